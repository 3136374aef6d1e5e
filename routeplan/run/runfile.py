"""Reading a run file: TOML merged over the defaults, with every problem in it at once."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import Any, TypeAlias, TypeVar

from pydantic import BaseModel, ValidationError

from routeplan.errors import Problem, RunFileError
from routeplan.run.defaults import MERGED_BY_PLACEMENT, Purpose, default_value, practice_rows
from routeplan.run.names import cable_makes, connector_grades
from routeplan.run.optics import CircuitOrder, Interface, JointFigures, Panel, SectionFigures
from routeplan.run.practice import CableMake, JacketMark, LayerColumns, Practice, RunFile, RunHead
from routeplan.run.runfile_checks import check_declared, refuse_unbuilt, wavelengths_of
from routeplan.run.runfile_messages import note_errors
from routeplan.run.street_rules import LegOrder, StreetRules
from routeplan.run.trouble import Trouble

__all__ = ["Declared", "declared_from_table", "declared_from_text", "parsed_toml"]

Table: TypeAlias = dict[str, Any]
Model = TypeVar("Model", bound=BaseModel)

_MENDED = {"cable": 1, "cables": 2}  # how deep the keys of a section are that can be mended
_PRACTICE_PARTS = tuple(Practice.model_fields)


@dataclass(frozen=True, slots=True, kw_only=True)
class Declared:
    """
    What a run file says, defaults filled in; a part that is wrong is None or left out.

    `given` holds the dotted keys the file sets.
    """

    head: RunHead | None
    practice: Practice | None
    cable: CableMake | None
    cables: Mapping[str, CableMake] = field(default_factory=dict)
    interfaces: Mapping[str, Interface] = field(default_factory=dict)
    circuits: tuple[CircuitOrder, ...] = ()
    panels: tuple[Panel, ...] = ()
    joints: tuple[JointFigures, ...] = ()
    sections: tuple[SectionFigures, ...] = ()
    marks: tuple[JacketMark, ...] = ()
    layers: tuple[LayerColumns, ...] = ()
    streets: StreetRules | None = None
    legs: tuple[LegOrder, ...] = ()
    given: frozenset[str] = frozenset()


def declared_from_text(content: bytes, *, file: str, trouble: Trouble) -> Declared:
    """
    Read a run file's bytes; everything wrong with it is noted in `trouble`.

    Parameters
    ----------
    content
        The file's bytes; empty bytes give a run of defaults.
    file
        Its name, for messages.
    trouble
        Where problems are noted.
    """
    raw = parsed_toml(content, file=file, trouble=trouble)
    if raw is None:
        return Declared(head=None, practice=None, cable=None)
    return declared_from_table(raw, file=file, trouble=trouble)


def declared_from_table(raw: Table, *, file: str, trouble: Trouble) -> Declared:
    """Return what a run file's table says; everything wrong with it is noted in `trouble`."""
    given = frozenset(_given_keys(raw))
    refuse_unbuilt(raw, file=file, trouble=trouble)
    merged = _merged(raw)
    declared = _validated(merged, file=file, trouble=trouble, given=given)
    check_declared(declared, file=file, trouble=trouble)
    return _made(_graded(declared))


def _graded(declared: Declared) -> Declared:
    """Return what was declared with the figures of a connector grade where one is named."""
    practice = declared.practice
    figures = connector_grades().get((practice and practice.loss.connector_grade) or "")
    if practice is None or figures is None:
        return declared
    named = {f"connector_{key}": value for key, value in figures.items()}
    loss = practice.loss.model_copy(update=named)
    given = declared.given | {f"loss.{key}" for key in named}
    return replace(declared, practice=practice.model_copy(update={"loss": loss}), given=given)


