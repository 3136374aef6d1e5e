"""What must hold for the cheapest joints and reels of a span."""

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction
from itertools import combinations, pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.cable import reels
from routeplan.cable.reel_models import (
    Buying,
    PlacementLimit,
    SpanLayout,
    SpanProblem,
    check_layout,
    mirrored,
    needed_mm,
    reel_for,
)
from routeplan.cable.reels import cheapest_layout, one_joint_fewer
from routeplan.errors import RangeError


def random_span(seed: int) -> SpanProblem:
    """Return an invented span: small round numbers, so that ties and tight limits abound."""
    rng = random.Random(seed)
    count = rng.randint(2, 9)
    at, walk = 0, []
    for _ in range(count):
        walk.append(at)
        at += rng.choice([0, 1, 3, 10, 10, 20, 35])
    loops = sorted(rng.choice([0, 0, 5]) for _ in range(count)) if rng.random() < 0.3 else None
    ruler = [w + (loops[k] if loops else 0) for k, w in enumerate(walk)]
    tails = [rng.choice(rng.choice([(0,), (2,), (2, 9), (0, 3, 7)])) for _ in range(count)]
    made = rng.choice([0, 0, 40, 55, 63, 200])
    put_ups = tuple(rng.sample([15, 20, 30, 45, 60, 90], rng.randint(0 if made else 1, 3)))
    buying = Buying(
        put_ups_mm=put_ups,
        made_max_mm=made,
        round_up_mm=rng.choice([1, 5, 7, 10, 25]),
        cable_cents_per_m=rng.choice([Fraction(0), Fraction(1000), Fraction(37_000, 3), Fraction(1)])
        * rng.choice([1, 10, 250]),
        reel_each_cents=rng.choice([0, 0, 3, 50, 400]),
    )
    flat = rng.random() < 0.4
    return SpanProblem(
        chain_mm=tuple(walk),
        arrive_mm=tuple(r + t for r, t in zip(ruler, tails, strict=True)),
        leave_mm=tuple(r - t for r, t in zip(ruler, tails, strict=True)),
        joint_cost_cents=tuple(7 if flat else rng.choice([0, 5, 7, 80]) for _ in range(count)),
        assumed=tuple(rng.random() < 0.4 for _ in range(count)),
        tie_key=tuple(rng.getrandbits(40) for _ in range(count)),
        ordering_ratio=rng.choice([Fraction(0), Fraction(1, 50), Fraction(1, 3), Fraction(1, 7)]),
        buying=buying,
        limits=tuple(
            PlacementLimit(
                placement=f"placement {k}",
                most_mm=rng.choice([10, 22, 30, 50]),
                intervals_mm=tuple(
                    tuple(sorted((rng.randint(-5, at + 5), rng.randint(-5, at + 5))))
                    for _ in range(rng.randint(1, 2))
                ),
            )
            for k in range(rng.choice([0, 0, 0, 1, 1, 2, 3]))
        ),
        joints_most=rng.choice([None, None, 0, 1, 2, 3, 4, 5]),
        joint_weight=tuple(rng.choice([0, 1, 2, 5]) for _ in range(count))
        if rng.random() < 0.5
        else (3,) * count,
        weight_most=rng.choice([None, None, None, 3, 5, 8, 12, 20]),
    )


def many_jointed(seed: int) -> SpanProblem:
    """Return an invented span on which joints are cheap or reels short, so that there are many."""
    rng = random.Random(seed + 77_000_000)
    problem = random_span(seed)
    count = len(problem.chain_mm)
    put_ups = (*rng.sample([13, 21, 29, 37, 48], rng.randint(1, 2)), 95)
    made = rng.choice([0, 35, 50])
    bare = rng.random() < 0.7
    return replace(
        problem,
        arrive_mm=problem.chain_mm if bare else problem.arrive_mm,
        leave_mm=problem.chain_mm if bare else problem.leave_mm,
        joint_cost_cents=tuple(rng.choice([0, 1, 30]) for _ in range(count)),
        buying=Buying(
            put_ups_mm=() if made and rng.random() < 0.3 else put_ups,
            made_max_mm=made,
            round_up_mm=rng.choice([1, 10, 25]),
            cable_cents_per_m=rng.choice([Fraction(3000), Fraction(50_000, 7)]),
            reel_each_cents=rng.choice([0, 0, 9]),
        ),
        limits=problem.limits if rng.random() < 0.3 else (),
        joints_most=None if rng.random() < 0.6 else problem.joints_most,
        weight_most=rng.choice([None, 2, 4, 6, 9, 13]),
    )


