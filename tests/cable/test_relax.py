"""What must hold for the diagnosis of spans without a layout."""

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction
from itertools import combinations, pairwise

import pytest

from routeplan.cable.reel_models import Buying, PlacementLimit, SpanProblem, needed_mm
from routeplan.cable.reels import cheapest_layout
from routeplan.cable.relax import Relaxation, infeasible_problem, smallest_relaxation

NO_NAMES = ("",) * 9


def span(chain_m: list[int], **changes: object) -> SpanProblem:
    """Return a bare span with places at given metres and put-ups of 4 km."""
    chain_mm = tuple(1000 * at for at in chain_m)
    count = len(chain_mm)
    problem = SpanProblem(
        chain_mm=chain_mm,
        arrive_mm=chain_mm,
        leave_mm=chain_mm,
        joint_cost_cents=(100,) * count,
        assumed=(False,) * count,
        tie_key=tuple(range(count)),
        joint_weight=(0,) * count,
        ordering_ratio=Fraction(0),
        buying=Buying(
            put_ups_mm=(4_000_000,), cable_cents_per_m=Fraction(120), reel_each_cents=12_000
        ),
    )
    return replace(problem, **changes)  # type: ignore[arg-type]


def random_span(seed: int) -> SpanProblem:
    """Return an invented span whose reels and limits are often too short."""
    rng = random.Random(seed)
    count = rng.randint(2, 8)
    chain = [0]
    for _ in range(count - 1):
        chain.append(chain[-1] + rng.choice([0, 1, 10, 10, 20, 35]))
    tails = [rng.choice(rng.choice([(0,), (2, 9), (0, 3, 7)])) for _ in range(count)]
    made = rng.choice([0, 0, 40, 63])
    intervals = [sorted(rng.randint(-5, chain[-1] + 5) for _ in range(2)) for _ in range(4)]
    limits = [
        PlacementLimit(placement=name, most_mm=rng.choice([10, 22, 30, 50]), intervals_mm=where)
        for name, where in (
            ("duct", ((intervals[0][0], intervals[0][1]), (intervals[1][0], intervals[1][1]))),
            ("aerial", ((intervals[2][0], intervals[2][1]),)),
            ("buried", ((intervals[3][0], intervals[3][1]),)),
        )
    ]
    return SpanProblem(
        chain_mm=tuple(chain),
        arrive_mm=tuple(at + tail for at, tail in zip(chain, tails, strict=True)),
        leave_mm=tuple(at - tail for at, tail in zip(chain, tails, strict=True)),
        joint_cost_cents=(5,) * count,
        assumed=(False,) * count,
        tie_key=tuple(rng.getrandbits(40) for _ in range(count)),
        ordering_ratio=rng.choice([Fraction(0), Fraction(1, 50), Fraction(1, 3)]),
        buying=Buying(
            put_ups_mm=tuple(rng.sample([15, 20, 30, 45, 60], rng.randint(0 if made else 1, 2))),
            made_max_mm=made,
            round_up_mm=rng.choice([1, 7, 10, 25]),
            cable_cents_per_m=Fraction(1000),
            reel_each_cents=3,
        ),
        limits=tuple(rng.sample(limits, rng.choice([0, 0, 1, 2, 3]))),
        joints_most=rng.choice([None, 0, 1, 2, 3, 4]),
        joint_weight=tuple(rng.choice([1, 2, 5]) for _ in range(count)),
        weight_most=rng.choice([None, 2, 3, 5, 8, 12]),
    )


def allowed(problem: SpanProblem, start: int, end: int) -> bool:
    """Say from the raw numbers whether a section can be bought and keeps every limit."""
    needed = (problem.arrive_mm[end] - problem.leave_mm[start]) * (1 + problem.ordering_ratio)
    low, high = problem.chain_mm[start], problem.chain_mm[end]
    for limit in problem.limits:
        touched = any(min(high, b) - max(low, a) > 0 for a, b in limit.intervals_mm)
        if touched and needed > limit.most_mm:
            return False
    step = problem.buying.round_up_mm
    longest = problem.buying.made_max_mm // step * step
    return any(needed <= reel for reel in (*problem.buying.put_ups_mm, longest or -1))


