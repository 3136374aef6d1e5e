"""All sheets of a plan are made, in one order, and written together."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from routeplan.planning import Plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.tables import csv_tables
from routeplan.sheets.write import LIST_NAME, SHEET_NAMES, json_text, make_sheets, write_sheets

# The sheets promised so far.
PROMISED = {
    "plan.json",
    "map.html",
    "report.html",
    "splice_schedule.csv",
    "stations.csv",
    "reels.csv",
    "panels.csv",
    "cards.txt",
    "loss_budget.csv",
    "bill.csv",
    "checks.csv",
    "assumptions.csv",
}


def test_every_promised_sheet_is_written(duct_plan: Plan, tmp_path: Path) -> None:
    """All promised sheets and their list are written, and their paths returned."""
    paths = write_sheets(duct_plan, tmp_path)
    assert set(SHEET_NAMES) >= PROMISED
    assert [path.name for path in paths] == list(SHEET_NAMES)
    assert {path.name for path in tmp_path.iterdir()} == {*SHEET_NAMES, LIST_NAME}


def test_plan_json_holds_the_document(duct_plan: Plan, tmp_path: Path) -> None:
    """plan.json reads back as exactly the document."""
    write_sheets(duct_plan, tmp_path)
    text = (tmp_path / "plan.json").read_text("utf-8")
    assert json.loads(text) == plan_document(duct_plan)


def test_each_sheet_is_told_as_it_is_made(duct_plan: Plan) -> None:
    """Whoever watches hears of every sheet once, in order."""
    heard: list[str] = []
    assert tuple(make_sheets(duct_plan, on_sheet=heard.append)) == SHEET_NAMES
    assert heard == list(SHEET_NAMES)


def test_sheets_of_a_plan_are_always_the_same(duct_plan: Plan) -> None:
    """Making the sheets twice gives the same text."""
    assert make_sheets(duct_plan) == make_sheets(duct_plan)


def test_every_sheet_is_utf_8_with_plain_newlines(hostile_plan: Plan, tmp_path: Path) -> None:
    """Every sheet is UTF-8; outside quoted cells lines end in one newline on every system."""
    for path in write_sheets(hostile_plan, tmp_path):
        text = path.read_bytes().decode("utf-8")
        assert text.endswith(("\n", "</script>", "</html>")), path.name
        assert "\r\n" not in text
        assert not text.startswith("\ufeff")


def test_json_has_a_row_a_line() -> None:
    """Rows of a list stand on lines of their own, so that two plans can be compared by line."""
    text = json_text({"a": 1, "rows": [{"b": 1.5}, {"b": None}], "none": [], "text": "é\n"})
    assert text == (
        '{\n "a": 1,\n "rows": [\n  {"b": 1.5},\n  {"b": null}\n ],\n "none": [],\n '
        '"text": "é\\n"\n}\n'
    )


@pytest.mark.parametrize("value", [float("nan"), float("inf"), -float("inf")])
def test_json_never_holds_what_is_no_number(value: float) -> None:
    """What JSON has no word for is an error, not a word of our own."""
    with pytest.raises(ValueError, match="JSON"):
        json_text({"a": value})


def test_csv_sheets_come_from_the_catalogue() -> None:
    """The CSV sheets are those of the catalogue."""
    assert {entry.csv for entry in csv_tables()} == {n for n in SHEET_NAMES if n.endswith(".csv")}


def test_public_names_need_nothing_heavy(tmp_path: Path) -> None:
    """The package's own names lead from a file to its sheets."""
    import routeplan
    from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, write_run

    run: Any = routeplan.read_run(write_run(tmp_path, DUCT_FEATURES, DUCT_TOML))
    planned = routeplan.plan(run)
    assert isinstance(run, routeplan.Run)
    assert isinstance(planned, routeplan.Plan)
    assert routeplan.write_sheets(planned, tmp_path / "sheets")[-1].name == "plan.json"
    with pytest.raises(AttributeError, match="no attribute 'plans'"):
        routeplan.plans  # noqa: B018
