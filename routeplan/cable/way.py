"""What lies along one cable: stretches, crossings and every spot a joint or a loop could be at."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from routeplan.cable.crossed import ChainCrossing, crossing_zones
from routeplan.cable.model import Cable, Millimetres
from routeplan.cable.spots import Spot, spot_at, tie_key, weighed
from routeplan.geodesy import is_turned
from routeplan.ground.model import Leg, Node, Stretch
from routeplan.ground.points import position_at
from routeplan.run.model import Floats
from routeplan.run.practice import Practice
from routeplan.units import mm_from_m

__all__ = [
    "Passed",
    "Spot",
    "Way",
    "cable_way",
    "existing_name",
    "is_within",
    "leg_at",
    "positions_on",
]

_NO_ASSUMED = frozenset({"bridge", "water", "indoor", "existing"})
_NO_JOINT = frozenset({"bridge", "water", "existing"})
_KEPT_OFF = frozenset({"bridge", "water"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Passed:
    """A node that a cable passes uncut; `is_entered` where it can be entered at mid-span."""

    node: Node
    chain_mm: int
    is_entered: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Way:
    """
    One cable's chain: its stretches end to end, its crossings, its spots in chain order.

    `passed` are the nodes between its ends. `is_turned` says that the chain runs against the
    direction in which halves are rounded, so that a reversed run gets mirrored millimetres.
    """

    cable: Cable
    legs: tuple[tuple[Leg, bool, int], ...]
    stretches: tuple[Stretch, ...]
    crossings: tuple[ChainCrossing, ...]
    spots: tuple[Spot, ...]
    length_mm: int
    is_turned: bool
    passed: tuple[Passed, ...] = ()


def cable_way(
    cable: Cable,
    legs: Sequence[tuple[Leg, bool]],
    *,
    practice: Practice,
    nodes: Sequence[Node] = (),
    entered: frozenset[str] = frozenset(),
) -> Way:
    """
    Return the chain of a cable with declared and assumed spots.

    Parameters
    ----------
    cable
        The cable.
    legs
        Its legs in order, each with whether it is taken forward.
    practice
        House rules; `joints.assumed_spacing_m` spaces assumed spots.
    nodes
        The nodes it passes, one between each two legs; left out where they do not matter.
    entered
        Ids of those it can be entered at mid-span, where it is not cut then.
    """
    placed: list[tuple[Leg, bool, int]] = []
    offset = 0
    for leg, forward in legs:
        placed.append((leg, forward, offset))
        offset += leg.length_mm
    way = Way(
        cable=cable,
        legs=tuple(placed),
        stretches=_joined_stretches(placed),
        crossings=tuple(sorted(_crossings(placed), key=lambda c: (c.start_mm, c.end_mm, c.name))),
        spots=tuple(spot for leg in placed for spot in _declared_spots(leg)),
        length_mm=offset,
        is_turned=_is_turned(placed),
        passed=tuple(_passed(placed, nodes, entered)),
    )
    way = replace(way, spots=_merged(way.spots, list(_node_spots(way))))
    way = _unentered_on_existing(way)
    joints = practice.joints
    off_mm = mm_from_m(joints.keep_off_m or 0.0)
    way = replace(way, spots=_merged(way.spots, _assumed_poles(way)))
    way = replace(way, spots=tuple(_unfit_where_forbidden(way, off_mm)))
    spacing_mm = max(1, mm_from_m(joints.assumed_spacing_m))
    spots = _merged(way.spots, _assumed_spots(way, spacing_mm, off_mm))
    return replace(way, spots=weighed(spots, joints.cost_factor_by_kind))


def _is_turned(placed: Sequence[tuple[Leg, bool, int]]) -> bool:
    leg, forward, _ = placed[0]
    if len(placed) == 1:
        return leg.is_turned == forward
    return is_turned(np.concatenate([leg.lonlat[:: 1 if way else -1] for leg, way, _ in placed]))


def _chain(placed: tuple[Leg, bool, int], ground_mm: int) -> int:
    leg, forward, offset = placed
    return offset + (ground_mm if forward else leg.length_mm - ground_mm)


def _joined_stretches(placed: Sequence[tuple[Leg, bool, int]]) -> tuple[Stretch, ...]:
    stretches: list[Stretch] = []
    for item in placed:
        leg, forward, _ = item
        for stretch in leg.stretches if forward else reversed(leg.stretches):
            span = sorted((_chain(item, stretch.start_mm), _chain(item, stretch.end_mm)))
            last = stretches[-1] if stretches else None
            if last and last.placement == stretch.placement != "existing":
                stretches[-1] = replace(last, end_mm=span[1])
            else:
                stretches.append(replace(stretch, start_mm=span[0], end_mm=span[1]))
    return tuple(stretches)


def _crossings(placed: Sequence[tuple[Leg, bool, int]]) -> Iterator[ChainCrossing]:
    for item in placed:
        for crossing in item[0].crossings:
            at = _chain(item, crossing.ground_mm)
            half = round((crossing.width_m or 0.0) * 500)
            yield ChainCrossing(
                crosses=crossing.crosses,
                name=crossing.name,
                start_mm=at - half,
                end_mm=at + half,
            )


def _declared_spots(item: tuple[Leg, bool, int]) -> Iterator[Spot]:
    leg, forward, _ = item
    for point in leg.points if forward else reversed(leg.points):
        place = point.place
        if place.kind != "crossing":
            yield spot_at(place, _chain(item, point.ground_mm))


def _passed(
    placed: Sequence[tuple[Leg, bool, int]], nodes: Sequence[Node], entered: frozenset[str]
) -> Iterator[Passed]:
    for node, (_, _, offset) in zip(nodes, placed[1:], strict=False):
        yield Passed(node=node, chain_mm=offset, is_entered=node.id in entered)


def _node_spots(way: Way) -> Iterator[Spot]:
    """Yield the reach points that stand at nodes the cable passes."""
    for passed in way.passed:
        place = passed.node.place
        if place is not None and not passed.node.is_site:
            yield spot_at(place, passed.chain_mm)


def _unentered_on_existing(way: Way) -> Way:
    """Return the way with nothing entered inside somebody else's span, or at the joint to it."""
    spans = [(s.start_mm, s.end_mm) for s in way.stretches if s.placement == "existing"]
    passed = [
        replace(each, is_entered=False)
        if any(start <= each.chain_mm <= end for start, end in spans)
        else each
        for each in way.passed
    ]
    return replace(way, passed=tuple(passed))


