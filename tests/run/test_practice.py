"""Practice values: the table of defaults, what a run takes, and what a plan rests on."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from pydantic import ValidationError

from routeplan.errors import TableError
from routeplan.run import assumed_values, default_value, practice_rows, read_run, value_of
from routeplan.run.practice import CableMake, CircuitOrder, Costs, GroundRules, Loss, Reels, Slack


def test_every_field_of_the_practice_has_a_default_row() -> None:
    """A key without a default row could never be left out of a run file."""
    named = {row.name for row in practice_rows()}
    free = {"joints.max_count", "joints.max_section_m", "cable.measured", "cable.legs"}
    free |= {"loss.connector_grade"}
    free |= {f"cable.{key}" for key in ("make", "metal", "located", "indoor_max_m")}
    for section, model in {
        "ground": GroundRules,
        "slack": Slack,
        "reels": Reels,
        "costs": Costs,
        "loss": Loss,
        "cable": CableMake,
    }.items():
        keys = {f"{section}.{key}" for key in model.model_fields}
        assert keys - free <= named


def test_every_row_says_where_it_is_from_and_why() -> None:
    """A default without a source and a reason would be a guess."""
    for row in practice_rows():
        assert row.source
        assert row.reason
        assert row.confidence


@pytest.mark.parametrize(
    ("key", "link", "venue"),
    [
        ("loss.margin_db", 3.0, 1.0),
        ("placement", "duct", "surface"),
        ("slack.loop_every_m", {"aerial": 600.0, "duct": 1000.0}, {}),
        ("slack.entry_m", 20.0, 20.0),
    ],
)
def test_purpose_chooses_the_column(key: str, link: object, venue: object) -> None:
    """A venue run differs from a link in three values and in nothing else."""
    assert default_value(key, "link") == link
    assert default_value(key, "venue") == venue


def test_only_four_values_differ_by_purpose() -> None:
    """The purpose chooses a set of defaults and nothing else."""
    differing = {row.name for row in practice_rows() if row.venue is not None}
    assert differing == {
        "loss.margin_db",
        "loss.repairs_count",
        "placement",
        "slack.loop_every_m",
    }


def test_an_unknown_default_is_an_error() -> None:
    """A key that no row has must not pass as None."""
    with pytest.raises(TableError, match=r"slack\.hope_m"):
        default_value("slack.hope_m")


def test_a_default_that_is_changed_by_a_caller_stays_as_it_is() -> None:
    """Callers get their own copy of a table of defaults."""
    table = default_value("slack.loop_m")
    assert isinstance(table, dict)
    table["aerial"] = 1.0
    assert default_value("slack.loop_m") == {"aerial": 30.0, "duct": 15.0}


@pytest.mark.parametrize("wrong", ["12", 12.0, True, 0, -1, 10**6, None, [12]], ids=repr)
def test_a_count_takes_whole_numbers_in_range_only(wrong: object) -> None:
    """Text, truth values, fractions and slips of the decimal point are no fibre counts."""
    good = {
        "fibre_count": 24,
        "fibre_type": "G.652.D",
        "fibres_per_tube": 12,
        "colour_code": "TIA-598",
        "glass_over_sheath_ratio": 0.012,
    }
    assert CableMake.model_validate(good).fibre_count == 24
    with pytest.raises(ValidationError):
        CableMake.model_validate({**good, "fibre_count": wrong})


@pytest.mark.parametrize("wrong", [float("nan"), float("inf"), "1", False, 10**400])
def test_a_measure_takes_finite_numbers_only(wrong: object) -> None:
    """Not-a-number and infinity would run through every sum behind them."""
    with pytest.raises(ValidationError):
        CableMake.model_validate(
            {
                "fibre_count": 24,
                "fibre_type": "G.652.D",
                "fibres_per_tube": 12,
                "colour_code": "TIA-598",
                "glass_over_sheath_ratio": wrong,
            }
        )


def test_models_cannot_be_changed() -> None:
    """A practice handed from stage to stage must stay what it was."""
    circuit = CircuitOrder.model_validate(
        {"name": "P", "from": "A", "to": "B", "fibre_count": 2, "wavelengths_nm": [1310]}
    )
    assert circuit.from_ == "A"
    with pytest.raises(ValidationError, match="frozen"):
        circuit.to = "C"  # type: ignore[misc]


def test_put_ups_are_taken_in_rising_order() -> None:
    """The order in which a maker's lengths are written has no meaning."""
    reels = Reels(buy=("put-ups",), put_ups_m=(6000.0, 2000.0), max_m=1.0, round_up_m=1.0)
    assert reels.put_ups_m == (2000.0, 6000.0)


