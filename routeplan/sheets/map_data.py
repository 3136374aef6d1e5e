"""What the map page draws from: a run as columns of whole numbers, each a step on the last."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from routeplan.sheets.lookup import (
    Row,
    column_at,
    numbers,
    rows_at,
    sites_in,
    text_at,
    value_at,
)
from routeplan.sheets.map_style import LINE_STYLES, POINT_WORDS, line_style
from routeplan.sheets.text import plain

__all__ = ["map_data", "steps"]

# Degrees are kept to 1e-7 (a centimetre), lengths and losses to a thousandth, heights to 0.1 m.
_PER_DEG = 10_000_000
_TURN = 360 * _PER_DEG
_POINT_CODES = tuple(POINT_WORDS)

Steps = list[int | None]


def map_data(document: Row) -> dict[str, object]:
    """
    Return everything the map page draws and shows, ready for JSON.

    Columns are lists of whole numbers in which each entry is the step from the one before it, so
    that thousands of stations stay small; null means not known.
    """
    legs = rows_at(document, "legs")
    names = [text_at(leg, "name") for leg in legs]
    by_leg = _stations_by_leg(document)
    sections = {text_at(row, "name"): row for row in rows_at(document, "sections")}
    origin = next((numbers(at[:1])[0] for leg in legs for at in _vertices(leg)[:1]), 0.0)
    return {
        "units": text_at(document, "units") or "metric",
        "pointWords": POINT_WORDS,
        "placements": _placements(legs),
        "legs": [
            _leg_columns(leg, by_leg.get(name, []), sections, origin)
            for leg, name in zip(legs, names, strict=True)
        ],
        "sites": [_site(row, origin) for row in sites_in(document)],
        "joints": [_joint(row, names, origin) for row in rows_at(document, "joints")],
        "areas": [_area(row, origin) for row in rows_at(document, "areas")],
        "background": [
            _polyline(_lists(line), origin) for line in _lists(document.get("background"))
        ],
        "power": [row for each in rows_at(document, "circuits") for row in _power(each, names)],
    }


def steps(values: Iterable[float | None], *, scale: int) -> Steps:
    """
    Return values times `scale` as whole numbers, each but the first as the step from the last.

    Examples
    --------
    >>> steps([1.0, 1.5, None, 0.5], scale=1000)
    [1000, 500, None, -1000]
    """
    last = 0
    column: Steps = []
    for value in values:
        if value is None:
            column.append(None)
            continue
        whole = round(value * scale)
        column.append(whole - last)
        last = whole
    return column


def _lon_steps(lons: Iterable[float], origin: float) -> Steps:
    """Return longitudes as steps that never jump round the globe, the first one near `origin`."""
    half, start = _TURN // 2, round(origin * _PER_DEG)
    last = start
    column: Steps = []
    for lon in lons:
        step = (round(lon * _PER_DEG) - last + half) % _TURN - half
        column.append(step if column else start + step)
        last += step
    return column


def _stations_by_leg(document: Row) -> dict[str, list[Row]]:
    """Return the stations of every leg; of two cables on a leg, those of the first."""
    by_leg: dict[str, list[Row]] = {}
    first_cable: dict[str, object] = {}
    for station in rows_at(document, "stations"):
        leg, cable = text_at(station, "leg"), station.get("cable")
        if first_cable.setdefault(leg, cable) == cable:
            by_leg.setdefault(leg, []).append(station)
    return by_leg


def _leg_columns(
    leg: Row, stations: Sequence[Row], sections: dict[str, Row], origin: float
) -> dict[str, object]:
    vertices = _vertices(leg)
    points = [(number, row) for number, row in enumerate(stations) if row["kind"] != "vertex"]
    spans, offsets = _section_spans(stations, sections)
    near, far = ("to", "from") if _runs_back(stations) else ("from", "to")
    return {
        "name": plain(text_at(leg, "name")),
        "from": plain(text_at(leg, "from")),
        "to": plain(text_at(leg, "to")),
        "cable": plain(text_at(stations[0], "cable")) if stations else "",
        **_polyline(vertices, origin),
        "height": steps((_third(vertex) for vertex in vertices), scale=10),
        "ground": steps(numbers(leg.get("line_ground_m")), scale=1000),
        "stretches": [
            [
                text_at(row, "placement"),
                round((value_at(row, "from_ground_m") or 0.0) * 1000),
                round((value_at(row, "to_ground_m") or 0.0) * 1000),
            ]
            for row in rows_at(leg, "stretches")
        ],
        "stations": {
            "ground": _column(stations, "ground_m"),
            "sheath": _column(stations, f"sheath_{near}_m"),
            "sheathStep": _rises(stations, f"sheath_{near}_m", f"sheath_{far}_m"),
            "glass": _column(stations, f"glass_{near}_m"),
            "glassStep": _rises(stations, f"glass_{near}_m", f"glass_{far}_m"),
            "section": spans,
        },
        "sections": offsets,
        "points": {
            "station": steps((number for number, _ in points), scale=1),
            "code": [_code(row) for _, row in points],
            "under": [_reach_code(row) for _, row in points],
            "name": [plain(text_at(row, "name")) for _, row in points],
            "lon": _lon_steps((value_at(row, "lon") or 0.0 for _, row in points), origin),
            "lat": steps((value_at(row, "lat") for _, row in points), scale=_PER_DEG),
        },
    }


def _runs_back(stations: Sequence[Row]) -> bool:
    """Return whether the cable runs against the leg, its rulers falling along it."""
    if not stations:
        return False
    first, last = (value_at(row, "sheath_from_m") or 0.0 for row in (stations[0], stations[-1]))
    return first > last


def _section_spans(
    stations: Sequence[Row], sections: dict[str, Row]
) -> tuple[list[int], list[list[object]]]:
    """
    Return the section that runs on from every station, and where on the sheath each starts.

    A joint's own row names only one of its two sections, so a span takes the section of an end
    that is not a joint, or the one that the two joints at its ends are called for.
    """
    by_ends = {(text_at(s, "from"), text_at(s, "to")): name for name, s in sections.items()}
    numbers_of: dict[str, int] = {}
    offsets: list[list[object]] = []
    spans = []
    for here, there in zip(stations, [*stations[1:], *stations[-1:]], strict=True):
        ends = (text_at(here, "name"), text_at(there, "name"))
        inner = next((row for row in (here, there) if _is_inside(row, sections)), None)
        name = by_ends.get(ends) if inner is None else text_at(inner, "section")
        name = name or text_at(here, "section")
        if name not in numbers_of:
            numbers_of[name] = len(offsets)
            offsets.append(_section_start(name, inner or here))
        spans.append(numbers_of[name])
    return spans, offsets


def _is_inside(station: Row, sections: dict[str, Row]) -> bool:
    """Return whether a station lies within its section: no end, or one that the cable passes."""
    if station["kind"] not in ("joint", "site"):
        return True
    section = sections.get(text_at(station, "section"))
    ends = () if section is None else (text_at(section, "from"), text_at(section, "to"))
    is_passed = bool(ends) and text_at(station, "name") not in ends
    return is_passed and bool(value_at(station, "section_m"))


def _section_start(name: str, station: Row) -> list[object]:
    """Return a section's name and the sheath reading at its own start, in millimetres."""
    sheath_m, section_m = value_at(station, "sheath_from_m"), value_at(station, "section_m")
    if sheath_m is None or section_m is None:
        return [plain(name), None]
    return [plain(name), round(sheath_m * 1000) - round(section_m * 1000)]


