"""A run with layers: crossings found once, put on the leg, with slack each side and no joint in."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from routeplan.errors import InputError
from routeplan.planning import Plan
from routeplan.sheets.document import plan_document
from tests.ground.runs_on_ground import across, handholes, planned_with, two_km, write_layer
from tests.sheets.plans import equator, point, polygon

Row = dict[str, Any]
LAYERS = 'layers = ["lines.geojson"]\n'


def crossings(planned: Plan) -> list[Row]:
    """Return the rows of what the way meets."""
    rows: Any = plan_document(planned)["crossings"]
    return list(rows)


def loops_m(planned: Plan, name: str) -> list[float]:
    """Return where loops for a crossing are."""
    steps = [step for cable in planned.laid for step in cable.steps if step.kind == "loop"]
    return [step.chain_mm / 1000 for step in steps if name in step.name]


def test_a_found_railway_takes_a_loop_on_each_side(tmp_path: Path) -> None:
    """A railway line of a layer is a crossing of 10 m, with a loop at either edge."""
    write_layer(
        tmp_path / "lines.geojson",
        [across(700, kind="rail", name="Fell line", owner="Fell Railway")],
    )
    planned = planned_with(tmp_path, LAYERS)
    (row,) = crossings(planned)
    assert (row["crosses"], row["name"], row["ask"]) == ("rail", "Fell line", "Fell Railway")
    assert (row["how"], row["source"], row["angle_deg"]) == ("crosses", "found", 90.0)
    assert row["ground_m"] == pytest.approx(700.0, abs=0.002)
    assert loops_m(planned, "Fell line") == pytest.approx([695.0, 705.0], abs=0.002)


def test_what_is_declared_and_found_stands_once(tmp_path: Path) -> None:
    """A declared crossing keeps its name and width, and takes class and owner of what is found."""
    write_layer(tmp_path / "lines.geojson", [across(700, kind="rail", owner="Fell Railway")])
    declared = point(equator(704), name="Gate 7", kind="crossing", crosses="rail", width_m=30)
    planned = planned_with(tmp_path, LAYERS, two_km(), declared)
    (row,) = crossings(planned)
    assert (row["name"], row["source"], row["ask"]) == ("Gate 7", "declared", "Fell Railway")
    assert row["width_m"] == 30
    assert loops_m(planned, "Gate 7") == pytest.approx([689.0, 719.0], abs=0.002)


def test_two_tracks_are_one_crossing_for_slack(tmp_path: Path) -> None:
    """Tracks 4 m apart have one loop on each side, none between; 40 m apart each has its own."""
    tracks = [across(700, kind="rail", name="Up"), across(704, kind="rail", name="Down")]
    write_layer(tmp_path / "lines.geojson", tracks)
    planned = planned_with(tmp_path, LAYERS)
    assert len(crossings(planned)) == 2
    assert loops_m(planned, "Up") == pytest.approx([695.0, 709.0], abs=0.002)
    write_layer(tmp_path / "lines.geojson", [tracks[0], across(740, kind="rail", name="Down")])
    apart = planned_with(tmp_path, LAYERS)
    assert loops_m(apart, "Up") + loops_m(apart, "Down") == pytest.approx(
        [695.0, 705.0, 735.0, 745.0], abs=0.002
    )


@pytest.mark.parametrize(("at_m", "joint_m"), [(900.0, 1_100.0), (1_100.0, 900.0)])
def test_no_joint_stands_in_a_crossing(tmp_path: Path, at_m: float, joint_m: float) -> None:
    """The handhole in the zone of a road is passed over for the one behind it."""
    write_layer(tmp_path / "lines.geojson", [across(at_m + 3.0, kind="road", name="Road")])
    toml = f"{LAYERS}[reels]\nput_ups_m = [1300]\n[joints]\nassumed_spacing_m = 5000.0\n"
    planned = planned_with(tmp_path, toml, two_km(), *handholes(900, 1_100))
    (joint,) = planned.layout.joints
    assert joint.ground_mm / 1000 == pytest.approx(joint_m, abs=1.0)


def test_a_slanting_line_keeps_more_ground(tmp_path: Path) -> None:
    """A line at 30 degrees is 20 m of ground from edge to edge; a footpath has no width."""
    lon, half = equator(700)[0], 0.001
    slant = {"type": "LineString", "coordinates": [[lon - half * 3**0.5, -half],
                                                   [lon + half * 3**0.5, half]]}  # fmt: skip
    path = across(1_500, kind="road")
    path["properties"]["class"] = "footway"
    road = {"type": "Feature", "properties": {"kind": "road"}, "geometry": slant}
    write_layer(tmp_path / "lines.geojson", [road, path])
    first, second = crossings(planned_with(tmp_path, LAYERS))
    assert first["angle_deg"] == pytest.approx(30.0, abs=0.3)
    assert first["width_m"] == pytest.approx(20.0, abs=0.2)
    assert (second["name"], second["width_m"]) == ("footway road", None)


def test_columns_of_a_file_are_mapped(tmp_path: Path) -> None:
    """A layer whose columns have names of their own says so in the run file."""
    own = [
        across(300, sort="Bahn", title="Fell line", holder="Fell Railway", use="freight"),
        across(600, sort="Wehr", title="Weir"),
    ]
    write_layer(tmp_path / "lines.geojson", own)
    toml = (
        '[[layer]]\nfile = "lines.geojson"\nkind_column = "sort"\nkinds = { Bahn = "rail" }\n'
        'name_column = "title"\nowner_column = "holder"\nclass_column = "use"\n'
    )
    (row,) = crossings(planned_with(tmp_path, toml))
    assert [row[key] for key in ("crosses", "name", "ask", "class")] == [
        "rail", "Fell line", "Fell Railway", "freight",
    ]  # fmt: skip


def test_declared_areas_are_found_without_any_layer(tmp_path: Path) -> None:
    """A permit area on the way is listed with its length and who has to be asked."""
    (west, _), (east, _) = equator(500), equator(900)
    ring = [[west, -0.001], [east, -0.001], [east, 0.001], [west, 0.001], [west, -0.001]]
    meadow = polygon(ring, name="Meadow", kind="permit", owner="Farm")
    (row,) = crossings(planned_with(tmp_path, "", two_km(), meadow))
    assert (row["crosses"], row["how"], row["ask"]) == ("permit", "inside", "Farm")
    assert row["length_m"] == pytest.approx(400.0, abs=0.01)


def test_power_and_pipelines_raise_their_cautions(tmp_path: Path) -> None:
    """What can kill is said on the sheets, from a layer as from the geometry."""
    write_layer(
        tmp_path / "lines.geojson", [across(700, kind="power"), across(900, kind="pipeline")]
    )
    cautions: Any = plan_document(planned_with(tmp_path, LAYERS))["cautions"]
    topics = {caution["topic"] for caution in cautions}
    assert {"Pipelines", "Power cables and lines crossed"} <= topics


def test_a_bridge_over_a_found_river_counts_once(tmp_path: Path) -> None:
    """Loops stand at the ends of the bridge, and none at the river below it."""
    write_layer(tmp_path / "lines.geojson", [across(700, kind="water", name="Lunnoth")])
    way = [
        two_km() | {"geometry": {"type": "LineString", "coordinates": [equator(a), equator(b)]},
                    "properties": {"placement": placement}}
        for a, b, placement in ((0, 650, "duct"), (650, 750, "bridge"), (750, 2_000, "duct"))
    ]  # fmt: skip
    planned = planned_with(tmp_path, LAYERS, *way)
    assert loops_m(planned, "Lunnoth") == []
    assert loops_m(planned, "bridge") == pytest.approx([650.0, 750.0], abs=0.01)


@pytest.mark.parametrize(
    ("toml", "said"),
    [
        ('layers = ["none.gpkg"]', r"none\.gpkg: is not there"),
        ('layers = ["plain.geojson"]', "does not say what its features are"),
        ('[[layer]]\nfile = "plain.geojson"\nkind = "lava"', "layer .*kind"),
        ('[[layer]]\nkind = "road"', "file"),
        ('[[layer]]\nfile = "plain.geojson"\nkind = "road"\nname_column = "x"', "no column"),
        ('[[layer]]\nfile = "area.osm"\nkind = "road"', "whose tags say"),
    ],
)
def test_a_layer_that_cannot_be_read_is_named(tmp_path: Path, toml: str, said: str) -> None:
    """Missing files, kinds and columns are problems with their remedy."""
    write_layer(tmp_path / "plain.geojson", [across(700, name="Lane")])
    (tmp_path / "area.osm").write_text("<osm/>", "utf-8")
    with pytest.raises(InputError, match=said):
        planned_with(tmp_path, toml)
