"""The report shows every figure of the document, and text from files stays text."""

from __future__ import annotations

import re
from html import unescape

import pytest

from routeplan.sheets.joint_words import runs_of_splices
from routeplan.sheets.report import report_html
from routeplan.sheets.report_parts import swatch
from tests.sheets.made_up_run import HOSTILE_NAMES, Row

DASH = "\N{EN DASH}"


def _text(html: str) -> str:
    """Return what a reader sees, in one line, with plain spaces."""
    body = html.partition("<body>")[2]
    spaced = re.sub(r"<[^>]*>", " ", body)
    return re.sub(r"[\s\xa0\u202f]+", " ", unescape(spaced))


def _section(html: str, name: str) -> str:
    found = re.search(rf'<section id="{name}">(.*?)</section>', html, re.DOTALL)
    return found[1] if found else ""


def _rows(part: str) -> list[str]:
    """Return the body rows of all tables of a part, as a reader sees them."""
    bodies = "".join(re.findall(r"<tbody>(.*?)</tbody>", part, re.DOTALL))
    rows = re.findall(r"<tr>(.*?)</tr>", bodies, re.DOTALL)
    return [_text(f"<body>{row}").strip() for row in rows]


def _fibres(part: str) -> list[str]:
    """Return the lines of all fibres of the cards, as a reader sees them."""
    found = re.findall(r'<g class="fibre">(.*?)</g>', part, re.DOTALL)
    return [_text(f"<body>{line}").strip() for line in found]


def test_every_fibre_of_every_closure_has_a_line(document: Row) -> None:
    """24 fibres in 3 closures are 72 lines: colours in words, the tube's at the tray's head."""
    html = report_html(document)
    schedule = _section(html, "schedule")
    assert len(_fibres(schedule)) == len(document["splices"]) == 72
    assert schedule.count('class="closure"') == schedule.count("<svg") == 3
    assert _fibres(schedule)[13] == "2 S1 14 orange \N{RIGHTWARDS ARROW} S2 14 orange spare"
    assert _text(f"<body>{schedule}").count("Tray 2, tube orange") == 3


def test_closures_carry_what_a_crew_needs_on_the_lid(document: Row) -> None:
    """Place, way there, coordinates as a navigator takes them, cable ends and the title."""
    text = _text(_section("<body>" + report_html(document), "schedule").join(["<body>", ""]))
    joint = document["joints"][0]
    assert f"{joint['lat']:.6f}, {joint['lon']:.6f}" in text
    assert "5 000.0 m along the way from Ostrel House" in text
    assert "S1 from Ostrel House, reel R1: its end, at 5 145.0 m of its jacket" in text
    assert "place assumed: confirm on site before ordering" in text
    assert document["title"] in text


def test_runs_name_what_is_straight_crossed_and_stored() -> None:
    """Neighbouring fibres treated alike are one run; a crossing, a store and a gap break it."""

    def row(fibre: int, out: int | None, kind: str = "splice") -> Row:
        return {"kind": kind, "in": {"fibre": fibre}, "out": out and {"fibre": out}}

    rows = [row(1, 1), row(2, 2), row(3, 4), row(4, 3), row(6, 6), row(7, None, "stored"),
            row(8, 8, "express")]  # fmt: skip
    assert runs_of_splices(rows) == [
        f"fibres 1{DASH}2 straight through",
        f"fibres 3{DASH}4 crossed: see rows",
        "fibre 6 straight through",
        "fibre 7 stored",
        "fibre 8 pass uncut",
    ]


def test_a_colour_that_differs_is_not_straight_through() -> None:
    """The same number in another colour code is marked as crossed."""
    ends = {"in": {"fibre": 3, "fibre_colour": "green"}, "out": {"fibre": 3, "fibre_colour": "red"}}
    assert runs_of_splices([{"kind": "splice", **ends}]) == ["fibre 3 crossed: see rows"]


def test_a_stored_fibre_has_an_empty_far_side(document: Row) -> None:
    """With nothing to splice to, the row is still there and says stored."""
    document["splices"][0] |= {"out": None, "kind": "stored"}
    line = _fibres(_section(report_html(document), "schedule"))[0]
    assert line == "1 S1 1 blue \N{DOWNWARDS ARROW} stored Programme"


def test_marked_colours_show_their_mark() -> None:
    """A tracer is a stripe in the patch, and the words stand beside it."""
    assert "linear-gradient(#1c63b7" in swatch("blue with black tracer")
    assert "blue with black tracer" in swatch("blue with black tracer")
    assert "background:transparent" in swatch("number 37")


def test_every_budget_line_is_shown_with_its_source(document: Row) -> None:
    """Every contribution at every wavelength, its totals and where it comes from."""
    light = _section(report_html(document), "light")
    lines = [row for row in _rows(light) if row.startswith("connector pairs")]
    assert (
        lines
        == ["connector pairs 2 0.250 0.130 0.500 0.500 1.000 loss.connector_pairs, default"] * 4
    )
    for figure in ("7.732", "8.342", "9.412", "15.000", "2.588", "3.658", "1.200"):
        assert figure in light


