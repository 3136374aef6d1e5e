"""Two ways of least total cost that share no street, or no junction: the search itself."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from routeplan.streets.graph import Graph
from routeplan.streets.model import Floats, Whole
from routeplan.streets.search import NO_NODE, arcs_to, distances_to, guessed_cost, least_arc
from routeplan.streets.ways import tails_of

__all__ = ["PairArcs", "least_pair"]

_USUALLY_DEARER = 0.6  # a second way seldom adds more to twice the best; if it does, look on


@dataclass(frozen=True, slots=True, kw_only=True)
class PairArcs:
    """The arcs of two ways, or of one if `second` is None: then there are no two."""

    first: list[int]
    second: list[int] | None


def least_pair(
    graph: Graph, source: int, target: int, *, by_junction: bool, shared_factor: float = np.inf
) -> PairArcs:
    """
    Return two ways of least total cost that share no street, or no junction either.

    Exact [1]_ [2]_: the best way is found, its arcs turned round at no reduced cost, and the best
    way in what is left mends it. Two Dijkstra searches, O(m log n).

    Parameters
    ----------
    graph
        The graph.
    source, target
        Where both ways begin and end.
    by_junction
        Whether they may not meet at a junction.
    shared_factor
        How many times its price a street costs the second way, and a junction that of its
        cheapest street; infinite: neither may be used twice.

    Raises
    ------
    LookupError
        If there is not even one way.

    References
    ----------
    .. [1] J. W. Suurballe, R. E. Tarjan, A quick method for finding shortest pairs of disjoint
       paths, Networks 14 (1984) 325-336.
    .. [2] R. Bhandari, Survivable Networks: Algorithms for Diverse Routing (1999), for undirected
       graphs and for splitting the junctions of the first way only.
    """
    rows = (graph.row_first, graph.row_node, graph.cost)
    guess = guessed_cost(graph, source, target)
    found, before = distances_to(*rows, source=source, target=target, guess=guess)
    if source == target or not np.isfinite(found[target]):
        raise LookupError
    first = arcs_to(graph, before, target)
    # Nodes farther than the target count as just as far: still no arc is less than nothing.
    found = np.minimum(found, found[target])
    reduced = _reduced(graph, found)
    left = _Left.of(graph, reduced)
    path = [*tails_of(graph, first), target]
    shared = _second_use(graph, first, found, path, shared_factor)
    back = [_twin(graph, arc, tail) for arc, tail in zip(first, path, strict=False)]
    if by_junction:
        again = _junctions_again(graph, path[1:-1], shared_factor)
        _split_junctions(left, path, (first, back), (shared, again))
    else:
        left.cost[first] = shared
        left.cost[back] = 0.0
    rows = (left.row_first(), left.heads(), left.prices())
    guess = _USUALLY_DEARER * float(found[target])
    away, previous = distances_to(*rows, source=source, target=target, guess=guess)
    if not np.isfinite(away[target]):
        return PairArcs(first=first, second=None)
    second = _real_arcs(left, previous, source, target)
    return _untangled(graph, first, second, source=source, target=target)


def _reduced(graph: Graph, found: Floats) -> Floats:
    """Return the price of every arc above what it brings nearer, at least 0."""
    tail_part = np.repeat(found, np.diff(graph.row_first))
    return np.maximum(graph.cost + tail_part - found[graph.row_node], 0.0)


def _twin(graph: Graph, arc: int, tail: int) -> int:
    """Return the arc that runs along the same piece the other way."""
    head, piece = int(graph.row_node[arc]), int(graph.row_piece[arc])
    first, last = int(graph.row_first[head]), int(graph.row_first[head + 1])
    pieces, heads = graph.row_piece[first:last].tolist(), graph.row_node[first:last].tolist()
    return next(
        first + at for at in range(last - first) if pieces[at] == piece and heads[at] == tail
    )


def _second_use(
    graph: Graph, first: list[int], found: Floats, path: list[int], factor: float
) -> Floats:
    """Return the reduced price of going a second time along each arc of the first way."""
    if np.isinf(factor):
        return np.full(len(first), np.inf)
    cost = graph.cost[first]
    again = cost * factor + found[path[:-1]] - found[path[1:]]
    return np.maximum(again, 0.0)


def _junctions_again(graph: Graph, nodes: list[int], factor: float) -> list[float]:
    """Return what each junction costs the second way."""
    if np.isinf(factor):
        return [np.inf] * len(nodes)
    rows = [slice(int(graph.row_first[node]), int(graph.row_first[node + 1])) for node in nodes]
    return [factor * float(graph.cost[row].min()) for row in rows]


@dataclass(slots=True, eq=False)
class _Left:
    """
    What is left of a graph once the first way is taken: its rows, and rows put after them.

    `of_arc` says which arc of the graph an arc put in stands for; -1: none.
    """

    first: Whole
    node: Whole
    cost: Floats
    extra: list[list[tuple[int, float, int]]]
    stands_for: dict[int, int]

    @classmethod
    def of(cls, graph: Graph, reduced: Floats) -> _Left:
        """Return a copy of a graph with these prices."""
        return cls(
            first=graph.row_first,
            node=graph.row_node.copy(),
            cost=reduced,
            extra=[],
            stands_for={},
        )

    @property
    def size(self) -> int:
        """The number of nodes of the graph itself."""
        return len(self.first) - 1

    def row_first(self) -> Whole:
        """Return where each row begins, the extra ones last."""
        counts = np.cumsum([len(row) for row in self.extra], dtype=np.int64)
        return np.concatenate([self.first, self.first[-1] + counts]).astype(np.int32)

    def heads(self) -> Whole:
        """Return the head of every arc."""
        extra = [arc[0] for row in self.extra for arc in row]
        return np.concatenate([self.node, extra]).astype(np.int32)

    def prices(self) -> Floats:
        """Return the price of every arc."""
        return np.concatenate([self.cost, [arc[1] for row in self.extra for arc in row]])

    def origins(self) -> list[int]:
        """Return the arc of the graph that every extra arc stands for, -1 for none."""
        return [arc[2] for row in self.extra for arc in row]


def _split_junctions(
    left: _Left,
    path: list[int],
    arcs: tuple[list[int], list[int]],
    twice: tuple[Floats, list[float]],
) -> None:
    """
    Split every junction inside the first way into an entrance and an exit.

    The exit keeps the node's row. Going in where the first way goes leads back along it, out of
    the junction before. The row of an entrance: back to the exit before; on to its own exit, where
    a junction may be used twice. The arc along the first way leads to a node of its own, from
    which one goes back to the entrance, or along the street a second time.
    """
    (first, back), (shared, junction) = arcs, twice
    inner = path[1:-1]
    entrance = {node: left.size + number for number, node in enumerate(inner)}
    again = {node: left.size + len(inner) + number for number, node in enumerate(path[:-1])}
    moved = np.arange(left.size, dtype=left.node.dtype)
    moved[inner] = [entrance[node] for node in inner]
    left.node[:] = moved[left.node]
    for at, node in enumerate(inner, start=1):
        left.extra.append([(path[at - 1], 0.0, back[at - 1]), (node, junction[at - 1], -1)])
    for at, node in enumerate(path[:-1]):
        following = path[at + 1]
        row = [(entrance.get(following, following), float(shared[at]), first[at])]
        if node in entrance:
            row.append((entrance[node], 0.0, -1))
        left.extra.append(row)
        left.node[first[at]] = again[node]
        left.cost[first[at]] = 0.0
        left.stands_for[first[at]] = -1
        left.cost[back[at]] = np.inf  # it leads out of an entrance now
    # What leads out of the last junction, back along the first way, never helps: it ends there.


def _real_arcs(left: _Left, before: Whole, source: int, target: int) -> list[int]:
    """Return the arcs of the graph that the way in what is left stands for."""
    first, heads, prices = left.row_first(), left.heads(), left.prices()
    origins = left.origins()
    nodes = [target]
    while nodes[-1] != source and int(before[nodes[-1]]) != NO_NODE:
        nodes.append(int(before[nodes[-1]]))
    nodes.reverse()
    base = int(left.first[-1])
    arcs = []
    for tail, head in pairwise(nodes):
        arc = least_arc(first, heads, prices, tail=tail, head=head)
        real = origins[arc - base] if arc >= base else left.stands_for.get(arc, arc)
        if real >= 0:
            arcs.append(real)
    return arcs


def _untangled(
    graph: Graph, first: list[int], second: list[int], *, source: int, target: int
) -> PairArcs:
    """Return two ways made of both searches' arcs, less those gone both ways."""
    heads = graph.row_node
    tails = dict(zip(first + second, tails_of(graph, first + second), strict=True))
    pending: dict[tuple[int, int, int], list[int]] = defaultdict(list)
    for arc in (*first, *second):
        tail, head, piece = tails[arc], int(heads[arc]), int(graph.row_piece[arc])
        opposite = pending[piece, head, tail]
        if opposite:
            opposite.pop()
        else:
            pending[piece, tail, head].append(arc)
    leaving: dict[int, list[int]] = defaultdict(list)
    for kept in pending.values():
        for arc in kept:
            leaving[tails[arc]].append(arc)
    ways = [_walked(graph, leaving, source=source, target=target) for _ in range(2)]
    ways.sort(key=lambda arcs: (float(graph.cost[arcs].sum()), arcs))
    return PairArcs(first=ways[0], second=ways[1])


def _walked(graph: Graph, leaving: dict[int, list[int]], *, source: int, target: int) -> list[int]:
    """Return one way along the arcs left, rounds that cost nothing left out."""
    arcs: list[int] = []
    at = {source: 0}
    node = source
    while node != target:
        arc = leaving[node].pop()
        node = int(graph.row_node[arc])
        if node in at:
            for dropped in arcs[at[node] :]:
                at.pop(int(graph.row_node[dropped]))
            del arcs[at[node] :]
            continue
        arcs.append(arc)
        at[node] = len(arcs)
    return arcs
