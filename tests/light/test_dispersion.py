"""Chromatic dispersion of fibre types and circuits."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.light.dispersion import (
    dispersion_range_ps_per_nm,
    dispersion_range_ps_per_nm_km,
    linear_range_ps_per_nm_km,
    pulse_spread_ps,
    sellmeier_ps_per_nm_km,
)
from routeplan.light.fibres import fibre_names, find_fibre
from tests.light.small_paths import example, published


@pytest.mark.parametrize(
    "row", published("dispersion_envelope.csv"), ids=lambda r: r["wavelength_nm"]
)
@pytest.mark.parametrize("fibre_type", ["G.652.D", "G.657.A1", "G.657.A2"])
def test_envelope_is_the_four_corner_one(row: dict[str, str], fibre_type: str) -> None:
    """Least and greatest over the box of zero and slope, to three decimals, on both sides of 0."""
    low, high = dispersion_range_ps_per_nm_km(float(row["wavelength_nm"]), find_fibre(fibre_type))
    assert low == pytest.approx(float(row["min_ps_per_nm_km"]), abs=5e-4)
    assert high == pytest.approx(float(row["max_ps_per_nm_km"]), abs=5e-4)


@pytest.mark.parametrize("wavelength_nm", [1260.0, 1305.0, 1312.0, 1400.0, 1625.0])
def test_no_fibre_inside_the_box_lies_outside_the_envelope(wavelength_nm: float) -> None:
    """A fine grid of the box finds nothing beyond the corners."""
    low, high = dispersion_range_ps_per_nm_km(wavelength_nm, find_fibre("G.652.D"))
    inside = [
        sellmeier_ps_per_nm_km(wavelength_nm, zero_dispersion_nm=zero, slope_ps_per_nm2_km=slope)
        for zero in np.linspace(1300.0, 1324.0, 25)
        for slope in np.linspace(0.073, 0.092, 20)
    ]
    assert low == pytest.approx(min(inside))
    assert high == pytest.approx(max(inside))


def test_example_of_a_spread_over_100_km() -> None:
    """Mynbaev and Scheiner, example 6.3.1: 17.46 ps/(nm km) and 1746.06 ps."""
    coefficient = sellmeier_ps_per_nm_km(
        1550.0, zero_dispersion_nm=1310.0, slope_ps_per_nm2_km=0.092
    )
    value, tolerance = example("E15", "dispersion")
    assert coefficient == pytest.approx(value, abs=tolerance)
    value, tolerance = example("E15", "spread")
    assert pulse_spread_ps(coefficient * 100.0, 1.0) == pytest.approx(value, abs=tolerance)


def test_example_below_the_zero() -> None:
    """Mynbaev and Scheiner, example 3.3.5: -4.38 ps/(nm km)."""
    value, tolerance = example("E16", "dispersion")
    assert sellmeier_ps_per_nm_km(
        1300.0, zero_dispersion_nm=1343.0, slope_ps_per_nm2_km=0.097
    ) == pytest.approx(value, abs=tolerance)


@pytest.mark.parametrize(
    ("fibre_type", "wavelength_nm", "low", "high"),
    [
        # ITU-T G.655: 2.80 to 6.20 for D and 6.06 to 9.31 for E at 1550 nm (read).
        ("G.655.D", 1550.0, 2.80, 6.20),
        ("G.655.E", 1550.0, 6.06, 9.31),
        # ITU-T G.654.E: 17 to 23 at 1550 nm (from memory), slope 0.050 to 0.070.
        ("G.654.E", 1550.0, 17.0, 23.0),
        ("G.654.E", 1590.0, 19.0, 25.8),
        # ITU-T G.656: not above 14 over 1460 to 1625 nm (from memory).
        ("G.656", 1625.0, 4.58, 14.0),
    ],
)
def test_bounds_by_wavelength(
    fibre_type: str, wavelength_nm: float, low: float, high: float
) -> None:
    """Types whose recommendation bounds the coefficient by wavelength keep to those bounds."""
    found = dispersion_range_ps_per_nm_km(wavelength_nm, find_fibre(fibre_type))
    assert found == pytest.approx((low, high), abs=1e-9)


@pytest.mark.parametrize("fibre_type", fibre_names())
def test_every_type_has_a_range_at_every_wavelength(fibre_type: str) -> None:
    """The least is never above the greatest."""
    for nm in range(1260, 1626, 5):
        low, high = dispersion_range_ps_per_nm_km(float(nm), find_fibre(fibre_type))
        assert low <= high


def test_spans_of_unlike_fibre_add_up() -> None:
    """The circuit's range is the sum of the spans' ranges, ends with ends."""
    ordinary, shifted = find_fibre("G.652.D"), find_fibre("G.655.E")
    low, high = dispersion_range_ps_per_nm(1550.0, [(ordinary, 10_000.0), (shifted, 5_000.0)])
    assert low == pytest.approx(132.28 + 30.30, abs=0.01)
    assert high == pytest.approx(180.10 + 46.55, abs=0.01)


def test_linear_limits_of_the_2016_edition_are_not_the_envelope() -> None:
    """13.3 and 18.6 at 1550 nm bound a straight line, not the Sellmeier form: 13.23 and 18.01."""
    fibre = find_fibre("G.652.D")
    assert linear_range_ps_per_nm_km(1550.0, fibre) == (13.3, 18.6)
    assert linear_range_ps_per_nm_km(1625.0, fibre) == pytest.approx((17.05, 23.625))
    assert dispersion_range_ps_per_nm_km(1550.0, fibre) != pytest.approx((13.3, 18.6), abs=0.05)
    assert linear_range_ps_per_nm_km(1550.0, find_fibre("G.656")) is None
