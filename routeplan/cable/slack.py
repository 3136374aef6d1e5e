"""Spare cable: loops, risers, racking and crossings, each a step of the sheath at one chain."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise

from routeplan.cable.crossed import crossing_zones
from routeplan.cable.way import Spot, Way, is_within
from routeplan.ground.model import Stretch
from routeplan.run.practice import Slack
from routeplan.units import mm_from_m

__all__ = ["Step", "slack_steps"]

_LOOP_CROSSES = frozenset({"rail", "water"})
_LOOP_STRETCHES = frozenset({"bridge", "water"})
_EXISTING = frozenset({"existing"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """Spare cable at one chain value."""

    chain_mm: int
    sheath_mm: int
    kind: str
    name: str


def slack_steps(way: Way, *, slack: Slack) -> tuple[tuple[Step, ...], tuple[tuple[str, str], ...]]:
    """
    Return every step of spare cable along a way, and warnings of gaps no loop can break.

    Loops are the fewest that keep `loop_every_m` along each run of one placement, at reach
    points; among the fewest, those that break the run most evenly (least sum of squared gaps).
    Exact, by dynamic programming over the reach points: O(n w), w of them within one spacing.

    Parameters
    ----------
    way
        The cable's way.
    slack
        House rules.
    """
    loops, warnings = _loops(way, slack)
    steps = [*loops, *_risers(way, slack), *_racking(way, slack), *_crossing_loops(way, slack)]
    steps += _entered_loops(way, slack)
    # On somebody else's span nothing is stored: the cable there is not ours.
    theirs = is_within(way, [step.chain_mm for step in steps], _EXISTING)
    own = [step for step, is_theirs in zip(steps, theirs, strict=True) if not is_theirs]
    warnings.extend(_left_out(way))
    own.sort(key=lambda step: (step.chain_mm, step.kind, step.name, step.sheath_mm))
    return tuple(own), tuple(warnings)


def _left_out(way: Way) -> Iterator[tuple[str, str]]:
    spots = [spot for spot in way.spots if spot.loop_m]
    theirs = is_within(way, [spot.chain_mm for spot in spots], _EXISTING)
    for spot, is_theirs in zip(spots, theirs, strict=True):
        if is_theirs:
            where = f'cable "{way.cable.name}", {spot.name}'
            yield where, "stands on existing fibre: no loop is put there"


def _loops(way: Way, slack: Slack) -> tuple[list[Step], list[tuple[str, str]]]:
    wanted: dict[int, float] = {}
    names: dict[int, str] = {}
    for spot in way.spots:
        if spot.loop_m and spot.loop_m > wanted.get(spot.chain_mm, 0.0):
            wanted[spot.chain_mm] = spot.loop_m
            names[spot.chain_mm] = spot.name
    declared = set(wanted)
    warnings: list[tuple[str, str]] = []
    for stretch in way.stretches:
        if stretch.placement == "existing" or stretch.placement not in slack.loop_every_m:
            continue
        every_mm = mm_from_m(slack.loop_every_m[stretch.placement])
        size_m = slack.loop_m.get(stretch.placement, 0.0)
        inside = _loop_spots(way.spots, stretch)
        fixed = {at for at in declared if stretch.start_mm <= at <= stretch.end_mm}
        chosen, longest_mm = _fewest(stretch, inside, fixed=fixed, every_mm=every_mm)
        for spot in chosen:
            wanted[spot.chain_mm] = max(wanted.get(spot.chain_mm, 0.0), size_m)
            names[spot.chain_mm] = spot.name
        if longest_mm > every_mm:
            warnings.append((_where(way, stretch), _gap_text(stretch, longest_mm, every_mm)))
    loops = [
        Step(chain_mm=at, sheath_mm=mm_from_m(size), kind="loop", name=names[at])
        for at, size in sorted(wanted.items())
        if size > 0
    ]
    return loops, warnings


def _loop_spots(spots: Sequence[Spot], stretch: Stretch) -> list[Spot]:
    """Return one spot for each chain value of the stretch where a loop may be added."""
    found: dict[int, Spot] = {}
    said: set[int] = set()
    for spot in spots:
        if stretch.start_mm <= spot.chain_mm <= stretch.end_mm:
            if spot.loop_m is not None:
                said.add(spot.chain_mm)
            elif spot.kind != "assumed":
                found.setdefault(spot.chain_mm, spot)
    return [found[at] for at in sorted(found) if at not in said]


def _fewest(
    stretch: Stretch, spots: Sequence[Spot], *, fixed: set[int], every_mm: int
) -> tuple[list[Spot], int]:
    """Return the spots to add a loop at, and the longest gap left between loops."""
    chosen: list[Spot] = []
    longest_mm = 0
    bounds = sorted({stretch.start_mm, *fixed, stretch.end_mm})
    for begin, end in pairwise(bounds):
        between = [spot for spot in spots if begin < spot.chain_mm < end]
        added, gap_mm = _fewest_between(begin, end, between, every_mm=every_mm)
        chosen.extend(added)
        longest_mm = max(longest_mm, gap_mm)
    return chosen, longest_mm


def _fewest_between(
    begin: int, end: int, spots: Sequence[Spot], *, every_mm: int
) -> tuple[list[Spot], int]:
    """
    Return the best loops between two fixed points, and the longest gap.

    Best is least total excess of gaps over the spacing, then fewest loops, then least sum of
    squared gaps, then least sum of the spots' own keys.
    """
    if end - begin <= every_mm:
        return [], end - begin
    at = [begin, *(spot.chain_mm for spot in spots), end]
    keys = [0, *(spot.tie_key for spot in spots), 0]
    best: list[tuple[int, int, int, int]] = [(0, 0, 0, 0)]
    came: list[int] = [-1]
    for j in range(1, len(at)):
        found: tuple[tuple[int, int, int, int], int] | None = None
        for i in range(j - 1, -1, -1):
            gap = at[j] - at[i]
            over = max(0, gap - every_mm)
            if found and over > found[0][0]:
                break
            excess, count, squares, key = best[i]
            score = (excess + over, count + 1, squares + gap * gap, key + keys[j])
            if found is None or score < found[0]:
                found = (score, i)
        assert found is not None
        best.append(found[0])
        came.append(found[1])
    path = [len(at) - 1]
    while came[path[-1]] >= 0:
        path.append(came[path[-1]])
    path.reverse()
    longest = max(at[b] - at[a] for a, b in pairwise(path))
    return [spots[i - 1] for i in path[1:-1]], longest


def _where(way: Way, stretch: Stretch) -> str:
    return (
        f'cable "{way.cable.name}", {stretch.placement} from {stretch.start_mm / 1000:.0f} m '
        f"to {stretch.end_mm / 1000:.0f} m"
    )


def _gap_text(stretch: Stretch, longest_mm: int, every_mm: int) -> str:
    return (
        f"{longest_mm / 1000:.0f} m without a reach point to hold a loop, more than "
        f"loop_every_m = {every_mm / 1000:g}. Draw its reach points, or set "
        f"slack.loop_every_m for {stretch.placement}"
    )


def _risers(way: Way, slack: Slack) -> Iterator[Step]:
    for before, after in pairwise(way.stretches):
        kinds = (before.placement, after.placement)
        if "existing" not in kinds and (kinds[0] == "aerial") != (kinds[1] == "aerial"):
            yield from _step(after.start_mm, slack.riser_m, "riser", " to ".join(kinds))


def _racking(way: Way, slack: Slack) -> Iterator[Step]:
    for spot in way.spots:
        if spot.kind == "maintenance_hole" and 0 < spot.chain_mm < way.length_mm:
            yield from _step(spot.chain_mm, slack.racking_m, "racking", spot.name)


def _crossing_loops(way: Way, slack: Slack) -> Iterator[Step]:
    """
    Yield a loop on each side of everything that takes one: a bridge, rail, water.

    A bridge, or water that the cable lies in, is a stretch; a declared crossing that it meets is
    the same crossing and counts once. So are crossings a few metres apart, as of two tracks.
    """
    spans = [s for s in way.stretches if s.placement in _LOOP_STRETCHES]
    for span in spans:
        for at in (span.start_mm, span.end_mm):
            yield from _step(at, slack.crossing_loop_m, "loop", span.placement)
    looped = [one for one in way.crossings if one.crosses in _LOOP_CROSSES]
    for start, end, names in crossing_zones(looped):
        if not any(s.start_mm <= end and start <= s.end_mm for s in spans):
            for at in (start, end):
                inside = min(max(at, 0), way.length_mm)
                yield from _step(inside, slack.crossing_loop_m, "loop", names)


def _entered_loops(way: Way, slack: Slack) -> Iterator[Step]:
    """Yield the loop at every node where the cable can be entered without being cut."""
    for passed in way.passed:
        if passed.is_entered:
            yield from _step(passed.chain_mm, slack.midspan_loop_m, "loop", passed.node.name)


def _step(chain_mm: int, length_m: float, kind: str, name: str) -> Iterator[Step]:
    if length_m > 0:
        yield Step(chain_mm=chain_mm, sheath_mm=mm_from_m(length_m), kind=kind, name=name)
