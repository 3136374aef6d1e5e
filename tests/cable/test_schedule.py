"""The splice schedule, followed by hand from panel to panel, and its rules joint by joint."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.cable.fibres import assign_fibres
from routeplan.cable.hops import whole_hops
from routeplan.cable.model import Cable, FibreUse, Joint, Splice
from routeplan.cable.schedule import EXISTING, OWNERS_COLOUR, PANEL, joint_splice_count, splice_rows
from routeplan.errors import InputError, RangeError
from routeplan.run.practice import CircuitOrder
from tests.cable.schedule_walk import check_joints, check_walks
from tests.cable.small_plants import (
    SmallPlant,
    cut_cable,
    make_cable,
    make_circuit,
    make_joint,
    make_plant,
)


def schedule(
    plant: SmallPlant, uses: Sequence[FibreUse] = (), *, fibres_per_tray: int = 12
) -> tuple[Splice, ...]:
    """Return the schedule of a plant."""
    return splice_rows(
        plant.joints,
        plant.sections,
        plant.cables,
        uses,
        fibres_per_tray=fibres_per_tray,
        limit_db=0.1,
    )


def assign(plant: SmallPlant, circuits: Sequence[CircuitOrder]) -> tuple[FibreUse, ...]:
    """Assign fibres; sites are called as their nodes, every cable is a metre of glass."""
    return assign_fibres(
        circuits,
        plant.cables,
        site_nodes={site: site for site in plant.sites},
        hops=whole_hops(plant.cables, {cable.id: 1000 for cable in plant.cables}),
    ).uses


def pairs(rows: Sequence[Splice]) -> list[tuple[str, int, str | None, int | None, str]]:
    """Return what meets what, shortly."""
    return [
        (row.a.section, row.a.fibre, row.b and row.b.section, row.b and row.b.fibre, row.circuit)
        for row in rows
    ]


@st.composite
def plants(draw: st.DrawFn) -> tuple[SmallPlant, list[CircuitOrder]]:
    """Draw a chain, a tree or a ring of cables, each in some sections, and circuits over it."""
    node_count = draw(st.integers(2, 6))
    is_chain = draw(st.booleans())
    ends = [
        (number - 1 if is_chain else draw(st.integers(0, number - 1)), number)
        for number in range(1, node_count)
    ]
    if node_count > 2 and draw(st.booleans()):
        ends.append((node_count - 1, 0))
    same_count = draw(st.sampled_from([None, 6, 24]))
    cables = []
    for number, pair in enumerate(ends):
        start, end = pair if draw(st.booleans()) else pair[::-1]
        fibre_count = same_count or draw(st.sampled_from([4, 6, 12, 24]))
        cables.append(make_cable(f"K{number}", f"n{start}", f"n{end}", fibre_count=fibre_count))
    degrees = Counter(node for cable in cables for node in (cable.start, cable.end))
    sites = [node for node in degrees if degrees[node] == 1 or draw(st.booleans())]
    section_counts = [draw(st.integers(1, 4)) for _ in cables]
    owner_after = [frozenset({draw(st.integers(1, 6))}) for _ in cables]
    plant = make_plant(cables, sites=sites, section_counts=section_counts, owner_after=owner_after)
    if len(sites) < 2:
        return plant, []
    chosen = st.lists(st.sampled_from(sites), min_size=2, max_size=2, unique=True)
    asked = draw(st.lists(chosen, min_size=1, max_size=3))
    circuits = [
        make_circuit(f"circuit {number}", *pair, fibre_count=draw(st.integers(1, 2)))
        for number, pair in enumerate(asked)
    ]
    return plant, circuits


@given(drawn=plants(), fibres_per_tray=st.sampled_from([12, 24]))
def test_every_circuit_arrives(
    drawn: tuple[SmallPlant, list[CircuitOrder]], fibres_per_tray: int
) -> None:
    """On chains, trees and rings every strand reaches its far panel on the fibres it was given."""
    plant, circuits = drawn
    try:
        uses = assign(plant, circuits)
    except InputError as error:
        assert "has too few fibres" in str(error)  # noqa: PT017  refusing is as good an answer
        return
    assert len({(use.cable, use.fibre) for use in uses}) == len(uses)
    rows = schedule(plant, uses, fibres_per_tray=fibres_per_tray)
    check_joints(plant, rows, fibres_per_tray=fibres_per_tray)
    check_walks(plant, rows, uses, circuits)
    counted = Counter(row.joint for row in rows if row.kind == "splice")
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {joint.id: counted[joint.id] for joint in plant.joints}


def test_straight_joint() -> None:
    """A joint in a cable splices every fibre to itself, and names its circuit where it has one."""
    plant = make_plant([make_cable("K", "a", "b")], sites=["a", "b"], section_counts=[2])
    uses = assign(plant, [make_circuit("Programme", "a", "b")])
    rows = schedule(plant, uses)
    assert pairs(rows) == [
        ("K.1", fibre, "K.2", fibre, "Programme" if fibre <= 2 else "") for fibre in range(1, 25)
    ]
    assert {(row.joint, row.kind, row.limit_db) for row in rows} == {("J K.1 end", "splice", 0.1)}
    last = rows[12]
    assert (last.tray, last.position) == (2, 1)
    assert (last.a.tube_colour, last.a.fibre_colour) == ("orange", "blue")
    assert last.b == replace(last.a, section="K.2", side="start")


def test_trays_of_twenty_four() -> None:
    """Twenty-four fibres fill one tray of twenty-four."""
    plant = make_plant([make_cable("K", "a", "b")], sites=["a", "b"], section_counts=[2])
    rows = schedule(plant, fibres_per_tray=24)
    assert [(row.tray, row.position) for row in rows] == [(1, place) for place in range(1, 25)]


def test_two_cables_of_one_count() -> None:
    """Where two cables of equal count meet, spares go straight through as well."""
    cables = [
        make_cable("K", "a", "x", fibre_count=6),
        make_cable("L", "b", "x", fibre_count=6, code="DIN VDE 0888"),
    ]
    plant = make_plant(cables, sites=["a", "b"])
    rows = schedule(plant, assign(plant, [make_circuit("Programme", "a", "b")]))
    assert pairs(rows) == [
        ("K.1", fibre, "L.1", fibre, "Programme" if fibre <= 2 else "") for fibre in range(1, 7)
    ]
    colours = [(row.a.fibre_colour, row.b and row.b.fibre_colour) for row in rows]
    assert colours[:3] == [("blue", "red"), ("orange", "green"), ("green", "blue")]


def test_spares_beside_a_circuit_that_changes_number() -> None:
    """Spares keep their number where both sides have it free; what is left over meets too."""
    cables = [make_cable(name, "a", "x", fibre_count=4) for name in ("K", "L")]
    plant = make_plant(cables, sites=["a"])
    uses = [
        FibreUse(circuit="C", strand=1, cable="K", fibre=1, forward=True),
        FibreUse(circuit="C", strand=1, cable="L", fibre=3, forward=False),
    ]
    assert pairs(schedule(plant, uses)) == [
        ("K.1", 1, "L.1", 3, "C"),
        ("K.1", 2, "L.1", 2, ""),
        ("K.1", 3, "L.1", 1, ""),
        ("K.1", 4, "L.1", 4, ""),
    ]


def test_branch() -> None:
    """At a branch circuits go from cable to cable, and every spare is stored after the splices."""
    cables = [
        make_cable("K", "a", "x", fibre_count=6),
        make_cable("L", "x", "b", fibre_count=4),
        make_cable("M", "x", "c", fibre_count=2),
    ]
    plant = make_plant(cables, sites=["a", "b", "c"])
    circuits = [
        make_circuit("One", "c", "a", fibre_count=1),
        make_circuit("Two", "b", "a"),
    ]
    uses = assign(plant, circuits)
    rows = schedule(plant, uses)
    assert pairs(rows) == [
        ("K.1", 1, "M.1", 1, "One"),
        ("K.1", 2, "L.1", 2, "Two"),
        ("K.1", 3, "L.1", 3, "Two"),
        *[("K.1", fibre, None, None, "") for fibre in (4, 5, 6)],
        *[("L.1", fibre, None, None, "") for fibre in (1, 4)],
        ("M.1", 2, None, None, ""),
    ]
    assert [row.kind for row in rows] == ["splice"] * 3 + ["stored"] * 6
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {"J x": 3}


def test_three_cables_of_one_count() -> None:
    """Where three cables meet and no circuit goes through, nothing is spliced."""
    cables = [make_cable(name, name.lower(), "x", fibre_count=2) for name in "KLM"]
    plant = make_plant(cables, sites=["k", "l", "m"])
    assert [row.kind for row in schedule(plant)] == ["stored"] * 6
    assert joint_splice_count(plant.joints, plant.sections, plant.cables, ()) == {"J x": 0}


def test_somebody_elses_cable() -> None:
    """Where a cable goes on in somebody else's, every fibre is spliced to that, colours unknown."""
    plant = make_plant(
        [make_cable("K", "a", "b", fibre_count=4)],
        sites=["a", "b"],
        section_counts=[2],
        owner_after=[frozenset({1})],
    )
    uses = assign(plant, [make_circuit("Programme", "a", "b", fibre_count=1)])
    rows = schedule(plant, uses)
    assert [row.joint for row in rows] == ["J K.1 end"] * 4 + ["J K.2 start"] * 4
    assert pairs(rows[:2]) == [
        ("K.1", 1, EXISTING, 1, "Programme"),
        ("K.1", 2, EXISTING, 2, ""),
    ]
    assert {row.b and row.b.fibre_colour for row in rows} == {OWNERS_COLOUR}
    assert {row.b and row.b.cable for row in rows} == {"K"}
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {"J K.1 end": 4, "J K.2 start": 4}


