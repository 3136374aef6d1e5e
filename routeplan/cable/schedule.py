"""What is spliced to what in every joint, fibre by fibre, and how many splices that makes."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TypeAlias

from routeplan.cable.colours import cable_colours
from routeplan.cable.fibres import meetings
from routeplan.cable.model import Cable, CableEnd, FibreEnd, FibreUse, Joint, Section, Splice
from routeplan.errors import InputError, Problem, RangeError

__all__ = ["EXISTING", "OWNERS_COLOUR", "joint_splice_count", "splice_rows"]

EXISTING = "existing"
"""Stands for the section where a fibre is spliced to somebody else's cable."""

OWNERS_COLOUR = "owner's"
"""Stands for the colours of such a fibre: its owner tells them."""

_Fibre: TypeAlias = tuple[int, int]  # which end of the joint, fibre
_Link: TypeAlias = tuple[_Fibre, _Fibre | str | None, str]  # what, to what or whose cable, circuit


@dataclass(frozen=True, slots=True, kw_only=True)
class _Plant:
    """Look-ups that all joints share."""

    sections: Mapping[str, Section]
    cables: Mapping[str, Cable]
    following: Mapping[str, str]  # section -> the next one of its cable
    circuits: Mapping[tuple[str, int], str]  # (cable, fibre) -> circuit
    through: Mapping[str, Sequence[_Link]]  # joint -> fibres of circuits that change cables there


def splice_rows(
    joints: Sequence[Joint],
    sections: Sequence[Section],
    cables: Sequence[Cable],
    uses: Sequence[FibreUse],
    *,
    fibres_per_tray: int,
    limit_db: float,
) -> tuple[Splice, ...]:
    """
    Return the splice schedule of every joint.

    In a joint first come the splices, in the order of its cable ends and of the fibres in them:
    circuits from cable to cable as `uses` say; every other fibre of a cable that is joined to
    itself, and the spares where exactly two cables of equal fibre count meet, straight through;
    where the cable goes on in somebody else's, all fibres to that. Then come the spares that meet
    nothing, stored. Trays fill in this order. A mated joint has no splices.

    Takes time linear in rows, fibres of circuits and joints.

    Parameters
    ----------
    joints, sections, cables
        Of one layout; the sections of a cable in order along it.
    uses
        Fibres of the circuits, as `assign_fibres` returns them.
    fibres_per_tray
        Splices, or stored fibres, that a tray holds. [-]
    limit_db
        Loss each splice has to meet. [dB]

    Returns
    -------
    splices
        By joint in the order given, tray and position; `b` is None for a stored fibre. A fibre of
        somebody else's cable has the section `EXISTING`, the number of our fibre it continues,
        and the colours `OWNERS_COLOUR`.

    Raises
    ------
    RangeError
        If a tray holds nothing.
    InputError
        If a joint enters a cable mid-span.
    """
    if fibres_per_tray < 1:
        raise RangeError(
            Problem(where="fibres per tray", what="is too small", value=str(fibres_per_tray))
        )
    plant = _plant(joints, sections, cables, uses)
    fibre_ends = {section.id: _fibre_ends(section, plant) for section in sections}
    rows: list[Splice] = []
    for joint in joints:
        ends = [fibre_ends[end.section] for end in joint.ends]
        for place, ((end, fibre), target, circuit) in enumerate(_links(joint, plant)):
            tray, position = divmod(place, fibres_per_tray)
            a = ends[end][fibre - 1]
            rows.append(
                Splice(
                    joint=joint.id,
                    tray=tray + 1,
                    position=position + 1,
                    a=a,
                    b=_far_end(a, target, ends),
                    kind="stored" if target is None else "splice",
                    circuit=circuit,
                    limit_db=limit_db,
                )
            )
    return tuple(rows)


def joint_splice_count(
    joints: Sequence[Joint],
    sections: Sequence[Section],
    cables: Sequence[Cable],
    uses: Sequence[FibreUse],
) -> dict[str, int]:
    """
    Return how many splices each joint holds, by joint id, without making its rows.

    Counts the rows of `splice_rows` of kind "splice". Only joints where cables of several counts
    meet are looked into fibre by fibre.

    Raises
    ------
    InputError
        If a joint enters a cable mid-span.
    """
    plant = _plant(joints, sections, cables, uses)
    counts = {}
    for joint in joints:
        fibre_counts = [_fibre_count(end, plant) for end in joint.ends]
        if _joins_all(joint, fibre_counts, plant):
            counts[joint.id] = fibre_counts[0]
        else:
            counts[joint.id] = sum(target is not None for _, target, _ in _links(joint, plant))
    return counts


def _plant(
    joints: Sequence[Joint],
    sections: Sequence[Section],
    cables: Sequence[Cable],
    uses: Sequence[FibreUse],
) -> _Plant:
    of_cable: defaultdict[str, list[str]] = defaultdict(list)
    for section in sections:
        of_cable[section.cable].append(section.id)
    return _Plant(
        sections={section.id: section for section in sections},
        cables={cable.id: cable for cable in cables},
        following={one: other for ids in of_cable.values() for one, other in pairwise(ids)},
        circuits={(use.cable, use.fibre): use.circuit for use in uses},
        through=_through(joints, of_cable, uses),
    )


