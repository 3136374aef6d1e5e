"""How long light takes."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from routeplan.light.constants import constant
from routeplan.light.fibres import Fibre

__all__ = ["delay_ns", "group_index", "link_delay_ns"]

Quantity = TypeVar("Quantity", float, NDArray[np.float64])
_INDEX_NM = (1310.0, 1550.0)  # what the two table fields are named for
_NS_PER_S = 1e9


def group_index(wavelength_nm: float, fibre: Fibre) -> float:
    r"""
    Return the group index of a fibre type.

    The table's two values hold at 1310 and 1550 nm. Between and beyond them the index follows
    the delay that belongs to the Sellmeier dispersion, in the middle of the type's range of
    zero-dispersion wavelengths, scaled to meet both:

    .. math:: n(\lambda) = a + b \left(\lambda - \frac{\lambda_0^2}{\lambda}\right)^2

    A type with no zero-dispersion wavelength has a straight line through the two values.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength. [nm]
    fibre
        Fibre type.

    Returns
    -------
    group_index
        Speed of light in vacuum over that of a pulse. [-]

    References
    ----------
    .. [1] ITU-T G.652: group delay form of the three-term Sellmeier fit; table `fibres`.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> round(group_index(1550.0, find_fibre("G.652.D")), 4)
    1.4682
    """
    low, high = (_shape(nm, fibre) for nm in _INDEX_NM)
    share = (_shape(wavelength_nm, fibre) - low) / (high - low)
    return fibre.group_index_1310 + share * (fibre.group_index_1550 - fibre.group_index_1310)


def delay_ns(glass_m: Quantity, index: float) -> Quantity:
    """
    Return how long light takes through a length of glass.

    Parameters
    ----------
    glass_m
        Length of the fibre itself, scalar or array. [m]
    index
        Group index. [-]

    Returns
    -------
    delay_ns
        One way. [ns]

    References
    ----------
    .. [1] Speed of light in vacuum: definition of the metre.

    Examples
    --------
    >>> round(delay_ns(25_000.0, 1.4676), 0)
    122385.0
    """
    return glass_m * (index * _NS_PER_S / constant("speed_of_light_m_per_s"))


def link_delay_ns(wavelength_nm: float, spans: Iterable[tuple[Fibre, float]]) -> float:
    """
    Return how long light takes through spans of fibre.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength. [nm]
    spans
        Fibre type and glass length of each span. [m]

    Returns
    -------
    link_delay_ns
        One way. [ns]

    References
    ----------
    .. [1] See `group_index` and `delay_ns`.
    """
    return sum(delay_ns(glass_m, group_index(wavelength_nm, fibre)) for fibre, glass_m in spans)


def _shape(wavelength_nm: float, fibre: Fibre) -> float:
    """Return what the index is straight in."""
    first, last = fibre.zero_dispersion_min_nm, fibre.zero_dispersion_max_nm
    if first is None or last is None:
        return wavelength_nm
    zero_nm = (first + last) / 2.0
    return (wavelength_nm - zero_nm * zero_nm / wavelength_nm) ** 2