def plant_with_owners_branch(*, has_own_part: bool) -> SmallPlant:
    """Return cables K and L that meet at x, where M begins with somebody else's fibre."""
    cables = [
        make_cable("K", "a", "x", fibre_count=3),
        make_cable("L", "b", "x", fibre_count=3),
        make_cable("M", "x", "c", fibre_count=3),
    ]
    plant = make_plant(cables, sites=["a", "b", "c"])
    joints = [make_joint("J x", [("K.1", "end"), ("L.1", "end")], node="x")]
    if has_own_part:
        joints.append(make_joint("J M", [("M.1", "start")]))
    sections = plant.sections if has_own_part else plant.sections[:2]
    return replace(plant, joints=tuple(joints), sections=sections)


@pytest.mark.parametrize("has_own_part", [True, False])
def test_somebody_elses_cable_at_a_branch(has_own_part: bool) -> None:
    """A circuit that leaves a branch on somebody else's fibre is spliced to it there."""
    plant = plant_with_owners_branch(has_own_part=has_own_part)
    circuits = [
        make_circuit("One", "a", "c", fibre_count=1),
        make_circuit("Two", "b", "a", fibre_count=1),
    ]
    rows = schedule(plant, assign(plant, circuits))
    assert pairs(rows)[:4] == [
        ("K.1", 1, EXISTING, 1, "One"),
        ("K.1", 2, "L.1", 2, "Two"),
        ("K.1", 3, "L.1", 3, ""),
        ("L.1", 1, None, None, ""),
    ]
    owners = [row.b.cable for row in rows if row.b is not None and row.b.section == EXISTING]
    assert owners == ["M"] * (4 if has_own_part else 1)
    assert len(rows) == (7 if has_own_part else 4)


