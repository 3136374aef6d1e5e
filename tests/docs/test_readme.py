"""What the README tells a reader to paste does what it says."""

from __future__ import annotations

import os
import re
import shlex
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

from routeplan.cli import main, make_parser

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text("utf-8")
SHELL = re.findall(r"^```sh\n(.*?)\n```$", README, re.MULTILINE | re.DOTALL)
TRACK = """<gpx version="1.1" creator="by hand" xmlns="http://www.topografix.com/GPX/1/1">
<wpt lat="-38.600" lon="-21.700"><name>Fenmarrow studio</name></wpt>
<wpt lat="-38.600" lon="-21.680"><name>Fenmarrow mast</name></wpt>
<trk><trkseg>{points}</trkseg></trk></gpx>"""


@pytest.fixture
def clone(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a folder with the demo runs in it, as the working directory."""
    shutil.copytree(
        ROOT / "demo_routes", tmp_path / "demo_routes", ignore=shutil.ignore_patterns("sheets")
    )
    monkeypatch.chdir(tmp_path)
    return tmp_path


def installed(*arguments: str, folder: Path) -> subprocess.CompletedProcess[str]:
    """Run this interpreter with the package on its path."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.run(
        [sys.executable, *arguments],
        cwd=folder,
        env=environment,
        capture_output=True,
        encoding="utf-8",
        timeout=300,
        check=False,
    )


def steps_of(command: str) -> list[list[str]]:
    """Return the steps of a pasted line, each as its words."""
    return [shlex.split(step) for step in command.split(" && ")]


def test_the_first_command_sets_up_and_plans_the_demo_link(clone: Path) -> None:
    """The first shell command makes an environment, installs, and plans with exit code 0."""
    make, install, act = steps_of(SHELL[0])
    assert make == ["python3", "-m", "venv", ".venv"]
    assert install[0] == ".venv/bin/pip"
    assert install[-1] == "."
    assert act[0] == ".venv/bin/routeplan"
    done = installed("-m", "routeplan", *act[1:], folder=clone)
    assert done.returncode == 0, done.stderr
    assert (clone / "demo_routes/quenmoor_link/sheets/map.html").is_file()


def test_the_second_command_sets_up_and_runs_the_tests() -> None:
    """The second shell command installs the extra that has the test tools, and runs them."""
    make, install, act = steps_of(SHELL[1])
    assert make == ["python3", "-m", "venv", ".venv"]
    assert install[-1] == ".[dev]"
    assert act == [".venv/bin/python", "-m", "pytest"]
    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))
    assert any(
        need.startswith("pytest>") for need in project["project"]["optional-dependencies"]["dev"]
    )
    assert project["project"]["scripts"] == {"routeplan": "routeplan.cli:main"}


@pytest.mark.skipif(shutil.which("awk") is None, reason="there is no awk here")
def test_the_check_of_a_clean_checkout_runs_that_command() -> None:
    """`.ci/run` takes the test command out of the README word for word."""
    script = (ROOT / ".ci/run").read_text("utf-8")
    assert os.access(ROOT / ".ci/run", os.X_OK)
    program = re.search(r"awk '(.*?)' README\.md", script, re.DOTALL)
    assert program is not None
    taken = subprocess.run(
        ["awk", program[1], "README.md"],
        cwd=ROOT,
        capture_output=True,
        encoding="utf-8",
        check=True,
    )
    assert taken.stdout.strip() == SHELL[1]


def test_the_terminal_session_is_what_is_printed(clone: Path) -> None:
    """The session in the README is what the command prints today."""
    block = re.search(r"```text\n\$ routeplan (.*?)\n(.*?)\n```", README, re.DOTALL)
    assert block is not None
    done = installed("-m", "routeplan", *shlex.split(block[1]), folder=clone)
    assert done.stdout.replace("\\", "/").rstrip() == block[2]


def test_the_python_sample_runs(clone: Path) -> None:
    """The sample prints each section and circuit and writes the sheets it names."""
    sample = re.search(r"```python\n(.*?)```", README, re.DOTALL)
    assert sample is not None
    done = installed("-c", sample[1], folder=clone)
    assert done.returncode == 0, done.stderr
    assert [line.split()[0] for line in done.stdout.splitlines()] == [
        "S1",
        "S2",
        "S3",
        "S4",
        "Programme",
        "Telemetry",
    ]
    assert (clone / "link_sheets/plan.json").is_file()


def test_the_commands_for_a_track_of_ones_own_work(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A recorded track with two waypoints plans, gets a run file, and plans from that."""
    points = "".join(
        f'<trkpt lat="-38.6" lon="{-21.7 + 0.0005 * k:.4f}">'
        f"<ele>{20 + k % 3}</ele><time>2030-05-01T10:{k:02}:00Z</time></trkpt>"
        for k in range(41)
    )
    (tmp_path / "walk.gpx").write_text(TRACK.format(points=points), "utf-8")
    monkeypatch.chdir(tmp_path)
    commands = re.findall(r"^    routeplan (.*?) +#", README, re.MULTILINE)
    assert [command.split()[0] for command in commands] == ["plan", "new", "plan"]
    for command in commands:
        assert main(shlex.split(command)) == 0, capsys.readouterr().err
    assert (tmp_path / "walk_sheets/assumptions.csv").is_file()
    assert (tmp_path / "sheets/plan.json").is_file()
    assert "Fenmarrow mast" in (tmp_path / "sheets/reels.csv").read_text("utf-8") + (
        tmp_path / "sheets/stations.csv"
    ).read_text("utf-8")


def test_the_readme_is_short_and_opens_with_the_job() -> None:
    """The README has 120 lines at most; a paragraph comes first, then the picture of the map."""
    assert len(README.splitlines()) <= 120
    blocks = README.split("\n\n")
    assert blocks[0] == "# routeplan"
    assert blocks[1].startswith("A broadcast engineer")
    assert re.fullmatch(r"!\[.+\]\(maps/quenmoor_link\.png\)", blocks[2])


@pytest.mark.parametrize("words", ["[reels]\nstock = [2000]", "[pulling]", "[traces]", "[compare]"])
def test_keys_for_what_is_missing_are_refused(
    clone: Path, capsys: pytest.CaptureFixture[str], words: str
) -> None:
    """A run file with a key for what the README calls missing is refused."""
    missing = re.search(r"^## What it does not do yet\n\n(.*?)\n\n", README, re.M | re.DOTALL)
    assert missing is not None
    assert "refused, not ignored" in missing[1]
    run = clone / "demo_routes/quenmoor_link/asked.toml"
    run.write_text(f'geometry = ["route.geojson"]\n{words}\n', "utf-8")
    assert main(["check", str(run)]) == 2
    said = capsys.readouterr().err
    assert "is not a known key" in said or "is not yet available" in said


def test_the_changelog_names_every_command() -> None:
    """The changelog's list of commands is the program's."""
    usage = re.search(r"^  COMMAND\n((?:    .*\n)+)", make_parser().format_help(), re.MULTILINE)
    assert usage is not None
    commands = {line.split()[0] for line in usage[1].splitlines()}
    changes = (ROOT / "CHANGELOG.md").read_text("utf-8")
    listed = re.search(r"^- Commands (.*)\.$", changes, re.MULTILINE)
    assert listed is not None
    assert set(re.findall(r"`(\w+)`", listed[1])) == commands
