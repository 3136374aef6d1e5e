"""Cables laid out: where every joint sits, which reel every section is cut from, at what cost."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from routeplan.cable.model import (
    Cable,
    CableEnd,
    Cut,
    Joint,
    Layout,
    Mark,
    Proof,
    Reel,
    Rulers,
    Section,
)
from routeplan.cable.reel_models import Buying, PlacementLimit, SpanLayout, SpanProblem
from routeplan.cable.reels import cheapest_layout, one_joint_fewer
from routeplan.cable.relax import infeasible_problem, smallest_relaxation
from routeplan.cable.rulers import BareRuler, bare_ruler, glass_from_sheath, readings, ruled
from routeplan.cable.slack import Step, slack_steps
from routeplan.cable.way import Spot, Way, cable_way, leg_at, positions_on
from routeplan.errors import InfeasibleError, Problem
from routeplan.ground.model import Ground, Leg, Node
from routeplan.memo import Memo, remembered
from routeplan.run.model import Run
from routeplan.run.practice import Costs, Practice
from routeplan.units import cents_from_amount, exact_from_number, mm_from_m

__all__ = ["LaidCable", "LaidSpan", "fewer_joints", "lay_cables", "put_together"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LaidSpan:
    """New cable between two fixed ends: its candidate spots, the problem and the best layout."""

    spots: tuple[Spot, ...]
    start_mm: int
    end_mm: int
    problem: SpanProblem
    best: SpanLayout


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LaidCable:
    """One cable laid out by itself."""

    way: Way
    steps: tuple[Step, ...]
    bare: BareRuler
    spans: tuple[LaidSpan, ...]
    parted: Mapping[int, tuple[int, int]]
    rulers: Rulers
    warnings: tuple[tuple[str, str], ...]


def lay_cables(run: Run, ground: Ground, *, memo: Memo | None = None) -> tuple[LaidCable, ...]:
    """
    Return every cable of a run laid out at least cost, each by itself.

    Each leg is a cable of its own. Exact: see `routeplan.cable.reels`.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    memo
        Results of earlier calls, to lay only what changed.

    Raises
    ------
    InfeasibleError
        If a cable has no layout within its limits; names the stretch and the smallest relaxation.
    """
    laid: list[LaidCable] = []
    problems: list[Problem] = []
    for leg in ground.legs:
        ends = (ground.node(leg.start), ground.node(leg.end))
        try:
            inputs = ("cable", run.cable, run.cables, run.practice, leg, ends)
            laid.append(remembered(memo, inputs, partial(_lay, run, leg, ends)))
        except InfeasibleError as error:
            problems.extend(error.problems)
    if problems:
        raise InfeasibleError(problems)
    return tuple(laid)


def _cable_of(run: Run, leg: Leg) -> Cable:
    """Return the leg's cable, of the named make that claims leg or line, else the default."""
    claimed = [
        name for name, make in run.cables.items() if leg.name in make.legs or leg.cable == name
    ]
    return Cable(
        id=f"C{leg.id[1:]}",
        name=claimed[0] if claimed else leg.cable or leg.name,
        legs=((leg.id, True),),
        make=run.cables[claimed[0]] if claimed else run.cable,
        start=leg.start,
        end=leg.end,
    )


def _lay(run: Run, leg: Leg, ends: tuple[Node, Node]) -> LaidCable:
    practice = run.practice
    way = cable_way(_cable_of(run, leg), [(leg, True)], practice=practice)
    steps, warnings = slack_steps(way, slack=practice.slack)
    end_mm = (_end_mm(ends[0], practice), _end_mm(ends[1], practice))
    bare = bare_ruler(way, steps, slack=practice.slack, end_mm=end_mm)
    spans = tuple(_laid_spans(way, bare, practice))
    parted = _parted(way, bare, spans, practice)
    rulers = ruled(way, bare, parted, glass_ratio=way.cable.make.glass_over_sheath_ratio)
    return LaidCable(
        way=way,
        steps=steps,
        bare=bare,
        spans=spans,
        parted=parted,
        rulers=rulers,
        warnings=warnings,
    )


def _end_mm(node: Node, practice: Practice) -> int:
    if node.is_site:
        return mm_from_m(practice.slack.entry_m)
    return _tail_mm(node.place.kind if node.place else "", practice)


def _tail_mm(kind: str, practice: Practice) -> int:
    slack = practice.slack
    return mm_from_m(slack.pole_tail_m if kind == "pole" else slack.joint_tail_m)


