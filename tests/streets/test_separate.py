"""Two separate ways against a linear programme, traps, bottlenecks and what is still shared."""

from __future__ import annotations

from collections import Counter

import networkx as nx
import numpy as np
import pytest

from routeplan.errors import InfeasibleError, InputError
from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.best import site_graph
from routeplan.streets.bottleneck import bottlenecks_of
from routeplan.streets.costs import prices_of, street_costs
from routeplan.streets.exposure import exposures_between
from routeplan.streets.graph import Graph
from routeplan.streets.model import Network
from routeplan.streets.residual import PairArcs, least_pair
from routeplan.streets.search import least_arcs
from routeplan.streets.separate import separate_ways
from routeplan.streets.ways import tails_of
from tests.streets.independent import least_pair_cost
from tests.streets.small_networks import (
    STEP,
    drawn_network,
    network_of,
    node_graph,
    priced,
    random_sites,
)


def walk_is_whole(graph: Graph, arcs: list[int], source: int, target: int) -> bool:
    """Tell whether arcs lead from one node to another without a node twice."""
    nodes = [*tails_of(graph, arcs), target]
    heads = [int(graph.row_node[arc]) for arc in arcs]
    return nodes[0] == source and heads == nodes[1:] and len(set(nodes)) == len(nodes)


def objective(graph: Graph, pair: PairArcs, *, by_junction: bool, factor: float) -> float:
    """Return what a pair costs when what it uses twice is dearer the second time."""
    assert pair.second is not None
    total = 0.0
    pieces = Counter(int(graph.row_piece[arc]) for arc in (*pair.first, *pair.second))
    prices = {int(graph.row_piece[arc]): graph.cost[arc] for arc in (*pair.first, *pair.second)}
    for piece, count in pieces.items():
        total += prices[piece] * (1.0 if count == 1 else 1.0 + factor)
    if by_junction:
        nodes = Counter(n for arcs in (pair.first, pair.second) for n in tails_of(graph, arcs)[1:])
        for node, count in nodes.items():
            if count == 2:
                row = slice(int(graph.row_first[node]), int(graph.row_first[node + 1]))
                total += factor * graph.cost[row].min()
    return float(total)


def check_pair(
    graph: Graph, source: int, target: int, *, by_junction: bool
) -> tuple[float, PairArcs]:
    """Compare a pair with the linear programme; return its cost."""
    wanted = least_pair_cost(graph, source, target, by_junction=by_junction)
    pair = least_pair(graph, source, target, by_junction=by_junction)
    if pair.second is None:
        assert np.isinf(wanted)
        return np.inf, pair
    for arcs in (pair.first, pair.second):
        assert walk_is_whole(graph, arcs, source, target)
    own = float(graph.cost[pair.first].sum() + graph.cost[pair.second].sum())
    assert own == pytest.approx(wanted, rel=1e-8)
    assert not {*graph.row_piece[pair.first]} & {*graph.row_piece[pair.second]}
    if by_junction:
        inner = [set(tails_of(graph, arcs)[1:]) for arcs in (pair.first, pair.second)]
        assert not inner[0] & inner[1]
    return own, pair


@pytest.mark.parametrize("by_junction", [False, True])
def test_pairs_on_drawn_networks(by_junction: bool) -> None:
    """On hundreds of small networks the pair costs what a linear programme finds."""
    found = none = 0
    for seed in range(250):
        network = drawn_network(seed)
        rng = np.random.default_rng(seed)
        prices = priced(network, rng.integers(0, 40, len(network.length_m)))
        one, other = (int(n) for n in rng.choice(len(network.node_lonlat), 2, replace=False))
        graph = node_graph(network, prices, [one, other])
        try:
            cost, _ = check_pair(graph, one, other, by_junction=by_junction)
        except LookupError:
            continue
        found += np.isfinite(cost)
        none += np.isinf(cost)
    assert found > 100
    assert none > 20


