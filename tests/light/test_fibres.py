"""Fibre types as the tables describe them."""

from __future__ import annotations

import pytest

from routeplan.light.fibres import check_fibre_type, fibre_names, find_fibre

EXPECTED = {
    "G.652.B",
    "G.652.D",
    "G.654.E",
    "G.655",
    "G.655.C",
    "G.655.D",
    "G.655.E",
    "G.656",
    "G.657.A1",
    "G.657.A2",
    "G.657.B3",
}


def test_every_type_is_there_and_complete() -> None:
    """Each type has the attributes every formula needs, and means to bound its dispersion."""
    assert set(fibre_names()) == EXPECTED
    for name in fibre_names():
        fibre = find_fibre(name)
        assert fibre.attenuation
        assert fibre.ceilings
        box = (fibre.zero_dispersion_min_nm, fibre.slope_max_ps_per_nm2_km)
        assert None not in box or fibre.dispersion_bounds


@pytest.mark.parametrize("wavelength_nm", [1310.0, 1383.0, 1490.0, 1550.0, 1625.0])
@pytest.mark.parametrize("name", ["G.652.D", "G.657.A1", "G.657.A2"])
def test_the_usual_wavelengths_are_points(name: str, wavelength_nm: float) -> None:
    """The wavelengths cable is ordered and measured at are rows, none is interpolated."""
    assert wavelength_nm in {row.wavelength_nm for row in find_fibre(name).attenuation}


def test_tighter_bends_go_with_the_better_types() -> None:
    """ITU-T G.657: A1 10 mm, A2 7.5 mm, B3 5 mm."""
    radii = [find_fibre(name).bend_radius_min_mm for name in ("G.657.A1", "G.657.A2", "G.657.B3")]
    assert radii == [10.0, 7.5, 5.0]


def test_a_known_type_has_no_problem() -> None:
    """Nothing is said of a name that is in the tables."""
    assert check_fibre_type("G.652.D", where="cable.fibre_type") == []


def test_a_name_like_no_other_lists_them_all() -> None:
    """With nothing near, the message lists what there is."""
    (problem,) = check_fibre_type("xyzzy", where="cable.fibre_type")
    assert "G.657.B3" in problem.remedy
