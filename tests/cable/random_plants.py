"""Trees, rings and stars of cables drawn from seeds, with sites, branches and circuits."""

from __future__ import annotations

import numpy as np

from routeplan.run.model import Run
from tests.drawn_runs import lonlat, make_line, make_place, make_run

SHAPES = ("tree", "ring", "star")


def random_plant(seed: int) -> Run:
    """Return a run of a few legs between nodes, some of them sites, cables through several."""
    rng = np.random.default_rng(seed)
    shape = SHAPES[seed % 3]
    count = int(rng.integers(3, 8))
    edges = _edges(shape, count, rng)
    positions = _positions(shape, count, rng)
    degree = np.bincount(np.ravel(edges), minlength=count)
    is_site = (degree == 1) | (rng.random(count) < 0.4)
    is_site[rng.permutation(count)[:2]] = True
    places = [
        make_place("site", lonlat(positions[node])[0], f"Site {node}")
        for node in range(count)
        if is_site[node]
    ]
    for node in np.flatnonzero(~is_site):
        if rng.random() < 0.5:
            places.append(make_place("handhole", lonlat(positions[node])[0], f"Hole {node}"))
    lines = []
    for number, (start, end) in enumerate(edges):
        named = {"cable": f"Way {rng.integers(1, 3)}"} if rng.random() < 0.7 else {}
        ends = (positions[start], positions[end])
        lines.append(make_line(lonlat(*ends), "duct", leg=f"leg {number}", **named))
    return make_run(lines, places, toml=_toml(rng, np.flatnonzero(is_site), len(edges)))


def _edges(shape: str, count: int, rng: np.random.Generator) -> list[tuple[int, int]]:
    if shape == "ring":
        edges = [(node, (node + 1) % count) for node in range(count)]
    elif shape == "star":
        edges = [(0, node) for node in range(1, count)]
    else:
        edges = [(int(rng.integers(0, node)), node) for node in range(1, count)]
    return [pair if rng.random() < 0.5 else pair[::-1] for pair in edges]


def _positions(shape: str, count: int, rng: np.random.Generator) -> list[tuple[float, float]]:
    """Return positions round a middle, askew, so that no end lies on another line."""
    found = []
    for node in range(count):
        angle = 2 * np.pi * (node + rng.uniform(0.1, 0.4)) / count
        radius = 0.0 if shape == "star" and node == 0 else rng.uniform(600, 1500)
        found.append((float(radius * np.cos(angle)), float(radius * np.sin(angle))))
    return found


def _toml(rng: np.random.Generator, sites: np.ndarray, edge_count: int) -> str:
    parts = [
        f"[cable]\nfibre_count = {rng.choice([4, 8, 24])}\nfibres_per_tube = {rng.choice([4, 6])}\n"
        f'terminate = "{rng.choice(["circuits", "all"])}"\n',
        "[slack]\nloop_every_m = {}\n"
        "[reels]\nput_ups_m = [700, 1500]\n[joints]\nassumed_spacing_m = 300\n",
    ]
    if rng.random() < 0.4:  # one beside another on one leg
        leg = int(rng.integers(0, edge_count))
        parts.append(f'[cables.One]\nlegs = ["leg {leg}"]\nfibre_count = 6\n')
        parts.append(f'[cables.Two]\nlegs = ["leg {leg}"]\n')
    for number in range(int(rng.integers(1, 6))):
        ends = rng.permutation(sites)[:2]
        parts.append(
            f'[[circuit]]\nname = "Circuit {number}"\nfrom = "Site {ends[0]}"\n'
            f'to = "Site {ends[1]}"\nfibre_count = {rng.integers(1, 3)}\n'
        )
    return "".join(parts)
