"""Where a run goes: nodes, legs, stretches and stations on the ground."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from routeplan.run.model import Floats, Place, Placement

__all__ = ["Crossing", "Ground", "Leg", "Millimetres", "Node", "PlacedPoint", "Stretch"]

Millimetres: TypeAlias = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Node:
    """A site or a branch point; legs meet only here."""

    id: str
    name: str
    role: str | None
    is_site: bool
    lon: float
    lat: float
    place: Place | None
    assumed: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """Part of a leg with one placement, between two ground stations."""

    placement: Placement
    start_mm: int
    end_mm: int
    existing_m: float | None = None
    existing_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedPoint:
    """A declared point put on a leg: its ground station and how far off the line it lay."""

    place: Place
    ground_mm: int
    offset_m: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Leg:
    """
    One continuous way on the ground between two nodes.

    `lonlat` (n, 2), `heights_m` (n,) or None, `ground_mm` (n,) whole millimetres from the start;
    `is_drawn` (n,) or None is False at vertices that nobody drew. `is_turned` says that the leg
    runs against the direction in which halves are rounded, so that a reversed one is mirrored.
    `shape_lonlat` (m, 2) and `shape_mm` (m,) hold the same way with long steps densified and the
    longitude unwrapped: between their points longitude and latitude may be interpolated.
    `grid_m` and `ellipsoid_m` are lengths of the whole leg; `drawn_ellipsoid_m` is the length
    before a track was thinned. `points` are in station order.
    """

    id: str
    name: str
    start: str
    end: str
    lonlat: Floats
    heights_m: Floats | None
    is_drawn: NDArray[np.bool_] | None
    is_turned: bool
    ground_mm: Millimetres
    shape_lonlat: Floats
    shape_mm: Floats
    grid_m: float
    grid_crs: str
    ellipsoid_m: float
    drawn_ellipsoid_m: float
    stretches: tuple[Stretch, ...]
    points: tuple[PlacedPoint, ...]
    cable: str | None = None

    @property
    def length_mm(self) -> int:
        """Ground length of the leg. [mm]"""
        return int(self.ground_mm[-1])


@dataclass(frozen=True, slots=True, kw_only=True)
class Crossing:
    """Something a leg crosses: declared in the geometry or found in a layer."""

    leg: str
    name: str
    crosses: str
    ground_mm: int
    width_m: float | None
    lon: float
    lat: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ground:
    """All nodes, legs and crossings of a run."""

    nodes: tuple[Node, ...]
    legs: tuple[Leg, ...]
    crossings: tuple[Crossing, ...]
    warnings: tuple[tuple[str, str], ...] = ()

    def node(self, node_id: str) -> Node:
        """Return the node with this id."""
        return next(node for node in self.nodes if node.id == node_id)
