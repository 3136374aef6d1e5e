"""What a run file says of light: every key read, every contradiction named with its remedy."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from routeplan.run import read_run
from routeplan.run.names import attenuator_steps_db, connector_grades, optical_parts

CIRCUIT = '[[circuit]]\nname = "P"\nfrom = "A"\nto = "B"\n'
PART = f"{CIRCUIT}[[circuit.part]]\n"
BEND = f"{CIRCUIT}[[circuit.bend]]\n"
OWN = "[interface.own]\nchannel_loss_db = 5.0\n"

EVERY_KEY = """
[loss]
connector_grade = "grade A"
connector_polish = "APC"
repairs_count = 4
repair_cable_m = 55.5

[interface.own]
tx_min_dbm = -3.0
tx_max_dbm = 1.0
rx_sensitivity_dbm = -20.0
channel_loss_min_db = 2.0
line_width_nm = 0.2
return_loss_min_db = 27.0
rx_return_loss_db = 14.0
rf = true
slope_w_per_a = 0.1
responsivity_a_per_w = 0.85
modulation_ratio = 0.04
bandwidth_hz = 4e6
intensity_noise_db_per_hz = -155.0
thermal_a_per_sqrt_hz = 8e-12

[[panel]]
site = "A"
grade = "grade B"
polish = "APC"
lead_polish = "APC"

[[panel]]
site = "B"
measured_db = 0.2

[[joint]]
place = "H1"
splice_mean_db = 0.04
splice_sigma_db = 0.02
splice_limit_db = 0.08

[[section]]
name = "S1"
measured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.33, sigma_db_per_km = 0.01 } ]

[[circuit]]
name = "P"
from = "A"
to = "B"
interface = "any"
attenuator_db = 5
patch = ["A", "A"]
leads = { A = "straight", B = "crossed" }
rolls = ["H1"]

[[circuit.part]]
name = "splitter 1:2"
at = "B"
count = 2

[[circuit.part]]
kind = "own"
loss_db = 0.4
sigma_db = 0.1
limit_db = 0.7
return_loss_db = 50.0

[[circuit.bend]]
place = "H1"
radius_mm = 30
turns = 0.25

