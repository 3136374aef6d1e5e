"""Cables put together: sections, joints and reels numbered in run order, and what they cost."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal, TypeAlias

import numpy as np

from routeplan.cable.closures import StraightJoint, shared_closures
from routeplan.cable.layout import LaidCable
from routeplan.cable.model import (
    Cable,
    CableEnd,
    Cut,
    FibreUse,
    Joint,
    Layout,
    Mark,
    Proof,
    Reel,
    Section,
)
from routeplan.cable.reel_models import BoughtSection
from routeplan.cable.reels import one_joint_fewer
from routeplan.cable.schedule import joint_splice_count
from routeplan.cable.spans import LaidSpan, closure_cents, joint_cents
from routeplan.cable.spots import Spot, kind_factor
from routeplan.cable.way import leg_at, positions_on
from routeplan.ground.model import Ground, Node
from routeplan.run.model import Run
from routeplan.units import cents_from_amount

__all__ = ["fewer_joints", "put_together"]

Side: TypeAlias = Literal["start", "end"]


@dataclass(slots=True)
class _Tally:
    """What has been numbered so far."""

    sections: list[Section] = field(default_factory=list)
    reels: list[Reel] = field(default_factory=list)
    joints: dict[str, Joint] = field(default_factory=dict)
    node_joints: dict[str, str] = field(default_factory=dict)
    ends: dict[str, list[CableEnd]] = field(default_factory=dict)
    entered: dict[str, list[Mark]] = field(default_factory=dict)
    bare_cents: dict[str, int] = field(default_factory=dict)  # joints at nodes, without splices
    straight: dict[str, StraightJoint] = field(default_factory=dict)  # by joint


@dataclass(frozen=True, slots=True, kw_only=True)
class _Stop:
    """Where a section ends: the site or joint there; `joint` is None at a site."""

    name: str
    joint: str | None = None


def put_together(
    run: Run, ground: Ground, laid: Sequence[LaidCable], uses: Sequence[FibreUse] = ()
) -> Layout:
    """
    Put cables together: sections, joints and reels numbered in run order, and the whole cost.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    laid
        Its cables, laid out.
    uses
        Fibres of its circuits: a cable that passes a site is opened there for those that get in
        or out.
    """
    tally = _Tally()
    opened = {(use.cable, at) for use in uses for at in use.span_mm or ()}
    for cable in laid:
        stops = _stops_along(cable, ground, tally, run=run)
        _enter(cable, tally, opened, run=run)
        for span in cable.spans:
            for bought in span.best.sections:
                _add_section(cable, span, bought, stops=stops, tally=tally)
    cables = tuple(cable.way.cable for cable in laid)
    joints = _counted(
        [_with_ends(joint, tally) for joint in tally.joints.values()], cables, tally, uses, run=run
    )
    joints = shared_closures(joints, tally.straight, run.practice.joints)
    cost = sum(reel.cost_cents for reel in tally.reels) + sum(j.cost_cents for j in joints)
    pairs = zip(tally.reels, tally.sections, strict=True)
    return Layout(
        cables=cables,
        rulers=tuple(cable.rulers for cable in laid),
        sections=tuple(tally.sections),
        joints=joints,
        reels=tuple(tally.reels),
        cuts=tuple(Cut(reel=reel.id, offset_mm=0, section=own.id) for reel, own in pairs),
        proof=_proof(laid, cost),
    )


def _stops_along(cable: LaidCable, ground: Ground, tally: _Tally, *, run: Run) -> dict[int, _Stop]:
    """Return the site or joint at every chain value where a section ends, making the joints."""
    stops: dict[int, _Stop] = {}
    way = cable.way
    chosen = {
        span.problem.chain_mm[place]: span.spots[place - 1]
        for span in cable.spans
        for place in span.best.places[1:-1]
    }
    ends = {0: way.cable.start, way.length_mm: way.cable.end}
    for at in sorted({*ends, *cable.parted}):
        if at in ends:
            stops[at] = _stop_at_node(cable, at, ground.node(ends[at]), tally, run=run)
        else:
            joint = _joint_on(cable, f"J{len(tally.joints) + 1}", at, spot=chosen.get(at), run=run)
            tally.joints[joint.id] = joint
            if at in chosen:
                tally.straight[joint.id] = _straight(cable, joint, chosen[at], run=run)
            stops[at] = _Stop(name=joint.id, joint=joint.id)
    return stops


def _straight(cable: LaidCable, joint: Joint, spot: Spot, *, run: Run) -> StraightJoint:
    """Return what tells whether a joint may share a closure: a reach point, or a spot of a leg."""
    place, make = spot.place, cable.way.cable.make
    return StraightJoint(
        place=(place.name, place.lon, place.lat) if place else (joint.leg, joint.ground_mm),
        splice_count=make.fibre_count,
        splice_cents=cents_from_amount(run.practice.costs.splice_each * make.fibre_count),
    )


def _stop_at_node(cable: LaidCable, chain_mm: int, node: Node, tally: _Tally, *, run: Run) -> _Stop:
    if node.is_site:
        return _Stop(name=node.name)
    joint_id = _node_joint(cable, chain_mm, node, tally, run=run)
    return _Stop(name=joint_id, joint=joint_id)


def _node_joint(cable: LaidCable, chain_mm: int, node: Node, tally: _Tally, *, run: Run) -> str:
    """Return the joint at a node, made when the first cable comes there and marked on it."""
    if node.id in tally.node_joints:
        return tally.node_joints[node.id]
    joint_id = f"J{len(tally.joints) + 1}"
    leg, ground_mm = leg_at(cable.way, chain_mm)
    place = node.place
    fitness, factor = (place.joint, place.joint_cost_factor) if place else ("yes", 1.0)
    factor *= kind_factor(
        run.practice.joints.cost_factor_by_kind, place.kind if place else "assumed"
    )
    costs = run.practice.costs
    tally.node_joints[node.id] = joint_id
    tally.bare_cents[joint_id] = closure_cents(fitness, factor, costs)
    tally.joints[joint_id] = Joint(
        id=joint_id,
        node=node.id,
        mark=Mark(cable=cable.way.cable.id, chain_mm=chain_mm),
        leg=leg.id,
        ground_mm=ground_mm,
        lon=node.lon,
        lat=node.lat,
        reach_name=place.name if place else node.name,
        kind="splice",
        assumed=place is None and not node.is_site,
        ends=(),
        cost_cents=tally.bare_cents[joint_id],
    )
    return joint_id


def _joint_on(
    cable: LaidCable, joint_id: str, chain_mm: int, *, spot: Spot | None, run: Run
) -> Joint:
    """Return the joint at a chosen spot, or where the cable meets an existing span."""
    way = cable.way
    leg, ground_mm = leg_at(way, chain_mm)
    lonlat, _ = positions_on(way, np.array([chain_mm]))
    at = spot or next((s for s in way.spots if s.chain_mm == chain_mm), None)
    # Where fibre of ours meets somebody else's there is no choice, and no avoiding.
    fitness = spot.fitness if spot else "yes"
    factor = at.cost_factor if at else 1.0
    return Joint(
        id=joint_id,
        node=None,
        mark=Mark(cable=way.cable.id, chain_mm=chain_mm),
        leg=leg.id,
        ground_mm=ground_mm,
        lon=float(lonlat[0, 0]),
        lat=float(lonlat[0, 1]),
        reach_name=at.name if at else "Meets existing fibre",
        kind="splice",
        assumed=at.assumed if at else True,
        ends=(),
        cost_cents=joint_cents(fitness, factor, way.cable, run.practice.costs),
    )


def _add_section(
    cable: LaidCable,
    span: LaidSpan,
    bought: BoughtSection,
    *,
    stops: Mapping[int, _Stop],
    tally: _Tally,
) -> None:
    """Add a section, the reel it is cut from and its two ends."""
    start_mm, end_mm = (span.problem.chain_mm[place] for place in (bought.start, bought.end))
    number = len(tally.sections) + 1
    start, end = _reading(cable, start_mm), _reading(cable, end_mm)
    section = Section(
        id=f"S{number}",
        cable=cable.way.cable.id,
        start=stops[start_mm].name,
        end=stops[end_mm].name,
        start_chain_mm=start_mm,
        end_chain_mm=end_mm,
        start_sheath_mm=start[0],
        end_sheath_mm=end[0],
        start_glass_mm=start[1],
        end_glass_mm=end[1],
        needed_mm=bought.needed_mm,
    )
    if section.sheath_mm != bought.sheath_mm:
        raise AssertionError(f"section {section.id} differs from its search")
    tally.sections.append(section)
    tally.reels.append(
        Reel(
            id=f"R{number}",
            length_mm=bought.reel_mm,
            source=bought.way,
            cost_cents=bought.price_cents,
        )
    )
    sides: tuple[tuple[int, Side], ...] = ((start_mm, "start"), (end_mm, "end"))
    for at, side in sides:
        joint_id = stops[at].joint
        if joint_id is not None:
            tally.ends.setdefault(joint_id, []).append(CableEnd(section=section.id, side=side))


def _reading(cable: LaidCable, chain_mm: int) -> tuple[int, int]:
    """Return sheath and glass at a section's end: the splice, or the outermost at a cable's end."""
    rulers = cable.rulers
    knots = np.flatnonzero(rulers.chain_mm == chain_mm)
    if chain_mm in cable.parted:
        at = knots[1]  # arriving, at the splice, leaving
    else:
        at = knots[0] if chain_mm == 0 else knots[-1]
    return int(rulers.sheath_mm[at]), int(rulers.glass_mm[at])


def _enter(
    cable: LaidCable, tally: _Tally, opened: Collection[tuple[str, int]], *, run: Run
) -> None:
    """Note where a cable is opened at mid-span: at branches always, at sites if light gets out."""
    way = cable.way
    for passed in way.passed:
        node, at = passed.node, passed.chain_mm
        is_used = (way.cable.id, at) in opened
        if passed.is_entered and (is_used or not node.is_site):
            joint_id = _node_joint(cable, at, node, tally, run=run)
            mark = Mark(cable=way.cable.id, chain_mm=at)
            tally.entered.setdefault(joint_id, []).append(mark)


def _with_ends(joint: Joint, tally: _Tally) -> Joint:
    # The arriving end first: what comes in, then what goes on.
    ordered = sorted(tally.ends.get(joint.id, ()), key=lambda end: end.side == "start")
    opened = [
        (section.id, mark.chain_mm)
        for mark in tally.entered.get(joint.id, ())
        for section in tally.sections
        if section.cable == mark.cable
        and section.start_chain_mm < mark.chain_mm < section.end_chain_mm
    ]
    return replace(
        joint,
        ends=tuple(ordered),
        opened=tuple(name for name, _ in opened),
        opened_mm=tuple(at for _, at in opened),
    )


def _counted(
    joints: Sequence[Joint],
    cables: Sequence[Cable],
    tally: _Tally,
    uses: Sequence[FibreUse],
    *,
    run: Run,
) -> tuple[Joint, ...]:
    """Return the joints with the cost of those at nodes: of cables that meet not all is spliced."""
    at_nodes = [joint for joint in joints if joint.node is not None]
    counts = joint_splice_count(at_nodes, tally.sections, cables, uses) if at_nodes else {}
    each = cents_from_amount(run.practice.costs.splice_each)
    return tuple(
        replace(joint, cost_cents=tally.bare_cents[joint.id] + counts[joint.id] * each)
        if joint.id in counts
        else joint
        for joint in joints
    )


def _proof(laid: Sequence[LaidCable], cost_cents: int) -> Proof:
    spans = [span for cable in laid for span in cable.spans]
    found = sum(span.best.cost_cents for span in spans)
    bound = sum(span.best.lower_bound_cents for span in spans)
    return Proof(
        optimal=all(span.best.optimal for span in spans),
        cost_cents=cost_cents,
        lower_bound_cents=cost_cents - found + bound,
        stopped_by=", ".join(sorted({s.best.stopped_by for s in spans} - {""})),
    )


def fewer_joints(laid: Sequence[LaidCable], layout: Layout) -> tuple[int, int] | None:
    """
    Return joint count and cost of the cheapest layout with one joint fewer, or None.

    Parameters
    ----------
    laid
        The cables as laid out.
    layout
        The layout put together from them.

    Returns
    -------
    fewer_joints
        Joint count and cost [cents], the joint taken from the span where that costs least. None
        as well where cables share closures: what a joint fewer saves is not known then.
    """
    if any(joint.closure for joint in layout.joints):
        return None
    found = []
    for cable in laid:
        for span in cable.spans:
            other = one_joint_fewer(span.problem, span.best)
            if other is not None:
                found.append(other.cost_cents - span.best.cost_cents)
    if not found:
        return None
    return len(layout.joints) - 1, layout.proof.cost_cents + min(found)
