"""Whether transmit meets receive at the far end of a pair of fibres."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from routeplan.errors import Problem

__all__ = ["PairElement", "check_polarity", "crossing_count"]


@dataclass(frozen=True, slots=True, kw_only=True)
class PairElement:
    """
    One thing a pair of fibres goes through, and whether it swaps the two.

    Patch leads are made to swap. Of the plant between two panels one thing is to swap: a panel
    position wired the other way round, or a coupler that turns a plug over.
    """

    where: str
    kind: Literal["lead", "plant"]
    swaps: bool


def crossing_count(elements: Sequence[PairElement]) -> int:
    """
    Return how often a pair is swapped on its way.

    Examples
    --------
    >>> crossing_count([PairElement(where="studio", kind="lead", swaps=True)])
    1
    """
    return sum(element.swaps for element in elements)


def check_polarity(elements: Sequence[PairElement], *, where: str) -> list[Problem]:
    """
    Return a problem if the pair is swapped an even number of times, naming what is odd about it.

    An odd number lets each transmitter meet the receiver at the other end.
    """
    count = crossing_count(elements)
    if count % 2 == 1:
        return []
    straight = [e.where for e in elements if e.kind == "lead" and not e.swaps]
    rolls = [e.where for e in elements if e.kind == "plant" and e.swaps]
    if straight:
        odd = f"the patch lead at {straight[0]} goes straight through"
        remedy = "Take a lead that swaps its two fibres there."
    elif rolls:
        odd = f"the pair is rolled at {', '.join(rolls)}"
        remedy = f"Take the roll at {rolls[-1]} out, or swap the plugs of one lead."
    else:
        odd = "nothing between the panels swaps the pair"
        remedy = "Swap the two positions at one panel, or the plugs of one lead."
    return [
        Problem(
            where=where,
            what=f"transmit meets transmit: {odd}",
            value=f"swapped {count} times",
            limit="an odd number of times",
            remedy=remedy,
        )
    ]
