"""Circuits take the way of least glass and the fibres the rules say."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import groupby, pairwise, product

import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.cable.fibres import assign_fibres, circuit_ways, meetings
from routeplan.cable.hops import Hop, least_glass_way, whole_hops
from routeplan.cable.model import Cable, FibreUse
from routeplan.errors import InputError
from routeplan.run.practice import CircuitOrder
from tests.cable.small_plants import make_cable, make_circuit

NODES = ("a", "b", "c", "d")
SITES = {node.upper(): node for node in NODES}


def assign(
    circuits: Sequence[CircuitOrder],
    cables: Sequence[Cable],
    glass_mm: Mapping[str, int] | None = None,
) -> tuple[FibreUse, ...]:
    """Assign with the sites A to D, every cable a metre of glass unless told."""
    glass_mm = glass_mm or {cable.id: 1000 for cable in cables}
    hops = whole_hops(cables, glass_mm)
    return assign_fibres(circuits, cables, site_nodes=SITES, hops=hops).uses


def strands(uses: Sequence[FibreUse]) -> dict[tuple[str, int], list[tuple[str, int, bool]]]:
    """Return cable, fibre and direction along every strand."""
    grouped = groupby(uses, key=lambda use: (use.circuit, use.strand))
    return {key: [(use.cable, use.fibre, use.forward) for use in of] for key, of in grouped}


# The same rules once more, by trying everything.


def all_ways(
    hops: Sequence[Hop], start: str, end: str, gone: tuple[tuple[int, bool], ...] = ()
) -> Iterator[tuple[tuple[int, bool], ...]]:
    """Yield every way that uses no cable twice, as (place in hops, forward)."""
    if start == end:
        yield gone
        return
    used = {index for index, _ in gone}
    for index, hop in enumerate(hops):
        for near, far, forward in ((hop.start, hop.end, True), (hop.end, hop.start, False)):
            if index not in used and near == start:
                yield from all_ways(hops, far, end, (*gone, (index, forward)))


def best_way(hops: Sequence[Hop], start: str, end: str) -> list[tuple[str, bool]] | None:
    """Return the way of least glass, fewest cables, earliest cables."""
    ways = [way for way in all_ways(hops, start, end) if way]
    if not ways:
        return None
    best = min(
        ways,
        key=lambda way: (
            sum(hops[index].glass_mm for index, _ in way),
            len(way),
            sorted(index for index, _ in way),
        ),
    )
    return [(hops[index].cable, forward) for index, forward in best]


@st.composite
def plants(draw: st.DrawFn) -> tuple[list[Cable], dict[str, int]]:
    """Draw up to five cables of few fibres between four nodes, with many ties in glass."""
    pairs = st.tuples(st.sampled_from(NODES), st.sampled_from(NODES))
    ends = draw(st.lists(pairs, min_size=1, max_size=5))
    cables = [
        make_cable(f"K{number}", *pair, fibre_count=draw(st.integers(2, 4)))
        for number, pair in enumerate(ends)
    ]
    return cables, {cable.id: draw(st.sampled_from([0, 1000, 2000])) for cable in cables}


@st.composite
def orders(draw: st.DrawFn) -> list[CircuitOrder]:
    """Draw up to three circuits between different sites."""
    ends = st.lists(st.sampled_from(sorted(SITES)), min_size=2, max_size=2, unique=True)
    return [
        make_circuit(f"circuit {number}", *pair, fibre_count=draw(st.integers(1, 2)))
        for number, pair in enumerate(draw(st.lists(ends, min_size=1, max_size=3)))
    ]


@given(plant=plants(), circuits=orders())
def test_equals_trying_everything(
    plant: tuple[list[Cable], dict[str, int]], circuits: list[CircuitOrder]
) -> None:
    """Ways and fibres are the best of all ways and of all sets of fibres together."""
    cables, glass_mm = plant
    hops = [Hop(cable=c.id, start=c.start, end=c.end, glass_mm=glass_mm[c.id]) for c in cables]
    ways = {c.name: best_way(hops, SITES[str(c.from_)], SITES[str(c.to)]) for c in circuits}
    free = {cable.id: list(range(1, cable.make.fibre_count + 1)) for cable in cables}
    asked = [(c.name, n) for c in circuits for n in range(1, c.fibre_count + 1)]
    if not all(ways.values()):
        best = None
    else:
        choices = joint_choices([ways[name] or () for name, _ in asked], free)
        best = min(choices, key=lambda all_: (sum(map(changes, all_)), all_), default=None)
    if best is None:
        with pytest.raises(InputError, match=r"no cables join|has too few fibres"):
            assign(circuits, cables, glass_mm)
        return
    assert strands(assign(circuits, cables, glass_mm)) == {
        (name, strand): [
            (cable, fibre, forward)
            for (cable, forward), fibre in zip(ways[name] or (), fibres, strict=True)
        ]
        for (name, strand), fibres in zip(asked, best, strict=True)
    }


def changes(fibres: Sequence[int]) -> int:
    """Return how often the number changes."""
    return sum(one != other for one, other in pairwise(fibres))


def joint_choices(
    ways: Sequence[Sequence[tuple[str, bool]]], free: Mapping[str, Sequence[int]]
) -> Iterator[tuple[tuple[int, ...], ...]]:
    """Yield every choice of fibres for all strands together, none used twice."""
    if not ways:
        yield ()
        return
    for fibres in product(*(free[cable] for cable, _ in ways[0])):
        left = {cable: list(numbers) for cable, numbers in free.items()}
        for (cable, _), fibre in zip(ways[0], fibres, strict=True):
            left[cable].remove(fibre)
        yield from ((fibres, *others) for others in joint_choices(ways[1:], left))


@given(plant=plants(), ends=st.permutations(NODES))
def test_a_way_turned_round_is_the_same(
    plant: tuple[list[Cable], dict[str, int]], ends: list[str]
) -> None:
    """From the other end a circuit takes the same cables, the other way round."""
    cables, glass_mm = plant
    hops = [Hop(cable=c.id, start=c.start, end=c.end, glass_mm=glass_mm[c.id]) for c in cables]
    there = least_glass_way(hops, start=ends[0], end=ends[1])
    back = least_glass_way(hops, start=ends[1], end=ends[0])
    assert back == (there and tuple((hop, not forward) for hop, forward in reversed(there)))


def test_two_circuits_on_one_cable() -> None:
    """Circuits take the lowest free fibres in file order, strand 1 first."""
    circuits = [make_circuit("One", "A", "B"), make_circuit("Two", "B", "A", fibre_count=1)]
    assert strands(assign(circuits, [make_cable("K", "a", "b")])) == {
        ("One", 1): [("K", 1, True)],
        ("One", 2): [("K", 2, True)],
        ("Two", 1): [("K", 3, False)],
    }


def test_number_is_kept_along_the_way() -> None:
    """A circuit over two cables takes the lowest number free on both."""
    cables = [make_cable("K", "a", "b"), make_cable("L", "c", "b")]
    circuits = [make_circuit("Short", "A", "B"), make_circuit("Through", "A", "C")]
    assert strands(assign(circuits, cables)) == {
        ("Short", 1): [("K", 1, True)],
        ("Short", 2): [("K", 2, True)],
        ("Through", 1): [("K", 3, True), ("L", 3, False)],
        ("Through", 2): [("K", 4, True), ("L", 4, False)],
    }


def test_an_earlier_circuit_makes_room() -> None:
    """Where a later circuit would have to change number, an earlier one takes another fibre."""
    cables = [make_cable("K", "a", "b", fibre_count=3), make_cable("L", "b", "c", fibre_count=2)]
    circuits = [make_circuit("Short", "A", "B"), make_circuit("Through", "A", "C", fibre_count=1)]
    assert strands(assign(circuits, cables)) == {
        ("Short", 1): [("K", 1, True)],
        ("Short", 2): [("K", 3, True)],
        ("Through", 1): [("K", 2, True), ("L", 2, True)],
    }


def test_number_changes_where_it_must() -> None:
    """With no number free on all cables, the number changes, to the lowest free one."""
    cables = [make_cable("K", "a", "b", fibre_count=2), make_cable("L", "b", "c", fibre_count=1)]
    wish = {"fibres": (1,)}
    circuits = [
        make_circuit("Short", "A", "B", fibre_count=1).model_copy(update=wish),
        make_circuit("Through", "A", "C", fibre_count=1),
    ]
    found = strands(assign(circuits, cables))
    assert found["Through", 1] == [("K", 2, True), ("L", 1, True)]


def test_least_glass_beats_fewest_cables() -> None:
    """A longer chain of cables is taken when it holds less glass; equal glass takes fewer."""
    cables = [
        make_cable("K", "a", "b"),
        make_cable("L", "b", "c"),
        make_cable("M", "a", "c"),
    ]
    circuits = [make_circuit("One", "A", "C")]

    def way(direct_mm: int) -> list[str]:
        glass_mm = {"K": 1000, "L": 1000, "M": direct_mm}
        hops = whole_hops(cables, glass_mm)
        found = circuit_ways(circuits, cables, site_nodes=SITES, hops=hops)
        return [hop.cable for hop, _ in found["One"]]

    assert way(2001) == ["K", "L"]
    assert way(2000) == ["M"]


def test_equal_ways_take_the_earliest_cables() -> None:
    """Of two ways alike, the one with the earliest cable of the file is taken from both ends."""
    cables = [
        make_cable("K", "c", "d"),
        make_cable("L", "a", "b"),
        make_cable("M", "b", "d"),
        make_cable("N", "a", "c"),
    ]
    circuits = [
        make_circuit("There", "A", "D", fibre_count=1),
        make_circuit("Back", "D", "A", fibre_count=1),
    ]
    assert strands(assign(circuits, cables)) == {
        ("There", 1): [("N", 1, True), ("K", 1, True)],
        ("Back", 1): [("K", 2, False), ("N", 2, False)],
    }


def test_two_unknown_sites_are_not_one_site() -> None:
    """Of a circuit whose two sites are unknown only that is said."""
    with pytest.raises(InputError) as caught:
        assign([make_circuit("One", "X", "Y")], [make_cable("K", "a", "b")])
    assert [problem.where for problem in caught.value.problems] == [
        'circuit "One", from',
        'circuit "One", to',
    ]


def test_no_circuits_use_no_fibres() -> None:
    """Without circuits no fibre is used."""
    assert assign([], [make_cable("K", "a", "b")]) == ()


def test_meetings_stay_on_one_strand() -> None:
    """Only uses that follow each other on one strand meet."""
    cables = [make_cable("K", "a", "b"), make_cable("L", "b", "c")]
    found = meetings(assign([make_circuit("Through", "A", "C")], cables))
    assert [(one.strand, one.cable, other.strand, other.cable) for one, other in found] == [
        (1, "K", 1, "L"),
        (2, "K", 2, "L"),
    ]


def test_all_problems_come_together() -> None:
    """Every wrong circuit and every cable too small is named in one error."""
    cables = [make_cable("K", "a", "b", fibre_count=3)]
    circuits = [
        make_circuit("Good", "A", "B"),
        make_circuit("Extra", "A", "B"),
        make_circuit("Mistyped", "A", "b "),
        make_circuit("Round", "A", "A"),
        make_circuit("Far", "A", "D"),
        make_circuit("Open", "A", None),
        make_circuit("Extra", "B", "A", fibre_count=1),
    ]
    with pytest.raises(InputError) as caught:
        assign(circuits, cables)
    assert [(problem.where, problem.what) for problem in caught.value.problems] == [
        ('circuit "Extra"', "stands 2 times"),
        ('circuit "Mistyped", to', "is not the name of a site"),
        ('circuit "Round"', "begins and ends at one site"),
        ('circuit "Far"', 'no cables join "A" and "D"'),
        ('circuit "Open", to', "names no site"),
        ('cable "K"', 'has too few fibres for its circuits "Good", "Extra"'),
    ]
    mistyped, short = caught.value.problems[1], caught.value.problems[-1]
    assert mistyped.remedy == 'Did you mean "B"? Sites are "A", "B", "C", "D".'
    assert (short.value, short.limit) == ("5 fibres needed", "3 fibres")


def test_a_full_cable_is_not_a_problem() -> None:
    """A cable all of whose fibres are used is enough."""
    cables = [make_cable("K", "a", "b", fibre_count=4)]
    circuits = [make_circuit("One", "A", "B"), make_circuit("Two", "A", "B")]
    assert sorted(use.fibre for use in assign(circuits, cables)) == [1, 2, 3, 4]


def test_long_lists_are_cut_short() -> None:
    """A message names eight sites and counts the rest."""
    sites = {f"Site {number}": f"n{number}" for number in range(20)}
    with pytest.raises(InputError, match=r'"Site 7" and 12 more'):
        assign_fibres([make_circuit("One", "Site 1", "Nowhere")], [], site_nodes=sites, hops=[])
