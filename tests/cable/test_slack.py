"""Spare cable: the fewest and most even loops, and everything else exactly once."""

from __future__ import annotations

from itertools import combinations, pairwise

import pytest

from routeplan.cable.slack import Step, slack_steps
from routeplan.cable.way import Way
from routeplan.run.model import Line, Place
from tests.cable.test_way import at, stretch, way_of
from tests.drawn_runs import declared, make_line, straight


def steps_of(
    *lines: Line, places: tuple[Place, ...] = (), toml: str = ""
) -> tuple[list[Step], list[str]]:
    way = way_of(*lines, places=places, toml=toml)
    return _steps(way, toml)


def _steps(way: Way, toml: str) -> tuple[list[Step], list[str]]:
    practice = declared(toml).practice
    assert practice is not None
    steps, warnings = slack_steps(way, slack=practice.slack)
    return list(steps), [f"{where}: {text}" for where, text in warnings]


def shown(steps: list[Step], *kinds: str) -> list[tuple[str, float, float]]:
    return [
        (step.kind, round(step.chain_mm / 1000, 1), step.sheath_mm / 1000)
        for step in steps
        if not kinds or step.kind in kinds
    ]


EVERY_100 = "[slack]\nloop_every_m = { duct = 100.0 }\nloop_m = { duct = 15.0 }\n"


# ------------------------------------------------------------------ loops


def best_loops(start: int, end: int, spots: list[tuple[int, int]], every: int) -> list[int]:
    """Return by brute force where loops go: least excess, fewest, most even, least keys."""

    def score(chosen: tuple[tuple[int, int], ...]) -> tuple[int, int, int, int]:
        gaps = [b - a for a, b in pairwise([start, *(c for c, _ in chosen), end])]
        excess = sum(max(0, gap - every) for gap in gaps)
        return excess, len(chosen), sum(g * g for g in gaps), sum(key for _, key in chosen)

    subsets = [c for size in range(len(spots) + 1) for c in combinations(spots, size)]
    return [chain for chain, _ in min(subsets, key=score)]


@pytest.mark.parametrize("seed", range(60))
def test_loops_are_the_fewest_and_most_even(seed: int) -> None:
    """On small random stretches the loops are those of brute force over all choices."""
    import random

    rng = random.Random(seed)
    length_m = rng.choice([95, 100, 101, 250, 480])
    places = tuple(
        at("handhole", rng.randrange(0, length_m + 1), f"HH {k}") for k in range(rng.randrange(9))
    )
    way = way_of(stretch("duct", 0, length_m), places=places, toml=EVERY_100)
    steps, warnings = _steps(way, EVERY_100)
    free = {s.chain_mm: s.tie_key for s in reversed(way.spots) if s.kind != "assumed"}
    inner = [(c, k) for c, k in sorted(free.items()) if 0 < c < way.length_mm]
    expected = best_loops(0, way.length_mm, inner, 100_000)
    assert [step.chain_mm for step in steps if step.kind == "loop"] == expected
    widest = max(b - a for a, b in pairwise([0, *expected, way.length_mm]))
    assert bool(warnings) == (widest > 100_000)
    if widest > 100_000:
        assert f"{widest / 1000:.0f} m without a reach point" in warnings[0]


def test_loops_keep_the_spacing_along_each_run_of_one_placement() -> None:
    """Each run has its own spacing and size; a run shorter than its spacing has no loop."""
    toml = (
        "[slack]\nloop_every_m = { aerial = 120.0, duct = 150.0 }\n"
        "loop_m = { aerial = 30.0, duct = 15.0 }\nriser_m = 0.0"
    )
    places = tuple(at("pole" if 200 < x < 400 else "handhole", x) for x in range(10, 800, 20))
    steps, warnings = steps_of(
        stretch("duct", 0, 200),
        stretch("aerial", 200, 400),
        stretch("duct", 400, 500),
        stretch("buried", 500, 800),
        places=places,
        toml=toml,
    )
    assert not warnings
    assert len(steps) == 2
    assert shown(steps)[0][2] == 15.0
    assert 50 <= shown(steps)[0][1] <= 150
    assert shown(steps)[1][2] == 30.0
    assert shown(steps)[1][1] in (290.0, 310.0)


