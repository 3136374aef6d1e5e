"""Least-cost search over a graph: distances from a node, and the arcs of a way."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np

from routeplan.geodesy import steps_m
from routeplan.streets.graph import Graph, node_lonlat
from routeplan.streets.model import Floats, Whole

__all__ = ["arcs_to", "distances", "distances_to", "guessed_cost", "least_arc", "least_arcs"]

NO_NODE = -9999  # what scipy writes where there is no node before


def distances(
    row_first: Whole, row_node: Whole, cost: Floats, *, source: int, limit: float = np.inf
) -> tuple[Floats, Whole]:
    """
    Return the least cost from a node to every other, and the node before each on the way.

    Exact (Dijkstra) for costs of at least 0; parallel arcs and arcs of no cost count as they are.
    O(m log n).

    Parameters
    ----------
    row_first, row_node
        The arcs; see `Graph`.
    cost
        Their prices.
    source
        Where from.
    limit
        Nodes that cost more than this need not be found.
    """
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import dijkstra

    size = len(row_first) - 1
    graph: Any = csr_array((cost, row_node, row_first), shape=(size, size))
    search: Any = dijkstra
    found, before = search(
        graph, directed=True, indices=source, return_predecessors=True, limit=limit
    )
    return found, before


def distances_to(
    row_first: Whole, row_node: Whole, cost: Floats, *, source: int, target: int, guess: float
) -> tuple[Floats, Whole]:
    """
    Return least costs from a node, exact at least for every node no dearer than `target`.

    Only as far as a guess is searched first; if the target is not found there, everywhere.

    Parameters
    ----------
    row_first, row_node
        The arcs; see `Graph`.
    cost
        Their prices.
    source, target
        Where from and where to.
    guess
        What the target may cost.
    """
    if np.isfinite(guess):
        found, before = distances(row_first, row_node, cost, source=source, limit=guess)
        if np.isfinite(found[target]):
            return found, before
    return distances(row_first, row_node, cost, source=source)


def arcs_to(graph: Graph, before: Whole, target: int, *, cost: Floats | None = None) -> list[int]:
    """
    Return the arcs of the way to a node, in order.

    Parameters
    ----------
    graph
        The graph.
    before
        The node before each, from `distances`.
    target
        Where to.
    cost
        The prices searched with, if not the graph's own.
    """
    nodes = [target]
    while int(before[nodes[-1]]) != NO_NODE:
        nodes.append(int(before[nodes[-1]]))
    nodes.reverse()
    prices = graph.cost if cost is None else cost
    return [
        least_arc(graph.row_first, graph.row_node, prices, tail=tail, head=head)
        for tail, head in pairwise(nodes)
    ]


def least_arc(row_first: Whole, row_node: Whole, cost: Floats, *, tail: int, head: int) -> int:
    """Return the cheapest of the arcs between two neighbours."""
    first, last = int(row_first[tail]), int(row_first[tail + 1])
    heads, prices = row_node[first:last].tolist(), cost[first:last].tolist()
    # Rows are so short that a plain loop is faster than arrays.
    return min((prices[at], first + at) for at in range(last - first) if heads[at] == head)[1]


def guessed_cost(graph: Graph, source: int, target: int) -> float:
    """
    Return what the best way between two nodes hardly exceeds: a guess, wrong now and then.

    Their distance, times the mean price of a metre of some of the streets, times one and a half.

    Parameters
    ----------
    graph
        The graph.
    source, target
        The nodes.
    """
    prices, length_m = graph.prices, graph.network.length_m
    some = slice(None, None, max(len(length_m) // 1000, 1))
    usable = np.isfinite(prices.cost[some])
    metres = float(length_m[some][usable].sum())
    if metres <= 0.0:
        return np.inf
    ends = np.array([node_lonlat(graph, source), node_lonlat(graph, target)])
    per_m = float(prices.cost[some][usable].sum()) / metres
    return 1.5 * per_m * float(steps_m(ends)[0]) + 1e-6


def least_arcs(graph: Graph, source: int, target: int, *, cost: Floats | None = None) -> list[int]:
    """
    Return the arcs of the cheapest way between two nodes, in order; empty if they are one.

    Parameters
    ----------
    graph
        The graph.
    source, target
        Where from and where to.
    cost
        Prices to search with, if not the graph's own.

    Raises
    ------
    LookupError
        If there is no way.
    """
    prices = graph.cost if cost is None else cost
    found, before = distances_to(
        graph.row_first,
        graph.row_node,
        prices,
        source=source,
        target=target,
        guess=guessed_cost(graph, source, target) if cost is None else np.inf,
    )
    if not np.isfinite(found[target]):
        raise LookupError
    return arcs_to(graph, before, target, cost=prices)
