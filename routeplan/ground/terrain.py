"""Heights of the ground at points, bilinear in rasters at their own step."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from routeplan.ground.terrain_files import Window, open_terrain, window_reader
from routeplan.ground.terrain_model import HIGHEST_M, LOWEST_M, Sheet, Terrain, Tile
from routeplan.ground.terrain_place import cell_positions, far_from_run
from routeplan.run.model import Floats

__all__ = [
    "KNOWN",
    "OUTSIDE",
    "VOID",
    "Heights",
    "Terrain",
    "far_from_run",
    "heights_at",
    "open_terrain",
]

KNOWN, OUTSIDE, VOID = 0, 1, 2
"""States of a height: known, off every raster, in a hole of a raster."""

_BLOCK_CELLS = 512  # rasters are read in windows of about so many rows and columns
_CHUNK = 8192  # keeps every temporary array in the processor's cache
_RUNS_FEW = 64  # points a run, on average, that are worth a window of their own

Whole = NDArray[np.intp]
Read = Callable[[int, int, int, int], Window]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Heights:
    """Heights of points, NaN where unknown, and the state of each: KNOWN, OUTSIDE or VOID."""

    heights_m: Floats
    state: NDArray[np.uint8]


def heights_at(terrain: Terrain, lonlat: Floats) -> Heights:
    """
    Return the height of the ground at points.

    Bilinear between the four centres of cells around a point [1]_; within the outer half cell of
    a raster, which has no centre beyond, the outer cells' heights are carried on. A point is
    unknown if a cell that bears on it is. Where the first sheet does not know, the next is asked.

    Only the parts of a raster around the points are read, some 512 x 512 cells at a time, so that
    memory does not grow with the raster. Costs one decoding of each touched block, and some 0.1
    microseconds a point that follows its neighbours; scattered points are sorted first.

    Parameters
    ----------
    terrain
        The terrain.
    lonlat
        WGS 84 longitude and latitude, shape (n, 2). [deg]

    Returns
    -------
    heights
        Heights in the rasters' own vertical datum, in metres whatever their unit.

    Raises
    ------
    GeometryError
        If a raster turns out to be damaged.

    References
    ----------
    .. [1] Bilinear interpolation, any textbook of numerical analysis.
    """
    heights: Floats | None = None
    for sheet in terrain.sheets:
        if heights is None:
            heights = _heights_in(sheet, lonlat)
        else:
            rest = np.flatnonzero(np.isnan(heights))
            heights[rest] = _heights_in(sheet, lonlat[rest])
        if not np.isnan(heights).any():
            break
    if heights is None:
        heights = np.full(len(lonlat), np.nan)
    return Heights(heights_m=heights, state=_states(terrain, lonlat, heights))


def _heights_in(sheet: Sheet, lonlat: Floats) -> Floats:
    """Return what heights one sheet knows of points, NaN of the others."""
    col, row = cell_positions(sheet, lonlat)
    if _is_all_inside(sheet, col, row):
        return _sheet_heights(sheet, col, row)
    heights = np.full(len(lonlat), np.nan)
    inside = _is_inside(sheet, col, row)
    if inside.any():
        heights[inside] = _sheet_heights(sheet, col[inside], row[inside])
    return heights


def _is_all_inside(sheet: Sheet, col: Floats, row: Floats) -> bool:
    if not len(col):
        return False
    return bool(
        col.min() >= -0.5
        and col.max() <= sheet.cols - 0.5
        and row.min() >= -0.5
        and row.max() <= sheet.rows - 0.5
    )


def _is_inside(
    box: Sheet | Tile, col: Floats, row: Floats, *, row0: int = 0, col0: int = 0
) -> NDArray[np.bool_]:
    return np.asarray(
        (col >= col0 - 0.5)
        & (col <= col0 + box.cols - 0.5)
        & (row >= row0 - 0.5)
        & (row <= row0 + box.rows - 0.5)
    )


def _states(terrain: Terrain, lonlat: Floats, heights_m: Floats) -> NDArray[np.uint8]:
    """Return what is known, and of the rest what lies on some tile and what on none."""
    state = np.zeros(len(lonlat), dtype=np.uint8)
    unknown = np.flatnonzero(np.isnan(heights_m))
    if not len(unknown):
        return state
    on_tile = np.zeros(len(unknown), dtype=bool)
    for sheet in terrain.sheets:
        col, row = cell_positions(sheet, lonlat[unknown])
        for (row0, col0), tile in zip(sheet.places, sheet.tiles, strict=True):
            on_tile |= _is_inside(tile, col, row, row0=row0, col0=col0)
    state[unknown] = np.where(on_tile, VOID, OUTSIDE)
    return state


def _sheet_heights(sheet: Sheet, col: Floats, row: Floats) -> Floats:
    """Return heights at positions within the outer edges of a sheet's box, NaN where unknown."""
    heights = np.empty(len(col))
    with window_reader(sheet) as read:
        for at in _windows(sheet, col, row):
            heights[at] = _window_heights(sheet, read, col[at], row[at])
    return heights


