"""How much of every street lies inside polygons, or near a line."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from routeplan.geodesy import unwrapped
from routeplan.streets.model import Floats, Network

__all__ = ["edge_lines", "inside_ratios", "near_ratios", "plan_frame"]


def edge_lines(network: Network, edges: Any) -> Any:
    """Return some edges of a network as shapely lines, in degrees."""
    import shapely

    edges = np.asarray(edges, dtype=np.int64)
    sizes = network.shape_first[edges + 1] - network.shape_first[edges]
    owner = np.repeat(np.arange(len(edges)), sizes)
    ends = np.cumsum(sizes)
    within = np.arange(len(owner)) - np.repeat(ends - sizes, sizes)
    vertices = network.shape_lonlat[np.repeat(network.shape_first[edges], sizes) + within]
    return shapely.linestrings(vertices, indices=owner)


def inside_ratios(network: Network, polygons: Sequence[tuple[Floats, ...]]) -> Floats:
    """
    Return which share of every edge lies inside any of some polygons.

    An edge that only touches a border is outside.

    Parameters
    ----------
    network
        The network.
    polygons
        For each its rings, shape (n, 2), the outer one first. [deg]
    """
    import shapely

    shapes = [shapely.Polygon(rings[0], holes=list(rings[1:])) for rings in polygons]
    ground = shapely.union_all([shapely.make_valid(shape) for shape in shapes])
    return _shares(network, ground)


def near_ratios(network: Network, lonlat: Floats, *, near_m: float) -> Floats:
    """
    Return which share of every edge lies within a distance of a polyline.

    Parameters
    ----------
    network
        The network.
    lonlat
        The polyline, shape (n, 2). [deg]
    near_m
        The distance. [m]
    """
    import shapely
    from shapely.affinity import scale

    line = np.column_stack([unwrapped(lonlat[:, 0]), lonlat[:, 1]])
    east, north = plan_frame(line)
    flat = shapely.LineString(line * [east, north]).buffer(near_m, quad_segs=4)
    return _shares(network, scale(flat, 1.0 / east, 1.0 / north, origin=(0.0, 0.0)))


def plan_frame(lonlat: Floats) -> tuple[float, float]:
    """Return the metres of a degree of longitude and of latitude at the middle of some points."""
    from routeplan.geodesy import local_xy_m

    middle = 0.5 * (lonlat[:, 1].min() + lonlat[:, 1].max())
    lon = float(lonlat[0, 0])
    east, north = local_xy_m(np.array([[lon + 1e-3, middle + 1e-3]]), lon=lon, lat=middle)
    return float(east[0]) / 1e-3, float(north[0]) / 1e-3


def _shares(network: Network, ground: Any) -> Floats:
    import shapely

    shares = np.zeros(len(network.length_m))
    west, south, east, north = shapely.bounds(ground)
    if not len(shares) or np.isnan(west):
        return shares
    first = network.shape_first[:-1]
    lon, lat = network.shape_lonlat[:, 0], network.shape_lonlat[:, 1]
    near = (np.minimum.reduceat(lon, first) <= east) & (np.maximum.reduceat(lon, first) >= west)
    near &= (np.minimum.reduceat(lat, first) <= north) & (np.maximum.reduceat(lat, first) >= south)
    edges = np.flatnonzero(near)
    lines = edge_lines(network, edges)
    shapely.prepare(ground)
    meets = shapely.intersects(ground, lines)
    edges, lines = edges[meets], lines[meets]
    within = shapely.contains_properly(ground, lines)
    shares[edges[within]] = 1.0
    edges, lines = edges[~within], lines[~within]
    whole = shapely.length(lines)
    part = shapely.length(shapely.intersection(lines, ground))
    part -= shapely.length(shapely.intersection(lines, shapely.boundary(ground)))  # on the border
    shares[edges] = np.clip(np.where(whole > 0, part / np.where(whole > 0, whole, 1.0), 0.0), 0, 1)
    return shares
