"""The graph that is searched: a network's adjacency with sites put into the streets they are on."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from routeplan.streets.anchors import Anchor
from routeplan.streets.bends import bend_positions
from routeplan.streets.costs import Prices
from routeplan.streets.edges import cumulative_m
from routeplan.streets.model import Floats, Network, Whole

__all__ = ["Graph", "graph_of", "piece_of"]

_SAME_PLACE_M = 0.01


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Graph:
    """
    Rows of arcs, as in `Network`, with a row more for every site part-way along a street.

    `cost` has one price an arc, infinite where closed. `row_piece` is the number of an edge or,
    from `edge_count` on, of a piece that an edge is cut into: `pieces` holds its edge, where on it
    the piece begins and ends, and the node at each. `terminals` are the nodes of the sites.
    """

    network: Network
    prices: Prices
    anchors: tuple[Anchor, ...]
    terminals: tuple[int, ...]
    row_first: Whole
    row_node: Whole
    row_piece: Whole
    cost: Floats
    pieces: tuple[tuple[int, float, float, int, int], ...]

    @property
    def edge_count(self) -> int:
        """The number of edges of the network."""
        return len(self.network.length_m)

    @property
    def node_count(self) -> int:
        """The number of nodes, sites included."""
        return len(self.row_first) - 1


def graph_of(network: Network, prices: Prices, anchors: Sequence[Anchor]) -> Graph:
    """
    Return the graph to search between some sites.

    The arcs of a street with a site on it lead to the site instead, and on from there. Costs
    O(m) to copy the arrays.

    Parameters
    ----------
    network
        The network.
    prices
        What its edges cost.
    anchors
        The sites.
    """
    row_node = network.row_node.copy()
    row_piece = network.row_edge.copy()
    cost = prices.cost[network.row_edge]
    node_count = len(network.node_lonlat)
    on_edge: dict[int, list[int]] = defaultdict(list)
    terminals = [anchor.node for anchor in anchors]
    for number, anchor in enumerate(anchors):
        if anchor.node < 0:
            on_edge[anchor.edge].append(number)
    pieces: list[tuple[int, float, float, int, int]] = []
    new_rows: list[tuple[tuple[int, int, float], tuple[int, int, float]]] = []
    for edge, numbers in on_edge.items():
        numbers.sort(key=lambda number: anchors[number].along_m)
        nodes, marks = [int(network.edge_start[edge])], [0.0]
        for number in numbers:
            along = anchors[number].along_m
            if len(nodes) == 1 or along - marks[-1] > _SAME_PLACE_M:
                nodes.append(node_count + len(new_rows) + len(nodes) - 1)
                marks.append(along)
            terminals[number] = nodes[-1]
        nodes.append(int(network.edge_end[edge]))
        marks.append(float(network.length_m[edge]))
        first_piece = len(prices.cost) + len(pieces)
        prices_here = [
            piece_cost(network, prices, edge, begin, end)
            for begin, end in zip(marks, marks[1:], strict=False)
        ]
        for at in range(len(nodes) - 1):
            pieces.append((edge, marks[at], marks[at + 1], nodes[at], nodes[at + 1]))
        for at in range(1, len(nodes) - 1):
            back = (nodes[at - 1], first_piece + at - 1, prices_here[at - 1])
            onward = (nodes[at + 1], first_piece + at, prices_here[at])
            new_rows.append((back, onward))
        begin_slot, end_slot = _slots(network, edge)
        last = len(nodes) - 2
        row_node[begin_slot], row_node[end_slot] = nodes[1], nodes[-2]
        row_piece[begin_slot], row_piece[end_slot] = first_piece, first_piece + last
        cost[begin_slot], cost[end_slot] = prices_here[0], prices_here[-1]
    arcs = [arc for row in new_rows for arc in row]
    rows_first = network.row_first[-1] + 2 * np.arange(1, len(new_rows) + 1)
    return Graph(
        network=network,
        prices=prices,
        anchors=tuple(anchors),
        terminals=tuple(terminals),
        row_first=np.concatenate([network.row_first, rows_first]).astype(np.int32),
        row_node=np.concatenate([row_node, [arc[0] for arc in arcs]]).astype(np.int32),
        row_piece=np.concatenate([row_piece, [arc[1] for arc in arcs]]).astype(np.int32),
        cost=np.concatenate([cost, [arc[2] for arc in arcs]]),
        pieces=tuple(pieces),
    )


def _slots(network: Network, edge: int) -> tuple[int, int]:
    """Return where an edge stands in the rows of its start and of its end."""
    found = []
    for node in (int(network.edge_start[edge]), int(network.edge_end[edge])):
        first, last = int(network.row_first[node]), int(network.row_first[node + 1])
        own = first + np.flatnonzero(network.row_edge[first:last] == edge)
        found.append(own)
    # An edge that ends where it starts stands twice in one row.
    return int(found[0][0]), int(found[1][-1])


def piece_cost(
    network: Network, prices: Prices, edge: int, from_m: float, to_m: float
) -> float:
    """Return what a part of an edge costs: its metres, and the crossings and bends on it."""
    if not np.isfinite(prices.cost[edge]):
        return float("inf")
    cost = float(prices.per_m[edge]) * (to_m - from_m)
    rows = np.flatnonzero(network.crossing_edge == edge)
    along = network.crossing_m[rows]
    is_last = to_m >= network.length_m[edge]
    on_it = (along >= from_m) & ((along < to_m) | is_last)
    cost += float(prices.crossing_each[rows[on_it]].sum())
    if prices.costs.sharp_bend_each:
        edges, vertices = bend_positions(network, sharp_deg=prices.costs.sharp_bend_deg)
        marks = cumulative_m(network, edge)[
            vertices[edges == edge] - int(network.shape_first[edge])
        ]
        cost += prices.costs.sharp_bend_each * int(((marks > from_m) & (marks < to_m)).sum())
    return cost


def piece_of(graph: Graph, piece: int, tail: int) -> tuple[int, float, float]:
    """Return the edge of a piece and where on it one begins and ends who comes from `tail`."""
    if piece < graph.edge_count:
        length = float(graph.network.length_m[piece])
        if int(graph.network.edge_start[piece]) == tail:
            return piece, 0.0, length
        return piece, length, 0.0
    edge, from_m, to_m, start, _ = graph.pieces[piece - graph.edge_count]
    return (edge, from_m, to_m) if start == tail else (edge, to_m, from_m)
