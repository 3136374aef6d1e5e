"""What is said of a closure on every sheet: where it is, what comes in, what is done in it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, value_at, whole_at
from routeplan.sheets.text import length_text, plain

__all__ = [
    "cable_lines",
    "closure_name",
    "closures_of",
    "entered_m_of",
    "joint_leg_place",
    "position_text",
    "runs_of_splices",
    "treatment",
]

_DASH = "\N{EN DASH}"


def joint_leg_place(document: Row, joint: Row) -> str:
    """Return how to find a joint: the nearest end of its leg along the way, not yet escaped."""
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
        fibre, what = whole_at(row_at(row, "in"), "fibre"), treatment(row)
        if runs and runs[-1][0] == what and fibre == runs[-1][2] + 1:
            runs[-1] = (what, runs[-1][1], fibre)
        else:
            runs.append((what, fibre, fibre))
    return [
        f"fibres {first}{_DASH}{last} {what}" if last > first else f"fibre {first} {what}"
        for what, first, last in runs
    ]


def treatment(row: Row) -> str:
    """Return in words what is done with a fibre in a closure."""
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


def entered_m_of(document: Row) -> dict[tuple[str, str], float]:
    """Return where along a section's jacket the stations of each name lie. [m]"""
    found: dict[tuple[str, str], float] = {}
    for row in rows_at(document, "stations"):
        along_m = value_at(row, "section_m")
        if text_at(row, "kind") in ("joint", "site") and along_m is not None:
            found[text_at(row, "section"), text_at(row, "name")] = along_m
    return found


def closures_of(document: Row) -> list[list[Row]]:
    """Return the joints in each closure, the one it is named after first."""
    found: dict[str, list[Row]] = {}
    for joint in rows_at(document, "joints"):
        name = text_at(joint, "name")
        found.setdefault(text_at(joint, "closure") or name, []).append(joint)
    return list(found.values())


def closure_name(joints: Sequence[Row]) -> str:
    """Return what a closure is called: after all joints in it."""
    return " + ".join(plain(text_at(joint, "name")) for joint in joints)


def cable_lines(
    joint: Row,
    sections: Mapping[str, Row],
    entered_m: Mapping[tuple[str, str], float],
    *,
    units: str,
) -> Iterator[str]:
    """Yield a line for every cable in a closure, with the jacket metres to look for."""
    for end in rows_at(joint, "ends"):
        yield _end_line(end, sections, units=units)
    opened = joint.get("opened")
    names = (text_at(joint, "name"), text_at(joint, "node"))
    for section in [str(entry) for entry in opened] if isinstance(opened, list) else []:
        at = [entered_m[section, name] for name in names if (section, name) in entered_m]
        row = sections.get(section, {})
        yield (
            f"{plain(section)} passes, from {plain(text_at(row, 'from'))} to "
            f"{plain(text_at(row, 'to'))}: open it at "
            f"{plain(length_text(at[0] if at else None, units=units))}, do not cut it"
        )


def _end_line(end: Row, sections: Mapping[str, Row], *, units: str) -> str:
    """Return what a cable end is: its section, where it comes from, its own jacket metres."""
    name, side = text_at(end, "section"), text_at(end, "side")
    row = sections.get(name, {})
    at_m = value_at(row, "sheath_m") if side == "end" else 0.0
    other = text_at(row, "from" if side == "end" else "to")
    way = "from" if side == "end" else "to"
    reel = f", reel {plain(text_at(row, 'reel'))}" if text_at(row, "reel") else ""
    at = plain(length_text(at_m, units=units))
    mark_m = value_at(end, "jacket_mark_m")
    mark = "" if mark_m is None else f", marked {plain(length_text(mark_m, units=units))}"
    return f"{plain(name)} {way} {plain(other)}{reel}: its {side}, at {at} of its jacket{mark}"
