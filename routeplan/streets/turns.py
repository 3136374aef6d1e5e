"""The best way where sharp bends from street to street have a price: a search over arcs."""

from __future__ import annotations

import numpy as np

from routeplan.streets.bends import headings_rad, turns_rad
from routeplan.streets.edges import edge_part
from routeplan.streets.graph import Graph
from routeplan.streets.model import Floats, Whole
from routeplan.streets.search import NO_NODE, distances

__all__ = ["arc_headings_rad", "least_arcs_with_turns"]


def least_arcs_with_turns(
    graph: Graph, source: int, target: int, *, cost: Floats | None = None
) -> list[int]:
    """
    Return the arcs of the cheapest way between two nodes, bends at junctions priced.

    Exact: Dijkstra over the arcs themselves, where going on from one arc to the next costs the
    next arc and, if the turn is sharp, the bend. Turning back on the spot is not allowed.
    O(a log a) with a the number of pairs of arcs that follow one another.

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
    if source == target:
        return []
    prices = graph.cost if cost is None else cost
    arc_count = len(graph.row_node)
    tail = np.repeat(np.arange(graph.node_count), np.diff(graph.row_first))
    one, other = _following(graph, tail)
    out, into = arc_headings_rad(graph, tail)
    costs = graph.prices.costs
    sharp = np.degrees(turns_rad(into[one], out[other])) >= costs.sharp_bend_deg
    step = prices[other] + np.where(sharp, costs.sharp_bend_each, 0.0)
    # One row more for the start: its arcs lead to the arcs that leave the source.
    starts = np.arange(int(graph.row_first[source]), int(graph.row_first[source + 1]))
    counts = np.bincount(one, minlength=arc_count + 1)
    counts[arc_count] = len(starts)
    first = np.concatenate([[0], np.cumsum(counts)]).astype(np.int32)
    heads = np.concatenate([other, starts]).astype(np.int32)
    found, before = distances(
        first, heads, np.concatenate([step, prices[starts]]), source=arc_count
    )
    last = np.flatnonzero(graph.row_node == target)
    best = int(last[np.argmin(found[last])])
    if not np.isfinite(found[best]):
        raise LookupError
    arcs = [best]
    while int(before[arcs[-1]]) not in (arc_count, NO_NODE):
        arcs.append(int(before[arcs[-1]]))
    return arcs[::-1]


def _following(graph: Graph, tail: Whole) -> tuple[Whole, Whole]:
    """Return the pairs of arcs that follow one another, sorted by the first."""
    head = graph.row_node
    counts = np.diff(graph.row_first)[head]
    one = np.repeat(np.arange(len(head)), counts)
    within = np.arange(len(one)) - np.repeat(np.cumsum(counts) - counts, counts)
    other = graph.row_first[head[one]] + within
    # Straight back along the same piece is no way on; round a closed street it is.
    back = (graph.row_piece[one] == graph.row_piece[other]) & (tail[one] != head[one])
    return one[~back], other[~back]


def arc_headings_rad(graph: Graph, tail: Whole) -> tuple[Floats, Floats]:
    """Return the heading in which each arc leaves its tail and reaches its head."""
    network = graph.network
    count = graph.edge_count
    begin, end = network.shape_first[:-1], network.shape_first[1:] - 1
    shape = network.shape_lonlat
    leave, arrive = (
        headings_rad(shape[begin], shape[begin + 1]),
        headings_rad(shape[end - 1], shape[end]),
    )
    starts = network.edge_start
    if graph.pieces:
        cut = [edge_part(network, edge, low, high) for edge, low, high, _, _ in graph.pieces]
        heads = np.array([part[:2] for part in cut])
        tails = np.array([part[-2:] for part in cut])
        leave = np.concatenate([leave, headings_rad(heads[:, 0], heads[:, 1])])
        arrive = np.concatenate([arrive, headings_rad(tails[:, 0], tails[:, 1])])
        starts = np.concatenate([starts, [piece[3] for piece in graph.pieces]])
    piece = graph.row_piece
    forward = starts[piece] == tail
    loops = piece[: len(network.row_edge)]
    is_loop = np.zeros(len(piece), dtype=bool)
    known = loops < count
    ends = network.edge_end[np.minimum(loops, count - 1)]
    is_loop[: len(loops)] = known & (network.edge_start[np.minimum(loops, count - 1)] == ends)
    if is_loop.any():
        # The second of the two arcs of a closed street runs it backwards.
        at = np.flatnonzero(is_loop)
        order = at[np.argsort(piece[at], kind="stable")]
        forward[order[1::2]] = False
    out = np.where(forward, leave[piece], arrive[piece] + np.pi)
    into = np.where(forward, arrive[piece], leave[piece] + np.pi)
    return out, into