@pytest.mark.parametrize(("name", "count"), [("nauru", 70), ("helsinki", 20)])
@pytest.mark.parametrize("by_junction", [False, True])
def test_pairs_on_real_streets(
    name: str, count: int, by_junction: bool, request: pytest.FixtureRequest
) -> None:
    """On real streets, from places part-way along them, the pair is the programme's."""
    network: Network = request.getfixturevalue(name)
    prices = prices_of(network, street_costs())
    found = 0
    for seed in range(count):
        sites = random_sites(network, 2, 300 + seed)
        graph = site_graph(network, sites, prices=prices, off_street_max_m=500.0)
        source, target = graph.terminals
        if source == target:
            continue
        cost, pair = check_pair(graph, source, target, by_junction=by_junction)
        found += np.isfinite(cost)
        if pair.second is None:
            assert bottlenecks_of(graph, pair.first, target, by_junction=by_junction)
    assert found >= count // 5


def test_a_trap_that_catches_the_greedy() -> None:
    """Where the best way blocks every second one, a pair is found all the same."""
    positions = np.array([[10.0, 50.0], [10.002, 50.002], [10.002, 49.998], [10.004, 50.0]])
    network = network_of([(0, 1), (1, 2), (2, 3), (0, 2), (1, 3)], positions)
    cost = {frozenset(pair): c for pair, c in
            (((0, 1), 1), ((1, 2), 1), ((2, 3), 1), ((0, 2), 10), ((1, 3), 10))}  # fmt: skip
    order = np.argsort(np.array([10.0, 10.002, 10.002, 10.004]), kind="stable")
    number = {  # the node of each position
        k: int(np.argmin(np.abs(network.node_lonlat - positions[k]).sum(axis=1))) for k in order
    }
    back = {node: k for k, node in number.items()}
    prices = priced(
        network,
        np.array([
            cost[frozenset((back[int(a)], back[int(b)]))]
            for a, b in zip(network.edge_start, network.edge_end, strict=True)
        ]),
    )  # fmt: skip
    source, target = number[0], number[3]
    graph = node_graph(network, prices, [source, target])
    greedy = graph.cost.copy()
    for arc in least_arcs(graph, source, target):
        greedy[graph.row_piece == graph.row_piece[arc]] = np.inf
    with pytest.raises(LookupError):
        least_arcs(graph, source, target, cost=greedy)
    for by_junction in (False, True):
        own, _ = check_pair(graph, source, target, by_junction=by_junction)
        assert own == 22.0


def test_traps_are_common() -> None:
    """Among drawn networks are many where taking the best way first fails or costs more."""
    fails = dearer = 0
    for seed in range(250):
        network = drawn_network(seed)
        rng = np.random.default_rng(seed)
        prices = priced(network, rng.integers(1, 40, len(network.length_m)))
        one, other = (int(n) for n in rng.choice(len(network.node_lonlat), 2, replace=False))
        graph = node_graph(network, prices, [one, other])
        try:
            pair = least_pair(graph, one, other, by_junction=False)
        except LookupError:
            continue
        if pair.second is None:
            continue
        best = least_arcs(graph, one, other)
        left = graph.cost.copy()
        left[np.isin(graph.row_piece, graph.row_piece[best])] = np.inf
        own = graph.cost[pair.first].sum() + graph.cost[pair.second].sum()
        try:
            second = least_arcs(graph, one, other, cost=left)
        except LookupError:
            fails += 1
            continue
        greedy = graph.cost[best].sum() + graph.cost[second].sum()
        assert own <= greedy + 1e-9
        dearer += own < greedy - 1e-9
    assert fails + dearer >= 5


