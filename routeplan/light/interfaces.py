"""Optical interfaces: those of open standards, and one's own, in one shape."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from routeplan.errors import InputError, Problem
from routeplan.light.constants import constant
from routeplan.light.dispersion import sellmeier_ps_per_nm_km
from routeplan.light.model import Direction
from routeplan.light.names import nearest_name
from routeplan.tables import load_rows

if TYPE_CHECKING:
    from routeplan.run.practice import Interface

__all__ = [
    "Channel",
    "Optic",
    "OpticPair",
    "channels",
    "check_fibre_count",
    "check_interface",
    "check_wavelengths",
    "default_wavelengths_nm",
    "dispersion_limits_ps_per_nm",
    "find_interface",
    "interface_names",
    "own_optic",
]

_M_PER_KM = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Optic:
    """
    One optical interface: what its transmitter and receiver promise in each lane.

    `basis` tells what the loss is held against: the standard's channel insertion loss, its
    penalties already set aside, or launch less penalty less sensitivity. Powers are averages of
    one lane; what is not known is None. `mate` names what stands at the other end where that is
    not the same interface.
    """

    name: str
    basis: Literal["channel", "sensitivity"]
    bands_nm: tuple[tuple[float, ...], ...]
    wavelengths_nm: tuple[float, ...]
    family: str = "own"
    mate: str = ""
    fibre_count: int = 2
    bit_rate_gbps: float | None = None
    lane_gbd: float | None = None
    levels: int = 2
    tx_min_dbm: float | None = None
    tx_max_dbm: float | None = None
    tx_total_max_dbm: float | None = None
    rx_sensitivity_dbm: float | None = None
    rx_sensitivity_oma_dbm: float | None = None
    rx_overload_dbm: float | None = None
    rx_damage_dbm: float | None = None
    channel_loss_db: float | None = None
    channel_loss_min_db: float | None = None
    penalty_db: float = 0.0
    dispersion_reach_m: float | None = None
    dispersion_max_ps_per_nm: float | None = None
    line_width_nm: float | None = None
    return_loss_min_db: float | None = None
    rx_return_loss_db: float | None = None
    extinction_ratio_min_db: float | None = None
    reach_m: float | None = None
    source: str
    confidence: str
    note: str = ""

    @property
    def available_db(self) -> float | None:
        """What may be lost between the ends, or None where that cannot be known. [dB]"""
        if self.basis == "channel":
            return self.channel_loss_db
        if self.tx_min_dbm is None or self.rx_sensitivity_dbm is None:
            return None
        return self.tx_min_dbm - self.penalty_db - self.rx_sensitivity_dbm

    def carries(self, wavelength_nm: float) -> bool:
        """Return whether a wavelength lies in one of the bands."""
        return any(low <= wavelength_nm <= high for low, high in self.bands_nm)

    def other_lanes_nm(self, wavelength_nm: float) -> tuple[float, ...]:
        """Return the nominal wavelengths of the lanes that `wavelength_nm` is not in. [nm]"""
        return tuple(
            lane
            for lane, (low, high) in zip(self.wavelengths_nm, self.bands_nm, strict=True)
            if not low <= wavelength_nm <= high
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class OpticPair:
    """What stands at the two ends of a circuit; the same twice unless it works in pairs."""

    name: str
    at_from: Optic
    at_to: Optic


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """One wavelength in one direction, with the interface that sends it."""

    direction: Direction
    wavelength_nm: float
    optic: Optic | None


def interface_names() -> tuple[str, ...]:
    """Return the names of the interfaces of the table, in its order, pairs named once more."""
    return tuple(_table()) + tuple(_pairs())


def check_interface(
    name: str, own: Mapping[str, Interface], *, where: str = "interface"
) -> list[Problem]:
    """Return what is wrong with `name` as an interface: nothing, or one problem."""
    known = [*own, *interface_names()]
    if name in known:
        return []
    near = nearest_name(name, known)
    remedy = (
        f'Did you mean "{near}"?'
        if near
        else "`routeplan tables interfaces` lists those there are; your own is [interface.NAME]."
    )
    return [Problem(where=where, what="is not a known interface", value=f'"{name}"', remedy=remedy)]


def find_interface(
    name: str, own: Mapping[str, Interface], *, where: str = "interface"
) -> OpticPair:
    """
    Return the interface `name`: the user's own if there is one so named, or that of the table.

    One that works one fibre in both directions has its mate at the other end: "1000BASE-BX10-D"
    puts the D end at the circuit's `from`, "1000BASE-BX10-U" the U end, and "1000BASE-BX10" is
    the former.

    Raises
    ------
    InputError
        If there is none of that name.

    Examples
    --------
    >>> find_interface("1000BASE-BX10-U", {}).at_to.name
    '1000BASE-BX10-D'
    """
    if problems := check_interface(name, own, where=where):
        raise InputError(problems)
    if name in own:
        optic = own_optic(name, own[name])
        return OpticPair(name=name, at_from=optic, at_to=optic)
    table = _table()
    optic = table[_pairs().get(name, name)]
    return OpticPair(name=name, at_from=optic, at_to=table[optic.mate or optic.name])


def own_optic(name: str, own: Interface) -> Optic:
    """Return an interface of one's own in the shape of the table's; a channel loss goes first."""
    low_nm, high_nm = own.band_nm
    return Optic(
        name=name,
        basis="sensitivity" if own.channel_loss_db is None else "channel",
        bands_nm=((low_nm, high_nm),),
        wavelengths_nm=((low_nm + high_nm) / 2.0,),
        bit_rate_gbps=own.bit_rate_gbps,
        tx_min_dbm=own.tx_min_dbm,
        tx_max_dbm=own.tx_max_dbm,
        rx_sensitivity_dbm=own.rx_sensitivity_dbm,
        rx_overload_dbm=own.rx_overload_dbm,
        channel_loss_db=own.channel_loss_db,
        channel_loss_min_db=own.channel_loss_min_db,
        penalty_db=own.penalty_db,
        dispersion_max_ps_per_nm=own.dispersion_max_ps_per_nm,
        line_width_nm=own.line_width_nm,
        return_loss_min_db=own.return_loss_min_db,
        rx_return_loss_db=own.rx_return_loss_db,
        source=f"run file, interface.{name}",
        confidence="house rule",
    )


def default_wavelengths_nm(pair: OpticPair) -> tuple[float, ...]:
    """Return the nominal wavelengths of an interface, for a circuit that names none. [nm]"""
    return tuple(sorted({*pair.at_from.wavelengths_nm, *pair.at_to.wavelengths_nm}))


def check_wavelengths(
    pair: OpticPair, wavelengths_nm: Sequence[float], *, where: str
) -> list[Problem]:
    """
    Return what is wrong with the wavelengths of a circuit.

    Each outside every band of its interface is a problem, and a direction in which none is sent.

    Examples
    --------
    >>> [str(p) for p in check_wavelengths(find_interface("10GBASE-ER", {}), [1310.0],
    ...                                    where="circuit 1")]
    ['circuit 1: 10GBASE-ER does not send at this wavelength (1310 nm, limit 1530 to 1565 nm).']
    """
    ends = {optic.name: optic for optic in (pair.at_from, pair.at_to)}.values()
    limit = "; ".join(
        ", ".join(f"{low:g} to {high:g} nm" if low < high else f"{low:g} nm" for low, high in bands)
        for bands in (optic.bands_nm for optic in ends)
    )
    problems = [
        Problem(
            where=where,
            what=f"{pair.name} does not send at this wavelength",
            value=f"{nm:g} nm",
            limit=limit,
        )
        for nm in wavelengths_nm
        if not any(optic.carries(nm) for optic in ends)
    ]
    if problems:
        return problems
    return [
        Problem(
            where=where,
            what=f"no wavelength is listed for {optic.name}, which sends the other way",
            limit=limit,
            remedy=f"Add {optic.wavelengths_nm[0]:g}.",
        )
        for optic in ends
        if not any(optic.carries(nm) for nm in wavelengths_nm)
    ]


def check_fibre_count(pair: OpticPair, fibre_count: int, *, where: str) -> list[Problem]:
    """Return a problem if an interface of parallel fibres is named for a circuit of one or two."""
    needed = pair.at_from.fibre_count
    if needed <= max(2, fibre_count):
        return []
    return [
        Problem(
            where=where,
            what=f"{pair.name} sends over parallel fibres",
            value=f"{fibre_count} fibres",
            limit=f"{needed} fibres",
            remedy="Name an interface for two fibres.",
        )
    ]


def channels(pair: OpticPair | None, wavelengths_nm: Sequence[float]) -> tuple[Channel, ...]:
    """
    Return what is to be computed: each direction with each wavelength its end sends.

    Examples
    --------
    >>> [(c.direction, c.wavelength_nm)
    ...  for c in channels(find_interface("1000BASE-BX10", {}), [1490.0, 1310.0])]
    [('from-to', 1490.0), ('to-from', 1310.0)]
    """
    ends: tuple[tuple[Direction, Optic | None], ...] = (
        ("from-to", pair.at_from if pair else None),
        ("to-from", pair.at_to if pair else None),
    )
    return tuple(
        Channel(direction=direction, wavelength_nm=nm, optic=optic)
        for nm in wavelengths_nm
        for direction, optic in ends
        if optic is None or optic.carries(nm)
    )


def dispersion_limits_ps_per_nm(optic: Optic, wavelength_nm: float) -> tuple[float, float] | None:
    r"""
    Return the least and the greatest dispersion an interface stands, or None if none is stated.

    An interface with one figure stands it with either sign. Ethernet's is that of the length
    the class is made for, with the standard's own bounds:

    .. math:: 0.02325 \, L \lambda \left[1 - (\lambda_0 / \lambda)^4\right],
              \quad \lambda_0 = 1324 \text{ and } 1300 \text{ nm}

    Parameters
    ----------
    optic
        The interface.
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    dispersion_limits_ps_per_nm
        Least, usually negative, and greatest. [ps/nm]

    References
    ----------
    .. [1] IEEE 802.3, dispersion of the singlemode channel; table `light_constants`.

    Examples
    --------
    >>> limits = dispersion_limits_ps_per_nm(find_interface("10GBASE-LR", {}).at_from, 1310.0)
    >>> [round(limit, 2) for limit in limits]
    [-13.23, 9.19]
    """
    if optic.dispersion_max_ps_per_nm is not None:
        return -optic.dispersion_max_ps_per_nm, optic.dispersion_max_ps_per_nm
    if optic.dispersion_reach_m is None:
        return None
    low, high = (
        sellmeier_ps_per_nm_km(
            wavelength_nm,
            zero_dispersion_nm=constant(zero),
            slope_ps_per_nm2_km=constant("ethernet_slope_ps_per_nm2_km"),
        )
        for zero in ("ethernet_zero_max_nm", "ethernet_zero_min_nm")
    )
    km = optic.dispersion_reach_m / _M_PER_KM
    return min(low * km, 0.0), max(high * km, 0.0)


def _table() -> dict[str, Optic]:
    return {row.name: row for row in load_rows("interfaces", Optic)}


def _pairs() -> dict[str, str]:
    """Return the common name of every pair with the name of its first row."""
    named: dict[str, str] = {}
    for row in load_rows("interfaces", Optic):
        if row.mate:
            named.setdefault(row.name.rpartition("-")[0], row.name)
    return named
