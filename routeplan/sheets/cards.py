"""A card for the lid of each closure, in plain text: what comes in, and every fibre by tray."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import groupby

from routeplan.sheets.joint_words import (
    cable_lines,
    closure_name,
    closures_of,
    entered_m_of,
    joint_leg_place,
    position_text,
)
from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, whole_at
from routeplan.sheets.text import plain

__all__ = ["cards_text"]

_WIDTH = 78
_FORM_FEED = "\f"  # a printer begins a new page at it


def cards_text(document: Row) -> str:
    """
    Return the cards of all closures, one page each.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.

    Returns
    -------
    cards_text
        Lines of 78 characters at most where names are short enough, pages parted by form feeds.
    """
    splices: dict[str, list[Row]] = {}
    for row in rows_at(document, "splices"):
        splices.setdefault(text_at(row, "joint"), []).append(row)
    sections = {text_at(row, "name"): row for row in rows_at(document, "sections")}
    entered = entered_m_of(document)
    cards = (
        "\n".join(_card(document, joints, splices, sections, entered))
        for joints in closures_of(document)
    )
    return f"\n{_FORM_FEED}\n".join(cards) + "\n"


def _card(
    document: Row,
    joints: Sequence[Row],
    splices: Mapping[str, Sequence[Row]],
    sections: Mapping[str, Row],
    entered: Mapping[tuple[str, str], float],
) -> Iterator[str]:
    joint = joints[0]
    place = plain(text_at(joint, "reach_name") or text_at(joint, "node"))
    yield f"CLOSURE {closure_name(joints)}   {plain(text_at(document, 'title'))}"
    yield "=" * _WIDTH
    yield f"Place      {place}" + (" (assumed: look at it first)" if joint.get("assumed") else "")
    yield f"Way there  {plain(joint_leg_place(document, joint))}"
    yield f"Position   {position_text(joint)}"
    units = text_at(document, "units")
    for each in joints:
        for line in cable_lines(each, sections, entered, units=units):
            yield f"Cable      {line}"
    rows = [row for each in joints for row in splices.get(text_at(each, "name"), ())]
    for tray, group in groupby(rows, key=lambda row: whole_at(row, "tray")):
        yield ""
        yield f"TRAY {tray}" if tray else "NOT CUT, on no tray"
        yield "-" * _WIDTH
        yield from (_fibre_line(row) for row in group)


def _fibre_line(row: Row) -> str:
    what = {"stored": "stored", "express": "passes"}.get(text_at(row, "kind"), "to")
    far = "" if what != "to" else _fibre_text(row_at(row, "out"))
    line = f"{whole_at(row, 'position'):3}  {_fibre_text(row_at(row, 'in')):32} {what:6} {far:32}"
    return f"{line.rstrip()}  {plain(text_at(row, 'circuit'))}".rstrip()


def _fibre_text(end: Row) -> str:
    colours = "/".join(
        plain(text) for text in (text_at(end, "tube_colour"), text_at(end, "fibre_colour")) if text
    )
    return f"{plain(text_at(end, 'section'))} {whole_at(end, 'fibre')} {colours}".rstrip()
