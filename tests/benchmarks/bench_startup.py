"""Print how long `routeplan --help` takes, as a ratio to an interpreter that does nothing."""

from __future__ import annotations

import subprocess
import sys
import time

RUNS = 15


def seconds(*code: str) -> float:
    """Return how long a process takes. [s]"""
    begin = time.perf_counter()
    subprocess.run([sys.executable, *code], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - begin


def main() -> None:
    """Print the medians and their ratio; the two take turns, so that load falls on both."""
    bare, own = [], []
    for _ in range(RUNS):
        bare.append(seconds("-c", "pass"))
        own.append(seconds("-m", "routeplan", "--help"))
    bare_s, own_s = sorted(bare)[RUNS // 2], sorted(own)[RUNS // 2]
    print(f"python -c pass     {1000 * bare_s:6.0f} ms")
    print(f"routeplan --help   {1000 * own_s:6.0f} ms, {own_s / bare_s:.1f}x")


if __name__ == "__main__":
    main()
