"""Crossings of lines: as often, and where, as plain searches and another overlay find them."""

from __future__ import annotations

import math
from collections import Counter

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan import geodesy
from routeplan.ground.crossings import FoundCrossing, find_crossings
from routeplan.ground.points import position_at
from tests.ground.crossing_layers import (
    STEP_DEG,
    cells,
    exact_crossing_count,
    layer_of,
    leg_of,
    line,
    plain_crossings,
)

EAST = leg_of(cells([(0, 0), (10, 0), (20, 0)]))  # 20 cells straight east, a vertex in the middle


def hows(*lines: shapely.Geometry, leg=EAST) -> list[str]:
    return [one.how for one in find_crossings([leg], [layer_of(*lines)])]


def found(*lines: shapely.Geometry, leg=EAST) -> tuple[FoundCrossing, ...]:
    return find_crossings([leg], [layer_of(*lines)])


@pytest.mark.parametrize(
    ("points", "expected"),
    [
        ([(5, -5), (5, 5)], ["crosses"]),  # plainly
        ([(10, -5), (10, 5)], ["crosses"]),  # at a vertex of the leg
        ([(5, -5), (5, 0), (5, 5)], ["crosses"]),  # with a vertex of its own
        ([(10, -5), (10, 0), (10, 5)], ["crosses"]),  # vertex on vertex
        ([(5, -5), (5, 0), (8, -5)], ["touches"]),  # a corner that touches
        ([(10, -5), (10, 0), (12, -5)], ["touches"]),  # a corner at a vertex of the leg
        ([(5, -5), (5, 0)], ["touches"]),  # ends on the leg
        ([(0, -5), (0, 5)], ["touches"]),  # at the leg's own end
        ([(20, 0), (25, 0)], ["touches"]),  # goes on where the leg ends
        ([(5, -5), (5, 0), (7, 0), (7, 5)], ["crosses"]),  # along it for a little, then across
        ([(5, -5), (5, 0), (7, 0), (7, -5)], ["touches"]),  # along it and back
        ([(9, -5), (9, 0), (11, 0), (11, 5)], ["crosses"]),  # the same over a vertex
        ([(11, -5), (11, 0), (9, 0), (9, 5)], ["crosses"]),  # against the leg
        ([(5, 1), (15, 1), (15, -3)], ["crosses"]),
        ([(5, 2), (15, 3)], []),
        ([(5, -5), (5, 5), (6, 5), (6, -5), (7, -5), (7, 5)], ["crosses"] * 3),
        ([(21, -5), (21, 5)], []),
    ],
)
def test_each_way_of_meeting_counts_once(points: list, expected: list[str]) -> None:
    """Touch, overlap, shared vertex and plain crossing, for the line drawn either way."""
    along_free = [one.how for one in found(line(points)) if one.how != "along"]
    assert along_free == expected
    assert [one.how for one in found(line(points[::-1])) if one.how != "along"] == expected


def test_station_angle_and_what_it_is_are_given() -> None:
    """A road at 45 degrees a quarter along the leg."""
    leg = leg_of([(9.0, 0.0), (9.01, 0.0)])
    road = shapely.LineString([(9.0015, -0.001), (9.0035, 0.001)])
    layer = layer_of(road, classes=["primary"], names=["Mast Road"], owners=["County"])
    (one,) = find_crossings([leg], [layer])
    assert one.how == "crosses"
    assert one.start_mm == one.end_mm == pytest.approx(leg.length_mm / 4, abs=1)
    assert one.angle_deg == pytest.approx(45.0, abs=0.3)  # a degree of latitude is the shorter
    assert (one.kind, one.feature_class, one.name, one.owner) == (
        "road",
        "primary",
        "Mast Road",
        "County",
    )
    assert (one.ask, one.leg, one.feature) == ("County", "L1", 0)
    assert (one.lon, one.lat) == pytest.approx((9.0025, 0.0), abs=1e-8)


@pytest.mark.parametrize("angle_deg", [1.0, 30.0, 60.0, 89.0])
@pytest.mark.parametrize("lat", [0.0, 50.0, -65.0])
def test_angles_are_those_on_the_ground(angle_deg: float, lat: float) -> None:
    """At any latitude; a degree of longitude shrinks towards the poles."""
    leg = leg_of([(9.0, lat), (9.002, lat)])
    east = np.array([-30.0, 30.0])
    north = east * math.tan(math.radians(angle_deg))
    shares = geodesy.local_xy_m(np.array([[9.002, lat], [9.001, lat + 0.001]]), lon=9.001, lat=lat)
    lonlat = np.column_stack(
        [9.001 + east / shares[0][0] * 0.001, lat + north / shares[1][1] * 0.001]
    )
    (one,) = [x for x in found(shapely.LineString(lonlat), leg=leg) if x.how == "crosses"]
    assert one.angle_deg == pytest.approx(angle_deg, abs=0.01)


