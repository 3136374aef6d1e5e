"""What lies on the island: its street network, its railway and its power line."""

from __future__ import annotations

from functools import cache
from itertools import combinations, pairwise
from typing import NamedTuple

import numpy as np

from island.frame import Floats, random_stream
from island.lines import along_m, cross_points, cut, nearest, point_at, resample, smooth
from island.terrain import HILLS, height_m, river_xy
from island.towns import TOWNS, Street, gate, town_streets
from island.ways import lay_way

__all__ = [
    "BRIDGES",
    "Bridge",
    "bridge_line",
    "mast_xy",
    "power_line",
    "railway",
    "road",
    "streets",
]

_VERTEX_STEP_M = 52.0
_APPROACH_M = 240.0


class Bridge(NamedTuple):
    """A road bridge over the river, near a place, its approaches square to the water."""

    name: str
    x_m: float
    y_m: float
    length_m: float


class Road(NamedTuple):
    """A road between two gates, over a bridge where it needs one."""

    name: str
    road_class: str
    start: tuple[str, str]
    end: tuple[str, str]
    bridge: str = ""
    easy_slope: float = 0.035


BRIDGES = {
    bridge.name: bridge
    for bridge in (
        Bridge("Lunnoth Bridge", 780, -420, 132),
        Bridge("Lunnothfoot Bridge", 2_560, -6_150, 156),
    )
}

_ROADS = (
    Road("Fell Road", "primary", ("Wexmarrow", "east"), ("Brindlequoy", "west"), "Lunnoth Bridge",
         0.055),
    Road("Tollan Road", "primary", ("Brindlequoy", "east"), ("Tollanquay", "west")),
    Road("Ulmeskar Road", "secondary", ("Brindlequoy", "north"), ("Ulmeskar", "west")),
    Road("Mast Road", "track", ("Ulmeskar", "east"), ("Quenmoor", "top"), "", 0.085),
    Road("South Shore Road", "secondary", ("Wexmarrow", "south"), ("Lunnothfoot", "west"),
         "Lunnothfoot Bridge"),
    Road("Thrumble Road", "secondary", ("Lunnothfoot", "east"), ("Tollanquay", "south")),
    Road("North Shore Road", "secondary", ("Wexmarrow", "north"), ("Norrabrith", "west")),
    Road("Urlaw Road", "tertiary", ("Norrabrith", "east"), ("Ulmeskar", "north")),
    Road("Valley Road", "tertiary", ("Lunnothfoot", "north"), ("Brindlequoy", "south")),
    Road("East Moor Road", "tertiary", ("Ulmeskar", "south"), ("Tollanquay", "north")),
)  # fmt: skip


@cache
def mast_xy() -> Floats:
    """Return where the mast stands: the highest place of the hill, to 10 m."""
    hill = HILLS[0]
    step = np.arange(-600.0, 601.0, 10.0)
    xy = np.stack(np.meshgrid(hill.x_m + step, hill.y_m + step), axis=-1).reshape(-1, 2)
    top: Floats = xy[int(np.argmax(np.round(height_m(xy), 1)))]
    return top


@cache
def bridge_line(name: str) -> Floats:
    """Return a bridge from west to east: its two ends."""
    ends = _square_to_river(BRIDGES[name], BRIDGES[name].length_m / 2)
    return np.array(ends)


def _square_to_river(bridge: Bridge, out_m: float) -> list[Floats]:
    """Return the places so far west and east of the river, square to it at the bridge."""
    river = river_xy()
    at = float(nearest(np.array([bridge.x_m, bridge.y_m]), river)[1][0])
    before, middle, after = point_at(river, [at - 90.0, at, at + 90.0])
    flow = (after - before) / np.hypot(*(after - before))
    east = np.array([-flow[1], flow[0]])
    return [middle - out_m * east, middle + out_m * east]


@cache
def _laid_roads() -> dict[str, tuple[Floats, ...]]:
    """Return the parts of every road in order: one, or two with a bridge between them."""
    laid: dict[str, tuple[Floats, ...]] = {}
    for plan in _ROADS:
        before = [part for parts in laid.values() for part in parts]
        start, end = _place(plan.start), _place(plan.end)
        if not plan.bridge:
            way = lay_way(start, end, easy_slope=plan.easy_slope, keep_off=before)
            laid[plan.name] = (_wandering(way, plan.name),)
            continue
        west, east = _square_to_river(BRIDGES[plan.bridge], _APPROACH_M)
        ends = bridge_line(plan.bridge)
        first = np.vstack([lay_way(start, west, keep_off=before), [ends[0]]])
        second = np.vstack([[ends[1]], lay_way(east, end, keep_off=before)])
        laid[plan.name] = tuple(_wandering(smooth(part, 1), plan.name) for part in (first, second))
    return laid


