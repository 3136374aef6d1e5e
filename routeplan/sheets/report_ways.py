"""The report's part on protection: separate ways, what could cut both, and both circuits."""

from __future__ import annotations

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.sheets.report_parts import Column, db, length, number, table, words
from routeplan.sheets.text import length_text, number_text, safe

__all__ = ["protection_html"]


def protection_html(document: Row) -> str:
    """Return separate ways with their exposures, and each standby circuit beside its main one."""
    units = text_at(document, "units")
    pairs = "".join(_pair(row, units) for row in rows_at(document, "separate_ways"))
    return pairs + _standbys(rows_at(document, "standbys"))


def _pair(pair: Row, units: str) -> str:
    main, standby = text_at(pair, "main"), text_at(pair, "standby")
    rule = text_at(pair, "rule")
    proven = "; proven" if pair.get("exact") else ""
    said = (
        f"Both from {text_at(pair, 'from')} to {text_at(pair, 'to')}: {main} "
        f"{length_text(value_at(pair, 'main_ellipsoid_m'), units=units)}, {standby} "
        f"{length_text(value_at(pair, 'standby_ellipsoid_m'), units=units)}. "
        f"{rule[:1].upper()}{rule[1:]}{proven}."
    )
    return (
        f"<h3>{safe(main)} and {safe(standby)}</h3>\n<p>{safe(said)}</p>\n{_exposed(pair, units)}"
    )


def _exposed(pair: Row, units: str) -> str:
    """Return all that one digger, flood or fire could cut together."""
    rows = rows_at(pair, "exposures")
    within = length_text(value_at(pair, "distance_m"), units=units)
    if not rows:
        return f"<p>{safe(f'They share nothing, and come nowhere within {within}.')}</p>\n"
    total = length_text(value_at(pair, "exposed_ellipsoid_m"), units=units)
    said = (
        f"One event could cut both along {total} of {text_at(pair, 'main')}: where they are one, "
        f"meet, or lie within {within}. Chambers, buildings and ducts inside one street are not "
        f"known here."
    )
    columns = [
        length("From", "from_ellipsoid_m", units=units, digits=0),
        length("To", "to_ellipsoid_m", units=units, digits=0),
        length("Length", "ellipsoid_m", units=units, digits=0),
        words("How", "kind", is_long=False),
        length("Nearest", "nearest_m", units=units, digits=0),
        Column(head="Where", cell=_where, is_long=True),
        number("Longitude", "lon", digits=6),
        number("Latitude", "lat", digits=6),
    ]
    return f"<p>{safe(said)}</p>\n{table(columns, rows)}"


def _where(row: Row) -> str:
    return safe(f"{text_at(row, 'name')}{' (bridge)' if row.get('bridge') else ''}")


def _standbys(rows: list[Row]) -> str:
    """Return each circuit and its standby one below the other, and what both have in common."""
    if not rows:
        return ""
    columns = [
        words("Circuit", "name", is_long=False),
        words("Stands by for", "main", is_long=False),
        db("Least margin, dB", "margin_db"),
        db("Worst loss, dB", "worst_db"),
        number("Delay, us", "delay_us", digits=3),
    ]
    parts = ["<h3>Circuits that stand by</h3>\n"]
    for row in rows:
        both = [_side(row, "main"), {**_side(row, "standby"), "main": text_at(row, "main")}]
        parts.append(f"{table(columns, both)}<p>{safe(_together(row))}</p>\n")
    return "".join(parts)


def _side(row: Row, side: str) -> Row:
    keys = ("margin_db", "worst_db", "delay_us")
    return {"name": text_at(row, side), "main": "-"} | {
        key: row.get(f"{side}_{key}") for key in keys
    }


def _together(row: Row) -> str:
    listed = row.get("shared_cables")
    names = ", ".join(map(str, listed)) if isinstance(listed, list) else ""
    cable = f"Both are in cable {names}: one cut takes both." if names else "No cable carries both."
    difference = number_text(value_at(row, "difference_us"), digits=3)
    return f"Their delays differ by {difference} us. {cable}"
