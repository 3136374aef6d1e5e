"""Reading layers of features from vector files and OpenStreetMap extracts."""

from __future__ import annotations

import warnings
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.ground.feature_tags import (
    OSM_COLUMNS,
    OSM_WHERE,
    other_tags,
    owner_of_tags,
    what_of_tags,
)
from routeplan.ground.features import FEATURE_KINDS, FeatureKind, FeatureLayer, feature_layer
from routeplan.ground.model import Leg
from routeplan.run.crs import crs_or_none, is_wgs84, unusable
from routeplan.run.trouble import looked_in, one_of

__all__ = ["Box", "box_around", "is_osm", "read_features", "read_osm"]

Box = tuple[float, float, float, float]
"""West, south, east, north. [deg]"""

_OSM_LAYERS = ("lines", "multipolygons")
_COLUMN_NAMES = {  # where the mapping of columns does not say
    "kind": ("kind", "crosses"),
    "class": ("class",),
    "name": ("name",),
    "owner": ("owner", "operator"),
}
_STRAIGHT_M = 1000.0  # longer segments of a grid are divided before they become degrees

Table = dict[str, NDArray[Any]]


def is_osm(path: Path) -> bool:
    """Tell whether a file is an OpenStreetMap extract."""
    return path.name.lower().endswith((".osm", ".osm.pbf", ".pbf"))


def box_around(legs: Sequence[Leg], *, margin_deg: float = 0.01) -> Box | None:
    """
    Return a box around legs, for reading no more than what lies near; None at the antimeridian.

    Parameters
    ----------
    legs
        The legs.
    margin_deg
        How far beyond them. [deg]
    """
    if not legs:
        return None
    lonlat = np.concatenate([leg.shape_lonlat for leg in legs])
    west, south = lonlat.min(axis=0) - margin_deg
    east, north = lonlat.max(axis=0) + margin_deg
    if west < -180.0 or east > 180.0 or east - west > 180.0:
        return None
    return float(west), float(south), float(east), float(north)


def read_osm(path: Path, *, box: Box | None = None) -> tuple[FeatureLayer, ...]:
    """
    Return what an OpenStreetMap extract holds that can be crossed: its lines and its areas.

    Parameters
    ----------
    path
        An `.osm` or `.osm.pbf` file.
    box
        Only what meets this box; None: everything.

    Raises
    ------
    GeometryError
        If the file cannot be read.
    """
    _there(path)
    layers = []
    for name in _OSM_LAYERS:
        fields = set(_info(path, name)["fields"])
        asked = " OR ".join(f"({text})" for column, text in OSM_WHERE if column in fields)
        columns = [column for column in OSM_COLUMNS if column in fields]
        _, geometries, table = _read(path, name, box=box, where=asked, columns=columns)
        tags = [_tags(table, row) for row in range(len(geometries))]
        what = [what_of_tags(one) for one in tags]
        keep = [at for at, one in enumerate(what) if one is not None]
        layers.append(
            feature_layer(
                f"{path.name} {name}",
                geometries[keep],
                kinds=[one[0] for one in what if one is not None],
                classes=[one[1] for one in what if one is not None],
                names=[tags[at].get("name", "") for at in keep],
                owners=[owner_of_tags(tags[at]) for at in keep],
            )
        )
    return tuple(layers)


def _tags(table: Table, row: int) -> dict[str, str]:
    tags = {key: column[row] for key, column in table.items() if column[row] is not None}
    return {**other_tags(tags.pop("other_tags", None)), **tags}


def read_features(
    path: Path,
    *,
    layer: str | None = None,
    kind: FeatureKind | None = None,
    columns: Mapping[str, str] | None = None,
    kinds: Mapping[str, FeatureKind] | None = None,
    crs: str | None = None,
    box: Box | None = None,
) -> FeatureLayer:
    """
    Return a layer of any vector file that GDAL reads.

    Parameters
    ----------
    path
        The file.
    layer
        Its layer; None: the first.
    kind
        What all features are; None: what the column of the kind says.
    columns
        Which column holds `kind`, `class`, `name` and `owner`; those left out are taken from
        columns of that name if there are any (`crosses` for the kind, `operator` for the owner).
    kinds
        Which kind a value of the kind column stands for; features of other values are left out.
        None: the values are the kinds themselves.
    crs
        CRS if the file does not say.
    box
        Only what meets this box; None: everything.

    Raises
    ------
    GeometryError
        If the file, its layer or a column is not there, or a kind is unknown.
    CrsError
        If its CRS is unknown.
    """
    _there(path)
    info = _info(path, layer)
    found = crs_or_none(info["crs"]) or crs_or_none(crs)
    if found is None or unusable(found):
        what = f"is in a CRS that {unusable(found)}" if found else "does not say which CRS it is in"
        raise CrsError(Problem(where=path.name, what=what, remedy="Name its CRS"))
    chosen = _chosen(path, [str(field) for field in info["fields"]], dict(columns or {}))
    if kind is None and "kind" not in chosen:
        remedy = "Name the kind of the layer, or the column that holds it"
        raise GeometryError(
            Problem(where=path.name, what="does not say what its features are", remedy=remedy)
        )
    _, geometries, table = _read(
        path, layer, box=_moved(box, found), where=None, columns=sorted(set(chosen.values()))
    )
    rows = _kinds(path, table, chosen, kind=kind, kinds=kinds, count=len(geometries))
    keep = [at for at, one in enumerate(rows) if one is not None]
    texts = {
        key: _texts(table[chosen[key]], keep) for key in ("class", "name", "owner") if key in chosen
    }
    return feature_layer(
        path.name if layer is None else f"{path.name} {layer}",
        _degrees(geometries[keep], found),
        kinds=[one for one in rows if one is not None],
        classes=texts.get("class"),
        names=texts.get("name"),
        owners=texts.get("owner"),
    )


