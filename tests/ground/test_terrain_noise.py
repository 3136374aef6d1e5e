"""Noise in heights: what smoothing takes off, on invented noise over a real terrain."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

from routeplan import geodesy
from routeplan.ground.terrain import heights_at, open_terrain
from routeplan.ground.terrain_profile import TerrainProfile, step_ways, terrain_profile
from routeplan.ground.terrain_report import profile_warnings
from routeplan.ground.terrain_smooth import smoothed_heights_m
from tests.ground.terrain_rasters import NORTH, SPHERE_M, UTM, WEST, lonlat_of, write_tiff


@pytest.fixture(scope="module")
def real_dem(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, np.ndarray]:
    """
    Return a real terrain as a GeoTIFF, and its heights.

    344 x 403 cells of 3 arc-seconds in the Appalachians, from the sample data of the matplotlib
    wheel. Its `ymin` is the northern edge and `ymax` the southern; the values are of outer edges.
    """
    cbook = pytest.importorskip("matplotlib.cbook")
    data = cbook.get_sample_data("jacksboro_fault_dem.npz")
    heights = data["elevation"]
    west, north, step = float(data["xmin"]), float(data["ymin"]), float(data["dx"])
    assert north > float(data["ymax"])
    path = tmp_path_factory.mktemp("real") / "real.tif"
    move = (west, north, step, -float(data["dy"]))
    return write_tiff(path, heights, move=move, crs="EPSG:4326"), heights


def profile(path: Path, lonlat: np.ndarray, *, wave_m: float | None = None) -> TerrainProfile:
    options = {} if wave_m is None else {"smooth_wave_m": wave_m}
    return terrain_profile(
        open_terrain([path]),
        lonlat,
        ellipsoid_steps_m=geodesy.steps_m(lonlat),
        ways=step_ways("buried", len(lonlat) - 1),
        radius_m=SPHERE_M,
        **options,
    )


def test_the_real_terrain_lies_the_right_way_up(real_dem: tuple[Path, np.ndarray]) -> None:
    """Centres of cells give their own heights: row 0 is the north."""
    path, heights = real_dem
    assert (heights.min(), heights.max()) == (236, 1076)
    row, col = np.array([0, 100, 343]), np.array([0, 200, 402])
    step = 0.3358333 / 403
    at = np.column_stack([-84.41375 + (col + 0.5) * step, 36.7329167 - (row + 0.5) * step])
    found = heights_at(open_terrain([path]), at).heights_m
    assert np.allclose(found, heights[row, col], atol=0.5)


def test_the_length_over_the_real_terrain_is_that_of_its_cells(
    real_dem: tuple[Path, np.ndarray],
) -> None:
    """Along a row of centres the ground length is the sum of its steps, cell by cell."""
    path, heights = real_dem
    step = 0.3358333 / 403
    lat = 36.7329167 - 150.5 * step
    lon = -84.41375 + (np.arange(5, 395) + 0.5) * step
    lonlat = np.column_stack([lon, np.full(len(lon), lat)])
    level = geodesy.steps_m(lonlat)
    own = heights[150, 5:395].astype(float)
    expected = np.hypot(level * (1 + (own[1:] + own[:-1]) / 2 / SPHERE_M), np.diff(own)).sum()
    assert profile(path, lonlat, wave_m=0.0).ground_steps_m.sum() == pytest.approx(
        expected, rel=1e-6
    )


@pytest.mark.parametrize("step_m", [5.0, 10.0, 30.0])
@pytest.mark.parametrize("row", [60, 150, 300])
def test_two_metres_of_noise_leave_the_length_within_a_500th_and_are_said(
    real_dem: tuple[Path, np.ndarray], tmp_path: Path, step_m: float, row: int
) -> None:
    """Noise of 2 m a cell on the real terrain: within 0.2 % of the quiet length, with a warning."""
    path, _ = real_dem
    west, north = -84.40, 36.7329167 - row * 0.3358333 / 403
    from pyproj import Transformer

    turn = Transformer.from_crs("EPSG:4326", "EPSG:32616", always_xy=True)
    x, y = turn.transform(west, north)
    rows, cols = 12, int(15_000 / step_m)
    east, south = np.meshgrid((np.arange(cols) + 0.5) * step_m, (np.arange(rows) + 0.5) * step_m)
    cells = np.column_stack(
        turn.transform(x + east.ravel(), y - south.ravel(), direction="INVERSE")
    )
    quiet = heights_at(open_terrain([path]), cells).heights_m.reshape(rows, cols)
    noisy = quiet + np.random.default_rng(row).normal(0.0, 2.0, quiet.shape)
    move = (x, y, step_m, -step_m)
    files = [
        write_tiff(tmp_path / name, heights.astype("float32"), move=move, crs="EPSG:32616")
        for name, heights in (("quiet.tif", quiet), ("noisy.tif", noisy))
    ]
    ends_x = x + np.array([100.0, 7000.0, 14_800.0])
    line = np.column_stack(
        turn.transform(ends_x, y - 6.5 * step_m + np.zeros(3), direction="INVERSE")
    )
    still, rough = profile(files[0], line), profile(files[1], line)
    unsmoothed = profile(files[0], line, wave_m=0.0).ground_steps_m.sum()
    length = rough.ground_steps_m.sum()
    assert length == pytest.approx(still.ground_steps_m.sum(), rel=0.002)
    assert length == pytest.approx(unsmoothed, rel=0.002)
    assert profile(files[1], line, wave_m=0.0).ground_steps_m.sum() > 1.002 * unsmoothed
    assert any("noisy" in message for _, message in profile_warnings(rough, "line"))
    assert not any("noisy" in message for _, message in profile_warnings(still, "line"))


def test_noise_on_level_ground_adds_less_than_a_thousandth(tmp_path: Path) -> None:
    """2 m of noise a cell, whatever the cell's step from 1 to 90 m."""
    rng = np.random.default_rng(1)
    for step_m in (1.0, 3.0, 10.0, 30.0, 45.0, 60.0, 90.0):
        side = int(40_000 / step_m)
        values = rng.normal(100.0, 2.0, (3, side)).astype("float32")
        path = write_tiff(
            tmp_path / f"{step_m}.tif", values, move=(WEST, NORTH, step_m, -step_m), crs=UTM
        )
        lonlat = lonlat_of(np.linspace(200, 39_000, 40), np.full(40, 1.5 * step_m))
        found = profile(path, lonlat)
        level = found.ellipsoid_steps_m.sum() * (1 + 100 / SPHERE_M)
        assert found.ground_steps_m.sum() / level - 1.0 < 1e-3


