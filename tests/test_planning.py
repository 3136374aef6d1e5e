"""The whole pipeline: mirrored by a reversed run, exact in its sums, the same again."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Callable
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from routeplan.errors import InfeasibleError, InputError
from routeplan.planning import Plan, assumptions, one_fewer, plan, splices
from routeplan.run.model import Run
from routeplan.run.reading import read_run
from routeplan.sheets.document import plan_document
from tests.drawn_runs import lonlat, make_line, make_place, make_run, straight
from tests.random_runs import random_run, reversed_run

STREETS = Path(__file__).parent / "reference" / "streets"


# ------------------------------------------------------------------ reversal


def mirror_view(planned: Plan, flip: Callable[[int], int]) -> dict[str, Any]:
    """Return what a plan of one leg says, its stations as seen from one end."""
    (leg,), (laid,), layout = planned.ground.legs, planned.laid, planned.layout
    (rulers,) = layout.rulers
    sections = [
        (*sorted((flip(s.start_chain_mm), flip(s.end_chain_mm))), s.sheath_mm, s.glass_mm)
        for s in layout.sections
    ]
    return {
        "vertices": sorted(flip(mm) for mm in leg.ground_mm.tolist()),
        "points": sorted((flip(p.ground_mm), p.place.name) for p in leg.points),
        "spots": sorted((flip(s.chain_mm), s.kind, s.fitness) for s in laid.way.spots),
        "steps": sorted((flip(s.chain_mm), s.sheath_mm, s.kind) for s in laid.steps),
        "joints": sorted((flip(j.mark.chain_mm), j.assumed, j.cost_cents) for j in layout.joints),
        "sections": sorted(sections),
        "needed": Counter(s.needed_mm for s in layout.sections),
        "reels": Counter((r.length_mm, r.source, r.cost_cents) for r in layout.reels),
        "cost": layout.proof,
        "totals": (int(rulers.sheath_mm[-1]), int(rulers.glass_mm[-1]), leg.length_mm),
        "one fewer": one_fewer(planned),
        "grid": (leg.grid_crs, round(leg.grid_m, 6), round(leg.ellipsoid_m, 6)),
        "splices": sum(planned.splice_counts.values()),
    }


def _plan_or_none(run: Run) -> Plan | None:
    try:
        return plan(run)
    except InfeasibleError:
        return None


@settings(max_examples=400, deadline=None, suppress_health_check=list(HealthCheck))
@given(seed=st.integers(0, 10**9))
def test_a_reversed_run_has_the_mirrored_plan(seed: int) -> None:
    """Drawn from the other end, stations, loops, joints, sections, reels and cost are mirrored."""
    run = random_run(seed)
    one, other = _plan_or_none(run), _plan_or_none(reversed_run(run))
    if one is None or other is None:
        assert one is other
        return
    length = one.ground.legs[0].length_mm
    assert mirror_view(other, lambda mm: length - mm) == mirror_view(one, lambda mm: mm)


def test_a_reversed_network_has_the_same_plan() -> None:
    """A branched run drawn the other way orders the same cable, reels and joints."""
    lines = [
        make_line(lonlat((0, 0), (40, 900), (0, 1900)), "duct"),
        make_line(lonlat((0, 1900), (30, 3000.3), (0, 4100)), "aerial"),
        make_line(lonlat((0, 1900), (1500, 1950)), "buried"),
    ]
    places = [
        make_place("site", lonlat((0, 0)), "Studio"),
        make_place("site", lonlat((0, 4100)), "Mast"),
        make_place("handhole", lonlat((20, 1000)), "HH"),
    ]
    run = make_run(lines, places)
    one, other = plan(run).layout, plan(reversed_run(run)).layout
    assert Counter(s.sheath_mm for s in one.sections) == Counter(
        s.sheath_mm for s in other.sections
    )
    assert Counter(r.length_mm for r in one.reels) == Counter(r.length_mm for r in other.reels)
    assert one.proof == other.proof
    assert len(one.joints) == len(other.joints)


# ------------------------------------------------------------------ sums


@pytest.fixture(scope="module")
def documents() -> list[dict[str, Any]]:
    """Return plan.json of two hundred random runs."""
    found = []
    for seed in range(20_000, 20_220):
        try:
            found.append(plan_document(plan(random_run(seed))))
        except InfeasibleError:
            continue
    assert len(found) > 180
    return found


def mm(value_m: float) -> int:
    """Return whole millimetres, and see that there are no others."""
    assert value_m * 1000 == pytest.approx(round(value_m * 1000), abs=1e-3)
    return round(value_m * 1000)


def test_totals_are_exact_sums(documents: list[dict[str, Any]]) -> None:
    """Every total of plan.json is the sum of its parts, to the millimetre and the cent."""
    for document in documents:
        totals = document["totals"]
        assert mm(totals["ground_m"]) == sum(mm(leg["ground_m"]) for leg in document["legs"])
        assert mm(totals["sheath_m"]) == sum(mm(s["sheath_m"]) for s in document["sections"])
        assert mm(totals["sheath_m"]) == sum(mm(c["sheath_m"]) for c in document["cables"])
        assert mm(totals["glass_m"]) == sum(mm(c["glass_m"]) for c in document["cables"])
        assert mm(totals["ordered_m"]) == sum(mm(r["length_m"]) for r in document["reels"])
        assert totals["joint_count"] == len(document["joints"])
        assert totals["splice_count"] == sum(j["splice_count"] for j in document["joints"])
        cents = [
            round(100 * entry["cost"]) for key in ("reels", "joints") for entry in document[key]
        ]
        assert round(100 * totals["cost"]) == sum(cents)
        for reel in document["reels"]:
            assert mm(reel["length_m"]) == mm(reel["used_m"]) + mm(reel["spare_m"])


def test_stations_follow_the_rulers(documents: list[dict[str, Any]]) -> None:
    """Stations rise on all three rulers, from nothing to the cable's ends, each loop a step."""
    loops = 0
    for document in documents:
        (leg,), (cable,), stations = document["legs"], document["cables"], document["stations"]
        assert mm(stations[0]["ground_m"]) == mm(stations[0]["sheath_from_m"]) == 0
        assert stations[-1]["ground_m"] == leg["ground_m"]
        assert stations[-1]["sheath_to_m"] == cable["sheath_m"]
        assert stations[-1]["glass_to_m"] == cable["glass_m"]
        for one, other in pairwise(stations):
            assert one["ground_m"] < other["ground_m"]
            assert one["sheath_to_m"] <= other["sheath_from_m"]
            assert one["glass_to_m"] <= other["glass_from_m"]
        for station in stations:
            assert station["sheath_from_m"] <= station["sheath_to_m"]
            loops += station["kind"] == "loop" and station["sheath_from_m"] < station["sheath_to_m"]
    assert loops > 100


