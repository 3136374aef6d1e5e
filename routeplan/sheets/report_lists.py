"""The report's lists: legs, reels, joints, checks, bill, assumptions, warnings, cautions."""

from __future__ import annotations

from collections.abc import Sequence

from routeplan.sheets.joint_words import joint_leg_place, position_text
from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, value_at
from routeplan.sheets.map_style import line_style
from routeplan.sheets.profile import line_svg
from routeplan.sheets.report_parts import (
    Column,
    amount,
    length,
    number,
    table,
    verdict_mark,
    words,
)
from routeplan.sheets.text import number_text, safe

__all__ = [
    "assumptions_html",
    "bill_html",
    "cautions_html",
    "checks_html",
    "has_invented_prices",
    "joints_html",
    "legs_html",
    "reels_html",
    "warnings_html",
]

INVENTED = (
    "Some prices here are invented defaults that only let layouts be compared. "
    "Put your own into the run file before you quote a cost."
)


def has_invented_prices(document: Row) -> bool:
    """Return whether any price is a default: those are invented, and every sheet says so."""
    names = (text_at(row, "name") for row in rows_at(document, "assumptions"))
    return any(name.startswith("costs.") for name in names)


def legs_html(document: Row) -> str:
    """Return the legs with all their lengths, and their stretches."""
    units = text_at(document, "units")
    legs = rows_at(document, "legs")
    columns = [
        words("Leg", "name"),
        words("From", "from"),
        words("To", "to"),
        length("Ground", "ground_m", units=units),
        length("Ellipsoid", "ellipsoid_m", units=units),
        length("Grid", "grid_m", units=units),
        words("Grid of", "grid_crs", is_long=False),
        number("Grid scale", "grid_scale_factor", digits=6),
    ]
    stretches = [
        {**stretch, "leg": text_at(leg, "name"), "length_m": _stretch_m(stretch)}
        for leg in legs
        for stretch in rows_at(leg, "stretches")
    ]
    stretch_columns = [
        *([words("Leg", "leg")] if len(legs) > 1 else []),
        Column(head="Placement", cell=lambda row: _placement_cell(text_at(row, "placement"))),
        length("From", "from_ground_m", units=units),
        length("To", "to_ground_m", units=units),
        length("Length", "length_m", units=units),
    ]
    return table(columns, legs) + "<h3>Stretches</h3>" + table(stretch_columns, stretches)


def _stretch_m(stretch: Row) -> float:
    to_m, from_m = value_at(stretch, "to_ground_m"), value_at(stretch, "from_ground_m")
    return round((to_m or 0.0) - (from_m or 0.0), 3)


def _placement_cell(placement: str) -> str:
    line = line_svg(line_style(placement), 1, 45, 6)
    picture = f'<svg class="line" viewBox="0 0 46 12" aria-hidden="true">{line}</svg>'
    return f'<span class="whole">{picture}{safe(placement)}</span>'


def reels_html(document: Row) -> str:
    """Return the cut list: every reel, the sections cut from it, and what is left."""
    units = text_at(document, "units")
    reels = rows_at(document, "reels")
    sections: dict[str, list[Row]] = {}
    for row in rows_at(document, "sections"):
        sections.setdefault(text_at(row, "reel"), []).append(row)
    rows = [
        {**reel, **section, "name": text_at(reel, "name"), "section": text_at(section, "name")}
        if number_ == 0
        else {**section, "name": "", "section": text_at(section, "name")}
        for reel in reels
        for number_, section in enumerate(sections.get(text_at(reel, "name"), [{}]))
    ]
    columns = [
        Column(head="Reel", cell=lambda row: f"<b>{safe(text_at(row, 'name'))}</b>"),
        Column(
            head="From",
            cell=lambda row: f'<span class="whole">{safe(text_at(row, "source"))}</span>',
        ),
        length("Reel length", "length_m", units=units, digits=1),
        words("Section", "section"),
        Column(head="Lies", cell=_section_cell),
        length("Sheath", "sheath_m", units=units),
        length("Cut at least", "needed_m", units=units),
        length("Left over", "spare_m", units=units),
        Column(
            head="Cost",
            cell=lambda row: (
                safe(number_text(value_at(row, "cost"), digits=2)) if text_at(row, "name") else ""
            ),
            is_number=True,
        ),
    ]
    return table(columns, rows) + _layout_note(document)


def _section_cell(row: Row) -> str:
    start, end = safe(text_at(row, "from")), safe(text_at(row, "to"))
    return f"{start} \N{RIGHTWARDS ARROW} {end}" if start or end else ""


def _layout_note(document: Row) -> str:
    layout = row_at(document, "layout")
    currency = text_at(document, "currency")
    if not layout:
        return ""

    def money(row: Row, key: str) -> str:
        return f"{currency} {number_text(value_at(row, key), digits=2)}".strip()

    if layout.get("optimal"):
        text = f"No layout under these limits costs less: {money(layout, 'cost')}."
    else:
        text = (
            f"This layout costs {money(layout, 'cost')}; none can cost less than "
            f"{money(layout, 'lower_bound')}. The search was stopped by "
            f"{text_at(layout, 'stopped_by')}."
        )
    fewer = row_at(layout, "one_fewer")
    if fewer:
        text += (
            f" With one joint fewer ({text_at(fewer, 'joint_count')}) the cheapest costs "
            f"{money(fewer, 'cost')}."
        )
    return f"<p>{safe(text)}</p>"


