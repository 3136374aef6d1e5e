"""How long light takes."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.light.delay import delay_ns, group_index, link_delay_ns
from routeplan.light.fibres import fibre_names, find_fibre


@pytest.mark.parametrize(
    ("glass_m", "wavelength_nm", "expected_us"),
    [(25_000.0, 1310.0, 122.385), (80_000.0, 1550.0, 391.791)],
)
def test_delay_of_ordinary_fibre(glass_m: float, wavelength_nm: float, expected_us: float) -> None:
    """Index 1.4676 and 1.4682 with the speed of light in vacuum, to a nanosecond."""
    found = link_delay_ns(wavelength_nm, [(find_fibre("G.652.D"), glass_m)])
    assert found / 1000.0 == pytest.approx(expected_us, abs=5e-4)


@pytest.mark.parametrize(
    ("index", "expected_us_per_km"),
    [(1.466, 4.8900), (1.467, 4.8934), (1.468, 4.8967), (1.469, 4.9001), (1.4682, 4.8974)],
)
def test_delay_of_catalogue_indices(index: float, expected_us_per_km: float) -> None:
    """Microseconds a kilometre of four catalogues, to the printed digit."""
    assert delay_ns(1000.0, index) / 1000.0 == pytest.approx(expected_us_per_km, abs=5e-5)


@pytest.mark.parametrize("fibre_type", fibre_names())
def test_index_meets_the_table_and_stays_near_it(fibre_type: str) -> None:
    """The table's values hold at 1310 and 1550 nm; no wavelength is 0.1 % away from both."""
    fibre = find_fibre(fibre_type)
    assert group_index(1310.0, fibre) == fibre.group_index_1310
    assert group_index(1550.0, fibre) == fibre.group_index_1550
    for nm in range(1260, 1626, 5):
        assert group_index(float(nm), fibre) == pytest.approx(fibre.group_index_1310, rel=1.5e-3)


def test_difference_of_two_wavelengths_is_that_of_dispersion() -> None:
    """Between 1310 and 1490 nm the delays part by the dispersion between them, 1.2 ns/km."""
    fibre = find_fibre("G.652.D")
    apart = link_delay_ns(1490.0, [(fibre, 1000.0)]) - link_delay_ns(1310.0, [(fibre, 1000.0)])
    # Integral of the Sellmeier form with 1312 nm and 0.0825: (S0/8) (l - l0^2/l)^2.
    expected_ps = 0.0825 / 8.0 * (1490.0 - 1312.0**2 / 1490.0) ** 2
    assert apart * 1000.0 == pytest.approx(expected_ps, rel=0.08)


def test_delay_takes_arrays() -> None:
    """An array of lengths gives an array of delays."""
    assert delay_ns(np.array([0.0, 1000.0]), 1.4676).tolist() == [0.0, delay_ns(1000.0, 1.4676)]
