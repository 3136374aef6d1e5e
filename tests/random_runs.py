"""Runs drawn from seeds: every placement, reach points, loops, crossings and house rules."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from routeplan.run.model import Line, Place, Run
from tests.drawn_runs import lonlat, make_line, make_place, make_run

PLACEMENTS = ("aerial", "duct", "buried", "surface", "indoor", "bridge", "water")
REACH = ("handhole", "maintenance_hole", "pole", "cabinet", "pedestal", "building")
RULES = (
    "",
    "[joints]\nassumed_spacing_m = 60",
    '[reels]\nbuy = ["to-length"]\nmax_m = 1500\nround_up_m = 7',
    '[reels]\nbuy = ["to-length", "put-ups"]\nmax_m = 900\nput_ups_m = [400, 1000, 2500]',
    "[slack]\nloop_every_m = { aerial = 90, duct = 150, buried = 200 }\n"
    "loop_m = { buried = 9.5 }\nordering_ratio = 0.013\n"
    "[joints]\nmax_section_m = { aerial = 700, duct = 900 }\nassumed_spacing_m = 75",
    "[slack]\nloop_every_m = {}\nentry_m = 0\nriser_m = 3.3333\nracking_m = 0.0005\n"
    "[costs]\njoint_each = 33.33\n[reels]\nput_ups_m = [500, 700, 1100]",
)


def random_run(seed: int, *, with_existing: bool = True) -> Run:
    """Return a run of one leg between two sites, up to some kilometres long."""
    rng = np.random.default_rng(seed)
    lines = _random_lines(rng, with_existing=with_existing)
    metres = np.concatenate([line.lonlat for line in lines])
    places = _random_places(rng, metres)
    ends = [
        make_place("site", lines[0].lonlat[0], "Studio", role="studio"),
        make_place("site", lines[-1].lonlat[-1], "Mast", role="transmitter"),
    ]
    return make_run(lines, [*ends, *places], toml=RULES[int(rng.integers(len(RULES)))])


def _random_lines(rng: np.random.Generator, *, with_existing: bool) -> list[Line]:
    count = int(rng.integers(1, 6))
    heading = rng.uniform(0, 2 * np.pi)
    at = np.zeros(2)
    lines = []
    for number in range(count):
        vertices = [at]
        for _ in range(int(rng.integers(1, 9))):
            heading += rng.normal(0, 0.3)
            step = float(rng.integers(5, 260)) + 0.5 * int(rng.integers(0, 2))
            at = at + step * np.array([np.cos(heading), np.sin(heading)])
            vertices.append(at)
        is_existing = with_existing and rng.random() < 0.15
        placement = "existing" if is_existing else str(rng.choice(PLACEMENTS))
        more: dict[str, Any] = {}
        if rng.random() < 0.4:
            more["heights_m"] = rng.uniform(0, 6, len(vertices))
        if is_existing and rng.random() < 0.7:
            more["existing_m"] = round(float(rng.uniform(1500, 3000)), 4)
        name = f"Line {number}"
        lines.append(make_line(lonlat(*map(tuple, vertices)), placement, name=name, **more))
    return lines


def _random_places(rng: np.random.Generator, positions: Any) -> list[Place]:
    places = []
    for number in range(int(rng.integers(0, 14))):
        k = int(rng.integers(0, len(positions) - 1))
        share = rng.choice([0.0, 0.5, float(rng.random())])
        spot = positions[k] + share * (positions[k + 1] - positions[k])
        spot = spot + rng.normal(0, 4e-5, 2) * rng.integers(0, 2)
        if rng.random() < 0.2:
            more: dict[str, Any] = {"crosses": str(rng.choice(["road", "rail", "water", "power"]))}
            more["width_m"] = rng.choice([None, 5.0, 33.333])
            places.append(make_place("crossing", spot, f"Crossing {number}", **more))
            continue
        more = {"joint_cost_factor": float(rng.choice([1.0, 1.0, 1.5]))}
        if rng.random() < 0.4:
            more["joint"] = str(rng.choice(["yes", "avoid", "no"]))
        if rng.random() < 0.3:
            more["loop_m"] = float(rng.choice([0.0, 12.0, 7.777]))
        places.append(make_place(str(rng.choice(REACH)), spot, f"Reach {number}", **more))  # type: ignore[arg-type]
    return places


def reversed_run(run: Run) -> Run:
    """Return the same run with every line drawn the other way, the last one first."""
    lines = [
        replace(
            line,
            lonlat=line.lonlat[::-1],
            datum_lonlat=line.datum_lonlat[::-1],
            heights_m=None if line.heights_m is None else line.heights_m[::-1],
            is_drawn=None if line.is_drawn is None else line.is_drawn[::-1],
        )
        for line in reversed(run.lines)
    ]
    return replace(run, lines=tuple(lines), places=tuple(reversed(run.places)))
