"""The checks of a plan: each with its value, its limit and a verdict that follows from them."""

from __future__ import annotations

import pytest

from routeplan.planning import Plan, plan
from tests.drawn_runs import make_line, make_run, straight

CIRCUIT = """
[[circuit]]
name = "Programme"
interface = "own-link"
wavelengths_nm = [1310]

[interface.own-link]
wavelength_nm = 1310
tx_min_dbm = {tx_min}
tx_max_dbm = {tx_max}
rx_sensitivity_dbm = -20.0
rx_overload_dbm = -3.0
"""


def planned(length_m: float, *, tx_min: float = -5.0, tx_max: float = -3.0, more: str = "") -> Plan:
    toml = more + CIRCUIT.format(tx_min=tx_min, tx_max=tx_max)
    return plan(make_run([make_line(straight(length_m))], toml=toml))


def test_margins_that_hold_and_fail() -> None:
    """A short link fits, a long one fails, and the plan's verdict follows."""
    short, long = planned(1000.0), planned(60_000.0)
    for each, verdict in ((short, "fits"), (long, "fails")):
        margins = [check for check in each.checks if check.kind == "margin"]
        assert len(margins) == 2
        assert {check.verdict for check in margins} == {verdict}
        assert all((check.value or 0) >= (check.limit or 0) for check in margins) == (
            verdict == "fits"
        )
        assert each.verdict == verdict


def test_what_is_not_known_is_unknown_and_not_failing() -> None:
    """Without an interface nothing is known of the light, and nothing fails."""
    each = plan(make_run([make_line(straight(1000.0))]))
    margins = [check for check in each.checks if check.kind == "margin"]
    assert {check.verdict for check in margins} == {"unknown"}
    assert {check.value for check in margins} == {None}
    assert each.verdict == "unknown"


def test_too_much_light_is_mended_by_an_attenuator() -> None:
    """A transmitter too strong for a short link is checked with the attenuator that mends it."""
    each = planned(500.0, tx_min=1.0, tx_max=2.0)
    kinds = {check.kind for check in each.checks}
    assert "overload with attenuator" in kinds
    for check in each.checks:
        if check.kind == "overload with attenuator":
            assert check.value is not None
            assert check.limit is not None
            assert 0 < check.value <= check.limit
            assert check.verdict == "fits"


def test_every_section_is_checked_against_its_reel() -> None:
    """Each section has a check of the cable it needs against its reel, and all hold."""
    each = plan(make_run([make_line(straight(9000.0))]))
    checks = [check for check in each.checks if check.kind == "section on reel"]
    assert len(checks) == len(each.layout.sections)
    for check, section in zip(checks, each.layout.sections, strict=True):
        assert check.value == section.needed_mm / 1000
        assert check.value <= (check.limit or 0)
        assert check.verdict == "fits"


@pytest.mark.parametrize("most", [None, 3])
def test_the_number_of_joints_is_checked_where_it_is_limited(most: int | None) -> None:
    """A limit on joints is a check of each cable; without one there is none."""
    more = "[reels]\nput_ups_m = [1000, 4000]\n"
    more += "" if most is None else f"[joints]\nmax_count = {most}\n"
    each = plan(make_run([make_line(straight(3000.0))], toml=more))
    checks = [check for check in each.checks if check.kind == "joints"]
    assert len(checks) == (0 if most is None else 1)
    for check in checks:
        assert check.value == len(each.layout.joints)
        assert check.limit == most
        assert check.verdict == "fits"


def test_a_branch_closure_counts_for_no_one_cable() -> None:
    """The joint at a branch node does not use up the joints of the cable it is marked on."""
    from tests.drawn_runs import lonlat

    lines = [make_line(lonlat((0, 0), (0, 500))), make_line(lonlat((0, 200), (300, 200)))]
    each = plan(make_run(lines, toml="[joints]\nmax_count = 0"))
    assert len(each.layout.joints) == 1
    counts = [check.value for check in each.checks if check.kind == "joints"]
    assert counts == [0.0, 0.0, 0.0]
    assert each.verdict != "fails"


def test_what_is_counted_is_whole() -> None:
    """Joints and swaps are counted: 3 of them, not 3.000."""
    checks = planned(5000.0, more="[joints]\nmax_count = 3\n").checks
    counted = [check for check in checks if check.kind in ("joints", "polarity")]
    assert {check.kind for check in counted} == {"joints", "polarity"}
    assert all(type(check.value) is int for check in counted)
