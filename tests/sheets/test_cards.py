"""The cards for the lids of closures: every fibre, every cable end, a page each."""

from __future__ import annotations

from routeplan.planning import plan
from routeplan.sheets.cards import cards_text
from routeplan.sheets.document import plan_document
from tests.drawn_runs import lonlat, make_line, make_place, make_run
from tests.sheets.made_up_run import HOSTILE_NAMES, Row


def entered_document() -> Row:
    """Return the document of a cable entered at a branch and at a site that it passes."""
    spots = {"West": (0, 0), "Mid": (0, 700), "East": (0, 1400), "Side": (400, 350)}
    lines = [
        make_line(lonlat((0, 0), (0, 350)), "duct", leg="a", cable="Main"),
        make_line(lonlat((0, 350), (0, 700)), "duct", leg="b", cable="Main"),
        make_line(lonlat((0, 700), (0, 1400)), "duct", leg="c", cable="Main"),
        make_line(lonlat((0, 350), (400, 350)), "duct", leg="d", cable="Spur"),
    ]
    places = [make_place("site", lonlat(at)[0], name) for name, at in spots.items()]
    toml = (
        '[[circuit]]\nname = "In"\nfrom = "Mid"\nto = "West"\n'
        '[[circuit]]\nname = "Spur"\nfrom = "Side"\nto = "East"\n'
    )
    return plan_document(plan(make_run(lines, places, toml=toml)))


def test_every_fibre_has_a_line(document: Row) -> None:
    """A card for each joint, with as many fibre lines as the schedule has rows for it."""
    cards = cards_text(document).split("\f")
    assert len(cards) == len(document["joints"]) == 3
    for card, joint in zip(cards, document["joints"], strict=True):
        assert f"CLOSURE {joint['name']}   {document['title']}" in card
        rows = [row for row in document["splices"] if row["joint"] == joint["name"]]
        lines = [line for line in card.splitlines() if line[:3].strip().isdigit()]
        assert len(lines) == len(rows)
        assert f"{joint['lat']:.6f}, {joint['lon']:.6f}" in card


def test_ends_carry_their_jacket_metres(document: Row) -> None:
    """A section that ends in a closure does so at its whole length, one that begins at nothing."""
    first = cards_text(document).split("\f")[0]
    section = document["sections"][0]
    metres = f"{section['sheath_m']:,.1f}".replace(",", "\N{NARROW NO-BREAK SPACE}").split()
    line = next(line for line in first.splitlines() if "S1 from" in line)
    assert " ".join(metres) in " ".join(line.split())
    assert any(
        "S2 to" in line and "at 0.0 m" in " ".join(line.split()) for line in first.splitlines()
    )


def test_a_cable_that_passes_is_not_cut() -> None:
    """At a branch and at a site the card says where to open the cable and what to leave."""
    document = entered_document()
    cards = cards_text(document).split("\f")
    passing = [card for card in cards if "passes, from West to East" in card]
    assert len(passing) == 2
    for card in passing:
        assert "do not cut it" in card
        assert "NOT CUT, on no tray" in card
        assert sum(" passes" in line and "do not" not in line for line in card.splitlines()) == 22
    joints = {joint["name"]: joint for joint in document["joints"]}
    assert all(joint["opened"] == ["S1"] for joint in joints.values())
    at_m = {
        station["name"]: station["section_m"]
        for station in document["stations"]
        if station["cable"] == "Main" and station["name"] in (*joints, "Mid")
    }
    for card in passing:
        name = "Mid" if "panel" in card else next(key for key in at_m if key != "Mid")
        assert f"open it at {at_m[name]:.1f}" in card


def test_no_page_is_made_by_a_name(document: Row) -> None:
    """Text from files stays on its line: no form feed and no line of its own."""
    for name in HOSTILE_NAMES:
        document["title"] = f"{name}\f\nCLOSURE X"
        document["joints"][0]["reach_name"] = f"{name}\nPlace"
        text = cards_text(document)
        assert text.count("\f") == len(document["joints"]) - 1
        assert sum(line.startswith("CLOSURE") for line in text.splitlines()) == 3
