"""Why no layout of a span keeps its limits, and the smallest relaxation that lets one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import pairwise
from typing import Literal

from routeplan.cable.reel_models import Buying, SpanProblem, longest_reel_mm
from routeplan.cable.reel_paths import forward, make_costs, make_table
from routeplan.cable.reels import cheapest_layout
from routeplan.errors import Problem

__all__ = ["Relaxation", "RelaxationKind", "infeasible_problem", "smallest_relaxation"]

RelaxationKind = Literal[
    "reel", "placement", "reel and placements", "joints", "weight", "joints and weight"
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Relaxation:
    """
    The smallest relaxation that makes a span feasible, and where it is needed.

    For a length: the section from place `start` to place `end` decides; it needs `value` mm
    and `limit` is the least of what the reels or the `placements` allow now; `reel_mm` is the
    longest reel to ask for. For joints or their weight: `value` is the least that would do,
    over the whole span; if each alone blocks, `value` joints that weigh `weight`.
    """

    kind: RelaxationKind
    start: int
    end: int
    value: int
    limit: int
    placements: tuple[str, ...] = ()
    reel_mm: int = 0
    weight: int = 0
    weight_limit: int = 0


def smallest_relaxation(problem: SpanProblem) -> Relaxation | None:
    """
    Return the smallest relaxation that makes a span feasible, or None if it is feasible.

    Where lengths alone forbid every layout, a longer longest reel, or a higher limit of one
    placement, is tried each by itself, and the one with the smallest increase is returned;
    where no single one helps, the least length that reels and placements must all allow.
    Otherwise the limit on joints, or on their weight, with the other one kept where possible.
    Exact: a millimetre less is still infeasible. Some 30 searches of the span a limit.
    """
    lengths = replace(problem, joints_most=None, weight_most=None)
    if not _feasible(lengths):
        return _length_relaxation(_free(lengths))
    if _feasible(problem):
        return None
    return _joint_relaxation(_free(problem))


def infeasible_problem(
    relaxation: Relaxation, *, where: str, names: Sequence[str], chain_m: Sequence[float]
) -> Problem:
    """
    Return the problem that tells a planner about an infeasible span.

    Parameters
    ----------
    relaxation
        What `smallest_relaxation` found.
    where
        The cable or leg, as in `Leg "Hill"`.
    names
        Name of every place of the span; empty where a place has none.
    chain_m
        Where every place lies along the way. [m]

    Returns
    -------
    infeasible_problem
        To be raised as an `InfeasibleError`.

    Examples
    --------
    >>> found = Relaxation(kind="reel", start=0, end=1, value=4_040_000, limit=4_000_000,
    ...     reel_mm=4_040_000)
    >>> print(infeasible_problem(found, where='Leg "Hill"', names=("", ""), chain_m=(3310, 7350)))
    ... # doctest: +NORMALIZE_WHITESPACE
    Leg "Hill": 4 040 m of cable lie between joint places at 3 310 m and 7 350 m, but the
    longest reel is 4 000 m (4 040 m, limit 4 000 m). Allow a joint between them, or a reel
    of 4 040 m.
    """
    if "joints" in relaxation.kind or relaxation.kind == "weight":
        return _joint_problem(relaxation, where)
    value, limit = _metres(relaxation.value), _metres(relaxation.limit)
    reel = _metres(relaxation.reel_mm)
    ends = [
        f"{names[place]} ({_metres_of(chain_m[place])})"
        if names[place]
        else _metres_of(chain_m[place])
        for place in (relaxation.start, relaxation.end)
    ]
    quoted = " and ".join(f'"{name}"' for name in relaxation.placements)
    if relaxation.kind == "reel":
        allowed, remedy = f"the longest reel is {limit}", f"a reel of {reel}"
    elif relaxation.kind == "placement":
        allowed = f"a section in {quoted} may need {limit} at most"
        remedy = f"sections of {value} in {quoted}"
    else:
        allowed = f"the reels and the limit in {quoted} allow {limit}"
        remedy = f"a reel of {reel} and sections of that length in {quoted}"
    return Problem(
        where=where,
        what=f"{value} of cable lie between joint places at {ends[0]} and {ends[1]}, but {allowed}",
        value=value,
        limit=limit,
        remedy=f"Allow a joint between them, or {remedy}.",
    )


def _joint_problem(relaxation: Relaxation, where: str) -> Problem:
    """Return the problem of a span with too little room for joints."""
    more = " and more loss in them" if relaxation.kind == "joints and weight" else ""
    if relaxation.kind != "weight":
        return Problem(
            where=where,
            what=f"no layout has fewer than {relaxation.value} joints",
            value=str(relaxation.value),
            limit=str(relaxation.limit),
            remedy=f"Allow {relaxation.value} joints{more}, or longer reels.",
        )
    return Problem(
        where=where,
        what="the joints of every layout lose more than the circuits can spare",
        value=str(relaxation.value),
        limit=str(relaxation.limit),
        remedy="Allow longer reels, joints of lower loss, or circuits with more to spare.",
    )


def _metres(length_mm: int) -> str:
    return _metres_of(length_mm / 1000)


def _metres_of(length_m: float) -> str:
    """Return metres as people write them, thousands apart and no idle zeros."""
    text = f"{length_m:,.3f}".replace(",", " ").rstrip("0").rstrip(".")
    return f"{text} m"


# ------------------------------------------------------------------ lengths


def _length_relaxation(problem: SpanProblem) -> Relaxation:
    """Return the smallest increase of one length, or the one length for several of them."""
    known = list(dict.fromkeys(limit.placement for limit in problem.limits))
    single = [found for found in (_increase(problem, (name,)) for name in ("", *known)) if found]
    if single:
        return min(single, key=lambda found: found.value - found.limit)
    names: tuple[str, ...] = ("", *known)
    together = _increase(problem, names)
    if together is None:
        raise AssertionError("no length makes the span feasible")
    for name in names:
        fewer = tuple(other for other in names if other != name)
        if _reached(_raised(problem, together.value, fewer))[-1]:
            names = fewer
    return _increase(problem, names) or together


def _increase(problem: SpanProblem, names: tuple[str, ...]) -> Relaxation | None:
    """Return the least length that some placements, or the reels (""), must allow, if it helps."""
    limits = [limit.most_mm for limit in problem.limits if limit.placement in names]
    if "" in names:
        limits.append(longest_reel_mm(problem.buying))
    factor = 1 + problem.ordering_ratio
    longest = (max(problem.arrive_mm) - min(problem.leave_mm)) * factor
    low, high = min(limits), max(-(-longest.numerator // longest.denominator), min(limits))
    if not _reached(_raised(problem, high, names))[-1]:
        return None
    while high - low > 1:
        middle = (low + high) // 2
        if _reached(_raised(problem, middle, names))[-1]:
            high = middle
        else:
            low = middle
    start, end = _deciding(problem, high, names)
    placements = tuple(name for name in names if name)
    kind: RelaxationKind = "placement" if "" not in names else "reel"
    return Relaxation(
        kind="reel and placements" if placements and kind == "reel" else kind,
        start=start,
        end=end,
        value=high,
        limit=min(limits),
        placements=placements,
        reel_mm=_reel_mm(problem.buying, high) if "" in names else 0,
    )


def _deciding(problem: SpanProblem, length_mm: int, names: tuple[str, ...]) -> tuple[int, int]:
    """Return the first section of a relaxed layout to a place a millimetre less cannot reach."""
    layout = cheapest_layout(_raised(problem, length_mm, names))
    reached = _reached(_raised(problem, length_mm - 1, names))
    if layout is None:
        raise AssertionError(f"a length of {length_mm} mm does not make the span feasible")
    return next((a, b) for a, b in pairwise(layout.places) if not reached[b])


def _reel_mm(buying: Buying, length_mm: int) -> int:
    """Return the longest reel to allow: where all is made to length, a whole number of steps."""
    if buying.put_ups_mm or not buying.made_max_mm:
        return length_mm
    return -(-length_mm // buying.round_up_mm) * buying.round_up_mm


def _reached(problem: SpanProblem) -> list[bool]:
    """Say of each place whether sections lead to it from the start."""
    table = make_table(problem)
    return [key is not None for key in forward(table, make_costs(table))[0]]


def _raised(problem: SpanProblem, length_mm: int, names: tuple[str, ...]) -> SpanProblem:
    """Return the problem with some placements, or the reels (""), allowing a length."""
    buying = problem.buying
    if "" in names:
        buying = replace(buying, put_ups_mm=(*buying.put_ups_mm, length_mm))
    limits = tuple(
        replace(limit, most_mm=max(limit.most_mm, length_mm)) if limit.placement in names else limit
        for limit in problem.limits
    )
    return replace(problem, buying=buying, limits=limits)


# ------------------------------------------------------------------ joints


def _joint_relaxation(problem: SpanProblem) -> Relaxation:
    """Return the fewest joints, or the least weight of joints, that would do."""
    fewest = cheapest_layout(replace(problem, joints_most=None))
    if fewest is not None:
        return _whole(problem, "joints", fewest.joint_count, problem.joints_most)
    priced = replace(problem, joint_cost_cents=problem.joint_weight, weight_most=None)
    lightest = cheapest_layout(priced)
    if lightest is not None:
        return _whole(problem, "weight", lightest.cost_cents, problem.weight_most)
    fewest = cheapest_layout(replace(problem, joints_most=None, weight_most=None))
    if fewest is None:
        raise AssertionError("the span is infeasible without limits on joints")
    lightest = cheapest_layout(replace(priced, joints_most=fewest.joint_count))
    weight = lightest.cost_cents if lightest else 0
    found = _whole(problem, "joints and weight", fewest.joint_count, problem.joints_most)
    return replace(found, weight=weight, weight_limit=problem.weight_most or 0)


def _whole(problem: SpanProblem, kind: RelaxationKind, value: int, limit: int | None) -> Relaxation:
    """Return a relaxation that concerns the whole span."""
    end = len(problem.chain_mm) - 1
    return Relaxation(kind=kind, start=0, end=end, value=value, limit=limit or 0)


def _free(problem: SpanProblem) -> SpanProblem:
    """Return the problem with nothing costing anything, so that fewest joints come first."""
    return replace(
        problem,
        joint_cost_cents=(0,) * len(problem.chain_mm),
        buying=replace(problem.buying, cable_cents_per_m=Fraction(0), reel_each_cents=0),
    )


def _feasible(problem: SpanProblem) -> bool:
    return cheapest_layout(problem) is not None
