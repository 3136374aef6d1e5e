"""Power along the glass of a circuit, and what lies on the way."""

from __future__ import annotations

from collections.abc import Iterator

from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.along import Level, levels_along
from routeplan.light.interfaces import channels
from routeplan.light.model import (
    Bend,
    ExistingSpan,
    Glass,
    Mating,
    Part,
    Path,
    SpliceStep,
    Step,
)
from routeplan.planning import Plan
from routeplan.sheets.columns import Json, Row
from routeplan.sheets.rows import shaped
from routeplan.units import m_from_mm

__all__ = ["level_rows", "mark_rows"]

_DIGITS = 3


def level_rows(planned: Plan, circuit: CircuitPlan) -> Iterator[Row]:
    """
    Yield the losses along a circuit's glass for each wavelength, in the first way it is sent.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits.
    """
    measured = measured_glass(planned.run, planned.layout)
    paths = {path.direction: path for path in circuit.paths}
    drawn: set[float] = set()
    for channel in channels(circuit.pair, sorted({b.wavelength_nm for b in circuit.budgets})):
        if channel.wavelength_nm in drawn:
            continue
        drawn.add(channel.wavelength_nm)
        levels = levels_along(
            paths[channel.direction],
            channel.wavelength_nm,
            practice=planned.run.practice.loss,
            measured=measured,
        )
        optic = channel.optic
        yield shaped(
            "levels",
            {
                "wavelength_nm": channel.wavelength_nm,
                "direction": channel.direction,
                "tx_min_dbm": optic.tx_min_dbm if optic else None,
                "tx_max_dbm": optic.tx_max_dbm if optic else None,
                "rx_sensitivity_dbm": optic.rx_sensitivity_dbm if optic else None,
                "rx_overload_dbm": optic.rx_overload_dbm if optic else None,
                "glass_m": _column(levels, "glass_m"),
                "nominal_db": _column(levels, "nominal_db"),
                "least_db": _column(levels, "least_db"),
                "worst_db": _column(levels, "worst_db"),
            },
        )


def mark_rows(circuit: CircuitPlan) -> Iterator[Row]:
    """
    Yield joints, panels and parts along a circuit, each once for every place it is met at.

    Parameters
    ----------
    circuit
        A circuit; the way from `from` to `to` is taken.
    """
    seen: set[tuple[int, str, str]] = set()
    for glass_mm, step in _places(circuit.paths[0]):
        kind, name = _kind_and_name(step)
        if kind and (glass_mm, kind, name) not in seen:
            seen.add((glass_mm, kind, name))
            yield shaped("marks", {"glass_m": m_from_mm(glass_mm), "kind": kind, "name": name})


def _column(levels: tuple[Level, ...], key: str) -> list[Json]:
    return [round(getattr(level, key), _DIGITS) for level in levels]


def _places(path: Path) -> Iterator[tuple[int, Step]]:
    """Yield every step that is no glass with the glass before it. [mm]"""
    glass_m = 0.0
    for step in path.steps:
        if isinstance(step, Glass | ExistingSpan):
            glass_m += step.glass_m
        else:
            yield round(glass_m * 1000), step


def _kind_and_name(step: Step) -> tuple[str, str]:
    match step:
        case SpliceStep(is_pigtail=False):
            return "joint", step.where
        case Mating():
            return "panel", step.where
        case Part():
            return "part", f"{step.item}, {step.where}"
        case Bend():
            return "bend", step.where
        case _:
            return "", ""
