"""Where every declared site goes: to an end of a line, or to its own place inside one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from routeplan.errors import Problem
from routeplan.geodesy import local_xy_m
from routeplan.ground.drawn import Drawn, along_m
from routeplan.ground.locate import Hit, LineIndex, near_lines, nearest_m
from routeplan.run.model import Floats, Place
from routeplan.run.practice import Joining

__all__ = ["take_sites"]


def take_sites(
    lines: LineIndex,
    drawn: Sequence[Drawn],
    sites: Sequence[Place],
    *,
    ends: Floats,
    cluster: Sequence[int],
    joining: Joining,
) -> tuple[list[tuple[Place, int | Hit]], list[Problem], list[tuple[str, str]]]:
    """
    Return where every site goes: a junction, or a place inside a line.

    The site nearest to a line's end takes it; another one near that end, too, goes to its own
    place inside a line.
    """
    taken: list[tuple[int, int | Hit]] = []
    problems: list[Problem] = []
    warnings: list[tuple[str, str]] = []
    points = np.array([[site.lon, site.lat] for site in sites]).reshape(-1, 2)
    radius = np.full(len(sites), joining.site_distance_max_m)
    near_ends = _nearest_ends(points, ends, radius_m=joining.site_distance_max_m)
    hits = near_lines(lines, points, radius_m=radius)
    owner: dict[int, Place] = {}
    assumed_sites = [bool(site.properties.get("kind_assumed")) for site in sites]
    for number in sorted(range(len(sites)), key=lambda at: (assumed_sites[at], near_ends[at][1])):
        site = sites[number]
        assumed = assumed_sites[number]
        end, distance_m = near_ends[number]
        inside = [hit for hit in hits[number] if _is_inside(hit, drawn[hit.line], joining)]
        if distance_m <= joining.site_distance_max_m and cluster[end] not in owner:
            owner[cluster[end]] = site
            taken.append((number, cluster[end]))
        elif assumed:
            warnings.append((str(site.source), _left_out(site, bool(hits[number]))))
        elif inside and all(_apart(inside[0], other, drawn, joining) for _, other in taken):
            taken.append((number, inside[0]))
        elif distance_m <= joining.site_distance_max_m:
            problems.append(_two_sites(owner[cluster[end]], site))
        elif inside:
            problems.append(_two_sites(_at(inside[0], taken, sites, drawn, joining), site))
        else:
            far_m = nearest_m(lines, points[number])
            problems.append(_far_site(site, far_m, joining.site_distance_max_m))
    taken.sort(key=lambda item: item[0])
    return [(sites[number], where) for number, where in taken], problems, warnings


def _is_inside(hit: Hit, line: Drawn, joining: Joining) -> bool:
    """Tell whether a place on a line lies farther from its ends than they are joined over."""
    reach = along_m(line, hit.index)
    return joining.join_tolerance_m < reach < along_m(line, np.inf) - joining.join_tolerance_m


def _apart(hit: Hit, other: int | Hit, drawn: Sequence[Drawn], joining: Joining) -> bool:
    """Tell whether two sites on one line leave a piece between them."""
    if not isinstance(other, Hit) or other.line != hit.line:
        return True
    line = drawn[hit.line]
    apart = abs(along_m(line, hit.index) - along_m(line, other.index))
    return apart > joining.join_tolerance_m


def _at(
    hit: Hit,
    taken: Sequence[tuple[int, int | Hit]],
    sites: Sequence[Place],
    drawn: Sequence[Drawn],
    joining: Joining,
) -> Place:
    return next(sites[n] for n, other in taken if not _apart(hit, other, drawn, joining))


def _nearest_ends(points: Floats, ends: Floats, *, radius_m: float) -> list[tuple[int, float]]:
    """Return for each point the nearest line end and its distance, infinite beyond the radius."""
    nearest: list[tuple[int, float]] = []
    for point in points:
        east, north = local_xy_m(ends, lon=point[0], lat=point[1])
        distance = np.hypot(east, north)
        at = int(np.argmin(distance))
        near = float(distance[at])
        nearest.append((at, near if near <= radius_m else np.inf))
    return nearest


def _two_sites(first: Place, second: Place) -> Problem:
    return Problem(
        where=str(second.source),
        what=f'sites "{first.name}" and "{second.name}" take the same place on a line',
        remedy="Draw each site's own line, or remove one of the sites",
    )


def _far_site(site: Place, far_m: float, limit_m: float) -> Problem:
    return Problem(
        where=str(site.source),
        what=f'site "{site.name}" is far from every line',
        value=f"{far_m:,.1f} m".replace(",", " "),
        limit=f"site_distance_max_m = {limit_m:g}",
        remedy="Move it, draw the line to it, or raise joining.site_distance_max_m",
    )


def _left_out(site: Place, is_near: bool) -> str:
    if is_near:
        return (
            f'"{site.name}" has no kind and stands beside the line, not at an end: left out. Give '
            'it kind = "site", or a reach kind such as "handhole"'
        )
    return f'"{site.name}" has no kind and is far from every line: left out'
