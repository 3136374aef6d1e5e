"""Printed jacket marks: metres along a section as a crew reads them on the cable."""

from __future__ import annotations

import pytest

from routeplan.errors import RunFileError
from routeplan.planning import Plan, plan
from routeplan.sheets.cards import cards_text
from routeplan.sheets.document import plan_document
from tests.drawn_runs import lonlat, make_line, make_place, make_run

HEAD = "[reels]\nput_ups_m = [700]\n[joints]\nassumed_spacing_m = 2000\n"


def mark(reel: str, start_m: float, *, falling: bool = False) -> str:
    """Return the entry of one reel in a run file."""
    return f'[[mark]]\nreel = "{reel}"\nstart_m = {start_m}\nfalling = {str(falling).lower()}\n'


def planned(toml: str) -> Plan:
    """Return a kilometre in two sections, on reels R1 and R2."""
    places = [make_place("handhole", lonlat((0, 500))[0], "Hole")]
    return plan(make_run([make_line(lonlat((0, 0), (0, 1000)), "duct")], places, toml=HEAD + toml))


def test_marks_rise_and_fall_along_sections() -> None:
    """A mark is the one at the section's start, plus or less the jacket from there."""
    toml = mark("R1", 12.25) + mark("R2", 5000, falling=True)
    document = plan_document(planned(toml))
    stations = document["stations"]
    assert {row["section"] for row in stations} == {"S1", "S2"}
    for row in stations:
        along_m = row["section_m"]
        expected = 12.25 + along_m if row["section"] == "S1" else 5000 - along_m
        assert row["jacket_mark_m"] == pytest.approx(expected, abs=1e-9)
    (joint,) = document["joints"]
    length_m = document["sections"][0]["sheath_m"]
    marks = [end["jacket_mark_m"] for end in joint["ends"]]
    assert marks == [pytest.approx(12.25 + length_m, abs=1e-9), 5000.0]
    card = " ".join(cards_text(document).split())
    assert f"marked {12.25 + length_m:.1f} m" in card
    assert "marked 5 000.0 m" in card


def test_without_marks_there_are_none() -> None:
    """Where no reel's marks are known nothing is said of them."""
    document = plan_document(planned(""))
    assert {row["jacket_mark_m"] for row in document["stations"]} == {None}
    assert "marked" not in cards_text(document)


def test_marks_that_cannot_be_are_warned_of() -> None:
    """A reel that there is not, and marks that fall below nothing, are named and not used."""
    toml = (
        '[[mark]]\nreel = "R9"\nstart_m = 1\n[[mark]]\nreel = "R1"\nstart_m = 100\nfalling = true'
    )
    found = planned(toml)
    warnings = dict(found.warnings)
    assert "no reel has this name" in warnings['mark "R9"']
    assert "its marks fall from 100 m" in warnings["section S1"]
    marks = [row["jacket_mark_m"] for row in plan_document(found)["stations"]]
    assert None in marks
    assert all(mark is None or mark >= 0 for mark in marks)


def test_a_reel_is_marked_once() -> None:
    """Two marks of one reel contradict each other."""
    toml = mark("R1", 1) * 2
    with pytest.raises(RunFileError, match='mark "R1": stands 2 times'):
        planned(toml)
