"""Print how long a million stations take on all rulers, against a general geometry library."""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import shapely

from routeplan.cable.rulers import readings
from routeplan.ground.points import position_at
from routeplan.planning import plan
from routeplan.run import read_run
from tests.benchmarks.inputs import write_long_run

STATIONS = 1_000_000
PEER_STATIONS = 3_000  # the peer's time grows with them in proportion: the rest is extrapolated
VERTICES = 10_000


def seconds(work: Callable[[], object], *, repeats: int) -> float:
    """Return the median time of some runs. [s]"""
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return sorted(times)[repeats // 2]


def main() -> None:
    """Print the times and their ratios."""
    with tempfile.TemporaryDirectory() as folder:
        path = write_long_run(Path(folder), vertex_count=VERTICES)
        planned = plan(read_run(path))
    leg, rulers = planned.ground.legs[0], planned.layout.rulers[0]
    line = shapely.LineString(leg.lonlat)
    at_mm = np.sort(np.random.default_rng(1).integers(0, leg.length_mm, STATIONS))
    share = at_mm[:: STATIONS // PEER_STATIONS] / leg.length_mm
    peer_s = seconds(
        lambda: shapely.line_interpolate_point(line, share, normalized=True), repeats=3
    )
    peer_s *= STATIONS / len(share)
    place_s = seconds(lambda: position_at(leg, at_mm), repeats=7)
    rulers_s = seconds(lambda: readings(rulers, at_mm), repeats=7)
    print(f"a million stations on a leg of {len(leg.lonlat):,} vertices")
    print(f"  shapely.line_interpolate_point (extrapolated)  {peer_s:8.1f} s")
    print(f"  position and height                            {place_s:8.3f} s", end="")
    print(f"  {peer_s / place_s:6,.0f}x")
    both_s = place_s + rulers_s
    print(f"  position, height, sheath and glass             {both_s:8.3f} s", end="")
    print(f"  {peer_s / both_s:6,.0f}x")


if __name__ == "__main__":
    main()
