"""Drawn lines: measured, thinned, cut, reversed and put end to end."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import given
from hypothesis import strategies as st

from routeplan import geodesy
from routeplan.ground.drawn import cut_drawn, draw_line, joined_drawn, reversed_drawn, shape_of
from tests.drawn_runs import LON, lonlat, make_line, straight

BENT = lonlat((0, 0), (300, 400), (310, 400), (2000, -100), (2000, -900))


def test_a_line_is_measured_step_by_step() -> None:
    """Steps are geodesics; without heights the ground is the ellipsoid."""
    drawn = draw_line(make_line(BENT), track_tolerance_m=2.0)
    assert drawn.ellipsoid_steps_m == pytest.approx([500, 10, 1762.4, 800], rel=1e-3)
    assert (drawn.ground_steps_m == drawn.ellipsoid_steps_m).all()
    assert drawn.drawn_m == drawn.ellipsoid_steps_m.sum()


def test_heights_raise_and_slope() -> None:
    """A level line at 1500 m is longer by (R + h) / R; a slope of 3 in 4 makes 4 into 5."""
    level = make_line(straight(1000.0), heights_m=np.array([1500.0, 1500.0]))
    drawn = draw_line(level, track_tolerance_m=2.0)
    assert drawn.ground_steps_m[0] == pytest.approx(1000.0 * (1 + 1500 / 6371008.8), abs=1e-6)
    slope = make_line(straight(400.0), heights_m=np.array([0.0, 300.0]))
    assert draw_line(slope, track_tolerance_m=2.0).ground_steps_m[0] == pytest.approx(
        500.0, abs=0.01
    )


def test_heights_of_a_track_give_the_profile_only() -> None:
    """A recorded track's heights are kept, but neither raise nor slope its length."""
    track = make_line(straight(400.0), heights_m=np.array([0.0, 300.0]), is_track=True)
    drawn = draw_line(track, track_tolerance_m=2.0)
    assert drawn.ground_steps_m[0] == drawn.ellipsoid_steps_m[0]
    assert drawn.heights_m is not None
    assert drawn.heights_m.tolist() == [0.0, 300.0]


def test_a_jittery_track_is_thinned_before_it_is_measured() -> None:
    """Jitter below the tolerance goes; the length before is kept; corners stay."""
    rng = np.random.default_rng(2)
    along = np.arange(0.0, 1000.0, 5.0)
    walk = [*((x, 0.0) for x in along), *((1000.0, y) for y in along)]
    jittered = np.array(walk) + rng.normal(0, 0.4, (len(walk), 2))
    line = make_line(lonlat(*map(tuple, jittered)), is_track=True)
    drawn = draw_line(line, track_tolerance_m=2.0)
    assert drawn.drawn_m > 2005
    assert drawn.ellipsoid_steps_m.sum() == pytest.approx(1995, abs=3)
    assert len(drawn.lonlat) < 12
    kept = {tuple(at) for at in drawn.lonlat.tolist()}
    assert kept <= {tuple(at) for at in line.lonlat.tolist()}
    assert draw_line(line, track_tolerance_m=0.0).ellipsoid_steps_m.sum() == drawn.drawn_m
    untimed = make_line(line.lonlat)
    assert len(draw_line(untimed, track_tolerance_m=2.0).lonlat) == len(walk)


def test_thinning_keeps_within_its_tolerance() -> None:
    """No vertex left out lies farther from the thinned track than the tolerance."""
    import shapely

    rng = np.random.default_rng(5)
    metres = np.cumsum(rng.normal(3, 4, (400, 2)), axis=0)
    drawn = draw_line(make_line(lonlat(*map(tuple, metres)), is_track=True), track_tolerance_m=5.0)
    thin = np.flatnonzero([at in drawn.lonlat[:, 0] for at in lonlat(*map(tuple, metres))[:, 0]])
    line = shapely.LineString(metres[thin])
    assert max(line.distance(shapely.Point(at)) for at in metres) < 5.01


def test_a_track_within_its_tolerance_is_not_thinned_away() -> None:
    """A closed walk smaller than the tolerance keeps its vertices and its length."""
    walk = lonlat((0, 0), (1, 0), (1, 1), (0, 0))
    drawn = draw_line(make_line(walk, is_track=True), track_tolerance_m=5.0)
    assert drawn.ellipsoid_steps_m.sum() == pytest.approx(2 + 2**0.5, abs=0.01)


def test_length_is_on_the_datum_of_the_file() -> None:
    """A line on the Bessel ellipsoid is measured there, on its own coordinates."""
    shifted = BENT + 0.001
    line = make_line(
        BENT, datum_lonlat=shifted, semi_major_m=6377397.155, inverse_flattening=299.1528128
    )
    own = draw_line(line, track_tolerance_m=2.0).ellipsoid_steps_m
    expected = geodesy.steps_m(shifted, semi_major_m=6377397.155, inverse_flattening=299.1528128)
    assert (own == expected).all()
    assert own.sum() != pytest.approx(geodesy.steps_m(BENT).sum(), rel=1e-6)


# ------------------------------------------------------------------ shapes


def test_long_steps_get_points_on_their_geodesic() -> None:
    """A line of one long step bulges towards the pole as its geodesic does, not the parallel."""
    line = np.array([[LON, 60.0], [LON + 1.0, 60.0]])
    shape, index = shape_of(draw_line(make_line(line), track_tolerance_m=2.0))
    middle = float(np.interp(0.5, index, shape[:, 1]))
    inverse = Geodesic.WGS84.Inverse(60.0, LON, 60.0, LON + 1.0)
    there = Geodesic.WGS84.Direct(60.0, LON, inverse["azi1"], inverse["s12"] / 2)
    assert middle == pytest.approx(there["lat2"], abs=1.8e-8)  # 2 mm
    assert (middle - 60.0) * 111_412 > 100
    assert geodesy.steps_m(shape).max() <= 200.0


