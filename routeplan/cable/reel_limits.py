"""
The best way along a span when a limit on joints binds: on their number, or on their weight.

A charge on every joint gives a bound that few places survive; these are then searched joint by
joint, with one key a place for a number and with several (key, weight) for a weight.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import accumulate

from routeplan.cable.reel_models import SpanProblem, mirrored
from routeplan.cable.reel_paths import (
    Costs,
    Table,
    best_start,
    forward,
    make_costs,
    make_front,
    make_table,
    path_key,
    path_of,
    push,
    section_price,
)

__all__ = ["Room", "keeps", "limited_path", "room_of"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Room:
    """What the joints of the span may use: a number, exactly or at most, and a weight."""

    joints_most: int
    exact: bool = False
    weight: tuple[int, ...] = ()
    weight_most: int = 0


def room_of(problem: SpanProblem) -> Room:
    """Return the limits on joints; joints that weigh the same are simply counted."""
    most = len(problem.chain_mm) - 2
    if problem.joints_most is not None:
        most = min(most, problem.joints_most)
    weights = set(problem.joint_weight[1:-1])
    if problem.weight_most is None or not problem.joint_weight:
        return Room(joints_most=most)
    if problem.weight_most < 0:
        return Room(joints_most=-1)
    if len(weights) > 1:
        weight = (0, *problem.joint_weight[1:-1], 0)
        return Room(joints_most=most, weight=weight, weight_most=problem.weight_most)
    each = max(weights, default=0)
    return Room(joints_most=min(most, problem.weight_most // each) if each else most)


def keeps(room: Room, path: Sequence[int]) -> bool:
    """Say whether a path keeps the limits on joints."""
    joints = len(path) - 2
    counted = joints == room.joints_most if room.exact else joints <= room.joints_most
    heavy = room.weight and sum(room.weight[place] for place in path) > room.weight_most
    return counted and not heavy


def limited_path(
    problem: SpanProblem, table: Table, room: Room, *, work_most: int | None
) -> tuple[tuple[int, ...], int | None] | None:
    """
    Return the best path under limits on joints, or None if there is none.

    Returns
    -------
    limited_path
        The places, and None if they are proven best; else, the work being used up, a key that
        no path is below.
    """
    back = make_table(mirrored(problem))
    ones = (0, *[1] * (len(table.gain) - 2), 0)
    counted = _bound(table, back, load=ones, most=room.joints_most)
    if counted is None:
        return None
    if not room.weight:
        path = _by_count(table, counted, exact=room.exact)
        return None if path is None else (path, None)
    weighed = _bound(table, back, load=room.weight, most=room.weight_most)
    first = None if weighed is None else _incumbent(table, counted, weighed, room)
    if weighed is None or first is None:
        return None
    if _load(weighed.load, first) == weighed.most and first == weighed.path:
        return first, None
    path, finished = _by_weight(table, counted, weighed, room, first=first, work_most=work_most)
    return path, None if finished else max(weighed.floor, counted.floor)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Bound:
    """
    A proven bound on every path under a limit on a load (joints, or their weight).

    Charging `rate` / `scale` for each unit of load, no path keeping the limit has a key below
    `floor`, and from a place to the end none costs less than `togo` / `scale` nor loads less
    than `least`. `path` is the best one seen that keeps the limit, optimal if it uses it up.
    `soonest` is the least reading at which a section to a place or to a later one may end.
    """

    load: tuple[int, ...]
    most: int
    scale: int
    rate: int
    togo: list[int | None]
    least: list[int | None]
    soonest: list[int]
    floor: int
    path: tuple[int, ...]


def _bound(table: Table, back: Table, *, load: tuple[int, ...], most: int) -> _Bound | None:
    """
    Return the bound of a load limit, or None if no path keeps it.

    Walks the lower hull of the points (load, key) of all paths from its two ends to the edge
    over the limit: each step a search with the load charged at the slope between two points.
    """
    weigh, unit = _charged(table, load, rate=None)
    light = path_of(forward(table, weigh))
    if light is None or _load(load, light) > most:
        return None
    best = path_of(forward(table, make_costs(table))) or light
    scale, rate, value = 1, 0, path_key(table, best)
    while _load(load, best) > most and _load(load, light) < most:
        scale = _load(load, best) - _load(load, light)
        rate = path_key(table, light) - path_key(table, best)
        value = scale * path_key(table, light) + rate * _load(load, light)
        costs, _ = _charged(table, load, rate=rate, scale=scale)
        found = forward(table, costs)
        step, reached = path_of(found), found[0][-1]
        if step is None or reached is None or reached >= value:
            break
        value = reached
        if _load(load, step) > most:
            best = step
        else:
            light = step
    if _load(load, best) <= most:
        light = best
    costs, _ = _charged(back, load[::-1], rate=rate, scale=scale)
    weigh, _ = _charged(back, load[::-1], rate=None)
    least = [None if key is None else key // unit for key in _togo(back, weigh)]
    return _Bound(
        load=load,
        most=most,
        scale=scale,
        rate=rate,
        togo=_togo(back, costs),
        least=least,
        soonest=list(accumulate(reversed(table.arrive), min))[::-1],
        floor=-(-(value - rate * most) // scale),
        path=light,
    )


def _charged(
    table: Table, load: tuple[int, ...], *, rate: int | None, scale: int = 1
) -> tuple[Costs, int]:
    """Return costs with the load charged at a rate, or (None) before all else, and the rate."""
    if rate is None:
        dearest = max([price for _, price in table.put_ups], default=0)
        dearest = max(dearest, table.price(table.pieces))
        rate = 1 << (len(load) * dearest + sum(table.gain)).bit_length()
    gain = [scale * key + rate * units for key, units in zip(table.gain, load, strict=True)]
    return make_costs(table, scale=scale, gain=gain), rate


def _load(load: Sequence[int], path: Sequence[int]) -> int:
    return sum(load[place] for place in path)


def _togo(back: Table, costs: Costs) -> list[int | None]:
    """Return the least cost from every place to the end, from a search of the mirrored span."""
    keys, _ = forward(back, costs)
    ahead = [None if key is None else key - own for key, own in zip(keys, costs.gain, strict=True)]
    return ahead[::-1]


def _allows(bound: _Bound, place: int, key: int, *, left: int, cutoff: int | None) -> bool:
    """Say whether a path to a place, with so much load left, may end at or under the cutoff."""
    togo, least = bound.togo[place], bound.least[place]
    if togo is None or least is None or least > left:
        return False
    return cutoff is None or (key - cutoff) * bound.scale + togo <= bound.rate * left


def _by_count(table: Table, bound: _Bound, *, exact: bool) -> tuple[int, ...] | None:
    """Return the best path with at most, or exactly, so many joints."""
    if _load(bound.load, bound.path) == bound.most:
        return bound.path
    costs, known = make_costs(table), path_key(table, bound.path)
    if not exact:
        return _layers(table, costs, bound, exact=False, cutoff=known)
    for widening in (1, 4, 16):  # a path found under a guessed cutoff is the best one
        cutoff = bound.floor + widening * (known - bound.floor)
        path = _layers(table, costs, bound, exact=True, cutoff=cutoff)
        if path is not None:
            return path
    return _layers(table, costs, bound, exact=True, cutoff=None)


def _layers(
    table: Table, costs: Costs, bound: _Bound, *, exact: bool, cutoff: int | None
) -> tuple[int, ...] | None:
    """Return the best path, searched joint by joint: every layer uses one joint more."""
    end = len(table.gain) - 1
    sources, befores = {0: 0}, []
    best: tuple[int, int] | None = None
    for used in range(bound.most + 1):
        left = bound.most - used - 1
        reached, before = _layer(table, costs, bound, sources, left=left, cutoff=cutoff)
        befores.append(before)
        key = reached.pop(end, None)
        if key is None or (exact and left >= 0):
            pass
        elif cutoff is None or key <= cutoff:
            best = min(best or (key, used), (key, used))
        sources = reached
        if not sources:
            break
    if best is None:
        return None
    path = [end]
    for before in reversed(befores[: best[1] + 1]):
        path.append(before[path[-1]])
    return tuple(path[::-1])


def _layer(
    table: Table,
    costs: Costs,
    bound: _Bound,
    sources: dict[int, int],
    *,
    left: int,
    cutoff: int | None,
) -> tuple[dict[int, int], dict[int, int]]:
    """Return the keys of the places one section after `sources`, and the places before them."""
    front, waiting = make_front(table, costs), list(sources)[::-1]
    furthest = _furthest(table, sources)
    end = len(table.gain) - 1
    reached, before = {}, {}
    for place in range(waiting[-1] + 1, end + 1):
        if bound.soonest[place] > furthest:
            break
        while waiting and waiting[-1] < place:
            start = waiting.pop()
            push(front, start, sources[start])
        if place != end and not _allows(bound, place, 0, left=left, cutoff=cutoff):
            continue
        found = best_start(front, place)
        if found is None:
            continue
        key = found[0] + costs.gain[place]
        if place == end or _allows(bound, place, key, left=left, cutoff=cutoff):
            reached[place], before[place] = key, found[1]
    return reached, before


def _furthest(table: Table, sources: Iterable[int]) -> int:
    """Return how far on the ruler one section from any of the sources can reach."""
    return max(table.leave[start] for start in sources) + table.longest


_Label = tuple[int, int, int, "_Label | None"]  # key, weight, place, and the label before


def _incumbent(
    table: Table, counted: _Bound, weighed: _Bound, room: Room
) -> tuple[int, ...] | None:
    """Return some path that keeps both limits, or None if there is none."""
    if keeps(room, weighed.path):
        return weighed.path
    costs, _ = _charged(table, weighed.load, rate=None)
    path = _layers(table, costs, counted, exact=room.exact, cutoff=None)
    return path if path is not None and keeps(room, path) else None


def _by_weight(
    table: Table,
    counted: _Bound,
    weighed: _Bound,
    room: Room,
    *,
    first: tuple[int, ...],
    work_most: int | None,
) -> tuple[tuple[int, ...], bool]:
    """Return the best path under both limits, and whether the search came to its end."""
    best, cutoff = first, path_key(table, first)
    sources: dict[int, list[_Label]] = {0: [(0, 0, 0, None)]}
    end, work = len(table.gain) - 1, 0
    for used in range(room.joints_most + 1):
        left = room.joints_most - used - 1
        reached: dict[int, list[_Label]] = {}
        for place in range(min(sources) + 1, end + 1):
            if counted.soonest[place] > _furthest(table, sources):
                break
            if place != end and not _allows(counted, place, 0, left=left, cutoff=cutoff):
                continue
            labels, weighings = _extended(table, weighed, sources, place, cutoff=cutoff)
            work += weighings
            if work_most is not None and work > work_most:
                return best, False
            if place != end and labels:
                reached[place] = labels
            elif labels and (left < 0 or not room.exact) and labels[0][0] <= cutoff:
                cutoff, best = labels[0][0], _unwound(labels[0])
        sources = reached
        if not sources:
            break
    return best, True


def _extended(
    table: Table, bound: _Bound, sources: dict[int, list[_Label]], place: int, *, cutoff: int
) -> tuple[list[_Label], int]:
    """Return the labels at a place that none outdoes in key and weight, and the work done."""
    found: list[_Label] = []
    work = 0
    for start, labels in sources.items():
        price = section_price(table, start, place) if start < place else None
        work += 1
        if price is None:
            continue
        work += len(labels)
        for label in labels:
            key = label[0] + price + table.gain[place]
            weight = label[1] + bound.load[place]
            if _allows(bound, place, key, left=bound.most - weight, cutoff=cutoff):
                found.append((key, weight, place, label))
    found.sort(key=lambda label: label[:2])
    kept = found[:1]
    for label in found:
        if label[1] < kept[-1][1]:
            kept.append(label)
    return kept, work


def _unwound(label: _Label) -> tuple[int, ...]:
    """Return the path that led to a label."""
    path = []
    step: _Label | None = label
    while step is not None:
        path.append(step[2])
        step = step[3]
    return tuple(path[::-1])
