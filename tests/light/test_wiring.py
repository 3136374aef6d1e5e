"""What a run file says of losses reaches the budget: from TOML to the plan's document."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from routeplan.planning import plan, splices
from routeplan.run.defaults import default_value
from routeplan.sheets.document import plan_document
from routeplan.tables import raw_rows, table_names
from tests.light.wired_runs import (
    CIRCUIT,
    checks_of,
    circuit_of,
    document,
    lines_of,
    planned,
    problems_of,
    straight_run,
    two_leg_run,
)

ER = CIRCUIT + 'interface = "10GBASE-ER"\nwavelengths_nm = [1550]\n'


def test_a_grade_for_the_whole_run_takes_the_place_of_three_figures() -> None:
    """Grade B has mean 0.12, sigma 0.069 and limit 0.25 dB (table connectors)."""
    line = lines_of(circuit_of('[loss]\nconnector_grade = "grade B"\n' + ER))["connector pairs"]
    assert (line["each_db"], line["sigma_db"], line["limit_db"]) == (0.12, 0.069, 0.25)
    assert line["source"].startswith("table connectors, grade B (IEC")
    names = {
        row["name"] for row in document('[loss]\nconnector_grade = "grade B"\n')["assumptions"]
    }
    assert not {n for n in names if n.startswith("loss.connector_") and n.endswith("_db")}


def test_a_better_polish_sends_less_back_and_changes_nothing_else() -> None:
    """PC 35, UPC 45 and APC 60 dB a pair (IEC 61755-1): return loss rises in that order."""
    found = [circuit_of(f'[loss]\nconnector_polish = "{p}"\n' + ER) for p in ("PC", "UPC", "APC")]
    returns = [row["budgets"][0]["return_loss_db"] for row in found]
    assert returns == sorted(set(returns))
    assert all(
        row["budgets"][0]["margin_db"] == found[0]["budgets"][0]["margin_db"] for row in found
    )
    assert returns[1] == circuit_of(ER)["budgets"][0]["return_loss_db"]


@pytest.mark.parametrize(
    ("panel", "limit_db", "source"),
    [
        ('grade = "grade D"', 1.0, "table connectors, grade D"),
        ("measured_db = 0.31", 0.31, "run file, panel Hill, measured_db"),
    ],
)
def test_a_panel_has_its_own_pairs(panel: str, limit_db: float, source: str) -> None:
    """Only the pair at that site changes; the other stays with practice."""
    lines = lines_of(circuit_of(f'[[panel]]\nsite = "Hill"\n{panel}\n' + ER))
    assert lines["connector pairs"]["count"] == 1
    own = lines["connector pair Hill"]
    assert (own["count"], own["limit_db"]) == (1, limit_db)
    assert own["source"].startswith(source)


def test_an_angled_end_on_a_flat_one_and_an_unknown_site_are_errors() -> None:
    """Both panels are told of at once, with the nearest site."""
    toml = (
        '[[panel]]\nsite = "Hil"\n[[panel]]\nsite = "Studio"\npolish = "APC"\nlead_polish = "UPC"\n'
    )
    unknown, mixed = problems_of(straight_run(toml + CIRCUIT))
    assert unknown == (
        'panel "Hil", site: is not a site ("Hil", one of Studio, Hill). Did you mean "Hill"?'
    )
    assert mixed.startswith('panel "Studio", lead_polish: an angled connector would be mated')


def test_a_joint_has_its_own_splices_in_budget_and_schedule() -> None:
    """The figures hold at that place alone; what is left out comes from practice."""
    toml = '[[joint]]\nplace = "HH 3"\nsplice_mean_db = 0.08\nsplice_limit_db = 0.2\n' + ER
    lines = lines_of(circuit_of(toml))
    own = lines["splice J1"]
    assert (own["each_db"], own["sigma_db"], own["limit_db"]) == (0.08, 0.03, 0.2)
    assert lines["splices in joints"]["count"] == 1
    limits = {row.joint: row.limit_db for row in splices(planned(toml))}
    assert limits == {"J1": 0.2, "J2": 0.1}


def test_a_measured_joint_is_what_was_measured_and_still_has_to_meet_practice() -> None:
    """No scatter is left once it is measured; the limit of the schedule stays."""
    toml = '[[joint]]\nplace = "HH 6"\nmeasured_db = 0.03\n' + ER
    own = lines_of(circuit_of(toml))["splice J2"]
    assert (own["each_db"], own["sigma_db"], own["limit_db"]) == (0.03, 0.0, 0.03)
    assert {row.limit_db for row in splices(planned(toml))} == {0.1}


def test_a_joint_that_ends_up_elsewhere_is_a_warning_and_an_unknown_place_an_error() -> None:
    """A handhole without a joint is no mistake of spelling."""
    found = document('[[joint]]\nplace = "HH 2"\nmeasured_db = 0.03\n' + CIRCUIT)
    assert [row["where"] for row in found["warnings"]] == ['joint "HH 2"']
    (text,) = problems_of(straight_run('[[joint]]\nplace = "HH 22"\nmeasured_db = 0.03\n'))
    assert 'Did you mean "HH 2' in text


def test_a_measured_section_goes_before_its_cable() -> None:
    """Section S2 has its own line, of its own attenuation; the others keep the cable's."""
    toml = (
        "[cable]\nmeasured = [ { wavelength_nm = 1550, attenuation_db_per_km = 0.2 } ]\n"
        '[[section]]\nname = "S2"\n'
        "measured = [ { wavelength_nm = 1550, attenuation_db_per_km = 0.19 } ]\n" + ER
    )
    found = document(toml)
    lines = lines_of(found["circuits"][0])
    glass_km = planned(toml).layout.sections[1].glass_mm / 1e6
    assert lines["fibre G.652.D, measured S2"]["each_db"] == pytest.approx(
        0.19 * glass_km, abs=6e-4
    )
    rest_km = found["cables"][0]["glass_m"] / 1000 - glass_km
    assert lines["fibre G.652.D, measured C1"]["each_db"] == pytest.approx(0.2 * rest_km, abs=6e-4)
    (text,) = problems_of(straight_run(toml.replace('"S2"', '"S9"')))
    assert 'section "S9", name: is not a section of this plan ("S9", one of S1, S2, S3)' in text


