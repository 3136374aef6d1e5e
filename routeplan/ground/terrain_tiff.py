"""Heights in GeoTIFF files, through rasterio."""

from __future__ import annotations

import logging
import math
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import GeometryError, Problem
from routeplan.ground.terrain_model import Tile
from routeplan.run.crs import crs_or_none

__all__ = ["open_tiff", "tiff_reader"]

_M_PER_UNIT = {  # exact by definition
    "": 1.0,
    "m": 1.0,
    "metre": 1.0,
    "metres": 1.0,
    "meter": 1.0,
    "meters": 1.0,
    "dm": 0.1,
    "decimetre": 0.1,
    "decimeter": 0.1,
    "cm": 0.01,
    "centimetre": 0.01,
    "centimeter": 0.01,
    "mm": 0.001,
    "millimetre": 0.001,
    "millimeter": 0.001,
    "ft": 0.3048,
    "foot": 0.3048,
    "feet": 0.3048,
    "international foot": 0.3048,
    "us-ft": 1200 / 3937,
    "ftus": 1200 / 3937,
    "us foot": 1200 / 3937,
    "us survey foot": 1200 / 3937,
    "us survey feet": 1200 / 3937,
    "foot_us": 1200 / 3937,
}


def open_tiff(path: Path, *, crs: str | None) -> Tile | Problem:
    """
    Return what the head of a GeoTIFF says, or what is wrong with it.

    The first band holds the heights. Its unit is what the band says, else the vertical axis of a
    compound CRS, else the metre; its scale and offset are applied.

    Parameters
    ----------
    path
        The file.
    crs
        CRS if the file does not say.
    """
    try:
        import rasterio
    except ImportError:
        return Problem(
            where=path.name,
            what="needs the library rasterio to be read",
            remedy='Install it with: pip install "routeplan[terrain]"',
        )
    try:
        with _quiet(), rasterio.open(path, driver="GTiff") as raster:
            return _tile(path, raster, crs=crs)
    except (rasterio.errors.RasterioError, ValueError, OSError) as error:
        return _damaged(path, error)


def _tile(path: Path, raster: Any, *, crs: str | None) -> Tile | Problem:
    if raster.count < 1 or raster.dtypes[0].startswith("complex"):
        return Problem(where=path.name, what="has no band of heights", value=str(raster.dtypes))
    declared = raster.crs.to_wkt() if raster.crs else crs
    found = crs_or_none(declared)
    if found is None:
        what = "does not say which CRS it is in" if not declared else "is in a CRS that is unknown"
        remedy = "Write its CRS into it, or name it in the run file"
        return Problem(where=path.name, what=what, value=(declared or "")[:80], remedy=remedy)
    move = raster.transform
    if move.is_identity or abs(move.determinant) == 0.0:
        return Problem(where=path.name, what="does not say where on the earth it lies")
    unit = (raster.units[0] or "").strip().lower()
    if unit not in _M_PER_UNIT:
        remedy = "Write its heights in metres or feet"
        return Problem(
            where=path.name, what="gives heights in an unknown unit", value=unit, remedy=remedy
        )
    unit_m = _M_PER_UNIT[unit] if unit else _axis_m(found)
    flags = {flag.name for flag in raster.mask_flag_enums[0]}
    centre = (move.c + (move.a + move.b) / 2, move.f + (move.d + move.e) / 2)
    return Tile(
        file=path.name,
        path=path,
        kind="tiff",
        crs=(found.sub_crs_list[0] if found.is_compound else found).to_wkt(),
        affine=(move.a, move.b, centre[0], move.d, move.e, centre[1]),
        rows=raster.height,
        cols=raster.width,
        block=raster.block_shapes[0],
        void=_void(raster.nodata, raster.dtypes[0]),
        factor_m=(raster.scales[0] or 1.0) * unit_m,
        offset_m=raster.offsets[0] * unit_m,
        has_mask=bool(flags & {"per_dataset", "alpha"}) and "nodata" not in flags,
    )


def _void(nodata: float | None, dtype: str) -> float | None:
    """Return the fill value as the stored type has it; a NaN says so itself."""
    if nodata is None or math.isnan(nodata):
        return None
    return float(np.float32(nodata)) if dtype == "float32" else nodata


def _axis_m(crs: Any) -> float:
    for part in crs.sub_crs_list:
        if part.is_vertical and part.axis_info:
            return float(part.axis_info[0].unit_conversion_factor) or 1.0
    return 1.0


@contextmanager
def tiff_reader(tile: Tile) -> Iterator[Callable[[int, int, int, int], NDArray[np.generic]]]:
    """
    Give a function that reads rows r0..r1 and columns c0..c1 of a GeoTIFF.

    Parameters
    ----------
    tile
        The opened tile.

    Raises
    ------
    GeometryError
        If a block of the file is damaged.
    """
    import rasterio

    with _quiet(), rasterio.open(tile.path, driver="GTiff") as raster:

        def read(r0: int, r1: int, c0: int, c1: int) -> NDArray[np.generic]:
            window = ((r0, r1), (c0, c1))
            try:
                values: NDArray[np.generic] = raster.read(1, window=window)
                if not tile.has_mask:
                    return values
                known = raster.read_masks(1, window=window) > 0
            except rasterio.errors.RasterioError as error:
                raise GeometryError(_damaged(tile.path, error)) from error
            return np.where(known, values.astype(np.float64), np.nan)

        yield read


@contextmanager
def _quiet() -> Iterator[None]:
    """Keep rasterio from warning and logging; what matters is said in our own words."""
    logger = logging.getLogger("rasterio")
    before = logger.disabled
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        logger.disabled = True
        try:
            yield
        finally:
            logger.disabled = before


def _damaged(path: Path, error: Exception) -> Problem:
    text = str(error).replace(str(path), path.name)[:200]
    return Problem(where=path.name, what="is damaged or is no GeoTIFF", value=text)
