"""Legs and features as straight segments, and which of them lie near each other."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.ground.features import Geometries
from routeplan.ground.model import Leg
from routeplan.run.model import Floats

__all__ = [
    "FeatureSegments",
    "LegSegments",
    "Pairs",
    "Whole",
    "feature_segments",
    "leg_segments",
    "near_features",
    "near_segments",
]

Whole = NDArray[np.int64]

_PIECE = 16  # steps of a leg that share a box
_AT_ONCE = 1 << 18  # pairs of segments held in memory together
_M_PER_DEGREE = 110_000.0  # a little less than any degree of latitude
_EDGE_LON = 150.0  # legs beyond it are also looked for at the other end of the map


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LegSegments:
    """
    All steps of all legs, in each leg's canonical direction; steps of no length are left out.

    `begin`, `end` (n, 2) [deg]; `start_m`, `stop_m` (n,) are ground metres from the leg's
    canonical start; `leg` (n,); `scale` (n, 2) is metres a degree, east and north. `first` and
    `last` (legs,) are each leg's first step and one beyond its last. Pieces of up to 16 steps
    have boxes in `tree`; `piece_first`, `piece_count` and `piece_turn` (p,) are their steps and
    by how many degrees their box was moved around the earth.
    """

    begin: Floats
    end: Floats
    start_m: Floats
    stop_m: Floats
    leg: Whole
    scale: Floats
    first: Whole
    last: Whole
    is_turned: tuple[bool, ...]
    reach_m: float
    tree: shapely.STRtree
    piece_first: Whole
    piece_count: Whole
    piece_turn: Floats


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FeatureSegments:
    """
    All segments of some features; those of no length are left out.

    `begin`, `end` (n, 2) [deg]; `part` (n,) numbers lines and rings, `at_m` (n,) is how far along
    its part a segment begins; `scale` (n, 2). By part: `feature`, `is_closed`, `first` and `last`
    segment (one beyond), `length_m`.
    """

    begin: Floats
    end: Floats
    part: Whole
    at_m: Floats
    length_m: Floats
    scale: Floats
    feature: Whole
    is_closed: NDArray[np.bool_]
    first: Whole
    last: Whole


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Pairs:
    """
    Steps of legs and segments of features near each other, in metres from the step's begin.

    `step`, `segment` (n,); `along` (n, 2) is the step; `near`, `far` (n, 2) the segment's ends.
    """

    step: Whole
    segment: Whole
    along: Floats
    near: Floats
    far: Floats


def leg_segments(legs: Sequence[Leg], *, reach_m: float) -> LegSegments:
    """
    Return the steps of legs, ready to be searched.

    Parameters
    ----------
    legs
        The legs.
    reach_m
        How far around a leg features are looked for. [m]
    """
    turned = tuple(geodesy.is_turned(leg.shape_lonlat) for leg in legs)
    columns = [_leg_columns(leg, turn) for leg, turn in zip(legs, turned, strict=True)]
    begin, end, start, stop = (np.concatenate(column) for column in zip(*columns, strict=True))
    counts = np.array([len(column[2]) for column in columns], dtype=np.int64)
    last = np.cumsum(counts)
    first = last - counts
    pieces = np.concatenate([np.arange(a, b, _PIECE) for a, b in zip(first, last, strict=True)])
    ends = np.minimum(pieces + _PIECE, np.repeat(last, -(-counts // _PIECE)))
    low = np.minimum.reduceat(np.minimum(begin, end), pieces)
    high = np.maximum.reduceat(np.maximum(begin, end), pieces)
    north = reach_m / _M_PER_DEGREE
    flattest = np.cos(np.radians(np.minimum(np.abs([low[:, 1], high[:, 1]]).max(axis=0), 89.9)))
    margin = np.column_stack([north / flattest, np.full(len(low), north)])
    low, high = low - margin, high + margin
    number, turn = _copies(low, high)
    tree = shapely.STRtree(
        shapely.box(low[number, 0] + turn, low[number, 1], high[number, 0] + turn, high[number, 1])
    )
    return LegSegments(
        begin=begin,
        end=end,
        start_m=start,
        stop_m=stop,
        leg=np.repeat(np.arange(len(legs)), counts),
        scale=_scale(0.5 * (begin[:, 1] + end[:, 1])),
        first=first,
        last=last,
        is_turned=turned,
        reach_m=reach_m,
        tree=tree,
        piece_first=pieces[number],
        piece_count=(ends - pieces)[number],
        piece_turn=turn,
    )


def _leg_columns(leg: Leg, is_turned: bool) -> tuple[Floats, Floats, Floats, Floats]:
    lonlat, at_m = leg.shape_lonlat, leg.shape_mm / 1000.0
    if is_turned:
        lonlat, at_m = lonlat[::-1], at_m[-1] - at_m[::-1]
    turn = 360.0 * np.round(lonlat[len(lonlat) // 2, 0] / 360.0)
    lonlat = lonlat - [turn, 0.0]
    moves = (lonlat[1:] != lonlat[:-1]).any(axis=1)
    return lonlat[:-1][moves], lonlat[1:][moves], at_m[:-1][moves], at_m[1:][moves]


def _copies(low: Floats, high: Floats) -> tuple[Whole, Floats]:
    """Return boxes, those near the edge of the map once more at its other end."""
    number, turn = [np.arange(len(low))], [np.zeros(len(low))]
    for beyond, move in ((high[:, 0] > _EDGE_LON, -360.0), (low[:, 0] < -_EDGE_LON, 360.0)):
        number.append(np.flatnonzero(beyond))
        turn.append(np.full(int(beyond.sum()), move))
    return np.concatenate(number), np.concatenate(turn)


def _scale(lat: Floats) -> Floats:
    """Return metres a degree, east and north, at latitudes."""
    flattening = 1.0 / geodesy.WGS84_INVERSE_FLATTENING
    square = flattening * (2.0 - flattening)
    shrink = 1.0 - square * np.sin(np.radians(lat)) ** 2
    normal = np.radians(geodesy.WGS84_SEMI_MAJOR_M / np.sqrt(shrink))
    return np.column_stack([normal * np.cos(np.radians(lat)), normal * (1.0 - square) / shrink])


def near_features(legs: LegSegments, geometries: Geometries) -> tuple[Whole, Whole]:
    """
    Return which features' boxes meet the boxes of which legs, as (feature, leg) pairs.

    Parameters
    ----------
    legs
        The legs' steps.
    geometries
        The features.
    """
    feature, piece = legs.tree.query(geometries)
    pairs = np.unique(np.stack([feature, legs.leg[legs.piece_first[piece]]]), axis=1)
    return pairs[0], pairs[1]


def feature_segments(geometries: Geometries, numbers: Whole) -> FeatureSegments:
    """
    Return the segments of some features: of lines, and of the rings of areas.

    Parameters
    ----------
    geometries
        All features.
    numbers
        Which of them, shape (m,).
    """
    parts, owner = shapely.get_parts(geometries[numbers], return_index=True)
    is_area = shapely.get_type_id(parts) == 3
    rings, ring_owner = shapely.get_rings(parts[is_area], return_index=True)
    lines = np.concatenate([parts[~is_area], rings])
    feature = numbers[np.concatenate([owner[~is_area], owner[is_area][ring_owner]])]
    lonlat, line = shapely.get_coordinates(lines, return_index=True)
    real = (line[1:] == line[:-1]) & (lonlat[1:] != lonlat[:-1]).any(axis=1)
    begin, end, part = lonlat[:-1][real], lonlat[1:][real], line[:-1][real]
    first = np.searchsorted(part, np.arange(len(lines)))
    last = np.searchsorted(part, np.arange(len(lines)), side="right")
    scale = _scale(0.5 * (begin[:, 1] + end[:, 1]))
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*((end - begin) * scale).T))])
    ends = np.minimum(np.maximum(last - 1, 0), max(len(begin) - 1, 0))
    is_closed = np.zeros(len(lines), dtype=bool)
    if len(begin):
        at = np.minimum(first, len(begin) - 1)
        is_closed = (last > first) & (begin[at] == end[ends]).all(axis=1)
    return FeatureSegments(
        begin=begin,
        end=end,
        part=part,
        at_m=along[:-1] - along[first[part]],
        length_m=along[last] - along[first],
        scale=scale,
        feature=feature,
        is_closed=is_closed,
        first=first,
        last=last,
    )


def near_segments(legs: LegSegments, features: FeatureSegments) -> Iterator[Pairs]:
    """
    Yield the pairs of steps and segments whose boxes are within reach, some at a time.

    Parameters
    ----------
    legs
        The legs' steps.
    features
        The features' segments.
    """
    if not len(features.begin):
        return
    ends = np.stack([features.begin, features.end], axis=1)
    for chunk in range(0, len(ends), _AT_ONCE):
        lines = shapely.linestrings(ends[chunk : chunk + _AT_ONCE])
        segment, piece = legs.tree.query(lines)
        segment = segment + chunk
        for begin in range(0, len(segment), _AT_ONCE // _PIECE):
            part = slice(begin, begin + _AT_ONCE // _PIECE)
            yield _pairs(legs, features, segment[part], piece[part])


def _pairs(legs: LegSegments, features: FeatureSegments, segment: Whole, piece: Whole) -> Pairs:
    count = legs.piece_count[piece]
    owner = np.repeat(np.arange(len(piece)), count)
    step = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    step += legs.piece_first[piece][owner]
    segment, turn = segment[owner], legs.piece_turn[piece][owner]
    origin = legs.begin[step].copy()
    scale = legs.scale[step]
    along = (legs.end[step] - origin) * scale
    origin[:, 0] += turn
    near = (features.begin[segment] - origin) * scale
    far = (features.end[segment] - origin) * scale
    meets = np.minimum(near, far) <= np.maximum(along, 0.0) + legs.reach_m
    meets &= np.maximum(near, far) >= np.minimum(along, 0.0) - legs.reach_m
    keep = np.flatnonzero(meets[:, 0] & meets[:, 1])
    return Pairs(
        step=step[keep],
        segment=segment[keep],
        along=along[keep],
        near=near[keep],
        far=far[keep],
    )
