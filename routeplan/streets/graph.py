"""The graph that is searched: a network's adjacency with sites put into the streets they are on."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np

from routeplan.streets.anchors import Anchor
from routeplan.streets.bends import bend_positions
from routeplan.streets.costs import Prices
from routeplan.streets.edges import cumulative_m
from routeplan.streets.model import Floats, Network, Whole

__all__ = ["Graph", "graph_of", "node_lonlat", "piece_cost", "piece_of"]

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
    on_edge: dict[int, list[int]] = defaultdict(list)
    for number, anchor in enumerate(anchors):
        if anchor.node < 0:
            on_edge[anchor.edge].append(number)
    cuts = _Cuts(
        node=network.row_node.copy(),
        piece=network.row_edge.copy(),
        cost=prices.cost[network.row_edge],
        terminals=[anchor.node for anchor in anchors],
    )
    for edge, numbers in on_edge.items():
        _cut_edge(cuts, network, prices, edge, {n: anchors[n].along_m for n in numbers})
    rows = network.row_first[-1] + 2 * np.arange(1, len(cuts.arcs) // 2 + 1)
    return Graph(
        network=network,
        prices=prices,
        anchors=tuple(anchors),
        terminals=tuple(cuts.terminals),
        row_first=np.append(network.row_first, rows.astype(np.int32)),
        row_node=np.append(cuts.node, np.array([arc[0] for arc in cuts.arcs], dtype=np.int32)),
        row_piece=np.append(cuts.piece, np.array([arc[1] for arc in cuts.arcs], dtype=np.int32)),
        cost=np.append(cuts.cost, np.array([arc[2] for arc in cuts.arcs], dtype=np.float64)),
        pieces=tuple(cuts.pieces),
    )


@dataclass(slots=True, kw_only=True, eq=False)
class _Cuts:
    """The arcs of a network while its edges are cut; two new arcs (head, piece, price) a site."""

    node: Whole
    piece: Whole
    cost: Floats
    terminals: list[int]
    pieces: list[tuple[int, float, float, int, int]] = field(default_factory=list)
    arcs: list[tuple[int, int, float]] = field(default_factory=list)


def _cut_edge(
    cuts: _Cuts, network: Network, prices: Prices, edge: int, along_m: Mapping[int, float]
) -> None:
    """Put sites into an edge: its own two arcs lead to the first and last, theirs to each other."""
    new_node = len(network.node_lonlat) + len(cuts.arcs) // 2
    nodes, marks = [int(network.edge_start[edge])], [0.0]
    for number in sorted(along_m, key=lambda number: (along_m[number], number)):
        if len(nodes) == 1 or along_m[number] - marks[-1] > _SAME_PLACE_M:
            nodes.append(new_node + len(nodes) - 1)
            marks.append(along_m[number])
        cuts.terminals[number] = nodes[-1]
    nodes.append(int(network.edge_end[edge]))
    marks.append(float(network.length_m[edge]))
    first = len(prices.cost) + len(cuts.pieces)
    costs = [piece_cost(network, prices, edge, begin, end) for begin, end in pairwise(marks)]
    spans, ends = pairwise(marks), pairwise(nodes)
    cuts.pieces.extend((edge, *span, *pair) for span, pair in zip(spans, ends, strict=True))
    for at in range(1, len(nodes) - 1):
        cuts.arcs.append((nodes[at - 1], first + at - 1, costs[at - 1]))
        cuts.arcs.append((nodes[at + 1], first + at, costs[at]))
    begin_slot, end_slot = _slots(network, edge)
    cuts.node[begin_slot], cuts.node[end_slot] = nodes[1], nodes[-2]
    cuts.piece[begin_slot], cuts.piece[end_slot] = first, first + len(costs) - 1
    cuts.cost[begin_slot], cuts.cost[end_slot] = costs[0], costs[-1]


def _slots(network: Network, edge: int) -> tuple[int, int]:
    """Return where an edge stands in the rows of its start and of its end."""
    found = []
    for node in (int(network.edge_start[edge]), int(network.edge_end[edge])):
        first, last = int(network.row_first[node]), int(network.row_first[node + 1])
        own = first + np.flatnonzero(network.row_edge[first:last] == edge)
        found.append(own)
    # An edge that ends where it starts stands twice in one row.
    return int(found[0][0]), int(found[1][-1])


def piece_cost(network: Network, prices: Prices, edge: int, from_m: float, to_m: float) -> float:
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


def node_lonlat(graph: Graph, node: int) -> tuple[float, float]:
    """Return where a node is, a site's on its street."""
    if node < len(graph.network.node_lonlat):
        lon, lat = graph.network.node_lonlat[node]
        return float(lon), float(lat)
    anchor = graph.anchors[graph.terminals.index(node)]
    return anchor.foot_lon, anchor.foot_lat


def piece_of(graph: Graph, piece: int, tail: int) -> tuple[int, float, float]:
    """Return the edge of a piece and where on it one begins and ends who comes from `tail`."""
    if piece < graph.edge_count:
        length = float(graph.network.length_m[piece])
        if int(graph.network.edge_start[piece]) == tail:
            return piece, 0.0, length
        return piece, length, 0.0
    edge, from_m, to_m, start, _ = graph.pieces[piece - graph.edge_count]
    return (edge, from_m, to_m) if start == tail else (edge, to_m, from_m)
