"""Lines joined into a network: ends that meet, sites on them, and the pieces between nodes."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import Problem
from routeplan.geodesy import wrapped
from routeplan.ground.drawn import Drawn, along_m, cut_drawn, reversed_drawn, shape_of
from routeplan.ground.locate import Hit, LineIndex, index_lines, near_lines, within_pairs
from routeplan.ground.sites import take_sites
from routeplan.run.model import Floats, Place
from routeplan.run.practice import Joining

__all__ = ["Network", "Piece", "chains", "join_lines"]

_STRAIGHT_BACK = 1e-3  # house rule: tangent of the angle to its own way that no bend has
_GAP_LOOK_M = 25.0  # house rule: nearer than this, two ends that do not meet look like a slip


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Piece:
    """Part of a drawn line between two junctions."""

    drawn: Drawn
    start: int
    end: int


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Network:
    """Pieces and the junctions they meet at; `sites` names the site at a junction."""

    pieces: tuple[Piece, ...]
    junctions: Floats
    sites: dict[int, Place]
    problems: tuple[Problem, ...]
    warnings: tuple[tuple[str, str], ...]


def join_lines(drawn: Sequence[Drawn], sites: Sequence[Place], *, joining: Joining) -> Network:
    """
    Join measured lines where their ends meet, and cut them where a site or another line's end is.

    Parameters
    ----------
    drawn
        The lines.
    sites
        Declared sites; each takes the nearest line end within `site_distance_max_m`, else the
        nearest place on a line.
    joining
        The tolerances of the run.
    """
    lines = index_lines([shape_of(line) for line in drawn])
    ends = np.array([line.lonlat[at] for line in drawn for at in (0, -1)])
    lengths_m = [float(line.ellipsoid_steps_m.sum()) for line in drawn]
    cluster = _clusters(ends, lengths_m, tolerance_m=joining.join_tolerance_m)
    cuts: dict[int, list[tuple[float, int]]] = defaultdict(list)
    _cut_at_ends(lines, drawn, ends, cluster=cluster, cuts=cuts, joining=joining)
    junctions = _junction_positions(ends, cluster)
    taken, problems, warnings = take_sites(
        lines, drawn, sites, ends=ends, cluster=cluster, joining=joining
    )
    named: dict[int, Place] = {}
    for place, where in taken:
        if isinstance(where, Hit):
            junctions = np.vstack([junctions, _position(drawn[where.line], where.index)])
            junction = len(junctions) - 1
            cuts[where.line].append((where.index, junction))
        else:
            junction = where
        named[junction] = place
    pieces = tuple(
        piece
        for number, line in enumerate(drawn)
        for piece in _pieces(
            line,
            cuts=sorted(cuts.get(number, [])),
            start=int(cluster[2 * number]),
            end=int(cluster[2 * number + 1]),
        )
    )
    pieces, short = _without_stubs(pieces, tolerance_m=joining.join_tolerance_m)
    warnings.extend(short)
    warnings.extend(_gaps(lines, pieces, junctions, named=named, joining=joining))
    doubled = _doubled_back(drawn)
    warnings.extend(doubled)
    warnings.extend(_turned_back(drawn, {where for where, _ in doubled}))
    return Network(
        pieces=pieces,
        junctions=junctions,
        sites=named,
        problems=tuple(problems),
        warnings=tuple(warnings),
    )


def _clusters(ends: Floats, lengths_m: Sequence[float], *, tolerance_m: float) -> list[int]:
    """Return for each line end the number of the junction it belongs to."""
    parent = list(range(len(ends)))

    def root(at: int) -> int:
        while parent[at] != at:
            parent[at] = parent[parent[at]]
            at = parent[at]
        return at

    for first, second in within_pairs(ends, radius_m=tolerance_m):
        # A line hardly longer than the tolerance is no ring.
        if first // 2 != second // 2 or lengths_m[first // 2] > 2 * tolerance_m:
            low, high = sorted((root(first), root(second)))
            parent[high] = low
    numbers: dict[int, int] = {}
    return [numbers.setdefault(root(at), len(numbers)) for at in range(len(ends))]


def _junction_positions(ends: Floats, cluster: Sequence[int]) -> Floats:
    """Return for each junction its first end by longitude and latitude: the same however drawn."""
    positions = np.zeros((max(cluster) + 1, 2))
    for at in np.lexsort((ends[:, 1], ends[:, 0]))[::-1].tolist():
        positions[cluster[at]] = ends[at]
    return positions


def _cut_at_ends(
    lines: LineIndex,
    drawn: Sequence[Drawn],
    ends: Floats,
    *,
    cluster: list[int],
    cuts: dict[int, list[tuple[float, int]]],
    joining: Joining,
) -> None:
    """
    Note a cut on every line that another line's end touches between its own ends.

    Where that is no farther along the line than the tolerance from a junction it has already,
    the two junctions become one.
    """
    radius = np.full(len(ends), joining.join_tolerance_m)
    for end, hits in enumerate(near_lines(lines, ends, radius_m=radius)):
        for hit in hits:
            number, line, here = hit.line, drawn[hit.line], cluster[end]
            own_ends = ((0.0, cluster[2 * number]), (np.inf, cluster[2 * number + 1]))
            known = [*own_ends, *cuts[number]]
            if any(junction == here for _, junction in known):
                continue
            reached_m = along_m(line, hit.index)
            near = [
                junction
                for index, junction in known
                if abs(along_m(line, index) - reached_m) <= joining.join_tolerance_m
            ]
            if near:
                _merge(cluster, cuts, old=here, new=near[0])
            else:
                cuts[number].append((hit.index, here))


def _merge(
    cluster: list[int], cuts: dict[int, list[tuple[float, int]]], *, old: int, new: int
) -> None:
    """Make two junctions one."""
    cluster[:] = [new if junction == old else junction for junction in cluster]
    for number, known in cuts.items():
        cuts[number] = [(index, new if at == old else at) for index, at in known]


def _without_stubs(
    pieces: Sequence[Piece], *, tolerance_m: float
) -> tuple[tuple[Piece, ...], list[tuple[str, str]]]:
    """Leave out pieces that begin and end in one junction and are no longer than its size."""
    kept, warnings = [], []
    for piece in pieces:
        length_m = float(piece.drawn.ellipsoid_steps_m.sum())
        if piece.start == piece.end and length_m <= 2 * tolerance_m:
            text = f"{length_m:.2f} m of it lie within join_tolerance_m of one node: left out"
            warnings.append((str(piece.drawn.line.source), text))
        else:
            kept.append(piece)
    return (tuple(kept), warnings) if kept else (tuple(pieces), [])


def _position(drawn: Drawn, index: float) -> Floats:
    shape, shape_index = shape_of(drawn)
    lon, lat = (np.interp(index, shape_index, shape[:, axis]) for axis in (0, 1))
    return np.array([wrapped(np.array([lon]))[0], lat])


def _pieces(
    line: Drawn, *, cuts: Sequence[tuple[float, int]], start: int, end: int
) -> Iterable[Piece]:
    junctions = [start, *(junction for _, junction in cuts), end]
    parts = cut_drawn(line, [index for index, _ in cuts]) if cuts else [line]
    for number, part in enumerate(parts):
        yield Piece(drawn=part, start=junctions[number], end=junctions[number + 1])


def chains(network: Network) -> list[list[Piece]]:
    """
    Return the pieces grouped into legs, each group end to end in the leg's direction.

    Pieces go on through a junction where exactly two meet, no site stands, and both name the same
    leg and cable. A leg runs the way its first piece in file order was drawn.
    """
    meeting: dict[int, list[int]] = defaultdict(list)
    for number, piece in enumerate(network.pieces):
        meeting[piece.start].append(number)
        meeting[piece.end].append(number)
    used: set[int] = set()
    groups = []
    for number in range(len(network.pieces)):
        if number in used:
            continue
        used.add(number)
        forward = _walk(network, number, meeting=meeting, used=used, from_end=True)
        backward = _walk(network, number, meeting=meeting, used=used, from_end=False)
        groups.append([*reversed(backward), network.pieces[number], *forward])
    return groups


def _walk(
    network: Network,
    number: int,
    *,
    meeting: dict[int, list[int]],
    used: set[int],
    from_end: bool,
) -> list[Piece]:
    found: list[Piece] = []
    piece = network.pieces[number]
    junction = piece.end if from_end else piece.start
    while True:
        others = [at for at in meeting[junction] if at != number]
        if len(meeting[junction]) != 2 or junction in network.sites or len(others) != 1:
            return found
        following = network.pieces[others[0]]
        if others[0] in used or not _one_leg(network.pieces[number], following):
            return found
        number = others[0]
        used.add(number)
        arrives = following.start if from_end else following.end
        found.append(following if arrives == junction else _turned(following))
        junction = found[-1].end if from_end else found[-1].start


def _one_leg(first: Piece, second: Piece) -> bool:
    one, other = first.drawn.line, second.drawn.line
    return one.leg == other.leg and one.cable == other.cable


def _turned(piece: Piece) -> Piece:
    return Piece(drawn=reversed_drawn(piece.drawn), start=piece.end, end=piece.start)


def _gaps(
    lines: LineIndex,
    pieces: Sequence[Piece],
    junctions: Floats,
    *,
    named: dict[int, Place],
    joining: Joining,
) -> list[tuple[str, str]]:
    """Return a warning for every loose end that stops just short of another line."""
    degree: dict[int, int] = defaultdict(int)
    owner: dict[int, Drawn] = {}
    for piece in pieces:
        for junction in (piece.start, piece.end):
            degree[junction] += 1
            owner[junction] = piece.drawn
    loose = [j for j in sorted(degree) if degree[j] == 1 and j not in named]
    points = junctions[loose].reshape(-1, 2)
    look = max(_GAP_LOOK_M, 2 * joining.join_tolerance_m)
    warnings = []
    for junction, hits in zip(
        loose, near_lines(lines, points, radius_m=np.full(len(loose), look)), strict=True
    ):
        others = [hit for hit in hits if hit.offset_m > joining.join_tolerance_m]
        if others:
            warnings.append((str(owner[junction].line.source), _gap_text(others[0], joining)))
    return warnings


def _gap_text(hit: Hit, joining: Joining) -> str:
    return (
        f"its end lies {hit.offset_m:.2f} m from another line and is not joined to it "
        f"(join_tolerance_m is {joining.join_tolerance_m:g}). If they should meet, move the end "
        f"or raise join_tolerance_m"
    )


def _doubled_back(drawn: Sequence[Drawn]) -> list[tuple[str, str]]:
    """Return a warning for every line that runs over itself or another line."""
    keys = np.concatenate([_step_keys(line.lonlat) for line in drawn])
    owner = np.repeat(np.arange(len(drawn)), [len(line.lonlat) - 1 for line in drawn])
    values, first = np.unique(keys, return_index=True)
    if len(values) == len(keys):
        return []
    again = np.setdiff1d(np.arange(len(keys)), first)
    under = first[np.searchsorted(values, keys[again])]
    warnings = []
    for number in np.unique(owner[again]).tolist():
        mine = owner[again] == number
        over = np.unique(owner[under[mine]]).tolist()
        named = ["itself" if at == number else str(drawn[at].line.source) for at in over]
        text = (
            f"{int(mine.sum())} of its {int((owner == number).sum())} steps run over "
            f"{' and '.join(named)}; that way is measured and planned twice"
        )
        warnings.append((str(drawn[number].line.source), text))
    return warnings


def _turned_back(drawn: Sequence[Drawn], told: set[str]) -> list[tuple[str, str]]:
    """Return a warning for every line, not told of yet, that turns straight back somewhere."""
    warnings = []
    for line in drawn:
        steps = np.diff(line.lonlat, axis=0)
        middle = (line.lonlat[1:, 1] + line.lonlat[:-1, 1]) / 2
        east, north = wrapped(steps[:, 0]) * np.cos(np.radians(middle)), steps[:, 1]
        along = east[1:] * east[:-1] + north[1:] * north[:-1]
        across = east[1:] * north[:-1] - north[1:] * east[:-1]
        at = np.flatnonzero(np.abs(across) < -_STRAIGHT_BACK * along)
        where = str(line.line.source)
        if len(at) and where not in told:
            lon, lat = line.lonlat[at[0] + 1]
            text = (
                f"it turns straight back on itself {len(at)} times, first at {lat:.6f}, {lon:.6f}; "
                "that way is measured and planned twice"
            )
            warnings.append((where, text.replace("1 times, first at", "at")))
    return warnings


def _step_keys(lonlat: Floats) -> NDArray[np.uint64]:
    """Return a number for every step that is the same whichever way the step is drawn."""
    whole = np.round(lonlat * 1e7).astype(np.int64).astype(np.uint64)
    point = whole[:, 0] * np.uint64(0x9E3779B97F4A7C15) + whole[:, 1] * np.uint64(
        0xC2B2AE3D27D4EB4F
    )
    point ^= point >> np.uint64(29)
    point *= np.uint64(0xBF58476D1CE4E5B9)
    return np.asarray(point[1:] + point[:-1])
