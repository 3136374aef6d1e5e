"""Which lines pass near a point, where along them, and how far off it lies."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import isqrt

import numpy as np
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.run.model import Floats

__all__ = ["Hit", "LineIndex", "index_lines", "near_lines", "nearest_m", "within_pairs"]

Whole = NDArray[np.int64]

_M_PER_DEGREE = 110_000.0  # a little less than any degree of latitude, so that boxes are generous
_BLOCK_LEAST = 16  # steps that share a box, at least: below it boxes cost more than steps
_AT_ONCE = 1 << 20  # tests held in memory together


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LineIndex:
    """
    The steps of several polylines, with a box around every `block` of them; see `index_lines`.

    Every line is taken in its canonical direction, so that answers do not hang on how it was
    drawn; `index_begin` and `index_end` may fall. Boxes are (4, n): west, south, east, north.
    """

    begin: Floats
    end: Floats
    line: Whole
    index_begin: Floats
    index_end: Floats
    step_boxes: Floats
    block: int
    block_boxes: Floats
    reference_lon: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Hit:
    """The nearest place on one line: its fractional vertex index and the distance to it."""

    line: int
    index: float
    offset_m: float


def index_lines(shapes: Sequence[tuple[Floats, Floats]]) -> LineIndex:
    """
    Return the steps of polylines given as (lonlat, fractional index), ready to be searched.

    Parameters
    ----------
    shapes
        For each line its points with unwrapped longitude and short steps, shape (n, 2) [deg],
        and their indices, shape (n,). [-]
    """
    reference = float(shapes[0][0][:, 0].mean())
    one_way = [
        (lonlat[::-1], index[::-1]) if geodesy.is_turned(lonlat) else (lonlat, index)
        for lonlat, index in shapes
    ]
    moved = [_near_reference(lonlat, reference) for lonlat, _ in one_way]
    begin = np.concatenate([lonlat[:-1] for lonlat in moved])
    end = np.concatenate([lonlat[1:] for lonlat in moved])
    block = max(_BLOCK_LEAST, isqrt(len(begin)) // 4)
    starts = np.arange(0, len(begin), block)
    low, high = np.minimum(begin, end).T, np.maximum(begin, end).T
    return LineIndex(
        begin=begin,
        end=end,
        line=np.repeat(np.arange(len(shapes)), [len(lonlat) - 1 for lonlat in moved]),
        index_begin=np.concatenate([index[:-1] for _, index in one_way]),
        index_end=np.concatenate([index[1:] for _, index in one_way]),
        step_boxes=np.pad(
            np.concatenate([low, high]),
            ((0, 0), (0, -len(begin) % block)),
            constant_values=np.nan,  # to whole blocks, with boxes that meet nothing
        ),
        block=block,
        block_boxes=np.concatenate(
            [np.minimum.reduceat(low, starts, axis=1), np.maximum.reduceat(high, starts, axis=1)]
        ),
        reference_lon=reference,
    )


def _near_reference(lonlat: Floats, reference_lon: float) -> Floats:
    turn = 360.0 * np.round((lonlat[:, 0].mean() - reference_lon) / 360.0)
    return lonlat - [turn, 0.0] if turn else lonlat


def near_lines(lines: LineIndex, points: Floats, *, radius_m: Floats) -> list[list[Hit]]:
    """
    Return for each point its nearest place on every line within `radius_m`, nearest first.

    Good to a millimetre for points within 50 m of a line, to centimetres within 200 m.
    Costs O(p sqrt(n)) box tests, and a distance for every step whose own box is near.

    Parameters
    ----------
    lines
        The indexed lines.
    points
        Points, shape (p, 2). [deg]
    radius_m
        How far to look from each point, shape (p,). [m]
    """
    hits: list[list[Hit]] = [[] for _ in range(len(points))]
    if not len(points):
        return hits
    moved = _points_near(points, lines.reference_lon)
    for point, step in _pairs(lines, moved, radius_m):
        share, offset = _feet(lines, moved[point], step)
        near = offset <= radius_m[point]
        feet = (share[near], offset[near])
        _note(lines, hits, (point[near], step[near]), feet=feet)
    return hits


def _note(
    lines: LineIndex,
    hits: list[list[Hit]],
    pairs: tuple[Whole, Whole],
    *,
    feet: tuple[Floats, Floats],
) -> None:
    """Add the nearest place on every line to its point's hits."""
    (point, step), (share, offset) = pairs, feet
    line = lines.line[step]
    # Ties in distance (a shared vertex) go to the lower line and step: the same every time.
    order = np.lexsort((step, offset, line, point))
    first = np.ones(len(order), dtype=bool)
    first[1:] = (np.diff(point[order]) != 0) | (np.diff(line[order]) != 0)
    order = order[first]
    order = order[np.lexsort((line[order], offset[order], point[order]))]
    begin, end = lines.index_begin[step[order]], lines.index_end[step[order]]
    index = begin + share[order] * (end - begin)
    columns = (point[order], line[order], index, offset[order])
    for at, number, where, far in zip(*(column.tolist() for column in columns), strict=True):
        hits[at].append(Hit(line=number, index=where, offset_m=far))


