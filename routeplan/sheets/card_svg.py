"""A card for the lid of a closure as drawn pages: what comes in, and every fibre by tray."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import groupby

from routeplan.sheets.card_parts import PATCH_MM, SQUEEZE, fitted_text, letters_em, patch, rule
from routeplan.sheets.joint_words import (
    cable_lines,
    closure_name,
    closures_of,
    entered_m_of,
    joint_leg_place,
    position_text,
    runs_of_splices,
    treatment,
)
from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, value_at, whole_at
from routeplan.sheets.svg_parts import MUTED
from routeplan.sheets.text import NO_BREAK_SPACE, number_text, plain, safe

__all__ = ["CardSources", "card_pages", "card_sources", "card_svg"]

_WIDTH_MM, _HEIGHT_MM = 184.0, 252.0  # what the margins of the report leave of A4
_GUTTER_MM, _LABEL_MM, _FACT_MM = 4.0, 28.0, 4.6
_FEW_LINES = 30
_BETWEEN = {
    "straight through": "\N{RIGHTWARDS ARROW}",
    "to the panel": "\N{RIGHTWARDS ARROW}",
    "stored": "\N{DOWNWARDS ARROW}",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class CardSources:
    """What the cards of one document look things up in."""

    document: Row
    sections: Mapping[str, Row]
    entered_m: Mapping[tuple[str, str], float]
    splices: Mapping[str, Sequence[Row]]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Line:
    """A line of a card's table: the head of a tray, words, or a fibre."""

    head: str = ""
    words: str = ""
    row: Row | None = None
    colours: tuple[str, str] = ("", "")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Grid:
    """How wide everything of a card's table is, its type size, and how many columns it has."""

    columns: int
    size_mm: float
    label_mm: float
    colour_mm: float
    circuit_mm: float

    @property
    def step_mm(self) -> float:
        """Return how far a line lies below the one before."""
        return self.size_mm * 1.55

    @property
    def width_mm(self) -> float:
        """Return the width of one column."""
        return (_WIDTH_MM - _GUTTER_MM * (self.columns - 1)) / self.columns


def card_svg(document: Row, joint_name: str) -> str:
    """
    Return the card of one closure as SVG, a drawing for each A4 page it takes.

    Up to some thirty fibres take a page that an A5 sheet holds.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.
    joint_name
        The closure, or a joint that shares it.

    Returns
    -------
    card_svg
        One `svg` element after the other; nothing if there is no such closure.
    """
    sources = card_sources(document)
    found = (
        joints
        for joints in closures_of(document)
        if joint_name in [text_at(joint, "name") for joint in joints]
    )
    return "".join(page for joints in found for page in card_pages(sources, joints))


def card_sources(document: Row) -> CardSources:
    """Return what all cards of a document share, looked up once."""
    splices: dict[str, list[Row]] = {}
    for row in rows_at(document, "splices"):
        splices.setdefault(text_at(row, "joint"), []).append(row)
    return CardSources(
        document=document,
        sections={text_at(row, "name"): row for row in rows_at(document, "sections")},
        entered_m=entered_m_of(document),
        splices=splices,
    )


