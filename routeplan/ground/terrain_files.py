"""Opening rasters of heights and reading windows of them; no file is read whole."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Sequence
from contextlib import ExitStack, contextmanager
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.ground.terrain_model import Affine, Sheet, Terrain, Tile
from routeplan.ground.terrain_place import misplaced
from routeplan.ground.terrain_plain import asc_reader, hgt_reader, open_asc, open_hgt
from routeplan.ground.terrain_tiff import open_tiff, tiff_reader
from routeplan.run.trouble import looked_in, one_of

__all__ = ["TERRAIN_SUFFIXES", "open_terrain", "window_reader"]

TERRAIN_SUFFIXES = (".tif", ".tiff", ".hgt", ".asc")
"""Suffixes of the rasters of heights that are read."""

Window = tuple[NDArray[np.generic], float | None]
"""Stored values of a window, and which of them stands for an unknown height."""

_ALIGNED_CELLS = 0.01  # grids whose cells lie this near are one grid


def open_terrain(paths: Sequence[Path], *, crs: str | None = None) -> Terrain:
    """
    Return the terrain that raster files hold; only their heads are read.

    Files on one grid (same CRS and step, whole steps apart) become one sheet, without a seam. Of
    sheets on different grids the one whose file comes first gives the height.

    Parameters
    ----------
    paths
        GeoTIFF, `.hgt` and ESRI `.asc` files; a folder stands for all such files in it.
    crs
        CRS of files that do not say.

    Raises
    ------
    GeometryError
        If a file is missing, of no such kind, or damaged.
    CrsError
        If nothing is wrong but a CRS: unknown, or contradicted by the values.
    """
    problems: list[Problem] = []
    tiles: list[Tile] = []
    wrong_crs = 0
    for path in _expanded(paths, problems):
        tile = _opened(path, crs=crs)
        if isinstance(tile, Tile):
            trouble = misplaced(tile)
            wrong_crs += trouble is not None
            tile = trouble or tile
        if isinstance(tile, Problem):
            problems.append(tile)
        else:
            tiles.append(tile)
    if problems:
        raise (CrsError if wrong_crs == len(problems) else GeometryError)(problems)
    return Terrain(sheets=tuple(_sheet(group) for group in _groups(tiles)))


def _expanded(paths: Sequence[Path], problems: list[Problem]) -> Iterator[Path]:
    for path in paths:
        if not path.is_dir():
            yield path
            continue
        inside = sorted(p for p in path.iterdir() if p.suffix.lower() in TERRAIN_SUFFIXES)
        if not inside:
            what = "is a folder without a raster of heights"
            problems.append(Problem(where=path.name, what=what, limit=one_of(TERRAIN_SUFFIXES)))
        yield from inside


def _opened(path: Path, *, crs: str | None) -> Tile | Problem:
    suffix = path.suffix.lower()
    if suffix not in TERRAIN_SUFFIXES:
        return Problem(
            where=path.name,
            what="is of no kind of raster that is read",
            value=suffix or "no suffix",
            limit=one_of(TERRAIN_SUFFIXES),
        )
    if not path.is_file():
        return Problem(where=path.name, what="is not there", remedy=looked_in(path))
    if not os.access(path, os.R_OK):
        return Problem(where=path.name, what="may not be read by this user")
    if suffix == ".hgt":
        return open_hgt(path)
    return open_asc(path, crs=crs) if suffix == ".asc" else open_tiff(path, crs=crs)


def _groups(tiles: Sequence[Tile]) -> list[list[Tile]]:
    groups: list[list[Tile]] = []
    for tile in tiles:
        for group in groups:
            if _is_aligned(group[0], tile):
                group.append(tile)
                break
        else:
            groups.append([tile])
    return groups


def _is_aligned(one: Tile, other: Tile) -> bool:
    if (one.crs, one.factor_m, one.offset_m) != (other.crs, other.factor_m, other.offset_m):
        return False
    a, b, _, d, e, _ = one.affine
    turn = np.array([[a, b], [d, e]])
    others = np.array([[other.affine[0], other.affine[1]], [other.affine[3], other.affine[4]]])
    reach = max(one.rows, one.cols, other.rows, other.cols)
    if np.abs(np.linalg.solve(turn, others) - np.eye(2)).max() * reach > _ALIGNED_CELLS:
        return False
    shift = _shift(one.affine, other.affine)
    return bool(np.abs(shift - np.rint(shift)).max() < _ALIGNED_CELLS)


def _shift(one: Affine, other: Affine) -> NDArray[np.float64]:
    """Return the column and row of one grid at which the other begins."""
    turn = np.array([[one[0], one[1]], [one[3], one[4]]])
    return np.linalg.solve(turn, np.array([other[2] - one[2], other[5] - one[5]]))


def _sheet(tiles: Sequence[Tile]) -> Sheet:
    first = tiles[0]
    shifts = np.rint([_shift(first.affine, tile.affine) for tile in tiles]).astype(np.int64)
    col0, row0 = shifts.min(axis=0)
    a, b, c, d, e, f = first.affine
    places = tuple((int(row - row0), int(col - col0)) for col, row in shifts)
    return Sheet(
        crs=first.crs,
        affine=(a, b, c + a * col0 + b * row0, d, e, f + d * col0 + e * row0),
        rows=max(place[0] + tile.rows for place, tile in zip(places, tiles, strict=True)),
        cols=max(place[1] + tile.cols for place, tile in zip(places, tiles, strict=True)),
        tiles=tuple(tiles),
        places=places,
    )


@contextmanager
def window_reader(sheet: Sheet) -> Iterator[Callable[[int, int, int, int], Window]]:
    """
    Give a function that reads rows r0..r1 and columns c0..c1 (ends left out) of a sheet.

    A window inside one tile comes as it is stored; one over several tiles is put together, with
    NaN where none of them has a height. Files are opened when first needed.

    Parameters
    ----------
    sheet
        The sheet.
    """
    with ExitStack() as stack:
        readers: dict[int, Callable[[int, int, int, int], NDArray[np.generic]]] = {}

        def read(r0: int, r1: int, c0: int, c1: int) -> Window:
            met = [
                at
                for at, ((row, col), tile) in enumerate(zip(sheet.places, sheet.tiles, strict=True))
                if row < r1 and r0 < row + tile.rows and col < c1 and c0 < col + tile.cols
            ]
            for at in met:
                if at not in readers:
                    readers[at] = stack.enter_context(_reader(sheet.tiles[at]))
            if len(met) == 1:
                tile, (row, col) = sheet.tiles[met[0]], sheet.places[met[0]]
                if row <= r0 and r1 <= row + tile.rows and col <= c0 and c1 <= col + tile.cols:
                    return readers[met[0]](r0 - row, r1 - row, c0 - col, c1 - col), tile.void
            whole = np.full((r1 - r0, c1 - c0), np.nan)
            for at in met:
                tile, (row, col) = sheet.tiles[at], sheet.places[at]
                top, bottom = max(r0, row), min(r1, row + tile.rows)
                left, right = max(c0, col), min(c1, col + tile.cols)
                stored = readers[at](top - row, bottom - row, left - col, right - col)
                part = whole[top - r0 : bottom - r0, left - c0 : right - c0]
                np.copyto(part, _known(stored, tile), where=np.isnan(part))
            return whole, None

        yield read


def _known(stored: NDArray[np.generic], tile: Tile) -> NDArray[np.float64]:
    values = stored.astype(np.float64)
    if tile.void is not None:
        values[stored == tile.void] = np.nan
    return values


@contextmanager
def _reader(tile: Tile) -> Iterator[Callable[[int, int, int, int], NDArray[np.generic]]]:
    if tile.kind == "tiff":
        with tiff_reader(tile) as read:
            yield read
    else:
        yield hgt_reader(tile) if tile.kind == "hgt" else asc_reader(tile)