def _span_bounds(way: Way) -> list[tuple[int, int]]:
    """Return the chain bounds of every run of new cable between existing spans."""
    bounds: list[tuple[int, int]] = []
    for stretch in way.stretches:
        if stretch.placement == "existing":
            continue
        if bounds and bounds[-1][1] == stretch.start_mm:
            bounds[-1] = (bounds[-1][0], stretch.end_mm)
        else:
            bounds.append((stretch.start_mm, stretch.end_mm))
    return bounds


def _laid_spans(way: Way, bare: BareRuler, practice: Practice) -> Iterator[LaidSpan]:
    bounds = _span_bounds(way)
    fixed = _fixed_joints(way, bounds)
    most = practice.joints.max_count
    left = None if most is None else most - len(fixed)
    for start, end in bounds:
        spots = tuple(s for s in way.spots if start < s.chain_mm < end and s.fitness != "no")
        problem = _problem(way, bare, spots, bounds=(start, end), practice=practice, most=left)
        best = cheapest_layout(problem)
        if best is None:
            raise InfeasibleError(_infeasible(way, spots, problem))
        if left is not None:
            left -= best.joint_count
        yield LaidSpan(spots=spots, start_mm=start, end_mm=end, problem=problem, best=best)


def _fixed_joints(way: Way, bounds: Sequence[tuple[int, int]]) -> list[int]:
    """Return the chain values where new cable meets an existing span."""
    return [at for span in bounds for at in span if 0 < at < way.length_mm]


def _infeasible(way: Way, spots: Sequence[Spot], problem: SpanProblem) -> Problem:
    relaxation = smallest_relaxation(problem)
    if relaxation is None:
        raise AssertionError(f"cable {way.cable.name}: no layout found where there is one")
    return infeasible_problem(
        relaxation,
        where=f'cable "{way.cable.name}"',
        names=["its start", *(spot.name for spot in spots), "its end"],
        chain_m=[at / 1000 for at in problem.chain_mm],
    )


def _problem(
    way: Way,
    bare: BareRuler,
    spots: Sequence[Spot],
    *,
    bounds: tuple[int, int],
    practice: Practice,
    most: int | None,
) -> SpanProblem:
    start, end = bounds
    inner = np.array([spot.chain_mm for spot in spots], dtype=np.int64)
    knot = np.searchsorted(bare.chain_mm, inner)
    tails = {kind: _tail_mm(kind, practice) for kind in ("pole", "")}
    tail = np.array([tails["pole" if s.kind == "pole" else ""] for s in spots], dtype=np.int64)
    at = bare.before_mm[knot] + bare.half_mm[knot]
    first, last = np.searchsorted(bare.chain_mm, [start, end]).tolist()
    leave = int(bare.before_mm[first]) - (_bound_tail(way, start, practice))
    arrive = int(bare.before_mm[last] + bare.step_mm[last]) + _bound_tail(way, end, practice)
    costs = practice.costs
    return SpanProblem(
        chain_mm=(start, *inner.tolist(), end),
        arrive_mm=(leave, *(at + tail).tolist(), arrive),
        leave_mm=(leave, *(at - tail).tolist(), arrive),
        joint_cost_cents=(
            0,
            *(_joint_cents(s.fitness, s.cost_factor, way.cable, costs) for s in spots),
            0,
        ),
        assumed=(False, *(s.assumed for s in spots), False),
        tie_key=(0, *(s.tie_key for s in spots), 0),
        ordering_ratio=exact_from_number(practice.slack.ordering_ratio),
        buying=_buying(practice),
        limits=_limits(way, practice),
        joints_most=most,
    )


def _bound_tail(way: Way, chain_mm: int, practice: Practice) -> int:
    """Return the tail where new cable meets an existing span; a cable's own ends have theirs."""
    if chain_mm in (0, way.length_mm):
        return 0
    kinds = {spot.kind for spot in way.spots if spot.chain_mm == chain_mm}
    return _tail_mm("pole" if "pole" in kinds else "", practice)


def _joint_cents(fitness: str, factor: float, cable: Cable, costs: Costs) -> int:
    """Return what a straight joint costs: closure and visit, and a splice for every fibre."""
    weight = factor * (costs.avoid_factor if fitness == "avoid" else 1.0)
    return cents_from_amount(costs.joint_each * weight) + cents_from_amount(
        costs.splice_each * cable.make.fibre_count
    )


