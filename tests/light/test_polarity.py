"""Transmit meets receive."""

from __future__ import annotations

from routeplan.light.polarity import PairElement, check_polarity


def pair(*swaps: bool, plant: bool = True) -> list[PairElement]:
    """Return two patch leads with the plant between them."""
    first, last = swaps
    return [
        PairElement(where="studio", kind="lead", swaps=first),
        PairElement(where="panel", kind="plant", swaps=plant),
        PairElement(where="hill", kind="lead", swaps=last),
    ]


def test_three_swaps_are_right() -> None:
    """Two leads that swap and one roll in the plant."""
    assert check_polarity(pair(True, True), where="c") == []
    assert check_polarity(pair(False, True, plant=False), where="c") == []


def test_the_straight_lead_is_named() -> None:
    """A lead that goes straight through is the odd one."""
    (problem,) = check_polarity(pair(True, False), where="c")
    assert "hill goes straight" in problem.what
    assert problem.value == "swapped 2 times"


def test_plant_without_its_roll_is_named() -> None:
    """With both leads right, the plant is what lacks a roll."""
    (problem,) = check_polarity(pair(True, True, plant=False), where="c")
    assert "nothing between the panels" in problem.what


def test_a_roll_too_many_is_named() -> None:
    """Two rolls in the plant undo each other."""
    elements = [*pair(True, True), PairElement(where="cabinet", kind="plant", swaps=True)]
    (problem,) = check_polarity(elements, where="c")
    assert "rolled at panel, cabinet" in problem.what
