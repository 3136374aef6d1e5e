"""Connector grades and which ends may be mated."""

from __future__ import annotations

import pytest

from routeplan.errors import InputError
from routeplan.light.connectors import (
    ReflectionRow,
    check_mating,
    connector_grades,
    connector_loss,
    scatter_db,
)
from routeplan.tables import load_rows


@pytest.mark.parametrize(
    ("grade", "mean_db", "limit_db"),
    [
        # IEC 61755-1 and 61753-1, from memory.
        ("grade A", 0.07, 0.15),
        ("grade B", 0.12, 0.25),
        ("grade C", 0.25, 0.50),
        ("grade D", 0.50, 1.00),
    ],
)
def test_grades_of_the_standard(grade: str, mean_db: float, limit_db: float) -> None:
    """Mean and the loss that 97 % stay below."""
    loss = connector_loss(grade)
    assert (loss.mean_db, loss.limit_db) == (mean_db, limit_db)


def test_scatter_puts_97_percent_below_the_limit() -> None:
    """Every grade's sigma is the one that its mean and limit imply, to the digits it is kept in."""
    for row in connector_grades():
        assert row.sigma_db == pytest.approx(scatter_db(row.mean_db, row.limit_db), abs=6e-4)


def test_field_connectors_lose_more_than_clean_ones() -> None:
    """Lenses and dirt cost more than the worst grade of the standard."""
    worst = connector_loss("grade D").mean_db
    assert connector_loss("expanded beam").mean_db > worst
    assert connector_loss("field, uncleaned").mean_db > worst


def test_angled_on_flat_is_a_problem() -> None:
    """Only like polish is mated, and the place is named."""
    assert check_mating("angled", "angled", where="panel") == []
    (problem,) = check_mating("angled", "flat", where="panel 3")
    assert problem.where == "panel 3"
    assert "angled on flat" in problem.value


def test_unknown_grade_names_the_nearest() -> None:
    """A slip of the pen is answered."""
    with pytest.raises(InputError, match='Did you mean "grade B"'):
        connector_loss("Grade  B")


def test_angled_ends_send_least_back() -> None:
    """Return loss grades 1 to 4: 60, 45, 35, 26 dB; an open flat end is far below them all."""
    back = {row.name: row.return_loss_db for row in load_rows("reflections", ReflectionRow)}
    graded = [back[name] for name in ("angled", "flat, grade 2", "flat, grade 3", "flat, grade 4")]
    assert graded == [60.0, 45.0, 35.0, 26.0]
    assert back["open, flat"] < 15.0 < back["open, angled"]
