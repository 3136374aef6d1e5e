"""The map page holds the whole run, nothing from elsewhere, and the same bytes every time."""

from __future__ import annotations

import base64
import json
import re
from hashlib import sha256
from itertools import accumulate

import pytest

from routeplan.sheets.map import map_html
from routeplan.sheets.map_data import map_data, steps
from tests.sheets.made_up_run import HOSTILE_NAMES, Row, made_up_run


def _sums(column: list[int]) -> list[int]:
    return list(accumulate(column))


def _data_in(html: str) -> Row:
    block = re.search(r'<script type="application/json" id="run-data">(.*?)</script>', html)
    assert block is not None
    found: Row = json.loads(block[1])
    return found


def test_columns_sum_back_to_the_document(document: Row) -> None:
    """Every ruler at every station is recovered to the millimetre."""
    leg = map_data(document)["legs"][0]  # type: ignore[index]
    columns = leg["stations"]
    for name, key in (
        ("ground", "ground_m"),
        ("sheath", "sheath_from_m"),
        ("glass", "glass_from_m"),
    ):
        expected = [round(row[key] * 1000) for row in document["stations"]]
        assert _sums(columns[name]) == expected
    gained = [
        round(row["sheath_to_m"] * 1000) - round(row["sheath_from_m"] * 1000)
        for row in document["stations"]
    ]
    assert columns["sheathStep"] == gained
    assert _sums(leg["lon"])[-1] == round(document["legs"][0]["line"][-1][0] * 1e7)
    assert _sums(leg["lat"])[-1] == round(document["legs"][0]["line"][-1][1] * 1e7)


def test_section_metres_are_recovered_at_every_station(document: Row) -> None:
    """Sheath less the section's start is the section metres that the document states."""
    leg = map_data(document)["legs"][0]  # type: ignore[index]
    sheath_mm = _sums(leg["stations"]["sheath"])
    for number, row in enumerate(document["stations"]):
        if row["kind"] in ("joint", "site"):
            continue
        name, start_mm = leg["sections"][leg["stations"]["section"][number]]
        assert name == row["section"]
        assert sheath_mm[number] - start_mm == round(row["section_m"] * 1000)


def test_the_span_after_a_joint_belongs_to_the_next_section(document: Row) -> None:
    """At a joint the old section ends and the new one runs on."""
    leg = map_data(document)["legs"][0]  # type: ignore[index]
    at = next(n for n, row in enumerate(document["stations"]) if row["kind"] == "joint")
    names = [leg["sections"][leg["stations"]["section"][n]][0] for n in (at - 1, at)]
    assert names == ["S1", "S2"]


def test_two_joints_side_by_side_take_the_section_between_them() -> None:
    """With nothing but joints at its ends, a span is found by their names."""
    rulers = {"ground_m": 0.0, "sheath_from_m": 0.0, "sheath_to_m": 0.0, "section_m": 0.0}
    document = {
        "legs": [{"name": "L"}],
        "stations": [
            {"leg": "L", "cable": "C", "kind": "joint", "name": name, "section": "S1", **rulers}
            for name in ("J1", "J2")
        ],
        "sections": [
            {"name": "S1", "from": "A", "to": "J1"},
            {"name": "S2", "from": "J1", "to": "J2"},
        ],
    }
    leg = map_data(document)["legs"][0]  # type: ignore[index]
    assert leg["sections"][leg["stations"]["section"][0]][0] == "S2"


def test_longitudes_step_over_the_antimeridian_the_short_way() -> None:
    """From 179.9 to -179.9 degrees is a step of 0.2, not of -359.8."""
    document = {"legs": [{"name": "L", "line": [[179.9, 0.0, None], [-179.9, 0.0, None]]}]}
    leg = map_data(document)["legs"][0]  # type: ignore[index]
    assert leg["lon"] == [1_799_000_000, 2_000_000]
    assert leg["height"] == [None, None]


def test_unknown_values_stay_unknown() -> None:
    """A null is carried as null and the next step counts from the last known value."""
    assert steps([None, 2.0, None, 3.5], scale=10) == [None, 20, None, 15]


def test_placements_are_totalled_for_the_legend(document: Row) -> None:
    """The legend's lengths add up to the ground length of the run."""
    placements = map_data(document)["placements"]
    assert isinstance(placements, list)
    assert sum(row["total"] for row in placements) == 20_000_000
    assert len(placements) == 8