def test_glass_above_its_ceiling_fails_a_check() -> None:
    """0.42 dB/km at 1310 nm is more than ITU-T G.652.D allows, 0.40."""
    toml = "[cable]\nmeasured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.42 } ]\n"
    found = document(toml + CIRCUIT + "wavelengths_nm = [1310]\n")
    (check,) = checks_of(found, "attenuation")
    assert (check["value"], check["limit"], check["verdict"]) == (0.42, 0.4, "fails")
    assert found["verdict"] == "fails"


def test_parts_stand_where_they_are_put_and_count_as_often() -> None:
    """Table part and own part, at an end and in a joint; the bill lists both for each fibre."""
    toml = (
        ER
        + '[[circuit.part]]\nname = "splitter 1:2"\nat = "Hill"\n'
        + '[[circuit.part]]\nkind = "own"\nname = "tap"\nat = "HH 3"\nloss_db = 0.4\ncount = 2\n'
    )
    lines = lines_of(circuit_of(toml))
    split, tap = lines["splitter 1:2 Hill"], lines["tap HH 3"]
    assert (split["each_db"], split["limit_db"]) == (3.5, 4.0)
    assert (tap["count"], tap["each_db"], tap["limit_db"]) == (2, 0.4, 0.4)
    bill = {row["item"]: row["quantity"] for row in document(toml)["bill"]}
    assert (bill["Passive part splitter 1:2"], bill["Passive part tap"]) == (2, 4)
    steps = [type(step).__name__ for step in planned(toml).circuits[0].paths[0].steps]
    assert steps[steps.index("Part") - 1] == "SpliceStep"


