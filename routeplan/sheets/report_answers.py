"""What the report says of a circuit beside its budgets: what closes it, its reach, years, times."""

from __future__ import annotations

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.sheets.report_parts import Column, db, number, table, words
from routeplan.sheets.text import length_text, number_text, safe

__all__ = ["answers_html"]


def answers_html(circuit: Row, *, units: str) -> str:
    """
    Return what closes a circuit, what would mend it, how far it stretches, its years and times.

    Parameters
    ----------
    circuit
        Its row in `plan.json`.
    units
        What people are shown: metric or us.
    """
    return "".join(
        [
            _closing(circuit),
            _changes(circuit),
            _stretch(circuit, units),
            _years(circuit),
            _times(circuit),
            _radio(circuit),
        ]
    )


def _closing(circuit: Row) -> str:
    columns = [
        words("Interface", "interface"),
        Column(head="Wavelengths, nm", cell=_light),
        db("Margin", "margin_db"),
    ]
    return _block("Interfaces that close it, least capable first", columns, circuit, "closing")


def _light(row: Row) -> str:
    listed = row.get("wavelengths_nm")
    return safe(", ".join(f"{nm:g}" for nm in listed) if isinstance(listed, list) else "")


def _changes(circuit: Row) -> str:
    listed = circuit.get("changes")
    texts = listed if isinstance(listed, list) else []
    if not texts:
        return ""
    items = "".join(f"<li>{safe(str(text))}</li>" for text in texts)
    return f"<h4>Any one of these would mend it</h4>\n<ul>{items}</ul>\n"


def _stretch(circuit: Row, units: str) -> str:
    metres = value_at(circuit, "stretch_m")
    if metres is None:
        return ""
    text = f"It could be {length_text(metres, units=units)} of glass longer, its joints held."
    return f"<p>{safe(text)}</p>\n"


def _years(circuit: Row) -> str:
    """Return the lines of life of the budget with the least margin at its end."""
    budgets = [row for row in rows_at(circuit, "budgets") if rows_at(row, "life_lines")]
    if not budgets:
        return ""
    first = min(budgets, key=lambda row: value_at(row, "end_of_life_margin_db") or 0.0)
    columns = [
        words("Allowance", "item"),
        number("Count", "count"),
        db("Each", "each_db"),
        db("Limit", "limit_db"),
        words("Source", "source"),
        words("Why", "reason"),
    ]
    light = number_text(value_at(first, "wavelength_nm"), digits=0)
    heading = f"Over the years, at {light} nm, {text_at(first, 'direction')}"
    return _block(heading, columns, first, "life_lines")


def _times(circuit: Row) -> str:
    columns = [
        words("Figure", "figure"),
        number("Value", "value", digits=3),
        number("Beside", "limit", digits=3),
        words("Unit", "unit"),
        words("Source", "source"),
    ]
    return _block("Times", columns, circuit, "timing")


def _radio(circuit: Row) -> str:
    columns = [
        number("Wavelength, nm", "wavelength_nm"),
        words("Direction", "direction"),
        words("Figure", "figure"),
        number("Value", "value", digits=2),
        words("Unit", "unit"),
    ]
    return _block("Radio frequency", columns, circuit, "radio")


def _block(heading: str, columns: list[Column], row: Row, key: str) -> str:
    rows = rows_at(row, key)
    if not rows:
        return ""
    return f'<div class="keep"><h4>{safe(heading)}</h4>\n{table(columns, rows, name="lines")}</div>'
