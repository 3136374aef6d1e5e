"""Reading GeoJSON with the standard library and numpy alone: the fast path."""

from __future__ import annotations

import gc
import json
from collections import Counter
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.run.crs import crs_or_none
from routeplan.run.model import Floats, Source
from routeplan.run.shapes import Layer, Shape, feature_label
from routeplan.run.trouble import Trouble, shown

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = ["layers_from_geojson", "text_from_utf8"]

Table: TypeAlias = Mapping[str, Any]

_DEPTHS = {  # how many lists a geometry's coordinates nest around a position
    "Point": 0,
    "MultiPoint": 1,
    "LineString": 1,
    "MultiLineString": 2,
    "Polygon": 2,
    "MultiPolygon": 3,
}
_MEMBERS_DEEPEST = 20


def layers_from_geojson(content: bytes, *, file: str, trouble: Trouble) -> list[Layer]:
    """
    Read the bytes of a GeoJSON file into one layer; what is wrong is noted in `trouble`.

    Parameters
    ----------
    content
        The file's bytes.
    file
        Its name, for messages.
    trouble
        Where problems are noted.
    """
    root = _parsed(content, file=file, trouble=trouble)
    if root is None:
        return []
    crs = _declared_crs(root, file=file, trouble=trouble)
    layer = Layer(file=file, name=None, crs=crs, default_crs="OGC:CRS84")
    for number, feature in enumerate(_features(root, file=file, trouble=trouble), start=1):
        layer.shapes.extend(_shapes(feature, number, file=file, trouble=trouble))
    return [layer]


