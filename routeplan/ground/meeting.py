"""What a run's legs meet: its layers read, its areas, and its crossings put on the legs."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path

from routeplan.errors import GeometryError, InputError, Problem
from routeplan.ground.feature_files import Box, box_around, is_osm, read_features, read_osm
from routeplan.ground.features import FeatureLayer
from routeplan.ground.model import Crossing, FoundCrossing, Leg
from routeplan.run.model import LayerSource, Run

__all__ = ["met_by"]


def met_by(
    run: Run, legs: Sequence[Leg], declared: Sequence[Crossing]
) -> tuple[tuple[Leg, ...], tuple[Crossing, ...], tuple[FoundCrossing, ...]]:
    """
    Return legs with their crossings, all crossings, and what else legs meet.

    Parameters
    ----------
    run
        The run, with its layers and areas.
    legs
        Its legs.
    declared
        The crossings that its geometry declares, in the order of the file.

    Raises
    ------
    GeometryError
        If a layer cannot be read.
    """
    found = _found(run, legs)
    crossings = [*declared]
    beside: tuple[FoundCrossing, ...] = ()
    if found:
        from routeplan.ground.crossings import crossings_of, known_crossings, not_got_past

        width_m = run.practice.ground.crossing_width_m
        crossings = [
            *known_crossings(found, declared),
            *crossings_of(found, declared, line_width_m=width_m or None),
        ]
        beside = not_got_past(found)
    placed = tuple(
        replace(leg, crossings=tuple(sorted(own, key=_station_order)))
        for leg in legs
        for own in ([one for one in crossings if one.leg == leg.id],)
    )
    return placed, tuple(crossings), beside


def _station_order(one: Crossing) -> tuple[int, float, float, str]:
    return one.ground_mm, one.lon, one.lat, one.name


def _found(run: Run, legs: Sequence[Leg]) -> tuple[FoundCrossing, ...]:
    if not run.layers and not run.areas:
        return ()
    from routeplan.ground.crossings import areas_layer, find_crossings

    rules = run.practice.ground
    layers = list(_layers(run, legs))
    if run.areas:
        layers.insert(0, areas_layer(run.areas))
    return find_crossings(
        legs,
        layers,
        along_distance_m=rules.along_distance_m,
        along_length_m=rules.along_length_m,
    )


def _layers(run: Run, legs: Sequence[Leg]) -> Iterator[FeatureLayer]:
    """Yield the layers near the legs; raise all that is wrong with any of them together."""
    box = box_around(legs)
    problems: list[Problem] = []
    for source in run.layers:
        try:
            yield from _read(source, run, box)
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise GeometryError(problems)


def _read(source: LayerSource, run: Run, box: Box | None) -> tuple[FeatureLayer, ...]:
    path, columns = Path(source.path), source.columns
    if is_osm(path):
        if columns.model_fields_set - {"file"}:
            remedy = "Name it under layers, or leave file alone"
            what = "is an OpenStreetMap extract, whose tags say what its features are"
            raise GeometryError(Problem(where=source.file, what=what, remedy=remedy))
        return read_osm(path, box=box)
    named = {
        "kind": columns.kind_column,
        "class": columns.class_column,
        "name": columns.name_column,
        "owner": columns.owner_column,
    }
    layer = read_features(
        path,
        layer=source.layer,
        kind=columns.kind,
        columns={key: column for key, column in named.items() if column},
        kinds=columns.kinds,
        crs=run.crs,
        box=box,
    )
    return (layer,)