def _column(stations: Sequence[Row], key: str) -> Steps:
    return steps(column_at(stations, key), scale=1000)


def _rises(stations: Sequence[Row], start: str, end: str) -> list[int]:
    """Return the millimetres a ruler gains at each station: loops, tails, entries."""
    pairs = zip(column_at(stations, start), column_at(stations, end), strict=True)
    return [
        0 if from_m is None or to_m is None else round(to_m * 1000) - round(from_m * 1000)
        for from_m, to_m in pairs
    ]


def _code(station: Row) -> int:
    kind = text_at(station, "kind")
    return _reach_code(station) if kind == "reach" else _index(kind)


def _reach_code(station: Row) -> int:
    kind = text_at(station, "reach_kind")
    return _index(kind) if kind or text_at(station, "kind") == "reach" else -1


def _index(kind: str) -> int:
    return _POINT_CODES.index(kind) if kind in POINT_WORDS else _POINT_CODES.index("reach")


def _placements(legs: Sequence[Row]) -> list[dict[str, object]]:
    """Return the drawing of each placement the run has, with its length in all."""
    total_m: dict[str, float] = {}
    for stretch in (row for leg in legs for row in rows_at(leg, "stretches")):
        length_m = (value_at(stretch, "to_ground_m") or 0) - (
            value_at(stretch, "from_ground_m") or 0
        )
        name = text_at(stretch, "placement")
        total_m[name] = total_m.get(name, 0.0) + length_m
    ordered = sorted(total_m, key=lambda name: (*LINE_STYLES, name).index(name))
    return [
        {
            "name": name,
            "word": line_style(name).word,
            "colour": line_style(name).colour,
            "form": line_style(name).form,
            "width": line_style(name).width_px,
            "dash": line_style(name).dash_px,
            "total": round(total_m[name] * 1000),
        }
        for name in ordered
    ]