def test_two_cables_onto_somebody_elses() -> None:
    """Circuits of both cables may leave on somebody else's fibre, and the count says so."""
    plant = plant_with_owners_branch(has_own_part=False)
    circuits = [make_circuit(name, name, "c", fibre_count=1) for name in "ab"]
    uses = assign(plant, circuits)
    assert pairs(schedule(plant, uses)) == [
        ("K.1", 1, EXISTING, 1, "a"),
        ("K.1", 2, "L.1", 1, ""),
        ("K.1", 3, "L.1", 3, ""),
        ("L.1", 2, EXISTING, 2, "b"),
    ]
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {"J x": 4}


def test_last_end_onto_somebody_elses() -> None:
    """A cable that ends at a node and goes on in another's, hands over its spares there too."""
    cables = [make_cable(*names, fibre_count=2) for names in (("K", "a", "x"), ("M", "x", "c"))]
    plant = make_plant(cables, sites=["a", "c"])
    joint = make_joint("J x", [("K.1", "end")], node="x")
    plant = replace(plant, joints=(joint,), sections=plant.sections[:1])
    rows = schedule(plant, assign(plant, [make_circuit("One", "a", "c", fibre_count=1)]))
    assert pairs(rows) == [("K.1", 1, EXISTING, 1, "One"), ("K.1", 2, EXISTING, 2, "")]
    assert [row.b and row.b.cable for row in rows] == ["M", "M"]


def test_joint_with_a_cable_that_goes_on_and_another() -> None:
    """Beside another cable, a cable cut at a branch goes on in itself and the other is stored."""
    cable, other = make_cable("K", "a", "b", fibre_count=3), make_cable("L", "c", "x")
    sections, (joint,) = cut_cable(cable, 2)
    more, _ = cut_cable(other, 1)
    three = replace(joint, node="x", ends=(*make_joint("", [("L.1", "end")]).ends, *joint.ends))
    plant = SmallPlant(
        cables=(cable, other),
        sections=(*sections, *more),
        joints=(three,),
        sites=frozenset("abc"),
    )
    uses = assign(plant, [make_circuit("Programme", "a", "b", fibre_count=1)])
    rows = schedule(plant, uses)
    assert pairs(rows)[:4] == [
        ("K.1", 1, "K.2", 1, "Programme"),
        ("K.1", 2, "K.2", 2, ""),
        ("K.1", 3, "K.2", 3, ""),
        ("L.1", 1, None, None, ""),
    ]
    assert len(rows) == 3 + 24


