"""The demo run with a drop: one cable past a relay, entered there at mid-span."""

from __future__ import annotations

from pathlib import Path

import pytest

from routeplan.planning import Plan, plan, splices
from routeplan.run import read_run

DEMO = Path(__file__).parents[2] / "demo_routes"


@pytest.fixture(scope="module")
def planned() -> Plan:
    return plan(read_run(DEMO / "lunnoth_drop"))


def test_both_circuits_fit(planned: Plan) -> None:
    """The programme and the relay's feed arrive."""
    assert [circuit.verdict for circuit in planned.circuits] == ["fits", "fits"]


def test_one_cable_passes_the_relay_uncut(planned: Plan) -> None:
    """Two legs, one cable, the sections of the link without the drop, and one closure more."""
    plain = plan(read_run(DEMO / "quenmoor_link"))
    assert [cable.name for cable in planned.layout.cables] == ["Trunk"]
    assert len(planned.ground.legs) == 2
    assert len(planned.layout.sections) == len(plain.layout.sections)
    assert len(planned.layout.joints) == len(plain.layout.joints) + 1


def test_only_the_fibres_of_the_feed_are_cut(planned: Plan) -> None:
    """In the closure at the relay two fibres go to the panel and twenty-two pass."""
    (joint,) = (joint for joint in planned.layout.joints if joint.opened)
    rows = [row for row in splices(planned) if row.joint == joint.id]
    assert {row.circuit for row in rows if row.kind == "splice"} == {"Relay feed"}
    assert sum(row.kind == "splice" for row in rows) == 2
    assert sum(row.kind == "express" for row in rows) == 22
