"""The best way between two or more sites in order."""

from __future__ import annotations

import contextlib
from collections.abc import Sequence

import numpy as np

from routeplan.errors import InfeasibleError, InputError, Problem
from routeplan.streets.anchors import OFF_STREET_MAX_M, Anchor, anchored
from routeplan.streets.costs import Prices
from routeplan.streets.graph import Graph, graph_of
from routeplan.streets.islands import parts_of
from routeplan.streets.model import Floats, Network, Way
from routeplan.streets.search import least_arcs
from routeplan.streets.turns import least_arcs_with_turns
from routeplan.streets.ways import way_of

__all__ = ["best_way", "legs_between", "no_way", "site_graph"]

Site = tuple[str, float, float]


def best_way(
    network: Network,
    sites: Sequence[Site],
    *,
    prices: Prices,
    off_street_max_m: float = OFF_STREET_MAX_M,
) -> Way:
    """
    Return the way of least cost through some sites in the order given.

    Exact for the prices given, sharp bends at junctions included where they have a price: one
    Dijkstra search for each pair of sites, O(m log n); with a price on bends it runs over arcs
    instead of nodes, three to five times as long.

    Parameters
    ----------
    network
        The network.
    sites
        Name, longitude and latitude of two sites or more. [deg]
    prices
        What its edges cost.
    off_street_max_m
        Longest walk from a site to its street. [m]

    Raises
    ------
    GeometryError
        If a site is no place on the earth.
    InfeasibleError
        If a site has no street near it, or there is no way between two of them.
    """
    graph = site_graph(network, sites, prices=prices, off_street_max_m=off_street_max_m)
    return way_of(graph, legs_between(graph), range(len(sites)))


def site_graph(
    network: Network, sites: Sequence[Site], *, prices: Prices, off_street_max_m: float
) -> Graph:
    """
    Return the graph to search between sites; raise if there are too few.

    Each site takes the nearest open street. Where those do not all meet, because a nearest one is
    an island of its own, every site takes the nearest street of the largest part instead.
    """
    if len(sites) < 2:
        raise InputError(
            Problem(where="sites", what="are too few", value=f"{len(sites)}", limit="at least 2")
        )
    usable = np.isfinite(prices.cost)
    anchors = anchored(network, sites, usable=usable, off_street_max_m=off_street_max_m)
    part = parts_of(network, usable)
    found = {int(part[network.edge_start[anchor.edge]]) for anchor in anchors}
    if len(found) > 1:
        own = part[network.edge_start]
        metres = np.bincount(own[usable], weights=network.length_m[usable])
        usable &= own == int(np.argmax(metres))
        with contextlib.suppress(InfeasibleError):
            anchors = anchored(network, sites, usable=usable, off_street_max_m=off_street_max_m)
    return graph_of(network, prices, anchors)


def legs_between(graph: Graph, *, cost: Floats | None = None) -> list[list[int]]:
    """
    Return the arcs of the best way from each site to the next.

    Parameters
    ----------
    graph
        The graph.
    cost
        Prices to search with, if not the graph's own.
    """
    legs = []
    pairs = zip(range(len(graph.anchors)), range(1, len(graph.anchors)), strict=False)
    for one, other in pairs:
        source, target = graph.terminals[one], graph.terminals[other]
        try:
            if graph.prices.costs.sharp_bend_each:
                legs.append(least_arcs_with_turns(graph, source, target, cost=cost))
            else:
                legs.append(least_arcs(graph, source, target, cost=cost))
        except LookupError:
            raise no_way(graph, graph.anchors[one], graph.anchors[other]) from None
    return legs


def no_way(graph: Graph, one: Anchor, other: Anchor) -> InfeasibleError:
    """Return the error that says why two sites cannot be joined."""
    from routeplan.streets.search import distances

    first, node = graph.row_first, graph.row_node
    open_to_all = np.ones(len(node))
    source = graph.terminals[graph.anchors.index(one)]
    target = graph.terminals[graph.anchors.index(other)]
    found, _ = distances(first, node, open_to_all, source=source)
    closed = bool(np.isfinite(found[target]))
    return InfeasibleError(
        Problem(
            where=f"{one.name} to {other.name}",
            what="there is no way: what is closed or to be avoided lies across every one"
            if closed
            else "there is no way: their streets do not meet",
            remedy="Open a road class or shrink an area."
            if closed
            else "Take a larger extract, or join the lines where they should meet.",
        )
    )
