"""Which parts of a network hang together."""

from __future__ import annotations

import numpy as np

from routeplan.streets.model import Flags, Network, Whole

__all__ = ["parts_of"]


def parts_of(network: Network, usable: Flags | None = None) -> Whole:
    """
    Return for each node the number of the part of the network it belongs to.

    Parameters
    ----------
    network
        The network.
    usable
        Which edges count, shape (m,); None: all.
    """
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    size = len(network.node_lonlat)
    row_first, row_node = network.row_first, network.row_node
    if usable is not None and not usable.all():
        keep = usable[network.row_edge]
        row_first = np.concatenate([[0], np.cumsum(keep)])[row_first].astype(np.int32)
        row_node = row_node[keep]
    ones = np.ones(len(row_node), dtype=np.int8)
    graph = csr_array((ones, row_node, row_first), shape=(size, size))
    _, label = connected_components(graph, directed=False)
    return np.asarray(label)
