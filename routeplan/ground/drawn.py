"""One drawn line with its steps measured: thinned, cut, reversed and put end to end."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.run.model import Floats, Line

__all__ = ["Drawn", "cut_drawn", "draw_line", "joined_drawn", "reversed_drawn", "shape_of"]

_SHAPE_STEP_M = 500.0  # interpolating longitude and latitude over more would leave the geodesic


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Drawn:
    """
    A measured polyline.

    `lonlat` (n, 2) with unwrapped longitude, `heights_m` (n,) or None; `ellipsoid_steps_m` and
    `ground_steps_m` (n - 1,); `drawn_m` is the ellipsoid length before thinning.
    """

    line: Line
    lonlat: Floats
    heights_m: Floats | None
    ellipsoid_steps_m: Floats
    ground_steps_m: Floats
    drawn_m: float


def draw_line(line: Line, *, track_tolerance_m: float) -> Drawn:
    """
    Measure a line; a track with times is thinned first.

    The heights of a track give its profile but not its length, because their noise would
    lengthen it falsely.

    Parameters
    ----------
    line
        The line as read.
    track_tolerance_m
        Farthest a left-out vertex of a track may lie from the thinned line. [m]

    References
    ----------
    .. [1] Ellipsoid and ground steps: `routeplan.geodesy`. Thinning: D. H. Douglas and
       T. K. Peucker, Cartographica 10 (1973) 112-122.
    """
    ellipsoid = _ellipsoid_steps_m(line, line.datum_lonlat)
    drawn_m = float(ellipsoid.sum())
    lonlat, heights = line.lonlat, line.heights_m
    if line.is_track and track_tolerance_m > 0:
        keep = _thinned(lonlat, track_tolerance_m)
        lonlat = lonlat[keep]
        heights = None if heights is None else heights[keep]
        ellipsoid = _ellipsoid_steps_m(line, line.datum_lonlat[keep])
    radius = geodesy.mean_radius_m(line.semi_major_m, line.inverse_flattening)
    ground = geodesy.ground_steps_m(ellipsoid, None if line.is_track else heights, radius_m=radius)
    unwrapped = np.column_stack([geodesy.unwrapped(lonlat[:, 0]), lonlat[:, 1]])
    return Drawn(
        line=line,
        lonlat=unwrapped,
        heights_m=heights,
        ellipsoid_steps_m=ellipsoid,
        ground_steps_m=ground,
        drawn_m=drawn_m,
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
    kept = shapely.get_coordinates(line.simplify(tolerance_m), include_z=True)
    return np.asarray(kept[:, 2].astype(np.int64))


def shape_of(drawn: Drawn) -> tuple[Floats, Floats]:
    """Return the line with long steps densified, and the fractional index of every point."""
    return geodesy.densified(drawn.lonlat, step_m=_SHAPE_STEP_M, lengths_m=drawn.ellipsoid_steps_m)


def reversed_drawn(drawn: Drawn) -> Drawn:
    """Return the line from its other end."""
    return replace(
        drawn,
        lonlat=drawn.lonlat[::-1],
        heights_m=None if drawn.heights_m is None else drawn.heights_m[::-1],
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
    parts = []
    begin = 0.0
    total = float(drawn.ellipsoid_steps_m.sum())
    for end in [*at, float(len(drawn.lonlat) - 1)]:
        part = _part(drawn, begin, end)
        share = float(part.ellipsoid_steps_m.sum()) / total if total else 0.0
        parts.append(replace(part, drawn_m=drawn.drawn_m * share))
        begin = end
    return parts


def _part(drawn: Drawn, begin: float, end: float) -> Drawn:
    inner = np.arange(np.floor(begin) + 1, np.ceil(end))
    index = np.concatenate([[begin], inner, [end]])
    shape, shape_index = shape_of(drawn)
    whole = np.arange(len(drawn.lonlat), dtype=np.float64)
    lonlat = np.column_stack([np.interp(index, shape_index, shape[:, axis]) for axis in (0, 1)])
    lonlat[1:-1] = drawn.lonlat[inner.astype(np.int64)]
    heights = drawn.heights_m
    return replace(
        drawn,
        lonlat=lonlat,
        heights_m=None if heights is None else np.interp(index, whole, heights),
        ellipsoid_steps_m=_shared_steps(drawn.ellipsoid_steps_m, index),
        ground_steps_m=_shared_steps(drawn.ground_steps_m, index),
    )


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
        turn = 360.0 * np.round((lonlats[-1][-1, 0] - part.lonlat[0, 0]) / 360.0)
        lonlats.append(part.lonlat[1:] + np.array([turn, 0.0]))
    return Drawn(
        line=first.line,
        lonlat=np.concatenate(lonlats),
        heights_m=_joined_heights(parts),
        ellipsoid_steps_m=np.concatenate([part.ellipsoid_steps_m for part in parts]),
        ground_steps_m=np.concatenate([part.ground_steps_m for part in parts]),
        drawn_m=sum(part.drawn_m for part in parts),
    )


def _joined_heights(parts: Sequence[Drawn]) -> Floats | None:
    if all(part.heights_m is None for part in parts):
        return None
    columns = [
        part.heights_m if part.heights_m is not None else np.full(len(part.lonlat), np.nan)
        for part in parts
    ]
    heights = [columns[0]]
    for column in columns[1:]:
        if np.isnan(heights[-1][-1]):
            heights[-1] = np.append(heights[-1][:-1], column[0])
        heights.append(column[1:])
    return np.concatenate(heights)
