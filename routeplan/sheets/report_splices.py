"""The splice schedule of the report: one closure after another, every fibre a row."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import groupby

from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, value_at, whole_at
from routeplan.sheets.report_parts import Column, swatch, table_row, words
from routeplan.sheets.text import count_text, length_text, number_text, safe

__all__ = ["closures_html", "joint_leg_place", "joint_place", "position_text", "runs_of_splices"]

_DASH = "\N{EN DASH}"
_SIDE_WORDS = {"start": "begins here", "end": "ends here"}


def closures_html(document: Row) -> str:
    """Return the splice schedule; in print each closure starts a new page."""
    splices: dict[str, list[Row]] = {}
    sections = {text_at(row, "name"): row for row in rows_at(document, "sections")}
    for row in rows_at(document, "splices"):
        splices.setdefault(text_at(row, "joint"), []).append(row)
    return "".join(
        _closure(document, joint, splices.get(text_at(joint, "name"), []), sections)
        for joint in rows_at(document, "joints")
    )


def joint_place(document: Row, joint: Row) -> str:
    """Return how to find a joint: where it is, and the nearest end of its leg along the way."""
    return safe(joint_leg_place(document, joint))


def joint_leg_place(document: Row, joint: Row) -> str:
    """Return the same as text that is not yet fit for a page."""
    units = text_at(document, "units")
    ground_m = value_at(joint, "ground_m") or 0.0
    legs = rows_at(document, "legs")
    leg = next((row for row in legs if text_at(row, "name") == text_at(joint, "leg")), None)
    if leg is None:
        return text_at(joint, "node")
    rest_m = (value_at(leg, "ground_m") or 0.0) - ground_m
    near_m, end = min((ground_m, text_at(leg, "from")), (rest_m, text_at(leg, "to")))
    return f"{length_text(near_m, units=units)} along the way from {end}"


def position_text(joint: Row) -> str:
    """Return a joint's coordinates as a navigator takes them, latitude first."""
    lon, lat = value_at(joint, "lon"), value_at(joint, "lat")
    if lon is None or lat is None:
        return ""
    return f"{lat:.6f}, {lon:.6f}"


def runs_of_splices(rows: Sequence[Row]) -> list[str]:
    """
    Return in words the runs of neighbouring fibres that are treated alike in one closure.

    Examples
    --------
    >>> rows = [
    ...     {"tray": 1, "kind": "splice", "in": {"fibre": n}, "out": {"fibre": n}}
    ...     for n in (1, 2, 3)
    ... ]
    >>> runs_of_splices(rows)
    ['fibres 1\N{EN DASH}3 straight through']
    """
    runs: list[tuple[str, int, int]] = []
    for row in rows:
        fibre, what = whole_at(row_at(row, "in"), "fibre"), _treatment(row)
        if runs and runs[-1][0] == what and fibre == runs[-1][2] + 1:
            runs[-1] = (what, runs[-1][1], fibre)
        else:
            runs.append((what, fibre, fibre))
    return [
        f"fibres {first}{_DASH}{last} {what}" if last > first else f"fibre {first} {what}"
        for what, first, last in runs
    ]


def _treatment(row: Row) -> str:
    kind = text_at(row, "kind")
    start, end = row_at(row, "in"), row_at(row, "out")
    if kind == "stored" or not end:
        return "stored"
    if kind == "express":
        return "pass uncut"
    if text_at(end, "section") == "panel":
        return "to the panel"
    alike = all(start.get(k) == end.get(k) for k in ("fibre", "tube_colour", "fibre_colour"))
    return "straight through" if alike else "crossed: see rows"


def _closure(document: Row, joint: Row, splices: Sequence[Row], sections: Mapping[str, Row]) -> str:
    name = safe(text_at(joint, "name"))
    facts = [
        ("Place", _place_words(joint)),
        ("How to get there", joint_place(document, joint)),
        ("Latitude, longitude", safe(position_text(joint))),
        ("Cable ends", _ends(sections, joint)),
        ("Work", _work(joint, splices)),
    ]
    listed = "".join(f"<div><dt>{word}</dt><dd>{text}</dd></div>" for word, text in facts if text)
    return (
        f'<article class="closure" id="closure-{name}"><h3>Closure {name}'
        f"<small>{safe(text_at(document, 'title'))}</small></h3>\n"
        f'<dl class="facts">{listed}</dl>\n{_schedule(splices)}</article>\n'
    )


def _place_words(joint: Row) -> str:
    name = safe(text_at(joint, "reach_name") or text_at(joint, "node"))
    if joint.get("assumed"):
        return f"{name} <b>place assumed: confirm on site before ordering</b>".strip()
    return name


