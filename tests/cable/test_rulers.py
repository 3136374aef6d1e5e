"""The three rulers: whole millimetres, never falling, invertible, and exact sums of their parts."""

from __future__ import annotations

import numpy as np
import pytest

from routeplan.cable.layout import LaidCable, lay_cables
from routeplan.cable.model import Rulers
from routeplan.cable.rulers import bare_ruler, chain_from_reading, existing_glass_mm, readings
from routeplan.cable.slack import slack_steps
from routeplan.errors import InfeasibleError
from routeplan.ground.legs import lay_ground
from routeplan.run.model import Line, Place
from routeplan.run.practice import Slack
from tests.cable.test_way import at, stretch, way_of
from tests.drawn_runs import declared, make_line, make_run
from tests.random_runs import random_run

BARE = (
    "[cable]\nglass_over_sheath_ratio = 0.0\n[slack]\nloop_every_m = {}\nriser_m = 0.0\n"
    "racking_m = 0.0\ncrossing_loop_m = 0.0\nentry_m = 0.0\n"
)
FLAT = (
    "undulation_ratio = { aerial = 0.0, duct = 0.0, buried = 0.0, surface = 0.0, indoor = 0.0, "
    "bridge = 0.0, water = 0.0 }\n"
)


def laid_cable(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> LaidCable:
    run = make_run(lines, places, toml=toml)
    (laid,) = lay_cables(run, lay_ground(run))
    return laid


def usual_slack() -> Slack:
    practice = declared("").practice
    assert practice is not None
    return practice.slack


def knots(rulers: Rulers) -> list[tuple[int, int, int]]:
    columns = (rulers.chain_mm.tolist(), rulers.sheath_mm.tolist(), rulers.glass_mm.tolist())
    return list(zip(*columns, strict=True))


# ------------------------------------------------------------------ by hand


def test_a_ruler_without_any_slack_is_the_ground() -> None:
    """With every allowance at nothing sheath and glass are the ground, to the millimetre."""
    laid = laid_cable(stretch("duct", 0, 240), toml=BARE + FLAT)
    length = laid.way.length_mm
    assert knots(laid.rulers) == [(0, 0, 0), (length, length, length)]


def test_undulation_entries_and_glass() -> None:
    """240 m of duct: 240 x 1.01 of sheath and 20 m at each end; the glass 1.2 % longer."""
    toml = (
        "[cable]\nglass_over_sheath_ratio = 0.012\n"
        "[slack]\nentry_m = 20.0\nundulation_ratio = { duct = 0.01 }"
    )
    laid = laid_cable(stretch("duct", 0, 240), toml=toml)
    sheath = [sheath for _, sheath, _ in knots(laid.rulers)]
    assert sheath == [0, 20_000, 262_400, 282_400]
    glass = [glass for *_, glass in knots(laid.rulers)]
    assert glass == [0, 20_240, 20_240 + round(242_400 * 1.012), round(282_400 * 1.012)]


def test_a_joint_steps_by_both_tails_and_shares_its_loop() -> None:
    """At a joint the loop is shared half and half and each side has its tail; on a pole its own."""
    toml = (
        BARE
        + FLAT
        + (
            "joint_tail_m = 15.0\npole_tail_m = 22.0\nordering_ratio = 0.0\n"
            "[reels]\nput_ups_m = [200]\n[joints]\nassumed_spacing_m = 1000"
        )
    )
    lines = (stretch("duct", 0, 140),)
    laid = laid_cable(*lines, places=(at("handhole", 70, loop_m=9.001),), toml=toml)
    assert not laid.spans[0].best.joint_count
    toml = toml.replace("[200]", "[100]")
    for kind, tail in (("handhole", 15_000), ("pole", 22_000)):
        laid = laid_cable(*lines, places=(at(kind, 70, loop_m=9.001),), toml=toml)  # type: ignore[arg-type]
        at_joint = [(s, c) for c, s, _ in knots(laid.rulers) if abs(c - 70_000) < 2]
        arrived, splice, left = (sheath for sheath, _ in at_joint)
        assert {splice - arrived, left - splice} == {4_500 + tail, 4_501 + tail}
        assert laid.spans[0].best.sections[0].sheath_mm == splice


def test_the_odd_millimetre_of_a_loop_falls_on_the_same_side_of_the_ground() -> None:
    """A joint's odd millimetre is on the same side of the joint whichever way the run is drawn."""
    toml = BARE + FLAT + "[reels]\nput_ups_m = [110]\n[joints]\nassumed_spacing_m = 1000"
    one = stretch("duct", 0, 140)
    other = one.lonlat[::-1]
    place = at("handhole", 70, loop_m=9.001)
    forward = laid_cable(one, places=(place,), toml=toml)
    backward = laid_cable(make_line(other, "duct"), places=(place,), toml=toml)
    assert len(forward.parted) == 1
    assert [tuple(reversed(p)) for p in forward.parted.values()] == list(backward.parted.values())


def test_existing_fibre_has_no_sheath_and_its_own_glass() -> None:
    """Across an existing span the sheath stands still and the glass grows by existing_m exactly."""
    laid = laid_cable(
        stretch("duct", 0, 100),
        stretch("existing", 100, 300, existing_m=251.2345),
        stretch("duct", 300, 400),
        places=(at("handhole", 170), at("handhole", 201)),
        toml=BARE + "joint_tail_m = 15.0\n",
    )
    rulers = laid.rulers
    low, high = (s.start_mm for s in laid.way.stretches[1:])
    (_, sheath), (_, glass) = readings(rulers, np.array([low, low + 70_000, low + 101_000]))
    arrive, _ = readings(rulers, np.array([high]))
    assert set(sheath.tolist()) == {int(arrive[0][0])}
    (_, (before, _)) = (
        readings(rulers, np.array([high, high]))[0],
        readings(rulers, np.array([high]))[1],
    )
    assert int(before[0]) - int(glass[0]) == 251_235 == existing_glass_mm(laid.way.stretches[1])
    assert glass[1] - glass[0] == pytest.approx(251_234.5 * 70 / 200, abs=2)
    assert [bought.sheath_mm for span in laid.spans for bought in span.best.sections] == [
        101_000 + 15_000,
        101_000 + 15_000,
    ]


def test_a_cable_that_ends_in_existing_fibre_has_no_entry_there() -> None:
    """No cable of ours lies at the far end of somebody else's: the sheath is the sections' sum."""
    laid = laid_cable(
        stretch("duct", 0, 100), stretch("existing", 100, 300), toml="[slack]\nentry_m = 20.0"
    )
    total = sum(b.sheath_mm for span in laid.spans for b in span.best.sections)
    assert total == int(laid.rulers.sheath_mm[-1])
    assert total == 20_000 + 101_000 + 15_000


def test_short_existing_fibre_is_warned_of() -> None:
    """Declared fibre shorter than the ground it crosses is told of."""
    laid = laid_cable(stretch("duct", 0, 100), stretch("existing", 100, 300, existing_m=150.0))
    assert "its existing_m is 150, but the way is 200.0 m" in laid.warnings[0][1]


def test_nothing_moves_when_a_joint_is_put_in() -> None:
    """Every piece between knots keeps its length, whatever is chosen for a joint."""
    toml = "[joints]\nassumed_spacing_m = 60\n[reels]\nput_ups_m = [%d]"
    whole = laid_cable(stretch("duct", 0, 333.3), toml=toml % 500)
    parts = laid_cable(stretch("duct", 0, 333.3), toml=toml % 150)
    assert not whole.parted
    assert parts.parted
    assert (whole.bare.piece_mm == parts.bare.piece_mm).all()
    tails = sum(before + after for before, after in parts.parted.values())
    assert parts.rulers.sheath_mm[-1] == whole.rulers.sheath_mm[-1] + tails


# ------------------------------------------------------------------ thousands of random layouts


@pytest.fixture(scope="module")
def many() -> list[LaidCable]:
    """Return the cables of two thousand random runs that can be laid out."""
    found = []
    for seed in range(2200):
        run = random_run(seed)
        try:
            found.extend(lay_cables(run, lay_ground(run)))
        except InfeasibleError:
            continue
    assert len(found) > 2000
    return found


def stations_of(laid: LaidCable) -> np.ndarray:
    leg = laid.way.legs[0][0]
    rng = np.random.default_rng(laid.way.length_mm)
    anywhere = rng.integers(0, laid.way.length_mm + 1, 20)
    chosen = [leg.ground_mm, laid.rulers.chain_mm, anywhere, [0, 1, laid.way.length_mm - 1]]
    return np.unique(np.clip(np.concatenate(chosen), 0, laid.way.length_mm))


def test_rulers_never_fall(many: list[LaidCable]) -> None:
    """Chain, sheath and glass are whole millimetres that never fall, from 0 to the way's length."""
    for laid in many:
        rulers = laid.rulers
        for ruler in (rulers.chain_mm, rulers.sheath_mm, rulers.glass_mm):
            assert ruler.dtype == np.int64
            assert ruler[0] == 0
            assert (np.diff(ruler) >= 0).all()
        assert rulers.chain_mm[-1] == laid.way.length_mm


def test_rulers_are_invertible_to_a_millimetre(many: list[LaidCable]) -> None:
    """From any station to sheath and glass and back is the same station, to a millimetre."""
    count = 0
    for laid in many:
        rulers, chain = laid.rulers, stations_of(laid)
        sheath, glass = readings(rulers, chain)
        theirs = np.zeros(len(chain), dtype=bool)
        for s in laid.way.stretches:
            if s.placement == "existing":
                theirs |= (s.start_mm <= chain) & (chain <= s.end_mm)
        for reading in sheath:
            back = chain_from_reading(rulers.chain_mm, rulers.sheath_mm, reading)
            assert (np.abs(back - chain)[~theirs] <= 1).all()
        for reading in glass:
            back = chain_from_reading(rulers.chain_mm, rulers.glass_mm, reading)
            assert (np.abs(back - chain) <= 1).all()
        count += len(chain)
    assert count > 40_000


def test_a_reading_within_a_loop_is_at_the_loop(many: list[LaidCable]) -> None:
    """Any reading between the two of one station is that station, exactly."""
    for laid in many[:300]:
        rulers, chain = laid.rulers, stations_of(laid)
        (before, after), _ = readings(rulers, chain)
        stored = after - before > 3
        for share in (0.25, 0.5, 0.75):
            inside = before[stored] + ((after - before)[stored] * share).astype(np.int64)
            back = chain_from_reading(rulers.chain_mm, rulers.sheath_mm, inside)
            assert (back == chain[stored]).all()


def test_readings_are_on_the_line_between_knots(many: list[LaidCable]) -> None:
    """A station between knots reads as the straight line between them, to half a millimetre."""
    for laid in many[:200]:
        rulers, chain = laid.rulers, stations_of(laid)
        between = chain[~np.isin(chain, rulers.chain_mm)]
        for ruler, (before, after) in zip(
            (rulers.sheath_mm, rulers.glass_mm), readings(rulers, between), strict=True
        ):
            low = np.searchsorted(rulers.chain_mm, between, side="right") - 1
            share = (between - rulers.chain_mm[low]) / np.diff(rulers.chain_mm)[low]
            exact = ruler[low] + share * np.diff(ruler)[low]
            assert np.abs(before - exact).max(initial=0.0) <= 0.501
            assert (before == after).all()


def test_sheath_is_ground_undulation_and_stores(many: list[LaidCable]) -> None:
    """The ruler's end is each placement's ground times its undulation, steps, tails and entries."""
    for laid in many:
        ratio = usual_slack().undulation_ratio  # no rule set of the random runs changes it
        laying = sum(
            (s.end_mm - s.start_mm) * (1 + ratio[s.placement])
            for s in laid.way.stretches
            if s.placement != "existing"
        )
        # At a joint its two stored parts hold the steps there; the ends hold the entries.
        stored = int(laid.bare.step_mm.sum()) + sum(
            sum(parts) - int(laid.bare.step_mm[np.searchsorted(laid.bare.chain_mm, at_mm)])
            for at_mm, parts in laid.parted.items()
        )
        pieces = len(laid.bare.piece_mm)
        assert laid.rulers.sheath_mm[-1] == pytest.approx(laying + stored, abs=0.51 * pieces + 1)


def test_bare_ruler_by_itself() -> None:
    """Before joints the ruler reads pieces and steps in order, the ends in the first and last."""
    way = way_of(stretch("duct", 0, 100), places=(at("handhole", 40, loop_m=5.0),))
    slack = usual_slack()
    steps, _ = slack_steps(way, slack=slack)
    bare = bare_ruler(way, steps, slack=slack, end_mm=(20_000, 7_000))
    assert bare.chain_mm.tolist() == [0, way.spots[0].chain_mm, way.length_mm]
    assert bare.step_mm.tolist() == [20_000, 5_000, 7_000]
    assert bare.half_mm.tolist() == [20_000, 2_500, 0]
    assert bare.before_mm.tolist() == [0, 20_000 + bare.piece_mm[0], 25_000 + bare.piece_mm.sum()]
