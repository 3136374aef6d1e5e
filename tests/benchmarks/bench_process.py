"""
Print how long planning a long leg takes as a process, against one that only reads the file.

Both run on compiled modules, as an installed package does: compiled to a folder of the benchmark's
own, whatever the environment says of writing byte code, by one run of each that does not count.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.benchmarks.inputs import write_long_run

RUNS = 7
READ_ONLY = "import sys, geopandas, folium; geopandas.read_file(sys.argv[1])"


def seconds(*code: str, compiled: str) -> tuple[float, float]:
    """Return how long a process computes, for itself and in the system, and how long it takes."""
    environment = {**os.environ, "PYTHONPYCACHEPREFIX": compiled}
    environment.pop("PYTHONDONTWRITEBYTECODE", None)
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    begin = time.perf_counter()
    command = [sys.executable, *code]
    done = subprocess.run(command, check=False, capture_output=True, env=environment)
    wall_s = time.perf_counter() - begin
    if done.returncode:
        raise SystemExit(done.stderr.decode())
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime, wall_s


def main() -> None:
    """Print the medians and their ratio; the two take turns, so that load falls on both."""
    with tempfile.TemporaryDirectory() as folder:
        route = write_long_run(Path(folder))
        out, compiled = str(Path(folder) / "out"), str(Path(folder) / "compiled")
        peer, own = [], []
        for _ in range(1 + RUNS):
            peer.append(seconds("-c", READ_ONLY, str(route), compiled=compiled))
            plan = ("-m", "routeplan", "plan", str(route), "--out", out)
            own.append(seconds(*plan, compiled=compiled))
        size = sum(path.stat().st_size for path in Path(out).iterdir())
    print("100 km leg, 5,000 vertices, 500 reach points; medians of processor and wall time")
    peer_s, own_s = median(peer[1:]), median(own[1:])
    print(f"import geopandas and folium, read the file   {peer_s[0]:5.2f} s  {peer_s[1]:5.2f} s")
    print(f"routeplan plan, all sheets ({size / 1e6:.1f} MB)         {own_s[0]:5.2f} s", end="")
    print(f"  {own_s[1]:5.2f} s, {own_s[0] / peer_s[0]:.2f}x  {own_s[1] / peer_s[1]:.2f}x")


def median(pairs: list[tuple[float, float]]) -> tuple[float, float]:
    """Return the medians of processor and wall time, each for itself."""
    cpu_s, wall_s = (sorted(column)[len(column) // 2] for column in zip(*pairs, strict=True))
    return cpu_s, wall_s


if __name__ == "__main__":
    main()