@pytest.mark.parametrize("by_junction", [False, True])
def test_sharing_the_least(by_junction: bool) -> None:
    """Where something has to be shared, the pair is the programme's with dear second uses."""
    shared = 0
    for seed in range(150):
        network = drawn_network(seed, size=4)
        rng = np.random.default_rng(seed)
        prices = priced(network, rng.integers(1, 40, len(network.length_m)))
        one, other = (int(n) for n in rng.choice(len(network.node_lonlat), 2, replace=False))
        graph = node_graph(network, prices, [one, other])
        try:
            pair = least_pair(graph, one, other, by_junction=by_junction, shared_factor=50.0)
        except LookupError:
            continue
        wanted = least_pair_cost(graph, one, other, by_junction=by_junction, factor=50.0)
        own = objective(graph, pair, by_junction=by_junction, factor=50.0)
        assert own == pytest.approx(wanted, rel=1e-9)
        assert pair.second is not None
        shared += bool({*graph.row_piece[pair.first]} & {*graph.row_piece[pair.second]})
    assert shared > 20


@pytest.mark.parametrize("by_junction", [False, True])
def test_bottlenecks_are_all_and_only_the_cuts(by_junction: bool) -> None:
    """What is named is what cuts the two nodes apart when it is taken out, by networkx."""
    for seed in range(120):
        network = drawn_network(seed, size=4, parallel=2)
        rng = np.random.default_rng(seed)
        prices = priced(network, rng.integers(1, 40, len(network.length_m)))
        one, other = (int(n) for n in rng.choice(len(network.node_lonlat), 2, replace=False))
        graph = node_graph(network, prices, [one, other])
        try:
            arcs = least_arcs(graph, one, other)
        except LookupError:
            continue
        whole = nx.MultiGraph()
        ends = zip(network.edge_start.tolist(), network.edge_end.tolist(), strict=True)
        whole.add_edges_from((a, b, e) for e, (a, b) in enumerate(ends))
        path = [*tails_of(graph, arcs), other]
        cuts = 0
        if by_junction and len(path) > 2:
            for node in path[1:-1]:
                left = whole.copy()
                left.remove_node(node)
                cuts += not nx.has_path(left, one, other)
        else:
            for arc in arcs:
                left = whole.copy()
                edge = int(graph.row_piece[arc])
                left.remove_edge(int(network.edge_start[edge]), int(network.edge_end[edge]), edge)
                cuts += not nx.has_path(left, one, other)
        found = bottlenecks_of(graph, arcs, other, by_junction=by_junction)
        if by_junction and len(path) > 2:
            assert len(found) == cuts
        else:  # pieces of one street that follow each other are told once
            length = sum(each.length_m for each in found)
            assert (length > 0) == (cuts > 0)
            assert len(found) <= cuts


def river_town() -> Network:
    """Return two blocks of streets joined by one bridge."""

    def block(west: float) -> list[np.ndarray]:
        corner = np.array([[0, 0], [1, 0], [1, 1], [0, 1], [0, 0]]) * STEP
        ring = corner + np.array([west, 50.0])
        return [ring[k : k + 2] for k in range(4)]

    bridge = np.array([[10.0 + STEP, 50.0 + STEP], [10.005, 50.0 + STEP]])
    lines = [*block(10.0), bridge, *block(10.005)]
    names = [f"West {k}" for k in range(4)] + ["Long Bridge"] + [f"East {k}" for k in range(4)]
    flags = [name == "Long Bridge" for name in names]
    return assembled(lines_from(lines, road_class=["street"] * 9, name=names, is_bridge=flags))


SITES = [("A", 10.0, 50.0), ("B", 10.007, 50.0)]


def test_the_bridge_is_named() -> None:
    """When no pair exists the error names the bridge, with its length and place."""
    network = river_town()
    prices = prices_of(network, street_costs())
    with pytest.raises(InfeasibleError, match=r'every way takes the bridge "Long Bridge" at 10\.'):
        separate_ways(network, SITES, prices=prices)
    with pytest.raises(InfeasibleError, match="junction"):
        separate_ways(network, SITES, prices=prices, apart="junctions")


