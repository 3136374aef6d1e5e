"""Lengths and projections against published geodesics, Snyder's grid and GeographicLib."""

from __future__ import annotations

import csv
import json
import math
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import given
from hypothesis import strategies as st

from routeplan import geodesy
from routeplan.planning import plan
from routeplan.run.reading import read_run
from routeplan.sheets.document import plan_document

REFERENCE = Path(__file__).parent / "reference"
BESSEL = (6377397.155, 299.1528128)
CLARKE = (6378206.4, 294.9786982)
with (REFERENCE / "geodesic_cases.csv").open(encoding="utf-8") as _file:
    CASES = list(csv.DictReader(_file))
STREETS = ("helsinki_road.geojson", "helsinki_streets.geojson")


def geographiclib_m(lonlat: Any) -> float:
    """Return the length of a polyline on WGS 84 by the independent implementation."""
    return sum(
        Geodesic.WGS84.Inverse(lat1, lon1, lat2, lon2)["s12"]
        for (lon1, lat1), (lon2, lat2) in pairwise(lonlat)
    )


def write_line(folder: Path, coordinates: Any, *, crs: str = "", toml: str = "") -> Path:
    """Write a bare line, in a CRS if one is named, with a run file if there is text for one."""
    shape: dict[str, Any] = {"type": "LineString", "coordinates": coordinates}
    if crs and crs != "EPSG:4326":
        name = "urn:ogc:def:crs:" + crs.replace(":", "::")
        member = {"type": "name", "properties": {"name": name}}
        feature = {"type": "Feature", "properties": {}, "geometry": shape}
        shape = {"type": "FeatureCollection", "crs": member, "features": [feature]}
    path = folder / "line.geojson"
    path.write_text(json.dumps(shape), encoding="utf-8")
    if toml:
        (folder / "run.toml").write_text('geometry = ["line.geojson"]\n' + toml, encoding="utf-8")
    return folder if toml else path


def planned_leg(path: Path) -> dict[str, Any]:
    """Return the only leg of a run as plan.json holds it."""
    (leg,) = plan_document(plan(read_run(path)))["legs"]
    return leg


# ------------------------------------------------------------------ published lines


@pytest.mark.parametrize("case", CASES, ids=lambda case: case["case"])
def test_published_geodesics_through_the_whole_plan(case: dict[str, str], tmp_path: Path) -> None:
    """A file of two vertices plans to the published distance, to the millimetre it is given in."""
    ends = [
        [float(case["lon1_deg"]), float(case["lat1_deg"])],
        [float(case["lon2_deg"]), float(case["lat2_deg"])],
    ]
    leg = planned_leg(write_line(tmp_path, ends, crs=case["crs"]))
    digit_m = max(float(case["printed_digit_m"]), 0.001)
    assert leg["ellipsoid_m"] == pytest.approx(float(case["length_m"]), abs=0.5001 * digit_m)
    assert leg["ground_m"] == pytest.approx(leg["ellipsoid_m"], abs=0.00051)


def test_the_test_set_for_geodesics_to_ten_nanometres() -> None:
    """The line of the test set for geodesics comes out to its float, not only to a millimetre."""
    case = CASES[0]
    ends = np.array([[case["lon1_deg"], case["lat1_deg"]], [case["lon2_deg"], case["lat2_deg"]]])
    (length_m,) = geodesy.steps_m(ends.astype(float))
    assert length_m == pytest.approx(float(case["length_m"]), abs=1e-8)


def test_vincenty_line_needs_the_ellipsoid_of_its_file() -> None:
    """On WGS 84 the Bessel line is kilometres off: the file's own ellipsoid is what measures it."""
    ends = np.array([[0.0, 55.75], [108 + 13 / 60, -(33 + 26 / 60)]])
    on_bessel = geodesy.steps_m(ends, semi_major_m=BESSEL[0], inverse_flattening=BESSEL[1])[0]
    assert on_bessel == pytest.approx(14110526.170, abs=0.0005)
    assert abs(geodesy.steps_m(ends)[0] - on_bessel) > 1000


# ------------------------------------------------------------------ Snyder's grid


