"""A budget with no map is that of a plan with the same glass, joints and practice."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import pytest

from routeplan import plan, read_run
from routeplan.errors import InputError
from routeplan.light.interfaces import find_interface
from routeplan.quick import QuickAnswer, quick_answer
from routeplan.quick_options import OPTIONS, order_from_options
from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, write_run

CIRCUIT = """
[[circuit]]
name = "Programme"
interface = "10GBASE-LR"
wavelengths_nm = [1310]
"""


def answer(**given: str | list[str]) -> QuickAnswer:
    """Return the answer to options as they are typed."""
    return quick_answer(order_from_options(given))


def problems(**given: str | list[str]) -> dict[str, str]:
    """Return what is wrong with options, by the option it is said of."""
    with pytest.raises(InputError) as caught:
        order_from_options(given)
    return {problem.where: str(problem) for problem in caught.value.problems}


def test_it_agrees_with_a_plan(tmp_path: Path) -> None:
    """Same glass, joints and practice: the same losses, margins, overload, delay and verdict."""
    planned = plan(read_run(write_run(tmp_path, DUCT_FEATURES, DUCT_TOML + CIRCUIT)))
    (circuit,) = planned.circuits
    glass_m = sum(getattr(step, "glass_m", 0.0) for step in circuit.paths[0].steps)
    quick = answer(
        glass_km=f"{glass_m / 1000:.6f}",
        splices=str(len(planned.layout.joints)),
        interface="10GBASE-LR",
        wavelength_nm=["1310"],
    )
    assert len(quick.budgets) == len(circuit.budgets) == 2
    for ours, theirs in zip(quick.budgets, circuit.budgets, strict=True):
        for key in (
            "direction",
            "nominal_db",
            "worst_db",
            "available_db",
            "margin_db",
            "pmd_ps",
            "delay_ns",
            "dispersion_min_ps_per_nm",
            "first_day_margin_db",
            "end_of_life_margin_db",
            "verdict",
        ):
            assert getattr(ours, key) == getattr(theirs, key), key
        # Sections differ in length there and not here, which moves sigma alone.
        assert ours.statistical_db == pytest.approx(theirs.statistical_db, abs=0.01)


def test_twenty_kilometres_by_hand() -> None:
    """20 km of G.652.D at 1310 nm with 4 splices, 2 pigtails and 2 pairs, added up by hand."""
    budget = answer(glass_km="20", splices="4", wavelength_nm=["1310"]).budgets[0]
    assert budget.nominal_db == pytest.approx(20 * 0.33 + 6 * 0.05 + 2 * 0.25)
    assert budget.worst_db == pytest.approx(20 * 0.35 + 6 * 0.1 + 2 * 0.5)


@pytest.mark.parametrize(
    ("sheath_km", "reel_km", "joints"),
    [("20", "4", 4), ("20.001", "4", 5), ("20", "5", 3), ("3.9", "4", 0), ("0.3", "0.1", 2)],
)
def test_joints_are_one_fewer_than_reels(sheath_km: str, reel_km: str, joints: int) -> None:
    """Five reels of 4 km make four joints; a metre more takes another reel."""
    assert order_from_options({"sheath_km": sheath_km, "reel_km": reel_km}).splices == joints


def test_cable_is_shorter_than_its_fibre() -> None:
    """Fibre is 1.2 % longer than the jacket round it, whichever of the two is given."""
    by_sheath = order_from_options({"sheath_km": "10"})
    assert by_sheath.glass_m == pytest.approx(10_120.0)
    by_glass = order_from_options({"glass_km": "10.12"})
    assert by_glass.sheath_m == pytest.approx(10_000.0)


def test_purpose_chooses_the_margin() -> None:
    """A venue run keeps less in hand than a link; a margin that is given goes before both."""
    assert order_from_options({"glass_km": "1"}).practice.margin_db == 3.0
    assert order_from_options({"glass_km": "1", "purpose": "venue"}).practice.margin_db == 1.0
    given = {"glass_km": "1", "purpose": "venue", "margin_db": "2.5"}
    assert order_from_options(given).practice.margin_db == 2.5


def test_an_interface_brings_its_light() -> None:
    """With no wavelength given it is the interface's, with no interface the usual two."""
    assert answer(glass_km="1", interface="10GBASE-ER").order.wavelengths_nm == (1550.0,)
    assert answer(glass_km="1").order.wavelengths_nm == (1310.0, 1550.0)
    both = answer(glass_km="5", interface="1000BASE-BX10", fibre_count="1").budgets
    assert {(b.wavelength_nm, b.direction) for b in both} == {
        (1310.0, "to-from"),
        (1490.0, "from-to"),
    }


