"""The values a run takes where its file gives none, and which of them a plan rests on."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal, TypeAlias

from routeplan.errors import Problem, TableError
from routeplan.tables import load_rows

if TYPE_CHECKING:
    from routeplan.run.model import Run

__all__ = [
    "MERGED_BY_PLACEMENT",
    "AssumedValue",
    "PracticeRow",
    "PracticeValue",
    "Purpose",
    "assumed_values",
    "default_value",
    "practice_rows",
    "value_of",
]

Purpose: TypeAlias = Literal["link", "venue"]
PracticeValue: TypeAlias = (
    bool | int | float | str | tuple[int | float | str, ...] | dict[str, float | int]
)

MERGED_BY_PLACEMENT = ("slack.loop_m", "slack.undulation_ratio")
"""Tables of which a planner may give some placements; the others keep their default."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PracticeRow:
    """One default of a run: its dotted key, value, unit, and where it comes from."""

    name: str
    value: PracticeValue
    venue: PracticeValue | None = None
    unit: str
    source: str
    reason: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class AssumedValue:
    """A default that a plan rests on because its run does not say otherwise."""

    name: str
    value: int | float | str
    unit: str
    source: str
    reason: str


def practice_rows() -> tuple[PracticeRow, ...]:
    """Return the defaults of a run in the order of the run file."""
    return load_rows("practice", PracticeRow)


def default_value(name: str, purpose: Purpose = "link") -> PracticeValue:
    """
    Return the default of one dotted key.

    Raises
    ------
    TableError
        If the table has no such key.

    Examples
    --------
    >>> default_value("loss.margin_db"), default_value("loss.margin_db", "venue")
    (3.0, 1.0)
    """
    for row in practice_rows():
        if row.name == name:
            return _chosen(row, purpose)
    raise TableError(Problem(where="table practice", what="has no row", value=repr(name)))


def value_of(run: Run, key: str) -> object:
    """
    Return what a run takes for one dotted key, given or default.

    Parameters
    ----------
    run
        The run.
    key
        Dotted key as in the run file, for example `slack.joint_tail_m`, `cable.fibre_count`,
        `slack.undulation_ratio.duct` or `placement`; `circuit.` and `interface.` keys give the
        default of a circuit or interface that does not say.

    Raises
    ------
    TableError
        If there is no such key.
    """
    head, _, rest = key.partition(".")
    if head in ("circuit", "interface"):
        return default_value(key, run.purpose)
    value: object = run if not rest or head == "cable" else run.practice
    for part in key.split("."):
        found = value.get(part) if isinstance(value, Mapping) else getattr(value, part, None)
        if found is None and not hasattr(value, part):
            raise TableError(Problem(where="practice", what="has no key", value=repr(key)))
        value = found
    return value


def assumed_values(run: Run) -> tuple[AssumedValue, ...]:
    """Return every default the run rests on, in the order of the run file."""
    found: list[AssumedValue] = []
    for row in practice_rows():
        for name, value in _assumed_of_row(run, row):
            found.append(
                AssumedValue(
                    name=name, value=value, unit=row.unit, source=row.source, reason=row.reason
                )
            )
    return tuple(found)


def _assumed_of_row(run: Run, row: PracticeRow) -> Iterator[tuple[str, int | float | str]]:
    value = _chosen(row, run.purpose)
    if row.name.startswith("circuit."):
        yield from _circuits_without(run, row.name, value)
    elif row.name == "interface.penalty_db":
        yield from ((name, _flat(value)) for name in _interfaces_without_penalty(run))
    elif row.name in MERGED_BY_PLACEMENT and isinstance(value, dict):
        names = ((f"{row.name}.{part}", each) for part, each in value.items())
        yield from ((name, each) for name, each in names if name not in run.given)
    elif row.name not in run.given:
        if isinstance(value, dict) and value:
            yield from ((f"{row.name}.{part}", each) for part, each in value.items())
        else:
            yield row.name, _flat(value)


def _circuits_without(
    run: Run, name: str, default: PracticeValue
) -> Iterator[tuple[str, int | float | str]]:
    """Yield dotted key and value where circuits do not say; with none asked for, the default's."""
    key = name.partition(".")[2]
    if not run.circuits:
        yield name, _flat(default)
    for circuit in run.circuits:
        if f"circuit.{circuit.name}.{key}" not in run.given:
            yield f"circuit.{circuit.name}.{key}", _flat(getattr(circuit, key))


def _interfaces_without_penalty(run: Run) -> Iterator[str]:
    for name, interface in run.interfaces.items():
        key = f"interface.{name}.penalty_db"
        if interface.channel_loss_db is None and key not in run.given:
            yield key


def _chosen(row: PracticeRow, purpose: Purpose) -> PracticeValue:
    value = row.venue if purpose == "venue" and row.venue is not None else row.value
    return dict(value) if isinstance(value, dict) else value


def _flat(value: PracticeValue) -> int | float | str:
    if isinstance(value, dict | tuple):
        parts = (f"{part:.10g}" if isinstance(part, float) else str(part) for part in value)
        return ", ".join(parts) or "none"
    return str(value).lower() if isinstance(value, bool) else value
