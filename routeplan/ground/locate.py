"""Which lines pass near a point, where along them, and how far off it lies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.run.model import Floats

__all__ = ["Hit", "LineIndex", "index_lines", "near_lines", "nearest_m", "within_pairs"]

_M_PER_DEGREE = 110_000.0  # a little less than any degree of latitude, so that boxes are generous


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LineIndex:
    """The steps of several polylines in a tree; build it with `index_lines`."""

    tree: shapely.STRtree
    begin: Floats
    end: Floats
    line: NDArray[np.int64]
    index_begin: Floats
    index_end: Floats
    reference_lon: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Hit:
    """The nearest place on one line: its fractional vertex index and the distance to it."""

    line: int
    index: float
    offset_m: float


def index_lines(shapes: Sequence[tuple[Floats, Floats]]) -> LineIndex:
    """
    Return a tree over polylines given as (lonlat, fractional index) with short steps.

    Parameters
    ----------
    shapes
        For each line its points, shape (n, 2) [deg], and their indices, shape (n,). [-]
    """
    reference = float(shapes[0][0][0, 0])
    moved = [_near_reference(lonlat, reference) for lonlat, _ in shapes]
    begin = np.concatenate([lonlat[:-1] for lonlat in moved])
    end = np.concatenate([lonlat[1:] for lonlat in moved])
    return LineIndex(
        tree=shapely.STRtree(np.asarray(shapely.linestrings(np.stack([begin, end], axis=1)))),
        begin=begin,
        end=end,
        line=np.repeat(np.arange(len(shapes)), [len(lonlat) - 1 for lonlat in moved]),
        index_begin=np.concatenate([index[:-1] for _, index in shapes]),
        index_end=np.concatenate([index[1:] for _, index in shapes]),
        reference_lon=reference,
    )


def _near_reference(lonlat: Floats, reference_lon: float) -> Floats:
    turn = 360.0 * np.round((lonlat[0, 0] - reference_lon) / 360.0)
    return lonlat - [turn, 0.0] if turn else lonlat


def near_lines(lines: LineIndex, points: Floats, *, radius_m: Floats) -> list[list[Hit]]:
    """
    Return for each point its nearest place on every line within `radius_m`, nearest first.

    Exact to a millimetre for radii up to some hundreds of metres. Costs O(log n) a point.

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
    turn = 360.0 * np.round((points[:, 0] - lines.reference_lon) / 360.0)
    moved = np.column_stack([points[:, 0] - turn, points[:, 1]])
    point, step = lines.tree.query(_boxes(moved, radius_m))
    if not len(point):
        return hits
    share, offset = _feet(lines, moved[point], step)
    near = offset <= radius_m[point]
    point, step, share, offset = point[near], step[near], share[near], offset[near]
    index = lines.index_begin[step] + share * (lines.index_end[step] - lines.index_begin[step])
    line = lines.line[step]
    # Ties in distance (a shared vertex) go to the lower line and index: the same every time.
    for at in np.lexsort((index, line, offset, point)):
        found = hits[point[at]]
        if all(hit.line != line[at] for hit in found):
            found.append(
                Hit(line=int(line[at]), index=float(index[at]), offset_m=float(offset[at]))
            )
    return hits


def _boxes(points: Floats, radius_m: Floats) -> NDArray[np.object_]:
    north = radius_m / _M_PER_DEGREE
    east = north / np.maximum(np.cos(np.radians(np.minimum(np.abs(points[:, 1]), 89.9))), 1e-3)
    lon, lat = points[:, 0], points[:, 1]
    return np.asarray(shapely.box(lon - east, lat - north, lon + east, lat + north))


def _feet(lines: LineIndex, points: Floats, step: NDArray[np.int64]) -> tuple[Floats, Floats]:
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
    turn = 360.0 * np.round((point[0] - lines.reference_lon) / 360.0)
    moved = np.array([[point[0] - turn, point[1]]])
    step = np.atleast_1d(lines.tree.nearest(shapely.points(moved)))
    _, offset = _feet(lines, moved, step)
    return float(offset[0])


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
    moved = np.column_stack(
        [points[:, 0] - 360.0 * np.round((points[:, 0] - points[0, 0]) / 360.0), points[:, 1]]
    )
    tree = shapely.STRtree(np.asarray(shapely.points(moved)))
    first, second = tree.query(_boxes(moved, np.full(len(moved), radius_m)))
    keep = first < second
    first, second = first[keep], second[keep]
    east, north = geodesy.local_xy_m(moved[second], lon=moved[first, 0], lat=moved[first, 1])
    near = np.hypot(east, north) <= radius_m
    return sorted(zip(first[near].tolist(), second[near].tolist(), strict=True))
