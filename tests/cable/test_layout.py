"""Cables laid out and put together: sections, joints, reels, limits and what is said of them."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations, pairwise, product
from math import inf

import pytest

from routeplan.cable.assembly import fewer_joints, put_together
from routeplan.cable.layout import LaidCable, lay_cables
from routeplan.cable.model import Layout
from routeplan.cable.reel_models import needed_mm, reel_for
from routeplan.cable.reels import cheapest_layout
from routeplan.errors import InfeasibleError, RunFileError
from routeplan.ground.legs import lay_ground
from routeplan.run.model import Line, Place, Run
from tests.cable.test_way import at, stretch
from tests.drawn_runs import lonlat, make_line, make_place, make_run, straight
from tests.random_runs import random_run


def laid_out(run: Run) -> tuple[Layout, tuple[LaidCable, ...]]:
    ground = lay_ground(run)
    laid = lay_cables(run, ground)
    return put_together(run, ground, laid), laid


def layout_of(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> Layout:
    return laid_out(make_run(lines, places, toml=toml))[0]


def messages(*lines: Line, places: tuple[Place, ...] = (), toml: str = "") -> list[str]:
    with pytest.raises(InfeasibleError) as caught:
        layout_of(*lines, places=places, toml=toml)
    return [str(problem) for problem in caught.value.problems]


SHORT = "[reels]\nput_ups_m = [400]\n"


# ------------------------------------------------------------------ random runs


@pytest.fixture(scope="module")
def many() -> list[tuple[Run, Layout, tuple[LaidCable, ...]]]:
    """Return five hundred random runs laid out."""
    found = []
    for seed in range(7000, 7540):
        run = random_run(seed)
        try:
            found.append((run, *laid_out(run)))
        except InfeasibleError:
            continue
    assert len(found) > 450
    return found


def test_sections_add_up_to_the_cable(
    many: list[tuple[Run, Layout, tuple[LaidCable, ...]]],
) -> None:
    """Sheath and glass of the sections are those of the ruler's end, existing fibre's set apart."""
    joined = 0
    for _, layout, (laid,) in many:
        theirs = [s for s in laid.way.stretches if s.placement == "existing"]
        existing_mm = sum(
            s.end_mm - s.start_mm if s.existing_m is None else int(s.existing_m * 1000 + 0.5)
            for s in theirs
        )
        (rulers,) = layout.rulers
        assert sum(s.sheath_mm for s in layout.sections) == rulers.sheath_mm[-1]
        assert sum(s.glass_mm for s in layout.sections) + existing_mm == rulers.glass_mm[-1]
        joined += len(layout.joints)
        for one, other in pairwise(layout.sections):
            assert one.end_sheath_mm == other.start_sheath_mm
            if one.end_chain_mm == other.start_chain_mm:
                assert one.end_glass_mm == other.start_glass_mm
                assert one.end == other.start
    assert joined > 300


def test_needed_is_the_sheath_and_the_allowance(
    many: list[tuple[Run, Layout, tuple[LaidCable, ...]]],
) -> None:
    """Needed is sheath x (1 + ratio), rounded up; its reel is no shorter and serves it alone."""
    for run, layout, _ in many:
        ratio = run.practice.slack.ordering_ratio
        reels = {reel.id: reel for reel in layout.reels}
        assert len(layout.cuts) == len(layout.sections) == len(reels)
        for section, cut in zip(layout.sections, layout.cuts, strict=True):
            assert cut.section == section.id
            assert section.needed_mm == pytest.approx(section.sheath_mm * (1 + ratio), abs=1)
            assert section.needed_mm >= section.sheath_mm * (1 + ratio) - 1e-6
            assert reels[cut.reel].length_mm >= section.needed_mm


def test_cost_is_reels_and_joints(many: list[tuple[Run, Layout, tuple[LaidCable, ...]]]) -> None:
    """The layout's cost is that of its reels and joints, by the prices of the run."""
    for run, layout, (laid,) in many:
        costs = run.practice.costs
        for reel in layout.reels:
            price = costs.cable_per_m * reel.length_mm / 10 + costs.reel_each * 100
            assert reel.cost_cents == pytest.approx(price, abs=0.51)
        spots = {(s.chain_mm, s.name): s for s in laid.way.spots}
        for joint in layout.joints:
            spot = spots.get((joint.mark.chain_mm, joint.reach_name))
            fixed = any(joint.mark.chain_mm in (s.start_mm, s.end_mm) for s in laid.spans)
            factor = spot.cost_factor if spot else 1.0
            if spot and spot.fitness == "avoid" and not fixed:
                factor *= costs.avoid_factor
            splices = costs.splice_each * run.cable.fibre_count
            assert joint.cost_cents == pytest.approx(
                100 * (costs.joint_each * factor + splices), abs=1.01
            )
        total = sum(r.cost_cents for r in layout.reels) + sum(j.cost_cents for j in layout.joints)
        assert layout.proof.cost_cents == total == layout.proof.lower_bound_cents
        assert layout.proof.optimal


