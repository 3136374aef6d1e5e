"""Print how long planning a long leg takes as a process, against one that only reads the file."""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

from tests.benchmarks.inputs import write_long_run

RUNS = 7
READ_ONLY = "import sys, geopandas, folium; geopandas.read_file(sys.argv[1])"


def seconds(*code: str) -> float:
    """Return how long a process takes. [s]"""
    begin = time.perf_counter()
    done = subprocess.run([sys.executable, *code], check=False, capture_output=True)
    if done.returncode:
        raise SystemExit(done.stderr.decode())
    return time.perf_counter() - begin


def main() -> None:
    """Print the medians and their ratio; the two take turns, so that load falls on both."""
    with tempfile.TemporaryDirectory() as folder:
        route = write_long_run(Path(folder))
        out = str(Path(folder) / "out")
        peer, own = [], []
        for _ in range(RUNS):
            peer.append(seconds("-c", READ_ONLY, str(route)))
            own.append(seconds("-m", "routeplan", "plan", str(route), "--out", out))
        size = sum(path.stat().st_size for path in Path(out).iterdir())
    peer_s, own_s = sorted(peer)[RUNS // 2], sorted(own)[RUNS // 2]
    print("100 km leg, 5,000 vertices, 500 reach points")
    print(f"import geopandas and folium, read the file   {peer_s:5.2f} s")
    print(f"routeplan plan, all sheets ({size / 1e6:.1f} MB)         {own_s:5.2f} s", end="")
    print(f", {own_s / peer_s:.2f}x")


if __name__ == "__main__":
    main()
