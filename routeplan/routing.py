"""From an order of ways to files: the ways found, each planned, compared and drawn."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from routeplan.errors import InputError, Problem, RouteplanError

if TYPE_CHECKING:
    from routeplan.route_options import RouteOrder, Stop
    from routeplan.streets.costs import Prices
    from routeplan.streets.model import Network, Tree, Way
    from routeplan.streets.output import NamedWay, SiteMark

__all__ = ["Routed", "find_ways", "routed_text"]

_OSM = (".osm", ".pbf", ".bz2", ".graphml")
_ATTRIBUTION = "Streets © OpenStreetMap contributors, Open Database License 1.0."


@dataclass(frozen=True, slots=True, kw_only=True)
class Routed:
    """What was found and written: `document` is what `--json` prints."""

    document: dict[str, Any]
    paths: tuple[Path, ...]
    warnings: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Answer:
    """The ways in groups of one geometry file each, and what is to be said of them."""

    groups: list[list[NamedWay]]
    facts: dict[str, Any]
    warnings: list[tuple[str, str]]
    exposures: tuple[Any, ...] = ()


def find_ways(order: RouteOrder, *, on_step: Callable[[str], None] = lambda _: None) -> Routed:
    """
    Find the ways of an order and write them.

    Parameters
    ----------
    order
        What is wanted.
    on_step
        Told the name of each step as it begins.

    Raises
    ------
    InputError
        If something given is wrong, or a file is there already.
    InfeasibleError
        If there is no such way.
    """
    _check_free(order)
    on_step("reading streets")
    network, attribution = _network(order)
    on_step("finding ways")
    prices = _prices(order, network)
    answer = _answer(order, network, prices)
    marks = _marks(order.stops)
    texts = _texts(order, answer.groups, marks)
    rows = _rows(answer.groups)
    if order.is_planned:
        on_step("planning ways")
        _add_plans(rows, answer.groups, marks)
    if order.is_drawn:
        on_step("drawing")
        texts[_map_path(order)] = _page(order, network, answer, attribution)
    paths = _written(texts)
    document = {
        "sites": [{"name": s.name, "lon": s.lon, "lat": s.lat} for s in order.stops],
        "ways": rows,
        **answer.facts,
        "files": [str(path) for path in paths],
        "attribution": attribution,
    }
    warnings = [*network.notes, *answer.warnings]
    return Routed(document=document, paths=tuple(paths), warnings=tuple(warnings))


def _network(order: RouteOrder) -> tuple[Network, str]:
    from routeplan.streets.reading import StreetSource, read_network

    streets = order.streets
    if order.request is not None:
        from routeplan.streets.download import download_streets

        folder = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache") / "routeplan"
        streets = (download_streets(order.request, folder, deadline_s=order.deadline_s),)
    source = StreetSource(
        streets=streets,
        existing=order.existing,
        existing_placement=order.existing_placement,
        crs=order.crs,
        noded=order.is_noded,
    )
    is_osm = any(path.suffix.lower() in _OSM for path in streets)
    return read_network(source), _ATTRIBUTION if is_osm else ""


def _prices(order: RouteOrder, network: Network) -> Prices:
    from routeplan.streets.costs import Zones, prices_of, street_costs

    costs = street_costs(order.costs, order.placement)
    zones = None
    if order.avoid or order.keep_to:
        from routeplan.streets.layers import read_polygons

        zones = Zones(
            avoid=tuple(p for path in order.avoid for p in read_polygons(path, crs=order.crs)),
            keep_to=tuple(p for path in order.keep_to for p in read_polygons(path, crs=order.crs)),
        )
    return prices_of(network, costs, zones=zones)


def _answer(order: RouteOrder, network: Network, prices: Prices) -> _Answer:
    sites = [(stop.name, stop.lon, stop.lat) for stop in order.stops]
    more: dict[str, Any] = {"prices": prices, "off_street_max_m": order.off_street_max_m}
    if order.is_tree:
        from routeplan.streets.tree import site_tree

        return _tree_answer(network, site_tree(network, sites, **more), _marks(order.stops))
    if order.separate is not None:
        return _pair_answer(order, network, sites, more)
    if order.way_count > 1:
        from routeplan.streets.others import other_ways

        found = other_ways(network, sites, count=order.way_count, **more)
        ways = [("Best way", found.ways[0])]
        ways += [(f"Way {number}", way) for number, way in enumerate(found.ways[1:], start=2)]
        short = len(found.ways) < order.way_count
        limit = f"{found.overlap_max_ratio:.0%} of any earlier one"
        said = f"only {len(found.ways)} ways share less than {limit}: no more are offered"
        return _Answer(
            groups=[[_named(network, name, way)] for name, way in ways],
            facts={"overlap_ratios": list(found.overlap_ratios)},
            warnings=[("ways", said)] if short else [],
        )
    from routeplan.streets.best import best_way

    way = best_way(network, sites, **more)
    return _Answer(groups=[[_named(network, "Way", way)]], facts={}, warnings=[])


def _pair_answer(
    order: RouteOrder, network: Network, sites: list[tuple[str, float, float]], more: dict[str, Any]
) -> _Answer:
    from dataclasses import asdict

    from routeplan.streets.separate import separate_ways

    assert order.separate is not None
    found = separate_ways(
        network, sites, apart=order.separate, share=order.share, distance_m=order.apart_m, **more
    )
    facts = {
        "rule": found.rule,
        "is_exact": found.is_exact,
        "cost": found.cost,
        "distance_m": found.distance_m,
        "exposures": [asdict(each) for each in found.exposures],
        "bottlenecks": [asdict(each) for each in found.bottlenecks],
    }
    pair = [("Main", found.main), ("Standby", found.standby)]
    return _Answer(
        groups=[[_named(network, name, way) for name, way in pair]],
        facts=facts,
        warnings=[],
        exposures=found.exposures,
    )


def _tree_answer(network: Network, tree: Tree, marks: Sequence[SiteMark]) -> _Answer:
    from routeplan.streets.output import tree_ways

    facts = {
        "is_exact": tree.is_exact,
        "guarantee_ratio": tree.guarantee_ratio,
        "cost": tree.cost,
        "length_m": tree.length_m,
    }
    named = [_named(network, name, way) for name, way in tree_ways(tree, marks)]
    said = f"its cost is at most {tree.guarantee_ratio:.2f} times the least: not proven least"
    return _Answer(groups=[named], facts=facts, warnings=[] if tree.is_exact else [("tree", said)])


def _named(network: Network, name: str, way: Way) -> NamedWay:
    from routeplan.streets.output import NamedWay
    from routeplan.streets.reach import reach_points

    return NamedWay(name=name, way=way, reach=reach_points(network, way))


def _marks(stops: Sequence[Stop]) -> list[SiteMark]:
    from routeplan.streets.output import SiteMark

    return [SiteMark(name=s.name, lon=s.lon, lat=s.lat, role=s.role) for s in stops]


def _paths(order: RouteOrder) -> list[Path]:
    """Return every file the order may write."""
    out = order.out
    more = [out.with_name(f"{out.stem}_{n}{out.suffix}") for n in range(2, order.way_count + 1)]
    return [out, *more, *([_map_path(order)] if order.is_drawn else [])]


def _map_path(order: RouteOrder) -> Path:
    return order.out.with_name(f"{order.out.stem}_map.html")


def _check_free(order: RouteOrder) -> None:
    """Raise if a file to be written is there already."""
    taken = [path for path in _paths(order) if path.exists()]
    if taken and not order.is_forced:
        remedy = "Choose another file with --out, or write over it with --force."
        raise InputError(
            [Problem(where=str(path), what="is there already", remedy=remedy) for path in taken]
        )


def _texts(
    order: RouteOrder, groups: Sequence[Sequence[NamedWay]], marks: Sequence[SiteMark]
) -> dict[Path, str]:
    from routeplan.streets.output import collection_of, collection_text

    return {
        path: collection_text(collection_of(group, marks))
        for path, group in zip(_paths(order), groups, strict=False)
    }


def _rows(groups: Sequence[Sequence[NamedWay]]) -> list[dict[str, Any]]:
    from routeplan.streets.output import rows_of

    return rows_of([named for group in groups for named in group])


def _add_plans(
    rows: list[dict[str, Any]],
    groups: Sequence[Sequence[NamedWay]],
    marks: Sequence[SiteMark],
) -> None:
    """Add to each row what planning its way with all defaults gives."""
    from routeplan.streets.output import collection_of, collection_text

    flat = [named for group in groups for named in group]
    with tempfile.TemporaryDirectory() as folder:
        for number, (row, named) in enumerate(zip(rows, flat, strict=True)):
            file = Path(folder) / f"way_{number}.geojson"
            ends = (named.way.lonlat[0], named.way.lonlat[-1])
            own = [
                mark
                for mark in marks
                if any(abs(mark.lon - e[0]) + abs(mark.lat - e[1]) < 1e-5 for e in ends)
            ]
            ends_m = (0.0, named.way.length_m)  # as one leg, from end to end
            whole = replace(named, way=replace(named.way, via_m=ends_m))
            file.write_text(collection_text(collection_of([whole], own)), "utf-8")
            row.update(_planned(file))


def _planned(file: Path) -> dict[str, Any]:
    from routeplan.planning import plan
    from routeplan.run import read_run

    try:
        planned = plan(read_run(file))
    except RouteplanError as error:
        return {"not_planned": str(error.problems[0])}
    lines = {
        f"nominal_{budget.wavelength_nm:.0f}_db": budget.nominal_db
        for circuit in planned.circuits
        for budget in circuit.budgets
        if budget.direction == "from-to"
    }
    layout = planned.layout
    return {
        "sheath_m": sum(int(each.rulers.sheath_mm[-1]) for each in planned.laid) / 1000,
        "glass_m": sum(int(each.rulers.glass_mm[-1]) for each in planned.laid) / 1000,
        "joint_count": len(layout.joints),
        **lines,
    }


def _page(order: RouteOrder, network: Network, answer: _Answer, attribution: str) -> str:
    from routeplan.streets.drawing import ways_page

    names = [stop.name for stop in order.stops]
    return ways_page(
        network,
        [named for group in answer.groups for named in group],
        _marks(order.stops),
        title=f"Ways from {names[0]} to {names[-1]}",
        attribution=attribution,
        exposures=answer.exposures,
    )


def _written(texts: dict[Path, str]) -> list[Path]:
    """Write every text whole, or none of the file it is for."""
    for path, text in texts.items():
        part = path.with_name(f".{path.name}.part")
        try:
            part.write_text(text, "utf-8", errors="replace")
            part.replace(path)
        except OSError as error:
            with contextlib.suppress(OSError):
                part.unlink(missing_ok=True)
            raise InputError(
                Problem(
                    where=str(path),
                    what="cannot be written",
                    value=error.strerror or str(error),
                    remedy="Choose another file with --out.",
                )
            ) from None
    return list(texts)


def routed_text(routed: Routed) -> str:
    """
    Return what was found as lines to read: a row a way, then what two ways have in common.

    Parameters
    ----------
    routed
        What was found.
    """
    rows = routed.document["ways"]
    columns = [
        ("way", [str(row["name"]) for row in rows], "<"),
        ("metres", [f"{row['length_m']:,.0f}" for row in rows], ">"),
        ("cost", [f"{row['cost']:,.0f}" for row in rows], ">"),
        ("rail", [str(row["rail_crossing_count"]) for row in rows], ">"),
        ("water", [str(row["water_crossing_count"]) for row in rows], ">"),
        ("motorway", [str(row["motorway_crossing_count"]) for row in rows], ">"),
        ("bridge m", [f"{row['bridge_m']:,.0f}" for row in rows], ">"),
    ]
    if any("joint_count" in row for row in rows):
        columns.append(("joints", [str(row.get("joint_count", "-")) for row in rows], ">"))
        keys = sorted({key for row in rows for key in row if key.startswith("nominal_")})
        for key in keys:
            title = f"dB at {key.split('_')[1]}"
            columns.append((title, [_db(row.get(key)) for row in rows], ">"))
    widths = [max(len(title), *map(len, cells)) for title, cells, _ in columns]
    lines = [_line([title for title, _, _ in columns], columns, widths)]
    lines.extend(
        _line([cells[number] for _, cells, _ in columns], columns, widths)
        for number in range(len(rows))
    )
    lines += _exposure_lines(routed.document)
    lines += [f"wrote {path}" for path in routed.paths]
    if routed.document["attribution"]:
        lines.append(routed.document["attribution"])
    return "\n".join(lines)


def _db(value: float | None) -> str:
    return "-" if value is None else f"{value:.2f}"


def _line(
    cells: Sequence[str], columns: Sequence[tuple[str, list[str], str]], widths: Sequence[int]
) -> str:
    aligned = (
        f"{cell:{align}{width}}"
        for cell, (_, _, align), width in zip(cells, columns, widths, strict=True)
    )
    return "  ".join(aligned).rstrip()


def _exposure_lines(document: dict[str, Any]) -> list[str]:
    if "exposures" not in document:
        return []
    lines = ["", f"{document['rule']}."]
    if document["exposures"]:
        lines.append(f"Both could be cut at once (within {document['distance_m']:g} m):")
    for each in document["exposures"]:
        nearest = f", {each['nearest_m']:.0f} m apart" if each["kind"] == "near" else ""
        place = f"{each['lon']:.5f}, {each['lat']:.5f}"
        lines.append(
            f"  {each['from_m']:7,.0f} m  {each['length_m']:6,.0f} m  {each['kind']:8}  "
            f"{each['name']}{' (bridge)' if each['is_bridge'] else ''}{nearest}, at {place}"
        )
    return [*lines, ""]
