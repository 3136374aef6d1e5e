"""Putting a layer's shapes on the earth: on its own datum for lengths, on WGS 84 for maps."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.geodesy import wrapped
from routeplan.run.crs import crs_label, degrees_of, is_wgs84, layer_crs
from routeplan.run.model import Floats
from routeplan.run.shapes import Layer, Shape, frozen
from routeplan.run.trouble import Trouble

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = ["PlacedShape", "placed_shapes"]

_STRAIGHT_M = 1000.0  # house rule: below it a straight line of a grid is a geodesic to a millimetre
_OUTSIDE_DEG = 2.0  # house rule: how far beyond a grid's area of use coordinates may lie unnoticed
_HEIGHT_MOST = 50_000.0  # house rule: in metres or feet, beyond any ground or sea floor


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlacedShape:
    """A shape with its vertices on WGS 84 and on the datum of its file, with that ellipsoid."""

    shape: Shape
    lonlat: Floats
    datum_lonlat: Floats
    heights_m: Floats | None
    is_drawn: NDArray[np.bool_] | None
    semi_major_m: float
    inverse_flattening: float


def placed_shapes(layer: Layer, *, run_crs: CRS | None, trouble: Trouble) -> list[PlacedShape]:
    """Return a layer's shapes on the earth; those that cannot be are noted and left out."""
    layer = _finite(layer, trouble)
    if not layer.shapes:
        return []
    crs = layer_crs(layer, _all_xy(layer), run_crs=run_crs, trouble=trouble)
    if crs is None:
        return []
    crs = crs.source_crs if crs.is_bound and crs.source_crs is not None else crs
    layer = replace(layer, shapes=[_without_repeats(shape) for shape in layer.shapes])
    dense = _dense(layer, crs)
    layer = replace(layer, shapes=[shape for shape, _ in dense])
    xy = _all_xy(layer)
    places = _on_earth(layer, xy, crs=crs, trouble=trouble)
    if places is None:
        return []
    lonlat, datum_lonlat = places
    if not is_wgs84(crs):
        _check_place(layer, xy, lonlat, crs=crs, trouble=trouble)
    heights = _heights(layer, crs, trouble)
    ellipsoid = crs.ellipsoid
    assert ellipsoid is not None
    ends = np.cumsum([0, *(len(shape.xy) for shape in layer.shapes)])
    marks = [is_drawn for _, is_drawn in dense]
    placed = []
    for shape, is_drawn, start, end in zip(layer.shapes, marks, ends[:-1], ends[1:], strict=True):
        own = frozen(lonlat[start:end])
        if not np.isfinite(own).all():
            _unplaceable(shape, crs, trouble)
            continue
        same = datum_lonlat is lonlat
        placed.append(
            PlacedShape(
                shape=shape,
                lonlat=own,
                datum_lonlat=own if same else frozen(datum_lonlat[start:end]),
                heights_m=_own_heights(heights, start, end),
                is_drawn=is_drawn,
                semi_major_m=ellipsoid.semi_major_metre,
                inverse_flattening=ellipsoid.inverse_flattening,
            )
        )
    return placed


def _all_xy(layer: Layer) -> Floats:
    if len(layer.shapes) == 1:
        return layer.shapes[0].xy
    return np.concatenate([shape.xy for shape in layer.shapes])


def _finite(layer: Layer, trouble: Trouble) -> Layer:
    if not layer.shapes or _is_finite(layer):
        return layer
    good = []
    for shape in layer.shapes:
        bad = ~np.isfinite(shape.xy).all(axis=1)
        if shape.z is not None:
            bad |= np.isinf(shape.z)
        heights = np.zeros(len(shape.xy)) if shape.z is None else shape.z
        high = np.abs(heights) > _HEIGHT_MOST
        if bad.any() or high.any():
            what = (
                "has a coordinate that is not a finite number"
                if bad.any()
                else "has a height that is nowhere on earth"
            )
            vertex = int(np.argmax(bad if bad.any() else high)) + 1
            problem = Problem(where=str(shape.source), what=what, value=f"vertex {vertex}")
            trouble.add(GeometryError, problem, file=layer.file)
        else:
            good.append(shape)
    return replace(layer, shapes=good)