def text_from_utf8(content: bytes, *, file: str, trouble: Trouble) -> str | None:
    """Return UTF-8 text, or None with the problem noted: empty, or the first byte that is not."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        byte = f"byte {error.start} is 0x{content[error.start]:02x}"
        _refuse(trouble, file, "is not UTF-8 text", value=byte, remedy="Save the file as UTF-8.")
        return None
    if not text.strip():
        _refuse(trouble, file, "is empty")
        return None
    return text


def _refuse(
    trouble: Trouble, file: str, what: str, *, value: str = "", limit: str = "", remedy: str = ""
) -> None:
    problem = Problem(where=file, what=what, value=value, limit=limit, remedy=remedy)
    trouble.add(GeometryError, problem, file=file)


def _parsed(content: bytes, *, file: str, trouble: Trouble) -> Table | None:
    text = text_from_utf8(content, file=file, trouble=trouble)
    if text is None:
        return None
    try:
        root = _loaded(text)
    except json.JSONDecodeError as error:
        place = f"{error.msg} in line {error.lineno}, column {error.colno}"
        if not text[error.pos :].strip() or error.msg.startswith("Unterminated"):
            _refuse(trouble, file, "breaks off before its end", value=place)
        else:
            _refuse(trouble, file, "is not JSON", value=place)
        return None
    except RecursionError:
        _refuse(trouble, file, "is nested too deeply")
        return None
    except ValueError:
        _refuse(trouble, file, "holds a number with too many digits")
        return None
    if isinstance(root, dict):
        return root
    _refuse(trouble, file, "is JSON but not GeoJSON", value=shown(root))
    return None


def _loaded(text: str) -> object:
    """Parse JSON with the garbage collector resting: it would search every list in vain."""
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        return json.loads(text)
    finally:
        if was_enabled:
            gc.enable()


def _declared_crs(root: Table, *, file: str, trouble: Trouble) -> CRS | None:
    """Return the CRS of an old-style `crs` member; None if the file says nothing."""
    member = root.get("crs")
    if member is None:
        return None
    properties = member.get("properties") if isinstance(member, dict) else None
    name = properties.get("name") if isinstance(properties, dict) else None
    crs = crs_or_none(name)
    if crs is None:
        problem = Problem(
            where=f"{file}, crs",
            what="declares a CRS that is not known",
            value=shown(member if name is None else name),
            remedy='Declare it by code, for example "urn:ogc:def:crs:EPSG::27700".',
        )
        trouble.add(CrsError, problem, file=file)
    return crs


def _features(root: Table, *, file: str, trouble: Trouble) -> Iterator[Table]:
    kind = root.get("type")
    if kind == "FeatureCollection":
        features = root.get("features")
        if isinstance(features, list):
            yield from features
        else:
            value = "" if features is None else shown(features)
            _refuse(trouble, file, "has no list of features", value=value)
    elif kind == "Feature":
        yield root
    elif kind == "GeometryCollection" or (isinstance(kind, str) and kind in _DEPTHS):
        yield {"type": "Feature", "geometry": root, "properties": None}
    else:
        _refuse(
            trouble,
            file,
            "is not GeoJSON",
            value=f"type is {shown(kind)}",
            limit=f"one of FeatureCollection, Feature, {', '.join(_DEPTHS)}, GeometryCollection",
        )


def _shapes(feature: object, number: int, *, file: str, trouble: Trouble) -> Iterator[Shape]:
    if not isinstance(feature, dict) or feature.get("type") != "Feature":
        where = str(Source(file=file, feature=str(number)))
        kind = feature.get("type") if isinstance(feature, dict) else feature
        problem = Problem(where=where, what="is not a GeoJSON Feature", value=shown(kind))
        trouble.add(GeometryError, problem, file=file)
        return
    properties = feature.get("properties")
    label = properties.get("name") if isinstance(properties, dict) else None
    source = Source(file=file, feature=feature_label(label, feature.get("id"), number))
    if properties is None:
        properties = {}
    if not isinstance(properties, dict):
        _fault(trouble, source, "has properties that are not a table", properties)
        properties = {}
    if feature.get("geometry") is None:
        trouble.warn(str(source), "has no geometry and plays no part", file=file)
        return
    counts: Counter[str] = Counter()
    for kind, coordinates in _members(feature["geometry"], source, trouble):
        for shape_kind, arrays in _parts(kind, coordinates, source, trouble):
            counts[shape_kind] += 1
            xy, z = _split(arrays)
            yield Shape(
                kind=shape_kind,
                xy=xy,
                z=z,
                properties=properties,
                source=source,
                part=counts[shape_kind],
                ring_starts=_ring_starts(arrays),
            )


def _fault(trouble: Trouble, source: Source, what: str, value: object) -> None:
    problem = Problem(where=str(source), what=what, value=shown(value))
    trouble.add(GeometryError, problem, file=source.file)


def _members(geometry: object, source: Source, trouble: Trouble) -> Iterator[tuple[str, Any]]:
    """Yield type and coordinates of a geometry, or of every member of a collection."""
    pending = [(geometry, 0)]
    while pending:
        member, depth = pending.pop()
        kind = member.get("type") if isinstance(member, dict) else None
        if not isinstance(member, dict) or not isinstance(kind, str):
            _fault(trouble, source, "has a geometry without a type", member)
        elif kind == "GeometryCollection":
            inner = member.get("geometries")
            if not isinstance(inner, list) or depth > _MEMBERS_DEEPEST:
                _fault(trouble, source, "has a collection without a list of geometries", inner)
            else:
                pending.extend((each, depth + 1) for each in reversed(inner))
        elif kind in _DEPTHS:
            yield kind, member.get("coordinates")
        else:
            _fault(trouble, source, "has a geometry of a type that plays no part here", kind)


def _parts(
    kind: str, coordinates: object, source: Source, trouble: Trouble
) -> Iterator[tuple[Any, list[Floats]]]:
    """Yield the simple shapes of a geometry, as the arrays of their rings."""
    if coordinates == []:
        trouble.warn(str(source), "has no geometry and plays no part", file=source.file)
        return
    simple = kind.removeprefix("Multi")
    shape_kind = {"Point": "point", "LineString": "line", "Polygon": "area"}[simple]
    parts = coordinates if kind.startswith("Multi") else [coordinates]
    if not isinstance(parts, list):
        _fault(trouble, source, f"has {kind} coordinates that are not a list", coordinates)
        return
    for part in parts:
        if simple == "Point":
            rings: object = [[part]]
        else:
            rings = part if simple == "Polygon" else [part]
        if not isinstance(rings, list) or not rings:
            _fault(trouble, source, f"has {kind} coordinates that are not a list", rings)
            continue
        arrays = [_positions(ring, source, trouble) for ring in rings]
        good = [array for array in arrays if array is not None]
        if any(len(array) == 0 for array in good):
            trouble.warn(str(source), "has an empty part, left out", file=source.file)
        elif len(good) == len(arrays):
            yield shape_kind, good


def _positions(ring: object, source: Source, trouble: Trouble) -> Floats | None:
    """Return positions as an (n, 2) or (n, 3) array; NaN stands for a height that is missing."""
    try:
        array = np.array(ring)
    except (ValueError, OverflowError, RecursionError):
        array = np.array(None)
    if array.ndim == 2 and array.dtype.kind in "fiu" and array.shape[1] >= 2:
        return array[:, :3].astype(np.float64)
    return _positions_one_by_one(ring, source, trouble)


def _positions_one_by_one(ring: object, source: Source, trouble: Trouble) -> Floats | None:
    if not isinstance(ring, list):
        _fault(trouble, source, "has coordinates that are not a list of positions", ring)
        return None
    rows = []
    for position in ring:
        row = _position(position)
        if row is None:
            _fault(trouble, source, "has a position that is not two or three numbers", position)
            return None
        rows.append(row)
    return np.array(rows, dtype=np.float64).reshape(-1, 3)


def _position(position: object) -> tuple[float, float, float] | None:
    if not isinstance(position, list) or len(position) < 2:
        return None
    x, y, *rest = position
    height = rest[0] if rest and rest[0] is not None else float("nan")
    values = (x, y, height)
    if any(isinstance(v, bool) or not isinstance(v, int | float) for v in values):
        return None
    try:
        return float(x), float(y), float(height)
    except OverflowError:
        return None


def _split(arrays: list[Floats]) -> tuple[Floats, Floats | None]:
    width = max(array.shape[1] for array in arrays)
    whole = arrays[0] if len(arrays) == 1 else np.concatenate([_wide(a, width) for a in arrays])
    xy = np.ascontiguousarray(whole[:, :2])
    return xy, (np.ascontiguousarray(whole[:, 2]) if width == 3 else None)


def _wide(array: Floats, width: int) -> Floats:
    return np.pad(array, ((0, 0), (0, width - array.shape[1])), constant_values=np.nan)


def _ring_starts(arrays: list[Floats]) -> tuple[int, ...]:
    if len(arrays) == 1:
        return (0,)
    starts = np.cumsum([0, *(len(array) for array in arrays[:-1])])
    return tuple(int(start) for start in starts)
