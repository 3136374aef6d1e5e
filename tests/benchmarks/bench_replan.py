"""Print how fast a plan follows a dragged vertex, in this process and without sheets."""

from __future__ import annotations

import gc
import statistics
import tempfile
import time
from dataclasses import replace
from pathlib import Path

from routeplan.memo import Memo
from routeplan.planning import plan
from routeplan.run import read_run
from routeplan.run.model import Run
from routeplan.sheets.document import plan_document
from tests.benchmarks.inputs import write_long_run

MOVES = 30


def moved(run: Run, number: int) -> Run:
    """Return the run with one vertex dragged by some metres, another one for every number."""
    at = number % len(run.lines)
    line = run.lines[at]
    lonlat = line.lonlat.copy()
    lonlat[10 + (37 * number) % (len(lonlat) - 20)] += [2e-5, 1e-5]
    new = replace(line, lonlat=lonlat, datum_lonlat=lonlat)
    return replace(run, lines=(*run.lines[:at], new, *run.lines[at + 1 :]))


def times_ms(runs: list[Run], memo: Memo | None) -> tuple[list[float], list[float]]:
    """Return wall and processor times of planning each run in turn. [ms]"""
    wall, processor = [], []
    for run in runs:
        gc.collect()
        begin = time.perf_counter(), time.process_time()
        plan(run, memo=memo)
        wall.append(1000 * (time.perf_counter() - begin[0]))
        processor.append(1000 * (time.process_time() - begin[1]))
    return wall, processor


def main() -> None:
    """Print medians over the moved vertices, with and without a memo, and compare the plans."""
    with tempfile.TemporaryDirectory() as folder:
        run = read_run(write_long_run(Path(folder)))
    memo = Memo()
    first_ms = times_ms([run], memo)[0][0]
    runs = [moved(run, number) for number in range(MOVES)]
    wall, processor = times_ms(runs, memo)
    fresh_wall, _ = times_ms(runs, None)
    steady = with_title(run)
    unmoved, _ = times_ms([steady] * MOVES, memo)
    same = plan_document(plan(runs[-1], memo=memo)) == plan_document(plan(runs[-1]))
    leg = plan(run).ground.legs[0]
    print(f"{leg.length_mm / 1e6:.0f} km, {len(leg.lonlat)} vertices, {len(leg.points)} points")
    print(f"  first plan                      {first_ms:7.1f} ms")
    print(
        f"  one vertex moved, with a memo   {statistics.median(wall):7.1f} ms (median of {MOVES})"
    )
    print(f"    least and most                {min(wall):7.1f} ms {max(wall):7.1f} ms")
    print(f"    processor time                {statistics.median(processor):7.1f} ms")
    print(f"  the same without a memo         {statistics.median(fresh_wall):7.1f} ms")
    print(f"  nothing of the ground changed   {statistics.median(unmoved):7.1f} ms")
    print(f"  equal to a fresh plan           {same}")


def with_title(run: Run) -> Run:
    """Return the run with another title: nothing that is computed hangs on it."""
    return replace(run, title="Another")


if __name__ == "__main__":
    main()