def _wandering(way: Floats, name: str) -> Floats:
    """Return a road with vertices at equal steps that sways a little, as no road is ruled."""
    line = resample(way, _VERTEX_STEP_M)
    chain = along_m(line)
    random = random_stream(f"road {name}")
    sway = np.zeros(len(line))
    for size_m, length_m in ((7.0, 830.0), (4.0, 470.0), (1.5, 260.0)):
        sway += size_m * np.sin(2 * np.pi * chain / length_m + random.uniform(0, 2 * np.pi))
    sway *= np.clip(np.minimum(chain, chain[-1] - chain) / 250.0, 0.0, 1.0)
    step = np.gradient(line, axis=0)
    unit = step / np.hypot(*step.T)[:, None]
    swayed: Floats = line + sway[:, None] * np.stack([-unit[:, 1], unit[:, 0]], axis=1)
    return swayed


def _place(named: tuple[str, str]) -> Floats:
    return mast_xy() if named[0] == "Quenmoor" else gate(*named)


def road(name: str) -> tuple[Floats, ...]:
    """Return the parts of a road, each ending where its bridge begins. [m]"""
    return _laid_roads()[name]


@cache
def streets() -> tuple[Street, ...]:
    """Return the whole street network: roads, bridges and town streets, joined where they meet."""
    network = []
    for plan in _ROADS:
        network += [Street(plan.name, plan.road_class, part) for part in road(plan.name)]
        if plan.bridge:
            line = bridge_line(plan.bridge)
            network.append(Street(plan.bridge, plan.road_class, line, bridge=True))
    for name in TOWNS:
        network += town_streets(name)
    return tuple(_joined(network))


def _joined(network: list[Street]) -> list[Street]:
    """Give streets that cross a common corner there."""
    lines = [street.line for street in network]
    for i, j in combinations(range(len(lines)), 2):
        if _boxes_apart(lines[i], lines[j]):
            continue
        for at_m in reversed(cross_points(lines[i], lines[j])):
            corner = point_at(lines[i], at_m)
            lines[i], corner = _with_corner(lines[i], corner)
            lines[j], corner = _with_corner(lines[j], corner)
    return [street._replace(line=line) for street, line in zip(network, lines, strict=True)]


def _boxes_apart(one: Floats, other: Floats) -> bool:
    return bool(np.any(one.max(0) < other.min(0)) or np.any(other.max(0) < one.min(0)))


def _with_corner(line: Floats, corner: Floats) -> tuple[Floats, Floats]:
    """Return the line with this corner in it, or with one of its own that is near enough."""
    away = np.hypot(*(line - corner).T)
    if away.min() < 2.0:
        return line, line[int(np.argmin(away))]
    at_m = float(nearest(corner, line)[1][0])
    index = int(np.searchsorted(along_m(line), at_m))
    return np.insert(line, index, corner, axis=0), corner


@cache
def railway() -> Floats:
    """Return the railway from Tollanquay quay up the valley to the stone pit at Skelvane. [m]"""
    stops = [(8_700, -2_900), (3_900, -4_300), (2_100, -2_900), (1_420, -480), (1_250, 1_750)]
    legs = [lay_way(np.array(a), np.array(b), easy_slope=0.014) for a, b in pairwise(stops)]
    line = np.vstack([legs[0], *(leg[1:] for leg in legs[1:])])
    line = smooth(resample(line, 220.0), 3)
    return resample(cut(line, 0.0, float(along_m(line)[-1]) - 300.0), 60.0)


@cache
def power_line() -> Floats:
    """Return the towers of the power line from Lunnothfoot to Wexmarrow. [m]"""
    bends = [(3_950, -5_550), (3_800, -2_700), (1_700, -1_450), (-1_600, -900), (-3_900, -2_750),
             (-5_600, -2_050), (-7_150, -2_650)]  # fmt: skip
    line = np.array(bends, dtype=float)
    spans = [resample(line[k : k + 2], 245.0)[:-1] for k in range(len(line) - 1)]
    return np.vstack([*spans, line[-1:]])
