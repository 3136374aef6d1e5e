"""The drawn card of a closure: every fibre once, nothing over the edge, names stay text."""

from __future__ import annotations

import re
from html import unescape
from xml.etree import ElementTree as ET

import pytest

from routeplan.planning import plan
from routeplan.sheets.card_parts import fitted_text, letters_em, patch
from routeplan.sheets.card_svg import card_svg
from routeplan.sheets.document import plan_document
from tests.drawn_runs import lonlat, make_line, make_place, make_run
from tests.sheets.made_up_run import HOSTILE_NAMES, Row

SVG = "{http://www.w3.org/2000/svg}"


def pages_of(text: str) -> list[ET.Element]:
    """Return the drawings of a card, read by a parser that knows nothing of ours."""
    return list(ET.fromstring(f"<cards>{text}</cards>"))


def shown(element: ET.Element) -> list[str]:
    """Return the texts of a drawing in the order they stand there."""
    return [text.text or "" for text in element.iter(f"{SVG}text")]


@pytest.fixture(scope="module")
def thick() -> Row:
    """Return the document of 13 km of a cable of 288 fibres, marked on the jacket."""
    line = make_line(lonlat((0, 0), (0, 13000)), "duct", leg="a")
    places = [
        make_place("site", lonlat((0, at))[0], name) for at, name in ((0, "West"), (13000, "East"))
    ]
    toml = (
        "[cable]\nfibre_count = 288\n"
        '[[circuit]]\nname = "Programme"\nfrom = "West"\nto = "East"\n'
        '[[mark]]\nreel = "R1"\nstart_m = 1200\n'
    )
    return plan_document(plan(make_run([line], places, toml=toml)))


def test_every_fibre_of_a_thick_cable_stands_once_on_its_pages(thick: Row) -> None:
    """288 fibres take several pages of two columns; each position of each tray is there once."""
    pages = pages_of(card_svg(thick, "J1"))
    assert 2 <= len(pages) <= 4
    groups = [group for page in pages for group in page.iter(f"{SVG}g")]
    lines = [shown(group) for group in groups]
    assert [line[1] for line in lines] == [f"S1 {fibre}" for fibre in range(1, 289)]
    assert [line[4] for line in lines] == [f"S2 {fibre}" for fibre in range(1, 289)]
    heads = [text for page in pages for text in shown(page) if text.startswith("Tray ")]
    assert len([head for head in heads if "continued" not in head]) == 24
    assert "Tray 13, tube blue with black tracer" in heads


def test_nothing_stands_outside_its_page(thick: Row, document: Row) -> None:
    """All that is drawn lies on the drawing, and a drawing on what A4 leaves within margins."""
    for page in [*pages_of(card_svg(thick, "J1")), *pages_of(card_svg(document, "J1"))]:
        _, _, width_mm, height_mm = map(float, page.attrib["viewBox"].split())
        assert width_mm == 184
        assert height_mm <= 252
        for element in [*page.iter(f"{SVG}text"), *page.iter(f"{SVG}rect")]:
            assert 0 <= float(element.attrib["x"]) <= width_mm
            assert 0 <= float(element.attrib["y"]) <= height_mm
        for rect in page.iter(f"{SVG}rect"):
            assert float(rect.attrib["x"]) + float(rect.attrib["width"]) <= width_mm + 0.01


def test_few_fibres_fit_a_sheet_of_a5(document: Row) -> None:
    """24 fibres are one drawing that keeps within A5 when its width does."""
    (page,) = pages_of(card_svg(document, "J2"))
    assert float(page.attrib["viewBox"].split()[3]) * 148 / 184 <= 210


def test_a_card_says_where_and_what(thick: Row) -> None:
    """Place, way there, position, cable ends with jacket metres and printed marks, circuits."""
    texts = " ".join(" ".join(shown(pages_of(card_svg(thick, "J1"))[0])).split())
    joint, section = thick["joints"][0], thick["sections"][0]
    assert f"{joint['lat']:.6f}, {joint['lon']:.6f}" in texts
    assert "along the way from West" in texts
    assert "place assumed: confirm on site before ordering" in texts
    at, mark = (
        f"{m:,.1f} m".replace(",", " ") for m in (section["sheath_m"], 1200 + section["sheath_m"])
    )
    assert f"S1 from West, reel R1: its end, at {at} of its jacket, marked {mark}" in texts
    assert "Circuits Programme" in texts


def test_a_tray_of_several_tubes_names_them_at_each_fibre(document: Row) -> None:
    """Where the head cannot speak for all, both words stand at the fibre; another is crossed."""
    document["splices"][1]["in"]["tube_colour"] = "red"
    page = pages_of(card_svg(document, "J1"))[0]
    lines = [shown(group) for group in page.iter(f"{SVG}g")]
    assert lines[1][1:6] == [
        "S1 2", "red / orange", "\N{MULTIPLICATION SIGN}", "S2 2", "blue / orange",
    ]  # fmt: skip
    assert lines[0][2] == "blue / blue"
    assert lines[12][2] == "blue"


def test_fibres_that_pass_are_one_line_for_each_tube(document: Row) -> None:
    """Uncut fibres take no line each, but none is left unsaid."""
    for row in document["splices"][2:24]:
        row |= {"kind": "express", "tray": 0, "out": row["in"]}
    page = pages_of(card_svg(document, "J1"))[0]
    assert len(list(page.iter(f"{SVG}g"))) == 2
    dash = "\N{EN DASH}"
    assert f"S1 tube blue: fibres 3{dash}12 pass uncut" in shown(page)
    assert f"S1 tube orange: fibres 13{dash}24 pass uncut" in shown(page)


def test_names_stay_text(document: Row) -> None:
    """Whatever a place, a circuit or a run is called, it is read as that and adds no element."""
    plain_tags = [element.tag for element in pages_of(card_svg(document, "J1"))[0].iter()]
    for name in HOSTILE_NAMES:
        document["title"] = document["joints"][0]["reach_name"] = name
        document["splices"][0]["circuit"] = name
        text = card_svg(document, "J1")
        page = pages_of(text)[0]
        assert [element.tag for element in page.iter()] == plain_tags
        assert shown(page).count(name) >= 2
        assert name not in text
        assert name in unescape(text)


def test_a_joint_that_is_not_there_has_no_card(document: Row) -> None:
    """Nothing is drawn for a name nobody has."""
    assert card_svg(document, "J99") == ""


def test_texts_are_pressed_then_cut() -> None:
    """A text a little too long is pressed to its width, one far too long ends in a mark."""
    text = "n" * 20
    width_mm = 2.0 * letters_em(text)
    assert "textLength" not in fitted_text(0, 0, text, width_mm, size_mm=2.0)
    pressed = fitted_text(0, 0, text, width_mm * 0.9, size_mm=2.0)
    assert f'textLength="{width_mm * 0.9:.2f}"' in pressed
    assert text in pressed
    cut = fitted_text(0, 0, text, width_mm * 0.5, size_mm=2.0)
    assert re.search("n{5,13}\N{HORIZONTAL ELLIPSIS}<", cut)


def test_a_mark_is_a_stripe_and_an_unknown_colour_is_empty() -> None:
    """The patch of a marked colour has two fills, that of a counted fibre none."""
    assert patch("blue with black tracer", 0, 0).count("<rect") == 2
    assert patch("blue", 0, 0).count("<rect") == 1
    assert 'fill="none"' in patch("numbered 25", 0, 0)
