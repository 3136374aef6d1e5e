"""Repairs and ageing."""

from __future__ import annotations

import pytest

from routeplan.light.budget import circuit_budget
from routeplan.light.interfaces import find_interface
from routeplan.light.life import ageing_lines, repair_line
from tests.light.small_paths import path, practice


def test_a_repair_is_two_splices_four_tails_and_new_cable() -> None:
    """40 m and four tails of 15 m at 1310 nm: 0.1 km of glass, two splices, each repair."""
    line = repair_line(
        3,
        cable_m=40.0,
        tail_m=15.0,
        fibre_type="G.652.D",
        wavelength_nm=1310.0,
        practice=practice(),
    )
    assert (line.count, line.each_db, line.limit_db) == (3, 0.133, 0.235)
    assert line.sigma_db == pytest.approx((2 * 0.03**2) ** 0.5, abs=6e-4)
    assert "100 m" in line.source


def test_allowances_say_why() -> None:
    """Temperature goes with length, the others do not; each has its reason."""
    short, long = ageing_lines(1_000.0), ageing_lines(40_000.0)
    grown = [a.item for a, b in zip(short, long, strict=True) if a.each_db != b.each_db]
    assert grown == ["temperature"]
    assert all(line.each_db == line.limit_db and line.source for line in long)


def test_end_of_life_takes_from_the_margin_and_not_from_overload() -> None:
    """The last day has less in hand by exactly its allowances; the receiver stands the first."""
    link = find_interface("10GBASE-ER", {}).at_from
    way, kept = path([5000.0] * 4), practice(margin_db=0.0)
    first = circuit_budget(way, 1550.0, practice=kept, optic=link)
    years = ageing_lines(20_000.0)
    last = circuit_budget(way, 1550.0, practice=kept, optic=link, allowances=years)
    assert first.margin_db is not None
    assert last.margin_db == pytest.approx(first.margin_db - 2.5, abs=1e-9)
    assert last.overload_db == first.overload_db
    assert {line.item for line in last.lines} > {"temperature", "transmitter ageing"}
