"""Legs and nodes from a joined network."""

from __future__ import annotations

import string
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import replace
from functools import cache

import numpy as np

from routeplan import geodesy
from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.ground.drawn import Drawn, draw_line, joined_drawn, shape_of
from routeplan.ground.heights import height_warnings, heights_from, leg_profile, run_terrain
from routeplan.ground.joining import Network, Piece, chains, join_lines
from routeplan.ground.meeting import met_by
from routeplan.ground.model import Ground, Leg, Millimetres, Node, Stretch
from routeplan.ground.points import place_points
from routeplan.ground.terrain_report import steep_stretches
from routeplan.run.model import Floats, Placement, Run

__all__ = ["lay_ground"]

_SCALE_RATIO = 0.01  # house rule: national grids and UTM zones keep within a third of it


def lay_ground(run: Run) -> Ground:
    """
    Return the nodes and legs of a run, every declared point on them with its ground station.

    Lines without heights that count take those of the run's terrain; crossings are found in its
    layers and areas.

    Parameters
    ----------
    run
        The run as read.

    Raises
    ------
    GeometryError
        If a site or reach point is far from every line, names of legs clash, or a terrain or
        layer cannot be read.
    CrsError
        If the run's grid does not reach a leg.

    References
    ----------
    .. [1] Lengths: `routeplan.geodesy`; joining: `routeplan.ground.joining`; heights:
       `routeplan.ground.terrain_profile`; crossings: `routeplan.ground.crossings`.
    """
    joining = run.practice.joining
    drawn = _drawn_lines(run)
    sites = [place for place in run.places if place.kind == "site"]
    network = join_lines(drawn, sites, joining=joining)
    groups = chains(network)
    nodes, numbers = _nodes(network, groups)
    ends = [(nodes[numbers[group[0].start]], nodes[numbers[group[-1].end]]) for group in groups]
    names = _leg_names(groups, ends)
    laid = [
        _leg(run, f"L{at}", name, pieces=group, ends=(start.id, end.id))
        for at, (name, group, (start, end)) in enumerate(zip(names, groups, ends, strict=True), 1)
    ]
    legs = [leg for leg, _ in laid]
    points = [place for place in run.places if place.kind != "site"]
    legs, nodes, crossings, problems = place_points(run, legs, nodes, points)
    problems = [
        *network.problems,
        *_name_problems(groups, names),
        *_short_problems(groups, legs),
        *problems,
    ]
    if problems:
        raise GeometryError(problems)
    warnings = (
        *network.warnings,
        *(warning for _, own in laid for warning in own),
        *_track_warnings(groups, names),
        *_grid_warnings(legs),
    )
    crossed, all_crossings, beside = met_by(run, legs, crossings)
    return Ground(
        nodes=tuple(nodes),
        legs=crossed,
        crossings=all_crossings,
        beside=beside,
        warnings=warnings,
    )


def _drawn_lines(run: Run) -> list[Drawn]:
    terrain = run_terrain(run)
    return [
        draw_line(
            line,
            track_tolerance_m=run.practice.joining.track_tolerance_m,
            track_heights=run.practice.ground.track_heights,
            terrain=terrain,
            placement=run.placement,
            smooth_wave_m=run.practice.ground.smooth_wave_m,
        )
        for line in run.lines
    ]


def _nodes(
    network: Network, groups: Sequence[Sequence[Piece]]
) -> tuple[list[Node], dict[int, int]]:
    """Return the nodes in run order, and for each junction the place of its node in the list."""
    degree = Counter(j for group in groups for j in (group[0].start, group[-1].end))
    letters = _free_letters({place.name for place in network.sites.values()})
    twins: Counter[str] = Counter()
    numbers: dict[int, int] = {}
    nodes: list[Node] = []
    for junction in (j for group in groups for j in (group[0].start, group[-1].end)):
        if junction in numbers:
            continue
        numbers[junction] = len(nodes)
        place = network.sites.get(junction)
        assumed = place is None and degree[junction] == 1
        name = place.name if place else next(letters) if assumed else f"Node {len(nodes) + 1}"
        twins[name] += 1  # points that were only taken for sites may share a name
        name = name if twins[name] == 1 else f"{name} ({twins[name]})"
        lon, lat = network.junctions[junction]
        nodes.append(
            Node(
                id=f"N{len(nodes) + 1}",
                name=name,
                role=place.role if place else None,
                is_site=place is not None or assumed,
                lon=float(geodesy.wrapped(np.array([lon]))[0]),
                lat=float(lat),
                place=place,
                assumed=assumed,
            )
        )
    return nodes, numbers


