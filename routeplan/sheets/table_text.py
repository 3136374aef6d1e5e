"""The rows of a published table as lines of text, as a layout hints, none of them lost."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Iterator, Mapping, Sequence
from itertools import groupby, zip_longest
from typing import TypeAlias

from routeplan.sheets.table_layouts import Layout

__all__ = ["WIDTH", "table_lines", "value_text", "wrapped"]

WIDTH = 100
_WIDE = 30  # a cell wider than this goes below its row
_GAP = "  "
_HEAD = 8  # a head of several words is broken to this width
_ACROSS = 8  # numbered items on a line
_ENDINGS = (
    ("_ps_per_nm2_km", "ps/(nm2 km)"),
    ("_ps_per_nm_km", "ps/(nm km)"),
    ("_ps_per_sqrt_km", "ps/sqrt km"),
    ("_ps_per_nm", "ps/nm"),
    ("_db_per_km", "dB/km"),
    ("_m_per_s", "m/s"),
    ("_gbps", "Gbit/s"),
    ("_gbd", "Gbaud"),
    ("_dbm", "dBm"),
    ("_db", "dB"),
    ("_gpa", "GPa"),
    ("_nm", "nm"),
    ("_um", "um"),
    ("_mm", "mm"),
    ("_us", "us"),
    ("_m", "m"),
    ("_count", ""),
)
_SHORT = {"mfd": "mode field", "pmd": "PMD", "q": "Q", "oma": "OMA"}
_FOOT = ("source", "confidence", "note")

TableRow: TypeAlias = Mapping[str, object]


def table_lines(rows: Sequence[TableRow], layout: Layout) -> Iterator[str]:
    """
    Yield the lines of a table: headings, columns with their units, numbered sources at the end.

    Parameters
    ----------
    rows
        Rows as they stand in the table's file.
    layout
        How the table is best read.
    """
    marks: dict[str, int] = {}
    if layout.across:
        yield from _matrix_lines(rows, layout.across, marks)
    else:
        for heading, own in _grouped(rows, layout):
            if heading:
                yield f"{heading}"
            shown = [key for key in layout.numbered if any(key in row for row in own)]
            draw = _block_lines if shown else _column_lines
            yield from draw(own, layout, marks)
            yield ""
    for text, number in marks.items():
        yield from wrapped(f"[{number}] {text}", indent=" " * (len(str(number)) + 3))


def wrapped(text: str, *, indent: str = "  ", first: str = "") -> list[str]:
    """Return text broken to the width of a page, but never inside a word."""
    return textwrap.wrap(
        text,
        WIDTH,
        initial_indent=first,
        subsequent_indent=indent,
        break_long_words=False,
        break_on_hyphens=False,
    )


def value_text(value: object) -> str:
    """
    Return a value with all its digits.

    Examples
    --------
    >>> value_text(0.40), value_text(1310.0), value_text([1260.0, 1360.0]), value_text({"duct": 3})
    ('0.4', '1310', '1260, 1360', 'duct 3')
    """
    if isinstance(value, list):
        return ", ".join(map(value_text, value))
    if isinstance(value, dict):
        return ", ".join(f"{key} {value_text(entry)}" for key, entry in value.items())
    # Every published digit counts; only the ".0" of a whole number does not.
    return repr(value).removesuffix(".0") if isinstance(value, float) else str(value)


def _grouped(
    rows: Sequence[TableRow], layout: Layout
) -> Iterator[tuple[str, list[dict[str, object]]]]:
    """Yield a heading and the rows below it, without what the heading says."""
    if layout.is_dotted:
        name = next(iter(rows[0]))

        def section(row: TableRow) -> str:
            return str(row[name]).rpartition(".")[0]

        for part, members in groupby(rows, key=section):
            bare = [{**row, name: str(row[name]).rpartition(".")[2]} for row in members]
            yield (f"[{part}]" if part else ""), bare
        return
    groups: dict[str, list[dict[str, object]]] = {}
    for row in rows:
        first, *more = (value_text(row[key]) for key in layout.group) if layout.group else ("",)
        named = (f"{key} {text}" for key, text in zip(layout.group[1:], more, strict=True))
        heading = ", ".join([first, *named])
        rest = {key: value for key, value in row.items() if key not in layout.group}
        groups.setdefault(heading, []).append(rest)
    while groups:
        heading, own = next(iter(groups.items()))
        same = [other for other, theirs in groups.items() if theirs == own]
        yield ", ".join(same), own
        groups = {other: theirs for other, theirs in groups.items() if other not in same}


def _column_lines(rows: Sequence[TableRow], layout: Layout, marks: dict[str, int]) -> Iterator[str]:
    """Yield rows under their heads; where they are too wide, as several tables by first column."""
    keys = _column_keys(rows, layout)
    lead, *rest = keys
    pages = _pages(rows, lead, rest, layout)
    for number, page in enumerate(pages):
        shown = [row for row in rows if number == 0 or any(key in row for key in page)]
        if number:
            yield ""
        yield from _page_lines(shown, [lead, *page], layout, marks, is_first=number == 0)


def _column_keys(rows: Sequence[TableRow], layout: Layout) -> list[str]:
    """Return the keys that are columns, the leading ones first."""
    found = dict.fromkeys(key for row in rows for key in row)
    apart = {*_FOOT, *layout.below, *layout.numbered}
    keys = [key for key in layout.first if key in found]
    keys += [key for key in found if key not in layout.first]
    return [
        key
        for key in keys
        if key not in apart and any(_fits_cell(row, key, layout) for row in rows)
    ]


def _fits_cell(row: TableRow, key: str, layout: Layout) -> bool:
    return key in row and max(map(len, _cell(row, key, layout))) <= _WIDE


def _cell(row: TableRow, key: str, layout: Layout) -> list[str]:
    """Return the lines of a cell: one, or one for each item of a stacked list."""
    value = row.get(key, "")
    if key not in layout.stacked or not isinstance(value, list):
        return [value_text(value)]
    return [
        " to ".join(map(value_text, v)) if isinstance(v, list) else value_text(v) for v in value
    ]


def _pages(
    rows: Sequence[TableRow], lead: str, rest: Sequence[str], layout: Layout
) -> list[list[str]]:
    """Return the columns beside the first one, as many to a page as its width holds."""
    room = WIDTH - _width(rows, lead, layout) - 6
    pages: list[list[str]] = [[]]
    used = 0
    for key in rest:
        width = _width(rows, key, layout) + len(_GAP)
        if used + width > room and pages[-1]:
            pages.append([])
            used = 0
        pages[-1].append(key)
        used += width
    return pages


def _width(rows: Sequence[TableRow], key: str, layout: Layout) -> int:
    cells = [
        cell for row in rows if _fits_cell(row, key, layout) for cell in _cell(row, key, layout)
    ]
    return max(map(len, [*cells, *_head(key, layout)]))


def _head(key: str, layout: Layout) -> list[str]:
    """Return the lines of a head: the words of a key one below the other, then its unit."""
    words, unit = _words(key)
    lines = textwrap.wrap(layout.labels.get(key, words), _HEAD, break_long_words=False)
    return [*lines, *([unit] if unit else [])]


def _words(key: str) -> tuple[str, str]:
    """
    Return a key as words, and its unit.

    Examples
    --------
    >>> _words("tx_min_dbm"), _words("levels"), _words("per_km_db")
    (('tx min', 'dBm'), ('levels', ''), ('per km', 'dB'))
    """
    if key.startswith("per_"):
        unit = key.split("_")[1]
        return f"per {unit}", "dB" if key.endswith("_db") else ""
    found = ((ending, unit) for ending, unit in _ENDINGS if key.endswith(ending))
    ending, unit = next(found, ("", ""))
    parts = key.removesuffix(ending).split("_")
    return " ".join(_SHORT.get(part, part) for part in parts), unit


def _page_lines(
    rows: Sequence[TableRow],
    keys: Sequence[str],
    layout: Layout,
    marks: dict[str, int],
    *,
    is_first: bool,
) -> Iterator[str]:
    widths = [_width(rows, key, layout) for key in keys]
    is_number = [_is_number(rows, key) for key in keys]
    heads = [_head(key, layout) for key in keys]
    depth = max(map(len, heads))
    padded = [[""] * (depth - len(head)) + head for head in heads]
    yield from _set(zip(*padded, strict=True), widths, is_number)
    for row in rows:
        cells = [_cell(row, key, layout) if _fits_cell(row, key, layout) else [""] for key in keys]
        lines = list(_set(zip_longest(*cells, fillvalue=""), widths, is_number))
        if is_first:
            lines[0] = f"{lines[0]}{_GAP}{_mark(row, marks)}".rstrip()
        yield from lines
        if is_first:
            yield from _below_lines(row, layout)


def _is_number(rows: Sequence[TableRow], key: str) -> bool:
    values = [row[key] for row in rows if key in row]
    return all(isinstance(value, int | float) for value in values)


def _set(
    lines: Iterable[Sequence[str]], widths: Sequence[int], is_number: Sequence[bool]
) -> Iterator[str]:
    """Yield lines of cells set to their columns, numbers to the right."""
    for cells in lines:
        yield _GAP.join(
            f"{cell:>{width}}" if right else f"{cell:{width}}"
            for cell, width, right in zip(cells, widths, is_number, strict=True)
        ).rstrip()


def _mark(row: TableRow, marks: dict[str, int]) -> str:
    """Return the number of a row's source and note, listed once for all rows that share them."""
    said = [str(row[key]) for key in ("source", "confidence") if key in row]
    text = ", ".join(dict.fromkeys(said))
    if note := row.get("note"):
        text = f"{text}; {note}" if text else str(note)
    return f"[{marks.setdefault(text, len(marks) + 1)}]" if text else ""


