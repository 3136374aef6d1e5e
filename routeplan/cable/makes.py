"""Makes of cable: what follows from how one is built."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from routeplan.run.practice import CableMake
from routeplan.tables import load_rows

__all__ = ["MakeRow", "has_metal", "make_of"]


@dataclass(frozen=True, slots=True, kw_only=True)
class MakeRow:
    """One make: `metal` is "may" where some cables of it have metal and some have not."""

    name: str
    glass_over_sheath_ratio: float
    metal: Literal["yes", "no", "may"]
    is_outdoor: bool
    is_buried: bool
    is_indoor: bool
    indoor_max_m: float | None = None
    source: str
    confidence: str


def make_of(cable: CableMake) -> MakeRow | None:
    """Return the row of a cable's make, None where it does not say."""
    rows = load_rows("cable_makes", MakeRow)
    return next((row for row in rows if row.name == cable.make), None)


def has_metal(cable: CableMake) -> bool | None:
    """Return whether a cable has metal in it, None where that is not known."""
    if cable.metal is not None:
        return cable.metal
    row = make_of(cable)
    return {"yes": True, "no": False}.get(row.metal) if row else None
