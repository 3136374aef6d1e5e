"""
Published numbers: one TOML file a source, each with where it comes from, and one loader.

A file has a `[meta]` table (`title`, `source`, `confidence`, optional `note`) and one `[[row]]`
for each row. The loader turns rows into frozen dataclasses and checks types, missing and unknown
fields, duplicate names, and that every row has a source (its own or that of the file).
"""

from __future__ import annotations

import dataclasses
import tomllib
import types
import typing
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any, TypeVar

from routeplan.errors import Problem, TableError

__all__ = ["CONFIDENCES", "Meta", "load_meta", "load_rows", "raw_rows", "table_names"]

CONFIDENCES = ("read", "from memory", "common practice", "house rule", "invented")

Row = TypeVar("Row")


@dataclass(frozen=True, slots=True, kw_only=True)
class Meta:
    """What a table holds and where it comes from."""

    title: str
    source: str
    confidence: str
    note: str = ""


def table_names() -> tuple[str, ...]:
    """Return the names of the tables the package carries."""
    found = (entry.name for entry in files(__name__).iterdir())
    return tuple(sorted(name.removesuffix(".toml") for name in found if name.endswith(".toml")))


def load_meta(name: str) -> Meta:
    """Return title, source, confidence and note of table `name`."""
    meta = _typed(name, "meta", Meta, _raw(name).get("meta", {}))
    _check_confidence(name, "meta", meta.confidence)
    return meta


def raw_rows(name: str) -> tuple[dict[str, object], ...]:
    """Return the rows of table `name` as they stand in its file, for showing."""
    return tuple(_raw(name).get("row", []))


@cache
def load_rows(name: str, row_type: type[Row]) -> tuple[Row, ...]:
    """
    Return the rows of table `name` as instances of the frozen dataclass `row_type`.

    A row's `source` and `confidence` fields, where `row_type` has them, are taken from the
    file's `[meta]` when the row gives none of its own.
    """
    meta = load_meta(name)
    fields = {field.name for field in dataclasses.fields(row_type)}  # type: ignore[arg-type]
    inherited = {"source": meta.source, "confidence": meta.confidence}
    shared = {key: value for key, value in inherited.items() if key in fields}
    rows = []
    seen: set[object] = set()
    for number, raw in enumerate(_raw(name).get("row", []), start=1):
        where = f"row {number}"
        row = _typed(name, where, row_type, shared | raw)
        if "confidence" in fields:
            _check_confidence(name, where, getattr(row, "confidence"))  # noqa: B009
        key = tuple(getattr(row, k) for k in getattr(row_type, "KEY", ("name",)) if k in raw)
        if key and key in seen:
            raise TableError(_problem(name, where, "stands twice", repr(key)))
        seen.add(key)
        rows.append(row)
    if not rows:
        raise TableError(_problem(name, "row", "has no rows", ""))
    return tuple(rows)


@cache
def _raw(name: str) -> dict[str, Any]:
    try:
        return tomllib.loads((files(__name__) / f"{name}.toml").read_text("utf-8"))
    except FileNotFoundError:
        known = ", ".join(table_names())
        raise TableError(_problem(name, "file", "is not a table; there are", known)) from None
    except tomllib.TOMLDecodeError as error:
        raise TableError(_problem(name, "file", "is not TOML", str(error))) from None


@cache
def _shape(row_type: type) -> tuple[dict[str, Any], dict[str, dataclasses.Field[Any]]]:
    """Return types and fields of a row by name: asked once, not for every row."""
    fields = {field.name: field for field in dataclasses.fields(row_type)}
    return typing.get_type_hints(row_type), fields


def _typed(name: str, where: str, row_type: type[Row], raw: dict[str, Any]) -> Row:
    hints, fields = _shape(row_type)  # type: ignore[arg-type]
    for key in raw.keys() - fields.keys():
        raise TableError(_problem(name, where, "has an unknown field", key))
    for key, field in fields.items():
        optional = (
            field.default is not dataclasses.MISSING
            or field.default_factory is not dataclasses.MISSING
        )
        if key not in raw and not optional:
            raise TableError(_problem(name, where, "lacks the field", key))
    values = {key: _converted(name, where, key, hints[key], raw[key]) for key in raw}
    for key in ("source", "title"):
        if key in fields and not str(values.get(key, "")).strip():
            raise TableError(_problem(name, where, "has no", key))
    return row_type(**values)


def _converted(name: str, where: str, key: str, hint: object, value: object) -> object:
    """Return `value` as the hinted type; lists become tuples and whole numbers floats."""
    options = typing.get_args(hint) if typing.get_origin(hint) is types.UnionType else (hint,)
    for option in options:
        origin = typing.get_origin(option) or option
        if origin is tuple and isinstance(value, list):
            item = typing.get_args(option)[0]
            return tuple(_converted(name, where, key, item, entry) for entry in value)
        if origin is dict and isinstance(value, dict):
            return value
        if origin is float and isinstance(value, int | float) and not isinstance(value, bool):
            return float(value)
        if origin is typing.Literal and value in typing.get_args(option):
            return value
        if isinstance(origin, type) and type(value) is origin:
            return value
    raise TableError(_problem(name, where, f"{key} is not {hint}", repr(value)))


def _check_confidence(name: str, where: str, confidence: str) -> None:
    if confidence not in CONFIDENCES:
        raise TableError(_problem(name, where, "has an unknown confidence", repr(confidence)))


def _problem(name: str, where: str, what: str, value: str) -> Problem:
    return Problem(where=f"table {name}, {where}", what=what, value=value)
