"""Placing declared points on legs, and where on the earth a station of a leg lies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from routeplan import geodesy
from routeplan.errors import Problem
from routeplan.ground.locate import index_lines, near_lines, nearest_m
from routeplan.ground.model import Crossing, Leg, Millimetres, Node, PlacedPoint
from routeplan.run.model import Floats, Place, Run

__all__ = ["place_points", "position_at"]


def place_points(
    run: Run, legs: Sequence[Leg], nodes: Sequence[Node], places: Sequence[Place]
) -> tuple[list[Leg], list[Node], list[Crossing], list[Problem]]:
    """
    Place reach points and declared crossings on the legs they lie nearest to.

    A reach point at a plain branch becomes the place of its node.

    Parameters
    ----------
    run
        The run, for how far from a leg a point may lie.
    legs
        Legs without points.
    nodes
        Their nodes, in order of their numbers.
    places
        The points; no sites.

    Returns
    -------
    legs
        With their points in order of station.
    nodes
        With the places found at them.
    crossings
        Those declared.
    problems
        Of points that are far from every leg.
    """
    nodes = list(nodes)
    joining = run.practice.joining
    shapes = [(leg.shape_lonlat, leg.shape_mm) for leg in legs]
    index = index_lines(shapes)
    points = np.array([[place.lon, place.lat] for place in places]).reshape(-1, 2)
    radius = np.full(len(places), joining.reach_distance_max_m)
    found: list[list[PlacedPoint]] = [[] for _ in legs]
    crossings: list[Crossing] = []
    problems: list[Problem] = []
    tolerance_mm = round(joining.join_tolerance_m * 1000)
    for number, hits in enumerate(near_lines(index, points, radius_m=radius)):
        place = places[number]
        if not hits:
            far_m = nearest_m(index, points[number])
            problems.append(_far_point(place, far_m, joining.reach_distance_max_m))
            continue
        leg = legs[hits[0].line]
        ground_mm = _whole_station(leg, hits[0].index)
        at_node = _plain_node_at(leg, nodes, ground_mm, tolerance_mm)
        if at_node is not None and place.kind != "crossing" and nodes[at_node].place is None:
            nodes[at_node] = replace(nodes[at_node], place=place, name=place.name)
            continue
        placed = PlacedPoint(place=place, ground_mm=ground_mm, offset_m=hits[0].offset_m)
        found[hits[0].line].append(placed)
        if place.kind == "crossing":
            crossings.append(_crossing(leg, placed))
    placed_legs = [
        replace(leg, points=tuple(sorted(placed, key=_station_order)))
        for leg, placed in zip(legs, found, strict=True)
    ]
    return placed_legs, nodes, crossings, problems


def _whole_station(leg: Leg, station_mm: float) -> int:
    """Return a whole millimetre, the half rounded in the leg's canonical direction."""
    return leg.length_mm - round(leg.length_mm - station_mm) if leg.is_turned else round(station_mm)


def _station_order(point: PlacedPoint) -> tuple[int, float, float, str]:
    # Places at one station keep an order that does not depend on the file.
    return (point.ground_mm, point.place.lon, point.place.lat, point.place.name)


def _plain_node_at(
    leg: Leg, nodes: Sequence[Node], ground_mm: int, tolerance_mm: int
) -> int | None:
    """Return the branch node, not a site, that a station on a leg falls on."""
    for node_id, at_mm in ((leg.start, 0), (leg.end, leg.length_mm)):
        number = int(node_id[1:]) - 1
        if abs(ground_mm - at_mm) <= tolerance_mm and not nodes[number].is_site:
            return number
    return None


def _crossing(leg: Leg, placed: PlacedPoint) -> Crossing:
    place = placed.place
    lonlat, _ = position_at(leg, np.array([placed.ground_mm]))
    return Crossing(
        leg=leg.id,
        name=place.name,
        crosses=place.crosses or "road",
        ground_mm=placed.ground_mm,
        width_m=place.width_m,
        lon=float(lonlat[0, 0]),
        lat=float(lonlat[0, 1]),
    )


def position_at(leg: Leg, ground_mm: Millimetres) -> tuple[Floats, Floats]:
    """
    Return where stations of a leg lie, and how high.

    Parameters
    ----------
    leg
        The leg.
    ground_mm
        Ground stations, shape (n,); fastest when rising. [mm]

    Returns
    -------
    lonlat
        WGS 84 longitude and latitude, shape (n, 2). [deg]
    heights_m
        Shape (n,), NaN where unknown. [m]
    """
    lonlat = np.column_stack(
        [np.interp(ground_mm, leg.shape_mm, leg.shape_lonlat[:, axis]) for axis in (0, 1)]
    )
    lonlat[:, 0] = geodesy.wrapped(lonlat[:, 0])
    if leg.heights_m is None:
        return lonlat, np.full(len(ground_mm), np.nan)
    return lonlat, np.interp(ground_mm, leg.ground_mm, leg.heights_m)


def _far_point(place: Place, far_m: float, limit_m: float) -> Problem:
    return Problem(
        where=str(place.source),
        what=f'{place.kind.replace("_", " ")} "{place.name}" is far from every line',
        value=f"{far_m:,.1f} m".replace(",", " "),
        limit=f"reach_distance_max_m = {limit_m:g}",
        remedy="Move it onto the way, or raise joining.reach_distance_max_m",
    )
