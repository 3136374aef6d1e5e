"""Heights in plain files: `.hgt` squares of one degree and ESRI `.asc` text rasters."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import GeometryError, Problem
from routeplan.ground.terrain_model import Tile
from routeplan.run.crs import crs_or_none

__all__ = ["asc_reader", "hgt_reader", "open_asc", "open_hgt"]

_HGT_NAME = re.compile(r"([NS])(\d{2})([EW])(\d{3})", re.IGNORECASE)
_HGT_VOID = -32768.0
_HALF_WIDE = (3601, 1801)  # rows and columns of one-second squares beyond latitude 50
_ASC_BLOCK = 64
_CHUNK_BYTES = 1 << 22


def open_hgt(path: Path) -> Tile | Problem:
    """
    Return a `.hgt` square: 16-bit big-endian metres, named by its south-west corner.

    Its outer samples lie on whole degrees, so neighbours share a row or a column.

    Parameters
    ----------
    path
        The file, for example N36W085.hgt.
    """
    name = _HGT_NAME.match(path.name)
    if name is None:
        remedy = "Name it by its south-west corner, for example N36W085.hgt"
        return Problem(where=path.name, what="does not say which square it is", remedy=remedy)
    samples = path.stat().st_size / 2
    side = math.isqrt(int(samples))
    rows, cols = (side, side) if side * side == samples else _HALF_WIDE
    if rows * cols != samples or side < 2:
        value = f"{path.stat().st_size} bytes"
        return Problem(where=path.name, what="is no square of 16-bit heights", value=value)
    south = int(name[2]) * (1 if name[1].upper() == "N" else -1)
    west = int(name[4]) * (1 if name[3].upper() == "E" else -1)
    crs = crs_or_none("OGC:CRS84")
    assert crs is not None
    return Tile(
        file=path.name,
        path=path,
        kind="hgt",
        crs=crs.to_wkt(),
        affine=(1.0 / (cols - 1), 0.0, float(west), 0.0, -1.0 / (rows - 1), float(south + 1)),
        rows=rows,
        cols=cols,
        block=(1, cols),
        void=_HGT_VOID,
    )


def hgt_reader(tile: Tile) -> Callable[[int, int, int, int], NDArray[np.generic]]:
    """
    Return a function that reads rows r0..r1 and columns c0..c1 of a `.hgt` square.

    Parameters
    ----------
    tile
        The opened tile.
    """
    values = np.memmap(tile.path, dtype=">i2", mode="r", shape=(tile.rows, tile.cols))

    def read(r0: int, r1: int, c0: int, c1: int) -> NDArray[np.generic]:
        return values[r0:r1, c0:c1].astype(np.int16)

    return read


def open_asc(path: Path, *, crs: str | None) -> Tile | Problem:
    """
    Return what the head of an ESRI text raster says, or what is wrong with it.

    Heights are in metres. The CRS is that of a `.prj` file beside it, else `crs`.

    Parameters
    ----------
    path
        The file.
    crs
        CRS if no `.prj` says it.
    """
    head, begin = _asc_head(path)
    try:
        cols, rows = int(head["ncols"]), int(head["nrows"])
        dx = float(head["cellsize"] if "cellsize" in head else head["dx"])
        dy = float(head["cellsize"] if "cellsize" in head else head["dy"])
        x = float(head["xllcenter"]) if "xllcenter" in head else float(head["xllcorner"]) + dx / 2
        y = float(head["yllcenter"]) if "yllcenter" in head else float(head["yllcorner"]) + dy / 2
        void = float(head["nodata_value"]) if "nodata_value" in head else None
    except (KeyError, ValueError) as error:
        value = str(error)[:100]
        return Problem(where=path.name, what="has no head of a text raster", value=value)
    if min(rows, cols) < 1 or not (dx > 0 and dy > 0 and math.isfinite(x + y + dx + dy)):
        return Problem(where=path.name, what="has an impossible head", value=str(head)[:200])
    prj = path.with_suffix(".prj")
    declared = prj.read_text(errors="replace") if prj.is_file() else crs
    found = crs_or_none(declared)
    if found is None:
        what = "is in a CRS that is unknown" if declared else "does not say which CRS it is in"
        remedy = f"Put {prj.name} beside it, or name its CRS in the run file"
        return Problem(where=path.name, what=what, value=(declared or "")[:80], remedy=remedy)
    return Tile(
        file=path.name,
        path=path,
        kind="asc",
        crs=found.to_wkt(),
        affine=(dx, 0.0, x, 0.0, -dy, y + (rows - 1) * dy),
        rows=rows,
        cols=cols,
        block=(_ASC_BLOCK, cols),
        void=void,
        row_starts=_row_starts(path, begin, rows),
    )


def _asc_head(path: Path) -> tuple[dict[str, str], int]:
    """Return the keys of the head in lower case, and the byte at which the heights begin."""
    head: dict[str, str] = {}
    with path.open("rb") as file:
        while True:
            begin = file.tell()
            words = file.readline(1000).decode("latin-1").split()
            if len(words) != 2 or not words[0][0].isalpha() or words[0].lower() == "nan":
                return head, begin
            head[words[0].lower()] = words[1]


def _row_starts(path: Path, begin: int, rows: int) -> NDArray[np.int64]:
    """Return where each row's line begins and the last ends; only `begin` if rows run on."""
    ends: list[NDArray[np.int64]] = []
    with path.open("rb") as file:
        file.seek(begin)
        at = begin
        while chunk := file.read(_CHUNK_BYTES):
            ends.append(np.flatnonzero(np.frombuffer(chunk, dtype=np.uint8) == 10) + at + 1)
            at += len(chunk)
    starts = np.concatenate([[begin], *ends, [at]]).astype(np.int64)
    filled = np.flatnonzero(np.diff(starts) > 2)  # a shorter line is blank
    if len(filled) != rows:
        return np.array([begin], dtype=np.int64)
    return np.append(starts[filled], at)


