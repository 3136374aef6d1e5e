"""The towns of the island and their streets: bent grids with ragged edges."""

from __future__ import annotations

from functools import cache
from typing import NamedTuple

import numpy as np

from island.frame import Floats, random_stream
from island.terrain import inland_ratio, river_distance_m

__all__ = ["TOWNS", "Street", "Town", "gate", "lane", "main_street", "node", "town_streets"]


class Town(NamedTuple):
    """A town: `columns` x `rows` street corners about its middle, turned by `turn_deg`."""

    name: str
    x_m: float
    y_m: float
    columns: int
    rows: int
    turn_deg: float
    block_m: float


class Street(NamedTuple):
    """A line of the street network, in the local frame; corners shared by streets are equal."""

    name: str
    road_class: str
    line: Floats
    bridge: bool = False


TOWNS = {
    town.name: town
    for town in (
        Town("Wexmarrow", -7_800, -3_330, 13, 9, 21, 112),
        Town("Tollanquay", 9_100, -2_550, 9, 7, -24, 108),
        Town("Brindlequoy", 2_450, -650, 7, 5, 14, 98),
        Town("Ulmeskar", 5_000, 900, 5, 3, 38, 92),
        Town("Norrabrith", -2_900, 6_050, 7, 5, -8, 100),
        Town("Lunnothfoot", 3_550, -5_950, 5, 3, -30, 96),
    )
}

_ROW_NAMES = (
    "Kiln", "Heron", "Ropewalk", "Saltbox", "Lantern", "Netmaker", "Thimble", "Plover", "Garnet",
)  # fmt: skip
_COLUMN_NAMES = (
    "Anvil", "Barley", "Candle", "Drover", "Ember", "Fennel", "Gannet", "Harrow", "Inkhorn",
    "Juniper", "Kestrel", "Limpet", "Mallow",
)  # fmt: skip


@cache
def _corners(name: str) -> tuple[Floats, Floats]:
    """Return the street corners of a town, and which of them exist."""
    town = TOWNS[name]
    random = random_stream(f"town {name}")
    east, north = np.meshgrid(
        np.arange(town.columns) - town.columns // 2, np.arange(town.rows) - town.rows // 2
    )
    round_shape = np.hypot(east / (town.columns / 2), north / (town.rows / 2))
    ragged = round_shape + random.uniform(-0.16, 0.16, east.shape) < 1.08
    bend = 0.012 * np.sign(town.turn_deg)
    u = town.block_m * (east + bend * north**2) + random.uniform(-9, 9, east.shape)
    v = town.block_m * (0.92 * north - bend * east**2) + random.uniform(-9, 9, east.shape)
    turn = np.radians(town.turn_deg)
    xy = np.stack([u * np.cos(turn) - v * np.sin(turn), u * np.sin(turn) + v * np.cos(turn)], -1)
    xy += [town.x_m, town.y_m]
    dry = (inland_ratio(xy) > 0.03) & (river_distance_m(xy) > 90.0)
    return xy, (ragged | (east == 0) | (north == 0)) & dry


def node(name: str, row: int, column: int) -> Floats:
    """Return a street corner of a town."""
    xy, there = _corners(name)
    if not there[row, column]:
        message = f"{name} has no corner in row {row}, column {column}"
        raise ValueError(message)
    corner: Floats = xy[row, column]
    return corner


def gate(name: str, side: str) -> Floats:
    """Return the last corner of a town's main streets to the east, west, north or south."""
    line = main_street(name) if side in {"east", "west"} else lane(name)
    end: Floats = line[-1] if side in {"east", "north"} else line[0]
    return end


def main_street(name: str) -> Floats:
    """Return a town's middle street from west to east."""
    xy, there = _corners(name)
    row = TOWNS[name].rows // 2
    line: Floats = xy[row][there[row]]
    return line


def lane(name: str, column: int | None = None) -> Floats:
    """Return one of a town's streets from south to north, the middle one if not named."""
    xy, there = _corners(name)
    column = TOWNS[name].columns // 2 if column is None else column
    line: Floats = xy[:, column][there[:, column]]
    return line


def town_streets(name: str) -> list[Street]:
    """Return every street of a town."""
    xy, there = _corners(name)
    town = TOWNS[name]
    streets = []
    for row in range(town.rows):
        middle = row == town.rows // 2
        label = "Market Street" if middle else f"{_ROW_NAMES[row]} Street"
        line = xy[row][there[row]]
        streets.append(Street(label, "secondary" if middle else "residential", line))
    for column in range(town.columns):
        middle = column == town.columns // 2
        label = "Chapel Lane" if middle else f"{_COLUMN_NAMES[column]} Lane"
        line = xy[:, column][there[:, column]]
        streets.append(Street(label, "tertiary" if middle else "residential", line))
    return [street for street in streets if len(street.line) > 1]
