"""What every way between two sites has to take: bridges of the graph, and its cut junctions."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from routeplan.errors import InfeasibleError, Problem
from routeplan.geodesy import wrapped
from routeplan.streets.edges import cumulative_m, edge_shape
from routeplan.streets.graph import Graph, piece_of
from routeplan.streets.model import Bottleneck, Floats, Whole
from routeplan.streets.ways import tails_of

__all__ = ["bottlenecks_of", "no_pair", "spoken"]

_NAMED = 3


def bottlenecks_of(
    graph: Graph, arcs: Sequence[int], target: int, *, by_junction: bool
) -> tuple[Bottleneck, ...]:
    """
    Return the streets, or the junctions, that every way between two nodes takes.

    Exact, from any one way: what hangs together without that way spans a range of its nodes, and
    only what no range spans is a bottleneck. O(m).

    Parameters
    ----------
    graph
        The graph.
    arcs
        The arcs of any way from the first node to the second.
    target
        The node where it ends.
    by_junction
        Whether junctions count, too.
    """
    path = np.array([*tails_of(graph, arcs), target])
    low, high = _spans(graph, arcs, path, open_nodes=not by_junction)
    if by_junction:
        # Junction i is passed round if a span reaches from before it to behind it.
        reach = np.zeros(len(path) + 1, dtype=np.int64)
        np.add.at(reach, np.minimum(low + 1, high), 1)
        np.add.at(reach, high, -1)
        covered = np.cumsum(reach)[: len(path)] > 0
        cut = (np.flatnonzero(~covered[1:-1]) + 1).tolist()
        found = [_junction(graph, int(path[at]), arcs[at]) for at in cut]
        if len(path) > 2:
            return tuple(found)
    reach = np.zeros(len(path) + 1, dtype=np.int64)
    np.add.at(reach, low, 1)
    np.add.at(reach, high, -1)
    covered = np.cumsum(reach)[: len(path) - 1] > 0
    cut = np.flatnonzero(~covered).tolist()
    return tuple(_merged([_street(graph, arcs[at], int(path[at])) for at in cut]))


def _spans(
    graph: Graph, arcs: Sequence[int], path: Whole, *, open_nodes: bool
) -> tuple[Whole, Whole]:
    """Return for everything that hangs together off the way the first and last of its nodes."""
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    size = graph.node_count
    tail = np.repeat(np.arange(size), np.diff(graph.row_first))
    keep = np.isfinite(graph.cost) & ~np.isin(graph.row_piece, graph.row_piece[np.asarray(arcs)])
    position = np.full(size, -1, dtype=np.int64)
    position[path] = np.arange(len(path))
    on_way = position >= 0
    head = graph.row_node
    if open_nodes:
        one, other = tail[keep], head[keep]
        label = connected_components(
            csr_array((np.ones(len(one), dtype=np.int8), (one, other)), shape=(size, size)),
            directed=False,
        )[1]
        groups = [(label[path], np.arange(len(path)))]
    else:
        # Off the way, parts hang together; each touches the way at the nodes next to it.
        inner = keep & ~on_way[tail] & ~on_way[head]
        ones = np.ones(int(inner.sum()), dtype=np.int8)
        label = connected_components(
            csr_array((ones, (tail[inner], head[inner])), shape=(size, size)), directed=False
        )[1]
        touch = keep & on_way[tail] & ~on_way[head]
        groups = [(label[head[touch]], position[tail[touch]])]
    count = int(label.max()) + 1
    low = np.full(count, len(path))
    high = np.full(count, -1)
    for number, at in groups:
        np.minimum.at(low, number, at)
        np.maximum.at(high, number, at)
    used = high > low
    low, high = low[used], high[used]
    if not open_nodes:
        chord = keep & on_way[tail] & on_way[head] & (position[tail] < position[head])
        low = np.concatenate([low, position[tail[chord]]])
        high = np.concatenate([high, position[head[chord]]])
    return low, high


def _junction(graph: Graph, node: int, arc: int) -> Bottleneck:
    network = graph.network
    tail = tails_of(graph, [arc])[0]
    edge, from_m, _ = piece_of(graph, int(graph.row_piece[arc]), tail)
    lon, lat = _place(graph, edge, from_m)
    first, last = int(network.row_first[min(node, len(network.node_lonlat) - 1)]), 0
    names: list[str] = []
    if node < len(network.node_lonlat):
        last = int(network.row_first[node + 1])
        codes = network.name[network.row_edge[first:last]]
        names = sorted({network.name_words[int(code)] for code in codes} - {""})
    return Bottleneck(
        kind="junction",
        name=" and ".join(names[:_NAMED]),
        road_class=network.class_words[int(network.road_class[edge])],
        is_bridge=False,
        is_tunnel=False,
        lon=lon,
        lat=lat,
        length_m=0.0,
    )


def _street(graph: Graph, arc: int, tail: int) -> Bottleneck:
    network = graph.network
    edge, from_m, to_m = piece_of(graph, int(graph.row_piece[arc]), tail)
    lon, lat = _place(graph, edge, 0.5 * (from_m + to_m))
    return Bottleneck(
        kind="street",
        name=network.name_words[int(network.name[edge])],
        road_class=network.class_words[int(network.road_class[edge])],
        is_bridge=bool(network.is_bridge[edge]),
        is_tunnel=bool(network.is_tunnel[edge]),
        lon=lon,
        lat=lat,
        length_m=abs(to_m - from_m),
    )


def _place(graph: Graph, edge: int, along_m: float) -> tuple[float, float]:
    shape: Floats = edge_shape(graph.network, edge)
    chain = cumulative_m(graph.network, edge)
    lon, lat = (float(np.interp(along_m, chain, shape[:, axis])) for axis in (0, 1))
    return float(wrapped(np.array([lon]))[0]), lat


def _merged(found: Sequence[Bottleneck]) -> list[Bottleneck]:
    """Return pieces of one street that follow one another as one."""
    kept: list[Bottleneck] = []
    for each in found:
        last = kept[-1] if kept else None
        if last and (last.name, last.road_class, last.is_bridge, last.is_tunnel) == (
            each.name,
            each.road_class,
            each.is_bridge,
            each.is_tunnel,
        ):
            kept[-1] = Bottleneck(
                kind="street",
                name=last.name,
                road_class=last.road_class,
                is_bridge=last.is_bridge,
                is_tunnel=last.is_tunnel,
                lon=last.lon,
                lat=last.lat,
                length_m=last.length_m + each.length_m,
            )
        else:
            kept.append(each)
    return kept


def spoken(each: Bottleneck) -> str:
    """Return a bottleneck as a sentence names it."""
    what = "junction" if each.kind == "junction" else "street"
    if each.is_bridge:
        what = "bridge"
    elif each.is_tunnel:
        what = "tunnel"
    name = f'{what} "{each.name}"' if each.name else f"{what} ({each.road_class})"
    size = f", {each.length_m:.0f} m" if each.length_m else ""
    return f"the {name} at {each.lon:.6f}, {each.lat:.6f}{size}"


def no_pair(names: tuple[str, str], found: Sequence[Bottleneck]) -> InfeasibleError:
    """Return the error that names what every way has to take."""
    shown = sorted(found, key=lambda each: (not (each.is_bridge or each.is_tunnel), -each.length_m))
    more = len(shown) - _NAMED
    listed = "; ".join(spoken(each) for each in shown[:_NAMED])
    return InfeasibleError(
        Problem(
            where=f"{names[0]} to {names[1]}",
            what=f"there are no two separate ways: every way takes {listed}"
            + (f", and {more} more" if more > 0 else ""),
            remedy="Allow what has to be shared, or give a network with another way past it.",
        )
    )
