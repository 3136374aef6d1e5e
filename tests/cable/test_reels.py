"""What must hold for the cheapest joints and reels of a span."""

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction
from itertools import combinations, pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array

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
        cable_cents_per_m=rng.choice(
            [Fraction(0), Fraction(1000), Fraction(37_000, 3), Fraction(1)]
        )
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


def section_cost(problem: SpanProblem, start: int, end: int) -> int | None:
    """Return the price of a section from the raw numbers; None if it is not allowed."""
    buying, sheath = problem.buying, problem.arrive_mm[end] - problem.leave_mm[start]
    needed = sheath * (1 + problem.ordering_ratio)
    needed = int(needed) + (needed != int(needed))
    low, high = problem.chain_mm[start], problem.chain_mm[end]
    for limit in problem.limits:
        touched = any(min(high, b) - max(low, a) > 0 for a, b in limit.intervals_mm)
        if touched and needed > limit.most_mm:
            return None
    pieces = [put_up for put_up in buying.put_ups_mm if put_up >= needed]
    if buying.made_max_mm:
        made = needed + (-needed) % buying.round_up_mm
        pieces += [made] if made <= buying.made_max_mm else []
    prices = [buying.cable_cents_per_m * piece / 1000 + buying.reel_each_cents for piece in pieces]
    return min((int(price + Fraction(1, 2)) for price in prices), default=None)


def objective(
    problem: SpanProblem, path: tuple[int, ...], costs: dict[tuple[int, int], int | None]
) -> tuple[int, int, int, int] | None:
    """Return a layout's cost, joints, assumed and ties; None if a limit forbids it."""
    joints = path[1:-1]
    prices = [costs[ends] for ends in pairwise(path)]
    if None in prices or (problem.joints_most is not None and len(joints) > problem.joints_most):
        return None
    weight = sum(problem.joint_weight[place] for place in joints)
    if problem.weight_most is not None and weight > problem.weight_most:
        return None
    return (
        sum(price or 0 for price in prices) + sum(problem.joint_cost_cents[p] for p in joints),
        len(joints),
        sum(problem.assumed[place] for place in joints),
        sum(problem.tie_key[place] for place in joints),
    )


def brute_force(
    problem: SpanProblem, *, joints: int | None = None
) -> tuple[int, tuple[int, ...]] | None:
    """Return cost and places of the best of all subsets of the places."""
    end = len(problem.chain_mm) - 1
    costs = {(i, j): section_cost(problem, i, j) for i, j in combinations(range(end + 1), 2)}
    found = []
    for count in range(end) if joints is None else [joints]:
        for middle in combinations(range(1, end), count):
            path = (0, *middle, end)
            value = objective(problem, path, costs)
            if value is not None:
                found.append((value, path))
    return (min(found)[0][0], min(found)[1]) if found else None


def answer(layout: SpanLayout | None) -> tuple[int, tuple[int, ...]] | None:
    """Return cost and places of a layout, None for no layout."""
    return None if layout is None else (layout.cost_cents, layout.places)


@pytest.mark.parametrize("block", range(12))
def test_equals_brute_force(block: int) -> None:
    """The optimum is the best of all subsets, in cost and in the places chosen."""
    solved = 0
    for seed in range(block * 500, block * 500 + 500):
        problem = random_span(seed) if block % 2 else many_jointed(seed)
        layout = cheapest_layout(problem)
        assert answer(layout) == brute_force(problem), seed
        if layout is not None:
            solved += 1
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
        assert answer(fewer) == expected, seed
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


