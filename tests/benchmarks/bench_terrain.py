"""Print how fast heights are found, as ratios to reading the window and to sampling by rasterio."""

from __future__ import annotations

import tempfile
import time
import tracemalloc
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pyproj
import rasterio
from rasterio.transform import Affine
from rasterio.windows import Window

from routeplan.ground.terrain import heights_at, open_terrain
from routeplan.ground.terrain_profile import ON_GROUND, terrain_profile
from routeplan.ground.terrain_smooth import smoothed_heights_m

SIDE = 5300  # 112 MB of float32
GRIDS = {
    "degrees": ("EPSG:4326", Affine(1 / 3600, 0.0, 10.0, 0.0, -1 / 3600, 50.0)),
    "UTM": ("EPSG:32632", Affine(25.0, 0.0, 500_000.0, 0.0, -25.0, 5_500_000.0)),
}
LAYOUTS = {"tiles": {"tiled": True, "blockxsize": 256, "blockysize": 256}, "strips": {}}


def write_raster(path: Path, crs: str, transform: object, **layout: object) -> None:
    """Write hills with noise, deflated."""
    row, col = np.mgrid[0:SIDE, 0:SIDE].astype(np.float32)
    heights = 300 + 200 * np.sin(col / 200) * np.cos(row / 300)
    heights += np.random.default_rng(0).normal(0, 0.5, heights.shape).astype(np.float32)
    shape = {"width": SIDE, "height": SIDE, "count": 1, "dtype": "float32"}
    options = {"driver": "GTiff", "compress": "deflate", "predictor": 3, **shape, **layout}
    with rasterio.open(path, "w", crs=crs, transform=transform, **options) as raster:
        raster.write(heights, 1)


def points(path: Path, way: str, *, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Return points in the raster's CRS and in degrees: a winding way, or scattered."""
    rng = np.random.default_rng(1)
    share = np.linspace(0.02, 0.98, count)
    if way == "across":
        cells = np.column_stack([share, 0.5 + 0.1 * np.sin(40 * share)])
    elif way == "diagonal":
        cells = np.column_stack([share, share + 0.02 * np.sin(40 * share)])
    else:
        cells = rng.uniform(0.02, 0.98, (count, 2))
    with rasterio.open(path) as raster:
        x, y = raster.transform * (cells[:, 0] * SIDE, cells[:, 1] * SIDE)
        turn = pyproj.Transformer.from_crs(raster.crs, 4326, always_xy=True)
    return np.column_stack([x, y]), np.column_stack(turn.transform(x, y))


def window_read(path: Path, xy: np.ndarray) -> np.ndarray:
    """Read the window around all points, and nothing more."""
    with rasterio.open(path) as raster:
        col, row = ~raster.transform * (xy[:, 0], xy[:, 1])
        c0, r0 = int(col.min()) - 1, int(row.min()) - 1
        window = Window(c0, r0, int(col.max()) + 2 - c0, int(row.max()) + 2 - r0)
        return raster.read(1, window=window)


def sampled(path: Path, xy: np.ndarray) -> np.ndarray:
    """Sample by rasterio: the nearest cell."""
    with rasterio.open(path) as raster:
        return np.array([value[0] for value in raster.sample(xy)])


def timed_s(work: Callable[[], object], *, repeats: int = 5) -> float:
    """Return the median processor time of some runs: other programs do not disturb it. [s]"""
    times = []
    for _ in range(repeats):
        begin = time.process_time()
        work()
        times.append(time.process_time() - begin)
    return sorted(times)[len(times) // 2]


def compare(path: Path, way: str) -> None:
    """Print one line: a million points against the window and against sampling."""
    xy, lonlat = points(path, way, count=1_000_000)
    own = timed_s(lambda: heights_at(open_terrain([path]), lonlat))
    window = timed_s(lambda: window_read(path, xy))
    some = xy[:: len(xy) // 2000]
    sample = timed_s(lambda: sampled(path, some), repeats=1) * len(xy) / len(some)
    print(
        f"  {path.stem:15} {way:9} own {own * 1000:6.0f} ms   window {window * 1000:6.0f} ms  "
        f"own/window {own / window:5.2f}   sample/own {sample / own:6.0f}"
    )


def main() -> None:
    """Print the tables."""
    with tempfile.TemporaryDirectory() as folder:
        print("1,000,000 points; sampling extrapolated from 2,000 of them")
        for name, (crs, transform) in GRIDS.items():
            for layout, options in LAYOUTS.items():
                path = Path(folder) / f"{name}_{layout}.tif"
                write_raster(path, crs, transform, **options)
                for way in ("across", "diagonal", "scattered"):
                    compare(path, way)
        path = Path(folder) / "UTM_tiles.tif"
        _, lonlat = points(path, "diagonal", count=10_000)
        terrain = open_terrain([path])
        tracemalloc.start()
        heights_at(terrain, lonlat)
        peak = tracemalloc.get_traced_memory()[1] / 1e6
        tracemalloc.stop()
        print(
            f"10,000 points over the whole raster: {peak:.1f} MB of arrays at most, raster 112 MB"
        )
        steps = np.full(len(lonlat) - 1, 20.0)
        ways = np.full(len(steps), ON_GROUND, dtype=np.uint8)

        def profile() -> object:
            return terrain_profile(
                terrain, lonlat, ellipsoid_steps_m=steps, ways=ways, radius_m=6_371_008.8
            )

        print(f"profile of a line of 10,000 vertices: {timed_s(profile) * 1000:.0f} ms")
        along = np.arange(0.0, 1e6, 5.0)
        smooth = timed_s(lambda: smoothed_heights_m(along, np.sin(along), wave_m=150.0), repeats=3)
        print(f"smoothing: {smooth / len(along) * 1e6:.2f} microseconds a station")


if __name__ == "__main__":
    main()
