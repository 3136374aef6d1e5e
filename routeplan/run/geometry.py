"""Reading vector files of any kind into the lines, places and areas of a run."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from routeplan.errors import GeometryError, Problem
from routeplan.run.attributes import area_from, line_from, place_from
from routeplan.run.datum import placed_shapes
from routeplan.run.geometry_checks import check_together
from routeplan.run.geometry_gdal import layers_from_gdal
from routeplan.run.geometry_geojson import layers_from_geojson
from routeplan.run.geometry_gpx import layers_from_gpx
from routeplan.run.model import Area, Floats, Line, Place
from routeplan.run.shapes import Layer
from routeplan.run.trouble import Trouble, looked_in

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = [
    "VECTOR_SUFFIXES",
    "Geometry",
    "background_from_files",
    "file_and_layer",
    "file_bytes",
    "geometry_from_files",
]

VECTOR_SUFFIXES = (".geojson", ".json", ".gpx", ".kml", ".kmz", ".gpkg", ".shp", ".shz", ".zip")
"""Suffixes by which a vector file is found beside a run file that names none."""

_GEOJSON = (".geojson", ".json")


@dataclass(slots=True)
class Geometry:
    """What vector files hold, and the bytes read, in order."""

    lines: list[Line] = field(default_factory=list)
    places: list[Place] = field(default_factory=list)
    areas: list[Area] = field(default_factory=list)
    contents: list[bytes] = field(default_factory=list)


def geometry_from_files(
    names: tuple[str, ...],
    folder: Path,
    *,
    run_crs: CRS | None,
    placement: str,
    trouble: Trouble,
    may_lack_lines: bool = False,
) -> Geometry:
    """
    Read vector files; everything wrong with them is noted in `trouble`.

    Parameters
    ----------
    names
        File names as the run file has them; `file.gpkg|layer` for one layer.
    folder
        What relative names are relative to.
    run_crs
        The run file's `crs`, for files that do not say.
    placement
        The run's placement.
    trouble
        Where problems are noted.
    may_lack_lines
        Whether points alone will do, because ways are still to be found.
    """
    geometry = Geometry()
    before = len(trouble.problems)
    for name in names:
        for layer in _layers(name, folder, geometry, trouble):
            _add_layer(geometry, layer, run_crs=run_crs, placement=placement, trouble=trouble)
    check_together(geometry.lines, geometry.places, trouble=trouble)
    if names and not (geometry.lines or may_lack_lines) and len(trouble.problems) == before:
        problem = Problem(
            where=", ".join(names),
            what="holds no line",
            remedy="Draw the way of the cable as at least one line.",
        )
        trouble.add(GeometryError, problem)
    return geometry


def background_from_files(
    names: tuple[str, ...],
    folder: Path,
    *,
    run_crs: CRS | None,
    geometry: Geometry,
    trouble: Trouble,
) -> tuple[Floats, ...]:
    """
    Read the lines and outlines that a map is drawn on; their bytes are noted in `geometry`.

    Parameters
    ----------
    names
        File names as the run file has them.
    folder
        What relative names are relative to.
    run_crs
        The run file's `crs`, for files that do not say.
    geometry
        Where the bytes read are noted.
    trouble
        Where problems are noted.

    Returns
    -------
    lonlat
        WGS 84 polylines, each of shape (n, 2). [deg]
    """
    return tuple(
        ring
        for name in names
        for layer in _layers(name, folder, geometry, trouble)
        for placed in placed_shapes(layer, run_crs=run_crs, trouble=trouble)
        for ring in np.split(placed.lonlat, placed.shape.ring_starts[1:])
        if len(ring) > 1
    )


def file_bytes(path: Path, *, file: str, trouble: Trouble) -> bytes | None:
    """Return the bytes of a file, or None with the problem noted."""
    try:
        content = path.read_bytes()
    except FileNotFoundError:
        _refuse(trouble, file, "is not there", remedy=looked_in(path))
    except IsADirectoryError:
        _refuse(trouble, file, "is a folder, not a file")
    except PermissionError:
        _refuse(trouble, file, "may not be read by this user")
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        _refuse(trouble, file, "cannot be read", value=reason or type(error).__name__)
    else:
        if content:
            return content
        _refuse(trouble, file, "is empty")
    return None


def _refuse(trouble: Trouble, file: str, what: str, *, value: str = "", remedy: str = "") -> None:
    problem = Problem(where=file, what=what, value=value, remedy=remedy)
    trouble.add(GeometryError, problem, file=file)


def _layers(name: str, folder: Path, geometry: Geometry, trouble: Trouble) -> list[Layer]:
    file, only = file_and_layer(name, folder)
    path = folder / file
    content = _folder_bytes(path) if _is_database(path) else None
    if content is None:
        content = file_bytes(path, file=file, trouble=trouble)
    if content is None:
        return []
    geometry.contents.append(content)
    suffix = path.suffix.lower()
    if suffix in _GEOJSON and only is None:
        return layers_from_geojson(content, file=file, trouble=trouble)
    if suffix == ".gpx" and only is None:
        return layers_from_gpx(content, file=file, trouble=trouble)
    geometry.contents.extend(sidecar.read_bytes() for sidecar in _sidecars(path))
    return layers_from_gdal(path, content, file=file, only=only, trouble=trouble)


def file_and_layer(name: str, folder: Path) -> tuple[str, str | None]:
    """Split `file.gpkg|layer`, unless that is the name of a file."""
    file, bar, layer = name.rpartition("|")
    try:
        is_file = (folder / name).exists()
    except (OSError, ValueError):
        is_file = True
    return (name, None) if is_file or not bar else (file, layer)


def _is_database(path: Path) -> bool:
    """Tell whether a folder is itself a vector file."""
    return path.suffix.lower() == ".gdb" and path.is_dir()


def _folder_bytes(path: Path) -> bytes:
    """Return the bytes of all files of a folder that is a vector file, in order of their names."""
    return b"".join(part.read_bytes() for part in sorted(path.iterdir()) if part.is_file())


def _sidecars(path: Path) -> list[Path]:
    """Return the files that belong to a plain shapefile, in order of their names."""
    if path.suffix.lower() != ".shp":
        return []
    siblings = (path.with_suffix(suffix) for suffix in (".cpg", ".dbf", ".prj", ".shx"))
    return [sibling for sibling in siblings if sibling.is_file()]


def _add_layer(
    geometry: Geometry, layer: Layer, *, run_crs: CRS | None, placement: str, trouble: Trouble
) -> None:
    for placed in placed_shapes(layer, run_crs=run_crs, trouble=trouble):
        if placed.shape.kind == "line":
            line = line_from(placed, loose=layer.loose, placement=placement, trouble=trouble)
            geometry.lines.extend([line] if line else [])
        elif placed.shape.kind == "point":
            number = len(geometry.places) + 1
            place = place_from(placed, number=number, loose=layer.loose, trouble=trouble)
            geometry.places.append(place)
        else:
            area = area_from(placed, loose=layer.loose, trouble=trouble)
            geometry.areas.extend([area] if area else [])
