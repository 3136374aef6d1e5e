"""The rooms import each other one way, in the order that DEVELOPERS.md lists them."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
PACKAGE = ROOT / "routeplan"
TABLE = (ROOT / "DEVELOPERS.md").read_text("utf-8").partition("\n## The house\n")[2]
ROWS = [
    re.findall(r"`([\w/]+)(?:\.py)?`", row)
    for row in re.findall(r"^\| (`[^|]+`) \|", TABLE.partition("\n## ")[0], re.MULTILINE)
]
RANKS = {name.strip("/"): rank for rank, row in enumerate(ROWS) for name in row}
BLIND = {("light", "mechanics"), ("mechanics", "light"), ("cable", "light")}


def room_of(path: Path) -> str:
    """Return the room a module belongs to."""
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imports_of(path: Path) -> Iterator[str]:
    """Yield the rooms that a module imports from, wherever in it the import stands."""
    for node in ast.walk(ast.parse(path.read_text("utf-8"))):
        names: list[str] = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path.name} imports by dots"
            names = [f"{node.module}.{alias.name}" for alias in node.names]
        for name in names:
            head, _, rest = name.partition(".")
            if head == "routeplan":
                yield rest.partition(".")[0]


MODULES = sorted(
    path for path in PACKAGE.rglob("*.py") if path.parent != PACKAGE or path.stem[0] != "_"
)


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_a_module_imports_from_rooms_above_its_own(path: Path) -> None:
    """No import goes to a room below, none sideways between rooms that do not know each other."""
    room = room_of(path)
    assert room in RANKS, f"{room} has no line in the table of rooms in DEVELOPERS.md"
    for other in imports_of(path):
        if other in ("__version__", room):
            continue
        assert RANKS.get(other, len(ROWS)) <= RANKS[room], f"{path.name}: {room} imports {other}"
        assert (room, other) not in BLIND


def test_the_table_has_the_order_of_the_data() -> None:
    """The table lists the main rooms from the ground up, and imports are really found."""
    main = ("errors", "geodesy", "run", "ground", "cable", "light", "planning", "sheets", "cli")
    assert [RANKS[room] for room in main] == sorted({RANKS[room] for room in main})
    assert {"planning", "sheets", "run"} <= set(imports_of(PACKAGE / "cli.py"))
