"""Where legs and features meet: crossing, touching, or lying one on the other."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from routeplan.ground.crossing_segments import FeatureSegments, LegSegments, Pairs, Whole
from routeplan.run.model import Floats

__all__ = [
    "TOUCH_M",
    "Contact",
    "Events",
    "chosen_events",
    "contacts",
    "events_of",
    "joined_events",
    "no_events",
]

TOUCH_M = 0.001
"""House rule: nearer than a millimetre is touching; coordinates are no better. [m]"""

_TURN = 2.0 * math.pi


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Events:
    """
    Meetings of single steps with single segments; points, or overlaps with two ends.

    `s0_m`, `s1_m` are ground metres along the leg, `q0_m`, `q1_m` metres along the feature's part
    at the same two places; `is_inner` tells that it is a plain crossing well inside both.
    """

    leg: Whole
    part: Whole
    s0_m: Floats
    s1_m: Floats
    q0_m: Floats
    q1_m: Floats
    angle_deg: Floats
    is_inner: NDArray[np.bool_]


_COLUMNS = tuple(field.name for field in fields(Events))


@dataclass(frozen=True, slots=True, kw_only=True)
class Contact:
    """One meeting of a leg with a line or ring; an overlap runs from `start_m` to `end_m`."""

    leg: int
    part: int
    start_m: float
    end_m: float
    crosses: bool
    angle_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Group:
    """Events at one place of both: ranges of both, and where on the leg the part's ends are."""

    s_low: float
    s_high: float
    q_low: float
    q_high: float
    s_at_q_low: float
    s_at_q_high: float


def events_of(legs: LegSegments, features: FeatureSegments, pairs: Pairs) -> Events:
    """
    Return where pairs of steps and segments meet, within a millimetre.

    Parameters
    ----------
    legs
        The legs' steps.
    features
        The features' segments.
    pairs
        Pairs that may meet.
    """
    step_m, segment_m = np.hypot(*pairs.along.T), np.hypot(*(pairs.far - pairs.near).T)
    size = step_m * segment_m
    across = _cross(pairs.along, pairs.far - pairs.near)
    near_off, far_off = (_cross(pairs.along, end) / step_m for end in (pairs.near, pairs.far))
    begin_off = _cross(pairs.near, pairs.far) / segment_m
    end_off = begin_off + across / segment_m
    lies_on = (np.abs(near_off) < TOUCH_M) & (np.abs(far_off) < TOUCH_M)
    lies_on |= (np.abs(begin_off) < TOUCH_M) & (np.abs(end_off) < TOUCH_M)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = _cross(pairs.near, pairs.far - pairs.near) / across
        u = _cross(pairs.near, pairs.along) / across
        slack = TOUCH_M * size / np.abs(across)  # an end that near lies so far off the meeting
        meets = ~lies_on & (across != 0.0) & (t * step_m >= -slack) & ((t - 1.0) * step_m <= slack)
        meets &= (u * segment_m >= -slack) & ((u - 1.0) * segment_m <= slack)
        inner = (np.minimum(t, 1.0 - t) * step_m > 2 * TOUCH_M + slack) & (
            np.minimum(u, 1.0 - u) * segment_m > 2 * TOUCH_M + slack
        )
    t0, t1, u0, u1 = (np.clip(value, 0.0, 1.0) for value in (t, t, u, u))
    at = np.flatnonzero(lies_on)
    overlap = _overlap(pairs, at, step_m, segment_m)
    for target, value in zip((t0, t1, u0, u1), overlap, strict=True):
        target[at] = value
    meets[at] = (t1[at] - t0[at]) * step_m[at] >= -TOUCH_M
    keep = np.flatnonzero(meets)
    step, segment = pairs.step[keep], pairs.segment[keep]
    reach = legs.stop_m[step] - legs.start_m[step]
    sine = np.minimum(np.abs(across[keep]) / size[keep], 1.0)
    return Events(
        leg=legs.leg[step],
        part=features.part[segment],
        s0_m=legs.start_m[step] + t0[keep] * reach,
        s1_m=legs.start_m[step] + t1[keep] * reach,
        q0_m=features.at_m[segment] + u0[keep] * _segments_m(features, segment),
        q1_m=features.at_m[segment] + u1[keep] * _segments_m(features, segment),
        angle_deg=np.degrees(np.arcsin(sine)),
        is_inner=inner[keep] & ~lies_on[keep],
    )


