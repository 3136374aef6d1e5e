"""What a terrain is made of: rasters of heights, laid side by side on common grids."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = ["HIGHEST_M", "LOWEST_M", "Affine", "Sheet", "Terrain", "Tile"]

# House rule: no way lies outside these, and every usual fill value of a raster does. [m]
LOWEST_M = -9999.0
HIGHEST_M = 9000.0

Affine = tuple[float, float, float, float, float, float]
"""x = a col + b row + c, y = d col + e row + f, at the centres of cells."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Tile:
    """
    One raster file of heights.

    `affine` takes column and row to the centre of that cell in the units of `crs` (WKT). A stored
    value v is the height v * `factor_m` + `offset_m`; the value `void` (None: no such value)
    stands for an unknown height. `block` is the rows and columns that are stored together.
    `row_starts` holds the byte at which each row of a text raster begins.
    """

    file: str
    path: Path
    kind: Literal["tiff", "hgt", "asc"]
    crs: str
    affine: Affine
    rows: int
    cols: int
    block: tuple[int, int]
    void: float | None
    factor_m: float = 1.0
    offset_m: float = 0.0
    has_mask: bool = False
    row_starts: NDArray[np.int64] | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sheet:
    """
    Tiles on one common grid: same CRS, same steps, whole steps apart.

    `places` are the row and column of each tile's first cell in the sheet's grid of `rows` by
    `cols`. Where tiles overlap, the first that knows a height gives it.
    """

    crs: str
    affine: Affine
    rows: int
    cols: int
    tiles: tuple[Tile, ...]
    places: tuple[tuple[int, int], ...]

    @property
    def names(self) -> str:
        """Return the files' names, as a message has them."""
        shown = [tile.file for tile in self.tiles[:3]]
        more = len(self.tiles) - len(shown)
        return ", ".join(shown) + (f" and {more} more" if more else "")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Terrain:
    """All sheets of a run's terrain, in order of preference."""

    sheets: tuple[Sheet, ...]