def _buying(practice: Practice) -> Buying:
    reels, costs = practice.reels, practice.costs
    by_length = "to-length" in reels.buy
    return Buying(
        put_ups_mm=tuple(map(mm_from_m, reels.put_ups_m)) if "put-ups" in reels.buy else (),
        made_max_mm=mm_from_m(reels.max_m) if by_length else 0,
        round_up_mm=max(1, mm_from_m(reels.round_up_m)),
        cable_cents_per_m=100 * exact_from_number(costs.cable_per_m),
        reel_each_cents=cents_from_amount(costs.reel_each),
    )


def _limits(way: Way, practice: Practice) -> tuple[PlacementLimit, ...]:
    return tuple(
        PlacementLimit(
            placement=placement,
            most_mm=mm_from_m(most_m),
            intervals_mm=tuple(
                (s.start_mm, s.end_mm) for s in way.stretches if s.placement == placement
            ),
        )
        for placement, most_m in practice.joints.max_section_m.items()
        if any(s.placement == placement for s in way.stretches)
    )


def _parted(
    way: Way, bare: BareRuler, spans: Sequence[LaidSpan], practice: Practice
) -> dict[int, tuple[int, int]]:
    """Return for every joint's chain value the cable stored before and after its splice."""
    parted: dict[int, tuple[int, int]] = {}
    for span in spans:
        for at in (span.start_mm, span.end_mm):
            if 0 < at < way.length_mm:
                stored = _stored_at(bare, at)[0] + _bound_tail(way, at, practice)
                parted[at] = (0, stored) if at == span.start_mm else (stored, 0)
        for place in span.best.places[1:-1]:
            spot = span.spots[place - 1]
            step, half = _stored_at(bare, spot.chain_mm)
            tail = _tail_mm(spot.kind, practice)
            parted[spot.chain_mm] = (half + tail, step - half + tail)
    return parted


def _stored_at(bare: BareRuler, chain_mm: int) -> tuple[int, int]:
    knot = int(np.searchsorted(bare.chain_mm, chain_mm))
    return int(bare.step_mm[knot]), int(bare.half_mm[knot])


def put_together(run: Run, ground: Ground, laid: Sequence[LaidCable]) -> Layout:
    """
    Return the layout: sections, joints and reels numbered in run order, the cost added up.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    laid
        Its cables, laid out.
    """
    sections: list[Section] = []
    joints: dict[str, Joint] = {}
    reels: list[Reel] = []
    cuts: list[Cut] = []
    node_joints: dict[str, str] = {}
    ends: dict[str, list[CableEnd]] = {}
    for cable in laid:
        names = _names_along(cable, ground, joints, node_joints, run=run)
        for span in cable.spans:
            for bought in span.best.sections:
                number = len(sections) + 1
                start, end = (_place_chain(span, at) for at in (bought.start, bought.end))
                section = _section(
                    cable,
                    number,
                    chains=(start, end),
                    names=(names[start], names[end]),
                    needed_mm=bought.needed_mm,
                )
                if section.sheath_mm != bought.sheath_mm:
                    raise AssertionError(f"section {section.id} differs from its search")
                sections.append(section)
                reels.append(
                    Reel(
                        id=f"R{number}",
                        length_mm=bought.reel_mm,
                        source=bought.way,
                        cost_cents=bought.price_cents,
                    )
                )
                cuts.append(Cut(reel=f"R{number}", offset_mm=0, section=section.id))
                ends.setdefault(section.start, []).append(_end(section, "start"))
                ends.setdefault(section.end, []).append(_end(section, "end"))
    placed = [_with_ends(joint, ends.get(joint.id, [])) for joint in joints.values()]
    cost = sum(reel.cost_cents for reel in reels) + sum(joint.cost_cents for joint in placed)
    return Layout(
        cables=tuple(cable.way.cable for cable in laid),
        rulers=tuple(cable.rulers for cable in laid),
        sections=tuple(sections),
        joints=tuple(placed),
        reels=tuple(reels),
        cuts=tuple(cuts),
        proof=_proof(laid, cost),
    )


def _end(section: Section, side: str) -> CableEnd:
    return CableEnd(section=section.id, side="start" if side == "start" else "end")


def _with_ends(joint: Joint, ends: Sequence[CableEnd]) -> Joint:
    # The arriving end first: what comes in, then what goes on.
    ordered = sorted(ends, key=lambda end: end.side == "start")
    return replace(joint, ends=tuple(ordered))


def _place_chain(span: LaidSpan, place: int) -> int:
    return span.problem.chain_mm[place]


