"""What each part of a circuit contributes to its loss, one line a kind of part."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from math import sqrt
from typing import TYPE_CHECKING

from routeplan.light.attenuation import (
    Attenuation,
    MeasuredPoint,
    attenuation_db_per_km,
    attenuation_of,
    sigma_db_per_km,
)
from routeplan.light.fibres import Fibre, find_fibre
from routeplan.light.model import BudgetLine, ExistingSpan, Glass, Mating, Path, SpliceStep
from routeplan.light.power import printed_db

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["fibre_line", "glass_spans", "loss_lines"]

_M_PER_KM = 1000.0


def loss_lines(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    measured: Mapping[str, Sequence[MeasuredPoint]],
) -> tuple[BudgetLine, ...]:
    """
    Return the lines of a budget: fibre by type and cable, splices, connectors, existing spans.

    Each line is rounded as it is printed, so that the printed lines add up to the printed loss.
    """
    found: list[BudgetLine] = []
    for (fibre_type, cable), lengths_m in _glass(path).items():
        points = measured.get(cable, ())
        attenuation = attenuation_of(fibre_type, points)
        item = f"fibre {fibre_type}, cable {cable}" if points else f"fibre {fibre_type}"
        found.append(fibre_line(item, lengths_m, wavelength_nm, attenuation=attenuation))
    steps = path.steps
    joints = sum(isinstance(step, SpliceStep) and not step.is_pigtail for step in steps)
    pigtails = sum(isinstance(step, SpliceStep) and step.is_pigtail for step in steps)
    pairs = sum(isinstance(step, Mating) for step in steps)
    found += [_splice_line("splices in joints", joints, practice)] if joints else []
    found += [_splice_line("pigtail splices", pigtails, practice)] if pigtails else []
    found += [_connector_line(pairs, practice)] if pairs else []
    found += [_span_line(s, wavelength_nm) for s in steps if isinstance(s, ExistingSpan)]
    return tuple(found)


def fibre_line(
    item: str, lengths_m: Sequence[float], wavelength_nm: float, *, attenuation: Attenuation
) -> BudgetLine:
    r"""
    Return the line of sections of one kind of fibre.

    .. math:: \alpha \sum l_i, \quad \sigma_\alpha \sqrt{\sum l_i^2}, \quad \alpha_{max} \sum l_i

    Parameters
    ----------
    item
        What the line is called.
    lengths_m
        Glass length of each section. [m]
    wavelength_nm
        Vacuum wavelength. [nm]
    attenuation
        Of this fibre.

    Returns
    -------
    fibre_line
        With a count of 1. [dB]

    References
    ----------
    .. [1] Sections vary independently; see table `attenuation`.

    Examples
    --------
    >>> line = fibre_line("fibre", [2000.0] * 5, 1310.0, attenuation=attenuation_of("G.652.D"))
    >>> line.each_db, line.sigma_db, line.limit_db
    (3.3, 0.045, 3.5)
    """
    km = sum(lengths_m) / _M_PER_KM
    root_km = sqrt(sum(length * length for length in lengths_m)) / _M_PER_KM
    at = f"at {wavelength_nm:g} nm"
    if wavelength_nm not in attenuation.point_nm:
        at += ", between its points"
    return BudgetLine(
        item=item,
        count=1,
        each_db=printed_db(attenuation_db_per_km(wavelength_nm, attenuation.typical) * km),
        sigma_db=printed_db(sigma_db_per_km(wavelength_nm, attenuation) * root_km),
        limit_db=printed_db(attenuation_db_per_km(wavelength_nm, attenuation.maximum) * km),
        source=f"{attenuation.source} {at}",
    )


def glass_spans(path: Path) -> tuple[tuple[Fibre, float], ...]:
    """Return fibre type and glass length [m] of every span of a path, existing ones included."""
    return tuple(
        (find_fibre(step.fibre_type), step.glass_m)
        for step in path.steps
        if isinstance(step, Glass | ExistingSpan)
    )


def _glass(path: Path) -> dict[tuple[str, str], list[float]]:
    """Return the section lengths of a path by fibre type and cable."""
    lengths: dict[tuple[str, str], list[float]] = {}
    for step in path.steps:
        if isinstance(step, Glass):
            lengths.setdefault((step.fibre_type, step.cable), []).append(step.glass_m)
    return lengths


def _splice_line(item: str, count: int, practice: LossPractice) -> BudgetLine:
    return _line(
        item,
        count,
        (practice.splice_mean_db, practice.splice_sigma_db, practice.splice_limit_db),
        "practice loss.splice_mean_db, splice_sigma_db, splice_limit_db",
    )


def _connector_line(count: int, practice: LossPractice) -> BudgetLine:
    return _line(
        "connector pairs",
        count,
        (practice.connector_mean_db, practice.connector_sigma_db, practice.connector_limit_db),
        "practice loss.connector_mean_db, connector_sigma_db, connector_limit_db",
    )


def _span_line(span: ExistingSpan, wavelength_nm: float) -> BudgetLine:
    """Return the line of an existing span: its declared loss, or that of its fibre type."""
    item = f"existing span {span.where}"
    if span.loss_db is not None:
        return _line(item, 1, (span.loss_db, 0.0, span.loss_db), "existing_db as declared")
    attenuation = attenuation_of(span.fibre_type)
    return fibre_line(item, [span.glass_m], wavelength_nm, attenuation=attenuation)


def _line(item: str, count: int, each: Iterable[float], source: str) -> BudgetLine:
    mean_db, sigma_db, limit_db = (printed_db(value) for value in each)
    return BudgetLine(
        item=item,
        count=count,
        each_db=mean_db,
        sigma_db=sigma_db,
        limit_db=limit_db,
        source=source,
    )