def test_one_number_is_an_interface() -> None:
    """A channel loss alone makes a verdict, a margin of exactly zero fits, and less fails."""
    at_limit: dict[str, str | list[str]] = {
        "glass_km": "10",
        "splices": "0",
        "wavelength_nm": ["1310"],
    }
    worst_db = answer(**at_limit).budgets[0].worst_db
    fits = answer(**at_limit, channel_loss_db=f"{worst_db + 3:.3f}")
    assert fits.verdict == "fits"
    assert fits.budgets[0].margin_db == 0.0
    assert fits.stretch_m is not None
    assert answer(**at_limit, channel_loss_db=f"{worst_db + 2.999:.3f}").verdict == "fails"


def test_the_stretch_limit_just_fits() -> None:
    """Stretched by the limit it fits, by ten metres more it fails, and it is said by what."""
    quick = answer(glass_km="5", splices="1", interface="10GBASE-LR", margin_db="0")
    assert quick.stretch_m is not None
    for more_m, verdict in ((quick.stretch_m, "fits"), (quick.stretch_m + 10, "fails")):
        order = replace(quick.order, glass_m=quick.order.glass_m + more_m)
        assert quick_answer(order).verdict == verdict
    assert "missing" in quick.stretch_ended_by or "made for" in quick.stretch_ended_by


def test_a_failing_budget_says_what_would_change_it() -> None:
    """30 km are too much for a class of 10 km: another optic or less glass is named."""
    quick = answer(glass_km="30", splices="5", interface="10GBASE-LR")
    assert quick.verdict == "fails"
    assert quick.stretch_m is None
    assert {"interface", "length"} <= {change.kind for change in quick.changes}


def test_any_interface_is_every_one_that_closes() -> None:
    """Each that is listed fits when it is named alone; least capable first."""
    quick = answer(glass_km="20", splices="4", interface="any")
    assert quick.verdict == "fits"
    rates = [closing.pair.at_from.bit_rate_gbps or 0.0 for closing in quick.closing]
    assert rates == sorted(rates)
    for closing in quick.closing:
        alone = answer(glass_km="20", splices="4", interface=closing.pair.name)
        assert alone.verdict == "fits"
    names = {closing.pair.name for closing in quick.closing}
    assert answer(glass_km="20", splices="4", interface="10GBASE-LR").verdict == "fails"
    assert "10GBASE-LR" not in names


def test_any_keeps_to_wavelengths_that_are_given() -> None:
    """With a wavelength given only interfaces that send it are tried."""
    quick = answer(glass_km="20", splices="4", interface="any", wavelength_nm=["1550"])
    assert quick.closing
    for closing in quick.closing:
        assert find_interface(closing.pair.name, {}).at_from.carries(1550.0)


def test_nothing_closes_what_is_too_long() -> None:
    """300 km without an amplifier close with nothing, and the verdict is a fail."""
    quick = answer(glass_km="300", interface="any")
    assert quick.closing == ()
    assert quick.verdict == "fails"


def test_a_connector_more_never_raises_the_margin() -> None:
    """Pairs from none to six: the margin falls with each."""
    margins = [
        answer(glass_km="5", interface="10GBASE-LR", connector_pairs=str(pairs))
        .budgets[0]
        .margin_db
        for pairs in range(7)
    ]
    assert all(more < less for less, more in pairwise(margins))  # type: ignore[operator]


def test_every_problem_is_said_at_once_by_its_option() -> None:
    """Numbers that are none, unknown names and what contradicts itself come together."""
    found = problems(
        glass_km="nan",
        splices="1.5",
        fibre_type="G652D",
        interface="10GBase-ER",
        margin_db="3,5",
        wavelength_nm=["1310", "13x"],
        fibre_count="3",
        tx_min_dbm="abc",
        purpose="lnk",
    )
    assert set(found) == {
        "--glass-km",
        "--splices",
        "--fibre-type",
        "--margin-db",
        "--wavelength-nm",
        "--fibre-count",
        "--tx-min-dbm",
        "--purpose",
    }
    assert 'Did you mean "G.652.D"?' in found["--fibre-type"]
    assert 'Did you mean "link"?' in found["--purpose"]
    assert found["--margin-db"].endswith("Write the decimals behind a point: 3.5.")


