"""Where a leg runs along a line: near it and nearly parallel, for some length."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from routeplan.ground.crossing_segments import FeatureSegments, LegSegments, Pairs, Whole
from routeplan.run.model import Floats

__all__ = ["Alongside", "alongside", "alongside_intervals"]

Key = tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Alongside:
    """A length of a leg that runs along a feature, or along several of one name end to end."""

    leg: int
    feature: int
    start_m: float
    end_m: float


def alongside_intervals(
    legs: LegSegments,
    features: FeatureSegments,
    pairs: Pairs,
    *,
    distance_m: float,
    angle_deg: float,
) -> tuple[Whole, Whole, Floats, Floats]:
    """
    Return the parts of steps that are near to segments nearly parallel to them.

    Parameters
    ----------
    legs
        The legs' steps.
    features
        The features' segments.
    pairs
        Pairs that may be near each other.
    distance_m
        Farthest to the side. [m]
    angle_deg
        Largest angle between step and segment. [deg]

    Returns
    -------
    leg, feature
        Whose interval it is, shape (n,) each. [-]
    start_m, end_m
        Ground metres along the leg, shape (n,) each. [m]
    """
    span = pairs.far - pairs.near
    across = pairs.along[:, 0] * span[:, 1] - pairs.along[:, 1] * span[:, 0]
    with_it = (pairs.along * span).sum(axis=1)
    keep = np.flatnonzero(np.abs(across) <= np.tan(np.radians(angle_deg)) * np.abs(with_it))
    along, near, far = pairs.along[keep], pairs.near[keep], pairs.far[keep]
    step_m = np.hypot(*along.T)
    unit = along / step_m[:, None]
    t = [(end * unit).sum(axis=1) for end in (near, far)]  # along the step
    h = [unit[:, 0] * end[:, 1] - unit[:, 1] * end[:, 0] for end in (near, far)]  # to its left
    low, high = np.zeros(len(keep)), np.ones(len(keep))  # shares of the segment
    for value, least, most in ((t, 0.0, step_m), (h, -distance_m, distance_m)):
        rise = value[1] - value[0]
        with np.errstate(divide="ignore", invalid="ignore"):
            bounds = np.stack([(least - value[0]) / rise, (most - value[0]) / rise])
        level = rise == 0.0
        inside = (value[0] >= least) & (value[0] <= most)
        begin = np.where(level, np.where(inside, 0.0, 2.0), bounds.min(axis=0))
        end = np.where(level, np.where(inside, 1.0, -1.0), bounds.max(axis=0))
        low, high = np.maximum(low, begin), np.minimum(high, end)
    real = np.flatnonzero(low < high)
    step, segment = pairs.step[keep][real], pairs.segment[keep][real]
    share = [((t[0] + v * (t[1] - t[0])) / step_m)[real] for v in (low, high)]
    reach = legs.stop_m[step] - legs.start_m[step]
    ends = [legs.start_m[step] + np.clip(part, 0.0, 1.0) * reach for part in share]
    feature = features.feature[features.part[segment]]
    return legs.leg[step], feature, np.minimum(*ends), np.maximum(*ends)


def alongside(
    intervals: tuple[Whole, Whole, Floats, Floats],
    keys: Mapping[int, Key | None],
    *,
    gap_m: float,
    length_m: float,
) -> list[Alongside]:
    """
    Return the lengths of legs that run along features, from intervals of single steps.

    Intervals of one feature are one over gaps up to `gap_m`. Features of one key that follow each
    other end to end (a street in several pieces) are one as well; beside each other (two
    carriageways) they stay apart.

    Parameters
    ----------
    intervals
        As by `alongside_intervals`.
    keys
        For every feature what it has in common with others of its name, or None.
    gap_m
        Longest gap that is passed over. [m]
    length_m
        Shorter lengths are left out. [m]
    """
    chains: dict[tuple[int, Key | int], list[Alongside]] = {}
    for one in _united(*intervals, gap_m=gap_m):
        key = keys[one.feature]
        own = chains.setdefault((one.leg, one.feature if key is None else key), [])
        for at, chain in enumerate(own):
            if -gap_m <= one.start_m - chain.end_m <= gap_m:
                own[at] = Alongside(
                    leg=chain.leg,
                    feature=chain.feature,
                    start_m=chain.start_m,
                    end_m=max(chain.end_m, one.end_m),
                )
                break
        else:
            own.append(one)
    return [
        chain for own in chains.values() for chain in own if chain.end_m - chain.start_m >= length_m
    ]


def _united(
    leg: Whole, feature: Whole, start_m: Floats, end_m: Floats, *, gap_m: float
) -> Iterator[Alongside]:
    """Yield the intervals of each leg and feature put together, by leg and start."""
    order = np.lexsort((start_m, feature, leg))
    leg, feature = leg[order], feature[order]
    start_m, end_m = start_m[order], end_m[order]
    if not len(order):
        return
    fresh = np.concatenate([[True], (leg[1:] != leg[:-1]) | (feature[1:] != feature[:-1])])
    # One running maximum serves all: each leg and feature is lifted above the one before.
    lift = (np.cumsum(fresh) - 1) * (2.0 * float(end_m.max()) + 1.0)
    reach = np.maximum.accumulate(end_m + lift)
    fresh[1:] |= start_m[1:] + lift[1:] > reach[:-1] + gap_m
    begins = np.flatnonzero(fresh)
    ends = np.maximum.reduceat(end_m, begins)
    rows = zip(
        *(column[begins].tolist() for column in (leg, feature, start_m)), ends.tolist(), strict=True
    )
    for a, b, start, end in sorted(rows, key=lambda row: (row[0], row[2], row[3], row[1])):
        yield Alongside(leg=a, feature=b, start_m=start, end_m=end)
