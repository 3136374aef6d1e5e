"""The JSON Schema of `plan.json`, derived from the catalogue."""

from __future__ import annotations

import json
from collections.abc import Sequence

from routeplan.sheets.columns import Column, Json, Row
from routeplan.sheets.tables import HEAD, SCHEMA, TABLES

__all__ = ["plan_schema", "plan_schema_text"]

_DRAFT = "https://json-schema.org/draft/2020-12/schema"
_POINT: Row = {
    "type": "array",
    "prefixItems": [{"type": "number"}, {"type": "number"}, {"type": ["number", "null"]}],
    "minItems": 3,
    "maxItems": 3,
}
_RING: Row = {
    "type": "array",
    "items": {"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2},
}
_TYPES: dict[str, Row] = {
    "text": {"type": "string"},
    "number": {"type": "number"},
    "integer": {"type": "integer"},
    "flag": {"type": "boolean"},
    "value": {"type": ["number", "string"]},
    "texts": {"type": "array", "items": {"type": "string"}},
    "numbers": {"type": "array", "items": {"type": "number"}},
    "points": {"type": "array", "items": _POINT},
    "rings": {"type": "array", "items": _RING},
}


def plan_schema() -> Row:
    """
    Return the JSON Schema of `plan.json`.

    References
    ----------
    .. [1] JSON Schema, draft 2020-12, core and validation.

    Examples
    --------
    >>> plan_schema()["properties"]["schema"]["const"]
    1
    """
    head = _object(HEAD)
    properties = head["properties"]
    assert isinstance(properties, dict)
    properties["schema"] = {"const": SCHEMA, "description": HEAD[0].text}
    for entry in TABLES.values():
        if len(entry.path) == 1:
            reference: Row = {"$ref": f"#/$defs/{entry.name}"}
            properties[entry.path[0]] = (
                reference if entry.is_single else {"type": "array", "items": reference}
            )
    return {
        "$schema": _DRAFT,
        "title": "plan.json of routeplan",
        "description": "A planned fibre run: lengths, reels, joints, splices, light and checks.",
        **head,
        "required": list(properties),
        "$defs": {name: _object(entry.columns) for name, entry in TABLES.items()},
    }


def plan_schema_text() -> str:
    """Return the schema as the text of a file."""
    return json.dumps(plan_schema(), ensure_ascii=False, indent=1) + "\n"


def _object(columns: Sequence[Column]) -> Row:
    properties: Row = {column.key: _value(column) for column in columns}
    return {
        "type": "object",
        "properties": properties,
        "required": list(properties),
        "additionalProperties": False,
    }


def _value(column: Column) -> Row:
    unit = f" [{column.unit}]" if column.unit else ""
    described: Row = {"description": f"{column.text}{unit}"}
    if column.kind in ("row", "rows"):
        reference: Row = {"$ref": f"#/$defs/{column.of}"}
        if column.kind == "rows":
            return {"type": "array", "items": reference, **described}
        return (
            {"anyOf": [reference, {"type": "null"}], **described}
            if column.may_be_null
            else {**reference, **described}
        )
    found: Row = dict(_TYPES[column.kind])
    if column.choices:
        words: list[Json] = list(column.choices)
        return {"enum": [*words, None] if column.may_be_null else words, **described}
    if column.may_be_null:
        found["type"] = [str(found["type"]), "null"]
    return {**found, **described}
