"""Panel ports: which fibres have one, which way light goes there, and the pigtails behind them."""

from __future__ import annotations

import pytest

from routeplan.planning import Plan, plan, ports
from routeplan.sheets.bill import bill_rows, pigtail_splice_count
from tests.drawn_runs import lonlat, make_line, make_place, make_run


def planned(toml: str) -> Plan:
    """Return a cable of six fibres from West past Mid to East."""
    lines = [
        make_line(lonlat((0, 0), (0, 400)), "duct", cable="Main"),
        make_line(lonlat((0, 400), (0, 900)), "duct", cable="Main"),
    ]
    spots = {"West": 0, "Mid": 400, "East": 900}
    places = [make_place("site", lonlat((0, at))[0], name) for name, at in spots.items()]
    return plan(make_run(lines, places, toml=f"[cable]\nfibre_count = 6\n{toml}"))


PAST = '[[circuit]]\nname = "Past"\nfrom = "West"\nto = "East"\n'
INTO = '[[circuit]]\nname = "Into"\nfrom = "East"\nto = "Mid"\nfibre_count = 1\n'


def test_fibres_of_circuits_have_ports() -> None:
    """Two fibres of a pair at either end: what is sent at one is received at the other."""
    found = [(p.site, p.port, p.fibre, p.circuit, p.light) for p in ports(planned(PAST))]
    assert found == [
        ("West", 1, 1, "Past", "out"),
        ("West", 2, 2, "Past", "in"),
        ("East", 1, 1, "Past", "in"),
        ("East", 2, 2, "Past", "out"),
    ]


def test_all_fibres_have_ports_where_all_are_terminated() -> None:
    """At the ends of the cable every fibre has one; where it passes only what is cut."""
    made = planned('terminate = "all"\n' + PAST + INTO)
    found = ports(made)
    assert [(p.fibre, p.circuit) for p in found if p.site == "West"] == [
        *((1, "Past"), (2, "Past")),
        *((3, ""), (4, ""), (5, ""), (6, "")),
    ]
    assert [(p.fibre, p.circuit, p.light) for p in found if p.site == "Mid"] == [
        (3, "Into", "both")
    ]
    assert {p.light for p in found if not p.circuit} == {"none"}
    assert len([p for p in found if p.site == "East"]) == 6


@pytest.mark.parametrize(
    ("toml", "behind"),
    [
        (PAST, 4),
        ('terminate = "all"\n' + PAST, 12),
        (PAST + INTO, 5),  # its splice at Mid is one of the closure's
        ('terminate = "all"\n' + PAST + INTO, 12),
        ('terminate = "all"\n' + PAST + "[loss]\npigtail_splices = 0\n", 0),
    ],
)
def test_pigtail_splices(toml: str, behind: int) -> None:
    """Those behind panels are counted, spares with them where all fibres are terminated."""
    made = planned(toml)
    assert pigtail_splice_count(made) == behind
    rows = {str(row["item"]): row["quantity"] for row in bill_rows(made)}
    assert rows.get("Pigtail with splice behind a panel", 0) == behind
    assert rows.get("Pigtail spliced in a closure", 0) == ("Into" in toml)
    assert sum(made.splice_counts.values()) == ("Into" in toml)
