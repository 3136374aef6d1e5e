"""How the house is built: imports go one way, nothing heavy at start, names as they are listed."""

from __future__ import annotations

import ast
import importlib
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

import routeplan

PACKAGE = Path(routeplan.__file__).parent
FLOORS = (
    {"errors"},
    {"units", "tables", "memo", "terminal"},
    {"geodesy"},
    {"run"},
    {"ground"},
    {"streets"},
    {"cable"},
    {"light", "mechanics"},
    {"field"},
    {"planning", "verify"},
    {"sheets"},
    {"sift", "board"},
    {"cli"},
)
"""Rooms from the ground up, built or to come: each may use the floors below, and its own."""

WHOLE_PAGE = next(number for number, rooms in enumerate(FLOORS) if "planning" in rooms)
"""The floor of the single files that put rooms together: those not named above are here."""

APART = {("light", "mechanics"), ("mechanics", "light"), ("sift", "board"), ("board", "sift")}
"""Rooms of one floor that do not know each other."""

OUTSIDE = {"routeplan", "__main__"}  # they re-export, or start the command
HEAVY = (
    "numpy",
    "geopandas",
    "pandas",
    "folium",
    "pydantic",
    "pyogrio",
    "pyproj",
    "shapely",
    "scipy",
)
LEAST_AT_RUN_TIME = ("geopandas", "folium", "scipy", "pyogrio")


def modules() -> list[str]:
    """Return every module of the package by its dotted name."""
    found = []
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
        found.append(".".join(parts[:-1] if parts[-1] == "__init__" else parts))
    return found


def tree_of(module: str) -> ast.Module:
    """Return the syntax tree of a module."""
    path = PACKAGE.parent.joinpath(*module.split("."))
    file = path / "__init__.py" if path.is_dir() else path.with_suffix(".py")
    return ast.parse(file.read_text(encoding="utf-8"))


def imports_of(module: str, *, at_load: bool = False) -> set[str]:
    """Return the modules of the package that a module imports: anywhere, or as it is loaded."""
    known = set(modules())
    found: set[str] = set()
    for node in _nodes(tree_of(module), at_load=at_load):
        if isinstance(node, ast.Import):
            found |= {name.name for name in node.names if name.name.split(".")[0] == "routeplan"}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module} has a relative import"
            if str(node.module).split(".")[0] == "routeplan":
                inner = {f"{node.module}.{name.name}" for name in node.names}
                found |= {name if name in known else str(node.module) for name in inner}
    return found


def _nodes(tree: ast.AST, *, at_load: bool) -> Iterator[ast.AST]:
    """Yield every node; for loading not what is there for type checkers or within functions."""
    for node in ast.iter_child_nodes(tree):
        is_for_types = isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING"
        if at_load and (is_for_types or isinstance(node, ast.FunctionDef)):
            continue
        yield node
        yield from _nodes(node, at_load=at_load)


def room_of(module: str) -> str:
    """Return the room of a module: the file or folder beneath the package."""
    parts = module.split(".")
    return parts[1] if len(parts) > 1 else parts[0]


def floor_of(room: str) -> int | None:
    """Return the floor of a room, or None if the plan of the house does not have it."""
    if (PACKAGE / f"{room}.py").is_file() and not any(room in rooms for rooms in FLOORS):
        return WHOLE_PAGE
    return next((number for number, rooms in enumerate(FLOORS) if room in rooms), None)


def test_every_room_is_in_the_plan_of_the_house() -> None:
    """Every module and folder of the package has its floor, and the main job's are all there."""
    rooms = {room_of(module) for module in modules()} - OUTSIDE
    assert [room for room in sorted(rooms) if floor_of(room) is None] == []
    main = {"errors", "units", "tables", "memo", "geodesy", "run", "ground", "cable", "light"}
    assert main | {"verify", "planning", "sheets", "cli"} <= rooms


@pytest.mark.parametrize("module", modules())
def test_imports_go_down(module: str) -> None:
    """A module uses its own room and the floors below, nothing beside it and nothing above."""
    room = room_of(module)
    if room in OUTSIDE:
        return
    for other in sorted(imports_of(module)):
        used = room_of(other)
        if used == room or (room == "cli" and other == "routeplan"):  # for the version
            continue
        own, below = floor_of(room), floor_of(used)
        assert own is not None
        assert below is not None, f"{module} imports {other}"
        assert below <= own, f"{module} imports {other}"
        assert (room, used) not in APART, f"{module} imports {other}"


def test_no_module_imports_itself_in_a_ring() -> None:
    """The modules can be put in an order in which each needs earlier ones only to be loaded."""
    left = {module: imports_of(module, at_load=True) - {module} for module in modules()}
    while left:
        free = [module for module, used in left.items() if not used & set(left)]
        assert free, f"imports in a ring among {sorted(left)}"
        for module in free:
            del left[module]


@pytest.mark.parametrize("module", modules())
def test_listed_names_are_sorted_and_exist(module: str) -> None:
    """`__all__` is sorted, names nothing twice, and every name in it exists."""
    if module == "routeplan.__main__":
        return
    loaded = importlib.import_module(module)
    listed = getattr(loaded, "__all__", None)
    if listed is None:
        assert not _public_names(module), f"{module} lists no names"
        return
    assert list(listed) == sorted(set(listed), key=_sort_key)
    for name in listed:
        assert hasattr(loaded, name), f"{module} lists {name}"


@pytest.mark.parametrize("module", modules())
def test_public_names_are_listed(module: str) -> None:
    """Every public function and class of a module is in its `__all__`."""
    if room_of(module) in OUTSIDE:
        return
    loaded = importlib.import_module(module)
    assert _public_names(module) <= set(getattr(loaded, "__all__", ()))


def _public_names(module: str) -> set[str]:
    kinds = (ast.FunctionDef, ast.ClassDef)
    names = {node.name for node in tree_of(module).body if isinstance(node, kinds)}
    return {name for name in names if not name.startswith("_")}


def _sort_key(name: str) -> tuple[int, str]:
    """Return the order that the linter sorts in: constants, classes, then the rest."""
    return (0 if name.isupper() else 1 if name[:1].isupper() else 2, name)


def _loaded_by(code: str) -> set[str]:
    """Return the top-level modules that a fresh interpreter has loaded after some code."""
    script = (
        f"{code}\nimport sys\nprint('|'.join(sorted({{m.split('.')[0] for m in sys.modules}})))"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True, timeout=120
    )
    return set(done.stdout.splitlines()[-1].split("|"))


def test_importing_the_package_is_light() -> None:
    """`import routeplan` loads nothing heavy."""
    assert not _loaded_by("import routeplan") & set(HEAVY)


def test_help_is_light() -> None:
    """`routeplan --help` loads nothing heavy."""
    code = (
        "from routeplan.cli import main\ntry:\n    main(['--help'])\nexcept SystemExit:\n    pass"
    )
    assert not _loaded_by(code) & set(HEAVY)


def test_planning_loads_no_library_it_does_not_use() -> None:
    """Planning a GeoJSON file loads neither geopandas nor folium nor scipy."""
    assert not _loaded_by("import routeplan.planning, routeplan.run.reading") & set(
        LEAST_AT_RUN_TIME
    )


def test_the_public_door_leads_to_the_rooms() -> None:
    """Every name of the package itself is found when it is asked for."""
    for name in routeplan.__all__:
        assert getattr(routeplan, name) is not None
    with pytest.raises(AttributeError, match="nonsense"):
        routeplan.nonsense  # noqa: B018