@pytest.mark.parametrize("step_m", [2.0, 10.0, 20.0])
@pytest.mark.parametrize(("ratio", "kept"), [(0.5, 1 / 17), (1.0, 1 / 2), (2.0, 16 / 17), (8, 1)])
def test_waves_keep_the_share_that_the_rule_states(
    step_m: float, ratio: float, kept: float
) -> None:
    """A wave of length L times `wave_m` keeps 1 / (1 + 1 / L^4) of its height."""
    along = np.arange(0.0, 30_000.0, step_m)
    wave = np.sin(2 * math.pi * along / (ratio * 200.0))
    smooth = smoothed_heights_m(along, wave, wave_m=200.0)
    inner = slice(len(along) // 4, -len(along) // 4)
    assert np.abs(smooth[inner]).max() == pytest.approx(kept, abs=0.03)


def test_smoothing_solves_the_stated_problem() -> None:
    """Against the dense normal equations on uneven stations."""
    rng = np.random.default_rng(9)
    along = np.cumsum(rng.uniform(5.0, 40.0, 60))
    heights = rng.normal(0, 10, 60)
    step = np.diff(along)
    weight = np.zeros(60)
    weight[:-1] += step / 2
    weight[1:] += step / 2
    second = np.zeros((58, 60))
    for at in range(58):
        gap = (step[at] + step[at + 1]) / 2
        second[at, at : at + 3] = (
            np.array([1 / step[at], -1 / step[at] - 1 / step[at + 1], 1 / step[at + 1]]) / gap
        )
    gaps = np.diag((step[:-1] + step[1:]) / 2)
    penalty = (150.0 / (2 * math.pi)) ** 4
    dense = np.linalg.solve(np.diag(weight) + penalty * second.T @ gaps @ second, weight * heights)
    assert np.abs(smoothed_heights_m(along, heights, wave_m=150.0) - dense).max() < 1e-8


def test_an_even_slope_stays_to_its_ends_whatever_the_stations() -> None:
    """Uneven, doubled and very near stations do not bend a straight slope."""
    rng = np.random.default_rng(10)
    along = np.sort(np.concatenate([rng.uniform(0, 3000, 300), [5.0, 5.0, 5.0 + 1e-9, 2999.0]]))
    slope = 12.0 + 0.07 * along
    assert np.abs(smoothed_heights_m(along, slope, wave_m=150.0) - slope).max() < 1e-6


@pytest.mark.parametrize("count", [1, 2, 3])
def test_a_handful_of_stations_is_no_trouble(count: int) -> None:
    """Too short to smooth is left as it is; three on one spot are a straight."""
    along = np.arange(count) * 50.0
    found = smoothed_heights_m(along, np.arange(count) * 1.0, wave_m=150.0)
    assert np.allclose(found, np.arange(count))
    assert np.isfinite(smoothed_heights_m(np.zeros(count), np.ones(count), wave_m=150.0)).all()
