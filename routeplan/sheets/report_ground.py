"""The report's parts on the ground: what is crossed, who has to be asked, where it is steep."""

from __future__ import annotations

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.sheets.report_parts import Column, length, number, table, words
from routeplan.sheets.text import number_text, safe

__all__ = ["crossings_html", "steep_html"]

_NOBODY = ("avoid", "boundary")  # what is met without anybody to be asked


def crossings_html(document: Row) -> str:
    """Return everything the way meets, and whom that makes it necessary to ask."""
    rows = rows_at(document, "crossings")
    if not rows:
        return ""
    units = text_at(document, "units")
    columns = [
        *([words("Leg", "leg")] if len(rows_at(document, "legs")) > 1 else []),
        length("Ground station", "ground_m", units=units, digits=0),
        Column(head="What", cell=_what),
        words("Name", "name"),
        words("How", "how", is_long=False),
        number("Angle, deg", "angle_deg"),
        length("Length", "length_m", units=units, digits=0),
        length("Kept for it", "width_m", units=units, digits=1),
        words("Ask", "ask"),
        words("From", "source", is_long=False),
    ]
    return _asked(rows) + "<h3>All that the way meets</h3>" + table(columns, rows)


def _what(row: Row) -> str:
    kind, own = text_at(row, "crosses"), text_at(row, "class")
    return safe(kind if own in ("", kind) else f"{kind}, {own}")


def _asked(rows: list[Row]) -> str:
    """Return who has to be asked, each once, with where and for what."""
    groups: dict[str, list[Row]] = {}
    for row in rows:
        if text_at(row, "crosses") not in _NOBODY and text_at(row, "how") != "touches":
            groups.setdefault(text_at(row, "ask") or text_at(row, "crosses"), []).append(row)
    if not groups:
        return ""
    listed = [
        {"ask": name, "what": _kinds(own), "where": _places(own)} for name, own in groups.items()
    ]
    columns = [words("Who", "ask"), words("For", "what"), words("At, m", "where")]
    return "<h3>Who has to be asked</h3>" + table(columns, listed)


def _kinds(rows: list[Row]) -> str:
    return ", ".join(dict.fromkeys(text_at(row, "crosses") for row in rows))


def _places(rows: list[Row]) -> str:
    shown = [number_text(value_at(row, "ground_m")) for row in rows[:8]]
    more = f" and {len(rows) - 8} more" if len(rows) > 8 else ""
    return ", ".join(shown) + more


def steep_html(document: Row) -> str:
    """Return the steep stretches of all legs."""
    legs = rows_at(document, "legs")
    rows = [{**row, "leg": text_at(leg, "name")} for leg in legs for row in rows_at(leg, "steep")]
    if not rows:
        return ""
    units = text_at(document, "units")
    columns = [
        *([words("Leg", "leg")] if len(legs) > 1 else []),
        length("From", "from_ground_m", units=units, digits=0),
        length("To", "to_ground_m", units=units, digits=0),
        length("Rise", "rise_m", units=units, digits=1),
        Column(head="Steepest, %", cell=_percent, is_number=True),
    ]
    return "<h3>Steep stretches</h3>" + table(columns, rows)


def _percent(row: Row) -> str:
    slope = value_at(row, "slope_max_ratio")
    return safe(number_text(None if slope is None else 100 * slope, digits=1))
