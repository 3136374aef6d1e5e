"""What is wrong with a run file in words: its key, the value, the limit and the remedy."""

from __future__ import annotations

import typing
from collections.abc import Iterator, Mapping
from typing import Any

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from routeplan.errors import Problem, RunFileError
from routeplan.run.optics import CircuitBend, CircuitPart, MeasuredAttenuation
from routeplan.run.practice import RunFile, RunHead
from routeplan.run.trouble import Trouble, nearest_hint, number_hint, one_of, shown

__all__ = ["key_path", "note_errors", "sections"]

_MISSPELT_RATIO = 0.9  # so like a key of its own section that it belongs in no other
_UNITS = {
    "_ps_per_nm": "ps/nm",
    "_db_per_km": "dB/km",
    "_per_m": "a metre",
    "_dbm": "dBm",
    "_db": "dB",
    "_nm": "nm",
    "_mm": "mm",
    "_gbps": "Gbit/s",
    "_m": "m",
}
_BOUNDS = {"greater_than_equal": "at least", "greater_than": "more than"} | {
    "less_than_equal": "at most",
    "less_than": "less than",
}
_WHATS = {
    "int_type": "is not a whole number",
    "bool_type": "is not true or false",
    "float_type": "is not a number",
    "string_type": "is not text",
    "finite_number": "is not a finite number",
    "literal_error": "is not one of the values it can take",
    "tuple_type": "is not a list",
    "mapping_type": "is not a table",
    "dict_type": "is not a table",
    "model_type": "is not a table",
    "model_attributes_type": "is not a table",
    "missing": "is missing",
    "string_too_short": "is empty",
    "too_short": "is empty",
    "string_too_long": "is too long",
    "too_long": "is too long",
    "value_error": "holds a value twice",
    "int_parsing_size": "is too large",
}
_NESTED: dict[str, type[BaseModel]] = {  # tables within the entries of a section
    "cable.measured": MeasuredAttenuation,
    "section.measured": MeasuredAttenuation,
    "circuit.part": CircuitPart,
    "circuit.bend": CircuitBend,
}
_CALLED = {
    "circuit": "name",
    "panel": "site",
    "joint": "place",
    "section": "name",
    "mark": "reel",
    "layer": "file",
    "leg": "name",
}
_ENTRIES = tuple(f"{name} " for name in _CALLED)


def sections() -> dict[str, tuple[str, ...]]:
    """Return the keys of every section of a run file; the top of the file is the section ""."""
    found: dict[str, tuple[str, ...]] = {"": tuple(RunFile.model_fields)}
    for name, field in RunFile.model_fields.items():
        if name not in RunHead.model_fields:
            found[name] = _keys(_model_in(field.annotation))
    return found | {name: _keys(model) for name, model in _NESTED.items()}


def note_errors(
    error: ValidationError,
    data: Mapping[str, Any],
    *,
    file: str,
    trouble: Trouble,
    given: frozenset[str],
) -> None:
    """Note every error of validation as a problem, each once."""
    for detail in error.errors(include_url=False):
        path = detail["loc"]
        if path[0] == "cables" and len(path) > 2 and f"cables.{path[1]}.{path[2]}" not in given:
            continue  # taken over from the default cable, where the error is shown already
        if detail["type"] == "too_short" and detail["input"]:
            continue  # its items are wrong, and each is shown
        trouble.add(RunFileError, _problem(detail, data, file=file))


def key_path(path: tuple[str | int, ...], data: Mapping[str, Any]) -> str:
    """
    Return a key's path as a person would say it.

    Examples
    --------
    >>> key_path(("slack", "entry_m"), {})
    'slack.entry_m'
    >>> key_path(("circuit", 0, "to"), {"circuit": [{"name": "Programme"}]})
    'circuit "Programme", to'
    >>> key_path(("reels", "put_ups_m", 1), {})
    'reels.put_ups_m, item 2'
    """
    text = ""
    if path[0] in _CALLED and len(path) > 1 and isinstance(path[1], int):
        item = _value_at(path[:2], data)
        name = item.get(_CALLED[str(path[0])]) if isinstance(item, Mapping) else None
        text = f"{path[0]} {shown(name) if isinstance(name, str) else path[1] + 1}"
        path = path[2:]
    for part in path:
        if isinstance(part, int):
            text += f", item {part + 1}"
        elif part != "[key]":
            joint = ", " if text.startswith(_ENTRIES) or ", item" in text else "."
            text += f"{joint if text else ''}{shown(part)[1:-1]}"
    return text


