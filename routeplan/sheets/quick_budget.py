"""A budget with no map, for people to read aloud and for programs."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

from routeplan.light.changes import deciding_line
from routeplan.light.circuits import Closing
from routeplan.light.interfaces import Optic, channels, dispersion_limits_ps_per_nm
from routeplan.light.model import Budget
from routeplan.light.penalties import dgd_limit_ps
from routeplan.quick import QuickAnswer, QuickOrder
from routeplan.quick_options import ANY
from routeplan.sheets.budget_rows import budget_row
from routeplan.sheets.columns import Json
from routeplan.terminal import visible

__all__ = ["quick_json", "quick_text"]

_WIDTH = 100
_ITEM, _NUMBER = 20, 9
_COLUMNS = ("count", "each", "sigma", "limit", "nominal", "worst")
_M_PER_KM = 1000.0


def quick_json(answer: QuickAnswer) -> dict[str, Json]:
    """
    Return an answer as the mapping that `--json` prints; budgets are rows as in `plan.json`.

    Parameters
    ----------
    answer
        What was worked out.
    """
    order = answer.order
    return {
        "verdict": answer.verdict,
        "glass_m": order.glass_m,
        "sheath_m": order.sheath_m,
        "fibre_type": order.fibre_type,
        "fibre_count": order.fibre_count,
        "splice_count": order.splices,
        "splice_count_from": order.joints_from,
        "interface": order.interface,
        "budgets": [budget_row(budget) for budget in answer.budgets],
        "changes": [{"kind": change.kind, "text": change.text} for change in answer.changes],
        "stretch_m": answer.stretch_m,
        "stretch_ended_by": answer.stretch_ended_by,
        "closing": [_closing_row(closing) for closing in answer.closing],
        "assumptions": [
            {
                "name": entry.name,
                "value": entry.value,
                "unit": entry.unit,
                "source": entry.source,
                "reason": entry.reason,
            }
            for entry in order.assumed
        ],
    }


def quick_text(answer: QuickAnswer) -> str:
    """
    Return an answer as lines: every contribution, what is allowed and left, verdict and reasons.

    Parameters
    ----------
    answer
        What was worked out.
    """
    order = answer.order
    sources: dict[str, int] = {}
    blocks = [_head(answer)]
    blocks += [_budget_block(order, group, sources) for group in _alike(answer.budgets)]
    if order.interface == ANY:
        blocks.append(list(_closing_lines(answer)))
    blocks.append([line for mark in sources.items() for line in _source_lines(*mark)])
    blocks.append(list(_assumed_lines(order)))
    blocks.append(list(_outcome(answer)))
    lines = "\n\n".join("\n".join(block) for block in blocks if block).splitlines()
    return "\n".join(visible(line.rstrip()) for line in lines)


def _head(answer: QuickAnswer) -> list[str]:
    order = answer.order
    first = f"{order.glass_m / _M_PER_KM:.3f} km of {order.fibre_type} fibre"
    first += f" in {order.sheath_m / _M_PER_KM:.3f} km of cable"
    return [first, f"{_counted(order.splices, 'joint')}: {order.joints_from}"]


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}{'' if count == 1 else 's'}"


def _alike(budgets: Sequence[Budget]) -> list[list[Budget]]:
    """Return budgets of one wavelength together where both directions come to the same."""
    groups: list[list[Budget]] = []
    for budget in budgets:
        last = groups[-1][0] if groups else None
        if last and _figures(last) == _figures(budget):
            groups[-1].append(budget)
        else:
            groups.append([budget])
    return groups


def _figures(budget: Budget) -> tuple[object, ...]:
    return (
        budget.wavelength_nm,
        budget.lines,
        budget.available_db,
        budget.overload_db,
        budget.verdict,
        budget.reasons,
    )


def _budget_block(order: QuickOrder, group: Sequence[Budget], sources: dict[str, int]) -> list[str]:
    budget = group[0]
    optic = _optic(order, budget)
    way = "both ways" if len(group) > 1 else budget.direction
    title = ", ".join([f"{budget.wavelength_nm:g} nm", way, *([optic.name] if optic else [])])
    heads = "".join(f"{name:>{_NUMBER}}" for name in _COLUMNS)
    verdict = "" if order.interface == ANY else f": {budget.verdict}"
    lines = [f"{title}{verdict}", "", f"{'all in dB':{_ITEM}}{heads}"]
    for line in budget.lines:
        figures = [
            f"{line.count}",
            *_decibels(line.each_db, line.sigma_db, line.limit_db),
            *_decibels(line.count * line.each_db, line.count * line.limit_db),
        ]
        numbers = "".join(f"{figure:>{_NUMBER}}" for figure in figures)
        lines.append(f"{line.item:{_ITEM}}{numbers}  {_mark(line.source, sources)}")
    return [*lines, *_sum_lines(order, budget, optic, sources), "", *_facts(order, budget, optic)]


def _decibels(*values_db: float) -> list[str]:
    return [f"{value_db:.3f}" for value_db in values_db]


def _mark(source: str, sources: dict[str, int]) -> str:
    return f"[{sources.setdefault(source, len(sources) + 1)}]"


def _source_lines(text: str, number: int) -> list[str]:
    mark = f"[{number}] "
    return textwrap.wrap(
        text, _WIDTH, initial_indent=mark, subsequent_indent=" " * len(mark), break_on_hyphens=False
    )


def _optic(order: QuickOrder, budget: Budget) -> Optic | None:
    """Return the interface that sends what a budget is of."""
    return next(
        channel.optic
        for channel in channels(order.pair, [budget.wavelength_nm])
        if channel.direction == budget.direction
    )


def _sum_lines(
    order: QuickOrder, budget: Budget, optic: Optic | None, sources: dict[str, int]
) -> Iterator[str]:
    """Yield loss, what is allowed, what is kept in hand and what is left, below their columns."""
    loss = order.practice
    statistical = f"{budget.statistical_db:.3f} with {loss.sigma_count:g} sigma"
    yield _summed("loss", budget.worst_db, statistical, nominal_db=budget.nominal_db)
    if optic is None or budget.available_db is None:
        return
    yield _summed("allowed", budget.available_db, _mark(_optic_source(optic), sources))
    kept = "practice loss.margin_db"
    yield _summed("kept in hand", loss.margin_db, _mark(kept, sources))
    if budget.margin_db is not None and budget.statistical_margin_db is not None:
        statistical = f"{budget.statistical_margin_db:.3f} with {loss.sigma_count:g} sigma"
        yield _summed("margin", budget.margin_db, statistical)
    if budget.first_day_margin_db is not None and budget.end_of_life_margin_db is not None:
        yield _summed("on the first day", budget.first_day_margin_db, "nothing kept in hand")
        years = _mark(_years_text(budget), sources)
        yield _summed("at the end of life", budget.end_of_life_margin_db, years)


def _years_text(budget: Budget) -> str:
    """Return what the years take, each at its limit."""
    taken = (f"{line.item} {line.count * line.limit_db:g} dB" for line in budget.life_lines)
    return f"less {', '.join(taken)}; table ageing, practice loss.repairs_count"


def _summed(name: str, worst_db: float, note: str, *, nominal_db: float | None = None) -> str:
    empty = " " * (4 * _NUMBER)
    nominal = "" if nominal_db is None else f"{nominal_db:.3f}"
    return f"{name:{_ITEM}}{empty}{nominal:>{_NUMBER}}{worst_db:>{_NUMBER}.3f}  {note}"


def _optic_source(optic: Optic) -> str:
    how = "channel insertion loss"
    if optic.basis == "sensitivity":
        how = (
            f"{optic.tx_min_dbm:g} dBm launched, {optic.penalty_db:g} dB penalty, "
            f"{optic.rx_sensitivity_dbm:g} dBm needed"
        )
    if optic.family == "own":
        return f"{how}, as given"
    return f"table interfaces, {optic.name}: {how}; {optic.source}, {optic.confidence}"


def _facts(order: QuickOrder, budget: Budget, optic: Optic | None) -> Iterator[str]:
    """Yield what is not a loss: overload, dispersion, PMD, return loss, delay."""
    if optic is not None:
        yield _fact("overload", _overload_text(budget))
    least, most = budget.dispersion_min_ps_per_nm, budget.dispersion_max_ps_per_nm
    limits = dispersion_limits_ps_per_nm(optic, budget.wavelength_nm) if optic else None
    allowed = f", {limits[0]:.1f} to {limits[1]:.1f} allowed" if limits else ""
    yield _fact("dispersion", f"{least:.1f} to {most:.1f} ps/nm{allowed}")
    if budget.pmd_ps is not None:
        rate_gbd = (optic.lane_gbd or optic.bit_rate_gbps) if optic else None
        bound = f", {dgd_limit_ps(rate_gbd):.3f} allowed" if rate_gbd else ""
        yield _fact("PMD", f"{budget.pmd_ps:.3f} ps{bound}")
    if budget.return_loss_db is not None:
        yield _fact("return loss", f"{budget.return_loss_db:.1f} dB")
    yield _fact("delay", f"{budget.delay_ns / 1000:.3f} us one way")
    if line := deciding_line(budget):
        yield _fact("most of it", f"{line.item}, {line.count * line.limit_db:.3f} dB at worst")
    for reason in budget.reasons if order.interface != ANY else ():
        yield from _bullet(reason)


def _fact(name: str, text: str) -> str:
    return f"{name:14}{text}"


def _overload_text(budget: Budget) -> str:
    if budget.overload_db is None:
        return "not known"
    if budget.overload_db <= 0.0:
        return f"none, {-budget.overload_db:.3f} dB below what the receiver stands"
    mend = budget.attenuator_db
    attenuator = f"{mend:g} dB attenuator at the receiver" if mend else "no attenuator is so large"
    return f"{budget.overload_db:.3f} dB too much: {attenuator}"


def _closing_row(closing: Closing) -> dict[str, Json]:
    optic = closing.pair.at_from
    return {
        "interface": closing.pair.name,
        "bit_rate_gbps": optic.bit_rate_gbps,
        "wavelengths_nm": list(closing.wavelengths_nm),
        "available_db": optic.available_db,
        "margin_db": closing.margin_db,
        "attenuator_db": max(budget.attenuator_db or 0.0 for budget in closing.budgets),
        "budgets": [budget_row(budget) for budget in closing.budgets],
    }


def _closing_lines(answer: QuickAnswer) -> Iterator[str]:
    if not answer.closing:
        yield "No interface of the table closes this."
        return
    yield "What closes it, least capable first:"
    yield ""
    heads = f"{'Gbit/s':>9}{'allowed':>10}{'worst':>9}{'margin':>9}{'attenuator':>11}"
    yield f"{'interface':16}{heads}  wavelengths, nm"
    for closing in answer.closing:
        optic = closing.pair.at_from
        rate = "-" if optic.bit_rate_gbps is None else f"{optic.bit_rate_gbps:g}"
        allowed = "-" if optic.available_db is None else f"{optic.available_db:.1f}"
        worst = f"{max(budget.worst_db for budget in closing.budgets):.3f}"
        mend_db = max(budget.attenuator_db or 0.0 for budget in closing.budgets)
        mend = f"{mend_db:g} dB" if mend_db else "-"
        light = ", ".join(f"{nm:g}" for nm in closing.wavelengths_nm)
        figures = f"{rate:>9}{allowed:>10}{worst:>9}{closing.margin_db:>9.3f}{mend:>11}"
        yield f"{closing.pair.name:16}{figures}  {light}"
    yield ""
    yield "Decibels; the margin is the least of all wavelengths, the attenuator taken off."


def _outcome(answer: QuickAnswer) -> Iterator[str]:
    yield f"verdict: {answer.verdict}"
    if answer.verdict == "fails" and answer.order.interface != ANY:
        yield (
            "what would change it, each by itself:"
            if answer.changes
            else ("no single change of interface, connectors, joints or length would change it")
        )
        for change in answer.changes:
            yield from _bullet(change.text)
    if answer.stretch_m is not None:
        yield f"could be {answer.stretch_m / _M_PER_KM:.3f} km longer, joints as they are"
        if answer.stretch_ended_by:
            yield from _bullet(f"a metre more: {answer.stretch_ended_by}")


def _bullet(text: str) -> list[str]:
    return textwrap.wrap(text, _WIDTH, initial_indent="- ", subsequent_indent="  ")


def _assumed_lines(order: QuickOrder) -> Iterator[str]:
    if not order.assumed:
        return
    yield "assumed:"
    names = max(len(entry.name) for entry in order.assumed)
    values = [_value_text(entry.value, entry.unit) for entry in order.assumed]
    width = max(map(len, values))
    for entry, value in zip(order.assumed, values, strict=True):
        yield f"{entry.name:{names}}  {value:{width}}  {entry.source}"


def _value_text(value: float | str, unit: str) -> str:
    number = f"{value:g}" if isinstance(value, float) else str(value)
    return f"{number} {unit}".strip()
