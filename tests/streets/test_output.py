"""Reach points, the geometry that planning takes, rows to compare by, and the drawing."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from routeplan.planning import plan
from routeplan.run import read_run
from routeplan.streets.assemble import Places, assembled, lines_from
from routeplan.streets.best import best_way
from routeplan.streets.costs import prices_of, street_costs
from routeplan.streets.drawing import ways_page
from routeplan.streets.model import Network, Way
from routeplan.streets.output import (
    NamedWay,
    SiteMark,
    collection_of,
    collection_text,
    leg_names,
    rows_of,
    tree_ways,
)
from routeplan.streets.reach import Spacing, reach_points, usual_spacing
from routeplan.streets.separate import separate_ways
from routeplan.streets.tree import site_tree
from tests.streets.small_networks import random_sites


def long_street(places: Places | None = None, **more: object) -> Network:
    """Return a street of about 1430 m with two side streets, one 30 m from the end."""
    shapes = [
        np.array([[10.0, 50.0], [10.01, 50.0], [10.0196, 50.0], [10.02, 50.0]]),
        np.array([[10.01, 50.0], [10.01, 50.001]]),
        np.array([[10.0196, 50.0], [10.0196, 50.001]]),
    ]
    lines = lines_from(shapes, road_class=["street"] * 3, **more)  # type: ignore[arg-type]
    return assembled(lines, places=places)


def way_along(network: Network, placement: str = "duct") -> Way:
    prices = prices_of(network, street_costs(placement=placement))
    return best_way(network, [("A", 10.0, 50.0), ("B", 10.02, 50.0)], prices=prices)


def test_junctions_and_spacing_make_reach_points() -> None:
    """A handhole at the junction, evenly spaced ones between, none too near the end."""
    network = long_street()
    way = way_along(network)
    found = reach_points(network, way)
    rule = usual_spacing()["duct"]
    assert {each.kind for each in found} == {"handhole"}
    assert [each.basis for each in found].count("junction") == 1
    marks = [0.0, *(each.along_m for each in found), way.length_m]
    gaps = np.diff(marks)
    assert gaps.max() <= rule.spacing_m + 1e-6
    assert gaps.min() >= rule.least_m
    assert len(found) == 1 + 2 + 2  # 717 m on either side of the junction, at most 250 m apart


def test_mapped_places_come_first() -> None:
    """A mapped manhole near the way is taken, one far from it is not, a pole not for duct."""
    marks = Places(
        kind=("maintenance_hole", "maintenance_hole", "pole"),
        lonlat=np.array([[10.005, 50.00005], [10.006, 50.001], [10.003, 50.0]]),
    )
    network = long_street(marks)
    found = reach_points(network, way_along(network))
    mapped = [each for each in found if each.basis == "mapped"]
    assert [each.kind for each in mapped] == ["maintenance_hole"]
    assert mapped[0].lon == pytest.approx(10.005)
    assert mapped[0].lat == pytest.approx(50.0)
    poles = reach_points(network, way_along(network, "aerial"))
    assert {each.kind for each in poles} == {"pole"}
    assert sum(each.basis == "mapped" for each in poles) == 1


def test_nothing_is_reached_on_a_bridge() -> None:
    """No reach point lies on a bridge."""
    network = long_street(is_bridge=[True, False, False])
    assert reach_points(network, way_along(network)) == ()


def test_spacing_of_ones_own() -> None:
    """A spacing given is used instead of the table's."""
    network = long_street()
    rule = {"duct": Spacing(reach_kind="cabinet", spacing_m=100.0, least_m=50.0)}
    found = reach_points(network, way_along(network), spacing=rule)
    assert {each.kind for each in found} == {"cabinet"}
    assert len(found) >= 14


def planned(tmp_path: Path, collection: dict[str, object]) -> Any:
    path = tmp_path / "ways.geojson"
    path.write_text(collection_text(collection), "utf-8")
    return plan(read_run(path))


def test_a_way_is_planned_as_it_is(helsinki: Network, tmp_path: Path) -> None:
    """The geometry file of a way plans without a complaint, as long as the way itself."""
    prices = prices_of(helsinki, street_costs())
    for seed in range(6):
        sites = random_sites(helsinki, 2, 20 + seed)
        way = best_way(helsinki, sites, prices=prices)
        marks = [SiteMark(name=name, lon=lon, lat=lat, role="studio") for name, lon, lat in sites]
        named = NamedWay(name="Main", way=way, reach=reach_points(helsinki, way))
        done = planned(tmp_path, collection_of([named], marks))
        assert [leg.name for leg in done.ground.legs] == ["Main"]
        assert {node.name for node in done.ground.nodes} == {"S0", "S1"}
        leg = done.ground.legs[0]
        assert leg.ground_mm[-1] / 1000 == pytest.approx(way.length_m, abs=0.01)
        bridge_m = sum(part.length_m for part in way.parts if part.is_bridge)
        drawn = sum(s.end_mm - s.start_mm for s in leg.stretches if s.placement == "bridge")
        assert drawn / 1000 == pytest.approx(bridge_m, abs=0.01)


