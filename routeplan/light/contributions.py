"""What each part of a circuit contributes to its loss, one line a kind of part."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from math import sqrt
from typing import TYPE_CHECKING, TypeAlias

from routeplan.light.attenuation import Attenuation, MeasuredPoint, attenuation_of, sigma_db_per_km
from routeplan.light.bends import bend_loss
from routeplan.light.connectors import connector_loss
from routeplan.light.fibres import Fibre, find_fibre
from routeplan.light.model import (
    Bend,
    BudgetLine,
    ExistingSpan,
    Glass,
    Mating,
    Part,
    PartLoss,
    Path,
    SpliceStep,
    Step,
)
from routeplan.light.power import printed_db
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.light.splices import fibre_mismatch

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = [
    "Measured",
    "fibre_line",
    "glass_spans",
    "loss_lines",
    "measured_of",
    "step_loss",
    "unlike_joints",
]

Measured: TypeAlias = Mapping[str, Sequence[MeasuredPoint]]
_M_PER_KM = 1000.0


def loss_lines(
    path: Path, wavelength_nm: float, *, practice: LossPractice, measured: Measured
) -> tuple[BudgetLine, ...]:
    """
    Return the lines of a budget: fibre by type, splices, connectors, mismatch, bends, parts.

    Each line is rounded as it is printed, so that the printed lines add up to the printed loss.
    """
    found: list[BudgetLine] = []
    for (fibre_type, key), lengths_m in _glass(path, measured).items():
        attenuation = attenuation_of(fibre_type, measured.get(key, ()))
        item = f"fibre {fibre_type}, measured {key}" if key else f"fibre {fibre_type}"
        found.append(fibre_line(item, lengths_m, wavelength_nm, attenuation=attenuation))
    found += _parts(path, wavelength_nm, practice, measured)
    for (one, other), count in _mismatches(path).items():
        loss = fibre_mismatch(find_fibre(one), find_fibre(other), wavelength_nm)
        found.append(_line(f"mode-field mismatch {one} to {other}", count, loss))
    found += [_span_line(s, wavelength_nm) for s in path.steps if isinstance(s, ExistingSpan)]
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
    return _line(item, 1, _fibre_loss(lengths_m, wavelength_nm, attenuation))


def step_loss(
    step: Step, wavelength_nm: float, *, practice: LossPractice, measured: Measured
) -> PartLoss | None:
    """
    Return what one step of a path loses, or None for a bend tighter than any limit covers.

    Parameters
    ----------
    step
        Any step.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    measured
        Measured attenuation by section or cable.

    Returns
    -------
    step_loss
        Its own loss where it has one, else that of practice or tables. [dB]

    References
    ----------
    .. [1] Tables `attenuation` and `bends`; practice of the run.
    """
    match step:
        case Glass():
            own = attenuation_of(step.fibre_type, measured_of(step, measured))
            return _fibre_loss([step.glass_m], wavelength_nm, own)
        case ExistingSpan(loss_db=None):
            return _fibre_loss([step.glass_m], wavelength_nm, attenuation_of(step.fibre_type))
        case ExistingSpan(loss_db=loss_db):
            return _exactly(loss_db or 0.0, "existing_db as declared")
        case Bend():
            fibre = find_fibre(step.fibre_type)
            return bend_loss(fibre, step.radius_mm, step.turns, wavelength_nm=wavelength_nm)
        case Part():
            return step.loss
        case SpliceStep():
            return step.loss or _splice(practice)
        case Mating():
            return step.loss or _connector(practice)


def measured_of(step: Glass, measured: Measured) -> Sequence[MeasuredPoint]:
    """Return the measured points of a glass step: its section's, or else its cable's."""
    return measured.get(_measured_key(step, measured), ())


def glass_spans(path: Path) -> tuple[tuple[Fibre, float], ...]:
    """Return every fibre type of a path and its whole length [m], existing spans included."""
    metres: dict[str, float] = {}
    for step in path.steps:
        if isinstance(step, Glass | ExistingSpan):
            metres[step.fibre_type] = metres.get(step.fibre_type, 0.0) + step.glass_m
    return tuple((find_fibre(name), glass_m) for name, glass_m in metres.items())


def unlike_joints(path: Path) -> Iterator[tuple[str, str, str]]:
    """Yield where a splice joins unlike fibre, with the types before and behind it."""
    before: str | None = None
    splice: SpliceStep | None = None
    for step in path.steps:
        match step:
            case SpliceStep(is_pigtail=False):
                splice = step
            case Glass() | ExistingSpan():
                if before and splice and before != step.fibre_type:
                    yield splice.where, before, step.fibre_type
                before, splice = step.fibre_type, None
            case Mating() | Part():
                before, splice = None, None


_COMMON = ("splices in joints", "pigtail splices", "connector pairs")


def _parts(
    path: Path, wavelength_nm: float, practice: LossPractice, measured: Measured
) -> Iterator[BudgetLine]:
    """Yield a line for each kind of part: those of practice first, then in order of the path."""
    counts: dict[str, int] = dict.fromkeys(_COMMON, 0)
    own: dict[tuple[str, PartLoss], int] = {}
    for step in path.steps:
        if isinstance(step, Glass | ExistingSpan):
            continue
        item = _item(step)
        if item in counts:
            counts[item] += 1
        elif loss := step_loss(step, wavelength_nm, practice=practice, measured=measured):
            own[item, loss] = own.get((item, loss), 0) + 1
    for item, count in counts.items():
        if count:
            yield _line(item, count, (_connector if item == _COMMON[2] else _splice)(practice))
    for (item, loss), count in own.items():
        yield _line(item, count, loss)


def _item(step: Step) -> str:
    match step:
        case SpliceStep(loss=None):
            return _COMMON[1] if step.is_pigtail else _COMMON[0]
        case SpliceStep():
            return f"splice {step.where}"
        case Mating(loss=None):
            return _COMMON[2]
        case Mating():
            return f"connector pair {step.where}"
        case Bend():
            return f"bend {step.where}"
        case Part():
            return f"{step.item} {step.where}"
        case Glass() | ExistingSpan():
            return step.fibre_type


def _glass(path: Path, measured: Measured) -> dict[tuple[str, str], list[float]]:
    """Return the section lengths of a path by fibre type and what it was measured under."""
    lengths: dict[tuple[str, str], list[float]] = {}
    for step in path.steps:
        if isinstance(step, Glass):
            key = (step.fibre_type, _measured_key(step, measured))
            lengths.setdefault(key, []).append(step.glass_m)
    return lengths


def _measured_key(step: Glass, measured: Measured) -> str:
    """Return under which name a glass step was measured; an empty string if it was not."""
    return next((key for key in (step.section, step.cable) if measured.get(key)), "")


def _mismatches(path: Path) -> dict[tuple[str, str], int]:
    """Return how often unlike fibres meet, by their types in either order."""
    counts: dict[tuple[str, str], int] = {}
    for _, before, behind in unlike_joints(path):
        first, second = sorted((before, behind))
        counts[first, second] = counts.get((first, second), 0) + 1
    return counts


def _fibre_loss(
    lengths_m: Sequence[float], wavelength_nm: float, attenuation: Attenuation
) -> PartLoss:
    km = sum(lengths_m) / _M_PER_KM
    root_km = sqrt(sum(length * length for length in lengths_m)) / _M_PER_KM
    at = f"at {wavelength_nm:g} nm"
    if wavelength_nm not in attenuation.point_nm:
        at += ", between its points"
    return PartLoss(
        mean_db=attenuation_db_per_km(wavelength_nm, attenuation.typical) * km,
        sigma_db=sigma_db_per_km(wavelength_nm, attenuation) * root_km,
        limit_db=attenuation_db_per_km(wavelength_nm, attenuation.maximum) * km,
        source=f"{attenuation.source} {at}",
    )


def _splice(practice: LossPractice) -> PartLoss:
    return PartLoss(
        mean_db=practice.splice_mean_db,
        sigma_db=practice.splice_sigma_db,
        limit_db=practice.splice_limit_db,
        source="practice loss.splice_mean_db, splice_sigma_db, splice_limit_db",
    )


def _connector(practice: LossPractice) -> PartLoss:
    if practice.connector_grade is not None:
        return connector_loss(practice.connector_grade)
    return PartLoss(
        mean_db=practice.connector_mean_db,
        sigma_db=practice.connector_sigma_db,
        limit_db=practice.connector_limit_db,
        source="practice loss.connector_mean_db, connector_sigma_db, connector_limit_db",
    )


def _exactly(loss_db: float, source: str) -> PartLoss:
    return PartLoss(mean_db=loss_db, sigma_db=0.0, limit_db=loss_db, source=source)


def _span_line(span: ExistingSpan, wavelength_nm: float) -> BudgetLine:
    """Return the line of an existing span: its declared loss, or that of its fibre type."""
    item = f"existing span {span.where}"
    if span.loss_db is not None:
        return _line(item, 1, _exactly(span.loss_db, "existing_db as declared"))
    attenuation = attenuation_of(span.fibre_type)
    return fibre_line(item, [span.glass_m], wavelength_nm, attenuation=attenuation)


def _line(item: str, count: int, loss: PartLoss) -> BudgetLine:
    return BudgetLine(
        item=item,
        count=count,
        each_db=printed_db(loss.mean_db),
        sigma_db=printed_db(loss.sigma_db),
        limit_db=printed_db(loss.limit_db),
        source=loss.source,
    )
