"""Ways of legs along streets: found, and put among the lines and places of a run."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

import numpy as np

from routeplan.errors import InputError, Problem, RouteplanError
from routeplan.geodesy import WGS84_INVERSE_FLATTENING, WGS84_SEMI_MAJOR_M
from routeplan.memo import Memo, remembered
from routeplan.run.defaults import AssumedValue
from routeplan.run.model import Line, Place, Run, Source, StreetFiles
from routeplan.run.street_rules import LegOrder, stop_problems

if TYPE_CHECKING:
    from routeplan.run.datum import PlacedShape
    from routeplan.streets.costs import Prices
    from routeplan.streets.model import Network, SeparateWays
    from routeplan.streets.output import NamedWay

__all__ = ["RoutedPair", "RoutedRun", "routed_run"]

_KEY = "leg "  # how the key of a source begins that is a leg found along streets


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RoutedPair:
    """Two legs found together: their names, the sites they join, and the two ways."""

    main: str
    standby: str
    start: str
    end: str
    ways: SeparateWays


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RoutedRun:
    """A run whose legs along streets are lines, the pairs among them, and what that assumes."""

    run: Run
    pairs: tuple[RoutedPair, ...] = ()
    assumed: tuple[AssumedValue, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Found:
    """What one search found: one way, or two that were found together."""

    named: tuple[NamedWay, ...]
    pair: RoutedPair | None = None


def routed_run(run: Run, *, memo: Memo | None = None) -> RoutedRun:
    """
    Return a run with the ways of its legs along streets among its lines and places.

    Routing a run again that was routed before gives the same.

    Parameters
    ----------
    run
        What was declared.
    memo
        Where the network and the ways are kept from one plan to the next.

    Raises
    ------
    InputError
        With everything that keeps legs from their ways: streets that cannot be read, prices that
        are none, sites without a street, no way, or no two separate ones.
    """
    if not run.legs:
        return RoutedRun(run=run)
    assert run.streets is not None
    streets, sites = run.streets, {each.name: each for each in run.places if each.kind == "site"}
    problems = list(stop_problems(run.legs, list(sites)))
    _raise_any(problems)
    network_key = _network_key(streets, run.crs)
    prices_key = ("prices", network_key, *_price_inputs(run, streets))
    with _telling("streets", problems):
        network = remembered(memo, network_key, lambda: _network(streets, run.crs))
        prices = remembered(memo, prices_key, lambda: _prices(run, streets, network))
    _raise_any(problems)
    found, keys = [], []
    for search in _searches(run.legs):
        stops = _stops(search[0], sites)
        key = ("ways", prices_key, streets.rules, search, stops)
        with _telling(_leg_key(search[-1].name), problems):
            compute = partial(_ways, streets, network, prices, search, stops)
            found.append(remembered(memo, key, compute))
            keys.append(key)
    _raise_any(problems)
    file = ", ".join(each.file for each in streets.streets)
    named = [way for each in found for way in each.named]
    drawn = remembered(memo, ("drawn", file, *keys), lambda: _drawn(named, file=file))
    return RoutedRun(
        run=_with_ways(run, *drawn, network.notes),
        pairs=tuple(each.pair for each in found if each.pair),
        assumed=tuple(_assumed(streets, named)),
    )


def _raise_any(problems: Sequence[Problem]) -> None:
    if problems:
        raise InputError(problems)


@contextmanager
def _telling(where: str, problems: list[Problem]) -> Iterator[None]:
    """Note what goes wrong within, as a fault of that part of the run file."""
    try:
        yield
    except RouteplanError as error:
        problems.extend(
            replace(problem, where=f"{where}, {problem.where}" if problem.where else where)
            for problem in error.problems
        )


def _network_key(streets: StreetFiles, crs: str | None) -> tuple[object, ...]:
    rules = streets.rules
    options = (rules.existing_placement, rules.node_lines, crs)
    return ("streets", streets.streets, streets.existing, *options)


def _network(streets: StreetFiles, crs: str | None) -> Network:
    from routeplan.streets.reading import StreetSource, read_network

    rules = streets.rules
    source = StreetSource(
        streets=tuple(Path(file.path) for file in streets.streets),
        existing=tuple(Path(file.path) for file in streets.existing),
        existing_placement=rules.existing_placement,
        crs=crs,
        noded=rules.node_lines,
    )
    return read_network(source)


def _price_inputs(run: Run, streets: StreetFiles) -> tuple[object, ...]:
    rules = streets.rules
    rings = [area.rings for area in run.areas if area.kind == "avoid"]
    return (dict(rules.costs), rules.placement, streets.avoid, streets.keep_to, run.crs, rings)


def _prices(run: Run, streets: StreetFiles, network: Network) -> Prices:
    from routeplan.streets.costs import Zones, prices_of, street_costs
    from routeplan.streets.layers import read_polygons

    avoid, keep_to = (
        [ring for file in files for ring in read_polygons(Path(file.path), crs=run.crs)]
        for files in (streets.avoid, streets.keep_to)
    )
    avoid += [area.rings for area in run.areas if area.kind == "avoid"]
    zones = Zones(avoid=tuple(avoid), keep_to=tuple(keep_to)) if avoid or keep_to else None
    costs = street_costs(streets.rules.costs, streets.rules.placement)
    return prices_of(network, costs, zones=zones)


def _searches(legs: Sequence[LegOrder]) -> Iterator[tuple[LegOrder, ...]]:
    """Yield what is found together: a leg, or a leg and the one kept separate from it."""
    standby = {leg.separate_from: leg for leg in legs if leg.separate_from is not None}
    for leg in legs:
        if leg.separate_from is None:
            yield (leg, standby[leg.name]) if leg.name in standby else (leg,)


def _stops(leg: LegOrder, sites: Mapping[str, Place]) -> list[tuple[str, float, float]]:
    places = (sites[str(name)] for name in (leg.from_, *leg.through, leg.to))
    return [(place.name, place.lon, place.lat) for place in places]


def _ways(
    streets: StreetFiles,
    network: Network,
    prices: Prices,
    search: Sequence[LegOrder],
    stops: Sequence[tuple[str, float, float]],
) -> _Found:
    from routeplan.streets.best import best_way
    from routeplan.streets.output import NamedWay
    from routeplan.streets.reach import reach_points
    from routeplan.streets.separate import separate_ways

    rules = streets.rules
    more: dict[str, Any] = {"prices": prices}
    if rules.off_street_max_m is not None:
        more["off_street_max_m"] = rules.off_street_max_m
    pair = None
    if len(search) == 1:
        ways = [best_way(network, stops, **more)]
    else:
        both = separate_ways(
            network,
            stops,
            apart=rules.apart,
            share="least" if rules.share_least else "never",
            distance_m=rules.apart_m,
            **more,
        )
        ways = [both.main, both.standby]
        pair = RoutedPair(
            main=search[0].name,
            standby=search[1].name,
            start=stops[0][0],
            end=stops[-1][0],
            ways=both,
        )
    named = (
        NamedWay(name=leg.name, way=way, reach=reach_points(network, way))
        for leg, way in zip(search, ways, strict=True)
    )
    return _Found(named=tuple(named), pair=pair)


def _with_ways(
    run: Run, lines: Sequence[Line], places: Sequence[Place], notes: Sequence[tuple[str, str]]
) -> Run:
    """Return the run with ways as lines and places, in place of those it may have already."""
    return replace(
        run,
        lines=(*(line for line in run.lines if not _is_found(line.source)), *lines),
        places=(*(place for place in run.places if not _is_found(place.source)), *places),
        warnings=(*run.warnings, *(note for note in notes if note not in run.warnings)),
    )


def _leg_key(name: str) -> str:
    return f'{_KEY}"{name}"'


def _is_found(source: Source) -> bool:
    return source.key is not None and source.key.startswith(_KEY)


def _drawn(named: Sequence[NamedWay], *, file: str) -> tuple[list[Line], list[Place]]:
    """Return the lines and places that a geometry file of the same ways would hold."""
    from routeplan.run.attributes import line_from, place_from
    from routeplan.run.trouble import Trouble
    from routeplan.streets.output import way_features

    lines: list[Line] = []
    places: list[Place] = []
    trouble = Trouble()
    for number, each in enumerate(named):
        source = Source(file=file, key=_leg_key(each.name))
        others = [other.way.lonlat for at, other in enumerate(named) if at != number]
        for feature in cast("list[dict[str, Any]]", way_features(each, others)):
            placed = _placed(feature, source)
            if placed.shape.kind == "line":
                line = line_from(placed, loose=False, placement="duct", trouble=trouble)
                lines.extend([line] if line else [])
            else:
                places.append(place_from(placed, number=0, loose=False, trouble=trouble))
    trouble.raise_if_any()
    return lines, places


def _placed(feature: Mapping[str, Any], source: Source) -> PlacedShape:
    """Return a feature in WGS 84 on the earth."""
    from routeplan.run.datum import PlacedShape
    from routeplan.run.shapes import Shape, frozen

    lonlat = frozen(np.atleast_2d(np.array(feature["geometry"]["coordinates"], dtype=float)))
    is_line = feature["geometry"]["type"] == "LineString"
    shape = Shape(
        kind="line" if is_line else "point",
        xy=lonlat,
        z=None,
        properties=feature["properties"],
        source=source,
    )
    return PlacedShape(
        shape=shape,
        lonlat=lonlat,
        datum_lonlat=lonlat,
        heights_m=None,
        is_drawn=None,
        semi_major_m=WGS84_SEMI_MAJOR_M,
        inverse_flattening=WGS84_INVERSE_FLATTENING,
    )


def _assumed(streets: StreetFiles, named: Sequence[NamedWay]) -> Iterator[AssumedValue]:
    """Yield what the ways rest on that nobody said or has looked at."""
    from routeplan.streets.reach import stretches

    rules = streets.rules
    yield AssumedValue(
        name="streets.costs",
        value=f"{len(rules.costs)} of them given" if rules.costs else "none given",
        unit="",
        source="table street_costs",
        reason="ratios that compare ways, no prices: another way may be the cheapest to build",
    )
    for each in named:
        placements = list(dict.fromkeys(placement for placement, _, _ in stretches(each.way)))
        if rules.placement is None:
            yield AssumedValue(
                name=f"placement along leg {each.name}",
                value=", ".join(placements),
                unit="",
                source="table street_costs, by road class",
                reason="nobody has said how cable lies along these streets",
            )
        yield AssumedValue(
            name=f"reach points of leg {each.name}",
            value=len(each.reach),
            unit="places",
            source="streets: mapped poles and manholes, junctions, even spacing",
            reason="put there by rule; find real ones on the ground",
        )
