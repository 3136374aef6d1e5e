"""The demo island: made again to the byte, in open sea, its link whole and on its own ground."""

from __future__ import annotations

import importlib
import json
import tomllib
from collections.abc import Iterator
from itertools import combinations, pairwise
from pathlib import Path
from types import ModuleType
from typing import Any, NamedTuple

import numpy as np
import pytest
from pyproj import Geod, Transformer
from shapely import LineString, Point, Polygon

DEMO = Path(__file__).parents[2] / "demo_routes"
VECTORS = (
    "island/coast.geojson",
    "island/streets.geojson",
    "quenmoor_link/route.geojson",
    "island/lines.geojson",
)
RASTER = "island/terrain.asc"
MADE = (*VECTORS, RASTER, "island/terrain.prj")
WGS84 = Geod(ellps="WGS84")
TO_UTM = Transformer.from_crs("EPSG:4326", "EPSG:32727", always_xy=True)  # zone 27 south
LINE_KEYS = {"name", "placement"}
POINT_KEYS = {
    "name", "kind", "role", "joint", "loop_m", "joint_cost_factor", "crosses", "width_m",
}  # fmt: skip

# The nearest land on every side; places to 0.1 degree as any atlas gives them.
LAND = {
    "Tristan da Cunha": (-12.3, -37.1),
    "Inaccessible Island": (-12.7, -37.3),
    "Gough Island": (-9.9, -40.3),
    "Trindade": (-29.3, -20.5),
    "Saint Helena": (-5.7, -16.0),
    "South Georgia": (-38.0, -54.0),
    "Zavodovski Island": (-27.6, -56.3),
    "Bouvet Island": (3.4, -54.4),
    "Cabo de Santa Marta, South America": (-48.8, -28.6),
    "Cape Agulhas, Africa": (20.0, -34.8),
}


class Island(NamedTuple):
    """The modules of the island script."""

    script: ModuleType
    frame: ModuleType
    layers: ModuleType
    lines: ModuleType
    terrain: ModuleType
    ways: ModuleType


@pytest.fixture(scope="module")
def island() -> Iterator[Island]:
    with pytest.MonkeyPatch.context() as patch:
        patch.syspath_prepend(str(DEMO))
        names = ("frame", "layers", "lines", "terrain", "ways")
        parts = [importlib.import_module(f"island.{name}") for name in names]
        yield Island(importlib.import_module("make_island"), *parts)


def features(name: str) -> list[dict[str, Any]]:
    """Return the features of a committed file."""
    content = json.loads((DEMO / name).read_text(encoding="utf-8"))
    assert set(content) == {"type", "features"}, "RFC 7946 has no crs member"
    return list(content["features"])


def link(kind: str) -> list[dict[str, Any]]:
    """Return the link's features of one geometry type."""
    return [f for f in features(MADE[2]) if f["geometry"]["type"] == kind]


def coordinates(feature: dict[str, Any]) -> np.ndarray:
    """Return a feature's coordinates as rows."""
    given = feature["geometry"]["coordinates"]
    return np.atleast_2d(np.array(given[0] if feature["geometry"]["type"] == "Polygon" else given))


def steps_m(rows: np.ndarray) -> np.ndarray:
    """Return the geodesic length of every segment."""
    return np.array(WGS84.inv(rows[:-1, 0], rows[:-1, 1], rows[1:, 0], rows[1:, 1])[2])


def on_grid(rows: np.ndarray) -> np.ndarray:
    """Return rows in metres of the zone the island lies in."""
    return np.column_stack(TO_UTM.transform(rows[:, 0], rows[:, 1]))


def whole_route() -> np.ndarray:
    """Return the link from end to end."""
    lines = [coordinates(feature) for feature in link("LineString")]
    return np.vstack([lines[0], *(line[1:] for line in lines[1:])])


def test_files_are_made_again_to_the_byte(island: Island, tmp_path: Path) -> None:
    """The script gives exactly the files that are committed, and no other."""
    assert island.script.main(["--out", str(tmp_path)]) == 0
    made = sorted(str(p.relative_to(tmp_path)) for p in tmp_path.rglob("*") if p.is_file())
    assert made == sorted(MADE)
    for name in MADE:
        assert (tmp_path / name).read_bytes() == (DEMO / name).read_bytes(), name


def test_files_are_small() -> None:
    """All made files together stay below a megabyte."""
    assert sum((DEMO / name).stat().st_size for name in MADE) < 1_000_000


def test_everything_lies_in_the_declared_box(island: Island) -> None:
    """No coordinate of any file lies outside the declared bounds, nor has too many digits."""
    west, south, east, north = island.frame.BOUNDS
    for name in VECTORS:
        rows = np.vstack([coordinates(feature)[:, :2] for feature in features(name)])
        assert np.all((rows > [west, south]) & (rows < [east, north])), name
        assert np.array_equal(rows, np.round(rows, 7)), name