def _through(
    joints: Sequence[Joint], of_cable: Mapping[str, Sequence[str]], uses: Sequence[FibreUse]
) -> dict[str, list[_Link]]:
    """Return, by joint at a node, the fibres of circuits that go from one cable to another."""
    places = {
        (end.section, end.side): (joint.id, index)
        for joint in joints
        if joint.node is not None
        for index, end in enumerate(joint.ends)
    }

    def place(use: FibreUse, *, leaving: bool) -> tuple[str, int] | None:
        """Return joint and end where a circuit leaves or enters a cable; None at a panel."""
        ids = of_cable.get(use.cable)
        if not ids:
            return None
        last = use.forward == leaving
        return places.get((ids[-1], "end") if last else (ids[0], "start"))

    found: defaultdict[str, list[_Link]] = defaultdict(list)
    for one, other in meetings(uses):
        here, there = place(one, leaving=True), place(other, leaving=False)
        if here and there and here[0] == there[0]:
            a, b = sorted([(here[1], one.fibre), (there[1], other.fibre)])
            found[here[0]].append((a, b, one.circuit))
            continue
        # One of the two cables begins with somebody else's fibre, and has no end of its own here.
        for spot, use, far in ((here, one, other), (there, other, one)):
            if spot:
                found[spot[0]].append(((spot[1], use.fibre), far.cable, use.circuit))
    return found


def _links(joint: Joint, plant: _Plant) -> Iterator[_Link]:
    """Yield what meets what in a joint: splices in order of end and fibre, then stored fibres."""
    if joint.opened:
        raise InputError(
            Problem(
                where=f"joint {joint.id}",
                what="enters a cable mid-span, which is not planned yet",
                value=", ".join(joint.opened),
                remedy="End the cable there.",
            )
        )
    if joint.kind == "mated":
        return
    counts = [_fibre_count(end, plant) for end in joint.ends]
    links = list(plant.through.get(joint.id, ()))
    taken = {fibre for a, b, _ in links for fibre in (a, b)}
    free = [
        [number for number in range(1, count + 1) if (end, number) not in taken]
        for end, count in enumerate(counts)
    ]
    if len(joint.ends) == 1:
        links += _owner_links(joint, free.pop(), links, plant)
    for pair in _straight(joint, counts, plant):
        links += _straight_links(joint, pair, free, plant)
    links.sort(key=lambda link: link[0])
    yield from links
    for end, numbers in enumerate(free):
        yield from (((end, number), None, "") for number in numbers)


def _owner_links(
    joint: Joint, free: Sequence[int], links: Sequence[_Link], plant: _Plant
) -> list[_Link]:
    """Return splices of the free fibres of a joint's only end to somebody else's cable."""
    cable = plant.sections[joint.ends[0].section].cable
    owners = links[0][1] if links else cable
    return [((0, n), owners, plant.circuits.get((cable, n), "")) for n in free]


def _straight(joint: Joint, counts: Sequence[int], plant: _Plant) -> Iterator[tuple[int, int]]:
    """Yield the pairs of ends whose spare fibres are spliced straight through."""
    if len(counts) == 2 and counts[0] == counts[1]:
        yield 0, 1
        return
    starts = {end.section: index for index, end in enumerate(joint.ends) if end.side == "start"}
    for index, end in enumerate(joint.ends):
        partner = starts.get(plant.following.get(end.section, "")) if end.side == "end" else None
        if partner is not None:
            yield min(index, partner), max(index, partner)


def _straight_links(
    joint: Joint, pair: tuple[int, int], free: list[list[int]], plant: _Plant
) -> list[_Link]:
    """Splice the free fibres of two ends: equal numbers first, what is left as it comes."""
    one, other = pair
    cable = plant.sections[joint.ends[one].section].cable
    same = set(free[one]) & set(free[other])
    left = [[number for number in free[end] if number not in same] for end in pair]
    crossed = list(zip(*left, strict=False))
    for end, numbers in zip(pair, left, strict=True):
        free[end] = numbers[len(crossed) :]
    meeting = [*((number, number) for number in same), *crossed]
    return [((one, a), (other, b), plant.circuits.get((cable, a), "")) for a, b in meeting]


def _joins_all(joint: Joint, fibre_counts: Sequence[int], plant: _Plant) -> bool:
    """Return whether it shows at a glance that every fibre of the joint is spliced."""
    looked_into = joint.kind == "mated" or joint.opened or joint.id in plant.through
    return not looked_into and len(fibre_counts) <= 2 and len(set(fibre_counts)) == 1


def _fibre_count(end: CableEnd, plant: _Plant) -> int:
    return plant.cables[plant.sections[end.section].cable].make.fibre_count


def _fibre_ends(section: Section, plant: _Plant) -> list[FibreEnd]:
    """Return the fibres of a section, fibre 1 first; both its ends show the same."""
    make = plant.cables[section.cable].make
    colours = cable_colours(
        make.fibre_count, code=make.colour_code, fibres_per_tube=make.fibres_per_tube
    )
    return [
        FibreEnd(
            cable=section.cable,
            section=section.id,
            fibre=number,
            tube_colour=tube,
            fibre_colour=fibre,
        )
        for number, (tube, fibre) in enumerate(colours, start=1)
    ]


def _far_end(
    a: FibreEnd, target: _Fibre | str | None, ends: Sequence[Sequence[FibreEnd]]
) -> FibreEnd | None:
    """Return what fibre `a` is spliced to."""
    if target is None:
        return None
    if isinstance(target, tuple):
        return ends[target[0]][target[1] - 1]
    return FibreEnd(
        cable=target,
        section=EXISTING,
        fibre=a.fibre,
        tube_colour=OWNERS_COLOUR,
        fibre_colour=OWNERS_COLOUR,
    )
