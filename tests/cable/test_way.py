"""A cable's way: its stretches, crossings, and every spot a joint or a loop could be at."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from routeplan.cable.model import Cable
from routeplan.cable.way import Way, cable_way, is_within, leg_at, positions_on
from routeplan.ground.legs import lay_ground
from routeplan.run.model import Line, Place
from tests.drawn_runs import declared, lonlat, make_line, make_place, make_run, straight
from tests.random_runs import random_run


def way_of(
    *lines: Line, places: tuple[Place, ...] = (), toml: str = "", turned: tuple[bool, ...] = ()
) -> Way:
    """Return the way of one cable over all legs of a run; `turned` takes some of them backwards."""
    run = make_run(lines, places, toml=toml)
    legs = lay_ground(run).legs
    ways = [not flag for flag in turned] or [True] * len(legs)
    make = declared(toml).cable
    assert make is not None
    cable = Cable(
        id="C1",
        name="Cable",
        legs=tuple((leg.id, forward) for leg, forward in zip(legs, ways, strict=True)),
        make=make,
        start="N1",
        end="N2",
    )
    return cable_way(cable, list(zip(legs, ways, strict=True)), practice=run.practice)


def stretch(placement: str, start_m: float, end_m: float, **more: object) -> Line:
    return make_line(straight(end_m - start_m, start_m=start_m), placement, **more)


def at(kind: str, station_m: float, name: str = "", **more: object) -> Place:
    (position,) = straight(station_m)[1:]
    return make_place(kind, position, name or f"{kind} {station_m:g}", **more)  # type: ignore[arg-type]


def chains_m(way: Way, *, kind: str = "", fit: bool = False) -> list[float]:
    return [
        round(spot.chain_mm / 1000, 2)
        for spot in way.spots
        if (not kind or spot.kind == kind) and not (fit and spot.fitness == "no")
    ]


# ------------------------------------------------------------------ assumed places


@pytest.mark.parametrize(
    ("length_m", "expected"),
    [
        (249.0, []),
        (250.0, []),
        (251.0, [125.5]),
        (750.0, [250.0, 500.0]),
        (751.0, [187.75, 375.5, 563.25]),
    ],
)
def test_gaps_are_divided_into_the_fewest_equal_parts(
    length_m: float, expected: list[float]
) -> None:
    """A gap over 250 m gets the fewest places that leave parts no longer, all equal."""
    assert chains_m(way_of(stretch("duct", 0, length_m))) == pytest.approx(expected, abs=0.011)


def test_declared_places_divide_the_gaps_first() -> None:
    """Only the gaps between places fit for a joint are divided; the unfit are passed over."""
    places = (at("handhole", 300, joint="no"), at("cabinet", 400))
    way = way_of(stretch("duct", 0, 1000), places=places)
    assert chains_m(way) == [200.0, 300.0, 400.0, 600.0, 800.0]
    assert [spot.assumed for spot in way.spots] == [True, False, False, True, True]


def test_a_place_to_avoid_is_fit() -> None:
    """A place to avoid is still fit for a joint, and divides a gap."""
    way = way_of(stretch("duct", 0, 400), places=(at("handhole", 200, joint="avoid"),))
    assert chains_m(way) == [200.0]


@pytest.mark.parametrize("placement", ["bridge", "water", "indoor", "existing"])
def test_nothing_is_assumed_where_nobody_can_work(placement: str) -> None:
    """No place is assumed on a bridge, in water, indoors or on existing fibre."""
    way = way_of(
        stretch("duct", 0, 500), stretch(placement, 500, 1500), stretch("duct", 1500, 2000)
    )
    assert chains_m(way) == [250.0, 500.0, 1500.0, 1750.0]
    # 2000 m in parts of 250 m: 500 and 1500 lie on the bounds, where the duct can be got at.


def test_nothing_is_assumed_on_a_crossing() -> None:
    """An equal part that falls on a crossing, its edges included, is left out."""
    brook = at("crossing", 510, crosses="water", width_m=20.0)
    way = way_of(stretch("duct", 0, 1000), places=(brook,))
    assert chains_m(way) == [250.0, 750.0]


def test_poles_are_assumed_at_the_vertices_of_aerial_stretches() -> None:
    """An aerial stretch without poles takes its vertices, its bounds included, as poles."""
    aerial = make_line(straight(200.0, count=5, start_m=100.0), "aerial")
    way = way_of(stretch("duct", 0, 100), aerial, stretch("duct", 300, 400))
    assert chains_m(way, kind="pole") == [100.0, 150.0, 200.0, 250.0, 300.0]
    assert {(s.fitness, s.assumed) for s in way.spots} == {("avoid", True)}


def test_declared_poles_are_not_added_to() -> None:
    """An aerial stretch with a pole takes no vertex as one, but its long gaps are divided."""
    aerial = make_line(straight(600.0, count=13), "aerial")
    way = way_of(aerial, places=(at("pole", 100, "P 1"),))
    assert chains_m(way, kind="pole") == [100.0, 350.0]
    assert [spot.name for spot in way.spots] == ["P 1", "Assumed pole at 350 m"]


def test_vertices_nobody_drew_are_no_poles() -> None:
    """Vertices put into a grid line are nobody's poles."""
    flags = np.array([True, False, True, False, True])
    aerial = make_line(straight(200.0, count=5), "aerial", is_drawn=flags)
    assert chains_m(way_of(aerial)) == [100.0]


