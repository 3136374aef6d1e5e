"""Loss against the ground: where along each leg a circuit has lost how much."""

from __future__ import annotations

from collections.abc import Iterator

from routeplan.cable.way import existing_name, leg_at
from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.along import losses_along_db
from routeplan.light.model import ExistingSpan, Glass, Path
from routeplan.planning import Plan
from routeplan.sheets.columns import Row
from routeplan.sheets.rows import shaped
from routeplan.units import m_from_mm

__all__ = ["power_rows"]


def power_rows(planned: Plan, circuit: CircuitPlan) -> Iterator[Row]:
    """
    Yield the nominal loss of a circuit at both ends of every piece of glass, by wavelength.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits; the way from `from` to `to` is taken.
    """
    path = circuit.paths[0]
    places = list(_glass_places(planned, circuit, path))
    measured = measured_glass(planned.run, planned.layout)
    for wavelength_nm in circuit.wavelengths_nm:
        losses_db = losses_along_db(
            path, wavelength_nm, practice=planned.run.practice.loss, measured=measured
        )
        for step, ends in places:
            before_db = losses_db[step - 1] if step else 0.0
            for (leg, ground_mm), loss_db in zip(ends, (before_db, losses_db[step]), strict=True):
                yield shaped(
                    "power",
                    {
                        "leg": leg,
                        "wavelength_nm": wavelength_nm,
                        "ground_m": m_from_mm(ground_mm),
                        "loss_db": loss_db,
                    },
                )


def _glass_places(
    planned: Plan, circuit: CircuitPlan, path: Path
) -> Iterator[tuple[int, tuple[tuple[str, int], tuple[str, int]]]]:
    """Yield for every piece of glass its step's number and the leg and station of both its ends."""
    ways = {cable.way.cable.id: cable.way for cable in planned.laid}
    own = {use.cable: use for use in circuit.uses}
    spans = {
        section.id: (section.cable, section.start_chain_mm, section.end_chain_mm)
        for section in planned.layout.sections
    }
    spans |= {
        existing_name(way, stretch): (cable, stretch.start_mm, stretch.end_mm)
        for cable, way in ways.items()
        for stretch in way.stretches
        if stretch.placement == "existing"
    }
    for number, step in enumerate(path.steps):
        if isinstance(step, Glass | ExistingSpan):
            name = step.section if isinstance(step, Glass) else step.where
            cable, start, end = spans[name]
            low, high = own[cable].span_mm or (start, end)
            start, end = max(start, low), min(end, high)
            first, last = (start, end) if own[cable].forward else (end, start)
            here, there = leg_at(ways[cable], first), leg_at(ways[cable], last)
            yield number, ((here[0].name, here[1]), (there[0].name, there[1]))
