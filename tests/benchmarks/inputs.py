"""Inputs that benchmarks share: long ways with many vertices, heights and reach points."""

from __future__ import annotations

import json
import math
import random
from pathlib import Path

__all__ = ["long_way", "write_long_run"]

_M_PER_DEG = 111_195.0


def long_way(*, length_km: float, vertex_count: int, seed: int = 1) -> list[list[float]]:
    """Return a winding way over hills: longitude, latitude and height of every vertex."""
    rng = random.Random(seed)
    step_deg = length_km * 1000 / (vertex_count - 1) / _M_PER_DEG
    lon, lat, heading = -20.0, 38.0, 0.4
    way = []
    for number in range(vertex_count):
        height = 120 + 90 * math.sin(number / 400) + 15 * math.sin(number / 37)
        way.append([round(lon, 9), round(lat, 9), round(height, 2)])
        heading = 0.4 + 0.9 * math.sin(number / 230) + rng.uniform(-0.2, 0.2)
        lon += step_deg * math.cos(heading) / math.cos(math.radians(lat))
        lat += step_deg * math.sin(heading)
    return way


def write_long_run(
    folder: Path, *, length_km: float = 100.0, vertex_count: int = 5000, reach_count: int = 500
) -> Path:
    """Write a bare GeoJSON of one long leg with sites, handholes and poles; return its path."""
    way = long_way(length_km=length_km, vertex_count=vertex_count)
    third = vertex_count // 3
    pieces = [(0, third, "duct"), (third, 2 * third, "aerial"), (2 * third, vertex_count, "buried")]
    features = [
        _feature("LineString", way[max(0, start - 1) : end], placement=placement, leg="Long leg")
        for start, end, placement in pieces
    ]
    for number in range(1, reach_count - 1):
        at = number * (vertex_count - 1) // (reach_count - 1)
        kind = "pole" if third <= at < 2 * third else "handhole"
        features.append(_feature("Point", way[at][:2], name=f"P{number}", kind=kind))
    features.append(_feature("Point", way[0][:2], name="Near end", kind="site"))
    features.append(_feature("Point", way[-1][:2], name="Far end", kind="site"))
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "long.geojson"
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}), "utf-8")
    return path


def _feature(shape: str, coordinates: object, /, **properties: str) -> dict[str, object]:
    geometry = {"type": shape, "coordinates": coordinates}
    return {"type": "Feature", "properties": properties, "geometry": geometry}
