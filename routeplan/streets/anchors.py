"""Where sites meet the streets: the nearest place on an open street, and the walk to it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from routeplan.errors import GeometryError, InfeasibleError, Problem
from routeplan.geodesy import local_xy_m, steps_m, wrapped
from routeplan.streets.model import Flags, Network

__all__ = ["OFF_STREET_MAX_M", "Anchor", "anchored"]

OFF_STREET_MAX_M = 500.0  # house rule: a site farther off than this has no street of its own
_FIRST_LOOK_M = 100.0
_AT_NODE_M = 0.01


@dataclass(frozen=True, slots=True, kw_only=True)
class Anchor:
    """
    A site and the place on the streets it is reached from.

    `node` is the junction, or -1 where the place lies `along_m` of the way along `edge`.
    """

    name: str
    lon: float
    lat: float
    foot_lon: float
    foot_lat: float
    walk_m: float
    node: int
    edge: int
    along_m: float


def anchored(
    network: Network,
    sites: Sequence[tuple[str, float, float]],
    *,
    usable: Flags,
    off_street_max_m: float = OFF_STREET_MAX_M,
) -> tuple[Anchor, ...]:
    """
    Return for each site the nearest place on the streets.

    Parameters
    ----------
    network
        The network.
    sites
        Name, longitude and latitude of each. [deg]
    usable
        Which edges may be used, shape (m,).
    off_street_max_m
        Longest walk from a site to its street. [m]

    Raises
    ------
    GeometryError
        With every site that is not a place on the earth.
    InfeasibleError
        With every site that has no street near it.
    """
    _check_sites(sites)
    found, problems = [], []
    for site in sites:
        anchor = _nearest(network, site, usable=usable, most_m=off_street_max_m)
        if anchor is None:
            problems.append(_far(network, site, off_street_max_m))
        else:
            found.append(anchor)
    if problems:
        raise InfeasibleError(problems)
    return tuple(found)


def _check_sites(sites: Sequence[tuple[str, float, float]]) -> None:
    problems = [
        Problem(
            where=name,
            what="is not a longitude and latitude",
            value=f"{lon:.9g}, {lat:.9g}",
            limit="-180 to 180, -90 to 90",
            remedy="Give longitude first, in degrees.",
        )
        for name, lon, lat in sites
        if not (abs(lon) <= 180.0 and abs(lat) <= 90.0)
    ]
    if problems:
        raise GeometryError(problems)


def _nearest(
    network: Network,
    site: tuple[str, float, float],
    *,
    usable: Flags,
    most_m: float,
) -> Anchor | None:
    """Return the nearest place, looking farther and farther."""
    reach_m = min(_FIRST_LOOK_M, most_m)
    while True:
        best = _within(network, site, usable=usable, reach_m=reach_m)
        if best is not None or reach_m >= most_m:
            return best
        reach_m = min(4.0 * reach_m, most_m)


def _within(
    network: Network,
    site: tuple[str, float, float],
    *,
    usable: Flags,
    reach_m: float,
) -> Anchor | None:
    _, lon, lat = site
    north = reach_m / 110_000.0
    east = north / max(np.cos(np.radians(min(abs(lat) + north, 89.9))), 1e-3)
    vertices = network.shape_lonlat
    # A step is near unless both its ends lie beyond the same side of the box.
    above, below = vertices[:, 1] > lat + north, vertices[:, 1] < lat - north
    step = np.flatnonzero(~((above[1:] & above[:-1]) | (below[1:] & below[:-1])))
    away = vertices[np.stack([step, step + 1]), 0] - lon
    away -= 360.0 * np.round(away[:1] / 360.0)
    step = step[(away.min(axis=0) <= east) & (away.max(axis=0) >= -east)]
    owner = np.searchsorted(network.shape_first, step, side="right") - 1
    inside = (step + 1 < network.shape_first[owner + 1]) & usable[owner]
    step, owner = step[inside], owner[inside]
    if not len(step):
        return None
    begin = np.column_stack(local_xy_m(vertices[step], lon=lon, lat=lat))
    along = np.column_stack(local_xy_m(vertices[step + 1], lon=lon, lat=lat)) - begin
    squared = (along * along).sum(axis=1)
    share = -(begin * along).sum(axis=1) / np.where(squared > 0, squared, 1.0)
    share = np.clip(share, 0.0, 1.0)
    off = np.hypot(*(begin + share[:, None] * along).T)
    at = int(np.argmin(off))
    if off[at] > reach_m:
        return None
    return _anchor(network, site, int(owner[at]), int(step[at]), float(share[at]))


def _anchor(
    network: Network, site: tuple[str, float, float], edge: int, step: int, share: float
) -> Anchor:
    name, lon, lat = site
    first = int(network.shape_first[edge])
    own = network.shape_lonlat[first : int(network.shape_first[edge + 1])]
    lengths = steps_m(own)
    along_m = float(lengths[: step - first].sum() + share * lengths[step - first])
    node = -1
    if along_m < _AT_NODE_M:
        node, foot = int(network.edge_start[edge]), own[0]
    elif along_m > float(lengths.sum()) - _AT_NODE_M:
        node, foot = int(network.edge_end[edge]), own[-1]
    else:
        begin, end = network.shape_lonlat[step], network.shape_lonlat[step + 1]
        foot = begin + share * (end - begin)
    walk_m = float(steps_m(np.array([[lon, lat], foot]))[0])
    return Anchor(
        name=name,
        lon=lon,
        lat=lat,
        foot_lon=float(wrapped(foot[:1])[0]),
        foot_lat=float(foot[1]),
        walk_m=walk_m,
        node=node,
        edge=edge,
        along_m=along_m,
    )


def _far(network: Network, site: tuple[str, float, float], most_m: float) -> Problem:
    name, lon, lat = site
    east, north = local_xy_m(network.shape_lonlat, lon=lon, lat=lat)
    far_m = float(np.hypot(east, north).min()) if len(east) else np.inf
    remedy = "Move the site, take a larger extract, or allow a longer walk off the streets."
    if abs(lon) <= 90.0 and len(east):
        swapped = np.hypot(*local_xy_m(network.shape_lonlat, lon=lat, lat=lon)).min()
        if swapped < min(far_m, 10.0 * most_m):
            remedy = "Longitude comes first: it looks as if the two were swapped."
    return Problem(
        where=name,
        what="has no open street near it",
        value=f"the nearest is about {far_m / 1000.0:.1f} km off",
        limit=f"{most_m:g} m",
        remedy=remedy,
    )