def test_a_fitted_attenuator_counts_in_loss_and_overload() -> None:
    """9 km overload 10GBASE-ER; with 5 dB fitted at the receivers nothing more is needed."""
    bare, fitted = circuit_of(ER)["budgets"], circuit_of(ER + "attenuator_db = 5\n")["budgets"]
    for before, after in zip(bare, fitted, strict=True):
        assert after["worst_db"] == round(before["worst_db"] + 5.0, 3)
        assert after["overload_db"] == round(before["overload_db"] - 5.0, 3)
        assert before["overload_db"] > 0.0 >= after["overload_db"]
    assert "attenuator Hill" in lines_of(circuit_of(ER + "attenuator_db = 5\n"))
    bill = [r for r in document(ER + "attenuator_db = 5\n")["bill"] if "attenuator" in r["item"]]
    assert [(row["item"], row["quantity"]) for row in bill] == [("Fixed attenuator 5 dB", 2)]


def test_an_attenuator_that_is_too_much_is_named_as_what_fails() -> None:
    """With 10 dB fitted the margin is gone; without it the circuit would fit."""
    row = circuit_of(ER + "attenuator_db = 10\n", 8000.0)
    assert row["verdict"] == "fails"
    assert "Without the attenuator of 10 dB at the receivers it would fit." not in row["changes"]
    long = circuit_of(ER + "attenuator_db = 10\n", 20000.0)
    assert long["changes"][-1] == "Without the attenuator of 10 dB at the receivers it would fit."


def test_an_extra_panel_is_a_mated_pair_and_never_raises_the_margin() -> None:
    """Each time a site is named is one pair more, wherever it is."""
    margins = []
    for count in range(4):
        names = ", ".join(['"Studio"', '"Hill"', '"Hill"'][:count])
        row = circuit_of(ER + f"patch = [{names}]\n")
        assert lines_of(row)["connector pairs"]["count"] == 2 + count
        margins.append(row["budgets"][0]["margin_db"])
    assert margins == sorted(margins, reverse=True)
    assert len(set(margins)) == 4


def test_a_through_site_can_have_a_further_panel() -> None:
    """Two panels and the lead between them are there anyway: four pairs, and one more is five."""
    found = plan_document(plan(two_leg_run(CIRCUIT + 'patch = ["Hut"]\n')))
    assert lines_of(found["circuits"][0])["connector pairs"]["count"] == 5


def test_bends_lose_what_the_table_allows_and_tight_ones_fail_a_check() -> None:
    """A hundred turns of 30 mm may lose 0.1 dB at 1625 nm (ITU-T G.652); 20 mm are too tight."""
    toml = ER + '[[circuit.bend]]\nplace = "{}"\nradius_mm = {}\nturns = 100\n'
    easy, tight = toml.format("HH 4", 30), toml.format("HH 4", 20)
    assert lines_of(circuit_of(easy))["bend HH 4"]["limit_db"] == 0.1
    (check,) = checks_of(document(easy), "bend radius")
    assert (check["value"], check["limit"], check["verdict"]) == (30.0, 30.0, "fits")
    (check,) = checks_of(document(tight), "bend radius")
    assert (check["where"], check["verdict"]) == ("P, HH 4", "fails")
    assert any("tighter than" in text for text in circuit_of(tight)["budgets"][0]["reasons"])


def test_what_is_not_on_the_way_is_named_all_at_once() -> None:
    """Parts, bends, patches, leads and rolls: one problem each, with the nearest name."""
    toml = (
        CIRCUIT
        + 'patch = ["Hlil"]\nrolls = ["HH 11"]\nleads = { Studo = "straight" }\n'
        + '[[circuit.part]]\nname = "wdm 1310/1550"\nat = "HH 2"\n'
        + '[[circuit.bend]]\nplace = "HHH 4"\nradius_mm = 30\nturns = 1\n'
    )
    texts = problems_of(straight_run(toml))
    assert [re.match(r'circuit "P", ([a-z]+( 1, \w+)?)', text)[1] for text in texts] == [  # type: ignore[index]
        "patch",
        "leads",
        "rolls",
        "part 1, at",
        "bend 1, place",
    ]
    assert all("is not on the circuit's way" in text for text in texts)


