"""The report: everything of a run on paper, for those who approve it and those who build it."""

from __future__ import annotations

from collections.abc import Mapping
from importlib.resources import files

from routeplan.sheets.lookup import Row, row_at, rows_at, sites_in, text_at, value_at
from routeplan.sheets.profile import profile_svg
from routeplan.sheets.report_ground import crossings_html, steep_html
from routeplan.sheets.report_light import circuits_html, reasons_of
from routeplan.sheets.report_lists import (
    INVENTED,
    assumptions_html,
    bill_html,
    cautions_html,
    checks_html,
    has_invented_prices,
    joints_html,
    legs_html,
    reels_html,
    warnings_html,
)
from routeplan.sheets.report_parts import section, verdict_mark
from routeplan.sheets.report_splices import closures_html
from routeplan.sheets.report_ways import protection_html
from routeplan.sheets.text import count_text, length_text, number_text, safe

__all__ = ["report_html"]

_POLICY = (
    "default-src 'none'; img-src data:; style-src 'unsafe-inline'; base-uri 'none'; "
    "form-action 'none'"
)

_HOW_TO_READ = (
    (
        "Three rulers",
        "Ground metres run along the way. Sheath metres run along the jacket of the cable, with "
        "its undulation, loops, entries and tails. Glass metres run along the fibre inside, "
        "which is longer again. A measuring wheel reads ground, the marks printed on the jacket "
        "read sheath, a reflectometer reads glass.",
    ),
    (
        "Section metres",
        "Sheath metres from the start of a section: what the jacket marks count from the end "
        "that lies nearer to the start of the cable.",
    ),
    (
        "Nominal, statistical, worst",
        "Nominal adds the means. Statistical adds the given number of standard deviations of all "
        "contributions together. Worst adds every limit. Margin is what the interface allows "
        "less that loss and less the margin kept in hand; zero still fits.",
    ),
    (
        "Verdicts",
        "Fits: inside its limit. Fails: outside. Unknown: something needed to judge it was not "
        "given; it is neither a pass nor a failure.",
    ),
    (
        "Assumed",
        "Whatever the run file did not say is listed under Assumptions with where the value "
        "comes from. A joint whose place is assumed must be looked at on site.",
    ),
    (
        "Fibre colours",
        "The patches show tube and fibre with their marks, the words count. On a card an "
        "arrow joins fibres of the same number and colour; a cross marks any other pair.",
    ),
)


def report_html(document: Mapping[str, object]) -> str:
    """
    Return the report of a run as one HTML page that prints well and needs no other file.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.

    Returns
    -------
    report_html
        The page; the same document gives the same text. It holds no script, and its policy
        allows none.
    """
    title = text_at(document, "title") or "Run"
    sections = _sections(document)
    links = "".join(f'<a href="#{name}">{heading}</a>' for name, heading, body in sections if body)
    body = "".join(section(name, heading, text) for name, heading, text in sections)
    style = (files("routeplan.sheets") / "assets" / "report.css").read_text("utf-8")
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{_POLICY}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{safe(title)}: report</title>\n<style>{style}</style>\n</head>\n<body>\n<main>\n"
        f"{_title_block(document, title)}<nav>{links}</nav>\n{body}</main>\n</body>\n</html>\n"
    )


def _sections(document: Row) -> list[tuple[str, str, str]]:
    """Return name, heading and body of every section, in reading order."""
    return [
        ("way", "Along the way", _profiles(document)),
        ("legs", "Legs and stretches", legs_html(document) + steep_html(document)),
        ("crossings", "Crossings", crossings_html(document)),
        ("reels", "Reels and cuts", reels_html(document)),
        ("joints", "Joints", joints_html(document)),
        ("light", "Light", circuits_html(document)),
        ("protection", "Protection", protection_html(document)),
        ("checks", "Checks", checks_html(document)),
        ("bill", "Bill", bill_html(document)),
        ("assumptions", "Assumptions", assumptions_html(document)),
        ("warnings", "Warnings", warnings_html(document)),
        ("cautions", "Cautions", cautions_html(document)),
        ("reading", "How to read this", _how_to_read()),
        ("schedule", "Splice schedule", closures_html(document)),
    ]


