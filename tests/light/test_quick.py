"""Paths without a map."""

from __future__ import annotations

import pytest

from routeplan.light.budget import circuit_budget
from routeplan.light.grid import part_loss
from routeplan.light.model import Part
from routeplan.light.quick import quick_path
from tests.light.small_paths import practice


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
