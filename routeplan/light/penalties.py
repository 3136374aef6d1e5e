"""How dispersion and PMD limit a bit rate: rise time, power penalty, group delay."""

from __future__ import annotations

from math import log10, pi, sqrt

from routeplan.light.constants import constant

__all__ = [
    "dgd_limit_ps",
    "equalisation_penalty_db",
    "intersymbol_penalty_db",
    "modulated_reach_km",
    "pmd_reach_km",
    "receiver_rise_ns",
    "rise_limit_ns",
    "spread_ratio",
    "system_rise_ns",
]

_PS_PER_NS = 1000.0


def receiver_rise_ns(bandwidth_ghz: float) -> float:
    """
    Return the rise time of a receiver, 0.35 over its bandwidth.

    Parameters
    ----------
    bandwidth_ghz
        Electrical bandwidth. [GHz]

    Returns
    -------
    receiver_rise_ns
        From 10 % to 90 %. [ns]

    References
    ----------
    .. [1] G. Keiser, Optical Communications Essentials, section 16.3.

    Examples
    --------
    >>> receiver_rise_ns(2.5)
    0.13999999999999999
    """
    return constant("receiver_rise_ratio") / bandwidth_ghz


def system_rise_ns(
    *, transmitter_ns: float, chromatic_ns: float, pmd_ns: float, receiver_ns: float
) -> float:
    """
    Return the rise time of a whole system, the root of the sum of squares.

    Parameters
    ----------
    transmitter_ns
        Rise time of the transmitter. [ns]
    chromatic_ns
        Spread by chromatic dispersion. [ns]
    pmd_ns
        Spread by polarisation mode dispersion. [ns]
    receiver_ns
        Rise time of the receiver. [ns]

    Returns
    -------
    system_rise_ns
        [ns]

    References
    ----------
    .. [1] G. Keiser, Optical Communications Essentials, section 16.3.

    Examples
    --------
    >>> system_rise_ns(transmitter_ns=3.0, chromatic_ns=4.0, pmd_ns=0.0, receiver_ns=0.0)
    5.0
    """
    return sqrt(transmitter_ns**2 + chromatic_ns**2 + pmd_ns**2 + receiver_ns**2)


def rise_limit_ns(bit_rate_gbps: float, *, returns_to_zero: bool = False) -> float:
    """
    Return the longest rise time a bit rate bears: 0.7 of a bit, or 0.35 returning to zero.

    Parameters
    ----------
    bit_rate_gbps
        Line rate. [Gbit/s]
    returns_to_zero
        Whether pulses return to zero within a bit.

    Returns
    -------
    rise_limit_ns
        [ns]

    References
    ----------
    .. [1] A. Ghatak, K. Thyagarajan, Introduction to Fiber Optics, example 13.15.

    Examples
    --------
    >>> round(rise_limit_ns(0.4), 3)
    1.75
    """
    name = "rise_rz_ratio" if returns_to_zero else "rise_nrz_ratio"
    return constant(name) / bit_rate_gbps


def spread_ratio(bit_rate_gbps: float, dispersion_ps_per_nm: float, line_width_nm: float) -> float:
    r"""
    Return how much of a bit its light spreads over.

    .. math:: \varepsilon = B \, D \, \sigma

    Parameters
    ----------
    bit_rate_gbps
        Line rate. [Gbit/s]
    dispersion_ps_per_nm
        Dispersion of the whole circuit, either sign. [ps/nm]
    line_width_nm
        Spectral width, root mean square. [nm]

    Returns
    -------
    spread_ratio
        Up to 0.115 for a source of several lines, 0.306 for a single one, at 1 dB. [-]

    References
    ----------
    .. [1] ITU-T G.957, annex A.

    Examples
    --------
    >>> round(spread_ratio(0.15552, 96.0, 7.7), 5)
    0.11496
    """
    return bit_rate_gbps * abs(dispersion_ps_per_nm) * line_width_nm / _PS_PER_NS


def intersymbol_penalty_db(spread_ratio: float) -> float:
    r"""
    Return the power penalty of pulses that spread into each other, for a single-line source.

    .. math:: 5 \log_{10}(1 + 2 \pi \varepsilon^2)

    Parameters
    ----------
    spread_ratio
        What `spread_ratio` returns. [-]

    Returns
    -------
    intersymbol_penalty_db
        1 dB at 0.306 and 2 dB at 0.491. [dB]

    References
    ----------
    .. [1] ITU-T G-series supplement 39, dispersion of linear links.

    Examples
    --------
    >>> round(intersymbol_penalty_db(0.306), 1), round(intersymbol_penalty_db(0.491), 1)
    (1.0, 2.0)
    """
    return 5.0 * log10(1.0 + 2.0 * pi * spread_ratio**2)


def equalisation_penalty_db(spread_ns: float, bit_rate_gbps: float) -> float:
    r"""
    Return the penalty of equalising a spread at the receiver.

    .. math:: 2 \left(2 \sigma_T B \sqrt{2}\right)^4

    Parameters
    ----------
    spread_ns
        Root mean square spread of the whole circuit. [ns]
    bit_rate_gbps
        Line rate. [Gbit/s]

    Returns
    -------
    equalisation_penalty_db
        Beyond a decibel or two it says only that the rate is too high. [dB]

    References
    ----------
    .. [1] J. M. Senior, Optical Fiber Communications, example 12.6.

    Examples
    --------
    >>> round(equalisation_penalty_db(4.8, 0.025), 2)
    0.03
    """
    return 2.0 * (2.0 * spread_ns * bit_rate_gbps * sqrt(2.0)) ** 4


def modulated_reach_km(bit_rate_gbps: float, dispersion_ps_per_nm_km: float) -> float:
    """
    Return how far dispersion lets chirp-free external modulation go, at about 1 dB.

    Parameters
    ----------
    bit_rate_gbps
        Line rate. [Gbit/s]
    dispersion_ps_per_nm_km
        Dispersion coefficient, either sign. [ps/(nm km)]

    Returns
    -------
    modulated_reach_km
        [km]

    References
    ----------
    .. [1] Limit of B^2 D L; table `light_constants`.

    Examples
    --------
    >>> round(modulated_reach_km(10.0, 17.0))
    61
    """
    return constant("modulated_gbps2_ps_per_nm") / (bit_rate_gbps**2 * abs(dispersion_ps_per_nm_km))


def dgd_limit_ps(symbol_rate_gbd: float) -> float:
    """
    Return the highest mean differential group delay, a tenth of a symbol.

    Parameters
    ----------
    symbol_rate_gbd
        Symbols of one lane. [GBd]

    Returns
    -------
    dgd_limit_ps
        Three times it, about, is never exceeded. [ps]

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), appendix I.

    Examples
    --------
    >>> dgd_limit_ps(10.0)
    10.0
    """
    return constant("dgd_mean_share_ratio") * _PS_PER_NS / symbol_rate_gbd


def pmd_reach_km(symbol_rate_gbd: float, pmd_q_ps_per_sqrt_km: float) -> float:
    """
    Return how far PMD lets a symbol rate go.

    Parameters
    ----------
    symbol_rate_gbd
        Symbols of one lane. [GBd]
    pmd_q_ps_per_sqrt_km
        Link design value. [ps/sqrt(km)]

    Returns
    -------
    pmd_reach_km
        [km]

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), appendix I.

    Examples
    --------
    >>> round(pmd_reach_km(10.0, 0.5))
    400
    """
    return (dgd_limit_ps(symbol_rate_gbd) / pmd_q_ps_per_sqrt_km) ** 2
