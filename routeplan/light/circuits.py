"""All budgets of a circuit, and which interfaces close it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from routeplan.light.budget import circuit_budget, circuit_verdict
from routeplan.light.contributions import Measured
from routeplan.light.interfaces import (
    OpticPair,
    channels,
    check_wavelengths,
    default_wavelengths_nm,
    find_interface,
    interface_names,
)
from routeplan.light.model import Budget, Direction, Path

if TYPE_CHECKING:
    from routeplan.run.practice import Interface
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["Closing", "circuit_budgets", "closing_interfaces", "least_margin_db"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Closing:
    """An interface that closes a circuit, with its budgets and the least of their margins."""

    pair: OpticPair
    wavelengths_nm: tuple[float, ...]
    budgets: tuple[Budget, ...]
    margin_db: float


def circuit_budgets(
    paths: Mapping[Direction, Path],
    pair: OpticPair | None,
    wavelengths_nm: Sequence[float],
    *,
    practice: LossPractice,
    measured: Measured | None = None,
    connector_return_loss_db: float | None = None,
) -> tuple[Budget, ...]:
    """
    Return the budget of every wavelength in every direction it is sent in.

    Parameters
    ----------
    paths
        Path of each direction.
    pair
        What stands at the ends; None where the circuit names no interface.
    wavelengths_nm
        Wavelengths of the circuit. [nm]
    practice
        The `loss` section of the run's practice.
    measured
        Measured attenuation by section or cable.
    connector_return_loss_db
        Of mated pairs that do not say their own. [dB]

    Returns
    -------
    circuit_budgets
        In order of wavelengths, from-to before to-from. [dB]

    References
    ----------
    .. [1] See `circuit_budget`.
    """
    return tuple(
        circuit_budget(
            paths[channel.direction],
            channel.wavelength_nm,
            practice=practice,
            optic=channel.optic,
            measured=measured,
            connector_return_loss_db=connector_return_loss_db,
        )
        for channel in channels(pair, wavelengths_nm)
    )


def closing_interfaces(
    paths: Mapping[Direction, Path],
    *,
    practice: LossPractice,
    own: Mapping[str, Interface] | None = None,
    measured: Measured | None = None,
    wavelengths_nm: Sequence[float] = (),
    fibre_count: int = 2,
) -> tuple[Closing, ...]:
    """
    Return every interface that closes a circuit, least capable first.

    Capability is the bit rate, then what may be lost. One's own interfaces are tried with those
    of the table.

    Parameters
    ----------
    paths
        Path of each direction.
    practice
        The `loss` section of the run's practice.
    own
        Interfaces of the run file.
    measured
        Measured attenuation by section or cable.
    wavelengths_nm
        Wavelengths the circuit insists on; none: each interface at its nominal ones. [nm]
    fibre_count
        Fibres the circuit has. [-]

    Returns
    -------
    closing_interfaces
        Those whose verdict is `fits`. [dB]

    References
    ----------
    .. [1] Table `interfaces`.
    """
    found: list[Closing] = []
    for name in dict.fromkeys([*(own or {}), *interface_names()]):
        pair = find_interface(name, own or {})
        if pair.name != name or pair.at_from.fibre_count > fibre_count or _is_turned(pair):
            continue
        listed = tuple(wavelengths_nm) or default_wavelengths_nm(pair)
        if check_wavelengths(pair, listed, where=name):
            continue
        budgets = circuit_budgets(paths, pair, listed, practice=practice, measured=measured)
        if circuit_verdict(budgets) == "fits":
            margin_db = least_margin_db(budgets, practice=practice)
            closing = Closing(
                pair=pair, wavelengths_nm=listed, budgets=budgets, margin_db=margin_db
            )
            found.append(closing)
    return tuple(sorted(found, key=_capability))


def least_margin_db(budgets: Sequence[Budget], *, practice: LossPractice) -> float:
    """
    Return the least margin of budgets, of the kind their verdict is on.

    Parameters
    ----------
    budgets
        Budgets with an interface.
    practice
        The `loss` section of the run's practice.

    Returns
    -------
    least_margin_db
        Any attenuator taken off. [dB]

    References
    ----------
    .. [1] See `circuit_budget`.
    """
    worst = practice.verdict_on == "worst"
    margins = [
        (budget.margin_db if worst else budget.statistical_margin_db or 0.0, budget.attenuator_db)
        for budget in budgets
    ]
    return round(min((margin or 0.0) - (mend or 0.0) for margin, mend in margins), 3)


def _is_turned(pair: OpticPair) -> bool:
    """Return whether a pair is named by one of its ends: its common name stands for both."""
    return pair.at_from != pair.at_to and pair.name in {pair.at_from.name, pair.at_to.name}


def _capability(closing: Closing) -> tuple[float, float, str]:
    optic = closing.pair.at_from
    return (optic.bit_rate_gbps or 0.0, optic.available_db or 0.0, closing.pair.name)
