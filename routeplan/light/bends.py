"""What declared bends lose, by the limits that fibre types are sold to."""

from __future__ import annotations

from dataclasses import dataclass
from math import exp, log
from typing import ClassVar

from routeplan.light.fibres import Fibre
from routeplan.light.model import PartLoss
from routeplan.tables import load_rows

__all__ = ["BendRow", "bend_loss"]

# Fibre of category A of G.657 meets G.652.D as well, and so its limit.
_ALSO = {"G.657.A1": ("G.652.D",), "G.657.A2": ("G.652.D", "G.657.A1")}


@dataclass(frozen=True, slots=True, kw_only=True)
class BendRow:
    """Highest loss of all the stated turns together."""

    KEY: ClassVar[tuple[str, ...]] = ("fibre_type", "radius_mm", "turns", "wavelength_nm")

    fibre_type: str
    radius_mm: float
    turns: float
    wavelength_nm: float
    limit_db: float
    source: str
    confidence: str


def bend_loss(
    fibre: Fibre, radius_mm: float, turns: float, *, wavelength_nm: float
) -> PartLoss | None:
    """
    Return what turns of a radius may lose, or None if they are tighter than any limit covers.

    A limit is for its stated number of turns together. Fewer turns keep the whole of it as their
    limit, and their share as mean; more turns multiply it. A radius between two rows is taken as
    the smaller one's; wavelengths under 1550 nm, which bend better, as 1550 nm; between 1550 and
    1625 nm the logarithm of the limit is straight.

    Parameters
    ----------
    fibre
        Fibre type.
    radius_mm
        Radius of the bend. [mm]
    turns
        Number of turns together; a right angle is 0.25. [-]
    wavelength_nm
        Vacuum wavelength. [nm]

    Returns
    -------
    bend_loss
        Mean and limit, no scatter. [dB]

    References
    ----------
    .. [1] ITU-T G.652, table 2; ITU-T G.657, tables 1 and 2: table `bends`.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> bend_loss(find_fibre("G.657.A1"), 15.0, 1.0, wavelength_nm=1550.0).limit_db
    0.25
    """
    types = (fibre.name, *_ALSO.get(fibre.name, ()))
    rows = [
        row
        for row in load_rows("bends", BendRow)
        if row.fibre_type in types and row.radius_mm <= radius_mm
    ]
    tests = {(row.fibre_type, row.radius_mm, row.turns) for row in rows}
    best: PartLoss | None = None
    for fibre_type, radius, stated in sorted(tests):
        own = [
            r for r in rows if (r.fibre_type, r.radius_mm, r.turns) == (fibre_type, radius, stated)
        ]
        limit_db = _limit_db(own, wavelength_nm)
        found = PartLoss(
            mean_db=limit_db * turns / stated,
            sigma_db=0.0,
            limit_db=limit_db * max(1.0, turns / stated),
            source=f"table bends, {fibre_type}: {stated:g} turns of {radius:g} mm",
        )
        best = found if best is None or found.limit_db < best.limit_db else best
    return best


def _limit_db(rows: list[BendRow], wavelength_nm: float) -> float:
    """Return the limit of one test at a wavelength."""
    first, last = sorted(rows, key=lambda row: row.wavelength_nm)
    if wavelength_nm <= first.wavelength_nm:
        return first.limit_db
    if wavelength_nm >= last.wavelength_nm:
        return last.limit_db
    share = (wavelength_nm - first.wavelength_nm) / (last.wavelength_nm - first.wavelength_nm)
    return exp(log(first.limit_db) + share * (log(last.limit_db) - log(first.limit_db)))
