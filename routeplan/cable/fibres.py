"""Circuits onto cables and fibres: the way of least glass, and the fibres free along it."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from itertools import pairwise

from routeplan.cable.fibre_choice import Strand, chosen_fibres
from routeplan.cable.fibre_wishes import hops_via, via_problems, wanted_problems
from routeplan.cable.hops import Hop, Way, least_glass_way
from routeplan.cable.model import Cable, FibreUse
from routeplan.errors import InputError, Problem
from routeplan.run.practice import CircuitOrder

__all__ = ["FibrePlan", "assign_fibres", "circuit_ways", "meetings"]


@dataclass(frozen=True, slots=True, kw_only=True)
class FibrePlan:
    """
    Fibres of all circuits, and how often a strand changes its number from cable to cable.

    `is_proven` says that it could not be less often.
    """

    uses: tuple[FibreUse, ...]
    change_count: int
    is_proven: bool


def assign_fibres(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    *,
    site_nodes: Mapping[str, str],
    hops: Sequence[Hop],
) -> FibrePlan:
    """
    Give every circuit its cables and fibres.

    Each circuit takes the way of least glass, over the cables it names if it names any. Fibres it
    names are kept. All others are chosen together, see `chosen_fibres`: the fewest changes of
    number from cable to cable, then the lowest numbers in file order, strand by strand. Strand 1
    carries light from `from` to `to`, strand 2 back.

    Parameters
    ----------
    circuits
        Circuits in file order, `from_` and `to` given.
    cables
        Cables in file order.
    site_nodes
        Node id of each site name.
    hops
        The pieces of cable between places where light gets in and out.

    Returns
    -------
    plan
        Uses by circuit in file order, by strand, then in order along the circuit; `forward` tells
        whether the circuit, from its `from` end, runs along the cable in the cable's direction.

    Raises
    ------
    InputError
        With every circuit that names no or an unknown site, one site twice, sites no cables
        join, or cables and fibres that it cannot have; and every cable with too few fibres.
    """
    ways, problems = _found_ways(circuits, cables, site_nodes, hops)
    problems += _short_cables(circuits, cables, ways)
    problems += wanted_problems(circuits, cables, ways)
    if problems:
        raise InputError(problems)
    counts = {cable.id: cable.make.fibre_count for cable in cables}
    strands = [
        (circuit, strand) for circuit in circuits for strand in range(1, circuit.fibre_count + 1)
    ]
    choice = chosen_fibres(
        [
            Strand(
                pieces=tuple((hop.cable, hop.span_mm) for hop, _ in ways[circuit.name]),
                wanted=circuit.fibres[strand - 1] if circuit.fibres else None,
            )
            for circuit, strand in strands
        ],
        counts,
    )
    if choice is None:
        raise InputError(_no_fibres(circuits))
    uses = tuple(
        FibreUse(
            circuit=circuit.name,
            strand=strand,
            cable=hop.cable,
            fibre=fibre,
            forward=forward,
            span_mm=hop.span_mm,
            start=hop.start,
            end=hop.end,
        )
        for (circuit, strand), fibres in zip(strands, choice.fibres, strict=True)
        for (hop, forward), fibre in zip(ways[circuit.name], fibres, strict=True)
    )
    return FibrePlan(uses=uses, change_count=choice.change_count, is_proven=choice.is_proven)


def circuit_ways(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    *,
    site_nodes: Mapping[str, str],
    hops: Sequence[Hop],
) -> dict[str, Way]:
    """
    Return the way of least glass of every circuit, by circuit name.

    Raises
    ------
    InputError
        As `assign_fibres`, fibres left aside.
    """
    ways, problems = _found_ways(circuits, cables, site_nodes, hops)
    if problems:
        raise InputError(problems)
    return ways


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
    hops: Sequence[Hop],
) -> tuple[dict[str, Way], list[Problem]]:
    """Return the ways of the circuits that have one, and what is wrong with the others."""
    problems = list(_repeated_names(circuits))
    ways: dict[str, Way] = {}
    known: dict[tuple[str, str, tuple[str, ...]], Way | None] = {}
    for circuit in circuits:
        found = [*_end_problems(circuit, site_nodes), *via_problems(circuit, cables)]
        if not found:
            asked = (site_nodes[str(circuit.from_)], site_nodes[str(circuit.to)], circuit.via)
            if asked not in known:
                allowed = hops_via(hops, cables, circuit.via)
                known[asked] = least_glass_way(allowed, start=asked[0], end=asked[1])
            way = known[asked]
            if way is None:
                found.append(_no_way(circuit))
            else:
                ways[circuit.name] = way
        problems += found
    return ways, problems


def _short_cables(
    circuits: Sequence[CircuitOrder], cables: Sequence[Cable], ways: Mapping[str, Way]
) -> list[Problem]:
    """Return a problem for every cable with fewer fibres than the circuits on it need somewhere."""
    loads: defaultdict[str, list[tuple[tuple[int, int] | None, CircuitOrder]]] = defaultdict(list)
    for circuit in circuits:
        for hop, _ in ways.get(circuit.name, ()):
            loads[hop.cable].append((hop.span_mm, circuit))
    needed = {cable.id: _most_needed(loads[cable.id]) for cable in cables}
    return [
        Problem(
            where=f'cable "{cable.name}"',
            what="has too few fibres for its circuits "
            + _listed(list(dict.fromkeys(f'"{circuit.name}"' for _, circuit in loads[cable.id]))),
            value=f"{needed[cable.id]} fibres needed",
            limit=f"{cable.make.fibre_count} fibres",
            remedy=f"Order at least {needed[cable.id]} fibres there, or fewer circuits.",
        )
        for cable in cables
        if needed[cable.id] > cable.make.fibre_count
    ]


def _most_needed(loads: Sequence[tuple[tuple[int, int] | None, CircuitOrder]]) -> int:
    """Return the fibres that circuits need where they need most of a cable at once."""
    steps: list[tuple[float, int]] = []
    for span, circuit in loads:
        low, high = span or (float("-inf"), float("inf"))
        steps += ((low, circuit.fibre_count), (high, -circuit.fibre_count))
    most = here = 0
    for _, change in sorted(steps):  # what ends at a point is taken off before what begins there
        here += change
        most = max(most, here)
    return most


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


def _no_fibres(circuits: Sequence[CircuitOrder]) -> Problem:
    """Return the problem of pieces that fit one by one, but were not fitted together."""
    return Problem(
        where="circuits",
        what="no fibres were found for all of them together "
        + _listed([f'"{circuit.name}"' for circuit in circuits]),
        remedy="Fix fewer fibres with `fibres`, or order more of them.",
    )


def _no_way(circuit: CircuitOrder) -> Problem:
    if circuit.via:
        return Problem(
            where=f'circuit "{circuit.name}", via',
            what=f'these cables do not join "{circuit.from_}" and "{circuit.to}"',
            value=_listed([f'"{name}"' for name in circuit.via]),
            remedy="Name every cable on its way.",
        )
    return Problem(
        where=f'circuit "{circuit.name}"',
        what=f'no cables join "{circuit.from_}" and "{circuit.to}"',
        remedy="Draw the missing line, or raise join_tolerance_m if its ends nearly meet.",
    )


def _listed(names: Sequence[str]) -> str:
    """Return the names in a row, the end of a long row as a count."""
    shown = ", ".join(names[:8])
    return shown if len(names) <= 8 else f"{shown} and {len(names) - 8} more"
