"""Other ways worth weighing: sensibly different from the best one and from each other."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from routeplan.errors import InputError, Problem
from routeplan.streets.anchors import OFF_STREET_MAX_M
from routeplan.streets.best import Site, legs_between, site_graph
from routeplan.streets.costs import Prices
from routeplan.streets.exposure import near_m_of
from routeplan.streets.graph import Graph
from routeplan.streets.inside import near_ratios
from routeplan.streets.model import Floats, Network, OtherWays, Way
from routeplan.streets.ways import tails_of, way_of

__all__ = ["other_ways"]

_NEAR_M = 30.0  # house rule: both sides of a street, and both carriageways, are one way
_RISE = 0.35
_ROUNDS_EACH = 12
_PETTY_RATIO = 0.06
_POINT_STEP_M = 20.0


def other_ways(
    network: Network,
    sites: Sequence[Site],
    *,
    prices: Prices,
    count: int = 3,
    overlap_max_ratio: float = 0.5,
    dearer_max_ratio: float = 1.6,
    near_m: float = _NEAR_M,
    off_street_max_m: float = OFF_STREET_MAX_M,
) -> OtherWays:
    """
    Return the best way and others that a planner would call different.

    The first is exact. The others come from searching again with the streets near all earlier ways
    made dearer, step by step, until a way turns up that runs within `near_m` of no earlier one for
    more than `overlap_max_ratio` of its length. Detours round single blocks are put back on the
    best way. They are good ways, not proven to be the next best; there may be fewer than wanted.

    Parameters
    ----------
    network
        The network.
    sites
        Name, longitude and latitude of two sites or more, in order. [deg]
    prices
        What the edges cost.
    count
        How many ways are wanted, the best one included.
    overlap_max_ratio
        Largest share of a way that may run along one earlier way. [-]
    dearer_max_ratio
        How much dearer than the best a way may be, as a multiple. [-]
    near_m
        From how near on two ways run along each other. [m]
    off_street_max_m
        Longest walk from a site to its street. [m]

    Raises
    ------
    InputError
        If a number is out of range.
    InfeasibleError
        If there is no way at all.
    """
    _check(count, overlap_max_ratio, dearer_max_ratio)
    graph = site_graph(network, sites, prices=prices, off_street_max_m=off_street_max_m)
    best_legs = legs_between(graph)
    numbers = range(len(sites))
    ways = [way_of(graph, best_legs, numbers)]
    overlaps = [0.0]
    edge_of = np.arange(graph.edge_count + len(graph.pieces))
    edge_of[graph.edge_count :] = [piece[0] for piece in graph.pieces]
    burden = near_ratios(network, ways[0].lonlat, near_m=near_m)
    tried: set[tuple[int, ...]] = set()
    for _ in range(_ROUNDS_EACH * (count - 1)):
        if len(ways) == count:
            break
        cost = graph.cost * (1.0 + _RISE * burden[edge_of[graph.row_piece]])
        legs = legs_between(graph, cost=cost)
        key = tuple(arc for leg in legs for arc in leg)
        if key in tried:
            burden *= 1.0 + _RISE
            continue
        tried.add(key)
        legs = _without_petty(graph, legs, best_legs)
        way = way_of(graph, legs, numbers)
        overlap = max(_overlap_ratio(way, earlier, near_m) for earlier in ways)
        if overlap <= overlap_max_ratio and way.cost <= dearer_max_ratio * ways[0].cost:
            ways.append(way)
            overlaps.append(overlap)
        burden += near_ratios(network, way.lonlat, near_m=near_m)
    order = sorted(range(len(ways)), key=lambda number: (number > 0, ways[number].cost))
    return OtherWays(
        ways=tuple(ways[number] for number in order),
        overlap_ratios=tuple(overlaps[number] for number in order),
        overlap_max_ratio=overlap_max_ratio,
        near_m=near_m,
        wanted_count=count,
    )


def _check(count: int, overlap_max_ratio: float, dearer_max_ratio: float) -> None:
    problems = []
    if not 1 <= count <= 20:
        problems.append(
            Problem(
                where="number of ways", what="is out of range", value=str(count), limit="1 to 20"
            )
        )
    if not 0.0 < overlap_max_ratio < 1.0:
        problems.append(
            Problem(
                where="overlap of ways",
                what="is out of range",
                value=f"{overlap_max_ratio:g}",
                limit="more than 0, less than 1",
            )
        )
    if not dearer_max_ratio >= 1.0:
        problems.append(
            Problem(
                where="how much dearer a way may be",
                what="is out of range",
                value=f"{dearer_max_ratio:g}",
                limit="at least 1",
            )
        )
    if problems:
        raise InputError(problems)


def _overlap_ratio(way: Way, earlier: Way, near_m: float) -> float:
    """Return the share of a way that runs within a distance of an earlier one."""
    steps = max(int(way.length_m / _POINT_STEP_M), 1)
    chain = np.linspace(0.0, 1.0, steps + 1)
    points = _points(way.lonlat, chain)
    return float((near_m_of(points, earlier.lonlat, most_m=near_m) <= near_m).mean())


def _points(lonlat: Floats, shares: Floats) -> Floats:
    from routeplan.geodesy import steps_m, unwrapped

    chain = np.concatenate([[0.0], np.cumsum(steps_m(lonlat))])
    at = shares * chain[-1]
    return np.column_stack(
        [np.interp(at, chain, unwrapped(lonlat[:, 0])), np.interp(at, chain, lonlat[:, 1])]
    )


def _without_petty(
    graph: Graph, legs: Sequence[Sequence[int]], best: Sequence[Sequence[int]]
) -> list[list[int]]:
    """Return the legs with detours that are short beside the whole put back on the best way."""
    return [_mended(graph, list(leg), list(own)) for leg, own in zip(legs, best, strict=True)]


def _mended(graph: Graph, leg: list[int], best: list[int]) -> list[int]:
    if not leg or not best:
        return leg
    target = int(graph.row_node[best[-1]])
    best_nodes = [*tails_of(graph, best), target]
    nodes = [*tails_of(graph, leg), target]
    place = {node: at for at, node in enumerate(best_nodes)}
    limit = _PETTY_RATIO * float(graph.cost[best].sum())
    mended: list[int] = []
    since, mark = 0, place[nodes[0]]
    for at in range(1, len(nodes)):
        here = place.get(nodes[at])
        if here is None:
            continue
        detour = leg[since:at]
        usual = best[mark:here] if here >= mark else detour
        petty = float(graph.cost[detour].sum()) <= limit
        mended.extend(usual if petty else detour)
        since, mark = at, here
    return mended
