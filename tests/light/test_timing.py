"""Asymmetry, clocks, guard intervals."""

from __future__ import annotations

import pytest

from routeplan.light.delay import delay_ns
from routeplan.light.fibres import find_fibre
from routeplan.light.timing import (
    clock_error_ns,
    glass_for_delay_m,
    glass_for_error_m,
    pair_asymmetry_ns,
    thermal_delay_ns,
    timing_figures,
    wavelength_asymmetry_ns,
)


def test_error_of_a_clock_is_half_the_difference() -> None:
    """100 m of difference are 244.9 ns; a microsecond is 408 m and 250 ns are 102 m."""
    unlike_ns = pair_asymmetry_ns(delay_ns(10_100.0, 1.4682), delay_ns(10_000.0, 1.4682))
    assert clock_error_ns(unlike_ns) == pytest.approx(244.9, abs=0.05)
    assert glass_for_error_m(1000.0, 1.4682) == pytest.approx(408.0, abs=0.5)
    assert glass_for_error_m(250.0, 1.4682) == pytest.approx(102.0, abs=0.5)


@pytest.mark.parametrize(
    ("delay_us", "glass_km"), [(224.0, 45.7), (246.0, 50.2), (1000.0, 204.0), (125.0, 25.5)]
)
def test_published_times_as_glass(delay_us: float, glass_km: float) -> None:
    """Guard intervals and packet times, to the printed digit."""
    found_km = glass_for_delay_m(delay_us, 1.4682) / 1000.0
    assert found_km == pytest.approx(glass_km, abs=0.25 if glass_km > 100.0 else 0.06)


def test_one_fibre_both_ways_is_unlike_by_a_nanosecond_a_kilometre() -> None:
    """1310 against 1490 nm: between 0.8 and 1.7 ns/km, whichever way round."""
    spans = [(find_fibre("G.652.D"), 20_000.0)]
    found = wavelength_asymmetry_ns(1310.0, 1490.0, spans)
    assert 0.8 < found / 20.0 < 1.7
    assert wavelength_asymmetry_ns(1490.0, 1310.0, spans) == found
    assert wavelength_asymmetry_ns(1310.0, 1310.0, spans) == 0.0


def test_delay_drifts_with_temperature() -> None:
    """38 ps/(km K), from memory: 11.4 ns over 10 km and 30 K."""
    assert thermal_delay_ns(10_000.0, 30.0) == pytest.approx(11.4)
    assert thermal_delay_ns(10_000.0, -30.0) == -thermal_delay_ns(10_000.0, 30.0)


def test_figures_stand_beside_their_limits() -> None:
    """20 km use 44 % of a guard interval of 224 us; a standby way is compared if there is one."""
    there_ns = delay_ns(20_000.0, 1.4682)
    figures = {figure.name: figure for figure in timing_figures(there_ns, there_ns + 500.0)}
    assert figures["DVB-T 8k 1/4"].share_ratio == pytest.approx(0.4373, abs=5e-4)
    assert figures["studio clock"].value_us == pytest.approx(0.25)
    assert all(figure.kind != "path difference" for figure in figures.values())
    with_standby = timing_figures(there_ns, there_ns, standby_ns=there_ns + 90_000.0)
    apart = {figure.name: figure.value_us for figure in with_standby}
    assert apart["standby class D"] == pytest.approx(90.0)