def test_what_must_be_shared_is_listed() -> None:
    """Sharing the least, both ways take the bridge and nothing else, and it is listed."""
    network = river_town()
    prices = prices_of(network, street_costs())
    pair = separate_ways(network, SITES, prices=prices, share="least", distance_m=None)
    assert [each.name for each in pair.bottlenecks] == ["Long Bridge"]
    shared = [each for each in pair.exposures if each.kind == "shared"]
    assert [each.name for each in shared] == ["Long Bridge"]
    assert shared[0].is_bridge
    bridge = network.length_m[network.is_bridge][0]
    assert shared[0].length_m == pytest.approx(bridge, rel=1e-6)
    again = separate_ways(network, SITES, prices=prices, share="least", apart="junctions")
    assert again.cost == pytest.approx(pair.cost)
    assert {each.kind for each in again.bottlenecks} == {"junction"}


def test_passing_near_is_listed_with_its_length() -> None:
    """Streets 20 m apart are near at 25 m for their whole length and not at 15 m."""
    north = 20.0 / 111_229.0
    lines = [
        np.array([[10.0, 50.0], [10.0, 50.001], [10.01, 50.001], [10.01, 50.0]]),
        np.array([[10.0, 50.0], [9.9999, 50.0005], [9.9999, 50.001 + north],
                  [10.0101, 50.001 + north], [10.0101, 50.0005], [10.01, 50.0]]),
    ]  # fmt: skip
    network = assembled(lines_from(lines, road_class=["street"] * 2))
    prices = prices_of(network, street_costs())
    pair = separate_ways(network, [("A", 10.0, 50.0), ("B", 10.01, 50.0)], prices=prices)
    near = [each for each in pair.exposures if each.kind == "near"]
    assert sum(each.length_m for each in near) > 0.95 * pair.main.length_m
    wide = exposures_between(pair.main, pair.standby, distance_m=15.0)
    length = sum(each.length_m for each in wide if each.kind == "near")
    assert 100.0 < length < 0.5 * pair.main.length_m
    for each in pair.exposures:
        assert 0.0 <= each.from_m <= each.to_m <= pair.main.length_m + 1e-6


def test_driving_apart_lowers_exposure(helsinki: Network) -> None:
    """Asked to keep apart, the pair is near for no longer than the cheapest one, and says so."""
    prices = prices_of(helsinki, street_costs())
    gains = 0
    for seed in range(6):
        sites = random_sites(helsinki, 2, 900 + seed)
        try:
            exact = separate_ways(helsinki, sites, prices=prices)
        except InfeasibleError:
            continue
        driven = separate_ways(helsinki, sites, prices=prices, distance_m=60.0)
        assert not driven.is_exact
        assert "not proven" in driven.rule
        near = exposures_between(exact.main, exact.standby, distance_m=60.0)
        before = sum(each.length_m for each in near)
        after = sum(each.length_m for each in driven.exposures)
        assert after <= before + 1e-6
        gains += after < before - 10.0
        assert driven.cost >= exact.cost - 1e-6
        main = {p.edge for p in driven.main.parts if p.length_m == helsinki.length_m[p.edge]}
        other = {p.edge for p in driven.standby.parts if p.length_m == helsinki.length_m[p.edge]}
        assert not main & other
    assert gains


def test_sites_at_one_place_are_refused(nauru: Network) -> None:
    """There is nothing to separate between a place and itself."""
    prices = prices_of(nauru, street_costs())
    lon, lat = (float(v) for v in nauru.node_lonlat[5])
    with pytest.raises(InputError, match="one place"):
        separate_ways(nauru, [("A", lon, lat), ("B", lon, lat)], prices=prices)
    with pytest.raises(InputError, match="between two sites"):
        separate_ways(nauru, random_sites(nauru, 3, 1), prices=prices)
    with pytest.raises(InputError, match="out of range"):
        separate_ways(nauru, random_sites(nauru, 2, 1), prices=prices, distance_m=-1.0)
