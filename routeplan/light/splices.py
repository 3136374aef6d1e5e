"""What a splice loses when modes do not match, are offset, or are tilted."""

from __future__ import annotations

from math import pi
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from routeplan.light.constants import constant
from routeplan.light.fibres import Fibre
from routeplan.light.model import PartLoss

__all__ = [
    "fibre_mismatch",
    "mode_field_um",
    "mode_mismatch_db",
    "mode_radius_um",
    "offset_loss_db",
    "tilt_loss_db",
]

Quantity = TypeVar("Quantity", float, NDArray[np.float64])
_DB_PER_NEPER = 10.0 * float(np.log10(np.e))
_NM_PER_UM = 1000.0
_FIELD_NM = (1310.0, 1550.0)  # what the table's mode fields are named for


def mode_mismatch_db(mfd_a_um: Quantity, mfd_b_um: Quantity) -> Quantity:
    r"""
    Return what two fibres of unlike mode field lose where they meet.

    .. math:: -20 \log_{10} \frac{2 w_1 w_2}{w_1^2 + w_2^2}

    Parameters
    ----------
    mfd_a_um
        Mode field diameter of one fibre, above 0. [um]
    mfd_b_um
        Mode field diameter of the other. [um]

    Returns
    -------
    mode_mismatch_db
        The same in both directions. [dB]

    References
    ----------
    .. [1] D. Marcuse, Bell System Technical Journal 56 (1977): Gaussian modes.

    Examples
    --------
    >>> round(mode_mismatch_db(9.2, 8.6), 4)
    0.0197
    """
    share = 2.0 * mfd_a_um * mfd_b_um / (mfd_a_um * mfd_a_um + mfd_b_um * mfd_b_um)
    loss = -20.0 * np.log10(share)
    return loss if isinstance(mfd_a_um, np.ndarray) else float(loss)


def offset_loss_db(offset_um: Quantity, mfd_a_um: float, mfd_b_um: float | None = None) -> Quantity:
    r"""
    Return what a sideways offset of the cores loses.

    .. math:: \frac{10}{\ln 10} \cdot \frac{2 d^2}{w_1^2 + w_2^2}, \quad w = MFD / 2

    Parameters
    ----------
    offset_um
        Distance between the axes. [um]
    mfd_a_um
        Mode field diameter of one fibre. [um]
    mfd_b_um
        Of the other; the same if left out. [um]

    Returns
    -------
    offset_loss_db
        Without the mismatch of the modes. [dB]

    References
    ----------
    .. [1] A. Ghatak, K. Thyagarajan, Introduction to Fiber Optics, section 8.

    Examples
    --------
    >>> round(offset_loss_db(0.759, 10.0), 3)
    0.1
    """
    other_um = mfd_a_um if mfd_b_um is None else mfd_b_um
    squares = (mfd_a_um * mfd_a_um + other_um * other_um) / 4.0
    return offset_um * offset_um * (2.0 * _DB_PER_NEPER / squares)


def tilt_loss_db(
    tilt_rad: Quantity, mfd_um: float, *, index: float, wavelength_nm: float
) -> Quantity:
    r"""
    Return what an angle between the axes loses.

    .. math:: \frac{10}{\ln 10} \left(\frac{\pi n w \theta}{\lambda}\right)^2, \quad w = MFD / 2

    Parameters
    ----------
    tilt_rad
        Angle between the axes. [rad]
    mfd_um
        Mode field diameter of both fibres. [um]
    index
        Refractive index between the ends. [-]
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    tilt_loss_db
        [dB]

    References
    ----------
    .. [1] G. Keiser, Optical Fiber Communications, section 5.

    Examples
    --------
    >>> round(tilt_loss_db(0.4964 * pi / 180.0, 10.0, index=1.45, wavelength_nm=1300.0), 3)
    0.1
    """
    factor = pi * index * (mfd_um / 2.0) * _NM_PER_UM / wavelength_nm
    return tilt_rad * tilt_rad * (factor * factor * _DB_PER_NEPER)


def mode_radius_um(core_radius_um: float, v_number: float) -> float:
    """
    Return the mode field radius of a step-index fibre.

    Parameters
    ----------
    core_radius_um
        Radius of the core. [um]
    v_number
        Normalised frequency, 0.8 to 2.5. [-]

    Returns
    -------
    mode_radius_um
        Half the mode field diameter. [um]

    References
    ----------
    .. [1] D. Marcuse, Bell System Technical Journal 56 (1977).

    Examples
    --------
    >>> round(mode_radius_um(4.5, 2.405), 4)
    4.9453
    """
    return core_radius_um * float(
        constant("mode_radius_constant_ratio")
        + constant("mode_radius_v15_ratio") / v_number**1.5
        + constant("mode_radius_v6_ratio") / v_number**6
    )


def mode_field_um(fibre: Fibre, wavelength_nm: float) -> float:
    """
    Return the typical mode field diameter of a fibre type, straight between 1310 and 1550 nm.

    Parameters
    ----------
    fibre
        Fibre type.
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    mode_field_um
        A type known at one of the two only has that value everywhere. [um]

    References
    ----------
    .. [1] Table `fibres`.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> mode_field_um(find_fibre("G.652.D"), 1310.0)
    9.2
    """
    fields = (fibre.mfd_1310_typical_um, fibre.mfd_1550_typical_um)
    known = [(nm, um) for nm, um in zip(_FIELD_NM, fields, strict=True) if um is not None]
    (first_nm, first_um), (last_nm, last_um) = known[0], known[-1]
    if first_nm == last_nm:
        return first_um
    return first_um + (wavelength_nm - first_nm) * (last_um - first_um) / (last_nm - first_nm)


def fibre_mismatch(one: Fibre, other: Fibre, wavelength_nm: float) -> PartLoss:
    """
    Return what two fibre types lose where they meet, beyond what a splice loses anyway.

    The mean is that of typical mode fields; the limit has the larger at the top and the smaller
    at the foot of its tolerance.

    Parameters
    ----------
    one
        Fibre type on one side.
    other
        Fibre type on the other.
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    fibre_mismatch
        No scatter of its own. [dB]

    References
    ----------
    .. [1] See `mode_mismatch_db`; table `fibres`.
    """
    pairs = ((mode_field_um(f, wavelength_nm), _tolerance_um(f)) for f in (one, other))
    (small_um, down_um), (large_um, up_um) = sorted(pairs)
    return PartLoss(
        mean_db=mode_mismatch_db(small_um, large_um),
        sigma_db=0.0,
        limit_db=mode_mismatch_db(small_um - down_um, large_um + up_um),
        source=f"table fibres, mode fields of {small_um:.1f} and {large_um:.1f} um",
    )


def _tolerance_um(fibre: Fibre) -> float:
    return fibre.mfd_1310_tolerance_um or fibre.mfd_1550_tolerance_um or 0.0
