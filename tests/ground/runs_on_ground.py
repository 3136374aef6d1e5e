"""Runs with rasters and layers beside them, read and planned as people would."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
from pyproj import CRS

from routeplan import plan, read_run
from routeplan.planning import Plan
from tests.sheets.plans import EQUATOR_M, equator, line, point, write_run

Row = dict[str, Any]
WGS84 = CRS.from_epsg(4326).to_wkt("WKT1_ESRI")
CELL_DEG = 0.0003  # 33 m on the equator


def write_asc(
    path: Path,
    height_m: Callable[[float], float],
    *,
    from_m: float = -300.0,
    to_m: float = 2_300.0,
    crs: str = WGS84,
) -> Path:
    """Write a text raster about the equator whose heights depend on metres east of the start."""
    deg = (np.degrees(np.array([from_m, to_m]) / EQUATOR_M) + 10.0).tolist()
    cols = int(np.ceil((deg[1] - deg[0]) / CELL_DEG))
    east_m = np.radians(deg[0] + (np.arange(cols) + 0.5) * CELL_DEG - 10.0) * EQUATOR_M
    row = " ".join(f"{height_m(float(at)):.4f}" for at in east_m)
    head = (
        f"ncols {cols}\nnrows 20\nxllcorner {deg[0]!r}\nyllcorner {-10 * CELL_DEG!r}\n"
        f"cellsize {CELL_DEG}\nNODATA_value -9999\n"
    )
    path.write_text(head + "\n".join([row] * 20) + "\n", "utf-8")
    path.with_suffix(".prj").write_text(crs, "utf-8")
    return path


def write_layer(path: Path, features: list[Row]) -> Path:
    """Write features as GeoJSON."""
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}), "utf-8")
    return path


def across(at_m: float, *, half_deg: float = 0.001, **properties: object) -> Row:
    """Return a line square over the equator so many metres east of the start."""
    lon = equator(at_m)[0]
    return line([[lon, -half_deg], [lon, half_deg]], **properties)


def planned_with(folder: Path, toml: str, *features: Row) -> Plan:
    """Plan two kilometres of duct along the equator, or other features, under a run file."""
    run = write_run(folder, list(features) or [two_km()], toml)
    return plan(read_run(run))


def two_km(**properties: object) -> Row:
    """Return a line of two kilometres along the equator."""
    return line([equator(0), equator(2_000)], **({"name": "Way", "placement": "duct"} | properties))


def handholes(*at_m: float) -> list[Row]:
    """Return handholes on the line."""
    return [point(equator(at), name=f"H{at:.0f}", kind="handhole") for at in at_m]