def _names_along(
    cable: LaidCable,
    ground: Ground,
    joints: dict[str, Joint],
    node_joints: dict[str, str],
    *,
    run: Run,
) -> dict[int, str]:
    """Return the site or joint at every chain value where a section ends, making the joints."""
    names: dict[int, str] = {}
    way = cable.way
    fixed = {at for at in cable.parted if any(at in (s.start_mm, s.end_mm) for s in cable.spans)}
    spots = {
        span.problem.chain_mm[p]: span.spots[p - 1]
        for span in cable.spans
        for p in span.best.places[1:-1]
    }
    for at in sorted({0, way.length_mm, *cable.parted}):
        node_id = way.cable.start if at == 0 else way.cable.end if at == way.length_mm else None
        if node_id is not None:
            names[at] = _node_end(cable, at, ground.node(node_id), joints, node_joints, run=run)
            continue
        joint_id = f"J{len(joints) + 1}"
        joints[joint_id] = _joint_on(
            cable, joint_id, at, spot=None if at in fixed else spots[at], run=run
        )
        names[at] = joint_id
    return names


def _node_end(
    cable: LaidCable,
    chain_mm: int,
    node: Node,
    joints: dict[str, Joint],
    node_joints: dict[str, str],
    *,
    run: Run,
) -> str:
    if node.is_site:
        return node.name
    if node.id not in node_joints:
        joint_id = f"J{len(joints) + 1}"
        node_joints[node.id] = joint_id
        leg, ground_mm = leg_at(cable.way, chain_mm)
        place = node.place
        fitness = place.joint if place else "yes"
        factor = place.joint_cost_factor if place else 1.0
        joints[joint_id] = Joint(
            id=joint_id,
            node=node.id,
            mark=Mark(cable=cable.way.cable.id, chain_mm=chain_mm),
            leg=leg.id,
            ground_mm=ground_mm,
            lon=node.lon,
            lat=node.lat,
            reach_name=place.name if place else node.name,
            kind="splice",
            assumed=place is None,
            ends=(),
            cost_cents=_joint_cents(fitness, factor, cable.way.cable, run.practice.costs),
        )
    return node_joints[node.id]


def _joint_on(
    cable: LaidCable, joint_id: str, chain_mm: int, *, spot: Spot | None, run: Run
) -> Joint:
    way = cable.way
    leg, ground_mm = leg_at(way, chain_mm)
    lonlat, _ = positions_on(way, np.array([chain_mm]))
    at = spot or next((s for s in way.spots if s.chain_mm == chain_mm), None)
    fitness = at.fitness if spot and at else "yes"
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
        cost_cents=_joint_cents(
            fitness, at.cost_factor if at else 1.0, way.cable, run.practice.costs
        ),
    )


def _section(
    cable: LaidCable,
    number: int,
    *,
    chains: tuple[int, int],
    names: tuple[str, str],
    needed_mm: int,
) -> Section:
    """Return a section with its readings; at a joint it begins or ends at the splice."""
    (sheath, _), (glass, _) = readings(cable.rulers, np.array(chains))
    (_, sheath_after), (_, glass_after) = readings(cable.rulers, np.array(chains))
    ratio = cable.way.cable.make.glass_over_sheath_ratio
    bounds = []
    for k, at in enumerate(chains):
        if at in cable.parted:
            part = cable.parted[at][0]
            bounds.append((int(sheath[k]) + part, int(glass[k]) + glass_from_sheath(part, ratio)))
        elif k == 0:
            bounds.append((int(sheath[0]), int(glass[0])))
        else:
            bounds.append((int(sheath_after[1]), int(glass_after[1])))
    return Section(
        id=f"S{number}",
        cable=cable.way.cable.id,
        start=names[0],
        end=names[1],
        start_chain_mm=chains[0],
        end_chain_mm=chains[1],
        start_sheath_mm=bounds[0][0],
        end_sheath_mm=bounds[1][0],
        start_glass_mm=bounds[0][1],
        end_glass_mm=bounds[1][1],
        needed_mm=needed_mm,
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
        Joint count and cost [cents], the joint taken from the span where that costs least.
    """
    found = []
    for cable in laid:
        for span in cable.spans:
            other = one_joint_fewer(span.problem, span.best)
            if other is not None:
                found.append(other.cost_cents - span.best.cost_cents)
    if not found:
        return None
    return len(layout.joints) - 1, layout.proof.cost_cents + min(found)
