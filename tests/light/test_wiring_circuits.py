"""What a run file asks of circuits reaches the plan: polarity, any, times, years, radio, reach."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.light.changes import stretched
from routeplan.light.circuits import circuit_budgets
from routeplan.planning import plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.report import report_html
from routeplan.sheets.summary import summary_text
from routeplan.tables import raw_rows
from tests.light.wired_runs import (
    CIRCUIT,
    checks_of,
    circuit_of,
    document,
    planned,
    problems_of,
    straight_run,
    two_leg_run,
)

LR = CIRCUIT + 'interface = "10GBASE-LR"\n'
ANY = CIRCUIT + 'interface = "any"\n'


@pytest.mark.parametrize(
    ("keys", "swaps", "verdict", "text"),
    [
        ("", 3, "fits", "transmit meets receive: swapped at Studio, Hill panel, Hill"),
        ('leads = { Studio = "crossed" }', 3, "fits", "transmit meets receive"),
        (
            'leads = { Hill = "straight" }',
            2,
            "fails",
            "transmit meets transmit: the patch lead at Hill goes straight through. Take a lead "
            "that swaps its two fibres there.",
        ),
        (
            'rolls = ["HH 4"]',
            4,
            "fails",
            "transmit meets transmit: the pair is rolled at Hill panel, HH 4. Take the roll at "
            "HH 4 out, or swap the plugs of one lead.",
        ),
        ('rolls = ["HH 4"]\nleads = { Studio = "straight" }', 3, "fits", "transmit meets receive"),
    ],
)
def test_the_odd_roll_is_found_and_said(keys: str, swaps: int, verdict: str, text: str) -> None:
    """An odd number of swaps lets transmit meet receive; an even one fails the plan."""
    found = document("[loss]\nmargin_db = 0.5\n" + LR + keys + "\n")
    (check,) = checks_of(found, "polarity")
    assert (check["value"], check["verdict"]) == (swaps, verdict)
    assert check["source"].startswith(text)
    assert (found["verdict"] == "fails") == (verdict == "fails")


def test_a_patched_site_has_a_lead_and_each_run_of_cable_its_roll() -> None:
    """Three leads and two runs make five swaps; one fibre has no pair to swap."""
    (check,) = checks_of(plan_document(plan(two_leg_run(CIRCUIT))), "polarity")
    assert (check["value"], check["verdict"]) == (5.0, "fits")
    assert checks_of(document(CIRCUIT + "fibre_count = 1\n"), "polarity") == []


def test_any_lists_what_closes_least_capable_first_and_shows_the_first() -> None:
    """Rates rise along the list, every margin holds, and the budgets are of its first entry."""
    row = circuit_of(ANY)
    closing = row["closing"]
    rates = {r["name"]: r.get("bit_rate_gbps") or 0.0 for r in raw_rows("interfaces")}
    listed = [rates.get(c["interface"], 1.25) for c in closing]
    assert listed == sorted(listed)
    assert all(c["margin_db"] >= 0.0 for c in closing)
    assert (row["interface"], row["optic"]) == ("any", closing[0]["interface"])
    assert row["verdict"] == "fits"
    assert {b["wavelength_nm"] for b in row["budgets"]} == set(closing[0]["wavelengths_nm"])
    shown = min(b["margin_db"] - (b["attenuator_db"] or 0.0) for b in row["budgets"])
    assert shown == pytest.approx(closing[0]["margin_db"], abs=5e-4)
    assert circuit_of(LR)["closing"] == []


def test_any_keeps_to_wavelengths_that_are_given_and_tries_own_interfaces() -> None:
    """At 1550 nm only what sends there comes; one's own is among it."""
    own = "[interface.mine]\nwavelength_nm = 1550\nchannel_loss_db = 12.0\n"
    row = circuit_of(own + ANY + "wavelengths_nm = [1550]\n")
    assert "mine" in {c["interface"] for c in row["closing"]}
    assert all(c["wavelengths_nm"] == [1550.0] for c in row["closing"])
    bill = [r["item"] for r in document(own + ANY + "wavelengths_nm = [1550]\n")["bill"]]
    assert f"Optical interface {row['optic']}" in bill


def test_any_fails_where_nothing_closes() -> None:
    """Thirty further panels are too much for every class, and the plan says so."""
    many = ", ".join(['"Hill"'] * 60)
    found = document(ANY + f"patch = [{many}]\n")
    row = found["circuits"][0]
    assert (row["verdict"], row["closing"], row["optic"]) == ("fails", [], None)
    (check,) = checks_of(found, "interfaces that close")
    assert (check["value"], check["limit"], check["verdict"]) == (0.0, 1.0, "fails")
    assert all("closes this circuit" in b["reasons"][0] for b in row["budgets"])