def objective(problem: SpanProblem, path: tuple[int, ...]) -> tuple[int, int, int, int] | None:
    """Return a layout's cost, joints, assumed and ties from the raw numbers; None if not allowed."""
    joints, weight = path[1:-1], 0
    if problem.weight_most is not None and problem.joint_weight:
        weight = sum(problem.joint_weight[place] for place in joints)
        if weight > problem.weight_most:
            return None
    if problem.joints_most is not None and len(joints) > problem.joints_most:
        return None
    cost = sum(problem.joint_cost_cents[place] for place in joints)
    for start, end in pairwise(path):
        sheath = problem.arrive_mm[end] - problem.leave_mm[start]
        needed = sheath * (1 + problem.ordering_ratio)
        needed = int(needed) + (needed != int(needed))
        for limit in problem.limits:
            low, high = problem.chain_mm[start], problem.chain_mm[end]
            if needed > limit.most_mm and any(
                min(high, b) - max(low, a) > 0 for a, b in limit.intervals_mm
            ):
                return None
        buying = problem.buying
        pieces = [p for p in buying.put_ups_mm if p >= needed]
        if buying.made_max_mm:
            made = needed
            while made % buying.round_up_mm:
                made += 1
            pieces += [made] if made <= buying.made_max_mm else []
        if not pieces:
            return None
        prices = []
        for piece in pieces:
            exact = buying.cable_cents_per_m * piece / 1000 + buying.reel_each_cents
            prices.append(int(exact + Fraction(1, 2)))
        cost += min(prices)
    return (
        cost,
        len(joints),
        sum(problem.assumed[place] for place in joints),
        sum(problem.tie_key[place] for place in joints),
    )


def brute_force(problem: SpanProblem, *, joints: int | None = None) -> tuple[int, ...] | None:
    """Return the best of all subsets of the places."""
    end = len(problem.chain_mm) - 1
    found = []
    for count in range(end) if joints is None else [joints]:
        for middle in combinations(range(1, end), count):
            path = (0, *middle, end)
            value = objective(problem, path)
            if value is not None:
                found.append((value, path))
    return min(found)[1] if found else None


def places_of(layout: SpanLayout | None) -> tuple[int, ...] | None:
    """Return the chosen places, None for no layout."""
    return None if layout is None else layout.places


@pytest.mark.parametrize("block", range(12))
def test_equals_brute_force(block: int) -> None:
    """The optimum is the best of all subsets, in cost and in the places chosen."""
    solved = 0
    for seed in range(block * 500, block * 500 + 500):
        problem = random_span(seed) if block % 2 else many_jointed(seed)
        layout = cheapest_layout(problem)
        assert places_of(layout) == brute_force(problem), seed
        if layout is not None:
            solved += 1
            assert objective(problem, layout.places)[0] == layout.cost_cents  # type: ignore[index]
            assert layout.optimal
            assert layout.lower_bound_cents == layout.cost_cents
            assert layout.stopped_by == ""
    assert solved > 100


@pytest.mark.parametrize("block", range(4))
def test_one_joint_fewer_equals_brute_force(block: int) -> None:
    """One joint fewer is the best of all subsets of exactly that size, or nothing."""
    found = 0
    for seed in range(block * 500, block * 500 + 500):
        problem = random_span(seed) if block == 0 else many_jointed(seed)
        layout = cheapest_layout(problem)
        if layout is None:
            continue
        fewer = one_joint_fewer(problem, layout)
        joints = layout.joint_count - 1
        expected = brute_force(problem, joints=joints) if joints >= 0 else None
        assert places_of(fewer) == expected, seed
        found += fewer is not None
    assert found > (5 if block == 0 else 40)


def test_mirrored_span_gives_mirrored_layout() -> None:
    """Walking a span from its other end chooses the same places."""
    for seed in range(1500):
        problem = random_span(seed)
        there, back = cheapest_layout(problem), cheapest_layout(mirrored(problem))
        if there is None or back is None:
            assert there is back is None, seed
            continue
        last = len(problem.chain_mm) - 1
        assert tuple(last - place for place in reversed(back.places)) == there.places, seed
        assert back.cost_cents == there.cost_cents
        sections = [(s.needed_mm, s.way, s.reel_mm, s.price_cents) for s in reversed(back.sections)]
        assert sections == [(s.needed_mm, s.way, s.reel_mm, s.price_cents) for s in there.sections]