def long_span(seed: int, *, count: int, buying: Buying) -> SpanProblem:
    """Return an invented span of many places about 200 m apart, a third of them dear."""
    rng = random.Random(seed)
    chain, tails = [0], []
    for _ in range(count - 1):
        chain.append(chain[-1] + rng.choice([0, 3_000, 120_000, rng.randint(50_000, 500_000)]))
    tails = [rng.choice((15_000, 22_000)) for _ in range(count)]
    return SpanProblem(
        chain_mm=tuple(chain),
        arrive_mm=tuple(at + tail for at, tail in zip(chain, tails, strict=True)),
        leave_mm=tuple(at - tail for at, tail in zip(chain, tails, strict=True)),
        joint_cost_cents=tuple(rng.choice((88_200, 88_200, 268_200)) for _ in range(count)),
        assumed=tuple(rng.random() < 0.5 for _ in range(count)),
        tie_key=tuple(rng.getrandbits(64) for _ in range(count)),
        ordering_ratio=Fraction(1, 50),
        buying=buying,
        limits=(
            PlacementLimit(
                placement="duct",
                most_mm=2_600_000,
                intervals_mm=((chain[-1] // 3, chain[-1] // 2),),
            ),
        )
        if seed % 2
        else (),
    )


def solver_cost(problem: SpanProblem) -> int | None:
    """Return the least cost by integer programming: a binary for every arc, one unit of flow."""
    count = len(problem.chain_mm)
    arcs, costs = [], []
    for start, end in combinations(range(count), 2):
        if problem.arrive_mm[end] - problem.leave_mm[start] > 7_000_000:
            continue
        price = section_cost(problem, start, end)
        if price is not None:
            arcs.append((start, end))
            costs.append(price + (problem.joint_cost_cents[end] if end < count - 1 else 0))
    columns = np.arange(len(arcs))
    tails, heads = np.array(arcs).T
    ones = np.ones(len(arcs))
    flow = csr_array(
        (np.concatenate([ones, -ones]), (np.concatenate([tails, heads]), np.tile(columns, 2))),
        shape=(count, len(arcs)),
    )
    net = np.zeros(count)
    net[0], net[-1] = 1, -1
    constraints = [LinearConstraint(flow, net, net)]
    if problem.joints_most is not None:
        constraints.append(LinearConstraint(ones[None, :], 0, problem.joints_most + 1))
    solved = milp(
        np.array(costs, float),
        integrality=ones,
        bounds=Bounds(0, 1),
        constraints=constraints,
        options={"mip_rel_gap": 0},
    )
    return round(solved.fun) if solved.success else None


@pytest.mark.parametrize("seed", range(20))
def test_equals_an_integer_programming_solver(seed: int) -> None:
    """An independent solver (HiGHS) finds the same least cost on 200 places, limits included."""
    money = {"cable_cents_per_m": Fraction(1201, 10), "reel_each_cents": 12_000}
    ways = [
        Buying(put_ups_mm=(2_000_000, 4_000_000, 6_000_000), **money),
        Buying(made_max_mm=6_000_000, round_up_mm=10_000, **money),
        Buying(
            put_ups_mm=(1_500_000, 6_500_000), made_max_mm=4_000_000, round_up_mm=7_000, **money
        ),
    ]
    buying = ways[seed % 3]
    problem = long_span(seed, count=200, buying=buying)
    layout = cheapest_layout(problem)
    assert layout is not None
    assert layout.cost_cents == solver_cost(problem)


@pytest.mark.parametrize("seed", range(0, 12, 3))
def test_equals_a_solver_with_fewer_joints(seed: int) -> None:
    """An independent solver (HiGHS) finds the same least cost when the joints are limited."""
    buying = Buying(
        put_ups_mm=(1_000_000, 3_000_000, 6_000_000),
        cable_cents_per_m=Fraction(1201, 10),
        reel_each_cents=0,
    )
    problem = long_span(seed, count=60, buying=buying)
    problem = replace(problem, joint_cost_cents=(1_500,) * 60)
    layout = cheapest_layout(problem)
    assert layout is not None
    fewer = replace(problem, joints_most=layout.joint_count - 1)
    limited = cheapest_layout(fewer)
    assert (limited and limited.cost_cents) == solver_cost(fewer)


@settings(max_examples=150, deadline=None)
@given(seed=st.integers(0, 10**6), cut=st.integers(0, 400), rate=st.fractions(0, 1))
def test_cheaper_reels_never_raise_the_cost(seed: int, cut: int, rate: Fraction) -> None:
    """Cheaper cable, cheaper reels or one put-up more never raise the cost."""
    problem = many_jointed(seed)
    layout = cheapest_layout(problem)
    if layout is None:
        return
    buying = problem.buying
    cheaper = (
        replace(buying, cable_cents_per_m=buying.cable_cents_per_m * rate),
        replace(buying, reel_each_cents=max(buying.reel_each_cents - cut, 0)),
        replace(buying, put_ups_mm=(*buying.put_ups_mm, 1 + cut)),
    )
    for changed in cheaper:
        other = cheapest_layout(replace(problem, buying=changed))
        assert other is not None
        assert other.cost_cents <= layout.cost_cents


@settings(max_examples=150, deadline=None)
@given(seed=st.integers(0, 10**6), joints=st.integers(0, 6), most=st.integers(5, 60))
def test_more_limits_never_lower_the_cost(seed: int, joints: int, most: int) -> None:
    """A limit more, on joints or on sections, never lowers the cost."""
    problem = replace(many_jointed(seed), joints_most=None)
    whole = PlacementLimit(placement="all", most_mm=most, intervals_mm=((-10, 10**6),))
    for limited in (
        replace(problem, joints_most=joints),
        replace(problem, limits=(*problem.limits, whole)),
    ):
        free, bound = cheapest_layout(problem), cheapest_layout(limited)
        assert bound is None or (free is not None and free.cost_cents <= bound.cost_cents)


def test_work_limit_leaves_a_checked_layout_and_a_true_bound() -> None:
    """A label search that is stopped says so, and its bound is not above the optimum."""
    stopped = 0
    for seed in range(600):
        problem = many_jointed(seed)
        best, cut = cheapest_layout(problem), cheapest_layout(problem, work_most=2)
        assert (best is None) == (cut is None)
        if best is None or cut is None:
            continue
        assert cut.lower_bound_cents <= best.cost_cents <= cut.cost_cents
        assert cut.optimal == (cut.stopped_by == "")
        assert not cut.optimal or cut.places == best.places
        stopped += cut.stopped_by == "work"
    assert stopped > 3


def test_weight_search_equals_brute_force_layers_on_a_long_span() -> None:
    """Joints that all weigh the same are limited exactly as by their number."""
    buying = Buying(
        put_ups_mm=(1_000_000, 2_000_000, 6_000_000),
        cable_cents_per_m=Fraction(120),
        reel_each_cents=0,
    )
    problem = replace(
        long_span(2, count=120, buying=buying), joint_cost_cents=(1_000,) * 120, limits=()
    )
    free = cheapest_layout(problem)
    assert free is not None
    most = free.joint_count - 2
    counted = cheapest_layout(replace(problem, joints_most=most))
    assert counted is not None
    same = replace(problem, joint_weight=(7,) * 120, weight_most=7 * most + 6)
    assert answer(cheapest_layout(same)) == answer(counted)
    # one joint place lighter than the rest, yet never worth it: searched with labels
    weights = tuple(6 if place == 119 - 1 else 7 for place in range(120))
    labelled = cheapest_layout(replace(problem, joint_weight=weights, weight_most=7 * most))
    assert answer(labelled) == answer(counted)


def test_shorter_reel_wins_at_one_price() -> None:
    """Of two reels at one price the shorter is bought, and a put-up before a made piece."""
    buying = Buying(
        put_ups_mm=(50, 20),
        made_max_mm=100,
        round_up_mm=10,
        cable_cents_per_m=Fraction(0),
        reel_each_cents=5,
    )
    assert reel_for(buying, 12) == (5, 20, "put-up")
    assert reel_for(buying, 21) == (5, 30, "to-length")
    assert reel_for(buying, 100) == (5, 100, "to-length")
    assert reel_for(buying, 101) is None


def test_price_rounds_the_half_cent_up() -> None:
    """A reel's price is the cable's exact price rounded half up, and the reel."""
    buying = Buying(put_ups_mm=(500,), cable_cents_per_m=Fraction(1), reel_each_cents=7)
    assert reel_for(buying, 1) == (8, 500, "put-up")


def test_allowance_is_exact_decimals() -> None:
    """A section that needs a put-up exactly fits it; one millimetre more does not."""
    buying = Buying(put_ups_mm=(1_020,), cable_cents_per_m=Fraction(1), reel_each_cents=0)
    for length, fits in ((1_000, True), (1_001, False)):
        problem = SpanProblem(
            chain_mm=(0, length),
            arrive_mm=(0, length),
            leave_mm=(0, length),
            joint_cost_cents=(0, 0),
            assumed=(False, False),
            tie_key=(1, 2),
            ordering_ratio=Fraction(1, 50),
            buying=buying,
        )
        assert (cheapest_layout(problem) is not None) == fits
    assert needed_mm(problem, 0, 1) == 1_022


def test_a_wrong_layout_is_never_returned() -> None:
    """The check of the answers catches every figure that is off."""
    problem = random_span(0)
    seed = 0
    layout = None
    while layout is None or len(layout.sections) < 2:
        seed += 1
        problem = random_span(seed)
        layout = cheapest_layout(problem)
    section = layout.sections[0]
    wrong = [
        replace(layout, cost_cents=layout.cost_cents + 1),
        replace(layout, lower_bound_cents=layout.cost_cents - 1),
        replace(layout, lower_bound_cents=layout.cost_cents + 1),
        replace(layout, places=(0, *layout.places)),
        replace(layout, places=layout.places[:-1]),
        replace(layout, sections=layout.sections[:-1]),
    ]
    for field, step in (("sheath_mm", 1), ("needed_mm", 1), ("reel_mm", 1), ("price_cents", 1)):
        changed = replace(section, **{field: getattr(section, field) - step})
        wrong.append(replace(layout, sections=(changed, *layout.sections[1:])))
    for bad in wrong:
        with pytest.raises(AssertionError, match="reel search gave a wrong layout"):
            check_layout(problem, bad)
    check_layout(problem, layout)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"chain_mm": (0, 5, 3)}, "not in order"),
        ({"leave_mm": (0, 99, 6)}, "negative length"),
        ({"tie_key": (1, 2)}, "columns"),
        ({"joint_cost_cents": (0, -1, 0)}, "-1 is negative"),
    ],
)
def test_numbers_the_search_is_not_exact_for_are_refused(
    changes: dict[str, tuple[int, ...]], message: str
) -> None:
    """A problem whose rulers run backwards or whose costs are negative is refused."""
    problem = SpanProblem(
        chain_mm=(0, 3, 6),
        arrive_mm=(0, 3, 6),
        leave_mm=(0, 3, 6),
        joint_cost_cents=(0, 1, 0),
        assumed=(False,) * 3,
        tie_key=(1, 2, 3),
        ordering_ratio=Fraction(0),
        buying=Buying(put_ups_mm=(9,), cable_cents_per_m=Fraction(1), reel_each_cents=0),
    )
    with pytest.raises(RangeError, match=message):
        replace(problem, **changes)  # type: ignore[arg-type]


