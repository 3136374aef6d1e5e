"""Heights at points: bilinear, rightly placed, in metres, over holes, edges and seams."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from routeplan.ground.terrain import KNOWN, OUTSIDE, VOID, heights_at, open_terrain
from tests.ground.terrain_rasters import NORTH, UTM, WEST, lonlat_of, surface, write_tiff

PLANE = (100.0, 0.1, -0.05)  # height at the corner, slope east, slope south


def plane(east: np.ndarray, south: np.ndarray) -> np.ndarray:
    return PLANE[0] + PLANE[1] * east + PLANE[2] * south


def inner_points(side_m: float, step_m: float, *, count: int = 500) -> tuple[np.ndarray, ...]:
    rng = np.random.default_rng(4)
    return tuple(rng.uniform(step_m, side_m - step_m, (2, count)))


@pytest.mark.parametrize("dtype", ["float32", "float64", "int16"])
def test_a_plane_is_met_exactly_between_the_centres_of_cells(tmp_path: Path, dtype: str) -> None:
    """Bilinear interpolation is exact on a plane; half a cell's shift would be 0.5 to 1 m off."""
    heights = surface(plane, side=100, step_m=20.0)
    factor = 0.01 if dtype == "int16" else 1.0
    scale = (factor, 0.0) if dtype == "int16" else None
    path = write_tiff(
        tmp_path / "plane.tif",
        np.rint(heights / factor).astype(dtype) if dtype == "int16" else heights.astype(dtype),
        move=(WEST, NORTH, 20.0, -20.0),
        scale=scale,
    )
    east, south = inner_points(2000.0, 20.0)
    found = heights_at(open_terrain([path]), lonlat_of(east, south))
    assert np.abs(found.heights_m - plane(east, south)).max() < 1e-3
    assert (found.state == KNOWN).all()


@pytest.mark.parametrize("option", [{"AREA_OR_POINT": "Point"}, {"AREA_OR_POINT": "Area"}])
def test_cells_as_points_and_cells_as_areas_lie_at_the_same_place(
    tmp_path: Path, option: dict[str, str]
) -> None:
    """GDAL's transform is of outer corners for both kinds of file; so must the heights be."""
    import rasterio

    path = write_tiff(tmp_path / "p.tif", surface(plane, side=50, step_m=10.0).astype("float32"))
    with rasterio.open(path, "r+") as raster:
        raster.update_tags(**option)
    east, south = inner_points(500.0, 10.0)
    found = heights_at(open_terrain([path]), lonlat_of(east, south))
    assert np.abs(found.heights_m - plane(east, south)).max() < 1e-3


def test_a_raster_that_begins_in_the_south_is_right_way_up(tmp_path: Path) -> None:
    """A positive step in y is as good as a negative one."""
    heights = surface(plane, side=60, step_m=10.0)[::-1].astype("float32")
    path = write_tiff(tmp_path / "up.tif", heights, move=(WEST, NORTH - 600.0, 10.0, 10.0))
    east, south = inner_points(600.0, 10.0)
    found = heights_at(open_terrain([path]), lonlat_of(east, south))
    assert np.abs(found.heights_m - plane(east, south)).max() < 1e-3


@pytest.mark.parametrize(
    ("units", "crs", "metres"),
    [
        ("ft", UTM, 0.3048),
        ("US survey foot", UTM, 1200 / 3937),
        ("metre", UTM, 1.0),
        (None, "EPSG:32632+6360", 1200 / 3937),  # heights in US survey feet by the CRS
        (None, "EPSG:32632+8228", 0.3048),  # heights in feet by the CRS
        (None, "EPSG:32632+5773", 1.0),
    ],
)
def test_heights_in_feet_become_metres(
    tmp_path: Path, units: str | None, crs: str, metres: float
) -> None:
    """The unit is what the band says, else what the vertical part of the CRS says."""
    values = np.full((20, 20), 1000.0, dtype="float32")
    path = write_tiff(tmp_path / "feet.tif", values, crs=crs, units=units)
    found = heights_at(open_terrain([path]), lonlat_of(np.array([100.0]), np.array([100.0])))
    assert found.heights_m[0] == pytest.approx(1000.0 * metres, rel=1e-9)


def test_a_hole_is_unknown_as_far_as_it_bears_and_no_farther(tmp_path: Path) -> None:
    """A point is unknown where a void cell has weight; on the next centre it has none."""
    values = np.full((20, 20), 50.0, dtype="float32")
    values[10, 10] = -9999.0
    path = write_tiff(tmp_path / "hole.tif", values, nodata=-9999.0)
    east = np.array([105.0, 114.9, 115.1, 95.1, 94.9, 110.0, 115.0])
    found = heights_at(open_terrain([path]), lonlat_of(east, np.full(7, 105.0)))
    # Degrees and back move a centre by some nanometres, so that the last may fall either way.
    assert found.state[:6].tolist() == [VOID, VOID, KNOWN, VOID, KNOWN, VOID]
    assert np.isnan(found.heights_m[0])
    assert found.heights_m[2] == 50.0


