"""The bill lists what is bought, and its priced lines add up to the cost of the layout."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from routeplan.planning import Plan
from routeplan.sheets.bill import bill_rows, has_invented_prices, pigtail_counts
from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, equator, line, planned, point

Row = dict[str, Any]


def test_duct_run_by_hand(duct_plan: Plan) -> None:
    """
    Two reels of 1500 m at 1920, one joint at 666 and four pigtails make up the bill.

    The default circuit has two fibres with a pigtail splice at each end.
    """
    reels, joints, pigtails = bill_rows(duct_plan)
    assert reels == {
        "item": "Cable, 12 fibres G.652.D, reel of 1500 m",
        "quantity": 2,
        "unit": "reel",
        "each": 1920.0,
        "total": 3840.0,
        "note": "put-up",
    }
    assert joints == {
        "item": "Joint: closure, visit and splices",
        "quantity": 1,
        "unit": "joint",
        "each": 666.0,
        "total": 666.0,
        "note": "J1",
    }
    assert (pigtails["quantity"], pigtails["each"], pigtails["total"]) == (4, None, None)
    assert "18.00" in pigtails["note"]


def test_priced_lines_add_up(many_documents: list[Row]) -> None:
    """Priced lines are quantity times price and add up to the layout's cost, to the cent."""
    for document in many_documents:
        total = 0
        for row in document["bill"]:
            if row["total"] is None:
                continue
            assert round(row["each"] * 100) * row["quantity"] == round(row["total"] * 100)
            total += round(row["total"] * 100)
        assert total == round(document["totals"]["cost"] * 100)


def test_every_reel_and_joint_is_on_it_once(many_documents: list[Row]) -> None:
    """The bill counts as many reels, joints and pigtails as the plan has."""
    for document in many_documents:
        counts = {"reel": 0, "joint": 0, "splice": 0}
        for row in document["bill"]:
            if row["unit"] in counts:
                counts[row["unit"]] += row["quantity"]
        totals = document["totals"]
        assert counts["reel"] == totals["reel_count"]
        assert counts["joint"] == totals["joint_count"]
        assert counts["splice"] == totals["pigtail_splice_count"]


@pytest.mark.parametrize(
    ("put_up", "text"),
    [("1234567 ", "reel of 1000000 m"), ("12345.678", "reel of 12345.678 m"), ("2.5e3", "2500 m")],
    ids=["long", "to the millimetre", "no idle decimals"],
)
def test_reel_lengths_are_written_out(tmp_path: Path, put_up: str, text: str) -> None:
    """The length of a reel is told to the millimetre it has, never shortened or as a power."""
    length = "1000000" if "1000000" in text else put_up
    plan = planned(tmp_path, [line([equator(0), equator(900)])], f"[reels]\nput_ups_m = [{length}]")
    assert text in next(bill_rows(plan))["item"]


def test_invented_prices_are_marked(duct_plan: Plan, tmp_path: Path) -> None:
    """A line whose price rests on an invented default says so; one with the run's own does not."""
    assert not has_invented_prices(duct_plan)
    assert not any("invented" in row["note"] for row in bill_rows(duct_plan))
    some = DUCT_TOML.replace("joint_each = 450.0\n", "")
    reels, joints, _ = bill_rows(planned(tmp_path, DUCT_FEATURES, some))
    assert "invented" in joints["note"]
    assert "invented" not in reels["note"]


def test_a_stock_reel_counts_once(duct_plan: Plan) -> None:
    """A reel that several sections are cut from is one line's one reel."""
    layout = duct_plan.layout
    first = replace(layout.reels[0], source="stock", cost_cents=0)
    cuts = tuple(replace(cut, reel=first.id) for cut in layout.cuts)
    plan = replace(duct_plan, layout=replace(layout, reels=(first,), cuts=cuts))
    reels = next(bill_rows(plan))
    assert (reels["quantity"], reels["each"]) == (1, 0.0)
    assert reels["note"].startswith("stock")


def test_interfaces_and_attenuators_are_listed(tmp_path: Path) -> None:
    """Each circuit's optics are listed with both ends, and an attenuator for each receiver."""
    features = [
        line([equator(0), equator(900)]),
        point(equator(0), name="S", kind="site"),
        point(equator(900), name="T", kind="site"),
    ]
    toml = """
[[circuit]]
name = "Video"
interface = "strong"
wavelengths_nm = [1310]
[interface.strong]
wavelength_nm = 1310
tx_min_dbm = 0.0
tx_max_dbm = 5.0
rx_sensitivity_dbm = -30.0
rx_overload_dbm = -7.0
"""
    plan = planned(tmp_path, features, toml)
    rows = {row["item"]: row for row in bill_rows(plan)}
    assert rows["Optical interface strong"]["quantity"] == 2
    attenuators = [row for row in bill_rows(plan) if row["item"].startswith("Fixed attenuator")]
    needed = {budget.direction: budget.attenuator_db for budget in plan.circuits[0].budgets}
    assert [row["item"] for row in attenuators] == [
        f"Fixed attenuator {needed[way]:g} dB" for way in ("from-to", "to-from")
    ]
    assert [row["note"] for row in attenuators] == [
        f"Video, {way}, at the receiver" for way in ("from-to", "to-from")
    ]


def test_pigtails_follow_practice(tmp_path: Path) -> None:
    """Pigtails are those of the path times the circuit's fibres."""
    features = [line([equator(0), equator(900)])]
    plan = planned(tmp_path, features, "[loss]\npigtail_splices = 3\n")
    assert list(pigtail_counts(plan)) == [6]
    none = planned(tmp_path / "none", features, "[loss]\npigtail_splices = 0\n")
    assert list(pigtail_counts(none)) == [0]
    assert not any("Pigtail" in row["item"] for row in bill_rows(none))
