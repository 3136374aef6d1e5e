"""What legs cross, run along or go through: roads, rail, water, power, pipelines, areas."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import shapely

from routeplan import geodesy
from routeplan.ground.crossing_along import Alongside, alongside, alongside_intervals
from routeplan.ground.crossing_areas import Inside, insides, positions
from routeplan.ground.crossing_contacts import (
    Contact,
    Events,
    chosen_events,
    contacts,
    events_of,
    joined_events,
    no_events,
)
from routeplan.ground.crossing_segments import (
    FeatureSegments,
    LegSegments,
    Whole,
    feature_segments,
    leg_segments,
    near_features,
    near_segments,
)
from routeplan.ground.features import FeatureLayer, feature_layer
from routeplan.ground.model import Crossing, FoundCrossing, How, Leg
from routeplan.run.model import Area, Floats

__all__ = [
    "ALONG_ANGLE_DEG",
    "ALONG_DISTANCE_M",
    "ALONG_LENGTH_M",
    "FoundCrossing",
    "areas_layer",
    "crossings_of",
    "find_crossings",
    "known_crossings",
    "not_got_past",
]

# House rules: a cable within a verge's width of a line, for longer than it takes to cross it.
ALONG_DISTANCE_M = 10.0
ALONG_LENGTH_M = 50.0
ALONG_ANGLE_DEG = 20.0

_PHYSICAL = ("road", "rail", "water", "power", "pipeline")  # what a cable has to get past
_PATHS = ("footway", "path", "steps", "cycleway", "bridleway", "pedestrian")

_NONE = np.zeros(0, dtype=np.int64)

Intervals = tuple[Whole, Whole, Floats, Floats]


def find_crossings(
    legs: Sequence[Leg],
    layers: Sequence[FeatureLayer],
    *,
    along_distance_m: float = ALONG_DISTANCE_M,
    along_length_m: float = ALONG_LENGTH_M,
    along_angle_deg: float = ALONG_ANGLE_DEG,
) -> tuple[FoundCrossing, ...]:
    """
    Return everything of some layers that legs meet, by leg and station.

    Lines that a leg meets within a millimetre are crossed or touched, each meeting once, however
    many vertices lie there. Every line counts for itself: two carriageways are two crossings.
    Between vertices features are straight in longitude and latitude, as GeoJSON has it [1]_;
    lengths and angles are taken in metres from the step's own beginning, which on a step of 200 m
    is good to a millimetre below latitude 80, over the antimeridian as elsewhere.

    Boxes around pieces of 16 steps go into a tree that is asked once for all features and once for
    the segments of those met; memory grows with what lies near the legs, not with the layers.

    Parameters
    ----------
    legs
        The legs.
    layers
        The layers.
    along_distance_m
        A line farther to the side is not run along. [m]
    along_length_m
        Shortest length of running along a line. [m]
    along_angle_deg
        Largest angle between leg and line for running along it. [deg]

    References
    ----------
    .. [1] RFC 7946 (August 2016), section 3.1.1.
    """
    if not legs or not layers:
        return ()
    steps = leg_segments(legs, reach_m=along_distance_m)
    found: list[FoundCrossing] = []
    for layer in layers:
        near = near_features(steps, layer.geometries)
        if not len(near[0]):
            continue
        segments = feature_segments(layer.geometries, np.unique(near[0]))
        events, intervals = _meetings(steps, segments, along_distance_m, along_angle_deg)
        beside = alongside(
            intervals, _keys(layer, intervals), gap_m=along_distance_m, length_m=along_length_m
        )
        within = insides(steps, segments, events, geometries=layer.geometries, near=near)
        crossed = contacts(steps, segments, _of_lines(layer, segments, events))
        shared: list[Contact | Alongside | Inside] = [*crossed, *beside, *within]
        middles = _middles(steps, shared)
        for one, middle in zip(shared, middles, strict=True):
            feature = int(segments.feature[one.part]) if isinstance(one, Contact) else one.feature
            found.append(_found(steps, legs[one.leg], layer, feature, one, middle=middle))
    order = {leg.id: at for at, leg in enumerate(legs)}
    found.sort(key=lambda one: (order[one.leg], *_rank(one)))
    return tuple(found)


def _rank(one: FoundCrossing) -> tuple[object, ...]:
    return (one.start_mm, one.end_mm, one.kind, one.name, one.how, one.file, one.feature)


def _meetings(
    legs: LegSegments, features: FeatureSegments, distance_m: float, angle_deg: float
) -> tuple[Events, Intervals]:
    events: list[Events] = []
    intervals: list[Intervals] = []
    for pairs in near_segments(legs, features):
        events.append(events_of(legs, features, pairs))
        intervals.append(
            alongside_intervals(legs, features, pairs, distance_m=distance_m, angle_deg=angle_deg)
        )
    if not events:
        return no_events(), (_NONE, _NONE, _NONE.astype(float), _NONE.astype(float))
    columns = [np.concatenate(column) for column in zip(*intervals, strict=True)]
    return joined_events(events), (columns[0], columns[1], columns[2], columns[3])


def _of_lines(layer: FeatureLayer, features: FeatureSegments, events: Events) -> Events:
    """Return the events of lines; those of areas only cut the leg."""
    kinds = shapely.get_type_id(layer.geometries[features.feature[events.part]])
    return chosen_events(events, ~np.isin(kinds, (3, 6)))


def _keys(layer: FeatureLayer, intervals: Intervals) -> dict[int, tuple[str, ...] | None]:
    """Return what features that are named have in common with others of the name."""
    return {
        at: (layer.kinds[at], layer.classes[at], layer.names[at], layer.owners[at])
        if layer.names[at]
        else None
        for at in np.unique(intervals[1]).tolist()
    }


def _middles(
    steps: LegSegments, shared: Sequence[Contact | Alongside | Inside]
) -> list[tuple[float, float]]:
    """Return longitude and latitude of the middle of each."""
    leg = np.array([one.leg for one in shared], dtype=np.int64)
    at_m = np.array([0.5 * (one.start_m + one.end_m) for one in shared])
    lonlat = np.empty((len(shared), 2))
    for number in np.unique(leg).tolist():
        lonlat[leg == number] = positions(steps, number, at_m[leg == number])
    return list(zip(geodesy.wrapped(lonlat[:, 0]).tolist(), lonlat[:, 1].tolist(), strict=True))


def _found(
    steps: LegSegments,
    leg: Leg,
    layer: FeatureLayer,
    feature: int,
    one: Contact | Alongside | Inside,
    *,
    middle: tuple[float, float],
) -> FoundCrossing:
    how: How
    start_m, end_m, angle = one.start_m, one.end_m, None
    if isinstance(one, Contact):
        how, angle = ("crosses" if one.crosses else "touches"), one.angle_deg
        start_m = end_m = 0.5 * (start_m + end_m)
    elif isinstance(one, Inside):
        how = "inside" if end_m > start_m else "touches"
    else:
        how = "along"
    span = round(start_m * 1000.0), round(end_m * 1000.0)
    if steps.is_turned[one.leg]:
        span = leg.length_mm - span[1], leg.length_mm - span[0]
    return FoundCrossing(
        leg=leg.id,
        kind=layer.kinds[feature],
        how=how,
        feature_class=layer.classes[feature],
        name=layer.names[feature],
        owner=layer.owners[feature],
        start_mm=span[0],
        end_mm=span[1],
        angle_deg=angle,
        lon=middle[0],
        lat=middle[1],
        file=layer.file,
        feature=feature,
    )


def areas_layer(areas: Sequence[Area]) -> FeatureLayer:
    """
    Return the declared areas of a run as a layer.

    Who has to be asked is the property `owner` or `operator` of an area, if it has one.

    Parameters
    ----------
    areas
        The areas.
    """
    owners = [area.properties.get("owner") or area.properties.get("operator") for area in areas]
    return feature_layer(
        areas[0].source.file if areas else "areas",
        [shapely.Polygon(area.rings[0], list(area.rings[1:])) for area in areas],
        kinds=[area.kind for area in areas],
        names=[area.name for area in areas],
        owners=["" if owner is None else str(owner) for owner in owners],
    )


def crossings_of(
    found: Sequence[FoundCrossing],
    declared: Sequence[Crossing] = (),
    *,
    apart_m: float = 15.0,
    line_width_m: float | None = None,
) -> tuple[Crossing, ...]:
    """
    Return what was found as crossings of a leg, less what the planner declared already.

    Those are the lines crossed and the water gone through. Water that is an area has the length
    inside as its width, and takes the place of a river's line in it.

    Parameters
    ----------
    found
        What was found.
    declared
        Declared crossings. One of the same kind on the same leg stands for a found one within its
        own half width and `apart_m`.
    apart_m
        How far a declared crossing may lie off; house rule: the width of a road. [m]
    line_width_m
        How wide a line is, square to it; None: not known. At a slant the leg is longer in it.
        Footpaths have no width. [m]
    """
    return tuple(
        Crossing(
            leg=one.leg,
            name=one.name or _called(one),
            crosses=one.kind,
            ground_mm=(one.start_mm + one.end_mm) // 2,
            width_m=one.length_mm / 1000.0 if one.how == "inside" else _width_m(one, line_width_m),
            lon=one.lon,
            lat=one.lat,
            is_declared=False,
            met=one,
        )
        for one in _got_past(found)
        if not any(_stands_for(known, one, apart_m) for known in declared)
    )


def known_crossings(
    found: Sequence[FoundCrossing], declared: Sequence[Crossing], *, apart_m: float = 15.0
) -> tuple[Crossing, ...]:
    """
    Return declared crossings, each with the nearest found one that it stands for.

    Parameters
    ----------
    found
        What was found.
    declared
        Declared crossings.
    apart_m
        How far a declared crossing may lie off. [m]
    """
    passed = _got_past(found)
    known = []
    for each in declared:
        own = [one for one in passed if _stands_for(each, one, apart_m)]
        nearest = min(own, key=lambda one: _off_mm(each, one), default=None)
        known.append(replace(each, met=nearest))
    return tuple(known)


def not_got_past(found: Sequence[FoundCrossing]) -> tuple[FoundCrossing, ...]:
    """
    Return what legs touch, run along or go through without having to get past it.

    Parameters
    ----------
    found
        What was found.
    """
    return tuple(one for one in found if not _is_physical(one))


def _got_past(found: Sequence[FoundCrossing]) -> list[FoundCrossing]:
    return [one for one in found if _is_physical(one) and not _is_in(one, found)]


def _is_physical(one: FoundCrossing) -> bool:
    return one.kind in _PHYSICAL and one.how in ("crosses", "inside")


def _called(one: FoundCrossing) -> str:
    """Return what a feature without a name is called."""
    return one.kind if one.feature_class in ("", one.kind) else f"{one.feature_class} {one.kind}"


def _width_m(one: FoundCrossing, line_width_m: float | None) -> float | None:
    if line_width_m is None or one.feature_class in _PATHS:
        return None
    slant = np.sin(np.radians(max(one.angle_deg or 90.0, ALONG_ANGLE_DEG)))
    return float(line_width_m / slant)


def _is_in(one: FoundCrossing, found: Sequence[FoundCrossing]) -> bool:
    """Tell whether a line of water is crossed within an area of water."""
    return (
        one.kind == "water"
        and one.how == "crosses"
        and any(
            other.how == "inside"
            and other.kind == "water"
            and other.leg == one.leg
            and other.start_mm <= one.start_mm <= other.end_mm
            for other in found
        )
    )


def _stands_for(known: Crossing, one: FoundCrossing, apart_m: float) -> bool:
    if known.leg != one.leg or known.crosses != one.kind:
        return False
    return _off_mm(known, one) <= 1000.0 * (apart_m + (known.width_m or 0.0) / 2.0)


def _off_mm(known: Crossing, one: FoundCrossing) -> int:
    return max(one.start_mm - known.ground_mm, known.ground_mm - one.end_mm, 0)
