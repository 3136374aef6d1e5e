"""Building a network from polylines: junctions where vertices coincide, edges between them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from routeplan.geodesy import steps_m, wrapped
from routeplan.streets.crossings import Crossings, find_crossings
from routeplan.streets.islands import labelled
from routeplan.streets.model import Flags, Floats, Network, Whole

__all__ = [
    "Lines",
    "Places",
    "adjacency",
    "assembled",
    "edge_lengths_m",
    "joined_lines",
    "lines_from",
    "unique_lines",
]

_UNIT = 1e7  # OpenStreetMap's own resolution: a ten-millionth of a degree, about a centimetre


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Lines:
    """
    Polylines end to end in one array, `first[k] : first[k + 1]` those of line k, with attributes.

    An empty placement is an ordinary street.
    """

    lonlat: Floats
    first: Whole
    road_class: Sequence[str]
    name: Sequence[str]
    placement: Sequence[str]
    is_bridge: Flags
    is_tunnel: Flags


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Places:
    """Mapped poles, manholes and cabinets."""

    kind: Sequence[str] = ()
    lonlat: Floats = field(default_factory=lambda: np.empty((0, 2)))


def lines_from(
    shapes: Sequence[Floats],
    *,
    road_class: Sequence[str],
    name: Sequence[str] | None = None,
    placement: Sequence[str] | None = None,
    is_bridge: Sequence[bool] | None = None,
    is_tunnel: Sequence[bool] | None = None,
) -> Lines:
    """
    Return lines from one array of vertices each.

    Parameters
    ----------
    shapes
        For each line its vertices, shape (n, 2). [deg]
    road_class, name, placement, is_bridge, is_tunnel
        One value a line.
    """
    count = len(shapes)
    sizes = [len(shape) for shape in shapes]
    return Lines(
        lonlat=np.concatenate([np.empty((0, 2)), *shapes]),
        first=np.concatenate([[0], np.cumsum(sizes, dtype=np.int64)]).astype(np.int64),
        road_class=tuple(road_class),
        name=tuple(name) if name is not None else ("",) * count,
        placement=tuple(placement) if placement is not None else ("",) * count,
        is_bridge=np.array(is_bridge if is_bridge is not None else [False] * count, dtype=bool),
        is_tunnel=np.array(is_tunnel if is_tunnel is not None else [False] * count, dtype=bool),
    )


def joined_lines(parts: Sequence[Lines]) -> Lines:
    """Return the lines of several sources as one."""
    offsets = np.cumsum([0, *(len(part.lonlat) for part in parts)])
    firsts = [part.first[:-1] + offset for part, offset in zip(parts, offsets, strict=False)]
    return Lines(
        lonlat=np.concatenate([np.empty((0, 2)), *(part.lonlat for part in parts)]),
        first=np.concatenate([*firsts, [offsets[-1]]]).astype(np.int64),
        road_class=tuple(word for part in parts for word in part.road_class),
        name=tuple(word for part in parts for word in part.name),
        placement=tuple(word for part in parts for word in part.placement),
        is_bridge=np.concatenate([part.is_bridge for part in parts]),
        is_tunnel=np.concatenate([part.is_tunnel for part in parts]),
    )


def assembled(
    lines: Lines,
    *,
    obstacles: Sequence[tuple[str, Floats]] = (),
    places: Places | None = None,
    where: str = "streets",
    notes: Sequence[tuple[str, str]] = (),
) -> Network:
    """
    Return the network of some lines.

    Vertices at equal coordinates (to 1e-7 degree) are one place. A place is a node if a line ends
    there or it is passed more than once. An edge drawn twice, vertex for vertex and with the same
    class and placement, counts once. Costs O(k log k) in the number of vertices.

    Parameters
    ----------
    lines
        The lines.
    obstacles
        Rail lines, watercourses and motorways: (kind, vertices).
    places
        Mapped poles, manholes and cabinets.
    where
        What the notes name.
    notes
        Notes of the reading.
    """
    kept = unique_lines(lines)
    again = len(lines.first) - len(kept.first)
    lines, vertex, position = _numbered(kept)
    begin, end, line, twice = _without_twins(vertex, *_cut(vertex, lines.first), _keys(lines))
    nodes, edge_start, edge_end = _edge_ends(vertex, begin, end)
    shape_lonlat, shape_first = _edge_shapes(position[vertex], begin, end)
    row_first, row_node, row_edge = adjacency(edge_start, edge_end, len(nodes))
    road_class, class_words = _coded(lines.road_class, line)
    name, name_words = _coded(lines.name, line)
    placement, placement_words = _coded(lines.placement, line)
    found = find_crossings(shape_lonlat, shape_first, obstacles) if obstacles else Crossings()
    marks = places or Places()
    place_kind, place_words = _coded(marks.kind, np.arange(len(marks.kind)))
    network = Network(
        node_lonlat=position[nodes],
        edge_start=edge_start,
        edge_end=edge_end,
        length_m=edge_lengths_m(shape_lonlat, shape_first),
        shape_first=shape_first,
        shape_lonlat=shape_lonlat,
        road_class=road_class,
        class_words=class_words,
        name=name,
        name_words=name_words,
        placement=placement,
        placement_words=placement_words,
        is_bridge=lines.is_bridge[line],
        is_tunnel=lines.is_tunnel[line],
        crossing_edge=found.edge,
        crossing_kind=found.kind,
        crossing_m=found.along_m,
        crossing_weight=found.weight,
        crossing_lonlat=found.lonlat,
        place_kind=place_kind,
        place_words=place_words,
        place_lonlat=marks.lonlat.reshape(-1, 2),
        row_first=row_first,
        row_node=row_node,
        row_edge=row_edge,
        part=labelled(row_first, row_node),
    )
    return replace(network, notes=(*notes, *_said(network, twice + again, where)))


def _edge_ends(vertex: Whole, begin: Whole, end: Whole) -> tuple[Whole, Whole, Whole]:
    """Return the vertices that are nodes, and the numbers of the nodes edges start and end at."""
    nodes, ends = np.unique(np.concatenate([vertex[begin], vertex[end]]), return_inverse=True)
    edge_start, edge_end = np.split(ends.astype(np.int32), 2)
    return nodes, edge_start, edge_end


def _edge_shapes(lonlat: Floats, begin: Whole, end: Whole) -> tuple[Floats, Whole]:
    """Return the vertices of all edges, and where each edge's begin among them."""
    sizes = end - begin + 1
    first = np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64)
    within = np.arange(first[-1]) - np.repeat(first[:-1], sizes)
    return _unbroken(lonlat[np.repeat(begin, sizes) + within], first), first


