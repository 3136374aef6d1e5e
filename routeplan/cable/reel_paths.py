"""
The shortest path that reels are bought along: places, sections and their prices, made quick.

Cost, joints, joints at assumed places and ties are packed into one integer, the key, so that a
sum of integers compares like the whole objective and every tie is a real one.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise

from routeplan.cable.reel_models import (
    SpanProblem,
    longest_reel_mm,
    reel_price_cents,
    sheath_most_mm,
)

__all__ = [
    "Costs",
    "Forward",
    "Front",
    "Table",
    "best_start",
    "forward",
    "make_costs",
    "make_front",
    "make_table",
    "path_key",
    "path_of",
    "push",
    "section_price",
]

Forward = tuple[list[int | None], list[int]]  # key of each place (None: not reached), and from
_Made = tuple[int, int, int, int]
_NEVER = 1 << 9999  # above every key


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """
    The problem as the search needs it.

    A section fits a limit if its sheath is at most the limit's or it starts no earlier than
    `clear[end]`, the first place from where on it stays out of the placement.
    Within a `group` places have both index and `leave` ascending, so that the places a section
    may start at are always the last ones of each group; nearly every place is in group 0.
    """

    arrive: Sequence[int]
    leave: Sequence[int]
    group: list[int]
    groups: int
    gain: list[int]
    shift: int
    put_ups: list[tuple[int, int]]
    limits: list[tuple[int, list[int]]]
    longest: int
    factor: int
    step: int
    pieces: int
    price: Callable[[int], int]
    rate: tuple[int, int]
    reel_each: int


class _Memo(dict[int, int]):
    """Values of a function of whole numbers, computed when first asked for."""

    __slots__ = ("_function",)

    def __init__(self, function: Callable[[int], int]) -> None:
        super().__init__()
        self._function = function

    def __missing__(self, number: int) -> int:
        value = self[number] = self._function(number)
        return value


def make_table(problem: SpanProblem) -> Table:
    """Prepare a problem: packed joint costs, longest sheaths, groups and clear places."""
    buying, ratio = problem.buying, 1 + problem.ordering_ratio
    bits = len(problem.chain_mm).bit_length()
    tie_bits = sum(problem.tie_key).bit_length()
    shift = tie_bits + 2 * bits
    joint = 1 << tie_bits + bits
    joints = (joint, joint + (1 << tie_bits))  # at a known place, at an assumed one
    gain = [
        (cost << shift) + joints[assumed] + tie
        for cost, assumed, tie in zip(
            problem.joint_cost_cents, problem.assumed, problem.tie_key, strict=True
        )
    ]
    gain[0] = gain[-1] = 0
    step = buying.round_up_mm
    piece = buying.cable_cents_per_m * step / 1000
    group = _groups(problem.leave_mm)
    return Table(
        arrive=problem.arrive_mm,
        leave=problem.leave_mm,
        group=group,
        groups=max(group) + 1,
        gain=gain,
        shift=shift,
        put_ups=[
            (sheath_most_mm(problem, put_up), reel_price_cents(buying, put_up) << shift)
            for put_up in sorted(set(buying.put_ups_mm))
        ],
        limits=[
            (sheath_most_mm(problem, limit.most_mm), _clear(problem.chain_mm, limit.intervals_mm))
            for limit in problem.limits
        ],
        longest=sheath_most_mm(problem, longest_reel_mm(buying)),
        factor=ratio.numerator,
        step=step * ratio.denominator,
        pieces=buying.made_max_mm // step,
        price=lambda pieces: reel_price_cents(buying, pieces * step) << shift,
        rate=(piece.numerator, piece.denominator),
        reel_each=buying.reel_each_cents,
    )


def _groups(leave: Sequence[int]) -> list[int]:
    """Part the places into the fewest groups with `leave` ascending, most of them in the first."""
    group = [0] * len(leave)
    last = [leave[0]]
    for place, value in enumerate(leave):
        if value >= last[0]:
            last[0] = value
            continue
        index = next((k for k, most in enumerate(last) if most <= value), len(last))
        last[index : index + 1] = [value]
        group[place] = index
    return group


def _clear(chain: Sequence[int], intervals: Sequence[tuple[int, int]]) -> list[int]:
    """Return for each end the first start that keeps a section out of the intervals."""
    waiting = sorted((a, b) for a, b in intervals if a < b)[::-1]
    reached, first, clear = chain[0], 0, []
    for here in chain:
        while waiting and waiting[-1][0] < here:
            reached = max(reached, waiting.pop()[1])
        while chain[first] < min(here, reached):
            first += 1
        clear.append(first)
    return clear


@dataclass(frozen=True, slots=True, kw_only=True)
class Costs:
    """
    Prices and joint costs of one search, every price multiplied by `scale`.

    `gap` is the least price difference between sections that differ by so many pieces. Times
    the denominator of a piece's rate: `piece` is the price of one, `least` the least that a
    section costs beside its pieces, and `band` how much rank makes up for any rounding.
    """

    put_ups: list[tuple[int, int]]
    price: _Memo
    gap: _Memo
    gain: list[int]
    piece: int
    least: int
    band: int


def make_costs(table: Table, *, scale: int = 1, gain: list[int] | None = None) -> Costs:
    """Return the costs of a search."""
    cents, parts = table.rate
    unit = scale << table.shift
    return Costs(
        put_ups=table.put_ups
        if scale == 1
        else [(most, price * scale) for most, price in table.put_ups],
        price=_Memo(lambda pieces: table.price(pieces) * scale),
        gap=_Memo(lambda pieces: pieces * cents // parts * unit),
        gain=table.gain if gain is None else gain,
        piece=cents * unit,
        least=(table.reel_each * parts - parts // 2) * unit,
        band=(cents + parts - 1) * unit,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Front:
    """
    Earlier places that may still start the best section, by group, in order of index.

    For put-ups a later place that costs no more outdoes an earlier one, since prices never
    fall with length; for made pieces it may even cost more by what the shorter piece saves.
    Made pieces keep (rank, leave, place, key) in order of rank, `leave` multiplied so that a
    step is a whole number. Rank is what a place costs less the cable up to it; the best start
    has a rank within the price of one step of the lowest, so few are looked at.
    """

    table: Table
    costs: Costs
    stacks: list[tuple[list[int], list[int], list[int]]]
    made: list[list[_Made]]


def make_front(table: Table, costs: Costs) -> Front:
    """Return an empty front."""
    groups = range(table.groups)
    return Front(
        table=table,
        costs=costs,
        stacks=[([], [], []) for _ in groups] if table.put_ups else [],
        made=[[] for _ in groups] if table.pieces else [],
    )


def push(front: Front, place: int, key: int) -> None:
    """Add a place reached at a cost, and drop those it outdoes."""
    table = front.table
    group, leave = table.group[place], table.leave[place]
    if front.stacks:
        leaves, places, keys = front.stacks[group]
        while keys and keys[-1] >= key:
            del leaves[-1], places[-1], keys[-1]
        leaves.append(leave)
        places.append(place)
        keys.append(key)
    if front.made:
        _push_made(front, front.made[group], place, key)


def _push_made(front: Front, made: list[_Made], place: int, key: int) -> None:
    """Add a place to those made pieces may start from, and drop those it outdoes or left behind."""
    table, costs = front.table, front.costs
    step, scaled = table.step, table.leave[place] * table.factor
    rank = key * table.rate[1] - scaled // step * costs.piece
    while made and made[0][1] < scaled - table.pieces * step:
        del made[0]
    at = bisect_left(made, (rank,))
    kept = [(rank, scaled, place, key)]
    if at < len(made):
        band, gap = rank + costs.band, costs.gap
        for item in made[at:]:
            if item[0] >= band:
                break
            if item[3] < key - gap[(scaled - item[1]) // step]:
                kept.append(item)
    made[at:] = kept


def best_start(front: Front, end: int) -> tuple[int, int] | None:
    """Return the least key of reaching `end`, its own joint excluded, and from where."""
    table, least, start = front.table, _NEVER, 0
    arrive, limits = table.arrive[end], table.limits
    for leaves, places, keys in front.stacks:
        first = _first_of(limits, leaves, places, arrive, end) if limits else 0
        for most, price in front.costs.put_ups:
            at = bisect_left(leaves, arrive - most, first)
            if at < len(leaves):
                key = keys[at] + price
                if key < least:
                    least, start = key, places[at]
                if at == first:  # a longer put-up reaches nothing more
                    break
    for made in front.made:
        if made:
            least, start = _best_made(made, front, end, least, start)
    return None if least is _NEVER else (least, start)


def _best_made(
    made: list[_Made], front: Front, end: int, least: int, start: int
) -> tuple[int, int]:
    """Return the better of what is known and the least key from the places of one group."""
    table, price, parts = front.table, front.costs.price, front.table.rate[1]
    step, arrive = table.step, table.arrive[end] * table.factor
    reach = arrive - table.pieces * step
    floor = arrive // step * front.costs.piece + front.costs.least
    ceiling = least * parts - floor  # no better start has this rank
    for rank, scaled, place, key in made:
        if scaled < reach or (table.limits and not _clears(table, place, end)):
            continue
        if rank >= ceiling:
            break
        total = key + price[-((scaled - arrive) // step)]
        if total < least:
            least, start = total, place
            ceiling = total * parts - floor
    return least, start


def _clears(table: Table, start: int, end: int) -> bool:
    """Say whether a section keeps every placement limit."""
    sheath = table.arrive[end] - table.leave[start]
    return all(sheath <= most or start >= clear[end] for most, clear in table.limits)


def _first_of(
    limits: list[tuple[int, list[int]]],
    leaves: list[int],
    places: list[int],
    arrive: int,
    end: int,
) -> int:
    """Return where in a group the places begin that keep every placement limit."""
    return max(
        min(bisect_left(leaves, arrive - most), bisect_left(places, clear[end]))
        for most, clear in limits
    )


def forward(table: Table, costs: Costs) -> Forward:
    """Return the least cost of every place and the place before it, no limit on joints."""
    front, gain = make_front(table, costs), costs.gain
    keys: list[int | None] = [0]
    before = [0]
    push(front, 0, 0)
    for place in range(1, len(gain)):
        found = best_start(front, place)
        if found is None:
            keys.append(None)
            before.append(0)
            continue
        key = found[0] + gain[place]
        keys.append(key)
        before.append(found[1])
        push(front, place, key)
    return keys, before


def path_of(found: Forward) -> tuple[int, ...] | None:
    """Return the places on the way to the end, or None if it is not reached."""
    keys, before = found
    if keys[-1] is None:
        return None
    path = [len(keys) - 1]
    while path[-1]:
        path.append(before[path[-1]])
    return tuple(path[::-1])


def section_price(table: Table, start: int, end: int) -> int | None:
    """Return the packed price of one section, None if it cannot be."""
    sheath = table.arrive[end] - table.leave[start]
    if not _clears(table, start, end):
        return None
    prices = [price for most, price in table.put_ups if sheath <= most][:1]
    pieces = -(-sheath * table.factor // table.step)
    if table.pieces and pieces <= table.pieces:
        prices.append(table.price(pieces))
    return min(prices, default=None)


def path_key(table: Table, path: Sequence[int]) -> int:
    """Return the packed objective of a path that keeps the section limits."""
    prices = (section_price(table, start, end) or 0 for start, end in pairwise(path))
    return sum(prices) + sum(table.gain[place] for place in path)