def _is_finite(layer: Layer) -> bool:
    heights = [shape.z for shape in layer.shapes if shape.z is not None]
    return bool(
        np.isfinite(_all_xy(layer)).all()
        and not (heights and (np.abs(np.concatenate(heights)) > _HEIGHT_MOST).any())
    )


def _without_repeats(shape: Shape) -> Shape:
    """Drop vertices of a line that repeat the one before; a height it has is kept."""
    if shape.kind != "line" or len(shape.xy) < 2:
        return shape
    keep = np.ones(len(shape.xy), dtype=bool)
    np.any(shape.xy[1:] != shape.xy[:-1], axis=1, out=keep[1:])
    if keep.all():
        return shape
    z = shape.z
    if z is not None:
        starts = np.flatnonzero(keep)
        z = np.where(np.isnan(z), np.inf, z)
        lowest = np.minimum.reduceat(z, starts)
        first = shape.z[starts] if shape.z is not None else lowest
        z = np.where(np.isnan(first), np.where(np.isinf(lowest), np.nan, lowest), first)
    return replace(shape, xy=shape.xy[keep], z=z)


def _dense(layer: Layer, crs: CRS) -> list[tuple[Shape, NDArray[np.bool_] | None]]:
    """Put vertices on long straight lines of a grid: there they are no geodesics."""
    if not crs.is_projected:
        return [(shape, None) for shape in layer.shapes]
    step = _STRAIGHT_M / crs.axis_info[0].unit_conversion_factor
    return [_dense_shape(shape, step) for shape in layer.shapes]


def _dense_shape(shape: Shape, step: float) -> tuple[Shape, NDArray[np.bool_] | None]:
    if shape.kind != "line" or len(shape.xy) < 2:
        return shape, None
    lengths = np.hypot(*np.diff(shape.xy, axis=0).T)
    pieces = np.clip(np.ceil(lengths / step), 1, 100_000).astype(np.int64)
    if pieces.max() == 1:
        return shape, None
    last = len(pieces)
    within = np.concatenate([np.arange(count) / count for count in pieces])
    index = np.append(np.repeat(np.arange(last), pieces) + within, float(last))
    whole = np.arange(last + 1, dtype=np.float64)
    columns = [np.interp(index, whole, shape.xy[:, axis]) for axis in (0, 1)]
    z = None if shape.z is None else np.interp(index, whole, shape.z)
    dense = replace(shape, xy=np.column_stack(columns), z=z)
    is_drawn = index == np.floor(index)
    is_drawn.flags.writeable = False
    return dense, is_drawn


def _on_earth(
    layer: Layer, xy: Floats, *, crs: CRS, trouble: Trouble
) -> tuple[Floats, Floats] | None:
    """Return coordinates on WGS 84 and on the file's own datum, longitudes within -180..180."""
    from pyproj.exceptions import ProjError

    if is_wgs84(crs):
        lonlat = _wrapped(xy)
        return lonlat, lonlat
    try:
        return _transformed(xy, crs, "EPSG:4326"), _transformed(xy, crs, None)
    except ProjError:
        problem = Problem(
            where=layer.where,
            what="is in a CRS that cannot be taken to longitude and latitude on the earth",
            value=crs_label(crs),
        )
        trouble.add(CrsError, problem, file=layer.file)
        return None


def _wrapped(lonlat: Floats) -> Floats:
    if not (np.abs(lonlat[:, 0]) > 180.0).any():
        return lonlat
    return np.column_stack([wrapped(lonlat[:, 0]), lonlat[:, 1]])


def _transformed(xy: Floats, crs: CRS, target: str | None) -> Floats:
    transformer = _transformer(crs, target)
    lon, lat = transformer.transform(xy[:, 0], xy[:, 1], errcheck=False)
    lonlat = np.column_stack([lon, lat])
    lonlat[np.isinf(lonlat)] = np.nan  # how the library marks what it cannot transform
    return _wrapped(lonlat)


