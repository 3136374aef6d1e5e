"""A walk over the splices of a schedule that knows nothing of how it was made."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Sequence
from dataclasses import replace
from itertools import groupby, pairwise

from routeplan.cable.colours import fibre_colours
from routeplan.cable.model import Cable, FibreUse, Joint, Section, Splice
from routeplan.cable.schedule import EXISTING, PANEL
from routeplan.run.practice import CircuitOrder
from tests.cable.small_plants import SmallPlant


class Walker:
    """Follows light through the rows of a schedule; knows sections and joints, not the planner."""

    def __init__(self, plant: SmallPlant, rows: Sequence[Splice]) -> None:
        """Note which joint each section end is in, and what each fibre meets there."""
        self.joint_of = {
            (end.section, end.side): joint.id for joint in plant.joints for end in joint.ends
        }
        self.ends_in = {
            joint.id: {end.section: end.side for end in joint.ends} for joint in plant.joints
        }
        self.at = {(section.id, "start"): section.start for section in plant.sections}
        self.at |= {(section.id, "end"): section.end for section in plant.sections}
        self.meets: dict[tuple[str, str, int], Splice] = {}
        self.owners: defaultdict[tuple[str, int], list[str]] = defaultdict(list)
        for row in rows:
            for end in (row.a, row.b):
                if end is None:
                    continue
                if end.section == EXISTING:
                    self.owners[end.cable, end.fibre].append(row.joint)
                    continue
                key = (row.joint, end.section, end.fibre)
                assert key not in self.meets, "a fibre stands twice in one joint"
                self.meets[key] = row

    def walk(
        self, section: str, side: str, fibre: int
    ) -> tuple[str, list[tuple[str, int]], list[str]]:
        """Go in at a section end; return the node come out at, fibres passed and circuits named."""
        passed = [(section.partition(".")[0], fibre)]
        named = []
        while True:
            side = "end" if side == "start" else "start"
            joint = self.joint_of.get((section, side))
            if joint is None:
                return self.at[section, side], passed, named
            row = self.meets[joint, section, fibre]
            assert row.kind == "splice", "a circuit runs into a stored fibre"
            named.append(row.circuit)
            far = row.b if (row.a.section, row.a.fibre) == (section, fibre) else row.a
            assert far is not None
            if far.section == EXISTING:
                other = next(j for j in self.owners[far.cable, far.fibre] if j != joint)
                row = next(
                    r
                    for r in self.meets.values()
                    if r.joint == other and r.a.fibre == far.fibre and r.b is not None
                )
                joint, far = other, row.a
                named.append(row.circuit)
            section, fibre = far.section, far.fibre
            side = self.ends_in[joint][section]
            if passed[-1] != (far.cable, fibre):
                passed.append((far.cable, fibre))


def check_walks(
    plant: SmallPlant,
    rows: Sequence[Splice],
    uses: Sequence[FibreUse],
    circuits: Sequence[CircuitOrder],
) -> None:
    """Follow every strand of every circuit from its first panel to its last."""
    walker = Walker(plant, rows)
    cables = {cable.id: cable for cable in plant.cables}
    sections: dict[str, list[str]] = defaultdict(list)
    for section in plant.sections:
        sections[section.cable].append(section.id)
    grouped = {
        key: list(of) for key, of in groupby(uses, key=lambda use: (use.circuit, use.strand))
    }
    assert set(grouped) == {
        (circuit.name, strand)
        for circuit in circuits
        for strand in range(1, circuit.fibre_count + 1)
    }
    for circuit in circuits:
        for strand in range(1, circuit.fibre_count + 1):
            left = [(use.cable, use.fibre, use.forward) for use in grouped[circuit.name, strand]]
            node = circuit.from_
            while left:
                cable, fibre, forward = left[0]
                assert node == (cables[cable].start if forward else cables[cable].end)
                first = (sections[cable][0], "start") if forward else (sections[cable][-1], "end")
                node, passed, named = walker.walk(*first, fibre)
                assert set(named) <= {circuit.name}
                assert passed == [(use[0], use[1]) for use in left[: len(passed)]]
                assert node in plant.sites
                del left[: len(passed)]
            assert node == circuit.to


def check_joints(plant: SmallPlant, rows: Sequence[Splice], *, fibres_per_tray: int) -> None:
    """Every fibre of every end stands in its joint once, trays fill in order, counts agree."""
    by_joint = {key: list(of) for key, of in groupby(rows, key=lambda row: row.joint)}
    assert list(by_joint) == [joint.id for joint in plant.joints if joint.kind == "splice"]
    for joint in plant.joints:
        check_joint_rows(
            joint,
            by_joint[joint.id],
            sections=plant.sections,
            cables=plant.cables,
            fibres_per_tray=fibres_per_tray,
        )


def check_joint_rows(
    joint: Joint,
    here: Sequence[Splice],
    *,
    sections: Sequence[Section],
    cables: Sequence[Cable],
    fibres_per_tray: int,
    trays_before: int = 0,
) -> None:
    """Hold the rows of one joint against its cable ends and what it enters."""
    cable_of = {section.id: section.cable for section in sections}
    makes = {cable.id: cable.make for cable in cables}
    on_trays = [row for row in here if row.kind != "express"]
    check_trays([replace(row, tray=row.tray - trays_before) for row in on_trays], fibres_per_tray)
    uncut = [row for row in here if row.kind == "express"]
    assert [(row.tray, row.position) for row in uncut] == [
        (0, number) for number in range(1, len(uncut) + 1)
    ]
    for row in uncut:
        assert row.b is not None
        assert replace(row.a, side="start") == row.b
        assert (row.a.side, row.a.section in joint.opened) == ("end", True)
    kinds = [row.kind for row in here]
    assert kinds == sorted(kinds, key=["splice", "stored", "express"].index)
    assert all((row.b is None) == (row.kind == "stored") for row in here)
    outside = (EXISTING, PANEL)
    ends = [e for row in here for e in (row.a, row.b) if e and e.section not in outside]
    pieces = [(end.section, end.side) for end in joint.ends]
    pieces += [(name, side) for name in joint.opened for side in ("start", "end")]
    assert Counter((e.section, e.side, e.fibre) for e in ends) == Counter(
        (section, side, fibre)
        for section, side in pieces
        for fibre in range(1, makes[cable_of[section]].fibre_count + 1)
    )
    for end in ends:
        make = makes[end.cable]
        assert (end.tube_colour, end.fibre_colour) == fibre_colours(
            end.fibre, code=make.colour_code, fibres_per_tube=make.fibres_per_tube
        )


def check_trays(rows: Sequence[Splice], fibres_per_tray: int) -> None:
    """Trays hold what they can, from position 1, and part no tube that fits on one."""
    trays = [[row.position for row in of] for _, of in groupby(rows, key=lambda row: row.tray)]
    assert [row.tray for row in rows] == sorted(row.tray for row in rows)
    assert sorted({row.tray for row in rows}) == list(range(1, len(trays) + 1))
    for positions in trays:
        assert positions == list(range(1, len(positions) + 1))
        assert len(positions) <= fibres_per_tray
    tubes = [
        list(of)
        for _, of in groupby(
            rows, key=lambda row: (row.a.section, row.a.side, row.a.tube_colour, row.kind)
        )
    ]
    for before, tube in pairwise([[], *tubes]):
        is_parted = len({row.tray for row in tube}) > 1
        assert not is_parted or len(tube) > fibres_per_tray
        if before and tube[0].tray > before[-1].tray:
            assert before[-1].position + len(tube) > fibres_per_tray
