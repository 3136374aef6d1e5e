"""What to buy and what it costs."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator

from routeplan.planning import Plan
from routeplan.sheets.tables import Row
from routeplan.units import amount_from_cents, cents_from_amount, m_from_mm

__all__ = ["bill_rows", "pigtail_counts"]


def bill_rows(planned: Plan) -> Iterator[Row]:
    """
    Yield the lines of the bill: cable on reels, closures with their splices, what light needs.

    Prices are the run's own; parts without one have none. The priced lines add up to the cost of
    the layout.

    Parameters
    ----------
    planned
        The plan.
    """
    yield from _reel_lines(planned)
    yield from _joint_lines(planned)
    yield from _circuit_lines(planned)


def _reel_lines(planned: Plan) -> Iterator[Row]:
    makes = {cable.id: cable.make for cable in planned.layout.cables}
    cable_of = {section.id: section.cable for section in planned.layout.sections}
    reels = {reel.id: reel for reel in planned.layout.reels}
    groups: Counter[tuple[str, int, str, int]] = Counter()
    for cut in planned.layout.cuts:
        reel = reels[cut.reel]
        make = makes[cable_of[cut.section]]
        what = f"Cable, {make.fibre_count} fibres {make.fibre_type}"
        groups[what, reel.length_mm, reel.source, reel.cost_cents] += 1
    for (what, length_mm, source, cents), count in sorted(groups.items()):
        yield {
            "item": f"{what}, reel of {m_from_mm(length_mm):g} m",
            "quantity": count,
            "unit": "reel",
            "each": amount_from_cents(cents),
            "total": amount_from_cents(cents * count),
            "note": source,
        }


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
            "note": ", ".join(names),
        }
    pigtails = sum(pigtail_counts(planned))
    if pigtails:
        each = cents_from_amount(costs.splice_each)
        yield {
            "item": "Pigtail with splice behind a panel",
            "quantity": pigtails,
            "unit": "splice",
            "each": None,
            "total": None,
            "note": f"not in the layout's cost; a splice is {amount_from_cents(each):.2f}",
        }


def pigtail_counts(planned: Plan) -> Iterator[int]:
    """Yield for each circuit the pigtail splices on all its fibres."""
    for circuit in planned.circuits:
        on_path = sum(getattr(step, "is_pigtail", False) for step in circuit.paths[0].steps)
        yield on_path * len({use.strand for use in circuit.uses})


def _circuit_lines(planned: Plan) -> Iterator[Row]:
    for circuit in planned.circuits:
        if circuit.order.interface:
            yield _unpriced(
                f"Optical interface {circuit.order.interface}", 2, "end", circuit.order.name
            )
        needed = Counter(
            (budget.attenuator_db, budget.direction)
            for budget in circuit.budgets
            if budget.attenuator_db
        )
        for attenuator_db, direction in sorted(needed):
            yield _unpriced(
                f"Fixed attenuator {attenuator_db:g} dB",
                1,
                "piece",
                f"{circuit.order.name}, {direction}, at the receiver",
            )


def _unpriced(item: str, quantity: int, unit: str, note: str) -> Row:
    return {
        "item": item,
        "quantity": quantity,
        "unit": unit,
        "each": None,
        "total": None,
        "note": note,
    }
