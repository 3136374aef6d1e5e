"""Rise time, power penalties and group delay."""

from __future__ import annotations

import pytest

from routeplan.light.constants import constant
from routeplan.light.dispersion import pulse_spread_ps
from routeplan.light.penalties import (
    dgd_limit_ps,
    equalisation_penalty_db,
    intersymbol_penalty_db,
    modulated_reach_km,
    pmd_reach_km,
    receiver_rise_ns,
    rise_limit_ns,
    spread_ratio,
    system_rise_ns,
)
from tests.light.small_paths import example, published


def test_example_of_a_rise_time_budget() -> None:
    """Keiser, 30 km at 2.5 Gbit/s: 0.12 and 0.14 ns give 0.21 ns, under 0.28."""
    chromatic_ns = pulse_spread_ps(4.0 * 30.0, 1.0) / 1000.0
    receiver_ns = receiver_rise_ns(2.5)
    system_ns = system_rise_ns(
        transmitter_ns=0.10,
        chromatic_ns=chromatic_ns,
        pmd_ns=0.1 * 30.0**0.5 / 1000.0,
        receiver_ns=receiver_ns,
    )
    for quantity, found in (
        ("chromatic rise", chromatic_ns),
        ("receiver rise", receiver_ns),
        ("system rise", system_ns),
        ("rise limit", rise_limit_ns(2.5)),
    ):
        value, tolerance = example("E10", quantity)
        assert found == pytest.approx(value, abs=tolerance)
    assert system_ns < rise_limit_ns(2.5)


def test_example_of_a_rise_limit() -> None:
    """Ghatak, 400 Mbit/s: 1.75 ns, and half of it returning to zero."""
    value, tolerance = example("E18", "rise limit")
    assert rise_limit_ns(0.4) == pytest.approx(value, abs=tolerance)
    assert rise_limit_ns(0.4, returns_to_zero=True) == pytest.approx(value / 2.0, abs=tolerance)


def test_example_of_equalising() -> None:
    """Senior, 0.6 ns/km over 8 km: 0.03 dB at 25 Mbit/s and 34.40 dB at 150."""
    for rate_gbps, quantity in ((0.025, "penalty at 25 Mbit/s"), (0.150, "penalty at 150 Mbit/s")):
        value, tolerance = example("E20", quantity)
        assert equalisation_penalty_db(0.6 * 8.0, rate_gbps) == pytest.approx(value, abs=tolerance)


@pytest.mark.parametrize(
    "row",
    [r for r in published("sdh_attenuation.csv") if r["line_width_nm"] and r["code"] != "I-16"],
    ids=lambda r: r["code"],
)
def test_remembered_rows_confirm_each_other(row: dict[str, str]) -> None:
    """ITU-T G.957: rate x dispersion x line width is 0.115 for sources of several lines."""
    found = spread_ratio(
        float(row["rate_mbps"]) / 1000.0,
        float(row["dispersion_ps_per_nm"]),
        float(row["line_width_nm"]),
    )
    assert found == pytest.approx(constant("epsilon_lines_max_ratio"), abs=6e-4)


def test_penalty_of_spread_into_the_next_bit() -> None:
    """1 dB at 0.306 and 2 dB at 0.491 of a bit; nothing at nothing; the sign does not matter."""
    assert intersymbol_penalty_db(0.306) == pytest.approx(1.0, abs=0.01)
    assert intersymbol_penalty_db(0.491) == pytest.approx(2.0, abs=0.01)
    assert intersymbol_penalty_db(0.0) == 0.0
    assert spread_ratio(10.0, -80.0, 0.1) == spread_ratio(10.0, 80.0, 0.1)


@pytest.mark.parametrize(
    ("rate_gbd", "pmd_q", "reach_km"),
    [
        (9.95328, 0.5, 403.8),
        (9.95328, 0.2, 2523.5),
        (9.95328, 0.1, 10094.0),
        (10.3125, 0.2, 2350.8),
        (39.81312, 0.2, 157.7),
        (2.48832, 0.5, 6460.0),
        (10.0, 0.5, 400.0),
    ],
)
def test_how_far_pmd_lets_a_rate_go(rate_gbd: float, pmd_q: float, reach_km: float) -> None:
    """A tenth of a symbol, to 0.1 %."""
    assert pmd_reach_km(rate_gbd, pmd_q) == pytest.approx(reach_km, rel=1e-3)


def test_dgd_of_ten_gigabit() -> None:
    """10 Gbit/s bears 10 ps on average and 30 at most."""
    assert dgd_limit_ps(10.0) * constant("dgd_peak_ratio") == pytest.approx(30.0)


def test_chirp_free_modulation_reaches_farther_than_a_hundredth_of_the_square() -> None:
    """1.04e5 (Gbit/s)2 ps/nm: 61 km at 10 Gbit/s and 17 ps/(nm km), a sixteenth at four times."""
    assert modulated_reach_km(10.0, 17.0) == pytest.approx(61.2, abs=0.05)
    assert modulated_reach_km(40.0, -17.0) == pytest.approx(61.2 / 16.0, abs=0.01)


@pytest.mark.parametrize(
    ("limit_ps_per_nm", "reach_km"), [(1600.0, 86.0), (800.0, 43.0), (296.0, 15.9)]
)
def test_dispersion_limited_reach(limit_ps_per_nm: float, reach_km: float) -> None:
    """L-16.2, S-16.2 and S-1.2 over fibre of 18.6 ps/(nm km), the linear limit at 1550 nm."""
    assert limit_ps_per_nm / 18.6 == pytest.approx(reach_km, abs=0.05)
