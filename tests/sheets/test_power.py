"""Loss against the ground: whole on every leg that a circuit runs along."""

from __future__ import annotations

from pathlib import Path

import pytest

from routeplan.planning import plan
from routeplan.run import read_run
from routeplan.sheets.power import power_rows

DEMO = Path(__file__).parents[2] / "demo_routes/lunnoth_drop"


def test_the_loss_goes_on_where_a_cable_passes_from_leg_to_leg() -> None:
    """Each leg's curve runs from end to end, the second goes on where the first stopped."""
    planned = plan(read_run(DEMO))
    programme = planned.circuits[0]
    rows = list(power_rows(planned, programme))
    first, second = ([row for row in rows if row["leg"] == leg.name] for leg in planned.ground.legs)
    for leg, own in zip(planned.ground.legs, (first, second), strict=True):
        assert own[0]["ground_m"] == 0.0
        assert own[-1]["ground_m"] == leg.length_mm / 1000
    assert second[0]["loss_db"] == first[-1]["loss_db"]
    assert rows[-1]["loss_db"] == pytest.approx(programme.budgets[0].nominal_db, abs=0.005)
    losses = [row["loss_db"] for row in rows]
    assert losses == sorted(losses)  # type: ignore[type-var]
