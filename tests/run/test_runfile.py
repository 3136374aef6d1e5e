"""Run files: every problem at once, each with its key, value, limit and remedy."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from routeplan.errors import InputError, RunFileError
from routeplan.run import read_run

OWN = "[interface.own]\n"
CIRCUIT = '[[circuit]]\nname = "P"\nfrom = "A"\nto = "B"\n'


@pytest.mark.parametrize(
    ("toml", "message"),
    [
        ('titel = "x"', 'run.toml, titel: is not a known key. Did you mean "title"?'),
        ("[slak]", 'run.toml, slak: is not a known key. Did you mean "slack"?'),
        (
            "[slack]\njont_tail_m = 1.0",
            'run.toml, slack.jont_tail_m: is not a known key. Did you mean "joint_tail_m"?',
        ),
        (
            "[slack]\nsplice_mean_db = 0.1",
            "run.toml, slack.splice_mean_db: is not a known key. It belongs in [loss].",
        ),
        (
            '[slack]\nplacement = "duct"',
            "run.toml, slack.placement: is not a known key. "
            "It belongs at the top of the file, before the first [section].",
        ),
        (
            "fibre_count = 12",
            "run.toml, fibre_count: is not a known key. It belongs in [cable].",
        ),
        (
            "[slack]\nsplice_mean = 0.1",
            "run.toml, slack.splice_mean: is not a known key. "
            'Did you mean "splice_mean_db" in [loss]?',
        ),
        (
            "[joints]\nzzz = 1",
            "run.toml, joints.zzz: is not a known key "
            "(one of assumed_spacing_m, max_count, max_section_m, fibres_per_tray, keep_off_m, "
            "cost_factor_by_kind, closure_splices_max, closure_ports).",
        ),
        (
            '[slack]\nentry_m = "20"',
            'run.toml, slack.entry_m: is not a number ("20"). Write the number without quotes.',
        ),
        (
            '[slack]\nentry_m = "20 m"',
            'run.toml, slack.entry_m: is not a number ("20 m"). '
            "Write the number alone, without unit or quotes.",
        ),
        (
            "[slack]\nentry_m = true",
            "run.toml, slack.entry_m: is not a number (true).",
        ),
        (
            "[slack]\nentry_m = -1",
            "run.toml, slack.entry_m: is too small (-1, limit at least 0 m).",
        ),
        (
            "[slack]\nordering_ratio = 2.0",
            "run.toml, slack.ordering_ratio: is too large (2.0, limit at most 0.5).",
        ),
        (
            "[slack]\nentry_m = inf",
            "run.toml, slack.entry_m: is not a finite number (Infinity).",
        ),
        ("[slack]\nentry_m = nan", "run.toml, slack.entry_m: is not a finite number (NaN)."),
        (
            "[cable]\nfibre_count = 24.0",
            "run.toml, cable.fibre_count: is not a whole number (24.0). Write 24.",
        ),
        (
            'purpose = "links"',
            'run.toml, purpose: is not one of the values it can take ("links", one of link, '
            'venue). Did you mean "link"?',
        ),
        (
            "[slack]\nloop_every_m = { areal = 600 }",
            "run.toml, slack.loop_every_m.areal: is not a placement that can be given here. "
            'Did you mean "aerial"?',
        ),
        ("slack = 5", "run.toml, slack: is not a table (5)."),
        (
            "[reels]\nput_ups_m = 2000",
            "run.toml, reels.put_ups_m: is not a list (2000). Put it in square brackets.",
        ),
        ("[reels]\nput_ups_m = []", "run.toml, reels.put_ups_m: is empty ([])."),
        (
            "[reels]\nput_ups_m = [2000, -4000]",
            "run.toml, reels.put_ups_m, item 2: is too small (-4000, limit more than 0 m).",
        ),
        (
            "[reels]\nput_ups_m = [2000, 2000]",
            "run.toml, reels.put_ups_m: holds a value twice ([2000, 2000]).",
        ),
        (
            "[cable]\nmeasured = [ { wavelength_nm = 1310 } ]",
            "run.toml, cable.measured, item 1, attenuation_db_per_km: is missing.",
        ),
        (
            "[cable]\nmeasured = [ { wavelength = 1310, attenuation_db_per_km = 0.3, "
            "wavelength_nm = 1310 } ]",
            "run.toml, cable.measured, item 1, wavelength: is not a known key. "
            'Did you mean "wavelength_nm"?',
        ),
        (
            f"{CIRCUIT}fibre_count = 3",
            'run.toml, circuit "P", fibre_count: is not one of the values it can take '
            "(3, one of 1, 2).",
        ),
        (
            f"{CIRCUIT}wavelengths_nm = [850]",
            'run.toml, circuit "P", wavelengths_nm, item 1: is too small '
            "(850, limit at least 1260 nm).",
        ),
        (
            "[[circuit]]\nwavelength_nm = 1310",
            'run.toml, circuit "Circuit 1", wavelength_nm: is not a known key. '
            'Did you mean "wavelengths_nm"?',
        ),
        (
            '[[circuit]]\nform = "A"',
            'run.toml, circuit "Circuit 1", form: is not a known key. Did you mean "from"?',
        ),
        (
            'title = "a\\u0000b"',
            "run.toml, title: holds characters that cannot be printed.",
        ),
        ("title = ''", 'run.toml, title: is empty ("").'),
        (
            '[[circuit]]\nname = "P"\nleads = { "" = "crossed" }',
            'run.toml, circuit "P", leads, : is empty ("").',
        ),
    ],
)
def test_a_wrong_key_or_value_is_named_with_its_remedy(
    toml: str, message: str, run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """A message says where, what, the value, the limit and the remedy, and nothing else."""
    assert said(run_with(toml)) == [message]


@pytest.mark.parametrize(
    ("toml", "message"),
    [
        (
            '[reels]\nbuy = ["put-ups", "stock"]',
            'run.toml, reels.buy: is not yet available in this version ("stock"). '
            "Buy to length or in put-ups.",
        ),
        (
            '[reels]\nstock = [ { name = "D-17", length_m = 3250 } ]',
            "run.toml, reels.stock: is not yet available in this version "
            '([{"name": "D-17", "length_m": 3250}]). Take the key out and buy to length or in '
            "put-ups.",
        ),
    ],
)
def test_what_is_not_yet_built_is_refused(
    toml: str, message: str, run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """A key of a capability to come is refused rather than ignored."""
    assert said(run_with(toml)) == [message]


@pytest.mark.parametrize(
    ("toml", "part"),
    [
        (f"{CIRCUIT}{CIRCUIT}", 'circuit "P": stands 2 times'),
        (
            '[[circuit]]\nfrom = "A"\nto = "A"',
            'circuit "Circuit 1": ends where it starts ("A"). Name two',
        ),
        ('[[circuit]]\nfrom = "A"', 'circuit "Circuit 1": names one of its ends only ("A")'),
        (
            f'{CIRCUIT}interface = "10GBASE-EX"',
            'interface: is not a known interface ("10GBASE-EX"). Did you mean "10GBASE',
        ),
        (
            f'{CIRCUIT}interface = "10GBASE-ER"\nwavelengths_nm = [1310, 1550]',
            "lies outside the band of its interface (1310 nm, limit 1530 to 1565 nm",
        ),
        (
            f"{OWN}wavelength_nm = 1310\nchannel_loss_db = 5.0\n"
            f'{CIRCUIT}interface = "own"\nwavelengths_nm = [1550]',
            '(1550 nm, limit 1310 to 1310 nm for "own")',
        ),
        (
            f"{OWN}channel_loss_db = 5.0\nwavelength_max_nm = 1310",
            "interface.own: does not say its light in one way",
        ),
        (
            f"{OWN}channel_loss_db = 5.0\nwavelength_nm = 1310\nwavelength_min_nm = 1300",
            "interface.own: does not say its light in one way",
        ),
        (
            f"{OWN}channel_loss_db = 5.0\nwavelength_min_nm = 1320\nwavelength_max_nm = 1310",
            "interface.own.wavelength_min_nm: is not below wavelength_max_nm (1320 nm",
        ),
        (f"{OWN}wavelength_nm = 1310", "interface.own: does not say what may be lost"),
        (
            f"{OWN}wavelength_nm = 1310\ntx_min_dbm = -8",
            "interface.own: does not say what may be lost",
        ),
        (
            f"{OWN}wavelength_nm = 1310\ntx_min_dbm = -8\nrx_sensitivity_dbm = -20\n"
            "channel_loss_db = 5",
            "interface.own: gives both channel_loss_db and rx_sensitivity_dbm",
        ),
        (
            f"{OWN}wavelength_nm = 1310\ntx_min_dbm = 0\ntx_max_dbm = -3\nrx_sensitivity_dbm = -20",
            "interface.own.tx_min_dbm: is not below tx_max_dbm (0 dBm, limit tx_max_dbm is -3 dBm)",
        ),
        (
            f"{OWN}wavelength_nm = 1310\ntx_min_dbm = 0\nrx_sensitivity_dbm = -3\n"
            "rx_overload_dbm = -3",
            "interface.own.rx_sensitivity_dbm: is not below rx_overload_dbm",
        ),
        ("[loss]\nsplice_mean_db = 0.2", "loss.splice_limit_db: is below the mean (0.1 dB"),
        ("[loss]\nconnector_limit_db = 0.2", "loss.connector_limit_db: is below the mean (0.2 dB"),
        (
            "[slack]\nloop_every_m = { buried = 500 }",
            "slack.loop_every_m.buried: asks for loops whose length is not given. "
            "Add buried to slack.loop_m.",
        ),
        (
            '[cable]\nfibre_type = "G.652"',
            'cable.fibre_type: is not a known fibre type ("G.652"',
        ),
        (
            '[cable]\ncolour_code = "TIA-599"',
            'cable.colour_code: is not a known colour code ("TIA-599")',
        ),
        ('[cable]\nlegs = ["a"]', "cable.legs: is not for the default cable"),
        (
            "[cable]\nmeasured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.3 }, "
            "{ wavelength_nm = 1310, attenuation_db_per_km = 0.4 } ]",
            "cable.measured: gives a wavelength more than once (1310 nm)",
        ),
        (
            '[cables.a]\nlegs = ["x", "y", "x"]',
            'cables.a.legs: names a leg 2 times ("x")',
        ),
        ('crs = "EPSG:0"', 'run.toml, crs: is not a known CRS ("EPSG:0")'),
        ('crs = "EPSG:4978"', "run.toml, crs: is geocentric"),
        ('crs = "EPSG:5703"', "run.toml, crs: is a vertical system"),
    ],
)
def test_values_that_contradict_each_other_are_named(
    toml: str, part: str, run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Checks that take more than one value find what no single value shows."""
    (message,) = said(run_with(toml))
    assert part in message