# J. P. Snyder, Map Projections: A Working Manual, USGS Professional Paper 1395, p. 269:
# UTM zone 18 on Clarke 1866 puts 40 30 N, 73 30 W at x 127106.5 from the central meridian,
# y 4484124.4, with the scale factor 0.9997989.
SNYDER = np.array([[-75.0, 0.0], [-73.5, 40.5]])
CLARKE_UTM_18 = "+proj=utm +zone=18 +ellps=clrk66 +type=crs"


def test_snyder_example_in_the_grid() -> None:
    """A line from the grid's origin to Snyder's point has the length of his coordinates."""
    grid_m = geodesy.grid_length_m(SNYDER, CLARKE_UTM_18)
    assert grid_m == pytest.approx(math.hypot(127106.5, 4484124.4), abs=0.05)
    corner = np.array([[-75.0, 40.5], [-73.5, 40.5]])
    assert geodesy.grid_length_m(corner, CLARKE_UTM_18) == pytest.approx(127106.5, rel=1e-4)


def test_snyder_scale_factor() -> None:
    """A short line at Snyder's point is longer on the ellipsoid by his scale factor."""
    for step in ([1e-4, 0.0], [0.0, 1e-4], [1e-4, 1e-4]):
        line = np.array([[-73.5, 40.5], [-73.5 + step[0], 40.5 + step[1]]])
        (ellipsoid_m,) = geodesy.steps_m(line, semi_major_m=CLARKE[0], inverse_flattening=CLARKE[1])
        scale = geodesy.grid_length_m(line, CLARKE_UTM_18) / ellipsoid_m
        assert scale == pytest.approx(0.9997989, abs=1.0e-7)


def test_snyder_example_through_the_whole_plan(tmp_path: Path) -> None:
    """A file on the old American datum with its own grid reports Snyder's grid metres."""
    ends = [[-75.0, 39.0], [-73.5, 40.5]]
    path = write_line(tmp_path, ends, crs="EPSG:4267", toml='crs = "EPSG:26718"')
    leg = planned_leg(path)
    # 39 N on the central meridian: Clarke 1866 meridian arc times 0.9996, by the implementation
    # above; Snyder's point as printed.
    north_m = 0.9996 * Geodesic(CLARKE[0], 1 / CLARKE[1]).Inverse(0, -75, 39, -75)["s12"]
    assert leg["grid_m"] == pytest.approx(math.hypot(127106.5, 4484124.4 - north_m), abs=0.07)
    assert leg["grid_crs"] == "EPSG:26718"
    assert leg["grid_scale_factor"] == pytest.approx(leg["grid_m"] / leg["ellipsoid_m"], abs=1e-9)
    assert 0.9996 < leg["grid_scale_factor"] < 0.9998


def test_same_point_on_the_world_ellipsoid() -> None:
    """On WGS 84 the same point lies at 627103.087, 4484335.402, as derived beside Snyder's."""
    east_m = geodesy.grid_length_m(np.array([[-73.5, 40.5], [-73.5, 40.5 + 1e-9]]), "EPSG:32618")
    assert east_m < 0.001
    whole_m = geodesy.grid_length_m(SNYDER, "EPSG:32618")
    assert whole_m == pytest.approx(math.hypot(627103.087 - 500000, 4484335.402), abs=0.001)


def test_a_grid_in_feet_is_reported_in_metres() -> None:
    """A state plane in US survey feet gives metres."""
    line = np.array([[-71.1, 42.3], [-71.0, 42.3]])
    feet, metres = (geodesy.grid_length_m(line, crs) for crs in ("EPSG:2249", "EPSG:26986"))
    assert feet == pytest.approx(metres, rel=1e-6)
    assert metres == pytest.approx(geodesy.steps_m(line)[0], rel=1e-4)


# ------------------------------------------------------------------ real streets


