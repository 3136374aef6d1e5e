"""The budget of a circuit."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.light.budget import circuit_budget, circuit_verdict
from routeplan.light.interfaces import find_interface
from routeplan.light.model import Budget, ExistingSpan, Mating, Path
from tests.light.small_paths import example, measured, optic, path, practice

ER = find_interface("10GBASE-ER", {}).at_from
LENGTHS = st.lists(st.floats(1.0, 6000.0), min_size=1, max_size=12)


def bare(**changes: object) -> object:
    """Return practice in which splices and connectors neither scatter nor are kept in hand."""
    return practice(splice_sigma_db=0.0, connector_sigma_db=0.0, margin_db=0.0, **changes)


def test_example_of_a_channel_loss() -> None:
    """A router maker's guide: 8 km at 0.5 dB/km and 7 connectors of 0.5 dB in 13 dB leave 5.5."""
    value, tolerance = example("E2", "margin")
    budget = circuit_budget(
        path([8000.0], cable="K", matings=7, pigtails=0),
        1310.0,
        practice=bare(connector_mean_db=0.5, connector_limit_db=0.5),
        optic=optic(basis="channel", channel_loss_db=13.0),
        measured={"K": measured((1310, 0.5))},
    )
    assert budget.margin_db == pytest.approx(value, abs=tolerance)
    assert budget.statistical_margin_db == budget.margin_db
    assert budget.verdict == "fits"


def test_example_of_launch_and_sensitivity() -> None:
    """Senior: 7 km at 2.6 dB/km, 6 splices, a connector of 1.5 dB and 6 dB kept leave 2.3 dB."""
    budget = circuit_budget(
        path([1000.0] * 7, cable="K", matings=1, pigtails=0),
        1310.0,
        practice=practice(
            splice_mean_db=0.5,
            splice_limit_db=0.5,
            connector_mean_db=1.5,
            connector_limit_db=1.5,
            margin_db=6.0,
        ),
        optic=optic(tx_min_dbm=-10.0, rx_sensitivity_dbm=-41.0),
        measured={"K": measured((1310, 2.6))},
    )
    value, tolerance = example("E5", "system margin")
    assert budget.available_db == pytest.approx(value, abs=tolerance)
    value, tolerance = example("E5", "loss with margin")
    assert budget.worst_db + 6.0 == pytest.approx(value, abs=tolerance)
    value, tolerance = example("E5", "excess")
    assert budget.margin_db == pytest.approx(value, abs=tolerance)
    splices = next(line for line in budget.lines if line.item == "splices in joints")
    assert splices.count == 6  # joints are one fewer than lengths


def test_fibre_line_is_typical_sigma_and_maximum_of_its_glass() -> None:
    """4 and 3 km of G.652.D at 1550 nm: 0.19 x 7, 0.010 x 5, 0.22 x 7."""
    line = circuit_budget(path([4000.0, 3000.0]), 1550.0, practice=practice()).lines[0]
    assert (line.count, line.each_db, line.sigma_db, line.limit_db) == (1, 1.33, 0.05, 1.54)
    assert "attenuation" in line.source
    assert "1550" in line.source


@settings(max_examples=50, deadline=None)
@given(LENGTHS, st.sampled_from([1310.0, 1490.0, 1550.0, 1625.0]))
def test_totals_follow_from_the_printed_lines(lengths_m: list[float], nm: float) -> None:
    """A reader with a pencil gets the printed totals from the printed lines."""
    budget = circuit_budget(path(lengths_m), nm, practice=practice(), optic=ER)
    nominal = sum(line.count * line.each_db for line in budget.lines)
    worst = sum(line.count * line.limit_db for line in budget.lines)
    sigma = sum(line.count * line.sigma_db**2 for line in budget.lines) ** 0.5
    assert budget.nominal_db == round(nominal, 3)
    assert budget.worst_db == round(worst, 3)
    assert budget.statistical_db == pytest.approx(min(nominal + 3.0 * sigma, worst), abs=6e-4)
    assert budget.nominal_db <= budget.statistical_db <= budget.worst_db
    assert budget.margin_db == pytest.approx(10.9 - budget.worst_db - 3.0, abs=6e-4)
    assert budget.overload_db == pytest.approx(
        4.0 - max(0.0, nominal - 3.0 * sigma) + 1.0, abs=6e-4
    )


@settings(max_examples=40, deadline=None)
@given(LENGTHS, LENGTHS)
def test_loss_adds_up_along_the_circuit(first: list[float], second: list[float]) -> None:
    """Two paths one behind the other lose what each of them loses."""
    one, two = path(first), path(second)
    both = Path(circuit="c", direction="from-to", steps=one.steps + two.steps)
    whole = circuit_budget(both, 1310.0, practice=practice())
    parts = [circuit_budget(part, 1310.0, practice=practice()) for part in (one, two)]
    assert whole.nominal_db == pytest.approx(sum(p.nominal_db for p in parts), abs=0.0011)
    assert whole.worst_db == pytest.approx(sum(p.worst_db for p in parts), abs=0.0011)
    assert whole.delay_ns == pytest.approx(sum(p.delay_ns for p in parts), abs=1)