def _free_letters(taken: set[str]) -> Iterator[str]:
    """Yield A, B, ... Z, A2, B2, ... less the names that are taken."""
    count = 1
    while True:
        for letter in string.ascii_uppercase:
            name = letter if count == 1 else f"{letter}{count}"
            if name not in taken:
                yield name
        count += 1


def _leg_names(groups: Sequence[Sequence[Piece]], ends: Sequence[tuple[Node, Node]]) -> list[str]:
    """Return each leg's declared name, else its lines' common name, else "start - end"."""
    names = []
    for group, (start, end) in zip(groups, ends, strict=True):
        declared = group[0].drawn.line.leg
        common = {piece.drawn.line.name for piece in group}
        name = (
            declared or (common.pop() if len(common) == 1 else "") or f"{start.name} - {end.name}"
        )
        names.append(name)
    counts = Counter(names)
    seen: Counter[str] = Counter()
    for at, name in enumerate(names):
        if counts[name] > 1 and not groups[at][0].drawn.line.leg:
            seen[name] += 1
            names[at] = f"{name} ({seen[name]})"
    return names


def _name_problems(groups: Sequence[Sequence[Piece]], names: Sequence[str]) -> list[Problem]:
    problems = []
    for name, count in Counter(names).items():
        if count > 1:
            line = next(g for g, n in zip(groups, names, strict=True) if n == name)[0].drawn.line
            problems.append(
                Problem(
                    where=str(line.source),
                    what=f'leg "{name}" is in {count} parts that do not run end to end',
                    remedy="Close the gap between its lines, or give each part its own leg name",
                )
            )
    return problems


def _short_problems(groups: Sequence[Sequence[Piece]], legs: Sequence[Leg]) -> Iterator[Problem]:
    for group, leg in zip(groups, legs, strict=True):
        if leg.length_mm == 0:
            yield Problem(
                where=str(group[0].drawn.line.source),
                what=f'leg "{leg.name}" is shorter than a millimetre',
                value=f"{leg.ellipsoid_m:.3g} m",
                remedy="Take the line out, or check the CRS and the units of its coordinates",
            )


def _leg(
    run: Run, leg_id: str, name: str, *, pieces: Sequence[Piece], ends: tuple[str, str]
) -> tuple[Leg, list[tuple[str, str]]]:
    """Return a leg, and what there is to say of its heights."""
    parts = [piece.drawn for piece in pieces]
    whole = joined_drawn(parts)
    profile = leg_profile(
        whole,
        [(part.line.placement or run.placement, len(part.lonlat) - 1) for part in parts],
    )
    rules = run.practice.ground
    is_turned = geodesy.is_turned(whole.lonlat)
    ground_mm = _whole_millimetres(whole.ground_steps_m, is_turned=is_turned)
    shape, shape_index = shape_of(whole)
    shape_mm = np.interp(shape_index, np.arange(len(ground_mm)), ground_mm)
    grid_m, grid_crs = _grid(run, name, whole.lonlat, middle=_middle(shape, shape_mm))
    leg = Leg(
        id=leg_id,
        name=name,
        start=ends[0],
        end=ends[1],
        lonlat=whole.lonlat,
        heights_m=whole.heights_m,
        is_drawn=whole.is_drawn,
        is_turned=is_turned,
        ground_mm=ground_mm,
        shape_lonlat=shape,
        shape_mm=shape_mm,
        grid_m=grid_m,
        grid_crs=grid_crs,
        ellipsoid_m=float(whole.ellipsoid_steps_m.sum()),
        drawn_ellipsoid_m=whole.drawn_m,
        stretches=_stretches(run, pieces, ground_mm),
        points=(),
        cable=pieces[0].drawn.line.cable,
        steep=steep_stretches(profile, rules.steep_ratio, length_min_m=rules.steep_length_m)
        if profile
        else (),
        heights_from=heights_from(parts),
        smoothed_off_m=whole.smoothed_off_m,
    )
    return leg, list(height_warnings(leg, profile, has_terrain=whole.state is not None))