def test_joints_stand_at_fit_places_only(
    many: list[tuple[Run, Layout, tuple[LaidCable, ...]]],
) -> None:
    """No joint on a bridge, in water, on a crossing, inside existing fibre or at an unfit place."""
    for _, layout, (laid,) in many:
        fixed = {mm for span in laid.spans for mm in (span.start_mm, span.end_mm)}
        for joint in layout.joints:
            mm = joint.mark.chain_mm
            if mm in fixed:
                continue
            assert any(s.chain_mm == mm and s.fitness != "no" for s in laid.way.spots)
            inside = [s.placement for s in laid.way.stretches if s.start_mm < mm < s.end_mm]
            assert not {"bridge", "water", "existing"} & set(inside)
            assert not any(c.start_mm <= mm <= c.end_mm for c in laid.way.crossings)


def test_limits_on_sections_hold(many: list[tuple[Run, Layout, tuple[LaidCable, ...]]]) -> None:
    """A section that touches a placement needs no more than that placement's limit."""
    touched = 0
    for run, layout, (laid,) in many:
        limits = run.practice.joints.max_section_m
        for section, s in product(layout.sections, laid.way.stretches):
            most_m = limits.get(s.placement)  # type: ignore[call-overload]
            low, high = section.start_chain_mm, section.end_chain_mm
            if most_m is not None and max(low, s.start_mm) < min(high, s.end_mm):
                assert section.needed_mm <= most_m * 1000
                touched += 1
    assert touched > 50


def test_numbers_run_along_the_cable(
    many: list[tuple[Run, Layout, tuple[LaidCable, ...]]],
) -> None:
    """Sections S1..., reels R1... and joints J1... are numbered in order along the run."""
    for _, layout, _ in many:
        assert [s.id for s in layout.sections] == [f"S{k + 1}" for k in range(len(layout.sections))]
        assert [r.id for r in layout.reels] == [f"R{k + 1}" for k in range(len(layout.reels))]
        assert [j.id for j in layout.joints] == [f"J{k + 1}" for k in range(len(layout.joints))]
        chains = [joint.mark.chain_mm for joint in layout.joints]
        assert chains == sorted(chains)
        for joint in layout.joints:
            sides = [end.side for end in joint.ends]
            assert sides in (["end", "start"], ["end"], ["start"])


# ------------------------------------------------------------------ small ones by hand


def test_one_reel_needs_no_joint() -> None:
    """A short way is one section from site to site."""
    layout = layout_of(stretch("duct", 0, 300))
    assert [(s.start, s.end) for s in layout.sections] == [("A", "B")]
    assert layout.joints == ()
    # 300 m x 1.01 and 20 m at each end, 2 % more ordered
    assert layout.sections[0].sheath_mm == 343_000
    assert layout.sections[0].needed_mm == 349_860


def test_a_joint_at_a_handhole() -> None:
    """With reels of 400 m a way of 600 m has one joint, at the only place that will do."""
    places = (at("handhole", 290), at("handhole", 100))
    layout = layout_of(stretch("duct", 0, 600), places=places, toml=SHORT)
    (joint,) = layout.joints
    assert (joint.reach_name, joint.assumed, joint.kind) == ("handhole 290", False, "splice")
    assert [(end.section, end.side) for end in joint.ends] == [("S1", "end"), ("S2", "start")]
    assert [(s.start, s.end) for s in layout.sections] == [("A", "J1"), ("J1", "B")]
    # closure 450 and 24 splices of 18
    assert joint.cost_cents == 45_000 + 24 * 1_800


