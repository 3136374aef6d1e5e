"""Jacket marks from a CSV: the same as in the run file, and every wrong line named."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from routeplan.errors import InputError, RunFileError
from routeplan.run import read_run

RUN = 'marks = "marks.csv"\n'
OWN = '[[mark]]\nreel = "R9"\nstart_m = 7\n'


def test_lines_are_marks_beside_those_of_the_run_file(
    run_with: Callable[[str], Path], write: Callable[..., Path]
) -> None:
    """Columns stand in any order; a mark may fall, and blank lines and a BOM do no harm."""
    write("marks.csv", "\ufeffstart_m,reel,falling\r\n12.5,R1,\r\n\r\n 4000 , R2 ,Yes\r\n")
    marks = read_run(run_with(RUN + OWN)).marks
    assert [(mark.reel, mark.start_m, mark.falling) for mark in marks] == [
        ("R9", 7.0, False),
        ("R1", 12.5, False),
        ("R2", 4000.0, True),
    ]


def test_falling_may_be_left_out(
    run_with: Callable[[str], Path], write: Callable[..., Path]
) -> None:
    """Two columns are enough; a quoted name keeps its comma."""
    write("marks.csv", 'reel,start_m\n"Drum 4, blue",0\n')
    (mark,) = read_run(run_with(RUN)).marks
    assert (mark.reel, mark.start_m, mark.falling) == ("Drum 4, blue", 0.0, False)


def test_its_bytes_are_part_of_the_digest(
    run_with: Callable[[str], Path], write: Callable[..., Path]
) -> None:
    """Another mark is another run; the same bytes are the same."""
    path = run_with(RUN)
    digests = []
    for start_m in (1, 2, 1):
        write("marks.csv", f"reel,start_m\nR1,{start_m}\n")
        digests.append(read_run(path).digest)
    assert digests[0] == digests[2] != digests[1]


def test_every_wrong_line_is_named(
    run_with: Callable[[str], Path], write: Callable[..., Path]
) -> None:
    """All at once, each by its line, with what stands there."""
    lines = ["reel,start_m,falling", "R1,-1,", "R2,5,maybe", ",5,", "R3,nan,no", "R4,1", "R5,1,no",
             "R5,2,no", "R9,2,no"]  # fmt: skip
    write("marks.csv", "\n".join(lines))
    with pytest.raises(RunFileError) as caught:
        read_run(run_with(RUN + OWN))
    found = {problem.where: problem for problem in caught.value.problems}
    assert list(found) == [f"marks.csv, line {number}" for number in (2, 3, 4, 5, 6, 8, 9)]
    assert found["marks.csv, line 2"].value == '"-1"'
    assert found["marks.csv, line 3"].value == '"maybe"'
    assert found["marks.csv, line 8"].what.endswith("from marks.csv, line 7")
    assert found["marks.csv, line 9"].what.endswith("from the run file")


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "is empty"),
        ("\n\n", "no line of column names"),
        ("reel,metres\nR1,5\n", "not known"),
        ("reel\nR1\n", "lacks columns"),
        ("reel,start_m,reel\nR1,5,R1\n", "twice"),
        ('reel,start_m\n"R1,5\n', "cannot be read"),
    ],
)
def test_a_file_that_is_no_table_of_marks_is_named(
    run_with: Callable[[str], Path], write: Callable[..., Path], text: str, says: str
) -> None:
    """What is wrong with the whole of it is said in words."""
    write("marks.csv", text)
    with pytest.raises(InputError) as caught:
        read_run(run_with(RUN))
    assert any(says in problem.what for problem in caught.value.problems)


def test_a_file_that_is_not_there_is_named(run_with: Callable[[str], Path]) -> None:
    """With where it was looked for."""
    with pytest.raises(InputError, match=r"marks\.csv.*is not there"):
        read_run(run_with(RUN))