@settings(max_examples=30, deadline=None)
@given(LENGTHS)
def test_the_way_back_loses_the_same(lengths_m: list[float]) -> None:
    """Turning a path round changes its direction and nothing else."""
    there = path(lengths_m)
    back = replace(there, direction="to-from", steps=there.steps[::-1])
    found = circuit_budget(back, 1550.0, practice=practice(), optic=ER)
    assert found == replace(
        circuit_budget(there, 1550.0, practice=practice(), optic=ER), direction="to-from"
    )


@settings(max_examples=30, deadline=None)
@given(LENGTHS)
def test_a_connector_more_never_raises_the_margin(lengths_m: list[float]) -> None:
    """Adding a mated pair lowers both margins, or leaves them."""
    before = circuit_budget(path(lengths_m), 1550.0, practice=practice(), optic=ER)
    after = circuit_budget(path(lengths_m, matings=3), 1550.0, practice=practice(), optic=ER)
    assert before.margin_db is not None
    assert after.margin_db is not None
    assert after.margin_db < before.margin_db
    assert after.statistical_db >= before.statistical_db


def _exact(channel_loss_db: float) -> Budget:
    """Return the budget of 10 km at 0.3 dB/km with nothing else, against a channel loss."""
    return circuit_budget(
        path([10_000.0], cable="K", matings=0, pigtails=0),
        1310.0,
        practice=practice(margin_db=1.1),
        optic=optic(basis="channel", channel_loss_db=channel_loss_db),
        measured={"K": measured((1310, 0.3))},
    )


def test_a_margin_of_exactly_nothing_fits() -> None:
    """3 dB of loss and 1.1 dB kept fit 4.1 dB, though 4.1 - 3 - 1.1 is not 0 in binary."""
    assert _exact(4.1).margin_db == 0.0
    assert _exact(4.1).verdict == "fits"
    assert _exact(4.099).verdict == "fails"
    assert "0.001 dB are missing" in _exact(4.099).reasons[0]


def test_verdict_is_on_the_loss_that_practice_names() -> None:
    """The same circuit fails on its worst loss of 2.7 dB and fits on its statistical one."""
    link = optic(basis="channel", channel_loss_db=5.6)
    likely_practice = practice(verdict_on="statistical")
    worst = circuit_budget(path([2000.0] * 2), 1310.0, practice=practice(), optic=link)
    likely = circuit_budget(path([2000.0] * 2), 1310.0, practice=likely_practice, optic=link)
    assert worst.margin_db == likely.margin_db == -0.1
    assert likely.statistical_margin_db is not None
    assert likely.statistical_margin_db > 0.0
    assert (worst.verdict, likely.verdict) == ("fails", "fits")
    assert worst.reasons[0].endswith(
        f"3.000 dB are kept in hand (loss.margin_db): 0.100 dB are missing; on the statistical "
        f"loss {likely.statistical_margin_db:.3f} dB would be left (loss.verdict_on)."
    )


def test_a_circuit_that_fails_on_either_loss_says_so() -> None:
    """No other verdict is held out where the statistical loss leaves nothing, too."""
    link = optic(basis="channel", channel_loss_db=4.0)
    worst = circuit_budget(path([2000.0] * 2), 1310.0, practice=practice(), optic=link)
    likely_practice = practice(verdict_on="statistical")
    likely = circuit_budget(path([2000.0] * 2), 1310.0, practice=likely_practice, optic=link)
    assert worst.statistical_margin_db is not None
    missing_db = -worst.statistical_margin_db
    assert missing_db > 0.0
    assert worst.reasons[0].endswith(
        f"; on the statistical loss {missing_db:.3f} dB would be missing, too."
    )
    assert likely.reasons[0].endswith(f"(loss.margin_db): {missing_db:.3f} dB are missing.")


def test_too_strong_light_is_mended_by_an_attenuator() -> None:
    """10GBASE-ER over 2 km is too strong; a venue's margin leaves room for 5 dB."""
    budget = circuit_budget(path([2000.0]), 1550.0, practice=practice(margin_db=1.0), optic=ER)
    assert budget.overload_db is not None
    assert budget.overload_db > 3.0
    assert budget.attenuator_db == 5.0
    assert budget.verdict == "fits"
    assert any("5 dB attenuator" in reason for reason in budget.reasons)


def test_too_strong_light_fails_where_the_attenuator_eats_the_margin() -> None:
    """With 3 dB kept in hand, 8 km of 10GBASE-ER have no room for the attenuator they need."""
    budget = circuit_budget(path([8200.0]), 1550.0, practice=practice(), optic=ER)
    assert budget.margin_db is not None
    assert budget.margin_db > 0.0
    assert budget.attenuator_db == 5.0
    assert budget.verdict == "fails"


def test_no_interface_is_unknown_and_says_so() -> None:
    """Loss, dispersion and delay are there; what needs an interface is not, and why is said."""
    budget = circuit_budget(path([5000.0]), 1550.0, practice=practice())
    assert budget.verdict == "unknown"
    assert budget.available_db is budget.margin_db is budget.overload_db is None
    assert budget.attenuator_db is None
    assert "interface" in budget.reasons[0]


