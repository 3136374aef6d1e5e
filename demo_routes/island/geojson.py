"""Writing what lies on the island as GeoJSON (RFC 7946), the same bytes on every machine."""

from __future__ import annotations

import json
from typing import Any

import numpy as np

from island.frame import BOUNDS, Floats, lonlat_from_xy
from island.layers import power_line, railway, streets
from island.link import link_areas, link_points, link_stretches
from island.terrain import beck_xy, coast_xy, river_xy

__all__ = ["coast_text", "lines_text", "link_text", "streets_text"]

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


def lines_text() -> str:
    """Return what else the island has that can be crossed: railway, waters, power line."""
    lines = (
        (railway(), "rail", "mineral", "Skelvane railway", "Skelvane Stone Railway"),
        (river_xy(), "water", "river", "Lunnoth", "Lunnoth Rivers Office"),
        (beck_xy(), "water", "stream", "Sarrel Beck", "Lunnoth Rivers Office"),
        (power_line(), "power", "line", "Lunnothfoot power line", "Ostrellan Power"),
    )
    keys = ("kind", "class", "name", "owner")
    return _text(
        [
            _feature("LineString", _flat(xy), dict(zip(keys, named, strict=True)))
            for xy, *named in lines
        ]
    )


def link_text() -> str:
    """Return the demo link: stretches, then points, then areas; the terrain has the heights."""
    features = []
    for stretch in link_stretches():
        properties = {"name": stretch.name, "placement": stretch.placement}
        features.append(_feature("LineString", _flat(stretch.line), properties))
    features.extend(
        _feature("Point", _flat(point.xy[None])[0], point.properties) for point in link_points()
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


def _feature(kind: str, coordinates: Any, properties: dict[str, Any]) -> dict[str, Any]:
    geometry = {"type": kind, "coordinates": coordinates}
    return {"type": "Feature", "properties": properties, "geometry": geometry}


def _text(features: list[dict[str, Any]]) -> str:
    rows = ",\n".join(json.dumps(f, ensure_ascii=False, separators=(",", ":")) for f in features)
    return f'{{"type":"FeatureCollection","features":[\n{rows}\n]}}\n'
