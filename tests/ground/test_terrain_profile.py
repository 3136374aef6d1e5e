"""Profiles along lines: analytic ground lengths, spans, unknown stretches, steepness, mirroring."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from routeplan import geodesy
from routeplan.ground.terrain import heights_at, open_terrain
from routeplan.ground.terrain_profile import (
    ON_GROUND,
    SPANNED,
    STRUNG,
    TerrainProfile,
    step_ways,
    terrain_profile,
)
from routeplan.ground.terrain_report import (
    profile_warnings,
    steep_stretches,
    unknown_stretches,
)
from tests.ground.terrain_rasters import NORTH, SPHERE_M, WEST, lonlat_of, surface, write_tiff


def profile_of(
    path: Path,
    east: np.ndarray,
    south: np.ndarray,
    *,
    ways: np.ndarray | int = ON_GROUND,
    wave_m: float = 0.0,
) -> TerrainProfile:
    lonlat = lonlat_of(np.asarray(east, float), np.asarray(south, float))
    return terrain_profile(
        open_terrain([path]),
        lonlat,
        ellipsoid_steps_m=geodesy.steps_m(lonlat),
        ways=np.broadcast_to(np.asarray(ways, dtype=np.uint8), (len(lonlat) - 1,)),
        smooth_wave_m=wave_m,
        radius_m=SPHERE_M,
    )


def slope_ratio(profile: TerrainProfile) -> float:
    """Return ground over level length, the level raised to its height. [-]"""
    heights = profile.heights_m
    lift = 1.0 + 0.5 * (heights[1:] + heights[:-1]) / SPHERE_M
    level = float((profile.ellipsoid_steps_m * lift).sum())
    return float(profile.ground_steps_m.sum()) / level


@pytest.mark.parametrize("step_m", [40.0, 10.0])
def test_a_tilted_plane_lengthens_by_its_slope(tmp_path: Path, step_m: float) -> None:
    """Straight up a plane of slope s the ground length is sqrt(1 + s^2) times the level one."""
    side = int(4000 / step_m)
    heights = surface(lambda x, y: 0.2 * x, side=side, step_m=step_m).astype("float32")
    path = write_tiff(tmp_path / "t.tif", heights, move=(WEST, NORTH, step_m, -step_m))
    for wave_m in (0.0, 150.0):
        profile = profile_of(path, [200.0, 3800.0], [2000.0, 2000.0], wave_m=wave_m)
        # A grid metre is 1 / 0.9996 m here, and as much longer again 400 m up.
        slope = 0.2 * 0.9996 / (1.0 + 400.0 / SPHERE_M)
        assert slope_ratio(profile) == pytest.approx(np.hypot(1.0, slope), rel=1e-7)


def test_a_cone_lengthens_by_its_slope_up_and_down(tmp_path: Path) -> None:
    """Over the tip of a cone both flanks count; the tip itself is blunt by about a cell."""
    errors = []
    for step_m in (40.0, 20.0, 10.0):
        side = int(4000 / step_m)
        heights = surface(
            lambda x, y: 800.0 - 0.3 * np.hypot(x - 2000.0, y - 2000.0), side=side, step_m=step_m
        )
        path = write_tiff(
            tmp_path / f"c{step_m}.tif",
            heights.astype("float32"),
            move=(WEST, NORTH, step_m, -step_m),
        )
        profile = profile_of(path, [200.0, 3800.0], [2000.0, 2000.0])
        errors.append(abs(slope_ratio(profile) - np.hypot(1.0, 0.3 * 0.9996)))
    assert errors[0] < 1e-3
    assert errors[2] < errors[1] < errors[0]


def test_a_sine_ridge_lengthens_by_its_arc_and_better_with_finer_steps(tmp_path: Path) -> None:
    """The arc length of a sine, by quadrature; halving the step quarters the error."""
    wave, height = 1000.0, 60.0
    x = np.linspace(0.0, 3000.0, 300_001)
    slope = 0.9996 * height * 2 * np.pi / wave * np.cos(2 * np.pi * x / wave)
    arc = float(np.trapezoid(np.hypot(1.0, slope), x)) / 3000.0
    errors = []
    for step_m in (80.0, 40.0, 20.0, 10.0):
        side = int(4000 / step_m)
        heights = surface(
            lambda x, y: 500 + height * np.sin(2 * np.pi * (x - 500) / wave),
            side=side,
            step_m=step_m,
        )
        path = write_tiff(tmp_path / f"s{step_m}.tif", heights, move=(WEST, NORTH, step_m, -step_m))
        profile = profile_of(path, [500.0, 3500.0], [2000.0, 2000.0])
        errors.append(abs(slope_ratio(profile) - arc))
    assert errors[-1] < 1e-4
    for coarse, fine in pairwise(errors):
        assert fine < coarse / 2.5


def test_smoothing_hardly_shortens_a_real_hill(tmp_path: Path) -> None:
    """A ridge of 1 km wave length keeps its length within 0.01 % at the default wave."""
    heights = surface(lambda x, y: 60 * np.sin(2 * np.pi * x / 1000.0), side=400, step_m=10.0)
    path = write_tiff(tmp_path / "s.tif", heights)
    rough = profile_of(path, [500.0, 3500.0], [2000.0, 2000.0])
    smooth = profile_of(path, [500.0, 3500.0], [2000.0, 2000.0], wave_m=150.0)
    assert smooth.ground_steps_m.sum() == pytest.approx(rough.ground_steps_m.sum(), rel=1e-4)
    assert smooth.smoothed_off_m == pytest.approx(
        rough.ground_steps_m.sum() - smooth.ground_steps_m.sum(), abs=1e-9
    )


def test_stations_stand_at_the_rasters_step_and_at_every_vertex(tmp_path: Path) -> None:
    """No step over the ground is longer than a cell, and the line's own vertices all stay."""
    path = write_tiff(tmp_path / "p.tif", np.zeros((200, 200), dtype="float32"))
    rng = np.random.default_rng(3)
    east, south = rng.uniform(50, 1950, (2, 40))
    profile = profile_of(path, east, south)
    assert profile.ellipsoid_steps_m.max() <= 10.05
    own = profile.lonlat[profile.is_vertex]
    assert np.abs(own - lonlat_of(east, south)).max() < 1e-12
    lengths = geodesy.steps_m(lonlat_of(east, south))
    assert np.allclose(profile.vertex_ground_steps_m, lengths, rtol=1e-9)


