"""The maps in maps/ show the demo runs as they are planned now."""

from __future__ import annotations

import json
import re
import runpy
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
BUILDER = runpy.run_path(str(ROOT / "demo_routes/build_maps.py"))
RUNS = [path.parent for path in sorted((ROOT / "demo_routes").glob("*/run.toml"))]


def data_of(page: str) -> object:
    """Return the data a map draws from."""
    found = re.search(
        r'<script type="application/json" id="run-data">(.*?)</script>', page, re.DOTALL
    )
    assert found is not None
    return json.loads(found[1])


@pytest.mark.parametrize("run", RUNS, ids=lambda run: run.name)
def test_a_map_holds_the_data_of_a_fresh_plan(run: Path) -> None:
    """The data in the page are those of a fresh plan; demo_routes/build_maps.py mends it."""
    kept = (ROOT / "maps" / f"{run.name}.html").read_text("utf-8")
    assert data_of(kept) == data_of(BUILDER["map_text"](run))
    assert re.findall(r"<header.*?</header>", kept, re.DOTALL)


def test_every_map_has_its_run_its_picture_and_its_line() -> None:
    """There is no map without a run, and each has a picture and a line in the folder's README."""
    text = (ROOT / "maps/README.md").read_text("utf-8")
    assert {path.stem for path in (ROOT / "maps").glob("*.html")} == {run.name for run in RUNS}
    for run in RUNS:
        assert (ROOT / "maps" / f"{run.name}.png").read_bytes().startswith(b"\x89PNG")
        assert f"({run.name}.html)" in text


def test_the_builder_writes_a_page_for_every_run(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The one command writes all pages where it is told to."""
    assert BUILDER["main"](["--out", str(tmp_path), "--no-pictures"]) == 0
    assert {path.stem for path in tmp_path.iterdir()} == {run.name for run in RUNS}
    assert str(tmp_path) in capsys.readouterr().out
