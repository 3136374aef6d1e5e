"""Print how fast the reel search is, as ratios to an independent solver and to itself."""

from __future__ import annotations

import random
import time
from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction

import numpy as np
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array

from routeplan.cable.reel_models import (
    Buying,
    SpanLayout,
    SpanProblem,
    longest_reel_mm,
    needed_mm,
    reel_for,
)
from routeplan.cable.reels import cheapest_layout, one_joint_fewer

MONEY = {"cable_cents_per_m": Fraction(120), "reel_each_cents": 12_000}
WAYS = {
    "put-ups": Buying(put_ups_mm=(2_000_000, 4_000_000, 6_000_000), **MONEY),
    "to-length": Buying(made_max_mm=6_000_000, round_up_mm=10_000, **MONEY),
    "both": Buying(
        put_ups_mm=(2_000_000, 4_000_000, 6_500_000),
        made_max_mm=6_000_000,
        round_up_mm=10_000,
        **MONEY,
    ),
}


def long_span(count: int, buying: Buying, *, seed: int = 1) -> SpanProblem:
    """Return a span of places about 200 m apart, some on poles and some to avoid."""
    rng = random.Random(seed)
    chain = [0]
    for _ in range(count - 1):
        chain.append(chain[-1] + rng.randint(3_000, 397_000))
    tails = [rng.choice((15_000, 15_000, 15_000, 22_000)) for _ in range(count)]
    return SpanProblem(
        chain_mm=tuple(chain),
        arrive_mm=tuple(at + tail for at, tail in zip(chain, tails, strict=True)),
        leave_mm=tuple(at - tail for at, tail in zip(chain, tails, strict=True)),
        joint_cost_cents=tuple(rng.choice((88_200, 88_200, 268_200)) for _ in range(count)),
        assumed=(False,) * count,
        tie_key=tuple(rng.getrandbits(64) for _ in range(count)),
        ordering_ratio=Fraction(1, 50),
        buying=buying,
    )


def solver(problem: SpanProblem) -> Callable[[], int]:
    """Return the integer program, built: a binary for every arc, one unit of flow."""
    count, longest = len(problem.chain_mm), longest_reel_mm(problem.buying)
    starts, ends, costs = [], [], []
    for start in range(count):
        for end in range(start + 1, count):
            needed = needed_mm(problem, start, end)
            if needed > longest + 100_000:
                break
            reel = reel_for(problem.buying, needed)
            if reel is not None:
                starts.append(start)
                ends.append(end)
                costs.append(reel[0] + (problem.joint_cost_cents[end] if end < count - 1 else 0))
    arcs = np.arange(len(starts))
    rows = np.concatenate([starts, ends])
    signs = np.concatenate([np.ones(len(arcs)), -np.ones(len(arcs))])
    flow = csr_array((signs, (rows, np.concatenate([arcs, arcs]))), shape=(count, len(arcs)))
    net = np.zeros(count)
    net[0], net[-1] = 1, -1

    def solve() -> int:
        answer = milp(
            np.array(costs, float),
            integrality=np.ones(len(arcs)),
            bounds=Bounds(0, 1),
            constraints=LinearConstraint(flow, net, net),
            options={"mip_rel_gap": 0},
        )
        return round(answer.fun)

    return solve


def timed(work: Callable[[], object], *, repeats: int) -> tuple[float, object]:
    """Return the median time of some runs [ms] and the last result."""
    times, result = [], None
    for _ in range(repeats):
        begin = time.perf_counter()
        result = work()
        times.append((time.perf_counter() - begin) * 1000)
    return sorted(times)[len(times) // 2], result


def main() -> None:
    """Print the tables."""
    print(
        "1,000 places (200 km), search against scipy.optimize.milp (HiGHS), its model built before"
    )
    for name, buying in WAYS.items():
        problem = long_span(1000, buying)
        own_ms, layout = timed(lambda problem=problem: cheapest_layout(problem), repeats=15)
        solver_ms, cost = timed(solver(problem), repeats=3)
        assert isinstance(layout, SpanLayout)
        same = "same cost" if layout.cost_cents == cost else f"COSTS DIFFER: {cost}"
        print(
            f"  {name:10} {own_ms:7.2f} ms {solver_ms:8.0f} ms {solver_ms / own_ms:6.0f}x  {same}"
        )
    print("growth: microseconds a place")
    for name, buying in WAYS.items():
        row = []
        for count in (1_000, 10_000, 50_000):
            problem = long_span(count, buying)
            own_ms, _ = timed(lambda problem=problem: cheapest_layout(problem), repeats=3)
            row.append(f"{count:,}: {own_ms * 1000 / count:.2f}")
        print(f"  {name:10} " + "  ".join(row))
    print("1,000 places, limits on joints against none")
    for name, buying in WAYS.items():
        problem = long_span(1000, buying)
        free_ms, layout = timed(lambda problem=problem: cheapest_layout(problem), repeats=5)
        assert isinstance(layout, SpanLayout)
        joints = layout.joint_count
        fewer_ms, fewer = timed(
            lambda problem=problem, layout=layout: one_joint_fewer(problem, layout), repeats=3
        )
        print(
            f"  {name:10} {joints} joints; one fewer {'found' if fewer else 'impossible'}", end=""
        )
        print(f" at {fewer_ms / free_ms:.1f}x")
        for cut in (1, 2, 3, 5):
            limited = replace(problem, joints_most=joints - cut)
            own_ms, found = timed(lambda limited=limited: cheapest_layout(limited), repeats=3)
            print(f"    at most {joints - cut}: {own_ms / free_ms:.1f}x {'' if found else 'none'}")


if __name__ == "__main__":
    main()
