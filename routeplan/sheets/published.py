"""The published numbers on screen, each with its source."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Mapping
from dataclasses import asdict
from difflib import get_close_matches

from routeplan.errors import InputError, Problem
from routeplan.run.trouble import shown
from routeplan.tables import load_meta, raw_rows, table_names

__all__ = ["published_json", "published_text"]

_WIDE = 28  # a cell wider than this goes on lines of its own
_PAGE = 140  # a table wider than this is shown row by row


def published_json(name: str | None) -> dict[str, object]:
    """
    Return a table with its meta data and rows, or the list of tables.

    Parameters
    ----------
    name
        Name of the table, or None.

    Raises
    ------
    InputError
        If there is no such table.
    """
    if name is None:
        return {"tables": {entry: asdict(load_meta(entry)) for entry in table_names()}}
    _refuse_unknown(name)
    return {"name": name, "meta": asdict(load_meta(name)), "rows": list(raw_rows(name))}


def published_text(name: str | None) -> str:
    """
    Return a table as lines to read, or the list of tables.

    Parameters
    ----------
    name
        Name of the table, or None.

    Raises
    ------
    InputError
        If there is no such table.
    """
    if name is None:
        width = max(map(len, table_names()))
        lines = [f"{entry:{width}}  {load_meta(entry).title}" for entry in table_names()]
        return "\n".join([*lines, "", "routeplan tables NAME shows one."]) + "\n"
    _refuse_unknown(name)
    meta = load_meta(name)
    head = [meta.title, *_wrapped(f"Source: {meta.source} ({meta.confidence})")]
    head += _wrapped(f"Note: {meta.note}") if meta.note else []
    return "\n".join([*head, "", *_row_lines(raw_rows(name))]) + "\n"


def _refuse_unknown(name: str) -> None:
    if name in table_names():
        return
    near = get_close_matches(name[:100], table_names(), n=1)
    hint = f"Did you mean {near[0]}? " if near else ""
    raise InputError(
        Problem(
            where="tables",
            what="there is no table of that name",
            value=shown(name),
            remedy=hint + f"There are {', '.join(table_names())}",
        )
    )


def _wrapped(text: str) -> list[str]:
    return textwrap.wrap(text, width=96, subsequent_indent="  ")


def _row_lines(rows: tuple[Mapping[str, object], ...]) -> Iterator[str]:
    """Yield a line of short values for each row, with long values indented below it."""
    cells = [{key: _shown(value) for key, value in row.items()} for row in rows]
    long = {
        key for row in cells for key, text in row.items() if max(len(text), len(key)) > _WIDE
    } | {"source", "confidence"}
    keys = [key for key in dict.fromkeys(k for row in cells for k in row) if key not in long]
    widths = {key: max([len(key), *(len(row.get(key, "")) for row in cells)]) for key in keys}
    if sum(widths.values()) + 2 * len(widths) > _PAGE:
        yield from _row_blocks(cells, long)
        return
    yield "  ".join(f"{key:{widths[key]}}" for key in keys).rstrip()
    for row in cells:
        yield "  ".join(f"{row.get(key, ''):{widths[key]}}" for key in keys).rstrip()
        yield from _long_lines(row, long)


def _row_blocks(cells: list[dict[str, str]], long: set[str]) -> Iterator[str]:
    """Yield each row as a block: what it is called, its short values, its long ones."""
    for row in cells:
        first, *rest = (key for key in row if key not in long)
        yield row[first]
        yield from _indented("; ".join(f"{key} {row[key]}" for key in rest))
        yield from _long_lines(row, long)


def _long_lines(row: Mapping[str, str], long: set[str]) -> Iterator[str]:
    for key in (key for key in row if key in long):
        yield from _indented(f"{key}: {row[key]}")


def _indented(text: str) -> list[str]:
    return textwrap.wrap(text, width=96, initial_indent="    ", subsequent_indent="      ")


def _shown(value: object) -> str:
    if isinstance(value, list):
        return ", ".join(map(_shown, value))
    if isinstance(value, dict):
        return ", ".join(f"{key} {_shown(entry)}" for key, entry in value.items())
    # Every published digit counts; only the ".0" of a whole number does not.
    return repr(value).removesuffix(".0") if isinstance(value, float) else str(value)
