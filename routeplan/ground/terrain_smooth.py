"""Smoothing of heights along a way, so that their noise does not lengthen it."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from routeplan.run.model import Floats

__all__ = ["smoothed_heights_m"]

_KNOTS_PER_WAVE = 50  # stations nearer than this share of the wave length add nothing


def smoothed_heights_m(along_m: Floats, heights_m: Floats, *, wave_m: float) -> Floats:
    """
    Return heights along a way without the ups and downs shorter than `wave_m`.

    The smooth profile z minimises the integral of (h - z)^2 + (wave_m / 2 pi)^4 z''^2 over the
    way: Whittaker's graduation with the second derivative as penalty [1]_, every station
    weighted by the length it stands for. A wave of length `wave_m` keeps half its height, one of
    half that length 1/17, one of twice that length 16/17; an even slope stays as it is, up to
    the ends. Exact, by a pentadiagonal Cholesky factor; costs about a microsecond a station.

    Parameters
    ----------
    along_m
        Distance of every station along the way, not falling, shape (n,). [m]
    heights_m
        Height of every station, all known, shape (n,). [m]
    wave_m
        Length of the wave that is halved; 0 leaves the heights as they are. [m]

    Returns
    -------
    heights_m
        Shape (n,). [m]

    References
    ----------
    .. [1] E. T. Whittaker, On a new method of graduation, Proc. Edinburgh Math. Soc. 41 (1923)
       63-75; P. H. C. Eilers, A perfect smoother, Anal. Chem. 75 (2003) 3631-3636.

    Examples
    --------
    >>> along = np.arange(0.0, 500.0, 10.0)
    >>> bool(np.allclose(smoothed_heights_m(along, 0.2 * along, wave_m=100.0), 0.2 * along))
    True
    """
    if wave_m <= 0.0 or len(along_m) < 3:
        return heights_m
    knots = _knots(along_m, wave_m / _KNOTS_PER_WAVE)
    if len(knots) < 3:
        return np.interp(along_m, along_m[[0, -1]], heights_m[[0, -1]])
    at = along_m[knots]
    smooth = _whittaker(at, heights_m[knots], (wave_m / (2.0 * math.pi)) ** 4)
    return np.interp(along_m, at, smooth)


def _knots(along_m: Floats, apart_m: float) -> NDArray[np.int64]:
    """Return stations at least so far apart, the first and the last among them."""
    if np.diff(along_m).min() >= apart_m:
        return np.arange(len(along_m))
    kept = [0]
    last = along_m[-1]
    for at, place in enumerate(along_m.tolist()):
        if place - along_m[kept[-1]] >= apart_m and last - place >= apart_m:
            kept.append(at)
    if last > along_m[kept[-1]]:
        kept.append(len(along_m) - 1)
    return np.array(kept)


def _whittaker(at: Floats, values: Floats, penalty: float) -> Floats:
    """Return the minimum of sum w (v - z)^2 + penalty sum g (z'')^2 over stations."""
    step = np.diff(at)
    weight = np.concatenate([step[:1], step[:-1] + step[1:], step[-1:]]) / 2.0
    gap = (step[:-1] + step[1:]) / 2.0
    # Second derivative at inner stations: one row (left, middle, right) each.
    left, right = 1.0 / (gap * step[:-1]), 1.0 / (gap * step[1:])
    middle = -(left + right)
    share = penalty * gap
    main, first, second = weight.copy(), np.zeros(len(at)), np.zeros(len(at))
    main[:-2] += share * left * left
    main[1:-1] += share * middle * middle
    main[2:] += share * right * right
    first[:-2] += share * left * middle
    first[1:-1] += share * middle * right
    second[:-2] += share * left * right
    return _banded(main, first, second, weight * values)


def _banded(main: Floats, first: Floats, second: Floats, right: Floats) -> Floats:
    """Solve a symmetric positive system of two side bands, by L D L^T."""
    d1 = d2 = l1 = l21 = l22 = y1 = y2 = 0.0  # of the last row and the one before
    rows: list[tuple[float, float, float]] = []
    for m, a, b, r in zip(
        main.tolist(), first.tolist(), second.tolist(), right.tolist(), strict=True
    ):
        d = m - d1 * l1 * l1 - d2 * l22 * l22
        y = r - l1 * y1 - l22 * y2
        below = (a - d1 * l1 * l21) / d
        rows.append((y / d, below, b / d))
        d2, d1, y2, y1 = d1, d, y1, y
        l22, l21, l1 = l21, b / d, below
    solved = np.empty(len(rows))
    x1 = x2 = 0.0
    for index in range(len(rows) - 1, -1, -1):
        value, below, further = rows[index]
        x = value - below * x1 - further * x2
        solved[index] = x
        x2, x1 = x1, x
    return solved