def feasible(problem: SpanProblem) -> bool:
    """Say by trying every subset of the places whether any layout keeps the limits."""
    end = len(problem.chain_mm) - 1
    fits = {(i, j) for i, j in combinations(range(end + 1), 2) if allowed(problem, i, j)}
    for count in range(end):
        if problem.joints_most is not None and count > problem.joints_most:
            break
        for middle in combinations(range(1, end), count):
            weight = sum(problem.joint_weight[place] for place in middle)
            light = problem.weight_most is None or weight <= problem.weight_most
            if light and all(ends in fits for ends in pairwise((0, *middle, end))):
                return True
    return False


def relaxed(problem: SpanProblem, length_mm: int, *, reel: bool, names: set[str]) -> SpanProblem:
    """Return the problem with one reel more and some limits raised to a length."""
    if reel:
        put_ups = (*problem.buying.put_ups_mm, length_mm)
        problem = replace(problem, buying=replace(problem.buying, put_ups_mm=put_ups))
    limits = []
    for limit in problem.limits:
        most = max(limit.most_mm, length_mm) if limit.placement in names else limit.most_mm
        limits.append(replace(limit, most_mm=most))
    return replace(problem, limits=tuple(limits), joints_most=None, weight_most=None)


def smallest_by_trial(problem: SpanProblem, *, reel: bool, names: set[str]) -> int | None:
    """Return the least of all lengths that any section needs for which brute force succeeds."""
    count = len(problem.chain_mm)
    lengths = {needed_mm(problem, i, j) for j in range(count) for i in range(j)}
    for length in sorted(lengths):
        if feasible(relaxed(problem, length, reel=reel, names=names)):
            return length
    return None


def test_length_relaxation_equals_brute_force() -> None:
    """The relaxation is the smallest single one that helps, or the smallest of all together."""
    kinds = set()
    for seed in range(700):
        problem = replace(random_span(seed), joints_most=None, weight_most=None)
        found = smallest_relaxation(problem)
        if feasible(problem):
            assert found is None, seed
            continue
        assert found is not None, seed
        kinds.add(found.kind)
        longest = max(
            problem.buying.made_max_mm // problem.buying.round_up_mm * problem.buying.round_up_mm,
            *problem.buying.put_ups_mm,
            0,
        )
        increases = []
        value = smallest_by_trial(problem, reel=True, names=set())
        if value is not None:
            increases.append(value - longest)
        for limit in problem.limits:
            value = smallest_by_trial(problem, reel=False, names={limit.placement})
            if value is not None:
                increases.append(value - limit.most_mm)
        if increases:
            assert found.value - found.limit == min(increases), seed
            assert found.kind in ("reel", "placement")
        else:
            every = {limit.placement for limit in problem.limits}
            assert found.value == smallest_by_trial(problem, reel=True, names=every), seed
        assert needed_mm(problem, found.start, found.end) == found.value, seed
    assert kinds == {"reel", "placement", "reel and placements"}


def test_one_millimetre_less_is_infeasible() -> None:
    """With the named relaxation a layout exists, with a millimetre less none does."""
    tried = 0
    for seed in range(700):
        problem = replace(random_span(seed), joints_most=None, weight_most=None)
        found = smallest_relaxation(problem)
        if found is None:
            continue
        tried += 1
        reel, names = "reel" in found.kind, set(found.placements)
        enough = relaxed(problem, found.value, reel=reel, names=names)
        assert cheapest_layout(enough) is not None, seed
        assert not feasible(relaxed(problem, found.value - 1, reel=reel, names=names)), seed
    assert tried > 200


def test_joint_relaxation_equals_brute_force() -> None:
    """Where only joints block, the fewest joints or the least weight is named exactly."""
    kinds = set()
    for seed in range(1200):
        problem = random_span(seed)
        if not feasible(replace(problem, joints_most=None, weight_most=None)):
            continue
        found = smallest_relaxation(problem)
        if feasible(problem):
            assert found is None
            continue
        assert found is not None
        kinds.add(found.kind)
        if found.kind == "joints":
            better = replace(problem, joints_most=found.value)
            assert feasible(better), seed
            assert not feasible(replace(better, joints_most=found.value - 1)), seed
        elif found.kind == "weight":
            better = replace(problem, weight_most=found.value)
            assert feasible(better), seed
            assert not feasible(replace(better, weight_most=found.value - 1)), seed
        else:
            better = replace(problem, joints_most=found.value, weight_most=found.weight)
            assert feasible(better), seed
    assert {"joints", "weight"} <= kinds


