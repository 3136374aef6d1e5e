"""Tables as CSV text: units in the heads, text that no spreadsheet takes for a formula."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Mapping, Sequence

from routeplan.sheets.columns import Column, Json, Table
from routeplan.sheets.rows import flat_rows
from routeplan.sheets.tables import table

__all__ = ["csv_heads", "csv_text", "neutral"]

_RISKY_STARTS = ("=", "+", "-", "@", "\t", "\r")


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
    digits = dict.fromkeys((key for key, _ in entry.carried), None)
    digits |= {key: column.digits for key, column in _flat_columns(entry)}
    out = io.StringIO(newline="")
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(csv_heads(entry, currency=str(document["currency"])))
    # Column by column: what kind of number it holds is asked once, not in every cell.
    columns = zip(*(row.values() for row in flat_rows(document, entry.name)), strict=True)
    cells = [_cells(values, own) for values, own in zip(columns, digits.values(), strict=False)]
    writer.writerows(zip(*cells, strict=True))
    return out.getvalue()


def csv_heads(entry: Table, *, currency: str) -> list[str]:
    """Return the heads of a table's CSV: its keys, with the unit where the key lacks it."""
    carried = [key for key, _ in entry.carried]
    own = [_head(key, column, currency) for key, column in _flat_columns(entry)]
    return [neutral(head) for head in (*carried, *own)]


def _flat_columns(entry: Table) -> Iterator[tuple[str, Column]]:
    """Yield key and column of every cell that the table's own rows fill."""
    for column in entry.columns:
        if not column.is_listed or column.kind == "rows":
            continue
        if column.kind == "row":
            for inner in table(column.of).columns:
                yield f"{column.key}_{inner.key}", inner
        else:
            yield column.key, column


def _head(key: str, column: Column, currency: str) -> str:
    unit = currency if column.unit == "currency" else column.unit.replace("/", "_per_")
    has_unit = not unit or key.lower().endswith(f"_{unit.lower()}")
    return key if has_unit else f"{key}_{unit}"


def _cells(values: Sequence[Json], digits: int | None) -> list[str]:
    number = repr if digits is None else f"{{:.{digits}f}}".format
    return [number(value) if type(value) is float else _cell(value) for value in values]


def _cell(value: Json) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, list):
        return neutral(", ".join(str(entry) for entry in value))
    return neutral(value) if isinstance(value, str) else str(value)


def neutral(text: str) -> str:
    """
    Return text that no spreadsheet takes for a formula.

    A lone dash, the unit of a ratio, is none.

    Examples
    --------
    >>> neutral("=1+1"), neutral("Hill"), neutral("-"), neutral("-1")
    ("'=1+1", 'Hill', '-', "'-1")
    """
    return f"'{text}" if text.startswith(_RISKY_STARTS) and text != "-" else text
