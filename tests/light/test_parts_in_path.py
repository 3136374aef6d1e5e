"""What a budget makes of parts with a loss of their own, unlike fibre, bends and penalties."""

from __future__ import annotations

from dataclasses import replace

import pytest

from routeplan.light.budget import circuit_budget
from routeplan.light.connectors import connector_loss
from routeplan.light.grid import part_loss
from routeplan.light.interfaces import find_interface
from routeplan.light.model import Bend, Budget, Mating, Part, PartLoss, Path, SpliceStep, Step
from routeplan.light.splices import mode_mismatch_db
from tests.light.small_paths import measured, optic, path, practice

MEASURED_SPLICE = PartLoss(mean_db=0.02, sigma_db=0.0, limit_db=0.02, source="test sheet")


def with_steps(*more: Step) -> Path:
    """Return a path of 5 km with further steps behind it."""
    way = path([5000.0])
    return replace(way, steps=(*way.steps, *more))


def lines_of(budget: Budget) -> dict[str, tuple[int, float, float]]:
    """Return count, mean and limit of every line by its name."""
    return {line.item: (line.count, line.each_db, line.limit_db) for line in budget.lines}


def test_measured_splices_replace_assumed_ones() -> None:
    """A splice with a value of its own is a line of its own; the others keep practice's."""
    way = with_steps(SpliceStep(where="J7"), SpliceStep(where="J8", loss=MEASURED_SPLICE))
    found = lines_of(circuit_budget(way, 1310.0, practice=practice()))
    assert found["splices in joints"] == (1, 0.05, 0.1)
    assert found["splice J8"] == (1, 0.02, 0.02)


def test_connector_grades_replace_practice_where_they_are_given() -> None:
    """Two panels of practice, and one pair of expanded-beam connectors between field cables."""
    way = with_steps(Mating(where="field", loss=connector_loss("expanded beam")))
    found = lines_of(circuit_budget(way, 1310.0, practice=practice()))
    assert found["connector pairs"][0] == 2
    assert found["connector pair field"] == (1, 0.85, 1.5)


def test_parts_in_the_path_are_lines_and_equal_ones_one_line() -> None:
    """A coupler at each end of one place, and a splitter."""
    coupler = Part(where="hut", item="coupler", loss=part_loss("wdm 1310/1550"))
    splitter = Part(where="hut", item="splitter", loss=part_loss("splitter 1:4"))
    budget = circuit_budget(with_steps(coupler, splitter, coupler), 1310.0, practice=practice())
    found = lines_of(budget)
    assert found["coupler hut"] == (2, 0.5, 0.8)
    assert found["splitter hut"] == (1, 6.7, 7.4)
    assert "optical_parts" in budget.lines[-1].source


def test_unlike_fibre_at_a_joint_costs_its_mismatch_and_is_said() -> None:
    """G.652.D spliced to G.657.A2 at 1310 nm: 0.020 dB more, and a remark to measure both ways."""
    two = path([3000.0, 2000.0])
    steps = tuple(
        replace(step, fibre_type="G.657.A2") if getattr(step, "section", "") == "S2" else step
        for step in two.steps
    )
    budget = circuit_budget(replace(two, steps=steps), 1310.0, practice=practice())
    count, mean_db, limit_db = lines_of(budget)["mode-field mismatch G.652.D to G.657.A2"]
    assert (count, mean_db) == (1, round(mode_mismatch_db(9.2, 8.6), 3))
    assert limit_db > mean_db
    assert any("G.652.D meets G.657.A2 at J1" in reason for reason in budget.reasons)
    turned = replace(two, steps=steps[::-1])
    assert lines_of(circuit_budget(turned, 1310.0, practice=practice())) == lines_of(budget)


def test_unlike_fibre_on_both_sides_of_a_panel_is_no_mismatch_of_a_joint() -> None:
    """A connector between unlike fibres is a connector: its loss is measured, not its splice."""
    way = replace(
        path([1000.0]),
        steps=(
            *path([1000.0]).steps,
            Mating(where="site"),
            *path([1000.0], fibre_type="G.657.A2", matings=0, pigtails=0).steps,
        ),
    )
    assert not any(
        "mismatch" in item for item in lines_of(circuit_budget(way, 1310.0, practice=practice()))
    )


