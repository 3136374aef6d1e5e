"""The summary on the terminal is short, right, and safe to look at."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import pytest

from routeplan.planning import Plan
from routeplan.sheets.summary import summary_text
from tests.sheets.plans import equator, line, planned, point

CIRCUIT = """
[[circuit]]
name = "{name}"
interface = "own"
wavelengths_nm = {wavelengths}
[interface.own]
wavelength_min_nm = 1260
wavelength_max_nm = 1625
channel_loss_db = {loss}
"""


def shown(plan: Plan) -> list[str]:
    """Return the summary's lines."""
    return summary_text(plan, folder=Path("sheets"), names=["a.csv", "plan.json"]).split("\n")


def words(line: str) -> list[str]:
    """Return what stands in the columns of a line."""
    return [part.strip() for part in line.split("  ") if part.strip()]


def test_duct_run_by_hand(duct_plan: Plan) -> None:
    """The figures worked out by hand stand in it, in groups of three."""
    lines = shown(duct_plan)
    assert lines[0] == "Two kilometres of duct"
    figures = dict(words(line) for line in lines[2:8])
    assert figures == {
        "ground": "2 000.0 m",
        "cable": "2 120.0 m",
        "glass": "2 145.4 m",
        "to order": "3 000.0 m on 2 reels",
        "joints": "1, 12 splices",
        "cost": "4 506.00 EUR, proven least",
    }
    assert words(lines[8])[0] == "assumed"
    table = [words(line) for line in lines if line.startswith(("reel", "R1", "R2"))]
    assert table == [
        ["reel", "length", "for", "joint at its end"],
        ["R1", "1 500.0 m", "1 302.5 m", "J1 H2"],
        ["R2", "1 500.0 m", "859.9 m", "Hill"],
    ]
    assert lines[-1] == "sheets: a.csv, plan.json"


def test_nothing_trails_a_line(many_plans: list[Plan]) -> None:
    """No line ends in blanks, and none is longer than a screen is wide by much."""
    for plan in many_plans:
        for text in shown(plan):
            assert text == text.rstrip()


def test_large_costs_are_grouped_throughout(duct_plan: Plan) -> None:
    """Every group of three of a large cost is parted by a blank, and a comma of a name stays."""
    proof = replace(duct_plan.layout.proof, cost_cents=123456789012, optimal=False)
    plan = replace(duct_plan, layout=replace(duct_plan.layout, proof=proof))
    assert any(text.endswith("1 234 567 890.12 EUR, not proven least") for text in shown(plan))


def test_stock_is_not_to_order(duct_plan: Plan) -> None:
    """Cable from stock does not count as ordered."""
    first, second = duct_plan.layout.reels
    reels = (replace(first, source="stock"), second)
    plan = replace(duct_plan, layout=replace(duct_plan.layout, reels=reels))
    assert "to order  1 500.0 m on 1 reel" in shown(plan)


def test_feet_are_shown_where_asked(tmp_path: Path) -> None:
    """With US units people see whole feet: 2000 m are 6562."""
    plan = planned(tmp_path, [line([equator(0), equator(2000)])], 'units = "us"')
    assert "ground    6 562 ft" in shown(plan)


def test_invented_prices_are_marked(tmp_path: Path) -> None:
    """A cost that rests on invented prices says so."""
    plan = planned(tmp_path, [line([equator(0), equator(2000)])])
    assert any(text.startswith("cost") and "invented" in text for text in shown(plan))


def test_reasons_stand_below_what_does_not_fit(tmp_path: Path) -> None:
    """A circuit that fails says why, below the table."""
    features = [line([equator(0), equator(2000)])]
    toml = CIRCUIT.format(name="Video", wavelengths=[1310], loss=0.5)
    lines = shown(planned(tmp_path, features, toml))
    assert any(words(text)[-1:] == ["fails"] for text in lines)
    assert any(text.startswith("Video: ") and "missing" in text for text in lines)


def test_failures_come_first_where_there_is_too_much(tmp_path: Path) -> None:
    """Of very many budgets a screenful is shown, what fails first, and the rest counted."""
    features = [line([equator(0), equator(20000)])]
    wavelengths = [*range(1530, 1590, 3), 1310.0]
    toml = CIRCUIT.format(name="Many", wavelengths=[float(nm) for nm in wavelengths], loss=10.0)
    plan = planned(tmp_path, features, toml)
    lines = shown(plan)
    rows = [words(text) for text in lines if text.startswith("Many  ")]
    assert len(rows) == 20
    assert {rows[0][1], rows[1][1]} == {"1310"}
    assert rows[0][-1] == "fails" != rows[2][-1]
    assert "...  22 more in loss_budget.csv" in lines


def test_many_reels_are_counted(duct_plan: Plan) -> None:
    """Of very many reels the first twenty are shown and the rest counted."""
    layout = duct_plan.layout
    plan = replace(duct_plan, layout=replace(layout, cuts=layout.cuts * 15))
    text = "\n".join(shown(plan))
    assert "10 more in reels.csv" in text


def test_names_cannot_steer_the_terminal(tmp_path: Path) -> None:
    """Marks that turn text about are spelt out wherever names stand, and long names cut."""
    features = [
        line([equator(0), equator(3000)]),
        point(equator(0), name="Hill\u202eEvil", kind="site"),
        point(equator(3000), name="x" * 300, kind="site"),
        point(equator(1500), name="two\u202elines", kind="handhole"),
    ]
    toml = 'title = "a\u2066b"\n[reels]\nput_ups_m = [1700]\n[joints]\nassumed_spacing_m = 5000\n'
    text = "\n".join(shown(planned(tmp_path, features, toml)))
    assert "a\\u2066b" in text
    assert "two\\u202elines" in text
    assert "x" * 41 not in text
    assert all(mark == "\n" or mark.isprintable() for mark in text)


class _Terminal:
    def isatty(self) -> bool:
        return True


def test_colour_only_on_a_terminal(
    duct_plan: Plan, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Verdicts have colour on a terminal, and none elsewhere or where it is not wanted."""
    assert "\033" not in "\n".join(shown(duct_plan))
    monkeypatch.delenv("NO_COLOR", raising=False)
    with monkeypatch.context() as patch:
        patch.setattr(sys, "stdout", _Terminal())
        coloured = shown(duct_plan)
    assert sum(text.endswith("\033[33munknown\033[0m") for text in coloured) == 4
    assert [text.replace("\033[33m", "").replace("\033[0m", "") for text in coloured] == shown(
        duct_plan
    )
    monkeypatch.setenv("NO_COLOR", "1")
    with monkeypatch.context() as patch:
        patch.setattr(sys, "stdout", _Terminal())
        plain = shown(duct_plan)
    assert plain == shown(duct_plan)


def test_no_circuit_is_said(tmp_path: Path) -> None:
    """Where no circuit can be assumed, that is said."""
    hub = equator(0)
    ring = [hub, [10.01, 0.0], [10.01, 0.01], hub]
    plan = planned(tmp_path, [line(ring)])
    assert plan.circuits == ()
    assert "no circuit" in shown(plan)
