"""Sheets of cables through several legs, against some of them, and beside each other."""

from __future__ import annotations

import re
from itertools import pairwise

import pytest

from routeplan.planning import plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.map_data import map_data
from routeplan.sheets.report import report_html
from tests.drawn_runs import lonlat, make_line, make_place, make_run
from tests.sheets.made_up_run import Row

LEGS = {"a": ((0, 0), (0, 900)), "b": ((0, 2000), (0, 900)), "spur": ((0, 900), (700, 900))}


def document(toml: str) -> Row:
    """Return the document of three legs that meet; b is drawn against the others."""
    lines = [make_line(lonlat(*ends), "duct", leg=name) for name, ends in LEGS.items()]
    spots = {"West": (0, 0), "East": (0, 2000), "Side": (700, 900)}
    places = [make_place("site", lonlat(at)[0], name) for name, at in spots.items()]
    places += [make_place("handhole", lonlat((0, at))[0], f"Hole {at}") for at in (300, 1200, 1700)]
    return plan_document(plan(make_run(lines, places, toml=toml)))


THROUGH = '[cables.Main]\nlegs = ["a", "b"]\n[[circuit]]\nname = "P"\nfrom = "Side"\nto = "West"\n'


def test_stations_run_along_their_leg() -> None:
    """On a leg that the cable takes backwards ground metres rise and its rulers fall."""
    stations = document(THROUGH)["stations"]
    on_b = [row for row in stations if row["leg"] == "b"]
    assert [row["name"] for row in on_b if row["kind"] in ("site", "joint")] == ["East", "J1"]
    for one, other in pairwise(on_b):
        assert one["ground_m"] < other["ground_m"]
        assert one["sheath_from_m"] >= other["sheath_to_m"]
        assert one["glass_from_m"] >= other["glass_to_m"]
    on_a = [row for row in stations if row["leg"] == "a"]
    # Both legs tell the same of the branch that they meet at.
    keys = ("sheath_from_m", "sheath_to_m", "glass_from_m", "glass_to_m", "section", "section_m")
    assert [on_a[-1][key] for key in keys] == [on_b[-1][key] for key in keys]
    assert on_a[-1]["sheath_to_m"] - on_a[-1]["sheath_from_m"] == pytest.approx(10.0)


def test_the_map_reads_the_same_rulers() -> None:
    """Rulers on the map step from one side of a station to the other, in the leg's direction."""
    made = document(THROUGH)
    legs = {leg["name"]: leg for leg in map_data(made)["legs"]}  # type: ignore[attr-defined]
    for name in ("a", "b"):
        columns = legs[name]["stations"]
        rows = [row for row in made["stations"] if row["leg"] == name]
        reading = 0
        for row, step, rise in zip(rows, columns["sheath"], columns["sheathStep"], strict=True):
            reading += step
            near, far = ("to", "from") if name == "b" else ("from", "to")
            assert reading == round(1000 * row[f"sheath_{near}_m"])
            assert reading + rise == round(1000 * row[f"sheath_{far}_m"])
        sections = [legs[name]["sections"][number][0] for number in columns["section"]]
        assert set(sections) <= {row["name"] for row in made["sections"]}


def test_two_cables_on_a_leg_have_stations_each() -> None:
    """Cables side by side are two in every table, and the way under them is counted once."""
    made = document('[cables.One]\nlegs = ["a", "spur"]\n[cables.Two]\nlegs = ["a", "b"]\n')
    assert [(row["name"], row["legs"]) for row in made["cables"]] == [
        ("One", ["a", "spur"]),
        ("Two", ["a", "b"]),
    ]
    on_a = {row["cable"] for row in made["stations"] if row["leg"] == "a"}
    assert on_a == {"One", "Two"}
    assert made["totals"]["ground_m"] == pytest.approx(2700.0, abs=0.05)
    assert made["totals"]["sheath_m"] > 2700.0 + 900.0


def test_the_report_tells_of_what_passes() -> None:
    """A cable that passes is opened where the card says, its other fibres are on no tray."""
    html = report_html(document(THROUGH))
    assert re.search(r"S\d+ passes, from [^:]+: open it at [^<]+, do not cut it", html)
    assert "On no tray" in html
    assert "pass uncut" in html