def test_both_limits_on_joints_block() -> None:
    """Where neither limit on joints can be kept, both needs are named."""
    problem = span([0, 3000, 6000, 9000], joint_weight=(0, 5, 6, 0), joints_most=1, weight_most=10)
    found = smallest_relaxation(problem)
    assert found is not None
    assert (found.kind, found.value, found.weight) == ("joints and weight", 2, 11)
    assert (found.limit, found.weight_limit) == (1, 10)
    text = str(infeasible_problem(found, where='Leg "Hill"', names=NO_NAMES, chain_m=(0.0,) * 4))
    assert "Allow 2 joints and more loss in them" in text


def test_the_gap_that_decides_is_named() -> None:
    """The sentence names the stretch, what it needs, the longest reel and the remedy."""
    found = smallest_relaxation(span([0, 3310, 7350, 9000]))
    assert found is not None
    assert found == Relaxation(
        kind="reel", start=1, end=2, value=4_040_000, limit=4_000_000, reel_mm=4_040_000
    )
    problem = infeasible_problem(
        found, where='Leg "Hill"', names=("A", "", "MH 7", "B"), chain_m=(0, 3310, 7350, 9000)
    )
    assert str(problem) == (
        'Leg "Hill": 4 040 m of cable lie between joint places at 3 310 m and MH 7 (7 350 m), '
        "but the longest reel is 4 000 m (4 040 m, limit 4 000 m). "
        "Allow a joint between them, or a reel of 4 040 m."
    )


def test_the_worst_of_two_gaps_decides() -> None:
    """With two gaps too long, the length named serves both."""
    found = smallest_relaxation(span([0, 4100, 8300, 9000]))
    assert found is not None
    assert (found.start, found.end, found.value) == (1, 2, 4_200_000)


def test_made_pieces_ask_for_whole_steps() -> None:
    """Where cable is only made to length, the reel to ask for is a whole number of steps."""
    buying = Buying(
        made_max_mm=4_005_000,
        round_up_mm=10_000,
        cable_cents_per_m=Fraction(120),
        reel_each_cents=0,
    )
    found = smallest_relaxation(span([0, 4001], buying=buying))
    assert found is not None
    assert (found.value, found.limit, found.reel_mm) == (4_001_000, 4_000_000, 4_010_000)


def test_a_placement_limit_that_blocks_is_named() -> None:
    """Where a placement's limit blocks, that placement and the length it needs are named."""
    limit = PlacementLimit(
        placement="duct", most_mm=2_500_000, intervals_mm=((3_000_000, 3_500_000),)
    )
    found = smallest_relaxation(span([0, 2800, 5600], limits=(limit,)))
    assert found is not None
    assert (found.kind, found.placements) == ("placement", ("duct",))
    assert (found.start, found.end, found.value, found.limit) == (1, 2, 2_800_000, 2_500_000)
    text = str(infeasible_problem(found, where="Leg", names=NO_NAMES, chain_m=(0, 2800, 5600)))
    assert 'a section in "duct" may need 2 500 m at most' in text
    assert 'or sections of 2 800 m in "duct"' in text


def test_reel_and_placement_both_block() -> None:
    """Where no single relaxation helps, reels and placements are named together."""
    limit = PlacementLimit(placement="duct", most_mm=3_000_000, intervals_mm=((0, 9_000_000),))
    found = smallest_relaxation(span([0, 4500, 5600], limits=(limit,)))
    assert found is not None
    assert (found.kind, found.placements, found.value) == (
        "reel and placements",
        ("duct",),
        4_500_000,
    )
    text = str(infeasible_problem(found, where="Leg", names=NO_NAMES, chain_m=(0, 4500, 5600)))
    assert 'a reel of 4 500 m and sections of that length in "duct"' in text


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        ({"joints_most": 1}, "no layout has fewer than 2 joints"),
        ({"joint_weight": (0, 5, 6, 0), "weight_most": 10}, "lose more than the circuits"),
    ],
)
def test_joint_limits_are_told(changes: dict[str, object], expected: str) -> None:
    """A limit on joints that blocks is told with the number that would do."""
    found = smallest_relaxation(span([0, 3000, 6000, 9000], **changes))
    assert found is not None
    text = str(infeasible_problem(found, where="Leg", names=NO_NAMES, chain_m=(0.0,) * 4))
    assert expected in text