def test_strung_steps_go_straight_and_spans_from_end_to_end(tmp_path: Path) -> None:
    """Over a valley: on the ground down and up, strung from pole to pole, spanned level."""
    heights = surface(lambda x, y: 0.3 * np.abs(x - 1000.0), side=200, step_m=10.0)
    path = write_tiff(tmp_path / "v.tif", heights.astype("float32"))
    east, south = [100.0, 500.0, 1000.0, 1500.0, 1900.0], [1000.0] * 5
    ground = profile_of(path, east, south)
    strung = profile_of(path, east, south, ways=STRUNG)
    spanned = profile_of(path, east, south, ways=SPANNED)
    assert ground.ground_steps_m.sum() > 1875.0
    assert len(strung.lonlat) == len(spanned.lonlat) == 5
    assert strung.heights_m[2] == pytest.approx(1.5, abs=0.1)
    assert strung.ground_steps_m.sum() == pytest.approx(1800.72 * np.hypot(1, 0.3), rel=1e-3)
    assert np.allclose(spanned.heights_m, 270.0, atol=0.1)
    assert spanned.ground_steps_m.sum() == pytest.approx(1800.8, abs=0.1)
    assert np.allclose(spanned.found_heights_m, strung.found_heights_m)


def test_a_bridge_between_two_ways_takes_the_heights_of_its_ends(tmp_path: Path) -> None:
    """Smoothing on either side does not reach over the bridge, and there is no jump at it."""
    heights = surface(lambda x, y: np.where(np.abs(x - 1000) < 200, 0.0, 80.0), side=200, step_m=10)
    path = write_tiff(tmp_path / "g.tif", heights.astype("float32"))
    ways = np.array([ON_GROUND, SPANNED, SPANNED, ON_GROUND])
    profile = profile_of(
        path, [100.0, 780.0, 1000.0, 1220.0, 1900.0], [1000.0] * 5, ways=ways, wave_m=150.0
    )
    assert np.allclose(profile.heights_m, 80.0, atol=1e-6)


