"""Attenuation of a circuit's glass against wavelength."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from routeplan.circuits import CircuitPlan, measured_glass
from routeplan.light.attenuation import MeasuredPoint, attenuation_of
from routeplan.light.contributions import measured_of
from routeplan.light.fibres import find_fibre
from routeplan.light.model import ExistingSpan, Glass, Path
from routeplan.light.spectrum import loss_spectrum
from routeplan.planning import Plan
from routeplan.sheets.columns import Json, Row
from routeplan.sheets.rows import shaped

__all__ = ["spectrum_row"]

_STEP_NM = 5.0
_DIGITS = 4


def spectrum_row(planned: Plan, circuit: CircuitPlan) -> Row:
    """
    Return typical and highest attenuation of all the glass of a circuit, 5 nm apart.

    Glass of several kinds counts by its length.

    Parameters
    ----------
    planned
        The plan.
    circuit
        One of its circuits; its first path is taken.
    """
    measured = measured_glass(planned.run, planned.layout)
    lengths_m = _lengths_m(circuit.paths[0], measured)
    types = sorted({fibre_type for fibre_type, _ in lengths_m})
    nm = typical = highest = np.zeros(1)
    for (fibre_type, points), length_m in lengths_m.items():
        own = attenuation_of(fibre_type, points)
        share = length_m / sum(lengths_m.values())
        nm, own_typical = loss_spectrum(own.typical, step_nm=_STEP_NM)
        typical = typical + share * own_typical
        highest = highest + share * loss_spectrum(own.maximum, step_nm=_STEP_NM)[1]
    ceilings = find_fibre(types[0]).ceilings if len(types) == 1 else ()
    return shaped(
        "spectrum",
        {
            "fibre_types": list(types),
            "wavelengths_nm": _listed(nm),
            "typical_db_per_km": _listed(typical),
            "max_db_per_km": _listed(highest),
            "ceilings": [
                shaped(
                    "ceilings",
                    {
                        "wavelength_min_nm": row.wavelength_min_nm,
                        "wavelength_max_nm": row.wavelength_max_nm,
                        "max_db_per_km": row.max_db_per_km,
                    },
                )
                for row in ceilings
            ],
        },
    )


def _lengths_m(
    path: Path, measured: Mapping[str, Sequence[MeasuredPoint]]
) -> dict[tuple[str, tuple[MeasuredPoint, ...]], float]:
    """Return the length of glass of each type and measurement."""
    found: dict[tuple[str, tuple[MeasuredPoint, ...]], float] = {}
    for step in path.steps:
        if isinstance(step, Glass | ExistingSpan):
            points = tuple(measured_of(step, measured)) if isinstance(step, Glass) else ()
            key = (step.fibre_type, points)
            found[key] = found.get(key, 0.0) + step.glass_m
    return found


def _listed(values: NDArray[np.float64]) -> list[Json]:
    return [round(value, _DIGITS) for value in values.tolist()]