@pytest.mark.parametrize("apart", ["streets", "junctions"])
def test_a_pair_is_planned_as_two_legs(apart: Any, helsinki: Network, tmp_path: Path) -> None:
    """Two separate ways are two legs between the same two sites, whatever they meet."""
    prices = prices_of(helsinki, street_costs())
    sites = [("A", 24.937, 60.166), ("B", 24.951, 60.177)]
    pair = separate_ways(helsinki, sites, prices=prices, apart=apart)
    marks = [SiteMark(name=name, lon=lon, lat=lat) for name, lon, lat in sites]
    ways = [
        NamedWay(name=name, way=way, reach=reach_points(helsinki, way))
        for name, way in (("Main", pair.main), ("Standby", pair.standby))
    ]
    done = planned(tmp_path, collection_of(ways, marks))
    assert sorted(leg.name for leg in done.ground.legs) == ["Main", "Standby"]
    for leg, way in zip(sorted(done.ground.legs, key=lambda each: each.name),
                        (pair.main, pair.standby), strict=True):  # fmt: skip
        assert leg.ground_mm[-1] / 1000 == pytest.approx(way.length_m, abs=0.01)


def test_a_tree_is_planned_with_its_branches(nauru: Network, tmp_path: Path) -> None:
    """The branches of a tree join at its forks and sites when they are planned."""
    prices = prices_of(nauru, street_costs())
    sites = random_sites(nauru, 4, 77)
    tree = site_tree(nauru, sites, prices=prices)
    marks = [SiteMark(name=name, lon=lon, lat=lat) for name, lon, lat in sites]
    ways = [NamedWay(name=name, way=way) for name, way in tree_ways(tree, marks)]
    done = planned(tmp_path, collection_of(ways, marks))
    assert {"S0", "S1", "S2", "S3"} <= {node.name for node in done.ground.nodes}
    total = sum(int(leg.ground_mm[-1]) for leg in done.ground.legs) / 1000
    assert total == pytest.approx(tree.length_m, rel=1e-4)


def test_rail_is_written_and_water_under_a_bridge_is_not() -> None:
    """A rail crossing is a point of the file; water that a bridge crosses is the bridge's."""
    obstacles = [
        ("rail", np.array([[10.005, 49.999], [10.005, 50.001]])),
        ("motorway", np.array([[10.007, 49.999], [10.007, 50.001]])),
        ("water", np.array([[10.015, 49.999], [10.015, 50.001]])),
    ]
    shapes = [np.array([[10.0, 50.0], [10.01, 50.0]]), np.array([[10.01, 50.0], [10.02, 50.0]])]
    lines = lines_from(shapes, road_class=["street"] * 2, is_bridge=[False, True])
    network = assembled(lines, obstacles=obstacles)
    way = way_along(network)
    assert [each.kind for each in way.crossings] == ["rail", "motorway", "water"]
    collection = collection_of([NamedWay(name="Way", way=way)], [])
    points = [
        feature["properties"]
        for feature in collection["features"]  # type: ignore[attr-defined]
        if feature["geometry"]["type"] == "Point"
    ]
    assert [point["crosses"] for point in points] == ["rail", "road"]
    row = rows_of([NamedWay(name="Way", way=way)])[0]
    assert (row["rail_crossing_count"], row["water_crossing_count"]) == (1, 1)
    assert row["bridge_m"] == pytest.approx(way.length_m / 2, rel=1e-3)


def test_rows_set_ways_beside_the_first(helsinki: Network) -> None:
    """A row has lengths, cost and what it costs beside the first way."""
    prices = prices_of(helsinki, street_costs())
    ways = [best_way(helsinki, random_sites(helsinki, 2, seed), prices=prices) for seed in (1, 2)]
    rows = rows_of([NamedWay(name=f"W{n}", way=way) for n, way in enumerate(ways)])
    assert rows[0]["cost_ratio"] == 1.0
    assert rows[1]["cost_ratio"] == pytest.approx(ways[1].cost / ways[0].cost, abs=1e-4)
    assert [row["length_m"] for row in rows] == pytest.approx([w.length_m for w in ways], abs=1e-3)
    assert json.dumps(rows)


def test_the_drawing_fetches_nothing_and_runs_nothing(helsinki: Network) -> None:
    """Names are escaped, there is no script and no address, and every way is in the legend."""
    prices = prices_of(helsinki, street_costs())
    sites = random_sites(helsinki, 2, 3)
    way = best_way(helsinki, sites, prices=prices)
    name = '<script>alert("x")</script>'
    marks = [SiteMark(name=name, lon=lon, lat=lat) for _, lon, lat in sites]
    page = ways_page(helsinki, [NamedWay(name=name, way=way)], marks, title=name)
    assert "<script" not in page
    assert not re.search(r"(src|href)=|https?://|url\(", page)
    assert page.count("&lt;script&gt;") >= 4
    assert f"{way.length_m:,.0f}" in page


def test_a_way_through_a_site_is_planned_as_two_legs_and_one_cable(tmp_path: Path) -> None:
    """The site between is a node, no leg runs past it, and one cable goes through uncut."""
    network = long_street()
    sites = [("A", 10.0, 50.0), ("C", 10.01, 50.001), ("B", 10.02, 50.0)]
    way = best_way(network, sites, prices=prices_of(network, street_costs()))
    marks = [SiteMark(name=name, lon=lon, lat=lat) for name, lon, lat in sites]
    named = NamedWay(name="Way", way=way, reach=reach_points(network, way))
    file = tmp_path / "route.geojson"
    file.write_text(collection_text(collection_of([named], marks)), "utf-8")
    planned = plan(read_run(file))
    assert leg_names(named) == ["Way (1)", "Way (2)"]
    assert [leg.name for leg in planned.ground.legs] == leg_names(named)
    assert [cable.name for cable in planned.layout.cables] == ["Way"]
    ends = [(planned.ground.node(leg.start).name, planned.ground.node(leg.end).name)
            for leg in planned.ground.legs]  # fmt: skip
    assert ends == [("A", "C"), ("C", "B")]
    measured_m = sum(leg.ellipsoid_m for leg in planned.ground.legs)
    assert measured_m == pytest.approx(way.length_m, abs=0.001)
