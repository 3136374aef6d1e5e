"""Where joints are put and what they cost there: kept off crossings, dearer at some places."""

from __future__ import annotations

import pytest

from routeplan.cable.layout import lay_cables
from routeplan.ground.legs import lay_ground
from routeplan.planning import plan
from tests.drawn_runs import lonlat, make_line, make_place, make_run

HOLES = {"Far": 400, "Near": 480, "Edge": 500, "Behind": 560}


def fitness(keep_off_m: float | None) -> dict[str, str]:
    """Return how fit the handholes are on both sides of a bridge of 40 m and a railway."""
    lines = [
        make_line(lonlat((0, 0), (0, 500)), "duct"),
        make_line(lonlat((0, 500), (0, 540)), "bridge"),
        make_line(lonlat((0, 540), (0, 1000)), "duct"),
    ]
    places = [make_place("handhole", lonlat((0, at))[0], name) for name, at in HOLES.items()]
    places += [
        make_place("crossing", lonlat((0, 800))[0], "Rail", crosses="rail", width_m=20.0),
        make_place("handhole", lonlat((0, 815))[0], "By the rail"),
    ]
    toml = "[joints]\nassumed_spacing_m = 2000\n"
    toml += "" if keep_off_m is None else f"keep_off_m = {keep_off_m}\n"
    run = make_run(lines, places, toml=toml)
    (cable,) = lay_cables(run, lay_ground(run))
    return {spot.name: spot.fitness for spot in cable.way.spots if spot.place}


@pytest.mark.parametrize(
    ("keep_off_m", "unfit"),
    [
        (None, set()),
        (0.0, set()),
        (4.0, {"Edge"}),
        (19.0, {"Edge", "By the rail"}),
        (22.0, {"Edge", "Near", "Behind", "By the rail"}),
        (150.0, {"Far", "Near", "Edge", "Behind", "By the rail"}),
    ],
)
def test_joints_are_kept_off(keep_off_m: float | None, unfit: set[str]) -> None:
    """No joint is put nearer to a bridge or a crossing than the run allows; by default it may."""
    found = fitness(keep_off_m)
    assert {name for name, fit in found.items() if fit == "no"} == unfit


def test_no_place_is_assumed_there_either() -> None:
    """Places are assumed farther from the bridge as well."""
    lines = [
        make_line(lonlat((0, 0), (0, 500)), "duct"),
        make_line(lonlat((0, 500), (0, 540)), "bridge"),
        make_line(lonlat((0, 540), (0, 1000)), "duct"),
    ]
    for keep_off_m in (0.0, 60.0):
        toml = f"[joints]\nassumed_spacing_m = 40\nkeep_off_m = {keep_off_m}\n"
        run = make_run(lines, toml=toml)
        (cable,) = lay_cables(run, lay_ground(run))
        off_mm = round(1000 * keep_off_m)
        chains = [spot.chain_mm for spot in cable.way.spots]
        assert len(chains) > 10
        near = [at for at in chains if 500_100 - off_mm < at < 539_900 + off_mm]
        assert not near


def test_a_kind_of_place_may_cost_more() -> None:
    """A cabinet that costs three times as much loses to a handhole a little farther on."""
    places = [
        make_place("site", lonlat((0, 0))[0], "A"),
        make_place("site", lonlat((0, 900))[0], "B"),
        make_place("cabinet", lonlat((0, 450))[0], "Cabinet"),
        make_place("handhole", lonlat((0, 500))[0], "Hole"),
    ]
    line = make_line(lonlat((0, 0), (0, 900)), "duct")
    head = "[reels]\nput_ups_m = [500, 600]\n[joints]\nassumed_spacing_m = 2000\n"
    chosen = {}
    for more in ("", "cost_factor_by_kind = { cabinet = 3.0 }\n"):
        (joint,) = plan(make_run([line], places, toml=head + more)).layout.joints
        chosen[more] = (joint.reach_name, joint.cost_cents)
    assert [name for name, _ in chosen.values()] == ["Cabinet", "Hole"]
    assert len({cents for _, cents in chosen.values()}) == 1