@pytest.mark.parametrize("name", STREETS)
def test_real_streets_agree_with_the_independent_implementation(name: str) -> None:
    """Streets as surveyed measure the same by GeographicLib, to a tenth of a millimetre a km."""
    run = read_run(REFERENCE / "streets" / name)
    for line in run.lines:
        other_m = geographiclib_m(line.lonlat.tolist())
        own_m = float(geodesy.steps_m(line.lonlat).sum())
        assert other_m > 100
        assert own_m == pytest.approx(other_m, abs=1e-4 * other_m / 1000)
    for leg in plan(run).ground.legs:
        other_m = geographiclib_m(leg.lonlat.tolist())
        assert leg.ellipsoid_m == pytest.approx(other_m, abs=1e-4 * other_m / 1000)


def test_web_mercator_streets_are_measured_on_the_ellipsoid() -> None:
    """Streets stored in web mercator, half as long again there, come out at their true length."""
    run = read_run(REFERENCE / "streets" / "prague_streets_3857.geojson")
    planned = plan(run)
    stored = json.loads((REFERENCE / "streets" / "prague_streets_3857.geojson").read_text())
    in_mercator_m = sum(
        math.dist(a, b)
        for feature in stored["features"]
        for a, b in pairwise(feature["geometry"]["coordinates"])
    )
    own_m = sum(leg.ellipsoid_m for leg in planned.ground.legs)
    other_m = sum(geographiclib_m(line.lonlat.tolist()) for line in run.lines)
    assert own_m == pytest.approx(other_m, abs=1e-4 * other_m / 1000)
    assert in_mercator_m / own_m == pytest.approx(1.56, abs=0.02)  # 1 / cos(50 N)
    for leg in planned.ground.legs:
        assert leg.grid_crs == "EPSG:32633"
        assert leg.grid_m == pytest.approx(leg.ellipsoid_m, rel=6e-4)


@given(
    lat=st.floats(-89.99, 89.99),
    lon=st.floats(-180.0, 180.0),
    azimuth=st.floats(0.0, 360.0),
    length_m=st.sampled_from([0.01, 1.0, 30.0, 500.0, 999.9, 1000.1, 5e3, 1e6]),
)
def test_steps_equal_the_geodesic(lat: float, lon: float, azimuth: float, length_m: float) -> None:
    """Any step, anywhere, is the geodesic to a hundredth of a part in a million."""
    there = Geodesic.WGS84.Direct(lat, lon, azimuth, length_m)
    line = np.array([[lon, lat], [there["lon2"], there["lat2"]]])
    (found_m,) = geodesy.steps_m(line)
    # Near a pole a double of longitude and latitude itself holds a step to some nanometres only.
    assert found_m == pytest.approx(length_m, rel=1e-8, abs=2e-8)


def test_steps_are_within_a_hundredth_ppm_up_to_the_hand_over() -> None:
    """The short form errs by less than 0.01 ppm wherever it is used: to 1 km, to latitude 70."""
    from pyproj import Geod

    rng = np.random.default_rng(3)
    start = np.column_stack([rng.uniform(-180, 180, 20000), rng.uniform(-69.98, 69.98, 20000)])
    azimuth, length_m = rng.uniform(0, 360, 20000), rng.uniform(1, 1000, 20000)
    lon, lat, _ = Geod(ellps="WGS84").fwd(start[:, 0], start[:, 1], azimuth, length_m)
    lines = np.stack([start, np.column_stack([lon, lat])], axis=1).reshape(-1, 2)
    found_m = geodesy.steps_m(lines)[::2]
    assert np.abs(found_m / length_m - 1).max() < 1e-8


# ------------------------------------------------------------------ edges of the map


@pytest.mark.parametrize("latitude", [0.0, -17.5, 52.0, -71.0])
@pytest.mark.parametrize("length_m", [22.0, 5_000.0, 900_000.0])
def test_antimeridian_steps_are_as_long_as_elsewhere(latitude: float, length_m: float) -> None:
    """A step over the antimeridian is as long as the same step far from it, both ways."""
    there = Geodesic.WGS84.Direct(latitude, 0.0, 80.0, length_m)
    half = there["lon2"] / 2
    here = np.array([[180.0 - half, latitude], [-180.0 + half, there["lat2"]]])
    assert geodesy.steps_m(here)[0] == pytest.approx(length_m, rel=1e-8)
    assert geodesy.steps_m(here[::-1])[0] == geodesy.steps_m(here)[0]


