"""Whether the light of a circuit arrives: its budget, in one direction at one wavelength."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from routeplan.light.contributions import Measured, glass_spans, loss_lines
from routeplan.light.delay import link_delay_ns
from routeplan.light.dispersion import dispersion_range_ps_per_nm
from routeplan.light.interfaces import Optic
from routeplan.light.model import Budget, BudgetLine, Path, Verdict
from routeplan.light.pmd import link_pmd_ps
from routeplan.light.power import (
    Loss,
    attenuator_db,
    least_loss_db,
    overload_db,
    printed_db,
    total_loss,
)
from routeplan.light.reflections import reflections, return_loss_db
from routeplan.light.remarks import (
    hazard_findings,
    path_findings,
    penalty_lines,
    pmd_findings,
    return_loss_findings,
)
from routeplan.light.verdict import Finding, dispersion_findings, power_findings, verdict_of

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["Power", "circuit_budget", "circuit_verdict"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Power:
    """What a loss means to an interface; what cannot be known is None."""

    available_db: float | None
    margin_db: float | None
    statistical_margin_db: float | None
    overload_db: float | None
    attenuator_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class _Judged:
    """What one wavelength comes to, before reflections and other lanes."""

    lines: tuple[BudgetLine, ...]
    loss: Loss
    power: Power
    dispersion_ps_per_nm: tuple[float, float]
    findings: tuple[Finding, ...]


def circuit_budget(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    optic: Optic | None = None,
    measured: Measured | None = None,
    connector_return_loss_db: float | None = None,
    allowances: Sequence[BudgetLine] = (),
) -> Budget:
    """
    Return the budget of one circuit, in one direction at one wavelength.

    Nominal, statistical and worst loss; what the interface allows and what is left of it once
    the practice's margin is kept; overload and the attenuator that mends it; dispersion, PMD,
    return loss and delay; a verdict with its reasons. Where the interface has further lanes, the
    verdict is on all of them.

    Parameters
    ----------
    path
        All that the light meets, in order, in this direction.
    wavelength_nm
        Vacuum wavelength, 1260 to 1625. [nm]
    practice
        The `loss` section of the run's practice.
    optic
        What sends and receives; None where the circuit names no interface.
    measured
        Measured attenuation by section or cable, looked up by the `section` and then the `cable`
        of each glass step.
    connector_return_loss_db
        Of mated pairs that do not say their own; without it the return loss is not known. [dB]
    allowances
        Lines for the years to come, as `life` gives them. They count as losses but do not protect
        the receiver, which has to stand the light of the first day.

    Returns
    -------
    circuit_budget
        Decibels to 0.001, delay to a nanosecond. [dB]

    Raises
    ------
    RangeError
        If the wavelength is outside 1260 to 1625 nm.

    References
    ----------
    .. [1] ITU-T G.652, appendix I: attenuation, splices and connectors of a link add up.
    .. [2] ITU-T G.957: least attenuation and overload.
    """
    measured = measured or {}
    judged = _judge(
        path,
        wavelength_nm,
        practice=practice,
        optic=optic,
        measured=measured,
        allowances=allowances,
    )
    returned = reflections(
        path,
        wavelength_nm,
        practice=practice,
        connector_return_loss_db=connector_return_loss_db,
        receiver_return_loss_db=optic.rx_return_loss_db if optic else None,
        measured=measured,
    )
    returned_db = return_loss_db(returned)
    findings = [*judged.findings, *return_loss_findings(returned_db, optic)]
    if optic and verdict_of(finding.verdict for finding in findings) != "fails":
        findings += _lane_findings(
            path,
            wavelength_nm,
            practice=practice,
            optic=optic,
            measured=measured,
            allowances=allowances,
        )
    findings += hazard_findings(optic)
    spans = glass_spans(path)
    return Budget(
        circuit=path.circuit,
        wavelength_nm=wavelength_nm,
        direction=path.direction,
        nominal_db=judged.loss.nominal_db,
        statistical_db=judged.loss.statistical_db,
        worst_db=judged.loss.worst_db,
        available_db=judged.power.available_db,
        margin_db=judged.power.margin_db,
        statistical_margin_db=judged.power.statistical_margin_db,
        overload_db=judged.power.overload_db,
        attenuator_db=judged.power.attenuator_db,
        dispersion_min_ps_per_nm=round(judged.dispersion_ps_per_nm[0], 3) + 0.0,
        dispersion_max_ps_per_nm=round(judged.dispersion_ps_per_nm[1], 3) + 0.0,
        pmd_ps=round(link_pmd_ps(spans), 3),
        return_loss_db=None if returned_db is None else printed_db(returned_db),
        delay_ns=round(link_delay_ns(wavelength_nm, spans)),
        verdict=verdict_of(finding.verdict for finding in findings),
        reasons=tuple(finding.text for finding in findings),
        lines=judged.lines,
    )


def circuit_verdict(budgets: Iterable[Budget]) -> Verdict:
    """Return the verdict of a circuit: it fits when every wavelength does in both directions."""
    return verdict_of(budget.verdict for budget in budgets)


def _power(
    lines: Sequence[BudgetLine], loss: Loss, optic: Optic | None, *, practice: LossPractice
) -> Power:
    """Return margins, overload and attenuator, as printed."""
    available = optic.available_db if optic else None
    excess: float | None = None
    least_db = least_loss_db(lines, sigma_count=practice.sigma_count)
    if optic and optic.tx_max_dbm is not None and optic.rx_overload_dbm is not None:
        excess = printed_db(overload_db(optic.tx_max_dbm, least_db, optic.rx_overload_dbm))
    elif optic and optic.channel_loss_min_db is not None:
        excess = printed_db(optic.channel_loss_min_db - least_db)
    return Power(
        available_db=None if available is None else printed_db(available),
        margin_db=_left_db(available, loss.worst_db, practice.margin_db),
        statistical_margin_db=_left_db(available, loss.statistical_db, practice.margin_db),
        overload_db=excess,
        attenuator_db=None if excess is None else attenuator_db(excess),
    )


def _left_db(available_db: float | None, loss_db: float, kept_db: float) -> float | None:
    return None if available_db is None else printed_db(available_db - loss_db - kept_db)


def _judge(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    optic: Optic | None,
    measured: Measured,
    allowances: Sequence[BudgetLine],
) -> _Judged:
    """Return loss, power and dispersion at one wavelength, and what is to be said of them."""
    spans = glass_spans(path)
    dispersion = dispersion_range_ps_per_nm(wavelength_nm, spans)
    lines = loss_lines(path, wavelength_nm, practice=practice, measured=measured)
    penalties = (*penalty_lines(dispersion, optic), *allowances)
    loss = total_loss([*lines, *penalties], sigma_count=practice.sigma_count)
    power = _power(lines, loss, optic, practice=practice)
    findings = power_findings(power, loss, optic, practice=practice)
    findings += dispersion_findings(dispersion, spans, optic, wavelength_nm=wavelength_nm)
    findings += pmd_findings(spans, optic)
    findings += path_findings(path, wavelength_nm, measured=measured)
    return _Judged(
        lines=(*lines, *penalties),
        loss=loss,
        power=power,
        dispersion_ps_per_nm=dispersion,
        findings=tuple(findings),
    )


def _lane_findings(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    optic: Optic,
    measured: Measured,
    allowances: Sequence[BudgetLine],
) -> list[Finding]:
    """Return what keeps the interface's other lanes from working, or nothing."""
    return [
        Finding(verdict="fails", text=f"Lane at {lane_nm:g} nm: {finding.text}")
        for lane_nm in optic.other_lanes_nm(wavelength_nm)
        for finding in _judge(
            path,
            lane_nm,
            practice=practice,
            optic=optic,
            measured=measured,
            allowances=allowances,
        ).findings
        if finding.verdict == "fails"
    ]
