"""Cables side by side share a closure where their joints fall on one place."""

from __future__ import annotations

from collections import defaultdict

import pytest

from routeplan.planning import Plan, plan
from routeplan.sheets.card_svg import card_svg
from routeplan.sheets.cards import cards_text
from routeplan.sheets.document import plan_document
from tests.drawn_runs import lonlat, make_line, make_place, make_run
from tests.sheets.made_up_run import Row

HEAD = (
    "[reels]\nput_ups_m = [700]\n[joints]\nassumed_spacing_m = 2000\n{limits}"
    "[costs]\njoint_each = 450.0\nsplice_each = 18.0\n"
)
BOTH = '[cables.One]\nlegs = ["a"]\n[cables.Two]\nlegs = ["a"]\nfibre_count = 48\n'


def planned(toml: str = BOTH, *, limits: str = "") -> Plan:
    """Return a kilometre with one place for a joint, and cables along it."""
    places = [
        make_place("site", lonlat((0, 0))[0], "West"),
        make_place("site", lonlat((0, 1000))[0], "East"),
        make_place("handhole", lonlat((0, 500))[0], "Hole"),
    ]
    line = make_line(lonlat((0, 0), (0, 1000)), "duct", leg="a")
    return plan(make_run([line], places, toml=HEAD.format(limits=limits) + toml))


def drawn(toml: str = BOTH, *, limits: str = "") -> Row:
    """Return the document of that plan."""
    return plan_document(planned(toml, limits=limits))


def test_two_joints_at_one_place_are_one_closure_and_one_visit() -> None:
    """The second pays 48 splices and no closure; totals count one, the bill adds up."""
    made = planned()
    document: Row = plan_document(made)
    first, second = document["joints"]
    assert (first["closure"], second["closure"]) == ("J1", "J1")
    assert first["cost"] == pytest.approx(450 + 24 * 18)
    assert second["cost"] == pytest.approx(48 * 18)
    totals = document["totals"]
    assert (totals["joint_count"], totals["closure_count"]) == (2, 1)
    assert totals["splice_count"] == 72
    assert totals["cost"] == document["layout"]["cost"]
    paid = sum(row["cost"] for row in (first, second))
    reels = sum(reel.cost_cents for reel in made.layout.reels) / 100
    assert totals["cost"] == pytest.approx(paid + reels)
    assert document["layout"]["lower_bound"] == totals["cost"]
    assert document["layout"]["one_fewer"] is None


def test_their_trays_are_numbered_through() -> None:
    """Six trays of twelve, no position twice, the first cable's before the second's."""
    rows = drawn()["splices"]
    assert len({(row["tray"], row["position"]) for row in rows}) == len(rows) == 72
    trays = defaultdict(set)
    for row in rows:
        trays[row["joint"]].add(row["tray"])
    assert trays == {"J1": {1, 2}, "J2": {3, 4, 5, 6}}


def test_they_have_one_card() -> None:
    """As text and drawn it lists the ends of both cables; either joint's name finds it."""
    document = drawn()
    text = cards_text(document)
    assert "\f" not in text
    assert "CLOSURE J1 + J2" in text
    assert card_svg(document, "J1") == card_svg(document, "J2")
    for section in ("S1 from", "S2 to", "S3 from", "S4 to"):
        assert section in text
        assert section in card_svg(document, "J1")


@pytest.mark.parametrize("limits", ["closure_splices_max = 71\n", "closure_ports = 3\n"])
def test_a_closure_that_cannot_hold_both_is_not_shared(limits: str) -> None:
    """One splice or one port too few, and each has its own, paid in full."""
    document = drawn(limits=limits)
    assert [row["closure"] for row in document["joints"]] == ["J1", "J2"]
    assert document["totals"]["closure_count"] == 2
    assert document["joints"][1]["cost"] == pytest.approx(450 + 48 * 18)


def test_what_goes_into_a_shared_closure_is_checked_as_a_whole() -> None:
    """72 splices and 4 ends against limits of just that fit, in one check each."""
    limits = "closure_splices_max = 72\nclosure_ports = 4\n"
    checks = drawn(limits=limits)["checks"]
    found = {row["kind"]: row for row in checks if row["kind"].startswith("closure")}
    assert (found["closure splices"]["value"], found["closure ports"]["value"]) == (72, 4)
    assert {row["verdict"] for row in found.values()} == {"fits"}


def test_one_cable_shares_with_nobody() -> None:
    """A cable alone costs what it did, its closure is its own."""
    document = drawn("")
    (joint,) = document["joints"]
    assert (joint["closure"], joint["cost"]) == ("J1", pytest.approx(450 + 24 * 18))
    assert document["totals"]["closure_count"] == 1