def _unfit_where_forbidden(way: Way, off_mm: int) -> Iterator[Spot]:
    """
    Yield the spots; none on a bridge, in water, on an existing span or a crossing is fit.

    Nor is one where the cable is entered at mid-span: it passes that closure uncut.
    """
    at = [spot.chain_mm for spot in way.spots]
    within = is_within(way, at, _NO_JOINT, crossings=True)
    forbidden = [one or other for one, other in zip(within, _is_near(way, at, off_mm), strict=True)]
    entered = {passed.chain_mm for passed in way.passed if passed.is_entered}
    for spot, banned in zip(way.spots, forbidden, strict=True):
        is_unfit = banned or spot.chain_mm in entered
        yield replace(spot, fitness="no") if is_unfit and spot.fitness != "no" else spot


def _is_near(way: Way, chain_mm: Sequence[int], off_mm: int) -> list[bool]:
    """Tell which chain values lie nearer than a distance to a bridge, water or a crossing."""
    at = np.asarray(chain_mm, dtype=np.int64)
    near = np.zeros(len(at), dtype=bool)
    spans = [(s.start_mm, s.end_mm) for s in way.stretches if s.placement in _KEPT_OFF]
    for start, end in (*spans, *((c.start_mm, c.end_mm) for c in way.crossings)):
        near |= (start - off_mm < at) & (at < end + off_mm)
    flags: list[bool] = (near & (off_mm > 0)).tolist()
    return flags


def is_within(
    way: Way, chain_mm: Sequence[int], placements: frozenset[str], *, crossings: bool = False
) -> list[bool]:
    """
    Tell which chain values lie in stretches of some placements: in them, not on their bounds.

    Parameters
    ----------
    way
        The cable's way.
    chain_mm
        Chain values, shape (n,). [mm]
    placements
        The placements. A bound between two stretches of them counts as within.
    crossings
        Whether being on a crossing, its edges included, counts as well.
    """
    at = np.asarray(chain_mm, dtype=np.int64)
    within = np.zeros(len(at), dtype=bool)
    outside = np.zeros(len(at), dtype=bool)
    for stretch in way.stretches:
        touches = (stretch.start_mm <= at) & (at <= stretch.end_mm)
        (within if stretch.placement in placements else outside)[touches] = True
    within &= ~outside
    for start, end, _ in crossing_zones(way.crossings) if crossings else ():
        within |= (start <= at) & (at <= end)
    flags: list[bool] = within.tolist()
    return flags


def _merged(spots: Sequence[Spot], more: Sequence[Spot]) -> tuple[Spot, ...]:
    if not more:
        return tuple(spots)
    return tuple(sorted([*spots, *more], key=lambda spot: spot.chain_mm))