def asc_reader(tile: Tile) -> Callable[[int, int, int, int], NDArray[np.generic]]:
    """
    Return a function that reads rows r0..r1 and columns c0..c1 of an ESRI text raster.

    With one line a row, as the format is nearly always written, only the lines asked for are
    read; otherwise the whole text is.

    Parameters
    ----------
    tile
        The opened tile.

    Raises
    ------
    GeometryError
        If a row has too few or too many values, or one that is no number.
    """
    starts = tile.row_starts
    assert starts is not None
    if len(starts) == 1:
        with tile.path.open("rb") as file:
            file.seek(int(starts[0]))
            whole = _numbers(tile, file.read(), tile.rows * tile.cols)
        grid = whole.reshape(tile.rows, tile.cols)
        return lambda r0, r1, c0, c1: grid[r0:r1, c0:c1]

    def read(r0: int, r1: int, c0: int, c1: int) -> NDArray[np.generic]:
        with tile.path.open("rb") as file:
            file.seek(int(starts[r0]))
            text = file.read(int(starts[r1] - starts[r0]))
        values = _numbers(tile, text, (r1 - r0) * tile.cols)
        return values.reshape(r1 - r0, tile.cols)[:, c0:c1]

    return read


def _numbers(tile: Tile, text: bytes, count: int) -> NDArray[np.float64]:
    words = text.split()
    if len(words) != count:
        what, value = "has rows of a wrong length", f"{len(words)} values"
        raise GeometryError(
            Problem(where=tile.file, what=what, value=value, limit=f"{count} by its head")
        )
    try:
        return np.array(words).astype(np.float64)
    except ValueError as error:
        problem = Problem(where=tile.file, what="holds what is no number", value=str(error)[:80])
        raise GeometryError(problem) from error