def card_pages(sources: CardSources, joints: Sequence[Row]) -> list[str]:
    """Return the pages of the card for the joints in one closure, each an `svg` element."""
    rows = [row for joint in joints for row in sources.splices.get(text_at(joint, "name"), ())]
    name = closure_name(joints)
    lines = list(_lines(rows))
    grid = _grid(lines)
    facts = list(_facts(sources, joints, rows))
    tops_mm = [12.0 + _FACT_MM * len(facts) + 3.0, 14.0]
    pages = _paged(lines, grid, tops_mm=tops_mm)
    title = text_at(sources.document, "title")
    title_mm = min(3.2 * letters_em(title) + 0.5, 70.0)
    drawn = []
    for number, columns in enumerate(pages, start=1):
        top_mm = tops_mm[number > 1]
        of = f", page {number} of {len(pages)}" if len(pages) > 1 else ""
        deepest = max((len(column) for column in columns), default=0)
        body = [
            fitted_text(0, 6.4, f"Closure {name}{of}", 110, size_mm=5.6, bold=True),
            fitted_text(_WIDTH_MM - title_mm, 6.4, title, 70, size_mm=3.2, colour=MUTED),
            rule(0, 8.6, _WIDTH_MM, 0.5),
            *(_fact_lines(facts) if number == 1 else ()),
        ]
        for place, column in enumerate(columns):
            x_mm = place * (grid.width_mm + _GUTTER_MM)
            body += [
                _drawn(line, grid, x_mm=x_mm, y_mm=top_mm + grid.step_mm * (at + 1))
                for at, line in enumerate(column)
            ]
        height_mm = top_mm + grid.step_mm * deepest + 2.0
        drawn.append(_page(body, height_mm, title=f"Closure {name}{of}"))
    return drawn


def _page(body: Sequence[str], height_mm: float, *, title: str) -> str:
    return (
        f'<svg class="card" xmlns="http://www.w3.org/2000/svg" width="{_WIDTH_MM:.0f}mm" '
        f'height="{height_mm:.1f}mm" viewBox="0 0 {_WIDTH_MM:.0f} {height_mm:.1f}" '
        f'font-family="Helvetica Neue, Arial, sans-serif"><title>{safe(title)}</title>\n'
        + "\n".join(body)
        + "\n</svg>\n"
    )


def _facts(
    sources: CardSources, joints: Sequence[Row], rows: Sequence[Row]
) -> Iterator[tuple[str, str]]:
    """Yield label and text of the lines above the table, long texts over several."""
    document, joint = sources.document, joints[0]
    units = text_at(document, "units")
    place = text_at(joint, "reach_name") or text_at(joint, "node")
    circuits = dict.fromkeys(text_at(row, "circuit") for row in rows)
    limits_db = {value_at(row, "limit_db") for row in rows if text_at(row, "kind") == "splice"}
    runs = runs_of_splices(rows)
    found = [
        ("Place", place),
        ("", "place assumed: confirm on site before ordering" if joint.get("assumed") else ""),
        ("How to get there", joint_leg_place(document, joint)),
        ("Latitude, longitude", position_text(joint)),
        *(
            ("" if at else "Cable ends", line)
            for at, line in enumerate(
                line
                for each in joints
                for line in cable_lines(each, sources.sections, sources.entered_m, units=units)
            )
        ),
        ("Circuits", "; ".join(name for name in circuits if name)),
        ("Work", "; ".join(runs[:12]) + ("; ..." if len(runs) > 12 else "")),
        (
            "Each splice",
            ", ".join(
                f"at most {number_text(limit_db, digits=2)}{NO_BREAK_SPACE}dB"
                for limit_db in sorted(value for value in limits_db if value is not None)
            ),
        ),
    ]
    letters = int((_WIDTH_MM - _LABEL_MM) / (3.0 * 0.5))  # of mean width
    for label, text in found:
        for at, line in enumerate(textwrap.wrap(plain(text), letters)):
            yield "" if at else label, line


def _fact_lines(facts: Sequence[tuple[str, str]]) -> Iterator[str]:
    for at, (label, text) in enumerate(facts):
        y_mm = 13.2 + _FACT_MM * at
        if label:
            yield fitted_text(0, y_mm, label, _LABEL_MM - 1, size_mm=2.7, colour=MUTED)
        yield fitted_text(_LABEL_MM, y_mm, text, _WIDTH_MM - _LABEL_MM, size_mm=3.0)


