"""What the models of a run file share: their base, and bounded kinds of values."""

from __future__ import annotations

from typing import Annotated, Literal, TypeAlias

from pydantic import BaseModel, ConfigDict, Field

__all__ = [
    "AnyPlacement",
    "Count",
    "Decibels",
    "Metres",
    "Money",
    "Name",
    "OwnPlacement",
    "PositiveMetres",
    "PowerDbm",
    "Ratio",
    "Section",
    "WavelengthNm",
    "rising",
    "without_repeats",
]

AnyPlacement = Literal[
    "aerial", "duct", "buried", "surface", "indoor", "bridge", "water", "existing"
]
OwnPlacement = Literal["aerial", "duct", "buried", "surface", "indoor", "bridge", "water"]

Metres: TypeAlias = Annotated[float, Field(ge=0, le=100_000)]
PositiveMetres: TypeAlias = Annotated[float, Field(gt=0, le=1_000_000)]
Ratio: TypeAlias = Annotated[float, Field(ge=0, le=0.5)]
Money: TypeAlias = Annotated[float, Field(ge=0, le=1e9)]
Decibels: TypeAlias = Annotated[float, Field(ge=0, le=100)]
PowerDbm: TypeAlias = Annotated[float, Field(ge=-100, le=50)]
Count: TypeAlias = Annotated[int, Field(ge=0, le=1000)]
WavelengthNm: TypeAlias = Annotated[float, Field(ge=1260, le=1625)]
Name: TypeAlias = Annotated[str, Field(min_length=1, max_length=500)]


class Section(BaseModel):
    """A section of a run file: frozen, strict, and closed to unknown keys."""

    model_config = ConfigDict(
        frozen=True,
        extra="forbid",
        strict=True,
        allow_inf_nan=False,
        validate_by_name=True,
        defer_build=True,  # a section within another is not built twice, one not used not at all
    )


def without_repeats(values: tuple[float, ...]) -> tuple[float, ...]:
    """Return the values, of which none may stand twice."""
    if len(set(values)) < len(values):
        raise ValueError("a value stands twice")
    return values


def rising(values: tuple[float, ...]) -> tuple[float, ...]:
    """Return the values in rising order, of which none may stand twice."""
    return tuple(sorted(without_repeats(values)))
