"""
Print how fast crossings are found, as ratios to a bare tree query plus intersection.

Run as a module from the project's folder: python -m tests.benchmarks.bench_crossings
"""

from __future__ import annotations

import time
import tracemalloc
from collections.abc import Callable

import numpy as np
import shapely

from routeplan.ground.crossings import find_crossings
from routeplan.ground.features import FeatureLayer, feature_layer, lines_from_arrays
from routeplan.ground.model import Leg
from tests.ground.crossing_layers import leg_of


def street_lines(count: int, *, seed: int = 1) -> FeatureLayer:
    """Return short lines of 2 to 8 vertices, some 100 m long, over 75 by 110 km."""
    rng = np.random.default_rng(seed)
    sizes = rng.integers(2, 9, count)
    number = np.repeat(np.arange(count), sizes)
    walk = np.cumsum(rng.normal(0, 2e-4, (len(number), 2)), axis=0)
    first = np.concatenate([[0], np.cumsum(sizes)[:-1]])
    lonlat = walk - walk[first][number] + rng.uniform(0, 1, (count, 2))[number] + [9.0, 47.0]
    return feature_layer("streets", lines_from_arrays(lonlat, number), kinds=["road"] * count)


def long_leg(vertices: int) -> Leg:
    """Return a winding leg of about 100 km over the lines."""
    share = np.linspace(0.1, 0.85, vertices)
    wind = 0.02 * np.sin(30 * share)
    return leg_of(np.column_stack([9.0 + share, 47.0 + share + wind]))


def bare(leg: Leg, layer: FeatureLayer, *, piece: int) -> int:
    """Query a tree of pieces of the leg with every line, and intersect what meets."""
    way = leg.shape_lonlat
    parts = np.array(
        [shapely.linestrings(way[at : at + piece + 1]) for at in range(0, len(way) - 1, piece)]
    )
    line, part = shapely.STRtree(parts).query(layer.geometries, predicate="intersects")
    met = shapely.intersection(parts[part], layer.geometries[line])
    return len(shapely.get_parts(met))


def timed_s(work: Callable[[], object], *, repeats: int = 5) -> tuple[float, object]:
    """Return the median processor time of some runs and the last result. [s]"""
    times, result = [], None
    for _ in range(repeats):
        begin = time.process_time()
        result = work()
        times.append(time.process_time() - begin)
    return sorted(times)[len(times) // 2], result


def main() -> None:
    """Print the tables."""
    leg = long_leg(10_000)
    print(f"leg of {leg.length_mm / 1e6:.0f} km, {len(leg.shape_lonlat)} vertices")
    for count in (50_000, 200_000, 800_000):
        layer = street_lines(count)
        own, found = timed_s(lambda layer=layer: find_crossings([leg], [layer]))
        tracemalloc.start()
        find_crossings([leg], [layer])
        peak = tracemalloc.get_traced_memory()[1] / 1e6
        tracemalloc.stop()
        crossed = sum(one.how == "crosses" for one in found)
        print(f"  {count:7,} lines: own {own * 1000:6.1f} ms, {crossed} crossings, {peak:.1f} MB")
        for piece in (64, 8):
            plain, points = timed_s(lambda layer=layer, piece=piece: bare(leg, layer, piece=piece))
            print(
                f"    bare, pieces of {piece:2}: {plain * 1000:6.1f} ms, {points} points, "
                f"own/bare {own / plain:.2f}"
            )


if __name__ == "__main__":
    main()
