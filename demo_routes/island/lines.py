"""Small geometry on lines of the local frame: lengths, cutting, smoothing, setting aside."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np

from island.frame import Floats

__all__ = [
    "along_m",
    "cross_points",
    "cut",
    "densify",
    "distance_to_line",
    "nearest",
    "point_at",
    "resample",
    "set_aside",
    "simplify",
    "smooth",
    "through",
]


def along_m(line: Floats) -> Floats:
    """Return the distance of every vertex from the start of its line. [m]"""
    return np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))])


def point_at(line: Floats, at_m: float | Sequence[float] | Floats) -> Floats:
    """Return the points that lie so far along a line."""
    chain = along_m(line)
    return np.stack([np.interp(at_m, chain, line[:, k]) for k in (0, 1)], axis=-1)


def cut(line: Floats, from_m: float, to_m: float) -> Floats:
    """Return the part of a line between two distances along it, with the vertices between."""
    chain = along_m(line)
    inside = (chain > from_m + 12.0) & (chain < to_m - 12.0)  # no sliver at a cut
    return np.vstack([point_at(line, from_m), line[inside], point_at(line, to_m)])


def densify(line: Floats, longest_m: float) -> Floats:
    """Divide segments longer than this into equal parts; keep every vertex."""
    parts = [line[:1]]
    for a, b in pairwise(line):
        count = max(1, int(np.ceil(np.hypot(*(b - a)) / longest_m)))
        steps = np.arange(1, count + 1)[:, None] / count
        parts.append(a + (b - a) * steps)
    return np.vstack(parts)


def resample(line: Floats, step_m: float) -> Floats:
    """Return the line with vertices at equal steps near this one, its ends kept."""
    length_m = along_m(line)[-1]
    count = max(1, round(length_m / step_m))
    return point_at(line, np.linspace(0.0, length_m, count + 1))


def simplify(line: Floats, tolerance_m: float) -> Floats:
    """Leave out vertices that lie nearer than this to the line without them (Douglas-Peucker)."""
    keep = np.zeros(len(line), dtype=bool)
    keep[[0, -1]] = True
    pending = [(0, len(line) - 1)]
    while pending:
        first, last = pending.pop()
        if last - first < 2:
            continue
        between = line[first + 1 : last]
        far = distance_to_line(between, line[[first, last]])
        worst = int(np.argmax(far))
        if far[worst] > tolerance_m:
            middle = first + 1 + worst
            keep[middle] = True
            pending += [(first, middle), (middle, last)]
    return line[keep]


def smooth(line: Floats, rounds: int = 3) -> Floats:
    """Cut the corners of a line a few times (Chaikin), its ends kept."""
    for _ in range(rounds):
        near = 0.75 * line[:-1] + 0.25 * line[1:]
        far = 0.25 * line[:-1] + 0.75 * line[1:]
        line = np.vstack([line[:1], np.stack([near, far], axis=1).reshape(-1, 2)[1:-1], line[-1:]])
    return line


def through(points: Sequence[tuple[float, float]], step_m: float) -> Floats:
    """Return a smooth line through control points (Catmull-Rom), with vertices at equal steps."""
    p = np.asarray(points, dtype=float)
    p = np.vstack([2 * p[0] - p[1], p, 2 * p[-1] - p[-2]])
    t = np.linspace(0.0, 1.0, 20, endpoint=False)[:, None]
    parts = []
    for a, b, c, d in zip(p[:-3], p[1:-2], p[2:-1], p[3:], strict=True):
        curve = 2 * b + (c - a) * t + (2 * a - 5 * b + 4 * c - d) * t**2
        parts.append(0.5 * (curve + (3 * b - a - 3 * c + d) * t**3))
    return resample(np.vstack([*parts, p[-2:-1]]), step_m)


def set_aside(line: Floats, left_m: float) -> Floats:
    """Return the line moved to its left, corners mitred; for gentle lines and small moves."""
    step = np.diff(line, axis=0)
    unit = step / np.hypot(*step.T)[:, None]
    normal = np.stack([-unit[:, 1], unit[:, 0]], axis=1)
    before, after = np.vstack([normal[:1], normal]), np.vstack([normal, normal[-1:]])
    mitre = before + after
    aside: Floats = line + left_m * 2 * mitre / np.sum(mitre**2, axis=1)[:, None]
    return aside


def distance_to_line(points: Floats, line: Floats) -> Floats:
    """Return the distance of each point to the nearest place of a line. [m]"""
    return nearest(points, line)[0]


def nearest(points: Floats, line: Floats) -> tuple[Floats, Floats]:
    """Return how far each point is from a line, and how far along the line that place is. [m]"""
    points = np.atleast_2d(points)
    chain = along_m(line)
    best = np.full(len(points), np.inf)
    where = np.zeros(len(points))
    for k, (a, b) in enumerate(pairwise(line)):
        step = b - a
        t = np.clip((points - a) @ step / (step @ step), 0.0, 1.0)
        far = np.hypot(*(points - a - t[:, None] * step).T)
        nearer = far < best
        best = np.where(nearer, far, best)
        where = np.where(nearer, chain[k] + t * (chain[k + 1] - chain[k]), where)
    return best, where


def cross_points(line: Floats, other: Floats) -> list[float]:
    """Return how far along the line each place is where it crosses the other one. [m]"""
    chain = along_m(line)
    start, step = other[:-1], np.diff(other, axis=0)
    found = []
    for k, (a, b) in enumerate(pairwise(line)):
        d = b - a
        denominator = d[0] * step[:, 1] - d[1] * step[:, 0]
        parallel = np.abs(denominator) < 1e-9
        safe = np.where(parallel, 1.0, denominator)
        gap = start - a
        t = (gap[:, 0] * step[:, 1] - gap[:, 1] * step[:, 0]) / safe
        u = (gap[:, 0] * d[1] - gap[:, 1] * d[0]) / safe
        hit = ~parallel & (t >= 0) & (t < 1) & (u >= 0) & (u < 1)
        found += [chain[k] + float(s) * (chain[k + 1] - chain[k]) for s in t[hit]]
    return sorted(found)
