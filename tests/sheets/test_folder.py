"""Sheets go into a folder whole or not at all, and nothing of anybody else's is touched."""

from __future__ import annotations

import hashlib
import os
import subprocess
import sys
import tempfile
from pathlib import Path

import pytest

from routeplan.errors import InputError
from routeplan.sheets import folder as folder_module
from routeplan.sheets.folder import LIST_NAME, put_sheets

OLD = {"a.csv": "old a\n", "b.csv": "old b\n", "plan.json": "old plan\n"}
NEW = {"a.csv": "new a\n", "c.csv": "new c\n", "plan.json": "new plan\n"}
MOVES = len(NEW) + 2
"""Files moved into place: every sheet, and the list before and after."""


def held(folder: Path) -> dict[str, bytes]:
    """Return every file below a folder with its bytes."""
    return {
        str(path.relative_to(folder)): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def names_in(folder: Path) -> list[str]:
    """Return the names of everything in a folder."""
    return sorted(path.name for path in folder.iterdir())


def sheets_in(folder: Path) -> dict[str, str]:
    """Return the text of every file of a folder but the list."""
    return {
        path.name: path.read_text("utf-8") for path in folder.iterdir() if path.name != LIST_NAME
    }


class FailingMove:
    """os.replace that fails at its k-th call, or from then on."""

    def __init__(self, at: int, *, forever: bool, error: type[BaseException] = OSError) -> None:
        self.real = os.replace
        self.left = at
        self.forever = forever
        self.error = error

    def __call__(self, *arguments: object) -> None:
        self.left -= 1
        if self.left == 0 or (self.left < 0 and self.forever):
            raise self.error("no room left")
        self.real(*arguments)  # type: ignore[arg-type]


def test_writes_what_is_given(tmp_path: Path) -> None:
    """The sheets and a list of their checksums are all there is; paths come back in order."""
    target = tmp_path / "deep" / "er" / "sheets"
    paths = put_sheets(OLD, target)
    assert paths == tuple(target / name for name in OLD)
    assert sheets_in(target) == OLD
    assert names_in(tmp_path / "deep" / "er") == ["sheets"]


def test_list_is_read_by_the_usual_tool(tmp_path: Path) -> None:
    """Every line of the list but its head is a SHA-256, two spaces and a name."""
    put_sheets(OLD, tmp_path)
    head, *lines = (tmp_path / LIST_NAME).read_text("utf-8").splitlines()
    assert head.startswith("#")
    assert lines == [
        f"{hashlib.sha256(text.encode()).hexdigest()}  {name}" for name, text in OLD.items()
    ]


def test_replaces_and_removes_only_its_own(tmp_path: Path) -> None:
    """Written again, our files are replaced, stale ones removed, and others stay as they were."""
    others = {"notes.txt": b"mine", "sub/a.csv": b"mine too", "a.csv.bak": b"and this"}
    (tmp_path / "sub").mkdir()
    for name, content in others.items():
        (tmp_path / name).write_bytes(content)
    put_sheets(OLD, tmp_path)
    put_sheets(NEW, tmp_path)
    found = held(tmp_path)
    assert {name: found[name] for name in others} == others
    expected = {*others, *NEW, LIST_NAME}
    assert set(found) == expected
    assert {name: found[name].decode() for name in NEW} == NEW


def test_writing_the_same_again_changes_nothing(tmp_path: Path) -> None:
    """The same sheets again give the same files, the list among them."""
    put_sheets(OLD, tmp_path)
    before = held(tmp_path)
    put_sheets(OLD, tmp_path)
    assert held(tmp_path) == before


def refused(folder: Path, *, sheets: dict[str, str] = NEW) -> InputError:
    """Return the error that refuses a folder, having checked that nothing changed there."""
    top = folder.parent
    before, names = held(top), sorted(str(p) for p in top.rglob("*"))
    with pytest.raises(InputError) as caught:
        put_sheets(sheets, folder)
    assert held(top) == before
    assert sorted(str(p) for p in top.rglob("*")) == names
    return caught.value


@pytest.mark.parametrize("name", [*NEW, LIST_NAME])
def test_a_foreign_file_of_the_same_name_is_refused(tmp_path: Path, name: str) -> None:
    """A file we did not write stands in the way, even one of an equal name; nothing is written."""
    target = tmp_path / "out"
    target.mkdir()
    (target / name).write_text("somebody else's", "utf-8")
    error = refused(target)
    assert name in str(error)
    assert "not one of our sheets" in str(error)


def test_every_file_in_the_way_is_named(tmp_path: Path) -> None:
    """All files in the way are problems of one error."""
    target = tmp_path / "out"
    target.mkdir()
    for name in NEW:
        (target / name).write_text("somebody else's", "utf-8")
    assert len(refused(target).problems) == len(NEW)


def test_a_changed_sheet_is_refused(tmp_path: Path) -> None:
    """A sheet that was edited since is not overwritten; its folder is left as it is."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    (target / "a.csv").write_text("corrected by hand", "utf-8")
    error = refused(target)
    assert "was changed since it was written" in str(error)
    assert [problem.where for problem in error.problems] == [str(target / "a.csv")]


def test_a_changed_stale_sheet_is_kept(tmp_path: Path) -> None:
    """A stale sheet that was edited since is somebody's work: it stays."""
    put_sheets(OLD, tmp_path)
    (tmp_path / "b.csv").write_text("corrected by hand", "utf-8")
    put_sheets(NEW, tmp_path)
    assert (tmp_path / "b.csv").read_text("utf-8") == "corrected by hand"


def test_a_sheet_removed_by_hand_comes_back(tmp_path: Path) -> None:
    """A sheet that was deleted is simply written again."""
    put_sheets(OLD, tmp_path)
    (tmp_path / "a.csv").unlink()
    put_sheets(NEW, tmp_path)
    assert sheets_in(tmp_path) == NEW


@pytest.mark.parametrize(
    "text",
    [
        "",
        "{sum}  a.csv\n",
        "{head}\n{sum}  ../mine.txt\n",
        "{head}\n{sum}  sub/mine.txt\n",
        "{head}\n{sum}  {abs}\n",
        "{head}\nanything else\n",
        "{head}\n{sum}  ..\n",
    ],
    ids=["empty", "no head", "parent", "below", "absolute", "no entry", "dots"],
)
def test_a_list_that_is_not_ours_is_refused(tmp_path: Path, text: str) -> None:
    """A list without our head, or with anything but plain names, is somebody else's file."""
    target = tmp_path / "out"
    target.mkdir()
    (target / "sub").mkdir()
    mine = b"mine"
    for path in (tmp_path / "mine.txt", target / "sub" / "mine.txt"):
        path.write_bytes(mine)
    facts = {
        "sum": hashlib.sha256(mine).hexdigest(),
        "head": folder_module._LIST_HEAD,
        "abs": str(tmp_path / "mine.txt"),
    }
    (target / LIST_NAME).write_text(text.format(**facts), "utf-8")
    assert LIST_NAME in str(refused(target))


def test_without_its_list_nothing_is_ours(tmp_path: Path) -> None:
    """Where the list is gone, our own old sheets are foreign."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    (target / LIST_NAME).unlink()
    assert len(refused(target).problems) == 2


def test_a_link_in_the_way_is_refused(tmp_path: Path) -> None:
    """A link of a sheet's name is not ours, whatever it points at, and stays."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    real = tmp_path / "real.csv"
    real.write_text(OLD["a.csv"], "utf-8")
    (target / "a.csv").unlink()
    (target / "a.csv").symlink_to(real)
    refused(target)
    (target / "a.csv").unlink()
    (target / "a.csv").symlink_to(tmp_path / "nowhere")
    refused(target)
    assert (target / "a.csv").is_symlink()


@pytest.mark.parametrize("name", ["a.csv", LIST_NAME])
def test_a_folder_in_the_way_is_refused(tmp_path: Path, name: str) -> None:
    """A folder of a sheet's name is refused."""
    target = tmp_path / "out"
    (target / name).mkdir(parents=True)
    refused(target)


def test_a_link_to_a_folder_is_followed(tmp_path: Path) -> None:
    """Given a link to a folder, the sheets go into that folder and the link stays."""
    (tmp_path / "real").mkdir()
    link = tmp_path / "link"
    link.symlink_to(tmp_path / "real")
    assert put_sheets(OLD, link)[0] == link / "a.csv"
    assert link.is_symlink()
    assert sheets_in(tmp_path / "real") == OLD
    assert names_in(tmp_path) == ["link", "real"]


def test_a_link_to_nowhere_makes_what_it_names(tmp_path: Path) -> None:
    """Given a link to a folder that is not there yet, that folder is made."""
    link = tmp_path / "link"
    link.symlink_to(tmp_path / "real")
    put_sheets(OLD, link)
    assert sheets_in(tmp_path / "real") == OLD


def test_out_is_a_file(tmp_path: Path) -> None:
    """A file in place of the folder, or of one above it, is refused and stays."""
    (tmp_path / "out").write_text("mine", "utf-8")
    assert "is not a folder" in str(refused(tmp_path / "out"))
    with pytest.raises(InputError, match="cannot be written to"):
        put_sheets(NEW, tmp_path / "out" / "sheets")
    assert (tmp_path / "out").read_text("utf-8") == "mine"


@pytest.mark.parametrize(
    "name", ["a" * 300, "a/" * 3000, "a\0b"], ids=["long name", "long path", "null"]
)
def test_impossible_names_are_refused(tmp_path: Path, name: str) -> None:
    """A name that no file system takes is refused in words."""
    with pytest.raises(InputError, match="cannot be written to"):
        put_sheets(NEW, f"{tmp_path}/{name}")
    assert names_in(tmp_path) == []


def test_a_parent_that_cannot_be_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where no folder can be made beside a new one, that is said and nothing is left."""

    def denied(*_: object, **__: object) -> str:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(tempfile, "mkdtemp", denied)
    with pytest.raises(InputError, match="Permission denied"):
        put_sheets(NEW, tmp_path / "new" / "out")
    assert names_in(tmp_path) == []


def test_a_folder_below_a_parent_that_cannot_be_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where only the folder itself can be written, the sheets are built inside it."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    real = tempfile.mkdtemp

    def denied_above(*, prefix: str, dir: Path) -> str:  # noqa: A002
        if dir == tmp_path:
            raise PermissionError(13, "Permission denied")
        return real(prefix=prefix, dir=dir)

    monkeypatch.setattr(tempfile, "mkdtemp", denied_above)
    put_sheets(NEW, target)
    assert sheets_in(target) == NEW


@pytest.mark.skipif(not Path("/proc/self").exists(), reason="no folder that nobody can write")
def test_a_place_nobody_can_write() -> None:
    """Where the system itself refuses, that is an input error."""
    with pytest.raises(InputError, match="cannot be written to"):
        put_sheets(NEW, "/proc/sheets/of/mine")


@pytest.mark.parametrize("at", range(1, MOVES + 1))
@pytest.mark.parametrize("error", [OSError, KeyboardInterrupt])
@pytest.mark.parametrize("is_new", [True, False], ids=["new folder", "old sheets"])
def test_a_move_that_fails_is_undone(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    *,
    at: int,
    error: type[BaseException],
    is_new: bool,
) -> None:
    """Whichever move fails, everything is as it was, and the next call goes through."""
    target = tmp_path / "above" / "out"
    if not is_new:
        put_sheets(OLD, target)
        (target / "mine.txt").write_text("mine", "utf-8")
    before = held(tmp_path)
    with monkeypatch.context() as patch:
        patch.setattr(os, "replace", FailingMove(at, forever=False, error=error))
        with pytest.raises(InputError if error is OSError else error):
            put_sheets(NEW, target)
    assert held(tmp_path) == before
    if is_new:
        assert names_in(tmp_path) == []
    put_sheets(NEW, target)
    assert sheets_in(target) == NEW | ({} if is_new else {"mine.txt": "mine"})
    assert names_in(target.parent) == ["out"]


@pytest.mark.parametrize("at", range(1, MOVES + 1))
def test_a_disk_that_fails_for_good_is_recovered_from(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, at: int
) -> None:
    """Where nothing can be put back either, each file is whole, and the next call goes through."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    with monkeypatch.context() as patch:
        patch.setattr(os, "replace", FailingMove(at, forever=True))
        with pytest.raises(InputError):
            put_sheets(NEW, target)
    for name, text in sheets_in(target).items():
        assert text in (OLD.get(name), NEW.get(name))
    assert names_in(tmp_path) == ["out"]
    put_sheets(NEW, target)
    assert {**NEW}.items() <= sheets_in(target).items()


KILLED = """
import os, sys
from routeplan.sheets.folder import put_sheets
real, left = os.replace, int(sys.argv[2])
def replace(*arguments):
    global left
    left -= 1
    if not left:
        os._exit(9)
    real(*arguments)
os.replace = replace
put_sheets({new!r}, sys.argv[1])
"""


@pytest.mark.parametrize("at", range(1, MOVES + 1))
def test_a_killed_process_is_recovered_from(tmp_path: Path, at: int) -> None:
    """A process killed at any move leaves whole files and a list of them; the next goes through."""
    target = tmp_path / "out"
    put_sheets(OLD, target)
    (target / "mine.txt").write_text("mine", "utf-8")
    code = [sys.executable, "-c", KILLED.format(new=NEW), str(target), str(at)]
    assert subprocess.run(code, check=False).returncode == 9
    for name, text in sheets_in(target).items():
        assert text in (OLD.get(name), NEW.get(name), "mine")
    put_sheets(NEW, target)
    found = sheets_in(target)
    assert found.pop("mine.txt") == "mine"
    assert found == NEW


def test_plan_json_is_moved_last(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Of all sheets plan.json is moved last, whatever order they are given in."""
    moved: list[str] = []
    real = os.replace

    def noted(source: Path, target: Path) -> None:
        moved.append(Path(target).name)
        real(source, target)

    monkeypatch.setattr(os, "replace", noted)
    put_sheets({"plan.json": "1", "a.csv": "2", "z.html": "3"}, tmp_path / "out")
    assert moved == [LIST_NAME, "a.csv", "z.html", "plan.json", LIST_NAME]


def test_moves_stay_on_one_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A folder that is a disk of its own is built in from inside: nothing is moved across."""
    target = tmp_path / "out"
    target.mkdir()
    real = Path.stat

    class OtherDisk:
        def __init__(self, found: os.stat_result) -> None:
            self.st_mode, self.st_dev = found.st_mode, found.st_dev + 1

    def stat(path: Path, **more: bool) -> object:
        found = real(path, **more)
        return OtherDisk(found) if path == target else found

    sources: list[Path] = []
    move = os.replace

    def noted(source: Path, goal: Path) -> None:
        sources.append(Path(source))
        move(source, goal)

    monkeypatch.setattr(Path, "stat", stat)
    monkeypatch.setattr(os, "replace", noted)
    put_sheets(NEW, target)
    assert all(target in source.parents for source in sources)
    monkeypatch.undo()
    assert sheets_in(target) == NEW