@pytest.mark.parametrize("void", [0.0, 255.0, -99.0])
def test_any_declared_value_can_stand_for_a_hole(tmp_path: Path, void: float) -> None:
    """A fill value that would pass as a height counts if the file declares it."""
    values = np.full((20, 20), 50.0, dtype="float32")
    values[5:15, 5:15] = void
    path = write_tiff(tmp_path / "hole.tif", values, nodata=void)
    at = lonlat_of(np.array([100.0, 20.0]), np.array([100.0, 20.0]))
    assert heights_at(open_terrain([path]), at).state.tolist() == [VOID, KNOWN]


@pytest.mark.parametrize("fill", [-32768, -9999, 32767])
def test_an_undeclared_fill_value_is_no_height(tmp_path: Path, fill: int) -> None:
    """A value that no place on earth has is a hole even if the file does not say so."""
    values = np.full((20, 20), 50, dtype="int16")
    values[5:15, 5:15] = fill
    path = write_tiff(tmp_path / "fill.tif", values)
    at = lonlat_of(np.array([100.0, 20.0]), np.array([100.0, 20.0]))
    found = heights_at(open_terrain([path]), at)
    assert found.state.tolist() == [VOID, KNOWN]
    assert found.heights_m[1] == 50.0


def test_a_mask_band_makes_holes(tmp_path: Path) -> None:
    """Cells masked by the file's own mask are unknown."""
    import rasterio

    path = write_tiff(tmp_path / "m.tif", np.full((20, 20), 50, dtype="uint8"))
    mask = np.full((20, 20), 255, dtype="uint8")
    mask[5:15, 5:15] = 0
    with rasterio.Env(GDAL_TIFF_INTERNAL_MASK=True), rasterio.open(path, "r+") as raster:
        raster.write_mask(mask)
    at = lonlat_of(np.array([100.0, 20.0]), np.array([100.0, 20.0]))
    assert heights_at(open_terrain([path]), at).state.tolist() == [VOID, KNOWN]


def test_the_outer_half_cell_is_covered_and_nothing_beyond(tmp_path: Path) -> None:
    """Heights go on to the outer edge of the outer cells; beyond is outside."""
    path = write_tiff(tmp_path / "p.tif", np.full((20, 20), 7.0, dtype="float32"))
    east = np.array([0.01, 199.99, -0.01, 200.01])
    found = heights_at(open_terrain([path]), lonlat_of(east, np.full(4, 100.0)))
    assert found.state.tolist() == [KNOWN, KNOWN, OUTSIDE, OUTSIDE]


@pytest.mark.parametrize("overlap", [0, 5])
def test_tiles_of_one_grid_have_no_seam(tmp_path: Path, overlap: int) -> None:
    """Over a seam heights are those of one raster cut in two, to the last bit."""
    rng = np.random.default_rng(8)
    heights = rng.uniform(0, 500, (64, 80)).astype("float32")
    whole = write_tiff(tmp_path / "whole.tif", heights)
    left = write_tiff(tmp_path / "left.tif", heights[:, : 40 + overlap])
    right = write_tiff(
        tmp_path / "right.tif", heights[:, 40:], move=(WEST + 400.0, NORTH, 10.0, -10.0)
    )
    east, south = rng.uniform(0, 800, 3000), rng.uniform(0, 640, 3000)
    east[:1000] = rng.uniform(380, 420, 1000)
    at = lonlat_of(east, south)
    expected = heights_at(open_terrain([whole]), at)
    for tiles in ([left, right], [right, left]):
        terrain = open_terrain(tiles)
        assert len(terrain.sheets) == 1
        found = heights_at(terrain, at)
        assert np.abs(found.heights_m - expected.heights_m).max() < 1e-6
        assert (found.state == KNOWN).all()


def test_a_hole_of_one_tile_is_filled_by_the_next(tmp_path: Path) -> None:
    """Where the first of two overlapping tiles has a hole, the second gives the height."""
    first, second = np.full((20, 20), 10.0, "float32"), np.full((20, 20), 30.0, "float32")
    first[5:15, 5:15] = np.nan
    paths = [write_tiff(tmp_path / "a.tif", first), write_tiff(tmp_path / "b.tif", second)]
    at = lonlat_of(np.array([100.0, 20.0]), np.array([100.0, 20.0]))
    assert heights_at(open_terrain(paths), at).heights_m.tolist() == [30.0, 10.0]


