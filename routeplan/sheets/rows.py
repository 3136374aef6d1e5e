"""Rows in the catalogue's order and digits, and rows of `plan.json` flattened for a CSV."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from routeplan.sheets.columns import Column, Json, Row, Table
from routeplan.sheets.tables import table

__all__ = ["flat_rows", "row_of", "shaped"]


def shaped(name: str, row: Mapping[str, Json]) -> Row:
    """
    Return a row in the catalogue's order, its numbers rounded to the catalogue's digits.

    Parameters
    ----------
    name
        Name of the table.
    row
        The values by key.

    Raises
    ------
    KeyError
        If the row lacks a column or has one more.
    """
    columns = table(name).columns
    if row.keys() != {column.key for column in columns}:
        extra = row.keys() ^ {column.key for column in columns}
        raise KeyError(f"table {name}: {sorted(extra)} stand in the row or the catalogue only")
    return {column.key: _rounded(column, row[column.key]) for column in columns}


def row_of(name: str, source: object, /, **more: Json) -> Row:
    """
    Return a row whose columns are attributes of `source`, but for those given.

    Parameters
    ----------
    name
        Name of the table.
    source
        What has the attributes.
    more
        Columns that are named or counted otherwise there.
    """
    return {
        column.key: _rounded(
            column, more[column.key] if column.key in more else getattr(source, column.key)
        )
        for column in table(name).columns
    }


def _rounded(column: Column, value: Json) -> Json:
    if column.digits is not None and isinstance(value, float):
        # Adding zero turns -0.0 into 0.0.
        return round(value, column.digits) + 0.0
    return value


def flat_rows(document: Mapping[str, Json], name: str) -> Iterator[Row]:
    """
    Yield the rows of a table as one CSV line each: carried columns first, nested rows joined on.

    Parameters
    ----------
    document
        What `plan.json` holds.
    name
        Name of the table.
    """
    entry = table(name)
    for around, row in _walk(document, entry.path, {}):
        line: Row = {key: around[_full(entry, origin)] for key, origin in entry.carried}
        for column in entry.columns:
            if not column.is_listed or column.kind == "rows":
                continue
            if column.kind == "row":
                inner = row[column.key]
                for nested in table(column.of).columns:
                    key = f"{column.key}_{nested.key}"
                    line[key] = inner[nested.key] if isinstance(inner, dict) else None
            else:
                line[column.key] = row[column.key]
        yield line


def _full(entry: Table, origin: str) -> str:
    return origin if "." in origin else f"{entry.path[-2]}.{origin}"


def _walk(
    place: Mapping[str, Json], path: tuple[str, ...], around: dict[str, Json]
) -> Iterator[tuple[dict[str, Json], dict[str, Json]]]:
    head, *rest = path
    found = place[head]
    for row in found if isinstance(found, list) else [found]:
        if not isinstance(row, dict):
            continue
        if rest:
            named = {f"{head}.{key}": value for key, value in row.items()}
            yield from _walk(row, tuple(rest), around | named)
        else:
            yield around, row
