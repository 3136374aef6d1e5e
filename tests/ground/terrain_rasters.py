"""Rasters of heights written for tests."""

from __future__ import annotations

import warnings
from collections.abc import Callable
from pathlib import Path

import numpy as np
import rasterio
from numpy.typing import NDArray
from rasterio.transform import Affine

from routeplan import geodesy

Floats = NDArray[np.float64]
Height = Callable[[Floats, Floats], Floats]

UTM = "EPSG:32632"
WEST, NORTH = 500_000.0, 5_300_000.0  # on the central meridian: 9 degrees east
SPHERE_M = 6_371_008.8


def write_tiff(
    path: Path,
    values: NDArray[np.generic],
    *,
    move: tuple[float, float, float, float] = (WEST, NORTH, 10.0, -10.0),
    crs: str | None = UTM,
    **options: object,
) -> Path:
    """Write one band; `move` is the outer corner of the first cell and the steps in x and y."""
    x, y, dx, dy = move
    scale = options.pop("scale", None)
    units = options.pop("units", None)
    shape = {"width": values.shape[1], "height": values.shape[0], "count": 1}
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        with rasterio.open(
            path,
            "w",
            driver="GTiff",
            dtype=str(values.dtype),
            crs=crs,
            transform=Affine(dx, 0.0, x, 0.0, dy, y),
            **shape,
            **options,
        ) as raster:
            raster.write(values, 1)
            if scale is not None:
                raster.scales, raster.offsets = ((scale[0],), (scale[1],))
            if units is not None:
                raster.units = (units,)
    return path


def surface(height: Height, *, side: int, step_m: float) -> Floats:
    """Return heights at the centres of a square raster; x east and y south of its corner. [m]"""
    at = (np.arange(side) + 0.5) * step_m
    east, south = np.meshgrid(at, at)
    return np.asarray(height(east, south), dtype=np.float64)


def lonlat_of(east_m: Floats, south_m: Floats) -> Floats:
    """Return degrees of points given from the raster's outer corner, shape (n, 2)."""
    import pyproj

    turn = pyproj.Transformer.from_crs(UTM, "EPSG:4326", always_xy=True)
    return np.column_stack(turn.transform(WEST + east_m, NORTH - south_m))


def utm_steps_m(lonlat: Floats) -> Floats:
    """Return ellipsoid steps of a polyline. [m]"""
    return geodesy.steps_m(lonlat)