def test_a_short_step_over_the_antimeridian_is_not_round_the_world() -> None:
    """The 22 m step that a naive difference of longitudes makes 39 470 km."""
    line = np.array([[179.9999, -10.0], [-179.9999, -10.0]])
    assert geodesy.steps_m(line)[0] == pytest.approx(21.928, abs=0.001)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_hemispheres_mirror(sign: float) -> None:
    """North and south of the equator, east and west of Greenwich, lengths are the same."""
    rng = np.random.default_rng(1)
    line = np.array([20.0, 40.0]) + np.cumsum(rng.normal(0, 0.01, (50, 2)), axis=0)
    mirrored = line * [sign, -1.0]
    assert geodesy.steps_m(mirrored) == pytest.approx(geodesy.steps_m(line), rel=1e-12)


def test_a_step_over_the_pole() -> None:
    """Nearly at the pole a step is still the geodesic: 2 x 1117 m over it, not round it."""
    line = np.array([[0.0, 89.99], [180.0, 89.99]])
    assert geodesy.steps_m(line)[0] == pytest.approx(2 * 1116.94, abs=0.02)
    assert geodesy.steps_m(line)[0] == pytest.approx(geographiclib_m(line.tolist()), abs=1e-6)


def test_a_line_on_a_sphere() -> None:
    """With no flattening a degree of meridian is the radius times a degree."""
    line = np.array([[0.0, 0.0], [0.0, 1.0], [0.0, 1.005]])
    found = geodesy.steps_m(line, semi_major_m=6_371_000.0, inverse_flattening=0.0)
    assert found == pytest.approx(6_371_000.0 * np.radians([1.0, 0.005]), rel=1e-9)


def test_no_steps_and_repeated_vertices() -> None:
    """A single vertex has no step; a repeated one has a step of nothing."""
    assert len(geodesy.steps_m(np.array([[1.0, 2.0]]))) == 0
    assert geodesy.steps_m(np.array([[1.0, 2.0]] * 3)).tolist() == [0.0, 0.0]


@pytest.mark.parametrize("count", [8190, 8193, 8194, 20001])
def test_chunks_leave_no_seam(count: int) -> None:
    """A line longer than a chunk measures as its steps do one by one."""
    line = np.column_stack([np.arange(count) * 1e-4 - 30.0, np.sin(np.arange(count)) * 1e-3])
    found = geodesy.steps_m(line)
    assert len(found) == count - 1
    for at in (0, 8190, 8191, 8192, count - 3):
        if at + 2 <= count:
            assert found[at] == geodesy.steps_m(line[at : at + 2])[0]


# ------------------------------------------------------------------ heights


def test_published_elevation_factor() -> None:
    """
    R / (R + h) for 500 ft over the earth's radius of 20 906 000 ft, as in textbook surveying.

    The combined factor 0.999981 x 20906000 / 20906500 is printed as 0.999957.
    """
    up = geodesy.ground_steps_m(
        np.array([1000.0]), np.array([500.0, 500.0]), radius_m=20_906_000.0
    )[0]
    assert 0.999981 * 1000.0 / up == pytest.approx(0.999957, abs=0.5e-6)


def test_height_lengthens_by_a_quarter_millimetre_a_metre() -> None:
    """At 152.4 m the factor is 0.99997608, at 1500 m 0.99976465, with R = 6372 km."""
    for height_m, factor in ((152.4, 0.99997608), (1500.0, 0.99976465)):
        heights = np.array([height_m, height_m])
        up = geodesy.ground_steps_m(np.array([1000.0]), heights, radius_m=6_372_000.0)[0]
        assert 1000.0 / up == pytest.approx(factor, abs=0.6e-8)


def test_slope_and_unknown_heights() -> None:
    """A slope adds by Pythagoras; a step with an unknown height stays level; none at all too."""
    steps = np.array([30.0, 30.0, 30.0])
    heights = np.array([0.0, 40.0, np.nan, 0.0])
    found = geodesy.ground_steps_m(steps, heights, radius_m=1e12)
    assert found == pytest.approx([50.0, 30.0, 30.0])
    assert geodesy.ground_steps_m(steps, None, radius_m=1e12) is steps


