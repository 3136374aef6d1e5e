"""What is asked of a circuit once it is planned: what would mend it, its reach, its times."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.changes import Circuit, mending_changes, stretch_limit_m
from routeplan.light.model import Budget, Direction, Part, Path
from routeplan.light.rf import carrier_to_noise_db, electrical_loss_db, rf_gain_db
from routeplan.light.timing import pair_asymmetry_ns, timing_figures
from routeplan.planning import Plan
from routeplan.run.optics import Interface

__all__ = ["Figure", "RfFigure", "changes", "radio_figures", "stretch_m", "times"]

_NS_PER_US = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A figure of a circuit beside its limit, where there is one."""

    figure: str
    value: float
    unit: str
    limit: float | None
    source: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RfFigure:
    """A figure of a radio-frequency link, in one direction at one wavelength."""

    wavelength_nm: float
    direction: Direction
    figure: str
    value: float
    unit: str
    source: str


def changes(planned: Plan, circuit: CircuitPlan) -> tuple[str, ...]:
    """
    Return what would make a failing circuit fit, each change by itself; nothing for others.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits.
    """
    asked = _asked(planned, circuit)
    if asked is None or circuit.verdict != "fails":
        return ()
    found = mending_changes(
        asked, own=planned.run.interfaces, fibre_count=circuit.order.fibre_count
    )
    return (*(change.text for change in found), *_without_attenuator(asked, circuit))


def stretch_m(planned: Plan, circuit: CircuitPlan) -> float | None:
    """
    Return how many metres of glass a circuit could be longer with its joints held.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits.

    Returns
    -------
    stretch_m
        None for a circuit that does not fit. [m]
    """
    asked = _asked(planned, circuit)
    if asked is None or circuit.verdict != "fits":
        return None
    limit_m = stretch_limit_m(asked)
    return None if limit_m is None else float(limit_m)


def times(planned: Plan, circuit: CircuitPlan) -> tuple[Figure, ...]:
    """
    Return the delays of a circuit, and what they mean to clocks, packets and transmitters.

    The way back is at the wavelength of the way there, or at its own where one fibre works both
    ways. A circuit that stands by for another is set beside it.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits.
    """
    there, back = _there_and_back(circuit)
    names = {one.order.name: one for one in planned.circuits}
    main = names.get(circuit.order.standby_for or "")
    standby_ns = None if main is None else float(_there_and_back(main)[0].delay_ns)
    found = [
        _delay(f"delay {budget.direction} at {budget.wavelength_nm:g} nm", budget.delay_ns)
        for budget in circuit.budgets
    ]
    asymmetry_ns = pair_asymmetry_ns(there.delay_ns, back.delay_ns)
    found.append(_delay("asymmetry", asymmetry_ns))
    if main is not None and standby_ns is not None:
        found.append(_delay(f"difference to {main.order.name}", abs(there.delay_ns - standby_ns)))
    rows = timing_figures(float(there.delay_ns), float(back.delay_ns), standby_ns=standby_ns)
    found += [
        Figure(
            figure=f"{row.kind}: {row.name}",
            value=row.value_us,
            unit="us",
            limit=row.limit_us,
            source=f"table timing: {row.source}",
        )
        for row in rows
    ]
    return tuple(found)


def radio_figures(planned: Plan, circuit: CircuitPlan) -> tuple[RfFigure, ...]:
    """
    Return what a link of radio frequency does to its signal; nothing for other interfaces.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits.
    """
    own = planned.run.interfaces.get(circuit.pair.name if circuit.pair else "")
    if own is None or not own.rf or circuit.pair is None:
        return ()
    return tuple(
        RfFigure(
            wavelength_nm=budget.wavelength_nm,
            direction=budget.direction,
            figure=figure,
            value=value,
            unit=unit,
            source=f"run file, interface.{circuit.pair.name}; light.rf",
        )
        for budget in circuit.budgets
        for figure, value, unit in _radio(own, budget)
    )


def _asked(planned: Plan, circuit: CircuitPlan) -> Circuit | None:
    if circuit.pair is None:
        return None
    return Circuit(
        paths={path.direction: path for path in circuit.paths},
        pair=circuit.pair,
        wavelengths_nm=circuit.wavelengths_nm,
        practice=planned.run.practice.loss,
        measured=measured_glass(planned.run, planned.layout),
    )


def _without_attenuator(asked: Circuit, circuit: CircuitPlan) -> Iterator[str]:
    """Yield that the fitted attenuator is what fails the circuit, if it is."""
    fitted_db = circuit.order.attenuator_db
    if fitted_db and asked.fits(_bare):
        yield f"Without the attenuator of {fitted_db:g} dB at the receivers it would fit."


def _bare(path: Path) -> Path:
    steps = tuple(s for s in path.steps if not (isinstance(s, Part) and s.item == "attenuator"))
    return replace(path, steps=steps)


def _there_and_back(circuit: CircuitPlan) -> tuple[Budget, Budget]:
    """Return the first budget there, and one back at its wavelength if there is one."""
    there = _first(circuit.budgets, "from-to")
    same = [b for b in circuit.budgets if b.wavelength_nm == there.wavelength_nm]
    if any(budget.direction == "to-from" for budget in same):
        return there, _first(same, "to-from")
    return there, _first(circuit.budgets, "to-from")


def _first(budgets: Sequence[Budget], direction: Direction) -> Budget:
    return next(budget for budget in budgets if budget.direction == direction)


def _delay(figure: str, delay_ns: float) -> Figure:
    return Figure(
        figure=figure,
        value=delay_ns / _NS_PER_US,
        unit="us",
        limit=None,
        source="glass and group index: table fibres",
    )


def _radio(own: Interface, budget: Budget) -> Iterator[tuple[str, float, str]]:
    for name, optical_db in (("nominal", budget.nominal_db), ("worst", budget.worst_db)):
        yield f"{name} loss of signal", electrical_loss_db(optical_db), "dB"
        if own.slope_w_per_a is not None and own.responsivity_a_per_w is not None:
            gain_db = rf_gain_db(
                optical_db,
                slope_w_per_a=own.slope_w_per_a,
                responsivity_a_per_w=own.responsivity_a_per_w,
            )
            yield f"{name} gain", gain_db, "dB"
        if (noise_db := _carrier_to_noise_db(own, optical_db)) is not None:
            yield f"{name} carrier to noise", noise_db, "dB"


def _carrier_to_noise_db(own: Interface, optical_db: float) -> float | None:
    """Return carrier to noise at the least launch, None unless all that it takes is given."""
    if (
        own.tx_min_dbm is None
        or own.responsivity_a_per_w is None
        or own.modulation_ratio is None
        or own.bandwidth_hz is None
        or own.intensity_noise_db_per_hz is None
        or own.thermal_a_per_sqrt_hz is None
    ):
        return None
    return carrier_to_noise_db(
        own.tx_min_dbm - optical_db,
        responsivity_a_per_w=own.responsivity_a_per_w,
        modulation_ratio=own.modulation_ratio,
        bandwidth_hz=own.bandwidth_hz,
        intensity_noise_db_per_hz=own.intensity_noise_db_per_hz,
        thermal_a_per_sqrt_hz=own.thermal_a_per_sqrt_hz,
    )
