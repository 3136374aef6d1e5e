"""Where streets cross rail lines, water and motorways."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from routeplan.geodesy import steps_m
from routeplan.streets.model import CROSSING_KINDS, Floats, Whole

__all__ = ["Crossings", "find_crossings"]

_AT_END_M = 0.05  # nearer than this to the end of an edge a crossing lies on the junction
_ONE_PLACE_M = 15.0  # house rule: the tracks of one railway, two carriageways, count once


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Crossings:
    """One row a crossing; see `Network`."""

    edge: Whole = field(default_factory=lambda: np.empty(0, dtype=np.int32))
    kind: Whole = field(default_factory=lambda: np.empty(0, dtype=np.int32))
    along_m: Floats = field(default_factory=lambda: np.empty(0))
    weight: Floats = field(default_factory=lambda: np.empty(0))
    lonlat: Floats = field(default_factory=lambda: np.empty((0, 2)))


def find_crossings(
    shape_lonlat: Floats, shape_first: Whole, obstacles: Sequence[tuple[str, Floats]]
) -> Crossings:
    """
    Return where edges cross obstacles.

    Crossings of one kind on one edge within 15 m of the one before count once (house rule: a line
    of several tracks is one crossing). On a junction each edge gets half of it.

    Parameters
    ----------
    shape_lonlat, shape_first
        The edges; see `Network`.
    obstacles
        Rail lines, watercourses and motorways: (kind, vertices).
    """
    import shapely

    obstacles = [(kind, line) for kind, line in obstacles if len(line) > 1]
    if not obstacles or len(shape_first) < 2:
        return Crossings()
    owner = np.repeat(np.arange(len(shape_first) - 1), np.diff(shape_first))
    edges: Any = shapely.linestrings(shape_lonlat, indices=owner)
    blocks: Any = [shapely.linestrings(line) for _, line in obstacles]
    edge, block = shapely.STRtree(blocks).query(edges, predicate="intersects")
    if not len(edge):
        return Crossings()
    met: Any = shapely.intersection(edges[edge], np.array(blocks)[block])
    rows: set[tuple[int, int, float, float, float]] = set()
    for one, other, shape in zip(edge.tolist(), block.tolist(), met, strict=True):
        kind = CROSSING_KINDS.index(obstacles[other][0])
        own = shape_lonlat[shape_first[one] : shape_first[one + 1]]
        for point in _points(shape):
            along, length = _along_m(own, point)
            if along is not None:
                rows.add((one, kind, along, length, *point))  # type: ignore[arg-type]
    return _thinned(sorted(rows))


def _points(shape: object) -> list[tuple[float, float]]:
    """Return the points of an intersection; a common stretch is no crossing."""
    import shapely

    parts = shapely.get_parts(np.array([shape], dtype=object))
    return [
        (float(part.x), float(part.y))
        for part in parts
        if shapely.get_type_id(part) == 0 and not shapely.is_empty(part)
    ]


def _along_m(line: Floats, point: tuple[float, float]) -> tuple[float | None, float]:
    """Return how far along a line a point on it lies, and the line's length."""
    step = line[1:] - line[:-1]
    away = np.array(point) - line[:-1]
    squared = (step * step).sum(axis=1)
    share = np.clip((away * step).sum(axis=1) / np.where(squared > 0, squared, 1.0), 0.0, 1.0)
    off = ((away - share[:, None] * step) ** 2).sum(axis=1)
    at = int(np.argmin(off))
    lengths = steps_m(line)
    return float(lengths[:at].sum() + share[at] * lengths[at]), float(lengths.sum())


def _thinned(rows: Sequence[tuple[float, ...]]) -> Crossings:
    kept: list[tuple[int, int, float, float, float, float]] = []
    for edge, kind, along, length, lon, lat in rows:
        weight = 0.5 if min(along, length - along) < _AT_END_M else 1.0
        if kept:
            last = kept[-1]
            if (last[0], last[1]) == (edge, kind) and along - last[2] < _ONE_PLACE_M:
                if weight > last[3]:
                    kept[-1] = (int(edge), int(kind), along, weight, lon, lat)
                continue
        kept.append((int(edge), int(kind), along, weight, lon, lat))
    table = np.array(kept).reshape(-1, 6)
    return Crossings(
        edge=table[:, 0].astype(np.int32),
        kind=table[:, 1].astype(np.int32),
        along_m=table[:, 2],
        weight=table[:, 3],
        lonlat=table[:, 4:6],
    )
