"""Plants of many shapes, planned and then walked fibre by fibre by something that did not plan."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cache
from itertools import groupby

import pytest

from routeplan.cable.assembly import put_together
from routeplan.cable.fibres import FibrePlan
from routeplan.cable.layout import LaidCable, lay_cables
from routeplan.cable.model import Layout, Splice
from routeplan.cable.panels import Port, panel_ports
from routeplan.cable.schedule import joint_splice_count, splice_rows
from routeplan.circuits import circuit_fibres
from routeplan.errors import InputError
from routeplan.ground.legs import lay_ground
from routeplan.ground.model import Ground
from routeplan.run.model import Run
from tests.cable.plant_walk import PlantWalker
from tests.cable.random_plants import random_plant
from tests.cable.schedule_walk import check_joint_rows

SEEDS = 2100
BLOCKS = 15


@dataclass(frozen=True, kw_only=True)
class Planned:
    """A plant planned as far as its schedule, without the light."""

    run: Run
    ground: Ground
    laid: tuple[LaidCable, ...]
    fibres: FibrePlan
    layout: Layout
    rows: tuple[Splice, ...]
    ports: tuple[Port, ...]


def planned(run: Run) -> Planned:
    """Plan a run as far as its schedule."""
    ground = lay_ground(run)
    laid = lay_cables(run, ground)
    fibres = circuit_fibres(ground, laid, run.circuits)
    layout = put_together(run, ground, laid, fibres.uses)
    rows = splice_rows(
        layout.joints,
        layout.sections,
        layout.cables,
        fibres.uses,
        fibres_per_tray=run.practice.joints.fibres_per_tray,
        limit_db=0.1,
    )
    ports = panel_ports(
        layout,
        fibres.uses,
        site_names={node.id: node.name for node in ground.nodes if node.is_site},
        fibre_counts={circuit.name: circuit.fibre_count for circuit in run.circuits},
    )
    return Planned(
        run=run, ground=ground, laid=laid, fibres=fibres, layout=layout, rows=rows, ports=ports
    )


@cache
def block(number: int) -> tuple[tuple[int, Planned], ...]:
    """Return the plants of one block of seeds that have fibres enough for their circuits."""
    found = []
    for seed in range(number, SEEDS, BLOCKS):
        try:
            found.append((seed, planned(random_plant(seed))))
        except InputError as error:
            assert "too few fibres" in str(error) or "no cables join" in str(error)  # noqa: PT017
    return tuple(found)


@pytest.mark.parametrize("number", range(BLOCKS))
def test_light_arrives(number: int) -> None:
    """From each port light goes out of, it comes in at one of the same circuit; by pairs, once."""
    plants = block(number)
    assert len(plants) > SEEDS / BLOCKS / 2
    for seed, plant in plants:
        check_light(seed, plant)


def check_light(seed: int, plant: Planned) -> None:
    """Walk every circuit of a plant, panel by panel, from its first site to its last and back."""
    names = {node.id: node.name for node in plant.ground.nodes if node.is_site}
    walker = PlantWalker(plant.layout, plant.rows, site_names=names)
    orders = {circuit.name: circuit for circuit in plant.run.circuits}
    arrived: dict[str, list[tuple[Port, Port]]] = {name: [] for name in orders}
    seen: set[tuple[str, int]] = set()
    for port in plant.ports:
        if port.light not in ("out", "both") or (port.site, port.port) in seen:
            continue
        arrival = walker.enter(port)
        assert {row.circuit for row in arrival.rows} <= {port.circuit}, seed
        far = [
            other
            for other in plant.ports
            if (other.site, other.cable, other.fibre, other.circuit, other.light)
            == (
                arrival.site,
                arrival.cable,
                arrival.fibre,
                port.circuit,
                "both" if port.light == "both" else "in",
            )
            and other is not port
        ]
        assert len(far) == 1, seed
        seen.add((far[0].site, far[0].port))
        arrived[port.circuit].append((port, far[0]))
    for name, order in orders.items():
        pairs = Counter((one.site, other.site) for one, other in arrived[name])
        leaves = Counter(site for site, _ in pairs.elements())
        comes = Counter(site for _, site in pairs.elements())
        # What comes in at a site goes out again, but for the ends.
        rest = leaves.copy()
        rest.subtract(comes)
        ends = {} if order.fibre_count == 2 else {order.from_: 1, order.to: 1}
        odd = {site: count % 2 for site, count in (leaves + comes).items() if count % 2}
        if order.fibre_count == 2:
            assert not any(rest.values()), seed
            assert leaves[str(order.from_)] == comes[str(order.from_)] == 1
            assert leaves[str(order.to)] == comes[str(order.to)] == 1
        else:
            assert odd == ends, seed
    assert set(walker.passed.values()) <= {1}, f"a fibre is used twice, seed {seed}"


@pytest.mark.parametrize("number", range(BLOCKS))
def test_schedules_are_whole(number: int) -> None:
    """Every fibre of every piece stands in its joint once, in its colours, on trays in order."""
    for seed, plant in block(number):
        by_joint = {key: list(of) for key, of in groupby(plant.rows, key=lambda row: row.joint)}
        assert list(by_joint) == [joint.id for joint in plant.layout.joints], seed
        filled: Counter[str] = Counter()
        for joint in plant.layout.joints:
            closure = joint.closure or joint.id
            check_joint_rows(
                joint,
                by_joint[joint.id],
                sections=plant.layout.sections,
                cables=plant.layout.cables,
                fibres_per_tray=plant.run.practice.joints.fibres_per_tray,
                trays_before=filled[closure],
            )
            filled[closure] += len({row.tray for row in by_joint[joint.id]} - {0})


@pytest.mark.parametrize("number", range(BLOCKS))
def test_counts_and_costs_are_those_of_the_rows(number: int) -> None:
    """Splices are counted as they are listed, and the cost of a layout is that of its parts."""
    for seed, plant in block(number):
        layout = plant.layout
        listed = Counter(row.joint for row in plant.rows if row.kind == "splice")
        counts = joint_splice_count(
            layout.joints, layout.sections, layout.cables, plant.fibres.uses
        )
        assert counts == {joint.id: listed[joint.id] for joint in layout.joints}, seed
        parts = sum(reel.cost_cents for reel in layout.reels)
        parts += sum(joint.cost_cents for joint in layout.joints)
        assert layout.proof.cost_cents == parts
        assert [joint.id for joint in layout.joints] == [
            f"J{number}" for number in range(1, len(layout.joints) + 1)
        ]
        for cable, rulers in zip(plant.laid, layout.rulers, strict=True):
            own = [s for s in layout.sections if s.cable == cable.way.cable.id]
            assert sum(section.sheath_mm for section in own) == rulers.sheath_mm[-1]
            assert sum(section.glass_mm for section in own) == rulers.glass_mm[-1]


def test_the_plants_are_of_all_kinds() -> None:
    """Cables go through several legs, are entered at branches and sites, and lie side by side."""
    plants = [plant for number in range(3) for _, plant in block(number)]
    joints = [joint for plant in plants for joint in plant.layout.joints]
    assert sum(len(cable.legs) > 1 for plant in plants for cable in plant.layout.cables) > 50
    assert sum(bool(joint.opened and joint.ends) for joint in joints) > 10
    assert sum(bool(joint.opened and not joint.ends) for joint in joints) > 10
    assert sum(len(joint.ends) > 2 for joint in joints) > 10
    assert sum(plant.fibres.change_count > 0 for plant in plants) > 0
    shared = (
        Counter(leg for cable in plant.layout.cables for leg, _ in cable.legs) for plant in plants
    )
    assert sum(max(counts.values()) > 1 for counts in shared) > 10