def test_a_pole_is_avoided_while_it_can_be() -> None:
    """A pole costs five times the closure and is used only where nothing else will do."""
    places = (at("pole", 300), at("handhole", 270))
    layout = layout_of(stretch("duct", 0, 600), places=places, toml=SHORT)
    assert layout.joints[0].reach_name == "handhole 270"
    toml = SHORT + "[joints]\nassumed_spacing_m = 10000"
    alone = layout_of(stretch("duct", 0, 600), places=places[:1], toml=toml)
    assert alone.joints[0].reach_name == "pole 300"
    assert alone.joints[0].cost_cents == 5 * 45_000 + 24 * 1_800


def test_a_site_with_a_joints_name_is_no_joint() -> None:
    """A site named J1 does not put its cable end into joint J1."""
    (start, end) = straight(600.0)
    places = (
        make_place("site", start, "J1"),
        make_place("site", end, "Mast"),
        at("handhole", 290),
    )
    layout = layout_of(stretch("duct", 0, 600), places=places, toml=SHORT)
    (joint,) = layout.joints
    assert len(joint.ends) == 2


def test_existing_fibre_ends_the_section_on_both_sides() -> None:
    """Existing fibre has a joint at each end, is not ordered and is not between sections."""
    layout = layout_of(
        stretch("duct", 0, 100), stretch("existing", 100, 900), stretch("duct", 900, 1000)
    )
    assert [(s.start, s.end) for s in layout.sections] == [("A", "J1"), ("J2", "B")]
    assert [j.ground_mm // 1000 for j in layout.joints] == [100, 900]
    assert [len(j.ends) for j in layout.joints] == [1, 1]
    assert layout.joints[0].reach_name == "Meets existing fibre"


def test_a_cable_that_is_all_existing_has_nothing_to_order() -> None:
    """A leg of somebody else's fibre has no section, joint or reel, and costs nothing."""
    layout = layout_of(stretch("existing", 0, 900, existing_m=950.0))
    assert (layout.sections, layout.joints, layout.reels) == ((), (), ())
    assert layout.proof.cost_cents == 0
    assert layout.rulers[0].glass_mm[-1] == 950_000
    assert layout.rulers[0].sheath_mm[-1] == 0


def test_a_branch_is_one_joint_of_three_ends() -> None:
    """Three cables that meet at a node share one closure, paid once; nothing is spliced yet."""
    lines = (make_line(lonlat((0, 0), (0, 500))), make_line(lonlat((0, 200), (300, 200))))
    handhole = make_place("handhole", lonlat((0, 200)), "HH 7", joint_cost_factor=2.0)
    layout = layout_of(*lines, places=(handhole,))
    (joint,) = layout.joints
    assert joint.reach_name == "HH 7"
    assert joint.node is not None
    assert not joint.assumed
    assert sorted((end.section, end.side) for end in joint.ends) == [
        ("S1", "end"),
        ("S2", "start"),
        ("S3", "start"),
    ]
    assert joint.cost_cents == 2 * 45_000
    tails = [section for section in layout.sections if section.start == joint.id]
    assert all(section.start_sheath_mm == 0 for section in tails)


def test_a_ring_without_a_site_meets_itself() -> None:
    """A closed way without a site has one joint where it begins and ends."""
    ring = make_line(lonlat((0, 0), (100, 0), (100, 100), (0, 0)))
    layout = layout_of(ring)
    (joint,) = layout.joints
    assert [(e.section, e.side) for e in joint.ends] == [("S1", "end"), ("S1", "start")]


# ------------------------------------------------------------------ limits on the count


def test_the_limit_on_joints_holds_for_the_cable_as_a_whole() -> None:
    """Joints of all runs of new cable, and those at existing fibre, count together."""
    toml = (
        "[reels]\nput_ups_m = [350, 2000]\n"
        "[costs]\njoint_each = 1.0\nsplice_each = 0.0\nreel_each = 0.0\n"
    )
    lines = (
        stretch("duct", 0, 600),
        stretch("existing", 600, 700),
        stretch("duct", 700, 1300),
    )
    free = layout_of(*lines, toml=toml)
    assert len(free.joints) == 6
    for most in range(2, len(free.joints) + 1):
        limited = layout_of(*lines, toml=toml + f"[joints]\nmax_count = {most}")
        assert len(limited.joints) <= most
        assert limited.proof.cost_cents >= free.proof.cost_cents
    with pytest.raises(InfeasibleError, match="no layout has fewer than 2 joints"):
        layout_of(*lines, toml=toml + "[joints]\nmax_count = 1")


@pytest.mark.parametrize("seed", range(25))
def test_joints_are_shared_out_at_least_cost(seed: int) -> None:
    """With several runs of new cable the best sharing of the limit is that of all sharings."""
    run = _run_with_existing(seed)
    _, (laid,) = laid_out(run)
    fixed = sum(0 < mm < laid.way.length_mm for s in laid.spans for mm in (s.start_mm, s.end_mm))
    free = [span.best.joint_count for span in laid.spans]
    for left in range(sum(free) + 1):
        joints = run.practice.joints.model_copy(update={"max_count": left + fixed})
        limited = replace(run, practice=run.practice.model_copy(update={"joints": joints}))
        options = []
        for span, count in zip(laid.spans, free, strict=True):
            tried = [
                cheapest_layout(replace(span.problem, joints_most=k)) for k in range(count + 1)
            ]
            options.append([(k, t.cost_cents if t else inf) for k, t in enumerate(tried)])
        best = min(
            (
                sum(c for _, c in chosen)
                for chosen in product(*options)
                if sum(k for k, _ in chosen) <= left
            ),
            default=inf,
        )
        if best == inf:
            with pytest.raises(InfeasibleError, match="no layout has fewer than"):
                laid_out(limited)
            continue
        layout, (cable,) = laid_out(limited)
        assert sum(span.best.cost_cents for span in cable.spans) == best
        assert len(layout.joints) <= left + fixed


def _run_with_existing(seed: int) -> Run:
    import random

    rng = random.Random(seed)
    lines, reached = [], 0
    for number in range(5):
        length = rng.choice([150, 300, 450]) if number % 2 == 0 else 50
        placement = "existing" if number % 2 else "duct"
        lines.append(stretch(placement, reached, reached + length))
        reached += length
    toml = (
        f"[reels]\nput_ups_m = [{rng.choice([180, 220])}, {rng.choice([300, 400, 900])}]\n"
        f"[costs]\njoint_each = {rng.choice([1, 40, 150])}\nsplice_each = 0.0\n"
        f"reel_each = {rng.choice([0, 50])}\n[joints]\nassumed_spacing_m = 70"
    )
    return make_run(lines, toml=toml)


def test_one_joint_fewer_is_the_cheapest_such() -> None:
    """The layout with one joint fewer is the cheapest of all with that count, by trying each."""
    toml = "[reels]\nput_ups_m = [250, 400, 2000]\n[costs]\njoint_each = 1.0\nsplice_each = 0.0"
    run = make_run([stretch("duct", 0, 900)], toml=toml)
    layout, laid = laid_out(run)
    assert len(layout.joints) == 3
    problem = laid[0].spans[0].problem
    end = len(problem.chain_mm) - 1
    costs = []
    for chosen in combinations(range(1, end), 2):
        bought = [
            reel_for(problem.buying, needed_mm(problem, *ends))
            for ends in pairwise((0, *chosen, end))
        ]
        joints = sum(problem.joint_cost_cents[place] for place in chosen)
        costs.append(sum(offer[0] if offer else inf for offer in bought) + joints)
    assert fewer_joints(laid, layout) == (2, min(costs))
    whole, spans = laid_out(make_run([stretch("duct", 0, 100)]))
    assert fewer_joints(spans, whole) is None


# ------------------------------------------------------------------ the infeasible


def test_an_unbridgeable_gap_is_named_with_its_remedy() -> None:
    """A bridge too long for any reel: named are the places on both sides, the cable, the reel."""
    lines = (stretch("duct", 0, 300), stretch("bridge", 300, 900), stretch("duct", 900, 1200))
    places = (at("handhole", 290, "West"), at("handhole", 910, "East"))
    (text,) = messages(*lines, places=places, toml=SHORT)
    assert text.startswith('cable "A - B": ')
    assert "of cable lie between joint places at West (290 m) and East (910 m)" in text
    assert "the longest reel is 400 m" in text
    assert "Allow a joint between them, or a reel of" in text


def test_the_smallest_relaxation_is_enough_and_no_more() -> None:
    """With a reel as long as the message asks the run plans; with a millimetre less it does not."""
    import re

    lines = (stretch("duct", 0, 300), stretch("bridge", 300, 900), stretch("duct", 900, 1200))
    (text,) = messages(*lines, toml=SHORT)
    reel_m = float(re.search(r"or a reel of ([\d .]+) m", text)[1].replace(" ", ""))  # type: ignore[index]
    layout_of(*lines, toml=f"[reels]\nput_ups_m = [400, {reel_m}]")
    messages(*lines, toml=f"[reels]\nput_ups_m = [400, {reel_m - 0.001:.3f}]")


def test_a_limit_of_a_placement_is_named() -> None:
    """Where a placement's own limit forbids every layout, it is named, with what it would need."""
    toml = "[joints]\nmax_section_m = { water = 200.0 }"
    lines = (stretch("duct", 0, 100), stretch("water", 100, 400), stretch("duct", 400, 500))
    (text,) = messages(*lines, toml=toml)
    assert 'a section in "water" may need 200 m at most' in text
    assert "or sections of" in text


def test_every_cable_and_every_run_of_it_is_named() -> None:
    """Two infeasible runs of one cable and one of another are three problems, told at once."""
    first = (
        stretch("bridge", 0, 600),
        stretch("existing", 600, 700),
        stretch("bridge", 700, 1300),
    )
    other = make_line(lonlat((500, 0), (500, 900)), "bridge", name="Other")
    texts = messages(*first, other, toml=SHORT)
    assert len(texts) == 3
    assert sum('cable "Other"' in text for text in texts) == 1


def test_too_few_joints_allowed() -> None:
    """A limit on joints that no layout keeps is named with the least that would do."""
    (text,) = messages(stretch("duct", 0, 2000), toml=SHORT + "[joints]\nmax_count = 3")
    assert "no layout has fewer than 7 joints (7, limit 3)" in text


# ------------------------------------------------------------------ cables and their names


def test_a_named_cable_takes_its_leg() -> None:
    """A cable of the run file that names a leg gives it its make and its name."""
    toml = '[cables.Trunk]\nlegs = ["Hill"]\nfibre_count = 96'
    lines = (
        make_line(lonlat((0, 0), (0, 300)), leg="Hill"),
        make_line(lonlat((0, 300), (0, 600)), leg="Town", cable="Own"),
    )
    layout = layout_of(*lines, toml=toml)
    assert [(c.name, c.make.fibre_count) for c in layout.cables] == [("Trunk", 96), ("Own", 24)]


def test_a_line_names_its_cable() -> None:
    """A line that names a cable of the run file gets that make."""
    toml = "[cables.Trunk]\nfibre_count = 48"
    layout = layout_of(make_line(lonlat((0, 0), (0, 300)), cable="Trunk"), toml=toml)
    assert [(c.name, c.make.fibre_count) for c in layout.cables] == [("Trunk", 48)]


def test_cables_of_one_name_are_told_apart() -> None:
    """One cable name on three legs that meet makes three cables, each named by its leg as well."""
    lines = (
        make_line(lonlat((0, 0), (0, 500)), cable="Main"),
        make_line(lonlat((0, 200), (300, 200)), cable="Main"),
    )
    names = [cable.name for cable in layout_of(*lines).cables]
    assert len(set(names)) == 3
    assert all(name.startswith("Main, ") for name in names)


def test_a_cable_of_an_unknown_leg_is_refused() -> None:
    """A leg name that the geometry does not have is an error that suggests the nearest."""
    toml = '[cables.Trunk]\nlegs = ["Hil"]'
    with pytest.raises(RunFileError) as caught:
        layout_of(make_line(lonlat((0, 0), (0, 300)), leg="Hill"), toml=toml)
    text = str(caught.value)
    assert "cables.Trunk.legs" in text
    assert 'Did you mean "Hill"?' in text
