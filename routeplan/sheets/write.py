"""All sheets of a plan: made from one document, written to one folder."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from functools import partial
from pathlib import Path

import numpy as np

from routeplan.planning import Plan
from routeplan.sheets.cards import cards_text
from routeplan.sheets.columns import Json
from routeplan.sheets.csv_text import csv_text
from routeplan.sheets.document import plan_document
from routeplan.sheets.folder import LIST_NAME, put_sheets
from routeplan.sheets.tables import csv_tables

__all__ = ["LIST_NAME", "SHEET_NAMES", "json_text", "make_sheets", "write_sheets"]

_compact = json.JSONEncoder(
    ensure_ascii=False, allow_nan=False, check_circular=False, separators=(", ", ": ")
).encode

SHEET_NAMES = (
    *(entry.csv for entry in csv_tables()),
    "cards.txt",
    "map.html",
    "report.html",
    "plan.json",
)


def write_sheets(
    planned: Plan, folder: str | Path, *, on_sheet: Callable[[str], None] | None = None
) -> tuple[Path, ...]:
    """
    Write all sheets of a plan into a folder and return their paths.

    Files that an earlier call wrote are replaced or, if they are no longer made, removed; any
    other file is left alone. See `routeplan.sheets.folder`.

    Parameters
    ----------
    planned
        The plan.
    folder
        Where to; made if it does not exist.
    on_sheet
        Called with the name of each sheet as it is made.

    Raises
    ------
    InputError
        If a file in the way is not one of ours or was changed since, or the folder cannot be
        written to; nothing is written then.
    """
    return put_sheets(make_sheets(planned, on_sheet=on_sheet), folder)


def make_sheets(planned: Plan, *, on_sheet: Callable[[str], None] | None = None) -> dict[str, str]:
    """
    Return the text of every sheet by its file name.

    Parameters
    ----------
    planned
        The plan.
    on_sheet
        Called with the name of each sheet as it is made.
    """
    from routeplan.sheets.map import map_html
    from routeplan.sheets.report import report_html

    document = plan_document(planned)
    makers: dict[str, Callable[[], str]] = {
        **{entry.csv: partial(csv_text, document, entry) for entry in csv_tables()},
        "cards.txt": partial(cards_text, document),
        "map.html": partial(map_html, document | {"background": _background(planned)}),
        "report.html": partial(report_html, document),
        "plan.json": partial(json_text, document),
    }
    sheets = {}
    for name in SHEET_NAMES:
        sheets[name] = makers[name]()
        if on_sheet:
            on_sheet(name)
    return sheets


def _background(planned: Plan) -> list[Json]:
    """Return the polylines under the map, to the decimetre."""
    return [np.round(line, 6).tolist() for line in planned.run.background]


def json_text(document: Mapping[str, Json]) -> str:
    """Return the document as JSON text, one row of a table a line."""
    parts = []
    for key, value in document.items():
        if isinstance(value, list) and value:
            rows = ",\n  ".join(_compact(row) for row in value)
            parts.append(f"{_compact(key)}: [\n  {rows}\n ]")
        else:
            parts.append(f"{_compact(key)}: {_compact(value)}")
    return "{\n " + ",\n ".join(parts) + "\n}\n"
