"""Optical interfaces of the table and of one's own."""

from __future__ import annotations

import pytest

from routeplan.errors import InputError
from routeplan.light.interfaces import (
    Optic,
    channels,
    check_fibre_count,
    check_interface,
    check_wavelengths,
    default_wavelengths_nm,
    dispersion_limits_ps_per_nm,
    find_interface,
    interface_names,
    own_optic,
)
from routeplan.run.practice import Interface
from routeplan.tables import load_rows
from tests.light.small_paths import optic, published

ROWS: tuple[Optic, ...] = load_rows("interfaces", Optic)
ETHERNET = [row for row in ROWS if row.family == "Ethernet"]
# IEEE 802.3 clause 52 gives this class 0.2 dB more than launch less channel loss.
SLACK_DB = {"10GBASE-ER": 0.2, "10GBASE-EW": 0.2}


def own(**values: object) -> Interface:
    """Return an interface of one's own with the given figures."""
    return Interface.model_validate({"wavelength_nm": 1310.0, "penalty_db": 0.0} | values)


@pytest.mark.parametrize("row", [r for r in ETHERNET if r.basis == "channel"], ids=lambda r: r.name)
def test_least_receive_power_is_launch_less_channel_loss(row: Optic) -> None:
    """RX minimum = TX minimum - channel loss - what the class sets aside, but for 10GBASE-ER."""
    assert row.tx_min_dbm is not None
    assert row.channel_loss_db is not None
    expected = row.tx_min_dbm - row.channel_loss_db - row.penalty_db - SLACK_DB.get(row.name, 0.0)
    assert row.rx_sensitivity_dbm == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("row", ETHERNET, ids=lambda r: r.name)
def test_least_channel_loss_is_highest_launch_less_overload(row: Optic) -> None:
    """What must be lost at least is what overload asks for; classes that ask nothing need none."""
    assert row.tx_max_dbm is not None
    assert row.rx_overload_dbm is not None
    needed = max(0.0, row.tx_max_dbm - row.rx_overload_dbm)
    stated = row.channel_loss_min_db
    assert (needed if stated is None else stated) == pytest.approx(needed, abs=1e-9) or (
        stated is None and row.basis == "sensitivity"
    )


@pytest.mark.parametrize("row", ROWS, ids=lambda r: r.name)
def test_rows_are_sound(row: Optic) -> None:
    """Bands rise and do not overlap, nominal wavelengths lie in them, powers are in order."""
    edges = [edge for band in row.bands_nm for edge in band]
    assert edges == sorted(edges)
    assert 1260.0 <= edges[0] <= edges[-1] <= 1625.0
    assert len(row.wavelengths_nm) == len(row.bands_nm)
    for nm, (low, high) in zip(row.wavelengths_nm, row.bands_nm, strict=True):
        assert low <= nm <= high
    assert row.available_db is None or row.available_db > 0.0
    assert None in (row.tx_min_dbm, row.tx_max_dbm) or row.tx_min_dbm <= row.tx_max_dbm
    if row.mate:
        assert find_interface(row.mate, {}).at_to == row


def test_penalty_is_not_taken_off_a_channel_loss() -> None:
    """What a channel row sets aside is already inside: 1000BASE-LX allows 4.6 dB, not 1.2."""
    assert find_interface("1000BASE-LX", {}).at_from.available_db == 4.6
    link = optic(tx_min_dbm=-8.0, rx_sensitivity_dbm=-23.0, penalty_db=1.0)
    assert link.available_db == 14.0


def test_dispersion_limits_of_ten_kilometres() -> None:
    """IEEE 802.3 (from memory): -13.23 and +9.19 ps/nm for 10 km at 1310 nm."""
    limits = dispersion_limits_ps_per_nm(find_interface("10GBASE-LR", {}).at_from, 1310.0)
    assert limits == pytest.approx((-13.23, 9.19), abs=0.005)
    assert dispersion_limits_ps_per_nm(find_interface("1000BASE-LX", {}).at_from, 1310.0) is None
    one = own_optic("a", own(dispersion_max_ps_per_nm=800.0))
    assert dispersion_limits_ps_per_nm(one, 1310.0) == (-800.0, 800.0)


