"""Shapes as a file holds them: in its own coordinates, before they mean anything."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

import numpy as np

from routeplan.run.model import Floats, Source
from routeplan.run.trouble import cleaned_text

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = ["Layer", "Shape", "feature_label", "frozen"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Shape:
    """
    One line, point or polygon of a file: (n, 2) coordinates, (n,) heights where it has them.

    The vertices of a polygon's rings follow one another; `ring_starts` says where each begins.
    """

    kind: Literal["line", "point", "area"]
    xy: Floats
    z: Floats | None
    properties: Mapping[str, object]
    source: Source
    is_track: bool = False
    part: int = 1
    ring_starts: tuple[int, ...] = (0,)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Layer:
    """
    The shapes of one layer of a file that share a coordinate reference system.

    `default_crs` is what the format itself prescribes for files that do not say; `loose` formats
    carry every value as text.
    """

    file: str
    name: str | None
    crs: CRS | None
    default_crs: str | None
    shapes: list[Shape] = field(default_factory=list)
    loose: bool = False

    @property
    def where(self) -> str:
        """The layer as messages name it."""
        return str(Source(file=self.file, layer=self.name))


def feature_label(name: object, identity: object, number: int) -> str:
    """
    Return how messages name a feature: by its name, its id, or its number in the file.

    Examples
    --------
    >>> feature_label("Hill", None, 1), feature_label(None, 7, 2), feature_label(None, None, 3)
    ('"Hill"', 'id 7', '3')
    """
    if isinstance(name, str) and name.strip():
        short = cleaned_text(" ".join(name.split()))
        return f'"{short[:57]}..."' if len(short) > 60 else f'"{short}"'
    if isinstance(identity, str | int) and not isinstance(identity, bool):
        return f"id {str(identity)[:60]}" if abs(_size(identity)) < 10**30 else str(number)
    return str(number)


def _size(identity: str | int) -> int:
    return identity if isinstance(identity, int) else 0


def frozen(values: Floats) -> Floats:
    """Return the array, closed to writing."""
    values.flags.writeable = False
    return values


EMPTY: Floats = frozen(np.empty((0, 2)))
