"""Writing the island's ground as a text raster of heights, the same bytes on every machine."""

from __future__ import annotations

import numpy as np

from island.frame import BOUNDS
from island.terrain import terrain_grid

__all__ = ["crs_text", "raster_text"]

_STEP_DEG = 0.0005  # 44 m east, 56 m north
_CRS = (
    'GEOGCS["GCS_WGS_1984",DATUM["D_WGS_1984",SPHEROID["WGS_1984",6378137.0,298.257223563]],'
    'PRIMEM["Greenwich",0.0],UNIT["Degree",0.0174532925199433]]'
)


def raster_text() -> str:
    """Return heights of all land in whole metres, the sea at 0, in ESRI's text form."""
    west, south, east, north = BOUNDS
    rows, cols = round((north - south) / _STEP_DEG), round((east - west) / _STEP_DEG)
    height_m = terrain_grid(west, north, _STEP_DEG, (rows, cols))
    is_land = height_m > 0.0
    top, bottom = np.flatnonzero(is_land.any(axis=1))[[0, -1]].tolist()
    left, right = np.flatnonzero(is_land.any(axis=0))[[0, -1]].tolist()
    land = np.maximum(height_m[top : bottom + 1, left : right + 1], 0.0).round().astype(int)
    head = (
        f"ncols {right - left + 1}",
        f"nrows {bottom - top + 1}",
        f"xllcorner {west + left * _STEP_DEG:.4f}",
        f"yllcorner {north - (bottom + 1) * _STEP_DEG:.4f}",
        f"cellsize {_STEP_DEG}",
        "NODATA_value -9999",
    )
    return "\n".join([*head, *(" ".join(map(str, row)) for row in land.tolist())]) + "\n"


def crs_text() -> str:
    """Return what the raster's coordinates are: longitude and latitude of WGS 84."""
    return f"{_CRS}\n"
