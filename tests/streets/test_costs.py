"""Prices: the table, changes of it, crossings, placements, areas; and how near a line runs."""

from __future__ import annotations

import math

import numpy as np
import pytest

from routeplan.errors import InputError
from routeplan.streets.assemble import assembled, lines_from
from routeplan.streets.bends import bend_counts
from routeplan.streets.best import best_way
from routeplan.streets.costs import Zones, class_of, cost_words, prices_of, street_costs
from routeplan.streets.inside import inside_ratios, near_ratios
from routeplan.streets.model import Network

NAMES = ("residential", "primary_link", "track", "no such class")


def streets(**more: object) -> Network:
    """Return four streets side by side, a thousandth of a degree long."""
    shapes = [np.array([[10.0, 50.0 + k / 1000], [10.001, 50.0 + k / 1000]]) for k in range(4)]
    return assembled(lines_from(shapes, road_class=NAMES, **more))  # type: ignore[arg-type]


def test_a_metre_costs_what_the_table_says() -> None:
    """Each edge costs its length times the price of its class and placement."""
    network, costs = streets(), street_costs()
    prices = prices_of(network, costs)
    wanted = [costs.road["residential"] * costs.placement["duct"],
              costs.road["primary"] * costs.placement["duct"],
              costs.road["track"] * costs.placement["buried"],
              costs.road["street"] * costs.placement["duct"]]  # fmt: skip
    assert prices.per_m == pytest.approx(wanted)
    assert prices.cost == pytest.approx(np.array(wanted) * network.length_m)
    aerial = prices_of(network, street_costs(placement="aerial"))
    assert aerial.per_m[2] == pytest.approx(costs.road["track"] * costs.placement["aerial"])


def test_bridges_tunnels_and_existing_routes_have_their_own() -> None:
    """A bridge and a tunnel multiply the price; a route that is there replaces it."""
    costs = street_costs()
    network = streets(is_bridge=[True, False, False, False], is_tunnel=[False, True, False, False],
                      placement=["", "", "", "aerial"])  # fmt: skip
    per_m = prices_of(network, costs).per_m
    assert per_m[0] == pytest.approx(costs.bridge_factor)
    assert per_m[1] == pytest.approx(costs.road["primary"] * costs.tunnel_factor)
    assert per_m[3] == costs.existing["aerial"]


@pytest.mark.parametrize("kind", ["rail", "water", "motorway"])
def test_crossings_are_paid_once(kind: str) -> None:
    """A crossing costs its price, a share of it on a bridge; two tracks side by side cost one."""
    shape = np.array([[10.0, 50.0], [10.001, 50.0]])
    tracks = [
        (kind, np.array([[10.0005 + k * 6e-5, 49.999], [10.0005 + k * 6e-5, 50.001]]))
        for k in (0, 1)
    ]
    costs = street_costs({f"crossing.{kind}": 500.0})
    for is_bridge, each in ((False, 500.0), (True, 500.0 * costs.on_structure_ratio)):
        lines = lines_from([shape], road_class=["street"], is_bridge=[is_bridge])
        network = assembled(lines, obstacles=tracks)
        prices = prices_of(network, costs)
        metres = prices.per_m[0] * network.length_m[0]
        assert prices.cost[0] - metres == pytest.approx(each)
        way = best_way(network, [("A", 10.0, 50.0), ("B", 10.001, 50.0)], prices=prices)
        assert [crossing.kind for crossing in way.crossings] == [kind]
        assert way.cost == pytest.approx(prices.cost[0])
        part = best_way(network, [("A", 10.0, 50.0), ("B", 10.0004, 50.0)], prices=prices)
        assert part.crossings == ()
        assert part.cost == pytest.approx(prices.per_m[0] * part.length_m, rel=1e-6)


def test_a_crossing_on_a_junction_is_one() -> None:
    """Where the rail line passes a junction, going across costs one crossing, listed once."""
    shapes = [np.array([[10.0, 50.0], [10.001, 50.0]]), np.array([[10.001, 50.0], [10.002, 50.0]])]
    rail = ("rail", np.array([[10.001, 49.999], [10.001, 50.0], [10.001, 50.001]]))
    network = assembled(lines_from(shapes, road_class=["street"] * 2), obstacles=[rail])
    prices = prices_of(network, street_costs())
    way = best_way(network, [("A", 10.0, 50.0), ("B", 10.002, 50.0)], prices=prices)
    assert len(way.crossings) == 1
    assert way.cost - way.length_m == pytest.approx(street_costs().crossing["rail"])


