"""The commands do what they say, exit as they say, and leave everything else alone."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from routeplan.cli import main
from routeplan.sheets.write import LIST_NAME, SHEET_NAMES
from routeplan.tables import table_names
from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, equator, line, point, write_run

Row = dict[str, Any]

FAILING = """
[[circuit]]
name = "Video"
interface = "own"
wavelengths_nm = [1310]
[interface.own]
wavelength_nm = 1310
channel_loss_db = 0.1
"""
FITTING = FAILING.replace(
    "channel_loss_db = 0.1",
    "tx_min_dbm = 0.0\ntx_max_dbm = 1.0\nrx_sensitivity_dbm = -25.0\nrx_overload_dbm = 2.0",
)


@pytest.fixture
def run_file(tmp_path: Path) -> Path:
    """Return the run file of two kilometres of duct, in a folder of its own."""
    return write_run(tmp_path / "job", DUCT_FEATURES, DUCT_TOML)


def tree(folder: Path) -> dict[str, bytes | None]:
    """Return everything below a folder, files with their bytes."""
    return {
        str(path.relative_to(folder)): path.read_bytes() if path.is_file() else None
        for path in sorted(folder.rglob("*"))
    }


def sheets_are_there(folder: Path) -> bool:
    """Return whether a folder holds exactly the sheets and their list."""
    return {path.name for path in folder.iterdir()} == {*SHEET_NAMES, LIST_NAME}


def test_unknown_is_not_failing(run_file: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A run without an interface plans with exit code 0; the sheets lie beside the run file."""
    assert main(["plan", str(run_file)]) == 0
    out, err = capsys.readouterr()
    assert sheets_are_there(run_file.parent / "sheets")
    assert "Two kilometres of duct" in out
    assert all(name in out for name in SHEET_NAMES)
    assert err == ""


@pytest.mark.parametrize(("more", "code"), [(FAILING, 1), (FITTING, 0)], ids=["fails", "fits"])
def test_exit_code_tells_what_fails(tmp_path: Path, more: str, code: int) -> None:
    """Exit code 1 where a check fails, all sheets written all the same; 0 where all fits."""
    path = write_run(tmp_path, DUCT_FEATURES, DUCT_TOML + more)
    assert main(["plan", str(path)]) == code
    assert sheets_are_there(tmp_path / "sheets")
    verdict = json.loads((tmp_path / "sheets" / "plan.json").read_text("utf-8"))["verdict"]
    assert verdict == ("fails" if code else "fits")


def test_a_folder_is_a_run(run_file: Path) -> None:
    """A folder that holds run.toml is planned like the file itself."""
    assert main(["plan", str(run_file.parent)]) == 0
    assert sheets_are_there(run_file.parent / "sheets")


