"""Where a run's heights are from: its terrain, each leg's profile, and what is said of both."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Literal

import numpy as np

from routeplan.errors import GeometryError
from routeplan.ground.drawn import Drawn
from routeplan.ground.model import Ground, Leg
from routeplan.ground.terrain import KNOWN, Terrain, far_from_run, open_terrain
from routeplan.ground.terrain_profile import TerrainProfile, step_ways
from routeplan.ground.terrain_report import profile_warnings
from routeplan.run.defaults import AssumedValue
from routeplan.run.model import Run

__all__ = ["assumed_heights", "height_warnings", "heights_from", "leg_profile", "run_terrain"]

_STEEP_RATIO = 0.01  # house rule: more than this from slope alone looks like noise in the heights


def run_terrain(run: Run) -> Terrain | None:
    """
    Return the terrain that a run names, or None.

    Parameters
    ----------
    run
        The run.

    Raises
    ------
    GeometryError
        If a raster cannot be read, or none lies under the run.
    CrsError
        If nothing is wrong but a raster's CRS.
    """
    if not run.terrain:
        return None
    terrain = open_terrain([Path(source.path) for source in run.terrain], crs=run.crs)
    far = far_from_run(terrain, np.concatenate([line.lonlat for line in run.lines]))
    if far is not None:
        raise GeometryError(far)
    return terrain


def leg_profile(whole: Drawn, parts: Sequence[tuple[str, int]]) -> TerrainProfile | None:
    """
    Return the profile of a leg, whatever its heights are from; None if it has none.

    Parameters
    ----------
    whole
        The leg as one line.
    parts
        Placement and count of steps of its lines, in order.
    """
    if whole.heights_m is None and whole.state is None:
        return None
    count = len(whole.lonlat)
    heights = np.full(count, np.nan) if whole.heights_m is None else whole.heights_m
    state = np.full(count, KNOWN, dtype=np.uint8) if whole.state is None else whole.state
    ways = np.concatenate([step_ways(placement, count) for placement, count in parts])
    return TerrainProfile(
        lonlat=whole.lonlat,
        index=np.arange(count, dtype=np.float64),
        heights_m=heights,
        found_heights_m=heights,
        state=state,
        ways=ways,
        ellipsoid_steps_m=whole.ellipsoid_steps_m,
        ground_steps_m=whole.ground_steps_m,
        smoothed_off_m=whole.smoothed_off_m,
    )


def heights_from(parts: Sequence[Drawn]) -> tuple[Literal["geometry", "terrain"], ...]:
    """Return where the heights of a leg's lines are from, each once."""
    found: dict[Literal["geometry", "terrain"], None] = {}
    for part in parts:
        if part.heights_m is not None and not np.isnan(part.heights_m).all():
            is_terrain = part.state is not None and bool((part.state == KNOWN).any())
            found["terrain" if is_terrain else "geometry"] = None
    return tuple(sorted(found))


def height_warnings(
    leg: Leg, profile: TerrainProfile | None, *, has_terrain: bool
) -> Iterator[tuple[str, str]]:
    """
    Yield what a planner has to know of a leg's heights.

    Parameters
    ----------
    leg
        The leg.
    profile
        Its profile, if it has one.
    has_terrain
        Whether any of them was looked for in a terrain.
    """
    where = f'leg "{leg.name}"'
    if profile is None:
        return
    if has_terrain:
        yield from profile_warnings(profile, where)
        return
    flat, ground = float(profile.ellipsoid_steps_m.sum()), float(profile.ground_steps_m.sum())
    if flat and ground / flat - 1.0 > _STEEP_RATIO:
        yield (
            where,
            f"slope adds {100 * (ground / flat - 1):.2f} % to its length; noisy heights "
            "lengthen a line falsely, so check them",
        )


def assumed_heights(run: Run, ground: Ground) -> Iterator[AssumedValue]:
    """
    Yield where the heights of legs are from, as far as that is not plain.

    Parameters
    ----------
    run
        The run.
    ground
        Its ground.
    """
    files = ", ".join(source.file for source in run.terrain)
    wave_m = run.practice.ground.smooth_wave_m
    for leg in ground.legs:
        if not leg.heights_from:
            source, reason = (
                (files, "neither the geometry nor the terrain has heights there")
                if files
                else ("geometry", "the geometry has no heights")
            )
            reason += ": measured on the ellipsoid, without slope"
        elif leg.heights_from == ("terrain",):
            source = files
            off_m = round(leg.smoothed_off_m, 1) + 0.0  # never "-0.0"
            reason = f"smoothed over {wave_m:g} m, which took {off_m:.1f} m off its length"
        elif files:
            source = "geometry" if len(leg.heights_from) == 1 else f"geometry; {files}"
            reason = "lines that have heights of their own keep them, before the terrain's"
        else:
            continue
        yield AssumedValue(
            name=f"heights of leg {leg.name}",
            value=" and ".join(leg.heights_from) or "none",
            unit="m",
            source=source,
            reason=reason,
        )
