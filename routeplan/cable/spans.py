"""Every run of new cable in a way as a problem of joints and reels, and its best layout."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from routeplan.cable.model import Cable
from routeplan.cable.reel_models import Buying, PlacementLimit, SpanLayout, SpanProblem
from routeplan.cable.reels import cheapest_layout
from routeplan.cable.relax import Relaxation, infeasible_problem, smallest_relaxation
from routeplan.cable.rulers import BareRuler
from routeplan.cable.way import Spot, Way
from routeplan.errors import InfeasibleError, Problem
from routeplan.run.practice import Costs, Practice
from routeplan.units import cents_from_amount, exact_from_number, mm_from_m

__all__ = ["LaidSpan", "bound_tail_mm", "closure_cents", "joint_cents", "laid_spans", "tail_mm"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LaidSpan:
    """New cable between two fixed ends: its candidate spots, the problem and the best layout."""

    spots: tuple[Spot, ...]
    start_mm: int
    end_mm: int
    problem: SpanProblem
    best: SpanLayout


def tail_mm(kind: str, practice: Practice) -> int:
    """Return the cable end brought out at a joint on a kind of place. [mm]"""
    slack = practice.slack
    return mm_from_m(slack.pole_tail_m if kind == "pole" else slack.joint_tail_m)


def bound_tail_mm(way: Way, chain_mm: int, practice: Practice) -> int:
    """Return the tail where new cable meets an existing span; a cable's own ends have theirs."""
    if chain_mm in (0, way.length_mm):
        return 0
    kinds = {spot.kind for spot in way.spots if spot.chain_mm == chain_mm}
    return tail_mm("pole" if "pole" in kinds else "", practice)


def joint_cents(fitness: str, factor: float, cable: Cable, costs: Costs) -> int:
    """Return what a straight joint costs: closure and visit, and a splice for every fibre."""
    return closure_cents(fitness, factor, costs) + cents_from_amount(
        costs.splice_each * cable.make.fibre_count
    )


def closure_cents(fitness: str, factor: float, costs: Costs) -> int:
    """Return what a closure and the visit to it cost, without its splices."""
    weight = factor * (costs.avoid_factor if fitness == "avoid" else 1.0)
    return cents_from_amount(costs.joint_each * weight)


def laid_spans(way: Way, bare: BareRuler, *, practice: Practice) -> tuple[LaidSpan, ...]:
    """
    Return the runs of new cable in a way, each with joints and reels at least cost.

    `joints.max_count` holds for the cable as a whole, the joints where it meets existing spans
    among them: what is left is shared out among the runs at least cost, exactly.

    Parameters
    ----------
    way
        The cable's way.
    bare
        Its ruler before joints.
    practice
        House rules.

    Raises
    ------
    InfeasibleError
        Naming every run without a layout and its smallest relaxation.
    """
    bounds = _span_bounds(way)
    spots = [
        tuple(s for s in way.spots if start < s.chain_mm < end and s.fitness != "no")
        for start, end in bounds
    ]
    problems = [
        _problem(way, bare, own, bounds=span, practice=practice)
        for span, own in zip(bounds, spots, strict=True)
    ]
    best = [cheapest_layout(problem) for problem in problems]
    blocked = [
        _infeasible(way, own, problem)
        for own, problem, found in zip(spots, problems, best, strict=True)
        if found is None
    ]
    if blocked:
        raise InfeasibleError(blocked)
    found = [layout for layout in best if layout is not None]
    most = practice.joints.max_count
    if most is not None:
        fixed = sum(0 < at < way.length_mm for span in bounds for at in span)
        problems, found = _within_count(way, problems, found, most=most, fixed=fixed)
    columns = zip(spots, bounds, problems, found, strict=True)
    return tuple(
        LaidSpan(spots=own, start_mm=span[0], end_mm=span[1], problem=problem, best=layout)
        for own, span, problem, layout in columns
    )


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


