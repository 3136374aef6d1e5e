"""How dangerous the light in a fibre may be."""

from __future__ import annotations

from dataclasses import dataclass
from math import log10

from routeplan.light.interfaces import Optic
from routeplan.tables import load_rows

__all__ = ["HazardRow", "hazard_level", "hazard_limit_dbm", "launch_hazard", "total_dbm"]


@dataclass(frozen=True, slots=True, kw_only=True)
class HazardRow:
    """Highest power of one hazard level in a band of wavelengths."""

    name: str
    level: str
    wavelength_min_nm: float
    wavelength_max_nm: float
    limit_dbm: float
    source: str
    confidence: str


def total_dbm(lane_dbm: float, lane_count: int) -> float:
    """
    Return the power of several equal lanes on one fibre.

    Parameters
    ----------
    lane_dbm
        Power of each. [dBm]
    lane_count
        Lanes, or channels, on the fibre. [-]

    Returns
    -------
    total_dbm
        [dBm]

    References
    ----------
    .. [1] IEEE 802.3, clause 88: four lanes at 4.5 dBm are 10.5 dBm.

    Examples
    --------
    >>> round(total_dbm(4.5, 4), 2)
    10.52
    """
    return lane_dbm + 10.0 * log10(lane_count)


def hazard_level(power_dbm: float, wavelength_nm: float) -> str:
    """
    Return the lowest hazard level that holds a power: "1", "1M", "3B" or "4".

    Parameters
    ----------
    power_dbm
        Continuous power in the fibre, all channels together. [dBm]
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    hazard_level
        The label on the equipment goes before it.

    References
    ----------
    .. [1] IEC 60825-2: table `laser_hazard`, from memory.

    Examples
    --------
    >>> hazard_level(4.0, 1550.0), hazard_level(13.0, 1550.0)
    ('1', '1M')
    """
    rows = (
        row
        for row in load_rows("laser_hazard", HazardRow)
        if row.wavelength_min_nm <= wavelength_nm < row.wavelength_max_nm
    )
    found = [row for row in rows if power_dbm <= row.limit_dbm]
    return min(found, key=lambda row: row.limit_dbm).level if found else "4"


def hazard_limit_dbm(level: str, wavelength_nm: float) -> float:
    """
    Return the highest power of a hazard level.

    Parameters
    ----------
    level
        "1", "1M" or "3B".
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    hazard_limit_dbm
        Continuous power in the fibre. [dBm]

    References
    ----------
    .. [1] IEC 60825-2: table `laser_hazard`, from memory.

    Examples
    --------
    >>> hazard_limit_dbm("1", 1550.0)
    10.0
    """
    rows: tuple[HazardRow, ...] = load_rows("laser_hazard", HazardRow)
    return next(
        row.limit_dbm
        for row in rows
        if row.level == level and row.wavelength_min_nm <= wavelength_nm < row.wavelength_max_nm
    )


def launch_hazard(optic: Optic) -> tuple[float, str] | None:
    """
    Return the highest power an interface launches into one fibre and its hazard level.

    Parameters
    ----------
    optic
        The interface; lanes on parallel fibres count one by one.

    Returns
    -------
    launch_hazard
        Power and level, or None if the launch is not known. [dBm]

    References
    ----------
    .. [1] See `total_dbm` and `hazard_level`.

    Examples
    --------
    >>> from routeplan.light.interfaces import find_interface
    >>> launch_hazard(find_interface("100GBASE-LR4", {}).at_from)
    (10.5, '1')
    """
    if optic.tx_max_dbm is None:
        return None
    power_dbm = optic.tx_total_max_dbm
    if power_dbm is None:
        power_dbm = total_dbm(optic.tx_max_dbm, len(optic.wavelengths_nm))
    return power_dbm, hazard_level(power_dbm, optic.wavelengths_nm[0])