def _assumed_poles(way: Way) -> list[Spot]:
    """Return the vertices of every aerial stretch without poles as poles."""
    found: list[Spot] = []
    for stretch in way.stretches:
        inside = [s for s in way.spots if stretch.start_mm <= s.chain_mm <= stretch.end_mm]
        if stretch.placement != "aerial" or any(spot.kind == "pole" for spot in inside):
            continue
        taken = {spot.chain_mm for spot in inside} | {0, way.length_mm}
        vertices = _vertices_mm(way)
        within = (vertices >= stretch.start_mm) & (vertices <= stretch.end_mm)
        chains = [at for at in np.unique(vertices[within]).tolist() if at not in taken]
        found.extend(_assumed(way, chains, "pole"))
    return found


def _vertices_mm(way: Way) -> Millimetres:
    """Return the chain values of all vertices that somebody drew."""
    chains = []
    for leg, forward, offset in way.legs:
        own = leg.ground_mm if leg.is_drawn is None else leg.ground_mm[leg.is_drawn]
        chains.append(offset + (own if forward else leg.length_mm - own))
    return np.concatenate(chains)


def _assumed_spots(way: Way, spacing_mm: int, off_mm: int) -> list[Spot]:
    """Return spots that divide every gap longer than the spacing into the fewest equal parts."""
    fit = [0, *(spot.chain_mm for spot in way.spots if spot.fitness != "no"), way.length_mm]
    chains: list[int] = []
    for begin, end in pairwise(fit):
        parts = -(-(end - begin) // spacing_mm)
        chains.extend(_shared_out(begin, end, parts, is_turned=way.is_turned))
    banned = is_within(way, chains, _NO_ASSUMED, crossings=True)
    near = _is_near(way, chains, off_mm)
    allowed = [at for at, *is_out in zip(chains, banned, near, strict=True) if not any(is_out)]
    aerial = [s for s in way.stretches if s.placement == "aerial"]
    on_poles = [at for at in allowed if any(s.start_mm <= at <= s.end_mm for s in aerial)]
    return [
        *_assumed(way, sorted(set(allowed) - set(on_poles)), "assumed"),
        *_assumed(way, on_poles, "pole"),
    ]


def _shared_out(begin: int, end: int, parts: int, *, is_turned: bool) -> list[int]:
    """Return the inner bounds of equal parts, halves rounded the same way from either end."""
    gap = end - begin
    if is_turned:
        return [end - (2 * k * gap + parts) // (2 * parts) for k in range(parts - 1, 0, -1)]
    return [begin + (2 * k * gap + parts) // (2 * parts) for k in range(1, parts)]


def _assumed(way: Way, chains: Sequence[int], kind: str) -> list[Spot]:
    if not chains:
        return []
    lonlat, _ = positions_on(way, np.array(chains))
    label = "Assumed pole" if kind == "pole" else "Assumed place"
    return [
        Spot(
            chain_mm=at,
            kind=kind,
            name=f"{label} at {at / 1000:.0f} m",
            fitness="avoid" if kind == "pole" else "yes",
            cost_factor=1.0,
            loop_m=None,
            assumed=True,
            tie_key=tie_key(lon, lat, kind),
        )
        for at, (lon, lat) in zip(chains, np.round(lonlat, 7).tolist(), strict=True)
    ]


def existing_name(way: Way, stretch: Stretch) -> str:
    """Return what an existing span is called on budgets: its cable and where it begins."""
    return f"{way.cable.name}, existing span at {stretch.start_mm / 1000:.0f} m"


def leg_at(way: Way, chain_mm: int) -> tuple[Leg, int]:
    """Return the leg that a chain value lies on and the ground station there. [mm]"""
    for leg, forward, offset in way.legs:
        if chain_mm <= offset + leg.length_mm:
            along = chain_mm - offset
            return leg, along if forward else leg.length_mm - along
    leg, forward, _ = way.legs[-1]
    return leg, leg.length_mm if forward else 0


def positions_on(way: Way, chain_mm: Millimetres) -> tuple[Floats, Floats]:
    """
    Return longitude and latitude, shape (n, 2), and height, shape (n,), of chain values.

    Parameters
    ----------
    way
        The cable's way.
    chain_mm
        Chain values, shape (n,). [mm]
    """
    lonlat = np.empty((len(chain_mm), 2))
    heights = np.empty(len(chain_mm))
    for leg, forward, offset in way.legs:
        on = (chain_mm >= offset) & (chain_mm <= offset + leg.length_mm)
        along = chain_mm[on] - offset
        lonlat[on], heights[on] = position_at(leg, along if forward else leg.length_mm - along)
    return lonlat, heights