def _within_count(
    way: Way,
    problems: list[SpanProblem],
    free: list[SpanLayout],
    *,
    most: int,
    fixed: int,
) -> tuple[list[SpanProblem], list[SpanLayout]]:
    """Return problems and layouts with the joints of all runs together within the limit."""
    left = most - fixed
    if sum(layout.joint_count for layout in free) > left:
        free = _shared_out(way, problems, free, most=most, fixed=fixed)
    spare = left - sum(layout.joint_count for layout in free)
    limited = [
        replace(problem, joints_most=layout.joint_count + spare)
        for problem, layout in zip(problems, free, strict=True)
    ]
    return limited, free


def _shared_out(
    way: Way, problems: list[SpanProblem], free: list[SpanLayout], *, most: int, fixed: int
) -> list[SpanLayout]:
    """
    Return the layouts of least cost that have no more joints than are left, all runs together.

    Dynamic programming over the runs: O(runs count^2) after one search for each run and count.
    """
    if len(problems) == 1:
        alone = cheapest_layout(replace(problems[0], joints_most=most - fixed))
        if alone is None:
            raise InfeasibleError(_too_many(way, problems, most=most, fixed=fixed))
        return [alone]
    table: dict[int, tuple[int, list[SpanLayout]]] = {0: (0, [])}
    for problem, layout in zip(problems, free, strict=True):
        options: dict[int, SpanLayout] = {layout.joint_count: layout}
        for count in range(min(layout.joint_count, max(most - fixed, 0) + 1)):
            found = cheapest_layout(replace(problem, joints_most=count))
            if found is not None:
                options.setdefault(found.joint_count, found)
        following: dict[int, tuple[int, list[SpanLayout]]] = {}
        for used, (cost, chosen) in table.items():
            for count, option in options.items():
                entry = (cost + option.cost_cents, [*chosen, option])
                known = following.get(used + count)
                if known is None or entry[0] < known[0]:
                    following[used + count] = entry
        table = following
    within = [(entry[0], used) for used, entry in table.items() if used <= most - fixed]
    if not within:
        raise InfeasibleError(_too_many(way, problems, most=most, fixed=fixed))
    return table[min(within)[1]][1]


def _too_many(way: Way, problems: list[SpanProblem], *, most: int, fixed: int) -> Problem:
    """Return the problem of a cable that cannot do with so few joints."""
    fewest = fixed
    for problem in problems:
        found = smallest_relaxation(replace(problem, joints_most=0))
        fewest += found.value if found else 0
    end = len(problems[0].chain_mm) - 1 if problems else 0
    return infeasible_problem(
        Relaxation(kind="joints", start=0, end=end, value=fewest, limit=most),
        where=f'cable "{way.cable.name}"',
        names=(),
        chain_m=(),
    )


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
) -> SpanProblem:
    start, end = bounds
    inner = np.array([spot.chain_mm for spot in spots], dtype=np.int64)
    knot = np.searchsorted(bare.chain_mm, inner)
    pole_mm, other_mm = tail_mm("pole", practice), tail_mm("", practice)
    tail = np.where([spot.kind == "pole" for spot in spots], pole_mm, other_mm)
    at = bare.before_mm[knot] + bare.half_mm[knot]
    first, last = np.searchsorted(bare.chain_mm, [start, end]).tolist()
    leave = int(bare.before_mm[first]) - bound_tail_mm(way, start, practice)
    arrive = int(bare.before_mm[last] + bare.step_mm[last]) + bound_tail_mm(way, end, practice)
    kinds = {(spot.fitness, spot.cost_factor) for spot in spots}
    cents = {kind: joint_cents(*kind, way.cable, practice.costs) for kind in kinds}
    return SpanProblem(
        chain_mm=(start, *inner.tolist(), end),
        arrive_mm=(leave, *(at + tail).tolist(), arrive),
        leave_mm=(leave, *(at - tail).tolist(), arrive),
        joint_cost_cents=(0, *(cents[spot.fitness, spot.cost_factor] for spot in spots), 0),
        assumed=(False, *(spot.assumed for spot in spots), False),
        tie_key=(0, *(spot.tie_key for spot in spots), 0),
        ordering_ratio=exact_from_number(practice.slack.ordering_ratio),
        buying=_buying(practice),
        limits=_limits(way, practice),
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
