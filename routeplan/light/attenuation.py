"""What cabled fibre of a type, or a cable that was measured, loses."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import Protocol

import numpy as np

from routeplan.light.fibres import Fibre, find_fibre
from routeplan.light.spectrum import LossCurve, loss_curve

__all__ = [
    "Attenuation",
    "MeasuredPoint",
    "attenuation_of",
    "ceiling_db_per_km",
    "sigma_db_per_km",
]


class MeasuredPoint(Protocol):
    """Attenuation of the delivered cable as measured at one wavelength."""

    @property
    def wavelength_nm(self) -> float:
        """Vacuum wavelength. [nm]"""

    @property
    def attenuation_db_per_km(self) -> float:
        """Measured attenuation, taken as typical and as maximum. [dB/km]"""

    @property
    def sigma_db_per_km(self) -> float:
        """Standard deviation between sections. [dB/km]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Attenuation:
    """Typical and highest attenuation of a cable, its scatter by section, and their source."""

    typical: LossCurve
    maximum: LossCurve
    sigma_nm: tuple[float, ...]
    sigma_db_per_km: tuple[float, ...]
    point_nm: tuple[float, ...]
    source: str


def sigma_db_per_km(wavelength_nm: float, attenuation: Attenuation) -> float:
    """
    Return the standard deviation of attenuation between sections, straight between its points.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength; beyond the outermost points their value holds. [nm]
    attenuation
        What `attenuation_of` returned.

    Returns
    -------
    sigma_db_per_km
        Of one section. [dB/km]

    References
    ----------
    .. [1] Table `attenuation`, or the user's measured points.
    """
    return float(np.interp(wavelength_nm, attenuation.sigma_nm, attenuation.sigma_db_per_km))


def attenuation_of(fibre_type: str, measured: Sequence[MeasuredPoint] = ()) -> Attenuation:
    """
    Return the attenuation of a fibre type, or of a cable that was measured.

    A measured point is typical and maximum at once. Where the measured points end, the fibre
    type's own curve goes on, its floor scaled to meet the last point; the water peak is the
    type's unless a point between 1340 and 1440 nm tells it.

    Raises
    ------
    InputError
        If the fibre type is not known.
    """
    own = _type_attenuation(fibre_type)
    if not measured:
        return own
    points = sorted((p.wavelength_nm, p.attenuation_db_per_km, p.sigma_db_per_km) for p in measured)
    nm = tuple(point[0] for point in points)
    curve = loss_curve([point[:2] for point in points], like=own.typical)
    return Attenuation(
        typical=curve,
        maximum=curve,
        sigma_nm=nm,
        sigma_db_per_km=tuple(point[2] for point in points),
        point_nm=nm,
        source=f"measured points of the cable, {fibre_type} between and beyond",
    )


@cache
def _type_attenuation(fibre_type: str) -> Attenuation:
    rows = find_fibre(fibre_type).attenuation
    nm = tuple(row.wavelength_nm for row in rows)
    return Attenuation(
        typical=loss_curve([(row.wavelength_nm, row.typical_db_per_km) for row in rows]),
        maximum=loss_curve([(row.wavelength_nm, row.max_db_per_km) for row in rows]),
        sigma_nm=nm,
        sigma_db_per_km=tuple(row.sigma_db_per_km for row in rows),
        point_nm=nm,
        source=f"table attenuation, {fibre_type}",
    )


def ceiling_db_per_km(wavelength_nm: float, fibre: Fibre) -> float | None:
    """
    Return the lowest ceiling a recommendation sets at a wavelength, or None where it sets none.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength. [nm]
    fibre
        Fibre type.

    Returns
    -------
    ceiling_db_per_km
        Of cabled fibre. [dB/km]

    References
    ----------
    .. [1] Table `attenuation_ceilings`.

    Examples
    --------
    >>> ceiling_db_per_km(1550.0, find_fibre("G.652.D"))
    0.3
    """
    return min(
        (
            row.max_db_per_km
            for row in fibre.ceilings
            if row.wavelength_min_nm <= wavelength_nm <= row.wavelength_max_nm
        ),
        default=None,
    )
