"""Constants of the optical formulas, read from their table."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from routeplan.tables import load_rows

__all__ = ["LightConstant", "constant"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LightConstant:
    """One constant with its unit and where it comes from."""

    name: str
    value: float
    unit: str
    source: str
    confidence: str


@cache
def constant(name: str) -> float:
    """
    Return the constant `name` of the table `light_constants`, in the unit its name ends in.

    Examples
    --------
    >>> constant("speed_of_light_m_per_s")
    299792458.0
    """
    values: dict[str, float] = {
        row.name: row.value for row in load_rows("light_constants", LightConstant)
    }
    return values[name]
