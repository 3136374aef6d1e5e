"""Reading a street graph kept as GraphML, as OSMnx writes them, or held in memory."""

from __future__ import annotations

import math
import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from routeplan.errors import GeometryError, Problem
from routeplan.streets.assemble import Lines, lines_from, unique_lines
from routeplan.streets.model import Floats

__all__ = ["lines_of_graph", "read_graphml"]


def read_graphml(path: Path) -> Lines:
    """
    Read a street graph: one-way streets count once, whichever way they run.

    Parameters
    ----------
    path
        The file; nodes carry `x` and `y` in the graph's `crs`, edges a `geometry` or run straight.

    Raises
    ------
    GeometryError
        If it is no such graph.
    """
    import osmnx

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            graph = osmnx.load_graphml(path)
    except Exception as error:  # anything may be in a file of that name
        remedy = "Save it with osmnx.save_graphml."
        raise GeometryError(
            Problem(
                where=path.name,
                what="is not a street graph that can be read",
                value=f"{type(error).__name__}: {error}"[:200],
                remedy=remedy,
            )
        ) from None
    return lines_of_graph(graph, where=path.name)


def lines_of_graph(graph: Any, *, where: str) -> Lines:
    """
    Return the streets of a networkx graph, directed or not, in degrees or in a projected CRS.

    An edge that stands in both directions is one street.

    Parameters
    ----------
    graph
        The graph.
    where
        What messages name.
    """
    import pyproj

    try:
        crs = pyproj.CRS.from_user_input(graph.graph["crs"])
        position = {
            node: (float(data["x"]), float(data["y"])) for node, data in graph.nodes(data=True)
        }
    except (KeyError, TypeError, ValueError, pyproj.exceptions.ProjError) as error:
        what = "is a graph without a CRS, or with nodes that have no x and y"
        raise GeometryError(
            Problem(where=where, what=what, value=f"{type(error).__name__}: {error}"[:200])
        ) from None
    rows = [
        (_shape(data, position[one], position[other]), data)
        for one, other, data in graph.edges(data=True)
    ]
    if not rows:
        raise GeometryError(Problem(where=where, what="is a graph without an edge"))
    shapes = _on_earth([shape for shape, _ in rows], crs)
    lines = lines_from(
        shapes,
        road_class=[_first(data, "highway") or "street" for _, data in rows],
        name=[_first(data, "name") or _first(data, "ref") for _, data in rows],
        is_bridge=[_first(data, "bridge") not in ("", "no", "None") for _, data in rows],
        is_tunnel=[_first(data, "tunnel") not in ("", "no", "None") for _, data in rows],
    )
    return unique_lines(lines)


def _shape(data: Mapping[str, Any], start: tuple[float, float], end: tuple[float, float]) -> Floats:
    """Return the vertices of an edge; a straight one has none but its nodes."""
    geometry = data.get("geometry")
    if geometry is None:
        return np.array([start, end])
    return np.asarray(geometry.coords, dtype=np.float64)[:, :2]


def _on_earth(shapes: list[Floats], crs: Any) -> list[Floats]:
    """Return shapes in WGS 84 degrees; equal coordinates stay equal."""
    import pyproj

    if crs.is_geographic and crs.equals(pyproj.CRS("EPSG:4326"), ignore_axis_order=True):
        return shapes
    to_degrees = pyproj.Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    xy = np.concatenate(shapes)
    lonlat = np.column_stack(to_degrees.transform(xy[:, 0], xy[:, 1]))
    return np.split(lonlat, np.cumsum([len(shape) for shape in shapes])[:-1])


def _first(data: Mapping[str, Any], key: str) -> str:
    """Return a value as text; of several, as merged streets have them, the first."""
    value = data.get(key)
    if isinstance(value, list | tuple):
        value = value[0] if value else None
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return ""
    return " ".join(str(value).split())
