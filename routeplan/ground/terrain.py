"""Heights of the ground at points, bilinear in rasters at their own step."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from routeplan.ground.terrain_files import Window, open_terrain, window_reader
from routeplan.ground.terrain_model import HIGHEST_M, LOWEST_M, Sheet, Terrain
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
    heights = np.full(len(lonlat), np.nan)
    state = np.full(len(lonlat), OUTSIDE, dtype=np.uint8)
    rest: Whole | slice = slice(None)
    for sheet in terrain.sheets:
        col, row = cell_positions(sheet, lonlat[rest])
        inside = (col >= -0.5) & (col <= sheet.cols - 0.5) & (row >= -0.5)
        inside &= row <= sheet.rows - 0.5
        if inside.all() and isinstance(rest, slice):
            heights = _sheet_heights(sheet, col, row)
            state = np.where(np.isnan(heights), VOID, KNOWN).astype(np.uint8)
        elif inside.any():
            at = np.flatnonzero(inside) if isinstance(rest, slice) else rest[inside]
            found = _sheet_heights(sheet, col[inside], row[inside])
            heights[at] = found
            # In a sheet's box but in none of its tiles is outside as well; see `_sheet_heights`.
            state[at] = np.where(np.isnan(found), VOID, KNOWN)
        rest = np.flatnonzero(np.isnan(heights))
        if not len(rest):
            break
    _mark_outside(terrain, lonlat, state)
    return Heights(heights_m=heights, state=state)


def _mark_outside(terrain: Terrain, lonlat: Floats, state: NDArray[np.uint8]) -> None:
    """Set to OUTSIDE what is on no tile though within the box of a sheet of several."""
    for at in np.array_split(np.flatnonzero(state == VOID), 1):
        on_tile = np.zeros(len(at), dtype=bool)
        for sheet in terrain.sheets:
            col, row = cell_positions(sheet, lonlat[at])
            for (row0, col0), tile in zip(sheet.places, sheet.tiles, strict=True):
                inside = (col >= col0 - 0.5) & (col <= col0 + tile.cols - 0.5)
                inside &= (row >= row0 - 0.5) & (row <= row0 + tile.rows - 0.5)
                on_tile |= inside
        state[at[~on_tile]] = OUTSIDE


def _sheet_heights(sheet: Sheet, col: Floats, row: Floats) -> Floats:
    """Return heights at positions within the outer edges of a sheet's box, NaN where unknown."""
    col = np.clip(col, 0.0, sheet.cols - 1.0)
    row = np.clip(row, 0.0, sheet.rows - 1.0)
    left = np.minimum(col.astype(np.int32), max(sheet.cols - 2, 0))
    top = np.minimum(row.astype(np.int32), max(sheet.rows - 2, 0))
    heights = np.empty(len(col))
    with window_reader(sheet) as read:
        for at in _windows(sheet, left, top):
            heights[at] = _bilinear(sheet, read, (col[at], row[at]), (left[at], top[at]))
    return heights


def _windows(
    sheet: Sheet, left: NDArray[np.int32], top: NDArray[np.int32]
) -> Iterator[Whole | slice]:
    """Yield the points of one window after the other, as they come or sorted."""
    height, width = _window_cells(sheet)
    window = (top // height) * (sheet.cols // width + 1) + left // width
    ends = np.append(np.flatnonzero(window[1:] != window[:-1]) + 1, len(window))
    if len(ends) * _RUNS_FEW <= len(window) + 64 * _RUNS_FEW:
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


def _bilinear(
    sheet: Sheet,
    read: Read,
    place: tuple[Floats, Floats],
    corner: tuple[NDArray[np.int32], NDArray[np.int32]],
) -> Floats:
    col, row = place
    left, top = corner
    c0, r0 = int(left.min()), int(top.min())
    c1 = min(int(left.max()) + 2, sheet.cols)
    r1 = min(int(top.max()) + 2, sheet.rows)
    stored, void = read(r0, r1, c0, c1)
    first = (top - r0).astype(np.intp) * (c1 - c0) + (left - c0)
    right, down = int(c1 - c0 > 1), (c1 - c0) * int(r1 - r0 > 1)
    flat = stored.ravel()
    corners = [flat.take(first + step) for step in (0, right, down, down + right)]
    unknown = _unknown(sheet, corners, void)
    nw, ne, sw, se = (values.astype(np.float64) for values in corners)
    across, along = col - left, row - top
    if unknown is not None:
        bears = [
            (across < 1.0) & (along < 1.0),
            (across > 0.0) & (along < 1.0),
            (across < 1.0) & (along > 0.0),
            (across > 0.0) & (along > 0.0),
        ]
        lost = np.any([miss & bear for miss, bear in zip(unknown, bears, strict=True)], axis=0)
        for values, miss in zip((nw, ne, sw, se), unknown, strict=True):
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
    tile = sheet.tiles[0]
    if tile.factor_m != 1.0 or tile.offset_m:
        nw = nw * tile.factor_m + tile.offset_m
    if unknown is not None:
        nw[lost] = np.nan
    return nw


def _unknown(
    sheet: Sheet, corners: list[NDArray[np.generic]], void: float | None
) -> list[NDArray[np.bool_]] | None:
    """Return at which corners the height is unknown or impossible, or None if at none."""
    tile = sheet.tiles[0]
    limits = [(limit - tile.offset_m) / tile.factor_m for limit in (LOWEST_M, HIGHEST_M)]
    low, high = min(limits), max(limits)
    unknown = []
    for values in corners:
        known = (values > low) & (values < high)  # type: ignore[operator]
        if void is not None and low < void < high:
            known &= values != void
        unknown.append(~known)
    return unknown if any(miss.any() for miss in unknown) else None