@pytest.mark.parametrize("name", ["OM3", "OM5", "A1-OM4", "50/125", "62.5/125", "G.651.1"])
def test_multimode_fibre_has_its_own_message(
    name: str, run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Multimode and singlemode must never be mixed: the message says that, not "unknown"."""
    (message,) = said(run_with(f'[cable]\nfibre_type = "{name}"'))
    assert "multimode fibre, which does not mix with the singlemode fibre" in message
    assert "G.652.D" in message


def test_all_problems_are_shown_together(
    run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Wrong keys, values, names and geometry come in one message, not one an attempt."""
    messages = said(
        run_with(
            'purpse = "link"\nterrain = 5\ncrs = "EPSG:0"\n'
            '[slack]\nentry_m = "x"\n[cable]\nfibre_type = "OM3"\nfibre_cont = 12\n'
            f"{CIRCUIT}{CIRCUIT}"
        )
    )
    parts = ["terrain", "slack.entry_m", "cable.fibre_cont", "purpse", "multimode", "2 times"]
    for part in [*parts, "known CRS"]:
        assert sum(part in message for message in messages) == 1, part
    assert len(messages) == 7


def test_an_error_of_the_default_cable_is_shown_once(
    run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Named cables take over the default cable's values, but not its messages."""
    assert len(said(run_with("[cable]\nfibre_count = 0\n[cables.a]\n[cables.b]\n"))) == 1
    assert len(said(run_with('[cable]\nfibre_type = "OM3"\n[cables.a]\n[cables.b]\n'))) == 1


def test_named_cables_and_interfaces_come_with_the_run(run_with: Callable[[str], Path]) -> None:
    """Named cables stand over the default cable; own interfaces over the default penalty."""
    run = read_run(
        run_with(
            '[cable]\nfibre_count = 48\n[cables.spur]\nlegs = ["Spur"]\nfibre_type = "G.657.A1"\n'
            f"{OWN}wavelength_min_nm = 1260\nwavelength_max_nm = 1360\nchannel_loss_db = 6.0\n"
            f'{CIRCUIT}interface = "own"\n'
        )
    )
    assert run.cables["spur"].fibre_count == 48
    assert run.cables["spur"].fibre_type == "G.657.A1"
    assert run.cables["spur"].legs == ("Spur",)
    assert run.interfaces["own"].band_nm == (1260.0, 1360.0)
    assert run.circuits[0].wavelengths_nm == (1310.0,)
    assert "cables.spur.legs" in run.given


def test_a_circuit_takes_its_light_from_its_interface(run_with: Callable[[str], Path]) -> None:
    """A circuit that names no wavelength uses that of its interface, not 1310 and 1550."""
    run = read_run(run_with(f'{CIRCUIT}interface = "10GBASE-ER"\n'))
    assert run.circuits[0].wavelengths_nm == (1550.0,)


def test_a_penalty_beside_a_channel_loss_is_warned_of(run_with: Callable[[str], Path]) -> None:
    """A channel insertion loss has the penalty inside it; a value not used must not go unsaid."""
    run = read_run(
        run_with(f"{OWN}wavelength_nm = 1310\nchannel_loss_db = 6.0\npenalty_db = 1.0\n")
    )
    ((where, message),) = run.warnings
    assert where == "run.toml, interface.own.penalty_db"
    assert "is not used" in message


@pytest.mark.parametrize(
    ("content", "part"),
    [
        (b"title = 'a\xff'", "run.toml: is not UTF-8 text (byte 10 in line 1 is 0xff)"),
        (b"\xff\xfet\x00", "run.toml: is not UTF-8 text (byte 0 in line 1 is 0xff)"),
        (b"title = ", "run.toml: is not TOML (Invalid value (at end of document))"),
        (b"a = 1\na = 2", "run.toml: is not TOML (Cannot overwrite a value (at end of document)"),
        (b"a = " + b"[" * 5000, "run.toml: is nested too deeply"),
        (b"a = 1" + b"0" * 5000, "run.toml: holds a number with too many digits"),
        (b"", "run.toml: is empty"),
    ],
)
def test_a_file_that_is_not_toml_is_named(
    content: bytes,
    part: str,
    write: Callable[..., Path],
    said: Callable[[Path], list[str]],
) -> None:
    """Broken files are told by line and column, or by the byte that is wrong."""
    (message,) = said(write("run.toml", content))
    assert part in message


def test_a_byte_order_mark_is_accepted(write: Callable[..., Path], run_with: object) -> None:
    """Editors that put a mark before UTF-8 are no reason to refuse a file."""
    path = run_with('title = "Hill"')  # type: ignore[operator]
    write("run.toml", b"\xef\xbb\xbf" + path.read_bytes())
    assert read_run(path).title == "Hill"


def test_a_huge_number_does_not_break_its_own_message(
    run_with: Callable[[str], Path], said: Callable[[Path], list[str]]
) -> None:
    """Numbers too long to print are described."""
    (message,) = said(run_with("[cable]\nfibre_count = 0x" + "f" * 5000))
    assert "a whole number of 20000 bits" in message


def test_problems_of_one_kind_come_as_that_kind_of_error(run_with: Callable[[str], Path]) -> None:
    """Callers can tell a wrong run file from wrong geometry."""
    with pytest.raises(RunFileError):
        read_run(run_with("[slak]"))
    with pytest.raises(InputError) as caught:
        read_run(run_with('crs = "EPSG:0"\n[slak]'))
    assert type(caught.value) is InputError