def _unbroken(shape_lonlat: Floats, shape_first: Whole) -> Floats:
    """Return shapes whose longitude runs on over the antimeridian within every edge."""
    turns = np.zeros(len(shape_lonlat))
    turns[1:] = np.round(np.diff(shape_lonlat[:, 0]) / 360.0)
    if not turns.any():
        return shape_lonlat
    total = np.cumsum(turns)
    starts = np.repeat(total[shape_first[:-1]], np.diff(shape_first))
    return shape_lonlat - np.column_stack([360.0 * (total - starts), np.zeros(len(total))])


def unique_lines(lines: Lines) -> Lines:
    """Return lines without those drawn before, vertex for vertex, in either direction."""
    plain, vertex, _ = _numbered(lines)
    filled = np.flatnonzero(np.diff(plain.first) > 0)
    begin, end = plain.first[:-1][filled], plain.first[1:][filled] - 1
    kept = _without_twins(vertex, begin, end, filled, _keys(lines))[2]
    if len(kept) == len(lines.first) - 1:
        return lines
    sizes = np.diff(lines.first)
    keep = np.zeros(len(sizes), dtype=bool)
    keep[kept] = True
    return Lines(
        lonlat=lines.lonlat[np.repeat(keep, sizes)],
        first=np.concatenate([[0], np.cumsum(sizes[keep])]).astype(np.int64),
        road_class=[lines.road_class[at] for at in kept],
        name=[lines.name[at] for at in kept],
        placement=[lines.placement[at] for at in kept],
        is_bridge=lines.is_bridge[keep],
        is_tunnel=lines.is_tunnel[keep],
    )


def edge_lengths_m(shape_lonlat: Floats, shape_first: Whole) -> Floats:
    """Return the geodesic length of every edge. [m]"""
    if len(shape_first) < 2:
        return np.empty(0)
    steps = np.append(steps_m(shape_lonlat), 0.0)
    steps[shape_first[1:] - 1] = 0.0  # from the end of one edge to the start of the next
    return np.asarray(np.add.reduceat(steps, shape_first[:-1]))


def adjacency(edge_start: Whole, edge_end: Whole, node_count: int) -> tuple[Whole, Whole, Whole]:
    """Return row_first, row_node and row_edge of an undirected network; see `Network`."""
    tail = np.concatenate([edge_start, edge_end])
    order = np.argsort(tail, kind="stable")
    row_first = np.zeros(node_count + 1, dtype=np.int32)
    np.cumsum(np.bincount(tail, minlength=node_count), out=row_first[1:])
    row_node = np.concatenate([edge_end, edge_start])[order].astype(np.int32)
    row_edge = (order % max(len(edge_start), 1)).astype(np.int32)
    return row_first, row_node, row_edge


