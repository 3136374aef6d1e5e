"""Putting sheets into a folder: nothing of anybody else's touched, nothing half done."""

from __future__ import annotations

import contextlib
import hashlib
import os
import re
import shutil
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import TypeAlias

from routeplan.errors import InputError, Problem

__all__ = ["LIST_NAME", "put_sheets"]

LIST_NAME = "sheets.sha256"
"""The list of what was written, in the form that sha256sum reads."""

_LIST_HEAD = "# Sheets written by routeplan. Only files of this list are replaced or removed."
# A name of the list is never a path.
_ENTRY = re.compile(r"([0-9a-f]{64})  ([A-Za-z0-9][A-Za-z0-9._-]*)")
_LAST = "plan.json"

Entries: TypeAlias = Sequence[tuple[str, str]]


def put_sheets(sheets: Mapping[str, str], folder: str | Path) -> tuple[Path, ...]:
    """
    Move finished sheets into a folder, replacing only what an earlier call put there.

    They are built in a temporary folder beside it and moved over one by one, `plan.json` last. If
    a move fails, what was there before is put back; if even that is cut short, the list in the
    folder names both the old and the new files, so that the next call can go on.

    Parameters
    ----------
    sheets
        Text by file name.
    folder
        Where to; made if it does not exist.

    Returns
    -------
    put_sheets
        Paths of the sheets, in the order given.

    Raises
    ------
    InputError
        If a file in the way is not one of ours or was changed since, or the folder cannot be
        written to; nothing is written then.
    """
    target = Path(folder)
    data = {name: text.encode("utf-8") for name, text in sheets.items()}
    if "\0" in str(folder):
        raise _cannot_write(target, "a null character in its name")
    try:
        # Beside the folder itself, not beside a link to it, which may lie on another disk.
        home = Path(os.path.realpath(target))
        _put(home, data, _ours(target, home, data))
    except OSError as error:
        raise _cannot_write(target, error.strerror or str(error)) from None
    return tuple(target / name for name in data)


def _cannot_write(target: Path, reason: str) -> InputError:
    problem = Problem(
        where=str(target),
        what="cannot be written to",
        value=reason,
        remedy="Choose another folder with --out",
    )
    return InputError(problem)


def _ours(target: Path, home: Path, data: Mapping[str, bytes]) -> Entries:
    """Return checksum and name of what an earlier call wrote, if nothing else is in the way."""
    if home.exists() and not home.is_dir():
        raise InputError(
            Problem(where=str(target), what="is not a folder", remedy="Choose another with --out")
        )
    listed = _listed(home)
    in_way = [] if listed is not None else [LIST_NAME]
    entries = listed or ()
    in_way += [n for n in data if _is_there(home / n) and not _is_ours(home / n, entries)]
    if in_way:
        named = {name for _, name in entries}
        raise InputError(_in_the_way(target / name, is_changed=name in named) for name in in_way)
    return entries


def _in_the_way(path: Path, *, is_changed: bool) -> Problem:
    why = "was changed since it was written" if is_changed else "is not one of our sheets"
    return Problem(
        where=str(path),
        what=f"stands in the way and {why}",
        remedy="Move it elsewhere, or choose another folder with --out",
    )


def _listed(home: Path) -> Entries | None:
    """Return the entries of the folder's list, none where there is no list, None if not ours."""
    path = home / LIST_NAME
    if not _is_there(path):
        return ()
    if path.is_symlink() or not path.is_file():
        return None
    head, *lines = path.read_text("utf-8", "replace").split("\n")
    found = [_ENTRY.fullmatch(line) for line in lines if line]
    if head != _LIST_HEAD or None in found:
        return None
    return [(match[1], match[2]) for match in found if match]


def _is_there(path: Path) -> bool:
    return path.exists() or path.is_symlink()


def _is_ours(path: Path, entries: Entries) -> bool:
    if path.is_symlink() or not path.is_file():
        return False
    return (_sum_of(path.read_bytes()), path.name) in entries


def _sum_of(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()


def _put(home: Path, data: Mapping[str, bytes], listed: Entries) -> None:
    with _made_folders(home.parent), _workshop(home) as shop, _made_folders(home):
        for name, content in data.items():
            (shop / "new" / name).write_bytes(content)
        stale = {name for _, name in listed} - data.keys()
        gone = [name for name in sorted(stale) if _is_ours(home / name, listed)]
        with _put_back_on_failure(home, shop, names=(LIST_NAME, *data, *gone)) as touched:
            _move(home, shop, data, listed=listed, gone=gone, touched=touched)


@contextlib.contextmanager
def _made_folders(folder: Path) -> Iterator[None]:
    """Make a folder and those above it; take away again what was made if anything fails."""
    made = [path for path in (folder, *folder.parents) if not path.exists()]
    try:
        folder.mkdir(parents=True, exist_ok=True)
        yield
    except BaseException:
        for path in made:
            with contextlib.suppress(OSError):
                path.rmdir()
        raise


@contextlib.contextmanager
def _workshop(home: Path) -> Iterator[Path]:
    """Make a temporary folder beside a folder; inside it, where files cannot be moved across."""
    is_mount = home.is_dir() and home.stat().st_dev != home.parent.stat().st_dev
    try:
        shop = Path(tempfile.mkdtemp(prefix=".sheets-", dir=home if is_mount else home.parent))
    except OSError:
        if is_mount or not home.is_dir():
            raise
        shop = Path(tempfile.mkdtemp(prefix=".sheets-", dir=home))
    try:
        (shop / "new").mkdir()
        (shop / "old").mkdir()
        yield shop
    finally:
        shutil.rmtree(shop, ignore_errors=True)


@contextlib.contextmanager
def _put_back_on_failure(
    home: Path, shop: Path, *, names: Sequence[str]
) -> Iterator[dict[str, None]]:
    """Yield where to note what was touched, in order; put all of that back if anything fails."""
    for name in names:
        if (home / name).exists():
            shutil.copy2(home / name, shop / "old" / name)
    touched: dict[str, None] = {}
    try:
        yield touched
    except BaseException:
        # The list was touched first and comes last: until then it names both old and new.
        for name in reversed(touched):
            if (shop / "old" / name).exists():
                os.replace(shop / "old" / name, home / name)
            else:
                (home / name).unlink(missing_ok=True)
        raise


def _move(
    home: Path,
    shop: Path,
    data: Mapping[str, bytes],
    *,
    listed: Entries,
    gone: Sequence[str],
    touched: dict[str, None],
) -> None:
    new = [(_sum_of(content), name) for name, content in data.items()]
    # Old and new sums stand in the list while files move, so that a stop half-way leaves none
    # of them looking like somebody else's.
    _write_list(home, shop, [*listed, *new])
    touched[LIST_NAME] = None
    for name in sorted(data, key=lambda name: name == _LAST):
        if name == _LAST:
            for stale in gone:
                (home / stale).unlink()
                touched[stale] = None
        os.replace(shop / "new" / name, home / name)
        touched[name] = None
    _write_list(home, shop, new)


def _write_list(home: Path, shop: Path, entries: Entries) -> None:
    lines = dict.fromkeys(f"{digest}  {name}\n" for digest, name in entries)
    (shop / LIST_NAME).write_text("".join([f"{_LIST_HEAD}\n", *lines]), "utf-8", newline="\n")
    os.replace(shop / LIST_NAME, home / LIST_NAME)
