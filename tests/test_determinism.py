"""The same input gives the same bytes, wherever, whenever and in whatever order of hashes."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.sheets.plans import MIXED_FEATURES, MIXED_TOML, random_run, write_run

CIRCUITS = """
[[circuit]]
name = "Video"
fibre_count = 1
interface = "own"
wavelengths_nm = [1310, 1550]
[interface.own]
wavelength_min_nm = 1260
wavelength_max_nm = 1625
channel_loss_db = 6.0
"""


def sheets_of(folder: Path, **environment: str) -> dict[str, bytes]:
    """Plan the run of a folder in a process of its own and return all files it wrote."""
    code = [sys.executable, "-m", "routeplan", "plan", str(folder)]
    done = subprocess.run(
        code, env=os.environ | environment, capture_output=True, check=False, timeout=120
    )
    assert done.returncode in (0, 1), done.stderr
    return {path.name: path.read_bytes() for path in (folder / "sheets").iterdir()}


@pytest.fixture(scope="module")
def runs(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    """Return the folders of a run worked out by hand and of one with several legs."""
    folder = tmp_path_factory.mktemp("runs")
    write_run(folder / "mixed", MIXED_FEATURES, MIXED_TOML + CIRCUITS)
    random_run(folder / "legs", 4)
    return [folder / "mixed", folder / "legs"]


def test_bytes_are_the_same_everywhere(runs: list[Path], tmp_path: Path) -> None:
    """Run again, in another folder, time zone, hash seed and language, no byte changes."""
    surroundings = [
        {"TZ": "Pacific/Kiritimati", "PYTHONHASHSEED": "1", "LC_ALL": "C"},
        {"TZ": "America/St_Johns", "PYTHONHASHSEED": "4242", "LANG": "de_DE.UTF-8"},
    ]
    for number, run in enumerate(runs):
        first = sheets_of(run, PYTHONHASHSEED="0", TZ="UTC")
        assert len(first) >= 11
        assert sheets_of(run) == first
        for turn, surrounding in enumerate(surroundings):
            copy = tmp_path / f"elsewhere {number}" / f"ünd {turn}" / "run"
            shutil.copytree(run, copy, ignore=shutil.ignore_patterns("sheets"))
            assert sheets_of(copy, **surrounding) == first


def test_no_sheet_tells_of_the_machine(runs: list[Path]) -> None:
    """No sheet holds the folder it was made in, the user's name or the day."""
    found = sheets_of(runs[0])
    for name, content in found.items():
        assert str(runs[0]).encode() not in content, name
        assert str(Path(__file__).parents[1]).encode() not in content, name