def _title_block(document: Row, title: str) -> str:
    purpose = {"link": "Permanent link", "venue": "Temporary run"}.get(
        text_at(document, "purpose"), ""
    )
    sites = " \N{MIDDLE DOT} ".join(text_at(node, "name") for node in sites_in(document)[:8])
    warning = f'<p class="warn">{INVENTED}</p>' if has_invented_prices(document) else ""
    return (
        f'<header><p class="kind">{purpose}</p><h1>{safe(title)}</h1>\n<p>{safe(sites)}</p>\n'
        f"{_verdicts(document)}{_figures(document)}{warning}</header>\n"
    )


def _verdicts(document: Row) -> str:
    lines = []
    for circuit in rows_at(document, "circuits"):
        margins_db = [value_at(row, "margin_db") for row in rows_at(circuit, "budgets")]
        known_db = [margin_db for margin_db in margins_db if margin_db is not None]
        margin = f"Smallest margin {number_text(min(known_db), digits=3)} dB" if known_db else ""
        said = " ".join(f"{part.rstrip('.')}." for part in (margin, *reasons_of(circuit)) if part)
        lines.append(
            f"<div><dt>{safe(text_at(circuit, 'name'))}</dt>"
            f"<dd>{verdict_mark(text_at(circuit, 'verdict'))} {safe(said)}</dd></div>"
        )
    failed = sum(text_at(row, "verdict") == "fails" for row in rows_at(document, "checks"))
    if failed:
        lines.append(
            f"<div><dt>Checks</dt><dd>{verdict_mark('fails')} "
            f'<a href="#checks">{safe(count_text(failed, "check"))} outside limits</a></dd></div>'
        )
    return f'<dl class="verdicts">{"".join(lines)}</dl>\n' if lines else ""


def _figures(document: Row) -> str:
    """Return the key figures, each with what it is made of below it."""
    totals, units = row_at(document, "totals"), text_at(document, "units")
    currency = text_at(document, "currency")

    def length(key: str) -> str:
        return length_text(value_at(totals, key), units=units)

    def count(key: str, noun: str) -> str:
        return count_text(value_at(totals, key) or 0, noun)

    stock = f"{length('stock_m')} from stock" if value_at(totals, "stock_m") else ""
    made_of = {
        "Ground": "along the way",
        "Sheath": f"{count('section_count', 'section')}, with loops and tails",
        "Glass": "along the fibre",
        "To order": "; ".join(part for part in (count("reel_count", "reel"), stock) if part),
        "Joints": f"{count('splice_count', 'splice')} in {count('closure_count', 'closure')}, "
        f"{count('pigtail_splice_count', 'pigtail splice')}",
        "Cost": "invented prices" if has_invented_prices(document) else "",
    }
    figures = {
        "Ground": length("ground_m"),
        "Sheath": length("sheath_m"),
        "Glass": length("glass_m"),
        "To order": length("ordered_m"),
        "Joints": number_text(value_at(totals, "joint_count")),
        "Cost": f"{currency} {number_text(value_at(totals, 'cost'), digits=2)}".strip(),
    }
    return (
        '<dl class="figures">'
        + "".join(
            f"<div><dt>{name}</dt><dd>{safe(value)}</dd>"
            f'<dd class="sub">{safe(made_of[name])}</dd></div>'
            for name, value in figures.items()
        )
        + "</dl>\n"
    )


def _profiles(document: Row) -> str:
    parts = []
    legs = rows_at(document, "legs")
    for number, leg in enumerate(legs):
        heading = f"<h3>{safe(text_at(leg, 'name'))}</h3>" if len(legs) > 1 else ""
        parts.append(f"<figure>{heading}{profile_svg(document, number)}</figure>")
    return "".join(parts)


def _how_to_read() -> str:
    terms = "".join(f"<div><dt>{term}</dt><dd>{text}</dd></div>" for term, text in _HOW_TO_READ)
    return f'<dl class="terms">{terms}</dl>'