def test_a_declared_loop_counts_as_one() -> None:
    """A declared loop is kept, with its own size, and the others go where it leaves a gap."""
    places = (at("handhole", 30, loop_m=7.5), *(at("handhole", x) for x in (60, 90, 120)))
    steps, _ = steps_of(stretch("duct", 0, 200), places=places, toml=EVERY_100)
    assert shown(steps) == [("loop", 30.0, 7.5), ("loop", 120.0, 15.0)]


def test_a_declared_loop_stays_where_no_loops_are_asked_for() -> None:
    """With an empty loop_every_m only declared loops are stored."""
    toml = "[slack]\nloop_every_m = {}"
    places = (at("handhole", 30, loop_m=7.5), at("handhole", 60))
    steps, warnings = steps_of(stretch("duct", 0, 5000), places=places, toml=toml)
    assert shown(steps) == [("loop", 30.0, 7.5)]
    assert not warnings


def test_no_loop_where_none_is_said() -> None:
    """A place with loop_m = 0 takes no loop, not even of another point at the same station."""
    places = (
        at("handhole", 100, "No", loop_m=0.0),
        at("cabinet", 100, "Same station"),
        at("handhole", 130, "Next"),
    )
    steps, _ = steps_of(stretch("duct", 0, 200), places=places, toml=EVERY_100)
    assert [(s.name, round(s.chain_mm / 1000)) for s in steps] == [("Next", 130)]


def test_only_unfit_places_leave_a_warning_with_a_remedy() -> None:
    """Where every place says no, the gap is told of, with its length and what to do."""
    places = tuple(at("handhole", x, loop_m=0.0) for x in (50, 100, 150))
    steps, warnings = steps_of(stretch("duct", 0, 200), places=places, toml=EVERY_100)
    assert steps == []
    assert "duct from 0 m to 200 m: 200 m without a reach point" in warnings[0]
    assert "slack.loop_every_m for duct" in warnings[0]


def test_assumed_places_hold_no_loop_but_assumed_poles_do() -> None:
    """A place that was only assumed in a duct holds no loop; a pole at a vertex does."""
    steps, warnings = steps_of(stretch("duct", 0, 900), toml=EVERY_100)
    assert steps == []
    assert len(warnings) == 1
    toml = "[slack]\nloop_every_m = { aerial = 100.0 }\nloop_m = { aerial = 30.0 }"
    steps, warnings = steps_of(make_line(straight(180.0, count=5), "aerial"), toml=toml)
    assert shown(steps) == [("loop", 90.0, 30.0)]
    assert not warnings


def test_the_largest_declared_loop_of_a_station_counts() -> None:
    """Two points at one station store the larger of their loops, under its name."""
    places = (at("handhole", 50, "Small", loop_m=5.0), at("cabinet", 50, "Large", loop_m=9.0))
    steps, _ = steps_of(stretch("duct", 0, 90), places=places, toml=EVERY_100)
    assert [(s.name, s.sheath_mm) for s in steps] == [("Large", 9000)]


# ------------------------------------------------------------------ risers and racking


def test_a_riser_wherever_aerial_meets_another_placement() -> None:
    """Each change between aerial and anything else has one riser; other changes have none."""
    toml = "[slack]\nloop_every_m = {}\ncrossing_loop_m = 0.0\nriser_m = 10.0"
    steps, _ = steps_of(
        stretch("duct", 0, 100),
        stretch("buried", 100, 200),
        stretch("aerial", 200, 300),
        stretch("bridge", 300, 350),
        stretch("aerial", 350, 400),
        stretch("aerial", 400, 500),
        toml=toml,
    )
    assert shown(steps) == [("riser", x, 10.0) for x in (200.0, 300.0, 350.0)]


def test_racking_in_each_maintenance_hole_passed() -> None:
    """Each maintenance hole passed takes its racking once, other kinds and the ends none."""
    toml = "[slack]\nloop_every_m = {}\nracking_m = 3.0"
    places = (
        at("maintenance_hole", 0.0, "At the start"),
        at("maintenance_hole", 50),
        at("handhole", 60),
        at("maintenance_hole", 80),
        at("maintenance_hole", 100, "At the end"),
    )
    steps, _ = steps_of(stretch("duct", 0, 100), places=places, toml=toml)
    assert shown(steps) == [("racking", 50.0, 3.0), ("racking", 80.0, 3.0)]


