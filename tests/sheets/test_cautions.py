"""Cautions are chosen by what a run has in it."""

from __future__ import annotations

import pytest

from routeplan.sheets.cautions import Caution, cautions_for
from routeplan.tables import load_rows
from tests.sheets.made_up_run import Row

ALWAYS = ["Local rules come first", "Laser light", "Lifting and reels"]
WORDS = {
    "always", "underground", "aerial", "maintenance_hole", "crossing", "rail", "water", "venue",
    "transmitter", "bright", "power", "pipeline",
}  # fmt: skip


def _topics(document: Row) -> list[str]:
    return [caution["topic"] for caution in cautions_for(document)]


def _leg(placement: str) -> Row:
    return {"legs": [{"stretches": [{"placement": placement}]}]}


def test_every_run_warns_of_laser_light_and_defers_to_local_rules() -> None:
    """An indoor run of nothing else carries the three that always hold."""
    assert _topics(_leg("indoor")) == ALWAYS


@pytest.mark.parametrize(
    ("document", "topic"),
    [
        (_leg("buried"), "Digging"),
        (_leg("duct"), "Digging"),
        (_leg("aerial"), "Climbing and power lines"),
        (_leg("water"), "Water and bridges"),
        ({"stations": [{"kind": "reach", "reach_kind": "maintenance_hole"}]}, "Maintenance holes"),
        ({"stations": [{"kind": "joint", "reach_kind": "pole"}]}, "Climbing and power lines"),
        ({"stations": [{"kind": "crossing"}]}, "Traffic and the public"),
        ({"purpose": "venue"}, "Traffic and the public"),
        ({"stations": [{"kind": "crossing", "crosses": "rail"}]}, "Railways"),
        ({"crossings": [{"crosses": "power"}]}, "Power cables and lines crossed"),
        ({"crossings": [{"crosses": "power"}]}, "Climbing and power lines"),
        ({"crossings": [{"crosses": "pipeline"}]}, "Pipelines"),
        ({"nodes": [{"role": "transmitter"}]}, "Radio-frequency exposure"),
        ({"nodes": [{"role": "transmitter"}]}, "Lightning and metal in the cable"),
        (
            {"checks": [{"kind": "laser hazard", "value": 13.0, "limit": 10.0}]},
            "Light above hazard level 1",
        ),
    ],
)
def test_a_danger_is_named_where_the_run_has_it(document: Row, topic: str) -> None:
    """What the run has adds its caution; a run without it has none."""
    assert topic in _topics(document)
    assert topic not in ALWAYS


def test_light_of_level_1_adds_no_caution() -> None:
    """A launch at the limit is within it."""
    check = {"kind": "laser hazard", "value": 10.0, "limit": 10.0}
    assert _topics({"checks": [check]}) == ALWAYS


def test_each_caution_has_a_known_condition() -> None:
    """A misspelt condition would keep a caution off every sheet."""
    rows = load_rows("cautions", Caution)
    assert {word for row in rows for word in row.when} == WORDS
    assert all(row.when for row in rows)


def test_texts_are_whole_sentences_on_one_line() -> None:
    """A caution is read aloud: no line break, no double space, a full stop at its end."""
    for caution in cautions_for({"purpose": "venue"}):
        assert caution["text"].endswith(".")
        assert caution["text"] == " ".join(caution["text"].split())
