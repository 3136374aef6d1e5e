"""The margin on the first day and at the end of life."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from routeplan.light.contributions import glass_spans
from routeplan.light.life import ageing_lines, repair_line
from routeplan.light.model import Budget, BudgetLine, Path
from routeplan.light.power import printed_db

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["life_lines", "with_years"]


def life_lines(
    path: Path, wavelength_nm: float, *, practice: LossPractice, tail_m: float
) -> tuple[BudgetLine, ...]:
    """
    Return what a circuit is to lose more over its life: repairs, temperature, ageing.

    Repairs are made with the type of fibre that most of the circuit is.

    Parameters
    ----------
    path
        All that the light meets.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    tail_m
        Each cable end in a closure. [m]

    Returns
    -------
    life_lines
        Each with its source and reason; no line for no repairs. [dB]

    References
    ----------
    .. [1] See `repair_line` and `ageing_lines`.
    """
    spans = glass_spans(path)
    repairs: list[BudgetLine] = []
    if practice.repairs_count and spans:
        fibre, _ = max(spans, key=lambda span: span[1])
        line = repair_line(
            practice.repairs_count,
            cable_m=practice.repair_cable_m,
            tail_m=tail_m,
            fibre_type=fibre.name,
            wavelength_nm=wavelength_nm,
            practice=practice,
        )
        keys = "practice loss.repairs_count, loss.repair_cable_m, slack.joint_tail_m"
        repairs.append(replace(line, source=f"{keys}: {line.source} each time the cable is cut"))
    return (*repairs, *ageing_lines(sum(glass_m for _, glass_m in spans)))


def with_years(budget: Budget, lines: tuple[BudgetLine, ...]) -> Budget:
    """
    Return a budget with its margins of the first day and of the end of life.

    Nothing is kept in hand in either: the lines take the place of that.

    Parameters
    ----------
    budget
        Of the first day.
    lines
        What `life_lines` returned.

    Returns
    -------
    with_years
        Verdict, loss and margin as they were. [dB]

    References
    ----------
    .. [1] House rule: worst loss, and every line of the years at its limit.
    """
    if budget.available_db is None:
        return replace(budget, life_lines=lines)
    first_db = printed_db(budget.available_db - budget.worst_db)
    years_db = sum(line.count * line.limit_db for line in lines)
    return replace(
        budget,
        first_day_margin_db=first_db,
        end_of_life_margin_db=printed_db(first_db - years_db),
        life_lines=lines,
    )
