"""Radio frequency on light."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.light.rf import carrier_to_noise_db, electrical_loss_db, photocurrent_a, rf_gain_db

LINK = {
    "responsivity_a_per_w": 0.9,
    "modulation_ratio": 0.05,
    "bandwidth_hz": 8e6,
    "intensity_noise_db_per_hz": -150.0,
    "thermal_a_per_sqrt_hz": 7e-12,
}


def test_a_decibel_of_light_is_two_of_signal() -> None:
    """Loss doubles, and the gain of a link falls by two for each."""
    assert electrical_loss_db(np.array([1.0, 5.0])).tolist() == [2.0, 10.0]
    near = rf_gain_db(3.0, slope_w_per_a=0.2, responsivity_a_per_w=0.9)
    far = rf_gain_db(4.0, slope_w_per_a=0.2, responsivity_a_per_w=0.9)
    assert near - far == pytest.approx(2.0)
    assert near == pytest.approx(20.0 * np.log10(0.18) - 6.0)


def test_weak_light_is_limited_by_the_amplifier_and_strong_light_by_the_laser() -> None:
    """Thermal noise: 2 dB a decibel. Shot noise: 1. The laser's own noise: none."""
    weak = carrier_to_noise_db(-30.0, **LINK) - carrier_to_noise_db(-31.0, **LINK)
    strong = carrier_to_noise_db(20.0, **LINK) - carrier_to_noise_db(19.0, **LINK)
    assert weak == pytest.approx(2.0, abs=0.05)
    assert strong == pytest.approx(0.0, abs=0.05)
    quiet = LINK | {"intensity_noise_db_per_hz": -300.0, "thermal_a_per_sqrt_hz": 0.0}
    shot = carrier_to_noise_db(-10.0, **quiet) - carrier_to_noise_db(-11.0, **quiet)
    assert shot == pytest.approx(1.0, abs=1e-6)


def test_shot_limited_ratio_by_hand() -> None:
    """m^2 I / (4 q B): 0.05^2 x 0.9 mA over 4 x 1.602e-19 x 8 MHz."""
    quiet = LINK | {"intensity_noise_db_per_hz": -300.0, "thermal_a_per_sqrt_hz": 0.0}
    by_hand = 0.05**2 * photocurrent_a(0.0, 0.9) / (4.0 * 1.602176634e-19 * 8e6)
    assert carrier_to_noise_db(0.0, **quiet) == pytest.approx(10.0 * np.log10(by_hand), abs=1e-9)
