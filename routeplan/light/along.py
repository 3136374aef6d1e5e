"""How the loss of a circuit grows along it, step by step."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import accumulate
from math import sqrt
from typing import TYPE_CHECKING

from routeplan.light.attenuation import MeasuredPoint
from routeplan.light.contributions import loss_lines, step_loss, unlike_joints
from routeplan.light.fibres import find_fibre
from routeplan.light.model import ExistingSpan, Glass, PartLoss, Path, SpliceStep, Step
from routeplan.light.power import printed_db
from routeplan.light.splices import fibre_mismatch

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["Level", "levels_along", "losses_along_db"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """What light has lost behind a step: as a rule, at least, and at worst."""

    glass_m: float
    nominal_db: float
    least_db: float
    worst_db: float


def losses_along_db(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    measured: Mapping[str, Sequence[MeasuredPoint]],
) -> tuple[float, ...]:
    """
    Return the nominal loss behind each step of a path.

    The last value is the nominal loss of the budget but for the rounding of each step.

    Parameters
    ----------
    path
        All that the light meets, in order.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    measured
        Measured attenuation by cable.

    References
    ----------
    .. [1] The budget's own lines: `routeplan.light.contributions`.
    """
    unlike = {where: (one, other) for where, one, other in unlike_joints(path)}

    def step_db(step: Step) -> float:
        alone = replace(path, steps=(step,))
        lines = loss_lines(alone, wavelength_nm, practice=practice, measured=measured)
        met = _mismatch(step, unlike, wavelength_nm)
        own_db = sum(line.count * line.each_db for line in lines)
        return own_db + sum(printed_db(loss.mean_db) for loss in met)

    return tuple(accumulate(map(step_db, path.steps)))


def levels_along(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    measured: Mapping[str, Sequence[MeasuredPoint]],
) -> tuple[Level, ...]:
    """
    Return what is lost at the start of a path and behind each of its steps.

    Least is nominal less k sigma of all that lies before, but not under 0, as for overload; worst
    has every limit. The last level is that of the budget but for the rounding of its lines, and
    without penalties, which weaken no light.

    Parameters
    ----------
    path
        All that the light meets, in order.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    measured
        Measured attenuation by section or cable.

    Returns
    -------
    levels_along
        One more than there are steps. [dB]

    References
    ----------
    .. [1] See `total_loss` and `least_loss_db`.
    """
    unlike = {where: (one, other) for where, one, other in unlike_joints(path)}
    glass_m = nominal_db = variance = worst_db = 0.0
    levels = [Level(glass_m=0.0, nominal_db=0.0, least_db=0.0, worst_db=0.0)]
    for step in path.steps:
        own = step_loss(step, wavelength_nm, practice=practice, measured=measured)
        for loss in (own, *_mismatch(step, unlike, wavelength_nm)):
            if loss is not None:
                nominal_db += loss.mean_db
                variance += loss.sigma_db**2
                worst_db += loss.limit_db
        glass_m += step.glass_m if isinstance(step, Glass | ExistingSpan) else 0.0
        least_db = max(0.0, nominal_db - practice.sigma_count * sqrt(variance))
        levels.append(
            Level(glass_m=glass_m, nominal_db=nominal_db, least_db=least_db, worst_db=worst_db)
        )
    return tuple(levels)


def _mismatch(
    step: Step, unlike: Mapping[str, tuple[str, str]], wavelength_nm: float
) -> Iterator[PartLoss]:
    if isinstance(step, SpliceStep) and not step.is_pigtail and step.where in unlike:
        one, other = sorted(unlike[step.where])
        yield fibre_mismatch(find_fibre(one), find_fibre(other), wavelength_nm)