def test_a_standby_is_set_beside_what_it_stands_by_for() -> None:
    """The difference of the delays, its published limits, and a warning of a shared cable."""
    both = LR + LR.replace('"P"', '"S"') + 'standby_for = "P"\npatch = ["Hill"]\n'
    found = document(both)
    main, standby = found["circuits"]
    assert "difference to P" not in {f["figure"] for f in main["timing"]}
    (figure,) = [f for f in standby["timing"] if f["figure"] == "difference to P"]
    assert figure["value"] == pytest.approx(abs(standby["delay_us"] - main["delay_us"]))
    assert sum(f["figure"].startswith("path difference") for f in standby["timing"]) == 3
    assert any("one cut takes both" in w["message"] for w in found["warnings"])


def test_times_stand_beside_their_limits() -> None:
    """Delay each way, asymmetry, guard intervals, packet times and clock error, with sources."""
    figures = {f["figure"]: f for f in circuit_of(LR)["timing"]}
    delay = figures["delay from-to at 1310 nm"]["value"]
    assert figures["guard interval: DVB-T 8k 1/4"]["value"] == delay
    assert figures["guard interval: DVB-T 8k 1/4"]["limit"] == 224.0
    assert figures["asymmetry"]["value"] == 0.0
    assert all(f["source"] for f in figures.values())
    one = CIRCUIT + 'fibre_count = 1\ninterface = "1000BASE-BX10"\n'
    figures = {f["figure"]: f["value"] for f in circuit_of(one)["timing"]}
    assert figures["asymmetry"] == pytest.approx(
        abs(figures["delay from-to at 1490 nm"] - figures["delay to-from at 1310 nm"])
    )
    assert figures["time error: studio clock"] == pytest.approx(figures["asymmetry"] / 2)


def test_two_fibre_interfaces_on_one_fibre_are_warned_of() -> None:
    """Both directions at one wavelength: only an interface made for that bears it."""
    found = document(LR + "fibre_count = 1\n")
    assert any("made for two fibres" in w["message"] for w in found["warnings"])
    made = document(CIRCUIT + 'fibre_count = 1\ninterface = "1000BASE-BX10"\n')
    assert made["warnings"] == []


def test_channels_of_coarse_multiplexers_are_held_to_the_grid() -> None:
    """Between channels, twice in one, and more than there are: all told of together."""
    wide = "[interface.wide]\nchannel_loss_db = 20.0\n"
    part = '[[circuit.part]]\nname = "cwdm 4 pair"\n'
    good = wide + CIRCUIT + 'interface = "wide"\nwavelengths_nm = [1271, 1291, 1311, 1331]\n' + part
    assert problems_of(straight_run(good)) == []
    assert len(circuit_of(good)["budgets"]) == 8
    bad = good.replace("1331]", "1309, 1340, 1551]")
    texts = problems_of(straight_run(bad))
    assert [t.split(": ", 1)[1].split(" (")[0] for t in texts] == [
        "needs the channel that 1311 nm has already",
        "lies between the channels of the coarse grid",
        "has more wavelengths than its multiplexers have channels",
    ]


def test_years_take_from_the_first_day_with_a_reason_each() -> None:
    """First day: nothing kept. End of life: less every line at its limit; verdict as it was."""
    for budget in circuit_of(LR)["budgets"]:
        first = round(budget["available_db"] - budget["worst_db"], 3)
        assert budget["first_day_margin_db"] == first
        taken = sum(line["count"] * line["limit_db"] for line in budget["life_lines"])
        assert budget["end_of_life_margin_db"] == pytest.approx(first - taken, abs=1e-9)
        assert budget["margin_db"] == round(first - 3.0, 3)
        assert budget["life_lines"][0]["item"] == "repairs"
        assert all(line["source"] and line["reason"] for line in budget["life_lines"])
    venue = circuit_of('purpose = "venue"\n' + LR)
    assert "repairs" not in {line["item"] for line in venue["budgets"][0]["life_lines"]}
    more = circuit_of("[loss]\nrepairs_count = 5\nrepair_cable_m = 100\n" + LR)
    assert (
        more["budgets"][0]["end_of_life_margin_db"]
        < circuit_of(LR)["budgets"][0]["end_of_life_margin_db"]
    )


RF = """
[interface.antenna]
wavelength_nm = 1310
rf = true
channel_loss_db = 8.0
"""


