"""Levels along a path grow step by step to what the budget says."""

from __future__ import annotations

from math import sqrt

import pytest

from routeplan.light.along import levels_along, losses_along_db
from routeplan.light.budget import circuit_budget
from routeplan.light.model import Glass, Path, SpliceStep
from routeplan.light.power import least_loss_db
from tests.light.small_paths import path, practice


def test_levels_start_at_nothing_and_end_at_the_budget() -> None:
    """Nominal, least and worst at the far end are those of the budget but for rounding."""
    way = path([2000.0, 3000.0, 1000.0])
    levels = levels_along(way, 1550.0, practice=practice(), measured={})
    budget = circuit_budget(way, 1550.0, practice=practice())
    assert len(levels) == len(way.steps) + 1
    assert (levels[0].glass_m, levels[0].nominal_db, levels[0].worst_db) == (0.0, 0.0, 0.0)
    assert levels[-1].glass_m == 6000.0
    assert levels[-1].nominal_db == pytest.approx(budget.nominal_db, abs=0.001)
    assert levels[-1].worst_db == pytest.approx(budget.worst_db, abs=0.001)
    least_db = least_loss_db(budget.lines, sigma_count=3.0)
    assert levels[-1].least_db == pytest.approx(least_db, abs=0.003)


def test_nominal_levels_are_the_losses_along() -> None:
    """Both ways of adding up agree at every step."""
    way = path([2000.0, 3000.0])
    levels = levels_along(way, 1310.0, practice=practice(), measured={})
    losses = losses_along_db(way, 1310.0, practice=practice(), measured={})
    for level, loss_db in zip(levels[1:], losses, strict=True):
        assert level.nominal_db == pytest.approx(loss_db, abs=0.01)


def test_variances_add_along_the_way() -> None:
    """Behind four splices the least loss is four means less three sigma of all four together."""
    steps = tuple(SpliceStep(where=f"J{n}") for n in range(4))
    way = Path(circuit="c", direction="from-to", steps=steps)
    rules = practice(splice_mean_db=0.5, splice_sigma_db=0.03, splice_limit_db=0.9)
    last = levels_along(way, 1550.0, practice=rules, measured={})[-1]
    assert last.least_db == pytest.approx(4 * 0.5 - 3 * 0.03 * sqrt(4))
    assert last.worst_db == pytest.approx(3.6)


def test_unlike_fibre_loses_at_its_joint() -> None:
    """The mismatch of mode fields is added where the two types meet, as in the budget."""
    steps = (
        Glass(section="S1", fibre=1, fibre_type="G.652.D", glass_m=1000.0),
        SpliceStep(where="J1"),
        Glass(section="S2", fibre=1, fibre_type="G.657.B3", glass_m=1000.0),
    )
    way = Path(circuit="c", direction="from-to", steps=steps)
    budget = circuit_budget(way, 1550.0, practice=practice())
    levels = levels_along(way, 1550.0, practice=practice(), measured={})
    assert any(line.item.startswith("mode-field mismatch") for line in budget.lines)
    assert levels[-1].worst_db == pytest.approx(budget.worst_db, abs=0.002)
    assert levels[2].nominal_db - levels[1].nominal_db > practice().splice_mean_db
    losses = losses_along_db(way, 1550.0, practice=practice(), measured={})
    assert losses[-1] == pytest.approx(budget.nominal_db, abs=0.002)
    assert losses[1] - losses[0] > practice().splice_mean_db
