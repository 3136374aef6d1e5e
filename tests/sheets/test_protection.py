"""Separate ways and standby circuits on the sheets: all that they share, both budgets, delays."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from routeplan.planning import Plan, plan
from routeplan.run import read_run
from routeplan.sheets.document import plan_document
from routeplan.sheets.report import report_html

DEMO = Path(__file__).parents[2] / "demo_routes" / "two_studios"


@pytest.fixture(scope="module")
def planned() -> Plan:
    return plan(read_run(DEMO))


@pytest.fixture(scope="module")
def document(planned: Plan) -> dict[str, Any]:
    return plan_document(planned)


def test_every_exposure_stands_in_the_document(planned: Plan, document: dict[str, Any]) -> None:
    """The rows are those found with the pair, in order along the main way, and add up."""
    (row,) = document["separate_ways"]
    ways = planned.pairs[0].ways
    assert (row["main"], row["standby"], row["exact"]) == ("Main", "Standby", True)
    assert len(row["exposures"]) == len(ways.exposures) > 0
    begins_m = [each["from_ellipsoid_m"] for each in row["exposures"]]
    assert begins_m == sorted(begins_m)
    total_m = sum(each["ellipsoid_m"] for each in row["exposures"])
    assert row["exposed_ellipsoid_m"] == pytest.approx(total_m, abs=0.01)
    lengths = {leg["name"]: leg["ellipsoid_m"] for leg in document["legs"]}
    assert row["main_ellipsoid_m"] == pytest.approx(lengths["Main"], abs=0.01)
    assert row["standby_ellipsoid_m"] == pytest.approx(lengths["Standby"], abs=0.01)


def test_both_circuits_stand_side_by_side(document: dict[str, Any]) -> None:
    """Margins and delays are those of their budgets, and the difference is between them."""
    (row,) = document["standbys"]
    circuits = {circuit["name"]: circuit for circuit in document["circuits"]}
    for side in ("main", "standby"):
        budgets = circuits[row[side]]["budgets"]
        assert row[f"{side}_margin_db"] == min(budget["margin_db"] for budget in budgets)
        assert row[f"{side}_worst_db"] == max(budget["worst_db"] for budget in budgets)
        assert row[f"{side}_delay_us"] == circuits[row[side]]["delay_us"]
    difference_us = abs(row["main_delay_us"] - row["standby_delay_us"])
    assert row["difference_us"] == pytest.approx(difference_us, abs=0.0005)
    assert row["difference_us"] > 1.0
    assert row["shared_cables"] == []
    timing = {each["figure"]: each["value"] for each in circuits[row["standby"]]["timing"]}
    assert timing["difference to Programme"] == pytest.approx(row["difference_us"], abs=0.001)


def test_the_report_says_what_could_cut_both(document: dict[str, Any]) -> None:
    """The section is there, with every exposure, and what is not known is said."""
    page = report_html(document)
    section = page.partition('<section id="protection">')[2].partition("</section>")[0]
    exposures = document["separate_ways"][0]["exposures"]
    assert section.count("<tr>") == (1 + len(exposures)) + (1 + 2), "heads, exposures, circuits"
    assert "share no street and no junction; proven." in section
    assert "Chambers, buildings and ducts inside one street are not known here." in section
    assert "Programme standby" in section
    difference_us = document["standbys"][0]["difference_us"]
    assert f"Their delays differ by {difference_us:.3f} us. No cable carries both." in section


def test_a_run_without_protection_has_no_such_section(mixed_plan: Plan) -> None:
    """Nothing is said of what was not asked."""
    document = plan_document(mixed_plan)
    assert document["separate_ways"] == document["standbys"] == []
    assert 'id="protection"' not in report_html(document)


def test_names_from_files_stay_text(document: dict[str, Any]) -> None:
    """A street or circuit named like a tag is shown, not run."""
    hostile = json.loads(json.dumps(document))
    hostile["separate_ways"][0]["exposures"][0]["name"] = "<script>x</script>"
    hostile["standbys"][0]["shared_cables"] = ["<img src=x>"]
    page = report_html(hostile)
    assert "<script>" not in page
    assert "<img src=x>" not in page
    assert "&lt;script&gt;" in page


def test_ways_that_share_nothing_are_said_to(document: dict[str, Any]) -> None:
    """No table without rows, but a sentence."""
    clear = json.loads(json.dumps(document))
    clear["separate_ways"][0]["exposures"] = []
    assert "They share nothing, and come nowhere within 25.0 m." in report_html(clear)
