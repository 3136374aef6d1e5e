"""One tree for many sites: the ways that join them all at least total cost."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Container, Mapping, Sequence

import numpy as np

from routeplan.errors import InfeasibleError, Problem
from routeplan.streets.anchors import OFF_STREET_MAX_M
from routeplan.streets.best import Site, site_graph
from routeplan.streets.costs import Prices
from routeplan.streets.graph import Graph, node_lonlat
from routeplan.streets.model import Floats, Network, Tree, Way
from routeplan.streets.search import distances
from routeplan.streets.steiner import exact_tree, exact_work, near_tree
from routeplan.streets.ways import tails_of, way_of

__all__ = ["EXACT_WORK_MAX", "site_tree"]

EXACT_WORK_MAX = 1.5e8
"""House rule: arcs and nodes looked at before the tree is no longer sought exactly; seconds."""


def site_tree(
    network: Network,
    sites: Sequence[Site],
    *,
    prices: Prices,
    off_street_max_m: float = OFF_STREET_MAX_M,
    exact_work_max: float = EXACT_WORK_MAX,
) -> Tree:
    """
    Return the ways that join all sites at least total cost, streets used by several laid once.

    Exact where 2^(k-1) searches of the network are few enough (ten sites at 10,000 edges, seven at
    100,000); otherwise within 2 - 2/k of the least cost for k sites. Sharp bends count inside
    streets, not from street to street.

    Parameters
    ----------
    network
        The network.
    sites
        Name, longitude and latitude of two sites or more. [deg]
    prices
        What the edges cost.
    off_street_max_m
        Longest walk from a site to its street. [m]
    exact_work_max
        Arcs and nodes looked at before the answer may be a near one.

    Raises
    ------
    InfeasibleError
        If the sites cannot be joined; those apart from the first are named.
    """
    graph = site_graph(network, sites, prices=prices, off_street_max_m=off_street_max_m)
    terminals = list(dict.fromkeys(graph.terminals))
    is_exact = len(terminals) <= 3 or exact_work(graph, len(terminals)) <= exact_work_max
    try:
        arcs = exact_tree(graph, terminals) if is_exact else near_tree(graph, terminals)
    except LookupError:
        raise _apart(graph) from None
    branches, ends, forks = _branches(graph, arcs)
    return Tree(
        branches=tuple(branches),
        ends=tuple(ends),
        branch_lonlat=_positions(graph, forks),
        length_m=sum(way.length_m for way in branches),
        cost=sum(way.cost for way in branches),
        is_exact=is_exact,
        guarantee_ratio=1.0 if is_exact else 2.0 - 2.0 / len(terminals),
    )


def _apart(graph: Graph) -> InfeasibleError:
    found, _ = distances(graph.row_first, graph.row_node, graph.cost, source=graph.terminals[0])
    first = graph.anchors[0].name
    names = [
        anchor.name
        for anchor, node in zip(graph.anchors, graph.terminals, strict=True)
        if not np.isfinite(found[node])
    ]
    return InfeasibleError(
        Problem(
            where=", ".join(names),
            what=f'cannot be reached from "{first}": the streets do not meet, or are closed',
            remedy="Take a larger extract, open a road class, or shrink an area.",
        )
    )


def _branches(
    graph: Graph, arcs: Sequence[int]
) -> tuple[list[Way], list[tuple[int, int]], list[int]]:
    """Return the ways between sites and forks, what ends each, and the forks' nodes."""
    meeting: dict[int, list[int]] = defaultdict(list)
    for arc, tail in zip(arcs, tails_of(graph, arcs), strict=True):
        head = int(graph.row_node[arc])
        meeting[tail].append(arc)
        meeting[head].append(_back(graph, arc, tail))
    first_site: dict[int, int] = {}
    for number, node in enumerate(graph.terminals):
        first_site.setdefault(node, number)
    # Several sites at one place on the streets, or one in the middle of the tree with a walk of
    # its own, hang on a fork there.
    crowded = {
        node
        for number, node in enumerate(graph.terminals)
        if graph.terminals.count(node) > 1 or (_walks(graph, number) and len(meeting[node]) > 1)
    }
    forks = sorted(
        {node for node, own in meeting.items() if len(own) > 2 and node not in first_site} | crowded
    )
    number_of = {node: -1 - at for at, node in enumerate(forks)}
    for node, site in first_site.items():
        number_of.setdefault(node, site)
    ways, ends = [], []
    for site, node in enumerate(graph.terminals):
        if node in crowded:
            ways.append(way_of(graph, [[]], (site, None)))
            ends.append((site, number_of[node]))
    seen: set[int] = set()
    for node in sorted(number_of):
        for arc in meeting[node]:
            if int(graph.row_piece[arc]) in seen:
                continue
            chain = _chain(graph, meeting, arc, stops=number_of)
            seen.update(int(graph.row_piece[each]) for each in chain)
            one, other = number_of[node], number_of[int(graph.row_node[chain[-1]])]
            sites = tuple(end if end >= 0 else None for end in (one, other))
            ways.append(way_of(graph, [chain], sites))
            ends.append((one, other))
    return ways, ends, forks


def _chain(
    graph: Graph, meeting: Mapping[int, Sequence[int]], arc: int, *, stops: Container[int]
) -> list[int]:
    """Return the arcs from one of them on, up to a site or fork."""
    chain = [arc]
    while (node := int(graph.row_node[chain[-1]])) not in stops:
        piece = int(graph.row_piece[chain[-1]])
        chain.append(next(on for on in meeting[node] if int(graph.row_piece[on]) != piece))
    return chain


def _walks(graph: Graph, number: int) -> bool:
    return graph.anchors[number].walk_m >= 0.05


def _back(graph: Graph, arc: int, tail: int) -> int:
    head, piece = int(graph.row_node[arc]), int(graph.row_piece[arc])
    first, last = int(graph.row_first[head]), int(graph.row_first[head + 1])
    own = (graph.row_piece[first:last] == piece) & (graph.row_node[first:last] == tail)
    return first + int(np.flatnonzero(own)[0])


def _positions(graph: Graph, nodes: Sequence[int]) -> Floats:
    return np.array([node_lonlat(graph, node) for node in nodes]).reshape(-1, 2)