@pytest.mark.parametrize("land", LAND)
def test_box_is_far_from_land(island: Island, land: str) -> None:
    """The island lies at least 700 km from the nearest land on every side."""
    west, south, east, north = island.frame.BOUNDS
    corners = [(lon, lat) for lon in (west, east) for lat in (south, north)]
    assert min(WGS84.inv(*corner, *LAND[land])[2] for corner in corners) > 700_000


def test_frame_is_invertible_and_true_to_scale(island: Island) -> None:
    """The local frame leads back to where it came from, and its metres are metres to 0.3 %."""
    xy = np.array([(-12_000.0, -9_000.0), (12_000.0, 9_000.0), (0.0, 0.0), (0.0, 8_000.0)])
    lonlat = island.frame.lonlat_from_xy(xy)
    assert np.abs(island.frame.xy_from_lonlat(lonlat) - xy).max() < 1e-5
    for a, b in combinations(range(len(xy)), 2):
        true_m = WGS84.inv(*lonlat[a], *lonlat[b])[2]
        assert np.hypot(*(xy[a] - xy[b])) == pytest.approx(true_m, rel=0.003)


def test_coast_is_where_the_ground_meets_the_sea(island: Island) -> None:
    """The coast is a closed, simple ring at height zero, land inside it and sea outside."""
    ring = coordinates(features(MADE[0])[0])
    assert np.array_equal(ring[0], ring[-1])
    assert np.abs(island.terrain.height_of_lonlat_m(ring)).max() < 0.1
    shape = Polygon(on_grid(ring))
    assert shape.is_valid
    assert shape.exterior.is_ccw
    west, south, east, north = island.frame.BOUNDS
    random = np.random.Generator(np.random.PCG64(7))
    places = random.uniform((west, south), (east, north), (300, 2))
    height_m = island.terrain.height_of_lonlat_m(places)
    for place, height in zip(on_grid(places), height_m, strict=True):
        if shape.exterior.distance(Point(place)) > 10.0:
            assert shape.contains(Point(place)) == (height > 0)


def test_hills_and_river(island: Island) -> None:
    """Quenmoor is the highest place, 350 to 450 m up, and the river only falls."""
    terrain = island.terrain
    grid = terrain.terrain_grid(-21.76, -38.50, 0.002, (100, 160))
    top_m = float(terrain.height_m(island.layers.mast_xy()[None])[0])
    assert 350.0 < top_m < 450.0
    assert grid.max() <= top_m
    assert np.all(np.diff(terrain.height_m(terrain.river_xy())) <= 0.0)


def test_terrain_grid_agrees_with_single_places(island: Island) -> None:
    """A raster cell holds the height of its middle, rows counted from the north."""
    grid = island.terrain.terrain_grid(-21.60, -38.55, 0.01, (3, 4))
    middle = np.array([[-21.60 + 2.5 * 0.01, -38.55 - 1.5 * 0.01]])
    assert grid.shape == (3, 4)
    assert grid[1, 2] == pytest.approx(island.terrain.height_of_lonlat_m(middle)[0], abs=0.051)


def test_streets_stay_on_land_and_join_up(island: Island) -> None:
    """Every street lies on land and can be reached from every other along shared corners."""
    lines = [coordinates(feature) for feature in features(MADE[1])]
    assert all(np.all(island.terrain.height_of_lonlat_m(line) > 0) for line in lines)
    corners = [{tuple(row) for row in line.tolist()} for line in lines]
    joined, pending = set(corners[0]), corners[1:]
    while pending:
        apart = [line for line in pending if joined.isdisjoint(line)]
        assert len(apart) < len(pending), f"{len(apart)} streets cannot be reached"
        joined.update(*(line for line in pending if line not in apart))
        pending = apart


def test_only_bridges_cross_the_river(island: Island) -> None:
    """Two bridges cross the river, once each, and no other street does."""
    river = LineString(on_grid(island.frame.lonlat_from_xy(island.terrain.river_xy())))
    crossed = [
        feature["properties"].get("bridge", False)
        for feature in features(MADE[1])
        if LineString(on_grid(coordinates(feature))).intersects(river)
    ]
    assert crossed == [True, True]


def test_stretches_join_end_to_end() -> None:
    """Each stretch begins exactly where the one before ends; sites stand at the two ends."""
    lines = [coordinates(feature) for feature in link("LineString")]
    for before, after in pairwise(lines):
        assert np.array_equal(before[-1], after[0])
    sites = {f["properties"]["role"]: f for f in link("Point") if "role" in f["properties"]}
    assert np.array_equal(coordinates(sites["studio"])[0], lines[0][0])
    assert np.array_equal(coordinates(sites["transmitter"])[0], lines[-1][-1])


