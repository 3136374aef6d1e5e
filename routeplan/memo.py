"""What was computed before, keyed by the inputs of a stage, for whoever wants to re-plan fast."""

from __future__ import annotations

from collections.abc import Callable, Hashable, Mapping
from dataclasses import dataclass, field
from hashlib import blake2b
from operator import attrgetter
from typing import Any, TypeVar, cast

import numpy as np
from pydantic import BaseModel

__all__ = ["Memo", "fingerprint", "remembered", "swept"]

Result = TypeVar("Result")

_PLAIN = frozenset({str, int, float, bool, type(None)})
_TURNS_KEPT = 3  # what the last plans used: enough to step back, and memory stays bounded


@dataclass(slots=True, eq=False)
class Memo:
    """
    Results of earlier plans. Make one with `Memo()` and pass it to every `plan` of a run.

    `results` holds each with the turn it was last used in; `prints` the fingerprint of every
    frozen thing seen, by its identity, with the thing itself so that the identity stays its own.
    """

    results: dict[Hashable, tuple[int, Any]] = field(default_factory=dict)
    prints: dict[int, tuple[int, object, Hashable]] = field(default_factory=dict)
    turn: int = 0


def remembered(
    memo: Memo | None, inputs: tuple[object, ...], compute: Callable[[], Result]
) -> Result:
    """
    Return the result kept for these inputs, or compute and keep it.

    Parameters
    ----------
    memo
        Where results are kept, or None to compute.
    inputs
        All that the result depends on, and a name of the stage; see `fingerprint`.
    compute
        Computes the result.
    """
    if memo is None:
        return compute()
    key = fingerprint(inputs, memo)
    kept: Result = memo.results[key][1] if key in memo.results else compute()
    memo.results[key] = (memo.turn, kept)
    return kept


def swept(memo: Memo | None) -> None:
    """Begin the next turn, forgetting what none of the last three used."""
    if memo is None:
        return
    memo.turn += 1
    oldest = memo.turn - _TURNS_KEPT
    memo.results = {key: kept for key, kept in memo.results.items() if kept[0] >= oldest}
    memo.prints = {key: kept for key, kept in memo.prints.items() if kept[0] >= oldest}


def fingerprint(value: object, memo: Memo | None = None) -> Hashable:
    """
    Return a key that is equal for equal inputs.

    Parameters
    ----------
    value
        Text, numbers, arrays, and tuples, lists, mappings, frozen dataclasses and models of them.
        What is frozen must not be changed from within either.
    memo
        Where the fingerprint of a frozen thing is kept from one time to the next.
    """
    if type(value) in _PLAIN:
        return value
    if isinstance(value, tuple):
        return tuple([e if type(e) in _PLAIN else fingerprint(e, memo) for e in value])
    if isinstance(value, np.ndarray):
        digest = blake2b(value.tobytes(), digest_size=16).digest()
        return (value.shape, value.dtype.str, digest)
    if memo is None:
        return _content(value, None)
    turn, _, key = memo.prints.get(id(value), (-1, None, None))
    if turn < 0:
        key = _content(value, memo)
    if turn != memo.turn:
        memo.prints[id(value)] = (memo.turn, value, key)
    return key


def _content(value: object, memo: Memo | None) -> Hashable:
    if isinstance(value, list):
        return fingerprint(tuple(value), memo)
    if isinstance(value, Mapping):
        return tuple([(key, fingerprint(entry, memo)) for key, entry in sorted(value.items())])
    if isinstance(value, BaseModel):
        return (type(value).__name__, value.model_dump_json())
    if isinstance(value, np.generic):
        return cast("Hashable", value.item())
    names = getattr(type(value), "__dataclass_fields__", None)
    if names is None:
        raise TypeError(f"no fingerprint of {type(value).__name__}")
    fields = attrgetter(*names, "__class__")(value)
    return (type(value).__name__, *fingerprint(fields[:-1], memo))  # type: ignore[misc]
