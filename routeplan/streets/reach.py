"""Reach points along a way: mapped poles and manholes, junctions, and even spacing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from routeplan.geodesy import steps_m, unwrapped, wrapped
from routeplan.streets.costs import all_rows
from routeplan.streets.exposure import near_m_of
from routeplan.streets.model import Floats, Network, ReachPoint, Way

__all__ = ["Spacing", "reach_points", "stretches", "usual_spacing"]

_MAPPED_M = 15.0  # house rule: half a street's width and the error of a position
_NO_REACH = ("bridge", "water", "indoor", "existing")
_FITS = {  # what a mapped place can be to a placement
    "aerial": ("pole",),
    "duct": ("maintenance_hole", "handhole", "cabinet"),
    "buried": ("maintenance_hole", "handhole", "cabinet", "pedestal"),
    "surface": ("cabinet", "pedestal", "pole"),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Spacing:
    """What stands along one placement, how far apart at most, and how near at least."""

    reach_kind: str
    spacing_m: float
    least_m: float


def usual_spacing() -> dict[str, Spacing]:
    """Return the spacing of the table `street_costs` for every placement that has one."""
    return {
        row.name: Spacing(
            reach_kind=row.reach_kind, spacing_m=row.spacing_m or 0.0, least_m=row.least_m or 0.0
        )
        for row in all_rows("reach")
    }


def reach_points(
    network: Network, way: Way, *, spacing: dict[str, Spacing] | None = None
) -> tuple[ReachPoint, ...]:
    """
    Return places along a way where the cable can be got at, all of them assumptions.

    Mapped poles and manholes within 15 m come first, then junctions of streets not nearer to
    another place than the least spacing, then as few places as leave no gap longer than the
    spacing. None on bridges, in water, indoors, on existing fibre, or at the ends of the way.

    Parameters
    ----------
    network
        The network the way was found in.
    way
        The way.
    spacing
        By placement; None takes the usual one. [m]
    """
    rules = usual_spacing() if spacing is None else spacing
    chain = np.concatenate([[0.0], np.cumsum(steps_m(way.lonlat))])
    scale = chain[-1] / way.length_m if way.length_m else 1.0
    mapped = _mapped(network, way, chain)
    found: list[ReachPoint] = []
    for placement, begin_m, end_m in stretches(way):
        rule = rules.get(placement)
        if rule is None or placement in _NO_REACH:
            continue
        marks: dict[float, tuple[str, str]] = {}
        for along, kind in mapped:
            if begin_m < along < end_m and kind in _FITS.get(placement, ()):
                _put(marks, along, (kind, "mapped"), within=(begin_m, end_m), least_m=rule.least_m)
        for along in way.junctions_m:
            if begin_m < along < end_m:
                sort = (rule.reach_kind, "junction")
                _put(marks, along, sort, within=(begin_m, end_m), least_m=rule.least_m)
        for along in _between([begin_m, *sorted(marks), end_m], rule.spacing_m):
            marks[along] = (rule.reach_kind, "spacing")
        for along in sorted(marks):
            kind, basis = marks[along]
            lon, lat = _at(way.lonlat, chain, along * scale)
            found.append(
                ReachPoint(
                    kind=kind,
                    lon=lon,
                    lat=lat,
                    along_m=along,
                    basis=basis,  # type: ignore[arg-type]
                    placement=placement,
                )
            )
    return tuple(found)


def stretches(way: Way) -> list[tuple[str, float, float]]:
    """Return placement, begin and end of every stretch of a way. [m]"""
    found: list[tuple[str, float, float]] = []
    begin = 0.0
    for part in way.parts:
        end = begin + part.length_m
        if found and found[-1][0] == part.placement:
            found[-1] = (part.placement, found[-1][1], end)
        else:
            found.append((part.placement, begin, end))
        begin = end
    return found


def _put(
    marks: dict[float, tuple[str, str]],
    along: float,
    sort: tuple[str, str],
    *,
    within: tuple[float, float],
    least_m: float,
) -> None:
    if all(abs(along - other) >= least_m for other in (*marks, *within)):
        marks[along] = sort


def _between(marks: Sequence[float], spacing_m: float) -> list[float]:
    """Return the fewest marks that leave no gap longer than the spacing, evenly in each gap."""
    found: list[float] = []
    for begin, end in pairwise(marks):
        count = int(np.ceil((end - begin) / spacing_m - 1e-9))
        found.extend((begin + (end - begin) * at / count) for at in range(1, count))
    return found


def _mapped(network: Network, way: Way, chain: Floats) -> list[tuple[float, str]]:
    """Return how far along the way each mapped place near it lies, and what it is."""
    if not len(network.place_kind):
        return []
    low, high = way.lonlat.min(axis=0) - 0.001, way.lonlat.max(axis=0) + 0.001
    inside = ((network.place_lonlat >= low) & (network.place_lonlat <= high)).all(axis=1)
    rows = np.flatnonzero(inside)
    if not len(rows):
        return []
    rows = rows[near_m_of(network.place_lonlat[rows], way.lonlat, most_m=_MAPPED_M) <= _MAPPED_M]
    found = [
        (
            _along_m(way.lonlat, chain, network.place_lonlat[row]),
            network.place_words[int(network.place_kind[row])],
        )
        for row in rows
    ]
    return sorted(found)


def _along_m(lonlat: Floats, chain: Floats, point: Floats) -> float:
    from routeplan.geodesy import local_xy_m

    east, north = local_xy_m(lonlat, lon=float(point[0]), lat=float(point[1]))
    xy = np.column_stack([east, north])
    step = xy[1:] - xy[:-1]
    squared = (step * step).sum(axis=1)
    share = np.clip(-(xy[:-1] * step).sum(axis=1) / np.where(squared > 0, squared, 1.0), 0.0, 1.0)
    off = ((xy[:-1] + share[:, None] * step) ** 2).sum(axis=1)
    at = int(np.argmin(off))
    return float(chain[at] + share[at] * (chain[at + 1] - chain[at]))


def _at(lonlat: Floats, chain: Floats, along: float) -> tuple[float, float]:
    lon = float(np.interp(along, chain, unwrapped(lonlat[:, 0])))
    return float(wrapped(np.array([lon]))[0]), float(np.interp(along, chain, lonlat[:, 1]))