def _chosen(path: Path, fields: list[str], columns: dict[str, str]) -> dict[str, str]:
    """Return the column of each of kind, class, name and owner."""
    problems = [
        Problem(
            where=path.name,
            what=f"has no column for the {key}",
            value=column,
            limit=one_of(fields) or "no column",
        )
        for key, column in columns.items()
        if column not in fields
    ]
    problems += [
        Problem(
            where=path.name,
            what="no such thing is read from a column",
            value=key,
            limit=one_of(_COLUMN_NAMES),
        )
        for key in columns
        if key not in _COLUMN_NAMES
    ]
    if problems:
        raise GeometryError(problems)
    lower = {field.lower(): field for field in reversed(fields)}
    for key, names in _COLUMN_NAMES.items():
        usual = next((lower[name] for name in names if name in lower), None)
        if key not in columns and usual is not None:
            columns[key] = usual
    return columns


def _kinds(
    path: Path,
    table: Table,
    chosen: dict[str, str],
    *,
    kind: FeatureKind | None,
    kinds: Mapping[str, FeatureKind] | None,
    count: int,
) -> list[FeatureKind | None]:
    if kind is not None:
        return [kind] * count
    values = _texts(table[chosen["kind"]], range(count))
    if kinds is not None:
        return [kinds.get(value) for value in values]
    known: dict[str, FeatureKind] = {one: one for one in FEATURE_KINDS}
    strange = sorted({value for value in values if value not in known})
    if strange:
        raise GeometryError(
            Problem(
                where=path.name,
                what=f"column {chosen['kind']} holds what is no kind",
                value=", ".join(strange[:5]),
                limit=one_of(FEATURE_KINDS),
                remedy="Say which kind each value stands for",
            )
        )
    return [known[value] for value in values]


def _texts(column: NDArray[Any], rows: Sequence[int]) -> list[str]:
    values = column.tolist()
    return [
        "" if values[at] is None or values[at] != values[at] else str(values[at]) for at in rows
    ]


def _moved(box: Box | None, crs: Any) -> Box | None:
    """Return a box in degrees as one in a CRS; None where it does not reach."""
    if box is None or is_wgs84(crs):
        return box
    import pyproj

    turn = pyproj.Transformer.from_crs("EPSG:4326", crs, always_xy=True)
    moved = turn.transform_bounds(*box)
    return moved if np.isfinite(moved).all() else None


def _degrees(geometries: NDArray[np.object_], crs: Any) -> NDArray[np.object_]:
    if is_wgs84(crs) or not len(geometries):
        return geometries
    import pyproj

    if crs.is_projected:
        unit_m = crs.axis_info[0].unit_conversion_factor or 1.0
        geometries = shapely.segmentize(geometries, _STRAIGHT_M / unit_m)
    turn = pyproj.Transformer.from_crs(crs, "EPSG:4326", always_xy=True)

    def degrees(xy: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.column_stack(turn.transform(xy[:, 0], xy[:, 1]))

    return np.asarray(shapely.transform(geometries, degrees))


def _there(path: Path) -> None:
    if not path.exists():
        raise GeometryError(Problem(where=path.name, what="is not there", remedy=looked_in(path)))


def _info(path: Path, layer: str | None) -> dict[str, Any]:
    import pyogrio

    return dict(_called(path, pyogrio.read_info, layer=layer))


def _read(
    path: Path, layer: str | None, *, box: Box | None, where: str | None, columns: list[str]
) -> tuple[dict[str, Any], NDArray[np.object_], Table]:
    import pyogrio

    meta, _, wkb, values = _called(
        path, pyogrio.raw.read, layer=layer, bbox=box, where=where or None, columns=columns
    )
    try:
        geometries = shapely.from_wkb(wkb)
    except shapely.errors.ShapelyError as error:
        what = "has a geometry that cannot be read"
        raise GeometryError(Problem(where=path.name, what=what, value=str(error)[:200])) from error
    table = {str(name): column for name, column in zip(meta["fields"], values, strict=True)}
    return meta, np.asarray(geometries, dtype=object), table


def _called(path: Path, call: Any, **options: Any) -> Any:
    from pyogrio.errors import DataLayerError, DataSourceError, FeatureError

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return call(path.absolute(), **options)
    except (DataLayerError, DataSourceError, FeatureError, RuntimeError, ValueError) as error:
        text = str(error).replace(str(path.absolute()), path.name)[:300]
        raise GeometryError(Problem(where=path.name, what="cannot be read", value=text)) from error