def _problem(detail: ErrorDetails, data: Mapping[str, Any], *, file: str) -> Problem:
    path, kind = detail["loc"], detail["type"]
    where = f"{file}, {key_path(path, data)}"
    if kind == "extra_forbidden":
        return _unknown_key(path, where)
    if path[-1] == "[key]" and kind == "literal_error":
        return _unknown_key(path[:-1], where, known=_expected(detail))
    value = "" if kind == "missing" else shown(detail["input"])
    if kind in _BOUNDS:
        bound = next(iter(detail["ctx"].values()))
        low = kind.startswith("greater")
        limit = f"{_BOUNDS[kind]} {_plain(bound)}{_unit(path)}"
        return Problem(
            where=where, what="is too small" if low else "is too large", value=value, limit=limit
        )
    if kind == "literal_error":
        known = _expected(detail)
        return Problem(
            where=where,
            what=_WHATS[kind],
            value=value,
            limit=one_of(known),
            remedy=nearest_hint(detail["input"], known),
        )
    what = _WHATS.get(kind, f"is not right: {detail['msg']}")
    return Problem(where=where, what=what, value=value, remedy=_remedy(kind, detail["input"]))


def _remedy(kind: str, value: object) -> str:
    if kind in ("int_type", "float_type") and isinstance(value, str):
        return number_hint(value)
    if kind == "int_type" and isinstance(value, float) and value.is_integer():
        return f"Write {value:.0f}."
    if kind == "tuple_type":
        return "Put it in square brackets."
    return ""


def _unknown_key(
    path: tuple[str | int, ...],
    where: str,
    *,
    known: tuple[str, ...] = (),
) -> Problem:
    """Return the problem of a key nobody knows, with the nearest known one or its section."""
    key = str(path[-1])
    here = _section_of(path[:-1])
    known = known or sections().get(here, ())
    homes = [section for section, keys in sections().items() if key in keys and section != here]
    if homes and not nearest_hint(key, known, likeness_min_ratio=_MISSPELT_RATIO):
        remedy = f"It belongs {_place_of(homes[0])}."
    else:
        remedy = nearest_hint(key, known) or _hint_elsewhere(key)
    what = "is not a placement that can be given here" if "_every_m" in where else ""
    return Problem(
        where=where,
        what=what or "is not a known key",
        limit="" if remedy else one_of(known),
        remedy=remedy,
    )


def _hint_elsewhere(key: str) -> str:
    owners: dict[str, str] = {}
    for section, names in sections().items():
        owners |= {name: section for name in names if name not in owners}
    hint = nearest_hint(key, owners, template="{}")
    return f'Did you mean "{hint}" {_place_of(owners[hint])}?' if hint else ""


def _place_of(section: str) -> str:
    if not section:
        return "at the top of the file, before the first [section]"
    shapes = {"interface": "[interface.NAME]", "cables": "[cables.NAME]"}
    if section.partition(".")[0] in _CALLED:
        return f"in [[{section}]]"
    return f"in {shapes.get(section, f'[{section}]')}"


def _section_of(path: tuple[str | int, ...]) -> str:
    names = [part for part in path if isinstance(part, str)]
    nested = ".".join((names[0].replace("cables", "cable"), names[-1])) if names else ""
    return nested if nested in _NESTED else names[0] if names else ""


def _keys(model: type[BaseModel]) -> tuple[str, ...]:
    return tuple(field.alias or name for name, field in model.model_fields.items())


def _model_in(annotation: object) -> type[BaseModel]:
    """Return the model inside a field's annotation, whatever it is wrapped in."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next(model for model in map(_model_or_none, typing.get_args(annotation)) if model)


def _model_or_none(annotation: object) -> type[BaseModel] | None:
    try:
        return _model_in(annotation)
    except StopIteration:
        return None


def _expected(detail: ErrorDetails) -> tuple[str, ...]:
    words = str(detail["ctx"]["expected"]).replace(" or ", ", ").split(", ")
    return tuple(word.strip("'") for word in words)


def _unit(path: tuple[str | int, ...]) -> str:
    names: Iterator[str] = (part for part in reversed(path) if isinstance(part, str))
    for name in names:
        for ending, unit in _UNITS.items():
            if name.endswith(ending):
                return f" {unit}"
    return ""


def _plain(bound: object) -> str:
    return f"{bound:g}" if isinstance(bound, float) and bound < 1e6 else f"{bound:.0f}"


def _value_at(path: tuple[str | int, ...], data: object) -> object:
    for part in path:
        if isinstance(data, Mapping) or (isinstance(data, list) and isinstance(part, int)):
            data = data[part]  # type: ignore[index]
    return data
