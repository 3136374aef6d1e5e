"""Networks from lines: junctions, parallel streets, doubles, noding, links to existing routes."""

from __future__ import annotations

from itertools import pairwise

import networkx as nx
import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.best import best_way
from routeplan.streets.costs import prices_of, street_costs
from routeplan.streets.model import Network
from routeplan.streets.noding import linked_lines, noded_lines


def lines(*shapes: list[tuple[float, float]], **more: object):  # type: ignore[no-untyped-def]
    arrays = [np.array(shape, dtype=float) for shape in shapes]
    return lines_from(arrays, road_class=["street"] * len(arrays), **more)  # type: ignore[arg-type]


def test_a_shared_vertex_is_a_junction() -> None:
    """Two lines with a common vertex inside both are four edges round one node."""
    network = assembled(
        lines(
            [(10, 50), (10.001, 50), (10.002, 50)], [(10.001, 49.999), (10.001, 50), (10.001, 50.1)]
        )
    )
    assert len(network.length_m) == 4
    assert len(network.node_lonlat) == 5
    degree = np.diff(network.row_first)
    assert sorted(degree.tolist()) == [1, 1, 1, 1, 4]


def test_crossing_without_a_vertex_is_none() -> None:
    """Lines that only cross, as under a bridge, do not meet."""
    network = assembled(lines([(10, 50), (10.002, 50)], [(10.001, 49.999), (10.001, 50.001)]))
    assert len(network.length_m) == 2
    assert "2 parts" in network.notes[0][1]


def test_parallel_streets_are_kept_apart() -> None:
    """Two streets between the same junctions are two edges with their own lengths."""
    network = assembled(
        lines([(10, 50), (10.001, 50)], [(10, 50), (10.0005, 50.0005), (10.001, 50)])
    )
    assert len(network.length_m) == 2
    assert len(network.node_lonlat) == 2
    assert network.length_m[0] != network.length_m[1]


def test_a_street_drawn_twice_counts_once() -> None:
    """The same line again, backwards too, is left out and said; another class is kept."""
    one = [(10, 50), (10.0005, 50.0001), (10.001, 50)]
    network = assembled(lines(one, one[::-1], one))
    assert len(network.length_m) == 1
    assert "drawn twice and count once" in network.notes[0][1]
    both = lines_from([np.array(one)] * 2, road_class=["street"] * 2, placement=["", "duct"])
    assert len(assembled(both).length_m) == 4


def test_nothing_is_made_of_points() -> None:
    """Lines of no length make no edge, and an empty network has none."""
    assert len(assembled(lines([(10, 50), (10, 50)])).length_m) == 0
    assert len(assembled(lines_from([], road_class=[])).length_m) == 0


def test_a_ring_keeps_its_edge() -> None:
    """A closed street alone is one edge that ends where it starts."""
    network = assembled(lines([(10, 50), (10.001, 50), (10.001, 50.001), (10, 50)]))
    assert network.edge_start.tolist() == network.edge_end.tolist() == [0]
    assert np.diff(network.row_first).tolist() == [2]


@pytest.mark.parametrize("lon", [180.0, -180.0])
def test_the_antimeridian_is_one_place(lon: float) -> None:
    """Streets that end on the antimeridian from both sides meet there."""
    network = assembled(lines([(179.999, -16), (lon, -16)], [(-179.999, -16), (-180.0, -16)]))
    assert len(network.node_lonlat) == 3
    exact = Geodesic.WGS84.Inverse(-16, 179.999, -16, -179.999)["s12"]
    assert network.length_m.sum() == pytest.approx(exact, rel=1e-7)
    prices = prices_of(network, street_costs())
    way = best_way(network, [("A", 179.9995, -16.0), ("B", -179.9995, -16.0)], prices=prices)
    assert way.length_m == pytest.approx(exact / 2, rel=1e-5)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.lists(st.tuples(st.integers(0, 4), st.integers(0, 4)), min_size=2, max_size=6),
                min_size=1, max_size=8))  # fmt: skip