def one_joint(joint: Joint) -> SmallPlant:
    """Return a cable in two sections with `joint` between them."""
    cable: Cable = make_cable("K", "a", "b")
    sections, _ = cut_cable(cable, 2)
    return SmallPlant(
        cables=(cable,), sections=tuple(sections), joints=(joint,), sites=frozenset("ab")
    )


def test_mated_joint_has_no_splices() -> None:
    """Connectors that are mated are not spliced."""
    plant = one_joint(make_joint("J1", [("K.1", "end"), ("K.2", "start")], kind="mated"))
    assert schedule(plant) == ()
    assert joint_splice_count(plant.joints, plant.sections, plant.cables, ()) == {"J1": 0}


def test_a_cable_entered_at_a_branch() -> None:
    """Only fibres of the circuit that leaves are cut; their far side is stored, all others pass."""
    plant = entered_plant(node="n", ends=[("L.1", "start")])
    uses = [
        FibreUse(
            circuit="C", strand=1, cable="K", fibre=2, forward=True, span_mm=(0, 500_000), end="n"
        ),
        FibreUse(circuit="C", strand=1, cable="L", fibre=2, forward=True),
        FibreUse(circuit="Past", strand=1, cable="K", fibre=1, forward=True),
    ]
    rows = schedule(plant, uses)
    check_joints(plant, rows, fibres_per_tray=12)
    spliced = [row for row in rows if row.kind == "splice"]
    assert [(row.a.section, row.a.fibre, row.circuit) for row in spliced] == [("L.1", 2, "C")]
    assert spliced[0].b == replace(spliced[0].a, cable="K", section="K.1", side="end")
    stored = [(row.a.section, row.a.side, row.a.fibre) for row in rows if row.kind == "stored"]
    assert stored == [("L.1", "start", n) for n in (1, 3, 4)] + [("K.1", "start", 2)]
    uncut = [(row.a.fibre, row.circuit) for row in rows if row.kind == "express"]
    assert uncut == [(1, "Past"), (3, ""), (4, "")]
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {"J1": 1}


def test_a_cable_entered_at_a_site() -> None:
    """A fibre cut at a site serves one circuit from either side, each spliced to a pigtail."""
    plant = entered_plant(node="s", ends=[])
    uses = [
        FibreUse(
            circuit="West",
            strand=1,
            cable="K",
            fibre=3,
            forward=True,
            span_mm=(0, 500_000),
            end="s",
        ),
        FibreUse(
            circuit="East",
            strand=1,
            cable="K",
            fibre=3,
            forward=False,
            span_mm=(500_000, 1_000_000),
            start="s",
        ),
    ]
    rows = schedule(plant, uses)
    check_joints(plant, rows, fibres_per_tray=12)
    cut = [(row.a.side, row.a.fibre, row.circuit) for row in rows if row.kind == "splice"]
    assert cut == [("end", 3, "West"), ("start", 3, "East")]
    assert {row.b and row.b.section for row in rows if row.kind == "splice"} == {PANEL}
    assert [row.a.fibre for row in rows if row.kind == "express"] == [1, 2, 4]
    counts = joint_splice_count(plant.joints, plant.sections, plant.cables, uses)
    assert counts == {"J1": 2}


def entered_plant(*, node: str, ends: list[tuple[str, str]]) -> SmallPlant:
    """Return cable K of four fibres entered in its middle, and a cable L that ends there."""
    cables = [
        make_cable("K", "a", "b", fibre_count=4),
        make_cable("L", node, "c", fibre_count=4),
    ]
    joint = make_joint("J1", ends, node=node, opened=("K.1",), opened_mm=(500_000,))
    sections = tuple(cut_cable(cable, 1)[0][0] for cable in cables)
    return SmallPlant(
        cables=tuple(cables), sections=sections, joints=(joint,), sites=frozenset("abc")
    )


def test_tray_must_hold_something() -> None:
    """A tray of no fibres is an error."""
    with pytest.raises(RangeError, match="fibres per tray: is too small"):
        schedule(one_joint(make_joint("J1", [])), fibres_per_tray=0)
