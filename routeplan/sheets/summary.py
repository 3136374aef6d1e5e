"""The compact summary that a person reads off the terminal."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path

from routeplan.circuit_answers import changes
from routeplan.light.model import Budget
from routeplan.planning import Plan, assumptions
from routeplan.sheets.bill import has_invented_prices
from routeplan.terminal import visible
from routeplan.units import amount_from_cents, ft_from_m, m_from_mm

__all__ = ["summary_text"]

_COLOURS = {"fits": "\033[32m", "fails": "\033[31m", "unknown": "\033[33m"}
_REELS_SHOWN = 20
_BUDGETS_SHOWN = 20
_NAME_SHOWN = 40
_CLOSING_SHOWN = 6
_SAID_KINDS = ("polarity", "bend radius", "laser hazard", "attenuation")


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
        visible(planned.run.title),
        "",
        *_table(list(_figure_rows(planned))),
        "",
        *_table([["reel", "length", "for", "joint at its end"], *_reel_rows(planned)]),
        "",
        *_light_lines(planned),
        "",
        f"{visible(str(folder))}: {', '.join(names)}",
    ]
    return "\n".join(line.rstrip() for line in lines)


def _grouped(number: float, digits: int) -> str:
    return f"{number:,.{digits}f}".replace(",", " ")


def _length(planned: Plan, length_mm: int) -> str:
    metres = m_from_mm(length_mm)
    if planned.run.units == "us":
        return f"{_grouped(ft_from_m(metres), 0)} ft"
    return f"{_grouped(metres, 1)} m"


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}{'' if count == 1 else 's'}"


def _figure_rows(planned: Plan) -> Iterator[list[str]]:
    layout = planned.layout
    bought = [reel for reel in layout.reels if reel.source != "stock"]
    lengths_mm = {
        "ground": sum(leg.length_mm for leg in planned.ground.legs),
        "cable": sum(section.sheath_mm for section in layout.sections),
        "glass": sum(int(rulers.glass_mm[-1]) for rulers in layout.rulers),
    }
    for name, length_mm in lengths_mm.items():
        yield [name, _length(planned, length_mm)]
    ordered = _length(planned, sum(reel.length_mm for reel in bought))
    yield ["to order", f"{ordered} on {_counted(len(bought), 'reel')}"]
    splices = _counted(sum(planned.splice_counts.values()), "splice")
    yield ["joints", f"{len(layout.joints)}, {splices}"]
    yield ["cost", _cost_text(planned)]
    yield ["assumed", f"{_counted(len(assumptions(planned)), 'value')}, see assumptions.csv"]


def _cost_text(planned: Plan) -> str:
    proof = planned.layout.proof
    amount = _grouped(amount_from_cents(proof.cost_cents), 2)
    currency = visible(planned.run.practice.costs.currency)
    proven = "proven least" if proof.optimal else "not proven least"
    invented = ", some prices invented" if has_invented_prices(planned) else ""
    return f"{amount} {currency}, {proven}{invented}"


def _short(name: str) -> str:
    text = visible(name)
    return text if len(text) <= _NAME_SHOWN else f"{text[: _NAME_SHOWN - 3]}..."


def _reel_rows(planned: Plan) -> Iterator[list[str]]:
    layout = planned.layout
    sections = {section.id: section for section in layout.sections}
    reels = {reel.id: reel for reel in layout.reels}
    places = {joint.id: joint for joint in layout.joints}
    for cut in layout.cuts[:_REELS_SHOWN]:
        section, reel = sections[cut.section], reels[cut.reel]
        joint = places.get(section.end)
        at = f"{joint.id} {joint.reach_name}" if joint else section.end
        needed = _length(planned, section.needed_mm)
        yield [reel.id, _length(planned, reel.length_mm), needed, _short(at)]
    if len(layout.cuts) > _REELS_SHOWN:
        yield ["...", "", "", f"{len(layout.cuts) - _REELS_SHOWN} more in reels.csv"]


def _light_lines(planned: Plan) -> Iterator[str]:
    budgets = [budget for circuit in planned.circuits for budget in circuit.budgets]
    if not budgets:
        yield "no circuit"
        return
    # What fails comes first where there is too much to show.
    shown = sorted(budgets, key=_is_harmless) if len(budgets) > _BUDGETS_SHOWN else budgets
    head = ["circuit", "nm", "way", "nominal", "worst", "in hand", "attenuator", "verdict"]
    rows = [_budget_row(planned, budget) for budget in shown[:_BUDGETS_SHOWN]]
    table_head, *table_rows = _table([head, *rows])
    yield table_head
    yield from map(_coloured, table_rows)
    if len(budgets) > _BUDGETS_SHOWN:
        yield f"...  {len(budgets) - _BUDGETS_SHOWN} more in loss_budget.csv"
    yield from dict.fromkeys(
        visible(f"{_short(budget.circuit)}: {reason}")
        for budget in shown[:_BUDGETS_SHOWN]
        if budget.verdict != "fits"
        for reason in budget.reasons
    )
    yield from _answer_lines(planned)


def _answer_lines(planned: Plan) -> Iterator[str]:
    """Yield what would mend failing circuits, what closes one that takes any, and odd findings."""
    for circuit in planned.circuits:
        name = _short(circuit.order.name)
        for text in changes(planned, circuit):
            yield visible(f"{name}: {text}")
        if circuit.closing:
            found = ", ".join(closing.pair.name for closing in circuit.closing[:_CLOSING_SHOWN])
            more = len(circuit.closing) - _CLOSING_SHOWN
            yield visible(f"{name}: closed by {found}{f' and {more} more' if more > 0 else ''}")
    for check in planned.checks:
        if check.kind in _SAID_KINDS and check.verdict == "fails":
            yield visible(f"{_short(check.where)}: {check.kind}: {check.source}")


def _is_harmless(budget: Budget) -> bool:
    return budget.verdict != "fails"


def _budget_row(planned: Plan, budget: Budget) -> list[str]:
    on_worst = planned.run.practice.loss.verdict_on == "worst"
    margin = budget.margin_db if on_worst else budget.statistical_margin_db
    return [
        _short(budget.circuit),
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
    head, _, word = line.rstrip().rpartition(" ")
    return f"{head} {_COLOURS[word]}{word}\033[0m"


def _table(rows: Sequence[Sequence[str]]) -> list[str]:
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    return [
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True))
        for row in rows
    ]