def test_edges_and_connections_are_those_of_the_lines(drawn: list[list[tuple[int, int]]]) -> None:
    """Whatever is drawn, the network joins what the lines join and is as long as their union."""
    shapes = [np.array([(10 + x / 1000, 50 + y / 1000) for x, y in line]) for line in drawn]
    network = assembled(lines_from(shapes, road_class=["street"] * len(shapes)))
    steps = {frozenset(pair) for line in drawn for pair in pairwise(line)}
    wanted = nx.Graph([tuple(step) for step in steps if len(step) == 2])
    found = nx.Graph()
    for edge in range(len(network.length_m)):
        first, last = network.shape_first[edge], network.shape_first[edge + 1]
        places = [tuple(np.rint((p - [10, 50]) * 1000).astype(int).tolist())
                  for p in network.shape_lonlat[first:last]]  # fmt: skip
        nx.add_path(found, places)
        ends = network.node_lonlat[[network.edge_start[edge], network.edge_end[edge]]]
        assert network.shape_lonlat[[first, last - 1]] == pytest.approx(ends)
    assert set(map(frozenset, found.edges)) == set(map(frozenset, wanted.edges))
    assert network.row_first[-1] == 2 * len(network.length_m)
    for node in range(len(network.node_lonlat)):
        row = slice(int(network.row_first[node]), int(network.row_first[node + 1]))
        for other, edge in zip(network.row_node[row], network.row_edge[row], strict=True):
            assert {node, int(other)} == {
                int(network.edge_start[edge]),
                int(network.edge_end[edge]),
            }


def test_noding_joins_what_crosses_and_touches() -> None:
    """Noded, crossing lines meet, a line that ends on another meets it, a bridge passes over."""
    level = lines([(10, 50), (10.004, 50)], [(10.001, 49.999), (10.001, 50.001)],
                  [(10.002, 50.001), (10.002, 50.0000001)])  # fmt: skip
    network = assembled(noded_lines(level))
    assert len(network.notes) == 0
    assert len(network.length_m) == 3 + 2 + 1
    over = lines([(10, 50), (10.004, 50)], [(10.001, 49.999), (10.001, 50.001)],
                 is_bridge=[False, True])  # fmt: skip
    assert len(assembled(noded_lines(over)).length_m) == 2


def test_noding_changes_no_length() -> None:
    """Vertices put in where lines cross lie on them: lengths stay."""
    rng = np.random.default_rng(4)
    shapes = [
        np.column_stack([10 + rng.uniform(0, 0.01, 3), 50 + rng.uniform(0, 0.01, 3)])
        for _ in range(12)
    ]
    plain = lines_from(shapes, road_class=["street"] * 12)
    before, after = assembled(plain), assembled(noded_lines(plain))
    assert after.length_m.sum() == pytest.approx(before.length_m.sum(), rel=1e-4)
    assert len(after.length_m) > len(before.length_m)


def existing_beside() -> Network:
    """Return a street with an existing duct 10 m north of it, vertices every 200 m."""
    north = 10.0 / 111_229.0
    street = lines([(10, 50), (10.02, 50)])
    duct = lines_from(
        [np.array([(10 + k * 0.0028, 50 + north) for k in range(8)])],
        road_class=["street"],
        placement=["duct"],
    )
    return assembled(linked_lines(street, duct, link_m=30.0))


def test_existing_routes_are_joined_and_preferred() -> None:
    """A way leaves the street for the duct beside it at its own price, and no farther than 30 m."""
    network = existing_beside()
    assert len(network.notes) == 0
    prices = prices_of(network, street_costs())
    way = best_way(network, [("A", 10.0, 50.0), ("B", 10.02, 50.0)], prices=prices)
    in_duct = sum(p.length_m for p in way.parts if p.edge >= 0 and p.road_class == "street"
                  and network.placement_words[network.placement[p.edge]] == "duct")  # fmt: skip
    assert in_duct > 0.9 * way.length_m
    dear = prices_of(network, street_costs({"existing.duct": 5.0}))
    plain = best_way(network, [("A", 10.0, 50.0), ("B", 10.02, 50.0)], prices=dear)
    assert plain.length_m == pytest.approx(network.length_m[network.placement == 0][
        network.road_class[network.placement == 0] == 0].sum())  # fmt: skip
    far = linked_lines(
        lines([(10, 50), (10.02, 50)]), lines([(10, 50.001), (10.02, 50.001)]), link_m=30.0
    )
    assert "2 parts" in assembled(far).notes[0][1]
