"""Areas gone through and lines run along: from where to where, and whose they are."""

from __future__ import annotations

import math

import numpy as np
import pytest
import shapely

from routeplan import geodesy
from routeplan.ground.crossings import (
    FoundCrossing,
    areas_layer,
    crossings_of,
    find_crossings,
)
from routeplan.ground.model import Crossing
from routeplan.run.model import Area, Source
from tests.ground.crossing_layers import area, cells, layer_of, leg_of, line

EAST = leg_of(cells([(0, 0), (10, 0), (20, 0)]))
CELL_MM = EAST.length_mm / 20
SQUARE = [(5, -5), (9, -5), (9, 5), (5, 5)]


def found(*shapes: object, leg=EAST, kind="permit", **options: float) -> tuple[FoundCrossing, ...]:
    return find_crossings([leg], [layer_of(*shapes, kind=kind)], **options)


def spans(*shapes: object, leg=EAST) -> list[tuple[str, float, float]]:
    return [
        (one.how, round(one.start_mm / CELL_MM, 2), round(one.end_mm / CELL_MM, 2))
        for one in found(*shapes, leg=leg)
        if one.how != "along"
    ]


@pytest.mark.parametrize(
    ("shape", "expected"),
    [
        (area(SQUARE), [("inside", 5, 9)]),
        (area([(-5, -5), (9, -5), (9, 5), (-5, 5)]), [("inside", 0, 9)]),
        (area([(-5, -5), (25, -5), (25, 5), (-5, 5)]), [("inside", 0, 20)]),
        (area([(10, -5), (14, -5), (14, 5), (10, 5)]), [("inside", 10, 14)]),
        (
            area([(5, -5), (17, -5), (17, 5), (5, 5)], [(8, -2), (12, -2), (12, 2), (8, 2)]),
            [("inside", 5, 8), ("inside", 12, 17)],
        ),
        (area([(7, 0), (9, 4), (5, 4)]), [("touches", 7, 7)]),  # a corner
        (area([(10, 0), (12, 4), (8, 4)]), [("touches", 10, 10)]),  # a corner at a vertex
        (area([(5, 0), (9, 0), (9, 4), (5, 4)]), []),  # an edge on the leg: along it, not inside
        (area([(5, -4), (9, -4), (9, 0), (7, 0), (7, 4), (5, 4)]), [("inside", 5, 7)]),
        (area([(25, -5), (30, -5), (30, 5), (25, 5)]), []),
        (
            shapely.MultiPolygon([area(SQUARE), area([(12, -1), (15, -1), (15, 1), (12, 1)])]),
            [("inside", 5, 9), ("inside", 12, 15)],
        ),
        (area([(5, -5), (7, 0), (9, -5), (9, 5), (7, 1), (5, 5)]), [("inside", 5, 9)]),
    ],
)
def test_entry_and_exit_of_areas(shape: object, expected: list) -> None:
    """Through, from inside, wholly inside, over holes, touching, edge on edge, several parts."""
    assert spans(shape) == expected
    turned = leg_of(cells([(20, 0), (10, 0), (0, 0)]))
    mirrored = sorted((how, 20 - end, 20 - start) for how, start, end in expected)
    assert sorted(spans(shape, leg=turned)) == mirrored


@pytest.mark.parametrize("seed", range(4))
def test_lengths_inside_are_those_of_an_overlay(seed: int) -> None:
    """Against geopandas: the length of leg within areas, in an equidistant grid around them."""
    gpd = pytest.importorskip("geopandas")
    rng = np.random.default_rng(seed)
    walk = cells(np.cumsum(rng.normal(0, 10, (50, 2)), axis=0))
    shapes = []
    for _ in range(60):
        angles = np.sort(rng.uniform(0, 2 * np.pi, rng.integers(3, 9)))
        radius = rng.uniform(3, 40, len(angles))[:, None]
        ring = rng.uniform(-60, 60, 2) + radius * np.column_stack([np.cos(angles), np.sin(angles)])
        shapes.append(shapely.Polygon(cells(ring)))
    shapes = [shape for shape in shapes if shape.is_valid]
    leg = leg_of(walk)
    own = np.zeros(len(shapes))
    for one in found(*shapes, leg=leg):
        if one.how == "inside":
            own[one.feature] += one.length_mm / 1000.0
    grid = "+proj=tmerc +lat_0=47 +lon_0=9 +k=1 +ellps=WGS84 +units=m"
    way = gpd.GeoSeries([shapely.LineString(walk)], crs=4326).to_crs(grid).iloc[0]
    other = gpd.GeoSeries(shapes, crs=4326).to_crs(grid).intersection(way).length.to_numpy()
    assert (other > 0).sum() > 5
    # Edges of 500 m are straight here in degrees and there in the grid: 5 mm apart in the middle,
    # and more along a leg that meets them slantwise.
    assert np.abs(own - other).max() < 0.03


