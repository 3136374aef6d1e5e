"""What was computed before, keyed by the inputs of a stage, for whoever wants to re-plan fast."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import Any, TypeAlias, TypeVar

import numpy as np
from pydantic import BaseModel

__all__ = ["Memo", "fingerprint", "remembered"]

Memo: TypeAlias = OrderedDict[Hashable, Any]
"""Results by fingerprint, the latest last. Make one with `Memo()` and pass it to `plan`."""

Result = TypeVar("Result")

_MOST = 256  # results kept; the oldest goes first


def remembered(
    memo: Memo | None, inputs: tuple[object, ...], compute: Callable[[], Result]
) -> Result:
    """Return the result kept for these inputs, or compute and keep it."""
    if memo is None:
        return compute()
    key = fingerprint(inputs)
    if key in memo:
        memo.move_to_end(key)
        kept: Result = memo[key]
        return kept
    memo[key] = result = compute()
    while len(memo) > _MOST:
        memo.popitem(last=False)
    return result


def fingerprint(value: object) -> Hashable:
    """Return a key that is equal for equal inputs: arrays by their bytes, models by their text."""
    if isinstance(value, np.ndarray):
        return (value.shape, value.dtype.str, value.tobytes())
    if isinstance(value, BaseModel):
        return value.model_dump_json()
    if isinstance(value, dict):
        return tuple((key, fingerprint(entry)) for key, entry in sorted(value.items()))
    if isinstance(value, tuple | list):
        return tuple(fingerprint(entry) for entry in value)
    slots = getattr(type(value), "__dataclass_fields__", None)
    if slots is not None:
        return (type(value).__name__, *(fingerprint(getattr(value, name)) for name in slots))
    return value
