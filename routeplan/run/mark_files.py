"""Jacket marks from a table of a crew: one line of comma-separated text for each reel."""

from __future__ import annotations

import csv
import math
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from routeplan.errors import Problem, RunFileError
from routeplan.run.geometry import file_bytes
from routeplan.run.practice import JacketMark
from routeplan.run.trouble import Trouble, is_plain_text, listed, shown

if TYPE_CHECKING:
    from hashlib import _Hash

__all__ = ["marks_from_files"]

_COLUMNS = ("reel", "start_m", "falling")
_SWITCHES = {"": False, "false": False, "no": False, "true": True, "yes": True}
_LONGEST_M = 1_000_000
_NAME_LETTERS = 500


def marks_from_files(
    names: Sequence[str],
    folder: Path,
    declared: Sequence[JacketMark],
    *,
    digest: _Hash,
    trouble: Trouble,
) -> tuple[JacketMark, ...]:
    """
    Return the marks a run file declares, and after them those of the files that it names.

    Parameters
    ----------
    names
        Files as the run file has them: UTF-8 text with the columns `reel`, `start_m` and, if
        wanted, `falling`.
    folder
        What relative names are relative to.
    declared
        Marks of the run file itself; a reel has its marks in one place only.
    digest
        Of all input bytes; those of the files are added.
    trouble
        Where problems are noted, each with its line.
    """
    found = list(declared)
    seen = {mark.reel: "the run file" for mark in declared}
    for name in names:
        content = file_bytes(folder / name, file=name, trouble=trouble)
        if content is None:
            continue
        digest.update(content)
        try:
            text = content.decode("utf-8-sig")
        except UnicodeDecodeError:
            _refuse(trouble, name, "is not UTF-8 text")
            continue
        for where, mark in _marks(text, file=name, trouble=trouble):
            if mark.reel in seen:
                what = f"gives a reel marks that it has from {seen[mark.reel]}"
                _refuse(trouble, where, what, value=shown(mark.reel), file=name)
            seen.setdefault(mark.reel, where)
            found.append(mark)
    return tuple(found)


def _marks(text: str, *, file: str, trouble: Trouble) -> Iterator[tuple[str, JacketMark]]:
    """Yield the marks of a table, each with where it stands."""
    lines = csv.reader(text.splitlines(), strict=True)
    heads: list[str] = []
    try:
        for cells in lines:
            where = f"{file}, line {lines.line_num}"
            stripped = [cell.strip() for cell in cells]
            if not any(stripped):
                continue
            if heads:
                mark = _mark(heads, stripped, where, trouble)
                if mark is not None:
                    yield where, mark
            elif _are_heads(stripped, where, trouble):
                heads = stripped
            else:
                return
    except csv.Error as error:
        _refuse(trouble, f"{file}, line {lines.line_num}", "cannot be read", value=str(error))
    if not heads:
        _refuse(trouble, file, "has no line of column names", limit=listed(_COLUMNS))


def _are_heads(heads: Sequence[str], where: str, trouble: Trouble) -> bool:
    unknown = [head for head in heads if head not in _COLUMNS]
    missing = [head for head in _COLUMNS[:2] if head not in heads]
    if unknown:
        what = "has columns that are not known"
        _refuse(trouble, where, what, value=shown(listed(unknown)), limit=listed(_COLUMNS))
    if missing:
        _refuse(trouble, where, "lacks columns", value=listed(missing), limit=listed(_COLUMNS))
    if len(set(heads)) < len(heads):
        _refuse(trouble, where, "names a column twice", value=shown(listed(heads)))
        return False
    return not unknown and not missing


def _mark(
    heads: Sequence[str], cells: Sequence[str], where: str, trouble: Trouble
) -> JacketMark | None:
    """Return the mark of one line, or None with all that is wrong with it noted."""
    file = where.rpartition(", line ")[0]
    if len(cells) != len(heads):
        what = "has another number of cells than there are columns"
        _refuse(trouble, where, what, value=str(len(cells)), limit=str(len(heads)), file=file)
        return None
    row = dict(zip(heads, cells, strict=True))
    reel, start_m = row["reel"], _number(row["start_m"])
    falling = _SWITCHES.get(row.get("falling", "").lower())
    before = len(trouble.problems)
    if not reel or len(reel) > _NAME_LETTERS or not is_plain_text(reel):
        what = "has no name of a reel that can be used"
        _refuse(trouble, where, what, value=shown(reel), file=file)
    if start_m is None:
        limit = f"a number from 0 to {_LONGEST_M}"
        what = "has a start_m that cannot be"
        _refuse(trouble, where, what, value=shown(row["start_m"]), limit=limit, file=file)
    if falling is None:
        limit = "true, false, yes, no or nothing"
        what = "has a falling that is not known"
        _refuse(trouble, where, what, value=shown(row["falling"]), limit=limit, file=file)
    if start_m is None or falling is None or len(trouble.problems) > before:
        return None
    return JacketMark(reel=reel, start_m=start_m, falling=falling)


def _number(text: str) -> float | None:
    try:
        value = float(text)
    except ValueError:
        return None
    return value if math.isfinite(value) and 0 <= value <= _LONGEST_M else None


def _refuse(
    trouble: Trouble, where: str, what: str, *, value: str = "", limit: str = "", file: str = ""
) -> None:
    problem = Problem(where=where, what=what, value=value, limit=limit)
    trouble.add(RunFileError, problem, file=file)