def joints_html(document: Row) -> str:
    """Return all joints with how to get there."""
    columns = [
        Column(
            head="Joint",
            cell=lambda row: (
                f'<a href="#closure-{safe(text_at(row, "closure") or text_at(row, "name"))}">'
                f"{safe(text_at(row, 'name'))}</a>"
            ),
        ),
        Column(head="Place", cell=_place_cell),
        *([words("Leg", "leg")] if len(rows_at(document, "legs")) > 1 else []),
        length("Ground station", "ground_m", units=text_at(document, "units")),
        Column(head="How to get there", cell=lambda row: safe(joint_leg_place(document, row))),
        Column(
            head="Latitude, longitude",
            cell=lambda row: f'<span class="whole">{safe(position_text(row))}</span>',
        ),
        words("Kind", "kind", is_long=False),
        number("Splices", "splice_count"),
        amount("Cost", "cost"),
    ]
    joints = rows_at(document, "joints")
    return table(columns, joints, name="joints") if joints else "<p>No joint is needed.</p>"


def _place_cell(joint: Row) -> str:
    name = safe(text_at(joint, "reach_name") or text_at(joint, "node"))
    return f"{name} <b>assumed</b>".strip() if joint.get("assumed") else name


def checks_html(document: Row) -> str:
    """Return the checks, those that fail first, then those nobody can judge yet."""
    order = {"fails": 0, "unknown": 1}
    checks = sorted(
        rows_at(document, "checks"), key=lambda row: order.get(text_at(row, "verdict"), 2)
    )
    columns = [
        Column(head="Verdict", cell=lambda row: verdict_mark(text_at(row, "verdict"))),
        words("Check", "kind"),
        words("Where", "where"),
        Column(head="Value", cell=lambda row: _measured(row, "value"), is_number=True),
        Column(head="Limit", cell=lambda row: _measured(row, "limit"), is_number=True),
        words("Source", "source"),
    ]
    return table(columns, checks) if checks else ""


def _measured(row: Row, key: str) -> str:
    value = row.get(key)
    if value is None:
        return safe(number_text(None))
    unit = text_at(row, "unit")
    if isinstance(value, float) and unit in ("m", "dB") and "limit" in row:
        return f"{safe(number_text(value, digits=3))} {safe(unit)}"
    return f"{_value_text(value)} {safe(unit)}".strip()


def _value_text(value: object) -> str:
    """Return a number with the digits it was given, anything else as text."""
    if isinstance(value, dict):
        return safe(", ".join(f"{key} {each}" for key, each in value.items()) or "none")
    if isinstance(value, list):
        return safe(", ".join(str(each) for each in value) or "none")
    if isinstance(value, bool):
        return "yes" if value else "no"
    if not isinstance(value, int | float):
        return safe(value)
    digits = len(f"{value:.6f}".rstrip("0").partition(".")[2])
    return safe(number_text(value, digits=digits))


def bill_html(document: Row) -> str:
    """Return the bill, with a warning where prices are invented."""
    rows = rows_at(document, "bill")
    if not rows:
        return ""
    currency = safe(text_at(document, "currency"))
    total = sum(value_at(row, "total") or 0.0 for row in rows)
    columns = [
        words("Item", "item"),
        Column(head="Quantity", cell=lambda row: _value_text(row.get("quantity")), is_number=True),
        Column(head="Unit", cell=lambda row: safe(text_at(row, "unit"))),
        amount("Each", "each"),
        amount("Total", "total"),
        Column(head="Note", cell=lambda row: safe(text_at(row, "note"))),
    ]
    foot = (
        f'<tr><th scope="row" colspan="4">Sum, {currency}</th>'
        f'<td class="n">{safe(number_text(total, digits=2))}</td><td></td></tr>'
    )
    warning = f'<p class="warn">{INVENTED}</p>' if has_invented_prices(document) else ""
    return warning + table(columns, rows, foot=foot)


def assumptions_html(document: Row) -> str:
    """Return everything that was assumed, with source and reason."""
    columns = [
        words("Name", "name"),
        Column(head="Value", cell=lambda row: _measured(row, "value"), is_number=True),
        words("Source", "source"),
        words("Reason", "reason"),
    ]
    rows = rows_at(document, "assumptions")
    return table(columns, rows, name="assumptions") if rows else ""


def warnings_html(document: Row) -> str:
    """Return the warnings."""
    return _terms(rows_at(document, "warnings"), "where", "message")


def cautions_html(document: Row) -> str:
    """Return the cautions."""
    return _terms(rows_at(document, "cautions"), "topic", "text")


def _terms(rows: Sequence[Row], term: str, text: str) -> str:
    listed = "".join(
        f"<div><dt>{safe(text_at(row, term))}</dt><dd>{safe(text_at(row, text))}</dd></div>"
        for row in rows
    )
    return f'<dl class="terms">{listed}</dl>' if listed else ""
