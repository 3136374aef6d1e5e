"""Radio frequency carried on light by its amplitude: a decibel of light is two of signal."""

from __future__ import annotations

from math import log10, sqrt
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from routeplan.light.constants import constant

__all__ = ["carrier_to_noise_db", "electrical_loss_db", "photocurrent_a", "rf_gain_db"]

Quantity = TypeVar("Quantity", float, NDArray[np.float64])
_W_PER_MW = 1e-3


def electrical_loss_db(optical_db: Quantity) -> Quantity:
    """
    Return what an optical loss takes from a signal carried by the light's amplitude.

    Parameters
    ----------
    optical_db
        Loss of light. [dB]

    Returns
    -------
    electrical_loss_db
        Twice as much: current follows optical power, and signal power its square. [dB]

    References
    ----------
    .. [1] Square-law detection; any textbook of fibre optics.

    Examples
    --------
    >>> electrical_loss_db(5.0)
    10.0
    """
    return optical_db * 2.0


def rf_gain_db(
    optical_db: float,
    *,
    slope_w_per_a: float,
    responsivity_a_per_w: float,
    match_ratio: float = 1.0,
) -> float:
    r"""
    Return the gain of a directly modulated link between equal impedances.

    .. math:: 20 \log_{10}(s \, r) - 2 L + 10 \log_{10} m

    Parameters
    ----------
    optical_db
        Loss of light between laser and diode. [dB]
    slope_w_per_a
        Slope efficiency of the laser, coupling included. [W/A]
    responsivity_a_per_w
        Responsivity of the diode. [A/W]
    match_ratio
        What matching networks leave of the power. [-]

    Returns
    -------
    rf_gain_db
        Usually negative. [dB]

    References
    ----------
    .. [1] C. H. Cox, Analog Optical Links, chapter 2.

    Examples
    --------
    >>> round(rf_gain_db(5.0, slope_w_per_a=0.1, responsivity_a_per_w=0.8), 2)
    -31.94
    """
    own_db = 20.0 * log10(slope_w_per_a * responsivity_a_per_w) + 10.0 * log10(match_ratio)
    return own_db - electrical_loss_db(optical_db)


def photocurrent_a(received_dbm: float, responsivity_a_per_w: float) -> float:
    """
    Return the current of a photodiode.

    Parameters
    ----------
    received_dbm
        Average optical power. [dBm]
    responsivity_a_per_w
        Responsivity. [A/W]

    Returns
    -------
    photocurrent_a
        [A]

    References
    ----------
    .. [1] Definition of responsivity.

    Examples
    --------
    >>> round(photocurrent_a(0.0, 0.9), 9)
    0.0009
    """
    return responsivity_a_per_w * float(10.0 ** (received_dbm / 10.0)) * _W_PER_MW


def carrier_to_noise_db(
    received_dbm: float,
    *,
    responsivity_a_per_w: float,
    modulation_ratio: float,
    bandwidth_hz: float,
    intensity_noise_db_per_hz: float,
    thermal_a_per_sqrt_hz: float,
) -> float:
    r"""
    Return the carrier-to-noise ratio of one carrier behind the diode.

    .. math:: \frac{(m I)^2 / 2}{B \left(I^2 \, RIN + 2 q I + i_{th}^2\right)}

    Parameters
    ----------
    received_dbm
        Average optical power at the diode. [dBm]
    responsivity_a_per_w
        Of the diode. [A/W]
    modulation_ratio
        Modulation index of the carrier. [-]
    bandwidth_hz
        Noise bandwidth. [Hz]
    intensity_noise_db_per_hz
        Relative intensity noise of the laser, negative. [dB/Hz]
    thermal_a_per_sqrt_hz
        Input noise current of the amplifier. [A/sqrt(Hz)]

    Returns
    -------
    carrier_to_noise_db
        [dB]

    References
    ----------
    .. [1] W. I. Way, Broadband Hybrid Fiber/Coax Access System Technologies: subcarrier links.

    Examples
    --------
    >>> round(carrier_to_noise_db(0.0, responsivity_a_per_w=1.0, modulation_ratio=0.04,
    ...     bandwidth_hz=4e6, intensity_noise_db_per_hz=-155.0, thermal_a_per_sqrt_hz=8e-12), 1)
    54.6
    """
    current = photocurrent_a(received_dbm, responsivity_a_per_w)
    noise = (
        current**2 * 10.0 ** (intensity_noise_db_per_hz / 10.0)
        + 2.0 * constant("elementary_charge_c") * current
        + thermal_a_per_sqrt_hz**2
    )
    carrier = modulation_ratio * current / sqrt(2.0)
    return 20.0 * log10(carrier) - 10.0 * log10(bandwidth_hz * noise)
