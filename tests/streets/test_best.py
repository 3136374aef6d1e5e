"""The best way against networkx and GeographicLib, and what stops it."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import networkx as nx
import numpy as np
import pytest
from geographiclib.geodesic import Geodesic

from routeplan.errors import GeometryError, InfeasibleError, InputError
from routeplan.streets.anchors import anchored
from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.bends import headings_rad, turns_rad
from routeplan.streets.best import best_way, legs_between, site_graph
from routeplan.streets.costs import Zones, prices_of, street_costs
from routeplan.streets.graph import Graph
from routeplan.streets.model import Network, Way
from routeplan.streets.ways import way_of
from tests.streets.independent import simple_graph
from tests.streets.small_networks import drawn_network, node_graph, priced, random_sites

PAIRS = 100


def end_costs(network: Network, graph: Graph, site: int) -> dict[int, float]:
    """Return what it costs from a site to the ends of its street, worked out by hand."""
    anchor = graph.anchors[site]
    if anchor.node >= 0:
        return {anchor.node: 0.0}
    prices, edge = graph.prices, anchor.edge
    found: dict[int, float] = {}
    for node, low, high in (
        (int(network.edge_start[edge]), 0.0, anchor.along_m),
        (int(network.edge_end[edge]), anchor.along_m, float(network.length_m[edge])),
    ):
        cost = float(prices.per_m[edge]) * (high - low)
        for row in np.flatnonzero(network.crossing_edge == edge):
            at = float(network.crossing_m[row])
            # A crossing right where the site stands belongs to what follows.
            if low <= at < high or (at >= high and high == network.length_m[edge]):
                cost += float(prices.crossing_each[row])
        found[node] = min(cost, found.get(node, np.inf))
    return found


@pytest.mark.parametrize("name", ["nauru", "helsinki"])
def test_the_best_way_costs_what_networkx_finds(name: str, request: pytest.FixtureRequest) -> None:
    """On real streets the best way costs what networkx finds on the same prices."""
    network: Network = request.getfixturevalue(name)
    prices = prices_of(network, street_costs())
    reference = simple_graph(network, prices.cost)
    joined = 0
    for seed in range(PAIRS):
        sites = random_sites(network, 2, seed)
        graph = site_graph(network, sites, prices=prices, off_street_max_m=500.0)
        if graph.anchors[0].edge == graph.anchors[1].edge:
            continue
        begins, ends = end_costs(network, graph, 0), end_costs(network, graph, 1)
        wanted = np.inf
        for node, cost in begins.items():
            found = nx.single_source_dijkstra_path_length(reference, node)
            wanted = min([wanted, *(cost + found[n] + c for n, c in ends.items() if n in found)])
        way = best_way(network, sites, prices=prices)
        walks = sum(anchor.walk_m for anchor in graph.anchors) * prices.costs.off_street_per_m
        own = way.cost - sum(part.cost for part in way.parts if part.edge < 0)
        assert own == pytest.approx(wanted, rel=1e-9)
        assert way.cost <= wanted + walks + 1e-6
        joined += 1
    assert joined > 0.9 * PAIRS


def length_by_geographiclib_m(way: Way) -> float:
    return sum(
        Geodesic.WGS84.Inverse(a[1], a[0], b[1], b[0])["s12"]
        for a, b in zip(way.lonlat, way.lonlat[1:], strict=False)
    )


@pytest.mark.parametrize("name", ["nauru", "helsinki"])
def test_lengths_are_geodesic(name: str, request: pytest.FixtureRequest) -> None:
    """A way is as long as GeographicLib measures its line, and never shorter than the geodesic."""
    network: Network = request.getfixturevalue(name)
    prices = prices_of(network, street_costs())
    for seed in range(20):
        sites = random_sites(network, 3, 1000 + seed)
        way = best_way(network, sites, prices=prices)
        # Published accuracy of GeographicLib: 15 nanometres; ours 0.01 ppm.
        assert way.length_m == pytest.approx(length_by_geographiclib_m(way), rel=2e-8)
        assert sum(part.length_m for part in way.parts) == pytest.approx(way.length_m, rel=1e-12)
        (_, lon1, lat1), _, (_, lon2, lat2) = sites
        assert way.length_m >= Geodesic.WGS84.Inverse(lat1, lon1, lat2, lon2)["s12"] * (1 - 1e-9)
        assert way.via_m[0] == 0.0
        assert way.via_m[-1] == pytest.approx(way.length_m)


def test_parts_join_end_to_end(helsinki: Network) -> None:
    """Each part of a way begins where the one before ends, and the line starts at the site."""
    prices = prices_of(helsinki, street_costs())
    for seed in range(30):
        sites = random_sites(helsinki, 2, 50 + seed)
        way = best_way(helsinki, sites, prices=prices)
        assert way.lonlat[0] == pytest.approx(sites[0][1:], abs=1e-6)
        for one, other in zip(way.parts, way.parts[1:], strict=False):
            assert one.lonlat[-1] == pytest.approx(other.lonlat[0], abs=2e-9)


def test_one_street_holds_both_sites() -> None:
    """Two sites on one street are joined along it, not round by its ends."""
    line = np.array([[10.0, 50.0], [10.01, 50.0]])
    network = assembled(lines_from([line], road_class=["residential"]))
    prices = prices_of(network, street_costs())
    way = best_way(network, [("A", 10.002, 50.0), ("B", 10.007, 50.0)], prices=prices)
    exact = Geodesic.WGS84.Inverse(50.0, 10.002, 50.0, 10.007)["s12"]
    assert way.length_m == pytest.approx(exact, rel=1e-6)
    back = best_way(network, [("B", 10.007, 50.0), ("A", 10.002, 50.0)], prices=prices)
    assert back.length_m == pytest.approx(way.length_m, rel=1e-12)
    assert back.lonlat[::-1] == pytest.approx(way.lonlat)


def test_a_closed_street_is_gone_round_the_short_way() -> None:
    """On a ring with one junction the shorter side is taken."""
    angle = np.linspace(0.0, 2 * np.pi, 41)
    ring = np.column_stack([10.0 + 0.01 * np.cos(angle), 0.01 * np.sin(angle)])
    ring[-1] = ring[0]
    network = assembled(lines_from([ring], road_class=["street"]))
    assert len(network.length_m) == 1
    prices = prices_of(network, street_costs())
    sites = [("A", *ring[36].tolist()), ("B", *ring[4].tolist())]
    way = best_way(network, sites, prices=prices)
    assert way.length_m == pytest.approx(network.length_m[0] * 8 / 40, rel=0.01)


def turn_reference(
    network: Network, cost: np.ndarray, nodes: tuple[int, int], each: float
) -> float:
    """Return the least cost with priced bends, over a networkx graph of directed streets."""
    states = nx.DiGraph()
    ends = list(zip(network.edge_start.tolist(), network.edge_end.tolist(), strict=True))
    directed = [(e, a, b) for e, (a, b) in enumerate(ends)] + [
        (e, b, a) for e, (a, b) in enumerate(ends)
    ]

    def steps(edge: int, tail: int) -> np.ndarray:
        first, last = network.shape_first[edge], network.shape_first[edge + 1]
        shape = network.shape_lonlat[first:last]
        return shape if ends[edge][0] == tail else shape[::-1]

    for one in directed:
        if one[1] == nodes[0]:
            states.add_edge("begin", one, weight=cost[one[0]])
        if one[2] == nodes[1]:
            states.add_edge(one, "end", weight=0.0)
        for other in directed:
            if other[1] == one[2] and other[0] != one[0]:
                mine, its = steps(one[0], one[1]), steps(other[0], other[1])
                turn = turns_rad(
                    headings_rad(mine[-2:-1], mine[-1:]), headings_rad(its[:1], its[1:2])
                )
                bend = each if math.degrees(turn[0]) >= 60.0 else 0.0
                states.add_edge(one, other, weight=cost[other[0]] + bend)
    try:
        return float(nx.dijkstra_path_length(states, "begin", "end"))
    except (nx.NetworkXNoPath, nx.NodeNotFound):
        return np.inf


@pytest.mark.parametrize("seed", range(25))
def test_sharp_bends_are_priced_exactly(seed: int) -> None:
    """With a price on sharp bends the way costs what networkx finds over directed streets."""
    network = drawn_network(seed)
    rng = np.random.default_rng(seed)
    cost = rng.integers(5, 60, len(network.length_m))
    prices = priced(network, cost)
    prices = replace(prices, costs=street_costs({"sharp_bend_each": 25.0}))
    one, other = (int(n) for n in rng.choice(len(network.node_lonlat), 2, replace=False))
    wanted = turn_reference(network, cost.astype(float), (one, other), 25.0)
    graph = node_graph(network, prices, [one, other])
    if np.isinf(wanted):
        with pytest.raises(InfeasibleError):
            legs_between(graph)
        return
    way = way_of(graph, legs_between(graph), (0, 1))
    bends = 0
    for before, after in pairwise(way.parts):
        mine, its = before.lonlat, after.lonlat
        turn = turns_rad(headings_rad(mine[-2:-1], mine[-1:]), headings_rad(its[:1], its[1:2]))
        bends += math.degrees(turn[0]) >= 60.0
    assert way.cost + 25.0 * bends == pytest.approx(wanted)


def test_swapped_coordinates_are_recognised(nauru: Network) -> None:
    """A site far off whose coordinates fit when swapped is said to be swapped."""
    prices = prices_of(nauru, street_costs())
    with pytest.raises(GeometryError, match="Give longitude first"):
        best_way(nauru, [("A", -0.53, 166.92), ("B", 166.93, -0.52)], prices=prices)
    line = np.array([[10.0, 50.0], [10.01, 50.0]])
    network = assembled(lines_from([line], road_class=["street"]))
    prices = prices_of(network, street_costs())
    with pytest.raises(InfeasibleError, match="swapped") as caught:
        best_way(network, [("A", 50.0, 10.0), ("B", 50.0, 10.01)], prices=prices)
    assert len(caught.value.problems) == 2


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), 181.0])
def test_a_site_that_is_nowhere_is_refused(bad: float, nauru: Network) -> None:
    """Coordinates that are no place on the earth are named."""
    prices = prices_of(nauru, street_costs())
    with pytest.raises(GeometryError, match="A: is not a longitude"):
        best_way(nauru, [("A", bad, 0.0), ("B", 166.93, -0.52)], prices=prices)


def test_one_site_is_too_few(nauru: Network) -> None:
    """A way takes two sites."""
    with pytest.raises(InputError, match="too few"):
        best_way(nauru, [("A", 166.93, -0.52)], prices=prices_of(nauru, street_costs()))


def test_islands_are_told_from_closures() -> None:
    """Streets that do not meet, and ways that are closed, are told apart."""
    left = np.array([[10.0, 50.0], [10.001, 50.0]])
    middle = np.array([[10.001, 50.0], [10.002, 50.0]])
    right = np.array([[10.002, 50.0], [10.003, 50.0]])
    apart = assembled(lines_from([left, right], road_class=["street"] * 2))
    assert "2 parts that do not meet" in apart.notes[0][1]
    sites = [("A", 10.0, 50.0), ("B", 10.003, 50.0)]
    with pytest.raises(InfeasibleError, match="streets do not meet"):
        best_way(apart, sites, prices=prices_of(apart, street_costs()), off_street_max_m=50.0)
    network = assembled(
        lines_from([left, middle, right], road_class=["street", "motorway", "street"])
    )
    closed = prices_of(network, street_costs({"road.motorway": math.inf}))
    with pytest.raises(InfeasibleError, match="closed or to be avoided"):
        best_way(network, sites, prices=closed, off_street_max_m=50.0)
    box = np.array([[10.0012, 49.9], [10.0018, 49.9], [10.0018, 50.1], [10.0012, 50.1],
                    [10.0012, 49.9]])  # fmt: skip
    avoided = prices_of(network, street_costs(), zones=Zones(avoid=((box,),)))
    with pytest.raises(InfeasibleError, match="closed or to be avoided"):
        best_way(network, sites, prices=avoided, off_street_max_m=50.0)


def test_a_site_on_an_island_takes_the_largest_part() -> None:
    """A site whose nearest street is an island walks to the streets the others are on."""
    road = np.array([[10.0, 50.0], [10.02, 50.0]])
    stub = np.array([[10.01, 50.0010], [10.0102, 50.0010]])
    network = assembled(lines_from([road, stub], road_class=["street"] * 2))
    prices = prices_of(network, street_costs())
    way = best_way(network, [("A", 10.0, 50.0), ("B", 10.0101, 50.0009)], prices=prices)
    assert way.off_street_m == pytest.approx(100.1, abs=0.5)


def test_anchors_are_the_nearest_places(helsinki: Network) -> None:
    """No vertex of any street is nearer to a site than its anchor."""
    usable = np.ones(len(helsinki.length_m), dtype=bool)
    for site in random_sites(helsinki, 25, 77):
        anchor = anchored(helsinki, [site], usable=usable)[0]
        step = helsinki.shape_lonlat - np.array(site[1:])
        near = helsinki.shape_lonlat[np.argsort((step * [0.5, 1.0] * step).sum(axis=1))[:20]]
        least = min(Geodesic.WGS84.Inverse(site[2], site[1], lat, lon)["s12"] for lon, lat in near)
        assert anchor.walk_m <= least + 1e-6
