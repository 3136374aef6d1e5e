"""Where a leg goes through areas: entry, exit and the length inside."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
import shapely

from routeplan.ground.crossing_contacts import TOUCH_M, Events
from routeplan.ground.crossing_segments import FeatureSegments, LegSegments, Whole
from routeplan.ground.features import Geometries
from routeplan.run.model import Floats

__all__ = ["Inside", "insides", "positions"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Inside:
    """A length of a leg inside an area; of no length where it only touches the edge."""

    leg: int
    feature: int
    start_m: float
    end_m: float


def insides(
    legs: LegSegments,
    features: FeatureSegments,
    events: Events,
    *,
    geometries: Geometries,
    near: tuple[Whole, Whole],
) -> list[Inside]:
    """
    Return the lengths of legs inside areas, and where they only touch an edge.

    A leg is cut where it meets the area's rings; each piece is inside if its middle is. What
    runs along an edge is not inside.

    Parameters
    ----------
    legs
        The legs' steps.
    features
        The features' segments.
    events
        The meetings of both.
    geometries
        All features.
    near
        Features and legs whose boxes meet.
    """
    met: dict[tuple[int, int], list[tuple[float, float]]] = defaultdict(list)
    owner = features.feature[events.part]
    for leg, feature, start, end in zip(
        *(c.tolist() for c in (events.leg, owner, events.s0_m, events.s1_m)), strict=True
    ):
        met[leg, feature].append((start, max(start, end)))
    found: list[Inside] = []
    is_area = np.isin(shapely.get_type_id(geometries[near[0]]), (3, 6))
    for feature, leg in zip(*(column[is_area].tolist() for column in near), strict=True):
        spans = _inside(legs, leg, geometries[feature], met.get((leg, feature), []))
        found.extend(
            Inside(leg=leg, feature=feature, start_m=start, end_m=end) for start, end in spans
        )
    return found


def _inside(
    legs: LegSegments, leg: int, area: Any, met: list[tuple[float, float]]
) -> Iterator[tuple[float, float]]:
    end_m = float(legs.stop_m[legs.last[leg] - 1])
    cuts = np.unique([0.0, end_m, *(at for pair in met for at in pair)])
    cuts = cuts[np.concatenate([[True], np.diff(cuts) > 2 * TOUCH_M])]
    cuts[-1] = end_m
    if len(cuts) < 2:
        return
    lonlat = positions(legs, leg, 0.5 * (cuts[1:] + cuts[:-1]))
    west, _, east, _ = area.bounds
    lonlat[:, 0] += 360.0 * np.round(((west + east) / 2.0 - lonlat[:, 0]) / 360.0)
    within = shapely.contains_xy(area, lonlat[:, 0], lonlat[:, 1])
    edges = [(a - 2 * TOUCH_M, b + 2 * TOUCH_M) for a, b in met if b > a]
    spans: list[tuple[float, float]] = []
    for (start, end), inside in zip(pairwise(cuts.tolist()), within.tolist(), strict=True):
        if not inside or any(a <= start and end <= b for a, b in edges):
            continue
        if spans and spans[-1][1] == start:
            spans[-1] = (spans[-1][0], end)
        else:
            spans.append((start, end))
    yield from spans
    reach = [(a - 4 * TOUCH_M, b + 4 * TOUCH_M) for a, b in (*spans, *edges)]
    touched = -1.0
    for at, _ in sorted(met):
        if at > touched + 2 * TOUCH_M and not any(a <= at <= b for a, b in reach):
            yield at, at
            touched = at


def positions(legs: LegSegments, leg: int, at_m: Floats) -> Floats:
    """
    Return where places of a leg lie, shape (n, 2). [deg]

    Parameters
    ----------
    legs
        The legs' steps.
    leg
        Number of the leg.
    at_m
        Ground metres from the leg's canonical start, shape (n,). [m]
    """
    first, last = int(legs.first[leg]), int(legs.last[leg])
    at = np.searchsorted(legs.start_m[first:last], at_m, side="right") - 1
    at = np.clip(at, 0, last - first - 1) + first
    length = np.maximum(legs.stop_m[at] - legs.start_m[at], 1e-12)
    share = np.clip((at_m - legs.start_m[at]) / length, 0.0, 1.0)[:, None]
    return np.asarray(legs.begin[at] + share * (legs.end[at] - legs.begin[at]))
