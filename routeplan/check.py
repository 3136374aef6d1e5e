"""What a check is: a value, its limit, and whether it fits."""

from __future__ import annotations

from dataclasses import dataclass

from routeplan.light.model import Verdict

__all__ = ["Check", "verdict_on"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """One comparison of a value with its limit."""

    kind: str
    where: str
    value: float | None
    limit: float | None
    unit: str
    verdict: Verdict
    source: str


def verdict_on(holds: bool | None) -> Verdict:
    """Return the verdict on something that holds, does not, or is not known."""
    return "unknown" if holds is None else "fits" if holds else "fails"
