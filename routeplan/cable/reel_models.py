"""What the search for joints and reels takes and gives, and the check of its answers."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import accumulate, pairwise
from operator import le
from typing import Literal

from routeplan.errors import Problem, RangeError

__all__ = [
    "BoughtSection",
    "Buying",
    "PlacementLimit",
    "SpanLayout",
    "SpanProblem",
    "Way",
    "check_layout",
    "longest_reel_mm",
    "mirrored",
    "needed_mm",
    "reel_for",
    "reel_price_cents",
    "sheath_most_mm",
]

Way = Literal["put-up", "to-length"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Buying:
    """
    How cable can be bought: any mix of put-ups and pieces made to length.

    `made_max_mm` bounds the rounded piece; 0 says that nothing is made to length.
    """

    put_ups_mm: tuple[int, ...] = ()
    made_max_mm: int = 0
    round_up_mm: int = 1
    cable_cents_per_m: Fraction
    reel_each_cents: int


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacementLimit:
    """The longest section, ordering allowance included, that may touch one placement."""

    placement: str
    most_mm: int
    intervals_mm: tuple[tuple[int, int], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class SpanProblem:
    """
    One span of new cable with its candidate joint places, in order along the chain.

    Place 0 is the start and the last one the end; their costs, ties and weights count for
    nothing. A section from place i to place j has a sheath of `arrive_mm[j] - leave_mm[i]`.
    `tie_key` must not depend on the direction, and two places should not share one.
    """

    chain_mm: tuple[int, ...]
    arrive_mm: tuple[int, ...]
    leave_mm: tuple[int, ...]
    joint_cost_cents: tuple[int, ...]
    assumed: tuple[bool, ...]
    tie_key: tuple[int, ...]
    ordering_ratio: Fraction
    buying: Buying
    limits: tuple[PlacementLimit, ...] = ()
    joints_most: int | None = None
    joint_weight: tuple[int, ...] = ()
    weight_most: int | None = None

    def __post_init__(self) -> None:
        """Refuse what the search is not exact for."""
        problems = [Problem(where="cable span", what=what) for what in _faults(self)]
        if problems:
            raise RangeError(problems)


@dataclass(frozen=True, slots=True, kw_only=True)
class BoughtSection:
    """One section between two places and the reel bought for it."""

    start: int
    end: int
    sheath_mm: int
    needed_mm: int
    way: Way
    reel_mm: int
    price_cents: int


@dataclass(frozen=True, slots=True, kw_only=True)
class SpanLayout:
    """The chosen places, start and end included, the sections between them, and the proof."""

    places: tuple[int, ...]
    sections: tuple[BoughtSection, ...]
    cost_cents: int
    lower_bound_cents: int
    optimal: bool
    stopped_by: str = ""

    @property
    def joint_count(self) -> int:
        """Return how many joints lie between the start and the end."""
        return len(self.places) - 2


def needed_mm(problem: SpanProblem, start: int, end: int) -> int:
    """Return what has to be bought for a section: its sheath and the allowance, rounded up."""
    factor = 1 + problem.ordering_ratio
    sheath_mm = problem.arrive_mm[end] - problem.leave_mm[start]
    return -(-sheath_mm * factor.numerator // factor.denominator)


def sheath_most_mm(problem: SpanProblem, most_mm: int) -> int:
    """Return the longest sheath whose needed length is not over `most_mm`."""
    factor = 1 + problem.ordering_ratio
    return most_mm * factor.denominator // factor.numerator


def longest_reel_mm(buying: Buying) -> int:
    """Return the longest piece that can be bought, 0 if there is none."""
    made_mm = buying.made_max_mm // buying.round_up_mm * buying.round_up_mm
    return max(made_mm, *buying.put_ups_mm, 0)


def reel_price_cents(buying: Buying, reel_mm: int) -> int:
    """Return the price of a reel, the half cent rounded up."""
    rate = buying.cable_cents_per_m
    doubled = 2 * rate.numerator * reel_mm + 1000 * rate.denominator
    return doubled // (2000 * rate.denominator) + buying.reel_each_cents


def reel_for(buying: Buying, length_mm: int) -> tuple[int, int, Way] | None:
    """
    Return the cheapest reel that holds a needed length.

    Returns
    -------
    reel_for
        Price [cents], length [mm] and way; the shorter of two at one price, a put-up before
        a made piece of its length; None if no reel is long enough.
    """
    offers: list[tuple[int, int, Way]] = [
        (reel_price_cents(buying, put_up), put_up, "put-up")
        for put_up in buying.put_ups_mm
        if put_up >= length_mm
    ]
    piece_mm = -(-length_mm // buying.round_up_mm) * buying.round_up_mm
    if buying.made_max_mm and piece_mm <= buying.made_max_mm:
        offers.append((reel_price_cents(buying, piece_mm), piece_mm, "to-length"))
    return min(offers, default=None)


def mirrored(problem: SpanProblem) -> SpanProblem:
    """Return the same span walked from its other end: place i becomes place n - 1 - i."""
    return replace(
        problem,
        chain_mm=tuple(-value for value in reversed(problem.chain_mm)),
        arrive_mm=tuple(-value for value in reversed(problem.leave_mm)),
        leave_mm=tuple(-value for value in reversed(problem.arrive_mm)),
        joint_cost_cents=problem.joint_cost_cents[::-1],
        assumed=problem.assumed[::-1],
        tie_key=problem.tie_key[::-1],
        limits=tuple(
            replace(limit, intervals_mm=tuple((-b, -a) for a, b in reversed(limit.intervals_mm)))
            for limit in problem.limits
        ),
        joint_weight=problem.joint_weight[::-1],
    )


def check_layout(problem: SpanProblem, layout: SpanLayout) -> None:
    """
    Compute a layout again from the raw problem, section by section, and compare.

    Raises
    ------
    AssertionError
        If a length, price, limit or total differs: a fault of the search, not of the input.
    """
    end = len(problem.chain_mm) - 1
    joints = layout.places[1:-1]
    _require(layout.places[0] == 0 and layout.places[-1] == end, "the span is not covered")
    _require(all(a < b for a, b in pairwise(layout.places)), "places out of order")
    ends = [(section.start, section.end) for section in layout.sections]
    _require(ends == list(pairwise(layout.places)), "sections do not meet at the places")
    for section in layout.sections:
        _check_section(problem, section)
    cost = sum(section.price_cents for section in layout.sections)
    cost += sum(problem.joint_cost_cents[place] for place in joints)
    _require(cost == layout.cost_cents, f"cost {layout.cost_cents}, computed again {cost}")
    _require(layout.lower_bound_cents <= cost, "the bound is above the cost")
    _require(not layout.optimal or layout.lower_bound_cents == cost, "optimal, yet not at bound")
    most = problem.joints_most
    _require(most is None or len(joints) <= most, f"{len(joints)} joints, limit {most}")
    if problem.weight_most is not None and problem.joint_weight:
        weight = sum(problem.joint_weight[place] for place in joints)
        _require(weight <= problem.weight_most, f"weight {weight} over {problem.weight_most}")


def _check_section(problem: SpanProblem, section: BoughtSection) -> None:
    """Check one section's lengths, reel, price and placement limits."""
    where = f"section {section.start}-{section.end}: "
    sheath_mm = problem.arrive_mm[section.end] - problem.leave_mm[section.start]
    _require(sheath_mm == section.sheath_mm, where + f"sheath {section.sheath_mm} mm")
    whole = problem.ordering_ratio.denominator
    over = section.needed_mm * whole - sheath_mm * (whole + problem.ordering_ratio.numerator)
    _require(0 <= over < whole, where + f"needed {section.needed_mm} mm")
    _require(section.reel_mm >= section.needed_mm, where + f"reel {section.reel_mm} mm too short")
    buying = problem.buying
    if section.way == "put-up":
        _require(section.reel_mm in buying.put_ups_mm, where + f"no put-up {section.reel_mm} mm")
    else:
        spare_mm = section.reel_mm - section.needed_mm
        _require(spare_mm < buying.round_up_mm, where + f"made {spare_mm} mm too long")
        _require(section.reel_mm % buying.round_up_mm == 0, where + "piece not rounded")
        _require(section.reel_mm <= buying.made_max_mm, where + f"made {section.reel_mm} mm")
    rate, price = buying.cable_cents_per_m, section.price_cents - buying.reel_each_cents
    half = 500 * rate.denominator
    over = 2 * half * price - rate.numerator * section.reel_mm
    _require(-half < over <= half, where + f"price {section.price_cents}")
    low, high = problem.chain_mm[section.start], problem.chain_mm[section.end]
    for limit in problem.limits:
        touched = any(max(a, low) < min(b, high) for a, b in limit.intervals_mm)
        within = section.needed_mm <= limit.most_mm
        _require(within or not touched, where + f"over the limit in {limit.placement}")


