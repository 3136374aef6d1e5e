"""Which coordinate reference system the coordinates of a layer are in, and whether they can be."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.run.model import Floats
from routeplan.run.trouble import Trouble

if TYPE_CHECKING:
    from pyproj import CRS

    from routeplan.run.shapes import Layer

__all__ = ["crs_label", "crs_or_none", "degrees_of", "is_wgs84", "layer_crs", "unusable"]

_NAME_IT = 'Name their CRS, for example crs = "EPSG:27700"'
_TURN_DEG = 360.0


def crs_or_none(name: object) -> CRS | None:
    """Return the CRS of that name, code or WKT, or None if there is no such."""
    if not isinstance(name, str) or not name.strip() or len(name) > 100_000:
        return None
    return _crs_named(name.strip())


@lru_cache(maxsize=64)
def _crs_named(name: str) -> CRS | None:
    from pyproj import CRS
    from pyproj.exceptions import ProjError

    try:
        return CRS.from_user_input(name)
    except (ProjError, ValueError, TypeError):
        return None


@lru_cache(maxsize=64)
def is_wgs84(crs: CRS) -> bool:
    """Tell whether coordinates are degrees on WGS 84 already, with or without heights."""
    if not crs.is_geographic:
        return False
    if crs == crs_or_none("OGC:CRS84"):
        return True
    return bool(crs.to_2d().equals(crs_or_none("EPSG:4326"), ignore_axis_order=True))


def unusable(crs: CRS) -> str:
    """Return why a CRS gives no place on the earth's surface; nothing if it does."""
    if crs.is_engineering:
        return "is a local system that has no known place on the earth"
    if crs.is_geocentric:
        return "is geocentric: it has no plan coordinates"
    if crs.is_vertical and not crs.is_compound:
        return "is a vertical system: it has no plan coordinates"
    if not (crs.is_geographic or crs.is_projected) or crs.geodetic_crs is None:
        return "is neither geographic nor projected"
    return ""


def crs_label(crs: CRS) -> str:
    """Return the code of a CRS if it has one, else its name."""
    authority = crs.to_authority()
    return f"{authority[0]}:{authority[1]}" if authority else crs.name


def layer_crs(layer: Layer, xy: Floats, *, run_crs: CRS | None, trouble: Trouble) -> CRS | None:
    """
    Return the CRS a layer's coordinates are in, or None with the problem noted.

    What the file declares comes first, then the run file's `crs`, then what the format prescribes
    (GeoJSON: WGS 84); a run file's projected `crs` does not apply to degrees.

    Parameters
    ----------
    layer
        The layer.
    xy
        All its coordinates, shape (n, 2), finite.
    run_crs
        The run file's `crs`.
    trouble
        Where problems are noted.
    """
    declared = layer.crs
    if declared is None:
        declared = _undeclared(layer, xy, run_crs=run_crs)
        if declared is None:
            problem = Problem(
                where=layer.where, what="does not say which CRS it is in", remedy=f"{_NAME_IT}."
            )
            trouble.add(CrsError, problem, file=layer.file)
            return None
    reason = unusable(declared)
    if reason:
        problem = Problem(
            where=layer.where,
            what=f"is in a CRS that {reason}",
            value=crs_label(declared),
            remedy="Give the geometry in a national grid or in longitude and latitude.",
        )
        trouble.add(CrsError, problem, file=layer.file)
        return None
    agrees = _degrees_agree if declared.is_geographic else _grid_agrees
    return declared if agrees(layer, xy, declared, trouble) else None


def degrees_of(crs: CRS) -> float:
    """Return how many degrees one unit of a geographic CRS is: 1, or 0.9 for gons."""
    factor: float = crs.axis_info[0].unit_conversion_factor
    degrees = math.degrees(factor)
    return 1.0 if abs(degrees - 1.0) < 1e-12 else degrees


def _undeclared(layer: Layer, xy: Floats, *, run_crs: CRS | None) -> CRS | None:
    prescribed = crs_or_none(layer.default_crs)
    if run_crs is None or prescribed is None:
        return prescribed if run_crs is None else run_crs
    return run_crs if run_crs.is_geographic or not _can_be_degrees(xy).all() else prescribed


