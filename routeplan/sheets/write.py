"""The sheets of a plan, written so that nothing is half done and nobody else's file touched."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import os
import shutil
import tempfile
from collections.abc import Callable, Iterator, Mapping, Sequence
from functools import partial
from pathlib import Path

from routeplan.errors import InputError, Problem
from routeplan.planning import Plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.rows import flat_rows
from routeplan.sheets.tables import TABLES, Json, Table, csv_tables

__all__ = ["LIST_NAME", "SHEET_NAMES", "csv_text", "json_text", "make_sheets", "write_sheets"]

LIST_NAME = "sheets.sha256"
"""The list of what was written, in the form that sha256sum reads."""

SHEET_NAMES = (
    *(entry.csv for entry in csv_tables()),
    "map.html",
    "report.html",
    "plan.json",
)

_RISKY_STARTS = ("=", "+", "-", "@", "\t", "\r")


def write_sheets(
    planned: Plan, folder: str | Path, *, on_sheet: Callable[[str], None] | None = None
) -> tuple[Path, ...]:
    """
    Write all sheets of a plan into a folder and return their paths.

    Files that an earlier call wrote are replaced or, if they are no longer made, removed; any
    other file is left alone. Everything is made in a folder beside it first, and `plan.json` is
    moved last.

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
        "map.html": partial(map_html, document),
        "report.html": partial(report_html, document),
        "plan.json": partial(json_text, document),
    }
    sheets = {}
    for name in SHEET_NAMES:
        sheets[name] = makers[name]()
        if on_sheet:
            on_sheet(name)
    return sheets


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


def _compact(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(", ", ": "))


def csv_text(document: Mapping[str, Json], entry: Table) -> str:
    """
    Return a table as CSV text with units in its heads.

    Text that a spreadsheet could take for a formula gets an apostrophe in front; numbers never.

    Parameters
    ----------
    document
        What `plan.json` holds.
    entry
        The table.
    """
    heads = csv_heads(entry, str(document["currency"]))
    digits = _digits(entry)
    out = io.StringIO(newline="")
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(heads)
    for row in flat_rows(document, entry.name):
        writer.writerow([_cell(row[key], digits.get(key)) for key in row])
    return out.getvalue()


def csv_heads(entry: Table, currency: str) -> list[str]:
    """Return the heads of a table's CSV: its keys, with the unit where the key lacks it."""
    heads = [key for key, _ in entry.carried]
    for column in entry.columns:
        if column.kind == "rows" or not column.is_listed:
            continue
        if column.kind == "row":
            heads += [f"{column.key}_{inner.key}" for inner in TABLES[column.of].columns]
            continue
        unit = currency if column.unit == "currency" else column.unit
        suffix = unit.replace("/", "_per_")
        lacks = suffix and not column.key.endswith(f"_{suffix}")
        heads.append(f"{column.key}_{suffix}" if lacks else column.key)
    return [neutral(head) for head in heads]


def _digits(entry: Table) -> dict[str, int]:
    return {c.key: c.digits for c in entry.columns if c.digits is not None}


def _cell(value: Json, digits: int | None) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.{digits}f}" if digits is not None else repr(value)
    if isinstance(value, list):
        return neutral(" ".join(str(entry) for entry in value))
    return neutral(value) if isinstance(value, str) else str(value)


def neutral(text: str) -> str:
    """Return text that no spreadsheet takes for a formula."""
    return f"'{text}" if text.startswith(_RISKY_STARTS) else text


def put_sheets(sheets: Mapping[str, str], folder: str | Path) -> tuple[Path, ...]:
    """
    Move finished sheets into a folder, replacing only what an earlier call put there.

    Parameters
    ----------
    sheets
        Text by file name; `plan.json` is moved last.
    folder
        Where to.

    Raises
    ------
    InputError
        As `write_sheets`.
    """
    target = Path(folder)
    data = {name: text.encode("utf-8") for name, text in sheets.items()}
    try:
        listed = _listed(target)
        _refuse_foreign(target, data, listed)
        target.parent.mkdir(parents=True, exist_ok=True)
        built = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
        try:
            for name, content in data.items():
                (built / name).write_bytes(content)
            target.mkdir(exist_ok=True)
            _move_in(built, target, data, listed)
        finally:
            shutil.rmtree(built, ignore_errors=True)
    except OSError as error:
        raise InputError(
            Problem(
                where=str(target),
                what="cannot be written to",
                value=error.strerror or str(error),
                remedy="Choose another folder with --out",
            )
        ) from None
    return tuple(target / name for name in data)


def _move_in(
    built: Path, target: Path, data: Mapping[str, bytes], listed: Sequence[tuple[str, str]]
) -> None:
    new = [(hashlib.sha256(content).hexdigest(), name) for name, content in data.items()]
    # Old and new sums stand in the list while files move, so that a stop half-way leaves none
    # of them looking like somebody else's.
    _write_list(built, target, [*listed, *new])
    for name in sorted(data, key=lambda name: name == "plan.json"):
        if name == "plan.json":
            for stale in _stale(target, data, listed):
                stale.unlink()
        os.replace(built / name, target / name)
    _write_list(built, target, new)


def _stale(
    target: Path, data: Mapping[str, bytes], listed: Sequence[tuple[str, str]]
) -> Iterator[Path]:
    for name in {name for _, name in listed} - data.keys():
        path = target / name
        if path.is_file() and (_sum_of(path), name) in listed:
            yield path


def _write_list(built: Path, target: Path, entries: Sequence[tuple[str, str]]) -> None:
    lines = dict.fromkeys(f"{digest}  {name}\n" for digest, name in entries)
    (built / LIST_NAME).write_text("".join(lines), "utf-8")
    os.replace(built / LIST_NAME, target / LIST_NAME)


def _listed(target: Path) -> list[tuple[str, str]]:
    """Return (checksum, name) of what an earlier call wrote; only our own sheet names count."""
    path = target / LIST_NAME
    if not path.is_file():
        return []
    pairs = (line.split("  ", 1) for line in path.read_text("utf-8", "replace").splitlines())
    return [(pair[0], pair[1]) for pair in pairs if len(pair) == 2 and pair[1] in SHEET_NAMES]


def _sum_of(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def _refuse_foreign(
    target: Path, data: Mapping[str, bytes], listed: Sequence[tuple[str, str]]
) -> None:
    if target.exists() and not target.is_dir():
        raise InputError(
            Problem(where=str(target), what="is not a folder", remedy="Choose another with --out")
        )
    named = {name for _, name in listed}
    problems = []
    for name in (*data, LIST_NAME):
        path = target / name
        if not path.exists() and not path.is_symlink():
            continue
        if name == LIST_NAME:
            is_ours = bool(listed)
        else:
            is_ours = path.is_file() and (_sum_of(path), name) in listed
        if not is_ours:
            what = "was changed since it was written" if name in named else "was not written by us"
            problems.append(
                Problem(
                    where=str(path),
                    what=f"stands in the way and {what}",
                    remedy="Move it elsewhere, or choose another folder with --out",
                )
            )
    if problems:
        raise InputError(problems)