def test_directions_that_differ_are_shown_apart(document: Row) -> None:
    """One line of one direction changed gives a table of its own."""
    before = report_html(document).count('<div class="keep"><h4>')
    document["circuits"][0]["budgets"][1]["lines"][0]["each_db"] = 7.1
    html = report_html(document)
    assert html.count('<div class="keep"><h4>') == before + 1
    assert "1310 nm, Quenmoor → Ostrel House" in html


def test_what_is_not_known_is_a_dash_and_unknown(document: Row) -> None:
    """Null is shown as a dash; its verdict is unknown and gives its reason."""
    light = _text("<body>" + _section(report_html(document), "light"))
    assert f"Available, dB {DASH} {DASH} {DASH} {DASH}" in light
    assert "no interface was named" in light


def test_checks_that_fail_stand_first(document: Row) -> None:
    """Fails, then unknown, then fits, with values and limits in their unit."""
    rows = _rows(_section(report_html(document), "checks"))
    assert [row.split()[1] for row in rows] == ["fails", "unknown", "fits"]
    assert "61.200 m 60.000 m" in rows[0]


def test_assumptions_warnings_and_cautions_are_all_there(document: Row) -> None:
    """Nothing is dropped: name, value, source and reason of each."""
    html = report_html(document)
    assert len(_rows(_section(html, "assumptions"))) == len(document["assumptions"])
    assert "250 m house rule no reach point was declared there" in _text(html)
    assert "slope adds 1.4 % to the length" in _section(html, "warnings")
    assert "Never look into a fibre end." in _section(html, "cautions")


def test_the_bill_adds_up_and_marks_invented_prices(document: Row) -> None:
    """The sum is that of the rows; default prices are called invented wherever a cost stands."""
    html = report_html(document)
    assert "30 150.00" in _text(_section(html, "bill").join(["<body>", ""]))
    assert html.count("Some prices here are invented") == 2
    document["assumptions"] = []
    assert "invented" not in report_html(document)


def test_us_units_show_feet_beside_metres(document: Row) -> None:
    """5 145 m are 16 879.9 ft; the metric report shows none."""
    assert "ft)" not in report_html(document)
    document["units"] = "us"
    text = _text(report_html(document))
    assert "5 145.000 (16 879.9)" in text
    assert "20 000.0 m (65 617 ft)" in text


def test_values_of_any_kind_are_readable(document: Row) -> None:
    """An assumption may be a table, a list, a switch or a word."""
    values = {"a": {"aerial": 600.0}, "b": [2000, 4000], "c": True, "d": "worst", "e": {}}
    document["assumptions"] = [{"name": name, "value": value} for name, value in values.items()]
    rows = _rows(_section(report_html(document), "assumptions"))
    shown = [row.split(DASH)[0].strip() for row in rows]
    assert shown == ["a aerial 600.0", "b 2000, 4000", "c yes", "d worst", "e none"]


def test_hostile_names_stay_text(hostile_document: Row) -> None:
    """No element is added, whatever a site, a leg or the run is called; the names can be read."""
    html = report_html(hostile_document)
    assert not re.search(r"<(?:script|img)\b", html)
    assert HOSTILE_NAMES[0] in _text(html)
    assert HOSTILE_NAMES[2] in _text(html)


def test_the_page_fetches_nothing_and_runs_nothing(document: Row) -> None:
    """No script, no address, and a policy that would allow none."""
    html = report_html(document)
    assert not re.search(r"<(?:script|link|iframe|object|embed|img|base)\b", html)
    assert "script-src" not in html
    assert "default-src 'none'" in html
    assert "url(" not in html


def test_a_layout_that_is_not_proven_says_what_it_is_known_to_be(document: Row) -> None:
    """The bound and what stopped the search stand beside the cost."""
    document["layout"] = {"optimal": False, "cost": 10.0, "lower_bound": 9.0, "stopped_by": "work"}
    text = _text(report_html(document))
    assert "none can cost less than EUR 9.00. The search was stopped by work." in text


@pytest.mark.parametrize("leave_out", ["circuits", "splices", "joints", "bill", "assumptions"])
def test_what_a_run_lacks_is_left_out(document: Row, leave_out: str) -> None:
    """A run without it still gives a report."""
    document[leave_out] = []
    assert report_html(document).endswith("</html>\n")


def test_the_same_document_gives_the_same_bytes(document: Row) -> None:
    """Nothing but the document decides."""
    assert report_html(document) == report_html(document)


def test_codes_and_ways_of_buying_do_not_break(document: Row) -> None:
    """A CRS code breaks nowhere, and the hyphen of put-up is no place to break."""
    document["legs"][0]["grid_crs"] = "EPSG:32632"
    document["reels"][0]["source"] = "put-up"
    html = report_html(document)
    assert "<td>EPSG:32632</td>" in html
    assert '<span class="whole">put-up</span>' in html