@lru_cache(maxsize=64)
def _transformer(crs: CRS, target: str | None):  # type: ignore[no-untyped-def]
    """Return the way from a CRS to another, or to degrees from Greenwich on its own datum."""
    from pyproj import Transformer

    plan = crs.to_2d()
    return Transformer.from_crs(plan, target or _own_degrees(plan), always_xy=True)


def _own_degrees(crs: CRS) -> object:
    own = crs.geodetic_crs
    assert own is not None
    assert own.prime_meridian is not None
    assert own.ellipsoid is not None
    if own.prime_meridian.longitude == 0.0 and degrees_of(own) == 1.0:
        return own.to_2d()
    ellipsoid = own.ellipsoid
    axes = {"a": ellipsoid.semi_major_metre, "b": ellipsoid.semi_minor_metre}
    return {"proj": "longlat", **axes, "type": "crs"}


def _heights(layer: Layer, crs: CRS, trouble: Trouble) -> Floats | None:
    """Return the heights of all vertices of a layer in metres, NaN where there are none."""
    parts = [np.full(len(s.xy), np.nan) if s.z is None else s.z for s in layer.shapes]
    heights = np.concatenate(parts)
    known = heights[~np.isnan(heights)]
    if not len(known):
        return None
    if not known.any():
        trouble.warn(layer.where, "all heights are 0: taken as not known", file=layer.file)
        return None
    return frozen(heights * _metres_up(crs))


def _own_heights(heights: Floats | None, start: int, end: int) -> Floats | None:
    if heights is None or np.isnan(heights[start:end]).all():
        return None
    return heights[start:end]


def _metres_up(crs: CRS) -> float:
    """Return what one unit of the vertical axis is in metres upward; 1 if there is none."""
    parts = crs.sub_crs_list if crs.is_compound else [crs]
    axes = [axis for part in parts for axis in part.axis_info]
    for axis in axes:
        if axis.direction in ("up", "down"):
            factor: float = axis.unit_conversion_factor
            return -factor if axis.direction == "down" else factor
    return 1.0


def _check_place(layer: Layer, xy: Floats, lonlat: Floats, *, crs: CRS, trouble: Trouble) -> None:
    """Note coordinates that lie where their CRS is not meant for, or on a map's false metres."""
    operation = crs.coordinate_operation
    if operation is not None and "Pseudo Mercator" in operation.method_name.replace("-", " "):
        message = (
            "is in web mercator, whose lengths are not metres on the ground; "
            "lengths are measured on the ellipsoid instead"
        )
        trouble.warn(layer.where, message, file=layer.file)
    if crs.area_of_use is None or _share_within(lonlat, crs) > 0.5:
        return
    turned = _transformed(xy[:, ::-1], crs, "EPSG:4326")
    if _share_within(turned, crs) > 0.5:
        problem = Problem(
            where=layer.where,
            what=f"the two coordinates look swapped for {crs_label(crs)}",
            value=f"first position {xy[0, 0]:.9g}, {xy[0, 1]:.9g}",
            remedy="Write easting (or longitude) first.",
        )
        trouble.add(CrsError, problem, file=layer.file)
    else:
        message = f"lies outside the area that {crs_label(crs)} is made for"
        trouble.warn(layer.where, message, file=layer.file)


def _share_within(lonlat: Floats, crs: CRS) -> float:
    area = crs.area_of_use
    assert area is not None
    east_of_west = np.mod(lonlat[:, 0] - area.west + _OUTSIDE_DEG, 360.0)
    width = (area.east - area.west) % 360.0 or 360.0
    within = east_of_west <= width + 2 * _OUTSIDE_DEG
    within &= lonlat[:, 1] >= area.south - _OUTSIDE_DEG
    within &= lonlat[:, 1] <= area.north + _OUTSIDE_DEG
    return float(within.mean())


def _unplaceable(shape: Shape, crs: CRS, trouble: Trouble) -> None:
    problem = Problem(
        where=str(shape.source),
        what="has coordinates that are no place on the earth in its CRS",
        value=f"{crs_label(crs)}, first position {shape.xy[0, 0]:.9g}, {shape.xy[0, 1]:.9g}",
    )
    trouble.add(CrsError, problem, file=shape.source.file)
