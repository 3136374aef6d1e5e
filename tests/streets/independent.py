"""The same questions put to general solvers: networkx and a linear programme."""

from __future__ import annotations

from itertools import combinations

import networkx as nx
import numpy as np

from routeplan.streets.graph import Graph
from routeplan.streets.model import Network


def simple_graph(network: Network, cost: np.ndarray) -> nx.Graph:
    """Return the network as a networkx graph with the cheapest of parallel edges."""
    graph = nx.Graph()
    graph.add_nodes_from(range(len(network.node_lonlat)))
    for edge, (one, other) in enumerate(zip(network.edge_start, network.edge_end, strict=True)):
        known = graph.get_edge_data(int(one), int(other))
        if np.isfinite(cost[edge]) and (known is None or cost[edge] < known["weight"]):
            graph.add_edge(int(one), int(other), weight=float(cost[edge]))
    return graph


def arcs_of(graph: Graph) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return tail, head and price of every open arc."""
    tail = np.repeat(np.arange(graph.node_count), np.diff(graph.row_first))
    keep = np.isfinite(graph.cost)
    return tail[keep], graph.row_node[keep], graph.cost[keep]


def least_pair_cost(
    graph: Graph, source: int, target: int, *, by_junction: bool, factor: float = np.inf
) -> float:
    """
    Return the least cost of two units of flow, by linear programming; infinite if there are none.

    Every arc has room for one unit; with a finite `factor` for a second at that many times the
    price. A junction has the same room, where junctions count. The matrix is that of a network, so
    that the optimum is whole.
    """
    from scipy.optimize import linprog
    from scipy.sparse import coo_array

    tail, head, cost = arcs_of(graph)
    size = graph.node_count
    if by_junction:
        inner = np.array([n for n in range(size) if n not in (source, target)])
        row_least = np.full(size, np.inf)
        np.minimum.at(row_least, tail, cost)
        entry = np.arange(size)
        entry[inner] = size + np.arange(len(inner))
        head = entry[head]
        alone = np.isfinite(row_least[inner])
        tail = np.concatenate([tail, entry[inner]])
        head = np.concatenate([head, inner])
        cost = np.concatenate([cost, np.zeros(len(inner))])
        again = np.concatenate([cost[: -len(inner)], np.where(alone, row_least[inner], 0.0)])
        size += len(inner)
    else:
        again = cost
    if np.isfinite(factor):
        tail, head = np.tile(tail, 2), np.tile(head, 2)
        cost = np.concatenate([cost, again * factor])
    count = len(tail)
    rows = np.concatenate([tail, head])
    matrix = coo_array(
        (np.repeat([1.0, -1.0], count), (rows, np.tile(np.arange(count), 2))), shape=(size, count)
    )
    wanted = np.zeros(size)
    wanted[source], wanted[target] = 2.0, -2.0
    found = linprog(cost, A_eq=matrix.tocsr(), b_eq=wanted, bounds=(0.0, 1.0), method="highs")
    return float(found.fun) if found.status == 0 else np.inf


def least_tree_cost(network: Network, cost: np.ndarray, terminals: list[int]) -> float:
    """Return the least cost of a tree over the terminals, by trying every set of other nodes."""
    graph = simple_graph(network, cost)
    others = [node for node in graph if node not in terminals]
    best = np.inf
    for count in range(len(others) + 1):
        for extra in combinations(others, count):
            part = graph.subgraph([*terminals, *extra])
            if nx.is_connected(part):
                tree = nx.minimum_spanning_tree(part)
                best = min(best, tree.size(weight="weight"))
    return best