def test_ten_crossings_within_a_metre_are_ten() -> None:
    """A line folded ten times over the leg, 10 cm apart."""
    leg = leg_of([(9.0, 47.0), (9.002, 47.0)])
    step = 0.1 / 111_000 / math.cos(math.radians(47.0))
    points = [(9.001 + k * step, 47.0 + (1e-5 if k % 2 else -1e-5)) for k in range(11)]
    crossed = found(shapely.LineString(points), leg=leg)
    assert [one.how for one in crossed] == ["crosses"] * 10
    gaps = np.diff([one.start_mm for one in crossed])
    assert ((gaps > 80) & (gaps < 120)).all()
    ten = [shapely.LineString([(x, 46.9999), (x, 47.0001)]) for x, _ in points[:10]]
    assert [one.feature for one in found(*ten, leg=leg)] == list(range(10))


def test_lines_of_several_parts_and_closed_ones_are_followed() -> None:
    """Every part counts; a ring has no end where it closes."""
    parts = shapely.MultiLineString([cells([(3, -5), (3, 5)]), cells([(6, -5), (6, 5)])])
    assert hows(parts) == ["crosses", "crosses"]
    for turn in range(4):
        corners = [(5, 0), (8, 4), (12, 0), (8, -4)]
        ring = corners[turn:] + corners[:turn]
        assert hows(line([*ring, ring[0]])) == ["crosses", "crosses"]


def test_a_road_that_ends_just_short_of_the_leg_does_not_touch_it() -> None:
    """A millimetre is the limit, measured square to the leg."""
    m = 1 / 111_132.0
    leg = leg_of([(9.0, 47.0), (9.002, 47.0)])
    near, far = (
        shapely.LineString([(9.001, 47.0 - d * m), (9.0013, 46.9999)]) for d in (0.0005, 0.002)
    )
    assert hows(near, leg=leg) == ["touches"]
    assert hows(far, leg=leg) == []


@settings(max_examples=150, deadline=None)
@given(
    st.lists(st.integers(0, 4), min_size=3, max_size=9),
    st.lists(
        st.tuples(st.integers(-1, 9), st.integers(-1, 5)), min_size=2, max_size=8, unique=True
    ),
)
def test_crossings_on_a_small_grid_are_those_of_exact_arithmetic(
    heights: list[int], other: list[tuple[int, int]]
) -> None:
    """On a small grid touches, overlaps and common vertices abound."""
    leg_points = list(enumerate(heights))
    expected = exact_crossing_count(leg_points, other)
    for one_way in (leg_points, leg_points[::-1]):
        for way in (other, other[::-1]):
            leg = leg_of(cells(one_way))
            assert hows(line(way), leg=leg).count("crosses") == expected


@pytest.mark.parametrize("seed", range(6))
def test_random_layers_give_what_a_search_of_all_segments_gives(seed: int) -> None:
    """Same lines, same places, to the millimetre."""
    rng = np.random.default_rng(seed)
    walk = cells(np.cumsum(rng.normal(0, 12, (60, 2)), axis=0))
    leg = leg_of(walk)
    lines = [
        cells(rng.uniform(-120, 120, 2) + np.cumsum(rng.normal(0, 6, (rng.integers(2, 9), 2)), 0))
        for _ in range(400)
    ]
    plain = plain_crossings(walk, lines)
    crossed = [
        one
        for one in found(*[shapely.LineString(points) for points in lines], leg=leg)
        if one.how != "along"
    ]
    assert len(plain) > 20
    assert Counter(one.feature for one in crossed) == Counter(number for number, _, _ in plain)
    stations = sorted(
        (number, leg.ground_mm[step] + share * (leg.ground_mm[step + 1] - leg.ground_mm[step]))
        for number, step, share in plain
    )
    own = sorted((one.feature, one.start_mm) for one in crossed)
    assert np.abs(np.array(stations) - np.array(own)).max() <= 1.0
    at, _ = position_at(leg, np.array([one.start_mm for one in crossed]))
    apart = geodesy.steps_m(np.stack([at, [[x.lon, x.lat] for x in crossed]], 1).reshape(-1, 2))
    assert apart[::2].max() < 0.002


@pytest.mark.parametrize("seed", range(3))
def test_an_overlay_in_a_projected_grid_finds_the_same(seed: int) -> None:
    """Against geopandas: intersection of leg and lines in UTM, an independent way."""
    gpd = pytest.importorskip("geopandas")
    rng = np.random.default_rng(100 + seed)
    walk = cells(np.cumsum(rng.normal(0, 12, (80, 2)), axis=0))
    lines = [
        shapely.LineString(
            cells(rng.uniform(-150, 150, 2) + np.cumsum(rng.normal(0, 6, (5, 2)), axis=0))
        )
        for _ in range(500)
    ]
    leg = leg_of(walk)
    own = Counter(one.feature for one in found(*lines, leg=leg) if one.how == "crosses")
    way = gpd.GeoSeries([shapely.LineString(walk)], crs=4326).to_crs(32632).iloc[0]
    cut = gpd.GeoDataFrame(geometry=lines, crs=4326).to_crs(32632).intersection(way)
    other = Counter()
    for number, met in enumerate(cut):
        other[number] = len(shapely.get_parts(met)) if not met.is_empty else 0
    assert own == +other