def _points_near(points: Floats, reference_lon: float) -> Floats:
    turn = 360.0 * np.round((points[:, 0] - reference_lon) / 360.0)
    return np.column_stack([points[:, 0] - turn, points[:, 1]])


def _pairs(lines: LineIndex, points: Floats, radius_m: Floats) -> Iterator[tuple[Whole, Whole]]:
    """Yield points and the steps whose boxes lie near them; all of one point come together."""
    reach = _reach_deg(points, radius_m).T
    boxes = np.concatenate([points.T - reach, points.T + reach])
    rows = max(1, _AT_ONCE // lines.block_boxes.shape[1])
    for first in range(0, len(points), rows):
        own = boxes[:, first : first + rows, None]
        meets = _meet(own, lines.block_boxes[:, None, :])
        point, block = np.nonzero(meets)
        counts = np.bincount(point, minlength=meets.shape[0])
        ends = np.cumsum(counts)
        begin = 0
        while begin < len(point):
            # As many whole points as fit, and at least one.
            room = np.searchsorted(ends, begin + _AT_ONCE // lines.block, side="right")
            end = int(ends[max(room - 1, point[begin])])
            yield _near_steps(lines, boxes, first + point[begin:end], block[begin:end])
            begin = end


def _near_steps(lines: LineIndex, boxes: Floats, point: Whole, block: Whole) -> tuple[Whole, Whole]:
    """Return the points and steps whose boxes meet, of those in some blocks."""
    step = (block[:, None] * lines.block + np.arange(lines.block)).ravel()
    owner = np.repeat(point, lines.block)
    near = _meet(boxes[:, owner], lines.step_boxes[:, step])
    return owner[near], step[near]


def _meet(boxes: Floats, others: Floats) -> NDArray[np.bool_]:
    """Tell which boxes meet."""
    west, south, east, north = boxes
    meets: NDArray[np.bool_] = west <= others[2]
    meets = meets & (others[0] <= east)
    meets &= south <= others[3]
    meets &= others[1] <= north
    return meets


def _reach_deg(points: Floats, radius_m: Floats) -> Floats:
    """Return how many degrees a radius is at most, east and north, shape (p, 2)."""
    north = radius_m / _M_PER_DEGREE
    farthest = np.minimum(np.abs(points[:, 1]) + north, 89.999)
    return np.column_stack([north / np.cos(np.radians(farthest)), north])


def _feet(lines: LineIndex, points: Floats, step: Whole) -> tuple[Floats, Floats]:
    """Return how far along each step the foot of its point lies (0..1) and the distance."""
    lon, lat = points[:, 0], points[:, 1]
    east0, north0 = geodesy.local_xy_m(lines.begin[step], lon=lon, lat=lat)
    east1, north1 = geodesy.local_xy_m(lines.end[step], lon=lon, lat=lat)
    east, north = east1 - east0, north1 - north0
    square = east * east + north * north
    along = -(east0 * east + north0 * north)
    share = np.clip(np.divide(along, square, out=np.zeros_like(along), where=square > 0), 0, 1)
    return share, np.hypot(east0 + share * east, north0 + share * north)


def nearest_m(lines: LineIndex, point: Floats) -> float:
    """
    Return about how far a point lies from the nearest line, for a message. [m]

    Parameters
    ----------
    lines
        The indexed lines.
    point
        Longitude and latitude, shape (2,). [deg]
    """
    moved = _points_near(point[None, :], lines.reference_lon)
    step = np.arange(len(lines.begin))
    share, offset = _feet(lines, np.repeat(moved, len(step), axis=0), step)
    at = int(np.argmin(offset))
    foot = lines.begin[at] + share[at] * (lines.end[at] - lines.begin[at])
    return float(geodesy.steps_m(np.stack([moved[0], foot]))[0])


def within_pairs(points: Floats, *, radius_m: float) -> list[tuple[int, int]]:
    """
    Return the pairs of points not farther apart than `radius_m`, as index pairs i < j.

    Parameters
    ----------
    points
        Points, shape (p, 2). [deg]
    radius_m
        Largest distance of a pair. [m]
    """
    moved = _points_near(points, float(points[0, 0]))
    reach = _reach_deg(moved, np.full(len(moved), radius_m))
    order = np.argsort(moved[:, 1], kind="stable")
    north = moved[order, 1]
    # Sorted by latitude, the candidates of a point are those that follow it within the radius.
    last = np.searchsorted(north, north + reach[order, 1], side="right")
    counts = last - np.arange(len(order)) - 1
    low = np.repeat(np.arange(len(order)), counts)
    high = np.arange(len(low)) - np.repeat(np.cumsum(counts) - counts, counts) + low + 1
    first, second = order[low], order[high]
    east, away = geodesy.local_xy_m(moved[second], lon=moved[first, 0], lat=moved[first, 1])
    near = np.hypot(east, away) <= radius_m
    first, second = first[near], second[near]
    pairs = zip(np.minimum(first, second), np.maximum(first, second), strict=True)
    return sorted((int(one), int(other)) for one, other in pairs)
