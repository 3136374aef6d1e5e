"""The published numbers on screen, each with its source."""

from __future__ import annotations

from dataclasses import asdict
from difflib import get_close_matches

from routeplan.errors import InputError, Problem
from routeplan.run.trouble import shown
from routeplan.sheets.table_layouts import layout_of
from routeplan.sheets.table_text import table_lines, wrapped
from routeplan.tables import load_meta, raw_rows, table_names

__all__ = ["published_json", "published_text"]


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
    head = [meta.title, *wrapped(f"Source: {meta.source} ({meta.confidence})")]
    head += wrapped(f"Note: {meta.note}") if meta.note else []
    lines = [*head, "", *table_lines(raw_rows(name), layout_of(name))]
    return "\n".join(lines).rstrip() + "\n"


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