def test_a_channel_loss_alone_is_enough_and_says_what_it_cannot_know() -> None:
    """One number gives a verdict; overload stays unknown and is named."""
    budget = _exact(9.0)
    assert budget.verdict == "fits"
    assert budget.overload_db is None
    assert any("too strong" in reason for reason in budget.reasons)


def test_launch_without_sensitivity_is_unknown() -> None:
    """What may be lost cannot be known from one of the two."""
    budget = circuit_budget(
        path([5000.0]), 1310.0, practice=practice(), optic=optic(tx_min_dbm=-3.0)
    )
    assert budget.verdict == "unknown"
    assert budget.available_db is None


def test_dispersion_beyond_the_interface_fails() -> None:
    """60 km of G.652.D may have 1081 ps/nm at 1550 nm, more than an interface of 800 stands."""
    link = optic(
        bands_nm=((1530.0, 1565.0),),
        wavelengths_nm=(1550.0,),
        basis="channel",
        channel_loss_db=30.0,
        dispersion_max_ps_per_nm=800.0,
    )
    far = circuit_budget(path([4000.0] * 15), 1550.0, practice=practice(), optic=link)
    near = circuit_budget(path([4000.0] * 11), 1550.0, practice=practice(), optic=link)
    assert far.dispersion_max_ps_per_nm == pytest.approx(60 * 18.010, abs=0.1)
    assert (far.verdict, near.verdict) == ("fails", "fits")
    assert any("ps/nm" in reason for reason in far.reasons)


def test_a_lane_that_fails_fails_the_interface() -> None:
    """Four lanes: with nothing left at 1331 nm, the lane at 1271 nm, which loses more, fails."""
    link = find_interface("40GBASE-LR4", {}).at_from
    way = path([2000.0] * 5)
    roomy = circuit_budget(way, 1331.0, practice=practice(margin_db=0.0), optic=link)
    assert roomy.margin_db is not None
    assert roomy.verdict == "fits"
    tight = practice(margin_db=roomy.margin_db)
    budget = circuit_budget(way, 1331.0, practice=tight, optic=link)
    assert budget.margin_db == 0.0
    assert budget.verdict == "fails"
    assert any(reason.startswith("Lane at 1271 nm") for reason in budget.reasons)


def test_existing_span_has_its_own_loss_or_that_of_its_fibre() -> None:
    """A declared loss stands as it is; without one the fibre type's attenuation is taken."""
    span = ExistingSpan(where="dark fibre", fibre_type="G.652.D", glass_m=10_000.0, loss_db=4.2)
    for loss_db, expected_db in ((4.2, 4.2), (None, 3.3)):
        steps = (replace(span, loss_db=loss_db),)
        budget = circuit_budget(
            Path(circuit="c", direction="from-to", steps=steps), 1310.0, practice=practice()
        )
        assert budget.nominal_db == expected_db
        assert budget.delay_ns == 48954
        assert budget.lines[0].item == "existing span dark fibre"


def test_unlike_fibres_have_a_line_each() -> None:
    """Sections of two types are two lines, and dispersion is that of both."""
    mixed = Path(
        circuit="c",
        direction="from-to",
        steps=path([3000.0]).steps + path([2000.0], fibre_type="G.657.A2").steps,
    )
    items = [line.item for line in circuit_budget(mixed, 1310.0, practice=practice()).lines]
    assert items[:2] == ["fibre G.652.D", "fibre G.657.A2"]


def test_below_cable_cutoff_nothing_is_promised() -> None:
    """G.655 is not sure to be single-mode at 1310 nm: the verdict is unknown, not fits."""
    budget = circuit_budget(
        path([5000.0], fibre_type="G.655"),
        1310.0,
        practice=practice(),
        optic=optic(basis="channel", channel_loss_db=20.0),
    )
    assert budget.verdict == "unknown"
    assert any("single mode" in reason for reason in budget.reasons)


def test_every_line_says_where_it_comes_from() -> None:
    """Source names the table or the practice key."""
    lines = circuit_budget(path([1000.0, 1000.0]), 1400.0, practice=practice()).lines
    assert all(line.source for line in lines)
    assert "between" in lines[0].source


def test_a_circuit_is_no_better_than_its_worst_budget() -> None:
    """One failing fails all; one unknown keeps it from fitting."""
    fits = _exact(9.0)
    fails, unknown = replace(fits, verdict="fails"), replace(fits, verdict="unknown")
    assert circuit_verdict([fits, fits]) == "fits"
    assert circuit_verdict([fits, unknown]) == "unknown"
    assert circuit_verdict([unknown, fails, fits]) == "fails"


def test_an_empty_path_loses_only_its_connectors() -> None:
    """Equipment in one room: no glass, no delay, no dispersion."""
    room = Path(circuit="c", direction="from-to", steps=(Mating(where="panel"),))
    budget = circuit_budget(room, 1310.0, practice=practice())
    assert (budget.nominal_db, budget.delay_ns, budget.pmd_ps) == (0.25, 0, 0.0)
    assert budget.dispersion_max_ps_per_nm == 0.0
