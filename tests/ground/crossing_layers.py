"""Legs and layers of lines and areas for tests, and crossings found the plain way."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from fractions import Fraction

import numpy as np
import shapely
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.ground.features import FeatureKind, FeatureLayer, feature_layer
from routeplan.ground.model import Leg, Stretch

Floats = NDArray[np.float64]
LON, LAT = 9.0, 47.0
STEP_DEG = 2.0**-14  # about 5 m: sums of it are exact, so that vertices can lie on lines exactly


def leg_of(lonlat: Sequence[Sequence[float]] | Floats, *, name: str = "L1") -> Leg:
    """Return a level leg through vertices, its long steps densified as those of a run are."""
    points = np.asarray(lonlat, dtype=float)
    steps = geodesy.steps_m(points)
    unwrapped = np.column_stack([geodesy.unwrapped(points[:, 0]), points[:, 1]])
    shape, index = geodesy.densified(unwrapped, step_m=200.0, lengths_m=steps)
    is_turned = geodesy.is_turned(points)
    along = np.cumsum(steps[::-1] if is_turned else steps)
    ground = np.rint(np.concatenate([[0.0], along]) * 1000.0).astype(np.int64)
    ground = ground[-1] - ground[::-1] if is_turned else ground
    return Leg(
        id=name,
        name=name,
        start="N1",
        end="N2",
        lonlat=points,
        heights_m=None,
        is_drawn=None,
        is_turned=is_turned,
        ground_mm=ground,
        shape_lonlat=shape,
        shape_mm=np.interp(index, np.arange(len(ground)), ground),
        grid_m=float(steps.sum()),
        grid_crs="EPSG:32632",
        ellipsoid_m=float(steps.sum()),
        drawn_ellipsoid_m=float(steps.sum()),
        stretches=(Stretch(placement="duct", start_mm=0, end_mm=int(ground[-1])),),
        points=(),
    )


def cells(points: Sequence[Sequence[float]]) -> Floats:
    """Return degrees of points on a grid of about 5 m, exactly."""
    return np.asarray(points, dtype=float) * STEP_DEG + np.array([LON, LAT])


def layer_of(*geometries: object, kind: FeatureKind = "road", **columns: object) -> FeatureLayer:
    """Return a layer of features of one kind."""
    return feature_layer(
        "made.geojson", list(geometries), kinds=[kind] * len(geometries), **columns
    )


def line(points: Sequence[Sequence[float]]) -> shapely.LineString:
    """Return a line through points on the grid."""
    return shapely.LineString(cells(points))


def area(points: Sequence[Sequence[float]], *holes: Sequence[Sequence[float]]) -> shapely.Polygon:
    """Return an area around points on the grid."""
    return shapely.Polygon(cells(points), [cells(hole) for hole in holes])


def plain_crossings(leg: Floats, lines: Sequence[Floats]) -> list[tuple[int, int, float]]:
    """Return (line, step of the leg, share of the step) of every crossing, segment by segment."""
    found = []
    for number, points in enumerate(lines):
        for step, (a, b) in enumerate(itertools.pairwise(leg)):
            for c, d in itertools.pairwise(points):
                r, s = b - a, d - c
                size = r[0] * s[1] - r[1] * s[0]
                if size == 0.0:
                    continue
                t = ((c - a)[0] * s[1] - (c - a)[1] * s[0]) / size
                u = ((c - a)[0] * r[1] - (c - a)[1] * r[0]) / size
                if 0.0 <= t <= 1.0 and 0.0 <= u <= 1.0:
                    found.append((number, step, t))
    return found


def exact_crossing_count(leg: Sequence[tuple[int, int]], other: Sequence[tuple[int, int]]) -> int:
    """
    Return how often a polyline of whole coordinates crosses from one side of a leg to the other.

    In exact arithmetic: the other line is cut where it meets the leg; each piece off the leg is
    given the side of the leg it lies on next to where it meets it, and changes are counted.
    """
    pieces = _pieces(leg, other)
    count = 0
    for before, after in _neighbours(pieces):
        if _side(leg, before, at_end=True) * _side(leg, after, at_end=False) < 0:
            count += 1
    return count


def _pieces(leg, other):
    """Return straight pieces (begin, end, is on the leg) of the other line."""
    pieces = []
    for c, d in itertools.pairwise(other):
        cuts = {Fraction(0), Fraction(1)}
        for a, b in itertools.pairwise(leg):
            cuts.update(_meeting_shares(a, b, c, d))
        ranked = sorted(cuts)
        for low, high in itertools.pairwise(ranked):
            begin, middle, end = (_between(c, d, at) for at in (low, (low + high) / 2, high))
            pieces.append((begin, end, _is_on(leg, middle)))
    return pieces


def _between(c, d, share):
    return tuple(x + (y - x) * share for x, y in zip(c, d, strict=True))


def _cross(o, p, q):
    return (p[0] - o[0]) * (q[1] - o[1]) - (p[1] - o[1]) * (q[0] - o[0])


def _meeting_shares(a, b, c, d):
    size = (b[0] - a[0]) * (d[1] - c[1]) - (b[1] - a[1]) * (d[0] - c[0])
    if size == 0:
        shares = []
        if _cross(a, b, c) == 0:
            square = sum((y - x) ** 2 for x, y in zip(c, d, strict=True))
            for p in (a, b):
                along = sum((p[k] - c[k]) * (d[k] - c[k]) for k in (0, 1))
                shares.append(Fraction(along) / square)
        return [share for share in shares if 0 <= share <= 1]
    t = Fraction((c[0] - a[0]) * (d[1] - c[1]) - (c[1] - a[1]) * (d[0] - c[0])) / size
    u = Fraction((c[0] - a[0]) * (b[1] - a[1]) - (c[1] - a[1]) * (b[0] - a[0])) / size
    return [u] if 0 <= t <= 1 and 0 <= u <= 1 else []


def _is_on(leg, p):
    return any(
        _cross(a, b, p) == 0
        and min(a[0], b[0]) <= p[0] <= max(a[0], b[0])
        and min(a[1], b[1]) <= p[1] <= max(a[1], b[1])
        for a, b in itertools.pairwise(leg)
    )


def _neighbours(pieces):
    """Yield pieces off the leg that follow each other at a place, or over a length, on it."""
    return itertools.pairwise([piece for piece in pieces if not piece[2]])


def _side(leg, piece, *, at_end):
    """Return 1 or -1 for left or right of a simple leg where a piece meets it, 0 if it does not."""
    begin, end, _ = piece
    at, away = (end, begin) if at_end else (begin, end)
    if not _is_on(leg, at):
        return 0
    for number, (a, b) in enumerate(itertools.pairwise(leg)):
        if at == tuple(b) and number + 2 < len(leg):
            return _corner_side(a, b, leg[number + 2], away)
        if at in (tuple(leg[0]), tuple(leg[-1])):
            return 0
        if at != tuple(a) and at != tuple(b) and _is_on([a, b], at):
            turn = _cross(a, b, away)
            return (turn > 0) - (turn < 0)
    return 0


def _corner_side(a, b, c, away):
    """Return the side of a corner a-b-c that a point lies on: left of both, or of either."""
    first, second, turn = _cross(a, b, away), _cross(b, c, away), _cross(a, b, c)
    if turn > 0:
        return 1 if first > 0 and second > 0 else -1
    if turn < 0:
        return -1 if first < 0 and second < 0 else 1
    return (first > 0) - (first < 0)
