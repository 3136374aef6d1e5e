"""Figures for pictures, and paths without a map."""

from __future__ import annotations

import pytest

from routeplan.light.attenuation import attenuation_of
from routeplan.light.budget import circuit_budget
from routeplan.light.grid import part_loss
from routeplan.light.model import Part
from routeplan.light.profile import levels_along, loss_spectrum, quick_path
from tests.light.small_paths import path, practice


def test_levels_end_at_the_nominal_loss_and_never_rise() -> None:
    """What has built up at the far end is what the budget says."""
    way = path([2000.0, 3000.0])
    points = levels_along(way, 1550.0, practice=practice())
    losses = [point.loss_db for point in points]
    assert losses == sorted(losses)
    budget = circuit_budget(way, 1550.0, practice=practice())
    assert losses[-1] == pytest.approx(budget.nominal_db, abs=0.001)
    assert points[-1].glass_m == 5000.0


def test_spectrum_covers_all_bands() -> None:
    """One value a nanometre from 1260 to 1625."""
    nm, loss = loss_spectrum(attenuation_of("G.652.D").typical)
    assert (nm[0], nm[-1], len(nm), len(loss)) == (1260.0, 1625.0, 366, 366)


def test_a_quick_path_has_what_was_asked_for() -> None:
    """20 km in five sections, four splices, two pairs and a splitter."""
    splitter = Part(where="hut", item="splitter 1:4", loss=part_loss("splitter 1:4"))
    way = quick_path(
        20_000.0, fibre_type="G.652.D", splices=4, connector_pairs=2, parts=(splitter,)
    )
    lines = {line.item: line for line in circuit_budget(way, 1310.0, practice=practice()).lines}
    assert lines["fibre G.652.D"].each_db == pytest.approx(6.6)
    assert lines["splices in joints"].count == 4
    assert lines["connector pairs"].count == 2
    assert lines["splitter 1:4 hut"].limit_db == 7.4
