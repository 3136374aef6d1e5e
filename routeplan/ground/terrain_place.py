"""Where a raster lies on the earth, and whether that can be right."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pyproj

from routeplan import geodesy
from routeplan.errors import Problem
from routeplan.ground.terrain_model import Affine, Sheet, Terrain, Tile
from routeplan.run.crs import crs_label, crs_or_none, is_wgs84, unusable
from routeplan.run.model import Floats

__all__ = ["cell_positions", "cell_step_m", "crs_is_geographic", "far_from_run", "misplaced"]

_AREA_MARGIN_DEG = 3.0  # grids are often used somewhat beyond the zone they are made for
_CHUNK = 65536
_CACHED = 8192  # keeps every temporary array in the processor's cache
_FIT_FROM = 4096  # fewer points are transformed one by one
_FIT_CELLS = 0.002  # how far a fitted position may lie off
_TERM_CELLS = 0.0001  # terms that move no position farther are not worth their time


def misplaced(tile: Tile) -> Problem | None:
    """
    Return what speaks against a tile's CRS tag, if anything does.

    Found are: a CRS without a place on the earth, a geographic one whose values cannot be
    degrees, a projected one whose values look like degrees, and one made for another part of the
    earth. A wrong zone of the right kind can only be seen by the run lying elsewhere.

    Parameters
    ----------
    tile
        The tile.
    """
    crs = crs_or_none(tile.crs)
    assert crs is not None
    reason = unusable(crs)
    if reason:
        what = f"is in a CRS that {reason}"
        return Problem(where=tile.file, what=what, value=crs_label(crs))
    x, y = _corners(tile.affine, tile.rows, tile.cols)
    shown = f"{x[0]:.6g}, {y[0]:.6g}"
    like_degrees = bool(np.abs(x).max() <= 360.5 and np.abs(y).max() <= 90.5)
    remedy = "Write the CRS it is in into the file"
    if crs.is_geographic and not like_degrees:
        what = f"declares {crs_label(crs)}, but its corner {shown} is not in degrees"
        return Problem(where=tile.file, what=what, remedy=remedy)
    if crs.is_projected and like_degrees and max(np.ptp(x), np.ptp(y)) < 90.0:
        what = f"declares the grid {crs_label(crs)}, but its corner {shown} looks like degrees"
        return Problem(where=tile.file, what=what, remedy=remedy)
    if not _is_in_area(crs, x, y):
        area = _with_area(crs).area_of_use
        made_for = f"made for {area.name}" if area else "which does not reach there"
        what = f"lies nowhere near where its CRS {crs_label(crs)} is used"
        return Problem(where=tile.file, what=what, value=shown, limit=made_for, remedy=remedy)
    return None


def _corners(affine: Affine, rows: int, cols: int) -> tuple[Floats, Floats]:
    """Return the outer corners and the middle."""
    a, b, c, d, e, f = affine
    col = np.array([-0.5, cols - 0.5, -0.5, cols - 0.5, (cols - 1) / 2])
    row = np.array([-0.5, -0.5, rows - 0.5, rows - 0.5, (rows - 1) / 2])
    return a * col + b * row + c, d * col + e * row + f


def _is_in_area(crs: pyproj.CRS, x: Floats, y: Floats) -> bool:
    lon, lat = _from_grid(crs.to_wkt()).transform(x, y)
    reached = np.isfinite(lon) & np.isfinite(lat)
    if not reached.any():
        return False
    area = _with_area(crs).area_of_use
    if area is None:
        return True
    width = (area.east - area.west) % 360.0 or 360.0
    east_of = (lon[reached] - area.west + _AREA_MARGIN_DEG) % 360.0
    inside = east_of <= width + 2 * _AREA_MARGIN_DEG
    inside |= width + 2 * _AREA_MARGIN_DEG >= 360.0
    inside &= lat[reached] >= area.south - _AREA_MARGIN_DEG
    inside &= lat[reached] <= area.north + _AREA_MARGIN_DEG
    return bool(inside.any())


def _with_area(crs: pyproj.CRS) -> pyproj.CRS:
    """Return a CRS that knows where it is used; the text of a CRS mostly leaves that out."""
    code = None if crs.area_of_use else crs.to_authority(min_confidence=70)
    return pyproj.CRS.from_authority(*code) if code else crs


def far_from_run(terrain: Terrain, lonlat: Floats) -> Problem | None:
    """
    Return that the terrain lies elsewhere, if none of the run's points is on it.

    Parameters
    ----------
    terrain
        The terrain.
    lonlat
        Points of the run, WGS 84, shape (n, 2). [deg]
    """
    for sheet in terrain.sheets:
        col, row = cell_positions(sheet, lonlat)
        inside = (np.abs(col - (sheet.cols - 1) / 2) <= sheet.cols / 2) & (
            np.abs(row - (sheet.rows - 1) / 2) <= sheet.rows / 2
        )
        if inside.any():
            return None
    if not terrain.sheets or not len(lonlat):
        return None
    sheet = terrain.sheets[0]
    crs = crs_or_none(sheet.crs)
    assert crs is not None
    lon, lat = _from_grid(sheet.crs).transform(*_corners(sheet.affine, sheet.rows, sheet.cols))
    return Problem(
        where=", ".join(sheet.names for sheet in terrain.sheets[:3]),
        what="covers no part of the run",
        value=f"by its CRS {crs_label(crs)} its middle is at {lon[4]:.4f}, {lat[4]:.4f}",
        limit=f"the run begins at {lonlat[0, 0]:.4f}, {lonlat[0, 1]:.4f}",
        remedy="Give the terrain of the run's own ground, or mend the CRS in the file",
    )


def cell_positions(sheet: Sheet, lonlat: Floats) -> tuple[Floats, Floats]:
    """
    Return the fractional column and row of points in a sheet's grid; whole at centres of cells.

    Many points are placed by a polynomial fitted to the transformation over a few thousand of
    them at a time, where it agrees within 0.002 of a cell; few, or others, one by one.

    Parameters
    ----------
    sheet
        The sheet.
    lonlat
        WGS 84 longitude and latitude, shape (n, 2). [deg]

    Returns
    -------
    column, row
        Shape (n,) each; not finite where the CRS does not reach. [-]
    """
    col, row = np.empty(len(lonlat)), np.empty(len(lonlat))
    for begin in range(0, len(lonlat), _CHUNK):
        part = slice(begin, begin + _CHUNK)
        col[part], row[part] = _positions(sheet, lonlat[part, 0], lonlat[part, 1])
    return col, row


def _positions(sheet: Sheet, lon: Floats, lat: Floats) -> tuple[Floats, Floats]:
    if len(lon) >= _FIT_FROM and not _is_plain(sheet.crs):
        for count in (3, 5):
            fitted = _fitted(sheet, lon, lat, count)
            if fitted is not None:
                return fitted
    return _exact(sheet, lon, lat)


@lru_cache(maxsize=64)
def _is_plain(crs: str) -> bool:
    found = crs_or_none(crs)
    return found is not None and is_wgs84(found)


@lru_cache(maxsize=64)
def _to_grid(crs: str) -> pyproj.Transformer:
    return pyproj.Transformer.from_crs("EPSG:4326", crs, always_xy=True)


@lru_cache(maxsize=64)
def _from_grid(crs: str) -> pyproj.Transformer:
    return pyproj.Transformer.from_crs(crs, "EPSG:4326", always_xy=True)


def _exact(sheet: Sheet, lon: Floats, lat: Floats) -> tuple[Floats, Floats]:
    a, b, c, d, e, f = sheet.affine
    if _is_plain(sheet.crs):
        x, y = lon, lat
    else:
        x, y = _to_grid(sheet.crs).transform(lon, lat)
    if crs_is_geographic(sheet.crs):
        middle = a * (sheet.cols - 1) / 2 + b * (sheet.rows - 1) / 2 + c
        if not (np.min(x) >= middle - 180.0 and np.max(x) <= middle + 180.0):
            x = x - 360.0 * np.rint((x - middle) / 360.0)
    size = a * e - b * d
    if b == 0.0 and d == 0.0:
        return (x - c) / a, (y - f) / e
    return (e * (x - c) - b * (y - f)) / size, (a * (y - f) - d * (x - c)) / size


@lru_cache(maxsize=64)
def crs_is_geographic(crs: str) -> bool:
    """Return whether a CRS (WKT) is geographic."""
    found = crs_or_none(crs)
    return found is not None and bool(found.is_geographic)


def _fitted(sheet: Sheet, lon: Floats, lat: Floats, count: int) -> tuple[Floats, Floats] | None:
    """Return positions by a polynomial through count x count points, if it agrees elsewhere."""
    low = np.array([lon.min(), lat.min()])
    half = np.maximum((np.array([lon.max(), lat.max()]) - low) / 2, 1e-9)
    middle = low + half
    if not np.isfinite(half).all() or half.max() > 5.0:
        return None
    nodes = np.cos(np.pi * (np.arange(count) + 0.5) / count)
    inverse = np.linalg.inv(np.vander(nodes, increasing=True))
    u, v = (grid.ravel() for grid in np.meshgrid(nodes, nodes, indexing="ij"))
    tables = [
        inverse @ value.reshape(count, count) @ inverse.T
        for value in _exact(sheet, middle[0] + half[0] * u, middle[1] + half[1] * v)
    ]
    for table in tables:
        table[np.abs(table) < _TERM_CELLS] = 0.0  # u and v are within -1 to 1
    probes = np.linspace(-1.0, 1.0, count + 1)
    u, v = (grid.ravel() for grid in np.meshgrid(probes, probes, indexing="ij"))
    truth = _exact(sheet, middle[0] + half[0] * u, middle[1] + half[1] * v)
    for table, value in zip(tables, truth, strict=True):
        if not np.abs(_polynomial(table, u, v) - value).max() <= _FIT_CELLS:
            return None
    col, row = np.empty(len(lon)), np.empty(len(lon))
    for begin in range(0, len(lon), _CACHED):
        part = slice(begin, begin + _CACHED)
        u = (lon[part] - middle[0]) * (1.0 / half[0])
        v = (lat[part] - middle[1]) * (1.0 / half[1])
        col[part], row[part] = _polynomial(tables[0], u, v), _polynomial(tables[1], u, v)
    return col, row


def _polynomial(table: Floats, u: Floats, v: Floats) -> Floats:
    """Return the sum of table[i, j] u^i v^j, by Horner's rule in both."""
    total = np.zeros_like(u)
    for number in range(len(table) - 1, -1, -1):
        if number < len(table) - 1:
            total *= u
        inner = _row_polynomial(table[number], v)
        if inner is not None:
            total += inner
    return total


