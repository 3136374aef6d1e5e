"""Attenuation of cabled fibre between and beyond its points."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.errors import InputError, RangeError
from routeplan.light.attenuation import attenuation_of, ceiling_db_per_km, sigma_db_per_km
from routeplan.light.fibres import fibre_names, find_fibre
from routeplan.light.spectrum import (
    attenuation_db_per_km,
    infrared_db_per_km,
    loss_curve,
    loss_spectrum,
    water_peak_ratio,
)
from tests.light.small_paths import measured

# Which curves the recommendations' ceilings were made for.
LOW_WATER_PEAK = ("G.652.D", "G.657.A1", "G.657.A2", "G.657.B3")


@pytest.mark.parametrize(
    ("wavelength_nm", "expected_db_per_km"),
    [(1310.0, 0.000066), (1550.0, 0.02037), (1625.0, 0.08629), (1650.0, 0.13561)],
)
def test_infrared_edge_is_the_published_one(
    wavelength_nm: float, expected_db_per_km: float
) -> None:
    """Absorption by the glass itself, 7.81e11 exp(-48.48/um), to the printed digit."""
    assert infrared_db_per_km(wavelength_nm) == pytest.approx(expected_db_per_km, abs=6e-6)


@pytest.mark.parametrize("fibre_type", fibre_names())
def test_table_points_come_back_exactly(fibre_type: str) -> None:
    """Every row of the table is on the typical and on the maximum curve."""
    attenuation = attenuation_of(fibre_type)
    for row in find_fibre(fibre_type).attenuation:
        nm = row.wavelength_nm
        assert attenuation_db_per_km(nm, attenuation.typical) == pytest.approx(
            row.typical_db_per_km, abs=1e-12
        )
        assert attenuation_db_per_km(nm, attenuation.maximum) == pytest.approx(
            row.max_db_per_km, abs=1e-12
        )
        assert sigma_db_per_km(nm, attenuation) == row.sigma_db_per_km


@pytest.mark.parametrize("fibre_type", fibre_names())
def test_typical_stays_under_maximum_and_maximum_under_the_ceiling(fibre_type: str) -> None:
    """What is ordered is better than the recommendation, and typical cable better than that."""
    attenuation, fibre = attenuation_of(fibre_type), find_fibre(fibre_type)
    for nm in np.arange(max(1260.0, fibre.cutoff_max_nm), 1625.1, 5.0):
        maximum = attenuation_db_per_km(float(nm), attenuation.maximum)
        assert attenuation_db_per_km(float(nm), attenuation.typical) < maximum
        ceiling = ceiling_db_per_km(float(nm), fibre)
        assert ceiling is None or maximum <= ceiling


@pytest.mark.parametrize("fibre_type", LOW_WATER_PEAK)
def test_curve_falls_peaks_at_water_falls_again_and_rises_above_1600(fibre_type: str) -> None:
    """Scattering falls with wavelength; water peaks at 1383 nm; infrared rises at the end."""
    nm = np.arange(1260.0, 1625.01, 0.5)
    for curve in (attenuation_of(fibre_type).typical, attenuation_of(fibre_type).maximum):
        slope = np.diff(attenuation_db_per_km(nm, curve))
        middle = nm[:-1] + 0.25
        assert (slope[middle < 1350.0] < 0.0).all()
        assert (slope[(middle > 1400.0) & (middle < 1550.0)] < 0.0).all()
        assert (slope[middle > 1590.0] > 0.0).all()
        near = (nm > 1365.0) & (nm < 1400.0)
        top_nm = nm[near][np.argmax(attenuation_db_per_km(nm[near], curve))]
        assert top_nm == pytest.approx(1383.0, abs=4.0)


def test_points_at_1310_and_1550_do_not_hide_the_infrared_edge() -> None:
    """A fit without the edge gives 0.173 dB/km at 1625 nm; real fibre loses more than at 1550."""
    curve = attenuation_of("G.652.D", measured((1310, 0.35), (1550, 0.20))).typical
    assert attenuation_db_per_km(1625.0, curve) > 0.21
    # A/lambda^4 + C through the same two points: 0.2267 at 1490 nm, before water and infrared.
    assert attenuation_db_per_km(1490.0, curve) == pytest.approx(0.2267, abs=0.012)


@settings(max_examples=60, deadline=None)
@given(
    st.lists(
        st.tuples(st.integers(1260, 1625), st.floats(0.15, 2.0)),
        min_size=1,
        max_size=8,
        unique_by=lambda point: point[0],
    )
)
def test_measured_points_come_back_exactly(points: list[tuple[int, float]]) -> None:
    """Any set of measured points is on the curve, wherever they lie and in whatever order."""
    attenuation = attenuation_of("G.652.D", measured(*points))
    for nm, db_per_km in points:
        assert attenuation_db_per_km(float(nm), attenuation.typical) == pytest.approx(
            db_per_km, abs=1e-9
        )
    assert attenuation.typical is attenuation.maximum


def test_one_measured_point_moves_the_whole_curve_with_it() -> None:
    """Cable 3 % better at 1310 nm is better everywhere, and a point on the curve changes none."""
    own = attenuation_of("G.652.D").typical
    nm = np.arange(1260.0, 1625.1, 5.0)
    same = attenuation_of("G.652.D", measured((1310, 0.33))).typical
    better = attenuation_of("G.652.D", measured((1310, 0.32))).typical
    assert attenuation_db_per_km(nm, same) == pytest.approx(
        attenuation_db_per_km(nm, own), abs=1e-12
    )
    assert (attenuation_db_per_km(nm, better) < attenuation_db_per_km(nm, own)).all()


def test_ordinary_water_peak_is_narrow_and_where_it_should_be() -> None:
    """A peak of 1 dB/km at 1383 nm leaves 1310 and 1550 nm alone and is halved 16 nm away."""
    curve = attenuation_of("G.652.D", measured((1310, 0.35), (1383, 1.0), (1550, 0.20))).typical
    assert attenuation_db_per_km(1310.0, curve) == pytest.approx(0.35, abs=1e-12)
    dry = attenuation_of("G.652.D", measured((1310, 0.35), (1383, 0.27), (1550, 0.20))).typical
    top = attenuation_db_per_km(1383.0, curve) - attenuation_db_per_km(1383.0, dry)
    half = attenuation_db_per_km(1399.0, curve) - attenuation_db_per_km(1399.0, dry)
    assert half / top == pytest.approx(0.5, abs=0.04)
    assert (
        water_peak_ratio(1383.0 - 16.0) == water_peak_ratio(1399.0) == pytest.approx(0.46, abs=0.01)
    )
    assert water_peak_ratio(1310.0) == water_peak_ratio(1490.0) == 0.0


def test_arrays_give_what_floats_give() -> None:
    """The curve of an array is the curve of each of its values."""
    curve = attenuation_of("G.656").maximum
    nm = np.linspace(1260.0, 1625.0, 37).reshape(1, 37)
    whole = attenuation_db_per_km(nm, curve)
    assert whole.shape == (1, 37)
    assert whole[0].tolist() == [attenuation_db_per_km(float(value), curve) for value in nm[0]]


@pytest.mark.parametrize("wavelength_nm", [1259.9, 1625.1, float("nan"), -1.0])
def test_wavelengths_outside_the_bands_are_refused(wavelength_nm: float) -> None:
    """Nothing is made up outside 1260 to 1625 nm, and the message says which value it was."""
    curve = attenuation_of("G.652.D").typical
    with pytest.raises(RangeError, match=f"{wavelength_nm:g} nm, limit 1260 to 1625 nm"):
        attenuation_db_per_km(np.array([1550.0, wavelength_nm]), curve)


def test_unknown_fibre_type_names_the_nearest() -> None:
    """A slip of the pen is answered with the type that was meant, multimode with what it is."""
    with pytest.raises(InputError, match=r'Did you mean "G.652.D"'):
        attenuation_of("G652D")
    with pytest.raises(InputError, match="Multimode"):
        attenuation_of("OM3")


def test_spectrum_covers_all_bands() -> None:
    """One value a nanometre from 1260 to 1625."""
    nm, loss = loss_spectrum(attenuation_of("G.652.D").typical)
    assert (nm[0], nm[-1], len(nm), len(loss)) == (1260.0, 1625.0, 366, 366)


def test_curve_without_points_at_water_has_no_peak() -> None:
    """Two points alone leave scattering and infrared."""
    curve = loss_curve([(1310.0, 0.35), (1550.0, 0.2)])
    assert curve.water_db_per_km == 0.0