def test_a_parish_around_the_whole_run_is_found_though_its_edge_is_far() -> None:
    """No edge comes near the leg; the leg is inside from end to end."""
    parish = area([(-3000, -3000), (3000, -3000), (3000, 3000), (-3000, 3000)])
    (one,) = found(parish, kind="boundary")
    assert (one.how, one.start_mm, one.end_mm) == ("inside", 0, EAST.length_mm)


def test_areas_over_the_antimeridian_hold_the_leg_on_either_side() -> None:
    """An area written beyond 180 and a leg written below -180 meet."""
    leg = leg_of([(-179.998, -16.0), (-179.990, -16.0)])
    square = shapely.Polygon([(179.99, -16.1), (180.004, -16.1), (180.004, -15.9), (179.99, -15.9)])
    (one,) = found(square, leg=leg)
    assert one.length_mm == pytest.approx(leg.length_mm / 4, abs=2)
    assert one.lon == pytest.approx(-179.997, abs=1e-6)


def test_declared_areas_become_a_layer_that_says_whom_to_ask() -> None:
    """Holes stay holes; the owner is a property of the area."""
    source = Source(file="route.geojson")
    areas = [
        Area(
            name="Links",
            kind="permit",
            rings=(cells([*SQUARE, SQUARE[0]]),),
            properties={"operator": "Links Committee"},
            source=source,
        ),
        Area(name="Bog", kind="avoid", rings=(cells([*SQUARE, SQUARE[0]]),), source=source),
    ]
    bog, links = find_crossings([EAST], [areas_layer(areas)])
    assert (bog.kind, bog.ask, links.kind, links.ask) == (
        "avoid",
        "Bog",
        "permit",
        "Links Committee",
    )
    assert find_crossings([EAST], [areas_layer([])]) == ()


def beside(offset_m: float, *, angle_deg: float = 0.0, length_m: float = 300.0):
    """Return a straight line from beside the leg's quarter on, turned by an angle."""
    leg = leg_of([(9.0, 47.0), (9.01, 47.0)])
    scale = geodesy.local_xy_m(np.array([[9.001, 47.001]]), lon=9.0, lat=47.0)
    east, north = float(scale[0][0]) / 0.001, float(scale[1][0]) / 0.001
    run = np.array([[0.0, 0.0], [length_m, length_m * math.tan(math.radians(angle_deg))]])
    lonlat = np.column_stack([9.0025 + run[:, 0] / east, 47.0 + (offset_m + run[:, 1]) / north])
    return leg, shapely.LineString(lonlat)


def along(road: object, leg: object, **options: float) -> list[FoundCrossing]:
    return [one for one in found(road, leg=leg, kind="road", **options) if one.how == "along"]


@pytest.mark.parametrize(
    ("offset_m", "length_m", "is_found"),
    [(0.0, 300, True), (9.5, 300, True), (-9.5, 300, True), (10.5, 300, False), (5.0, 45, False)],
)
def test_a_line_beside_the_leg_is_run_along_if_near_and_long_enough(
    offset_m: float, length_m: float, is_found: bool
) -> None:
    """Within 10 m to either side, for 50 m or more."""
    leg, road = beside(offset_m, length_m=length_m)
    hits = along(road, leg)
    assert bool(hits) == is_found
    if is_found:
        assert hits[0].start_mm == pytest.approx(leg.length_mm / 4, abs=30)
        assert hits[0].length_mm == pytest.approx(300_000, abs=60)
    (reverse,) = along(shapely.reverse(road), leg) or (None,)
    assert (reverse is not None) == is_found


def test_a_line_that_draws_away_is_run_along_until_it_is_too_far() -> None:
    """At 2 degrees from 1 m off, 10 m are reached after 9 / tan 2 = 258 m."""
    leg, road = beside(1.0, angle_deg=2.0)
    (one,) = along(road, leg)
    assert one.length_mm == pytest.approx(9_000 / math.tan(math.radians(2.0)), rel=0.005)


def test_a_line_that_crosses_slantwise_is_not_run_along() -> None:
    """Beyond 20 degrees it is crossing; the limits are the caller's."""
    leg, road = beside(-5.0, angle_deg=25.0)
    assert along(road, leg) == []
    assert [one.how for one in found(road, leg=leg)] == ["crosses"]
    assert len(along(road, leg, along_angle_deg=30.0, along_length_m=20.0)) == 1


def test_a_street_in_many_pieces_is_one_and_two_carriageways_are_two() -> None:
    """Pieces of one name end to end are chained; beside each other they stay apart."""
    leg = leg_of(cells([(0, 0), (100, 0)]))
    pieces = [line([(x, 1), (x + 5, 1)]) for x in range(10, 60, 5)]
    own = find_crossings([leg], [layer_of(*pieces, names=["Quay"] * 10)])
    assert [one.how for one in own] == ["along"]
    assert own[0].length_mm == pytest.approx(leg.length_mm / 2, rel=1e-3)
    assert find_crossings([leg], [layer_of(*pieces)]) == ()  # nameless: each too short for itself
    both = [*pieces, *(line([(x, -1), (x + 5, -1)]) for x in range(10, 60, 5))]
    assert len(find_crossings([leg], [layer_of(*both, names=["Quay"] * 20)])) == 2
    apart = [line([(10, 1), (30, 1)]), line([(60, 1), (80, 1)])]
    assert len(find_crossings([leg], [layer_of(*apart, names=["Quay"] * 2)])) == 2