@pytest.mark.parametrize("spacing_m", [1.0, 17.0, 60.0, 250.0])
def test_no_gap_is_left_wider_than_the_spacing(spacing_m: float) -> None:
    """On random runs every gap between fit places is within the spacing, save what is forbidden."""
    toml = f"[joints]\nassumed_spacing_m = {spacing_m}"
    for seed in range(30):
        run = random_run(seed, with_existing=False)
        banned = {"bridge", "water", "indoor"}
        way = way_of(*run.lines, places=tuple(p for p in run.places if p.kind != "site"), toml=toml)
        fit = [0, *(s.chain_mm for s in way.spots if s.fitness != "no"), way.length_mm]
        for low, high in pairwise(fit):
            clear = not any(
                s.placement in banned and s.start_mm <= high and low <= s.end_mm
                for s in way.stretches
            ) and not any(c.start_mm <= high and low <= c.end_mm for c in way.crossings)
            if clear:
                assert high - low <= spacing_m * 1000 + 1


# ------------------------------------------------------------------ fitness


def test_defaults_of_fitness() -> None:
    """Poles are avoided, other reach points are fit, unless they say otherwise."""
    places = (at("handhole", 10), at("pole", 20), at("pole", 30, joint="yes"))
    way = way_of(stretch("duct", 0, 40), places=places)
    assert [spot.fitness for spot in way.spots] == ["yes", "avoid", "yes"]


def test_never_on_a_bridge_in_water_or_on_a_crossing() -> None:
    """A reach point there is kept for access but never fit, whatever it says; at the edge it is."""
    places = (
        at("handhole", 100, "Edge"),
        at("handhole", 150, "On", joint="yes"),
        at("handhole", 205, "Between"),
        at("crossing", 300, "Line", crosses="rail", width_m=10.0),
        at("handhole", 305, "Crossing's edge"),
        at("handhole", 306, "Beyond"),
    )
    way = way_of(
        stretch("duct", 0, 100),
        stretch("bridge", 100, 205),
        stretch("water", 205, 220),
        stretch("duct", 220, 330),
        places=places,
    )
    assert {spot.name: spot.fitness for spot in way.spots} == {
        "Edge": "yes",
        "On": "no",
        "Between": "no",
        "Crossing's edge": "no",
        "Beyond": "yes",
    }


def test_an_assumed_pole_on_a_crossing_takes_no_joint() -> None:
    """A vertex of an aerial stretch that stands in a crossing is a pole, but not for a joint."""
    aerial = make_line(straight(200.0, count=5), "aerial")
    road = at("crossing", 100, crosses="road", width_m=6.0)
    way = way_of(aerial, places=(road,))
    assert [(spot.chain_mm // 1000, spot.fitness) for spot in way.spots] == [
        (50, "avoid"),
        (100, "no"),
        (150, "avoid"),
    ]


def test_within_and_on_bounds() -> None:
    """Inside a stretch is within; its bound with another placement is not."""
    way = way_of(stretch("duct", 0, 100), stretch("bridge", 100, 200), stretch("duct", 200, 300))
    bounds = [s.start_mm for s in way.stretches][1:]
    found = is_within(way, [50_000, bounds[0], 150_000, bounds[1], 250_000], frozenset({"bridge"}))
    assert found == [False, False, True, False, False]


# ------------------------------------------------------------------ chains of legs


def test_a_cable_over_two_legs_one_of_them_backwards() -> None:
    """The chain runs on over both legs; stretches, points and crossings come in its order."""
    lines = (
        make_line(lonlat((0, 0), (0, 400)), "duct", leg="One"),
        make_line(lonlat((0, 900), (0, 700), (0, 400)), "aerial", leg="Two"),
    )
    places = (
        make_place("handhole", lonlat((0, 100)), "HH"),
        make_place("pole", lonlat((0, 600)), "P"),
        make_place("crossing", lonlat((0, 500)), "Line", crosses="rail", width_m=10.0),
    )
    way = way_of(*lines, places=places, turned=(False, True))
    assert [(s.placement, round(s.start_mm, -3), round(s.end_mm, -3)) for s in way.stretches] == [
        ("duct", 0, 400_000),
        ("aerial", 400_000, 900_000),
    ]
    assert [(s.name, round(s.chain_mm, -3)) for s in way.spots if not s.assumed] == [
        ("HH", 100_000),
        ("P", 600_000),
    ]
    assert [(c.start_mm + 500) // 1000 for c in way.crossings] == [495]
    leg, ground_mm = leg_at(way, 600_000)
    assert leg.name == "Two"
    assert ground_mm == pytest.approx(300_000, abs=100)
    positions, _ = positions_on(way, np.array([0, 100_000, 400_000, 600_000, way.length_mm]))
    expected = lonlat((0, 0), (0, 100), (0, 400), (0, 600), (0, 900))
    assert positions == pytest.approx(expected, abs=2e-7)


def test_ends_of_the_chain() -> None:
    """The first and the last millimetre lie on the first and the last leg."""
    way = way_of(stretch("duct", 0, 300))
    assert leg_at(way, 0)[1] == 0
    assert leg_at(way, way.length_mm)[1] == way.length_mm
