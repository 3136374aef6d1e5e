"""Fibre types as the tables describe them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from typing import ClassVar

from routeplan.errors import InputError, Problem, TableError
from routeplan.light.names import nearest_name
from routeplan.tables import load_rows

__all__ = [
    "AttenuationCeiling",
    "AttenuationRow",
    "DispersionBound",
    "Fibre",
    "FibreQuantity",
    "check_fibre_type",
    "fibre_names",
    "find_fibre",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class FibreQuantity:
    """One attribute, for the fibre types that share its value."""

    KEY: ClassVar[tuple[str, ...]] = ("quantity", "fibre_types")

    quantity: str
    fibre_types: tuple[str, ...]
    value: float
    source: str
    confidence: str
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class AttenuationRow:
    """Attenuation of cabled fibre at one wavelength: typical, its scatter, what is ordered to."""

    KEY: ClassVar[tuple[str, ...]] = ("fibre_types", "wavelength_nm")

    fibre_types: tuple[str, ...]
    wavelength_nm: float
    typical_db_per_km: float
    sigma_db_per_km: float
    max_db_per_km: float
    source: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class AttenuationCeiling:
    """Highest attenuation a recommendation allows over a band."""

    KEY: ClassVar[tuple[str, ...]] = ("fibre_types", "wavelength_min_nm", "wavelength_max_nm")

    fibre_types: tuple[str, ...]
    wavelength_min_nm: float
    wavelength_max_nm: float
    max_db_per_km: float
    source: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class DispersionBound:
    """Bounds of the dispersion coefficient at one wavelength."""

    KEY: ClassVar[tuple[str, ...]] = ("fibre_type", "wavelength_nm")

    fibre_type: str
    wavelength_nm: float
    min_ps_per_nm_km: float
    max_ps_per_nm_km: float
    source: str
    confidence: str
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Fibre:
    """One fibre type: its attributes, attenuation rows, ceilings and dispersion bounds."""

    name: str
    cutoff_max_nm: float
    pmd_q_max_ps_per_sqrt_km: float
    group_index_1310: float
    group_index_1550: float
    bend_radius_min_mm: float
    concentricity_error_max_um: float
    proof_stress_min_gpa: float
    mfd_1310_min_um: float | None = None
    mfd_1310_max_um: float | None = None
    mfd_1310_tolerance_um: float | None = None
    mfd_1310_typical_um: float | None = None
    mfd_1550_min_um: float | None = None
    mfd_1550_max_um: float | None = None
    mfd_1550_tolerance_um: float | None = None
    mfd_1550_typical_um: float | None = None
    zero_dispersion_min_nm: float | None = None
    zero_dispersion_max_nm: float | None = None
    slope_min_ps_per_nm2_km: float | None = None
    slope_max_ps_per_nm2_km: float | None = None
    linear_1550_min_ps_per_nm_km: float | None = None
    linear_1550_max_ps_per_nm_km: float | None = None
    linear_slope_min_ps_per_nm2_km: float | None = None
    linear_slope_max_ps_per_nm2_km: float | None = None
    attenuation: tuple[AttenuationRow, ...]
    ceilings: tuple[AttenuationCeiling, ...]
    dispersion_bounds: tuple[DispersionBound, ...]


def fibre_names() -> tuple[str, ...]:
    """Return the names of the fibre types the tables hold."""
    rows = load_rows("attenuation", AttenuationRow)
    return tuple(sorted({name for row in rows for name in row.fibre_types}))


def check_fibre_type(name: str, *, where: str) -> list[Problem]:
    """Return what is wrong with `name` as a fibre type: nothing, or one problem."""
    if name in fibre_names():
        return []
    if name.upper().startswith(("OM", "G.651", "A1")):
        remedy = "Multimode fibre is not planned here. Use a singlemode type such as G.652.D."
    else:
        near = nearest_name(name, fibre_names())
        remedy = f'Did you mean "{near}"?' if near else f"There are {', '.join(fibre_names())}."
    return [
        Problem(where=where, what="is not a known fibre type", value=f'"{name}"', remedy=remedy)
    ]


@cache
def find_fibre(name: str) -> Fibre:
    """
    Return the fibre type `name`.

    Raises
    ------
    InputError
        If no table has a type of that name.

    Examples
    --------
    >>> find_fibre("G.652.D").zero_dispersion_max_nm
    1324.0
    """
    if problems := check_fibre_type(name, where="fibre type"):
        raise InputError(problems)
    values: dict[str, float] = {}
    for row in load_rows("fibres", FibreQuantity):
        if name in row.fibre_types:
            if row.quantity in values:
                raise TableError(
                    Problem(where=f"table fibres, {name}", what="stands twice", value=row.quantity)
                )
            values[row.quantity] = row.value
    points = [row for row in load_rows("attenuation", AttenuationRow) if name in row.fibre_types]
    ceilings = load_rows("attenuation_ceilings", AttenuationCeiling)
    bounds = [
        row for row in load_rows("dispersion_bounds", DispersionBound) if row.fibre_type == name
    ]
    return Fibre(
        name=name,
        attenuation=tuple(sorted(points, key=lambda row: row.wavelength_nm)),
        ceilings=tuple(row for row in ceilings if name in row.fibre_types),
        dispersion_bounds=tuple(sorted(bounds, key=lambda row: row.wavelength_nm)),
        **values,
    )
