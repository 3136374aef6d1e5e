"""The map: one page that opens from disk with no network, drawn on a canvas from columns."""

from __future__ import annotations

import base64
import re
from collections.abc import Mapping
from functools import cache
from hashlib import sha256
from importlib.metadata import distribution
from importlib.resources import files
from typing import TYPE_CHECKING

from routeplan.sheets.lookup import Row, row_at, rows_at, text_at, value_at
from routeplan.sheets.map_data import map_data
from routeplan.sheets.optics_pictures import circuit_pictures
from routeplan.sheets.text import count_text, data_block, length_text, number_text, safe

if TYPE_CHECKING:
    import folium
    from branca.element import Element, Figure

__all__ = ["map_html"]

_SCRIPTS = ("map_data.js", "map_draw.js", "map_layer.js", "map_strip.js", "map_page.js")
_POLICY_MARK = "@content-security-policy@"
_POLICY = (
    "default-src 'none'; img-src data:; style-src 'unsafe-inline'; script-src {hashes}; "
    "base-uri 'none'; form-action 'none'"
)
_INLINE_SCRIPT = re.compile(r"<script>(.*?)</script>", re.DOTALL)


def map_html(document: Mapping[str, object]) -> str:
    """
    Return the map of a run as one HTML page that needs no other file and no network.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.

    Returns
    -------
    map_html
        The page; the same document gives the same text. Whatever names the document holds stay
        text: they reach the page escaped or as data that is never run, and the page's own
        policy lets the browser run no script but the ones written here.
    """
    title = text_at(document, "title") or "Run"
    page = _page()
    map_ = _offline_map_type()(
        location=[0.0, 0.0],
        tiles=None,
        zoom_start=3,
        control_scale=True,
        font_size="13px",
        attribution_control=False,
        zoom_snap=0.25,
        zoom_delta=0.5,
        wheel_px_per_zoom_level=120,
        world_copy_jump=False,
    )
    page.add_child(map_)
    page.header.add_child(_verbatim(_head_html(title)), name="head")
    page.html.add_child(_verbatim(_top_html(document, title)), name="top")
    map_.add_child(_starter(_below_html(document), page, map_), name="start")
    _number_ids(page)
    return _with_policy(page.render())


def _head_html(title: str) -> str:
    return (
        f'<meta http-equiv="Content-Security-Policy" content="{_POLICY_MARK}">\n'
        f"<title>{safe(title)}</title>\n"
        f"<style>{_leaflet_css()}\n{_asset('map.css')}</style>\n"
        f"<script>{_leaflet_js()}</script>\n"
    )


def _top_html(document: Row, title: str) -> str:
    """Return title, totals and verdicts."""
    items = "".join(
        f'<span class="item{" minor" if is_minor else ""}">{text}</span>\n'
        for text, is_minor in _totals(document)
    )
    verdicts = "".join(_verdict(circuit) for circuit in rows_at(document, "circuits"))
    return (
        f'<header class="head"><h1>{safe(title)}</h1>\n<p>{items}</p>\n<p>{verdicts}</p></header>\n'
    )


def _totals(document: Row) -> list[tuple[str, bool]]:
    """Return the figures under the title; the minor ones give way on a small screen."""
    totals, units = row_at(document, "totals"), text_at(document, "units")

    def length(key: str) -> str:
        return safe(length_text(value_at(totals, key), units=units))

    def count(key: str, noun: str) -> str:
        return safe(count_text(value_at(totals, key) or 0, noun))

    cost = f"{text_at(document, 'currency')} {number_text(value_at(totals, 'cost'))}".strip()
    made_up = " (with invented prices)" if _has_invented_prices(document) else ""
    return [
        (f"ground <b>{length('ground_m')}</b>", False),
        (f"sheath <b>{length('sheath_m')}</b>", False),
        (f"glass <b>{length('glass_m')}</b>", False),
        (f"<b>{count('section_count', 'section')}</b>", True),
        (f"<b>{count('reel_count', 'reel')}</b>, {length('ordered_m')} to order", True),
        (f"<b>{count('joint_count', 'joint')}</b>", True),
        (f"cost <b>{safe(cost)}</b>{made_up}", True),
    ]


def _has_invented_prices(document: Row) -> bool:
    names = (text_at(row, "name") for row in rows_at(document, "assumptions"))
    return any(name.startswith("costs.") for name in names)


def _verdict(circuit: Row) -> str:
    """Return a circuit's verdict with its smallest margin."""
    verdict = text_at(circuit, "verdict") or "unknown"
    margins_db = [value_at(row, "margin_db") for row in rows_at(circuit, "budgets")]
    known_db = [margin_db for margin_db in margins_db if margin_db is not None]
    margin = f", margin {safe(number_text(min(known_db), digits=1))} dB" if known_db else ""
    return (
        f'<span class="verdict {safe(verdict)}">{safe(text_at(circuit, "name"))} '
        f"<b>{safe(verdict)}</b>{margin}</span>\n"
    )


