"""How the loss of a circuit grows along it, step by step."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import accumulate
from typing import TYPE_CHECKING

from routeplan.light.attenuation import MeasuredPoint
from routeplan.light.contributions import loss_lines
from routeplan.light.model import Path, Step

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["losses_along_db"]


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

    def step_db(step: Step) -> float:
        alone = replace(path, steps=(step,))
        lines = loss_lines(alone, wavelength_nm, practice=practice, measured=measured)
        return sum(line.count * line.each_db for line in lines)

    return tuple(accumulate(map(step_db, path.steps)))