[[circuit]]
name = "Q"
standby_for = "P"
"""


def test_every_key_is_read_as_it_stands(run_with: Callable[[str], Path]) -> None:
    """What the planner wrote is what the run holds."""
    run = read_run(run_with(EVERY_KEY))
    loss = run.practice.loss
    assert (loss.connector_polish, loss.repairs_count, loss.repair_cable_m) == ("APC", 4, 55.5)
    assert (loss.connector_mean_db, loss.connector_limit_db) == (0.07, 0.15)
    assert [panel.site for panel in run.panels] == ["A", "B"]
    assert run.panels[1].measured_db == 0.2
    assert run.joints[0].splice_limit_db == 0.08
    assert run.sections[0].measured[0].sigma_db_per_km == 0.01
    main, standby = run.circuits
    assert (main.interface, main.attenuator_db, main.patch) == ("any", 5.0, ("A", "A"))
    assert (main.leads, main.rolls) == ({"A": "straight", "B": "crossed"}, ("H1",))
    assert [part.count for part in main.part] == [2, 1]
    assert (main.bend[0].radius_mm, main.bend[0].turns) == (30.0, 0.25)
    assert standby.standby_for == "P"
    own = run.interfaces["own"]
    assert own.rf
    assert own.band_nm == (1260.0, 1625.0)
    assert own.thermal_a_per_sqrt_hz == 8e-12


@pytest.mark.parametrize(
    ("toml", "part"),
    [
        (
            '[loss]\nconnector_grade = "grade E"',
            'loss.connector_grade: is not a known connector grade ("grade E", one of grade A,',
        ),
        (
            '[loss]\nconnector_grade = "grade B"\nconnector_limit_db = 0.4',
            "loss.connector_limit_db: is given beside connector_grade, which says it already",
        ),
        ('[loss]\nconnector_polish = "upc"', 'one of PC, UPC, APC). Did you mean "UPC"?'),
        ("[loss]\nrepairs_count = 2.5", "loss.repairs_count: is not a whole number (2.5)"),
        (
            "[loss]\nrepair_cable_m = -1",
            "loss.repair_cable_m: is too small (-1, limit at least",
        ),
        ('[[panel]]\ngrade = "grade B"', "panel 1, site: is missing"),
        (
            '[[panel]]\nsite = "A"\ngrade = "grade Z"',
            'panel "A", grade: is not a known connector grade ("grade Z"',
        ),
        (
            '[[panel]]\nsite = "A"\ngrade = "grade B"\nmeasured_db = 0.2',
            'panel "A": gives both grade and measured_db',
        ),
        ('[[panel]]\nsite = "A"\n[[panel]]\nsite = "A"', 'panel "A": stands 2 times'),
        (
            '[[panel]]\nsite = "A"\nmeasured = 0.2',
            'panel "A", measured: is not a known key. It belongs in [cable].',
        ),
        ('[panel]\nsite = "A"', "panel: is not a list"),
        ('[[joint]]\nplace = "H"', 'joint "H": says nothing of its splices'),
        (
            '[[joint]]\nplace = "H"\nmeasured_db = 0.1\nsplice_mean_db = 0.1',
            'joint "H": gives measured_db beside what a splice there is assumed to lose',
        ),
        (
            '[[joint]]\nplace = "H"\nsplice_mean_db = 0.3',
            'joint "H", splice_limit_db: is below the mean (0.1 dB, limit at least 0.3 dB)',
        ),
        (
            '[[joint]]\nplace = "H"\nmeasured_db = 0\n[[joint]]\nplace = "H"\nmeasured_db = 0',
            'joint "H": stands 2 times',
        ),
        ('[[section]]\nname = "S1"\nmeasured = []', 'section "S1", measured: is empty'),
        (
            '[[section]]\nname = "S1"\nmeasured = [ { wavelength_nm = 1310 } ]',
            'section "S1", measured, item 1, attenuation_db_per_km: is missing',
        ),
        (
            '[[section]]\nname = "S1"\nmeasured = [ { wavelength_nm = 1310, '
            "attenuation_db_per_km = 0.3 }, { wavelength_nm = 1310, "
            "attenuation_db_per_km = 0.4 } ]",
            'section "S1", measured: gives a wavelength more than once (1310 nm)',
        ),
        (f"{PART}count = 1", 'circuit "P", part 1: names no part (one of splitter 1:2,'),
        (
            f'{PART}name = "spliter 1:2"',
            'part 1, name: is not a known passive part ("spliter 1:2", one of splitter 1:2, '
            "splitter 1:4, splitter 1:8, splitter 1:16, splitter 1:32, splitter 1:64, "
            'wdm 1310/1550, cwdm 4 pair, cwdm 8 pair). Did you mean "splitter 1:2"?',
        ),
        (f'{PART}name = "splitter 1:2"\nloss_db = 3.0', "gives a loss of its own beside a part"),
        (f'{PART}kind = "own"', "part 1: is an own part that does not say its loss. Add loss_db."),
        (
            f'{PART}kind = "own"\nloss_db = 1.0\nlimit_db = 0.5',
            "part 1, limit_db: is below the mean (0.5 dB, limit at least loss_db, 1 dB)",
        ),
        (f'{PART}kind = "mine"', 'circuit "P", part, item 1, kind: is not one of the values'),
        (f'{PART}name = "splitter 1:2"\ncount = 0', "part, item 1, count: is too small (0"),
        (f'{PART}name = "splitter 1:2"\nplace = "A"', "part, item 1, place: is not a known key"),
        (f'{BEND}place = "H"\nturns = 1', 'circuit "P", bend, item 1, radius_mm: is missing'),
        (
            f'{BEND}place = "H"\nturns = 1\nradius_mm = 0',
            "bend, item 1, radius_mm: is too small (0, limit more than 0 mm)",
        ),
        (
            f"{CIRCUIT}attenuator_db = 4",
            'circuit "P", attenuator_db: is not an attenuator of the stock (4 dB, limit 1, 2',
        ),
        (f'{CIRCUIT}leads = {{ A = "cross" }}', 'Did you mean "crossed"?'),
        (
            f'{CIRCUIT}fibre_count = 1\nrolls = ["A"]',
            'circuit "P", rolls: is given for a circuit',
        ),
        (
            f'{CIRCUIT}fibre_count = 1\nleads = {{ A = "straight" }}',
            'circuit "P", leads: is given for a circuit on one fibre',
        ),
        (f'{CIRCUIT}standby_for = "P"', 'circuit "P", standby_for: stands by for itself ("P")'),
        (
            f'{CIRCUIT}standby_for = "Q"',
            'standby_for: is not a known circuit of this run ("Q", only P)',
        ),
        (
            f"{OWN}channel_loss_min_db = 6.0",
            "interface.own.channel_loss_min_db: is above channel_loss_db (6 dB, limit",
        ),
        (
            f"{OWN}slope_w_per_a = 0.1",
            "interface.own.slope_w_per_a: is a figure of a radio-frequency link",
        ),
        (f'{OWN}rf = "yes"', "interface.own.rf: is not true or false"),
        (f"{OWN}line_width_nm = 0", "line_width_nm: is too small (0, limit more than 0 nm)"),
        (f'{CIRCUIT}interface = "Any"', 'interface: is not a known interface ("Any"'),
    ],
)
def test_what_cannot_be_is_named(
    toml: str, part: str, run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Key path, value, limit and remedy, in one message."""
    (message,) = said(run_with(toml))
    assert part in message


def test_all_problems_of_light_are_told_of_at_once(
    run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """One reading shows panels, joints, sections, parts, attenuators and standbys."""
    toml = (
        '[[panel]]\nsite = "A"\ngrade = "x"\n[[joint]]\nplace = "H"\n'
        f'{CIRCUIT}attenuator_db = 4\nstandby_for = "Z"\n[[circuit.part]]\nname = "y"\n'
    )
    assert len(said(run_with(toml))) == 5


def test_what_comes_from_a_grade_is_no_assumption(run_with: Callable[[str], Path]) -> None:
    """The three figures stand in the table, so they count as given."""
    run = read_run(run_with('[loss]\nconnector_grade = "grade D"'))
    assert {"loss.connector_mean_db", "loss.connector_limit_db"} <= run.given
    assert run.practice.loss.connector_sigma_db == 0.266


def test_names_of_the_tables_are_those_a_run_file_may_use() -> None:
    """Grades, parts and attenuators come from the tables in their order."""
    assert list(connector_grades())[:2] == ["grade A", "grade B"]
    assert "wdm 1310/1550" in optical_parts()
    assert list(attenuator_steps_db()) == sorted(attenuator_steps_db())
