"""The height of a way along its length, and the ground length that follows."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.ground.terrain import Terrain, heights_at
from routeplan.ground.terrain_model import Sheet
from routeplan.ground.terrain_place import cell_positions, cell_step_m
from routeplan.ground.terrain_smooth import smoothed_heights_m
from routeplan.run.model import Floats

__all__ = [
    "ON_GROUND",
    "SMOOTH_WAVE_M",
    "SPANNED",
    "STRUNG",
    "TerrainProfile",
    "step_ways",
    "terrain_profile",
]

ON_GROUND, STRUNG, SPANNED = 0, 1, 2
"""
How a step of a line goes: over the ground (heights at every cell), strung straight between its
own two vertices (aerial), or part of a straight span over several vertices (bridge, water).
"""

SMOOTH_WAVE_M = 150.0
"""
House rule: waves of this length are halved. A way cut to the ground is graded over such lengths;
what goes up and down faster is ditch, bank, tree, roof or noise. With independent errors of 2 m
in every cell it leaves less than 0.1 % of false length whatever the raster's step.
"""

Flags = NDArray[np.bool_]
Ways = NDArray[np.uint8]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TerrainProfile:
    """
    A line with the stations that its terrain needs.

    `lonlat` (m, 2) [deg]; `index` (m,) is the fractional vertex index of every station in the
    line as given, whole at its own vertices; `heights_m` (m,) are smoothed and bridged over what
    is unknown between known heights, NaN at unknown ends; `found_heights_m` (m,) are those of
    the rasters, NaN where unknown; `state` (m,) is KNOWN, OUTSIDE or VOID; `ways` (m - 1,);
    `ellipsoid_steps_m` and `ground_steps_m` (m - 1,). `smoothed_off_m` is how much shorter the
    ground length is than it would be without smoothing.
    """

    lonlat: Floats
    index: Floats
    heights_m: Floats
    found_heights_m: Floats
    state: NDArray[np.uint8]
    ways: Ways
    ellipsoid_steps_m: Floats
    ground_steps_m: Floats
    smoothed_off_m: float

    @property
    def is_vertex(self) -> Flags:
        """Tell which stations are the line's own vertices, shape (m,)."""
        return np.asarray(self.index == np.floor(self.index))

    @property
    def ground_m(self) -> Floats:
        """Ground metres of every station from the line's start, shape (m,). [m]"""
        return np.concatenate([[0.0], np.cumsum(self.ground_steps_m)])

    @property
    def vertex_ground_steps_m(self) -> Floats:
        """Ground steps between the line's own vertices, shape (n - 1,). [m]"""
        return np.add.reduceat(self.ground_steps_m, np.flatnonzero(self.is_vertex)[:-1])


def step_ways(placement: str, step_count: int) -> Ways:
    """
    Return how the steps of a line with one placement go.

    Parameters
    ----------
    placement
        The placement.
    step_count
        How many steps the line has. [-]

    Examples
    --------
    >>> step_ways("aerial", 2).tolist(), step_ways("water", 1).tolist()
    ([1, 1], [2])
    """
    way = {"aerial": STRUNG, "bridge": SPANNED, "water": SPANNED}.get(placement, ON_GROUND)
    return np.full(step_count, way, dtype=np.uint8)


def terrain_profile(
    terrain: Terrain,
    lonlat: Floats,
    *,
    ellipsoid_steps_m: Floats,
    ways: Ways,
    smooth_wave_m: float = SMOOTH_WAVE_M,
    radius_m: float,
) -> TerrainProfile:
    """
    Return a line's heights and ground steps from a terrain.

    Stations are put on every step over the ground that is longer than the raster's own step, in
    equal parts no longer than it, so that the length along the slope is that of the raster and
    not of the drawing. A strung step goes straight between its vertices; a span goes straight
    from its first vertex to its last. Heights over ground and at strung vertices are smoothed
    together between spans and unknown ends. Unknown heights between known ones are taken
    straight between these; beyond the last known one a step keeps its ellipsoid length.
    The same to the last bit, mirrored, for the line drawn the other way.

    Parameters
    ----------
    terrain
        The terrain.
    lonlat
        WGS 84 vertices, shape (n, 2). [deg]
    ellipsoid_steps_m
        Length of every step on the ellipsoid, shape (n - 1,). [m]
    ways
        ON_GROUND, STRUNG or SPANNED for every step, shape (n - 1,).
    smooth_wave_m
        Length of the wave that smoothing halves; 0: no smoothing. [m]
    radius_m
        Mean radius of the ellipsoid. [m]

    References
    ----------
    .. [1] Ground steps: `routeplan.geodesy.ground_steps_m`; heights:
       `routeplan.ground.terrain.heights_at`; smoothing: `routeplan.ground.terrain_smooth`.
    """
    is_turned = geodesy.is_turned(lonlat)
    if is_turned:
        lonlat, ellipsoid_steps_m, ways = lonlat[::-1], ellipsoid_steps_m[::-1], ways[::-1]
    dense, index, steps, dense_ways = _stations(terrain, lonlat, ellipsoid_steps_m, ways)
    found = heights_at(terrain, dense)
    along = np.concatenate([[0.0], np.cumsum(steps)])
    rough = _spanned(along, found.heights_m, dense_ways, wave_m=0.0)
    smooth = _spanned(along, found.heights_m, dense_ways, wave_m=smooth_wave_m)
    ground = geodesy.ground_steps_m(steps, smooth, radius_m=radius_m)
    longer = geodesy.ground_steps_m(steps, rough, radius_m=radius_m)
    profile = TerrainProfile(
        lonlat=dense,
        index=index,
        heights_m=smooth,
        found_heights_m=found.heights_m,
        state=found.state,
        ways=dense_ways,
        ellipsoid_steps_m=steps,
        ground_steps_m=ground,
        smoothed_off_m=float(longer.sum() - ground.sum()),
    )
    return _reversed(profile) if is_turned else profile


