"""Ways as a geometry file that planning takes as it is, and as rows to compare them by."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from routeplan.streets.model import Floats, ReachPoint, Tree, Way
from routeplan.streets.reach import stretches

__all__ = [
    "NamedWay",
    "SiteMark",
    "collection_of",
    "collection_text",
    "leg_names",
    "line_between",
    "rows_of",
    "tree_ways",
    "way_features",
]

_CROSSES = {"rail": "rail", "water": "water", "motorway": "road"}
_DIGITS = 9
_CLEAR_M = 3.0  # house rule: a change of placement keeps clear of another way's line by so much


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteMark:
    """A site as the geometry file has it."""

    name: str
    lon: float
    lat: float
    role: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NamedWay:
    """A way with the name its leg gets, and its reach points."""

    name: str
    way: Way
    reach: tuple[ReachPoint, ...] = ()


def collection_of(ways: Sequence[NamedWay], sites: Sequence[SiteMark]) -> dict[str, object]:
    """
    Return ways as a GeoJSON FeatureCollection with placements, sites, reach points and crossings.

    A line a stretch of one placement, all those of one way with the same `leg`. Water crossed on a
    bridge is the bridge's and gets no point of its own.

    Parameters
    ----------
    ways
        The ways.
    sites
        The sites, each once.
    """
    features: list[dict[str, object]] = []
    others = [named.way.lonlat for named in ways]
    for number, named in enumerate(ways):
        rest = [line for at, line in enumerate(others) if at != number]
        features.extend(_lines(named, rest))
    for site in sites:
        known: dict[str, object] = {"name": site.name, "kind": "site"}
        if site.role:
            known["role"] = site.role
        features.append(_point(known, site.lon, site.lat))
    for named in ways:
        features.extend(_reach(named, len(ways) > 1))
        features.extend(_crossings(named, len(ways) > 1))
    return {"type": "FeatureCollection", "features": features}


def way_features(
    named: NamedWay, others: Sequence[Floats], *, is_one_of_many: bool = True
) -> list[dict[str, object]]:
    """
    Return one way as GeoJSON features: its lines, reach points and crossings.

    Parameters
    ----------
    named
        The way.
    others
        The lines of all other ways, which its own lines do not end on.
    is_one_of_many
        Whether names of its points begin with its own.
    """
    return [
        *_lines(named, others),
        *_reach(named, is_one_of_many),
        *_crossings(named, is_one_of_many),
    ]


def collection_text(collection: Mapping[str, object]) -> str:
    """Return a collection as text, a feature a line."""
    features = collection["features"]
    assert isinstance(features, list)
    lines = ",\n".join(
        json.dumps(each, ensure_ascii=False, separators=(",", ":")) for each in features
    )
    return f'{{"type":"FeatureCollection","features":[\n{lines}\n]}}\n'


def leg_names(named: NamedWay) -> list[str]:
    """Return the names of a way's legs: one from each of its sites to the next."""
    count = len(named.way.via_m) - 1
    if count < 2:
        return [named.name]
    return [f"{named.name} ({number})" for number in range(1, count + 1)]


def _lines(named: NamedWay, others: Sequence[Floats]) -> list[dict[str, object]]:
    """Return the lines of a way; one through several sites is a leg a site, and one cable."""
    way = named.way
    names = leg_names(named)
    marks = [0.0, *way.via_m[1:-1], way.length_m] if len(names) > 1 else [0.0, way.length_m]
    found = []
    for leg, within in zip(names, pairwise(marks), strict=True):
        known: dict[str, object] = {"leg": leg}
        if len(names) > 1:
            known["cable"] = named.name
        found.extend(_leg_lines(way, known, within, others))
    return found


def _leg_lines(
    way: Way, known: dict[str, object], within: tuple[float, float], others: Sequence[Floats]
) -> list[dict[str, object]]:
    """Return the lines of one leg of a way, a stretch of one placement each."""
    begin_m, end_m = within
    groups = [
        (placement, max(from_m, begin_m), min(to_m, end_m))
        for placement, from_m, to_m in stretches(way)
        if min(to_m, end_m) > max(from_m, begin_m)
    ]
    inner = (_clear_of(way, to_m, others, within=within) for _, _, to_m in groups[:-1])
    bounds = [begin_m, *inner, end_m]
    leg = known["leg"]
    found = []
    for number, (placement, from_m, to_m) in enumerate(groups):
        line = line_between(way.lonlat, bounds[number], bounds[number + 1])
        names = _street_names(way, from_m, to_m)
        own: dict[str, object] = {
            "name": leg if len(groups) == 1 else f"{leg} {number + 1}",
            "placement": placement,
            **known,
        }
        if names:
            own["streets"] = names
        found.append(_feature(own, "LineString", _rounded(line)))
    return found


_SHIFTS_M = (0.0, *(sign * _CLEAR_M * step for step in range(1, 9) for sign in (1, -1)))