def test_stretches_are_of_every_kind_promised() -> None:
    """The link runs in duct, on poles, buried and over a bridge, 15 to 25 km in all."""
    placements = [feature["properties"]["placement"] for feature in link("LineString")]
    assert placements == ["duct", "aerial", "buried", "bridge", "duct", "buried", "buried"]
    assert 15_000 < steps_m(whole_route()).sum() < 25_000


def test_route_bends_and_has_close_vertices() -> None:
    """Vertices stand 20 to 80 m apart, and no long part of the route is ruler-straight."""
    route = whole_route()
    assert steps_m(route).min() > 20.0
    assert steps_m(route).max() < 80.0
    grid = on_grid(route)
    for start in range(0, len(grid) - 20, 10):
        part = LineString(grid[start : start + 20])
        assert part.length > Point(grid[start]).distance(Point(grid[start + 19])) + 0.01


def test_points_have_names_of_their_own_and_known_properties() -> None:
    """Properties are those the planner knows; reach point names are not used twice."""
    assert all(set(f["properties"]) == LINE_KEYS for f in link("LineString"))
    points = [feature["properties"] for feature in link("Point")]
    assert all(set(point) <= POINT_KEYS for point in points)
    names = [point["name"] for point in points if point["kind"] != "crossing"]
    assert len(names) == len(set(names))
    assert {point["joint"] for point in points if "joint" in point} == {"yes", "no"}
    assert all("joint" not in point for point in points if point["kind"] == "pole")
    crosses = {point["crosses"] for point in points if point["kind"] == "crossing"}
    assert crosses == {"road", "rail", "water", "power"}


def test_points_lie_on_the_route() -> None:
    """Every declared point lies within 3 m of the route."""
    route = LineString(on_grid(whole_route()))
    for feature in link("Point"):
        away_m = route.distance(Point(on_grid(coordinates(feature))[0]))
        assert away_m < 3.0, feature["properties"]["name"]


def test_poles_are_the_vertices_of_the_aerial_stretch() -> None:
    """One pole stands at every vertex of the aerial stretch, 50 to 65 m from the next."""
    aerial = next(f for f in link("LineString") if f["properties"]["placement"] == "aerial")
    poles = [f for f in link("Point") if f["properties"]["kind"] == "pole"]
    assert np.array_equal(np.vstack([coordinates(pole) for pole in poles]), coordinates(aerial))
    spans_m = steps_m(coordinates(aerial))
    assert spans_m.min() > 50.0
    assert spans_m.max() < 65.0
    assert sum("loop_m" in pole["properties"] for pole in poles) == 5


def test_places_fit_for_a_joint_are_near_enough() -> None:
    """No gap between places fit for a joint is over 600 m, so that the planner assumes none."""
    route = LineString(on_grid(whole_route()))
    at_m = [0.0, route.length]
    for feature in link("Point"):
        kind, joint = feature["properties"]["kind"], feature["properties"].get("joint", "yes")
        if kind not in {"site", "crossing"} and joint != "no":
            at_m.append(route.project(Point(on_grid(coordinates(feature))[0])))
    assert np.diff(sorted(at_m)).max() < 600.0


def test_heights_are_in_the_raster_alone(island: Island) -> None:
    """The link has no heights; those the raster gives are the ground's within a metre or two."""
    from routeplan.ground.terrain import heights_at, open_terrain

    rows = np.vstack([coordinates(f) for f in [*link("LineString"), *link("Point")]])
    assert rows.shape[1] == 2
    found = heights_at(open_terrain([DEMO / RASTER]), rows).heights_m
    off_m = found - island.terrain.height_of_lonlat_m(rows)
    assert np.abs(off_m).max() < 2.5  # whole metres, straight between cells 44 by 56 m apart
    assert np.sqrt(np.mean(off_m**2)) < 0.6


def test_the_link_is_planned_on_the_islands_ground() -> None:
    """Heights come from the raster, crossings of the geometry and of the layers stand once."""
    from routeplan import plan, read_run
    from routeplan.sheets.crossing_rows import crossing_rows

    planned = plan(read_run(DEMO / "quenmoor_link"))
    (leg,) = planned.ground.legs
    assert leg.heights_from == ("terrain",)
    assert len(planned.layout.reels) == 4
    assert len(planned.layout.joints) == 3
    rows = crossing_rows(planned)
    met = {key: [row for row in rows if row["crosses"] == key] for key in ("rail", "power")}
    assert [(row["ask"], row["source"]) for row in met["rail"]] == [
        ("Skelvane Stone Railway", "declared")
    ]
    assert [(row["ask"], row["source"]) for row in met["power"]] == [
        ("Ostrellan Power", "declared")
    ]
    waters = [row for row in rows if row["crosses"] == "water"]
    assert [(row["class"], row["source"]) for row in waters] == [
        ("stream", "declared"),
        ("river", "found"),
    ]


