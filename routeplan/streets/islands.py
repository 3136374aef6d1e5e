"""Which parts of a network hang together."""

from __future__ import annotations

import numpy as np

from routeplan.streets.model import Flags, Network, Whole

__all__ = ["labelled", "parts_of"]


def parts_of(network: Network, usable: Flags) -> Whole:
    """
    Return for each node the number of the part of the network it belongs to.

    Parameters
    ----------
    network
        The network.
    usable
        Which edges count, shape (m,).
    """
    if usable.all():
        return network.part
    keep = usable[network.row_edge]
    row_first = np.concatenate([[0], np.cumsum(keep)])[network.row_first].astype(np.int32)
    return labelled(row_first, network.row_node[keep])


def labelled(row_first: Whole, row_node: Whole) -> Whole:
    """Return for each row of an adjacency the number of the part it hangs together with."""
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    size = len(row_first) - 1
    if not size:
        return np.empty(0, dtype=np.int32)
    ones = np.ones(len(row_node), dtype=np.int8)
    graph = csr_array((ones, row_node, row_first), shape=(size, size))
    _, label = connected_components(graph, directed=False)
    return np.asarray(label)
