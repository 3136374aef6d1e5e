"""Which cables there are: the legs each takes, in what direction, and the nodes it meets."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import TypeAlias

from routeplan.cable.model import Cable
from routeplan.errors import Problem, RunFileError
from routeplan.ground.model import Ground, Leg, Node
from routeplan.run.model import Run
from routeplan.run.practice import CableMake
from routeplan.run.trouble import nearest_hint, one_of, shown

__all__ = ["Course", "cable_courses"]

Taken: TypeAlias = tuple[tuple[Leg, bool], ...]
_Named: TypeAlias = tuple[str, CableMake, Taken]  # cable's name, its make, the legs it takes


@dataclass(frozen=True, slots=True, kw_only=True)
class Course:
    """
    A cable with the legs it takes and the nodes it meets, its own two ends among them.

    `entered` holds the nodes that it passes uncut and can be entered at mid-span.
    """

    cable: Cable
    legs: Taken
    nodes: tuple[Node, ...]
    entered: frozenset[str] = frozenset()


def cable_courses(
    run: Run, ground: Ground, *, called: frozenset[str] = frozenset()
) -> tuple[Course, ...]:
    """
    Return the cables of a run in the order of their first legs.

    A named cable takes its `legs` one after the other; two may take the same leg. Legs left over
    whose lines name one cable are one cable as far as exactly two of them meet in new cable, and
    every other leg is a cable of its own. A cable passes nodes and sites uncut. It can be entered
    at mid-span where another cable ends, and at a site where a circuit does.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    called
        Names of the sites where circuits begin or end.

    Raises
    ------
    RunFileError
        If a cable names a leg that there is not, or legs that do not meet.
    """
    problems = list(_leg_problems(run.cables, ground.legs))
    if problems:
        raise RunFileError(problems)
    claimed = list(_claimed(run.cables, ground.legs))
    taken = {leg.id for _, _, legs in claimed for leg, _ in legs}
    nodes = {node.id: node for node in ground.nodes}
    left = [leg for leg in ground.legs if leg.id not in taken]
    named = [*claimed, *_unclaimed(run, left, nodes)]
    order = {leg.id: number for number, leg in enumerate(ground.legs)}
    named.sort(key=lambda each: min(order[leg.id] for leg, _ in each[2]))
    counts = Counter(name for name, _, _ in named)
    courses = [
        _course(
            f"C{number}",
            name if counts[name] == 1 else f"{name}, {legs[0][0].name}",
            make,
            legs=legs,
            nodes=nodes,
        )
        for number, (name, make, legs) in enumerate(named, start=1)
    ]
    ends = {end for course in courses for end in (course.cable.start, course.cable.end)}
    return tuple(
        replace(
            course,
            entered=frozenset(
                node.id
                for node in course.nodes[1:-1]
                if course.nodes.count(node) == 1
                and (node.id in ends or (node.is_site and node.name in called))
            ),
        )
        for course in courses
    )


def _course(
    cable_id: str, name: str, make: CableMake, *, legs: Taken, nodes: Mapping[str, Node]
) -> Course:
    met = [_from(legs[0]), *(_to(each) for each in legs)]
    cable = Cable(
        id=cable_id,
        name=name,
        legs=tuple((leg.id, forward) for leg, forward in legs),
        make=make,
        start=met[0],
        end=met[-1],
    )
    return Course(cable=cable, legs=legs, nodes=tuple(nodes[each] for each in met))


def _from(taken: tuple[Leg, bool]) -> str:
    leg, forward = taken
    return leg.start if forward else leg.end


def _to(taken: tuple[Leg, bool]) -> str:
    leg, forward = taken
    return leg.end if forward else leg.start


def _leg_problems(cables: Mapping[str, CableMake], legs: Sequence[Leg]) -> Iterator[Problem]:
    known = {leg.name: leg for leg in legs}
    for name, make in cables.items():
        where = f"cables.{name}.legs"
        unknown = [leg for leg in make.legs if leg not in known]
        for leg in unknown:
            yield Problem(
                where=where,
                what="names a leg that the geometry does not have",
                value=shown(leg),
                limit=one_of(list(known)),
                remedy=nearest_hint(leg, list(known)),
            )
        if not unknown and make.legs:
            yield from _gaps(where, [known[leg] for leg in make.legs])


def _gaps(where: str, legs: Sequence[Leg]) -> Iterator[Problem]:
    for (one, other), at in zip(pairwise(legs), _directed(legs), strict=False):
        if _to(at) not in (other.start, other.end):
            yield Problem(
                where=where,
                what="names legs that do not meet end to end",
                value=f"{shown(one.name)}, {shown(other.name)}",
                remedy="Name the legs in order along the cable, with every leg between them.",
            )


def _directed(legs: Sequence[Leg]) -> Taken:
    """Return legs with their directions, each going on where the one before it ends."""
    first = legs[0]
    forward = len(legs) == 1 or first.end in (legs[1].start, legs[1].end)
    taken = [(first, forward)]
    for leg in legs[1:]:
        taken.append((leg, leg.start == _to(taken[-1])))
    return tuple(taken)


def _claimed(cables: Mapping[str, CableMake], legs: Sequence[Leg]) -> Iterator[_Named]:
    known = {leg.name: leg for leg in legs}
    for name, make in cables.items():
        if make.legs:
            yield name, make, _directed([known[leg] for leg in make.legs])


def _unclaimed(run: Run, legs: Sequence[Leg], nodes: Mapping[str, Node]) -> Iterator[_Named]:
    """Yield the cables of legs that no cable claims: by the name their lines give, or alone."""
    by_name: defaultdict[str, list[Leg]] = defaultdict(list)
    for leg in legs:
        if leg.cable:
            by_name[leg.cable].append(leg)
        else:
            yield leg.name, run.cables.get(leg.name, run.cable), ((leg, True),)
    for name, own in by_name.items():
        make = run.cables.get(name, run.cable)
        yield from ((name, make, _opened(taken, nodes)) for taken in _unbranched(own))


def _opened(taken: Taken, nodes: Mapping[str, Node]) -> Taken:
    """Return a ring begun at a site if it has one, whichever leg was drawn first."""
    if len(taken) == 1 or _from(taken[0]) != _to(taken[-1]):
        return taken
    starts = [nodes[_from(each)] for each in taken]
    first = min(
        range(len(taken)),
        key=lambda at: (not starts[at].is_site, starts[at].lon, starts[at].lat),
    )
    return taken[first:] + taken[:first]


def _unbranched(legs: Sequence[Leg]) -> Iterator[Taken]:
    """Yield legs of one cable name, end to end as far as exactly two of them meet."""
    meeting: defaultdict[str, list[Leg]] = defaultdict(list)
    for leg in legs:
        meeting[leg.start].append(leg)
        meeting[leg.end].append(leg)
    used: set[str] = set()
    for leg in legs:
        if leg.id in used:
            continue
        used.add(leg.id)
        onward = _walk((leg, True), meeting, used)
        behind = _walk((leg, False), meeting, used)
        turned = tuple((each, not forward) for each, forward in reversed(behind))
        yield (*turned, (leg, True), *onward)


def _placement_at(leg: Leg, node: str) -> str:
    return leg.stretches[0 if leg.start == node else -1].placement


def _walk(
    taken: tuple[Leg, bool], meeting: Mapping[str, Sequence[Leg]], used: set[str]
) -> list[tuple[Leg, bool]]:
    """Return the legs that go on from a leg, each marked as used."""
    found: list[tuple[Leg, bool]] = []
    while True:
        node = _to(taken)
        others = [leg for leg in meeting[node] if leg.id not in used]
        if len(meeting[node]) != 2 or len(others) != 1:
            return found
        if "existing" in (_placement_at(taken[0], node), _placement_at(others[0], node)):
            return found  # somebody else's cable ends ours
        taken = (others[0], others[0].start == node)
        used.add(others[0].id)
        found.append(taken)
