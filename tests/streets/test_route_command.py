"""The route command: what it writes and prints, and how it refuses."""

from __future__ import annotations

import json
import shutil
from pathlib import Path
from typing import Any

import pytest

from routeplan.cli import main
from routeplan.errors import InputError
from routeplan.route_options import ROUTE_OPTIONS, order_of
from routeplan.run import read_run
from tests.streets.small_networks import REFERENCE

ENDS = ("Studio=24.937,60.166", "Mast=24.951,60.177")


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a folder with an extract, made the working one."""
    shutil.copy(REFERENCE / "helsinki_centre.osm.pbf", tmp_path / "town.osm.pbf")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def route(*arguments: str) -> int:
    return main(["route", *ENDS, "--streets", "town.osm.pbf", *arguments])


def test_a_way_is_written_and_planned(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The file can be planned, the map is drawn, and a row shows joints and loss."""
    assert route() == 0
    out, err = capsys.readouterr()
    assert "dB at 1550" in out
    assert "OpenStreetMap contributors" in out
    assert "warning: town.osm.pbf" in err
    assert {p.name for p in folder.iterdir()} == {
        "town.osm.pbf", "town.osm.pbf.network.npz", "route.geojson", "route_map.html",
    }  # fmt: skip
    assert [place.name for place in read_run("route.geojson").places if place.kind == "site"] == [
        "Studio", "Mast",
    ]  # fmt: skip
    assert main(["check", "route.geojson"]) == 0