def test_a_bare_run_rests_on_every_default(run_with: Callable[[str], Path]) -> None:
    """Nothing that was assumed may be missing from the list."""
    run = read_run(run_with(""))
    names = [assumed.name for assumed in assumed_values(run)]
    for row in practice_rows():
        if row.name.startswith("interface."):
            continue
        assert any(name == row.name or name.startswith(f"{row.name}.") for name in names), row.name
    assert len(set(names)) == len(names)


def test_what_is_given_is_not_assumed(run_with: Callable[[str], Path]) -> None:
    """Keys of the run file leave the list, by placement where they are given so."""
    run = read_run(
        run_with(
            "[slack]\nentry_m = 20.0\nundulation_ratio = { duct = 0.02 }\n"
            "loop_every_m = { duct = 900.0 }\n"
        )
    )
    names = {assumed.name for assumed in assumed_values(run)}
    assert "slack.entry_m" not in names
    assert "slack.undulation_ratio.duct" not in names
    assert "slack.undulation_ratio.aerial" in names
    assert not any(name.startswith("slack.loop_every_m") for name in names)
    assert "slack.loop_m.duct" in names


def test_partly_given_tables_are_merged_or_replaced(run_with: Callable[[str], Path]) -> None:
    """Ratios and loop lengths keep their other placements; spacings do not, so one can be left."""
    run = read_run(
        run_with(
            "[slack]\nundulation_ratio = { duct = 0.02 }\nloop_m = { duct = 9.0 }\n"
            "loop_every_m = { duct = 900.0 }\n"
        )
    )
    slack = run.practice.slack
    assert slack.undulation_ratio["duct"] == 0.02
    assert slack.undulation_ratio["water"] == 0.02
    assert slack.undulation_ratio["aerial"] == 0.005
    assert slack.loop_m == {"aerial": 30.0, "duct": 9.0}
    assert slack.loop_every_m == {"duct": 900.0}


def test_an_empty_table_of_loops_means_none(run_with: Callable[[str], Path]) -> None:
    """`loop_every_m = {}` switches loops off, and says so where it is a default."""
    run = read_run(run_with("[slack]\nloop_every_m = {}\n"))
    assert run.practice.slack.loop_every_m == {}
    venue = read_run(run_with('purpose = "venue"\n'))
    assert venue.practice.slack.loop_every_m == {}
    assumed = {value.name: value.value for value in assumed_values(venue)}
    assert assumed["slack.loop_every_m"] == "none"


def test_circuits_and_interfaces_are_assumed_by_name(run_with: Callable[[str], Path]) -> None:
    """What a circuit or an own interface does not say is listed under its name."""
    run = read_run(
        run_with(
            "[interface.own]\nwavelength_nm = 1310\ntx_min_dbm = -8.0\nrx_sensitivity_dbm = -23.0\n"
            '[[circuit]]\nname = "P"\nfrom = "A"\nto = "B"\ninterface = "own"\n'
        )
    )
    assumed = {value.name: value.value for value in assumed_values(run)}
    assert assumed["interface.own.penalty_db"] == 0.0
    assert assumed["circuit.P.fibre_count"] == 2
    assert assumed["circuit.P.wavelengths_nm"] == "1310"
    assert run.circuits[0].wavelengths_nm == (1310.0,)


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("slack.joint_tail_m", 15.0),
        ("slack.undulation_ratio.duct", 0.01),
        ("cable.fibre_count", 24),
        ("placement", "duct"),
        ("joints.max_count", None),
        ("circuit.fibre_count", 2),
        ("reels.buy", ("put-ups",)),
    ],
)
def test_a_value_is_found_by_its_dotted_key(
    run_with: Callable[[str], Path], key: str, value: object
) -> None:
    """Sheets look values up by the key that the run file uses."""
    assert value_of(read_run(run_with("")), key) == value


def test_an_unknown_dotted_key_is_an_error(run_with: Callable[[str], Path]) -> None:
    """A misspelt key must not pass as None."""
    run = read_run(run_with(""))
    for key in ("slack.hope_m", "hope", "slack.loop_m.water"):
        with pytest.raises(TableError):
            value_of(run, key)