def _row_polynomial(row: Floats, v: Floats) -> Floats | float | None:
    """Return the sum of row[j] v^j up to the last term that is not zero; None if all are."""
    terms = np.flatnonzero(row)
    if not len(terms):
        return None
    last = int(terms[-1])
    if not last:
        return float(row[0])
    inner: Floats = v * row[last]
    for value in row[last - 1 : 0 : -1]:
        inner += value
        inner *= v
    inner += row[0]
    return inner


def cell_step_m(sheet: Sheet, lon: float, lat: float) -> float:
    """
    Return the shorter side of a sheet's cells at a place. [m]

    Parameters
    ----------
    sheet
        The sheet.
    lon
        Longitude of the place. [deg]
    lat
        Latitude of the place. [deg]
    """
    # How many cells a metre is, east and north; its inverse is how long a cell is.
    step_deg = 1e-4
    near = np.array([[lon, lat], [lon + step_deg, lat], [lon, lat + step_deg]])
    col, row = _exact(sheet, near[:, 0], near[:, 1])
    east, north = geodesy.local_xy_m(near, lon=lon, lat=lat)
    cells = np.array(
        [
            [(col[1] - col[0]) / east[1], (col[2] - col[0]) / north[2]],
            [(row[1] - row[0]) / east[1], (row[2] - row[0]) / north[2]],
        ]
    )
    if not np.isfinite(cells).all() or abs(np.linalg.det(cells)) == 0.0:
        return float("nan")
    return float(np.hypot(*np.linalg.inv(cells)).min())
