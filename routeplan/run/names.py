"""The names a run file may use of the published tables: fibre types, interfaces, colour codes."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

__all__ = ["InterfaceClass", "colour_codes", "fibre_types", "interface_classes"]


@dataclass(frozen=True, slots=True, kw_only=True)
class InterfaceClass:
    """What the run file needs to know of an interface of the table: its light."""

    wavelengths_nm: tuple[float, ...]
    bands_nm: tuple[tuple[float, float], ...]


@cache
def fibre_types() -> tuple[str, ...]:
    """Return the fibre types whose attenuation is in the tables, in their order."""
    return tuple(dict.fromkeys(n for row in _rows("attenuation") for n in row["fibre_types"]))


@cache
def colour_codes() -> tuple[str, ...]:
    """Return the colour codes of the table and their other names."""
    return tuple(n for row in _rows("colours") for n in (row["name"], *row.get("aliases", ())))


@cache
def interface_classes() -> dict[str, InterfaceClass]:
    """Return the interfaces of the table by name."""
    return {
        row["name"]: InterfaceClass(
            wavelengths_nm=tuple(row["wavelengths_nm"]),
            bands_nm=tuple((low, high) for low, high in row["bands_nm"]),
        )
        for row in _rows("interfaces")
    }


def _rows(table: str) -> list[dict[str, Any]]:
    # Other rooms check these tables through the loader; here only their names are wanted.
    text = (files("routeplan.tables") / f"{table}.toml").read_text("utf-8")
    rows: list[dict[str, Any]] = tomllib.loads(text)["row"]
    return rows
