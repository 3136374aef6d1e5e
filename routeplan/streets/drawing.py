"""A simple map of ways on their streets: one page with a drawing in it, nothing fetched."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

import numpy as np

from routeplan.geodesy import unwrapped
from routeplan.streets.inside import plan_frame
from routeplan.streets.model import Exposure, Floats, Network
from routeplan.streets.output import NamedWay, SiteMark

__all__ = ["ways_page"]

_WIDTH_PX, _HEIGHT_PX, _MARGIN_PX = 1200.0, 800.0, 60.0
_STREETS_MAX = 25_000
# Hues that keep apart for the kinds of colour blindness; dashes tell them apart without any.
_STROKES = (
    ("#15487f", ""),
    ("#c2410c", "14 5"),
    ("#0b7f5c", "3 5"),
    ("#8a3f86", "14 4 3 4"),
    ("#7a6a00", "7 3"),
    ("#1f2528", "1 4"),
)
_STYLE = """
body{font:15px/1.4 system-ui,sans-serif;margin:1rem;color:#1f2528;background:#fff}
svg{width:100%;height:auto;max-height:80vh;border:1px solid #c9d0d3;background:#fbfaf7}
table{border-collapse:collapse;margin-top:1rem}td,th{padding:.25rem .8rem .25rem 0;text-align:left}
td.n{text-align:right;font-variant-numeric:tabular-nums}
"""


def ways_page(
    network: Network,
    ways: Sequence[NamedWay],
    sites: Sequence[SiteMark],
    *,
    title: str,
    attribution: str = "",
    exposures: Sequence[Exposure] = (),
) -> str:
    """
    Return a page that shows ways on their streets, with a legend, a scale and a table.

    Parameters
    ----------
    network
        The streets drawn below.
    ways, sites
        What is drawn on them.
    title
        Heading of the page.
    attribution
        Who made the streets.
    exposures
        Where two ways share something or pass near, marked on the first.
    """
    frame = _Frame.round(np.concatenate([named.way.lonlat for named in ways]))
    body = [
        f'<svg viewBox="0 0 {_WIDTH_PX:g} {_HEIGHT_PX:g}" role="img" aria-label="{escape(title)}">',
        _streets(network, frame),
        *_exposed(ways, exposures, frame),
        *(_halo(named.way.lonlat, frame) for named in ways),
        *(_way(named.way.lonlat, number, named.name, frame) for number, named in enumerate(ways)),
        *(_site(site, frame) for site in sites),
        _scale(frame),
        "</svg>",
        _table(ways),
    ]
    if attribution:
        body.append(f"<p>{escape(attribution)}</p>")
    head = f'<meta charset="utf-8"><title>{escape(title)}</title><style>{_STYLE}</style>'
    return (
        f'<!doctype html>\n<html lang="en"><head>{head}</head>\n'
        f"<body><h1>{escape(title)}</h1>\n" + "\n".join(body) + "\n</body></html>\n"
    )


class _Frame:
    """From degrees to the drawing."""

    def __init__(self, low: Floats, flat: Floats, scale: float, shift: Floats) -> None:
        self.low, self.flat, self.scale, self.shift = low, flat, scale, shift

    @classmethod
    def round(cls, lonlat: Floats) -> _Frame:
        """Return the frame that some points fill."""
        line = np.column_stack([unwrapped(lonlat[:, 0]), lonlat[:, 1]])
        flat = np.array(plan_frame(line))
        low = line.min(axis=0)
        size = np.maximum((line.max(axis=0) - low) * flat, 1.0)
        room = np.array([_WIDTH_PX, _HEIGHT_PX]) - 2 * _MARGIN_PX
        scale = float((room / size).min())
        return cls(low, flat, scale, _MARGIN_PX + (room - size * scale) / 2)

    def at(self, lonlat: Floats) -> Floats:
        """Return where points are drawn."""
        away = lonlat - self.low
        turns = np.column_stack([360.0 * np.round(away[:, 0] / 360.0), np.zeros(len(away))])
        xy = (away - turns) * self.flat * self.scale + self.shift
        return np.column_stack([xy[:, 0], _HEIGHT_PX - xy[:, 1]])


def _path(xy: Floats) -> str:
    return "M" + "L".join(f"{x:.1f} {y:.1f}" for x, y in xy.tolist())


def _streets(network: Network, frame: _Frame) -> str:
    xy = frame.at(network.shape_lonlat)
    first = network.shape_first[:-1]
    inside = (np.minimum.reduceat(xy[:, 0], first) < _WIDTH_PX) & (
        np.maximum.reduceat(xy[:, 0], first) > 0
    )
    inside &= (np.minimum.reduceat(xy[:, 1], first) < _HEIGHT_PX) & (
        np.maximum.reduceat(xy[:, 1], first) > 0
    )
    edges = np.flatnonzero(inside)
    # Of too many the longest are drawn: they are what one finds one's way by.
    edges = np.sort(edges[np.argsort(-network.length_m[edges], kind="stable")][:_STREETS_MAX])
    lines = (
        _path(xy[int(network.shape_first[edge]) : int(network.shape_first[edge + 1])])
        for edge in edges
    )
    return f'<path d="{"".join(lines)}" fill="none" stroke="#c4c9c6" stroke-width="1.2"/>'


def _halo(lonlat: Floats, frame: _Frame) -> str:
    path = _path(frame.at(lonlat))
    return f'<path d="{path}" fill="none" stroke="#fff" stroke-width="8" stroke-opacity=".7"/>'


def _way(lonlat: Floats, number: int, name: str, frame: _Frame) -> str:
    colour, dash = _STROKES[number % len(_STROKES)]
    path = _path(frame.at(lonlat))
    return (
        f'<path d="{path}" fill="none" stroke="{colour}" stroke-width="4" '
        f'stroke-dasharray="{dash}"><title>{escape(name)}</title></path>'
    )


def _exposed(ways: Sequence[NamedWay], exposures: Sequence[Exposure], frame: _Frame) -> list[str]:
    from routeplan.streets.output import line_between

    found = []
    for each in exposures:
        line = line_between(ways[0].way.lonlat, each.from_m, each.to_m)
        label = f"{each.kind}: {each.name}, {each.length_m:.0f} m"
        found.append(
            f'<path d="{_path(frame.at(line))}" fill="none" stroke="#f2c500" stroke-width="16" '
            f'stroke-opacity=".55" stroke-linecap="round"><title>{escape(label)}</title></path>'
        )
    return found


def _site(site: SiteMark, frame: _Frame) -> str:
    x, y = frame.at(np.array([[site.lon, site.lat]]))[0].tolist()
    anchor = "end" if x > _WIDTH_PX / 2 else "start"
    shift = -12 if anchor == "end" else 12
    return (
        f'<circle cx="{x:.1f}" cy="{y:.1f}" r="7" fill="#fff" stroke="#1f2528" stroke-width="3"/>'
        f'<text x="{x + shift:.1f}" y="{y - 10:.1f}" text-anchor="{anchor}" font-size="17" '
        f'font-weight="600" stroke="#fff" stroke-width="4" paint-order="stroke">'
        f"{escape(site.name)}</text>"
    )


def _scale(frame: _Frame) -> str:
    room_m = 260.0 / frame.scale
    step = 10.0 ** math.floor(math.log10(room_m))
    length_m = max(k * step for k in (1, 2, 5) if k * step <= room_m)
    size = length_m * frame.scale
    text = f"{length_m / 1000:g} km" if length_m >= 1000 else f"{length_m:g} m"
    y = _HEIGHT_PX - 24
    return (
        f'<path d="M30 {y - 8}V{y}H{30 + size:.1f}V{y - 8}" fill="none" stroke="#1f2528" '
        f'stroke-width="2"/><text x="{36 + size:.1f}" y="{y}" font-size="15">{text} '
        f"({length_m / 0.3048:,.0f} ft)</text>"
    )


def _table(ways: Sequence[NamedWay]) -> str:
    rows = []
    for number, named in enumerate(ways):
        colour, dash = _STROKES[number % len(_STROKES)]
        key = (
            f'<svg viewBox="0 0 60 10" style="width:60px;border:0"><path d="M0 5H60" '
            f'stroke="{colour}" stroke-width="4" stroke-dasharray="{dash}"/></svg>'
        )
        cells = (f"{named.way.length_m:,.0f}", f"{named.way.cost:,.0f}",
                 f"{len(named.way.crossings)}")  # fmt: skip
        numbers = "".join(f'<td class="n">{cell}</td>' for cell in cells)
        rows.append(f"<tr><td>{key}</td><td>{escape(named.name)}</td>{numbers}</tr>")
    head = "<tr><th></th><th>way</th><th>metres</th><th>cost</th><th>crossings</th></tr>"
    return f"<table>{head}{''.join(rows)}</table>"
