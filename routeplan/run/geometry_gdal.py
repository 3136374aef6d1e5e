"""Reading every other vector format through GDAL."""

from __future__ import annotations

import math
import os
import struct
import warnings
from collections import Counter
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from routeplan.errors import GeometryError, Problem
from routeplan.run.crs import crs_or_none
from routeplan.run.geometry_gpx import xml_problem
from routeplan.run.model import Source
from routeplan.run.shapes import Layer, Shape, feature_label
from routeplan.run.trouble import Trouble, listed, nearest_hint, one_of, shown

if TYPE_CHECKING:
    from pyproj import CRS
    from shapely.geometry.base import BaseGeometry

__all__ = ["layers_from_gdal"]

_KINDS = {"Point": "point", "LineString": "line", "LinearRing": "line", "Polygon": "area"}
_KML_SERVICE = (  # columns the KML driver adds to every layer
    "id",
    "timestamp",
    "begin",
    "end",
    "altitudeMode",
    "tessellate",
    "extrude",
    "visibility",
    "drawOrder",
    "icon",
)
_POINTERS = (b"<OGRVRT", b"<OGRWFS", b"<OGRWMS", b"<GDAL_W", b"<WMS_", b"<WFS", b"[Connection")


def layers_from_gdal(
    path: Path, content: bytes, *, file: str, only: str | None, trouble: Trouble
) -> list[Layer]:
    """
    Read a vector file of any format GDAL knows; what is wrong is noted in `trouble`.

    Parameters
    ----------
    path
        Where the file is.
    content
        Its bytes, for what GDAL does not say: a file cut short, text that is not UTF-8.
    file
        Its name, for messages.
    only
        The one layer to read; None for all that have a geometry.
    trouble
        Where problems are noted.
    """
    problem = _unreadable(path, content, file=file)
    if problem is not None:
        trouble.add(GeometryError, problem, file=file)
        return []
    if path.suffix.lower() == ".shp" and not path.with_suffix(".dbf").is_file():
        trouble.warn(file, "has no .dbf file beside it: nothing in it has a name or a property")
    names = _layer_names(path, file=file, only=only, trouble=trouble)
    found = (_layer(path, name, file=file, trouble=trouble) for name in names)
    return [layer for layer in found if layer is not None]


def _unreadable(path: Path, content: bytes, *, file: str) -> Problem | None:
    if "!" in str(path.absolute()):
        what, remedy = "has an exclamation mark in its path", "Rename the file or its folder."
        return Problem(where=file, what=what, value=shown(str(path.name)), remedy=remedy)
    head = content[:2000].lstrip()
    if any(pointer in head for pointer in _POINTERS):
        return Problem(
            where=file,
            what="points at data elsewhere instead of holding it",
            remedy="Export the data themselves.",
        )
    if path.suffix.lower() == ".kml":
        return xml_problem(content, file=file)
    if path.suffix.lower() == ".shp" and len(content) >= 28:
        stated = 2 * struct.unpack(">i", content[24:28])[0]
        if stated > len(content):
            return Problem(
                where=file,
                what="breaks off before its end",
                value=f"{len(content)} bytes",
                limit=f"{stated} bytes by its own head",
            )
    return None


def _layer_names(path: Path, *, file: str, only: str | None, trouble: Trouble) -> list[str]:
    listing = _called("list_layers", path, file=file, trouble=trouble)
    if listing is None:
        return []
    spatial = [str(name) for name, geometry in listing if geometry is not None]
    every = [str(name) for name, _ in listing]
    if only is None:
        if not spatial:
            problem = Problem(
                where=file, what="has no layer with a geometry", value=listed(every) or "no layer"
            )
            trouble.add(GeometryError, problem, file=file)
        return spatial
    if only in every:
        return [only]
    problem = Problem(
        where=file,
        what="has no such layer",
        value=shown(only),
        limit=one_of(every),
        remedy=nearest_hint(only, every),
    )
    trouble.add(GeometryError, problem, file=file)
    return []


def _layer(path: Path, name: str, *, file: str, trouble: Trouble) -> Layer | None:
    import shapely

    read = _called("read", path, file=file, trouble=trouble, layer=name)
    if read is None:
        return None
    meta, fids, wkb, columns = read
    layer = Layer(file=file, name=name, crs=_declared(meta["crs"]), default_crs=None, loose=True)
    try:
        with np.errstate(invalid="ignore"):  # what is no number is told of below, where it is
            geometries = shapely.from_wkb(wkb) if wkb is not None else []
    except (shapely.errors.ShapelyError, TypeError, ValueError) as error:
        _refuse(trouble, layer.where, "has a geometry that cannot be read", value=str(error)[:200])
        return None
    is_kml = path.suffix.lower() in (".kml", ".kmz")
    fields = [str(field) for field in meta["fields"]]
    for row, geometry in enumerate(geometries):
        values = {field: _plain(column[row]) for field, column in zip(fields, columns, strict=True)}
        layer.shapes.extend(
            _shapes(geometry, values, int(fids[row]), layer=layer, is_kml=is_kml, trouble=trouble)
        )
    return layer


