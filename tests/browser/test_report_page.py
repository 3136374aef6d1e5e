"""The report page in a real browser with no network, on screen and in print."""

from __future__ import annotations

from typing import Any

from routeplan.sheets.report import report_html
from tests.sheets.made_up_run import HOSTILE_NAMES, Row

STYLE = "([query, name]) => getComputedStyle(document.querySelector(query))[name]"


def test_the_report_opens_offline_with_empty_logs(open_html: Any, document: Row) -> None:
    """Title, chart and all closures are there; the fixture sees that nothing was logged."""
    page = open_html(report_html(document)).page
    assert page.locator("h1").inner_text() == document["title"]
    assert page.locator("svg.profile").bounding_box()["height"] > 150
    assert page.locator(".closure").count() == len(document["joints"])


def test_hostile_names_stay_text(open_html: Any, hostile_document: Row) -> None:
    """No dialog, no new element; the names can be read."""
    page = open_html(report_html(hostile_document)).page
    assert page.evaluate("document.querySelectorAll('img, script, iframe').length") == 0
    body = page.locator("body").inner_text()
    assert all(name in body for name in HOSTILE_NAMES)


def test_each_closure_starts_a_page_in_print(open_html: Any, document: Row) -> None:
    """A card can be taped to the lid of its closure; long tables repeat their heads."""
    page = open_html(report_html(document)).page
    page.emulate_media(media="print")
    assert page.evaluate(STYLE, [".closure:nth-of-type(2)", "breakBefore"]) == "page"
    assert page.evaluate(STYLE, ["thead", "display"]) == "table-header-group"
    assert page.evaluate(STYLE, ["h2", "breakAfter"]) == "avoid"
    assert page.evaluate(STYLE, ["nav", "display"]) == "none"


def test_nothing_is_wider_than_the_page(open_html: Any, document: Row) -> None:
    """On a phone wide tables scroll inside the page, and on paper all columns fit on it."""
    page = open_html(report_html(document), width=390, height=844).page
    assert page.evaluate("document.documentElement.scrollWidth") == 390
    paper = open_html(report_html(document), width=695, height=980).page
    paper.emulate_media(media="print")
    widest = paper.evaluate(
        "Math.max(...[...document.querySelectorAll('table')].map((t) => t.scrollWidth))"
    )
    assert widest <= 695


def test_no_text_of_a_card_runs_over_its_edge(open_html: Any, document: Row) -> None:
    """As the browser sets them, all texts of every card end on its paper."""
    page = open_html(report_html(document)).page
    over = page.evaluate(
        "[...document.querySelectorAll('.card')].flatMap((card) => {"
        "const edge = card.getBoundingClientRect();"
        "return [...card.querySelectorAll('text')].filter((text) => {"
        "const own = text.getBoundingClientRect();"
        "return own.right > edge.right + 0.5 || own.left < edge.left - 0.5"
        "|| own.bottom > edge.bottom + 0.5}).map((text) => text.textContent)})"
    )
    assert over == []
