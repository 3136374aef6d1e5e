"""What circuits want of cables and fibres: kept, or named with what stands in the way."""

from __future__ import annotations

import pytest

from routeplan.cable.fibres import FibrePlan, assign_fibres
from routeplan.cable.hops import Hop
from routeplan.errors import InputError
from tests.cable.small_plants import make_cable, make_circuit

SITES = {"A": "a", "B": "b", "C": "c"}
CABLES = [
    make_cable("K", "a", "b", fibre_count=4),
    make_cable("L", "b", "c", fibre_count=2),
    make_cable("M", "a", "c", fibre_count=4),
]
HOPS = [
    Hop(cable="K", start="a", end="b", glass_mm=1000, span_mm=(0, 1000)),
    Hop(cable="L", start="b", end="c", glass_mm=1000, span_mm=(0, 1000)),
    Hop(cable="M", start="a", end="c", glass_mm=5000, span_mm=(0, 5000)),
]


def assigned(*wishes: dict[str, object]) -> FibrePlan:
    """Return the fibres of circuits of one fibre from A to C, unless they say otherwise."""
    circuits = []
    for number, wish in enumerate(wishes, start=1):
        plain = {"from_": "A", "to": "C", "fibre_count": 1} | wish
        made = make_circuit(f"circuit {number}", "A", "C", fibre_count=1)
        circuits.append(made.model_copy(update=plain))
    return assign_fibres(circuits, CABLES, site_nodes=SITES, hops=HOPS)


def test_wishes_are_kept() -> None:
    """Cables and fibres named are taken, round others that would have had them."""
    found = assigned({}, {"via": ("M",), "fibres": (4,)}, {"fibres": (1,)})
    uses = [(use.circuit, use.cable, use.fibre) for use in found.uses]
    assert uses == [
        ("circuit 1", "K", 2),
        ("circuit 1", "L", 2),
        ("circuit 2", "M", 4),
        ("circuit 3", "K", 1),
        ("circuit 3", "L", 1),
    ]
    assert (found.change_count, found.is_proven) == (0, True)


@pytest.mark.parametrize(
    ("wishes", "messages"),
    [
        ([{"via": ("N",)}], ['circuit "circuit 1", via: is not the name of a cable ("N"']),
        ([{"via": ("K",)}], ['via: these cables do not join "A" and "C" ("K")']),
        ([{"via": ("K", "L", "M")}], ['via: names a cable that its way does not take ("M")']),
        ([{"fibres": (1, 2)}], ["fibres: does not name one number for each fibre ([1, 2]"]),
        ([{"fibres": (3,)}], ['fibres: are more than cable "L" has (3, limit 1 to 2)']),
        (
            [{"fibres": (2,)}, {"fibres": (2,), "to": "B"}],
            ['fibres: are wanted by circuit "circuit 1" as well (fibre 2 of cable "K")'],
        ),
        ([{}, {}, {}], ['cable "L": has too few fibres for its circuits']),
    ],
)
def test_what_stands_in_the_way_is_named(
    wishes: list[dict[str, object]], messages: list[str]
) -> None:
    """Unknown cables, cables off the way, fibres that are not there or taken, and full cables."""
    with pytest.raises(InputError) as caught:
        assigned(*wishes)
    text = str(caught.value)
    for message in messages:
        assert message in text


def test_pieces_of_a_cable_count_where_they_lie() -> None:
    """Circuits on both sides of a place share fibres; only what overlaps needs more of them."""
    cable = [make_cable("K", "a", "c", fibre_count=1)]
    hops = [
        Hop(cable="K", start="a", end="b", glass_mm=1, span_mm=(0, 5)),
        Hop(cable="K", start="b", end="c", glass_mm=1, span_mm=(5, 9)),
        Hop(cable="K", start="a", end="c", glass_mm=2, span_mm=(0, 9)),
    ]
    ends = [("A", "B"), ("C", "B")]
    circuits = [make_circuit(f"{a}{b}", a, b, fibre_count=1) for a, b in ends]
    found = assign_fibres(circuits, cable, site_nodes=SITES, hops=hops)
    assert [use.fibre for use in found.uses] == [1, 1]
    circuits.append(make_circuit("AC", "A", "C", fibre_count=1))
    with pytest.raises(InputError, match="2 fibres needed, limit 1 fibres"):
        assign_fibres(circuits, cable, site_nodes=SITES, hops=hops)
