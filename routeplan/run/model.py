"""What the planner declares: places, lines, areas, cables, circuits and practice of one run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from routeplan.run.optics import CircuitOrder, Interface, JointFigures, Panel, SectionFigures
from routeplan.run.practice import CableMake, JacketMark, LayerColumns, Practice
from routeplan.run.street_rules import LegOrder, StreetRules

__all__ = [
    "AREA_KINDS",
    "CROSSES",
    "PLACEMENTS",
    "PLACE_KINDS",
    "ROLES",
    "Area",
    "Floats",
    "JointFitness",
    "LayerSource",
    "Line",
    "Place",
    "PlaceKind",
    "Placement",
    "RasterSource",
    "Run",
    "Source",
    "StreetFile",
    "StreetFiles",
]

Floats: TypeAlias = NDArray[np.float64]

Placement = Literal["aerial", "duct", "buried", "surface", "indoor", "bridge", "water", "existing"]
PlaceKind = Literal[
    "site",
    "handhole",
    "maintenance_hole",
    "pole",
    "cabinet",
    "pedestal",
    "building",
    "crossing",
]
JointFitness = Literal["yes", "avoid", "no"]

PLACEMENTS: tuple[Placement, ...] = (
    "aerial",
    "duct",
    "buried",
    "surface",
    "indoor",
    "bridge",
    "water",
    "existing",
)
PLACE_KINDS: tuple[PlaceKind, ...] = (
    "site",
    "handhole",
    "maintenance_hole",
    "pole",
    "cabinet",
    "pedestal",
    "building",
    "crossing",
)
ROLES = ("studio", "transmitter", "venue", "compound", "position", "repeater")
CROSSES = ("road", "rail", "water", "power", "pipeline")
AREA_KINDS = ("avoid", "permit")


@dataclass(frozen=True, slots=True, kw_only=True)
class Source:
    """Where a declared thing stands: for messages and for writing back."""

    file: str
    layer: str | None = None
    feature: str | None = None
    key: str | None = None

    def __str__(self) -> str:
        """Return the source as a message names it: `file, layer "x", feature "y", key`."""
        parts = [self.file]
        if self.layer:
            parts.append(f'layer "{self.layer}"')
        if self.feature:
            parts.append(f"feature {self.feature}")
        if self.key:
            parts.append(self.key)
        return ", ".join(parts)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Line:
    """
    One drawn or imported line.

    `lonlat` is WGS 84 and what maps show. `datum_lonlat` holds the same vertices on the datum the
    file declares, with that datum's ellipsoid, and is what lengths are measured on; for a file in
    WGS 84 both are the same array. `heights_m` is None where the file gives no height, and holds
    NaN at a vertex that has none. `is_drawn`, where given, is False at vertices put in to keep a
    long straight line of a grid straight: they are nobody's pole. An unnamed line has the name "".
    """

    name: str
    lonlat: Floats
    datum_lonlat: Floats
    semi_major_m: float
    inverse_flattening: float
    heights_m: Floats | None
    placement: Placement | None
    leg: str | None = None
    cable: str | None = None
    existing_m: float | None = None
    existing_db: float | None = None
    is_track: bool = False
    is_drawn: NDArray[np.bool_] | None = None
    properties: Mapping[str, object] = field(default_factory=dict)
    source: Source


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """One declared point: a site, a reach point or a crossing."""

    name: str
    kind: PlaceKind
    role: str | None
    lon: float
    lat: float
    height_m: float | None
    joint: JointFitness
    joint_cost_factor: float = 1.0
    loop_m: float | None = None
    crosses: str | None = None
    width_m: float | None = None
    properties: Mapping[str, object] = field(default_factory=dict)
    source: Source


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Area:
    """One declared polygon: ground to avoid, or ground that takes a permit."""

    name: str
    kind: Literal["avoid", "permit"]
    rings: tuple[Floats, ...]
    properties: Mapping[str, object] = field(default_factory=dict)
    source: Source


@dataclass(frozen=True, slots=True, kw_only=True)
class RasterSource:
    """A raster of heights, or a folder of them: its name in the run file, and its digest."""

    file: str
    path: str
    digest: str


@dataclass(frozen=True, slots=True, kw_only=True)
class LayerSource:
    """A file of what may be crossed, what its columns are, and its digest."""

    file: str
    path: str
    layer: str | None
    columns: LayerColumns
    digest: str


@dataclass(frozen=True, slots=True, kw_only=True)
class StreetFile:
    """A file that finding ways takes: its name in the run file, and its digest."""

    file: str
    path: str
    digest: str


@dataclass(frozen=True, slots=True, kw_only=True)
class StreetFiles:
    """Where ways of legs are found: what the run file says, and the files it names."""

    rules: StreetRules
    streets: tuple[StreetFile, ...]
    existing: tuple[StreetFile, ...] = ()
    avoid: tuple[StreetFile, ...] = ()
    keep_to: tuple[StreetFile, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Run:
    """
    Everything the planner was told, and nothing it worked out.

    `given` holds the dotted keys the user set (`slack.entry_m`); every other value of `practice`
    and `cable` is a default and is listed as an assumption. `digest` is the SHA-256 of all input
    bytes. `legs` are those whose ways are to be found in `streets`; they become lines when the run
    is planned. `terrain` and `layers` are files that are opened when the ground is laid.
    `background` holds polylines that the map is drawn on and nothing else looks at. `warnings`
    are (where, message) pairs from reading.
    """

    title: str
    purpose: Literal["link", "venue"]
    units: Literal["metric", "us"]
    crs: str | None
    placement: Placement
    lines: tuple[Line, ...]
    places: tuple[Place, ...]
    areas: tuple[Area, ...]
    cable: CableMake
    cables: Mapping[str, CableMake]
    interfaces: Mapping[str, Interface]
    circuits: tuple[CircuitOrder, ...]
    practice: Practice
    given: frozenset[str]
    digest: str
    panels: tuple[Panel, ...] = ()
    joints: tuple[JointFigures, ...] = ()
    sections: tuple[SectionFigures, ...] = ()
    marks: tuple[JacketMark, ...] = ()
    legs: tuple[LegOrder, ...] = ()
    streets: StreetFiles | None = None
    terrain: tuple[RasterSource, ...] = ()
    layers: tuple[LayerSource, ...] = ()
    background: tuple[Floats, ...] = ()
    warnings: tuple[tuple[str, str], ...] = ()
