"""The developers' guide describes the house that the code's own tests hold it to."""

from __future__ import annotations

import re
from pathlib import Path

from tests.test_architecture import FLOORS, OUTSIDE, PACKAGE

ROOT = Path(__file__).parents[2]
GUIDE = (ROOT / "DEVELOPERS.md").read_text("utf-8")
TABLE = GUIDE.partition("\n## The house\n")[2].partition("\n## ")[0]
ROWS = [
    [name.removesuffix("/").removesuffix(".py") for name in re.findall(r"`([^`]+)`", row)]
    for row in re.findall(r"^\| (`[^|]+`) \|", TABLE, re.MULTILINE)
]


def test_the_table_goes_from_the_ground_up() -> None:
    """No row of the guide stands above one whose rooms lie on a lower floor."""
    floors = [
        [number for number, floor in enumerate(FLOORS) if room in floor]
        for row in ROWS
        for room in row
        if room not in OUTSIDE
    ]
    assert all(len(found) == 1 for found in floors), "the guide names a room that is on no floor"
    assert floors == sorted(floors)


def test_every_room_has_its_line() -> None:
    """Each folder of the package, and each file that has a floor of its own, is in the table."""
    listed = {room for row in ROWS for room in row}
    folders = {path.parent.name for path in PACKAGE.glob("*/__init__.py")}
    files = {path.stem for path in PACKAGE.glob("*.py")} & {
        room for floor in FLOORS for room in floor
    }
    assert folders | files <= listed