def test_unlike_fibre_is_a_warning_a_check_and_a_line() -> None:
    """Where two makes of cable are spliced, traces have to be taken from both sides."""
    toml = CIRCUIT + "wavelengths_nm = [1550]\n"
    run = two_leg_run(toml, hut_is_site=False)
    far = run.cables["far"].model_copy(update={"fibre_type": "G.654.E"})

    found = plan_document(plan(replace(run, cables={**run.cables, "far": far})))
    assert [row["where"] for row in found["warnings"]] == ["joint J1"]
    (check,) = checks_of(found, "unlike fibre")
    line = lines_of(found["circuits"][0])["mode-field mismatch G.652.D to G.654.E"]
    assert check["value"] == line["limit_db"] > line["each_db"] > 0.0


@pytest.mark.parametrize("existing_db", [None, 1.7])
def test_an_existing_span_brings_its_own_length_and_loss(existing_db: float | None) -> None:
    """Its declared glass and loss stand in the budget, at both wavelengths; else its type's."""
    run = two_leg_run(CIRCUIT + "wavelengths_nm = [1550]\n", hut_is_site=False)
    dark = replace(run.lines[1], placement="existing", existing_m=3333.0, existing_db=existing_db)
    found = plan_document(plan(replace(run, lines=(run.lines[0], dark))))
    row = found["circuits"][0]
    (line,) = [line for item, line in lines_of(row).items() if item.startswith("existing span")]
    expected = existing_db if existing_db is not None else round(0.19 * 3.333, 3)
    assert line["each_db"] == pytest.approx(expected, abs=0.02)
    assert row["glass_m"] > 3333.0


EVERYTHING = (
    '[loss]\nconnector_grade = "grade C"\n[[panel]]\nsite = "Hill"\nmeasured_db = 0.2\n'
    '[[joint]]\nplace = "HH 3"\nsplice_limit_db = 0.2\n'
    '[[section]]\nname = "S2"\n'
    "measured = [ { wavelength_nm = 1550, attenuation_db_per_km = 0.2 } ]\n"
    + ER
    + 'attenuator_db = 3\n[[circuit.part]]\nname = "wdm 1310/1550"\n'
    + '[[circuit.bend]]\nplace = "HH 1"\nradius_mm = 30\nturns = 10\n'
)


@pytest.mark.parametrize("toml", [ER, EVERYTHING, CIRCUIT])
def test_every_number_of_a_budget_can_be_followed_to_its_row_and_source(toml: str) -> None:
    """A line names a row of a table, a key of practice, or a key of the run file; each is there."""
    for circuit in document(toml)["circuits"]:
        for budget in circuit["budgets"]:
            for line in [*budget["lines"], *budget["life_lines"]]:
                assert _resolves(line["source"], toml), line


def _resolves(source: str, toml: str) -> bool:
    kind, _, rest = source.partition(" ")
    if kind == "practice":
        keys = re.findall(r"(?:\w+\.)?\w+", rest)
        section = keys[0].partition(".")[0]
        full = [key if "." in key else f"{section}.{key}" for key in keys]
        return all(default_value(key) is not None for key in full)
    if kind == "table":
        name, _, row = rest.partition(", ")
        assert name in table_names()
        rows = list(raw_rows(name))
        assert all(entry.get("source") or name for entry in rows)
        if not row:
            return bool(rows)
        told = row.partition(" (")[0]
        names = [
            n for r in rows for n in (r.get("name"), r.get("fibre_type"), *r.get("fibre_types", ()))
        ]
        return any(isinstance(n, str) and told.startswith(n) for n in names)
    if source.startswith("run file, "):
        what, _, name = source.removeprefix("run file, ").partition(" ")
        return f"[[{what}]]" in toml and name.partition(",")[0].partition(";")[0] in toml
    return source.startswith("measured") and "measured = [" in toml
