"""Networks that tests of streets share: drawn from seeds, and read from real extracts."""

from __future__ import annotations

import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np

from routeplan.streets.anchors import Anchor
from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.costs import Prices, prices_of, street_costs
from routeplan.streets.graph import Graph, graph_of
from routeplan.streets.model import Network
from routeplan.streets.reading import read_network

REFERENCE = Path(__file__).parents[1] / "reference" / "streets"
WEST, SOUTH, STEP = 10.0, 50.0, 0.002


def real_network(name: str, folder: Path) -> Network:
    """Return a network of the reference folder, read from a copy."""
    copy = folder / name
    shutil.copy(REFERENCE / name, copy)
    return read_network(copy)


def network_of(
    edges: list[tuple[int, int]], positions: np.ndarray, rng: np.random.Generator | None = None
) -> Network:
    """Return the network of some edges; each bends by itself, so that parallel ones differ."""
    random = rng or np.random.default_rng(5)
    shapes = []
    for one, other in edges:
        middle = 0.5 * (positions[one] + positions[other]) + random.uniform(-3e-4, 3e-4, 2)
        shapes.append(np.array([positions[one], middle, positions[other]]))
    return assembled(lines_from(shapes, road_class=["street"] * len(shapes)))


def drawn_network(seed: int, *, size: int = 5, parallel: int = 4) -> Network:
    """Return a connected-looking grid with gaps, diagonals and parallel streets."""
    rng = np.random.default_rng(seed)
    positions = np.array(
        [[WEST + STEP * x, SOUTH + STEP * y] for y in range(size) for x in range(size)]
    ) + rng.uniform(-2e-4, 2e-4, (size * size, 2))
    every = [
        (y * size + x, (y + dy) * size + x + dx)
        for y in range(size)
        for x in range(size)
        for dx, dy in ((1, 0), (0, 1), (1, 1))
        if x + dx < size and y + dy < size
    ]
    kept = [edge for edge in every if rng.random() < 0.62]
    kept += [kept[int(at)] for at in rng.integers(0, len(kept), parallel)]
    return network_of(kept, positions, rng)


def priced(network: Network, costs: np.ndarray) -> Prices:
    """Return prices with these totals an edge."""
    usual = prices_of(network, street_costs())
    whole = costs.astype(np.float64)
    return replace(usual, cost=whole, per_m=whole / network.length_m)


def node_anchor(network: Network, node: int) -> Anchor:
    """Return a site that stands on a node."""
    lon, lat = (float(value) for value in network.node_lonlat[node])
    edge = int(network.row_edge[network.row_first[node]])
    return Anchor(
        name=f"N{node}", lon=lon, lat=lat, foot_lon=lon, foot_lat=lat,
        walk_m=0.0, node=node, edge=edge, along_m=0.0,
    )  # fmt: skip


def node_graph(network: Network, prices: Prices, nodes: list[int]) -> Graph:
    """Return the graph to search between nodes."""
    return graph_of(network, prices, [node_anchor(network, node) for node in nodes])


def random_sites(network: Network, count: int, seed: int) -> list[tuple[str, float, float]]:
    """Return sites near random streets."""
    rng = np.random.default_rng(seed)
    rows = rng.integers(0, len(network.shape_lonlat), count)
    places = network.shape_lonlat[rows] + rng.uniform(-2e-4, 2e-4, (count, 2))
    return [(f"S{n}", float(lon), float(lat)) for n, (lon, lat) in enumerate(places)]
