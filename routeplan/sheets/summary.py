"""The compact summary that a person reads off the terminal."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path

from routeplan.light.model import Budget
from routeplan.planning import Plan
from routeplan.units import amount_from_cents, ft_from_m, m_from_mm

__all__ = ["summary_text"]

_COLOURS = {"fits": "\033[32m", "fails": "\033[31m", "unknown": "\033[33m"}


def summary_text(planned: Plan, *, folder: Path, names: Sequence[str]) -> str:
    """
    Return the summary: lengths, reels and joints, light, and what was written where.

    Parameters
    ----------
    planned
        The plan.
    folder
        Where the sheets are.
    names
        Their file names.
    """
    lines = [
        _printable(planned.run.title),
        "",
        *_table(list(_length_rows(planned))),
        "",
        *_table([["reel", "length", "for", "joint at its end"], *_reel_rows(planned)]),
        "",
        *_light_lines(planned),
        "",
        f"{folder}: {', '.join(names)}",
    ]
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _printable(text: str) -> str:
    return "".join(c if c.isprintable() else " " for c in text)


def _length(planned: Plan, length_mm: int) -> str:
    metres = m_from_mm(length_mm)
    if planned.run.units == "us":
        return f"{ft_from_m(metres):,.0f} ft"
    return f"{metres:,.1f} m".replace(",", " ")


def _length_rows(planned: Plan) -> Iterator[list[str]]:
    layout = planned.layout
    ground_mm = sum(leg.length_mm for leg in planned.ground.legs)
    sheath_mm = sum(section.sheath_mm for section in layout.sections)
    glass_mm = sum(int(rulers.glass_mm[-1]) for rulers in layout.rulers)
    ordered_mm = sum(reel.length_mm for reel in layout.reels)
    currency = planned.run.practice.costs.currency
    proven = "proven least" if layout.proof.optimal else "not proven least"
    yield ["ground", _length(planned, ground_mm)]
    yield ["cable", _length(planned, sheath_mm)]
    yield ["glass", _length(planned, glass_mm)]
    yield ["to order", f"{_length(planned, ordered_mm)} on {_counted(len(layout.reels), 'reel')}"]
    yield [
        "joints",
        f"{len(layout.joints)}, {_counted(sum(planned.splice_counts.values()), 'splice')}",
    ]
    cost = amount_from_cents(layout.proof.cost_cents)
    yield ["cost", f"{cost:,.2f} {currency}, {proven}".replace(",", " ", cost >= 1000)]


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}{'' if count == 1 else 's'}"


def _reel_rows(planned: Plan, most: int = 20) -> list[list[str]]:
    layout = planned.layout
    sections = {section.id: section for section in layout.sections}
    reels = {reel.id: reel for reel in layout.reels}
    places = {joint.id: joint for joint in layout.joints}
    rows = []
    for cut in layout.cuts[:most]:
        section, reel = sections[cut.section], reels[cut.reel]
        joint = places.get(section.end)
        at = f"{joint.id} {joint.reach_name}" if joint else section.end
        needed = _length(planned, section.needed_mm)
        rows.append([reel.id, _length(planned, reel.length_mm), needed, _printable(at)])
    if len(layout.cuts) > most:
        rows.append(["...", "", "", f"{len(layout.cuts) - most} more in reels.csv"])
    return rows


def _light_lines(planned: Plan) -> list[str]:
    if not planned.circuits:
        return ["no circuit"]
    head = ["circuit", "nm", "way", "nominal", "worst", "in hand", "attenuator", "verdict"]
    budgets = [budget for circuit in planned.circuits for budget in circuit.budgets]
    lines = _table([head, *(_budget_row(planned, budget) for budget in budgets)])
    reasons = dict.fromkeys(
        f"{budget.circuit}: {reason}"
        for budget in budgets
        if budget.verdict != "fits"
        for reason in budget.reasons
    )
    return [*(_coloured(line) for line in lines), *(_printable(reason) for reason in reasons)]


def _budget_row(planned: Plan, budget: Budget) -> list[str]:
    on_worst = planned.run.practice.loss.verdict_on == "worst"
    margin = budget.margin_db if on_worst else budget.statistical_margin_db
    return [
        _printable(budget.circuit),
        f"{budget.wavelength_nm:g}",
        budget.direction,
        f"{budget.nominal_db:.2f} dB",
        f"{budget.worst_db:.2f} dB",
        "-" if margin is None else f"{margin:.2f} dB",
        f"{budget.attenuator_db:g} dB" if budget.attenuator_db else "-",
        budget.verdict,
    ]


def _coloured(line: str) -> str:
    """Colour the verdict at a line's end, on a terminal only."""
    if not sys.stdout.isatty() or os.environ.get("NO_COLOR"):
        return line
    for word, colour in _COLOURS.items():
        if line.rstrip().endswith(word):
            head = line.rstrip().removesuffix(word)
            return f"{head}{colour}{word}\033[0m"
    return line


def _table(rows: Sequence[Sequence[str]]) -> list[str]:
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    return [
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True))
        for row in rows
    ]
