"""What circuits want of their cables and fibres, and what keeps them from it."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence

from routeplan.cable.hops import Hop, Way
from routeplan.cable.model import Cable
from routeplan.errors import Problem
from routeplan.run.practice import CircuitOrder
from routeplan.run.trouble import listed, nearest_hint, one_of, shown

__all__ = ["hops_via", "via_problems", "wanted_problems"]


def hops_via(hops: Sequence[Hop], cables: Sequence[Cable], via: Sequence[str]) -> Sequence[Hop]:
    """Return the hops over the named cables, all of them where none is named."""
    if not via:
        return hops
    ids = {cable.id for cable in cables if cable.name in via}
    return [hop for hop in hops if hop.cable in ids]


def via_problems(circuit: CircuitOrder, cables: Sequence[Cable]) -> Iterator[Problem]:
    """Yield every name in a circuit's `via` that is no cable's."""
    known = [cable.name for cable in cables]
    for name in dict.fromkeys(circuit.via):
        if name not in known:
            yield Problem(
                where=f'circuit "{circuit.name}", via',
                what="is not the name of a cable",
                value=shown(name),
                limit=one_of(known),
                remedy=nearest_hint(name, known),
            )


def wanted_problems(
    circuits: Sequence[CircuitOrder], cables: Sequence[Cable], ways: Mapping[str, Way]
) -> Iterator[Problem]:
    """Yield what keeps circuits from the fibres they want, and named cables that are not used."""
    names = {cable.id: cable.name for cable in cables}
    counts = {cable.id: cable.make.fibre_count for cable in cables}
    taken: defaultdict[tuple[str, int], list[tuple[tuple[int, int] | None, str]]]
    taken = defaultdict(list)
    for circuit in circuits:
        way = ways.get(circuit.name, ())
        where = f'circuit "{circuit.name}"'
        used = {names[hop.cable] for hop, _ in way}
        for name in dict.fromkeys(circuit.via):
            if way and name not in used:
                yield Problem(
                    where=f"{where}, via",
                    what="names a cable that its way does not take",
                    value=shown(name),
                    remedy=f"Its way takes {listed(sorted(used))}.",
                )
        if circuit.fibres and len(circuit.fibres) != circuit.fibre_count:
            yield Problem(
                where=f"{where}, fibres",
                what="does not name one number for each fibre",
                value=str(list(circuit.fibres)),
                limit=f"fibre_count is {circuit.fibre_count}",
            )
            continue
        for hop, _ in way:
            for fibre in circuit.fibres:
                if fibre > counts[hop.cable]:
                    yield Problem(
                        where=f"{where}, fibres",
                        what=f'are more than cable "{names[hop.cable]}" has',
                        value=str(fibre),
                        limit=f"1 to {counts[hop.cable]}",
                    )
                for span, other in taken[hop.cable, fibre]:
                    if _overlap(span, hop.span_mm):
                        yield Problem(
                            where=f"{where}, fibres",
                            what=f'are wanted by circuit "{other}" as well',
                            value=f'fibre {fibre} of cable "{names[hop.cable]}"',
                            remedy="Give one of the two another number.",
                        )
                taken[hop.cable, fibre].append((hop.span_mm, circuit.name))


def _overlap(one: tuple[int, int] | None, other: tuple[int, int] | None) -> bool:
    return one is None or other is None or (one[0] < other[1] and other[0] < one[1])