def test_here_is_a_run(run_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A dot is the folder one stands in."""
    monkeypatch.chdir(run_file.parent)
    assert main(["plan", "."]) == 0
    assert sheets_are_there(run_file.parent / "sheets")


@pytest.mark.parametrize(
    ("name", "folder"),
    [
        ("road.geojson", "road_sheets"),
        ("road.v2.geojson", "road.v2_sheets"),
        ("ROAD.GEOJSON", "ROAD_sheets"),
        ("a road.json", "a road_sheets"),
    ],
)
def test_a_bare_geometry_file_is_a_run(
    tmp_path: Path, name: str, folder: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """One line without any property plans with exit code 0 and lists every assumption."""
    route = {"type": "LineString", "coordinates": [equator(0), equator(3000)]}
    (tmp_path / name).write_text(json.dumps(route), "utf-8")
    assert main(["plan", str(tmp_path / name)]) == 0
    assert sheets_are_there(tmp_path / folder)
    assert {path.name for path in tmp_path.iterdir()} == {name, folder}
    document = json.loads((tmp_path / folder / "plan.json").read_text("utf-8"))
    assumed = {row["name"] for row in document["assumptions"]}
    from routeplan.run import practice_rows

    for row in practice_rows():
        if row.name != "interface.penalty_db":
            assert any(n == row.name or n.startswith(f"{row.name}.") for n in assumed), row.name
    assert {"site A", "site B"} <= assumed
    assert any(name.startswith("heights of leg") for name in assumed)
    assert any(name.startswith("places on cable") for name in assumed)
    assert capsys.readouterr().err.count("\n") == len(document["warnings"])


def write_vector(path: Path) -> None:
    """Write a line and a handhole in the format of a file's name."""
    import geopandas
    import shapely

    shapes = [
        shapely.LineString([equator(0), equator(3000)]),
        shapely.Point(equator(1500)),
    ]
    if path.suffix == ".gpx":
        path.write_text(GPX, "utf-8")
        return
    if path.suffix == ".kml":
        path.write_text(KML, "utf-8")
        return
    frame = geopandas.GeoDataFrame(
        {"name": ["Road", "H1"], "kind": [None, "handhole"]}, geometry=shapes, crs="EPSG:4326"
    )
    if path.suffix == ".gpkg":
        grid = frame.set_crs("EPSG:4326").to_crs("EPSG:32632")
        grid[:1].to_file(path, layer="ways", driver="GPKG")
        grid[1:].to_file(path, layer="places", driver="GPKG")
    else:
        frame[:1].to_file(path, driver="ESRI Shapefile")


_LONS = [equator(0)[0], equator(3000)[0]]
GPX = f"""<?xml version="1.0"?>
<gpx version="1.1" creator="x" xmlns="http://www.topografix.com/GPX/1/1">
<wpt lat="0" lon="{_LONS[0]}"><name>Start</name></wpt>
<trk><name>Road</name><trkseg>
<trkpt lat="0" lon="{_LONS[0]}"/><trkpt lat="0" lon="{_LONS[1]}"/>
</trkseg></trk></gpx>
"""
KML = f"""<?xml version="1.0"?>
<kml xmlns="http://www.opengis.net/kml/2.2"><Document>
<Folder><name>Ways</name><Placemark><name>Road</name>
<LineString><coordinates>{_LONS[0]},0 {_LONS[1]},0</coordinates></LineString></Placemark></Folder>
<Folder><name>Places</name><Placemark><name>Start</name>
<Point><coordinates>{_LONS[0]},0</coordinates></Point></Placemark></Folder>
</Document></kml>
"""


@pytest.mark.parametrize("name", ["road.gpx", "road.kml", "road.gpkg", "road.shp"])
def test_every_format_is_planned_bare(tmp_path: Path, name: str) -> None:
    """Every format plans bare with exit code 0 to the length drawn; nothing else is written."""
    write_vector(tmp_path / name)
    before = tree(tmp_path)
    assert main(["plan", str(tmp_path / name)]) == 0
    document = json.loads((tmp_path / "road_sheets" / "plan.json").read_text("utf-8"))
    assert document["totals"]["ground_m"] == pytest.approx(3000.0, abs=0.002)
    after = {key: value for key, value in tree(tmp_path).items() if "road_sheets" not in key}
    assert after == before


def test_a_layer_of_a_file_is_a_run(tmp_path: Path) -> None:
    """A layer named behind a bar is planned; the folder is named after the file."""
    write_vector(tmp_path / "road.gpkg")
    assert main(["plan", f"{tmp_path / 'road.gpkg'}|ways"]) == 0
    assert sheets_are_there(tmp_path / "road_sheets")


def test_out_chooses_the_folder(run_file: Path, tmp_path: Path) -> None:
    """With --out the sheets go there, folders made on the way, and nowhere else."""
    before = tree(run_file.parent)
    assert main(["plan", str(run_file), "--out", str(tmp_path / "a" / "b")]) == 0
    assert sheets_are_there(tmp_path / "a" / "b")
    assert tree(run_file.parent) == before


def test_plan_again_replaces_and_recovers(run_file: Path) -> None:
    """Planned again the sheets are the same; after a change they are the new plan's."""
    sheets = run_file.parent / "sheets"
    assert main(["plan", str(run_file)]) == 0
    first = tree(sheets)
    assert main(["plan", str(run_file)]) == 0
    assert tree(sheets) == first
    run_file.write_text(run_file.read_text("utf-8").replace("= 1.20", "= 2.40"), "utf-8")
    assert main(["plan", str(run_file)]) == 0
    assert json.loads((sheets / "plan.json").read_text("utf-8"))["totals"]["cost"] == 8106.0


def test_foreign_and_changed_files_are_refused(
    run_file: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Exit code 2 and nothing written where a file in the way is not ours or was changed."""
    folder = run_file.parent / "sheets"
    folder.mkdir()
    (folder / "stations.csv").write_text("mine", "utf-8")
    before = tree(run_file.parent)
    assert main(["plan", str(run_file)]) == 2
    assert tree(run_file.parent) == before
    assert "stations.csv" in capsys.readouterr().err
    (folder / "stations.csv").unlink()
    assert main(["plan", str(run_file)]) == 0
    (folder / "bill.csv").write_text("corrected", "utf-8")
    before = tree(run_file.parent)
    assert main(["plan", str(run_file)]) == 2
    assert tree(run_file.parent) == before
    assert "was changed since it was written" in capsys.readouterr().err


def test_the_run_itself_is_never_overwritten(tmp_path: Path) -> None:
    """A geometry file of a sheet's own name is safe from --out into its folder."""
    route = {"type": "LineString", "coordinates": [equator(0), equator(900)]}
    (tmp_path / "plan.json").write_text(json.dumps(route), "utf-8")
    before = tree(tmp_path)
    assert main(["plan", str(tmp_path / "plan.json"), "--out", str(tmp_path)]) == 2
    assert tree(tmp_path) == before


def test_out_into_the_runs_own_folder(run_file: Path) -> None:
    """Sheets may stand beside the run file itself, twice."""
    before = tree(run_file.parent)
    for _ in range(2):
        assert main(["plan", str(run_file), "--out", str(run_file.parent)]) == 0
    assert before.items() <= tree(run_file.parent).items()


@pytest.mark.parametrize("name", ["out", "out/more"])
def test_out_is_a_file(run_file: Path, tmp_path: Path, name: str) -> None:
    """Exit code 2 where a file stands in place of the folder or of one above it."""
    (tmp_path / "out").write_text("mine", "utf-8")
    before = tree(tmp_path)
    assert main(["plan", str(run_file), "--out", str(tmp_path / name)]) == 2
    assert tree(tmp_path) == before


def test_json_is_plan_json(run_file: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """With --json stdout holds what plan.json holds, and nothing else."""
    assert main(["plan", str(run_file), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    text = (run_file.parent / "sheets" / "plan.json").read_text("utf-8")
    assert found == json.loads(text)


def problems_of(text: str) -> list[dict[str, str]]:
    """Return the problems printed as JSON, having checked their keys."""
    found = json.loads(text)
    assert set(found) == {"problems"}
    for problem in found["problems"]:
        assert set(problem) == {"where", "what", "value", "limit", "remedy"}
        assert all(isinstance(value, str) for value in problem.values())
    problems: list[dict[str, str]] = found["problems"]
    return problems


@pytest.mark.parametrize("command", ["plan", "check"])
def test_every_problem_is_a_line(
    command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Each problem is one line on stderr; as JSON they are the same; nothing is written."""
    path = write_run(tmp_path, DUCT_FEATURES, 'fibre_cuont = 2\n[slack]\nentry_m = -1\nx = "\x7f"')
    before = tree(tmp_path)
    assert main([command, str(path)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert main([command, str(path), "--json"]) == 2
    out, err_again = capsys.readouterr()
    problems = problems_of(out)
    assert err == err_again
    assert len(problems) == len(err.splitlines()) >= 1
    assert "Traceback" not in err
    assert tree(tmp_path) == before


@pytest.mark.parametrize("command", ["plan", "check"])
def test_no_layout_is_an_answer(
    command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Where no layout is possible exit code 2 comes with the stretch, and nothing is written."""
    toml = "[reels]\nput_ups_m = [100]\n[joints]\nassumed_spacing_m = 900\n"
    path = write_run(tmp_path, DUCT_FEATURES, toml)
    before = tree(tmp_path)
    assert main([command, str(path), "--json"]) == 2
    out, err = capsys.readouterr()
    assert problems_of(out)[0]["where"] in err
    assert tree(tmp_path) == before


@pytest.mark.parametrize(
    ("arguments", "word"),
    [
        ([], "COMMAND"),
        (["plan"], "RUN"),
        (["plna", "x"], "plna"),
        (["plan", "x", "--uot", "y"], "--uot"),
        (["check", "a", "b"], "b"),
    ],
)
def test_wrong_arguments_are_problems(
    arguments: list[str], word: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """Wrong arguments give exit code 2 and a line that says where help is, as JSON too."""
    assert main(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert word in err
    assert "--help" in err
    assert main([*arguments, "--json"]) == 2
    (problem,) = problems_of(capsys.readouterr().out)
    assert problem["where"] == "command line"


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], ["plan", "--help"]])
def test_help_and_version(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    """Help and version go to stdout with exit code 0."""
    assert main(arguments) == 0
    out, err = capsys.readouterr()
    assert "routeplan" in out
    assert err == ""


@pytest.mark.parametrize("name", ["nothing.toml", "nothing.geojson", "nothing", ".", "a\0b", ""])
def test_a_run_that_is_not_there(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    """A run that is not there, or cannot be, is an input error of every command that takes one."""
    monkeypatch.chdir(tmp_path)
    for command in ("plan", "check", "new"):
        assert main([command, name]) == 2
    assert tree(tmp_path) == {}


def test_check_writes_nothing(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Check tells of warnings on stderr, a line each, and leaves every folder as it was."""
    features = [line([equator(0), equator(2500)], placement="aerial")]
    features.append(point(equator(10), name="P", kind="pole"))
    path = write_run(tmp_path, features, "[joints]\nassumed_spacing_m = 5000")
    before = tree(tmp_path)
    assert main(["check", str(path)]) == 0
    out, err = capsys.readouterr()
    assert main(["check", str(path), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["problems"] == []
    assert len(found["warnings"]) == err.count("\n") >= 1
    assert f"no problem, {len(found['warnings'])} warning" in out
    assert all(text.startswith("warning: ") for text in err.splitlines())
    assert tree(tmp_path) == before


@pytest.mark.parametrize("name", ["road.gpkg", "road.shp", "road.kml", "road.gpx"])
def test_check_of_any_format_writes_nothing(tmp_path: Path, name: str) -> None:
    """Reading leaves no side file beside any format."""
    write_vector(tmp_path / name)
    before = tree(tmp_path)
    assert main(["check", str(tmp_path / name)]) == 0
    assert tree(tmp_path) == before


def test_new_writes_a_run_that_plans(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """New writes run.toml beside the geometry; it plans, to the same plan as the bare file."""
    route = write_run(tmp_path, DUCT_FEATURES).with_name("route.geojson")
    (tmp_path / "run.toml").unlink()
    assert main(["new", str(route)]) == 0
    assert str(tmp_path / "run.toml") in capsys.readouterr().out
    assert main(["plan", str(tmp_path)]) == 0
    assert main(["plan", str(route)]) == 0
    with_file, bare = (
        json.loads((tmp_path / name / "plan.json").read_text("utf-8"))
        for name in ("sheets", "route_sheets")
    )
    for key in ("totals", "stations", "sections", "joints"):
        assert with_file[key] == bare[key]


def test_new_never_overwrites(run_file: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """New leaves a run file that is there alone, and so what --out names."""
    route = run_file.with_name("route.geojson")
    before = tree(run_file.parent)
    assert main(["new", str(route)]) == 2
    assert "run.toml" in capsys.readouterr().err
    assert main(["new", str(route), "--out", str(route)]) == 2
    assert main(["new", str(route), "--out", str(run_file.parent)]) == 2
    assert main(["new", str(route), "--out", str(run_file.parent / "no" / "run.toml")]) == 2
    assert tree(run_file.parent) == before


def test_new_elsewhere_finds_its_geometry(tmp_path: Path) -> None:
    """A run file written into another folder names the geometry as seen from there."""
    route = write_run(tmp_path / "maps", DUCT_FEATURES).with_name("route.geojson")
    (tmp_path / "jobs" / "one").mkdir(parents=True)
    out = tmp_path / "jobs" / "one" / "link.toml"
    assert main(["new", str(route), "--out", str(out)]) == 0
    assert 'geometry = ["../../maps/route.geojson"]' in out.read_text("utf-8")
    assert main(["plan", str(out)]) == 0


def test_new_names_a_layer(tmp_path: Path) -> None:
    """A layer named behind a bar stands in the new run file."""
    write_vector(tmp_path / "road.gpkg")
    assert main(["new", f"{tmp_path / 'road.gpkg'}|ways"]) == 0
    assert 'geometry = ["road.gpkg|ways"]' in (tmp_path / "run.toml").read_text("utf-8")
    assert main(["plan", str(tmp_path)]) == 0


@pytest.mark.parametrize(
    ("arguments", "code", "verdict"),
    [
        ("--glass-km 20 --splices 3 --interface 10GBASE-ER", 0, "fits"),
        ("--glass-km 30 --splices 4 --interface 10GBASE-LR", 1, "fails"),
        ("--sheath-km 20 --reel-km 4", 0, "unknown"),
        ("--glass-km 20 --interface any", 0, "fits"),
        ("--glass-km 300 --interface any", 1, "fails"),
        (
            "--glass-km 20 --wavelength-nm 1310 --tx-min-dbm -5 --rx-sensitivity-dbm -23",
            0,
            "fits",
        ),
    ],
)
def test_a_budget_needs_no_map(
    arguments: str, code: int, verdict: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """A budget is printed as text and as JSON; only a fail has exit code 1."""
    assert main(["budget", *arguments.split()]) == code
    out, err = capsys.readouterr()
    assert f"verdict: {verdict}\n" in out
    assert err == ""
    assert main(["budget", *arguments.split(), "--json"]) == code
    found = json.loads(capsys.readouterr().out)
    assert found["verdict"] == verdict
    assert found["budgets"]


def test_a_budget_says_everything_that_is_wrong(capsys: pytest.CaptureFixture[str]) -> None:
    """Each wrong option is a line on stderr and an entry of the JSON, and nothing is worked out."""
    wrong = "--glass-km twenty --fibre-type G652D --margin-db nan --splices -1"
    assert main(["budget", *wrong.split()]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    options = ["--glass-km", "--splices", "--margin-db", "--fibre-type"]
    assert [line.partition(":")[0] for line in err.splitlines()] == options
    assert main(["budget", *wrong.split(), "--json"]) == 2
    assert [p["where"] for p in problems_of(capsys.readouterr().out)] == options


def test_a_budget_cannot_steer_the_terminal(capsys: pytest.CaptureFixture[str]) -> None:
    """Escape sequences on the command line are spelt out."""
    assert main(["budget", "--glass-km", "1", "--interface", "any\x1b[2J"]) == 2
    assert "\x1b" not in capsys.readouterr().err


@pytest.mark.parametrize("name", table_names())
def test_tables_are_shown(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    """Every table is shown as text and as JSON."""
    assert main(["tables", name]) == 0
    assert "Source: " in capsys.readouterr().out
    assert main(["tables", name, "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["rows"]


def test_tables_are_listed(capsys: pytest.CaptureFixture[str]) -> None:
    """Without a name the tables are listed; an unknown one is a problem."""
    assert main(["tables"]) == 0
    out = capsys.readouterr().out
    assert all(name in out for name in table_names())
    assert main(["tables", "--json"]) == 0
    assert set(json.loads(capsys.readouterr().out)["tables"]) == set(table_names())
    assert main(["tables", "nothing", "--json"]) == 2
    assert problems_of(capsys.readouterr().out)


def test_names_cannot_steer_the_terminal(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Escape sequences in names of files and features are spelt out wherever they are printed."""
    odd = "x\x1b]0;owned\x07\x9b2J\u202e\n.geojson"
    bad = [line([equator(0), equator(900)]), point([50.0, 50.0], name=odd, kind="handhole")]
    (tmp_path / odd).write_text(json.dumps({"type": "FeatureCollection", "features": bad}), "utf-8")
    folder = tmp_path / "out\x1b[2J"
    for arguments in (["plan", str(tmp_path / odd)], ["check", "no\x1b[2Jrun"], ["a\x1bb"]):
        for extra in ([], ["--json"]):
            assert main([*arguments, *extra]) == 2
            out, err = capsys.readouterr()
            assert all(mark == "\n" or mark.isprintable() for mark in out + err)
            assert len(err.splitlines()) >= 1
    good = write_run(tmp_path / "good", DUCT_FEATURES, DUCT_TOML)
    for extra in ([], ["--json"]):
        assert main(["plan", str(good), "--out", str(folder), *extra]) == 0
        out, err = capsys.readouterr()
        assert all(mark == "\n" or mark.isprintable() for mark in out + err)


def test_warnings_are_lines_and_counted(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Of very many warnings plan shows twelve and counts the rest; check shows all."""
    hub, features = equator(0), []
    for arm in range(20):
        end = [10.0 + 0.03 * (arm - 10), 0.03]
        features.append(line([hub, end], placement="aerial", leg=f"Arm {arm}"))
        features.append(point(end, name=f"S{arm}", kind="site"))
        features.append(point([end[0] * 0.001 + 9.99, 0.00003], name=f"P{arm}", kind="pole"))
    features = [f for f in features if f["properties"].get("kind") != "pole"]
    toml = "[slack]\nloop_every_m = { aerial = 100.0 }\n[joints]\nassumed_spacing_m = 5000\n"
    path = write_run(tmp_path, features, toml)
    assert main(["plan", str(path)]) == 0
    err = capsys.readouterr().err.splitlines()
    assert len(err) == 13
    assert "more, in report.html" in err[-1]
    assert main(["check", str(path)]) == 0
    assert len(capsys.readouterr().err.splitlines()) >= 20


def test_output_in_another_coding(run_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where the terminal cannot carry a letter it is spelt out, and JSON stays JSON."""
    text = run_file.read_text("utf-8").replace("Two kilometres", "Två \U0001f4e1 km €")
    run_file.write_text(text, "utf-8")
    for coding in ("ascii", "cp1252"):
        for extra in ([], ["--json"]):
            out = io.TextIOWrapper(io.BytesIO(), encoding=coding)
            monkeypatch.setattr(sys, "stdout", out)
            assert main(["plan", str(run_file), *extra]) == 0
            printed = out.buffer.getvalue().decode(coding)  # type: ignore[attr-defined]
            if extra:
                assert json.loads(printed)["title"].startswith("Två \U0001f4e1 km €")
            else:
                assert "km" in printed.splitlines()[0]


def command(*arguments: object, **more: Any) -> subprocess.CompletedProcess[str]:
    """Run the program as a process of its own."""
    code = [sys.executable, "-m", "routeplan", *map(str, arguments)]
    return subprocess.run(code, capture_output=True, text=True, check=False, timeout=60, **more)


def test_runs_as_a_module(run_file: Path) -> None:
    """As a process the program gives the same exit codes, and no traceback."""
    assert command("check", run_file).returncode == 0
    missing = command("check", run_file.with_name("missing.toml"))
    assert missing.returncode == 2
    assert missing.stdout == ""
    assert missing.stderr.count("\n") == 1


@pytest.mark.skipif(os.name == "nt", reason="pipes of this kind")
@pytest.mark.parametrize("arguments", [["--json"], []])
def test_a_reader_that_has_gone(run_file: Path, arguments: list[str]) -> None:
    """A reader that closes early is no error: the sheets are written, nothing is complained of."""
    read, write = os.pipe()
    os.close(read)
    code = [sys.executable, "-m", "routeplan", "plan", str(run_file), *arguments]
    with os.fdopen(write, "wb") as out:
        done = subprocess.run(code, stdout=out, stderr=subprocess.PIPE, check=False, timeout=60)
    assert (done.returncode, done.stderr) == (0, b"")
    assert sheets_are_there(run_file.parent / "sheets")


@pytest.mark.skipif(os.name == "nt", reason="pipes of this kind")
@pytest.mark.parametrize("arguments", [["--help"], ["tables"], ["check", "nothing", "--json"]])
def test_nobody_reads_anything(arguments: list[str]) -> None:
    """With nobody reading stdout or stderr there is still no traceback and no other exit code."""
    read, write = os.pipe()
    os.close(read)
    code = [sys.executable, "-m", "routeplan", *arguments]
    with os.fdopen(write, "wb") as out:
        done = subprocess.run(code, stdout=out, stderr=out, check=False, timeout=60)
    assert done.returncode == (2 if "check" in arguments else 0)


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no device that is always full")
def test_a_full_disk_for_output(run_file: Path) -> None:
    """Where stdout cannot be written that is a problem, not a traceback."""
    code = [sys.executable, "-m", "routeplan", "plan", str(run_file)]
    with Path("/dev/full").open("wb") as out:
        done = subprocess.run(code, stdout=out, stderr=subprocess.PIPE, check=False, timeout=60)
    assert done.returncode == 2
    assert done.stderr.decode().startswith("standard output: cannot be written")
    assert "Traceback" not in done.stderr.decode()


HEAVY = (
    "geopandas",
    "pandas",
    "pyogrio",
    "folium",
    "scipy",
    "shapely",
    "numpy",
    "pydantic",
    "tqdm",
)


def test_help_imports_nothing_heavy() -> None:
    """Help and version load none of the heavy libraries."""
    code = "import sys; from routeplan.cli import main; main(['--help']); print(*sys.modules)"
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60
    )
    assert not set(HEAVY) & set(done.stdout.split())


def test_interrupted_is_quiet(
    run_file: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Interrupted by the user it stops without a traceback, nothing written."""
    import routeplan.sheets.write

    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    before = tree(run_file.parent)
    monkeypatch.setattr(routeplan.sheets.write, "put_sheets", interrupted)
    assert main(["plan", str(run_file)]) == 130
    assert capsys.readouterr().err == ""
    assert tree(run_file.parent) == before
