"""The keys of a run file as rows and as a JSON Schema: what the reference page is made of."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from routeplan.run.defaults import PracticeRow, PracticeValue, practice_rows
from routeplan.run.practice import RunFile

__all__ = ["KeyRow", "key_rows", "run_file_schema", "toml_value"]

_HEADINGS = {"cables": "cables.NAME", "interface": "interface.NAME"}
_COMPLETE = (  # tables that make no sense without some of their keys
    "CircuitBend",
    "JacketMark",
    "JointFigures",
    "LayerColumns",
    "LegOrder",
    "MeasuredAttenuation",
    "Panel",
    "SectionFigures",
    "StreetRules",
)
_TYPES = {
    "boolean": "true or false",
    "number": "number",
    "integer": "whole number",
    "string": "text",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class KeyRow:
    """
    One key of a run file; `default` is None where leaving it out means "none".

    `section` is "" at the top of the file; `venue` is the default of a venue run where it differs.
    """

    section: str
    key: str
    type: str
    unit: str
    limits: str
    default: PracticeValue | None
    venue: PracticeValue | None
    description: str
    reason: str
    source: str
    confidence: str

    @property
    def name(self) -> str:
        """The dotted key."""
        return f"{self.section}.{self.key}" if self.section else self.key


def key_rows() -> tuple[KeyRow, ...]:
    """Return every key a run file may have, in the order of the file."""
    schema = RunFile.model_json_schema(by_alias=True)
    practice = {row.name: row for row in practice_rows()}
    found: list[KeyRow] = []
    for name, entry in schema["properties"].items():
        section = _table(entry, schema["$defs"])
        if section is None:
            found.append(_row("", name, entry, practice.get(name)))
            continue
        for key, own in section["properties"].items():
            if not (name == "cable" and key == "legs"):
                row = practice.get(f"{'cable' if name == 'cables' else name}.{key}")
                found.append(_row(_HEADINGS.get(name, name), key, own, row))
        if name == "circuit":
            found += _nested_rows(name, section, schema["$defs"])
    return tuple(found)


def _nested_rows(
    name: str, section: Mapping[str, Any], defs: Mapping[str, Any]
) -> Iterator[KeyRow]:
    """Yield the keys of the tables within the entries of a section."""
    for key, entry in section["properties"].items():
        if nested := _table(entry, defs):
            for inner, own in nested["properties"].items():
                yield _row(f"{name}.{key}", inner, own, None)


def run_file_schema() -> dict[str, Any]:
    """Return the JSON Schema of a run file as people write it: every key optional."""
    schema = RunFile.model_json_schema(by_alias=True)
    practice = {row.name: row.value for row in practice_rows()}
    for name, entry in schema["properties"].items():
        if name in practice:
            entry["default"] = practice[name]
        section = _table(entry, schema["$defs"])
        for key, own in section["properties"].items() if section else ():
            if f"{name}.{key}" in practice:
                own["default"] = practice[f"{name}.{key}"]
    for table in (schema, *schema["$defs"].values()):
        if table.get("title") not in _COMPLETE:
            table.pop("required", None)
    return schema


def toml_value(value: PracticeValue) -> str:
    """
    Return a default as a run file writes it.

    Examples
    --------
    >>> toml_value({"aerial": 600.0}), toml_value(("put-ups",)), toml_value(3.0), toml_value({})
    ('{ aerial = 600.0 }', '["put-ups"]', '3.0', '{}')
    """
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, tuple):
        return f"[{', '.join(toml_value(each) for each in value)}]"
    if isinstance(value, dict):
        inner = ", ".join(f"{key} = {toml_value(each)}" for key, each in value.items())
        return f"{{ {inner} }}" if inner else "{}"
    return str(value).lower() if isinstance(value, bool) else repr(value)


def _table(entry: Mapping[str, Any], defs: Mapping[str, Any]) -> Mapping[str, Any] | None:
    """Return the schema of the section behind an entry, None for a plain key."""
    inner = _without_null(entry)
    for wrapper in ("additionalProperties", "items"):
        if isinstance(entry.get(wrapper), Mapping):
            inner = entry[wrapper]
    reference = str(inner.get("$ref", "")).rpartition("/")[2]
    found: Mapping[str, Any] | None = defs.get(reference)
    return found


def _row(section: str, key: str, entry: Mapping[str, Any], row: PracticeRow | None) -> KeyRow:
    description = str(entry.get("description", ""))
    text, bracket, rest = description.rpartition(" [")
    unit = rest.rstrip("]") if bracket and rest.endswith("]") else ""
    return KeyRow(
        section=section,
        key=key,
        type=_type_of(entry),
        unit=unit,
        limits=", ".join(_limits(entry)),
        default=row.value if row else None,
        venue=row.venue if row else None,
        description=text if unit else description,
        reason=row.reason if row else "",
        source=row.source if row else "",
        confidence=row.confidence if row else "",
    )


def _without_null(entry: Mapping[str, Any]) -> Mapping[str, Any]:
    options = [option for option in entry.get("anyOf", ()) if option.get("type") != "null"]
    return options[0] if options else entry


def _type_of(entry: Mapping[str, Any]) -> str:
    entry = _without_null(entry)
    if "enum" in entry:
        return "one of " + ", ".join(str(word) for word in entry["enum"])
    if entry.get("type") == "array":
        items = entry["items"]
        return "list of tables" if "$ref" in items else f"list of {_type_of(items)}"
    if entry.get("type") == "object":
        by = (
            " by placement" if "propertyNames" in entry and "enum" in entry["propertyNames"] else ""
        )
        return f"table of {_type_of(entry['additionalProperties'])}{by}"
    return _TYPES.get(str(entry.get("type")), "table")


def _limits(entry: Mapping[str, Any]) -> Iterator[str]:
    entry = _without_null(entry)
    for wrapper in ("items", "additionalProperties"):
        if isinstance(entry.get(wrapper), Mapping):
            entry = entry[wrapper]
    words = {"minimum": "at least", "exclusiveMinimum": "more than", "maximum": "at most"}
    for key, word in words.items():
        if key in entry:
            yield f"{word} {entry[key]:g}"
