"""Channels on one fibre: the coarse and the dense grid, multiplexers and splitters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import log10

from routeplan.errors import InputError, Problem
from routeplan.light.constants import constant
from routeplan.light.model import PartLoss
from routeplan.light.names import nearest_name
from routeplan.tables import load_rows

__all__ = [
    "CoarseChannel",
    "OpticalPart",
    "check_coarse_channels",
    "coarse_channel",
    "coarse_channel_count",
    "coarse_channels",
    "dense_channel_nm",
    "part_loss",
    "split_loss_db",
]

_NM_THZ = 1000.0  # c in m/s over 1e6: nanometres times terahertz


@dataclass(frozen=True, slots=True, kw_only=True)
class CoarseChannel:
    """One channel of the coarse grid."""

    name: str
    centre_nm: float
    half_width_nm: float
    source: str
    confidence: str

    def holds(self, wavelength_nm: float) -> bool:
        """Return whether a wavelength lies in the channel."""
        return abs(wavelength_nm - self.centre_nm) <= self.half_width_nm


@dataclass(frozen=True, slots=True, kw_only=True)
class OpticalPart:
    """A passive part in the path; `channel_count` is set for multiplexers of the coarse grid."""

    name: str
    channel_count: int | None = None
    typical_db: float
    sigma_db: float
    limit_db: float
    wavelength_min_nm: float
    wavelength_max_nm: float
    source: str
    confidence: str
    note: str = ""


def coarse_channels() -> tuple[CoarseChannel, ...]:
    """Return the 18 channels of the coarse grid, shortest wavelength first."""
    return load_rows("cwdm_grid", CoarseChannel)


def coarse_channel(wavelength_nm: float) -> CoarseChannel | None:
    """
    Return the coarse channel a wavelength lies in, or None between channels.

    Examples
    --------
    >>> coarse_channel(1310.0).name, coarse_channel(1318.0)
    ('1311', None)
    """
    return next((row for row in coarse_channels() if row.holds(wavelength_nm)), None)


def check_coarse_channels(wavelengths_nm: Sequence[float], *, where: str) -> list[Problem]:
    """Return what keeps wavelengths from sharing one fibre through coarse multiplexers."""
    problems: list[Problem] = []
    taken: dict[str, float] = {}
    for nm in wavelengths_nm:
        channel = coarse_channel(nm)
        if channel is None:
            near = min(coarse_channels(), key=lambda row: abs(row.centre_nm - nm))
            what = "lies between the channels of the coarse grid"
            remedy = f"The nearest is {near.centre_nm:g} nm, {near.half_width_nm:g} nm each way."
            problems.append(Problem(where=where, what=what, value=f"{nm:g} nm", remedy=remedy))
        elif channel.name in taken:
            what = f"needs the channel that {taken[channel.name]:g} nm has already"
            remedy = "Give one of the two another channel."
            problems.append(Problem(where=where, what=what, value=f"{nm:g} nm", remedy=remedy))
        else:
            taken[channel.name] = nm
    return problems


def coarse_channel_count(name: str) -> int | None:
    """Return the channels of a part of the table, or None if it is no coarse multiplexer."""
    rows: tuple[OpticalPart, ...] = load_rows("optical_parts", OpticalPart)
    return next((row.channel_count for row in rows if row.name == name), None)


def dense_channel_nm(number: int, spacing_thz: float) -> float:
    """
    Return the wavelength of a channel of the dense grid.

    Parameters
    ----------
    number
        Steps from 193.1 THz, either sign. [-]
    spacing_thz
        0.0125, 0.025, 0.05 or 0.1. [THz]

    Returns
    -------
    dense_channel_nm
        In vacuum. [nm]

    References
    ----------
    .. [1] ITU-T G.694.1.

    Examples
    --------
    >>> round(dense_channel_nm(0, 0.1), 2)
    1552.52
    """
    frequency_thz = constant("dwdm_anchor_thz") + number * spacing_thz
    return constant("speed_of_light_m_per_s") / frequency_thz / _NM_THZ


def split_loss_db(ways: int) -> float:
    """
    Return what an even split takes from each way, the splitter's own loss left out.

    Parameters
    ----------
    ways
        Outputs of the splitter, at least 1. [-]

    Returns
    -------
    split_loss_db
        [dB]

    References
    ----------
    .. [1] Conservation of power.

    Examples
    --------
    >>> round(split_loss_db(32), 3)
    15.051
    """
    return 10.0 * log10(ways)


def part_loss(name: str) -> PartLoss:
    """
    Return what a passive part of the table loses.

    Raises
    ------
    InputError
        If the table has no such part.

    Examples
    --------
    >>> part_loss("splitter 1:8").limit_db
    10.5
    """
    by_name: dict[str, OpticalPart] = {r.name: r for r in load_rows("optical_parts", OpticalPart)}
    if name not in by_name:
        near = nearest_name(name, by_name)
        remedy = f'Did you mean "{near}"?' if near else f"There are {', '.join(by_name)}."
        what = "is not a known passive part"
        raise InputError(Problem(where="part", what=what, value=f'"{name}"', remedy=remedy))
    row = by_name[name]
    return PartLoss(
        mean_db=row.typical_db,
        sigma_db=row.sigma_db,
        limit_db=row.limit_db,
        source=f"table optical_parts, {name}",
    )