def _lines(rows: Sequence[Row]) -> Iterator[_Line]:
    """Yield the lines of a table; fibres that pass uncut are one line for each of their tubes."""
    for tray, group in groupby(rows, key=lambda row: whole_at(row, "tray")):
        listed = list(group)
        tubes = _tubes(listed) if tray else ""
        head = f"Tray {tray}{tubes}" if tray else "On no tray"
        yield _Line(head=head)
        for (passes, section, tube), part in groupby(listed, key=_kind):
            if not passes:
                for row in part:
                    colours = _row_colours(row, in_head=bool(tubes))
                    yield _Line(head=head, row=row, colours=colours)
                continue
            said = "; ".join(runs_of_splices(list(part)))
            yield _Line(head=head, words=f"{section} tube {tube}: {said}")
    if not rows:
        yield _Line(words="No fibre is spliced here.")


def _tubes(rows: Sequence[Row]) -> str:
    """Return what the head of a tray says of its tubes, if either side has one and no more."""
    sides = [
        {text_at(end, "tube_colour") for row in rows for end in [row_at(row, side)] if end}
        for side in ("in", "out")
    ]
    tubes = [sorted(side - {""}) for side in sides]
    if len(tubes[0]) != 1 or len(tubes[1]) > 1:
        return ""
    both = dict.fromkeys(tube for side in tubes for tube in side)
    return ", tube " + " to tube ".join(plain(tube) for tube in both)


def _row_colours(row: Row, *, in_head: bool) -> tuple[str, str]:
    """Return the words for the colours of both ends, without the tube a tray's head names."""
    keys = ("fibre_colour",) if in_head else ("tube_colour", "fibre_colour")
    ends = row_at(row, "in"), row_at(row, "out")
    start, end = (
        " / ".join(plain(text_at(end, key)) for key in keys if text_at(end, key)) for end in ends
    )
    return start, end


def _kind(row: Row) -> tuple[bool, str, str]:
    """Return what puts fibres that pass uncut together, and parts them from all others."""
    end = row_at(row, "in")
    if treatment(row) != "pass uncut":
        return False, "", ""
    return True, text_at(end, "section"), text_at(end, "tube_colour")


def _grid(lines: Sequence[_Line]) -> _Grid:
    """Return one wide column for a few fibres or long words, two where both ends fit beside."""
    rows = [line.row for line in lines if line.row is not None]
    ends = [row_at(row, side) for row in rows for side in ("in", "out")]
    label_em = max((letters_em(_label(end)) for end in ends), default=0.0)
    colour_em = max((letters_em(word) for line in lines for word in line.colours), default=0.0)

    def grid(columns: int, size_mm: float) -> _Grid:
        label_mm = min(label_em * size_mm + 1.2, 24.0)
        width_mm = (_WIDTH_MM - _GUTTER_MM * (columns - 1)) / columns
        left_mm = (
            width_mm - 11.0 - (8.0 if columns > 1 else 16.0) - 2 * (label_mm + 2 * PATCH_MM + 1.6)
        )
        colour_mm = min(colour_em * size_mm + 1.0, (left_mm - 10.0) / 2)
        return _Grid(
            columns=columns,
            size_mm=size_mm,
            label_mm=label_mm,
            colour_mm=colour_mm,
            circuit_mm=left_mm - 2 * colour_mm,
        )

    if len(lines) <= _FEW_LINES:
        return grid(1, 2.8)
    narrow = grid(2, 2.2)
    fits = narrow.colour_mm * SQUEEZE >= colour_em * narrow.size_mm
    return narrow if fits else grid(1, 2.5)


