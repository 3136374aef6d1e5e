"""What finding a way works on and gives back: the network, ways, trees, places they share."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "CROSSING_KINDS",
    "Bottleneck",
    "Exposure",
    "Flags",
    "Floats",
    "Network",
    "OtherWays",
    "Part",
    "ReachPoint",
    "SeparateWays",
    "Tree",
    "Way",
    "WayCrossing",
    "Whole",
]

Floats: TypeAlias = NDArray[np.float64]
Whole: TypeAlias = NDArray[np.integer]
Flags: TypeAlias = NDArray[np.bool_]

CROSSING_KINDS = ("rail", "water", "motorway")
"""What streets are known to cross, in the order of `Network.crossing_kind`."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Network:
    """
    Streets and routes as arrays: n nodes, m undirected edges, parallel edges kept apart.

    Edge e runs from `edge_start[e]` to `edge_end[e]` along
    `shape_lonlat[shape_first[e] : shape_first[e + 1]]` and is `length_m[e]` long on the WGS 84
    ellipsoid; the longitude of a shape runs on over the antimeridian. Row v of the adjacency,
    `row_first[v] : row_first[v + 1]`, holds for every edge end at node v the node at the other end
    (`row_node`) and the edge (`row_edge`). `part[v]` numbers what node v hangs together with. Text
    columns are numbers into their list of words; the placement of an ordinary street is the word
    "". A crossing weighs a half where it lies on an end of its edge, so that both halves make one.
    `notes` are (where, message) pairs about what the source holds.
    """

    node_lonlat: Floats
    edge_start: Whole
    edge_end: Whole
    length_m: Floats
    shape_first: Whole
    shape_lonlat: Floats
    road_class: Whole
    class_words: tuple[str, ...]
    name: Whole
    name_words: tuple[str, ...]
    placement: Whole
    placement_words: tuple[str, ...]
    is_bridge: Flags
    is_tunnel: Flags
    crossing_edge: Whole
    crossing_kind: Whole
    crossing_m: Floats
    crossing_weight: Floats
    crossing_lonlat: Floats
    place_kind: Whole
    place_words: tuple[str, ...]
    place_lonlat: Floats
    row_first: Whole
    row_node: Whole
    row_edge: Whole
    part: Whole
    notes: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Part:
    """
    A piece of a way along one edge, in the way's direction; `edge` is -1 off the streets.

    `from_m` and `to_m` count along the edge; where the way runs against it, `from_m` is larger.
    """

    edge: int
    from_m: float
    to_m: float
    name: str
    road_class: str
    placement: str
    is_bridge: bool
    is_tunnel: bool
    lonlat: Floats
    length_m: float
    cost: float


@dataclass(frozen=True, slots=True, kw_only=True)
class WayCrossing:
    """A rail line, water or motorway that a way crosses, and whether on a bridge or in a tunnel."""

    kind: str
    lon: float
    lat: float
    along_m: float
    is_bridge: bool
    is_tunnel: bool


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Way:
    """
    A way through its sites in order: its parts end to end, its one line, its length and cost.

    `via_m` holds how far along each site lies, the first at 0; `junctions_m` the same for every
    junction of three streets or more that it passes.
    """

    parts: tuple[Part, ...]
    lonlat: Floats
    length_m: float
    off_street_m: float
    cost: float
    crossings: tuple[WayCrossing, ...]
    via_m: tuple[float, ...]
    junctions_m: tuple[float, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OtherWays:
    """
    The best way first, then other ways by cost.

    `overlap_ratios[k]` is the largest share of way k that runs within `near_m` of one earlier way
    (0 for the first). `wanted_count` may be more than were found.
    """

    ways: tuple[Way, ...]
    overlap_ratios: tuple[float, ...]
    overlap_max_ratio: float
    near_m: float
    wanted_count: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Bottleneck:
    """The street or junction that every way between two sites has to take."""

    kind: Literal["street", "junction"]
    name: str
    road_class: str
    is_bridge: bool
    is_tunnel: bool
    lon: float
    lat: float
    length_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Exposure:
    """
    A stretch of the first way that the second shares, crosses or passes near.

    `kind` is "shared" on a common street or walk, "junction" where they meet at a point, "near"
    where they come within the chosen distance. Positions are along the first way.
    """

    kind: Literal["shared", "junction", "near"]
    from_m: float
    to_m: float
    length_m: float
    nearest_m: float
    name: str
    is_bridge: bool
    lon: float
    lat: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SeparateWays:
    """
    Two ways between two sites, the cheaper one first, and everywhere one event could cut both.

    `apart` says what they do not share, `is_exact` whether no pair of less total cost exists under
    that rule; `rule` says it in words. `bottlenecks` is not empty where they had to share a street.
    """

    main: Way
    standby: Way
    cost: float
    apart: Literal["streets", "junctions"]
    is_exact: bool
    rule: str
    distance_m: float
    exposures: tuple[Exposure, ...]
    bottlenecks: tuple[Bottleneck, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Tree:
    """
    Ways that join many sites at once, each between sites or branch points.

    `ends[k]` are the two ends of branch k: a site's number, or -1 - b for branch point b.
    `guarantee_ratio` bounds cost / least possible cost; 1 is exact.
    """

    branches: tuple[Way, ...]
    ends: tuple[tuple[int, int], ...]
    branch_lonlat: Floats
    length_m: float
    cost: float
    is_exact: bool
    guarantee_ratio: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ReachPoint:
    """
    A place on a way where the cable can be got at.

    `basis` is "mapped" for a pole or manhole of the extract, "junction" or "spacing" for one that
    is put there by rule; all of them are assumptions until somebody has looked.
    """

    kind: str
    lon: float
    lat: float
    along_m: float
    basis: Literal["mapped", "junction", "spacing"]
    placement: str
