"""Coordinate reference systems: which one coordinates are in, and whether they can be."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyproj
import pytest

from routeplan.errors import CrsError
from routeplan.run import read_run

Feature = Callable[..., dict[str, Any]]
STREETS = Path(__file__).parents[1] / "reference" / "streets"

# The worked example of the national grid's own guide: a point of easting 651409.903 and northing
# 313177.270 lies at 52 39 27.2531 N, 1 43 4.5177 E on OSGB36. Source: Ordnance Survey, A guide to
# coordinate systems in Great Britain, annex C (projection formulae), read.
GRID = (651409.903, 313177.270)
OSGB36 = (1 + 43 / 60 + 4.5177 / 3600, 52 + 39 / 60 + 27.2531 / 3600)


def with_crs(name: str) -> dict[str, object]:
    return {"crs": {"type": "name", "properties": {"name": name}}}


def near(east: float, north: float, *, step: float = 500.0) -> list[list[float]]:
    return [[east, north], [east + step, north]]


@pytest.mark.parametrize("how", ["urn:ogc:def:crs:EPSG::27700", "EPSG:27700", "run file"])
def test_a_grid_is_put_on_its_own_datum_and_on_wgs84(
    how: str, collection: Callable[..., Path], feature: Feature, write: Callable[..., Path]
) -> None:
    """Lengths are measured on the grid's ellipsoid, maps are drawn on WGS 84."""
    members = {} if how == "run file" else with_crs(how)
    path = collection(feature("LineString", near(*GRID), name="STL-2"), **members)
    if how == "run file":
        path = write("run.toml", 'geometry = ["route.geojson"]\ncrs = "EPSG:27700"\n')
    run = read_run(path)
    (line,) = run.lines
    half_second_digit = 0.00005 / 3600
    assert line.datum_lonlat[0] == pytest.approx(OSGB36, abs=half_second_digit, rel=0)
    # Airy 1830: a = 6377563.396, published with the same guide.
    assert line.semi_major_m == 6377563.396
    assert line.inverse_flattening == pytest.approx(299.3249646)
    # The datums lie some 120 m apart here; the exact shift depends on the transformation.
    assert np.abs(line.lonlat[0] - line.datum_lonlat[0]).max() > 0.0005
    assert run.warnings == ()