def test_bends_are_lines_and_tighter_ones_are_not_known() -> None:
    """One turn of 15 mm of A1 may lose all of 0.25 dB; 5 mm is tighter than it is tested for."""
    bend = Bend(where="tray", fibre_type="G.657.A1", radius_mm=15.0, turns=1.0)
    link = optic(
        basis="channel",
        channel_loss_db=20.0,
        bands_nm=((1530.0, 1565.0),),
        wavelengths_nm=(1550.0,),
    )
    wide = circuit_budget(with_steps(bend), 1550.0, practice=practice(), optic=link)
    assert lines_of(wide)["bend tray"] == (1, 0.025, 0.25)
    assert wide.verdict == "fits"
    tight = replace(bend, radius_mm=5.0)
    budget = circuit_budget(with_steps(tight), 1550.0, practice=practice(), optic=link)
    assert budget.verdict == "unknown"
    assert any("tighter than G.657.A1" in reason for reason in budget.reasons)


def test_sections_measured_one_by_one_keep_their_own_attenuation() -> None:
    """A reel that was measured counts by its own figure, the others by their type's."""
    budget = circuit_budget(
        path([3000.0, 2000.0]), 1310.0, practice=practice(), measured={"S2": measured((1310, 0.40))}
    )
    found = lines_of(budget)
    assert found["fibre G.652.D"] == (1, 0.99, 1.05)
    assert found["fibre G.652.D, measured S2"] == (1, 0.8, 0.8)


def test_measured_cable_above_its_ceiling_is_said() -> None:
    """0.45 dB/km at 1310 nm is more than ITU-T G.652.D allows; 0.40 is not."""
    for db_per_km, is_said in ((0.45, True), (0.40, False)):
        budget = circuit_budget(
            path([1000.0], cable="K"),
            1310.0,
            practice=practice(),
            measured={"K": measured((1310, db_per_km))},
        )
        assert any("above the 0.4 dB/km" in reason for reason in budget.reasons) is is_said


def _link(**more: object) -> Budget:
    """Return the budget of 40 km at 1550 nm against launch and sensitivity at 2.5 Gbit/s."""
    figures: dict[str, object] = {
        "bands_nm": ((1530.0, 1565.0),),
        "wavelengths_nm": (1550.0,),
        "tx_min_dbm": 0.0,
        "tx_max_dbm": 2.0,
        "rx_sensitivity_dbm": -28.0,
        "rx_overload_dbm": -5.0,
        "lane_gbd": 2.48832,
        "line_width_nm": 0.1,
    }
    link = optic(**(figures | more))
    return circuit_budget(path([5000.0] * 8), 1550.0, practice=practice(), optic=link)


def test_dispersion_penalty_is_a_line_where_nothing_else_holds_it() -> None:
    """720 ps/nm of a line 0.1 nm wide at 2.5 Gbit/s spread over 0.179 of a bit: 0.40 dB."""
    found = lines_of(_link())
    assert found["dispersion penalty"][0] == 1
    assert found["dispersion penalty"][1] == pytest.approx(0.40, abs=0.005)


def test_penalty_is_not_counted_twice() -> None:
    """With a stated penalty, or on a channel basis, there is no line for it."""
    assert "dispersion penalty" not in lines_of(_link(penalty_db=1.0))
    assert "dispersion penalty" not in lines_of(_link(basis="channel", channel_loss_db=28.0))


def test_a_penalty_does_not_protect_the_receiver() -> None:
    """Overload is with the loss of light alone: a penalty makes light no weaker."""
    assert _link().overload_db == _link(penalty_db=1.0).overload_db
    margin_with, margin_without = _link().margin_db, _link(line_width_nm=None).margin_db
    assert margin_with is not None
    assert margin_without is not None
    assert margin_without - margin_with == pytest.approx(0.40, abs=0.006)


def test_pmd_beyond_a_tenth_of_a_symbol_fails() -> None:
    """G.657.B3 at 0.5 ps/sqrt(km): 20 km may have 2.2 ps, more than 53 GBd bears."""
    fast = find_interface("100GBASE-LR1", {}).at_from
    way = path([4000.0] * 5, fibre_type="G.657.B3")
    budget = circuit_budget(way, 1310.0, practice=practice(), optic=fast)
    assert budget.pmd_ps == pytest.approx(0.5 * 20.0**0.5, abs=5e-4)
    assert any(reason.startswith("PMD may reach 2.236 ps") for reason in budget.reasons)
    slow = find_interface("10GBASE-LR", {}).at_from
    budget = circuit_budget(way, 1310.0, practice=practice(), optic=slow)
    assert not any("PMD" in reason for reason in budget.reasons)