def _whole_millimetres(ground_steps_m: Floats, *, is_turned: bool) -> Millimetres:
    """
    Return the ground station of every vertex.

    The running sum is rounded in the canonical direction, so that a line drawn the other way
    gets the mirrored stations to the millimetre.
    """
    steps = ground_steps_m[::-1] if is_turned else ground_steps_m
    reach = np.concatenate([[0.0], np.cumsum(steps)])
    whole = np.rint(reach * 1000.0).astype(np.int64)
    return np.asarray(whole[-1] - whole[::-1]) if is_turned else whole


def _middle(shape: Floats, shape_mm: Floats) -> tuple[float, float]:
    """Return the position half-way along a leg."""
    lon, lat = (np.interp(0.5 * shape_mm[-1], shape_mm, shape[:, axis]) for axis in (0, 1))
    return float(lon), float(lat)


def _grid(run: Run, name: str, lonlat: Floats, *, middle: tuple[float, float]) -> tuple[float, str]:
    crs = run.crs
    if crs is None or not _is_projected(crs):
        crs = geodesy.utm_crs(*middle)
    grid_m = geodesy.grid_length_m(lonlat, crs)
    if not np.isfinite(grid_m) and run.crs == crs:
        raise CrsError(
            Problem(
                where=f'leg "{name}"',
                what=f"the grid {crs} does not reach it",
                remedy="Name a projected CRS of the region, or leave crs out",
            )
        )
    return (grid_m if np.isfinite(grid_m) else float("nan")), crs


@cache
def _is_projected(crs: str) -> bool:
    import pyproj

    return bool(pyproj.CRS.from_user_input(crs).is_projected)


def _stretches(run: Run, pieces: Sequence[Piece], ground_mm: Millimetres) -> tuple[Stretch, ...]:
    """Return the leg's stretches; neighbours of one placement are one, but existing spans stay."""
    stretches: list[Stretch] = []
    at = 0
    for piece in pieces:
        begin, at = at, at + len(piece.drawn.lonlat) - 1
        line = piece.drawn.line
        placement = line.placement or run.placement
        span = (int(ground_mm[begin]), int(ground_mm[at]))
        last = stretches[-1] if stretches else None
        if last and last.placement == placement and placement != "existing":
            stretches[-1] = replace(last, end_mm=span[1])
        else:
            stretches.append(
                Stretch(
                    placement=placement,
                    start_mm=span[0],
                    end_mm=span[1],
                    existing_m=_shared(line.existing_m, piece, placement),
                    existing_db=_shared(line.existing_db, piece, placement),
                )
            )
    return tuple(stretches)


def _shared(value: float | None, piece: Piece, placement: Placement) -> float | None:
    """Return what a declared whole of an existing line comes to on one piece of it."""
    if value is None or placement != "existing":
        return None
    return value * piece.drawn.share


def _track_warnings(
    groups: Sequence[Sequence[Piece]], names: Sequence[str]
) -> Iterator[tuple[str, str]]:
    for group, name in zip(groups, names, strict=True):
        flat = sum(float(piece.drawn.ellipsoid_steps_m.sum()) for piece in group)
        drawn = sum(piece.drawn.drawn_m for piece in group)
        if drawn - flat > 1e-6 * drawn:
            yield (
                f'leg "{name}"',
                f"its track measured {drawn:.1f} m and {flat:.1f} m once thinned; the thinned "
                "length is used",
            )


def _grid_warnings(legs: Sequence[Leg]) -> Iterator[tuple[str, str]]:
    for leg in legs:
        excess = leg.grid_m / leg.ellipsoid_m - 1.0 if leg.ellipsoid_m else 0.0
        if abs(excess) > _SCALE_RATIO:
            yield (
                f'leg "{leg.name}"',
                f"its length in the grid {leg.grid_crs} is {100 * excess:+.1f} % off the true one; "
                "that grid is no measure here, and nothing is ordered by it",
            )