# ------------------------------------------------------------------ crossings

PLAIN = "[slack]\nloop_every_m = {}\nriser_m = 0.0\ncrossing_loop_m = 10.0"


@pytest.mark.parametrize(
    ("crosses", "count"), [("rail", 2), ("water", 2), ("road", 0), ("power", 0)]
)
def test_a_loop_on_each_side_of_rail_and_water(crosses: str, count: int) -> None:
    """Rail and water crossings have a loop at each edge; roads and power lines have none."""
    places = (at("crossing", 50, crosses=crosses, width_m=8.0),)
    steps, _ = steps_of(stretch("duct", 0, 100), places=places, toml=PLAIN)
    assert shown(steps) == [("loop", 46.0, 10.0), ("loop", 54.0, 10.0)][:count]


def test_a_crossing_without_a_width_has_both_loops_at_its_place() -> None:
    """Both loops of a crossing of unknown width are stored, at its own station."""
    places = (at("crossing", 50, crosses="rail"),)
    steps, _ = steps_of(stretch("duct", 0, 100), places=places, toml=PLAIN)
    assert shown(steps) == [("loop", 50.0, 10.0)] * 2


@pytest.mark.parametrize("placement", ["bridge", "water"])
@pytest.mark.parametrize("station_m", [None, 130.0, 102.0, 98.0])
def test_a_bridge_or_water_counts_once_with_the_crossing_on_it(
    placement: str, station_m: float | None
) -> None:
    """A stretch over or in water has one loop on each side, crossings declared on it or not."""
    places = (
        () if station_m is None else (at("crossing", station_m, crosses="water", width_m=10.0),)
    )
    steps, _ = steps_of(
        stretch("duct", 0, 100),
        stretch(placement, 100, 160),
        stretch("duct", 160, 300),
        places=places,
        toml=PLAIN,
    )
    assert shown(steps) == [("loop", 100.0, 10.0), ("loop", 160.0, 10.0)]


def test_bridge_lines_in_a_row_are_one_bridge() -> None:
    """Two lines of one bridge have two loops together, not four."""
    steps, _ = steps_of(
        stretch("duct", 0, 100),
        stretch("bridge", 100, 130),
        stretch("bridge", 130, 160),
        stretch("duct", 160, 300),
        toml=PLAIN,
    )
    assert shown(steps) == [("loop", 100.0, 10.0), ("loop", 160.0, 10.0)]


def test_a_crossing_wider_than_the_way_stores_at_its_ends() -> None:
    """Edges beyond the ends of a way are brought back to them."""
    places = (at("crossing", 3, crosses="water", width_m=500.0),)
    steps, _ = steps_of(stretch("duct", 0, 100), places=places, toml=PLAIN)
    assert shown(steps) == [("loop", 0.0, 10.0), ("loop", 100.0, 10.0)]


# ------------------------------------------------------------------ existing fibre


def test_nothing_is_stored_on_existing_fibre() -> None:
    """On somebody else's span there are no loops, racking or crossings of ours; a word is said."""
    places = (
        at("handhole", 150, "Theirs", loop_m=12.0),
        at("maintenance_hole", 160),
        at("crossing", 170, crosses="rail", width_m=6.0),
    )
    steps, warnings = steps_of(
        stretch("aerial", 0, 100),
        stretch("existing", 100, 200),
        stretch("aerial", 200, 300),
        places=places,
        toml=PLAIN.replace("riser_m = 0.0", "riser_m = 10.0"),
    )
    assert steps == []
    assert any("Theirs: stands on existing fibre" in text for text in warnings)


def test_steps_come_in_order() -> None:
    """Whatever their kind, steps come in order along the way."""
    places = (at("maintenance_hole", 90), at("crossing", 40, crosses="rail", width_m=6.0))
    steps, _ = steps_of(
        stretch("duct", 0, 100), stretch("aerial", 100, 200), places=places, toml=EVERY_100
    )
    chains = [step.chain_mm for step in steps]
    assert chains == sorted(chains)
    assert {step.kind for step in steps} == {"loop", "racking", "riser"}
