"""Where one event could cut both of two ways: what they share, cross, or pass near."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from routeplan.geodesy import steps_m, unwrapped
from routeplan.streets.inside import plan_frame
from routeplan.streets.model import Exposure, Floats, Part, Way

__all__ = ["exposures_between", "near_m_of"]

_SHARED_M = 0.05
_STEP_M = 5.0  # house rule: lines are compared at points this near to each other, or nearer
_AT_POINT_M = 1.0


def exposures_between(main: Way, standby: Way, *, distance_m: float) -> tuple[Exposure, ...]:
    """
    Return the stretches of one way within a distance of another, in order along it.

    Distances are taken from points every 5 m or less along the first way to the second's line; the
    length is known to that step at each end of a stretch.

    Parameters
    ----------
    main, standby
        The ways.
    distance_m
        From where on two ways count as apart. [m]
    """
    points, along = _points(main.lonlat)
    away = near_m_of(points, standby.lonlat, most_m=distance_m)
    shared = _shared_pieces(main, standby)
    is_shared = _within(along, shared)
    kinds = np.where(
        is_shared, 2, np.where(away <= _SHARED_M, 1, np.where(away < distance_m, 0, -1))
    )
    # A single point in common is a junction; it stands inside a stretch that is merely near.
    found: list[Exposure] = []
    for first, last in _runs(kinds >= 0):
        own = slice(first, last + 1)
        for kind, begin, end in _split(kinds[own], along[own]):
            inside = (along >= begin) & (along <= end)
            nearest_m = float(away[inside].min())
            stretch = (kind, begin, end)
            found.append(_exposure(main, stretch, nearest_m=nearest_m, points=points, along=along))
    return tuple(found)


def near_m_of(points: Floats, lonlat: Floats, *, most_m: float) -> Floats:
    """
    Return how far points are from a polyline, infinite beyond `most_m`.

    Parameters
    ----------
    points
        Shape (n, 2). [deg]
    lonlat
        The polyline, shape (k, 2). [deg]
    most_m
        How far to look. [m]
    """
    import shapely

    line = np.column_stack([unwrapped(lonlat[:, 0]), lonlat[:, 1]])
    flat = np.array(plan_frame(line))
    turn = 360.0 * np.round((points[:, 0] - line[0, 0]) / 360.0)
    moved = np.column_stack([points[:, 0] - turn, points[:, 1]]) * flat
    steps = np.stack([line[:-1] * flat, line[1:] * flat], axis=1)
    drawn: Any = shapely.linestrings(steps)
    tree = shapely.STRtree(drawn)
    marks: Any = shapely.points(moved)
    number, step = tree.query(marks, predicate="dwithin", distance=most_m)
    away = np.full(len(points), np.inf)
    np.minimum.at(away, number, shapely.distance(marks[number], drawn[step]))
    return away


def _points(lonlat: Floats) -> tuple[Floats, Floats]:
    """Return the vertices of a line and points between them, with how far along each lies."""
    steps = steps_m(lonlat)
    counts = np.maximum(np.ceil(steps / _STEP_M).astype(np.int64), 1)
    owner = np.repeat(np.arange(len(steps)), counts)
    share = (np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)) / counts[
        owner
    ]
    line = np.column_stack([unwrapped(lonlat[:, 0]), lonlat[:, 1]])
    points = line[owner] + share[:, None] * (line[owner + 1] - line[owner])
    chain = np.concatenate([[0.0], np.cumsum(steps)])
    along = chain[owner] + share * steps[owner]
    return np.vstack([points, line[-1:]]), np.append(along, chain[-1])


def _shared_pieces(main: Way, standby: Way) -> list[tuple[float, float]]:
    """Return where along the first way the second uses the same piece of street or walk."""
    used: dict[int, list[tuple[float, float]]] = {}
    walks = [part.lonlat for part in standby.parts if part.edge < 0]
    for part in standby.parts:
        if part.edge >= 0:
            low, high = sorted((part.from_m, part.to_m))
            used.setdefault(part.edge, []).append((low, high))
    found = []
    begin = 0.0
    for part in main.parts:
        end = begin + part.length_m
        low, high = sorted((part.from_m, part.to_m))
        if part.edge < 0:
            common = any(_same_line(part.lonlat, walk) for walk in walks)
        else:
            common = any(
                min(high, to_m) - max(low, from_m) > _SHARED_M
                for from_m, to_m in used.get(part.edge, [])
            )
        if common:
            found.append((begin, end))
        begin = end
    return found


def _same_line(one: Floats, other: Floats) -> bool:
    return one.shape == other.shape and bool(
        np.array_equal(one, other) or np.array_equal(one, other[::-1])
    )


def _within(along: Floats, stretches: Sequence[tuple[float, float]]) -> np.ndarray:
    inside = np.zeros(len(along), dtype=bool)
    for begin, end in stretches:
        inside |= (along >= begin - 1e-6) & (along <= end + 1e-6)
    return inside


def _runs(flags: np.ndarray) -> list[tuple[int, int]]:
    """Return the first and last index of every run of true values."""
    edges = np.diff(np.concatenate([[False], flags, [False]]).astype(np.int8))
    return list(
        zip(
            np.flatnonzero(edges == 1).tolist(),
            (np.flatnonzero(edges == -1) - 1).tolist(),
            strict=True,
        )
    )


def _split(kinds: np.ndarray, along: Floats) -> list[tuple[int, float, float]]:
    """Return the stretches of one kind: shared ones, junctions, and what is near between them."""
    found: list[tuple[int, float, float]] = []
    for shared in (True, False):
        for first, last in _runs((kinds == 2) == shared):
            if shared:
                found.append((2, float(along[first]), float(along[last])))
                continue
            # From the point where the shared stretch ends, not from the first one after it.
            begin = float(along[first - 1 if first else 0])
            end = float(along[min(last + 1, len(along) - 1)])
            found.append((0, begin, end))
            met = [along[at] for at in range(first, last + 1) if kinds[at] == 1]
            found.extend((1, float(at), float(at)) for at in _apart(met))
    return sorted(found, key=lambda item: (item[1], item[2]))


def _apart(marks: Sequence[float]) -> list[float]:
    """Return marks, those hardly apart only once."""
    kept: list[float] = []
    for mark in marks:
        if not kept or mark - kept[-1] > 2 * _STEP_M:
            kept.append(mark)
    return kept


def _exposure(
    main: Way,
    stretch: tuple[int, float, float],
    *,
    nearest_m: float,
    points: Floats,
    along: Floats,
) -> Exposure:
    kind, begin_m, end_m = stretch
    middle = 0.5 * (begin_m + end_m)
    at = int(np.argmin(np.abs(along - middle)))
    part = _part_at(main, middle)
    lon = (float(points[at, 0]) + 180.0) % 360.0 - 180.0
    return Exposure(
        kind=("near", "junction", "shared")[kind],
        from_m=begin_m,
        to_m=end_m,
        length_m=end_m - begin_m,
        nearest_m=0.0 if nearest_m < _SHARED_M else nearest_m,
        name=(part.name or part.road_class) if part else "",
        is_bridge=bool(part and part.is_bridge),
        lon=lon,
        lat=float(points[at, 1]),
    )


def _part_at(way: Way, along_m: float) -> Part | None:
    ends = np.cumsum([part.length_m for part in way.parts])
    if not len(ends):
        return None
    return way.parts[min(int(np.searchsorted(ends, along_m)), len(ends) - 1)]