def wide_span(seed: int) -> SpanProblem:
    """Return an invented span of dozens of places whose sections reach over many of them."""
    rng = random.Random(seed)
    count = rng.randint(25, 60)
    chain = [0]
    for _ in range(count - 1):
        chain.append(chain[-1] + rng.choice([0, 1, rng.randint(1, 90)]))
    tail = rng.choice((0, 0, 4, 120))
    tails = [rng.choice((0, tail, rng.randint(0, tail))) for _ in range(count)]
    cuts = sorted(rng.sample(range(chain[-1]), 4))
    return SpanProblem(
        chain_mm=tuple(chain),
        arrive_mm=tuple(at + tail for at, tail in zip(chain, tails, strict=True)),
        leave_mm=tuple(at - tail for at, tail in zip(chain, tails, strict=True)),
        joint_cost_cents=tuple(rng.choice((0, 3, 3, 3, 50)) for _ in range(count)),
        assumed=tuple(rng.random() < 0.5 for _ in range(count)),
        tie_key=tuple(rng.getrandbits(64) for _ in range(count)),
        ordering_ratio=rng.choice([Fraction(0), Fraction(1, 50), Fraction(3, 70)]),
        buying=Buying(
            put_ups_mm=rng.choice([(), (150, 999), (110, 390, 999)]),
            made_max_mm=rng.choice([0, 600, 815]),
            round_up_mm=rng.choice([1, 9, 40, 150]),
            cable_cents_per_m=rng.choice(
                [Fraction(0), Fraction(1100, 3), Fraction(1000), Fraction(1000)]
            ),
            reel_each_cents=rng.choice([0, 0, 60]),
        ),
        limits=(
            PlacementLimit(placement="duct", most_mm=350, intervals_mm=((cuts[0], cuts[2]),)),
            PlacementLimit(placement="buried", most_mm=450, intervals_mm=((cuts[1], cuts[3]),)),
        )[: rng.choice([0, 0, 1, 2])],
    )