def test_a_decibel_of_light_is_two_of_signal() -> None:
    """Channel loss alone gives the loss of signal; slope and responsivity give the gain."""
    row = circuit_of(RF + CIRCUIT + 'interface = "antenna"\n')
    nominal = {f["figure"]: f["value"] for f in row["radio"] if f["direction"] == "from-to"}
    assert nominal == {
        "nominal loss of signal": pytest.approx(2 * row["budgets"][0]["nominal_db"]),
        "worst loss of signal": pytest.approx(2 * row["budgets"][0]["worst_db"]),
    }
    full = RF.replace("channel_loss_db = 8.0", "") + (
        "tx_min_dbm = 3.0\nrx_sensitivity_dbm = -10.0\nslope_w_per_a = 0.1\n"
        "responsivity_a_per_w = 0.8\nmodulation_ratio = 0.04\nbandwidth_hz = 4e6\n"
        "intensity_noise_db_per_hz = -155.0\nthermal_a_per_sqrt_hz = 8e-12\n"
    )
    row = circuit_of(full + CIRCUIT + 'interface = "antenna"\n')
    found = {f["figure"]: f["value"] for f in row["radio"] if f["direction"] == "from-to"}
    # 20 log10(0.1 x 0.8) = -21.938 dB before the light is lost.
    assert found["worst gain"] == pytest.approx(
        -21.938 - 2 * row["budgets"][0]["worst_db"], abs=2e-3
    )
    assert found["worst carrier to noise"] < found["nominal carrier to noise"]
    assert circuit_of(LR)["radio"] == []


def test_a_channel_loss_alone_is_enough_and_says_what_it_cannot_know() -> None:
    """One number: a verdict at any wavelength, and a reason on light that is too strong."""
    row = circuit_of("[interface.one]\nchannel_loss_db = 12.0\n" + CIRCUIT + 'interface = "one"\n')
    assert row["verdict"] == "fits"
    assert {b["wavelength_nm"] for b in row["budgets"]} == {1310.0, 1550.0}
    for budget in row["budgets"]:
        assert budget["overload_db"] is None
        assert any("cannot be ruled out" in text for text in budget["reasons"])


def test_a_least_channel_loss_of_ones_own_asks_for_an_attenuator() -> None:
    """A receiver that needs 10 dB before it has too much behind 9 km: the stock mends it."""
    own = (
        "[interface.long]\nwavelength_nm = 1550\nchannel_loss_db = 25.0\nchannel_loss_min_db = 10\n"
    )
    (budget, _) = circuit_of(own + CIRCUIT + 'interface = "long"\n')["budgets"]
    assert budget["overload_db"] > 0.0
    assert budget["attenuator_db"] >= budget["overload_db"]
    assert budget["verdict"] == "fits"


def test_a_receiver_that_reflects_is_seen_and_judged() -> None:
    """A transmitter that bears 40 dB fails where backscatter alone is 31 dB down."""
    own = "[interface.tender]\nwavelength_nm = 1550\nchannel_loss_db = 15.0\n"
    asks = own + CIRCUIT + 'interface = "tender"\n'
    tender = asks.replace("15.0\n", "15.0\nreturn_loss_min_db = 40\nrx_return_loss_db = 14\n", 1)
    bare, judged = circuit_of(asks)["budgets"][0], circuit_of(tender)["budgets"][0]
    assert judged["return_loss_db"] < bare["return_loss_db"]
    assert (bare["verdict"], judged["verdict"]) == ("fits", "fails")


def test_strong_light_is_a_check_and_a_caution() -> None:
    """+13 dBm at 1550 nm is hazard level 1M, +20 dBm with sixteen channels above it."""
    own = (
        "[interface.loud]\nwavelength_min_nm = 1540\nwavelength_max_nm = 1560\ntx_min_dbm = 10\n"
        "tx_max_dbm = {}\nrx_sensitivity_dbm = -20\nrx_overload_dbm = 25\n"
    )
    ask = CIRCUIT + 'interface = "loud"\nwavelengths_nm = [{}]\n'
    found = document(own.format(13) + ask.format("1550"))
    (check,) = checks_of(found, "laser hazard")
    assert (check["value"], check["limit"], check["verdict"]) == (13.0, 10.0, "fits")
    assert "Light above hazard level 1" in {c["topic"] for c in found["cautions"]}
    many = ", ".join(str(1541 + k) for k in range(16))
    (check,) = checks_of(document(own.format(20) + ask.format(many)), "laser hazard")
    assert check["value"] == pytest.approx(32.041, abs=1e-3)
    assert check["verdict"] == "fails"


