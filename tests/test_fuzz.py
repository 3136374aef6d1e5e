"""Whatever is wrong with an input, the program says so and leaves every folder whole."""

from __future__ import annotations

import contextlib
import io
import json
import os
import random
import signal
import subprocess
import sys
import tempfile
from collections import Counter
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pytest

from routeplan.cli import main
from routeplan.errors import InputError
from routeplan.run import read_run
from routeplan.sheets.write import LIST_NAME, SHEET_NAMES
from tests.mutations import GPX, KML, RUN_TOML, geojson, gpkg, mutated, shapefile_zip
from tests.mutations_inside import mutated_inside

SHEETS = {*SHEET_NAMES, LIST_NAME}
FOREIGN = {"notes.txt": b"mine", "plan.json.bak": b"mine", ".hidden": b"mine"}
BATCH = 50
COUNTS = {
    "run.toml": 600,
    "a.geojson": 500,
    "a.gpx": 250,
    "a.kml": 250,
    "a.gpkg": 200,
    "a.zip": 200,
}
BATCHES = [(name, start) for name, count in COUNTS.items() for start in range(0, count, BATCH)]
SECONDS = 60
"""No input of a few kilobytes may take longer; this ends a hang, it measures nothing."""


@pytest.fixture(scope="module")
def seeds(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Return a good input of every format by file name."""
    folder = tmp_path_factory.mktemp("seeds")
    return {
        "run.toml": RUN_TOML.encode(),
        "a.geojson": geojson(),
        "a.gpx": GPX.encode(),
        "a.kml": KML.encode(),
        "a.gpkg": gpkg(folder),
        "a.zip": shapefile_zip(folder),
    }


@contextlib.contextmanager
def at_most(seconds: int) -> Iterator[None]:
    """End what hangs, where the system can."""
    if not hasattr(signal, "SIGALRM"):
        yield
        return

    def hung(*_: object) -> None:
        raise AssertionError(f"no answer within {seconds} s")

    before = signal.signal(signal.SIGALRM, hung)
    signal.alarm(seconds)
    try:
        yield
    finally:
        signal.alarm(0)
        signal.signal(signal.SIGALRM, before)


def spoilt(seeds: dict[str, bytes], name: str, number: int) -> bytes:
    """Return the mutant of a seed with this number: odd ones keep the format whole."""
    rng = random.Random(f"{name} {number}")
    if number % 2:
        with tempfile.TemporaryDirectory() as folder:
            return mutated_inside(rng, name, seeds[name], Path(folder))
    other = rng.choice(sorted(seeds))
    return mutated(rng, seeds[name], seeds[other])


def lay_out(folder: Path, seeds: dict[str, bytes], name: str, data: bytes) -> Path:
    """Write a mutant and what it needs into a folder, with files of somebody else's."""
    (folder / "out").mkdir(parents=True)
    for foreign, content in FOREIGN.items():
        (folder / "out" / foreign).write_bytes(content)
    if name == "run.toml":
        (folder / "route.geojson").write_bytes(seeds["a.geojson"])
    (folder / name).write_bytes(data)
    return folder / name


def check_whole(folder: Path, before: dict[str, bytes], code: int, *, is_plan: bool) -> None:
    """Check that a folder holds all sheets or none, and all else as it was."""
    found = {str(p.relative_to(folder)): p for p in folder.rglob("*") if p.is_file()}
    sheets = {str(Path("out") / name) for name in SHEETS}
    written = found.keys() - before.keys()
    assert written == (sheets if code < 2 and is_plan else set())
    for name, content in before.items():
        assert found[name].read_bytes() == content
    assert {path.name for path in folder.iterdir() if path.is_dir()} == {"out"}
    if written:
        json.loads((folder / "out" / "plan.json").read_text("utf-8"))


def check_output(out: str, err: str, code: int) -> None:
    """Check that what is printed fits the exit code, a problem a line, nothing odd in it."""
    assert code in (0, 1, 2)
    assert "Traceback" not in out + err
    assert all(mark == "\n" or mark.isprintable() for mark in out + err)
    if code == 2:
        assert out == ""
        assert err.strip()


def checked(folder: Path, arguments: list[str], before: dict[str, bytes]) -> int:
    """Run a command, check what it prints and leaves behind, and return its exit code."""
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err), at_most(SECONDS):
        code = main(arguments)
    check_output(out.getvalue(), err.getvalue(), code)
    check_whole(folder, before, code, is_plan=arguments[0] == "plan")
    return code


