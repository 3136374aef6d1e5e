"""Powers and losses: sums, overload, and the attenuator that mends it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from math import log10, sqrt
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from routeplan.light.model import BudgetLine
from routeplan.tables import load_rows

__all__ = [
    "AttenuatorRow",
    "Loss",
    "attenuator_db",
    "average_dbm",
    "least_loss_db",
    "longest_glass_km",
    "overload_db",
    "printed_db",
    "total_loss",
]

Quantity = TypeVar("Quantity", float, NDArray[np.float64])
_PRINTED_DIGITS = 3  # decibels are printed, and judged, to 0.001


@dataclass(frozen=True, slots=True, kw_only=True)
class AttenuatorRow:
    """One fixed attenuator of the stock."""

    name: str
    loss_db: float
    source: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Loss:
    """What a circuit loses; `is_capped` tells that k sigma would have gone beyond the worst."""

    nominal_db: float
    statistical_db: float
    worst_db: float
    is_capped: bool


def printed_db(value_db: float) -> float:
    """
    Return a decibel figure as it is printed, to 0.001; verdicts are on printed figures.

    Parameters
    ----------
    value_db
        Any ratio or power. [dB]

    Returns
    -------
    printed_db
        Never minus zero. [dB]

    References
    ----------
    .. [1] House rule: finer than any measurement of a link.

    Examples
    --------
    >>> printed_db(-0.0004)
    0.0
    """
    return round(value_db, _PRINTED_DIGITS) + 0.0


def total_loss(lines: Iterable[BudgetLine], *, sigma_count: float) -> Loss:
    r"""
    Return nominal, statistical and worst loss of the lines of a budget.

    .. math:: \sum n\mu, \quad \sum n\mu + k\sqrt{\sum n\sigma^2}, \quad \sum n\,l

    The statistical loss is never more than the worst.

    Parameters
    ----------
    lines
        Contributions, each `count` times mean, sigma and limit.
    sigma_count
        How many standard deviations k are added. [-]

    Returns
    -------
    total_loss
        All to 0.001. [dB]

    References
    ----------
    .. [1] ITU-T G.652, appendix I, for the sum; normal approximation of independent parts.

    Examples
    --------
    >>> splice = BudgetLine(item="splices", count=4, each_db=0.05, sigma_db=0.03, limit_db=0.1,
    ...                     source="")
    >>> total_loss([splice], sigma_count=3.0)
    Loss(nominal_db=0.2, statistical_db=0.38, worst_db=0.4, is_capped=False)
    """
    lines = tuple(lines)
    nominal_db = sum(line.count * line.each_db for line in lines)
    worst_db = sum(line.count * line.limit_db for line in lines)
    statistical_db = nominal_db + sigma_count * _sigma_db(lines)
    return Loss(
        nominal_db=printed_db(nominal_db),
        statistical_db=printed_db(min(statistical_db, worst_db)),
        worst_db=printed_db(worst_db),
        is_capped=printed_db(statistical_db) > printed_db(worst_db),
    )


def average_dbm(modulation_dbm: float, extinction_db: float) -> float:
    r"""
    Return the average power of light whose modulation amplitude is given.

    .. math:: P = OMA \, \frac{r + 1}{2 (r - 1)}

    Parameters
    ----------
    modulation_dbm
        Optical modulation amplitude: the one level less the zero level. [dBm]
    extinction_db
        Extinction ratio, above 0. [dB]

    Returns
    -------
    average_dbm
        3 dB under the amplitude for full extinction, more for less. [dBm]

    References
    ----------
    .. [1] IEEE 802.3, clause 52: sensitivities are stated both ways.

    Examples
    --------
    >>> round(average_dbm(-15.09, 9.0), 1)
    -17.0
    """
    ratio = 10.0 ** (extinction_db / 10.0)
    return modulation_dbm + 10.0 * log10((ratio + 1.0) / (2.0 * (ratio - 1.0)))


def least_loss_db(lines: Iterable[BudgetLine], *, sigma_count: float) -> float:
    """
    Return the loss that all but a few circuits exceed: nominal less k sigma, not under 0.

    Parameters
    ----------
    lines
        Contributions, each `count` times mean and sigma.
    sigma_count
        How many standard deviations k are taken off. [-]

    Returns
    -------
    least_loss_db
        What protects the receiver. [dB]

    References
    ----------
    .. [1] See `total_loss`.
    """
    lines = tuple(lines)
    nominal_db = sum(line.count * line.each_db for line in lines)
    return max(0.0, nominal_db - sigma_count * _sigma_db(lines))


def overload_db(tx_max_dbm: Quantity, least_db: Quantity, rx_overload_dbm: float) -> Quantity:
    """
    Return by how much the strongest light exceeds what the receiver stands.

    Parameters
    ----------
    tx_max_dbm
        Most launch power of one lane. [dBm]
    least_db
        Least loss on the way. [dB]
    rx_overload_dbm
        Most power the receiver stands. [dBm]

    Returns
    -------
    overload_db
        Positive is too strong. [dB]

    References
    ----------
    .. [1] ITU-T G.957: least attenuation is launch less overload.

    Examples
    --------
    >>> overload_db(4.0, 3.0, -1.0)
    2.0
    """
    return tx_max_dbm - least_db - rx_overload_dbm


def attenuator_db(overload_db: float) -> float | None:
    """
    Return the smallest stock attenuator that takes an overload away; None if none does.

    Parameters
    ----------
    overload_db
        Excess at the receiver. [dB]

    Returns
    -------
    attenuator_db
        0 where there is no overload. [dB]

    References
    ----------
    .. [1] Table `attenuators`.

    Examples
    --------
    >>> attenuator_db(3.2), attenuator_db(-1.0)
    (5.0, 0.0)
    """
    if overload_db <= 0.0:
        return 0.0
    steps = (row.loss_db for row in load_rows("attenuators", AttenuatorRow))
    return min((step for step in steps if step >= overload_db), default=None)


def longest_glass_km(available_db: Quantity, *, fixed_db: float, loss_db_per_km: float) -> Quantity:
    """
    Return how much glass a budget reaches over, its other losses given.

    Parameters
    ----------
    available_db
        What may be lost between the ends. [dB]
    fixed_db
        Connectors, margin, penalties: all that does not grow with length. [dB]
    loss_db_per_km
        Fibre, and splices spread over it. [dB/km]

    Returns
    -------
    longest_glass_km
        Negative where the fixed losses alone are too much. [km]

    References
    ----------
    .. [1] J. M. Senior, Optical Fiber Communications, example 12.8.

    Examples
    --------
    >>> longest_glass_km(52.0, fixed_db=9.0, loss_db_per_km=0.5)
    86.0
    """
    return (available_db - fixed_db) / loss_db_per_km


def _sigma_db(lines: Iterable[BudgetLine]) -> float:
    return sqrt(sum(line.count * line.sigma_db**2 for line in lines))