def test_three_ways_are_three_files(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each way has its file, and JSON holds a row for each."""
    assert route("--ways", "3", "--json", "--no-map") == 0
    found = json.loads(capsys.readouterr().out)
    assert [row["name"] for row in found["ways"]] == ["Best way", "Way 2", "Way 3"]
    assert all(row["joint_count"] >= 0 and row["nominal_1550_db"] > 0 for row in found["ways"])
    assert found["files"] == ["route.geojson", "route_2.geojson", "route_3.geojson"]
    assert all((folder / name).is_file() for name in found["files"])


def test_two_ways_are_two_legs(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A pair is one file with what they share told, exactly or driven apart."""
    assert route("--separate", "junctions", "--no-plan") == 0
    out = capsys.readouterr().out
    assert "least total cost of two ways that share no street and no junction" in out
    assert "shared    off street" in out
    assert {line.leg for line in read_run(folder / "route.geojson").lines} == {"Main", "Standby"}
    assert route("--separate", "streets", "--apart-m", "60", "--force", "--no-plan", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    assert found["is_exact"] is False
    assert found["exposures"]


def test_a_tree_joins_all(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Further sites are joined; the answer says whether it is exact."""
    assert route("--join", "Park=24.94,60.175", "--no-plan", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    assert found["is_exact"] is True
    assert [site["name"] for site in found["sites"]] == ["Studio", "Mast", "Park"]
    assert main(["check", "route.geojson"]) == 0


def test_sites_of_a_run_may_be_named(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """FROM and TO can be the sites of a run, with their roles."""
    points = [
        {"type": "Feature", "properties": {"name": name, "role": role},
         "geometry": {"type": "Point", "coordinates": place}}
        for name, role, place in (("Hall", "studio", [24.937, 60.166]),
                                  ("Hill", "transmitter", [24.951, 60.177]))
    ]  # fmt: skip
    line = {"type": "LineString", "coordinates": [[24.937, 60.166], [24.951, 60.177]]}
    features = [*points, {"type": "Feature", "properties": {}, "geometry": line}]
    collection = {"type": "FeatureCollection", "features": features}
    (folder / "job.geojson").write_text(json.dumps(collection), "utf-8")
    ends = ["Hall", "Hill", "--run", "job.geojson"]
    assert main(["route", *ends, "--streets", "town.osm.pbf", "--no-plan", "--no-map"]) == 0
    roles = [place.role for place in read_run("route.geojson").places if place.kind == "site"]
    assert roles == ["studio", "transmitter"]
    capsys.readouterr()
    ends[1] = "Hil"
    assert main(["route", *ends, "--streets", "town.osm.pbf"]) == 2
    assert 'Did you mean "Hill"?' in capsys.readouterr().err


def test_nothing_is_written_over(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file that is there stays, and nothing is searched, unless it may be written over."""
    (folder / "route.geojson").write_text("mine", "utf-8")
    assert route("--no-plan") == 2
    assert "is there already" in capsys.readouterr().err
    assert (folder / "route.geojson").read_text("utf-8") == "mine"
    assert route("--no-plan", "--force") == 0
    assert (folder / "route.geojson").read_text("utf-8") != "mine"


def test_areas_and_prices_are_minded(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """An area across the best way moves it; a price of one's own changes the cost."""
    assert route("--no-plan", "--no-map", "--json") == 0
    plain = json.loads(capsys.readouterr().out)["ways"][0]
    ring = [[24.9425, 60.168], [24.9440, 60.168], [24.9440, 60.173], [24.9425, 60.173],
            [24.9425, 60.168]]  # fmt: skip
    area = {"type": "Polygon", "coordinates": [ring]}
    (folder / "area.geojson").write_text(json.dumps(area), "utf-8")
    again = ("--no-plan", "--no-map", "--json", "--force")
    assert route(*again, "--avoid", "area.geojson") == 0
    moved = json.loads(capsys.readouterr().out)["ways"][0]
    assert moved["cost"] > plain["cost"]
    assert route(*again, "--cost", "off_street_per_m=1000") == 0
    dear = json.loads(capsys.readouterr().out)["ways"][0]
    assert dear["cost"] - plain["cost"] == pytest.approx(
        plain["off_street_m"] * (1000 - 1.2), rel=1e-4
    )


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ({"streets": None}, "one source of streets"),
        ({"place": "Town"}, "one source of streets"),
        ({"start": "here"}, "neither LON,LAT"),
        ({"start": "1,2,3"}, "neither LON,LAT"),
        ({"start": "nan,2"}, "neither LON,LAT"),
        ({"start": "B=1,2"}, "name of two places"),
        ({"ways": "0"}, "makes sense"),
        ({"ways": "2.5"}, "makes sense"),
        ({"ways": "2", "separate": "streets"}, "do not go together"),
        ({"separate": "roads"}, "not a known rule"),
        ({"apart_m": "50"}, "for --separate only"),
        ({"share_least": True}, "for --separate only"),
        ({"through": ["1,2"], "separate": "streets"}, "does not go together"),
        ({"box": "1,2,3", "streets": None}, "west,south,east,north"),
        ({"cost": ["road.primary"]}, "is not NAME=VALUE"),
        ({"off_street_max_m": "-1"}, "makes sense"),
    ],
)
def test_faults_of_the_command_line_are_named(given: dict[str, Any], said: str) -> None:
    """What is wrong with an argument, or with two together, is said."""
    with pytest.raises(InputError, match=said):
        order_of({"start": "1,2", "end": "3,4", "streets": ["town.osm"], **given})


def test_all_faults_are_told_together() -> None:
    """One attempt shows every problem of the command line."""
    with pytest.raises(InputError) as caught:
        order_of({"start": "x", "end": "y", "ways": "0", "cost": ["z"]})
    assert len(caught.value.problems) == 5


def test_unnamed_places_are_lettered() -> None:
    """Places without a name are called in order of the way, and options have defaults."""
    order = order_of({"start": "1,2", "end": "5,6", "through": ["3,4"], "streets": ["s.osm"]})
    assert [(stop.name, stop.lon) for stop in order.stops] == [("A", 1.0), ("B", 3.0), ("C", 5.0)]
    assert (order.way_count, order.deadline_s, order.off_street_max_m) == (1, 120.0, 500.0)
    assert order.is_planned
    assert order.is_drawn
    keys = [option.key for option in ROUTE_OPTIONS]
    assert len(keys) == len(set(keys))


@pytest.mark.parametrize("ends", [("-0.1,51.5", "-.08,51.5"), ("A=-0.1,51.5", "-0.08,51.5")])
def test_places_west_of_greenwich_are_no_options(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, ends: tuple[str, str]
) -> None:
    """A longitude may begin with a minus sign, as the place of an end or behind an option."""
    monkeypatch.chdir(tmp_path)
    street = {"type": "LineString", "coordinates": [[-0.1, 51.5], [-0.09, 51.5], [-0.08, 51.5]]}
    Path("streets.geojson").write_text(json.dumps(street))
    more = ("--through", "-0.09,51.5", "--no-plan", "--no-map")
    assert main(["route", *ends, "--streets", "streets.geojson", *more]) == 0
    assert len(read_run("route.geojson").lines) >= 1
