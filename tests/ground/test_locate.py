"""Points found on lines: as brute force finds them, whatever the number of steps."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from routeplan.ground.locate import index_lines, near_lines, nearest_m, within_pairs
from routeplan.run.model import Floats
from tests.drawn_runs import lonlat

ALONG = lonlat((0, 0), (100, 0), (100, 80), (100, 200))


def indexed(*lines: Floats) -> list[tuple[Floats, Floats]]:
    return [(line, np.arange(len(line), dtype=float)) for line in lines]


def test_a_point_beside_a_step() -> None:
    """A point 7 m off the middle of a step is found there, at that distance."""
    (hits,) = near_lines(index_lines(indexed(ALONG)), lonlat((50, 7)), radius_m=np.array([10.0]))
    assert [(hit.line, round(hit.index, 5), round(hit.offset_m, 3)) for hit in hits] == [
        (0, 0.5, 7.0)
    ]


def test_beyond_an_end_and_beyond_the_radius() -> None:
    """Beyond an end the end is nearest; outside the radius nothing is found."""
    lines = index_lines(indexed(ALONG))
    points = lonlat((-3, 4), (-30, 40))
    first, second = near_lines(lines, points, radius_m=np.array([10.0, 10.0]))
    assert (first[0].index, round(first[0].offset_m, 3)) == (0.0, 5.0)
    assert second == []


@pytest.mark.parametrize("steps", [3, 15, 16, 17, 400, 6000])
def test_equal_to_brute_force(steps: int) -> None:
    """On wandering lines of any size the nearest place on every line is the true one."""
    rng = np.random.default_rng(steps)
    metres = [np.cumsum(rng.normal(0, 30, (steps, 2)), axis=0) for _ in range(3)]
    lines = [lonlat(*map(tuple, each)) for each in metres]
    points = np.concatenate([each[:: max(1, steps // 30)] for each in metres])
    points = points + rng.normal(0, 15, points.shape)
    radius = np.full(len(points), 25.0)
    found = near_lines(index_lines(indexed(*lines)), lonlat(*map(tuple, points)), radius_m=radius)
    shapes = [shapely.LineString(each) for each in metres]
    count = 0
    for point, hits in zip(points, found, strict=True):
        at = shapely.Point(point)
        expected = {n: s.distance(at) for n, s in enumerate(shapes) if s.distance(at) < 24.99}
        mine = {hit.line: hit.offset_m for hit in hits}
        assert set(expected) <= set(mine)
        for number, distance in expected.items():
            assert mine[number] == pytest.approx(distance, abs=0.02)
        offsets = [hit.offset_m for hit in hits]
        assert offsets == sorted(offsets)
        count += len(expected)
    assert count > 0


def test_the_answer_does_not_hang_on_direction() -> None:
    """A line drawn the other way gives the mirrored index, also for a point between two steps."""
    corner = lonlat((0, 0), (100, 0), (100, 100))
    points = lonlat((90, 10), (95, 5), (30, 20), (100, 0))  # the first two are as near to both
    radius = np.full(len(points), 25.0)
    one = near_lines(index_lines(indexed(corner)), points, radius_m=radius)
    other = near_lines(index_lines(indexed(corner[::-1])), points, radius_m=radius)
    for (first,), (second,) in zip(one, other, strict=True):
        assert first.index == pytest.approx(2.0 - second.index, abs=1e-12)
        assert first.offset_m == second.offset_m


def test_over_the_antimeridian() -> None:
    """A line over the antimeridian is found from either side of it."""
    line = np.array([[179.999, -16.0], [180.0, -16.0], [180.001, -16.0]])
    points = np.array([[179.9995, -16.0], [-179.9995, -16.0]])
    for shape in (line, line - [360.0, 0.0]):
        found = near_lines(index_lines(indexed(shape)), points, radius_m=np.array([1.0, 1.0]))
        assert [round(hits[0].index, 6) for hits in found] == [0.5, 1.5]


def test_several_lines_come_nearest_first() -> None:
    """A point near two lines has a hit on each, the nearer one first."""
    other = lonlat((0, 12), (100, 12))
    (hits,) = near_lines(
        index_lines(indexed(ALONG, other)), lonlat((40, 8)), radius_m=np.array([25.0])
    )
    assert [(hit.line, round(hit.offset_m, 2)) for hit in hits] == [(1, 4.0), (0, 8.0)]


def test_no_points() -> None:
    """Without points there is nothing to find."""
    assert near_lines(index_lines(indexed(ALONG)), np.empty((0, 2)), radius_m=np.empty(0)) == []


def test_how_far_off_for_a_message() -> None:
    """The distance named in a message is right within a part in a hundred, also far away."""
    lines = index_lines(indexed(ALONG))
    assert nearest_m(lines, lonlat((50, -120))[0]) == pytest.approx(120, rel=0.01)
    assert nearest_m(lines, lonlat((40_000, 0))[0]) == pytest.approx(39_900, rel=0.01)


def test_pairs_equal_to_brute_force() -> None:
    """All pairs within the radius are found, each once, lower number first."""
    rng = np.random.default_rng(8)
    metres = rng.uniform(0, 40, (80, 2))
    points = lonlat(*map(tuple, metres))
    points[::2, 0] += 360.0  # the same places, a turn farther
    expected = [
        (i, j)
        for i in range(80)
        for j in range(i + 1, 80)
        if np.hypot(*(metres[i] - metres[j])) <= 3.0
    ]
    assert within_pairs(points, radius_m=3.0) == expected
    assert len(expected) > 20
    assert within_pairs(points[:1], radius_m=3.0) == []
