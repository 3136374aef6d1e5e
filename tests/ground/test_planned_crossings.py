"""Whole runs over layers: what the plan lists is what an overlay by other means finds."""

from __future__ import annotations

import warnings
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely

from routeplan.sheets.document import plan_document
from routeplan.sheets.report_ground import crossings_html
from tests.ground.runs_on_ground import across, handholes, planned_with, two_km, write_layer
from tests.sheets.plans import line

Row = dict[str, Any]
STREETS = Path(__file__).parents[1] / "reference" / "streets"
LAYERS = 'layers = ["lines.geojson"]\n'
LON, LAT, STEP_DEG = 10.0, 47.0, 0.002


def rows_of(folder: Path, *features: Row, toml: str = LAYERS) -> list[Row]:
    """Return the plan document's list of what the way meets."""
    rows: Any = plan_document(planned_with(folder, toml, *features))["crossings"]
    return list(rows)


def walk(rng: np.random.Generator, *, count: int, step: float) -> list[list[float]]:
    """Return a line that wanders from somewhere in a square of a tenth of a degree."""
    start = np.array([LON, LAT]) + rng.uniform(0.0, 0.1, 2)
    points = start + np.cumsum(rng.normal(0.0, step, (count, 2)), axis=0)
    return [[float(x), float(y)] for x, y in np.round(points, 9).tolist()]


def random_way(rng: np.random.Generator) -> list[list[float]]:
    """Return a winding way through the square whose steps are short: straight in degrees too."""
    share = np.linspace(0.0, 1.0, 120)
    wave = 0.05 + 0.03 * np.sin(7.0 * share + rng.uniform(0.0, 6.0))
    points = np.round(np.column_stack([LON + 0.1 * share, LAT + wave]), 9)
    return [[float(x), float(y)] for x, y in points.tolist()]


@pytest.mark.parametrize("seed", range(4))
def test_lines_are_those_of_an_overlay(tmp_path: Path, seed: int) -> None:
    """Every meeting of a way and random lines, and no other, is in the plan, at its place."""
    import geopandas

    rng = np.random.Generator(np.random.PCG64(seed))
    own = random_way(rng)
    lines = [
        line(walk(rng, count=int(rng.integers(2, 9)), step=STEP_DEG), kind="road", name=f"R{at}")
        for at in range(300)
    ]
    write_layer(tmp_path / "lines.geojson", lines)
    rows = rows_of(tmp_path, line(own, name="Way", placement="duct"))
    met = [row for row in rows if row["how"] == "crosses"]
    frame = geopandas.read_file(tmp_path / "lines.geojson")
    points = frame.intersection(shapely.LineString(own)).explode(index_parts=False)
    points = points[~points.is_empty]
    assert (points.geom_type == "Point").all()
    expected = Counter(frame["name"].loc[points.index])
    assert len(points) > 30
    assert Counter(row["name"] for row in met) == expected
    # A step of 70 m is straight in degrees to less than a millimetre: 1e-8 degrees.
    names = frame["name"].loc[points.index].to_numpy()
    for row in met:
        here = points.to_numpy()[names == row["name"]]
        assert shapely.distance(here, shapely.Point(row["lon"], row["lat"])).min() < 2e-8


