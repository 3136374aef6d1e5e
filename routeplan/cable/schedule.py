"""What is spliced to what in every joint, fibre by fibre, and how many splices that makes."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Literal, TypeAlias

from routeplan.cable.colours import cable_colours
from routeplan.cable.fibres import meetings
from routeplan.cable.model import Cable, FibreEnd, FibreUse, Joint, Section, Splice
from routeplan.cable.trays import tray_places
from routeplan.errors import Problem, RangeError

__all__ = ["EXISTING", "OWNERS_COLOUR", "PANEL", "joint_splice_count", "splice_rows"]

EXISTING = "existing"
"""Stands for the section where a fibre is spliced to somebody else's cable."""

OWNERS_COLOUR = "owner's"
"""Stands for the colours of such a fibre: its owner tells them."""

PANEL = "panel"
"""Stands for the section where a fibre is spliced to a pigtail of the site's panel."""

_Piece: TypeAlias = tuple[str, Literal["start", "end"]]  # section, its end that is in the joint
_Fibre: TypeAlias = tuple[int, int]  # which piece of the joint, fibre
_Link: TypeAlias = tuple[_Fibre, _Fibre | str | None, str]  # what, to what or whose cable, circuit


@dataclass(frozen=True, slots=True, kw_only=True)
class _Plant:
    """Look-ups that all joints share."""

    sections: Mapping[str, Section]
    cables: Mapping[str, Cable]
    following: Mapping[str, str]  # section -> the next one of its cable
    circuits: Mapping[tuple[str, int], Sequence[FibreUse]]  # (cable, fibre) -> circuits on it
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
    where the cable goes on in somebody else's, all fibres to that. Then come those that meet
    nothing, stored. Trays fill in this order, tube by tube: fibres of one tube begin a new tray
    where they would be parted otherwise. A mated joint has no splices.

    Where a cable is entered at mid-span, only fibres of circuits that get in or out there are
    cut: spliced to another cable, or to pigtails at a site; the side of them that is not used is
    stored. All others pass uncut, and come last on tray 0, which is none.

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
        somebody else's cable has the section `EXISTING`, a pigtail `PANEL`, both the number of
        our fibre that goes on in it; the owner's has the colours `OWNERS_COLOUR`.

    Raises
    ------
    RangeError
        If a tray holds nothing.
    """
    if fibres_per_tray < 1:
        raise RangeError(
            Problem(where="fibres per tray", what="is too small", value=str(fibres_per_tray))
        )
    plant = _plant(joints, sections, cables, uses)
    colours = {cable.id: _colours(cable) for cable in cables}
    rows: list[Splice] = []
    filled: dict[str, int] = {}  # trays of closures; those that share one fill them one by one
    for joint in joints:
        ends = [_fibre_ends(piece, plant, colours) for piece in _pieces(joint)]
        links = list(_links(joint, plant))
        tubes = [_tube(link, joint, plant) for link in links]
        places = list(tray_places(tubes, fibres_per_tray=fibres_per_tray))
        closure = joint.closure or joint.id
        before = filled.get(closure, 0)
        filled[closure] = before + max((tray for tray, _ in places), default=0)
        for ((end, fibre), target, circuit), (own, position) in zip(links, places, strict=True):
            tray = own + before if own else 0
            a = ends[end][fibre - 1]
            b = _far_end(a, target, ends)
            rows.append(
                Splice(
                    joint=joint.id,
                    tray=tray,
                    position=position,
                    a=a,
                    b=b,
                    kind="stored" if b is None else "splice" if tray else "express",
                    circuit=circuit,
                    limit_db=limit_db,
                )
            )
    return tuple(rows)


def _tube(link: _Link, joint: Joint, plant: _Plant) -> tuple[int, int, bool] | None:
    """Return piece, tube and whether it is stored, of a fibre on a tray; None for one uncut."""
    (end, fibre), target, _ = link
    if _passes(link, joint):
        return None
    section, _ = _pieces(joint)[end]
    make = plant.cables[plant.sections[section].cable].make
    return end, (fibre - 1) // make.fibres_per_tube, target is None


def joint_splice_count(
    joints: Sequence[Joint],
    sections: Sequence[Section],
    cables: Sequence[Cable],
    uses: Sequence[FibreUse],
) -> dict[str, int]:
    """
    Return how many splices each joint holds, by joint id, without making its rows.

    Counts the rows of `splice_rows` of kind "splice". Only joints where cables of several counts
    meet, or one is entered at mid-span, are looked into fibre by fibre.
    """
    plant = _plant(joints, sections, cables, uses)
    counts = {}
    for joint in joints:
        fibre_counts = [_fibre_count(end.section, plant) for end in joint.ends]
        if _joins_all(joint, fibre_counts, plant):
            counts[joint.id] = fibre_counts[0]
        else:
            counts[joint.id] = sum(
                link[1] is not None and not _passes(link, joint) for link in _links(joint, plant)
            )
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
    circuits: defaultdict[tuple[str, int], list[FibreUse]] = defaultdict(list)
    for use in uses:
        circuits[use.cable, use.fibre].append(use)
    by_id = {section.id: section for section in sections}
    return _Plant(
        sections=by_id,
        cables={cable.id: cable for cable in cables},
        following={one: other for ids in of_cable.values() for one, other in pairwise(ids)},
        circuits=circuits,
        through=_through(joints, by_id, of_cable, uses),
    )


def _pieces(joint: Joint) -> tuple[_Piece, ...]:
    """Return what comes into a joint: its cable ends, then both sides of what it enters."""
    ends: list[_Piece] = [(end.section, end.side) for end in joint.ends]
    for section in joint.opened:
        ends += ((section, "end"), (section, "start"))
    return tuple(ends)


def _through(
    joints: Sequence[Joint],
    sections: Mapping[str, Section],
    of_cable: Mapping[str, Sequence[str]],
    uses: Sequence[FibreUse],
) -> dict[str, list[_Link]]:
    """Return, by joint at a node, the fibres of circuits that change cables or end there."""
    places = {
        (section, side): (joint.id, index)
        for joint in joints
        if joint.node is not None
        for index, (section, side) in enumerate(_pieces(joint)[: len(joint.ends)])
    }
    at_sites = {joint.id for joint in joints if not joint.ends}
    # A cable that is entered has no end there: its node and its name tell where that is.
    entered = {
        (joint.node, sections[section].cable): (joint.id, len(joint.ends) + 2 * number)
        for joint in joints
        for number, section in enumerate(joint.opened)
    }

    def place(use: FibreUse, *, leaving: bool) -> tuple[str, int] | None:
        """Return joint and piece where a circuit leaves or enters a cable; None at a panel."""
        last = use.forward == leaving
        at = entered.get((use.end if last else use.start, use.cable))
        if at is not None:
            return at[0], at[1] + (not last)
        ids = of_cable.get(use.cable)
        if not ids:
            return None
        return places.get((ids[-1], "end") if last else (ids[0], "start"))

    found: defaultdict[str, list[_Link]] = defaultdict(list)
    for use in uses if at_sites else ():
        for spot in (place(use, leaving=False), place(use, leaving=True)):
            if spot and spot[0] in at_sites:
                found[spot[0]].append(((spot[1], use.fibre), PANEL, use.circuit))
    for one, other in meetings(uses):
        here, there = place(one, leaving=True), place(other, leaving=False)
        if (here or there or ("",))[0] in at_sites:
            continue
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
    """Yield what meets what: splices in order of piece and fibre, then stored, then uncut ones."""
    if joint.kind == "mated":
        return
    pieces = _pieces(joint)
    counts = [_fibre_count(section, plant) for section, _ in pieces]
    links = list(plant.through.get(joint.id, ()))
    taken = {fibre for a, b, _ in links for fibre in (a, b) if isinstance(fibre, tuple)}
    free = [
        [number for number in range(1, count + 1) if (end, number) not in taken]
        for end, count in enumerate(counts)
    ]
    if len(pieces) == 1:
        links += _owner_links(joint, free.pop(), links, plant)
    for pair in _straight(joint, counts, plant):
        links += _straight_links(joint, pair, free, plant)
    uncut = list(_uncut(joint, free, plant))
    links.sort(key=lambda link: link[0])
    yield from links
    for end, numbers in enumerate(free):
        yield from (((end, number), None, "") for number in numbers)
    yield from uncut


def _uncut(joint: Joint, free: list[list[int]], plant: _Plant) -> Iterator[_Link]:
    """Yield the fibres that pass an entered section uncut, and take them out of the free ones."""
    for number, section in enumerate(joint.opened):
        end = len(joint.ends) + 2 * number
        both = set(free[end]) & set(free[end + 1])
        cable = plant.sections[section].cable
        yield from (
            ((end, fibre), (end + 1, fibre), _circuit_at(joint, cable, fibre, plant))
            for fibre in sorted(both)
        )
        for side in (end, end + 1):
            free[side] = [fibre for fibre in free[side] if fibre not in both]


def _passes(link: _Link, joint: Joint) -> bool:
    """Return whether a fibre passes from one side of an entered section to the other, uncut."""
    (end, fibre), target, _ = link
    first = len(joint.ends)
    return target == (end + 1, fibre) and end >= first and (end - first) % 2 == 0


def _circuit_at(joint: Joint, cable: str, fibre: int, plant: _Plant) -> str:
    """Return the circuit on a fibre of a cable at a joint, empty for a spare."""
    uses = plant.circuits.get((cable, fibre), ())
    if len(uses) == 1 and uses[0].span_mm is None:
        return uses[0].circuit
    at = _chain_mm(joint, cable, plant)
    return next((use.circuit for use in uses if use.covers(at)), "")


def _chain_mm(joint: Joint, cable: str, plant: _Plant) -> int:
    """Return where on a cable a joint is: on its mark, at an end, or within what it enters."""
    if joint.mark.cable == cable:
        return joint.mark.chain_mm
    for name, at in zip(joint.opened, joint.opened_mm, strict=True):
        if plant.sections[name].cable == cable:
            return at
    for end in joint.ends:
        section = plant.sections[end.section]
        if section.cable == cable:
            return section.start_chain_mm if end.side == "start" else section.end_chain_mm
    raise AssertionError(f"joint {joint.id} is not on cable {cable}")


def _owner_links(
    joint: Joint, free: Sequence[int], links: Sequence[_Link], plant: _Plant
) -> list[_Link]:
    """Return splices of the free fibres of a joint's only end to somebody else's cable."""
    cable = plant.sections[joint.ends[0].section].cable
    owners = links[0][1] if links else cable
    return [((0, n), owners, _circuit_at(joint, cable, n, plant)) for n in free]


def _straight(joint: Joint, counts: Sequence[int], plant: _Plant) -> Iterator[tuple[int, int]]:
    """Yield the pairs of ends whose spare fibres are spliced straight through."""
    if len(counts) == 2 == len(joint.ends) and counts[0] == counts[1]:
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
    return [((one, a), (other, b), _circuit_at(joint, cable, a, plant)) for a, b in meeting]


def _joins_all(joint: Joint, fibre_counts: Sequence[int], plant: _Plant) -> bool:
    """Return whether it shows at a glance that every fibre of the joint is spliced."""
    looked_into = joint.kind == "mated" or joint.opened or joint.id in plant.through
    return not looked_into and len(fibre_counts) <= 2 and len(set(fibre_counts)) == 1


def _fibre_count(section: str, plant: _Plant) -> int:
    return plant.cables[plant.sections[section].cable].make.fibre_count


def _colours(cable: Cable) -> Sequence[tuple[str, str]]:
    make = cable.make
    return cable_colours(
        make.fibre_count, code=make.colour_code, fibres_per_tube=make.fibres_per_tube
    )


def _fibre_ends(
    piece: _Piece, plant: _Plant, colours: Mapping[str, Sequence[tuple[str, str]]]
) -> list[FibreEnd]:
    """Return the fibres of a section as they come into a joint, fibre 1 first."""
    section, side = piece
    cable = plant.sections[section].cable
    return [
        FibreEnd(
            cable=cable,
            section=section,
            fibre=number,
            tube_colour=tube,
            fibre_colour=fibre,
            side=side,
        )
        for number, (tube, fibre) in enumerate(colours[cable], start=1)
    ]


def _far_end(
    a: FibreEnd, target: _Fibre | str | None, ends: Sequence[Sequence[FibreEnd]]
) -> FibreEnd | None:
    """Return what fibre `a` is spliced to."""
    if target is None:
        return None
    if isinstance(target, tuple):
        return ends[target[0]][target[1] - 1]
    if target == PANEL:
        return FibreEnd(cable="", section=PANEL, fibre=a.fibre, tube_colour="", fibre_colour="")
    return FibreEnd(
        cable=target,
        section=EXISTING,
        fibre=a.fibre,
        tube_colour=OWNERS_COLOUR,
        fibre_colour=OWNERS_COLOUR,
    )