def _paged(
    lines: Sequence[_Line], grid: _Grid, *, tops_mm: Sequence[float]
) -> list[list[list[_Line]]]:
    """Return pages of columns of lines; a tray that goes on says so, none has its head last."""
    rooms = [max(int((_HEIGHT_MM - top_mm) / grid.step_mm) - 1, 4) for top_mm in tops_mm]
    if len(lines) <= rooms[0] * grid.columns:
        rooms[0] = max(-(-len(lines) // grid.columns) + 2, 4)  # columns of much the same depth
    pages: list[list[list[_Line]]] = [[[]]]
    for at, line in enumerate(lines):
        column = pages[-1][-1]
        room = rooms[len(pages) > 1]
        is_head = line.row is None and not line.words
        if len(column) >= room - (is_head and at + 1 < len(lines)):
            if len(pages[-1]) < grid.columns:
                pages[-1].append([])
            else:
                pages.append([[]])
            column = pages[-1][-1]
            if not is_head and line.head:
                column.append(_Line(head=f"{line.head}, continued"))
        column.append(line)
    return pages


def _drawn(line: _Line, grid: _Grid, *, x_mm: float, y_mm: float) -> str:
    if line.row is not None:
        return _fibre(line, line.row, grid, x_mm=x_mm, y_mm=y_mm)
    if line.words:
        return fitted_text(x_mm + 1, y_mm, line.words, grid.width_mm - 2, size_mm=grid.size_mm)
    top_mm = y_mm - grid.size_mm * 1.12
    is_tray = line.head.startswith("Tray")
    at_mm, word = x_mm + grid.width_mm - 15.6, "measured, dB"
    measured = fitted_text(at_mm, y_mm, word, 15.5, size_mm=grid.size_mm * 0.9) if is_tray else ""
    return (
        f'<rect x="{x_mm:.2f}" y="{top_mm:.2f}" width="{grid.width_mm:.2f}" '
        f'height="{grid.step_mm:.2f}" fill="#f3f1ea"/>'
        + fitted_text(
            x_mm + 1, y_mm, line.head, grid.width_mm - 24, size_mm=grid.size_mm, bold=True
        )
        + measured
    )


def _fibre(line: _Line, row: Row, grid: _Grid, *, x_mm: float, y_mm: float) -> str:
    """Return the line of a fibre, with a blank for what is measured."""
    end_mm = grid.label_mm + 2 * PATCH_MM + 1.6 + grid.colour_mm
    out_mm = x_mm + 5.0 + end_mm + 5.0
    circuit_mm = out_mm + end_mm + 1.0
    what, far = treatment(row), row_at(row, "out")
    sign = _BETWEEN.get(what, "\N{MULTIPLICATION SIGN}")
    circuit = text_at(row, "circuit") or "spare"
    size_mm, blank_mm = grid.size_mm, 8.0 if grid.columns > 1 else 16.0
    return "".join(
        [
            '<g class="fibre">',
            fitted_text(
                x_mm, y_mm, str(whole_at(row, "position")), 4.5, size_mm=size_mm, colour=MUTED
            ),
            _end(row_at(row, "in"), line.colours[0], grid, x_mm=x_mm + 5.0, y_mm=y_mm),
            fitted_text(out_mm - 4.2, y_mm, sign, 4, size_mm=size_mm, bold=True),
            _end(far, line.colours[1], grid, x_mm=out_mm, y_mm=y_mm)
            if what != "stored"
            else fitted_text(out_mm, y_mm, "stored", end_mm, size_mm=size_mm),
            fitted_text(circuit_mm, y_mm, circuit, grid.circuit_mm - 2.0, size_mm=size_mm),
            rule(x_mm + grid.width_mm - blank_mm, y_mm + 0.5, blank_mm, 0.15) if far else "",
            "</g>",
        ]
    )


def _end(end: Row, colours: str, grid: _Grid, *, x_mm: float, y_mm: float) -> str:
    at_mm = x_mm + grid.label_mm
    patches = []
    for key in ("tube_colour", "fibre_colour"):
        if text_at(end, key):
            patches.append(patch(text_at(end, key), at_mm, y_mm - grid.size_mm * 0.78))
            at_mm += PATCH_MM + 0.4
    words_mm = x_mm + grid.label_mm + 2 * PATCH_MM + 1.4
    size_mm = grid.size_mm
    return (
        fitted_text(x_mm, y_mm, _label(end), grid.label_mm - 0.6, size_mm=size_mm)
        + "".join(patches)
        + fitted_text(words_mm, y_mm, colours, grid.colour_mm - 0.4, size_mm=size_mm)
    )


def _label(end: Row) -> str:
    fibre = whole_at(end, "fibre")
    return f"{plain(text_at(end, 'section'))} {fibre if fibre else ''}".rstrip()
