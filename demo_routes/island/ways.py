"""Laying a way over the ground: the cheapest one between two places, shaped like a road."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from heapq import heappop, heappush

import numpy as np
from numpy.typing import NDArray

from island.frame import Floats
from island.lines import distance_to_line, simplify, smooth
from island.terrain import height_m, inland_ratio, river_distance_m, waves

__all__ = ["CELL_M", "lay_way"]

CELL_M = 100.0
_WEST_M, _SOUTH_M = -13_500.0, -9_500.0
_COLUMNS, _ROWS = 271, 191
_CLOSED = 10_000_000  # costs are whole numbers, so that every machine finds the same way
_MOVES = tuple(
    (east, north)
    for east in (-2, -1, 0, 1, 2)
    for north in (-2, -1, 0, 1, 2)
    if (east, north) != (0, 0) and (abs(east), abs(north)) not in {(2, 2), (0, 2), (2, 0)}
)


def lay_way(
    start: Floats, end: Floats, *, easy_slope: float = 0.035, keep_off: Sequence[Floats] = ()
) -> Floats:
    """
    Return the cheapest way between two places of the local frame, bent like a road.

    Exact on a grid of 100 m cells with sixteen moves. A metre costs more the steeper it is; sea
    and river are closed.

    Parameters
    ----------
    start, end
        East and north of the origin. [m]
    easy_slope
        The slope at which a metre costs twice as much. [-]
    keep_off
        Ways already laid, which this one should not run beside.

    Returns
    -------
    way
        Vertices from start to end, shape (n, 2). [m]
    """
    costs = _move_costs(round(easy_slope * 1_000), _beside(keep_off, start, end))
    cells = _cheapest(costs, _cell(start), _cell(end))
    inner = np.array([(_WEST_M + c * CELL_M, _SOUTH_M + r * CELL_M) for r, c in cells[1:-1]])
    line = np.vstack([[start], inner.reshape(-1, 2), [end]])
    return smooth(simplify(line, 35.0))


def _cell(xy: Floats) -> tuple[int, int]:
    return round((xy[1] - _SOUTH_M) / CELL_M), round((xy[0] - _WEST_M) / CELL_M)


@cache
def _grid() -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Return cell middles, heights to 0.1 m, and which cells are closed."""
    east = _WEST_M + CELL_M * np.arange(_COLUMNS)
    north = _SOUTH_M + CELL_M * np.arange(_ROWS)
    xy = np.stack(np.meshgrid(east, north), axis=-1)
    closed = (inland_ratio(xy) < 0.025) | (river_distance_m(xy) < 150.0)
    return xy, np.round(height_m(xy), 1), closed


def _beside(ways: Sequence[Floats], start: Floats, end: Floats) -> Floats:
    """Return a factor per cell: dear beside ways already laid, except where this one begins."""
    xy = _grid()[0].reshape(-1, 2)
    factor = np.ones(len(xy))
    for way in ways:
        factor[distance_to_line(xy, simplify(way, 20.0)) < 220.0] = 4.0
    for place in (start, end):
        factor[np.hypot(*(xy - place).T) < 350.0] = 1.0
    return factor.reshape(_ROWS, _COLUMNS)


def _move_costs(easy_per_mille: int, beside: Floats) -> list[list[int]]:
    """Return for each move the cost of leaving each cell by it, in centimetres of flat way."""
    xy, height, closed = _grid()
    mood = 1.0 + 0.55 * waves(xy, "mood", shortest_m=350, longest_m=1_900, count=18)
    ground = np.round(mood * beside, 3)
    table = []
    for east, north in _MOVES:
        at = (_span(-north, _ROWS), _span(-east, _COLUMNS))
        to = (_span(north, _ROWS), _span(east, _COLUMNS))
        run_m = CELL_M * np.hypot(east, north)
        slope = (height[to] - height[at]) / run_m * 1_000 / easy_per_mille
        cost = np.full((_ROWS, _COLUMNS), _CLOSED)
        priced = 100 * run_m * (1 + slope**2) * (ground[at] + ground[to]) / 2
        cost[at] = np.where(closed[to] | closed[at], _CLOSED, np.rint(priced).astype(int))
        table.append(cost.reshape(-1).tolist())
    return table


def _span(shift: int, size: int) -> slice:
    """Return the rows (or columns) that stay on the grid when it is moved by so many."""
    return slice(max(shift, 0), size + min(shift, 0))


def _cheapest(
    costs: list[list[int]], start: tuple[int, int], end: tuple[int, int]
) -> list[tuple[int, int]]:
    """Return the cells of the cheapest way (Dijkstra); ties fall to the lower cell number."""
    steps = [north * _COLUMNS + east for east, north in _MOVES]
    first, last = start[0] * _COLUMNS + start[1], end[0] * _COLUMNS + end[1]
    best, came, done = {first: 0}, {first: first}, set()
    pending = [(0, first)]
    while pending:
        spent, cell = heappop(pending)
        if cell in done:
            continue
        done.add(cell)
        if cell == last:
            break
        for step, cost in zip(steps, costs, strict=True):
            price = cost[cell]
            if price < _CLOSED and spent + price < best.get(cell + step, 1 << 60):
                best[cell + step], came[cell + step] = spent + price, cell
                heappush(pending, (spent + price, cell + step))
    if last not in came:
        message = f"no way on land from cell {start} to cell {end}: one of them may be closed"
        raise ValueError(message)
    way = [last]
    while way[-1] != first:
        way.append(came[way[-1]])
    return [divmod(cell, _COLUMNS) for cell in reversed(way)]