def test_a_dear_crossing_is_gone_round() -> None:
    """The way takes the longer street if that saves more than a crossing costs."""
    straight = np.array([[10.0, 50.0], [10.002, 50.0]])
    round_it = np.array([[10.0, 50.0], [10.001, 50.0006], [10.002, 50.0]])
    rail = ("rail", np.array([[10.001, 49.999], [10.001, 50.0003]]))
    network = assembled(lines_from([straight, round_it], road_class=["street"] * 2),
                        obstacles=[rail])  # fmt: skip
    sites = [("A", 10.0, 50.0), ("B", 10.002, 50.0)]
    dear = best_way(network, sites, prices=prices_of(network, street_costs()))
    cheap = best_way(network, sites, prices=prices_of(network, street_costs({"crossing.rail": 1})))
    assert dear.crossings == ()
    assert len(cheap.crossings) == 1
    assert cheap.length_m < dear.length_m


def box(west: float, south: float, east: float, north: float) -> tuple[np.ndarray, ...]:
    return (np.array([[west, south], [east, south], [east, north], [west, north], [west, south]]),)


def test_areas_close_or_make_dear() -> None:
    """Ground to avoid closes what it touches, or makes the share inside so much dearer."""
    network = streets()
    half = box(10.0005, 49.9995, 10.002, 50.0005)
    assert inside_ratios(network, [half]) == pytest.approx([0.5, 0, 0, 0], abs=1e-9)
    closed = prices_of(network, street_costs(), zones=Zones(avoid=(half,)))
    assert np.isinf(closed.cost).tolist() == [True, False, False, False]
    usual = prices_of(network, street_costs())
    dear = prices_of(network, street_costs({"avoid_factor": 5.0}), zones=Zones(avoid=(half,)))
    assert dear.cost / usual.cost == pytest.approx([3.0, 1, 1, 1])
    kept = prices_of(network, street_costs(), zones=Zones(keep_to=(half,)))
    assert np.isinf(kept.cost).all()
    wide = Zones(keep_to=(box(9.9, 49.9, 10.1, 50.0015),))
    assert np.isinf(prices_of(network, street_costs(), zones=wide).cost).tolist() == [
        False, False, True, True,
    ]  # fmt: skip


def test_a_border_along_a_street_does_not_close_it() -> None:
    """A street that an area only touches is outside it."""
    network = streets()
    touching = box(10.0, 49.9, 10.001, 50.0)
    assert inside_ratios(network, [touching]) == pytest.approx([0, 0, 0, 0])


def test_shares_near_a_line() -> None:
    """Half a street lies near a line that runs along half of it."""
    network = streets()
    line = np.array([[10.0, 50.0001], [10.0005, 50.0001]])
    ratios = near_ratios(network, line, near_m=15.0)
    assert ratios == pytest.approx([0.64, 0, 0, 0], abs=0.02)


def test_bends_inside_a_street_are_counted() -> None:
    """Turns at vertices count from the stated angle."""
    shape = np.array([[0.0, 0.0], [0.001, 0.0], [0.001, 0.001], [0.002, 0.0015]])
    network = assembled(lines_from([shape], road_class=["street"]))
    assert bend_counts(network, sharp_deg=60.0).tolist() == [2.0]
    assert bend_counts(network, sharp_deg=80.0).tolist() == [1.0]
    assert bend_counts(network, sharp_deg=100.0).tolist() == [0.0]
    priced = prices_of(network, street_costs({"sharp_bend_each": 10.0}))
    plain = prices_of(network, street_costs())
    assert priced.cost[0] - plain.cost[0] == pytest.approx(20.0)


def test_classes_find_their_price() -> None:
    """A slip road is priced as the road it serves, what is unknown as a street."""
    known = street_costs().road
    assert class_of("Trunk_Link", known) == "trunk"
    assert class_of("", known) == class_of("via ferrata", known) == "street"


def test_all_faults_of_prices_are_told_together() -> None:
    """Unknown names, words for numbers and negative prices come in one error."""
    with pytest.raises(InputError) as caught:
        street_costs(
            {"road.primry": 1.0, "crossing.rail": -1.0, "bridge_factor": math.nan,
             "off_street_per_m": math.inf}, placement="areal",
        )  # fmt: skip
    assert len(caught.value.problems) == 5
    assert 'Did you mean "road.primary"?' in str(caught.value)
    assert 'Did you mean "aerial"?' in str(caught.value)


def test_every_price_can_be_changed() -> None:
    """Each name that is offered is taken, and changes its own price only."""
    usual = street_costs()
    for word in cost_words():
        changed = street_costs({word: 7.25})
        group, dot, name = word.partition(".")
        if dot:
            assert getattr(changed, group)[name] == 7.25
            others = {k: v for k, v in getattr(changed, group).items() if k != name}
            assert others.items() <= getattr(usual, group).items()
        else:
            assert getattr(changed, word) == 7.25
