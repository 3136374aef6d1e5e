"""Reading a run: a run file, its folder, or a bare geometry file; what it is made of."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from routeplan.errors import InputError
from routeplan.run import read_run

Feature = Callable[..., dict[str, Any]]


def test_a_folder_is_read_by_its_run_file(run_with: Callable[[str], Path]) -> None:
    """`plan FOLDER` and `plan FOLDER/run.toml` are the same."""
    path = run_with('title = "Hill"')
    assert read_run(path.parent).title == read_run(str(path)).title == "Hill"


def test_a_bare_geometry_file_gives_a_run_of_defaults(
    collection: Callable[..., Path], road: object
) -> None:
    """Nothing is required beyond one line; the title is the file's name."""
    run = read_run(collection(road, name="hill.v2.geojson"))
    assert (run.title, run.purpose, run.placement, run.units) == ("hill", "link", "duct", "metric")
    assert run.given == frozenset()
    assert run.circuits == ()


def test_several_files_are_one_run(
    write: Callable[..., Path], collection: Callable[..., Path], road: object, feature: Feature
) -> None:
    """Lines may come from one file and points from another; each says where it is from."""
    collection(road)
    collection(feature("Point", [10.0, 50.0], name="Mast", kind="site"), name="points.geojson")
    run = read_run(write("run.toml", 'geometry = ["route.geojson", "points.geojson"]'))
    assert [line.source.file for line in run.lines] == ["route.geojson"]
    assert [place.source.file for place in run.places] == ["points.geojson"]


def test_geometry_is_looked_for_beside_the_run_file(
    tmp_path: Path, run_with: Callable[[str], Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The folder a program is started in does not matter."""
    path = run_with("")
    monkeypatch.chdir(os.path.sep)
    assert len(read_run(path).lines) == 1
    monkeypatch.chdir(tmp_path)
    assert len(read_run("run.toml").lines) == 1


def test_the_only_vector_file_need_not_be_named(
    write: Callable[..., Path],
    collection: Callable[..., Path],
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """One vector file beside the run file is meant; of two, none is guessed."""
    path = write("run.toml", 'title = "Hill"')
    assert "does not hold exactly one vector file (none)" in said(path)[0]
    collection(road)
    assert len(read_run(path).lines) == 1
    collection(road, name="other.geojson")
    assert "exactly one vector file (other.geojson, route.geojson)" in said(path)[0]


def test_the_digest_is_that_of_all_input_bytes(
    write: Callable[..., Path], collection: Callable[..., Path], road: object, feature: Feature
) -> None:
    """A plan can be traced to the very bytes it was made from."""
    first = collection(road)
    second = collection(feature("Point", [10.0, 50.0]), name="points.geojson")
    path = write("run.toml", 'geometry = ["route.geojson", "points.geojson"]')
    content = path.read_bytes() + first.read_bytes() + second.read_bytes()
    assert read_run(path).digest == hashlib.sha256(content).hexdigest()
    assert read_run(first).digest == hashlib.sha256(first.read_bytes()).hexdigest()


def test_two_readings_in_two_folders_say_the_same(
    tmp_path: Path, collection: Callable[..., Path], road: object
) -> None:
    """No message and no source holds the folder, or sheets would differ by where they are made."""
    empty = {"type": "Feature", "properties": None, "geometry": None}
    first = collection(road, empty)
    (tmp_path / "elsewhere").mkdir()
    second = tmp_path / "elsewhere" / first.name
    second.write_bytes(first.read_bytes())
    one, two = read_run(first), read_run(second)
    assert one.warnings == two.warnings
    assert str(one.lines[0].source) == str(two.lines[0].source)
    assert one.title == two.title


@pytest.mark.parametrize(
    ("toml", "message"),
    [
        ('geometry = ["no.geojson"]', "no.geojson: is not there."),
        ('geometry = ["."]', ".: is a folder, not a file."),
        ("geometry = []", "run.toml, geometry: is empty ([])."),
        ('geometry = [""]', 'run.toml, geometry, item 1: is empty ("").'),
        ('geometry = ["a\\u0000b"]', "cannot be read (embedded null byte)."),
        ('geometry = ["' + "x" * 300 + '.geojson"]', "cannot be read (File name too long)."),
        ('geometry = ["https://example.org/x.geojson"]', "is not there."),
        ('geometry = ["/vsicurl/https://example.org/x.gpkg"]', "is not there."),
    ],
)
def test_a_file_that_cannot_be_read_is_named(
    toml: str, message: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """Missing files, folders and impossible names are told apart; nothing is fetched."""
    (text,) = said(write("run.toml", toml))
    assert message in text


def test_what_is_not_there_is_named(tmp_path: Path, said: Callable[[Path], list[str]]) -> None:
    """A missing run file, a missing geometry file, and a folder without a run file."""
    assert said(tmp_path / "no.toml")[0].startswith("no.toml: is not there.")
    assert said(tmp_path / "no.geojson") == [
        f"no.geojson: is not there. It is looked for in {tmp_path}."
    ]
    assert said(tmp_path / "of/../none/no.geojson") == [
        f"no.geojson: is not there. It is looked for in {tmp_path / 'none'}, and there is no such "
        "folder."
    ]
    assert said(tmp_path)[0].endswith(
        "is a folder without a run.toml. Give a geometry file, or write a run file for one: "
        "routeplan new GEOMETRY."
    )


@pytest.mark.skipif(
    not hasattr(os, "geteuid") or os.geteuid() == 0, reason="a superuser may read everything"
)
def test_a_file_that_may_not_be_read_is_named(
    collection: Callable[..., Path], road: object, said: Callable[[Path], list[str]]
) -> None:
    """A lack of permission is not taken for a missing file."""
    path = collection(road)
    path.chmod(0)
    assert said(path) == ["route.geojson: may not be read by this user."]


def test_problems_of_the_run_file_and_of_the_geometry_come_together(
    write: Callable[..., Path], collection: Callable[..., Path], feature: Feature
) -> None:
    """One attempt shows what is wrong in all files."""
    collection(feature("LineString", [[10.0, 50.0]], name="Dot"))
    path = write("run.toml", 'geometry = ["route.geojson", "no.gpx"]\n[slack]\nentry_m = -1\n')
    with pytest.raises(InputError) as caught:
        read_run(path)
    where = [problem.where for problem in caught.value.problems]
    assert where == ["run.toml, slack.entry_m", 'route.geojson, feature "Dot"', "no.gpx"]
