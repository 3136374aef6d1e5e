"""What to buy and what it costs."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

from routeplan.circuits import CircuitPlan
from routeplan.planning import Plan, ports
from routeplan.run.defaults import practice_rows
from routeplan.sheets.columns import Row
from routeplan.units import amount_from_cents, cents_from_amount, m_from_mm

__all__ = ["bill_rows", "has_invented_prices", "pigtail_counts", "pigtail_splice_count"]

_REEL_PRICES = ("costs.cable_per_m", "costs.reel_each")
_STOCK_PRICES = ("costs.stock_per_m",)
_JOINT_PRICES = ("costs.joint_each", "costs.splice_each")


def bill_rows(planned: Plan) -> Iterator[Row]:
    """
    Yield the lines of the bill: cable on reels, closures with their splices, what light needs.

    Prices are the run's own, marked where they are invented defaults; parts without one have
    none. The priced lines add up to the cost of the layout.

    Parameters
    ----------
    planned
        The plan.
    """
    yield from _reel_lines(planned)
    yield from _joint_lines(planned)
    yield from _circuit_lines(planned)


def has_invented_prices(
    planned: Plan, keys: tuple[str, ...] = _REEL_PRICES + _JOINT_PRICES
) -> bool:
    """Return whether any of these prices is a default that the table calls invented."""
    invented = {row.name for row in practice_rows() if row.confidence == "invented"}
    return any(key in invented and key not in planned.run.given for key in keys)


def _noted(planned: Plan, note: str, keys: tuple[str, ...]) -> str:
    return f"{note}; invented default price" if has_invented_prices(planned, keys) else note


def _reel_lines(planned: Plan) -> Iterator[Row]:
    makes = {cable.id: cable.make for cable in planned.layout.cables}
    cable_of = {section.id: section.cable for section in planned.layout.sections}
    # A reel holds one make of cable, however many sections are cut from it.
    first_section = {cut.reel: cut.section for cut in reversed(planned.layout.cuts)}
    groups: Counter[tuple[str, int, str, int]] = Counter()
    for reel in planned.layout.reels:
        make = makes[cable_of[first_section[reel.id]]]
        what = f"Cable, {make.fibre_count} fibres {make.fibre_type}"
        groups[what, reel.length_mm, reel.source, reel.cost_cents] += 1
    for (what, length_mm, source, cents), count in sorted(groups.items()):
        keys = _STOCK_PRICES if source == "stock" else _REEL_PRICES
        yield {
            "item": f"{what}, reel of {_metres_text(length_mm)} m",
            "quantity": count,
            "unit": "reel",
            "each": amount_from_cents(cents),
            "total": amount_from_cents(cents * count),
            "note": _noted(planned, source, keys),
        }


def _metres_text(length_mm: int) -> str:
    """Return whole millimetres as metres with no more decimals than they need."""
    return f"{m_from_mm(length_mm):.3f}".rstrip("0").rstrip(".")


def _joint_lines(planned: Plan) -> Iterator[Row]:
    costs = planned.run.practice.costs
    groups: Counter[int] = Counter(joint.cost_cents for joint in planned.layout.joints)
    for cents, count in sorted(groups.items()):
        names = [j.id for j in planned.layout.joints if j.cost_cents == cents]
        yield {
            "item": "Joint: closure, visit and splices",
            "quantity": count,
            "unit": "joint",
            "each": amount_from_cents(cents),
            "total": amount_from_cents(cents * count),
            "note": _noted(planned, ", ".join(names), _JOINT_PRICES),
        }
    pigtails = pigtail_splice_count(planned)
    if pigtails:
        each = amount_from_cents(cents_from_amount(costs.splice_each))
        note = f"not in the layout's cost; a splice is {each:.2f}"
        yield _unpriced(
            "Pigtail with splice behind a panel",
            pigtails,
            "splice",
            _noted(planned, note, ("costs.splice_each",)),
        )
    dropped = sum(port.is_entered for port in ports(planned))
    if dropped:
        yield _unpriced("Pigtail spliced in a closure", dropped, "piece", "cables that pass a site")


def pigtail_splice_count(planned: Plan) -> int:
    """
    Return the pigtail splices behind all panels.

    Those of circuits, less those in a closure where a fibre is cut out of a cable that passes,
    and the spares of cables of which all is terminated; none where pigtails are not spliced.
    """
    dropped = Counter(port.circuit for port in ports(planned) if port.is_entered)
    spares = sum(not port.circuit for port in ports(planned))
    counts = zip(planned.circuits, pigtail_counts(planned), strict=True)
    behind = sum(max(0, count - dropped[one.order.name]) for one, count in counts)
    return behind + (spares if planned.run.practice.loss.pigtail_splices else 0)


def pigtail_counts(planned: Plan) -> Iterator[int]:
    """Yield for each circuit the pigtail splices on all its fibres."""
    for circuit in planned.circuits:
        on_path = sum(getattr(step, "is_pigtail", False) for step in circuit.paths[0].steps)
        yield on_path * len({use.strand for use in circuit.uses})


def _circuit_lines(planned: Plan) -> Iterator[Row]:
    for circuit in planned.circuits:
        name = circuit.order.name
        if circuit.pair:
            yield _unpriced(f"Optical interface {circuit.pair.name}", 2, "end", name)
        yield from _fitted_lines(circuit)
        needed = {
            (budget.attenuator_db, budget.direction)
            for budget in circuit.budgets
            if budget.attenuator_db
        }
        for attenuator_db, direction in sorted(needed):
            yield _unpriced(
                f"Fixed attenuator {attenuator_db:g} dB",
                1,
                "piece",
                f"{name}, {direction}, at the receiver",
            )


def _fitted_lines(circuit: CircuitPlan) -> Iterator[Row]:
    """Yield what the run file puts into a circuit: attenuators and passive parts."""
    order = circuit.order
    if order.attenuator_db:
        item = f"Fixed attenuator {order.attenuator_db:g} dB"
        yield _unpriced(item, 2, "piece", f"{order.name}, as fitted, one at each receiver")
    strands = len({use.strand for use in circuit.uses})
    for part in order.part:
        where = part.at or order.from_
        note = f"{order.name}, at {where}, on each fibre"
        yield _unpriced(f"Passive part {part.name or 'own'}", part.count * strands, "piece", note)


def _unpriced(item: str, quantity: int, unit: str, note: str) -> Row:
    return {
        "item": item,
        "quantity": quantity,
        "unit": unit,
        "each": None,
        "total": None,
        "note": note,
    }