def test_a_coarse_raster_stands_in_where_a_fine_one_ends(tmp_path: Path) -> None:
    """Rasters on different grids: the first that covers a point gives its height."""
    fine = write_tiff(
        tmp_path / "fine.tif", np.full((100, 100), 5.0, "float32"), move=(WEST, NORTH, 1.0, -1.0)
    )
    coarse = write_tiff(
        tmp_path / "coarse.tif",
        np.full((10, 10), 9.0, "float32"),
        move=(WEST, NORTH, 30.0, -30.0),
    )
    at = lonlat_of(np.array([50.0, 150.0, 400.0]), np.array([50.0, 50.0, 50.0]))
    found = heights_at(open_terrain([fine, coarse]), at)
    assert found.heights_m[:2].tolist() == [5.0, 9.0]
    assert found.state.tolist() == [KNOWN, KNOWN, OUTSIDE]


def test_between_two_far_tiles_is_outside_not_a_hole(tmp_path: Path) -> None:
    """Tiles of one grid with nothing between them: what lies between is outside."""
    values = np.full((10, 10), 5.0, dtype="float32")
    paths = [
        write_tiff(tmp_path / f"{x}.tif", values, move=(WEST + x, NORTH, 10.0, -10.0))
        for x in (0.0, 500.0)
    ]
    at = lonlat_of(np.array([50.0, 300.0, 550.0]), np.full(3, 50.0))
    terrain = open_terrain(paths)
    assert len(terrain.sheets) == 1
    assert heights_at(terrain, at).state.tolist() == [KNOWN, OUTSIDE, KNOWN]


@pytest.mark.parametrize("blocks", [{"tiled": True, "blockxsize": 64, "blockysize": 64}, {}])
def test_many_windows_give_what_one_would(tmp_path: Path, blocks: dict[str, object]) -> None:
    """Ways and scattered points over many blocks are as by interpolation in the whole array."""
    rng = np.random.default_rng(2)
    heights = rng.uniform(0, 500, (1300, 1700)).astype("float32")
    path = write_tiff(tmp_path / "big.tif", heights, compress="deflate", **blocks)
    terrain = open_terrain([path])
    for east, south in (
        (rng.uniform(10, 16990, 20_000), rng.uniform(10, 12990, 20_000)),
        (np.linspace(10, 16990, 20_000), np.linspace(12990, 10, 20_000)),
    ):
        found = heights_at(terrain, lonlat_of(east, south)).heights_m
        col, row = np.clip(east / 10 - 0.5, 0, 1699), np.clip(south / 10 - 0.5, 0, 1299)
        c, r = np.minimum(col.astype(int), 1698), np.minimum(row.astype(int), 1298)
        f, g = col - c, row - r
        top = heights[r, c] * (1 - f) + heights[r, c + 1] * f
        bottom = heights[r + 1, c] * (1 - f) + heights[r + 1, c + 1] * f
        # Positions fitted by a polynomial may lie 0.002 of a cell off: a metre on such a ground.
        assert np.abs(found - (top * (1 - g) + bottom * g)).max() < 2.0
        assert np.abs(found - (top * (1 - g) + bottom * g)).mean() < 0.01


def test_no_terrain_and_no_points_are_no_trouble(tmp_path: Path) -> None:
    """Nothing asked gives nothing; no raster gives only what is outside."""
    path = write_tiff(tmp_path / "p.tif", np.zeros((5, 5), dtype="float32"))
    assert len(heights_at(open_terrain([path]), np.empty((0, 2))).heights_m) == 0
    assert heights_at(open_terrain([]), np.zeros((2, 2))).state.tolist() == [OUTSIDE, OUTSIDE]


@pytest.mark.parametrize("shape", [(1, 1), (1, 30), (30, 1)])
def test_rasters_of_one_row_or_column_work(tmp_path: Path, shape: tuple[int, int]) -> None:
    """With no second row or column the height is carried across."""
    path = write_tiff(tmp_path / "thin.tif", np.full(shape, 12.0, dtype="float32"))
    found = heights_at(open_terrain([path]), lonlat_of(np.array([5.0]), np.array([5.0])))
    assert found.heights_m.tolist() == [12.0]


def test_a_raster_over_the_antimeridian_covers_both_sides(tmp_path: Path) -> None:
    """Longitudes beyond 180 in the raster and below -180 in the run are one place."""
    values = np.tile(np.arange(40, dtype="float32"), (10, 1))
    path = write_tiff(tmp_path / "t.tif", values, move=(178.0, 10.0, 0.1, -0.1), crs="EPSG:4326")
    at = np.array([[179.95, 9.5], [-179.95, 9.5], [180.05, 9.5]])
    found = heights_at(open_terrain([path]), at).heights_m
    assert np.allclose(found, [19.0, 20.0, 20.0])
