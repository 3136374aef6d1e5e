"""Figures for pictures: power along a circuit, and loss against wavelength."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from routeplan.light.attenuation import LossCurve, attenuation_db_per_km
from routeplan.light.constants import constant
from routeplan.light.contributions import Measured, step_loss
from routeplan.light.model import ExistingSpan, Glass, Mating, Part, Path, SpliceStep, Step

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["LevelPoint", "levels_along", "loss_spectrum", "quick_path"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelPoint:
    """The loss so far at one place of a circuit; a part is two points at one place."""

    where: str
    glass_m: float
    loss_db: float


def levels_along(
    path: Path, wavelength_nm: float, *, practice: LossPractice, measured: Measured | None = None
) -> tuple[LevelPoint, ...]:
    """
    Return the nominal loss that has built up at every place of a path.

    Parameters
    ----------
    path
        The path, in its direction.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    measured
        Measured attenuation by section or cable.

    Returns
    -------
    levels_along
        From 0 at the start, never falling. [dB]

    References
    ----------
    .. [1] See `step_loss`.
    """
    glass_m, loss_db = 0.0, 0.0
    points = [LevelPoint(where="start", glass_m=0.0, loss_db=0.0)]
    for step in path.steps:
        loss = step_loss(step, wavelength_nm, practice=practice, measured=measured or {})
        loss_db += loss.mean_db if loss else 0.0
        if isinstance(step, Glass | ExistingSpan):
            glass_m += step.glass_m
        where = step.section if isinstance(step, Glass) else step.where
        points.append(LevelPoint(where=where, glass_m=glass_m, loss_db=loss_db))
    return tuple(points)


def loss_spectrum(
    curve: LossCurve, *, step_nm: float = 1.0
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
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


def quick_path(
    glass_m: float,
    *,
    fibre_type: str,
    splices: int,
    connector_pairs: int,
    parts: tuple[Part, ...] = (),
) -> Path:
    """
    Return a path with no map behind it: so much glass in equal sections, splices and connectors.

    Parameters
    ----------
    glass_m
        Length of the fibre. [m]
    fibre_type
        Its type.
    splices
        Splices, joints and pigtails alike; the glass is in one section more. [-]
    connector_pairs
        Mated pairs. [-]
    parts
        Further parts, such as a splitter.

    Returns
    -------
    quick_path
        From one end to the other.

    References
    ----------
    .. [1] See `circuit_budget`.
    """
    steps: list[Step] = [Mating(where="panel")] * (connector_pairs - connector_pairs // 2)
    steps += parts
    for number in range(splices + 1):
        if number:
            steps.append(SpliceStep(where=f"J{number}"))
        section = f"S{number + 1}"
        piece_m = glass_m / (splices + 1)
        steps.append(Glass(section=section, fibre=1, fibre_type=fibre_type, glass_m=piece_m))
    steps += [Mating(where="panel")] * (connector_pairs // 2)
    return Path(circuit="quick", direction="from-to", steps=tuple(steps))
