"""Ways over cables: the pieces between places where light gets in and out, and the least glass."""

from __future__ import annotations

import heapq
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from routeplan.cable.layout import LaidCable
from routeplan.cable.model import Cable

__all__ = ["Hop", "Way", "cable_hops", "entered_glass_mm", "least_glass_way", "whole_hops"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Hop:
    """
    A cable, or a piece of it, between two nodes where light can get in and out of it.

    `span_mm` are the chain values of the piece, None for the whole cable.
    """

    cable: str
    start: str
    end: str
    glass_mm: int
    span_mm: tuple[int, int] | None = None


Way = tuple[tuple[Hop, bool], ...]
"""Hops in order along a circuit, each with whether it runs in the cable's own direction."""


def cable_hops(laid: Sequence[LaidCable]) -> tuple[Hop, ...]:
    """
    Return the hops of cables: between each two of the places where one can be entered.

    Parameters
    ----------
    laid
        The cables, laid out.
    """
    hops: list[Hop] = []
    for cable in laid:
        way, rulers = cable.way, cable.rulers
        stops = [(0, way.cable.start, int(rulers.glass_mm[0]))]
        names = {passed.chain_mm: passed.node.id for passed in way.passed}
        stops += [(at, names[at], glass) for at, glass in entered_glass_mm(cable).items()]
        stops.append((way.length_mm, way.cable.end, int(rulers.glass_mm[-1])))
        hops += [
            Hop(
                cable=way.cable.id,
                start=one[1],
                end=other[1],
                glass_mm=other[2] - one[2],
                span_mm=(one[0], other[0]),
            )
            for one, other in combinations(stops, 2)
        ]
    return tuple(hops)


def entered_glass_mm(cable: LaidCable) -> dict[int, int]:
    """Return the glass before the middle of every loop entered at mid-span, by chain value. [mm]"""
    rulers = cable.rulers
    found = {}
    for passed in cable.way.passed:
        if passed.is_entered:
            # Arriving, in the middle of the loop, leaving.
            middle = np.flatnonzero(rulers.chain_mm == passed.chain_mm)[1]
            found[passed.chain_mm] = int(rulers.glass_mm[middle])
    return found


def whole_hops(cables: Sequence[Cable], glass_mm: Mapping[str, int]) -> tuple[Hop, ...]:
    """Return one hop for each cable, from end to end, with its glass by cable id. [mm]"""
    return tuple(
        Hop(cable=cable.id, start=cable.start, end=cable.end, glass_mm=glass_mm[cable.id])
        for cable in cables
    )


def least_glass_way(hops: Sequence[Hop], *, start: str, end: str) -> Way | None:
    """
    Return the way of least glass between two nodes, or None where there is none.

    Exact (Dijkstra). Ties go to the fewest hops, then to the hops earliest in `hops`, compared as
    sorted places in it, so that a circuit turned round takes the same way.
    """
    near: defaultdict[str, list[tuple[int, str, bool]]] = defaultdict(list)
    for index, hop in enumerate(hops):
        near[hop.start].append((index, hop.end, True))
        near[hop.end].append((index, hop.start, False))
    # Labels are (glass, hops, sorted places, ...): adding one hop to two of them never turns
    # their order round, which is what Dijkstra needs to be exact.
    queue: list[tuple[int, int, tuple[int, ...], str, tuple[tuple[int, bool], ...]]]
    queue = [(0, 0, (), start, ())]
    done: set[str] = set()
    while queue:
        glass_mm, count, places, node, way = heapq.heappop(queue)
        if node == end:
            return tuple((hops[index], forward) for index, forward in way)
        if node in done:
            continue
        done.add(node)
        for index, far, forward in near[node]:
            if far not in done:
                label = glass_mm + hops[index].glass_mm, count + 1
                step = tuple(sorted((*places, index))), far, (*way, (index, forward))
                heapq.heappush(queue, (*label, *step))
    return None
