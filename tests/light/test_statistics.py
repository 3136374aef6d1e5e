"""Mean plus k sigma against random draws."""

from __future__ import annotations

from math import erf, sqrt

import numpy as np
import pytest

from routeplan.light.budget import circuit_budget
from tests.light.small_paths import path, practice

DRAWS = 400_000
LENGTHS_M = [4000.0] * 5


@pytest.mark.parametrize("sigma_count", [1.0, 2.0, 3.0])
def test_normal_parts_stay_below_mean_plus_k_sigma_as_often_as_they_should(
    sigma_count: float,
) -> None:
    """Each section, splice and pair drawn by itself: 84.1, 97.7 and 99.87 % are below."""
    rng = np.random.default_rng(20_240)
    drawn_db = rng.normal(0.33 * 4.0, 0.010 * 4.0, (DRAWS, 5)).sum(axis=1)
    drawn_db += rng.normal(0.05, 0.03, (DRAWS, 4 + 2)).sum(axis=1)
    drawn_db += rng.normal(0.25, 0.13, (DRAWS, 2)).sum(axis=1)
    budget = circuit_budget(
        path(LENGTHS_M), 1310.0, practice=practice(sigma_count=sigma_count, connector_limit_db=9.0)
    )
    share = 0.5 * (1.0 + erf(sigma_count / sqrt(2.0)))
    below = float((drawn_db <= budget.statistical_db).mean())
    assert below == pytest.approx(share, abs=5.0 * sqrt(share * (1.0 - share) / DRAWS))


def test_skewed_parts_go_a_little_beyond() -> None:
    """With losses that cannot be negative the true 99.87 % lies 0.12 to 0.18 dB higher."""
    rng = np.random.default_rng(7)

    def gamma(mean_db: float, sigma_db: float, count: int) -> np.ndarray:
        shape = (mean_db / sigma_db) ** 2
        return rng.gamma(shape, mean_db / shape, (DRAWS, count)).sum(axis=1)

    drawn_db = rng.normal(0.33 * 4.0, 0.010 * 4.0, (DRAWS, 5)).sum(axis=1)
    drawn_db += gamma(0.05, 0.03, 6) + gamma(0.25, 0.13, 2)
    budget = circuit_budget(path(LENGTHS_M), 1310.0, practice=practice(connector_limit_db=9.0))
    beyond_db = float(np.quantile(drawn_db, 0.99865)) - budget.statistical_db
    assert 0.12 < beyond_db < 0.18