@pytest.mark.parametrize("seed", range(3))
def test_the_leg_drawn_the_other_way_has_mirrored_stations(seed: int) -> None:
    """To the millimetre, with everything else the same."""
    rng = np.random.default_rng(200 + seed)
    walk = cells(np.cumsum(rng.normal(0, 12, (60, 2)), axis=0))
    lines = [
        shapely.LineString(
            cells(rng.uniform(-100, 100, 2) + np.cumsum(rng.normal(0, 9, (6, 2)), 0))
        )
        for _ in range(200)
    ]
    there, back = (found(*lines, leg=leg_of(points)) for points in (walk, walk[::-1]))
    length = leg_of(walk).length_mm
    assert len(there) > 10
    mirrored = {(x.feature, x.how, length - x.end_mm, length - x.start_mm) for x in back}
    assert {(x.feature, x.how, x.start_mm, x.end_mm) for x in there} == mirrored


@pytest.mark.parametrize("shift", [0.0, 360.0, -360.0])
def test_the_antimeridian_is_a_line_like_any_other(shift: float) -> None:
    """Legs over it meet lines on both sides and over it, in either writing of longitude."""
    leg = leg_of([(179.99, -16.0), (-179.99, -16.0)])
    roads = [
        shapely.LineString([(179.995, -16.01), (179.995, -15.99)]),
        shapely.LineString([(-179.995, -16.01), (-179.995, -15.99)]),
        shapely.LineString([(179.999, -16.01), (-179.999, -15.99)]),  # jumps, as files have it
        shapely.LineString([(180.002, -16.01), (180.004, -15.99)]),
    ]
    moved = [shapely.transform(road, lambda xy: xy + np.array([shift, 0.0])) for road in roads[:2]]
    crossed = found(*moved, *roads[2:], leg=leg)
    assert [one.how for one in crossed] == ["crosses"] * 4
    assert [one.feature for one in crossed] == [0, 2, 3, 1]
    shares = [one.start_mm / leg.length_mm for one in crossed]
    assert shares == pytest.approx([0.25, 0.5, 0.65, 0.75], abs=0.001)
    assert all(abs(one.lon) <= 180.0 for one in crossed)


def test_several_legs_and_layers_come_in_order() -> None:
    """By leg, then station, whatever the order of the layers."""
    legs = [
        leg_of(cells([(0, 0), (20, 0)]), name="La"),
        leg_of(cells([(20, 0), (20, 20)]), name="Lb"),
    ]
    roads = layer_of(line([(15, -5), (15, 5)]), line([(15, 10), (25, 10)]))
    rails = layer_of(line([(5, -5), (5, 5)]), kind="rail")
    for layers in ([roads, rails], [rails, roads]):
        crossed = find_crossings(legs, layers)
        assert [(one.leg, one.kind) for one in crossed] == [
            ("La", "rail"),
            ("La", "road"),
            ("Lb", "road"),
        ]


def test_nothing_to_search_finds_nothing() -> None:
    """No leg, no layer, an empty layer, one far away, points only."""
    far = layer_of(line([(50_000, 0), (50_000, 10)]))
    assert find_crossings([], [far]) == ()
    assert find_crossings([EAST], []) == ()
    assert find_crossings([EAST], [layer_of(), far]) == ()
    assert find_crossings([EAST], [layer_of(shapely.Point(9, 47), None)]) == ()


def test_lines_of_no_length_and_doubled_vertices_are_no_trouble() -> None:
    """A step of no length has no direction and is passed over."""
    leg = leg_of(cells([(0, 0), (10, 0), (10, 0), (20, 0)]))
    point = line([(5, 0), (5, 0)])
    doubled = line([(10, -5), (10, 0), (10, 0), (10, 5)])
    assert hows(point, doubled, leg=leg) == ["crosses"]


def test_a_long_step_is_met_where_it_truly_runs() -> None:
    """On a step of 40 km the geodesic lies 24 m north of the straight line in degrees at 50 N."""
    leg = leg_of([(9.0, 50.0), (9.56, 50.0)])
    middle = leg.shape_lonlat[len(leg.shape_lonlat) // 2]
    assert middle[1] - 50.0 > 0.0002
    short = shapely.LineString([(middle[0], middle[1] - 1e-5), (middle[0], middle[1] + 1e-5)])
    below = shapely.LineString([(middle[0], 49.9999), (middle[0], 50.0001)])
    assert hows(short, leg=leg) == ["crosses"]
    assert hows(below, leg=leg) == []
    assert STEP_DEG < 1e-4
