"""Reading the document that `plan.json` holds, where every value is only known to be an object."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import TypeAlias

__all__ = [
    "Row",
    "column_at",
    "numbers",
    "row_at",
    "rows_at",
    "sites_in",
    "text_at",
    "value_at",
    "whole_at",
]

Row: TypeAlias = Mapping[str, object]

_NOTHING: Row = {}


def row_at(row: Row, key: str) -> Row:
    """Return the mapping under `key`, empty if there is none."""
    value = row.get(key)
    return value if isinstance(value, Mapping) else _NOTHING


def rows_at(row: Row, key: str) -> list[Row]:
    """Return the mappings listed under `key`, none if there is no list."""
    value = row.get(key)
    return [each for each in value if isinstance(each, Mapping)] if isinstance(value, list) else []


def text_at(row: Row, key: str) -> str:
    """Return the text under `key`, empty if there is none."""
    value = row.get(key)
    return "" if value is None else str(value)


def value_at(row: Row, key: str) -> float | None:
    """Return the number under `key`, None if there is none."""
    value = row.get(key)
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    return value


def column_at(rows: Iterable[Row], key: str) -> list[float | None]:
    """Return the number under `key` of every row, None where there is none."""
    values = [row.get(key) for row in rows]
    return [value if isinstance(value, int | float) else None for value in values]


def whole_at(row: Row, key: str) -> int:
    """Return the whole number under `key`, 0 if there is none."""
    return int(value_at(row, key) or 0)


def numbers(value: object) -> list[float]:
    """Return the numbers of a list, such as the longitude and latitude of a vertex."""
    return [float(each) for each in value] if isinstance(value, list | tuple) else []


def sites_in(document: Row) -> list[Row]:
    """
    Return the nodes that are sites: those a joint stands at and no station calls one are branches.

    Examples
    --------
    >>> nodes = [{"name": "Studio"}, {"name": "Node 1"}]
    >>> sites_in({"nodes": nodes, "joints": [{"name": "J1", "node": "Node 1"}]})
    [{'name': 'Studio'}]
    """
    stations = rows_at(document, "stations")
    known = {text_at(row, "name") for row in stations if row.get("kind") == "site"}
    branches = {text_at(row, "node") for row in rows_at(document, "joints")} - known
    return [row for row in rows_at(document, "nodes") if text_at(row, "name") not in branches]