def _clear_of(
    way: Way, along_m: float, others: Sequence[Floats], *, within: tuple[float, float]
) -> float:
    """
    Return where one placement ends and the next begins, off the line of every other way.

    Ends of lines that lie on another line are joined to it when the file is read; two ways that
    only pass the same junction must stay two.
    """
    from routeplan.streets.exposure import near_m_of

    for shift_m in _SHIFTS_M:
        trial = along_m + shift_m
        if not within[0] < trial < within[1]:
            continue
        point = line_between(way.lonlat, trial, trial)[:1]
        if all(
            float(near_m_of(point, line, most_m=_CLEAR_M)[0]) >= _CLEAR_M / 2 for line in others
        ):
            return trial
    return along_m


def line_between(lonlat: Floats, from_m: float, to_m: float) -> Floats:
    """Return the part of a polyline between two places along it."""
    from routeplan.geodesy import steps_m, unwrapped, wrapped

    chain = np.concatenate([[0.0], np.cumsum(steps_m(lonlat))])
    lon = unwrapped(lonlat[:, 0])
    inner = (chain > from_m + 1e-6) & (chain < to_m - 1e-6)
    marks = np.concatenate([[from_m], chain[inner], [to_m]])
    places = np.column_stack([np.interp(marks, chain, lon), np.interp(marks, chain, lonlat[:, 1])])
    if from_m <= 0.0:
        places[0] = lonlat[0]
    if to_m >= chain[-1] - 1e-6:
        places[-1] = lonlat[-1]
    return np.column_stack([wrapped(places[:, 0]), places[:, 1]])


def _street_names(way: Way, begin_m: float, end_m: float) -> str:
    names: list[str] = []
    at = 0.0
    for part in way.parts:
        middle = at + part.length_m / 2
        at += part.length_m
        if begin_m <= middle <= end_m and part.name and part.name not in names[-1:]:
            names.append(part.name)
    return ", ".join(names)


def _reach(named: NamedWay, is_one_of_many: bool) -> list[dict[str, object]]:
    found = []
    for number, place in enumerate(named.reach, start=1):
        kind = place.kind.replace("_", " ")
        prefix = f"{named.name} " if is_one_of_many else ""
        known: dict[str, object] = {
            "name": f"{prefix}{kind} {number}",
            "kind": place.kind,
            "assumed": True,
            "basis": place.basis,
        }
        found.append(_point(known, place.lon, place.lat))
    return found


def _crossings(named: NamedWay, is_one_of_many: bool) -> list[dict[str, object]]:
    found = []
    kept = [
        each
        for each in named.way.crossings
        if not (each.kind == "water" and (each.is_bridge or each.is_tunnel))
    ]
    for number, crossing in enumerate(kept, start=1):
        prefix = f"{named.name} " if is_one_of_many else ""
        known: dict[str, object] = {
            "name": f"{prefix}{crossing.kind} crossing {number}",
            "kind": "crossing",
            "crosses": _CROSSES[crossing.kind],
        }
        found.append(_point(known, crossing.lon, crossing.lat))
    return found


def _point(known: dict[str, object], lon: float, lat: float) -> dict[str, object]:
    return _feature(known, "Point", [round(lon, _DIGITS), round(lat, _DIGITS)])


def _feature(known: dict[str, object], kind: str, coordinates: object) -> dict[str, object]:
    geometry = {"type": kind, "coordinates": coordinates}
    return {"type": "Feature", "properties": known, "geometry": geometry}


def _rounded(lonlat: Floats) -> list[list[float]]:
    found: list[list[float]] = np.round(lonlat, _DIGITS).tolist()
    return found


def tree_ways(tree: Tree, sites: Sequence[SiteMark]) -> list[tuple[str, Way]]:
    """Return the branches of a tree, each with a name made of its two ends."""
    return [
        (f"{_end_name(one, sites)} - {_end_name(other, sites)}", way)
        for way, (one, other) in zip(tree.branches, tree.ends, strict=True)
    ]


def _end_name(end: int, sites: Sequence[SiteMark]) -> str:
    return sites[end].name if end >= 0 else f"branch {-end}"


def rows_of(ways: Sequence[NamedWay]) -> list[dict[str, object]]:
    """
    Return one row a way to compare them by: length, cost, crossings, bridges, streets.

    Parameters
    ----------
    ways
        The ways; the first is what the others are set beside.
    """
    rows: list[dict[str, object]] = []
    for named in ways:
        way = named.way
        kinds = [crossing.kind for crossing in way.crossings]
        first = ways[0].way
        rows.append(
            {
                "name": named.name,
                "length_m": round(way.length_m, 3),
                "off_street_m": round(way.off_street_m, 3),
                "cost": round(way.cost, 2),
                "cost_ratio": round(way.cost / first.cost, 4) if first.cost else 1.0,
                "rail_crossing_count": kinds.count("rail"),
                "water_crossing_count": kinds.count("water"),
                "motorway_crossing_count": kinds.count("motorway"),
                "bridge_m": round(sum(part.length_m for part in way.parts if part.is_bridge), 3),
                "reach_point_count": len(named.reach),
                "streets": _street_names(way, 0.0, way.length_m),
            }
        )
    return rows
