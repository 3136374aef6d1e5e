"""One drawn line with its steps measured: thinned, cut, reversed and put end to end."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.ground.terrain import KNOWN, VOID, Terrain
from routeplan.ground.terrain_profile import SMOOTH_WAVE_M, step_ways, terrain_profile
from routeplan.run.model import Floats, Line

__all__ = [
    "Drawn",
    "along_m",
    "cut_drawn",
    "draw_line",
    "joined_drawn",
    "reversed_drawn",
    "shape_of",
]

Flags: TypeAlias = NDArray[np.bool_]

_SHAPE_STEP_M = 200.0  # between its ends longitude and latitude leave the geodesic by 2 mm at 65 N


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Drawn:
    """
    A measured polyline.

    `lonlat` (n, 2), `heights_m` (n,) or None; `is_drawn` (n,) or None is False at vertices that
    nobody drew; `ellipsoid_steps_m` and `ground_steps_m` (n - 1,); `drawn_m` is the ellipsoid
    length before thinning, `share` the part of its line that it is. `state` (n,) tells which
    heights a terrain knew, None where heights are the geometry's; `smoothed_off_m` is what
    smoothing them took off the length.
    """

    line: Line
    lonlat: Floats
    heights_m: Floats | None
    is_drawn: Flags | None
    ellipsoid_steps_m: Floats
    ground_steps_m: Floats
    drawn_m: float
    share: float = 1.0
    state: NDArray[np.uint8] | None = None
    smoothed_off_m: float = 0.0


def draw_line(
    line: Line,
    *,
    track_tolerance_m: float,
    track_heights: bool = False,
    terrain: Terrain | None = None,
    placement: str = "duct",
    smooth_wave_m: float = SMOOTH_WAVE_M,
) -> Drawn:
    """
    Measure a line; a track with times is thinned first.

    A line's own heights go before a terrain's. The heights of a track give its profile but not
    its length, because their noise would lengthen it falsely, unless they are said to count.

    Parameters
    ----------
    line
        The line as read.
    track_tolerance_m
        Farthest a left-out vertex of a track may lie from the thinned line. [m]
    track_heights
        Whether the heights of a track count for its length.
    terrain
        Heights for a line that has none that count.
    placement
        Placement of a line that does not say.
    smooth_wave_m
        Length of the wave that smoothing of a terrain halves. [m]

    References
    ----------
    .. [1] Ellipsoid and ground steps: `routeplan.geodesy`; heights of a terrain:
       `routeplan.ground.terrain_profile`. Thinning: D. H. Douglas and
       T. K. Peucker, Cartographica 10 (1973) 112-122.
    """
    ellipsoid = _ellipsoid_steps_m(line, line.datum_lonlat)
    drawn_m = float(ellipsoid.sum())
    lonlat, heights, is_drawn = line.lonlat, line.heights_m, line.is_drawn
    if line.is_track and track_tolerance_m > 0:
        keep = _thinned(lonlat, track_tolerance_m)
        thin = _ellipsoid_steps_m(line, line.datum_lonlat[keep])
        if thin.sum() > 0.0:  # else the whole track lies within the tolerance of its start
            ellipsoid, lonlat = thin, lonlat[keep]
            heights = None if heights is None else heights[keep]
            is_drawn = None if is_drawn is None else is_drawn[keep]
    radius = geodesy.mean_radius_m(line.semi_major_m, line.inverse_flattening)
    counted = heights if track_heights or not line.is_track else None
    plain = Drawn(
        line=line,
        lonlat=lonlat,
        heights_m=heights,
        is_drawn=is_drawn,
        ellipsoid_steps_m=ellipsoid,
        ground_steps_m=geodesy.ground_steps_m(ellipsoid, counted, radius_m=radius),
        drawn_m=drawn_m,
    )
    if terrain is None or counted is not None:
        return plain
    return _on_terrain(
        plain,
        terrain,
        placement=line.placement or placement,
        smooth_wave_m=smooth_wave_m,
        radius_m=radius,
    )


def _on_terrain(
    plain: Drawn, terrain: Terrain, *, placement: str, smooth_wave_m: float, radius_m: float
) -> Drawn:
    """Return a line with heights and stations of a terrain; as it is where that knows nothing."""
    profile = terrain_profile(
        terrain,
        plain.lonlat,
        ellipsoid_steps_m=plain.ellipsoid_steps_m,
        ways=step_ways(placement, len(plain.lonlat) - 1),
        smooth_wave_m=smooth_wave_m,
        radius_m=radius_m,
    )
    if np.isnan(profile.heights_m).all():
        return replace(plain, state=profile.state[profile.is_vertex])
    is_drawn = profile.is_vertex.copy()
    if plain.is_drawn is not None:
        is_drawn[is_drawn] = plain.is_drawn
    return replace(
        plain,
        lonlat=profile.lonlat,
        heights_m=profile.heights_m,
        is_drawn=is_drawn,
        ellipsoid_steps_m=profile.ellipsoid_steps_m,
        ground_steps_m=profile.ground_steps_m,
        state=profile.state,
        smoothed_off_m=profile.smoothed_off_m,
    )


def _ellipsoid_steps_m(line: Line, lonlat: Floats) -> Floats:
    return geodesy.steps_m(
        lonlat, semi_major_m=line.semi_major_m, inverse_flattening=line.inverse_flattening
    )


def _thinned(lonlat: Floats, tolerance_m: float) -> NDArray[np.int64]:
    """Return the indices of the vertices that Douglas-Peucker keeps."""
    import shapely

    middle = lonlat[len(lonlat) // 2]
    east, north = geodesy.local_xy_m(lonlat, lon=middle[0], lat=middle[1])
    # The third ordinate carries the index through the simplification.
    line = shapely.LineString(np.column_stack([east, north, np.arange(len(lonlat))]))
    thin = line.simplify(tolerance_m, preserve_topology=False)
    return np.asarray(shapely.get_coordinates(thin, include_z=True)[:, 2].astype(np.int64))


def shape_of(drawn: Drawn) -> tuple[Floats, Floats]:
    """
    Return the line with long steps densified, and the fractional index of every point.

    The longitude runs on over the antimeridian. All is computed in the canonical direction, so
    that a line drawn the other way has the same points to the last bit.
    """
    is_turned = geodesy.is_turned(drawn.lonlat)
    one_way = reversed_drawn(drawn) if is_turned else drawn
    lonlat = one_way.lonlat
    shape, index = geodesy.densified(
        np.column_stack([geodesy.unwrapped(lonlat[:, 0]), lonlat[:, 1]]),
        step_m=_SHAPE_STEP_M,
        lengths_m=one_way.ellipsoid_steps_m,
    )
    return (shape[::-1], len(lonlat) - 1 - index[::-1]) if is_turned else (shape, index)


def reversed_drawn(drawn: Drawn) -> Drawn:
    """Return the line from its other end."""
    return replace(
        drawn,
        lonlat=drawn.lonlat[::-1],
        heights_m=None if drawn.heights_m is None else drawn.heights_m[::-1],
        is_drawn=None if drawn.is_drawn is None else drawn.is_drawn[::-1],
        state=None if drawn.state is None else drawn.state[::-1],
        ellipsoid_steps_m=drawn.ellipsoid_steps_m[::-1],
        ground_steps_m=drawn.ground_steps_m[::-1],
    )


def cut_drawn(drawn: Drawn, at: Sequence[float]) -> list[Drawn]:
    """
    Return the parts of a line cut at fractional vertex indices, in order.

    Parameters
    ----------
    drawn
        The line.
    at
        Indices strictly inside the line, rising; 2.25 lies a quarter along the third step. [-]
    """
    shape = shape_of(drawn)
    parts = []
    begin = 0.0
    total = float(drawn.ellipsoid_steps_m.sum())
    for end in [*at, float(len(drawn.lonlat) - 1)]:
        part = _part(drawn, shape, begin, end)
        share = float(part.ellipsoid_steps_m.sum()) / total if total else 0.0
        parts.append(
            replace(
                part,
                drawn_m=drawn.drawn_m * share,
                share=drawn.share * share,
                smoothed_off_m=drawn.smoothed_off_m * share,
            )
        )
        begin = end
    return parts


def _part(drawn: Drawn, shape: tuple[Floats, Floats], begin: float, end: float) -> Drawn:
    inner = np.arange(np.floor(begin) + 1, np.ceil(end))
    index = np.concatenate([[begin], inner, [end]])
    points, at = shape
    whole = np.arange(len(drawn.lonlat), dtype=np.float64)
    lonlat = np.column_stack([np.interp(index, at, points[:, axis]) for axis in (0, 1)])
    lonlat[:, 0] = geodesy.wrapped(lonlat[:, 0])
    lonlat[1:-1] = drawn.lonlat[inner.astype(np.int64)]
    heights, is_drawn = drawn.heights_m, drawn.is_drawn
    return replace(
        drawn,
        lonlat=lonlat,
        heights_m=None if heights is None else np.interp(index, whole, heights),
        # A cut is a place of its own: a site or another line's end.
        is_drawn=None if is_drawn is None else np.isin(index, np.flatnonzero(is_drawn)),
        state=None if drawn.state is None else _worse(drawn.state, index),
        ellipsoid_steps_m=_shared_steps(drawn.ellipsoid_steps_m, index),
        ground_steps_m=_shared_steps(drawn.ground_steps_m, index),
    )


def _worse(state: NDArray[np.uint8], index: Floats) -> NDArray[np.uint8]:
    """Return what is known at fractional indices: no more than at either neighbour."""
    before, after = np.floor(index).astype(np.int64), np.ceil(index).astype(np.int64)
    return np.asarray(np.maximum(state[before], state[after]))


def _shared_steps(steps_m: Floats, index: Floats) -> Floats:
    """Return the steps between fractional indices, each a share of one whole step."""
    at = np.minimum(np.floor(index[:-1]).astype(np.int64), len(steps_m) - 1)
    return np.asarray(steps_m[at] * np.diff(index))


def joined_drawn(parts: Sequence[Drawn]) -> Drawn:
    """
    Return lines put end to end as one; their common vertices become one.

    Parameters
    ----------
    parts
        Lines, each ending where the next one begins (within the joining tolerance).
    """
    first = parts[0]
    if len(parts) == 1:
        return first
    lonlats = [first.lonlat]
    for part in parts[1:]:
        # The ends may lie a tolerance apart; which of them is taken must not hang on direction.
        if part.lonlat[0].tolist() < lonlats[-1][-1].tolist():
            lonlats[-1] = np.vstack([lonlats[-1][:-1], part.lonlat[:1]])
        lonlats.append(part.lonlat[1:])
    return Drawn(
        line=first.line,
        lonlat=np.concatenate(lonlats),
        heights_m=_joined_heights(parts),
        is_drawn=_joined_flags(parts),
        state=_joined_states(parts),
        smoothed_off_m=sum(part.smoothed_off_m for part in parts),
        ellipsoid_steps_m=np.concatenate([part.ellipsoid_steps_m for part in parts]),
        ground_steps_m=np.concatenate([part.ground_steps_m for part in parts]),
        drawn_m=sum(part.drawn_m for part in parts),
    )


def _joined_flags(parts: Sequence[Drawn]) -> Flags | None:
    """Return which vertices were drawn; the common ones of two lines were."""
    if all(part.is_drawn is None for part in parts):
        return None
    flags = [
        np.ones(len(part.lonlat), dtype=bool) if part.is_drawn is None else part.is_drawn
        for part in parts
    ]
    return np.concatenate([flags[0], *(flag[1:] for flag in flags[1:])])


def _joined_states(parts: Sequence[Drawn]) -> NDArray[np.uint8] | None:
    """Return what is known of heights; a common vertex is known if one of its lines knows it."""
    if all(part.state is None for part in parts):
        return None
    states: list[NDArray[np.uint8]] = []
    for part in parts:
        own = part.state
        if own is None:
            unknown = np.isnan(part.heights_m) if part.heights_m is not None else True
            own = np.where(unknown, VOID, np.full(len(part.lonlat), KNOWN)).astype(np.uint8)
        if states:
            best = np.minimum(states[-1][-1:], own[:1])
            states[-1] = np.concatenate([states[-1][:-1], best])
            own = own[1:]
        states.append(own)
    return np.concatenate(states)


def _joined_heights(parts: Sequence[Drawn]) -> Floats | None:
    if all(part.heights_m is None for part in parts):
        return None
    columns = [
        part.heights_m if part.heights_m is not None else np.full(len(part.lonlat), np.nan)
        for part in parts
    ]
    heights = [columns[0]]
    for column in columns[1:]:
        both = np.fmin(heights[-1][-1:], column[:1])
        heights[-1] = np.concatenate([heights[-1][:-1], both])
        heights.append(column[1:])
    return np.concatenate(heights)


def along_m(line: Drawn, index: float) -> float:
    """Return how far along a line, on the ellipsoid, a fractional index lies."""
    count = len(line.ellipsoid_steps_m)
    whole = min(int(min(index, count)), count - 1)
    share = min(index, count) - whole
    return float(line.ellipsoid_steps_m[:whole].sum() + share * line.ellipsoid_steps_m[whole])
