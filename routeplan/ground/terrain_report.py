"""What a planner has to know of a line's heights: unknown, steep and noisy stretches."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from routeplan.ground.model import Steep
from routeplan.ground.terrain import KNOWN, OUTSIDE
from routeplan.ground.terrain_profile import ON_GROUND, SPANNED, TerrainProfile

__all__ = ["Steep", "Unknown", "profile_warnings", "steep_stretches", "unknown_stretches"]

_NOISY_RATIO = 0.002  # house rule: length that smoothing takes off before it is said
_STEEP_RATIO = 0.01  # house rule: length that slope adds before it is said


@dataclass(frozen=True, slots=True, kw_only=True)
class Unknown:
    """A stretch of a line whose height is unknown, between the known stations around it."""

    start_m: float
    end_m: float
    why: Literal["outside", "void"]
    is_bridged: bool


def unknown_stretches(profile: TerrainProfile) -> tuple[Unknown, ...]:
    """
    Return the stretches of a line whose height no raster knows, in order.

    Stations inside a span are left out: their height is not asked for.

    Parameters
    ----------
    profile
        The line's profile.
    """
    in_span = profile.ways == SPANNED
    inner = np.concatenate([[False], in_span[:-1] & in_span[1:], [False]])
    state = np.where(inner, KNOWN, profile.state)
    ground = profile.ground_m
    bounds = np.flatnonzero(np.diff(state)) + 1
    found = []
    for begin, end in zip([0, *bounds], [*bounds, len(state)], strict=True):
        if state[begin] == KNOWN:
            continue
        before, after = max(begin - 1, 0), min(end, len(state) - 1)
        found.append(
            Unknown(
                start_m=float(ground[before]),
                end_m=float(ground[after]),
                why="outside" if state[begin] == OUTSIDE else "void",
                is_bridged=not np.isnan(profile.heights_m[begin:end]).any(),
            )
        )
    return tuple(found)


def steep_stretches(
    profile: TerrainProfile, slope_limit_ratio: float, *, length_min_m: float = 0.0
) -> tuple[Steep, ...]:
    """
    Return the stretches that rise or fall more steeply than a limit, in order.

    Slope is rise over level distance, of the smoothed heights. Neighbouring steps over the limit
    are one stretch while they go the same way, up or down; spans and strung steps take no part.

    Parameters
    ----------
    profile
        The line's profile.
    slope_limit_ratio
        Steepest slope that is not listed. [-]
    length_min_m
        Shorter stretches are left out. [m]
    """
    level = profile.ellipsoid_steps_m
    rise = np.diff(profile.heights_m)
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = np.where(level > 0.0, rise / level, 0.0)
    side = np.where(np.abs(slope) > slope_limit_ratio, np.sign(slope), 0.0)
    side[np.isnan(slope) | (profile.ways != ON_GROUND)] = 0.0
    ground = profile.ground_m
    bounds = np.flatnonzero(np.diff(side)) + 1
    found = [
        Steep(
            start_m=float(ground[begin]),
            end_m=float(ground[end]),
            rise_m=float(rise[begin:end].sum()),
            slope_max_ratio=float(np.abs(slope[begin:end]).max()),
        )
        for begin, end in zip([0, *bounds], [*bounds, len(side)], strict=True)
        if side[begin]
    ]
    return tuple(steep for steep in found if steep.end_m - steep.start_m >= length_min_m)


def profile_warnings(profile: TerrainProfile, where: str) -> tuple[tuple[str, str], ...]:
    """
    Return what a planner has to know of a line's heights, as (where, message).

    Parameters
    ----------
    profile
        The line's profile.
    where
        What the line is called.
    """
    said = [*_unknown_said(unknown_stretches(profile))]
    flat = float(profile.ellipsoid_steps_m.sum())
    ground = float(profile.ground_steps_m.sum())
    off = profile.smoothed_off_m
    if flat and off > _NOISY_RATIO * flat:
        said.append(
            f"its terrain is noisy: smoothing took {off:.1f} m ({100 * off / flat:.2f} %) off the "
            "ground length. Trees, roofs or errors of the heights lengthen a way falsely; check "
            "it against a measured length"
        )
    if flat and ground / flat - 1.0 > _STEEP_RATIO:
        share = 100 * (ground / flat - 1.0)
        said.append(f"slope adds {share:.2f} % to its length even after smoothing of the terrain")
    return tuple((where, message) for message in said)


def _unknown_said(stretches: Sequence[Unknown]) -> Iterator[str]:
    for why, what in (("outside", "lies outside the terrain"), ("void", "has no height")):
        own = [stretch for stretch in stretches if stretch.why == why]
        if not own:
            continue
        shown = ", ".join(f"{part.start_m:.0f} to {part.end_m:.0f} m" for part in own[:5])
        more = f" and {len(own) - 5} more" if len(own) > 5 else ""
        bridged = all(part.is_bridged for part in own)
        then = "taken straight between the known heights" if bridged else "taken as level"
        yield f"{what} from {shown}{more}; there it is {then}"