def _require(holds: bool, what: str) -> None:
    if not holds:
        raise AssertionError(f"reel search gave a wrong layout: {what}")


def _faults(problem: SpanProblem) -> list[str]:
    """List what is wrong with a problem's numbers."""
    count = len(problem.chain_mm)
    sizes = [len(problem.arrive_mm), len(problem.leave_mm), len(problem.joint_cost_cents)]
    sizes += [len(problem.assumed), len(problem.tie_key)]
    sizes += [len(problem.joint_weight)] if problem.joint_weight else []
    if count < 2 or set(sizes) != {count}:
        return [f"{count} places with columns of {sizes}; at least 2 places, columns alike"]
    buying = problem.buying
    rate = min(problem.ordering_ratio, buying.cable_cents_per_m)
    lengths = min(buying.reel_each_cents, buying.made_max_mm, *buying.put_ups_mm)
    columns = (problem.joint_cost_cents, problem.tie_key, problem.joint_weight or (0,))
    least = min(lengths, *(min(column) for column in columns))
    checks = (
        (rate >= 0, f"a ratio or rate of {rate} is negative"),
        (least >= 0, f"a length, price, tie or weight of {least} is negative"),
        (buying.round_up_mm > 0, f"pieces in steps of {buying.round_up_mm} mm"),
        (_ascends(problem.chain_mm), "places are not in order along the chain"),
        (
            all(map(le, accumulate(problem.leave_mm, max), problem.arrive_mm[1:])),
            "a section would have a negative length",
        ),
    )
    return [what for holds, what in checks if not holds]


def _ascends(values: tuple[int, ...]) -> bool:
    return all(map(le, values, values[1:]))
