"""From the arcs of a search to a way on the ground: its line, parts, crossings and lengths."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np

from routeplan.geodesy import steps_m, wrapped
from routeplan.streets.anchors import Anchor
from routeplan.streets.costs import class_of
from routeplan.streets.edges import edge_part
from routeplan.streets.graph import Graph, piece_of
from routeplan.streets.model import CROSSING_KINDS, Floats, Part, Way, WayCrossing

__all__ = ["WALK_CLASS", "placement_of", "tails_of", "way_of"]

WALK_CLASS = "off street"
_NO_WALK_M = 0.05
_ONE_PLACE_M = 15.0  # house rule: crossings of one kind nearer than this are one


def way_of(graph: Graph, legs: Sequence[Sequence[int]], sites: Sequence[int | None]) -> Way:
    """
    Return the way along some arcs.

    Parameters
    ----------
    graph
        The graph.
    legs
        The arcs from each site to the next, in order.
    sites
        The site (number of its anchor) before, between and after the legs; None where there is
        none, as at a branch point.
    """
    parts: list[Part] = []
    marks: list[int] = []
    for number, site in enumerate(sites):
        walk = _walk(graph, site)
        is_first, is_last = number == 0, number == len(sites) - 1
        if walk is not None and not is_first:
            parts.append(walk)
        marks.append(len(parts))
        if walk is not None and not is_last:
            parts.append(_turned(walk))
        if not is_last:
            parts.extend(_street_parts(graph, legs[number]))
    ends_m = np.concatenate([[0.0], np.cumsum([part.length_m for part in parts])])
    lonlat = _line(parts, graph, sites)
    return Way(
        parts=tuple(parts),
        lonlat=lonlat,
        length_m=float(ends_m[-1]),
        off_street_m=sum(part.length_m for part in parts if part.edge < 0),
        cost=sum(part.cost for part in parts),
        crossings=_crossings(graph, parts, ends_m),
        via_m=tuple(float(ends_m[mark]) for mark in marks),
        junctions_m=_junctions(graph, parts, ends_m),
    )


def tails_of(graph: Graph, arcs: Sequence[int]) -> list[int]:
    """Return the node each arc leaves."""
    if not len(arcs):
        return []
    found = np.searchsorted(graph.row_first, np.asarray(arcs), side="right") - 1
    return [int(node) for node in found]


def placement_of(graph: Graph, edge: int) -> str:
    """Return how cable lies along an edge: on a bridge as a bridge, else as the prices say."""
    network = graph.network
    own = network.placement_words[int(network.placement[edge])]
    if own:
        return own
    if network.is_bridge[edge]:
        return "bridge"
    costs = graph.prices.costs
    if costs.usual_placement:
        return costs.usual_placement
    word = network.class_words[int(network.road_class[edge])]
    return costs.road_placement[class_of(word, costs.road)]


def _walk(graph: Graph, site: int | None) -> Part | None:
    """Return the walk from the street to a site, or None if the site is on it."""
    if site is None or graph.anchors[site].walk_m < _NO_WALK_M:
        return None
    anchor: Anchor = graph.anchors[site]
    costs = graph.prices.costs
    lonlat = np.array([[anchor.foot_lon, anchor.foot_lat], [anchor.lon, anchor.lat]])
    return Part(
        edge=-1,
        from_m=0.0,
        to_m=anchor.walk_m,
        name="",
        road_class=WALK_CLASS,
        placement=placement_of(graph, anchor.edge),
        is_bridge=False,
        is_tunnel=False,
        lonlat=lonlat,
        length_m=anchor.walk_m,
        cost=anchor.walk_m * costs.off_street_per_m,
    )


def _turned(part: Part) -> Part:
    return Part(
        edge=part.edge,
        from_m=part.to_m,
        to_m=part.from_m,
        name=part.name,
        road_class=part.road_class,
        placement=part.placement,
        is_bridge=part.is_bridge,
        is_tunnel=part.is_tunnel,
        lonlat=part.lonlat[::-1],
        length_m=part.length_m,
        cost=part.cost,
    )


def _street_parts(graph: Graph, arcs: Sequence[int]) -> list[Part]:
    network = graph.network
    found = []
    for arc, tail in zip(arcs, tails_of(graph, arcs), strict=True):
        edge, from_m, to_m = piece_of(graph, int(graph.row_piece[arc]), tail)
        lonlat = edge_part(network, edge, from_m, to_m)
        whole_m = float(network.length_m[edge])
        is_whole = abs(to_m - from_m) == whole_m
        found.append(
            Part(
                edge=edge,
                from_m=from_m,
                to_m=to_m,
                name=network.name_words[int(network.name[edge])],
                road_class=network.class_words[int(network.road_class[edge])],
                placement=placement_of(graph, edge),
                is_bridge=bool(network.is_bridge[edge]),
                is_tunnel=bool(network.is_tunnel[edge]),
                lonlat=lonlat,
                length_m=whole_m if is_whole else float(steps_m(lonlat).sum()),
                cost=float(graph.cost[arc]),
            )
        )
    return found


def _line(parts: Sequence[Part], graph: Graph, sites: Sequence[int | None]) -> Floats:
    """Return the parts end to end as one line, each vertex once."""
    if not parts:
        anchor = graph.anchors[next(site for site in sites if site is not None)]
        return np.array([[anchor.foot_lon, anchor.foot_lat]] * 2)
    whole = np.concatenate([part.lonlat for part in parts])
    whole[:, 0] = wrapped(whole[:, 0])
    whole[whole[:, 0] == -180.0, 0] = 180.0  # one meridian, two names
    keep = np.ones(len(whole), dtype=bool)
    keep[1:] = (whole[1:] != whole[:-1]).any(axis=1)
    return np.asarray(whole[keep])


def _crossings(graph: Graph, parts: Sequence[Part], ends_m: Floats) -> tuple[WayCrossing, ...]:
    network = graph.network
    if not len(network.crossing_edge):
        return ()
    found: list[WayCrossing] = []
    for part, begin_m in zip(parts, ends_m[:-1], strict=True):
        low, high = min(part.from_m, part.to_m), max(part.from_m, part.to_m)
        for row in np.flatnonzero(network.crossing_edge == part.edge):
            along = float(network.crossing_m[row])
            if low - 1e-6 <= along <= high + 1e-6:
                found.append(
                    WayCrossing(
                        kind=CROSSING_KINDS[int(network.crossing_kind[row])],
                        lon=float(network.crossing_lonlat[row, 0]),
                        lat=float(network.crossing_lonlat[row, 1]),
                        along_m=float(begin_m) + abs(along - part.from_m),
                        is_bridge=part.is_bridge,
                        is_tunnel=part.is_tunnel,
                    )
                )
    found.sort(key=lambda crossing: (crossing.along_m, crossing.kind))
    kept: list[WayCrossing] = []
    for crossing in found:
        same = [other for other in kept if other.kind == crossing.kind]
        if not same or crossing.along_m - same[-1].along_m >= _ONE_PLACE_M:
            kept.append(crossing)
    return tuple(kept)


def _junctions(graph: Graph, parts: Sequence[Part], ends_m: Floats) -> tuple[float, ...]:
    """Return how far along the way each junction of three streets or more lies."""
    degree = np.diff(graph.network.row_first)
    streets = [number for number, part in enumerate(parts) if part.edge >= 0]
    found = []
    for number, following in pairwise(streets):
        if following != number + 1:
            continue
        part, network = parts[number], graph.network
        edge = part.edge
        node = None
        if part.to_m <= 0.0:
            node = int(network.edge_start[edge])
        elif part.to_m >= float(network.length_m[edge]):
            node = int(network.edge_end[edge])
        if node is not None and degree[node] >= 3:
            found.append(float(ends_m[number + 1]))
    return tuple(found)
