"""Fibres on the trays of a closure, tube by tube."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import groupby

__all__ = ["tray_places"]


def tray_places(
    tubes: Sequence[object | None], *, fibres_per_tray: int
) -> Iterator[tuple[int, int]]:
    """
    Yield tray and position of every fibre in a closure, tube by tube.

    Neighbours of one tube stay on one tray where they fit on one, and begin a new one if they
    must. Tray 0 stands for none.

    Parameters
    ----------
    tubes
        What has to stay together, fibre by fibre; None for a fibre that passes uncut.
    fibres_per_tray
        Fibres a tray holds. [-]

    Examples
    --------
    >>> list(tray_places(["a", "b", "b", None], fibres_per_tray=2))
    [(1, 1), (2, 1), (2, 2), (0, 1)]
    """
    used = 0
    for tube, group in groupby(tubes):
        count = len(list(group))
        if tube is None:
            yield from ((0, number) for number in range(1, count + 1))
            continue
        left = -used % fibres_per_tray
        used += left if left < count <= fibres_per_tray else 0
        for number in range(used, used + count):
            tray, position = divmod(number, fibres_per_tray)
            yield tray + 1, position + 1
        used += count