def _made(declared: Declared) -> Declared:
    """Return what was declared with the stranding of a make where one is named without its own."""
    given = set(declared.given)

    def made(cable: CableMake, path: str, above: str) -> CableMake:
        key = "glass_over_sheath_ratio"
        ratio = cable_makes().get(cable.make or "")
        # A ratio of [cable] holds for the others, unless they name a make of their own.
        is_own = f"{path}.make" in given
        if ratio is None or f"{path}.{key}" in given or (not is_own and f"{above}.{key}" in given):
            return cable
        given.add(f"{path}.{key}")
        return cable.model_copy(update={key: ratio})

    cables = {
        name: made(cable, f"cables.{name}", "cable") for name, cable in declared.cables.items()
    }
    cable = declared.cable and made(declared.cable, "cable", "cable")
    return replace(declared, cable=cable, cables=cables, given=frozenset(given))


def parsed_toml(content: bytes, *, file: str, trouble: Trouble) -> Table | None:
    """Return the table that TOML bytes hold, or None with the problem noted."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        _refuse(
            trouble,
            file,
            what="is not UTF-8 text",
            value=f"byte {error.start} in line {line} is 0x{content[error.start]:02x}",
            remedy="Save the file as UTF-8.",
        )
        return None
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        _refuse(trouble, file, what="is not TOML", value=str(error).rstrip("."))
    except RecursionError:
        _refuse(trouble, file, what="is nested too deeply")
    except ValueError:
        _refuse(trouble, file, what="holds a number with too many digits")
    return None


def _refuse(trouble: Trouble, file: str, *, what: str, value: str = "", remedy: str = "") -> None:
    trouble.add(RunFileError, Problem(where=file, what=what, value=value, remedy=remedy))


def _given_keys(raw: Table, path: str = "") -> Iterator[str]:
    """Yield the dotted keys a file sets; circuits go by their names, or else their numbers."""
    for key, value in raw.items():
        here = f"{path}{key}"
        if isinstance(value, dict):
            if value or path:
                yield here
            yield from _given_keys(value, f"{here}.")
        elif here == "circuit" and isinstance(value, list):
            for number, item in enumerate(value, start=1):
                if isinstance(item, dict):
                    own = item.get("name")
                    name = own if isinstance(own, str) else f"Circuit {number}"
                    yield from (f"circuit.{name}.{each}" for each in item)
        else:
            yield here


def _merged(raw: Table) -> Table:
    """Return the file's table over the defaults, to be validated as a whole."""
    purpose: Purpose = "venue" if raw.get("purpose") == "venue" else "link"
    merged = {key: value for key, value in raw.items() if key not in _PRACTICE_PARTS}
    defaults = _default_tables(purpose)
    for key, value in defaults.pop("", {}).items():
        merged.setdefault(key, value)
    for part in (*_PRACTICE_PARTS, "cable"):
        merged[part] = _over(raw.get(part, {}), defaults[part], path=part)
    merged["cables"] = _each_over(raw.get("cables", {}), merged["cable"])
    merged["interface"] = _each_over(raw.get("interface", {}), defaults["interface"])
    merged["circuit"] = _circuits(raw.get("circuit", []), defaults["circuit"], merged["interface"])
    return merged


def _default_tables(purpose: Purpose) -> dict[str, Table]:
    tables: dict[str, Table] = {}
    for row in practice_rows():
        section, _, key = row.name.rpartition(".")
        tables.setdefault(section, {})[key] = default_value(row.name, purpose)
    return tables


def _over(given: object, defaults: object, *, path: str = "") -> Any:
    """Return a given table over its defaults; what is no table is left for validation."""
    if not isinstance(given, dict) or not isinstance(defaults, dict):
        return given
    merged = {**defaults, **given}
    for key in given.keys() & defaults.keys():
        if f"{path}.{key}" in MERGED_BY_PLACEMENT and isinstance(given[key], dict):
            merged[key] = {**defaults[key], **given[key]}
    return merged


def _each_over(given: object, defaults: object) -> Any:
    if not isinstance(given, dict):
        return given
    return {name: _over(table, defaults) for name, table in given.items()}


def _circuits(given: object, defaults: Table, interfaces: object) -> Any:
    if not isinstance(given, list):
        return given
    own = interfaces if isinstance(interfaces, dict) else {}
    return [_circuit(item, number, defaults, own) for number, item in enumerate(given, start=1)]


