"""All budgets of a circuit, and the interfaces that close it."""

from __future__ import annotations

from dataclasses import replace

from routeplan.light.circuits import circuit_budgets, closing_interfaces, least_margin_db
from routeplan.light.interfaces import find_interface
from routeplan.light.model import Direction, Path
from routeplan.run.practice import Interface
from tests.light.small_paths import path, practice


def both_ways(lengths_m: list[float]) -> dict[Direction, Path]:
    """Return the path of each direction."""
    there = path(lengths_m)
    back = replace(there, direction="to-from", steps=there.steps[::-1])
    return {"from-to": there, "to-from": back}


def test_every_wavelength_has_a_budget_in_every_direction_it_is_sent() -> None:
    """Two fibres: both ways each. One fibre: each its own."""
    paths = both_ways([3000.0])
    two = circuit_budgets(paths, None, [1310.0, 1550.0], practice=practice())
    assert [(b.wavelength_nm, b.direction) for b in two] == [
        (1310.0, "from-to"),
        (1310.0, "to-from"),
        (1550.0, "from-to"),
        (1550.0, "to-from"),
    ]
    pair = find_interface("1000BASE-BX10", {})
    one = circuit_budgets(paths, pair, [1490.0, 1310.0], practice=practice())
    assert [(b.wavelength_nm, b.direction) for b in one] == [
        (1490.0, "from-to"),
        (1310.0, "to-from"),
    ]
    assert [b.available_db for b in one] == [5.5, 6.0]


def test_closing_interfaces_are_least_capable_first_and_all_fit() -> None:
    """Over 5 km gigabit and ten-gigabit classes close; short classes and too strong ones do not."""
    found = closing_interfaces(both_ways([2500.0] * 2), practice=practice(margin_db=1.0))
    names = [closing.pair.name for closing in found]
    rates = [closing.pair.at_from.bit_rate_gbps or 0.0 for closing in found]
    assert rates == sorted(rates)
    assert {"1000BASE-LX10", "10GBASE-LR", "100GBASE-LR4"} <= set(names)
    assert not {"100GBASE-DR", "400GBASE-FR4", "200GBASE-DR4"} & set(names)
    for closing in found:
        assert all(budget.verdict == "fits" for budget in closing.budgets)
        assert closing.margin_db >= 0.0
    assert names.count("1000BASE-BX10") == 1
    assert "1000BASE-BX10-U" not in names


def test_own_interfaces_are_tried_and_wavelengths_kept_to() -> None:
    """At 1550 nm only classes of that band come, and one's own among them."""
    own = {
        "hill": Interface.model_validate(
            {"wavelength_nm": 1550.0, "channel_loss_db": 12.0, "penalty_db": 0.0}
        )
    }
    found = closing_interfaces(
        both_ways([5000.0] * 4), practice=practice(), own=own, wavelengths_nm=[1550.0]
    )
    names = [closing.pair.name for closing in found]
    assert "hill" in names
    assert all(closing.pair.at_from.carries(1550.0) for closing in found)


def test_one_fibre_takes_one_fibre_classes() -> None:
    """A circuit of a single fibre is closed by what works it both ways."""
    found = closing_interfaces(both_ways([2000.0]), practice=practice(margin_db=1.0), fibre_count=1)
    assert [closing.pair.name for closing in found] == ["1000BASE-BX10"]


def test_nothing_closes_the_impossible() -> None:
    """300 km have no class."""
    assert closing_interfaces(both_ways([5000.0] * 60), practice=practice()) == ()


def test_least_margin_is_after_the_attenuator() -> None:
    """A circuit mended by 5 dB has 5 dB less in hand."""
    pair = find_interface("10GBASE-ER", {})
    kept = practice(margin_db=1.0)
    budgets = circuit_budgets(both_ways([2000.0]), pair, [1550.0], practice=kept)
    assert budgets[0].attenuator_db == 5.0
    assert least_margin_db(budgets, practice=kept) == round((budgets[0].margin_db or 0.0) - 5.0, 3)