def goes_round_the_world(path: Path) -> bool:
    """Return whether a way is thousands of kilometres long: its sheets would take too long here."""
    try:
        lines = read_run(path).lines
    except InputError:
        return False
    spans = (np.ptp(np.asarray(line.lonlat), axis=0) for line in lines)
    return any(span.max() > 5.0 for span in spans)


def test_the_seeds_themselves_are_good(seeds: dict[str, bytes], tmp_path: Path) -> None:
    """Unspoilt, every input plans with exit code 0 or 1."""
    for name, data in seeds.items():
        folder = tmp_path / name
        path = lay_out(folder, seeds, name, data)
        assert main(["plan", str(path), "--out", str(folder / "out")]) in (0, 1)


@pytest.mark.parametrize(("name", "start"), BATCHES)
def test_mutants_in_process(name: str, start: int, seeds: dict[str, bytes], tmp_path: Path) -> None:
    """Every mutant gives exit code 0, 1 or 2 and no exception, and only sheets are written."""
    codes: Counter[int] = Counter()
    for number in range(start, start + BATCH):
        folder = tmp_path / str(number)
        path = lay_out(folder, seeds, name, spoilt(seeds, name, number))
        before = {str(p.relative_to(folder)): p.read_bytes() for p in folder.rglob("*.*")}
        code = checked(folder, ["check", str(path)], before)
        if number % 5 and not goes_round_the_world(path):
            code = checked(folder, ["plan", str(path), "--out", str(folder / "out")], before)
        codes[code] += 1
    assert codes.total() == BATCH


def test_mutants_do_get_through(seeds: dict[str, bytes], tmp_path: Path) -> None:
    """Of the mutants some plan and some do not: they are neither all harmless nor all hopeless."""
    codes = set()
    for number in range(60):
        path = lay_out(tmp_path / str(number), seeds, "run.toml", spoilt(seeds, "run.toml", number))
        with contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
            codes.add(main(["check", str(path)]))
    assert codes == {0, 2}


INSTALLED = Path(sys.executable).with_name("routeplan.exe" if os.name == "nt" else "routeplan")


@pytest.mark.skipif(not INSTALLED.exists(), reason="the command is not installed")
@pytest.mark.parametrize("name", COUNTS)
def test_mutants_through_the_command(name: str, seeds: dict[str, bytes], tmp_path: Path) -> None:
    """The same holds for the installed command: no traceback, nothing half written."""
    jobs: list[tuple[Path, dict[str, bytes], list[str]]] = []
    number = 10_000
    while len(jobs) < {"run.toml": 24, "a.geojson": 24}.get(name, 13):
        number += 1
        folder = tmp_path / str(number)
        path = lay_out(folder, seeds, name, spoilt(seeds, name, number))
        before = {str(p.relative_to(folder)): p.read_bytes() for p in folder.rglob("*.*")}
        code = [str(INSTALLED), "plan", str(path), "--out", str(folder / "out")]
        if not goes_round_the_world(path):
            jobs.append((folder, before, code))
    with ThreadPoolExecutor(os.cpu_count()) as pool:
        done = pool.map(run_quietly, [code for *_, code in jobs])
        for (folder, before, _), process in zip(jobs, done, strict=True):
            check_output(process.stdout, process.stderr, process.returncode)
            check_whole(folder, before, process.returncode, is_plan=True)


def run_quietly(code: list[str]) -> subprocess.CompletedProcess[str]:
    """Run a process to its end and return what it printed."""
    return subprocess.run(code, capture_output=True, text=True, check=False, timeout=120)
