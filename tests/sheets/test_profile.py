"""The strip chart for print shows heights, loss, ways and joints where they are."""

from __future__ import annotations

import re
from xml.etree import ElementTree as ET

import pytest

from routeplan.sheets.map_style import LINE_STYLES
from routeplan.sheets.profile import line_svg, nice_step, profile_svg
from tests.sheets.made_up_run import Row

SVG = "{http://www.w3.org/2000/svg}"


def _texts(document: Row) -> list[str]:
    return [text.text or "" for text in _parsed(document).iter(f"{SVG}text")]


def _parsed(document: Row) -> ET.Element:
    return ET.fromstring(profile_svg(document))


def _diamonds_x(document: Row) -> list[float]:
    """Return where joints are drawn: the tips of the diamonds."""
    drawn = profile_svg(document)
    return [float(x) for x in re.findall(r'd="M([\d.]+) [\d.]+l6 6', drawn)]


@pytest.mark.parametrize(
    ("span", "count", "step"),
    [(20000, 10, 2000), (10000, 4, 2500), (7.4, 4, 2), (0.3, 4, 0.1), (0, 4, 0), (1, 1, 1)],
)
def test_steps_are_round_and_enough(span: float, count: float, step: float) -> None:
    """The smallest of 1, 2, 2.5, 5 times a power of ten that gives no more than `count` parts."""
    assert nice_step(span, count) == pytest.approx(step)


def test_joints_stand_at_their_share_of_the_way(document: Row) -> None:
    """Joints at 5, 10 and 15 of 20 km divide the axis into quarters."""
    first, second, third = _diamonds_x(document)
    assert second - first == pytest.approx(third - second, abs=0.11)
    assert second == pytest.approx(380, abs=0.11)


def test_the_highest_vertex_is_the_highest_point_drawn(document: Row) -> None:
    """The top of the profile stands over the ground station of the highest vertex."""
    line, ground_m = document["legs"][0]["line"], document["legs"][0]["line_ground_m"]
    top_m = max(range(len(line)), key=lambda index: line[index][2])
    edge = next(
        path.get("d", "") for path in _parsed(document).iter(f"{SVG}path")
        if path.get("stroke") == "#8b8778" and path.get("fill") == "none"
    )  # fmt: skip
    points = [tuple(map(float, pair.split())) for pair in edge[1:].split("L")]
    x, _ = min(points, key=lambda point: point[1])
    assert x == pytest.approx(44 + 672 * ground_m[top_m] / ground_m[-1], abs=6)


def test_loss_is_drawn_only_where_it_is_given(document: Row) -> None:
    """Nothing is made up: without a curve in the document there is no loss axis."""
    assert any(text.startswith("Loss of Programme") for text in _texts(document))
    for circuit in document["circuits"]:
        del circuit["power"]
    assert not any(text.startswith("Loss") for text in _texts(document))


def test_loss_is_labelled_to_the_digits_of_its_steps(document: Row) -> None:
    """Four steps of a quarter of a decibel say 0.25 and 0.75, not 0.2 and 0.8."""
    for vertex in document["legs"][0]["line"]:
        vertex[2] = None
    for circuit in document["circuits"]:
        most_db = max(row["loss_db"] for row in circuit["power"])
        for row in circuit["power"]:
            row["loss_db"] *= 0.97 / most_db
    assert {"0.00", "0.25", "0.50", "0.75", "1.00"} <= set(_texts(document))


def test_a_run_without_heights_says_so(document: Row) -> None:
    """No profile is drawn for a line that has no heights."""
    for vertex in document["legs"][0]["line"]:
        vertex[2] = None
    texts = _texts(document)
    assert "No heights in the input." in texts
    assert "Height, m" not in texts


def test_missing_heights_do_not_break_the_profile(document: Row) -> None:
    """Every other height unknown still gives a profile with the known ones."""
    for vertex in document["legs"][0]["line"][::2]:
        vertex[2] = None
    assert "Height, m" in _texts(document)


def test_hostile_names_stay_text(hostile_document: Row) -> None:
    """The picture is well-formed and holds the names as text."""
    root = _parsed(hostile_document)
    tags = {f"{SVG}{tag}" for tag in ("svg", "path", "text", "circle")}
    assert {element.tag for element in root.iter()} <= tags
    assert hostile_document["nodes"][0]["name"] in _texts(hostile_document)


def test_crossings_loops_and_reach_points_stand_below_their_places() -> None:
    """Each leg shows its own crossings by letter, its loops as rings and its reach points."""
    station = {"leg": "A", "sheath_from_m": 0.0, "sheath_to_m": 0.0}
    document = {
        "legs": [{"name": name, "ground_m": 1000.0} for name in ("A", "B")],
        "stations": [
            {**station, "kind": "loop", "ground_m": 250.0},
            {**station, "kind": "reach", "reach_kind": "handhole", "ground_m": 750.0},
        ],
        "crossings": [
            {"leg": "A", "crosses": "rail", "how": "crosses", "ground_m": 500.0},
            {"leg": "A", "crosses": "road", "how": "along", "ground_m": 100.0},
        ],
    }
    drawn = profile_svg(document, 0)
    rings = re.findall(r'<circle cx="([\d.]+)" cy="[\d.]+" r="3.4"', drawn)
    letters = re.findall(r'<circle cx="([\d.]+)" cy="[\d.]+" r="5"', drawn)
    assert [float(x) for x in rings] == pytest.approx([44 + 672 * 0.25], abs=0.06)
    assert [float(x) for x in letters] == pytest.approx([380], abs=0.06)
    assert f"M{44 + 672 * 0.75:.1f} " in drawn
    assert "T rail" in drawn
    assert "R road" not in drawn
    assert "circle" not in profile_svg(document, 1)


def test_placements_differ_without_colour() -> None:
    """Drawn in one colour, no two placements look alike."""
    drawn = {
        name: line_svg(style, 0, 40, 6).replace(style.colour, "#000")
        for name, style in LINE_STYLES.items()
    }
    assert len(set(drawn.values())) == len(LINE_STYLES)
    assert len({style.colour for style in LINE_STYLES.values()}) == len(LINE_STYLES)
