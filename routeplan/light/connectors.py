"""Mated connector pairs by grade, and which ends may be mated."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from routeplan.errors import InputError, Problem
from routeplan.light.constants import constant
from routeplan.light.model import PartLoss
from routeplan.light.names import nearest_name
from routeplan.tables import load_rows

__all__ = [
    "ConnectorGrade",
    "Polish",
    "ReflectionRow",
    "check_mating",
    "connector_grade",
    "connector_grades",
    "connector_loss",
    "finish_reflection",
    "scatter_db",
]

Polish = Literal["angled", "flat"]


@dataclass(frozen=True, slots=True, kw_only=True)
class ConnectorGrade:
    """What mated pairs of one grade lose: mean, scatter, and what 97 % stay below."""

    name: str
    mean_db: float
    sigma_db: float
    limit_db: float
    return_loss_db: float | None = None
    source: str
    confidence: str
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class ReflectionRow:
    """How far below what meets it an end sends light back, at least; `finish` as it is sold."""

    name: str
    polish: Polish
    finish: str = ""
    return_loss_db: float
    source: str
    confidence: str
    note: str = ""


def connector_grades() -> tuple[ConnectorGrade, ...]:
    """Return the grades of the table, best first within a standard."""
    return load_rows("connectors", ConnectorGrade)


def connector_loss(grade: str) -> PartLoss:
    """
    Return what a mated pair of a grade loses.

    Raises
    ------
    InputError
        If the table has no such grade.

    Examples
    --------
    >>> connector_loss("grade B").limit_db
    0.25
    """
    row = connector_grade(grade)
    return PartLoss(
        mean_db=row.mean_db,
        sigma_db=row.sigma_db,
        limit_db=row.limit_db,
        source=f"table connectors, {grade} ({row.source})",
    )


def connector_grade(grade: str) -> ConnectorGrade:
    """
    Return a row of the table of grades.

    Raises
    ------
    InputError
        If the table has no such grade.
    """
    by_name = {row.name: row for row in connector_grades()}
    if grade not in by_name:
        near = nearest_name(grade, by_name)
        remedy = f'Did you mean "{near}"?' if near else f"There are {', '.join(by_name)}."
        what = "is not a known connector grade"
        raise InputError(Problem(where="connector", what=what, value=f'"{grade}"', remedy=remedy))
    return by_name[grade]


def finish_reflection(finish: str) -> ReflectionRow:
    """
    Return what a mated pair of a finish sends back: "PC", "UPC" or "APC".

    Examples
    --------
    >>> finish_reflection("APC").return_loss_db
    60.0
    """
    rows: tuple[ReflectionRow, ...] = load_rows("reflections", ReflectionRow)
    return next(row for row in rows if row.finish == finish)


def scatter_db(mean_db: float, limit_db: float) -> float:
    """
    Return the standard deviation of pairs of which 97 % stay below a limit.

    Parameters
    ----------
    mean_db
        Mean loss. [dB]
    limit_db
        Loss that 97 % stay below. [dB]

    Returns
    -------
    scatter_db
        As if losses were normally distributed. [dB]

    References
    ----------
    .. [1] House rule; quantile of the standard normal distribution in `light_constants`.

    Examples
    --------
    >>> round(scatter_db(0.25, 0.50), 3)
    0.133
    """
    return (limit_db - mean_db) / constant("quantile_97")


def check_mating(one: Polish, other: Polish, *, where: str) -> list[Problem]:
    """Return a problem if an angled end would be pushed against a flat one."""
    if one == other:
        return []
    return [
        Problem(
            where=where,
            what="an angled connector would be mated with a flat one",
            value=f"{one} on {other}",
            limit="the same polish on both sides",
            remedy="The gap loses several decibels and may chip the ends: change one side.",
        )
    ]