def _reversed(profile: TerrainProfile) -> TerrainProfile:
    return TerrainProfile(
        lonlat=profile.lonlat[::-1],
        index=profile.index[-1] - profile.index[::-1],
        heights_m=profile.heights_m[::-1],
        found_heights_m=profile.found_heights_m[::-1],
        state=profile.state[::-1],
        ways=profile.ways[::-1],
        ellipsoid_steps_m=profile.ellipsoid_steps_m[::-1],
        ground_steps_m=profile.ground_steps_m[::-1],
        smoothed_off_m=profile.smoothed_off_m,
    )


def _stations(
    terrain: Terrain, lonlat: Floats, steps_m: Floats, ways: Ways
) -> tuple[Floats, Floats, Floats, Ways]:
    """Return a line with the stations its rasters need: points, indices, steps and ways."""
    step_m = _raster_step_m(terrain, lonlat)
    # A step that is not over the ground is told to be short, so that it is not divided.
    lengths = np.where(ways == ON_GROUND, steps_m, 0.0)
    dense, index = geodesy.densified(lonlat, step_m=step_m, lengths_m=lengths)
    own = np.minimum(np.floor(index[:-1]).astype(np.int64), len(steps_m) - 1)
    dense = np.column_stack([geodesy.wrapped(dense[:, 0]), dense[:, 1]])
    return dense, index, steps_m[own] * np.diff(index), ways[own]


def _raster_step_m(terrain: Terrain, lonlat: Floats) -> float:
    """Return the finest step of the sheets whose box the line's box meets."""
    middle = lonlat[len(lonlat) // 2]
    steps = [
        cell_step_m(sheet, float(middle[0]), float(middle[1]))
        for sheet in terrain.sheets
        if _meets(sheet, lonlat)
    ]
    return min((step for step in steps if np.isfinite(step)), default=np.inf)


def _meets(sheet: Sheet, lonlat: Floats) -> bool:
    col, row = cell_positions(sheet, lonlat)
    if not (np.isfinite(col).any() and np.isfinite(row).any()):
        return False
    return bool(
        np.nanmin(col) < sheet.cols
        and np.nanmax(col) > -1.0
        and np.nanmin(row) < sheet.rows
        and np.nanmax(row) > -1.0
    )


def _spanned(along_m: Floats, found_m: Floats, ways: Ways, *, wave_m: float) -> Floats:
    """Return heights smoothed between spans, spans straight, gaps bridged."""
    heights = found_m.copy()
    in_span = ways == SPANNED
    inner = np.zeros(len(heights), dtype=bool)
    inner[1:-1] = in_span[:-1] & in_span[1:]
    heights[inner] = np.nan
    known = np.flatnonzero(~np.isnan(heights))
    if not len(known):
        return heights
    first, last = int(known[0]), int(known[-1]) + 1
    heights[first:last] = np.interp(along_m[first:last], along_m[known], heights[known])
    if wave_m > 0.0:
        for begin, end in _between_spans(in_span, first, last):
            part = slice(begin, end)
            heights[part] = smoothed_heights_m(along_m[part], heights[part], wave_m=wave_m)
        ends = np.flatnonzero(~inner[first:last]) + first
        heights[first:last] = np.interp(along_m[first:last], along_m[ends], heights[ends])
    return heights


def _between_spans(in_span: Flags, first: int, last: int) -> Iterator[tuple[int, int]]:
    """Yield the stations between spans as slices, at least two each."""
    begin = first
    for step in range(first, last):
        if step == last - 1 or in_span[step]:
            if step > begin:
                yield begin, step + 1
            begin = step + 1
