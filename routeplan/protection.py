"""Circuits that stand by for another: over which cables, and what both ways still share."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import islice

from routeplan.cable.layout import LaidCable
from routeplan.cable.model import Cable
from routeplan.circuits import CircuitPlan
from routeplan.routed import RoutedPair
from routeplan.run.optics import CircuitOrder

__all__ = ["Standby", "guarded_orders", "standbys"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Standby:
    """A circuit and the one that stands by for it, side by side; delays from `from` to `to`."""

    main: CircuitPlan
    standby: CircuitPlan
    main_delay_ns: int
    standby_delay_ns: int
    shared_cables: tuple[str, ...]

    @property
    def difference_ns(self) -> int:
        """How much later light arrives by the slower of the two. [ns]"""
        return abs(self.main_delay_ns - self.standby_delay_ns)


def guarded_orders(
    orders: Sequence[CircuitOrder], laid: Sequence[LaidCable], pairs: Sequence[RoutedPair]
) -> tuple[CircuitOrder, ...]:
    """
    Return circuits, each that stands by for another over the standby leg of a separate pair.

    Main and standby circuit have to run between the two sites that the pair of legs joins. The
    main circuit takes the main leg, unless its own `via` takes the standby leg; a circuit with a
    `via` of its own keeps it.

    Parameters
    ----------
    orders
        The circuits, both ends of each named.
    laid
        The cables.
    pairs
        Pairs of legs that were found together.
    """
    named = {order.name: order for order in orders}
    via: dict[str, tuple[str, ...]] = {}
    for order in orders:
        main = named.get(order.standby_for or "")
        pair = next((each for each in pairs if main and _joins(each, main, order)), None)
        if main is None or pair is None:
            continue
        first, second = _cable_of(pair.main, laid), _cable_of(pair.standby, laid)
        if set(main.via) & set(second) and not set(main.via) & set(first):
            first, second = second, first
        via.setdefault(main.name, first)
        via.setdefault(order.name, second)
    return tuple(
        order.model_copy(update={"via": via[order.name]})
        if order.name in via and not order.via
        else order
        for order in orders
    )


def _joins(pair: RoutedPair, *orders: CircuitOrder) -> bool:
    return all({order.from_, order.to} == {pair.start, pair.end} for order in orders)


def _cable_of(leg: str, laid: Sequence[LaidCable]) -> tuple[str, ...]:
    """Return the name of the first cable that takes a leg, by itself."""
    taking = (
        cable.way.cable.name
        for cable in laid
        if any(each.name == leg for each, _, _ in cable.way.legs)
    )
    return tuple(islice(taking, 1))


def standbys(circuits: Sequence[CircuitPlan], cables: Sequence[Cable]) -> tuple[Standby, ...]:
    """
    Return every circuit that stands by for another beside that other one.

    Parameters
    ----------
    circuits
        The circuits of a plan.
    cables
        Its cables.
    """
    cable_names = {cable.id: cable.name for cable in cables}
    named = {circuit.order.name: circuit for circuit in circuits}
    return tuple(
        Standby(
            main=main,
            standby=circuit,
            main_delay_ns=_delay_ns(main),
            standby_delay_ns=_delay_ns(circuit),
            shared_cables=_shared(main, circuit, cable_names),
        )
        for circuit in circuits
        if (main := named.get(circuit.order.standby_for or "")) is not None
    )


def _shared(
    main: CircuitPlan, standby: CircuitPlan, cable_names: Mapping[str, str]
) -> tuple[str, ...]:
    other = {use.cable for use in standby.uses}
    both = dict.fromkeys(use.cable for use in main.uses if use.cable in other)
    return tuple(cable_names[cable] for cable in both)


def _delay_ns(circuit: CircuitPlan) -> int:
    """Return the delay of the first wavelength from `from` to `to`. [ns]"""
    return int(next(each.delay_ns for each in circuit.budgets if each.direction == "from-to"))
