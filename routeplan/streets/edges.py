"""Single edges of a network: how far along each vertex lies, and what a part of one looks like."""

from __future__ import annotations

import numpy as np

from routeplan.geodesy import steps_m
from routeplan.streets.model import Floats, Network

__all__ = ["cumulative_m", "edge_part", "edge_shape"]


def edge_shape(network: Network, edge: int) -> Floats:
    """Return the vertices of an edge."""
    return network.shape_lonlat[int(network.shape_first[edge]) : int(network.shape_first[edge + 1])]


def cumulative_m(network: Network, edge: int) -> Floats:
    """Return how far along an edge each of its vertices lies. [m]"""
    return np.concatenate([[0.0], np.cumsum(steps_m(edge_shape(network, edge)))])


def edge_part(network: Network, edge: int, from_m: float, to_m: float) -> Floats:
    """
    Return the vertices of a part of an edge, backwards where `from_m` is the larger.

    Parameters
    ----------
    network
        The network.
    edge
        The edge.
    from_m, to_m
        Where the part begins and ends along it. [m]
    """
    shape = edge_shape(network, edge)
    low, high = min(from_m, to_m), max(from_m, to_m)
    if low <= 0.0 and high >= float(network.length_m[edge]):
        part = shape
    else:
        chain = cumulative_m(network, edge)
        inner = shape[(chain > low + 1e-6) & (chain < high - 1e-6)]
        ends = np.column_stack([np.interp([low, high], chain, shape[:, axis]) for axis in (0, 1)])
        part = np.vstack([ends[:1], inner, ends[1:]])
    return part if from_m <= to_m else part[::-1]