def _site(node: Row, origin: float) -> list[object]:
    role = plain(text_at(node, "role"))
    return [plain(text_at(node, "name")), role, *_lonlat(node, origin)]


def _joint(joint: Row, legs: Sequence[str], origin: float) -> list[object]:
    leg = text_at(joint, "leg")
    return [
        plain(text_at(joint, "name")),
        plain(text_at(joint, "reach_name")),
        bool(joint.get("assumed")),
        legs.index(leg) if leg in legs else -1,
        round((value_at(joint, "ground_m") or 0.0) * 1000),
        *_lonlat(joint, origin),
    ]


def _lonlat(row: Row, origin: float) -> list[int | None]:
    lon, lat = value_at(row, "lon"), value_at(row, "lat")
    return [*_lon_steps([lon or 0.0], origin), *steps([lat or 0.0], scale=_PER_DEG)]


def _area(area: Row, origin: float) -> dict[str, object]:
    return {
        "name": plain(text_at(area, "name")),
        "kind": plain(text_at(area, "kind")),
        "rings": [_polyline(_lists(ring), origin) for ring in _lists(area.get("rings"))],
    }


def _power(circuit: Row, legs: Sequence[str]) -> list[dict[str, object]]:
    """Return a circuit's loss along the ground, one curve a leg and wavelength, if it is given."""
    curves: dict[tuple[str, float | None], list[Row]] = {}
    for row in rows_at(circuit, "power"):
        key = (text_at(row, "leg") or (legs[0] if legs else ""), value_at(row, "wavelength_nm"))
        curves.setdefault(key, []).append(row)
    for rows in curves.values():
        if (value_at(rows[0], "ground_m") or 0.0) > (value_at(rows[-1], "ground_m") or 0.0):
            rows.reverse()  # the circuit runs against the leg; the chart reads along it
    return [
        {
            "circuit": plain(text_at(circuit, "name")),
            "wavelength": "" if wavelength is None else f"{wavelength:g}",
            "leg": legs.index(leg),
            "ground": steps((value_at(row, "ground_m") for row in rows), scale=1000),
            "loss": steps((value_at(row, "loss_db") for row in rows), scale=1000),
        }
        for (leg, wavelength), rows in curves.items()
        if leg in legs
    ]


def _polyline(vertices: Sequence[list[object]], origin: float) -> dict[str, Steps]:
    pairs = [numbers(vertex[:2]) for vertex in vertices]
    return {
        "lon": _lon_steps((lon for lon, _ in pairs), origin),
        "lat": steps((lat for _, lat in pairs), scale=_PER_DEG),
    }


def _vertices(leg: Row) -> list[list[object]]:
    return _lists(leg.get("line"))


def _lists(value: object) -> list[list[object]]:
    """Return the lists in a list: vertices of a line, rings of an area."""
    return [each for each in value if isinstance(each, list)] if isinstance(value, list) else []


def _third(vertex: object) -> float | None:
    if not isinstance(vertex, list | tuple) or len(vertex) < 3 or vertex[2] is None:
        return None
    return float(vertex[2])