def _can_be_degrees(xy: Floats) -> NDArray[np.bool_]:
    return np.asarray((np.abs(xy[:, 0]) <= _TURN_DEG) & (np.abs(xy[:, 1]) <= 90.0))


def _degrees_agree(layer: Layer, xy: Floats, crs: CRS, trouble: Trouble) -> bool:
    """Tell whether values can be degrees; note what speaks against it, shape by shape if few."""
    good = _can_be_degrees(xy * degrees_of(crs))
    if good.all():
        return True
    bad = int(np.argmin(good))
    x, y = xy[:, 0], xy[:, 1]
    if np.abs(xy).max() <= _TURN_DEG:
        if good.mean() < 0.5 and np.abs(x).max() <= 90.0 and _can_be_degrees(xy[:, ::-1]).all():
            _swapped(layer, xy, bad, trouble)
            return False
        for at in _first_of_shapes(layer, ~good):
            _fault(layer, at, "has a latitude beyond 90 degrees", f"{y[at]:.6g}", trouble)
        return False
    if good.mean() > 0.5:
        for at in _first_of_shapes(layer, ~good):
            what = "has a vertex that is not in degrees while the others are"
            _fault(layer, at, what, _pair(xy[at]), trouble)
        return False
    remedy = f"{_NAME_IT}."
    if layer.crs is not None:
        remedy = f"The file declares {crs_label(crs)}; declare the CRS they are in."
    problem = Problem(
        where=_where(layer, bad),
        what=f"coordinates such as {_pair(xy[bad])} are not degrees",
        remedy=remedy,
    )
    trouble.add(CrsError, problem, file=layer.file)
    return False


def _grid_agrees(layer: Layer, xy: Floats, crs: CRS, trouble: Trouble) -> bool:
    if not (np.abs(xy[:, 0]).max() <= 180.0 and np.abs(xy[:, 1]).max() <= 90.0):
        return True
    says = "the file declares" if layer.crs is not None else "the run file's crs is"
    problem = Problem(
        where=_where(layer, 0),
        what=f"coordinates such as {_pair(xy[0])} look like degrees, "
        f"but {says} the grid {crs_label(crs)}",
        remedy="Name the CRS they are in.",
    )
    trouble.add(CrsError, problem, file=layer.file)
    return False


def _swapped(layer: Layer, xy: Floats, bad: int, trouble: Trouble) -> None:
    problem = Problem(
        where=_where(layer, bad),
        what="longitude and latitude look swapped",
        value=f"latitude {xy[bad, 1]:.6g}",
        limit="90",
        remedy="Write longitude first.",
    )
    trouble.add(CrsError, problem, file=layer.file)


def _fault(layer: Layer, at: int, what: str, value: str, trouble: Trouble) -> None:
    problem = Problem(where=_where(layer, at), what=what, value=value)
    trouble.add(GeometryError, problem, file=layer.file)


def _first_of_shapes(layer: Layer, flags: NDArray[np.bool_]) -> list[int]:
    """Return the first flagged vertex of every shape that has one."""
    owners = np.repeat(np.arange(len(layer.shapes)), [len(shape.xy) for shape in layer.shapes])
    at = np.flatnonzero(flags)
    _, first = np.unique(owners[at], return_index=True)
    return [int(index) for index in at[first]]


def _where(layer: Layer, at: int) -> str:
    ends = np.cumsum([len(shape.xy) for shape in layer.shapes])
    return str(layer.shapes[int(np.searchsorted(ends, at, side="right"))].source)


def _pair(position: Floats) -> str:
    return ", ".join(_grouped(float(value)) for value in position)


def _grouped(value: float) -> str:
    """Return a coordinate as a person reads it: 532 410."""
    if abs(value) >= 1e12:
        return f"{value:.6g}"
    if abs(value) < 1000.0:
        return f"{value:.9g}"
    return f"{value:,.0f}".replace(",", " ")
