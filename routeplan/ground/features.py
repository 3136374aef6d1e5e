"""What lies in the country: lines and areas with what they are and whose they are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import get_args

import numpy as np
import shapely
from numpy.typing import NDArray

from routeplan import geodesy
from routeplan.run.model import Floats
from routeplan.run.practice import FeatureKind

__all__ = ["FEATURE_KINDS", "FeatureKind", "FeatureLayer", "feature_layer", "lines_from_arrays"]

FEATURE_KINDS: tuple[FeatureKind, ...] = get_args(FeatureKind)

Geometries = NDArray[np.object_]

_LINES = (1, 2, 5)  # shapely's type numbers: line, ring, several lines
_AREAS = (3, 6)
_COLLECTION = 7


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FeatureLayer:
    """
    Lines and areas of one layer of one file.

    `geometries` (n,) are shapely lines and polygons, also of several parts, in WGS 84 degrees;
    of each the kind, the class (a road's class, a railway's kind ...), the name and the owner
    or operator, "" where not said.
    """

    file: str
    geometries: Geometries
    kinds: tuple[FeatureKind, ...]
    classes: tuple[str, ...]
    names: tuple[str, ...]
    owners: tuple[str, ...]


def feature_layer(
    file: str,
    geometries: Sequence[object] | Geometries,
    *,
    kinds: Sequence[FeatureKind],
    classes: Sequence[str] | None = None,
    names: Sequence[str] | None = None,
    owners: Sequence[str] | None = None,
) -> FeatureLayer:
    """
    Return a layer of features; points and what is empty are left out.

    A geometry that jumps over the antimeridian is made to run on over it.

    Parameters
    ----------
    file
        What the layer is called in messages.
    geometries
        Shapely geometries in WGS 84 degrees, shape (n,).
    kinds
        What each is.
    classes
        The class of each.
    names
        The name of each.
    owners
        Who owns or operates each.
    """
    plain = np.empty(len(geometries), dtype=object)
    plain[:] = geometries
    for at in np.flatnonzero(shapely.get_type_id(plain) == _COLLECTION).tolist():
        plain[at] = _flat(plain[at])
    usable = np.isin(shapely.get_type_id(plain), (*_LINES, *_AREAS))
    usable &= ~shapely.is_empty(plain)
    keep = np.flatnonzero(usable).tolist()
    columns = [
        tuple(column[at] for at in keep) if column is not None else ("",) * len(keep)
        for column in (classes, names, owners)
    ]
    return FeatureLayer(
        file=file,
        geometries=_run_on(plain[keep]),
        kinds=tuple(kinds[at] for at in keep),
        classes=columns[0],
        names=columns[1],
        owners=columns[2],
    )


def lines_from_arrays(lonlat: Floats, feature: NDArray[np.int64]) -> Geometries:
    """
    Return one line for every feature of flat arrays of coordinates.

    Parameters
    ----------
    lonlat
        Vertices of all lines one after the other, shape (n, 2). [deg]
    feature
        Number of the line each vertex belongs to, not falling, shape (n,). [-]
    """
    return np.asarray(shapely.linestrings(lonlat, indices=feature))


def _flat(collection: object) -> object:
    """Return the areas, or else the lines, of a collection as one geometry."""
    parts = np.array([collection], dtype=object)
    while (shapely.get_type_id(parts) == _COLLECTION).any():
        parts = shapely.get_parts(parts)
    types = shapely.get_type_id(parts)
    for wanted, together in ((_AREAS, shapely.multipolygons), (_LINES, shapely.multilinestrings)):
        own = parts[np.isin(types, wanted)]
        if len(own):
            return together(shapely.get_parts(own))
    return None


def _run_on(geometries: Geometries) -> Geometries:
    """Make what jumps over the antimeridian run on, and bring middles within -180..180."""
    bounds = shapely.bounds(geometries)
    for at in np.flatnonzero(bounds[:, 2] - bounds[:, 0] > 180.0).tolist():
        geometries[at] = shapely.transform(geometries[at], _unwrapped)
        bounds[at] = geometries[at].bounds
    turns = np.round((bounds[:, 0] + bounds[:, 2]) / 720.0)
    for at in np.flatnonzero(turns).tolist():
        back = np.array([360.0 * turns[at], 0.0])
        moved = shapely.get_coordinates(geometries[at]) - back
        geometries[at] = shapely.set_coordinates(geometries[at], moved)
    return geometries


def _unwrapped(lonlat: Floats) -> Floats:
    return np.column_stack([geodesy.unwrapped(lonlat[:, 0]), lonlat[:, 1]])
