"""Two separate ways between two sites, and everything they still have in common."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Literal

import numpy as np

from routeplan.errors import InfeasibleError, InputError, Problem
from routeplan.streets.anchors import OFF_STREET_MAX_M
from routeplan.streets.best import Site, legs_between, no_way, site_graph
from routeplan.streets.bottleneck import bottlenecks_of, no_pair
from routeplan.streets.costs import Prices
from routeplan.streets.exposure import exposures_between
from routeplan.streets.graph import Graph
from routeplan.streets.inside import near_ratios
from routeplan.streets.model import Floats, Network, SeparateWays, Way
from routeplan.streets.residual import PairArcs, least_pair
from routeplan.streets.ways import way_of

__all__ = ["SHARED_FACTOR", "exposed_m", "separate_ways"]

SHARED_FACTOR = 10_000.0
"""How many times its price a street costs the second way, where sharing cannot be helped."""
_EXPOSED_M = 25.0  # house rule: one digger, one burst main, one flooded dip
_ROUNDS = 8
_NEAR_FACTOR = 4.0


def separate_ways(
    network: Network,
    sites: Sequence[Site],
    *,
    prices: Prices,
    apart: Literal["streets", "junctions"] = "streets",
    share: Literal["never", "least"] = "never",
    distance_m: float | None = None,
    off_street_max_m: float = OFF_STREET_MAX_M,
) -> SeparateWays:
    """
    Return two ways of least total cost that share no street, or no junction either.

    Exact: no two ways under the same rule cost less together. Sharp bends count inside streets,
    not from street to street. Where every way has to take one street, `share="least"` lets both
    take it at ten thousand times its price, and is exact for those prices. With `distance_m` the
    ways are also driven apart: the best found in a few rounds, never said to be exact.

    Parameters
    ----------
    network
        The network.
    sites
        The two sites: name, longitude and latitude. [deg]
    prices
        What the edges cost.
    apart
        What the two may not share.
    share
        Whether they may share what they must.
    distance_m
        How far apart they should keep; None: 25 m are looked at but not aimed for. [m]
    off_street_max_m
        Longest walk from a site to its street. [m]

    Raises
    ------
    InfeasibleError
        If there is no such pair: the streets or junctions every way takes are named.
    """
    _check(sites, distance_m)
    graph = site_graph(network, sites, prices=prices, off_street_max_m=off_street_max_m)
    source, target = graph.terminals
    if source == target:
        raise InputError(
            Problem(
                where=f"{sites[0][0]} to {sites[1][0]}",
                what="begin and end at one place on the streets: there is nothing to separate",
                remedy="Give two sites on different places of the streets.",
            )
        )
    by_junction = apart == "junctions"
    factor = SHARED_FACTOR if share == "least" else np.inf
    pair = _pair(graph, source, target, by_junction=by_junction, factor=factor)
    is_tied = pair.second is None or share == "least"
    found = bottlenecks_of(graph, pair.first, target, by_junction=by_junction) if is_tied else ()
    if pair.second is None:
        raise no_pair((sites[0][0], sites[1][0]), found)
    main, standby = _ways(graph, pair)
    exact = _result(main, standby, apart=apart, distance_m=distance_m or _EXPOSED_M)
    if distance_m is not None:
        exact = _driven_apart(graph, exact, by_junction=by_junction, factor=factor)
    return replace(exact, bottlenecks=found)


def _check(sites: Sequence[Site], distance_m: float | None) -> None:
    if len(sites) != 2:
        raise InputError(
            Problem(
                where="sites",
                what="two separate ways run between two sites",
                value=f"{len(sites)} given",
            )
        )
    if distance_m is not None and not 0.0 < distance_m <= 1e5:
        raise InputError(
            Problem(
                where="distance between the ways",
                what="is out of range",
                value=f"{distance_m:g} m",
                limit="more than 0, at most 100 000 m",
            )
        )


def _pair(graph: Graph, source: int, target: int, *, by_junction: bool, factor: float) -> PairArcs:
    try:
        return least_pair(graph, source, target, by_junction=by_junction, shared_factor=factor)
    except LookupError:
        raise no_way(graph, graph.anchors[0], graph.anchors[1]) from None


def _ways(graph: Graph, pair: PairArcs) -> tuple[Way, Way]:
    assert pair.second is not None
    return way_of(graph, [pair.first], (0, 1)), way_of(graph, [pair.second], (0, 1))


def _result(
    main: Way, standby: Way, *, apart: Literal["streets", "junctions"], distance_m: float
) -> SeparateWays:
    main, standby = sorted((main, standby), key=lambda way: way.cost)
    no_shared = "no street" if apart == "streets" else "no street and no junction"
    return SeparateWays(
        main=main,
        standby=standby,
        cost=main.cost + standby.cost,
        apart=apart,
        is_exact=True,
        rule=f"least total cost of two ways that share {no_shared}",
        distance_m=distance_m,
        exposures=exposures_between(main, standby, distance_m=distance_m),
        bottlenecks=(),
    )


def exposed_m(ways: SeparateWays) -> float:
    """Return how much of the main way one event could cut together with the standby. [m]"""
    return sum(each.length_m for each in ways.exposures)


def _driven_apart(
    graph: Graph, exact: SeparateWays, *, by_junction: bool, factor: float
) -> SeparateWays:
    """
    Return the pair with the least length too near to each other, then the least cost, of a few.

    In turn one way is held, streets near it are made dearer, and the pair is searched anew.
    """
    best = exact
    for held in (exact.main, exact.standby):
        near = near_ratios(graph.network, held.lonlat, near_m=exact.distance_m)
        rise = 1.0
        for _ in range(_ROUNDS // 2):
            rise *= _NEAR_FACTOR
            other = _other_way(graph, held, near, rise, by_junction=by_junction, factor=factor)
            if other is None:
                break
            trial = _result(held, other, apart=exact.apart, distance_m=exact.distance_m)
            if (exposed_m(trial), trial.cost) < (exposed_m(best), best.cost):
                best = trial
    left_m = exposed_m(best)
    told = "all of it" if left_m == 0 else f"all but {left_m:.0f} m of it"
    return replace(
        best,
        is_exact=False,
        rule=f"{exact.rule}, driven {exact.distance_m:g} m apart for {told}: the best of the "
        f"pairs tried, not proven",
    )


def _other_way(
    graph: Graph, held: Way, near: Floats, rise: float, *, by_junction: bool, factor: float
) -> Way | None:
    """Return the best way apart from the one held, streets near it made dearer."""
    network = graph.network
    edge_of = np.arange(graph.edge_count + len(graph.pieces))
    edge_of[graph.edge_count :] = [piece[0] for piece in graph.pieces]
    share = near[edge_of[graph.row_piece]]
    cost = graph.cost * (1.0 + (rise - 1.0) * share)
    used = {part.edge for part in held.parts if part.edge >= 0}
    # A street cut by a site may be used by both, each its own end of it.
    whole = used - {piece[0] for piece in graph.pieces}
    taken = np.isin(graph.row_piece, sorted(whole))
    for number, (edge, from_m, to_m, _, _) in enumerate(graph.pieces):
        middle = 0.5 * (from_m + to_m)
        if any(
            part.edge == edge and min(part.from_m, part.to_m) < middle < max(part.from_m, part.to_m)
            for part in held.parts
        ):
            taken |= graph.row_piece == graph.edge_count + number
    if by_junction:
        ends = set(graph.terminals)
        nodes = {
            int(node)
            for edge in used
            for node in (network.edge_start[edge], network.edge_end[edge])
        }
        own = _inner_nodes(graph, held)
        taken |= np.isin(graph.row_node, sorted((nodes & own) - ends))
    cost = np.where(taken, cost * factor, cost)
    try:
        legs = legs_between(graph, cost=cost)
    except InfeasibleError:
        return None
    return way_of(graph, legs, (0, 1))


def _inner_nodes(graph: Graph, way: Way) -> set[int]:
    """Return the junctions a way passes."""
    network = graph.network
    found: set[int] = set()
    for part in way.parts:
        if part.edge >= 0:
            for at_m in (part.from_m, part.to_m):
                if at_m <= 0.0:
                    found.add(int(network.edge_start[part.edge]))
                elif at_m >= float(network.length_m[part.edge]):
                    found.add(int(network.edge_end[part.edge]))
    return found