def test_a_hole_is_bridged_straight_and_said(tmp_path: Path) -> None:
    """Unknown heights between known ones lie on the straight line between these."""
    heights = surface(lambda x, y: 0.1 * x, side=200, step_m=10.0).astype("float32")
    heights[:, 80:120] = -9999.0
    path = write_tiff(tmp_path / "h.tif", heights, nodata=-9999.0)
    profile = profile_of(path, [100.0, 1900.0], [1000.0, 1000.0])
    assert slope_ratio(profile) == pytest.approx(np.hypot(1.0, 0.09996), rel=1e-6)
    (hole,) = unknown_stretches(profile)
    assert (hole.why, hole.is_bridged) == ("void", True)
    # Cells 79 and 120 know; the line begins at 100 m; a station each 10 m; ground over level 1.005.
    assert hole.start_m == pytest.approx(695 * 1.0054, abs=11.0)
    assert hole.end_m == pytest.approx(1105 * 1.0054, abs=11.0)
    assert np.isnan(profile.found_heights_m).any()
    assert not np.isnan(profile.heights_m).any()


def test_a_raster_over_half_of_the_run_says_which_stations_lie_outside(tmp_path: Path) -> None:
    """Outside the last known height steps keep their ellipsoid length."""
    heights = surface(lambda x, y: 0.3 * x, side=100, step_m=10.0).astype("float32")
    path = write_tiff(tmp_path / "half.tif", heights)
    profile = profile_of(path, [500.0, 1500.0], [500.0, 500.0])
    (outside,) = unknown_stretches(profile)
    assert (outside.why, outside.is_bridged) == ("outside", False)
    half = 500.0 * np.hypot(1.0, 0.3)
    assert outside.start_m == pytest.approx(half, abs=11.0)
    assert outside.end_m == pytest.approx(half + 500.0, abs=11.0)
    assert profile.ground_steps_m.sum() == pytest.approx(half + 500.2, abs=1.0)
    said = dict(profile_warnings(profile, "line"))
    assert set(said) == {"line"}
    messages = [message for _, message in profile_warnings(profile, "line")]
    assert any("outside the terrain" in text and "taken as level" in text for text in messages)


def test_a_line_wholly_outside_keeps_its_ellipsoid_length(tmp_path: Path) -> None:
    """Nothing is known, nothing is invented."""
    path = write_tiff(tmp_path / "p.tif", np.zeros((10, 10), dtype="float32"))
    profile = profile_of(path, [5000.0, 6000.0], [5000.0, 5000.0])
    assert np.isnan(profile.heights_m).all()
    assert np.array_equal(profile.ground_steps_m, profile.ellipsoid_steps_m)
    assert len(profile.lonlat) == 2


def test_holes_under_a_bridge_are_not_missed(tmp_path: Path) -> None:
    """Nobody asks for the height of the water under a span."""
    heights = np.full((200, 200), 5.0, dtype="float32")
    heights[:, 80:120] = np.nan
    path = write_tiff(tmp_path / "w.tif", heights)
    profile = profile_of(
        path, [100.0, 700.0, 1000.0, 1300.0], [1000.0] * 4, ways=[ON_GROUND, SPANNED, SPANNED]
    )
    assert unknown_stretches(profile) == ()
    assert np.allclose(profile.heights_m, 5.0)


