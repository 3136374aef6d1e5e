"""Reading streets, existing duct routes and pole lines from any line layer in any CRS."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.run.crs import crs_or_none
from routeplan.run.datum import placed_shapes
from routeplan.run.geometry import file_bytes
from routeplan.run.geometry_gdal import layers_from_gdal
from routeplan.run.geometry_geojson import layers_from_geojson
from routeplan.run.geometry_gpx import layers_from_gpx
from routeplan.run.model import PLACEMENTS
from routeplan.run.shapes import Layer
from routeplan.run.trouble import Trouble, cleaned_text, nearest_hint, one_of, shown
from routeplan.streets.assemble import Lines, lines_from

__all__ = ["read_layers", "read_polygons"]

_CLASS_KEYS = ("road_class", "highway", "fclass", "class")
_NO = ("", "0", "no", "false", "f", "n", "none")


def read_layers(
    path: Path, *, crs: str | None = None, placement: str | None = None
) -> tuple[Lines, tuple[tuple[str, str], ...]]:
    """
    Read every line of a vector file as a street, or as a route that is there already.

    The columns `name`, `road_class` (or `highway`), `bridge`, `tunnel` and `placement` are used
    where they exist. A line with a placement is a route that is there already.

    Parameters
    ----------
    path
        The file; `file.gpkg|layer` for one layer.
    crs
        CRS of a file that does not say.
    placement
        What lines without a placement of their own are; None: ordinary streets.

    Raises
    ------
    GeometryError, CrsError
        With everything that is wrong with the file.
    """
    trouble = Trouble()
    rows = [
        (placed.lonlat, placed.shape.properties, str(placed.shape.source))
        for layer in _layers(path, trouble)
        for placed in placed_shapes(layer, run_crs=_crs(crs, trouble), trouble=trouble)
        if placed.shape.kind == "line" and len(placed.lonlat) > 1
    ]
    if not rows and not trouble.problems:
        problem = Problem(
            where=path.name, what="holds no line", remedy="Give a layer of streets or routes."
        )
        trouble.add(GeometryError, problem)
    own = [_placement(known, where, placement, trouble) for _, known, where in rows]
    trouble.raise_if_any()
    lines = lines_from(
        [lonlat for lonlat, _, _ in rows],
        road_class=[_text(known, *_CLASS_KEYS) or "street" for _, known, _ in rows],
        name=[_text(known, "name", "ref") for _, known, _ in rows],
        placement=own,
        is_bridge=[_is_set(known, "bridge") for _, known, _ in rows],
        is_tunnel=[_is_set(known, "tunnel") for _, known, _ in rows],
    )
    return lines, trouble.closed_warnings()


def read_polygons(path: Path, *, crs: str | None = None) -> tuple[tuple[np.ndarray, ...], ...]:
    """
    Read the polygons of a vector file, whatever their properties.

    Parameters
    ----------
    path
        The file.
    crs
        CRS of a file that does not say.

    Returns
    -------
    polygons
        For each its rings, shape (n, 2), the outer one first. [deg]
    """
    trouble = Trouble()
    polygons = []
    for layer in _layers(path, trouble):
        for placed in placed_shapes(layer, run_crs=_crs(crs, trouble), trouble=trouble):
            if placed.shape.kind == "area":
                rings = np.split(placed.lonlat, placed.shape.ring_starts[1:])
                polygons.append(tuple(ring for ring in rings if len(ring) > 3))
    if not polygons and not trouble.problems:
        problem = Problem(where=path.name, what="holds no polygon", remedy="Draw the area.")
        trouble.add(GeometryError, problem)
    trouble.raise_if_any()
    return tuple(rings for rings in polygons if rings)


def _crs(name: str | None, trouble: Trouble):  # type: ignore[no-untyped-def]
    if name is None:
        return None
    found = crs_or_none(name)
    if found is None:
        problem = Problem(
            where="crs",
            what="is not a known CRS",
            value=shown(name),
            remedy='Name it by code, for example "EPSG:27700".',
        )
        if not any(known.where == "crs" for known in trouble.problems):
            trouble.add(CrsError, problem)
    return found


def _layers(path: Path, trouble: Trouble) -> list[Layer]:
    name, _, only = path.name.partition("|")
    file = path if path.exists() or not only else path.with_name(name)
    layer = only if file != path else None
    content = file_bytes(file, file=file.name, trouble=trouble)
    if content is None:
        return []
    suffix = file.suffix.lower()
    if suffix in (".geojson", ".json"):
        return layers_from_geojson(content, file=file.name, trouble=trouble)
    if suffix == ".gpx":
        return layers_from_gpx(content, file=file.name, trouble=trouble)
    return layers_from_gdal(file, content, file=file.name, only=layer or None, trouble=trouble)


def _text(known: Mapping[str, object], *keys: str) -> str:
    folded = {key.lower(): value for key, value in known.items()}
    for key in keys:
        value = folded.get(key)
        if isinstance(value, str) and value.strip():
            return cleaned_text(" ".join(value.split()))[:200]
    return ""


def _is_set(known: Mapping[str, object], key: str) -> bool:
    value = {name.lower(): value for name, value in known.items()}.get(key)
    if isinstance(value, str):
        return value.strip().lower() not in _NO
    return bool(value)


def _placement(known: Mapping[str, object], where: str, usual: str | None, trouble: Trouble) -> str:
    word = _text(known, "placement").lower()
    if not word:
        return usual or ""
    if word not in PLACEMENTS:
        problem = Problem(
            where=f"{where}, placement",
            what="is not a known placement",
            value=shown(word),
            limit=one_of(PLACEMENTS),
            remedy=nearest_hint(word, PLACEMENTS),
        )
        trouble.add(GeometryError, problem)
    return word