def test_a_slip_of_the_pen_is_answered_with_the_nearest_name() -> None:
    """The user's own interfaces are known names, too."""
    with pytest.raises(InputError, match='Did you mean "10GBASE-ER"'):
        find_interface("10GBase ER", {})
    (problem,) = check_interface("own-lnk", {"own-link": own()}, where="circuit 1")
    assert problem.remedy == 'Did you mean "own-link"?'
    (problem,) = check_interface("qwertyuiop", {}, where="circuit 1")
    assert "tables interfaces" in problem.remedy


def test_own_interface_goes_before_the_table() -> None:
    """A run file's interface of a table's name is the one that counts, and says where it stands."""
    pair = find_interface("10GBASE-ER", {"10GBASE-ER": own(channel_loss_db=7.0)})
    assert pair.at_from.available_db == 7.0
    assert pair.at_to.source == "run file, interface.10GBASE-ER"


def test_wavelength_outside_every_band_is_a_problem_each() -> None:
    """All wrong wavelengths are told at once, with the bands; right ones are not."""
    pair = find_interface("40GBASE-LR4", {})
    assert check_wavelengths(pair, [1271.0, 1311.0], where="c") == []
    problems = check_wavelengths(pair, [1281.0, 1311.0, 1550.0], where="c")
    assert [problem.value for problem in problems] == ["1281 nm", "1550 nm"]
    assert "1264.5 to 1277.5 nm" in problems[0].limit


def test_own_band_of_one_wavelength_takes_that_alone() -> None:
    """An interface at 1310 nm is not one at 1311."""
    pair = find_interface("mine", {"mine": own(channel_loss_db=7.0)})
    assert check_wavelengths(pair, [1310.0], where="c") == []
    assert check_wavelengths(pair, [1311.0], where="c")[0].limit == "1310 nm"


def test_one_fibre_both_ways_needs_both_wavelengths() -> None:
    """Each end sends its own wavelength; with one missing, the message says which to add."""
    pair = find_interface("1000BASE-BX10-U", {})
    assert (pair.at_from.name, pair.at_to.name) == ("1000BASE-BX10-U", "1000BASE-BX10-D")
    assert check_wavelengths(pair, [1310.0, 1490.0], where="c") == []
    (problem,) = check_wavelengths(pair, [1310.0], where="c")
    assert problem.remedy == "Add 1490."
    assert default_wavelengths_nm(pair) == (1310.0, 1490.0)
    sent = {(c.direction, c.wavelength_nm) for c in channels(pair, [1310.0, 1490.0])}
    assert sent == {("from-to", 1310.0), ("to-from", 1490.0)}


def test_two_fibres_send_every_wavelength_both_ways() -> None:
    """An ordinary interface, or none, is computed both ways at each wavelength."""
    pair = find_interface("10GBASE-LR", {})
    for given in (pair, None):
        found = [(c.direction, c.wavelength_nm) for c in channels(given, [1270.0, 1310.0])]
        assert found == [
            ("from-to", 1270.0),
            ("to-from", 1270.0),
            ("from-to", 1310.0),
            ("to-from", 1310.0),
        ]


def test_parallel_fibres_are_refused_on_two() -> None:
    """A class of four fibres each way cannot be had on a pair."""
    (problem,) = check_fibre_count(find_interface("400GBASE-DR4", {}), 2, where="c")
    assert problem.limit == "8 fibres"
    assert check_fibre_count(find_interface("400GBASE-FR4", {}), 2, where="c") == []
    assert check_fibre_count(find_interface("1000BASE-BX10", {}), 1, where="c") == []


def test_names_are_unique_and_hold_the_pair() -> None:
    """Every row and the common name of the one pair are known, each once."""
    names = interface_names()
    assert len(set(names)) == len(names)
    assert "1000BASE-BX10" in names
    assert "10GBASE-ER" in names


@pytest.mark.parametrize("row", published("sdh_attenuation.csv"), ids=lambda r: r["code"])
def test_attenuation_range_of_synchronous_interfaces(row: dict[str, str]) -> None:
    """Most = launch - sensitivity - penalty; least = launch - overload; both as published."""
    found = find_interface(row["code"], {}).at_from
    assert found.tx_max_dbm is not None
    assert found.rx_overload_dbm is not None
    assert found.available_db == pytest.approx(float(row["most_db"]), abs=1e-9)
    assert found.tx_max_dbm - found.rx_overload_dbm == pytest.approx(float(row["least_db"]))
    assert found.channel_loss_min_db == float(row["least_db"])
    limit = row["dispersion_ps_per_nm"]
    assert found.dispersion_max_ps_per_nm == (float(limit) if limit else None)
