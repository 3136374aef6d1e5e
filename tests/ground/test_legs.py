"""Legs: their three lengths, stations, stretches, points and positions, all round the world."""

from __future__ import annotations

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan import geodesy
from routeplan.errors import CrsError
from routeplan.ground.legs import lay_ground
from routeplan.ground.model import Ground, Leg
from routeplan.ground.points import position_at
from routeplan.run.model import Line, Place
from tests.drawn_runs import LAT, LON, lonlat, make_line, make_place, make_run, straight


def ground(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> Ground:
    return lay_ground(make_run(lines, places, toml=toml))


def only_leg(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> Leg:
    (leg,) = ground(*lines, places=places, toml=toml).legs
    return leg


# ------------------------------------------------------------------ lengths


def test_three_lengths_and_their_factor() -> None:
    """Ellipsoid by GeographicLib, grid by the zone's scale, ground by height: each its own."""
    heights = np.full(11, 1500.0)
    leg = only_leg(make_line(straight(10_000.0, count=11), heights_m=heights))
    assert leg.ellipsoid_m == pytest.approx(10_000.0, abs=1e-6)
    # 30 W is the edge of zone 26 (central meridian 27 W): at 44 N the scale is about 1.00031.
    assert leg.grid_crs == "EPSG:32626"
    assert leg.grid_m / leg.ellipsoid_m == pytest.approx(1.00031, abs=0.00003)
    assert leg.length_mm == pytest.approx(10_000_000 * (1 + 1500 / 6371008.8), abs=1)


def test_grid_of_the_run() -> None:
    """A projected CRS of the run is the grid reported; a geographic one leaves it to the zone."""
    line = make_line(straight(5000.0))
    in_grid = only_leg(line, toml='crs = "EPSG:3035"')
    assert in_grid.grid_crs == "EPSG:3035"
    assert in_grid.grid_m != only_leg(line).grid_m
    assert only_leg(line, toml='crs = "EPSG:4258"').grid_crs == "EPSG:32626"


def test_a_grid_that_does_not_reach_is_an_error() -> None:
    """A run's grid that has no coordinates for a leg is named."""
    far = make_line(np.array([[88.0, 0.0], [88.1, 0.0]]))
    with pytest.raises(CrsError, match='leg "A - B": the grid EPSG:27700 does not reach it'):
        ground(far, toml='crs = "EPSG:27700"')


def test_a_zone_that_does_not_reach_leaves_the_grid_unknown() -> None:
    """A leg over half the equator has no length in one zone, but is planned."""
    leg = only_leg(make_line(np.array([[-120.0, 0.0], [70.0, 1.0]])))
    assert np.isnan(leg.grid_m)
    assert leg.ellipsoid_m == pytest.approx(18_900_000, rel=0.01)


@pytest.mark.parametrize(("crs", "excess"), [("EPSG:3857", "+39"), ("EPSG:27700", "+6")])
def test_a_grid_that_is_no_measure_is_warned_of(crs: str, excess: str) -> None:
    """Web mercator, or a national grid far from home, is reported with how far off it is."""
    laid = ground(make_line(straight(5000.0)), toml=f'crs = "{crs}"')
    (leg,) = laid.legs
    assert leg.ellipsoid_m == pytest.approx(5000.0, abs=1e-6)
    assert leg.grid_m > 5050
    assert f"in the grid {crs} is {excess}" in laid.warnings[0][1]
    assert not ground(make_line(straight(5000.0))).warnings


def test_the_zone_is_that_of_the_middle_of_the_way() -> None:
    """A leg over a zone's edge takes the zone of the place half-way, however its vertices lie."""
    many_first = np.array([*([x, 50.0] for x in np.linspace(5.0, 5.2, 50)), [8.0, 50.0]])
    assert only_leg(make_line(many_first)).grid_crs == "EPSG:32632"
    assert only_leg(make_line(many_first[::-1])).grid_crs == "EPSG:32632"


@pytest.mark.parametrize(
    ("start", "end", "zone"),
    [
        ((179.9, -16.5), (-179.9, -16.4), {"EPSG:32701", "EPSG:32760"}),
        ((-179.99, 52.0), (179.99, 52.1), {"EPSG:32601", "EPSG:32660"}),
        ((25.0, 78.2), (25.3, 78.3), {"EPSG:32635"}),
        ((-70.0, -54.9), (-69.9, -55.0), {"EPSG:32719"}),
        ((10.0, 0.05), (10.1, -0.06), {"EPSG:32632", "EPSG:32732"}),
        ((-40.0, 89.90), (-20.0, 89.95), {"EPSG:32625", "EPSG:32626", "EPSG:32624"}),
        ((0.0, -89.99), (120.0, -89.98), {"EPSG:32745"}),
    ],
)
def test_all_round_the_world(
    start: tuple[float, float], end: tuple[float, float], zone: set[str]
) -> None:
    """Over the antimeridian, in both hemispheres and near the poles a leg has its true length."""
    line = np.array([start, end])
    leg = only_leg(make_line(line))
    true_m = Geodesic.WGS84.Inverse(start[1], start[0], end[1], end[0])["s12"]
    assert leg.ellipsoid_m == pytest.approx(true_m, rel=1e-9)
    assert leg.length_mm == pytest.approx(true_m * 1000, abs=1)
    assert leg.grid_crs in zone
    assert leg.grid_m == pytest.approx(true_m, rel=2e-3)
    at = np.array([0, leg.length_mm])
    found, _ = position_at(leg, at)
    assert found[0] == pytest.approx(start, abs=1e-9)
    assert found[1] == pytest.approx(end, abs=1e-9)


def test_positions_on_a_long_step_lie_on_the_geodesic() -> None:
    """Stations along a step of 500 km lie on the geodesic to 2 mm, not on the chord in degrees."""
    line = np.array([[-10.0, 60.0], [-1.0, 60.5]])
    leg = only_leg(make_line(line))
    inverse = Geodesic.WGS84.Inverse(60.0, -10.0, 60.5, -1.0)
    stations = np.linspace(0, leg.length_mm, 977).astype(np.int64)
    found, _ = position_at(leg, stations)
    for (lon, lat), at in zip(found.tolist(), stations.tolist(), strict=True):
        there = Geodesic.WGS84.Direct(60.0, -10.0, inverse["azi1"], at / 1000)
        off_m = Geodesic.WGS84.Inverse(lat, lon, there["lat2"], there["lon2"])["s12"]
        assert off_m < 0.002
    assert found[488][1] - 60.25 > 0.07  # 8 km north of the chord


def test_positions_over_the_antimeridian() -> None:
    """Stations along a step over the antimeridian run on from one side to the other."""
    leg = only_leg(make_line(np.array([[179.9, -16.5], [-179.9, -16.5]])))
    found, _ = position_at(leg, np.linspace(0, leg.length_mm, 201).astype(np.int64))
    assert (np.abs(found[:, 0]) >= 179.9 - 1e-9).all()
    assert (np.abs(found[:, 0]) <= 180.0).all()
    away = geodesy.steps_m(found)
    assert away == pytest.approx(leg.ellipsoid_m / 200, abs=0.005)


def test_heights_between_vertices() -> None:
    """The height of a station is linear between its vertices, and not known without them."""
    line = straight(1000.0, count=3)
    leg = only_leg(make_line(line, heights_m=np.array([10.0, 30.0, 20.0])))
    stations = np.array([0, int(leg.ground_mm[1]) // 2, int(leg.ground_mm[1]), leg.length_mm])
    _, heights = position_at(leg, stations)
    assert heights == pytest.approx([10.0, 20.0, 30.0, 20.0], abs=1e-4)
    _, unknown = position_at(only_leg(make_line(line)), stations)
    assert np.isnan(unknown).all()


def test_a_steep_leg_is_warned_of() -> None:
    """Slope that adds more than 1 % is told of; a gentle one is not."""
    line = straight(1000.0, count=101)
    noisy = np.where(np.arange(101) % 2, 0.0, 3.0)
    laid = ground(make_line(line, heights_m=noisy))
    assert "slope adds 4.4" in laid.warnings[0][1]
    assert not ground(make_line(line, heights_m=noisy / 4)).warnings


def test_a_thinned_track_reports_both_lengths() -> None:
    """A track's warning gives the length as recorded and as thinned."""
    rng = np.random.default_rng(2)
    metres = np.column_stack([rng.normal(0, 0.5, 300), np.arange(300) * 4.0])
    laid = ground(make_line(lonlat(*map(tuple, metres)), is_track=True))
    (leg,) = laid.legs
    assert leg.drawn_ellipsoid_m > leg.ellipsoid_m
    text = laid.warnings[0][1]
    assert f"measured {leg.drawn_ellipsoid_m:.1f} m and {leg.ellipsoid_m:.1f} m" in text


# ------------------------------------------------------------------ stations


def test_stations_are_whole_millimetres_of_the_running_sum() -> None:
    """A vertex's station is the rounded sum so far: the total does not gather roundings."""
    line = straight(1000.0, count=3001)  # steps of 333.33 mm
    leg = only_leg(make_line(line))
    assert leg.length_mm == 1_000_000
    assert leg.ground_mm.dtype == np.int64
    assert leg.ground_mm == pytest.approx(np.linspace(0, 1_000_000, 3001), abs=0.51)


@settings(max_examples=150, deadline=None)
@given(
    seed=st.integers(0, 10**6),
    count=st.integers(2, 40),
    lon=st.sampled_from([LON, 179.9999, 0.0]),
    closed=st.booleans(),
)
def test_a_reversed_line_has_mirrored_stations(
    seed: int, count: int, lon: float, closed: bool
) -> None:
    """Drawn the other way every vertex and point has the mirrored station, to a millimetre."""
    rng = np.random.default_rng(seed)
    metres = np.cumsum(rng.integers(-200, 200, (count, 2)) + np.array([0.5, 0.25]), axis=0)
    positions = lonlat(*map(tuple, metres)) + np.array([lon - LON, 0.0])
    if closed and count > 3:
        positions[-1] = positions[0]
    positions[:, 0] = geodesy.wrapped(positions[:, 0])
    heights = rng.uniform(0, 50, count)
    heights[-1] = heights[0]
    spots = positions[rng.integers(0, count, 6)] + rng.normal(0, 5e-5, (6, 2))
    places = tuple(make_place("handhole", spot, f"HH {k}") for k, spot in enumerate(spots))
    one = only_leg(make_line(positions, heights_m=heights), places=places)
    other = only_leg(make_line(positions[::-1], heights_m=heights[::-1]), places=places)
    assert (other.ground_mm == one.length_mm - one.ground_mm[::-1]).all()
    mine = {point.place.name: point.ground_mm for point in one.points}
    theirs = {point.place.name: other.length_mm - point.ground_mm for point in other.points}
    assert mine == theirs
    assert one.is_turned != other.is_turned or (positions == positions[::-1]).all()


# ------------------------------------------------------------------ stretches


def test_stretches_follow_the_lines() -> None:
    """Lines of one placement in a row are one stretch; every existing line is its own."""
    at = [straight(100.0, start_m=100.0 * k) for k in range(6)]
    placements = [None, "duct", "aerial", "existing", "existing", "buried"]
    lines = [
        make_line(line, placement, existing_m=120.0 if placement == "existing" else None)
        for line, placement in zip(at, placements, strict=True)
    ]
    leg = only_leg(*lines)
    assert [(s.placement, s.start_mm, s.end_mm, s.existing_m) for s in leg.stretches] == [
        ("duct", 0, 200_000, None),
        ("aerial", 200_000, 300_000, None),
        ("existing", 300_000, 400_000, 120.0),
        ("existing", 400_000, 500_000, 120.0),
        ("buried", 500_000, 600_000, None),
    ]


def test_existing_fibre_cut_by_a_site_is_shared_between_its_parts() -> None:
    """Declared length and loss of an existing line count once, however it is cut."""
    line = make_line(straight(1000.0), "existing", existing_m=1200.0, existing_db=0.6)
    relay = make_place("site", straight(1000.0, count=5)[1], "Relay")
    laid = ground(line, places=(relay,))
    spans = [leg.stretches[0] for leg in laid.legs]
    assert [span.existing_m for span in spans] == pytest.approx([300.0, 900.0], abs=1e-4)
    assert [span.existing_db for span in spans] == pytest.approx([0.15, 0.45], abs=1e-6)


# ------------------------------------------------------------------ points


def test_points_are_placed_at_their_foot() -> None:
    """A point's station is that of its foot on the line, and the distance is kept."""
    leg = only_leg(
        make_line(lonlat((0, 0), (0, 1000))),
        places=(
            make_place("handhole", lonlat((6, 750)), "Later"),
            make_place("handhole", lonlat((-12, 250)), "Sooner"),
        ),
    )
    assert [(p.place.name, round(p.ground_mm, -1), round(p.offset_m, 2)) for p in leg.points] == [
        ("Sooner", 250_000, 12.0),
        ("Later", 750_000, 6.0),
    ]


def test_a_point_goes_to_the_nearest_leg() -> None:
    """Between two legs a point goes to the nearer one."""
    laid = ground(
        make_line(lonlat((0, 0), (0, 500))),
        make_line(lonlat((30, 0), (30, 500))),
        places=(make_place("handhole", lonlat((20, 100)), "HH"),),
    )
    assert [len(leg.points) for leg in laid.legs] == [0, 1]


def test_a_reach_point_at_a_branch_is_its_place() -> None:
    """A handhole at a branch node names the node and is no longer a point of a leg."""
    laid = ground(
        make_line(lonlat((0, 0), (0, 500))),
        make_line(lonlat((0, 200), (300, 200))),
        places=(make_place("handhole", lonlat((0, 200.3)), "HH 7"),),
    )
    node = next(node for node in laid.nodes if not node.is_site)
    assert node.name == "HH 7"
    assert node.place is not None
    assert not any(leg.points for leg in laid.legs)


def test_crossings_are_listed_with_their_place() -> None:
    """A declared crossing has its leg, station, width and position on the line."""
    laid = ground(
        make_line(straight(1000.0)),
        places=(
            make_place(
                "crossing", straight(1000.0, count=3)[1], "Brook", crosses="water", width_m=8.0
            ),
        ),
    )
    (crossing,) = laid.crossings
    assert (crossing.name, crossing.crosses, crossing.width_m) == ("Brook", "water", 8.0)
    assert crossing.ground_mm == pytest.approx(500_000, abs=1)
    assert (crossing.lon, crossing.lat) == pytest.approx(
        tuple(straight(1000.0, count=3)[1]), abs=1e-8
    )
    assert crossing.lat > LAT
