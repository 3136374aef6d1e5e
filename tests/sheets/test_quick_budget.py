"""A budget with no map says every figure, where it comes from, and what follows from it."""

from __future__ import annotations

import json
import re

import pytest

from routeplan.quick import QuickAnswer, quick_answer
from routeplan.quick_options import order_from_options
from routeplan.sheets.quick_budget import quick_json, quick_text

ASKED: tuple[dict[str, str | list[str]], ...] = (
    {"glass_km": "20", "splices": "4", "interface": "10GBASE-ER"},
    {"glass_km": "30", "splices": "10", "interface": "10GBASE-LR"},
    {"sheath_km": "20", "reel_km": "4"},
    {"glass_km": "20", "interface": "any"},
    {"glass_km": "300", "interface": "any"},
    {"glass_km": "5", "interface": "1000BASE-BX10", "fibre_count": "1"},
    {"glass_km": "5", "wavelength_nm": ["1310"], "channel_loss_db": "9"},
    {"glass_km": "9", "interface": "100GBASE-LR4", "purpose": "venue"},
)


def answer(given: dict[str, str | list[str]]) -> QuickAnswer:
    """Return the answer to options as they are typed."""
    return quick_answer(order_from_options(given))


@pytest.mark.parametrize("given", ASKED)
def test_every_contribution_and_source_is_said(given: dict[str, str | list[str]]) -> None:
    """Each line of each budget stands in the text with its figures and the mark of its source."""
    quick = answer(given)
    text = quick_text(quick)
    flat = " ".join(text.split())
    for budget in quick.budgets:
        for line in budget.lines:
            row = re.search(
                rf"^{re.escape(line.item)} +{line.count} +{line.each_db:.3f} +{line.sigma_db:.3f} "
                rf"+{line.limit_db:.3f} +{line.count * line.each_db:.3f} "
                rf"+{line.count * line.limit_db:.3f}  (\[\d+\])$",
                text,
                re.MULTILINE,
            )
            assert row, line.item
            assert f"{row[1]} {line.source}" in flat
        assert f"{budget.nominal_db:.3f}" in text
        assert f"{budget.delay_ns / 1000:.3f} us" in text
        if quick.order.interface != "any":
            assert all(" ".join(reason.split()) in flat for reason in budget.reasons)


@pytest.mark.parametrize("given", ASKED)
def test_it_fits_a_terminal(given: dict[str, str | list[str]]) -> None:
    """No line is wider than 100 columns or ends in blanks, and the verdict is said once."""
    lines = quick_text(answer(given)).splitlines()
    assert max(map(len, lines)) <= 100
    assert all(line == line.rstrip() for line in lines)
    assert sum(line.startswith("verdict: ") for line in lines) == 1


def test_what_is_left_is_what_is_allowed_less_loss_and_margin() -> None:
    """The figures that stand one below the other add up as a reader adds them."""
    text = quick_text(answer(ASKED[0]))

    def figure(name: str) -> float:
        row = re.search(rf"^{name} +(.*)", text, re.MULTILINE)
        assert row
        numbers = re.findall(r"-?\d+\.\d{3}(?=  |$)", row[1])
        return float(numbers[-1])

    left_db = figure("allowed") - figure("loss") - figure("kept in hand")
    assert figure("margin") == pytest.approx(left_db)
    assert figure("on the first day") == pytest.approx(figure("allowed") - figure("loss"))


def test_directions_that_differ_stand_apart() -> None:
    """One fibre both ways has a block for each direction; two alike share one."""
    apart = quick_text(answer(ASKED[5]))
    assert "1310 nm, to-from, 1000BASE-BX10-U: fits" in apart
    assert "1490 nm, from-to, 1000BASE-BX10-D: fits" in apart
    assert quick_text(answer(ASKED[0])).count("1550 nm, both ways") == 1


def test_a_fail_names_what_would_change_it() -> None:
    """The changes that were tried and would do are listed, each by itself."""
    quick = answer(ASKED[1])
    text = " ".join(quick_text(quick).split())
    assert quick.changes
    assert all(f"- {change.text}" in text for change in quick.changes)


def test_too_strong_light_names_its_attenuator() -> None:
    """Overload is said with the attenuator that mends it."""
    quick = answer({"glass_km": "20", "splices": "3", "interface": "10GBASE-ER"})
    budget = quick.budgets[0]
    assert budget.overload_db
    expected = f"{budget.overload_db:.3f} dB too much: {budget.attenuator_db:g} dB attenuator"
    assert expected in quick_text(quick)


def test_any_lists_what_closes_with_its_margin() -> None:
    """Each interface that closes has a row with its margin; the path itself has no verdict."""
    quick = answer(ASKED[3])
    text = quick_text(quick)
    assert quick.closing
    for closing in quick.closing:
        row = next(line for line in text.splitlines() if line.startswith(f"{closing.pair.name} "))
        assert f" {closing.margin_db:.3f} " in row
    assert "No interface is named" not in text
    assert "No interface of the table closes this." in quick_text(answer(ASKED[4]))


@pytest.mark.parametrize("given", ASKED)
def test_json_holds_what_the_text_says(given: dict[str, str | list[str]]) -> None:
    """Budgets are rows as in plan.json, with every assumption and its source, without NaN."""
    quick = answer(given)
    found = json.loads(json.dumps(quick_json(quick), allow_nan=False))
    assert found["verdict"] == quick.verdict
    assert found["splice_count"] == quick.order.splices
    for row, budget in zip(found["budgets"], quick.budgets, strict=True):
        assert row["margin_db"] == budget.margin_db
        assert [line["item"] for line in row["lines"]] == [line.item for line in budget.lines]
        worst_db = sum(line["count"] * line["limit_db"] for line in row["lines"])
        assert row["worst_db"] == pytest.approx(worst_db)
    assert [row["interface"] for row in found["closing"]] == [c.pair.name for c in quick.closing]
    assert all(entry["source"] for entry in found["assumptions"])
    assert found["stretch_m"] == quick.stretch_m
