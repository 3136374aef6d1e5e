"""The budgets of the report: each circuit, wavelength and direction, every line with its source."""

from __future__ import annotations

from collections.abc import Sequence

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.sheets.optics_pictures import PICTURES_MOST, circuit_pictures
from routeplan.sheets.report_answers import answers_html
from routeplan.sheets.report_parts import Column, db, number, table, verdict_mark, words
from routeplan.sheets.text import count_text, length_text, number_text, safe

__all__ = ["circuits_html", "direction_text", "reasons_of", "wavelength_text"]

_BUDGETS_ACROSS = 6
_QUANTITIES = (
    ("Nominal loss", "dB", 3, "nominal_db"),
    ("Statistical loss", "dB", 3, "statistical_db"),
    ("Worst loss", "dB", 3, "worst_db"),
    ("Available", "dB", 3, "available_db"),
    ("Margin on the worst loss", "dB", 3, "margin_db"),
    ("Margin on the statistical loss", "dB", 3, "statistical_margin_db"),
    ("Left on the first day, nothing kept", "dB", 3, "first_day_margin_db"),
    ("Left at the end of life", "dB", 3, "end_of_life_margin_db"),
    ("Overload, positive is too much light", "dB", 3, "overload_db"),
    ("Attenuator that mends it", "dB", 1, "attenuator_db"),
    ("Dispersion, least", "ps/nm", 1, "dispersion_min_ps_per_nm"),
    ("Dispersion, most", "ps/nm", 1, "dispersion_max_ps_per_nm"),
    ("Polarisation mode dispersion", "ps", 3, "pmd_ps"),
    ("Return loss", "dB", 1, "return_loss_db"),
)


def circuits_html(document: Row) -> str:
    """Return the budgets of all circuits."""
    return "".join(_circuit(document, row) for row in rows_at(document, "circuits"))


def reasons_of(circuit: Row) -> list[str]:
    """Return the reasons for a circuit's verdicts, each once, in the order they appear."""
    reasons: dict[str, None] = {}
    for budget in rows_at(circuit, "budgets"):
        listed = budget.get("reasons")
        for reason in listed if isinstance(listed, list) else []:
            reasons.setdefault(str(reason))
    return list(reasons)


def direction_text(circuit: Row, direction: str) -> str:
    """Return a direction with the names of the sites it leads between."""
    ends = (text_at(circuit, "from"), text_at(circuit, "to"))
    start, end = ends if direction == "from-to" else reversed(ends)
    return f"{start} \N{RIGHTWARDS ARROW} {end}"


def _circuit(document: Row, circuit: Row) -> str:
    units = text_at(document, "units")
    facts = (
        f"{text_at(circuit, 'from')} to {text_at(circuit, 'to')}; {_fibres_text(circuit)}; "
        f"{length_text(value_at(circuit, 'glass_m'), units=units, digits=3)} of glass; "
        f"delay {number_text(value_at(circuit, 'delay_us'), digits=3)} \N{MICRO SIGN}s one way"
    )
    budgets = rows_at(circuit, "budgets")
    reasons = "".join(f"<li>{safe(reason)}</li>" for reason in reasons_of(circuit))
    return (
        f"<article><h3>{safe(text_at(circuit, 'name'))} "
        f"{verdict_mark(text_at(circuit, 'verdict'))}</h3>\n<p>{safe(facts)}</p>\n"
        f"{_overview(circuit, budgets)}"
        f"{f'<ul>{reasons}</ul>' if reasons else ''}\n{_all_lines(circuit, budgets)}"
        f"{answers_html(circuit, units=units)}"
        f"{_pictures(circuit)}</article>\n"
    )


def _pictures(circuit: Row) -> str:
    """Return attenuation against wavelength and power along the glass, where the data is there."""
    levels = rows_at(circuit, "levels")
    figures = "".join(
        f'<figure class="keep">{picture}</figure>' for picture in circuit_pictures(circuit)
    )
    more = len(levels) - PICTURES_MOST
    note = (
        f'<p class="note">Power at {count_text(more, "more wavelength")} is in plan.json.</p>\n'
        if figures and more > 0
        else ""
    )
    return f"<h4>Pictures</h4>\n{figures}{note}" if figures else ""