def test_the_stretch_limit_just_fits_and_ten_metres_more_just_fails() -> None:
    """Worked from the plan's own paths, joints held."""
    toml, length_m = LR.replace("LR", "ER") + "attenuator_db = 1\n", 16000.0
    circuit = planned(toml, length_m).circuits[0]
    limit_m = circuit_of(toml, length_m)["stretch_m"]
    verdicts = [
        {
            budget.verdict
            for budget in circuit_budgets(
                {p.direction: stretched(p, limit_m + more_m) for p in circuit.paths},
                circuit.pair,
                circuit.wavelengths_nm,
                practice=planned(toml, length_m).run.practice.loss,
            )
        }
        for more_m in (0.0, 10.0)
    ]
    assert verdicts == [{"fits"}, {"fails"}]
    assert circuit_of(toml, 30000.0)["stretch_m"] is None


def test_a_failing_circuit_says_what_would_mend_it_and_what_decides() -> None:
    """30 km are too much for 10GBASE-LR: another optic would do; the fibre is what decides."""
    row = circuit_of("[loss]\nmargin_db = 0.0\n" + LR, 26000.0)
    assert row["verdict"] == "fails"
    assert any(text.startswith("10GBASE-ER at 1550 nm would fit") for text in row["changes"])
    assert {budget["deciding"] for budget in row["budgets"]} == {"fibre G.652.D"}
    assert circuit_of(ANY)["changes"] == []


def test_reversing_a_circuit_swaps_its_directions() -> None:
    """Whatever stands at its ends: the way there is the way back of the other."""
    extra = (
        'attenuator_db = 2\npatch = ["Hill"]\n[[circuit.part]]\nname = "wdm 1310/1550"\n'
        'at = "Hill"\n[[circuit.bend]]\nplace = "HH 2"\nradius_mm = 30\nturns = 5\n'
    )
    one = '[[panel]]\nsite = "Hill"\ngrade = "grade D"\npolish = "PC"\n'
    there = circuit_of(one + LR + extra)["budgets"]
    turned = LR.replace('from = "Studio"\nto = "Hill"', 'from = "Hill"\nto = "Studio"')
    back = circuit_of(one + turned + extra)["budgets"]
    keys = ("nominal_db", "worst_db", "margin_db", "overload_db", "return_loss_db", "pmd_ps")
    for key in keys:
        assert [b[key] for b in there] == [b[key] for b in back][::-1]
    assert there[0]["return_loss_db"] != there[1]["return_loss_db"]


@settings(max_examples=10, deadline=None)
@given(st.lists(st.sampled_from(["Studio", "Hill"]), max_size=6), st.integers(1, 3))
def test_adding_a_connector_never_raises_the_margin(sites: list[str], more: int) -> None:
    """On the worst and on the statistical loss, wherever the pair is."""
    run = straight_run(LR)
    order = run.circuits[0]

    def margins(patch: list[str]) -> list[float | None]:
        changed = replace(run, circuits=(order.model_copy(update={"patch": tuple(patch)}),))
        budgets = plan(changed).circuits[0].budgets
        return [m for b in budgets for m in (b.margin_db, b.statistical_margin_db)]

    fewer, further = margins(sites), margins(sites + ["Hill"] * more)
    assert all(b <= a for a, b in zip(fewer, further, strict=True) if a is not None)  # type: ignore[operator]


def test_the_report_shows_what_was_asked() -> None:
    """Closing interfaces, years, times and radio stand in the report."""
    page = report_html(document(ANY))
    for text in (
        "Interfaces that close it",
        "Over the years",
        "guard interval: DAB",
        "of glass longer",
    ):
        assert text in page
    radio = report_html(document(RF + CIRCUIT + 'interface = "antenna"\n'))
    assert "loss of signal" in radio


def test_the_summary_says_what_closes_what_mends_and_what_is_odd() -> None:
    """What a person reads aloud: interfaces, changes and the failing polarity, each on its line."""

    def summary(toml: str, length_m: float = 9000.0) -> list[str]:
        return summary_text(planned(toml, length_m), folder=Path("sheets"), names=[]).splitlines()

    assert any(line.startswith("P: closed by ") for line in summary(ANY))
    rolled = [line for line in summary(LR + 'rolls = ["HH 4"]\n') if "polarity" in line]
    assert len(rolled) == 1
    assert "the pair is rolled at Hill panel, HH 4" in rolled[0]
    assert any("would fit: another optic" in line for line in summary(LR, 26000.0))