def joined_events(several: Sequence[Events]) -> Events:
    """Return the events of several as one."""
    return Events(
        **{name: np.concatenate([getattr(one, name) for one in several]) for name in _COLUMNS}
    )


def chosen_events(events: Events, chosen: NDArray[np.bool_]) -> Events:
    """Return some of the events."""
    return Events(**{name: getattr(events, name)[chosen] for name in _COLUMNS})


def no_events() -> Events:
    """Return no event."""
    whole, real = np.zeros(0, dtype=np.int64), np.zeros(0)
    return Events(
        leg=whole,
        part=whole,
        s0_m=real,
        s1_m=real,
        q0_m=real,
        q1_m=real,
        angle_deg=real,
        is_inner=np.zeros(0, dtype=bool),
    )


def _segments_m(features: FeatureSegments, segment: Whole) -> Floats:
    """Return the length of segments of features. [m]"""
    ends = (features.end[segment] - features.begin[segment]) * features.scale[segment]
    return np.asarray(np.hypot(*ends.T))


def _cross(one: Floats, other: Floats) -> Floats:
    return one[:, 0] * other[:, 1] - one[:, 1] * other[:, 0]


def _overlap(
    pairs: Pairs, at: Whole, step_m: Floats, segment_m: Floats
) -> tuple[Floats, Floats, Floats, Floats]:
    """Return where overlaps begin and end: shares of the step (rising) and of the segment."""
    along, near, far = pairs.along[at], pairs.near[at], pairs.far[at]
    t_near = (near * along).sum(axis=1) / step_m[at] ** 2
    t_far = (far * along).sum(axis=1) / step_m[at] ** 2
    low, high = np.minimum(t_near, t_far), np.maximum(t_near, t_far)
    # Not clipped to be in order: what does not reach the step comes out with its end first.
    t0, t1 = np.maximum(low, 0.0), np.minimum(high, 1.0)
    span = far - near
    to_u = [((along * t[:, None] - near) * span).sum(axis=1) / segment_m[at] ** 2 for t in (t0, t1)]
    return t0, t1, np.clip(to_u[0], 0.0, 1.0), np.clip(to_u[1], 0.0, 1.0)


def contacts(legs: LegSegments, features: FeatureSegments, events: Events) -> list[Contact]:
    """
    Return every meeting of a leg with a line or ring once.

    Events at one place of both the leg and the part are one contact: a vertex of either, or a
    length that both share. It is a crossing if the part comes to the leg on one side and leaves
    it on the other; else, or if either ends there, it is a touch.

    Parameters
    ----------
    legs
        The legs' steps.
    features
        The features' segments.
    events
        Their meetings.
    """
    found = [
        Contact(leg=leg, part=part, start_m=s, end_m=s, crosses=True, angle_deg=angle)
        for leg, part, s, angle in zip(
            *(
                column[events.is_inner].tolist()
                for column in (events.leg, events.part, events.s0_m, events.angle_deg)
            ),
            strict=True,
        )
    ]
    rest = np.flatnonzero(~events.is_inner)
    order = rest[np.lexsort((events.s0_m[rest], events.part[rest], events.leg[rest]))]
    key = np.stack([events.leg[order], events.part[order]])
    for own in np.split(order, np.flatnonzero((key[:, 1:] != key[:, :-1]).any(axis=0)) + 1):
        if len(own):
            leg, part = int(events.leg[own[0]]), int(events.part[own[0]])
            round_m = float(features.length_m[part]) if features.is_closed[part] else 0.0
            groups = _grouped([_group(events, at) for at in own.tolist()], round_m)
            found.extend(_contact(legs, features, group, leg, part) for group in groups)
    return found