def test_circuit_glass_is_that_of_its_cable(documents: list[dict[str, Any]]) -> None:
    """A circuit from end to end has the glass of the cable, existing spans and all."""
    for document in documents:
        (cable,) = document["cables"]
        for circuit in document["circuits"]:
            assert mm(circuit["glass_m"]) == mm(cable["glass_m"])


def test_ground_is_the_geodesic_and_the_heights() -> None:
    """The ground length of a random level run is what GeographicLib measures."""
    for seed in range(40):
        run = random_run(seed)
        if any(line.heights_m is not None for line in run.lines):
            continue
        try:
            planned = plan(run)
        except InfeasibleError:
            continue
        true_m = sum(
            Geodesic.WGS84.Inverse(a[1], a[0], b[1], b[0])["s12"]
            for line in run.lines
            for a, b in pairwise(line.lonlat.tolist())
        )
        assert planned.ground.legs[0].length_mm == pytest.approx(1000 * true_m, abs=0.6)


# ------------------------------------------------------------------ bare files


def test_a_bare_road_plans_and_lists_what_it_assumes() -> None:
    """A real road with no properties plans from A to B; every assumption is listed."""
    planned = plan(read_run(STREETS / "helsinki_road.geojson"))
    assert [node.name for node in planned.ground.nodes] == ["A", "B"]
    assert planned.layout.sections
    assert planned.verdict == "unknown"
    names = [entry.name for entry in assumptions(planned)]
    assert {"site A", "site B", "slack.entry_m", "placement"} <= set(names)
    assert any(name.startswith("heights of leg") for name in names)
    assert len(names) == len(set(names))


def test_the_same_run_gives_the_same_plan() -> None:
    """Planning twice gives equal documents."""
    run = random_run(11)
    assert json.dumps(plan_document(plan(run))) == json.dumps(plan_document(plan(run)))


def test_nothing_of_the_run_is_changed() -> None:
    """Planning leaves the arrays of a run as they were."""
    run = random_run(12)
    before = [(line.lonlat.copy(), line.datum_lonlat.copy()) for line in run.lines]
    plan(run)
    for line, (lonlat_before, datum_before) in zip(run.lines, before, strict=True):
        assert (line.lonlat == lonlat_before).all()
        assert (line.datum_lonlat == datum_before).all()


# ------------------------------------------------------------------ circuits


def test_without_a_circuit_one_is_taken_over_the_longest_leg() -> None:
    """With no circuit given there is one of two fibres at 1310 and 1550 nm, its verdict unknown."""
    (circuit,) = plan(make_run([make_line(straight(5000.0))])).circuits
    assert (circuit.order.from_, circuit.order.to) == ("A", "B")
    assert circuit.order.fibre_count == 2
    assert circuit.order.wavelengths_nm == (1310, 1550)
    assert circuit.verdict == "unknown"


def test_a_ring_without_sites_has_no_circuit_and_says_so() -> None:
    """Where the longest leg joins no two sites, no circuit is invented."""
    ring = make_line(lonlat((0, 0), (100, 0), (100, 100), (0, 0)))
    planned = plan(make_run([ring]))
    assert planned.circuits == ()
    assert any("does not join two sites" in text for _, text in planned.warnings)


def test_a_circuit_without_ends_on_a_ring_is_an_error() -> None:
    """A circuit that names no ends needs a leg between two sites."""
    ring = make_line(lonlat((0, 0), (100, 0), (100, 100), (0, 0)))
    toml = '[[circuit]]\nname = "Programme"\nwavelengths_nm = [1310]'
    with pytest.raises(InputError, match="Give from and to"):
        plan(make_run([ring], toml=toml))


def test_splices_of_a_plan_count_up() -> None:
    """The schedule holds as many splices as the joints are said to have."""
    toml = "[reels]\nput_ups_m = [1000]"
    planned = plan(make_run([make_line(straight(3000.0))], toml=toml))
    rows = Counter(row.joint for row in splices(planned) if row.kind == "splice")
    assert rows == Counter(planned.splice_counts)
    assert sum(rows.values()) == 24 * len(planned.layout.joints) > 0


def test_every_problem_of_the_ground_comes_at_once() -> None:
    """A site and a reach point far off are told together."""
    places = [
        make_place("site", lonlat((900, 0)), "Far"),
        make_place("handhole", lonlat((900, 0)), "HH"),
    ]
    with pytest.raises(InputError) as caught:
        plan(make_run([make_line(straight(500.0))], places))
    assert len(caught.value.problems) == 2
