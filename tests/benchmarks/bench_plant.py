"""Print how long a plant of many cables, joints and fibres takes to plan, without sheets."""

from __future__ import annotations

import gc
import statistics
import time

from routeplan.planning import plan, splices
from routeplan.run.model import Run
from tests.drawn_runs import lonlat, make_line, make_place, make_run

CABLES = 10
ROUNDS = 5


def plant(*, fibre_count: int, joints: int) -> Run:
    """Return a chain of ten cables between sites and branches, each cut by the same joints."""
    sections = joints // CABLES
    step_m = 1000.0
    lines, places, toml = [], [], [f"[cable]\nfibre_count = {fibre_count}\n"]
    for number in range(CABLES):
        start, end = number * sections * step_m, (number + 1) * sections * step_m
        lines.append(make_line(lonlat((0, start), (0, end)), "duct", leg=f"leg {number}"))
        places.append(make_place("site", lonlat((0, start))[0], f"Site {number}"))
        if number:
            toml.append(f'[cables."Way {number}"]\nlegs = ["leg {number}"]\n')
    places.append(make_place("site", lonlat((0, CABLES * sections * step_m))[0], f"Site {CABLES}"))
    toml.append(
        "[reels]\nput_ups_m = [1100]\n[joints]\nassumed_spacing_m = 500\n"
        "[slack]\nloop_every_m = {}\n"
    )
    for number in range(fibre_count // 2):
        one, other = number % CABLES, (number * 7 + 3) % CABLES
        toml.append(
            f'[[circuit]]\nname = "Circuit {number}"\nfrom = "Site {one}"\n'
            f'to = "Site {other if other != one else CABLES}"\nfibre_count = 2\n'
        )
    return make_run(lines, places, toml="".join(toml))


def plan_ms(run: Run) -> float:
    """Return the median time to plan a run. [ms]"""
    times = []
    for _ in range(ROUNDS):
        gc.collect()
        begin = time.perf_counter()
        plan(run)
        times.append(1000 * (time.perf_counter() - begin))
    return statistics.median(times)


def main() -> None:
    """Print times for rising fibres, and of the schedule for each splice in it."""
    for fibre_count, joints in ((24, 50), (288, 50), (288, 100), (576, 50)):
        run = plant(fibre_count=fibre_count, joints=joints)
        planned = plan(run)
        begin = time.perf_counter()
        rows = splices(planned)
        schedule_ms = 1000 * (time.perf_counter() - begin)
        print(
            f"{fibre_count:4} fibres, {len(planned.layout.joints):3} joints, "
            f"{len(run.circuits):3} circuits: plan {plan_ms(run):8.1f} ms, "
            f"schedule of {len(rows):6} rows {schedule_ms:7.1f} ms, "
            f"{1000 * schedule_ms / max(1, len(rows)):5.1f} us a row"
        )


if __name__ == "__main__":
    main()