def test_small_gaps_and_kinks_do_not_break_a_length() -> None:
    """A line of short pieces with one kink across is run along from end to end."""
    leg = leg_of(cells([(0, 0), (100, 0)]))
    kinked = line([(10, 1), (30, 1), (30, 0.5), (30.5, 0.5), (60, 1)])
    (one,) = [x for x in find_crossings([leg], [layer_of(kinked)]) if x.how == "along"]
    assert one.length_mm == pytest.approx(leg.length_mm / 2, rel=1e-3)


def test_running_along_is_checked_at_every_place() -> None:
    """Against distances of dense points to a random winding line, away from its ends."""
    rng = np.random.default_rng(11)
    leg = leg_of(cells([(0, 0), (300, 0)]))
    east = np.linspace(20, 280, 27)
    road = line(np.column_stack([east, np.cumsum(rng.normal(0, 0.8, 27))]))
    inside = np.zeros(4000, dtype=bool)
    at = np.linspace(0, leg.length_mm, 4000)
    for one in along(road, leg, along_length_m=1.0):
        inside |= (at >= one.start_mm) & (at <= one.end_mm)
    # In a plane where both axes are metres.
    scale = geodesy.local_xy_m(np.array([[9.001, 47.001]]), lon=9.0, lat=47.0)
    size = np.array([float(scale[0][0]), float(scale[1][0])]) / 0.001
    plane = shapely.transform(road, lambda xy: (xy - [9.0, 47.0]) * size)
    points = shapely.points(np.column_stack([at / 1000.0, np.zeros(4000)]))
    far = shapely.distance(points, plane)
    assert 0.2 < inside.mean() < 0.95
    assert not inside[far > 10.3].any()
    gap = 10.0 / (leg.length_mm / 4e6)  # a gap of 10 m is passed over
    near = far < 9.0
    clear = np.convolve(near, np.ones(int(2 * gap) + 1), "same") > 2 * gap
    assert inside[clear].all()


def test_found_crossings_become_those_of_the_model() -> None:
    """What is crossed, and water gone through with its width; not what is only near."""
    layers = [
        layer_of(line([(3, -5), (3, 5)]), kind="power", names=["North line"]),
        layer_of(area(SQUARE), kind="water", names=["Loch"]),
        layer_of(area(SQUARE), kind="permit"),
        layer_of(line([(5, -5), (5, 0)]), kind="road"),
    ]
    power, loch = crossings_of(find_crossings([EAST], layers))
    assert (power.crosses, power.name, power.width_m, power.leg) == (
        "power",
        "North line",
        None,
        "L1",
    )
    assert power.ground_mm == pytest.approx(3 * CELL_MM, abs=1)
    assert loch.width_m == pytest.approx(4 * CELL_MM / 1000, abs=0.002)
    assert loch.ground_mm == pytest.approx(7 * CELL_MM, abs=1)


def test_a_rivers_line_in_its_own_water_is_one_crossing() -> None:
    """The area says how wide; a stream elsewhere stays."""
    river = line([(7, -5), (7, 5)])
    stream = line([(15, -5), (15, 5)])
    layers = [layer_of(river, stream, kind="water"), layer_of(area(SQUARE), kind="water")]
    wide, narrow = crossings_of(find_crossings([EAST], layers))
    assert wide.width_m == pytest.approx(4 * CELL_MM / 1000, abs=0.002)
    assert (narrow.ground_mm, narrow.width_m) == (pytest.approx(15 * CELL_MM, abs=1), None)


@pytest.mark.parametrize(
    ("crosses", "off_m", "width_m", "leg", "count"),
    [
        ("rail", 0.0, None, "L1", 0),
        ("rail", 14.0, None, "L1", 0),
        ("rail", 16.0, None, "L1", 1),
        ("rail", 16.0, 4.0, "L1", 0),
        ("road", 0.0, None, "L1", 1),
        ("rail", 0.0, None, "L2", 1),
    ],
)
def test_a_declared_crossing_stands_for_the_found_one(
    crosses: str, off_m: float, width_m: float | None, leg: str, count: int
) -> None:
    """Same kind, same leg, near by: the planner's own word is kept and not doubled."""
    found_there = find_crossings([EAST], [layer_of(line([(5, -5), (5, 5)]), kind="rail")])
    declared = Crossing(
        leg=leg,
        name="Level crossing",
        crosses=crosses,
        ground_mm=found_there[0].start_mm + round(off_m * 1000),
        width_m=width_m,
        lon=9.0,
        lat=47.0,
    )
    assert len(crossings_of(found_there, [declared])) == count