def _circuit(item: object, number: int, defaults: Table, own: Mapping[str, Any]) -> object:
    if not isinstance(item, dict):
        return item
    light = wavelengths_of(item.get("interface"), own) or defaults["wavelengths_nm"]
    return {"name": f"Circuit {number}", **defaults, "wavelengths_nm": light, **item}


def _validated(merged: Table, *, file: str, trouble: Trouble, given: frozenset[str]) -> Declared:
    """Validate the whole, then keep the parts that are right so that they are checked as well."""
    try:
        whole = RunFile.model_validate(merged)
    except ValidationError as error:
        note_errors(error, merged, file=file, trouble=trouble, given=given)
        return _sound_parts(merged, error, given=given)
    parts = {name: getattr(whole, name) for name in _PRACTICE_PARTS}
    return Declared(
        head=RunHead.model_construct(**{n: getattr(whole, n) for n in RunHead.model_fields}),
        practice=Practice.model_construct(**parts),
        cable=whole.cable,
        cables=whole.cables,
        interfaces=whole.interface,
        circuits=whole.circuit,
        panels=whole.panel,
        joints=whole.joint,
        sections=whole.section,
        marks=whole.mark,
        layers=whole.layer,
        streets=whole.streets,
        legs=whole.leg,
        given=given,
    )


def _sound_parts(merged: Table, error: ValidationError, *, given: frozenset[str]) -> Declared:
    """Return what validates with unknown keys out, and defaults in the head and in cables."""
    for detail in error.errors(include_url=False):
        _mend(merged, detail["loc"], unknown=detail["type"] == "extra_forbidden")
    head = {key: value for key, value in merged.items() if key in RunHead.model_fields}
    practice = {key: merged[key] for key in _PRACTICE_PARTS}
    return Declared(
        head=_model_or_none(RunHead, head),
        practice=_model_or_none(Practice, practice),
        cable=_model_or_none(CableMake, merged["cable"]),
        cables=_sound_models(CableMake, merged["cables"]),
        interfaces=_sound_models(Interface, merged["interface"]),
        circuits=_sound_list(CircuitOrder, merged["circuit"]),
        panels=_sound_list(Panel, merged.get("panel")),
        joints=_sound_list(JointFigures, merged.get("joint")),
        sections=_sound_list(SectionFigures, merged.get("section")),
        marks=_sound_list(JacketMark, merged.get("mark")),
        layers=_sound_list(LayerColumns, merged.get("layer")),
        streets=_model_or_none(StreetRules, merged.get("streets")),
        legs=_sound_list(LegOrder, merged.get("leg")),
        given=given,
    )


def _mend(merged: Table, path: tuple[str | int, ...], *, unknown: bool) -> None:
    depth = 0 if path[0] in RunHead.model_fields else _MENDED.get(str(path[0]))
    if unknown:
        depth = len(path) - 1
    if depth is None or len(path) <= depth:
        return
    table: Any = merged
    for part in path[:depth]:
        try:
            table = table[part]
        except (KeyError, IndexError, TypeError):  # mended already, with what it stood in
            return
    if isinstance(table, dict):
        table.pop(path[depth], None)
        if not unknown:
            defaults = _default_tables("link")["cable" if depth else ""]
            table.update({k: v for k, v in defaults.items() if k == path[depth]})


def _model_or_none(model: type[Model], data: object) -> Model | None:
    try:
        return model.model_validate(data)
    except ValidationError:
        return None


def _sound_list(model: type[Model], items: object) -> tuple[Model, ...]:
    found = (_model_or_none(model, item) for item in (items if isinstance(items, list) else ()))
    return tuple(each for each in found if each is not None)


def _sound_models(model: type[Model], tables: object) -> dict[str, Model]:
    if not isinstance(tables, dict):
        return {}
    found = {name: _model_or_none(model, table) for name, table in tables.items()}
    return {name: each for name, each in found.items() if each is not None}
