"""Wavelength grids and passive parts."""

from __future__ import annotations

import pytest

from routeplan.errors import InputError
from routeplan.light.grid import (
    OpticalPart,
    check_coarse_channels,
    coarse_channels,
    dense_channel_nm,
    part_loss,
    split_loss_db,
)
from routeplan.tables import load_rows


def test_coarse_grid_has_18_channels_20_nm_apart() -> None:
    """ITU-T G.694.2: 1271 to 1611 nm."""
    centres = [row.centre_nm for row in coarse_channels()]
    assert centres == [1271.0 + 20.0 * number for number in range(18)]
    assert centres[-1] == 1611.0


def test_channels_on_one_fibre_must_not_collide() -> None:
    """Between two channels, or twice in one, is a problem; eighteen apart are none."""
    assert check_coarse_channels([row.centre_nm for row in coarse_channels()], where="c") == []
    between, twice = check_coarse_channels([1311.0, 1321.0, 1310.0], where="c")
    assert "between" in between.what
    assert "1311 nm" in twice.what


def test_dense_grid_starts_at_193_1_thz() -> None:
    """ITU-T G.694.1: 1552.52 nm, and shorter with every step up."""
    assert dense_channel_nm(0, 0.1) == pytest.approx(1552.524, abs=5e-4)
    assert dense_channel_nm(20, 0.05) == dense_channel_nm(10, 0.1) < dense_channel_nm(0, 0.1)


@pytest.mark.parametrize(
    ("ways", "expected_db"),
    [(2, 3.010), (4, 6.021), (8, 9.031), (16, 12.041), (32, 15.051), (64, 18.062)],
)
def test_even_split(ways: int, expected_db: float) -> None:
    """Ten times the logarithm, to the printed digit; a real splitter loses more than that."""
    assert split_loss_db(ways) == pytest.approx(expected_db, abs=5e-4)
    real = part_loss(f"splitter 1:{ways}")
    assert split_loss_db(ways) < real.mean_db < real.limit_db


def test_parts_are_in_order() -> None:
    """Typical is below the limit, sigma is not negative, and an unknown name is answered."""
    for row in load_rows("optical_parts", OpticalPart):
        assert 0.0 < row.typical_db <= row.limit_db
        assert row.sigma_db >= 0.0
    with pytest.raises(InputError, match='Did you mean "splitter 1:8"'):
        part_loss("splitter 1x8")
