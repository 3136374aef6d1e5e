"""Putting vertices where lines meet without one, and joining existing routes to the streets."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import replace

import numpy as np

from routeplan.streets.assemble import Lines, joined_lines, lines_from
from routeplan.streets.inside import plan_frame
from routeplan.streets.model import Floats

__all__ = ["linked_lines", "noded_lines"]

LINK_CLASS = "link"
_AT_VERTEX_M = 0.05  # a crossing nearer than this to a vertex is that vertex
_TOUCH_M = 0.5  # house rule: a line that ends nearer than this to another was drawn to meet it

Cuts = dict[int, list[tuple[int, float, tuple[float, float]]]]


def noded_lines(lines: Lines) -> Lines:
    """
    Return lines with a common vertex wherever two of them cross, or one ends on another.

    Bridges and tunnels pass over and under: they meet others at their vertices only.

    Parameters
    ----------
    lines
        The lines.
    """
    import shapely

    level = ~(lines.is_bridge | lines.is_tunnel)
    steps, owner, at = _steps(lines, level)
    if not len(steps):
        return lines
    flat = np.array(plan_frame(lines.lonlat))
    drawn = shapely.linestrings(steps * flat)
    tree = shapely.STRtree(drawn)
    cuts: Cuts = defaultdict(list)
    one, other = tree.query(drawn, predicate="intersects")
    apart = (one < other) & ~((owner[one] == owner[other]) & (np.abs(at[one] - at[other]) <= 1))
    one, other = one[apart], other[apart]
    met = shapely.intersection(drawn[one], drawn[other])
    for first, second, shape in zip(one.tolist(), other.tolist(), met, strict=True):
        for point in shapely.get_coordinates(shape) / flat:
            for step in (first, second):
                _cut(cuts, steps, flat, (step, int(owner[step]), int(at[step])), point)
    _cut_at_ends(lines, cuts, (steps, owner, at), tree=tree, flat=flat)
    return _with_vertices(lines, cuts)


def linked_lines(streets: Lines, routes: Lines, *, link_m: float) -> Lines:
    """
    Return streets and existing routes as one, joined by short pieces.

    Every vertex of a route within `link_m` of a street is joined to the nearest place on it: that
    is where cable can change over.

    Parameters
    ----------
    streets, routes
        The lines.
    link_m
        Longest joining piece. [m]
    """
    import shapely

    level = ~(streets.is_bridge | streets.is_tunnel)
    steps, owner, at = _steps(streets, level)
    vertices = np.unique(routes.lonlat, axis=0)
    if not len(steps) or not len(vertices):
        return joined_lines([streets, routes])
    flat = np.array(plan_frame(streets.lonlat))
    drawn = shapely.linestrings(steps * flat)
    points = shapely.points(vertices * flat)
    (number, step), far = shapely.STRtree(drawn).query_nearest(
        points, max_distance=link_m, return_distance=True, all_matches=False
    )
    foot = shapely.line_interpolate_point(
        drawn[step], shapely.line_locate_point(drawn[step], points[number])
    )
    feet = shapely.get_coordinates(foot) / flat
    cuts: Cuts = defaultdict(list)
    pieces = []
    for vertex, on, away, place in zip(number.tolist(), step.tolist(), far, feet, strict=True):
        exact = _cut(cuts, steps, flat, (on, int(owner[on]), int(at[on])), place)
        if away > 0:
            pieces.append(np.array([vertices[vertex], exact]))
    links = lines_from(pieces, road_class=[LINK_CLASS] * len(pieces))
    return joined_lines([_with_vertices(streets, cuts), routes, links])


def _steps(lines: Lines, wanted: np.ndarray) -> tuple[Floats, np.ndarray, np.ndarray]:
    """Return all steps, shape (n, 2, 2), with their line and the index of their first vertex."""
    sizes = np.diff(lines.first)
    line = np.repeat(np.arange(len(sizes)), sizes)
    if len(line) < 2:
        return np.empty((0, 2, 2)), line[:0], line[:0]
    inside = (line[1:] == line[:-1]) & wanted[line[:-1]]
    inside &= (lines.lonlat[1:] != lines.lonlat[:-1]).any(axis=1)
    at = np.flatnonzero(inside)
    return np.stack([lines.lonlat[at], lines.lonlat[at + 1]], axis=1), line[at], at


def _cut(
    cuts: Cuts, steps: Floats, flat: Floats, where: tuple[int, int, int], point: Floats
) -> Floats:
    """Note a vertex on a step, unless there is one; return the vertex."""
    step, line, at = where
    begin, end = steps[step]
    along = (end - begin) * flat
    squared = float(along @ along)
    share = float(((point - begin) * flat) @ along / squared)
    length = squared**0.5
    if share * length < _AT_VERTEX_M:
        return np.asarray(begin)
    if (1.0 - share) * length < _AT_VERTEX_M:
        return np.asarray(end)
    rounded = np.round(point, 7)
    cuts[line].append((at, share, (float(rounded[0]), float(rounded[1]))))
    return rounded


def _cut_at_ends(
    lines: Lines,
    cuts: Cuts,
    table: tuple[Floats, np.ndarray, np.ndarray],
    *,
    tree: object,
    flat: Floats,
) -> None:
    """Put the ends of lines on the lines they were drawn to meet: there the end is the vertex."""
    import shapely

    steps, owner, at = table
    filled = np.flatnonzero(np.diff(lines.first) > 0)
    line = np.concatenate([filled, filled])
    ends = lines.lonlat[np.concatenate([lines.first[:-1][filled], lines.first[1:][filled] - 1])]
    number, step = tree.query(  # type: ignore[attr-defined]
        shapely.points(ends * flat), predicate="dwithin", distance=_TOUCH_M
    )
    for end, on in zip(number.tolist(), step.tolist(), strict=True):
        if owner[on] == line[end]:
            continue
        begin, along = steps[on][0], (steps[on][1] - steps[on][0]) * flat
        share = float(((ends[end] - begin) * flat) @ along / (along @ along))
        length = float(np.hypot(*along))
        if _AT_VERTEX_M < share * length < length - _AT_VERTEX_M:
            cuts[int(owner[on])].append((int(at[on]), share, tuple(ends[end].tolist())))


def _with_vertices(lines: Lines, cuts: Cuts) -> Lines:
    if not cuts:
        return lines
    rows = sorted((at, share, place) for own in cuts.values() for at, share, place in own)
    where = np.array([at for at, _, _ in rows]) + 1
    lonlat = np.insert(lines.lonlat, where, np.array([place for _, _, place in rows]), axis=0)
    first = lines.first + np.searchsorted(where, lines.first, side="left")
    return replace(lines, lonlat=lonlat, first=first)