# ------------------------------------------------------------------ helpers of the rooms above


def test_densified_points_lie_on_the_geodesic() -> None:
    """Points put into a long step are on the geodesic and equally far apart, to a micrometre."""
    line = np.array([[-30.0, 60.0], [-10.0, 62.0], [-9.999, 62.0]])
    lengths = geodesy.steps_m(line)
    dense, index = geodesy.densified(line, step_m=10_000.0, lengths_m=lengths)
    assert index[0] == 0
    assert index[-1] == 2
    assert (np.diff(index) > 0).all()
    parts = geodesy.steps_m(dense)
    assert parts[:-1] == pytest.approx(lengths[0] / (len(parts) - 1), abs=1e-6)
    assert parts.sum() == pytest.approx(lengths.sum(), abs=1e-6)
    inverse = Geodesic.WGS84.Inverse(60.0, -30.0, 62.0, -10.0)
    for (lon, lat), at in zip(dense[1:-2], index[1:-2], strict=True):
        there = Geodesic.WGS84.Direct(60.0, -30.0, inverse["azi1"], at * inverse["s12"])
        assert (lon, lat) == pytest.approx((there["lon2"], there["lat2"]), abs=1e-11)


def test_densified_runs_on_over_the_antimeridian() -> None:
    """Points put into a step over the antimeridian do not jump back round the world."""
    line = np.array([[179.9, -10.0], [180.1, -10.0]])
    dense, _ = geodesy.densified(line, step_m=500.0, lengths_m=geodesy.steps_m(line))
    assert len(dense) > 40
    assert (np.diff(dense[:, 0]) > 0).all()
    assert dense[-1].tolist() == [180.1, -10.0]


def test_unwrapped_and_wrapped_are_inverse() -> None:
    """Longitudes that cross the antimeridian twice run on, and come back the same."""
    lon = np.array([170.0, 179.0, -179.0, -170.0, 175.0, -175.0])
    on = geodesy.unwrapped(lon)
    assert np.abs(np.diff(on)).max() <= 15
    assert geodesy.wrapped(on) == pytest.approx(lon)


def test_zones() -> None:
    """UTM zones: six degrees each, from 180 W, their own codes south of the equator."""
    cases = {
        (-180.0, 1.0): 32601,
        (179.99, 1.0): 32660,
        (180.0, 1.0): 32601,
        (186.0, 1.0): 32602,
        (-0.01, 51.0): 32630,
        (0.0, 51.0): 32631,
        (0.0, -0.1): 32731,
    }
    assert {at: geodesy.utm_crs(*at) for at in cases} == {
        at: f"EPSG:{code}" for at, code in cases.items()
    }


@given(st.lists(st.tuples(st.integers(-3, 3), st.integers(-3, 3)), min_size=2, max_size=6))
def test_canonical_direction(points: list[tuple[int, int]]) -> None:
    """Of a line and its reverse exactly one is turned, unless they are the same line."""
    line = np.array(points, dtype=float)
    flags = {geodesy.is_turned(line), geodesy.is_turned(line[::-1])}
    assert flags == ({False} if (line == line[::-1]).all() else {False, True})


@pytest.mark.parametrize(("length_m", "error_m"), [(25.0, 0.0004), (50.0, 0.0013), (200.0, 0.021)])
def test_local_metres(length_m: float, error_m: float) -> None:
    """East and north of a near point agree with the geodesic as closely as is said."""
    for latitude in (0.0, 45.0, -60.0, 80.0):
        for azimuth in range(0, 360, 15):
            there = Geodesic.WGS84.Direct(latitude, 179.9999, azimuth, length_m)
            point = np.array([[there["lon2"], there["lat2"]]])
            east, north = geodesy.local_xy_m(point, lon=179.9999, lat=latitude)
            angle = math.radians(azimuth)
            off = (east[0] - length_m * math.sin(angle), north[0] - length_m * math.cos(angle))
            assert math.hypot(*off) < error_m
