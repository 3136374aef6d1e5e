"""Every cable of a run laid out by itself: its way, slack, rulers, joints and reels."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from routeplan.cable.courses import Course, cable_courses
from routeplan.cable.model import Rulers
from routeplan.cable.rulers import BareRuler, bare_ruler, ruled
from routeplan.cable.slack import Step, slack_steps
from routeplan.cable.spans import LaidSpan, bound_tail_mm, laid_spans, tail_mm
from routeplan.cable.way import Way, cable_way
from routeplan.errors import InfeasibleError, Problem
from routeplan.ground.model import Ground, Node, Stretch
from routeplan.memo import Memo, remembered
from routeplan.run.model import Run
from routeplan.run.practice import Practice
from routeplan.units import mm_from_m

__all__ = ["LaidCable", "lay_cables"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LaidCable:
    """One cable laid out by itself."""

    way: Way
    steps: tuple[Step, ...]
    bare: BareRuler
    spans: tuple[LaidSpan, ...]
    parted: Mapping[int, tuple[int, int]]
    rulers: Rulers
    warnings: tuple[tuple[str, str], ...]


def lay_cables(
    run: Run, ground: Ground, *, memo: Memo | None = None, called: frozenset[str] | None = None
) -> tuple[LaidCable, ...]:
    """
    Return every cable of a run laid out at least cost, each by itself.

    Exact: see `routeplan.cable.reels`. Which cables there are: `routeplan.cable.courses`.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    memo
        Results of earlier calls, to lay only what changed.
    called
        Names of the sites where circuits begin or end; left out: those the circuits name.

    Raises
    ------
    RunFileError
        If a cable names a leg that there is not, or legs that do not meet.
    InfeasibleError
        If a cable has no layout within its limits; names the stretch and the smallest relaxation.
    """
    laid: list[LaidCable] = []
    problems: list[Problem] = []
    if called is None:
        called = frozenset(name for each in run.circuits for name in (each.from_, each.to) if name)
    for course in cable_courses(run, ground, called=called):
        try:
            entered = sorted(course.entered)
            inputs = ("cable", course.cable, run.practice, course.legs, course.nodes, entered)
            laid.append(remembered(memo, inputs, partial(_lay, course, run.practice)))
        except InfeasibleError as error:
            problems.extend(error.problems)
    if problems:
        raise InfeasibleError(problems)
    return tuple(laid)


def _lay(course: Course, practice: Practice) -> LaidCable:
    way = cable_way(
        course.cable,
        course.legs,
        practice=practice,
        nodes=course.nodes[1:-1],
        entered=course.entered,
    )
    steps, warnings = slack_steps(way, slack=practice.slack)
    ends, bounds = (course.nodes[0], course.nodes[-1]), (way.stretches[0], way.stretches[-1])
    end_mm = tuple(_end_mm(node, s, practice) for node, s in zip(ends, bounds, strict=True))
    bare = bare_ruler(way, steps, slack=practice.slack, end_mm=(end_mm[0], end_mm[1]))
    spans = laid_spans(way, bare, practice=practice)
    parted = _parted(way, bare, spans, practice)
    ratio = way.cable.make.glass_over_sheath_ratio
    rulers = ruled(way, bare, {**parted, **_opened(way, bare)}, glass_ratio=ratio)
    return LaidCable(
        way=way,
        steps=steps,
        bare=bare,
        spans=spans,
        parted=parted,
        rulers=rulers,
        warnings=(*warnings, *_short_spans(way)),
    )


def _short_spans(way: Way) -> Iterator[tuple[str, str]]:
    """Yield a warning for every existing span whose declared fibre is shorter than its way."""
    for stretch in way.stretches:
        way_m = (stretch.end_mm - stretch.start_mm) / 1000
        if stretch.existing_m is not None and stretch.existing_m < way_m:
            where = f'cable "{way.cable.name}", existing from {stretch.start_mm / 1000:.0f} m'
            yield where, f"its existing_m is {stretch.existing_m:g}, but the way is {way_m:.1f} m"


def _end_mm(node: Node, stretch: Stretch, practice: Practice) -> int:
    """Return the cable beyond an end of the way; none where that is somebody else's."""
    if stretch.placement == "existing":
        return 0
    if node.is_site:
        return mm_from_m(practice.slack.entry_m)
    return tail_mm(node.place.kind if node.place else "", practice)


def _parted(
    way: Way, bare: BareRuler, spans: Sequence[LaidSpan], practice: Practice
) -> dict[int, tuple[int, int]]:
    """Return for every joint's chain value the cable stored before and after its splice."""
    parted: dict[int, tuple[int, int]] = {}
    for span in spans:
        for at in (span.start_mm, span.end_mm):
            if 0 < at < way.length_mm:
                stored = _stored_at(bare, at)[0] + bound_tail_mm(way, at, practice)
                parted[at] = (0, stored) if at == span.start_mm else (stored, 0)
        for place in span.best.places[1:-1]:
            spot = span.spots[place - 1]
            step, half = _stored_at(bare, spot.chain_mm)
            tail = tail_mm(spot.kind, practice)
            parted[spot.chain_mm] = (half + tail, step - half + tail)
    return parted


def _opened(way: Way, bare: BareRuler) -> dict[int, tuple[int, int]]:
    """Return the cable stored before and after the middle of every loop entered at mid-span."""
    entered = [passed.chain_mm for passed in way.passed if passed.is_entered]
    stored = {at: _stored_at(bare, at) for at in entered}
    return {at: (half, step - half) for at, (step, half) in stored.items()}


def _stored_at(bare: BareRuler, chain_mm: int) -> tuple[int, int]:
    knot = int(np.searchsorted(bare.chain_mm, chain_mm))
    return int(bare.step_mm[knot]), int(bare.half_mm[knot])
