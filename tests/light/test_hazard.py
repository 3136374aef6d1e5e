"""Laser power and hazard levels."""

from __future__ import annotations

import pytest

from routeplan.light.budget import circuit_budget
from routeplan.light.hazard import hazard_level, launch_hazard, total_dbm
from routeplan.light.interfaces import Optic, find_interface
from routeplan.tables import load_rows
from tests.light.small_paths import optic, path, practice

ROWS: tuple[Optic, ...] = load_rows("interfaces", Optic)


def test_four_lanes_are_six_decibels_more() -> None:
    """Four lanes at +4.5 dBm are 10.52 dBm in the fibre."""
    assert total_dbm(4.5, 4) == pytest.approx(10.52, abs=0.005)
    assert total_dbm(4.5, 1) == 4.5


@pytest.mark.parametrize("row", [r for r in ROWS if r.tx_total_max_dbm], ids=lambda r: r.name)
def test_stated_total_is_that_of_the_lanes(row: Optic) -> None:
    """A total that a standard prints agrees with its lanes to its digit."""
    assert row.tx_max_dbm is not None
    assert total_dbm(row.tx_max_dbm, len(row.wavelengths_nm)) == pytest.approx(
        row.tx_total_max_dbm, abs=0.055
    )


@pytest.mark.parametrize(
    ("power_dbm", "wavelength_nm", "level"),
    [
        (11.9, 1310.0, "1"),
        (12.0, 1310.0, "1M"),
        (16.4, 1310.0, "3B"),
        (10.0, 1550.0, "1"),
        (10.1, 1550.0, "1M"),
        (21.4, 1550.0, "3B"),
        (27.1, 1550.0, "4"),
    ],
)
def test_hazard_levels(power_dbm: float, wavelength_nm: float, level: str) -> None:
    """IEC 60825-2 (from memory): 15.6 and 42.8 mW at 1310 nm, 10 and 136 mW at 1550, 500 mW."""
    assert hazard_level(power_dbm, wavelength_nm) == level


def test_lanes_count_together() -> None:
    """Eight lanes at 5.3 dBm are 14.3 dBm and no longer level 1, though each lane alone is."""
    launched = launch_hazard(find_interface("400GBASE-LR8", {}).at_from)
    assert launched is not None
    assert launched[0] == pytest.approx(14.33, abs=0.005)
    assert launched[1] == "1M"
    assert launch_hazard(optic()) is None


def test_a_budget_warns_of_more_than_level_1() -> None:
    """The remark is there and decides nothing; a weak laser has none."""
    loud = find_interface("400GBASE-LR8", {}).at_from
    budget = circuit_budget(path([500.0]), 1310.0, practice=practice(margin_db=0.0), optic=loud)
    assert any("hazard level 1M" in reason for reason in budget.reasons)
    quiet = find_interface("10GBASE-LR", {}).at_from
    budget = circuit_budget(path([500.0]), 1310.0, practice=practice(), optic=quiet)
    assert not any("hazard" in reason for reason in budget.reasons)
