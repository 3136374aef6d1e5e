"""The maps in maps/ show the demo runs as they are planned now."""

from __future__ import annotations

import runpy
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
BUILDER = runpy.run_path(str(ROOT / "demo_routes/build_maps.py"))
RUNS = [path.parent for path in sorted((ROOT / "demo_routes").glob("*/run.toml"))]


@pytest.mark.parametrize("run", RUNS, ids=lambda run: run.name)
def test_a_map_holds_the_data_of_a_fresh_plan(run: Path) -> None:
    """The data kept are those of a fresh plan; demo_routes/build_maps.py mends them."""
    kept = (ROOT / "maps" / f"{run.name}.json").read_text("utf-8")
    assert kept == BUILDER["data_text"](BUILDER["map_text"](run))


def test_every_map_has_its_run_its_picture_and_its_line() -> None:
    """There is no map without a run, and each has a picture and a line in the folder's README."""
    text = (ROOT / "maps/README.md").read_text("utf-8")
    assert {path.stem for path in (ROOT / "maps").glob("*.json")} == {run.name for run in RUNS}
    for run in RUNS:
        assert (ROOT / "maps" / f"{run.name}.png").read_bytes().startswith(b"\x89PNG")
        assert f"({run.name}.png)" in text


def test_the_builder_writes_a_page_for_every_run(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The one command writes all pages where it is told to."""
    assert BUILDER["main"](["--out", str(tmp_path), "--no-pictures"]) == 0
    assert {path.name for path in tmp_path.iterdir()} == {
        f"{run.name}{suffix}" for run in RUNS for suffix in (".html", ".json")
    }
    assert str(tmp_path) in capsys.readouterr().out
