"""Runs drawn in metres, east and north of a spot in open sea, for tests of what comes after."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from typing import Any

import numpy as np

from routeplan.geodesy import WGS84_INVERSE_FLATTENING, WGS84_SEMI_MAJOR_M
from routeplan.run.model import Floats, Line, Place, PlaceKind, Run, Source
from routeplan.run.runfile import Declared, declared_from_text
from routeplan.run.trouble import Trouble

LON, LAT = -30.0, 44.0
_JOINTS = {"pole": "avoid", "crossing": "no"}


@cache
def declared(toml: str = "") -> Declared:
    """Return what a run file of this text declares, defaults filled in."""
    trouble = Trouble()
    found = declared_from_text(toml.encode(), file="run.toml", trouble=trouble)
    trouble.raise_if_any()
    return found


def lonlat(*east_north_m: tuple[float, float]) -> Floats:
    """Return positions so many metres east and north of the spot, good to some millimetres."""
    metres = np.array(east_north_m, dtype=float)
    north = LAT + metres[:, 1] / 111_112.242
    east = LON + metres[:, 0] / (80_206.193 * np.cos(np.radians(north)) / np.cos(np.radians(LAT)))
    return np.column_stack([east, north])


def straight(length_m: float, *, count: int = 2, start_m: float = 0.0) -> Floats:
    """Return a line due north of this geodesic length, its vertices equally far apart."""
    from pyproj import Geod

    geod = Geod(a=WGS84_SEMI_MAJOR_M, rf=WGS84_INVERSE_FLATTENING)
    at = start_m + np.linspace(0.0, length_m, count)
    same = np.full(count, LON), np.full(count, LAT)
    lon, lat, _ = geod.fwd(*same, np.zeros(count), at)
    return np.column_stack([lon, lat])


def make_line(positions: Floats, placement: str | None = None, **more: Any) -> Line:
    """Return a line as the reader gives it."""
    name = more.pop("name", "")
    values: dict[str, Any] = {
        "datum_lonlat": positions,
        "semi_major_m": WGS84_SEMI_MAJOR_M,
        "inverse_flattening": WGS84_INVERSE_FLATTENING,
        "heights_m": None,
        "source": Source(file="made.geojson", feature=f'"{name}"' if name else "1"),
    }
    return Line(name=name, lonlat=positions, placement=placement, **(values | more))  # type: ignore[arg-type]


def make_place(kind: PlaceKind, position: Floats, name: str, **more: Any) -> Place:
    """Return a point as the reader gives it."""
    values: dict[str, Any] = {
        "role": None,
        "height_m": None,
        "joint": _JOINTS.get(kind, "yes"),
        "source": Source(file="made.geojson", feature=f'"{name}"'),
    }
    lon, lat = np.ravel(position).tolist()
    return Place(name=name, kind=kind, lon=lon, lat=lat, **(values | more))


def make_run(lines: Sequence[Line], places: Sequence[Place] = (), *, toml: str = "") -> Run:
    """Return a run of these lines and places under this run file."""
    found = declared(toml)
    assert found.head is not None
    assert found.cable is not None
    assert found.practice is not None
    return Run(
        title="Made",
        purpose=found.head.purpose,
        units=found.head.units,
        crs=found.head.crs,
        placement=found.head.placement,
        lines=tuple(lines),
        places=tuple(places),
        areas=(),
        cable=found.cable,
        cables=found.cables,
        interfaces=found.interfaces,
        circuits=found.circuits,
        panels=found.panels,
        joints=found.joints,
        sections=found.sections,
        marks=found.marks,
        practice=found.practice,
        given=found.given,
        digest="",
    )