def test_a_branch_is_no_site() -> None:
    """A node with a joint is drawn as that joint; one that a station calls a site stays one."""
    document = {
        "nodes": [{"name": name, "lon": 1.0, "lat": 2.0} for name in ("Studio", "Node 1", "Hill")],
        "stations": [{"kind": "site", "name": "Hill"}],
        "joints": [{"name": "J1", "node": "Node 1"}, {"name": "J2", "node": "Hill"}],
    }
    sites = map_data(document)["sites"]
    assert isinstance(sites, list)
    assert [site[0] for site in sites] == ["Studio", "Hill"]


def test_loss_against_the_leg_is_read_along_it() -> None:
    """A circuit that runs from the leg's end is charted from its start, steps in order."""
    power = [
        {"leg": "L", "ground_m": ground_m, "loss_db": loss_db}
        for ground_m, loss_db in ((500.0, 0.1), (200.0, 0.2), (200.0, 0.25), (0.0, 0.3))
    ]
    document = {
        "legs": [{"name": "L"}],
        "circuits": [{"name": "C", "power": [*power, {"leg": "gone", "ground_m": 1.0}]}],
    }
    curves = map_data(document)["power"]
    assert isinstance(curves, list)
    assert [curve["leg"] for curve in curves] == [0]
    assert _sums(curves[0]["ground"]) == [0, 200_000, 200_000, 500_000]
    assert _sums(curves[0]["loss"]) == [300, 250, 200, 100]


def test_a_background_is_carried_as_lines(document: Row) -> None:
    """Streets given as polylines reach the page."""
    document["background"] = [[[-31.4, 46.9], [-31.3, 46.95]]]
    drawn = map_data(document)["background"]
    assert drawn == [{"lon": [-314_000_000, 1_000_000], "lat": [469_000_000, 500_000]}]


def test_the_page_names_nothing_outside_itself(document: Row) -> None:
    """No element fetches anything: no source, no link, no import, no address in a style."""
    html = map_html(document)
    assert not re.search(r"<(?:link|iframe|object|embed|img|base)\b", html)
    assert not re.search(r"<script[^>]+src=", html)
    styles = "".join(re.findall(r"<style>(.*?)</style>", html, re.DOTALL))
    assert "url(" not in styles
    assert "@import" not in styles


def test_the_policy_names_every_script_of_the_page(hostile_document: Row) -> None:
    """The hashes in the policy are those of the page's own scripts, one each."""
    html = map_html(hostile_document)
    scripts = re.findall(r"<script>(.*?)</script>", html, re.DOTALL)
    hashes = [
        "sha256-" + base64.b64encode(sha256(script.encode()).digest()).decode()
        for script in scripts
    ]
    policy = re.search(r'http-equiv="Content-Security-Policy" content="([^"]*)"', html)
    assert policy is not None
    assert re.findall(r"'(sha256-[^']+)'", policy[1]) == hashes
    assert "unsafe-inline'; script-src 'sha256-" in policy[1]


def test_hostile_names_reach_the_page_only_as_text(hostile_document: Row) -> None:
    """No hostile name stands in the page unescaped, and the data gives each back unchanged."""
    html = map_html(hostile_document)
    data = _data_in(html)
    for name in HOSTILE_NAMES[::2]:
        assert name not in html
    assert [site[0] for site in data["sites"]] == list(HOSTILE_NAMES[:2])
    assert data["legs"][0]["name"] == HOSTILE_NAMES[2]


def test_template_marks_in_names_are_not_evaluated(document: Row) -> None:
    """The page is made by a template engine; names must not be templates to it."""
    document["title"] = "{{ 7 * 7 }}{% raw %}"
    document["nodes"][0]["name"] = "{{ 6 * 7 }}"
    html = map_html(document)
    assert "<h1>49" not in html
    assert _data_in(html)["sites"][0][0] == "{{ 6 * 7 }}"


@pytest.mark.parametrize("hostile", [False, True])
def test_the_same_document_gives_the_same_bytes(hostile: bool) -> None:
    """No random id, date or order reaches the page."""
    assert map_html(made_up_run(hostile=hostile)) == map_html(made_up_run(hostile=hostile))


def test_invented_prices_are_marked_beside_the_cost(document: Row) -> None:
    """A default price says so; with prices of the user's own the mark is gone."""
    assert "with invented prices" in map_html(document)
    document["assumptions"] = [
        row for row in document["assumptions"] if not row["name"].startswith("costs.")
    ]
    assert "with invented prices" not in map_html(document)


def test_the_licence_goes_with_the_library(document: Row) -> None:
    """Leaflet's terms ask that its copyright and conditions go with every copy."""
    html = map_html(document)
    assert "Redistribution and use in source and binary forms" in html
    assert "Volodymyr Agafonkin" in html or "Vladimir Agafonkin" in html


def test_an_empty_document_still_gives_a_page() -> None:
    """Whatever is missing is left out, not an error."""
    assert "<h1>Run</h1>" in map_html({})
