"""What a cable crosses, and where crossings are so near each other that they are one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["ChainCrossing", "crossing_zones"]

_NEIGHBOUR_MM = 10_000  # house rule: no crew puts a loop or a joint between crossings so near


@dataclass(frozen=True, slots=True, kw_only=True)
class ChainCrossing:
    """Something the cable crosses, from edge to edge."""

    crosses: str
    name: str
    start_mm: int
    end_mm: int


def crossing_zones(crossings: Sequence[ChainCrossing]) -> list[tuple[int, int, str]]:
    """
    Return where crossings begin and end, and their names; neighbours are one.

    The two tracks of a railway, or a road beside it, leave no room for a loop or a joint between.

    Parameters
    ----------
    crossings
        Crossings by where they begin.
    """
    zones: list[tuple[int, int, str]] = []
    for one in crossings:
        if zones and one.start_mm - zones[-1][1] <= _NEIGHBOUR_MM:
            start, end, names = zones[-1]
            name = names if one.name in names.split("; ") else f"{names}; {one.name}"
            zones[-1] = (start, max(end, one.end_mm), name)
        else:
            zones.append((one.start_mm, one.end_mm, one.name))
    return zones
