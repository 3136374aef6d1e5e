"""Trees of least total cost in a graph: exact for few sites, within a known factor for many."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from routeplan.streets.graph import Graph
from routeplan.streets.model import Floats, Whole
from routeplan.streets.search import NO_NODE, distances, least_arc

__all__ = ["exact_tree", "exact_work", "near_tree"]

Arcs = list[int]


def exact_work(graph: Graph, terminal_count: int) -> float:
    """Return how many arcs and nodes `exact_tree` has to look at, roughly."""
    sets = 2.0 ** (terminal_count - 1)
    splits = 3.0 ** (terminal_count - 1) / 2.0
    return sets * len(graph.row_node) + splits * graph.node_count


def exact_tree(graph: Graph, terminals: Sequence[int]) -> Arcs:
    """
    Return the arcs of a tree of least total cost that joins some nodes.

    Exact [1]_: for every set of the nodes but the last, the cheapest tree that joins it and ends at
    each node of the graph, from the best split in two and one search. O(3^k n + 2^k m log n).

    Parameters
    ----------
    graph
        The graph.
    terminals
        The nodes to join, each once.

    Raises
    ------
    LookupError
        If they cannot be joined.

    References
    ----------
    .. [1] S. E. Dreyfus, R. A. Wagner, The Steiner problem in graphs, Networks 1 (1971) 195-207,
       in the form of R. E. Erickson, C. L. Monma, A. F. Veinott (1987).
    """
    near = near_tree(graph, terminals)
    bound = float(graph.cost[near].sum()) * (1.0 + 1e-9)
    *others, root = terminals
    if not others:
        return []
    full = (1 << len(others)) - 1
    cost: dict[int, Floats] = {}
    before: dict[int, Whole] = {}
    split: dict[int, Whole] = {}
    for number, node in enumerate(others):
        found, previous = distances(
            graph.row_first, graph.row_node, graph.cost, source=node, limit=bound
        )
        cost[1 << number], before[1 << number] = found, previous
    for joined in range(1, full + 1):
        if joined & (joined - 1) == 0:
            continue
        best, choice = _best_split(cost, joined, graph.node_count)
        split[joined] = choice
        cost[joined], before[joined] = _spread(graph, best, bound)
    arcs: set[int] = set()
    _collect(graph, full, root, (before, split), arcs)
    return sorted(arcs)


def _best_split(cost: dict[int, Floats], joined: int, size: int) -> tuple[Floats, Whole]:
    """Return for each node the least cost of joining a set there from two halves, and one half."""
    best = np.full(size, np.inf)
    choice = np.zeros(size, dtype=np.int32)
    lowest = joined & -joined
    part = (joined - 1) & joined
    while part:
        if part & lowest:  # each pair of halves once
            total = cost[part] + cost[joined ^ part]
            better = total < best
            best[better] = total[better]
            choice[better] = part
        part = (part - 1) & joined
    return best, choice


def _spread(graph: Graph, start: Floats, bound: float) -> tuple[Floats, Whole]:
    """Return the least cost at each node from prices to begin with, and the node before."""
    begin = np.flatnonzero(start <= bound)
    size = graph.node_count
    if not len(begin):
        return np.full(size, np.inf), np.full(size, NO_NODE)
    # One row more, from which every node is reached at its price.
    first = np.append(graph.row_first, graph.row_first[-1] + len(begin)).astype(np.int32)
    node = np.concatenate([graph.row_node, begin]).astype(np.int32)
    cost = np.concatenate([graph.cost, start[begin]])
    found, before = distances(first, node, cost, source=size, limit=bound)
    return found[:size], np.where(before[:size] == size, NO_NODE, before[:size])


def _collect(
    graph: Graph,
    joined: int,
    node: int,
    tables: tuple[dict[int, Whole], dict[int, Whole]],
    arcs: set[int],
) -> None:
    """Add the arcs of the tree that joins a set and ends at a node."""
    before, split = tables
    pending = [(joined, node)]
    while pending:
        joined, node = pending.pop()
        previous = int(before[joined][node])
        while previous != NO_NODE:
            arcs.add(
                least_arc(graph.row_first, graph.row_node, graph.cost, tail=previous, head=node)
            )
            node, previous = previous, int(before[joined][previous])
        if joined in split:
            part = int(split[joined][node])
            if not part:
                raise LookupError
            pending += [(part, node), (joined ^ part, node)]


def near_tree(graph: Graph, terminals: Sequence[int]) -> Arcs:
    """
    Return the arcs of a tree that joins some nodes at no more than 2 - 2/k times the least cost.

    The least spanning tree of the best ways between every two of the k nodes [1]_, laid on the
    graph, made a tree again there, and cut back to the nodes. k searches, O(k m log n).

    Parameters
    ----------
    graph
        The graph.
    terminals
        The nodes to join, each once.

    Raises
    ------
    LookupError
        If they cannot be joined.

    References
    ----------
    .. [1] L. Kou, G. Markowsky, L. Berman, A fast algorithm for Steiner trees, Acta Informatica
       15 (1981) 141-145.
    """
    joined = {terminals[0]}
    found = {
        node: distances(graph.row_first, graph.row_node, graph.cost, source=node)
        for node in terminals[:-1]
    }
    arcs: set[int] = set()
    while len(joined) < len(terminals):
        pairs = [
            (
                float(found[one if one in found else other][0][other if one in found else one]),
                one,
                other,
            )
            for one in joined
            for other in terminals
            if other not in joined
        ]
        cost, one, other = min(pairs)
        if not np.isfinite(cost):
            raise LookupError
        source, node = (one, other) if one in found else (other, one)
        before = found[source][1]
        while int(before[node]) != NO_NODE:
            tail = int(before[node])
            arcs.add(least_arc(graph.row_first, graph.row_node, graph.cost, tail=tail, head=node))
            node = tail
        joined.add(other)
    return _pruned(graph, arcs, set(terminals))


def _pruned(graph: Graph, arcs: set[int], terminals: set[int]) -> Arcs:
    """Return the least spanning tree of some arcs, cut back until every leaf is a terminal."""
    order = sorted(arcs, key=lambda arc: (float(graph.cost[arc]), arc))
    tails = dict(zip(order, np.searchsorted(graph.row_first, order, side="right") - 1, strict=True))
    parent: dict[int, int] = {}

    def root(node: int) -> int:
        while parent.setdefault(node, node) != node:
            parent[node] = parent[parent[node]]
            node = parent[node]
        return node

    kept: dict[int, tuple[int, int]] = {}
    for arc in order:
        tail, head = int(tails[arc]), int(graph.row_node[arc])
        if root(tail) != root(head):
            parent[root(tail)] = root(head)
            kept[arc] = (tail, head)
    while True:
        degree: dict[int, int] = {}
        for tail, head in kept.values():
            degree[tail] = degree.get(tail, 0) + 1
            degree[head] = degree.get(head, 0) + 1
        loose = [
            arc
            for arc, ends in kept.items()
            if any(degree[node] == 1 and node not in terminals for node in ends)
        ]
        if not loose:
            return sorted(kept)
        for arc in loose:
            del kept[arc]
