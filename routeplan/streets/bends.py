"""Sharp bends: at the vertices of a street, and from one street into the next."""

from __future__ import annotations

import numpy as np

from routeplan.geodesy import local_xy_m
from routeplan.streets.model import Floats, Network

__all__ = ["bend_counts", "bend_positions", "headings_rad", "turns_rad"]


def headings_rad(begin: Floats, end: Floats) -> Floats:
    """
    Return the heading of steps, counted from east.

    Parameters
    ----------
    begin, end
        Points, shape (n, 2) each. [deg]
    """
    east, north = local_xy_m(end, lon=begin[:, 0], lat=begin[:, 1])
    return np.arctan2(north, east)


def turns_rad(first: Floats, second: Floats) -> Floats:
    """Return by how much one heading turns into another, 0 to pi."""
    return np.abs((second - first + np.pi) % (2.0 * np.pi) - np.pi)


def bend_positions(network: Network, *, sharp_deg: float) -> tuple[np.ndarray, np.ndarray]:
    """Return the edge and the vertex of every turn inside an edge of at least `sharp_deg`."""
    vertices = network.shape_lonlat
    if len(vertices) < 3:
        return np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64)
    heading = headings_rad(vertices[:-1], vertices[1:])
    turn = np.degrees(turns_rad(heading[:-1], heading[1:]))
    inner = np.ones(len(vertices), dtype=bool)
    inner[network.shape_first[:-1]] = False
    inner[network.shape_first[1:] - 1] = False
    at = np.flatnonzero((turn >= sharp_deg) & inner[1:-1]) + 1
    return np.searchsorted(network.shape_first, at, side="right") - 1, at


def bend_counts(network: Network, *, sharp_deg: float) -> Floats:
    """
    Return how many turns of at least `sharp_deg` each edge makes between its ends.

    Parameters
    ----------
    network
        The network.
    sharp_deg
        From where a turn is sharp. [deg]
    """
    edge, _ = bend_positions(network, sharp_deg=sharp_deg)
    return np.bincount(edge, minlength=len(network.length_m)).astype(np.float64)
