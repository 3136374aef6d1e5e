"""Loss of declared bends."""

from __future__ import annotations

import pytest

from routeplan.light.bends import BendRow, bend_loss
from routeplan.light.fibres import fibre_names, find_fibre
from routeplan.tables import load_rows

ROWS: tuple[BendRow, ...] = load_rows("bends", BendRow)


@pytest.mark.parametrize(
    "row", ROWS, ids=lambda r: f"{r.fibre_type}-{r.radius_mm}-{r.wavelength_nm}"
)
def test_limit_is_for_all_stated_turns_together(row: BendRow) -> None:
    """Ten turns of 15 mm may lose 0.25 dB in A1, not 2.5; the mean is at that limit, too."""
    loss = bend_loss(
        find_fibre(row.fibre_type), row.radius_mm, row.turns, wavelength_nm=row.wavelength_nm
    )
    assert loss is not None
    assert loss.limit_db <= row.limit_db
    assert loss.mean_db <= loss.limit_db


def test_turns_share_the_mean_and_multiply_the_limit() -> None:
    """One turn keeps the whole limit; twenty have twice that of ten."""
    fibre = find_fibre("G.657.A1")
    one, ten, twenty = (
        bend_loss(fibre, 15.0, turns, wavelength_nm=1550.0) for turns in (1.0, 10.0, 20.0)
    )
    assert one
    assert ten
    assert twenty
    assert (one.mean_db, one.limit_db) == pytest.approx((0.025, 0.25))
    assert (ten.mean_db, ten.limit_db) == pytest.approx((0.25, 0.25))
    assert (twenty.mean_db, twenty.limit_db) == pytest.approx((0.5, 0.5))


@pytest.mark.parametrize("wavelength_nm", [1550.0, 1590.0, 1625.0])
def test_better_types_lose_less_and_longer_waves_more(wavelength_nm: float) -> None:
    """A1 > A2 > B3 at one turn of 10 mm; 1625 nm > 1550 nm."""
    names = ("G.657.A1", "G.657.A2", "G.657.B3")
    found = [bend_loss(find_fibre(n), 10.0, 1.0, wavelength_nm=wavelength_nm) for n in names]
    limits = [loss.limit_db for loss in found if loss]
    assert len(limits) == 3
    assert limits == sorted(limits, reverse=True)
    short = bend_loss(find_fibre("G.657.A1"), 10.0, 1.0, wavelength_nm=1310.0)
    assert short is not None
    assert short.limit_db == 0.75 <= limits[0]


def test_tighter_than_any_limit_is_not_known() -> None:
    """G.652.D at 10 mm, or A2 at 7: no limit, so no figure."""
    assert bend_loss(find_fibre("G.652.D"), 10.0, 1.0, wavelength_nm=1550.0) is None
    assert bend_loss(find_fibre("G.657.A2"), 7.0, 1.0, wavelength_nm=1550.0) is None


def test_wide_bends_of_bend_tolerant_fibre_have_the_ordinary_limit() -> None:
    """A2 also meets G.652.D, whose 100 turns of 30 mm may lose 0.1 dB."""
    loss = bend_loss(find_fibre("G.657.A1"), 30.0, 100.0, wavelength_nm=1625.0)
    assert loss is not None
    assert loss.limit_db == 0.1


def test_every_type_has_a_bend_limit_at_its_own_radius() -> None:
    """The design radius of each type is one of its tests."""
    for name in fibre_names():
        fibre = find_fibre(name)
        assert bend_loss(fibre, fibre.bend_radius_min_mm, 1.0, wavelength_nm=1625.0) is not None