@pytest.mark.parametrize("seed", range(4))
def test_areas_are_those_of_an_overlay(tmp_path: Path, seed: int) -> None:
    """The lengths inside random areas are those of geopandas' overlay, area by area."""
    import geopandas
    from pyproj import Geod

    rng = np.random.Generator(np.random.PCG64(100 + seed))
    own = random_way(rng)
    areas = []
    for number in range(60):
        hull = shapely.MultiPoint(walk(rng, count=7, step=2 * STEP_DEG)).convex_hull
        ring = [[float(x), float(y)] for x, y in shapely.get_coordinates(hull).tolist()]
        shape = {"type": "Polygon", "coordinates": [ring]}
        properties = {"kind": "permit", "name": f"A{number}", "owner": f"O{number % 5}"}
        areas.append({"type": "Feature", "properties": properties, "geometry": shape})
    write_layer(tmp_path / "lines.geojson", areas)
    rows = rows_of(tmp_path, line(own, name="Way", placement="duct"))
    frame = geopandas.read_file(tmp_path / "lines.geojson")
    way = geopandas.GeoDataFrame(geometry=[shapely.LineString(own)], crs=frame.crs)
    parts = geopandas.overlay(way, frame, how="intersection", keep_geom_type=True)
    geod = Geod(ellps="WGS84")
    expected: Counter[str] = Counter()
    for name, part in zip(parts["name"], parts.geometry, strict=True):
        expected[name] += geod.geometry_length(part)
    found: Counter[str] = Counter()
    for row in rows:
        if row["how"] == "inside":
            found[row["name"]] += row["length_m"]
    assert len(expected) > 8
    assert dict(found) == pytest.approx(dict(expected), abs=0.01)
    assert {row["ask"] for row in rows} == set(frame.loc[frame["name"].isin(expected), "owner"])


def helsinki() -> list[list[float]]:
    """Return a way of three steps through the middle of the extract."""
    return [[24.9375, 60.1665], [24.9431, 60.1702], [24.9437, 60.1741], [24.9502, 60.1766]]


def test_an_extract_gives_its_roads_and_whom_to_ask(tmp_path: Path) -> None:
    """Streets and rails of a real extract are crossed as a plain overlay of its lines has it."""
    import geopandas

    extract = STREETS / "helsinki_centre.osm.pbf"
    (tmp_path / "area.osm.pbf").write_bytes(extract.read_bytes())
    toml = 'layers = ["area.osm.pbf"]\n'
    planned = planned_with(tmp_path, toml, line(helsinki(), name="Way", placement="duct"))
    rows: Any = plan_document(planned)["crossings"]
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        frame = geopandas.read_file(extract, layer="lines")
    points = frame.intersection(shapely.LineString(helsinki())).explode(index_parts=False)
    points = points[~points.is_empty]
    tags = frame.loc[points.index]
    is_road = tags["highway"].notna() & ~tags["highway"].isin(["proposed", "platform", "corridor"])
    expected = Counter(tags["highway"][is_road])
    crossed = [row for row in rows if row["how"] == "crosses"]
    roads = [row for row in crossed if row["crosses"] == "road"]
    assert sum(expected.values()) > 20
    assert Counter(row["class"] for row in roads) == expected
    is_rail = ~is_road & tags["railway"].isin(["rail", "tram", "subway", "light_rail"])
    rails = [row for row in crossed if row["crosses"] == "rail"]
    assert Counter(row["class"] for row in rails) == Counter(tags["railway"][is_rail])
    names = {name for name in tags["name"][is_road] if isinstance(name, str)}
    assert names <= {row["name"] for row in roads}
    tram = [row for row in rails if row["class"] == "tram"]
    assert {row["ask"] for row in tram} == {"HKL-Raitioliikenne"}
    report = crossings_html(plan_document(planned))
    asked = report.split("All that the way meets")[0]
    assert "HKL-Raitioliikenne" in asked
    assert all(f">{name}<" in asked for name in names)


@pytest.mark.parametrize("width_m", [0.0, 10.0])
def test_no_joint_stands_where_its_place_is_crossed(tmp_path: Path, width_m: float) -> None:
    """A road exactly over the handhole of a joint moves the joint to the next one."""
    rules = f"[ground]\ncrossing_width_m = {width_m}\n"
    toml = f"{LAYERS}[reels]\nput_ups_m = [1300]\n[joints]\nassumed_spacing_m = 5000.0\n{rules}"
    places = handholes(900, 1_100)
    joint_m = []
    for road_m in (300, 1_100, 900):
        write_layer(tmp_path / "lines.geojson", [across(road_m, kind="road", name="Road")])
        planned = planned_with(tmp_path, toml, two_km(), *places)
        (joint,) = planned.layout.joints
        joint_m.append(round(joint.ground_mm / 1000))
        (met,) = plan_document(planned)["crossings"]  # type: ignore[misc]
        assert met["ground_m"] == pytest.approx(road_m, abs=0.002)
    assert joint_m == [1_100, 900, 1_100]
