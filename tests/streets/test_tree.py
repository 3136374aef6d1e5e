"""Trees against brute force, their guarantee, and how they hang together."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import networkx as nx
import numpy as np
import pytest

from routeplan.errors import InfeasibleError
from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.best import best_way
from routeplan.streets.costs import prices_of, street_costs
from routeplan.streets.model import Network
from routeplan.streets.steiner import exact_tree, exact_work, near_tree
from routeplan.streets.tree import EXACT_WORK_MAX, site_tree
from routeplan.streets.ways import tails_of
from tests.streets.independent import least_tree_cost
from tests.streets.small_networks import drawn_network, node_graph, priced, random_sites


def test_trees_equal_brute_force() -> None:
    """On small graphs the exact tree costs what trying every set of branch points finds."""
    compared = 0
    for seed in range(80):
        network = drawn_network(seed, size=3, parallel=2)
        rng = np.random.default_rng(seed)
        prices = priced(network, rng.integers(0, 30, len(network.length_m)))
        count = int(rng.integers(2, 6))
        size = len(network.node_lonlat)
        if size <= count:
            continue
        nodes = [int(node) for node in rng.choice(size, count, replace=False)]
        wanted = least_tree_cost(network, prices.cost, nodes)
        graph = node_graph(network, prices, nodes)
        if np.isinf(wanted):
            with pytest.raises(LookupError):
                exact_tree(graph, nodes)
            continue
        exact = graph.cost[exact_tree(graph, nodes)].sum()
        near = graph.cost[near_tree(graph, nodes)].sum()
        assert exact == pytest.approx(wanted)
        assert exact <= near + 1e-9
        assert near <= (2.0 - 2.0 / count) * exact + 1e-9
        compared += 1
    assert compared > 40


@pytest.mark.parametrize("seed", range(30))
def test_arcs_make_a_tree(seed: int) -> None:
    """What comes back is connected, without a ring, and every leaf is a site."""
    network = drawn_network(seed, size=6)
    rng = np.random.default_rng(seed)
    prices = priced(network, rng.integers(1, 30, len(network.length_m)))
    nodes = [int(n) for n in rng.choice(len(network.node_lonlat), 6, replace=False)]
    graph = node_graph(network, prices, nodes)
    for search in (exact_tree, near_tree):
        try:
            arcs = search(graph, nodes)
        except LookupError:
            return
        tree = nx.MultiGraph()
        tree.add_edges_from(zip(tails_of(graph, arcs), graph.row_node[arcs].tolist(), strict=True))
        assert nx.is_tree(tree)
        assert set(nodes) <= set(tree)
        assert {node for node, degree in tree.degree if degree == 1} <= set(nodes)


def test_two_sites_get_the_best_way(nauru: Network) -> None:
    """The tree of two sites is the best way between them."""
    prices = prices_of(nauru, street_costs())
    for seed in range(20):
        sites = random_sites(nauru, 2, 40 + seed)
        tree = site_tree(nauru, sites, prices=prices)
        way = best_way(nauru, sites, prices=prices)
        assert tree.is_exact
        assert tree.cost == pytest.approx(way.cost)
        assert tree.length_m == pytest.approx(way.length_m)


@pytest.mark.parametrize("name", ["nauru", "helsinki"])
def test_branches_join_every_site(name: str, request: pytest.FixtureRequest) -> None:
    """Branches run between sites and forks, join all of them, and add up to the tree."""
    network: Network = request.getfixturevalue(name)
    prices = prices_of(network, street_costs())
    for seed in range(12):
        sites = random_sites(network, 5, 600 + seed)
        tree = site_tree(network, sites, prices=prices)
        joined = nx.MultiGraph(list(tree.ends))
        assert nx.is_tree(joined)
        assert set(range(5)) <= set(joined)
        degree = Counter(end for pair in tree.ends for end in pair if end < 0)
        assert all(count >= 2 for count in degree.values())
        assert len(degree) == len(tree.branch_lonlat)
        places = {end: tree.branch_lonlat[-1 - end] for end in degree}
        places |= {n: np.array(site[1:]) for n, site in enumerate(sites)}
        for way, ends in zip(tree.branches, tree.ends, strict=True):
            for end, lonlat in zip(ends, (way.lonlat[0], way.lonlat[-1]), strict=True):
                assert lonlat == pytest.approx(places[end], abs=1e-6)
        assert tree.cost == pytest.approx(sum(way.cost for way in tree.branches))


def test_more_sites_never_cost_less(nauru: Network) -> None:
    """A further site never makes the exact tree cheaper; the near one keeps its guarantee."""
    prices = prices_of(nauru, street_costs())
    sites = random_sites(nauru, 7, 3)
    costs = [site_tree(nauru, sites[:count], prices=prices).cost for count in range(2, 8)]
    assert costs == sorted(costs)
    near = site_tree(nauru, sites, prices=prices, exact_work_max=0.0)
    assert not near.is_exact
    assert near.guarantee_ratio == pytest.approx(2.0 - 2.0 / 7)
    assert costs[-1] - 1e-6 <= near.cost <= near.guarantee_ratio * costs[-1] + 1e-6


def test_two_sites_at_one_place(nauru: Network) -> None:
    """Two sites on one junction and a third elsewhere still hang together."""
    prices = prices_of(nauru, street_costs())
    lon, lat = (float(v) for v in nauru.node_lonlat[100])
    far = random_sites(nauru, 1, 8)[0]
    tree = site_tree(nauru, [("A", lon, lat), ("B", lon, lat + 1e-5), far], prices=prices)
    assert {0, 1, 2} <= {end for pair in tree.ends for end in pair}


def test_sites_that_cannot_be_joined_are_named() -> None:
    """The error names the sites that cannot be reached."""
    lines = [np.array([[10.0, 50.0], [10.001, 50.0]]), np.array([[10.1, 50.0], [10.101, 50.0]])]
    network = assembled(lines_from(lines, road_class=["street"] * 2))
    prices = prices_of(network, street_costs())
    sites = [("A", 10.0, 50.0), ("B", 10.001, 50.0), ("C", 10.1, 50.0)]
    with pytest.raises(InfeasibleError, match='C: cannot be reached from "A"'):
        site_tree(network, sites, prices=prices)


@pytest.mark.parametrize(("sites", "edges", "nodes"), [(10, 10_000, 7_000), (7, 100_000, 65_000)])
def test_the_promised_sizes_are_exact(sites: int, edges: int, nodes: int, nauru: Network) -> None:
    """Ten sites at 10,000 streets and seven at 100,000 are within what is sought exactly."""
    graph = node_graph(nauru, prices_of(nauru, street_costs()), [0, 1])
    large = replace(
        graph,
        row_node=np.zeros(2 * edges, dtype=np.int32),
        row_first=np.zeros(nodes + 1, dtype=np.int32),
    )
    assert exact_work(large, sites) <= EXACT_WORK_MAX
