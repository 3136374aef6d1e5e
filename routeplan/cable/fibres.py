"""Circuits onto cables and fibres: the way of least glass, and the fibres free along it."""

from __future__ import annotations

import heapq
from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from itertools import pairwise

from routeplan.cable.model import Cable, FibreUse
from routeplan.errors import InputError, Problem
from routeplan.run.practice import CircuitOrder

__all__ = ["Hop", "Way", "assign_fibres", "circuit_ways", "least_glass_way", "meetings"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Hop:
    """A cable between two nodes where light can get in and out of it."""

    cable: str
    start: str
    end: str
    glass_mm: int


Way = tuple[tuple[Hop, bool], ...]
"""Hops in order along a circuit, each with whether it runs in the cable's own direction."""


def assign_fibres(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    *,
    site_nodes: Mapping[str, str],
    glass_mm: Mapping[str, int],
) -> tuple[FibreUse, ...]:
    """
    Give every circuit its cables and fibres.

    Each circuit takes the way of least glass. Circuits are served in file order, strand by strand:
    a strand takes the lowest fibre number free on all cables of its way, so that it keeps number
    and colour; where there is none, the lowest free number on each cable. Strand 1 carries light
    from `from` to `to`, strand 2 back.

    Parameters
    ----------
    circuits
        Circuits in file order, `from_` and `to` given.
    cables
        Cables in file order.
    site_nodes
        Node id of each site name.
    glass_mm
        Fibre length of each cable, by cable id. [mm]

    Returns
    -------
    uses
        By circuit in file order, by strand, then in order along the circuit; `forward` tells
        whether the circuit, from its `from` end, runs along the cable in the cable's direction.

    Raises
    ------
    InputError
        With every circuit that names no or an unknown site, one site twice, or sites no cables
        join, and every cable that has too few fibres.
    """
    ways, problems = _found_ways(circuits, cables, site_nodes, glass_mm)
    problems += _short_cables(circuits, cables, ways)
    if problems:
        raise InputError(problems)
    free = {cable.id: set(range(1, cable.make.fibre_count + 1)) for cable in cables}
    uses: list[FibreUse] = []
    for circuit in circuits:
        way = ways[circuit.name]
        for strand in range(1, circuit.fibre_count + 1):
            fibres = _strand_fibres([free[hop.cable] for hop, _ in way])
            for (hop, forward), fibre in zip(way, fibres, strict=True):
                free[hop.cable].remove(fibre)
                uses.append(
                    FibreUse(
                        circuit=circuit.name,
                        strand=strand,
                        cable=hop.cable,
                        fibre=fibre,
                        forward=forward,
                    )
                )
    return tuple(uses)


def circuit_ways(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    *,
    site_nodes: Mapping[str, str],
    glass_mm: Mapping[str, int],
) -> dict[str, Way]:
    """
    Return the way of least glass of every circuit, by circuit name.

    Raises
    ------
    InputError
        As `assign_fibres`, fibre counts left aside.
    """
    ways, problems = _found_ways(circuits, cables, site_nodes, glass_mm)
    if problems:
        raise InputError(problems)
    return ways


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


def meetings(uses: Iterable[FibreUse]) -> tuple[tuple[FibreUse, FibreUse], ...]:
    """Return each two uses that follow each other on one strand of a circuit."""
    return tuple(
        (one, other)
        for one, other in pairwise(uses)
        if (one.circuit, one.strand) == (other.circuit, other.strand)
    )


def _found_ways(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    site_nodes: Mapping[str, str],
    glass_mm: Mapping[str, int],
) -> tuple[dict[str, Way], list[Problem]]:
    """Return the ways of the circuits that have one, and what is wrong with the others."""
    hops = [
        Hop(cable=cable.id, start=cable.start, end=cable.end, glass_mm=glass_mm[cable.id])
        for cable in cables
    ]
    problems = list(_repeated_names(circuits))
    ways: dict[str, Way] = {}
    for circuit in circuits:
        found = list(_end_problems(circuit, site_nodes))
        if not found:
            ends = site_nodes[str(circuit.from_)], site_nodes[str(circuit.to)]
            way = least_glass_way(hops, start=ends[0], end=ends[1])
            if way is None:
                found.append(_no_way(circuit))
            else:
                ways[circuit.name] = way
        problems += found
    return ways, problems


def _strand_fibres(free: Sequence[set[int]]) -> list[int]:
    """Return the fibre a strand takes on each cable of its way."""
    common = set.intersection(*free)
    return [min(common)] * len(free) if common else [min(fibres) for fibres in free]


def _short_cables(
    circuits: Sequence[CircuitOrder], cables: Sequence[Cable], ways: Mapping[str, Way]
) -> list[Problem]:
    """Return a problem for every cable with fewer fibres than the circuits on it need."""
    needed: Counter[str] = Counter()
    takers: defaultdict[str, list[str]] = defaultdict(list)
    for circuit in circuits:
        for hop, _ in ways.get(circuit.name, ()):
            needed[hop.cable] += circuit.fibre_count
            takers[hop.cable].append(f'"{circuit.name}"')
    return [
        Problem(
            where=f'cable "{cable.name}"',
            what="has too few fibres for its circuits "
            + _listed(list(dict.fromkeys(takers[cable.id]))),
            value=f"{needed[cable.id]} fibres needed",
            limit=f"{cable.make.fibre_count} fibres",
            remedy=f"Order at least {needed[cable.id]} fibres there, or fewer circuits.",
        )
        for cable in cables
        if needed[cable.id] > cable.make.fibre_count
    ]


def _repeated_names(circuits: Sequence[CircuitOrder]) -> Iterable[Problem]:
    for name, count in Counter(circuit.name for circuit in circuits).items():
        if count > 1:
            yield Problem(
                where=f'circuit "{name}"',
                what=f"stands {count} times",
                remedy="Give every circuit a name of its own.",
            )


def _end_problems(circuit: CircuitOrder, site_nodes: Mapping[str, str]) -> Iterable[Problem]:
    """Yield what is wrong with the two sites of a circuit."""
    for key, site in (("from", circuit.from_), ("to", circuit.to)):
        if site is None or site not in site_nodes:
            yield Problem(
                where=f'circuit "{circuit.name}", {key}',
                what="names no site" if site is None else "is not the name of a site",
                value="" if site is None else f'"{site}"',
                remedy=_known_sites(site or "", site_nodes),
            )
    ends = [site_nodes.get(site or "") for site in (circuit.from_, circuit.to)]
    if None not in ends and ends[0] == ends[1]:
        yield Problem(
            where=f'circuit "{circuit.name}"',
            what="begins and ends at one site",
            value=f'"{circuit.from_}"',
            remedy="Name two different sites.",
        )


def _known_sites(site: str, site_nodes: Mapping[str, str]) -> str:
    """Return the nearest known site as a question, and a list of them."""
    by_fold = {name.casefold(): name for name in site_nodes}
    near = get_close_matches(site.casefold(), by_fold, n=1, cutoff=0.5)
    guess = f'Did you mean "{by_fold[near[0]]}"? ' if near else ""
    known = _listed([f'"{name}"' for name in site_nodes]) if site_nodes else "none"
    return f"{guess}Sites are {known}."


def _no_way(circuit: CircuitOrder) -> Problem:
    return Problem(
        where=f'circuit "{circuit.name}"',
        what=f'no cables join "{circuit.from_}" and "{circuit.to}"',
        remedy="Draw the missing line, or raise join_tolerance_m if its ends nearly meet.",
    )


def _listed(names: Sequence[str]) -> str:
    """Return the names in a row, the end of a long row as a count."""
    shown = ", ".join(names[:8])
    return shown if len(names) <= 8 else f"{shown} and {len(names) - 8} more"
