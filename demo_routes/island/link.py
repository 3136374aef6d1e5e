"""The demo link: from the studio in Wexmarrow over Sarrel Fell to the mast on Quenmoor."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from island.frame import Floats, random_stream
from island.layers import bridge_line, mast_xy, power_line, railway, road, streets
from island.lines import along_m, cross_points, cut, densify, nearest, point_at, set_aside
from island.terrain import beck_xy
from island.towns import gate, lane, main_street, node

__all__ = ["LinkPoint", "Stretch", "link_areas", "link_line", "link_points", "link_stretches"]

_VERGE_M = 4.0  # the route keeps this far to the left of the middle of the road
_SHORTEST_STEP_M, _LONGEST_STEP_M = 16.0, 70.0
_POLE_SPACING_M = 57.0
_AERIAL_M = (3_330.0, 7_940.0)  # from the last house of Wexmarrow to the foot of the fell


class Stretch(NamedTuple):
    """A part of the route put up in one way, between two distances along it."""

    name: str
    placement: str
    from_m: float
    to_m: float
    line: Floats


class LinkPoint(NamedTuple):
    """A declared point of the link and the properties it is written with."""

    xy: Floats
    properties: dict[str, Any]


def link_line() -> Floats:
    """Return the whole route in the local frame, in the verge of the roads it follows. [m]"""
    row = 4  # the main street of Wexmarrow
    start = (node("Wexmarrow", 1, 4) + node("Wexmarrow", 2, 4)) / 2
    town = main_street("Wexmarrow")
    corner = node("Wexmarrow", row, 4)
    village, over = main_street("Brindlequoy"), bridge_line("Lunnoth Bridge")
    middle = node("Brindlequoy", 2, 3)
    to_bridge, from_bridge = road("Fell Road")
    parts: list[Floats] = [
        np.array([start, node("Wexmarrow", 2, 4), node("Wexmarrow", 3, 4)]),
        _after(town, corner),
        to_bridge,
        over,
        from_bridge,
        village[: _index(village, middle)],
        _after(lane("Brindlequoy"), middle),
        road("Ulmeskar Road")[0],
        main_street("Ulmeskar"),
        road("Mast Road")[0],
    ]
    way = np.vstack(parts)
    verge = _spread(set_aside(_spread(way), _VERGE_M))
    yard = verge[0] + 24.0 * _aside(verge, 0.0)  # the studio stands back from the street
    return np.vstack([[yard], verge[:-1], [mast_xy()]])


def _spread(line: Floats) -> Floats:
    """Leave out vertices that stand next to the one before."""
    apart = np.hypot(*np.diff(line, axis=0).T) > _SHORTEST_STEP_M
    kept: Floats = line[np.concatenate([[True], apart])]
    return kept


def _index(line: Floats, corner: Floats) -> int:
    return int(np.argmin(np.hypot(*(line - corner).T)))


def _after(line: Floats, corner: Floats) -> Floats:
    return line[_index(line, corner) :]


def _aside(line: Floats, at_m: float) -> Floats:
    """Return the direction square to the left of a line at a place along it."""
    before, after = point_at(line, [max(at_m - 2.0, 0.0), at_m + 2.0])
    ahead = (after - before) / np.hypot(*(after - before))
    return np.array([-ahead[1], ahead[0]])


def _at(line: Floats, place: Floats) -> float:
    """Return how far along the line a place beside it is, to a whole metre."""
    return float(np.round(nearest(place, line)[1][0]))


def _poles_at_m() -> Floats:
    """Return how far along the route the poles stand."""
    start, end = _AERIAL_M
    count = round((end - start) / _POLE_SPACING_M)
    even = np.linspace(start, end, count + 1)
    moved = np.round(random_stream("poles").uniform(-3.0, 3.0, count + 1), 1)
    moved[[0, -1]] = 0.0
    return even + moved


def link_stretches() -> list[Stretch]:
    """Return the stretches of the route from the studio to the mast, joined end to end."""
    line = link_line()
    bridge = [_at(line, end) for end in bridge_line("Lunnoth Bridge")]
    village_end = _at(line, gate("Brindlequoy", "north")) + 260.0
    climb = _at(line, gate("Ulmeskar", "east")) + 30.0
    plan = [
        ("Wexmarrow streets", "duct", 0.0),
        ("Sarrel Fell", "aerial", _AERIAL_M[0]),
        ("Valley verge", "buried", _AERIAL_M[1]),
        ("Lunnoth Bridge", "bridge", bridge[0]),
        ("Brindlequoy streets", "duct", bridge[1]),
        ("Ulmeskar verge", "buried", village_end),
        ("Quenmoor track", "buried", climb),
    ]
    ends = [*(from_m for *_, from_m in plan[1:]), float(along_m(line)[-1])]
    return [
        Stretch(name, placement, from_m, to_m, _shape(line, placement, from_m, to_m))
        for (name, placement, from_m), to_m in zip(plan, ends, strict=True)
    ]


def _shape(line: Floats, placement: str, from_m: float, to_m: float) -> Floats:
    if placement == "aerial":
        return point_at(line, _poles_at_m())
    if placement == "bridge":
        return point_at(line, np.linspace(from_m, to_m, 4))
    return densify(cut(line, from_m, to_m), _LONGEST_STEP_M)


def link_points() -> list[LinkPoint]:
    """Return sites, reach points and crossings, in the order they are met."""
    line = link_line()
    end_m = float(along_m(line)[-1])
    found = [
        (0.0, LinkPoint(line[0], {"name": "Studio", "kind": "site", "role": "studio"})),
        (end_m, LinkPoint(line[-1], {"name": "Quenmoor", "kind": "site", "role": "transmitter"})),
    ]
    found += _poles(line) + _chambers(line) + _crossings(line)
    return [point for _, point in sorted(found, key=lambda item: item[0])]


def _poles(line: Floats) -> list[tuple[float, LinkPoint]]:
    at_m = _poles_at_m()
    roadside = {round(share * (len(at_m) - 1)) for share in (0.0, 0.27, 0.52, 0.76, 1.0)}
    poles = []
    for number, (at, xy) in enumerate(zip(at_m, point_at(line, at_m), strict=True)):
        properties: dict[str, Any] = {"name": f"Pole {number + 1}", "kind": "pole"}
        if number in roadside:  # a bucket truck can stand here
            properties["loop_m"] = 30.0
        poles.append((float(at), LinkPoint(xy, properties)))
    return poles


def _chambers(line: Floats) -> list[tuple[float, LinkPoint]]:
    """Return the reach points of every stretch but the aerial one and the bridge."""
    random = random_stream("chambers")
    town, _, valley, _, village, verge, track = link_stretches()
    ends = {town.name, valley.name, track.name}  # a pole, the bridge and the mast come next
    crossings_m = np.array([at for at, _ in _crossings(line)])
    cabinet_m = _at(line, node("Brindlequoy", 2, 3)) + 14.0
    spaced = [
        (town, (170, 280), ("maintenance_hole", "handhole", "handhole", "handhole")),
        (valley, (320, 480), ("handhole", "handhole", "pedestal")),
        (village, (170, 280), ("handhole", "maintenance_hole", "handhole")),
        (verge, (320, 480), ("handhole", "pedestal", "handhole")),
        (track, (400, 480), ("handhole",)),
    ]
    places = [(cabinet_m, "cabinet", village)]
    for stretch, (least_m, most_m), kinds in spaced:
        at, turn = stretch.from_m + 15.0, 0
        while at < stretch.to_m - 0.28 * least_m:
            clear = at + 40.0 if np.any(np.abs(crossings_m - at) < 30.0) else at
            if abs(clear - cabinet_m) > 60.0:
                places.append((clear, kinds[turn % len(kinds)], stretch))
            at, turn = at + float(random.integers(least_m, most_m)), turn + 1
        if stretch.name in ends:
            places.append((stretch.to_m - 15.0, "handhole", stretch))
    return _named_chambers(line, sorted(places), steep=track)


def _named_chambers(
    line: Floats, places: list[tuple[float, str, Stretch]], *, steep: Stretch
) -> list[tuple[float, LinkPoint]]:
    labels = {"handhole": "HH", "maintenance_hole": "MH", "pedestal": "PED", "cabinet": "CAB"}
    count = dict.fromkeys(labels, 0)
    chambers = []
    for at, kind, stretch in places:
        count[kind] += 1
        properties: dict[str, Any] = {"name": f"{labels[kind]} {count[kind]:02d}", "kind": kind}
        if kind == "maintenance_hole":  # every other one lies in the carriageway
            properties["joint"] = "no" if count[kind] % 2 else "yes"
        if kind == "cabinet":
            properties["joint"] = "yes"
        if stretch is steep and at < stretch.to_m - 20.0:
            properties["joint_cost_factor"] = 1.5  # a slow drive up the track
        xy = point_at(line, at) + 0.8 * _aside(line, at)
        chambers.append((at, LinkPoint(xy, properties)))
    return chambers


def _crossings(line: Floats) -> list[tuple[float, LinkPoint]]:
    """Return where the route crosses roads, the railway, the stream and the power line."""
    widths = {"primary": 9.0, "secondary": 8.0, "tertiary": 6.5}
    wanted = [
        (street.name, "road", widths[street.road_class], street.line)
        for street in streets()
        if street.road_class in widths and not street.bridge
    ]
    wanted += [
        ("Skelvane railway", "rail", 9.0, railway()),
        ("Sarrel Beck", "water", 4.0, beck_xy()),
        ("Lunnothfoot power line", "power", 14.0, power_line()),
    ]
    crossings = []
    for name, crosses, width_m, other in wanted:
        for at in cross_points(line, other):
            properties = {
                "name": f"{name} crossing", "kind": "crossing", "crosses": crosses,
                "width_m": width_m,
            }  # fmt: skip
            crossings.append((at, LinkPoint(point_at(line, at), properties)))
    return crossings


def link_areas() -> list[tuple[Floats, dict[str, str]]]:
    """Return the areas the planner has declared: a meadow to ask for, a mire to keep out of."""
    line = link_line()
    bridge = link_stretches()[3]
    meadow = point_at(line, bridge.from_m - 40.0)
    pass_m = _AERIAL_M[0] + 0.5 * (_AERIAL_M[1] - _AERIAL_M[0])
    mire = point_at(line, pass_m) - 330.0 * _aside(line, pass_m)
    return [
        (_patch(meadow, 270.0, "meadow"), {"name": "Lunnoth water meadow", "kind": "permit"}),
        (_patch(mire, 190.0, "mire"), {"name": "Sarrel Gate mire", "kind": "avoid"}),
    ]


def _patch(middle: Floats, radius_m: float, name: str) -> Floats:
    """Return an uneven closed outline about a place, anticlockwise."""
    out = radius_m * random_stream(name).uniform(0.75, 1.2, 14)
    angle = np.arange(14) * 2 * np.pi / 14
    ring = middle + np.stack([1.25 * out * np.cos(angle), 0.85 * out * np.sin(angle)], axis=1)
    return np.vstack([ring, ring[:1]])
