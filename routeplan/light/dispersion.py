"""How far a pulse spreads: chromatic dispersion of fibre types and of whole circuits."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import Problem, RangeError
from routeplan.light.fibres import DispersionBound, Fibre

__all__ = [
    "dispersion_range_ps_per_nm",
    "dispersion_range_ps_per_nm_km",
    "linear_range_ps_per_nm_km",
    "pulse_spread_ps",
    "sellmeier_ps_per_nm_km",
]

Quantity = TypeVar("Quantity", float, NDArray[np.float64])
_M_PER_KM = 1000.0
_LINEAR_NM = 1550.0  # what the linear limits are named for


def sellmeier_ps_per_nm_km(
    wavelength_nm: Quantity, *, zero_dispersion_nm: float, slope_ps_per_nm2_km: float
) -> Quantity:
    r"""
    Return the dispersion coefficient by the three-term Sellmeier form.

    .. math:: D = \frac{S_0}{4} \left(\lambda - \frac{\lambda_0^4}{\lambda^3}\right)

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, scalar or array, above 0. [nm]
    zero_dispersion_nm
        Wavelength of no dispersion. [nm]
    slope_ps_per_nm2_km
        Slope there. [ps/(nm2 km)]

    Returns
    -------
    dispersion_ps_per_nm_km
        Negative below `zero_dispersion_nm`. [ps/(nm km)]

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), clause on the chromatic dispersion coefficient.

    Examples
    --------
    >>> round(sellmeier_ps_per_nm_km(1550.0, zero_dispersion_nm=1310.0,
    ...                              slope_ps_per_nm2_km=0.092), 2)
    17.46
    """
    cubed = wavelength_nm * wavelength_nm * wavelength_nm
    return (slope_ps_per_nm2_km / 4.0) * (wavelength_nm - zero_dispersion_nm**4 / cubed)


def dispersion_range_ps_per_nm_km(wavelength_nm: float, fibre: Fibre) -> tuple[float, float]:
    """
    Return the least and the greatest dispersion coefficient a fibre type may have.

    Where the type gives ranges of zero-dispersion wavelength and slope, all four corners of the
    two ranges are tried; elsewhere its bounds by wavelength hold, straight between their rows
    and, outside them, on the outermost straight line.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, 1260 to 1625. [nm]
    fibre
        Fibre type.

    Returns
    -------
    dispersion_range_ps_per_nm_km
        Least and greatest; a negative value lies below the zero. [ps/(nm km)]

    Raises
    ------
    RangeError
        If the tables hold neither for this type.

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), table 2; G.655 and G.656: table `dispersion_bounds`.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> low, high = dispersion_range_ps_per_nm_km(1550.0, find_fibre("G.652.D"))
    >>> round(low, 3), round(high, 3)
    (13.228, 18.01)
    """
    zeros_nm = (fibre.zero_dispersion_min_nm, fibre.zero_dispersion_max_nm)
    slopes = (fibre.slope_min_ps_per_nm2_km, fibre.slope_max_ps_per_nm2_km)
    corners = [
        sellmeier_ps_per_nm_km(wavelength_nm, zero_dispersion_nm=zero, slope_ps_per_nm2_km=slope)
        for zero in zeros_nm
        for slope in slopes
        if zero is not None and slope is not None
    ]
    if corners:
        return min(corners), max(corners)
    if not fibre.dispersion_bounds:
        raise RangeError(Problem(where="dispersion", what="is not known", value=fibre.name))
    return _between(wavelength_nm, fibre.dispersion_bounds)


def dispersion_range_ps_per_nm(
    wavelength_nm: float, spans: Iterable[tuple[Fibre, float]]
) -> tuple[float, float]:
    """
    Return the least and the greatest dispersion of a whole circuit.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength. [nm]
    spans
        Fibre type and glass length of each span. [m]

    Returns
    -------
    dispersion_range_ps_per_nm
        Least and greatest, signs kept. [ps/nm]

    References
    ----------
    .. [1] See `dispersion_range_ps_per_nm_km`; spans add up.
    """
    least, greatest = 0.0, 0.0
    for fibre, glass_m in spans:
        low, high = dispersion_range_ps_per_nm_km(wavelength_nm, fibre)
        least += low * glass_m / _M_PER_KM
        greatest += high * glass_m / _M_PER_KM
    return least, greatest


def linear_range_ps_per_nm_km(wavelength_nm: float, fibre: Fibre) -> tuple[float, float] | None:
    """
    Return the bounds that a recommendation sets as straight lines through 1550 nm.

    They are another thing than the four corners of the Sellmeier form, and budgets do not use
    them; delivered fibre is held against them.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, 1460 to 1625. [nm]
    fibre
        Fibre type.

    Returns
    -------
    linear_range_ps_per_nm_km
        Least and greatest, or None where the type has no such limits. [ps/(nm km)]

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), table 2, from memory.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> [round(bound, 3) for bound in linear_range_ps_per_nm_km(1625.0, find_fibre("G.652.D"))]
    [17.05, 23.625]
    """
    least, greatest = fibre.linear_1550_min_ps_per_nm_km, fibre.linear_1550_max_ps_per_nm_km
    flat, steep = fibre.linear_slope_min_ps_per_nm2_km, fibre.linear_slope_max_ps_per_nm2_km
    if least is None or greatest is None or flat is None or steep is None:
        return None
    offset_nm = wavelength_nm - _LINEAR_NM
    rises = (flat * offset_nm, steep * offset_nm)
    return least + min(rises), greatest + max(rises)


def pulse_spread_ps(dispersion_ps_per_nm: Quantity, line_width_nm: float) -> Quantity:
    """
    Return how much a pulse spreads, its light being `line_width_nm` wide.

    Parameters
    ----------
    dispersion_ps_per_nm
        Dispersion of the whole circuit, either sign. [ps/nm]
    line_width_nm
        Spectral width of the source. [nm]

    Returns
    -------
    pulse_spread_ps
        Never negative. [ps]

    References
    ----------
    .. [1] D. K. Mynbaev, L. L. Scheiner, Fiber-Optic Communications Technology, section 6.3.

    Examples
    --------
    >>> pulse_spread_ps(-100.0, 0.5)
    50.0
    """
    return abs(dispersion_ps_per_nm) * line_width_nm


def _between(wavelength_nm: float, bounds: tuple[DispersionBound, ...]) -> tuple[float, float]:
    """Return the bounds on the straight line of the two rows about, or nearest to, a wavelength."""
    index = 1
    while index < len(bounds) - 1 and bounds[index].wavelength_nm < wavelength_nm:
        index += 1
    first, second = bounds[index - 1], bounds[index]
    share = (wavelength_nm - first.wavelength_nm) / (second.wavelength_nm - first.wavelength_nm)
    low = first.min_ps_per_nm_km + share * (second.min_ps_per_nm_km - first.min_ps_per_nm_km)
    high = first.max_ps_per_nm_km + share * (second.max_ps_per_nm_km - first.max_ps_per_nm_km)
    return min(low, high), max(low, high)