def test_coordinates_that_are_not_degrees_say_what_to_do(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Metres in a file that says nothing: the message names the feature, a pair, and the key."""
    path = collection(feature("LineString", near(532410, 181220), name="STL-2"))
    assert said(path) == [
        'route.geojson, feature "STL-2": coordinates such as 532 410, 181 220 are not degrees. '
        'Name their CRS, for example crs = "EPSG:27700".'
    ]
    with pytest.raises(CrsError):
        read_run(path)


def test_a_declared_crs_that_contradicts_the_values_is_an_error(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Neither metres called degrees nor degrees called metres can be planned on."""
    metres = collection(feature("LineString", near(532410, 181220)), **with_crs("EPSG:4326"))
    assert said(metres) == [
        "route.geojson, feature 1: coordinates such as 532 410, 181 220 are not degrees. "
        "The file declares EPSG:4326; declare the CRS they are in."
    ]
    degrees = collection(
        feature("LineString", [[-0.1, 51.5], [-0.2, 51.5]]), **with_crs("EPSG:27700")
    )
    assert said(degrees) == [
        "route.geojson, feature 1: coordinates such as -0.1, 51.5 look like degrees, "
        "but the file declares the grid EPSG:27700. Name the CRS they are in."
    ]


def test_a_run_files_grid_does_not_apply_to_degrees(
    collection: Callable[..., Path], road: object, write: Callable[..., Path]
) -> None:
    """GeoJSON is in degrees unless its values say otherwise; the grid is then only for reports."""
    collection(road)
    path = write("run.toml", 'geometry = ["route.geojson"]\ncrs = "EPSG:25832"\n')
    run = read_run(path)
    assert run.crs == "EPSG:25832"
    assert run.lines[0].lonlat.tolist() == [[10.0, 50.0], [10.0, 50.01]]


def test_a_run_files_geographic_crs_is_that_of_degrees(
    collection: Callable[..., Path], road: object, write: Callable[..., Path]
) -> None:
    """Degrees on another datum are measured on its ellipsoid."""
    collection(road)
    path = write("run.toml", 'geometry = ["route.geojson"]\ncrs = "EPSG:4314"\n')
    (line,) = read_run(path).lines
    assert line.datum_lonlat.tolist() == [[10.0, 50.0], [10.0, 50.01]]
    assert line.semi_major_m == 6377397.155  # Bessel 1841
    assert np.abs(line.lonlat - line.datum_lonlat).max() > 0.0005


@pytest.mark.parametrize(
    ("crs", "part"),
    [
        ({"type": "name", "properties": {"name": "EPSG:999999"}}, 'not known ("EPSG:999999")'),
        ({"type": "link", "properties": {"href": "x"}}, "declares a CRS that is not known"),
        ({"type": "name", "properties": {"name": [1]}}, "declares a CRS that is not known ([1])"),
        ("EPSG:4326", 'declares a CRS that is not known ("EPSG:4326")'),
    ],
)
def test_an_unknown_crs_member_is_an_error(
    crs: object,
    part: str,
    collection: Callable[..., Path],
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """A CRS that is declared and not known is not taken for WGS 84."""
    assert any(part in message for message in said(collection(road, crs=crs)))


@pytest.mark.parametrize(
    ("wkt", "part"),
    [
        (
            'ENGCRS["site",EDATUM["site"],CS[Cartesian,2],AXIS["x",east],AXIS["y",north],'
            'LENGTHUNIT["metre",1]]',
            "is in a CRS that is a local system that has no known place on the earth",
        ),
        ("EPSG:4978", "is in a CRS that is geocentric"),
        (
            "+proj=merc +a=3396190 +b=3376200 +type=crs",
            "is in a CRS that cannot be taken to longitude and latitude on the earth",
        ),
    ],
)
def test_a_crs_without_a_place_on_the_earth_is_an_error(
    wkt: str,
    part: str,
    collection: Callable[..., Path],
    feature: Feature,
    said: Callable[[Path], list[str]],
) -> None:
    """A building's own grid cannot be put on a map."""
    (message,) = said(collection(feature("LineString", near(1000, 1000)), **with_crs(wkt)))
    assert part in message


def test_web_mercator_is_measured_on_the_ground() -> None:
    """Web mercator is accepted, warned of, and its stretched metres are not taken as lengths."""
    run = read_run(STREETS / "prague_streets_3857.geojson")
    ((where, message),) = run.warnings
    assert where == "prague_streets_3857.geojson"
    assert "web mercator" in message
    geod = pyproj.Geod(ellps="WGS84")
    ground_m = sum(geod.line_length(*line.datum_lonlat.T) for line in run.lines)
    stretched_m = 0.0
    to_plane = pyproj.Transformer.from_crs(4326, 3857, always_xy=True)
    for line in run.lines:
        x, y = to_plane.transform(*line.lonlat.T)
        stretched_m += float(np.hypot(np.diff(x), np.diff(y)).sum())
    # At latitude 50.1 web mercator stretches by about 1 / cos(50.1 deg).
    assert stretched_m / ground_m == pytest.approx(1 / np.cos(np.radians(50.1)), rel=0.005)


@pytest.mark.parametrize("over", [90.5, 112.0])
def test_latitudes_beyond_90_are_named(
    over: float, collection: Callable[..., Path], feature: Feature, said: Callable[..., list[str]]
) -> None:
    """One wrong latitude is named by its feature, not taken for another CRS."""
    good = feature("LineString", [[100.0, 50.0], [100.0, 50.1]])
    bad = feature("LineString", [[100.0, 50.1], [100.0, over]], name="Hill")
    assert said(collection(good, bad)) == [
        f'route.geojson, feature "Hill": has a latitude beyond 90 degrees ({over:g}).'
    ]


def test_swapped_axes_are_told_by_impossible_latitudes(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Values that are only possible the other way round were written the other way round."""
    assert said(collection(feature("LineString", [[-38.6, 144.2], [-38.7, 144.2]]))) == [
        "route.geojson, feature 1: longitude and latitude look swapped "
        "(latitude 144.2, limit 90). Write longitude first."
    ]


def test_swapped_points_are_told_by_the_lines(
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """Points that would lie beside the line once turned were written latitude first."""
    point = feature("Point", [50.005, 10.0], kind="handhole")
    (message,) = said(collection(road, point))
    assert "has points whose longitude and latitude look swapped" in message


def test_swapped_files_are_told_by_the_other_files(
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    write: Callable[..., Path],
    said: Callable[[Path], list[str]],
) -> None:
    """A second file in the wrong order is named."""
    collection(road)
    collection(feature("LineString", [[50.01, 10.0], [50.02, 10.0]]), name="more.geojson")
    (message,) = said(write("run.toml", 'geometry = ["route.geojson", "more.geojson"]'))
    assert message.startswith("more.geojson: has lines whose longitude and latitude look swapped")


def test_swapped_grid_coordinates_are_told_by_the_area_of_the_grid(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Northing before easting puts a line outside the grid's country."""
    lines = feature("LineString", [[6_900_000.0, 380_000.0], [6_900_500.0, 380_000.0]])
    (message,) = said(collection(lines, **with_crs("EPSG:3067")))
    assert "the two coordinates look swapped for EPSG:3067" in message
    right = feature("LineString", [[380_000.0, 6_900_000.0], [380_000.0, 6_900_500.0]])
    assert read_run(collection(right, **with_crs("EPSG:3067"))).warnings == ()


def test_coordinates_far_outside_a_grids_area_are_warned_of(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """A grid of another country gives places, but distorted ones."""
    line = feature("LineString", near(900_000.0, 1_900_000.0))
    run = read_run(collection(line, **with_crs("EPSG:27700")))
    assert "lies outside the area that EPSG:27700 is made for" in run.warnings[0][1]


def test_one_vertex_in_metres_among_degrees_is_named(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """A slip in one vertex is not taken for another CRS of the whole file."""
    line = feature("LineString", [[10.0, 50.0], [10.0, 50.1], [10.0, 50.2], [532410.0, 181220.0]])
    assert said(collection(line)) == [
        "route.geojson, feature 1: has a vertex that is not in degrees while the others are "
        "(532 410, 181 220)."
    ]


def test_a_long_straight_line_of_a_grid_stays_straight(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Straight in a grid is no geodesic: vertices are put in, and marked as nobody's."""
    start, end = [400_000.0, 700_000.0, 10.0], [400_000.0, 705_000.0, 20.0]
    line = feature("LineString", [start, end, [400_500.0, 705_000.0, 20.0]])
    (line_read,) = read_run(collection(line, **with_crs("EPSG:27700"))).lines
    assert line_read.is_drawn is not None
    assert line_read.is_drawn.tolist() == [True, False, False, False, False, True, True]
    assert line_read.heights_m is not None
    assert line_read.heights_m.tolist() == [10.0, 12.0, 14.0, 16.0, 18.0, 20.0, 20.0]
    back = pyproj.Transformer.from_crs(4277, 27700, always_xy=True)
    east, north = back.transform(*line_read.datum_lonlat.T)
    assert east[:6] == pytest.approx([400_000.0] * 6, abs=1e-5)
    assert north[:6] == pytest.approx(np.arange(700_000.0, 705_001.0, 1000.0), abs=1e-5)


def test_feet_of_a_grid_and_of_its_heights_are_metres_afterwards(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """US survey feet on both axes: places are right, and heights are converted."""
    name = "EPSG:2263+6360"  # New York Long Island (ftUS) with NAVD88 height (ftUS)
    line = feature("LineString", [[984_250.0, 209_000.0, 100.0], [984_350.0, 209_000.0, 200.0]])
    (line_read,) = read_run(collection(line, **with_crs(name))).lines
    geod = pyproj.Geod(ellps="GRS80")
    metres_a_survey_foot = 1200 / 3937  # its definition
    assert geod.line_length(*line_read.datum_lonlat.T) == pytest.approx(
        100 * metres_a_survey_foot, rel=2e-4
    )
    assert line_read.heights_m == pytest.approx(np.array([100.0, 200.0]) * metres_a_survey_foot)


def test_paris_meridian_and_gons_become_degrees_from_greenwich(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Everything after reading counts degrees from Greenwich, whatever the file counts from."""
    line = feature("LineString", [[0.0, 54.0], [0.001, 54.0]])
    (line_read,) = read_run(collection(line, **with_crs("EPSG:4807"))).lines
    # The Paris meridian lies 2.5969213 gon east of Greenwich; 54 gon are 48.6 degrees.
    assert line_read.datum_lonlat[0] == pytest.approx([2.33722917, 48.6], abs=1e-8)
    assert line_read.semi_major_m == 6378249.2


def test_a_place_beyond_a_projection_is_named(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Coordinates that no projection undoes are named, not turned into infinity."""
    line = feature("LineString", [[1e9, 1e9], [1e9, 2e9]], name="Hill")
    (message,) = said(collection(line, **with_crs("EPSG:3035")))
    assert 'feature "Hill": has coordinates that are no place on the earth in its CRS' in message
