"""Sums of losses, overload and attenuators."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.light.model import BudgetLine
from routeplan.light.power import (
    attenuator_db,
    average_dbm,
    least_loss_db,
    longest_glass_km,
    overload_db,
    printed_db,
    total_loss,
)
from tests.light.small_paths import example


def line(count: int, mean_db: float, sigma_db: float = 0.0, limit_db: float = 99.0) -> BudgetLine:
    """Return one line of a budget."""
    return BudgetLine(
        item="part",
        count=count,
        each_db=mean_db,
        sigma_db=sigma_db,
        limit_db=limit_db,
        source="test",
    )


def test_example_of_mean_and_three_sigma() -> None:
    """IBM planning guide: mean 11.05, component variance 0.14, total 12.82 (it prints 12.86)."""
    lines = [
        line(1, 19.76 * 0.5),
        line(1, 0.21 * 0.8),
        line(2, 0.35, 0.06**0.5),
        line(2, 0.15, 0.01**0.5),
    ]
    mean, tolerance = example("E1", "mean")
    assert total_loss(lines, sigma_count=0.0).nominal_db == pytest.approx(mean, abs=tolerance)
    variance, tolerance = example("E1", "component variance")
    one_sigma = total_loss(lines, sigma_count=1.0)
    spread_db = one_sigma.statistical_db - one_sigma.nominal_db
    assert spread_db**2 == pytest.approx(variance, abs=6e-4)
    system = [*lines, line(1, 0.0, 0.04**0.5), line(1, 0.50)]
    total, tolerance = example("E1", "total")
    assert total_loss(system, sigma_count=3.0).statistical_db == pytest.approx(total, abs=tolerance)


def test_example_of_twenty_reels() -> None:
    """20 reels of 2 km: mean 10.350, mean + 3 sigma 11.011, all at their maximum 13.86 dB."""
    lines = [
        line(1, 0.22 * 40.0, 0.012 * (20 * 2.0**2) ** 0.5, 0.25 * 40.0),
        line(19, 0.05, 0.03, 0.14),
        line(2, 0.3, 0.1, 0.6),
    ]
    loss = total_loss(lines, sigma_count=3.0)
    assert (loss.nominal_db, loss.statistical_db, loss.worst_db) == (10.35, 11.011, 13.86)
    assert not loss.is_capped


def test_variances_add_not_deviations() -> None:
    """A hundred splices of 0.03 dB scatter by 0.3 dB together, not by 3."""
    assert total_loss([line(100, 0.05, 0.03)], sigma_count=1.0).statistical_db == 5.3


def test_statistical_is_never_beyond_worst() -> None:
    """One part of wide scatter is capped at its limit, and that is told."""
    loss = total_loss([line(1, 0.25, 0.13, 0.5)], sigma_count=3.0)
    assert loss.statistical_db == loss.worst_db == 0.5
    assert loss.is_capped


def test_example_of_a_longest_link() -> None:
    """Senior, example 12.8: 86 km, 64 km, and 61 km with the penalty."""
    for quantity, sensitivity_dbm, penalty_db in (
        ("length at 35 Mbit/s", -55.0, 0.0),
        ("length at 400 Mbit/s", -44.0, 0.0),
        ("length with penalty", -44.0, 1.5),
    ):
        value, tolerance = example("E6", quantity)
        available_db = -3.0 - sensitivity_dbm - penalty_db
        found = longest_glass_km(available_db, fixed_db=2.0 + 7.0, loss_db_per_km=0.4 + 0.1)
        assert found == pytest.approx(value, abs=tolerance)


@pytest.mark.parametrize(
    ("excess_db", "step_db"),
    [(-0.001, 0.0), (0.0, 0.0), (0.001, 1.0), (1.0, 1.0), (1.001, 2.0), (5.001, 7.0), (99.0, None)],
)
def test_attenuator_is_the_smallest_that_mends(excess_db: float, step_db: float | None) -> None:
    """Stock steps: never under the excess, none where there is no excess."""
    assert attenuator_db(excess_db) == step_db


@given(st.floats(0.0, 40.0), st.floats(0.0, 5.0))
def test_least_loss_protects_no_more_than_it_may(mean_db: float, sigma_db: float) -> None:
    """Least loss is never negative and never above the nominal."""
    least_db = least_loss_db([line(1, mean_db, sigma_db)], sigma_count=3.0)
    assert 0.0 <= least_db <= mean_db


def test_overload_is_with_the_least_loss() -> None:
    """4 dBm through 5 dB just meets a receiver that stands -1 dBm; arrays work the same."""
    assert overload_db(4.0, 5.0, -1.0) == 0.0
    assert overload_db(np.array([4.0, 6.0]), np.array([5.0, 5.0]), -1.0).tolist() == [0.0, 2.0]


def test_average_power_is_not_modulation_amplitude() -> None:
    """0.031 mW of amplitude at an extinction of 9 dB is 0.0200 mW on average, -17.0 dBm."""
    found_dbm = average_dbm(10.0 * np.log10(0.031), 9.0)
    assert found_dbm == pytest.approx(-17.0, abs=0.005)
    # The source takes the ratio as 7.94 and prints 0.01997.
    assert 10.0 ** (found_dbm / 10.0) == pytest.approx(0.01997, abs=1e-5)
    # 10GBASE-ER: -14.1 dBm of amplitude is no average; at 3 dB of extinction it is -12.3 dBm.
    assert average_dbm(-14.1, 3.0) == pytest.approx(-12.3, abs=0.05)


def test_printed_figures_have_no_minus_zero() -> None:
    """What rounds to nothing is printed as 0, and judged as 0."""
    assert str(printed_db(-0.0004)) == "0.0"
    assert printed_db(-0.0006) == -0.001
