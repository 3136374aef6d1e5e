"""Other ways: different enough, not too dear, without petty detours, and said when too few."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.errors import InputError
from routeplan.streets.best import best_way
from routeplan.streets.costs import prices_of, street_costs
from routeplan.streets.exposure import near_m_of
from routeplan.streets.model import Network, Way
from routeplan.streets.others import other_ways
from tests.streets.small_networks import random_sites


def share_near(way: Way, other: Way, near_m: float) -> float:
    """Return which share of a way's vertices, each for half its steps, is near another way."""
    steps = np.hypot(*np.diff(way.lonlat * [0.6, 1.0], axis=0).T)
    weights = np.zeros(len(way.lonlat))
    weights[:-1] += steps / 2
    weights[1:] += steps / 2
    near = near_m_of(way.lonlat, other.lonlat, most_m=near_m) <= near_m
    return float(weights[near].sum() / weights.sum())


@pytest.mark.parametrize("name", ["nauru", "helsinki"])
def test_ways_are_different_and_not_too_dear(name: str, request: pytest.FixtureRequest) -> None:
    """The first is the best; each other keeps off every earlier one and within the price."""
    network: Network = request.getfixturevalue(name)
    prices = prices_of(network, street_costs())
    several = 0
    for seed in range(8):
        sites = random_sites(network, 2, 700 + seed)
        found = other_ways(network, sites, prices=prices, count=3, dearer_max_ratio=1.5)
        best = best_way(network, sites, prices=prices)
        assert found.ways[0].cost == pytest.approx(best.cost)
        assert found.wanted_count == 3
        costs = [way.cost for way in found.ways]
        assert costs == sorted(costs)
        assert costs[-1] <= 1.5 * costs[0] + 1e-9
        assert all(ratio <= found.overlap_max_ratio for ratio in found.overlap_ratios)
        for number, way in enumerate(found.ways):
            for earlier in found.ways[:number]:
                near = min(share_near(way, earlier, 30.0), share_near(earlier, way, 30.0))
                assert near <= found.overlap_max_ratio + 0.12  # vertices are coarser than points
        several += len(found.ways) > 1
    assert several >= 4


def test_no_way_goes_over_a_street_twice(helsinki: Network) -> None:
    """No other way uses one street twice, forth and back."""
    prices = prices_of(helsinki, street_costs())
    for seed in range(5):
        sites = random_sites(helsinki, 2, 800 + seed)
        for way in other_ways(helsinki, sites, prices=prices, count=4).ways:
            whole = [p.edge for p in way.parts
                     if p.edge >= 0 and p.length_m == helsinki.length_m[p.edge]]  # fmt: skip
            assert len(whole) == len(set(whole))


def test_ways_through_a_place_all_pass_it(nauru: Network) -> None:
    """Every way goes through the place between its ends."""
    prices = prices_of(nauru, street_costs())
    sites = random_sites(nauru, 3, 12)
    for way in other_ways(nauru, sites, prices=prices, count=2).ways:
        away = np.abs(way.lonlat - np.array(sites[1][1:])).sum(axis=1).min()
        assert away < 1e-6
        assert len(way.via_m) == 3


def test_the_same_every_time(nauru: Network) -> None:
    """The same question has the same answer."""
    prices = prices_of(nauru, street_costs())
    sites = random_sites(nauru, 2, 5)
    one, other = (other_ways(nauru, sites, prices=prices, count=3) for _ in range(2))
    assert [w.lonlat.tolist() for w in one.ways] == [w.lonlat.tolist() for w in other.ways]


def test_numbers_out_of_range_are_told_together(nauru: Network) -> None:
    """A count, an overlap and a price ratio that make no sense are named together."""
    prices = prices_of(nauru, street_costs())
    with pytest.raises(InputError) as caught:
        other_ways(
            nauru, random_sites(nauru, 2, 5), prices=prices, count=0, overlap_max_ratio=1.5,
            dearer_max_ratio=0.5,
        )  # fmt: skip
    assert len(caught.value.problems) == 3
