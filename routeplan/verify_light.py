"""Checks and warnings of circuits beside their budgets: polarity, bends, glass, laser light."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from routeplan.cable.model import Layout
from routeplan.check import Check, verdict_on
from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.attenuation import attenuation_of
from routeplan.light.contributions import Measured, measured_of, unlike_joints
from routeplan.light.fibres import AttenuationCeiling, find_fibre
from routeplan.light.hazard import hazard_level, hazard_limit_dbm, launch_hazard, total_dbm
from routeplan.light.interfaces import Optic
from routeplan.light.model import Bend, Glass, Verdict
from routeplan.light.polarity import PairElement, check_polarity, crossing_count
from routeplan.light.power import printed_db
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.light.splices import fibre_mismatch
from routeplan.run.model import Run
from routeplan.run.optics import ANY_INTERFACE

__all__ = ["circuit_checks", "light_warnings"]

_HAZARD_VERDICTS: dict[str, Verdict] = {"3B": "unknown", "4": "fails"}


def circuit_checks(run: Run, layout: Layout, circuits: Sequence[CircuitPlan]) -> Iterator[Check]:
    """
    Yield the checks of circuits that no budget holds.

    Parameters
    ----------
    run
        What was declared.
    layout
        Its layout.
    circuits
        Its circuits.
    """
    measured = measured_glass(run, layout)
    for circuit in circuits:
        yield from _interface_checks(circuit)
        yield from _polarity_checks(circuit)
        yield from _bend_checks(circuit)
        yield from _unlike_checks(circuit)
        yield from _hazard_checks(circuit)
        yield from _ceiling_checks(circuit, measured)


def light_warnings(
    run: Run, layout: Layout, circuits: Sequence[CircuitPlan]
) -> Iterator[tuple[str, str]]:
    """Yield what a planner should know of circuits: where it is, and what."""
    places = {name for joint in layout.joints for name in (joint.id, joint.reach_name)}
    for joint in run.joints:
        if joint.place not in places:
            yield f'joint "{joint.place}"', "no joint stands there, so its figures are not used"
    unlike = dict.fromkeys(
        (where, *sorted((before, behind)))
        for circuit in circuits
        for where, before, behind in unlike_joints(circuit.paths[0])
    )
    for where, one, other in unlike:
        yield (
            f"joint {where}",
            f"{one} meets {other}: traces read wrong there from one side, so measure from both",
        )
    by_name = {circuit.order.name: circuit for circuit in circuits}
    for circuit in circuits:
        yield from _one_fibre_warnings(run, circuit)
        main = by_name.get(circuit.order.standby_for or "")
        if main is not None:
            yield from _standby_warnings(circuit, main, layout)


def _one_fibre_warnings(run: Run, circuit: CircuitPlan) -> Iterator[tuple[str, str]]:
    if circuit.pair is None or circuit.pair.name in run.interfaces:
        return  # whoever describes an interface knows what it is made for
    ways = {(budget.wavelength_nm, budget.direction) for budget in circuit.budgets}
    both = sorted({nm for nm, _ in ways if {(nm, "from-to"), (nm, "to-from")} <= ways})
    if circuit.order.fibre_count == 1 and both:
        light = ", ".join(f"{nm:g}" for nm in both)
        yield (
            f'circuit "{circuit.order.name}"',
            f"{circuit.pair.name} is made for two fibres: both directions would use {light} nm on "
            "one; interfaces for one fibre have a wavelength for each direction",
        )


def _standby_warnings(
    circuit: CircuitPlan, main: CircuitPlan, layout: Layout
) -> Iterator[tuple[str, str]]:
    names = {cable.id: cable.name for cable in layout.cables}
    own = {use.cable for use in circuit.uses}
    shared = dict.fromkeys(names[use.cable] for use in main.uses if use.cable in own)
    if shared:
        yield (
            f'circuit "{circuit.order.name}"',
            f'stands by for "{main.order.name}" but shares cable {", ".join(shared)} with it: '
            "one cut takes both",
        )


def _interface_checks(circuit: CircuitPlan) -> Iterator[Check]:
    if circuit.order.interface != ANY_INTERFACE:
        return
    count = len(circuit.closing)
    yield Check(
        kind="interfaces that close",
        where=circuit.order.name,
        value=count,
        limit=1,
        unit="",
        verdict=verdict_on(count >= 1),
        source="at least one of table interfaces and of the run file's own",
    )


def _polarity_checks(circuit: CircuitPlan) -> Iterator[Check]:
    if circuit.order.fibre_count == 1:
        return
    elements = list(_pair_elements(circuit))
    problems = check_polarity(elements, where=circuit.order.name)
    text = "transmit meets receive: swapped at " + ", ".join(e.where for e in elements if e.swaps)
    for problem in problems:
        text = f"{problem.what}. {problem.remedy}"
    yield Check(
        kind="polarity",
        where=circuit.order.name,
        value=crossing_count(elements),
        limit=None,
        unit="swaps",
        verdict=verdict_on(not problems),
        source=text,
    )


def _pair_elements(circuit: CircuitPlan) -> Iterator[PairElement]:
    """Yield what a pair goes through: a lead at each panel, one roll to each run of cable."""
    order, way = circuit.order, circuit.way
    panels = (way.start, *way.patched, way.end)
    for number, site in enumerate(panels):
        if number:
            yield PairElement(where=f"{site} panel", kind="plant", swaps=True)
        crossed = order.leads.get(site, "crossed") == "crossed"
        yield PairElement(where=f"{site}", kind="lead", swaps=crossed)
    yield from (PairElement(where=place, kind="plant", swaps=True) for place in order.rolls)


def _bend_checks(circuit: CircuitPlan) -> Iterator[Check]:
    for step in dict.fromkeys(circuit.paths[0].steps):
        if isinstance(step, Bend):
            least_mm = find_fibre(step.fibre_type).bend_radius_min_mm
            yield Check(
                kind="bend radius",
                where=f"{circuit.order.name}, {step.where}",
                value=step.radius_mm,
                limit=least_mm,
                unit="mm",
                verdict=verdict_on(step.radius_mm >= least_mm),
                source=f"table fibres, bend_radius_min_mm of {step.fibre_type}",
            )


def _unlike_checks(circuit: CircuitPlan) -> Iterator[Check]:
    for where, before, behind in unlike_joints(circuit.paths[0]):
        loss = fibre_mismatch(find_fibre(before), find_fibre(behind), circuit.wavelengths_nm[0])
        yield Check(
            kind="unlike fibre",
            where=f"{circuit.order.name}, {where}",
            value=printed_db(loss.limit_db),
            limit=None,
            unit="dB",
            verdict="fits",
            source=f"{before} to {behind} at {circuit.wavelengths_nm[0]:g} nm, in the budget; "
            f"{loss.source}",
        )


def _hazard_checks(circuit: CircuitPlan) -> Iterator[Check]:
    if circuit.pair is None:
        return
    for name, optic in {o.name: o for o in (circuit.pair.at_from, circuit.pair.at_to)}.items():
        sent_nm = [nm for nm in circuit.wavelengths_nm if optic.carries(nm)]
        power_dbm = _launched_dbm(optic, len(sent_nm))
        if power_dbm is None or not sent_nm:
            continue
        level = hazard_level(power_dbm, max(sent_nm))
        yield Check(
            kind="laser hazard",
            where=f"{circuit.order.name}, {name}",
            value=round(power_dbm, 3),
            limit=hazard_limit_dbm("1", max(sent_nm)),
            unit="dBm",
            verdict=_HAZARD_VERDICTS.get(level, "fits"),
            source=f"hazard level {level}, the limit is that of level 1: table laser_hazard",
        )


def _launched_dbm(optic: Optic, count: int) -> float | None:
    """Return the highest power into one fibre, all wavelengths of a circuit together."""
    launched = launch_hazard(optic)
    if launched is None or optic.tx_max_dbm is None:
        return None
    if len(optic.wavelengths_nm) > 1:  # its lanes are all there, however many are listed
        return launched[0]
    return total_dbm(optic.tx_max_dbm, max(1, count))


def _ceiling_checks(circuit: CircuitPlan, measured: Measured) -> Iterator[Check]:
    """Yield a check for each kind of glass: its highest attenuation and what is allowed."""
    steps = [step for step in circuit.paths[0].steps if isinstance(step, Glass)]
    own = {(step.fibre_type, tuple(measured_of(step, measured))): step for step in reversed(steps)}
    for (fibre_type, points), step in reversed(own.items()):
        for nm in circuit.wavelengths_nm:
            row = _ceiling(fibre_type, nm)
            if row is None:
                continue
            highest = attenuation_db_per_km(nm, attenuation_of(fibre_type, points).maximum)
            yield Check(
                kind="attenuation",
                where=f"{circuit.order.name}, {fibre_type} from {step.section}, {nm:g} nm",
                value=round(highest, 3),
                limit=row.max_db_per_km,
                unit="dB/km",
                verdict=verdict_on(round(highest, 3) <= row.max_db_per_km),
                source=f"table attenuation_ceilings: {row.source}",
            )


def _ceiling(fibre_type: str, wavelength_nm: float) -> AttenuationCeiling | None:
    """Return the lowest of the ceilings that hold at a wavelength."""
    rows = (
        row
        for row in find_fibre(fibre_type).ceilings
        if row.wavelength_min_nm <= wavelength_nm <= row.wavelength_max_nm
    )
    return min(rows, key=lambda row: row.max_db_per_km, default=None)
