"""Writing what lies on the island as GeoJSON (RFC 7946), the same bytes on every machine."""

from __future__ import annotations

import json
from typing import Any

import numpy as np

from island.frame import BOUNDS, Floats, lonlat_from_xy
from island.layers import streets
from island.link import link_areas, link_points, link_stretches
from island.terrain import coast_xy, height_of_lonlat_m

__all__ = ["coast_text", "link_text", "streets_text"]

_DECIMALS = 7  # about a centimetre


def coast_text() -> str:
    """Return the coast as one polygon."""
    return _text([_feature("Polygon", [_flat(coast_xy())], {"name": "Ostrellan"})])


def streets_text() -> str:
    """Return the street network, one line a street."""
    features = []
    for street in streets():
        properties: dict[str, Any] = {"name": street.name, "road_class": street.road_class}
        if street.bridge:
            properties["bridge"] = True
        features.append(_feature("LineString", _flat(street.line), properties))
    return _text(features)


def link_text() -> str:
    """Return the demo link: stretches, then points, then areas, with heights."""
    features = []
    for stretch in link_stretches():
        properties = {"name": stretch.name, "placement": stretch.placement}
        line = _with_heights(stretch.line, deck=stretch.placement == "bridge")
        features.append(_feature("LineString", line, properties))
    features.extend(
        _feature("Point", _with_heights(point.xy[None])[0], point.properties)
        for point in link_points()
    )
    for ring, named in link_areas():
        features.append(_feature("Polygon", [_flat(ring)], named))
    return _text(features)


def _rounded(xy: Floats) -> Floats:
    lonlat = np.round(lonlat_from_xy(xy), _DECIMALS)
    west, south, east, north = BOUNDS
    if not np.all((lonlat > [west, south]) & (lonlat < [east, north])):
        message = f"a coordinate lies outside {BOUNDS}: {lonlat.min(axis=0)}, {lonlat.max(axis=0)}"
        raise ValueError(message)
    return lonlat


def _flat(xy: Floats) -> list[list[float]]:
    return [[float(v) for v in row] for row in _rounded(xy)]


def _with_heights(xy: Floats, *, deck: bool = False) -> list[list[float]]:
    """Return coordinates with the height of the ground, or of a deck straight between its ends."""
    lonlat = _rounded(xy)
    height: Floats = np.round(height_of_lonlat_m(lonlat), 1)
    if deck:
        height = np.round(np.linspace(height[0], height[-1], len(height)), 1).astype(float)
    return [[*map(float, row), float(h)] for row, h in zip(lonlat, height, strict=True)]


def _feature(kind: str, coordinates: Any, properties: dict[str, Any]) -> dict[str, Any]:
    geometry = {"type": kind, "coordinates": coordinates}
    return {"type": "Feature", "properties": properties, "geometry": geometry}


def _text(features: list[dict[str, Any]]) -> str:
    rows = ",\n".join(json.dumps(f, ensure_ascii=False, separators=(",", ":")) for f in features)
    return f'{{"type":"FeatureCollection","features":[\n{rows}\n]}}\n'
