"""Loss of splices by mismatch, offset and tilt."""

from __future__ import annotations

from math import degrees, pi, radians

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.light.fibres import fibre_names, find_fibre
from routeplan.light.splices import (
    fibre_mismatch,
    mode_field_um,
    mode_mismatch_db,
    mode_radius_um,
    offset_loss_db,
    tilt_loss_db,
)
from tests.light.small_paths import example


@pytest.mark.parametrize(
    ("one_um", "other_um", "loss_db"),
    [(9.2, 8.6, 0.0197), (9.2, 10.4, 0.0651), (10.4, 12.5, 0.1461), (1.0, 1.5, 0.6952)],
)
def test_mismatch_of_gaussian_modes(one_um: float, other_um: float, loss_db: float) -> None:
    """Four pairs, to the printed digit; 0.35 dB for 1.5, found in print, forgot to square."""
    assert mode_mismatch_db(one_um, other_um) == pytest.approx(loss_db, abs=5e-5)
    assert mode_mismatch_db(other_um, one_um) == mode_mismatch_db(one_um, other_um)


def test_example_of_the_largest_offset() -> None:
    """Ghatak and Thyagarajan, example 8.3: 0.1 dB of a mode 5 um in radius is 0.76 um of offset."""
    per_um2 = offset_loss_db(1.0, 10.0)
    value, tolerance = example("splice offset", "largest offset")
    assert (0.1 / per_um2) ** 0.5 == pytest.approx(value, abs=tolerance)
    assert (0.1 / per_um2) ** 0.5 == pytest.approx(0.759, abs=5e-4)


def test_example_of_the_largest_tilt() -> None:
    """Ghatak and Thyagarajan, example 8.4: 0.1 dB at 1.3 um is half a degree (0.4962)."""
    per_rad2 = tilt_loss_db(1.0, 10.0, index=1.45, wavelength_nm=1300.0)
    value, tolerance = example("splice tilt", "largest tilt")
    found_deg = degrees((0.1 / per_rad2) ** 0.5)
    assert found_deg == pytest.approx(value, abs=tolerance)
    assert found_deg == pytest.approx(0.4962, abs=5e-5)


def test_examples_of_a_step_index_fibre() -> None:
    """Keiser, examples 5.5 and 5.6: radius 4.9453 um, 0.1776 dB of offset, 0.40547 dB of tilt."""
    mfd_um = 2.0 * mode_radius_um(4.5, 2.405)
    assert mfd_um / 2.0 == pytest.approx(4.9453, abs=5e-5)
    value, tolerance = example("Keiser 5.5", "offset loss")
    assert offset_loss_db(1.0, mfd_um) == pytest.approx(value, abs=tolerance)
    value, tolerance = example("Keiser 5.6", "tilt loss")
    found = tilt_loss_db(1.0 / 57.3, mfd_um, index=1.465, wavelength_nm=1300.0)
    assert found == pytest.approx(value, abs=tolerance)


def test_example_of_offset_and_tilt_together() -> None:
    """Senior, example 5.5: core 8 um, NA 0.1, V 2.40: 0.224 + 0.492 = 0.72 dB."""
    mfd_um = 2.0 * mode_radius_um(4.0, 2.40)
    wavelength_nm = 2.0 * pi * 4.0 * 0.1 / 2.40 * 1000.0
    offset = offset_loss_db(1.0, mfd_um)
    tilt = tilt_loss_db(radians(1.0), mfd_um, index=1.46, wavelength_nm=wavelength_nm)
    value, tolerance = example("Senior 5.5", "total loss")
    assert offset + tilt == pytest.approx(value, abs=tolerance)


@given(st.floats(6.0, 14.0), st.floats(6.0, 14.0))
def test_mismatch_is_never_negative_and_nothing_between_equals(one_um: float, other: float) -> None:
    """No splice gains light; like fibres lose nothing by mismatch."""
    assert mode_mismatch_db(one_um, other) >= -1e-12
    assert mode_mismatch_db(one_um, one_um) == pytest.approx(0.0, abs=1e-12)


def test_offset_of_unlike_modes_is_between_that_of_each() -> None:
    """Offset hurts a small mode more; two unlike ones lie between."""
    small, mixed, large = (
        offset_loss_db(1.0, 9.0),
        offset_loss_db(1.0, 9.0, 12.0),
        offset_loss_db(1.0, 12.0),
    )
    assert large < mixed < small


def test_arrays_give_what_floats_give() -> None:
    """The formulas take arrays."""
    values = np.array([8.6, 9.2])
    found = mode_mismatch_db(values, np.array([9.2, 9.2]))
    assert found.tolist() == [mode_mismatch_db(8.6, 9.2), mode_mismatch_db(9.2, 9.2)]


@pytest.mark.parametrize("name", fibre_names())
def test_every_type_has_a_mode_field(name: str) -> None:
    """Known at 1310 or at 1550 nm or both, and larger at the longer wavelength."""
    fibre = find_fibre(name)
    assert 8.0 < mode_field_um(fibre, 1310.0) <= mode_field_um(fibre, 1550.0) < 13.0


def test_unlike_fibres_have_a_mean_and_a_limit() -> None:
    """G.652.D on G.654.E at 1550 nm: 0.146 dB typically, more where tolerances part them."""
    found = fibre_mismatch(find_fibre("G.652.D"), find_fibre("G.654.E"), 1550.0)
    assert found.mean_db == pytest.approx(0.1461, abs=5e-5)
    assert found.limit_db > found.mean_db
    same = fibre_mismatch(find_fibre("G.654.E"), find_fibre("G.652.D"), 1550.0)
    assert same == found