def _below_html(document: Row) -> str:
    """Return what stands below the map: readings, strip chart, cautions, and the data."""
    readings = (
        ("way", "Way"),
        ("ground", "Ground"),
        ("sheath", "Sheath"),
        ("glass", "Glass"),
        ("section", "Section, from its start"),
        ("height", "Height"),
        ("loss", "Loss"),
    )
    cells = "".join(
        f'<div><dt>{word}</dt><dd data-reading="{name}"></dd></div>' for name, word in readings
    )
    units = "us" if text_at(document, "units") == "us" else "metric"
    return (
        f'<dl class="readings {units}">{cells}</dl>\n'
        '<section class="strip"><canvas id="strip-chart"></canvas>'
        '<canvas id="strip-pointer" tabindex="0" role="img" '
        'aria-label="Height and loss against ground length"></canvas></section>\n'
        f'<footer class="foot">{_cautions_html(document)}{_light_html(document)}'
        '<span class="choices">'
        '<select data-choice="leg" aria-label="Leg" hidden></select>'
        '<select data-choice="curve" aria-label="Loss of" hidden></select></span></footer>\n'
        f"{data_block('run-data', map_data(document))}\n"
    )


def _cautions_html(document: Row) -> str:
    cautions = rows_at(document, "cautions")
    if not cautions:
        return "<span></span>"
    topics = " \N{MIDDLE DOT} ".join(safe(text_at(row, "topic")) for row in cautions)
    texts = "".join(
        f"<dt>{safe(text_at(row, 'topic'))}</dt><dd>{safe(text_at(row, 'text'))}</dd>"
        for row in cautions
    )
    return f"<details><summary><b>Cautions</b> {topics}</summary><dl>{texts}</dl></details>"


def _light_html(document: Row) -> str:
    """Return the pictures of every circuit's light, folded away until they are wanted."""
    drawn = [(text_at(row, "name"), circuit_pictures(row)) for row in rows_at(document, "circuits")]
    shown = [(name, pictures) for name, pictures in drawn if pictures]
    if not shown:
        return ""
    names = " \N{MIDDLE DOT} ".join(safe(name) for name, _ in shown)
    figures = "".join(
        f"<h2>{safe(name)}</h2>" + "".join(f"<figure>{picture}</figure>" for picture in pictures)
        for name, pictures in shown
    )
    return f'<details class="light"><summary><b>Light</b> {names}</summary>{figures}</details>'


def _with_policy(html: str) -> str:
    """Return the page with a policy that names its own scripts by their hashes."""
    hashes = " ".join(
        f"'sha256-{base64.b64encode(sha256(script.encode('utf-8')).digest()).decode('ascii')}'"
        for script in _INLINE_SCRIPT.findall(html)
    )
    return html.replace(_POLICY_MARK, _POLICY.format(hashes=hashes), 1)


def _number_ids(element: Element) -> None:
    """Give every element of the page a plain name in place of a random one."""
    waiting, number = [element], 0
    while waiting:
        each = waiting.pop()
        each._id = f"{number}"
        number += 1
        waiting.extend(each._children.values())


@cache
def _own_script() -> str:
    return "\n".join(_asset(name) for name in _SCRIPTS)


@cache
def _asset(name: str) -> str:
    return (files("routeplan.sheets") / "assets" / name).read_text("utf-8")


@cache
def _leaflet_js() -> str:
    folder = files("js_lib_leaflet") / "static" / "js_lib_leaflet"
    text = (folder / "leaflet.js").read_text("utf-8")
    return f"/*\n{_leaflet_licence()}\n*/\n" + re.sub(r"//# sourceMappingURL=\S*\s*$", "", text)


def _leaflet_licence() -> str:
    """Return Leaflet's licence, which asks to go with every copy of it."""
    package = distribution("django-js-lib-leaflet")
    found = package.read_text("LICENSE") or package.read_text("licenses/LICENSE") or ""
    return found.strip().replace("*/", "")


@cache
def _leaflet_css() -> str:
    """Return Leaflet's style sheet without its pictures: no control here uses them."""
    folder = files("js_lib_leaflet") / "static" / "js_lib_leaflet"
    text = (folder / "leaflet.css").read_text("utf-8")
    return re.sub(r"url\([^)]*\)", "none", text)


@cache
def _offline_map_type() -> type[folium.Map]:
    import folium

    class OfflineMap(folium.Map):
        """A folium map that names no script or style sheet elsewhere."""

    OfflineMap.default_js = []
    OfflineMap.default_css = []
    return OfflineMap


def _verbatim(text: str) -> Element:
    """Return an element that is written as it stands; others are read as templates once more."""
    from branca.element import Element

    class Verbatim(Element):
        def render(self, **_kwargs: object) -> str:
            return text

    return Verbatim()


def _starter(below: str, page: Figure, map_: folium.Map) -> Element:
    """Return the map's child that writes what stands below it and starts our own script."""
    from branca.element import Element

    class Starter(Element):
        def render(self, **_kwargs: object) -> str:
            start = f"(() => {{\n{_own_script()}\nshowRun({map_.get_name()});\n}})();"
            page.html.add_child(_verbatim(below), name="below")
            page.script.add_child(_verbatim(start), name="start")
            return ""

    return Starter()


def _page() -> Figure:
    """Return the frame of the page, in the order of parts that browsers expect."""
    from branca.element import Figure
    from jinja2 import Template

    class Page(Figure):
        _template = Template(
            '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
            "{{this.header.render(**kwargs)}}\n</head>\n<body>\n{{this.html.render(**kwargs)}}\n"
            "<script>{{this.script.render(**kwargs)}}</script>\n</body>\n</html>\n"
        )

    return Page()