def _ends(sections: Mapping[str, Row], joint: Row) -> str:
    parts = []
    for end in rows_at(joint, "ends"):
        row = sections.get(text_at(end, "section"), {})
        side = text_at(end, "side")
        other = text_at(row, "from" if side == "end" else "to")
        reach = f" ({'from' if side == 'end' else 'to'} {safe(other)})" if other else ""
        reel = f", reel {safe(text_at(row, 'reel'))}" if text_at(row, "reel") else ""
        name = safe(text_at(end, "section"))
        at_m = value_at(row, "sheath_m") if side == "end" else 0.0
        jacket = f", jacket {safe(length_text(at_m))}" if row else ""
        mark_m = value_at(end, "jacket_mark_m")
        jacket += "" if mark_m is None else f", marked {safe(length_text(mark_m))}"
        parts.append(f"section {name}{reach}{reel} {_SIDE_WORDS.get(side, '')}{jacket}")
    for entered in _texts(joint.get("opened")):
        row = sections.get(entered, {})
        ends = f" (from {safe(text_at(row, 'from'))} to {safe(text_at(row, 'to'))})" if row else ""
        parts.append(f"section {safe(entered)}{ends} passes and is entered, not cut")
    return "; ".join(parts)


def _texts(value: object) -> list[str]:
    return [str(entry) for entry in value] if isinstance(value, list) else []


def _work(joint: Row, splices: Sequence[Row]) -> str:
    count = count_text(whole_at(joint, "splice_count"), "splice")
    return safe("; ".join([count, *runs_of_splices(splices)][:12]))


def _schedule(splices: Sequence[Row]) -> str:
    if not splices:
        return "<p>No fibre is spliced here.</p>"
    columns = _columns()
    heads = (
        '<tr><th></th><th colspan="4" class="side">in</th><th></th>'
        '<th colspan="4" class="side">out</th><th colspan="4"></th></tr><tr>'
        + "".join(f"<th{_class(column)}>{safe(column.head)}</th>" for column in columns)
        + "</tr>"
    )
    bodies = []
    for tray, group in groupby(splices, key=lambda row: whole_at(row, "tray")):
        rows = list(group)
        runs = "; ".join(runs_of_splices(rows)[:8])
        head = f"Tray {tray}" if tray else "On no tray"
        bodies.append(
            f'<tbody><tr class="tray"><th colspan="{len(columns)}" scope="rowgroup">{head}: '
            f"{safe(runs)}</th></tr>{''.join(table_row(columns, row) for row in rows)}</tbody>"
        )
    return f'<table class="splices"><thead>{heads}</thead>{"".join(bodies)}</table>\n'


def _columns() -> list[Column]:
    return [
        Column(head="Pos.", cell=lambda row: str(whole_at(row, "position")), is_number=True),
        *_end_columns("in"),
        Column(head="", cell=_between),
        *_end_columns("out"),
        words("Kind", "kind", is_long=False),
        Column(head="Circuit", cell=lambda row: safe(text_at(row, "circuit")) or "spare"),
        Column(
            head="Limit, dB",
            cell=lambda row: safe(number_text(value_at(row, "limit_db"), digits=2)),
            is_number=True,
        ),
        Column(head="Measured", cell=lambda _: '<span class="blank"></span>'),
    ]


def _end_columns(side: str) -> list[Column]:
    def text(key: str) -> Column:
        head = {"section": "Section", "fibre": "Fibre"}[key]
        is_number = key == "fibre"
        return Column(
            head=head, cell=lambda row: safe(text_at(row_at(row, side), key)), is_number=is_number
        )

    def colour(head: str, key: str) -> Column:
        return Column(
            head=head,
            cell=lambda row: swatch(text_at(row_at(row, side), key)) if row_at(row, side) else "",
            is_long=True,
        )

    return [
        text("section"), text("fibre"),
        colour("Tube", "tube_colour"), colour("Colour", "fibre_colour"),
    ]  # fmt: skip


def _between(row: Row) -> str:
    return {
        "straight through": "\N{RIGHTWARDS ARROW}",
        "stored": "\N{DOWNWARDS ARROW}",
        "pass uncut": "\N{LONG RIGHTWARDS ARROW}",
        "to the panel": "\N{RIGHTWARDS ARROW}",
    }.get(_treatment(row), "<b>\N{MULTIPLICATION SIGN}</b>")


def _class(column: Column) -> str:
    return ' class="n"' if column.is_number else ""