def _numbered(lines: Lines) -> tuple[Lines, Whole, Floats]:
    """Return lines without repeated vertices, each vertex's place, and the places' positions."""
    longitude = wrapped(lines.lonlat[:, 0]) if len(lines.lonlat) else lines.lonlat[:, 0]
    east = np.rint(longitude * _UNIT).astype(np.int64)
    east[east == -1_800_000_000] = 1_800_000_000  # one meridian, two names
    north = np.rint(lines.lonlat[:, 1] * _UNIT).astype(np.int64)
    keys, vertex = np.unique((east << 32) + (north + (1 << 31)), return_inverse=True)
    position = np.column_stack([keys >> 32, (keys & 0xFFFFFFFF) - (1 << 31)]) / _UNIT
    is_first = np.zeros(len(vertex) + 1, dtype=bool)
    is_first[lines.first] = True
    keep = is_first[:-1].copy()
    keep[1:] |= vertex[1:] != vertex[:-1]
    passed = np.concatenate([[0], np.cumsum(keep)])
    first = passed[lines.first].astype(np.int64)
    return replace(lines, lonlat=lines.lonlat[keep], first=first), vertex[keep], position


def _cut(vertex: Whole, first: Whole) -> tuple[Whole, Whole, Whole]:
    """Return where edges begin and end among the vertices, and the line of each."""
    counts = np.bincount(vertex, minlength=1)
    is_node = counts[vertex] > 1
    sizes = np.diff(first)
    starts, last = first[:-1][sizes > 0], first[1:][sizes > 0] - 1
    is_node[starts] = True
    is_node[last] = True
    at = np.flatnonzero(is_node)
    line = np.repeat(np.arange(len(sizes)), sizes)[at]
    same = line[1:] == line[:-1]
    return at[:-1][same], at[1:][same], line[:-1][same]


def _keys(lines: Lines) -> Whole:
    """Return one number a line for its class and placement."""
    _, kinds = np.unique(np.array(lines.road_class, dtype=str), return_inverse=True)
    words, placements = np.unique(np.array(lines.placement, dtype=str), return_inverse=True)
    return np.asarray(kinds * len(words) + placements)


def _without_twins(
    vertex: Whole, begin: Whole, end: Whole, line: Whole, keys: Whole
) -> tuple[Whole, Whole, Whole, int]:
    """Leave out edges drawn before, and those that come back to their start without area."""
    low, high = np.minimum(vertex[begin], vertex[end]), np.maximum(vertex[begin], vertex[end])
    total = np.concatenate([[0], np.cumsum(vertex.astype(np.int64))])
    marks = total[end + 1] - total[begin]  # the same for an edge and its reverse
    order = np.lexsort((np.arange(len(begin)), keys[line], marks, end - begin, high, low))
    columns = (low, high, end - begin, marks, keys[line])
    same = np.ones(max(len(order) - 1, 0), dtype=bool)
    for column in columns:
        same &= column[order][1:] == column[order][:-1]
    keep = np.ones(len(begin), dtype=bool)
    kept = order[:1].tolist()
    for at in np.flatnonzero(same).tolist():
        one, other = int(order[at]), int(order[at + 1])
        if at == 0 or not same[at - 1]:
            kept = [one]
        if any(_is_twin(vertex, begin, end, mine, other) for mine in kept):
            keep[other] = False
        else:
            kept.append(other)
    return begin[keep], end[keep], line[keep], int((~keep).sum())


def _is_twin(vertex: Whole, begin: Whole, end: Whole, one: int, other: int) -> bool:
    mine = vertex[begin[one] : end[one] + 1]
    its = vertex[begin[other] : end[other] + 1]
    return bool(np.array_equal(mine, its) or np.array_equal(mine, its[::-1]))


def _coded(words: Sequence[str], index: Whole) -> tuple[Whole, tuple[str, ...]]:
    numbers: dict[str, int] = {}
    codes = np.array([numbers.setdefault(word, len(numbers)) for word in words], dtype=np.int32)
    return codes[index], tuple(numbers)


def _said(network: Network, twice: int, where: str) -> list[tuple[str, str]]:
    """Return what is worth knowing about a network as it was read."""
    said = []
    if twice:
        said.append((where, f"{twice} of the pieces of street are drawn twice and count once"))
    size = len(network.node_lonlat)
    if not size:
        return said
    count = int(network.part.max()) + 1
    if count > 1:
        metres = np.bincount(
            network.part[network.edge_start], weights=network.length_m, minlength=count
        )
        outside = 100.0 * (1.0 - metres.max() / metres.sum())
        said.append(
            (
                where,
                f"the streets fall into {count} parts that do not meet; {outside:.1f} % of their "
                f"length lies outside the largest",
            )
        )
    return said