def _fibres_text(circuit: Row) -> str:
    """Return the fibres a circuit runs on, cable by cable."""
    by_cable: dict[str, list[str]] = {}
    for row in rows_at(circuit, "fibres"):
        by_cable.setdefault(text_at(row, "cable"), []).append(text_at(row, "fibre"))
    return ", ".join(
        f"{cable} {'fibre' if len(fibres) == 1 else 'fibres'} {' and '.join(fibres)}"
        for cable, fibres in by_cable.items()
    )


def _overview(circuit: Row, budgets: Sequence[Row]) -> str:
    """Return the budgets side by side, a row for each quantity, a few budgets to a table."""
    parts = [
        _side_by_side(circuit, budgets[start : start + _BUDGETS_ACROSS])
        for start in range(0, len(budgets), _BUDGETS_ACROSS)
    ]
    return "".join(parts)


def _side_by_side(circuit: Row, budgets: Sequence[Row]) -> str:
    heads = "".join(
        f'<th scope="col" class="n">{wavelength_text(row)}<br><small>to '
        f"{safe(_far_end(circuit, row))}</small></th>"
        for row in budgets
    )
    lines = []
    for name, unit, digits, key in _QUANTITIES:
        cells = "".join(
            f'<td class="n">{safe(number_text(value_at(row, key), digits=digits))}</td>'
            for row in budgets
        )
        lines.append(f'<tr><th scope="row">{name}, {unit}</th>{cells}</tr>')
    marks = "".join(
        f'<td class="n">{verdict_mark(text_at(row, "verdict"))}</td>' for row in budgets
    )
    return (
        f'<table class="budgets keep"><thead><tr><th></th>{heads}</tr></thead><tbody>'
        f'{"".join(lines)}</tbody><tfoot><tr><th scope="row">Verdict</th>{marks}</tr></tfoot>'
        "</table>\n"
    )


def wavelength_text(budget: Row) -> str:
    """Return a wavelength without grouping, as people say it."""
    return safe(f"{value_at(budget, 'wavelength_nm') or 0:g} nm")


def _far_end(circuit: Row, budget: Row) -> str:
    return text_at(circuit, "to" if text_at(budget, "direction") == "from-to" else "from")


def _all_lines(circuit: Row, budgets: Sequence[Row]) -> str:
    """Return the lines of every budget; directions that share all lines share one table."""
    groups: dict[tuple[str, str], list[Row]] = {}
    for budget in budgets:
        key = (text_at(budget, "wavelength_nm"), repr(budget.get("lines")))
        groups.setdefault(key, []).append(budget)
    return "".join(_lines(circuit, group) for group in groups.values())


def _lines(circuit: Row, budgets: Sequence[Row]) -> str:
    first = budgets[0]
    ways = [direction_text(circuit, text_at(row, "direction")) for row in budgets]
    way = ways[0] if len(ways) == 1 else "both directions"
    columns = [
        words("Contribution", "item"),
        number("Count", "count"),
        db("Each", "each_db"),
        db("Sigma", "sigma_db"),
        db("Limit", "limit_db"),
        Column(head="Nominal", cell=lambda row: _times(row, "each_db"), is_number=True),
        Column(head="Worst", cell=lambda row: _times(row, "limit_db"), is_number=True),
        words("Source", "source"),
    ]
    sums = "".join(
        f'<td class="n">{safe(number_text(value_at(first, key), digits=3))}</td>'
        for key in ("nominal_db", "worst_db")
    )
    foot = f'<tr><th scope="row" colspan="5">Sum, dB</th>{sums}<td></td></tr>'
    lines = table(columns, rows_at(first, "lines"), name="lines", foot=foot)
    return f'<div class="keep"><h4>{wavelength_text(first)}, {safe(way)}</h4>\n{lines}</div>'


def _times(row: Row, key: str) -> str:
    count, each_db = value_at(row, "count"), value_at(row, key)
    known = count is not None and each_db is not None
    return safe(number_text(count * each_db if known else None, digits=3))  # type: ignore[operator]
