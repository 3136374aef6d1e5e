"""The demo run of two studios: two ways along the island's streets, both circuits fit."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from routeplan.cli import main
from routeplan.planning import Plan, plan
from routeplan.run import read_run

DEMO = Path(__file__).parents[2] / "demo_routes"


@pytest.fixture(scope="module")
def planned() -> Plan:
    return plan(read_run(DEMO / "two_studios"))


def test_the_command_ends_well(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Exit code 0: nothing fails, and both circuits fit."""
    assert main(["plan", str(DEMO / "two_studios"), "--out", str(tmp_path / "out")]) == 0
    document = json.loads((tmp_path / "out" / "plan.json").read_text("utf-8"))
    assert [circuit["verdict"] for circuit in document["circuits"]] == ["fits", "fits"]
    assert "Programme standby" in capsys.readouterr().out


def test_nobody_drew_a_line() -> None:
    """The geometry holds two studios and nothing else."""
    run = read_run(DEMO / "two_studios")
    assert run.lines == ()
    assert [place.role for place in run.places] == ["studio", "studio"]


def test_the_two_ways_have_no_street_and_no_junction_in_common(planned: Plan) -> None:
    """Only their last metres to the studios are shared; they cross the river on two bridges."""
    ways = planned.pairs[0].ways
    edges = [
        {part.edge for part in way.parts if part.edge >= 0} for way in (ways.main, ways.standby)
    ]
    cut = {way.parts[at].edge for way in (ways.main, ways.standby) for at in (1, -2)}
    assert edges[0] & edges[1] <= cut, "a studio's own street is left by one at each end"
    bridges = [
        {part.name for part in way.parts if part.is_bridge} for way in (ways.main, ways.standby)
    ]
    assert bridges == [{"Lunnoth Bridge"}, {"Lunnothfoot Bridge"}]
    assert {each.kind for each in ways.exposures} == {"shared", "near"}
    assert sum(each.length_m for each in ways.exposures) < 100.0


def test_each_way_is_a_leg_of_its_own_with_its_cable(planned: Plan) -> None:
    """Two legs from studio to studio, a cable each, and a circuit in each cable."""
    assert [leg.name for leg in planned.ground.legs] == ["Main", "Standby"]
    assert [cable.name for cable in planned.layout.cables] == ["Main", "Standby"]
    taken = [{use.cable for use in circuit.uses} for circuit in planned.circuits]
    assert taken == [{"C1"}, {"C2"}]
