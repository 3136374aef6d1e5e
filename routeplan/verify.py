"""Every check of a plan: what was found, the limit, and whether it fits."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from routeplan.cable.model import Layout
from routeplan.check import Check, verdict_on
from routeplan.circuits import CircuitPlan
from routeplan.light.model import Budget
from routeplan.run.model import Run
from routeplan.verify_light import circuit_checks

__all__ = ["Check", "plan_checks"]


def plan_checks(run: Run, layout: Layout, circuits: Sequence[CircuitPlan]) -> tuple[Check, ...]:
    """
    Return the checks of a plan: light first, then cable.

    Parameters
    ----------
    run
        What was declared.
    layout
        Its layout.
    circuits
        Its circuits.
    """
    return (
        *(
            check
            for one in circuits
            for budget in one.budgets
            for check in _light_checks(budget, run)
        ),
        *circuit_checks(run, layout, circuits),
        *_reel_checks(layout),
        *_count_checks(run, layout),
    )


def _light_checks(budget: Budget, run: Run) -> Iterator[Check]:
    where = f"{budget.circuit}, {budget.wavelength_nm:g} nm, {budget.direction}"
    on_worst = run.practice.loss.verdict_on == "worst"
    margin = budget.margin_db if on_worst else budget.statistical_margin_db
    yield Check(
        kind="margin",
        where=where,
        value=margin,
        limit=0.0,
        unit="dB",
        verdict=verdict_on(None if margin is None else margin >= 0),
        source=f"loss.margin_db, loss.verdict_on = {run.practice.loss.verdict_on}",
    )
    over = budget.overload_db
    mended = over is not None and over > 0 and budget.attenuator_db is not None
    yield Check(
        kind="overload with attenuator" if mended else "overload",
        where=where,
        value=over,
        limit=budget.attenuator_db if mended else 0.0,
        unit="dB",
        verdict=verdict_on(None if over is None else over <= (budget.attenuator_db or 0.0)),
        source="interface, least loss",
    )
    yield Check(
        kind="circuit",
        where=where,
        value=margin,
        limit=None,
        unit="dB",
        verdict=budget.verdict,
        source="; ".join(budget.reasons),
    )


def _reel_checks(layout: Layout) -> Iterator[Check]:
    reels = {reel.id: reel for reel in layout.reels}
    sections = {section.id: section for section in layout.sections}
    for cut in layout.cuts:
        section, reel = sections[cut.section], reels[cut.reel]
        yield Check(
            kind="section on reel",
            where=f"{section.id} on {reel.id}",
            value=section.needed_mm / 1000,
            limit=reel.length_mm / 1000,
            unit="m",
            verdict=verdict_on(section.needed_mm <= reel.length_mm),
            source="slack.ordering_ratio, reels",
        )


def _count_checks(run: Run, layout: Layout) -> Iterator[Check]:
    most = run.practice.joints.max_count
    if most is None:
        return
    for cable in layout.cables:
        # A joint at a branch node belongs to no one cable; the limit is on those along one.
        count = sum(j.mark.cable == cable.id and j.node is None for j in layout.joints)
        yield Check(
            kind="joints",
            where=f"cable {cable.name}",
            value=count,
            limit=most,
            unit="",
            verdict=verdict_on(count <= most),
            source="joints.max_count",
        )
