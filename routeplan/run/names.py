"""The names a run file may use of the published tables: fibre types, interfaces, colour codes."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

__all__ = [
    "InterfaceClass",
    "attenuator_steps_db",
    "cable_makes",
    "colour_codes",
    "connector_grades",
    "fibre_types",
    "interface_classes",
    "optical_parts",
]


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
    """
    Return the interfaces of the table by name.

    Where two of one name but for its last part belong together on one fibre, each has the light
    of both, and so has the name they share.
    """
    rows = {row["name"]: row for row in _rows("interfaces")}
    found: dict[str, InterfaceClass] = {}
    for name, row in rows.items():
        ends = [row, rows[row["mate"]]] if row.get("mate") else [row]
        light = InterfaceClass(
            wavelengths_nm=tuple(sorted(nm for end in ends for nm in end["wavelengths_nm"])),
            bands_nm=tuple((low, high) for end in ends for low, high in end["bands_nm"]),
        )
        found[name] = light
        if row.get("mate"):
            found.setdefault(name.rpartition("-")[0], light)
    return found


@cache
def cable_makes() -> dict[str, float]:
    """Return the makes of cable of the table, with how much longer the fibre is in each. [-]"""
    return {row["name"]: row["glass_over_sheath_ratio"] for row in _rows("cable_makes")}


@cache
def connector_grades() -> dict[str, dict[str, float]]:
    """Return the connector grades of the table: mean, sigma and limit by name. [dB]"""
    keys = ("mean_db", "sigma_db", "limit_db")
    return {row["name"]: {key: row[key] for key in keys} for row in _rows("connectors")}


@cache
def optical_parts() -> tuple[str, ...]:
    """Return the passive parts of the table."""
    return tuple(row["name"] for row in _rows("optical_parts"))


@cache
def attenuator_steps_db() -> tuple[float, ...]:
    """Return the fixed attenuators that are in stock, least first. [dB]"""
    return tuple(sorted(row["loss_db"] for row in _rows("attenuators")))


def _rows(table: str) -> list[dict[str, Any]]:
    # Other rooms check these tables through the loader; here only their names are wanted.
    text = (files("routeplan.tables") / f"{table}.toml").read_text("utf-8")
    rows: list[dict[str, Any]] = tomllib.loads(text)["row"]
    return rows
