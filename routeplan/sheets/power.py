"""Loss against the ground: where along each leg a circuit has lost how much."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TypeAlias

from routeplan.cable.way import Way, existing_name
from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.along import losses_along_db
from routeplan.light.model import ExistingSpan, Glass, Path
from routeplan.planning import Plan
from routeplan.sheets.columns import Row
from routeplan.sheets.rows import shaped
from routeplan.units import m_from_mm

__all__ = ["power_rows"]

_Station: TypeAlias = tuple[str, int]
"""Leg and ground station there. [mm]"""

_Point: TypeAlias = tuple[float, _Station]
"""How far along a piece of glass, 0 to 1, and where that is."""


def power_rows(planned: Plan, circuit: CircuitPlan) -> Iterator[Row]:
    """
    Yield the nominal loss of a circuit at both ends of every piece of glass, by wavelength.

    A last row at the place of the last has the whole loss, with what stands behind the last glass.

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
        for (leg, ground_mm), loss_db in _losses_at(places, losses_db):
            yield shaped(
                "power",
                {
                    "leg": leg,
                    "wavelength_nm": wavelength_nm,
                    "ground_m": m_from_mm(ground_mm),
                    "loss_db": loss_db,
                },
            )


def _losses_at(
    places: Sequence[tuple[int, Sequence[_Point]]], losses_db: Sequence[float]
) -> Iterator[tuple[_Station, float]]:
    """Yield the points of every piece of glass with the loss there, then the whole loss."""
    for step, points in places:
        before_db = losses_db[step - 1] if step else 0.0
        for share, station in points:
            yield station, before_db + share * (losses_db[step] - before_db)
    if places:
        yield places[-1][1][-1][1], losses_db[-1]


def _glass_places(
    planned: Plan, circuit: CircuitPlan, path: Path
) -> Iterator[tuple[int, Sequence[_Point]]]:
    """Yield for every piece of glass its step's number and its ends on every leg it lies on."""
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
            points = list(_leg_points(ways[cable], start, end))
            if not own[cable].forward:
                points = [(1.0 - share, station) for share, station in reversed(points)]
            if points:
                yield number, points


def _leg_points(way: Way, start_mm: int, end_mm: int) -> Iterator[_Point]:
    """Yield where a part of a chain begins and ends on each leg, with its share of the part."""
    length_mm = max(end_mm - start_mm, 1)
    for leg, forward, offset_mm in way.legs:
        low = max(start_mm, offset_mm)
        high = min(end_mm, offset_mm + leg.length_mm)
        for at in (low, high) if low < high else ():
            along = at - offset_mm
            station = (leg.name, along if forward else leg.length_mm - along)
            yield (at - start_mm) / length_mm, station
