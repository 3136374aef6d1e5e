"""Where a run goes: nodes, legs, stretches and stations on the ground."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from routeplan.run.model import Floats, Place, Placement
from routeplan.run.practice import FeatureKind

__all__ = [
    "Crossing",
    "FoundCrossing",
    "Ground",
    "How",
    "Leg",
    "Millimetres",
    "Node",
    "PlacedPoint",
    "Steep",
    "Stretch",
]

Millimetres: TypeAlias = NDArray[np.int64]
How = Literal["crosses", "touches", "along", "inside"]


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


@dataclass(frozen=True, slots=True, kw_only=True)
class Steep:
    """A stretch of a way that is steeper than a limit; rising where `rise_m` is positive."""

    start_m: float
    end_m: float
    rise_m: float
    slope_max_ratio: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FoundCrossing:
    """
    A place where a leg meets a feature, or a length that it shares with one.

    `how` is `crosses` (from one side of a line to the other), `touches` (it meets it and stays on
    one side, or either ends there), `along` (near and nearly parallel) or `inside` (an area).
    `start_mm` and `end_mm` are ground stations of the leg, equal for a point; `angle_deg` is
    between leg and line, 0 to 90, None where it means nothing. `feature` is the number of the
    feature in its layer. `lon` and `lat` are of the middle.
    """

    leg: str
    kind: FeatureKind
    how: How
    feature_class: str
    name: str
    owner: str
    start_mm: int
    end_mm: int
    angle_deg: float | None
    lon: float
    lat: float
    file: str
    feature: int

    @property
    def length_mm(self) -> int:
        """Ground length shared with the feature. [mm]"""
        return self.end_mm - self.start_mm

    @property
    def ask(self) -> str:
        """Who has to be asked: the owner, else the name, else what it is."""
        return self.owner or self.name or self.feature_class or self.kind


@dataclass(frozen=True, slots=True, kw_only=True)
class Crossing:
    """
    Something a leg crosses, declared in the geometry or found in a layer.

    `met` is what was found; for a declared one that a found one stands for, too.
    """

    leg: str
    name: str
    crosses: str
    ground_mm: int
    width_m: float | None
    lon: float
    lat: float
    is_declared: bool = True
    met: FoundCrossing | None = None


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
    before a track was thinned. `points` and `crossings` are in station order. `heights_from` says
    where heights are from, `smoothed_off_m` how much smoothing of a terrain took off the length.
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
    crossings: tuple[Crossing, ...] = ()
    steep: tuple[Steep, ...] = ()
    heights_from: tuple[Literal["geometry", "terrain"], ...] = ()
    smoothed_off_m: float = 0.0

    @property
    def length_mm(self) -> int:
        """Ground length of the leg. [mm]"""
        return int(self.ground_mm[-1])


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ground:
    """
    All nodes, legs and crossings of a run.

    `beside` is what legs touch, run along or go through without having to get past it.
    """

    nodes: tuple[Node, ...]
    legs: tuple[Leg, ...]
    crossings: tuple[Crossing, ...]
    beside: tuple[FoundCrossing, ...] = ()
    warnings: tuple[tuple[str, str], ...] = ()

    def node(self, node_id: str) -> Node:
        """Return the node with this id."""
        return next(node for node in self.nodes if node.id == node_id)
