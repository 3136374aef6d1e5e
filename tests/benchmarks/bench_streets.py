"""
Compare finding a way with the usual libraries: time in ratios of one run, on a made-up town.

    python tests/benchmarks/bench_streets.py            100,000 edges
    python tests/benchmarks/bench_streets.py --large    and 1,000,000 edges

Every answer is compared with the other library's before its time counts.
"""

from __future__ import annotations

import argparse
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from itertools import pairwise
from pathlib import Path

import networkx as nx
import numpy as np

from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.best import best_way
from routeplan.streets.cache import cached_network
from routeplan.streets.costs import Prices, prices_of, street_costs
from routeplan.streets.model import Network
from routeplan.streets.others import other_ways
from routeplan.streets.separate import separate_ways
from routeplan.streets.tree import site_tree

SIDE_100K, SIDE_1M = 245, 775  # junctions a side


def made_up_town(side: int, seed: int = 3) -> Network:
    """Return a town of crooked blocks, a tenth of the streets left out."""
    rng = np.random.default_rng(seed)
    step = 0.0015
    x, y = np.meshgrid(np.arange(side), np.arange(side))
    place = np.stack([10.0 + step * x, 50.0 + step * 0.65 * y], axis=-1)
    place += rng.uniform(-0.25, 0.25, place.shape) * [step, 0.65 * step]
    east = np.stack([place[:, :-1], place[:, 1:]], axis=2).reshape(-1, 2, 2)
    north = np.stack([place[:-1], place[1:]], axis=2).reshape(-1, 2, 2)
    ends = np.concatenate([east, north])
    ends = ends[rng.random(len(ends)) < 0.9]
    middle = ends.mean(axis=1) + rng.uniform(-1e-4, 1e-4, (len(ends), 2))
    shapes = np.stack([ends[:, 0], middle, ends[:, 1]], axis=1)
    kinds = np.array(["residential", "tertiary", "secondary", "primary"])
    classes = kinds[rng.choice(4, len(ends), p=[0.7, 0.15, 0.1, 0.05])]
    return assembled(lines_from(list(shapes), road_class=classes.tolist()))


def median_s(act: Callable[[int], object], count: int) -> float:
    """Return the middle time of some calls, each with its number."""
    times = []
    for number in range(count):
        begin = time.perf_counter()
        act(number)
        times.append(time.perf_counter() - begin)
    return statistics.median(times)


def node_sites(network: Network, pairs: np.ndarray) -> list[list[tuple[str, float, float]]]:
    """Return pairs of sites that stand on junctions."""
    return [
        [(f"S{n}", *map(float, network.node_lonlat[node])) for n, node in enumerate(pair)]
        for pair in pairs.tolist()
    ]


def multigraph(network: Network, prices: Prices) -> nx.MultiDiGraph:
    """Return the network as OSMnx keeps one."""
    graph = nx.MultiDiGraph(crs="EPSG:4326")
    for node, (lon, lat) in enumerate(network.node_lonlat.tolist()):
        graph.add_node(node, x=lon, y=lat)
    rows = zip(
        network.edge_start.tolist(),
        network.edge_end.tolist(),
        prices.cost.tolist(),
        strict=True,
    )
    for one, other, cost in rows:
        graph.add_edge(one, other, weight=cost)
        graph.add_edge(other, one, weight=cost)
    return graph


def greedy_pair_cost(graph: nx.Graph, source: int, target: int) -> float:
    """Return what two ways cost when the best one is taken out and the search run again."""
    first = nx.shortest_path(graph, source, target, weight="weight")
    taken = [(a, b, dict(graph.edges[a, b])) for a, b in pairwise(first)]
    total = sum(data["weight"] for _, _, data in taken)
    graph.remove_edges_from([(a, b) for a, b, _ in taken])
    try:
        return float(total + nx.shortest_path_length(graph, source, target, weight="weight"))
    except nx.NetworkXNoPath:
        return float("inf")
    finally:
        graph.add_edges_from(taken)


