"""The splice schedule of the report: the card of one closure after another."""

from __future__ import annotations

from routeplan.sheets.card_svg import card_pages, card_sources
from routeplan.sheets.lookup import Row, rows_at, text_at
from routeplan.sheets.text import safe

__all__ = ["closures_html"]


def closures_html(document: Row) -> str:
    """Return the cards of all closures; in print each page of a card is a page."""
    sources = card_sources(document)
    return "".join(
        f'<article class="closure" id="closure-{safe(text_at(joint, "name"))}">\n'
        f"{''.join(card_pages(sources, joint))}</article>\n"
        for joint in rows_at(document, "joints")
    )
