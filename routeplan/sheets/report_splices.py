"""The splice schedule of the report: the card of one closure after another."""

from __future__ import annotations

from routeplan.sheets.card_svg import card_pages, card_sources
from routeplan.sheets.joint_words import closures_of
from routeplan.sheets.lookup import Row, text_at
from routeplan.sheets.text import safe

__all__ = ["closures_html"]


def closures_html(document: Row) -> str:
    """Return the cards of all closures; in print each page of a card is a page."""
    sources = card_sources(document)
    return "".join(
        f'<article class="closure" id="closure-{safe(text_at(joints[0], "name"))}">\n'
        f"{''.join(card_pages(sources, joints))}</article>\n"
        for joints in closures_of(document)
    )