def _called(what: str, path: Path, *, file: str, trouble: Trouble, layer: str | None = None) -> Any:
    """Return what GDAL reads, or None with the problem noted; its warnings become ours."""
    import pyogrio
    from pyogrio.errors import DataLayerError, DataSourceError, FeatureError

    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always")
        try:
            if what == "list_layers":
                result = pyogrio.list_layers(path.absolute())
            else:
                result = pyogrio.raw.read(path.absolute(), layer=layer, return_fids=True)
        except (DataSourceError, DataLayerError, FeatureError) as error:
            _refuse(trouble, file, *_said(_without_path(error, path)))
            return None
        except UnicodeDecodeError as error:
            byte = f"byte 0x{error.object[error.start]:02x} in {shown(error.object[:40].hex())}"
            _refuse(trouble, file, "holds text that is not UTF-8", value=byte)
            return None
        except Exception as error:  # damaged files bring out faults of the library itself
            _refuse(trouble, file, "cannot be read", value=_without_path(error, path)[:300])
            return None
    for warning in caught:
        text = str(warning.message)
        if issubclass(warning.category, RuntimeWarning | UserWarning) and "Measured" not in text:
            text = text.replace(f"{path.absolute().parent}{os.sep}", "")
            trouble.warn(file, text[:300], file=file, kind="the format's reader warns")
    return result


def _without_path(error: BaseException, path: Path) -> str:
    return str(error).replace(f"{path.absolute().parent}{os.sep}", "")


def _said(text: str) -> tuple[str, str]:
    """Return what GDAL said in our words, and in its own where they tell more."""
    if "not recognized as being in a supported file format" in text:
        return "is of no format that can be read, or is damaged", ""
    if any(word in text.lower() for word in ("malformed", "parsing", "not a database")):
        return "is damaged or breaks off before its end", text.partition(";")[0][:300]
    return "cannot be read", text[:300]


def _refuse(trouble: Trouble, where: str, what: str, value: str = "") -> None:
    trouble.add(GeometryError, Problem(where=where, what=what, value=value), file=where)


def _declared(crs: str | None) -> CRS | None:
    """Return the CRS a layer declares; the formats' ways of saying "undefined" are None."""
    found = crs_or_none(crs)
    return None if found is not None and found.name.lower().startswith("undefined") else found


def _plain(value: Any) -> object:
    """Return a value of a column as Python has it; None where there is none."""
    if isinstance(value, np.datetime64):
        return None if np.isnat(value) else str(value)
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and math.isnan(value):
        return None
    if isinstance(value, np.ndarray):
        return value.tolist()
    return None if isinstance(value, bytes) else value


def _shapes(
    geometry: BaseGeometry | None,
    values: dict[str, object],
    fid: int,
    *,
    layer: Layer,
    is_kml: bool,
    trouble: Trouble,
) -> Iterator[Shape]:
    name = next((values[key] for key in ("name", "Name", "NAME") if values.get(key)), None)
    source = Source(file=layer.file, layer=layer.name, feature=feature_label(name, fid, fid))
    is_track = is_kml and _is_recorded(values)
    if is_kml:
        values = {k: v for k, v in values.items() if k not in _KML_SERVICE and v is not None}
    if geometry is None or geometry.is_empty:
        trouble.warn(str(source), "has no geometry and plays no part", file=layer.file)
        return
    counts: Counter[str] = Counter()
    for part in _simple(geometry):
        kind = _KINDS.get(part.geom_type)
        if kind is None:
            what = "has a geometry of a type that plays no part here"
            problem = Problem(where=str(source), what=what, value=part.geom_type)
            trouble.add(GeometryError, problem, file=layer.file)
            continue
        counts[kind] += 1
        yield _shape(part, kind, values, source, is_track=is_track, part=counts[kind])


def _is_recorded(values: dict[str, object]) -> bool:
    begin, end = values.get("begin"), values.get("end")
    return begin is not None and end is not None and begin != end


def _simple(geometry: BaseGeometry) -> Iterator[BaseGeometry]:
    pending = [geometry]
    while pending:
        part = pending.pop()
        if hasattr(part, "geoms"):
            pending.extend(reversed(part.geoms))
        elif not part.is_empty:
            yield part


def _shape(
    geometry: Any,
    kind: Any,
    values: dict[str, object],
    source: Source,
    *,
    is_track: bool,
    part: int,
) -> Shape:
    import shapely

    rings = [geometry.exterior, *geometry.interiors] if kind == "area" else [geometry]
    arrays = [shapely.get_coordinates(ring, include_z=bool(geometry.has_z)) for ring in rings]
    whole = arrays[0] if len(arrays) == 1 else np.concatenate(arrays)
    starts = np.cumsum([0, *(len(array) for array in arrays[:-1])])
    return Shape(
        kind=kind,
        xy=np.ascontiguousarray(whole[:, :2]),
        z=np.ascontiguousarray(whole[:, 2]) if geometry.has_z else None,
        properties=values,
        source=source,
        is_track=is_track and kind == "line",
        part=part,
        ring_starts=tuple(int(start) for start in starts),
    )
