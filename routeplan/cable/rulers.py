"""The three rulers of a cable: ground chain, sheath along the jacket, glass along the fibre."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from routeplan.cable.model import Millimetres, Rulers
from routeplan.cable.slack import Step
from routeplan.cable.way import Way
from routeplan.ground.model import Stretch
from routeplan.run.model import Placement
from routeplan.run.practice import Slack
from routeplan.units import mm_from_m

__all__ = [
    "BareRuler",
    "bare_ruler",
    "chain_from_reading",
    "existing_glass_mm",
    "readings",
    "ruled",
]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BareRuler:
    """
    Sheath readings before any joint, at every knot of a way, all shape (n,).

    `before_mm` is the reading as the chain value is reached, `step_mm` the spare cable stored
    there, `half_mm` the part of it that lies before a joint at that knot. `piece_mm` and
    `is_existing`, shape (n - 1,), tell of the piece after each knot: the sheath of an existing
    span is not ours and does not count.
    """

    chain_mm: Millimetres
    before_mm: Millimetres
    step_mm: Millimetres
    half_mm: Millimetres
    piece_mm: Millimetres
    is_existing: NDArray[np.bool_]


def bare_ruler(
    way: Way, steps: Sequence[Step], *, slack: Slack, end_mm: tuple[int, int]
) -> BareRuler:
    """
    Return the sheath ruler with undulation, spare cable and ends, but no joints.

    Every spot, step, place it is entered at and bound of a stretch is a knot, and each piece
    between knots is rounded to a millimetre by itself, so that a joint at a spot moves nothing
    else.

    Parameters
    ----------
    way
        The cable's way.
    steps
        Spare cable along it.
    slack
        House rules: `undulation_ratio` by placement.
    end_mm
        Cable beyond the first and the last chain value: an entry or a tail. [mm]
    """
    bounds = [s.start_mm for s in way.stretches] + [way.length_mm]
    entered = [passed.chain_mm for passed in way.passed if passed.is_entered]
    stored = [s.chain_mm for s in steps] + [s.chain_mm for s in way.spots]
    chain = np.unique(np.array(bounds + entered + stored))
    middle = 0.5 * (chain[1:] + chain[:-1])
    at = np.searchsorted(bounds, middle, side="right") - 1
    ratio = np.array([_undulation(s.placement, slack) for s in way.stretches])[at]
    piece = np.rint(np.diff(chain) * (1.0 + ratio)).astype(np.int64)
    is_existing = np.array([s.placement == "existing" for s in way.stretches])[at]
    piece[is_existing] = 0
    step = np.zeros(len(chain), dtype=np.int64)
    np.add.at(
        step,
        np.searchsorted(chain, [s.chain_mm for s in steps]),
        np.array([s.sheath_mm for s in steps], dtype=np.int64),
    )
    half = (step + 1) // 2 if way.is_turned else step // 2
    step[[0, -1]] += np.array(end_mm)
    half[0], half[-1] = step[0], 0
    before = np.concatenate([[0], np.cumsum(piece + step[:-1])])
    return BareRuler(
        chain_mm=chain,
        before_mm=before,
        step_mm=step,
        half_mm=half,
        piece_mm=piece,
        is_existing=is_existing,
    )


def _undulation(placement: Placement, slack: Slack) -> float:
    return 0.0 if placement == "existing" else slack.undulation_ratio[placement]


def ruled(
    way: Way, bare: BareRuler, parted: Mapping[int, tuple[int, int]], *, glass_ratio: float
) -> Rulers:
    """
    Return the rulers with the joints in.

    Parameters
    ----------
    way
        The cable's way.
    bare
        Its ruler before joints.
    parted
        For each joint's chain value the cable stored there before and after the splice, tails
        and the shares of a loop. [mm]
    glass_ratio
        How much longer the fibre is than the sheath. [-]
    """
    chains: list[int] = []
    sheath_steps: list[int] = []
    existing = _existing_glass(way, bare)
    glass_extra: list[int] = []
    for k, at in enumerate(bare.chain_mm.tolist()):
        piece = int(bare.piece_mm[k - 1]) if k else 0
        chains.append(at)
        sheath_steps.append(piece)
        glass_extra.append(existing[k - 1] if k else 0)
        for part in parted.get(at, (int(bare.step_mm[k]),)):
            if part or at in parted:
                chains.append(at)
                sheath_steps.append(part)
                glass_extra.append(0)
    steps = np.array(sheath_steps, dtype=np.int64)
    glass = np.rint(steps * (1.0 + glass_ratio)).astype(np.int64) + np.array(glass_extra)
    return Rulers(
        cable=way.cable.id,
        chain_mm=np.array(chains, dtype=np.int64),
        sheath_mm=np.cumsum(steps),
        glass_mm=np.cumsum(glass),
    )


def _existing_glass(way: Way, bare: BareRuler) -> list[int]:
    """Return the existing glass in the piece after each knot but the last. [mm]"""
    glass = [0] * len(bare.piece_mm)
    for stretch in way.stretches:
        if stretch.placement != "existing":
            continue
        first, last = np.searchsorted(bare.chain_mm, [stretch.start_mm, stretch.end_mm]).tolist()
        along = bare.chain_mm[first : last + 1] - stretch.start_mm
        reached = _shared_mm(existing_glass_mm(stretch), along.tolist(), is_turned=way.is_turned)
        glass[first:last] = np.diff(reached).tolist()
    return glass


def existing_glass_mm(stretch: Stretch) -> int:
    """Return the fibre in an existing span: as declared, else as long as its way. [mm]"""
    if stretch.existing_m is None:
        return stretch.end_mm - stretch.start_mm
    return mm_from_m(stretch.existing_m)


def _shared_mm(whole_mm: int, along_mm: Sequence[int], *, is_turned: bool) -> list[int]:
    """
    Return how much of a whole lies before each of some points, the half rounded either way.

    Parameters
    ----------
    whole_mm
        The whole. [mm]
    along_mm
        How far along every point lies, rising from 0 to the end. [mm]
    is_turned
        Whether the half is rounded down, so that the mirrored points get the mirrored shares.
    """
    total = max(along_mm[-1], 1)
    up = 0 if is_turned else 1
    # Twice the share plus one half, rounded down; turned, the exact half stays below.
    return [(2 * whole_mm * at + total + up - 1) // (2 * total) for at in along_mm]


def readings(
    rulers: Rulers, chain_mm: Millimetres
) -> tuple[tuple[Millimetres, Millimetres], tuple[Millimetres, Millimetres]]:
    """
    Return sheath and glass readings of chain values, before and after any step there.

    Parameters
    ----------
    rulers
        Rulers of the cable.
    chain_mm
        Chain values, shape (n,). [mm]

    Returns
    -------
    sheath_mm
        Readings before and after, shape (n,) each. [mm]
    glass_mm
        Readings before and after, shape (n,) each. [mm]
    """
    first = np.searchsorted(rulers.chain_mm, chain_mm, side="left")
    last = np.searchsorted(rulers.chain_mm, chain_mm, side="right") - 1
    is_knot = last >= first
    sheath = _between(rulers.chain_mm, rulers.sheath_mm, chain_mm, first)
    glass = _between(rulers.chain_mm, rulers.glass_mm, chain_mm, first)
    return (
        (
            np.where(
                is_knot, rulers.sheath_mm[np.minimum(first, len(rulers.chain_mm) - 1)], sheath
            ),
            np.where(is_knot, rulers.sheath_mm[last], sheath),
        ),
        (
            np.where(is_knot, rulers.glass_mm[np.minimum(first, len(rulers.chain_mm) - 1)], glass),
            np.where(is_knot, rulers.glass_mm[last], glass),
        ),
    )


def _between(
    knots_mm: Millimetres, values_mm: Millimetres, at_mm: Millimetres, upper: NDArray[np.int64]
) -> Millimetres:
    """Interpolate between the knots on either side of each value, to the millimetre."""
    high = np.clip(upper, 1, len(knots_mm) - 1)
    low = high - 1
    span = np.maximum(knots_mm[high] - knots_mm[low], 1)
    rise = (values_mm[high] - values_mm[low]) * (at_mm - knots_mm[low])
    return np.asarray(values_mm[low] + (2 * rise + span) // (2 * span))


def chain_from_reading(
    chain_mm: Millimetres, ruler_mm: Millimetres, reading_mm: Millimetres
) -> Millimetres:
    """
    Return the chain values at readings of one ruler; anywhere in a loop it is the loop's own.

    Parameters
    ----------
    chain_mm
        Chain values of the ruler's knots, shape (n,). [mm]
    ruler_mm
        Readings at the knots, `sheath_mm` or `glass_mm` of `Rulers`, shape (n,). [mm]
    reading_mm
        Readings to invert, shape (m,). [mm]
    """
    upper = np.searchsorted(ruler_mm, reading_mm, side="left")
    return _between(ruler_mm, chain_mm, reading_mm, upper)