def compare(network: Network, *, count: int = 9) -> None:
    """Print times and ratios on one network, with answers compared."""
    import osmnx

    prices = prices_of(network, street_costs())
    rng = np.random.default_rng(1)
    joined = nx.Graph()
    joined.add_weighted_edges_from(
        zip(network.edge_start.tolist(), network.edge_end.tolist(), prices.cost.tolist(),
            strict=True)
    )  # fmt: skip
    largest = np.array(sorted(max(nx.connected_components(joined), key=len)))
    pairs = rng.choice(largest, (count, 2))
    sites = node_sites(network, pairs)
    best_way(network, sites[0], prices=prices)
    own_s = median_s(lambda n: best_way(network, sites[n], prices=prices), count)
    graph = multigraph(network, prices)
    osmnx_s = median_s(
        lambda n: osmnx.routing.shortest_path(graph, *pairs[n].tolist(), weight="weight"), count
    )
    plain_s = median_s(lambda n: nx.shortest_path(joined, *pairs[n].tolist(), weight="weight"),
                       count)  # fmt: skip
    for number in range(count):
        wanted = nx.shortest_path_length(joined, *pairs[number].tolist(), weight="weight")
        assert abs(best_way(network, sites[number], prices=prices).cost - wanted) < 1e-6 * wanted
    print(f"best way            {1e3 * own_s:8.1f} ms")
    print(f"  OSMnx             {1e3 * osmnx_s:8.1f} ms   {osmnx_s / own_s:6.1f} times as long")
    print(f"  networkx.Graph    {1e3 * plain_s:8.1f} ms   {plain_s / own_s:6.1f} times as long")
    costs = []
    pair_s = median_s(lambda n: costs.append(separate_ways(network, sites[n], prices=prices)),
                      count)  # fmt: skip
    copied = multigraph(network, prices)

    def remove_and_search_again(number: int) -> None:
        one, other = pairs[number].tolist()
        left = copied.copy()
        way = nx.shortest_path(left, one, other, weight="weight")
        for a, b in pairwise(way):
            left.remove_edges_from([(a, b, key) for key in list(left[a][b])])
            left.remove_edges_from([(b, a, key) for key in list(left[b][a])])
        nx.shortest_path(left, one, other, weight="weight")

    copy_s = median_s(remove_and_search_again, 3)
    greedy = []
    greedy_s = median_s(
        lambda n: greedy.append(greedy_pair_cost(joined, *pairs[n].tolist())), count
    )
    worse = sum(own.cost < other - 1e-6 for own, other in zip(costs, greedy, strict=True))
    assert all(own.cost <= other + 1e-6 for own, other in zip(costs, greedy, strict=True))
    print(f"two separate ways   {1e3 * pair_s:8.1f} ms")
    print(f"  networkx, greedy, on a copy of the graph OSMnx keeps"
          f" {1e3 * copy_s:8.1f} ms   {copy_s / pair_s:6.1f} times as long")  # fmt: skip
    print(f"  the same on a networkx.Graph changed in place {1e3 * greedy_s:8.1f} ms   "
          f"{greedy_s / pair_s:6.1f} times as long, dearer on {worse} of {count}")  # fmt: skip
    begin = time.perf_counter()
    found = other_ways(network, sites[0], prices=prices, count=3)
    print(f"three ways          {1e3 * (time.perf_counter() - begin):8.1f} ms   "
          f"{len(found.ways)} found")  # fmt: skip
    many = node_sites(network, rng.choice(largest, (1, 7)))[0]
    begin = time.perf_counter()
    tree = site_tree(network, many, prices=prices)
    print(f"tree of 7 sites     {1e3 * (time.perf_counter() - begin):8.1f} ms   "
          f"exact: {tree.is_exact}")  # fmt: skip


SCRIPT = """
import sys
import numpy as np
import networkx as nx
held = np.load(sys.argv[1])
place, start, end = held["node_lonlat"], held["edge_start"], held["edge_end"]
cost = held["length_m"]
graph = nx.Graph()
graph.add_weighted_edges_from(zip(start.tolist(), end.tolist(), cost.tolist()))
def nearest(text):
    return int(((place - np.array(text.split(","), float)) ** 2).sum(axis=1).argmin())
way = nx.shortest_path(graph, nearest(sys.argv[2]), nearest(sys.argv[3]), weight="weight")
first, shape = held["shape_first"], held["shape_lonlat"]
print(place[way].tolist()[:1])
"""


def one_shot(folder: Path, network: Network) -> None:
    """Compare the whole command, geometry only, with the same as a networkx script."""
    source = folder / "town.geojson"
    source.write_text('{"type":"FeatureCollection","features":[]}', "utf-8")
    from routeplan.streets.cache import cache_path
    from routeplan.streets.reading import StreetSource, options_of

    places = StreetSource(streets=(source,))
    cached_network([source], options_of(places), lambda: network)
    sites = [",".join(f"{value:.7f}" for value in network.node_lonlat[node])
             for node in (3, len(network.node_lonlat) - 3)]  # fmt: skip
    own = [sys.executable, "-m", "routeplan", "route", *sites, "--streets", str(source),
           "--out", str(folder / "way.geojson"), "--no-plan", "--no-map", "--force"]  # fmt: skip
    other = [sys.executable, "-c", SCRIPT, str(cache_path(source)), *sites]
    times: dict[str, list[float]] = {"own": [], "networkx": []}
    for _ in range(6):  # in turn, so that whatever else the machine does meets both
        for name, command in (("own", own), ("networkx", other)):
            begin = time.perf_counter()
            subprocess.run(command, check=True, capture_output=True)
            times[name].append(time.perf_counter() - begin)
    own_s, other_s = (statistics.median(times[name][1:]) for name in ("own", "networkx"))
    print(f"one-shot command    {1e3 * own_s:8.1f} ms")
    print(f"  networkx script   {1e3 * other_s:8.1f} ms   "
          f"ratio {own_s / other_s:.2f}")  # fmt: skip


def from_cache(folder: Path, network: Network) -> None:
    """Print how long a kept network takes to load, and to search."""
    source = folder / "large.geojson"
    source.write_text("{}", "utf-8")
    cached_network([source], [], lambda: network)

    def refuse() -> Network:
        raise AssertionError

    load_s = median_s(lambda _: cached_network([source], [], refuse), 3)
    prices = prices_of(network, street_costs())
    sites = node_sites(network, np.array([[3, len(network.node_lonlat) - 3]]))[0]
    way_s = median_s(lambda _: best_way(network, sites, prices=prices), 3)
    pair_s = median_s(lambda _: separate_ways(network, sites, prices=prices), 3)
    print(f"load {load_s:.2f} s, best way {way_s:.2f} s, two separate ways {pair_s:.2f} s")


def main() -> None:
    """Run the benchmarks."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--large", action="store_true", help="a million edges as well")
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        town = made_up_town(SIDE_100K)
        print(f"{len(town.length_m)} edges")
        compare(town)
        one_shot(folder, town)
        if arguments.large:
            large = made_up_town(SIDE_1M)
            print(f"{len(large.length_m)} edges")
            from_cache(folder, large)


if __name__ == "__main__":
    main()
