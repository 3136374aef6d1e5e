"""Attenuation against wavelength: scattering, the water peak, the infrared edge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import overload

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import Problem, RangeError
from routeplan.light.constants import constant

__all__ = [
    "LossCurve",
    "attenuation_db_per_km",
    "infrared_db_per_km",
    "loss_curve",
    "loss_spectrum",
    "water_peak_ratio",
]

Floats = NDArray[np.float64]
_NM_PER_UM = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LossCurve:
    """
    Attenuation against wavelength, through given points.

    The floor (scattering and what does not depend on wavelength) is straight in the inverse
    fourth power of the wavelength between its knots; the water peak has the given height; the
    rest, straight in wavelength, carries the curve through further points on the water peak.
    """

    floor_per_um4: tuple[float, ...]
    floor_db_per_km: tuple[float, ...]
    water_db_per_km: float
    rest_nm: tuple[float, ...] = ()
    rest_db_per_km: tuple[float, ...] = ()


@overload
def infrared_db_per_km(wavelength_nm: float) -> float: ...
@overload
def infrared_db_per_km(wavelength_nm: Floats) -> Floats: ...
def infrared_db_per_km(wavelength_nm: float | Floats) -> float | Floats:
    r"""
    Return the infrared absorption edge of silica.

    .. math:: 7.81 \cdot 10^{11} \exp(-48.48 / \lambda), \quad \lambda \text{ in } \mu m

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, scalar or array. [nm]

    Returns
    -------
    infrared_db_per_km
        Below 0.001 under 1440 nm, 0.020 at 1550 nm. [dB/km]

    References
    ----------
    .. [1] Two-exponential model of silica loss; constants in table `light_constants`.

    Examples
    --------
    >>> round(infrared_db_per_km(1550.0), 5)
    0.02037
    """
    factor = constant("infrared_db_per_km")
    return _as_given(
        factor * np.exp(-constant("infrared_um") * _NM_PER_UM / np.asarray(wavelength_nm)),
        wavelength_nm,
    )


@overload
def water_peak_ratio(wavelength_nm: float) -> float: ...
@overload
def water_peak_ratio(wavelength_nm: Floats) -> Floats: ...
def water_peak_ratio(wavelength_nm: float | Floats) -> float | Floats:
    r"""
    Return the shape of the water peak: 1 at its top, a Lorentzian line about 1383 nm.

    The line is lowered so that it ends 60 nm from its top: there it no longer matters, and the
    floor can be told from points beyond.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, scalar or array. [nm]

    Returns
    -------
    water_peak_ratio
        Between 0 and 1. [-]

    References
    ----------
    .. [1] S. T. Sorensen, thesis, DTU Fotonik, 2013: half width 16 nm.

    Examples
    --------
    >>> round(water_peak_ratio(1399.0), 3), water_peak_ratio(1310.0)
    (0.464, 0.0)
    """
    half_nm, reach_nm = constant("water_half_width_nm"), constant("water_reach_nm")
    offset = (np.asarray(wavelength_nm) - constant("water_peak_nm")) / half_nm
    end = 1.0 / (1.0 + (reach_nm / half_nm) ** 2)
    ratio = (1.0 / (1.0 + offset * offset) - end) / (1.0 - end)
    return _as_given(np.maximum(ratio, 0.0), wavelength_nm)


@overload
def attenuation_db_per_km(wavelength_nm: float, curve: LossCurve) -> float: ...
@overload
def attenuation_db_per_km(wavelength_nm: Floats, curve: LossCurve) -> Floats: ...
def attenuation_db_per_km(wavelength_nm: float | Floats, curve: LossCurve) -> float | Floats:
    r"""
    Return the attenuation that a curve gives: Rayleigh floor, water peak and infrared edge.

    .. math:: \alpha = a + b / \lambda^4 + h \, w(\lambda) + \alpha_{IR}

    with the shape *w* of the water peak, and *a*, *b* and *h* such that the curve passes through
    its points.

    Parameters
    ----------
    wavelength_nm
        Vacuum wavelength, scalar or array of any shape, 1260 to 1625. [nm]
    curve
        `typical` or `maximum` of an `Attenuation`.

    Returns
    -------
    attenuation_db_per_km
        Same shape as `wavelength_nm`. [dB/km]

    Raises
    ------
    RangeError
        If a wavelength lies outside 1260 to 1625 nm.

    References
    ----------
    .. [1] Rayleigh, infrared and OH terms: see `infrared_db_per_km` and `water_peak_ratio`.

    Examples
    --------
    >>> curve = loss_curve([(1310.0, 0.35), (1550.0, 0.22)])
    >>> round(attenuation_db_per_km(1310.0, curve), 6)
    0.35
    >>> round(attenuation_db_per_km(1490.0, curve), 3)
    0.232
    """
    nm = np.asarray(wavelength_nm, dtype=np.float64)
    _check_wavelength(nm)
    return _as_given(_curve(nm, curve), wavelength_nm)


def loss_spectrum(curve: LossCurve, *, step_nm: float = 1.0) -> tuple[Floats, Floats]:
    """
    Return wavelengths from 1260 to 1625 nm and the attenuation at each.

    Parameters
    ----------
    curve
        `typical` or `maximum` of an `Attenuation`.
    step_nm
        Distance between wavelengths. [nm]

    Returns
    -------
    loss_spectrum
        Wavelengths [nm] and attenuation. [dB/km]

    References
    ----------
    .. [1] See `attenuation_db_per_km`.
    """
    low_nm, high_nm = constant("attenuation_min_nm"), constant("attenuation_max_nm")
    count = int((high_nm - low_nm) / step_nm) + 1
    nm = low_nm + step_nm * np.arange(count, dtype=np.float64)
    return nm, attenuation_db_per_km(nm, curve)


def loss_curve(
    points: Sequence[tuple[float, float]], *, like: LossCurve | None = None
) -> LossCurve:
    """
    Return the curve through (wavelength_nm, attenuation_db_per_km) points.

    `like` tells how the curve goes on beyond the outermost points, and its water peak where no
    point does; without it the outermost two points' own floor goes on.
    """
    low_nm, high_nm = constant("water_band_min_nm"), constant("water_band_max_nm")
    floor = [point for point in points if not low_nm <= point[0] <= high_nm]
    water = [point for point in points if low_nm <= point[0] <= high_nm]
    if not water:
        return _with_floor(floor, like, like.water_db_per_km if like else 0.0)
    peak = min(water, key=lambda point: abs(point[0] - constant("water_peak_nm")))
    dry = _miss_db_per_km(peak, _with_floor(floor, like, 0.0))
    unit = _miss_db_per_km(peak, _with_floor(floor, like, 1.0))
    curve = _with_floor(floor, like, max(0.0, dry / (dry - unit)))
    rest = sorted((nm, round(_miss_db_per_km((nm, db), curve), 15)) for nm, db in points)
    return LossCurve(
        floor_per_um4=curve.floor_per_um4,
        floor_db_per_km=curve.floor_db_per_km,
        water_db_per_km=curve.water_db_per_km,
        rest_nm=tuple(nm for nm, _ in rest),
        rest_db_per_km=tuple(db for _, db in rest),
    )


def _with_floor(
    points: Sequence[tuple[float, float]], like: LossCurve | None, water_db_per_km: float
) -> LossCurve:
    """Return the curve whose floor meets the points once water and infrared are taken off."""
    knots = sorted(
        (
            _per_um4(nm),
            db - infrared_db_per_km(nm) - water_db_per_km * water_peak_ratio(nm),
        )
        for nm, db in points
    )
    knots = _carried_on(knots) if like is None else _carried_on_like(knots, like)
    return LossCurve(
        floor_per_um4=tuple(x for x, _ in knots),
        floor_db_per_km=tuple(y for _, y in knots),
        water_db_per_km=water_db_per_km,
    )


def _carried_on(knots: list[tuple[float, float]]) -> list[tuple[float, float]]:
    """Return the knots with one more at each end of the range, on the outermost straight lines."""
    (x1, y1), (x2, y2) = knots[:2]
    (x3, y3), (x4, y4) = knots[-2:]
    first, last = _per_um4(constant("attenuation_max_nm")), _per_um4(constant("attenuation_min_nm"))
    if first < x1:
        knots = [(first, y1 + (y2 - y1) * (first - x1) / (x2 - x1)), *knots]
    if last > x4:
        knots = [*knots, (last, y3 + (y4 - y3) * (last - x3) / (x4 - x3))]
    return knots


def _carried_on_like(
    knots: list[tuple[float, float]], like: LossCurve
) -> list[tuple[float, float]]:
    """Return the knots with those of `like` beyond them, scaled to meet the outermost ones."""
    theirs = list(zip(like.floor_per_um4, like.floor_db_per_km, strict=True))
    if not knots:
        return theirs
    (first, low), (last, high) = knots[0], knots[-1]
    low_ratio = low / float(np.interp(first, like.floor_per_um4, like.floor_db_per_km))
    high_ratio = high / float(np.interp(last, like.floor_per_um4, like.floor_db_per_km))
    before = [(x, y * low_ratio) for x, y in theirs if x < first]
    after = [(x, y * high_ratio) for x, y in theirs if x > last]
    return [*before, *knots, *after]


def _miss_db_per_km(point: tuple[float, float], curve: LossCurve) -> float:
    return point[1] - float(_curve(np.asarray(point[0]), curve))


def _curve(wavelength_nm: Floats, curve: LossCurve) -> Floats:
    """Return floor, water peak and infrared edge together, at wavelengths already checked."""
    total = np.interp(_per_um4(wavelength_nm), curve.floor_per_um4, curve.floor_db_per_km)
    total += infrared_db_per_km(wavelength_nm)
    if curve.water_db_per_km:
        total += curve.water_db_per_km * water_peak_ratio(wavelength_nm)
    if any(curve.rest_db_per_km):
        total += np.interp(wavelength_nm, curve.rest_nm, curve.rest_db_per_km)
    return total


@overload
def _per_um4(wavelength_nm: float) -> float: ...
@overload
def _per_um4(wavelength_nm: Floats) -> Floats: ...
def _per_um4(wavelength_nm: float | Floats) -> float | Floats:
    um2 = (wavelength_nm / _NM_PER_UM) ** 2
    return 1.0 / (um2 * um2)


def _check_wavelength(wavelength_nm: Floats) -> None:
    low_nm, high_nm = constant("attenuation_min_nm"), constant("attenuation_max_nm")
    if wavelength_nm.size and not (
        wavelength_nm.min() >= low_nm and wavelength_nm.max() <= high_nm
    ):
        bad = wavelength_nm[~((wavelength_nm >= low_nm) & (wavelength_nm <= high_nm))].flat[0]
        raise RangeError(
            Problem(
                where="attenuation",
                what="wavelength is outside what the curve holds for",
                value=f"{bad:g} nm",
                limit=f"{low_nm:g} to {high_nm:g} nm",
            )
        )


def _as_given(result: Floats, given: float | Floats) -> float | Floats:
    """Return a float for a float and an array for an array."""
    return result if isinstance(given, np.ndarray) else float(result)
