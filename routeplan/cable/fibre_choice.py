"""Which fibre each strand of each circuit takes, with the fewest changes of number."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import TypeAlias

__all__ = ["FibreChoice", "Strand", "chosen_fibres"]

Span: TypeAlias = tuple[int, int]
Pieces: TypeAlias = tuple[tuple[str, Span | None], ...]  # cables in order, with the piece of each

_WORK_MOST = 20_000
"""Fibres weighed before the exact search gives up: some hundredths of a second. House rule."""

_STRANDS_MOST = 60
"""More strands than that are not searched at all. House rule."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Strand:
    """One fibre of a circuit from end to end: the pieces of cable it takes, and a number wanted."""

    pieces: Pieces
    wanted: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class FibreChoice:
    """
    The fibre of every strand on each of its pieces, and how often the number changes between two.

    `is_proven` says that no choice has fewer changes.
    """

    fibres: tuple[tuple[int, ...], ...]
    change_count: int
    is_proven: bool


@dataclass(slots=True)
class _Taken:
    """What is taken of each fibre, by cable and number."""

    counts: Mapping[str, int]
    spans: defaultdict[str, defaultdict[int, list[Span | None]]] = field(
        default_factory=lambda: defaultdict(lambda: defaultdict(list))
    )


def chosen_fibres(
    strands: Sequence[Strand], counts: Mapping[str, int], *, work_most: int = _WORK_MOST
) -> FibreChoice | None:
    """
    Return a fibre for every strand on each piece of its way, or None where none was found.

    Wanted numbers are kept. The objective is the fewest changes of number, all strands together;
    among equals the lowest numbers, strand by strand and piece by piece. One strand after the
    other takes what is best for it; where that leads to no change at all it is the best there is.
    Else every choice is searched, exactly, as long as the work allows.

    Parameters
    ----------
    strands
        Strands in file order.
    counts
        Fibres of each cable. [-]
    work_most
        Fibres weighed before the search gives up. [-]
    """
    taken = _Taken(counts=counts)
    for strand in strands:
        if strand.wanted is not None:
            _take(taken, strand.pieces, [strand.wanted] * len(strand.pieces))
    quick = _one_by_one(strands, taken)
    most = sum(len(strand.pieces) - 1 for strand in strands)
    if quick is not None:
        most = sum(map(_changes, quick))
        if most == 0:
            return FibreChoice(fibres=quick, change_count=0, is_proven=True)
    work = [work_most]
    for allowed in range(most + 1 if len(strands) <= _STRANDS_MOST else 0):
        found = next(_searched(strands, taken, allowed=allowed, work=work), None)
        if found is not None:
            return FibreChoice(fibres=found, change_count=sum(map(_changes, found)), is_proven=True)
        if work[0] < 0:
            break
    if quick is None:
        return None
    return FibreChoice(fibres=quick, change_count=most, is_proven=False)


def _changes(fibres: Sequence[int]) -> int:
    return sum(one != other for one, other in pairwise(fibres))


def _one_by_one(strands: Sequence[Strand], taken: _Taken) -> tuple[tuple[int, ...], ...] | None:
    """Return the best for each strand in turn, or None where one finds no fibre."""
    found: list[tuple[int, ...]] = []
    done: list[tuple[Pieces, tuple[int, ...]]] = []
    for strand in strands:
        if strand.wanted is not None:
            found.append((strand.wanted,) * len(strand.pieces))
            continue
        free = [_free(taken, piece) for piece in strand.pieces]
        common = set.intersection(*free)
        fibres = (min(common),) * len(free) if common else _best(_costs(free))
        if fibres is None:
            break
        found.append(fibres)
        done.append((strand.pieces, fibres))
        _take(taken, strand.pieces, fibres)
    for pieces, fibres in done:
        _give_back(taken, pieces, fibres)
    return tuple(found) if len(found) == len(strands) else None


def _costs(free: Sequence[Collection[int]]) -> list[dict[int, int]]:
    """Return, for each free fibre on each piece, the fewest changes from there to the end."""
    costs: list[dict[int, int]] = []
    for fibres in reversed(free):
        if not costs:
            costs.append(dict.fromkeys(fibres, 0))
            continue
        behind = costs[-1]
        other = 1 + min(behind.values(), default=len(free))
        costs.append({fibre: min(behind.get(fibre, other), other) for fibre in fibres})
    return costs[::-1]


def _best(costs: Sequence[Mapping[int, int]]) -> tuple[int, ...] | None:
    """Return the lowest fibres among those with the fewest changes."""
    if not all(costs):
        return None
    fibres: list[int] = []
    left = min(costs[0].values())
    for here in costs:
        last = fibres[-1] if fibres else None
        fibre = min(
            fibre
            for fibre, cost in here.items()
            if cost + (last is not None and fibre != last) <= left
        )
        fibres.append(fibre)
        left = here[fibre]
    return tuple(fibres)


def _searched(
    strands: Sequence[Strand], taken: _Taken, *, allowed: int, work: list[int]
) -> Iterator[tuple[tuple[int, ...], ...]]:
    """Yield choices with no more changes than allowed, in order of their numbers."""
    if not strands:
        yield ()
        return
    strand, rest = strands[0], strands[1:]
    if strand.wanted is not None:
        own = (strand.wanted,) * len(strand.pieces)
        for others in _searched(rest, taken, allowed=allowed, work=work):
            yield (own, *others)
        return
    costs = _costs([_free(taken, piece) for piece in strand.pieces])
    for fibres in _within(costs, (), allowed, work):
        _take(taken, strand.pieces, fibres)
        left = allowed - _changes(fibres)
        found = next(_searched(rest, taken, allowed=left, work=work), None)
        _give_back(taken, strand.pieces, fibres)
        if found is not None:
            yield (fibres, *found)
        if work[0] < 0:
            return


def _within(
    costs: Sequence[Mapping[int, int]], begun: tuple[int, ...], allowed: int, work: list[int]
) -> Iterator[tuple[int, ...]]:
    """Yield the fibres of one strand with no more changes than allowed, lowest numbers first."""
    if len(begun) == len(costs):
        yield begun
        return
    for fibre, cost in sorted(costs[len(begun)].items()):
        work[0] -= 1
        if work[0] < 0:
            return
        change = bool(begun) and begun[-1] != fibre
        if change + cost <= allowed:
            yield from _within(costs, (*begun, fibre), allowed - change, work)


def _free(taken: _Taken, piece: tuple[str, Span | None]) -> set[int]:
    cable, span = piece
    used = {
        fibre
        for fibre, spans in taken.spans[cable].items()
        if any(_overlap(span, other) for other in spans)
    }
    return set(range(1, taken.counts[cable] + 1)) - used


def _overlap(one: Span | None, other: Span | None) -> bool:
    return one is None or other is None or (one[0] < other[1] and other[0] < one[1])


def _take(taken: _Taken, pieces: Pieces, fibres: Sequence[int]) -> None:
    for (cable, span), fibre in zip(pieces, fibres, strict=True):
        taken.spans[cable][fibre].append(span)


def _give_back(taken: _Taken, pieces: Pieces, fibres: Sequence[int]) -> None:
    for (cable, span), fibre in zip(pieces, fibres, strict=True):
        taken.spans[cable][fibre].remove(span)