def _windows(sheet: Sheet, col: Floats, row: Floats) -> Iterator[Whole | slice]:
    """Yield the points of one window after the other, as they come or sorted."""
    height, width = _window_cells(sheet)
    across = sheet.cols // width + 1
    count = (sheet.rows // height + 1) * across
    window = np.empty(len(col), dtype=np.uint16 if count < 65536 else np.int64)
    for begin in range(0, len(col), _CHUNK):
        part = slice(begin, begin + _CHUNK)
        # A point on a bound may go to either side: a window is read as wide as its points need.
        # Within the outer half cell, beyond the first centres, whole numbers are nought as well.
        up = (row[part] * (1.0 / height)).astype(np.int32)
        window[part] = up * across + (col[part] * (1.0 / width)).astype(np.int32)
    ends = np.append(np.flatnonzero(window[1:] != window[:-1]) + 1, len(window))
    if (len(ends) - 64) * _RUNS_FEW <= len(window):
        begin = 0
        for end in ends.tolist():
            yield slice(begin, end)
            begin = end
        return
    order = np.argsort(window, kind="stable")
    ranked = window[order]
    yield from np.split(order, np.flatnonzero(ranked[1:] != ranked[:-1]) + 1)


def _window_cells(sheet: Sheet) -> tuple[int, int]:
    """Return rows and columns of a window: whole blocks of the file, 512 or a little more."""
    rows, cols = sheet.tiles[0].block
    height = rows * max(1, -(-_BLOCK_CELLS // rows)) if rows <= _BLOCK_CELLS else _BLOCK_CELLS
    width = cols * max(1, -(-_BLOCK_CELLS // cols)) if cols <= _BLOCK_CELLS else 2 * _BLOCK_CELLS
    return height, width


def _window_heights(sheet: Sheet, read: Read, col: Floats, row: Floats) -> Floats:
    c0, c1, is_inner = _bounds(col, sheet.cols)
    r0, r1, is_level = _bounds(row, sheet.rows)
    stored, void = read(r0, r1, c0, c1)
    heights = np.empty(len(col))
    # Of a window with fewer cells than its points have corners, cells are looked through instead.
    is_clean = stored.size <= 4 * len(col) and _are_known(sheet, [stored], void)
    for begin in range(0, len(col), _CHUNK):
        part = slice(begin, begin + _CHUNK)
        left, across = _cell(col[part], c0, c1, is_inner=is_inner)
        top, along = _cell(row[part], r0, r1, is_inner=is_level)
        top *= c1 - c0
        top += left
        corners = _corners(stored, top)
        unknown = [] if is_clean else _unknown(sheet, corners, void)
        heights[part] = _bilinear(corners, unknown, across=across, along=along)
    tile = sheet.tiles[0]
    if tile.factor_m != 1.0 or tile.offset_m:
        heights = heights * tile.factor_m + tile.offset_m
    return heights


def _bounds(at: Floats, count: int) -> tuple[int, int, bool]:
    """Return the first and one beyond the last cell that bear, and whether all lie between two."""
    low, high = float(at.min()), float(at.max())
    first = min(max(int(low), 0), max(count - 2, 0))
    return first, min(max(int(high), first) + 2, count), low >= 0.0 and high < count - 1


def _cell(at: Floats, first: int, last: int, *, is_inner: bool) -> tuple[Whole, Floats]:
    """Return the cell before each position, from the window's first, and how far on it lies."""
    if not is_inner:
        at = np.clip(at, first, last - 1)
    cell = at.astype(np.int32)
    if not is_inner:
        np.minimum(cell, max(last - 2, first), out=cell)
    share = at - cell
    whole = cell.astype(np.intp)
    whole -= first
    return whole, share


def _corners(stored: NDArray[np.generic], first: Whole) -> list[NDArray[np.generic]]:
    """Return a window's cells north-west, north-east, south-west and south-east of points."""
    rows, cols = stored.shape
    right, down = int(cols > 1), cols * int(rows > 1)
    flat = stored.ravel()
    return [flat[step:].take(first) for step in (0, right, down, down + right)]


def _bilinear(
    corners: list[NDArray[np.generic]],
    unknown: list[NDArray[np.bool_]],
    *,
    across: Floats,
    along: Floats,
) -> Floats:
    """Return stored values between the centres of four cells, NaN where one is unknown."""
    nw, ne, sw, se = (values.astype(np.float64) for values in corners)
    for values, miss in zip((nw, ne, sw, se), unknown, strict=False):
        values[miss] = 0.0
    ne -= nw
    se -= sw
    ne *= across
    se *= across
    nw += ne
    sw += se
    sw -= nw
    sw *= along
    nw += sw
    if unknown:
        nw[_lost(unknown, across, along)] = np.nan
    return nw


def _limits(sheet: Sheet) -> tuple[float, float]:
    """Return the lowest and the highest value of a height, as stored."""
    tile = sheet.tiles[0]
    limits = [(limit - tile.offset_m) / tile.factor_m for limit in (LOWEST_M, HIGHEST_M)]
    return min(limits), max(limits)


def _are_known(sheet: Sheet, stored: list[NDArray[np.generic]], void: float | None) -> bool:
    """Tell whether all of some values are heights; NaN is none."""
    low, high = _limits(sheet)
    lowest = min(float(values.min()) for values in stored)
    highest = max(float(values.max()) for values in stored)
    return low < lowest and highest < high and not (void is not None and lowest <= void <= highest)


def _unknown(
    sheet: Sheet, corners: list[NDArray[np.generic]], void: float | None
) -> list[NDArray[np.bool_]]:
    """Return at which corners the height is unknown or impossible; nothing if at none."""
    if _are_known(sheet, corners, void):
        return []
    low, high = _limits(sheet)
    unknown = []
    for values in corners:
        known = (values > low) & (values < high)  # type: ignore[operator]
        unknown.append(~known if void is None else ~known | (values == void))
    return unknown


def _lost(unknown: list[NDArray[np.bool_]], across: Floats, along: Floats) -> NDArray[np.bool_]:
    """Return at which points an unknown corner bears on the height."""
    bears = (
        (across < 1.0) & (along < 1.0),
        (across > 0.0) & (along < 1.0),
        (across < 1.0) & (along > 0.0),
        (across > 0.0) & (along > 0.0),
    )
    return np.asarray(
        np.any([miss & bear for miss, bear in zip(unknown, bears, strict=True)], axis=0)
    )
