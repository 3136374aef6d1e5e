"""Paths, practice and interfaces that the tests of light share."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from pathlib import Path as FilePath

from routeplan.light.interfaces import Optic
from routeplan.light.model import Direction, Glass, Mating, Path, SpliceStep, Step
from routeplan.run.practice import Loss, MeasuredAttenuation

REFERENCE = FilePath(__file__).parents[1] / "reference"


def published(name: str) -> list[dict[str, str]]:
    """Return the rows of a file of published values."""
    with (REFERENCE / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def example(number: str, quantity: str) -> tuple[float, float]:
    """Return a published value and half its last printed digit."""
    row = next(
        row
        for row in published("light_examples.csv")
        if row["example"] == number and row["quantity"] == quantity
    )
    return float(row["value"]), float(row["tolerance"])


def practice(**changes: object) -> Loss:
    """Return the loss section of a run's practice with some values changed."""
    values: dict[str, object] = {
        "splice_mean_db": 0.05,
        "splice_sigma_db": 0.03,
        "splice_limit_db": 0.10,
        "connector_mean_db": 0.25,
        "connector_sigma_db": 0.13,
        "connector_limit_db": 0.50,
        "connector_polish": "UPC",
        "connector_pairs": 2,
        "pigtail_splices": 2,
        "sigma_count": 3.0,
        "margin_db": 3.0,
        "verdict_on": "worst",
        "repairs_count": 2,
        "repair_cable_m": 30.0,
    }
    return Loss.model_validate(values | changes)


def path(
    lengths_m: Sequence[float],
    *,
    fibre_type: str = "G.652.D",
    cable: str = "",
    matings: int = 2,
    pigtails: int = 2,
    direction: Direction = "from-to",
) -> Path:
    """Return a path of sections spliced to each other, with connectors and pigtails in front."""
    steps: list[Step] = [Mating(where="panel")] * matings
    steps += [SpliceStep(where="panel", is_pigtail=True)] * pigtails
    for number, glass_m in enumerate(lengths_m):
        if number:
            steps.append(SpliceStep(where=f"J{number}"))
        steps.append(
            Glass(
                section=f"S{number + 1}",
                fibre=1,
                fibre_type=fibre_type,
                glass_m=glass_m,
                cable=cable,
            )
        )
    return Path(circuit="c", direction=direction, steps=tuple(steps))


def measured(*points: tuple[float, float]) -> tuple[MeasuredAttenuation, ...]:
    """Return measured attenuation at wavelengths."""
    return tuple(
        MeasuredAttenuation(wavelength_nm=nm, attenuation_db_per_km=db) for nm, db in points
    )


def optic(**values: object) -> Optic:
    """Return an interface at 1310 nm with the given figures."""
    fields: dict[str, object] = {
        "name": "own",
        "basis": "sensitivity",
        "bands_nm": ((1260.0, 1360.0),),
        "wavelengths_nm": (1310.0,),
        "source": "test",
        "confidence": "invented",
    }
    return Optic(**(fields | values))  # type: ignore[arg-type]