def by_layers(problem: SpanProblem) -> list[tuple[tuple[int, ...], tuple[int, ...]] | None]:
    """Return for every number of joints the best layout, by the plainest dynamic programming."""
    count = len(problem.chain_mm)
    arcs = [
        (i, j, price)
        for j in range(count)
        for i in range(j)
        if (price := section_cost(problem, i, j)) is not None
    ]
    layer = {0: ((0, 0, 0, 0), (0,))}
    answers = []
    for _ in range(count - 1):
        following: dict[int, tuple[tuple[int, ...], tuple[int, ...]]] = {}
        for i, j, price in arcs:
            if i not in layer:
                continue
            own = (problem.joint_cost_cents[j], 1, problem.assumed[j], problem.tie_key[j])
            step = (0, 0, 0, 0) if j == count - 1 else own
            value = tuple(map(sum, zip(layer[i][0], step, (price, 0, 0, 0), strict=True)))
            reached = (value, (*layer[i][1], j))
            following[j] = min(following.get(j, reached), reached)
        answers.append(following.get(count - 1))
        layer = following
    return answers


@pytest.mark.parametrize("block", range(4))
def test_equals_plain_dynamic_programming(block: int) -> None:
    """On dozens of places the free, limited and one-fewer optima equal the plainest search."""
    limited = 0
    for seed in range(block * 30, block * 30 + 30):
        problem = wide_span(seed)
        layers = by_layers(problem)
        solved = [found for found in layers if found is not None]
        layout = cheapest_layout(problem)
        if not solved:
            assert layout is None
            continue
        assert layout is not None
        assert layout.places == min(solved)[1], seed
        fewer = one_joint_fewer(problem, layout)
        expected = layers[layout.joint_count - 1] if layout.joint_count else None
        assert (fewer and fewer.places) == (expected and expected[1]), seed
        for most in range(layout.joint_count):
            within = [found for found in layers[: most + 1] if found is not None]
            bound = cheapest_layout(replace(problem, joints_most=most))
            assert (bound and bound.places) == (min(within)[1] if within else None), (seed, most)
            limited += bool(within)
    assert limited > 3