def test_steep_stretches_are_listed_by_their_way_and_length(tmp_path: Path) -> None:
    """Up at 1 in 4, level, down at 1 in 2: two stretches over 1 in 5, one over 1 in 3."""
    east = np.array([0.0, 500.0, 900.0, 1100.0, 1300.0, 2000.0])
    height = np.array([0.0, 0.0, 100.0, 100.0, 0.0, 0.0])
    heights = surface(lambda x, y: np.interp(x, east, height), side=200, step_m=10.0)
    path = write_tiff(tmp_path / "steep.tif", heights.astype("float32"))
    profile = profile_of(path, [100.0, 1900.0], [1000.0, 1000.0])
    up, down = steep_stretches(profile, 0.2)
    assert up.rise_m == pytest.approx(100.0, abs=6.0)
    assert up.start_m == pytest.approx(400.0, abs=15.0)
    assert up.slope_max_ratio == pytest.approx(0.25, rel=0.01)
    assert down.rise_m == pytest.approx(-100.0, abs=6.0)
    assert down.end_m - down.start_m == pytest.approx(200 * np.hypot(1, 0.5), abs=25.0)
    assert len(steep_stretches(profile, 1 / 3)) == 1
    assert steep_stretches(profile, 0.2, length_min_m=300.0) == (up,)
    assert steep_stretches(profile, 0.6) == ()


@pytest.mark.parametrize("wave_m", [0.0, 150.0])
def test_the_line_drawn_the_other_way_is_mirrored_to_the_bit(tmp_path: Path, wave_m: float) -> None:
    """Heights and ground steps do not depend on which end a line begins at."""
    rng = np.random.default_rng(5)
    heights = rng.uniform(0, 20, (200, 200)).astype("float32")
    heights[60:80, 60:120] = np.nan
    path = write_tiff(tmp_path / "r.tif", heights)
    east, south = rng.uniform(50, 1950, (2, 30))
    ways = rng.integers(0, 3, 29).astype(np.uint8)
    there = profile_of(path, east, south, ways=ways, wave_m=wave_m)
    back = profile_of(path, east[::-1], south[::-1], ways=ways[::-1], wave_m=wave_m)
    assert np.array_equal(there.heights_m, back.heights_m[::-1], equal_nan=True)
    assert np.array_equal(there.ground_steps_m, back.ground_steps_m[::-1])
    assert np.array_equal(there.lonlat, back.lonlat[::-1])
    assert np.allclose(there.index, 29 - back.index[::-1])
    assert there.smoothed_off_m == back.smoothed_off_m


def test_a_line_over_two_tiles_has_the_profile_of_the_whole(tmp_path: Path) -> None:
    """A seam leaves no trace in the ground length."""
    heights = surface(
        lambda x, y: 40 * np.sin(x / 90) * np.cos(y / 70), side=200, step_m=10.0
    ).astype("float32")
    whole = write_tiff(tmp_path / "whole.tif", heights)
    parts = [
        write_tiff(tmp_path / "l.tif", heights[:, :103]),
        write_tiff(tmp_path / "r.tif", heights[:, 97:], move=(WEST + 970.0, NORTH, 10.0, -10.0)),
    ]
    lonlat = lonlat_of(np.linspace(60, 1900, 30), np.linspace(1800, 90, 30))
    lengths = [
        terrain_profile(
            open_terrain(paths),
            lonlat,
            ellipsoid_steps_m=geodesy.steps_m(lonlat),
            ways=step_ways("duct", 29),
            radius_m=SPHERE_M,
        ).ground_steps_m
        for paths in ([whole], parts)
    ]
    assert np.allclose(*lengths, atol=1e-7)


def test_steps_of_a_placement_go_as_the_placement_does() -> None:
    """Aerial is strung, bridges and water are spans, all else is on the ground."""
    assert step_ways("aerial", 1).tolist() == [STRUNG]
    assert step_ways("bridge", 1).tolist() == step_ways("water", 1).tolist() == [SPANNED]
    for placement in ("duct", "buried", "surface", "indoor", "existing"):
        assert step_ways(placement, 1).tolist() == [ON_GROUND]


def test_heights_of_stations_are_those_of_the_raster(tmp_path: Path) -> None:
    """What was found is kept beside what was smoothed."""
    rng = np.random.default_rng(6)
    path = write_tiff(tmp_path / "r.tif", rng.uniform(0, 20, (200, 200)).astype("float32"))
    profile = profile_of(path, [100.0, 1900.0], [1000.0, 1000.0], wave_m=150.0)
    direct = heights_at(open_terrain([path]), profile.lonlat)
    assert np.array_equal(profile.found_heights_m, direct.heights_m)
    assert np.std(profile.heights_m) < 0.5 * np.std(profile.found_heights_m)