def test_shape_is_the_same_whichever_way_it_is_drawn() -> None:
    """A reversed line has the reversed shape to the last bit, over the antimeridian, too."""
    for offset in (0.0, 179.99 - LON):
        line = BENT + np.array([offset, 0.0])
        line[:, 0] = geodesy.wrapped(line[:, 0])
        one = shape_of(draw_line(make_line(line), track_tolerance_m=2.0))
        other = shape_of(draw_line(make_line(line[::-1]), track_tolerance_m=2.0))
        assert (one[0] == other[0][::-1]).all()
        assert one[1] == pytest.approx(len(line) - 1 - other[1][::-1], abs=1e-12)
        assert np.abs(np.diff(one[0][:, 0])).max() < 0.01


# ------------------------------------------------------------------ parts


@given(st.lists(st.floats(0.001, 3.999), min_size=1, max_size=4, unique=True))
def test_parts_add_up(at: list[float]) -> None:
    """Cut anywhere, the parts' steps, heights and shares make up the line."""
    heights = np.array([0.0, 30.0, 30.0, 80.0, 5.0])
    drawn = draw_line(make_line(BENT, heights_m=heights), track_tolerance_m=2.0)
    parts = cut_drawn(drawn, sorted(at))
    assert len(parts) == len(at) + 1
    for total, each in (
        (drawn.ellipsoid_steps_m.sum(), [part.ellipsoid_steps_m.sum() for part in parts]),
        (drawn.ground_steps_m.sum(), [part.ground_steps_m.sum() for part in parts]),
        (drawn.drawn_m, [part.drawn_m for part in parts]),
        (1.0, [part.share for part in parts]),
    ):
        assert sum(each) == pytest.approx(total, rel=1e-12)
    for one, other in pairwise(parts):
        assert one.lonlat[-1] == pytest.approx(other.lonlat[0], abs=1e-12)
        assert one.heights_m is not None
        assert other.heights_m is not None
        assert one.heights_m[-1] == pytest.approx(other.heights_m[0])


def test_a_cut_lies_on_the_geodesic() -> None:
    """A long step cut in the middle has the cut on the geodesic, half the length on each side."""
    line = np.array([[LON, 60.0], [LON + 1.0, 60.0]])
    drawn = draw_line(make_line(line), track_tolerance_m=2.0)
    first, second = cut_drawn(drawn, [0.5])
    assert geodesy.steps_m(first.lonlat)[0] == pytest.approx(first.ellipsoid_steps_m[0], abs=0.002)
    assert geodesy.steps_m(second.lonlat)[0] == pytest.approx(first.ellipsoid_steps_m[0], abs=0.002)


def test_a_cut_at_a_vertex_keeps_it_once() -> None:
    """A cut at a whole index ends one part and begins the next with that vertex."""
    drawn = draw_line(make_line(BENT), track_tolerance_m=2.0)
    first, second = cut_drawn(drawn, [2.0])
    assert (len(first.lonlat), len(second.lonlat)) == (3, 3)
    assert first.lonlat[-1].tolist() == second.lonlat[0].tolist() == BENT[2].tolist()


def test_joined_lines_keep_their_steps() -> None:
    """Lines end to end keep every step; the gap within the tolerance counts for nothing."""
    near = lonlat((2000.3, -900), (2500, -900))
    parts = [draw_line(make_line(line), track_tolerance_m=2.0) for line in (BENT, near)]
    whole = joined_drawn(parts)
    assert len(whole.lonlat) == len(BENT) + 1
    steps = np.concatenate([part.ellipsoid_steps_m for part in parts])
    assert (whole.ellipsoid_steps_m == steps).all()
    back = joined_drawn([reversed_drawn(part) for part in reversed(parts)])
    assert (back.lonlat == whole.lonlat[::-1]).all()
    assert (back.ellipsoid_steps_m == whole.ellipsoid_steps_m[::-1]).all()


def test_joined_heights_fill_each_other_in() -> None:
    """Where only one of two lines has heights the other's stay unknown; the common end is known."""
    first = draw_line(make_line(BENT), track_tolerance_m=2.0)
    after = lonlat((2000, -900), (2500, -900))
    second = draw_line(make_line(after, heights_m=np.array([7.0, 9.0])), track_tolerance_m=2.0)
    whole = joined_drawn([first, second])
    assert whole.heights_m is not None
    assert whole.heights_m[-2:].tolist() == [7.0, 9.0]
    assert np.isnan(whole.heights_m[:-2]).all()


def test_vertices_nobody_drew_are_known_through_every_cut() -> None:
    """Vertices put in along a grid line stay marked when it is cut, reversed and joined."""
    flags = np.array([True, False, False, True, True])
    drawn = draw_line(make_line(BENT, is_drawn=flags), track_tolerance_m=2.0)
    first, second = cut_drawn(drawn, [1.5])
    assert first.is_drawn is not None
    assert first.is_drawn.tolist() == [True, False, False]
    turned = reversed_drawn(second)
    assert turned.is_drawn is not None
    assert turned.is_drawn.tolist() == [True, True, False, False]
    plain = draw_line(make_line(lonlat((2000, -900), (2500, -900))), track_tolerance_m=2.0)
    whole = joined_drawn([drawn, plain])
    assert whole.is_drawn is not None
    assert whole.is_drawn.tolist() == [*flags.tolist(), True]