@pytest.mark.parametrize(
    ("given", "where", "text"),
    [
        ({}, "--glass-km", "is missing"),
        ({"glass_km": "1", "sheath_km": "1"}, "--glass-km", "beside --sheath-km"),
        ({"glass_km": "-3"}, "--glass-km", "out of range"),
        ({"glass_km": "0"}, "--glass-km", "out of range"),
        ({"glass_km": "1e9"}, "--glass-km", "limit more than 0 to 1000 km"),
        ({"glass_km": "inf"}, "--glass-km", "not a finite number"),
        ({"glass_km": "1_0"}, "--glass-km", "not a number"),
        ({"sheath_km": "1", "reel_km": "0"}, "--reel-km", "out of range"),
        ({"sheath_km": "1", "reel_km": "1", "splices": "1"}, "--reel-km", "beside --splices"),
        ({"glass_km": "1", "splices": "-1"}, "--splices", "limit 0 to 1000"),
        ({"glass_km": "1", "margin_db": "-1"}, "--margin-db", "too small"),
        ({"glass_km": "1", "margin_db": "nan"}, "--margin-db", "not a finite number"),
        ({"glass_km": "1", "connector_pairs": "1e9"}, "--connector-pairs", "not a whole number"),
        ({"glass_km": "1", "wavelength_nm": ["850"]}, "--wavelength-nm", "at least 1260 nm"),
        ({"glass_km": "1", "wavelength_nm": ["1310", "1310"]}, "--wavelength-nm", "twice"),
        ({"glass_km": "1", "fibre_type": "OM3"}, "--fibre-type", "multimode"),
        ({"glass_km": "1", "interface": "10GBASE-RL"}, "--interface", "Did you mean"),
        (
            {"glass_km": "1", "interface": "10GBASE-ER", "wavelength_nm": ["1310"]},
            "--wavelength-nm",
            "1530 to 1565 nm",
        ),
        (
            {"glass_km": "1", "interface": "1000BASE-BX10", "wavelength_nm": ["1310"]},
            "--wavelength-nm",
            "Add 1490",
        ),
        ({"glass_km": "1", "interface": "200GBASE-DR4"}, "--interface", "parallel fibres"),
        (
            {"glass_km": "1", "interface": "10GBASE-ER", "tx_min_dbm": "1"},
            "--tx-min-dbm",
            "stands beside --interface",
        ),
        ({"glass_km": "1", "channel_loss_db": "9"}, "--wavelength-nm", "is missing"),
        (
            {"glass_km": "1", "tx_min_dbm": "1", "wavelength_nm": ["1310"]},
            "--tx-min-dbm",
            "Give --channel-loss-db, or --tx-min-dbm and --rx-sensitivity-dbm",
        ),
        (
            {"glass_km": "1", "tx_min_dbm": "1", "tx_max_dbm": "0", "rx_sensitivity_dbm": "-9",
             "wavelength_nm": ["1310"]},
            "--tx-min-dbm",
            "is not below --tx-max-dbm",
        ),
    ],
)  # fmt: skip
def test_what_is_wrong_is_said_of_its_option(
    given: dict[str, str | list[str]], where: str, text: str
) -> None:
    """Each problem names the option as it is typed, the value and the remedy."""
    found = problems(**given)
    assert text in found[where]
    assert len(found) == 1


def test_every_option_is_read() -> None:
    """No option is left unread: each changes the order it makes."""
    base: dict[str, str | list[str]] = {"glass_km": "10", "wavelength_nm": ["1550"]}
    own: dict[str, str | list[str]] = {"tx_min_dbm": "-3", "rx_sensitivity_dbm": "-20"}
    tried = {
        "glass_km": "11", "sheath_km": "10", "splices": "7", "reel_km": "1",
        "connector_pairs": "4", "pigtail_splices": "4", "fibre_type": "G.657.A1",
        "fibre_count": "1", "interface": "10GBASE-ER", "wavelength_nm": ["1551"],
        "purpose": "venue", "margin_db": "1.5", "tx_min_dbm": "-4", "tx_max_dbm": "1",
        "rx_sensitivity_dbm": "-21", "rx_overload_dbm": "0", "penalty_db": "1",
        "channel_loss_db": "12", "dispersion_max_ps_per_nm": "800", "bit_rate_gbps": "10",
    }  # fmt: skip
    assert set(tried) == {option.name for option in OPTIONS}
    for option in OPTIONS:
        before = dict(base)
        if option.key.startswith("interface."):
            before |= own
        after = before | {option.name: tried[option.name]}
        if option.name == "sheath_km":
            del after["glass_km"]
        if option.name == "channel_loss_db":
            after.pop("rx_sensitivity_dbm")
        assert order_from_options(after) != order_from_options(before), option.name


def test_what_was_not_said_is_assumed() -> None:
    """Defaults the answer rests on are listed, those that were given are not."""
    bare = {entry.name for entry in order_from_options({"glass_km": "9"}).assumed}
    assert {"loss.margin_db", "reels.put_ups_m", "circuit.wavelengths_nm"} <= bare
    given = order_from_options(
        {"glass_km": "9", "margin_db": "2", "splices": "3", "interface": "10GBASE-LR"}
    )
    said = {entry.name for entry in given.assumed}
    assert not said & {
        "loss.margin_db",
        "reels.put_ups_m",
        "circuit.wavelengths_nm",
        "cable.glass_over_sheath_ratio",
    }
    assert all(entry.source and entry.reason for entry in given.assumed)