def test_crossings_lie_on_what_they_cross(island: Island) -> None:
    """Declared crossings lie on the railway, the stream and the power line of the same island."""
    lines = {
        "rail": island.layers.railway(),
        "water": island.terrain.beck_xy(),
        "power": island.layers.power_line(),
    }
    route = LineString(on_grid(whole_route()))
    for crosses, xy in lines.items():
        other = LineString(on_grid(island.frame.lonlat_from_xy(xy)))
        declared = [f for f in link("Point") if f["properties"].get("crosses") == crosses]
        assert len(declared) == len(list(getattr(route & other, "geoms", [route & other])))
        for feature in declared:
            assert other.distance(Point(on_grid(coordinates(feature))[0])) < 1.0


def test_areas_are_met_and_avoided() -> None:
    """The route passes through the meadow that takes a permit and keeps out of the mire."""
    route = LineString(on_grid(whole_route()))
    areas = {f["properties"]["kind"]: Polygon(on_grid(coordinates(f))) for f in link("Polygon")}
    assert all(area.is_valid for area in areas.values())
    assert route.intersects(areas["permit"])
    assert 20.0 < route.distance(areas["avoid"]) < 500.0


def test_run_file_names_what_the_route_holds() -> None:
    """The circuits of the run file join sites of the route, on interfaces it can know."""
    run = tomllib.loads((DEMO / "quenmoor_link/run.toml").read_text(encoding="utf-8"))
    sites = {f["properties"]["name"] for f in link("Point") if "role" in f["properties"]}
    assert run["geometry"] == ["route.geojson"]
    assert {circuit["from"] for circuit in run["circuit"]} == {"Studio"}
    assert {circuit["to"] for circuit in run["circuit"]} | {"Studio"} == sites
    assert {circuit["interface"] for circuit in run["circuit"]} == {
        "10GBASE-ER",
        *run["interface"],
    }


def test_no_circuit_of_the_link_shines_both_ways_on_one_wavelength_of_one_fibre() -> None:
    """A circuit on a single fibre would have a wavelength for each way."""
    with (DEMO / "quenmoor_link/run.toml").open("rb") as file:
        circuits = tomllib.load(file)["circuit"]
    assert [circuit["name"] for circuit in circuits] == ["Programme", "Telemetry"]
    assert all(each["fibre_count"] > 1 or len(each["wavelengths_nm"]) > 1 for each in circuits)


def test_a_way_costs_least_where_the_ground_is_level(island: Island) -> None:
    """A way between two towns goes over the pass, not straight over the top of the fell."""
    start, end = np.array([-7_500.0, 1_000.0]), np.array([-1_600.0, 1_000.0])
    way = island.ways.lay_way(start, end, easy_slope=0.02)
    straight = np.linspace(start, end, 60)
    height_m = island.terrain.height_m
    assert height_m(way).max() < height_m(straight).max() - 50.0
    assert np.array_equal(way[[0, -1]], [start, end])


def test_a_way_that_cannot_be_is_named(island: Island) -> None:
    """A way to a place in the sea is refused with the place named."""
    with pytest.raises(ValueError, match="no way on land"):
        island.ways.lay_way(np.array([0.0, -3_000.0]), np.array([13_000.0, 9_000.0]))


def test_lines_are_cut_thinned_and_set_aside_true(island: Island) -> None:
    """Cutting keeps lengths, thinning keeps its tolerance, and a line set aside is parallel."""
    lines = island.lines
    wave = np.column_stack([np.arange(0.0, 1_001.0, 50.0), 30 * np.sin(np.arange(21) / 3)])
    length_m = float(lines.along_m(wave)[-1])
    halves = [lines.cut(wave, 0.0, 500.0), lines.cut(wave, 500.0, length_m)]
    assert sum(LineString(half).length for half in halves) == pytest.approx(length_m, abs=0.2)
    thin = lines.simplify(wave, 5.0)
    assert len(thin) < len(wave)
    assert lines.distance_to_line(wave, thin).max() <= 5.0
    aside = LineString(lines.set_aside(wave, 4.0))
    assert LineString(wave).hausdorff_distance(aside) == pytest.approx(4.0, abs=0.3)
    assert lines.cross_points(wave, np.array([[475.0, -99.0], [475.0, 99.0]])) == pytest.approx(
        [LineString(wave).project(LineString(wave) & LineString([(475, -99), (475, 99)]))]
    )