def _group(events: Events, at: int) -> _Group:
    ends = sorted([(events.q0_m[at], events.s0_m[at]), (events.q1_m[at], events.s1_m[at])])
    return _Group(
        s_low=float(events.s0_m[at]),
        s_high=float(max(events.s0_m[at], events.s1_m[at])),
        q_low=float(ends[0][0]),
        q_high=float(ends[1][0]),
        s_at_q_low=float(ends[0][1]),
        s_at_q_high=float(ends[1][1]),
    )


def _grouped(groups: Sequence[_Group], round_m: float) -> list[_Group]:
    """Return groups put together where both ranges meet; a closed part goes round."""
    done: list[_Group] = []
    for group in groups:
        merged = group
        while True:
            for at, other in enumerate(done):
                together = _together(other, merged, round_m)
                if together is not None:
                    merged = together
                    del done[at]
                    break
            else:
                break
        done.append(merged)
    return done


def _together(one: _Group, other: _Group, round_m: float) -> _Group | None:
    near = 2 * TOUCH_M
    if other.s_low > one.s_high + near or one.s_low > other.s_high + near:
        return None
    for turn in (0.0, round_m, -round_m) if round_m else (0.0,):
        low, high = other.q_low + turn, other.q_high + turn
        if low <= one.q_high + near and one.q_low <= high + near:
            return replace(
                one,
                s_low=min(one.s_low, other.s_low),
                s_high=max(one.s_high, other.s_high),
                q_low=min(one.q_low, low),
                q_high=max(one.q_high, high),
                s_at_q_low=one.s_at_q_low if one.q_low <= low else other.s_at_q_low,
                s_at_q_high=one.s_at_q_high if one.q_high >= high else other.s_at_q_high,
            )
    return None


def _contact(
    legs: LegSegments, features: FeatureSegments, group: _Group, leg: int, part: int
) -> Contact:
    before = _part_heading(features, part, group.q_low, forward=False)
    after = _part_heading(features, part, group.q_high, forward=True)
    sides: list[bool] = []
    angle = 0.0
    for heading, at_m in ((before, group.s_at_q_low), (after, group.s_at_q_high)):
        back, out = (_leg_heading(legs, leg, at_m, forward=way) for way in (False, True))
        if heading is None or back is None or out is None:
            continue
        sides.append((heading - out) % _TURN < (back - out) % _TURN)
        turn = heading - math.atan2(math.sin(out) - math.sin(back), math.cos(out) - math.cos(back))
        angle = max(angle, math.degrees(math.asin(min(1.0, abs(math.sin(turn))))))
    return Contact(
        leg=leg,
        part=part,
        start_m=group.s_low,
        end_m=group.s_high,
        crosses=len(sides) == 2 and sides[0] != sides[1],
        angle_deg=angle,
    )


def _part_heading(
    features: FeatureSegments, part: int, at_m: float, *, forward: bool
) -> float | None:
    """Return the direction in which a part goes on from a place [rad], None at its end."""
    first, last = int(features.first[part]), int(features.last[part])
    length = float(features.length_m[part])
    beyond = at_m + (2 * TOUCH_M if forward else -2 * TOUCH_M)
    if not 0.0 <= beyond <= length:
        if not features.is_closed[part] or length <= 4 * TOUCH_M:
            return None
        beyond %= length
    at = int(np.searchsorted(features.at_m[first:last], beyond, side="right")) - 1 + first
    east, north = (features.end[at] - features.begin[at]) * features.scale[at]
    return math.atan2(north, east) if forward else math.atan2(-north, -east)


def _leg_heading(legs: LegSegments, leg: int, at_m: float, *, forward: bool) -> float | None:
    """Return the direction in which a leg goes on from a place [rad], None at its end."""
    first, last = int(legs.first[leg]), int(legs.last[leg])
    beyond = at_m + (2 * TOUCH_M if forward else -2 * TOUCH_M)
    if not legs.start_m[first] <= beyond <= legs.stop_m[last - 1]:
        return None
    at = int(np.searchsorted(legs.start_m[first:last], beyond, side="right")) - 1 + first
    east, north = (legs.end[at] - legs.begin[at]) * legs.scale[at]
    return math.atan2(north, east) if forward else math.atan2(-north, -east)
