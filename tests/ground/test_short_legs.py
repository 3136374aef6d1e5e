"""A leg of no length is named, one of a millimetre is laid."""

from __future__ import annotations

from pathlib import Path

import pytest

from routeplan.errors import GeometryError
from tests.sheets.plans import equator, line, planned


def test_a_leg_of_no_length_is_named(tmp_path: Path) -> None:
    """A line shorter than half a millimetre has no length in whole ones: an error, not a leg."""
    with pytest.raises(GeometryError, match="shorter than a millimetre"):
        planned(tmp_path, [line([equator(0), equator(0.0003)], name="Speck")])


def test_the_shortest_leg_is_laid(tmp_path: Path) -> None:
    """A leg of one millimetre is planned like any other."""
    plan = planned(tmp_path, [line([equator(0), equator(0.0008)])])
    assert plan.ground.legs[0].length_mm == 1