def _below_lines(row: TableRow, layout: Layout) -> Iterator[str]:
    """Yield what stands under a row: long texts, and cells too wide for their column."""
    apart = {*_FOOT, *layout.numbered}
    for key, value in row.items():
        if key in apart or (key not in layout.below and _fits_cell(row, key, layout)):
            continue
        label = "" if key in ("reason", "text", "title", "topic") else f"{_label(key, layout)}: "
        yield from wrapped(f"{label}{value_text(value)}", first="    ", indent="      ")


def _label(key: str, layout: Layout) -> str:
    if key in layout.labels:
        return layout.labels[key]
    words, unit = _words(key)
    return f"{words}, {unit}" if unit else words


def _block_lines(rows: Sequence[TableRow], layout: Layout, marks: dict[str, int]) -> Iterator[str]:
    """Yield each row as a block: its name, texts, numbered lists, and what else it says."""
    for number, row in enumerate(rows):
        if number:
            yield ""
        lead, *rest = (key for key in row if key not in (*_FOOT, *layout.below, *layout.numbered))
        yield f"{value_text(row[lead])}{_GAP}{_mark(row, marks)}".rstrip()
        yield from _below_lines(row, layout)
        for key in layout.numbered:
            yield from _numbered_lines(_label(key, layout), row.get(key))
        said = "; ".join(f"{_label(key, layout)}: {value_text(row[key])}" for key in rest)
        yield from wrapped(said, first="    ", indent="      ")


