"""What a link loses more over its life: repairs, temperature, ageing."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from routeplan.light.attenuation import attenuation_of, sigma_db_per_km
from routeplan.light.model import BudgetLine
from routeplan.light.power import printed_db
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.tables import load_rows

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["AgeingRow", "ageing_lines", "repair_line"]

_M_PER_KM = 1000.0
_SPLICES_A_REPAIR = 2  # both ends of the piece that is put in


@dataclass(frozen=True, slots=True, kw_only=True)
class AgeingRow:
    """One allowance for the years: a loss of its own, and one for each kilometre."""

    name: str
    each_db: float
    per_km_db: float
    reason: str
    source: str
    confidence: str


def repair_line(
    repairs: int,
    *,
    cable_m: float,
    tail_m: float,
    fibre_type: str,
    wavelength_nm: float,
    practice: LossPractice,
) -> BudgetLine:
    """
    Return the line of the repairs expected over the life of a link.

    A repair is two splices in two closures, the tails in both, and a piece of new cable.

    Parameters
    ----------
    repairs
        How many. [-]
    cable_m
        New cable put in beyond what is cut out. [m]
    tail_m
        Each cable end in a closure; a repair has four. [m]
    fibre_type
        Of the new cable.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.

    Returns
    -------
    repair_line
        Count is the number of repairs. [dB]

    References
    ----------
    .. [1] House rule; splices by practice, glass by table `attenuation`.
    """
    own = attenuation_of(fibre_type)
    km = (cable_m + 2 * _SPLICES_A_REPAIR * tail_m) / _M_PER_KM
    glass_sigma_db = sigma_db_per_km(wavelength_nm, own) * km
    variance = _SPLICES_A_REPAIR * practice.splice_sigma_db**2 + glass_sigma_db**2
    mean_db = attenuation_db_per_km(wavelength_nm, own.typical) * km
    limit_db = attenuation_db_per_km(wavelength_nm, own.maximum) * km
    return BudgetLine(
        item="repairs",
        count=repairs,
        each_db=printed_db(_SPLICES_A_REPAIR * practice.splice_mean_db + mean_db),
        sigma_db=printed_db(variance**0.5),
        limit_db=printed_db(_SPLICES_A_REPAIR * practice.splice_limit_db + limit_db),
        source=f"{_SPLICES_A_REPAIR} splices by practice and {km * _M_PER_KM:g} m of {fibre_type}",
    )


def ageing_lines(glass_m: float) -> tuple[BudgetLine, ...]:
    """
    Return the allowances for temperature and ageing, each with its reason.

    Parameters
    ----------
    glass_m
        Length of the circuit's fibre. [m]

    Returns
    -------
    ageing_lines
        Taken as they are: mean and limit are the same. [dB]

    References
    ----------
    .. [1] Table `ageing`, common practice.

    Examples
    --------
    >>> [(line.item, line.each_db) for line in ageing_lines(20_000.0)]
    [('temperature', 1.0), ('transmitter ageing', 1.0), ('connector wear', 0.5)]
    """
    lines = []
    for row in load_rows("ageing", AgeingRow):
        loss_db = printed_db(row.each_db + row.per_km_db * glass_m / _M_PER_KM)
        lines.append(
            BudgetLine(
                item=row.name,
                count=1,
                each_db=loss_db,
                sigma_db=0.0,
                limit_db=loss_db,
                source=f"table ageing: {row.reason}",
            )
        )
    return tuple(lines)
