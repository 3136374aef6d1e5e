"""Polarisation mode dispersion of a link."""

from __future__ import annotations

import pytest

from routeplan.light.fibres import find_fibre
from routeplan.light.pmd import link_pmd_ps


def test_link_value_grows_with_the_root_of_length() -> None:
    """0.2 ps/sqrt(km): 2 ps over 100 km, 4 ps over 400 km."""
    fibre = find_fibre("G.652.D")
    assert link_pmd_ps([(fibre, 100_000.0)]) == pytest.approx(2.0)
    assert link_pmd_ps([(fibre, 400_000.0)]) == pytest.approx(4.0)


def test_unlike_spans_add_by_squares() -> None:
    """Spans add by the squares of their values, in any order, and splitting one changes none."""
    ordinary, bend = find_fibre("G.652.D"), find_fibre("G.657.B3")
    both = link_pmd_ps([(ordinary, 9_000.0), (bend, 4_000.0)])
    assert both == pytest.approx((0.2**2 * 9.0 + 0.5**2 * 4.0) ** 0.5)
    assert link_pmd_ps(
        [(bend, 4_000.0), (ordinary, 5_000.0), (ordinary, 4_000.0)]
    ) == pytest.approx(both)