def _numbered_lines(label: str, items: object) -> Iterator[str]:
    if not isinstance(items, list) or not items:
        return
    cells = [f"{number:>2} {item}" for number, item in enumerate(items, start=1)]
    width = max(map(len, cells)) + len(_GAP)
    across = min(_ACROSS, (WIDTH - 14) // width)
    across = -(-len(cells) // -(-len(cells) // across))
    for start in range(0, len(cells), across):
        head = label if start == 0 else ""
        line = "".join(f"{cell:{width}}" for cell in cells[start : start + across])
        yield f"    {head:8}{line}".rstrip()


def _matrix_lines(
    rows: Sequence[TableRow], across: tuple[str, str, str], marks: dict[str, int]
) -> Iterator[str]:
    """Yield a matrix, in as many tables as the page is too narrow for."""
    row_key, column_key, value_key = across
    cells: dict[str, dict[str, str]] = {}
    for row in rows:
        named = row[column_key]
        for column in named if isinstance(named, list) else [named]:
            text = f"{value_text(row[value_key])} {_mark(row, marks)}".rstrip()
            cells.setdefault(str(row[row_key]), {})[str(column)] = text
    names = {key: ", ".join(part for part in _words(key) if part) for key in cells}
    lead = max(map(len, names.values()))
    columns = _alike_columns(cells)
    widths = {
        column: max(map(len, [*heads, *(own.get(column, "") for own in cells.values())]))
        for column, heads in columns.items()
    }
    for page in _matrix_pages(widths, WIDTH - lead):
        depth = max(len(columns[column]) for column in page)
        for line in range(depth):
            heads = (([""] * depth + columns[column])[line - depth :][0] for column in page)
            texts = zip(page, heads, strict=True)
            yield (" " * lead + "".join(f"{_GAP}{h:{widths[c]}}" for c, h in texts)).rstrip()
        for key, own in cells.items():
            if any(column in own for column in page):
                line_cells = (f"{_GAP}{own.get(column, ''):{widths[column]}}" for column in page)
                yield f"{names[key]:{lead}}{''.join(line_cells)}".rstrip()
        yield ""


def _alike_columns(cells: Mapping[str, Mapping[str, str]]) -> dict[str, list[str]]:
    """Return the columns in order of their names, each with the names of those like it."""
    found: dict[str, list[str]] = {}
    for column in sorted({column for own in cells.values() for column in own}):
        entries = [own.get(column) for own in cells.values()]
        like = (c for c in found if [own.get(c) for own in cells.values()] == entries)
        found.setdefault(next(like, column), []).append(column)
    return found


def _matrix_pages(widths: Mapping[str, int], room: int) -> list[list[str]]:
    """Return the columns of each page, about as many on every one."""
    pages: list[list[str]] = [[]]
    most = len(widths)
    while True:
        pages = [[]]
        for column, width in widths.items():
            used = sum(widths[each] + len(_GAP) for each in pages[-1])
            if pages[-1] and (used + width + len(_GAP) > room or len(pages[-1]) == most):
                pages.append([])
            pages[-1].append(column)
        even = -(-len(widths) // len(pages))
        if even >= most:
            return pages
        most = even
