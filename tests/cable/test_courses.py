"""Cables through several legs: which there are, what they pass, and that passing costs nothing."""

from __future__ import annotations

from dataclasses import replace

import pytest

from routeplan.cable.assembly import put_together
from routeplan.cable.courses import Course, cable_courses
from routeplan.cable.layout import lay_cables
from routeplan.cable.schedule import joint_splice_count
from routeplan.circuits import circuit_fibres
from routeplan.errors import InfeasibleError, InputError, RunFileError
from routeplan.ground.legs import lay_ground
from routeplan.planning import Plan, plan
from routeplan.run.model import Line, Run
from tests.cable.random_plants import random_plant
from tests.drawn_runs import lonlat, make_line, make_place, make_run
from tests.random_runs import random_run, reversed_run

LEGS = {
    "a": ((0, 0), (0, 1000)),
    "b": ((0, 2000), (0, 1000)),
    "c": ((0, 2000), (0, 3000)),
    "spur": ((0, 1000), (900, 1000)),
}


def lines(**cables: str) -> list[Line]:
    """Return the four lines, those named with their cable."""
    return [
        make_line(lonlat(*ends), "duct", leg=name, cable=cables.get(name))
        for name, ends in LEGS.items()
    ]


def run_of(toml: str = "", *, sites: bool = True, **cables: str) -> Run:
    """Return the run with a site at every end and at the far end of b."""
    spots = {"West": (0, 0), "Mid": (0, 2000), "East": (0, 3000), "Side": (900, 1000)}
    places = [make_place("site", lonlat(at)[0], name) for name, at in spots.items()]
    return make_run(lines(**cables), places if sites else [], toml=toml)


def courses(run: Run) -> list[tuple[str, str, list[str]]]:
    """Return each cable's name, its legs with their directions, and the nodes it is entered at."""
    ground = lay_ground(run)
    called = frozenset(str(end) for each in run.circuits for end in (each.from_, each.to))
    found = cable_courses(run, ground, called=called)
    return [(course.cable.name, _legs(course), _entered(course)) for course in found]


def _legs(course: Course) -> str:
    return " ".join(f"{'+' if forward else '-'}{leg.name}" for leg, forward in course.legs)


def _entered(course: Course) -> list[str]:
    return [node.name for node in course.nodes if node.id in course.entered]


def test_a_cable_takes_its_legs_in_order_and_direction() -> None:
    """Direction comes from where legs meet; other legs are cables of their own."""
    assert courses(run_of('[cables.Trunk]\nlegs = ["c", "b", "a"]')) == [
        ("Trunk", "-c +b -a", ["Node 2"]),
        ("spur", "+spur", []),
    ]
    assert courses(run_of('[cables.Trunk]\nlegs = ["a", "b"]')) == [
        ("Trunk", "+a -b", ["Node 2"]),
        ("c", "+c", []),
        ("spur", "+spur", []),
    ]


def test_lines_of_one_cable_are_one_cable_through_nodes_and_sites() -> None:
    """Two legs whose lines name one cable go on through a node, and through a site."""
    assert courses(run_of(a="Main", b="Main", c="Main")) == [
        ("Main", "+a -b +c", ["Node 2"]),
        ("spur", "+spur", []),
    ]


@pytest.mark.parametrize("theirs", [("b",), ("a", "b"), ("a", "b", "spur")])
def test_somebody_elses_cable_ends_ours(theirs: tuple[str, ...]) -> None:
    """Where one of two legs is existing fibre at their node, ours ends; light goes on there."""
    toml = '[[circuit]]\nname = "P"\nfrom = "Side"\nto = "East"\n'
    run = run_of(toml, a="Main", b="Main", c="Main")
    changed = [
        replace(line, placement="existing" if line.leg in theirs else "duct") for line in run.lines
    ]
    existing = replace(run, lines=tuple(changed))
    assert [name for name, _, _ in courses(existing)] == [
        "Main, a",
        "Main, b",
        "Main, c",
        "spur",
    ]
    (circuit,) = plan(existing).circuits
    assert [use.cable for use in circuit.uses if use.strand == 1] == ["C4", "C2", "C3"]


def test_a_site_is_entered_where_a_circuit_ends() -> None:
    """At a site that is passed a cable can be entered only if a circuit begins or ends there."""
    toml = '[[circuit]]\nname = "P"\nfrom = "West"\nto = "Mid"\n'
    found = courses(run_of(toml, a="Main", b="Main", c="Main"))
    assert found[0] == ("Main", "+a -b +c", ["Node 2", "Mid"])


def test_two_cables_on_one_way() -> None:
    """Two named cables take the same leg, each laid by itself; the leg is walked once."""
    toml = '[cables.One]\nlegs = ["a", "spur"]\n[cables.Two]\nlegs = ["a", "b"]\nfibre_count = 96'
    assert courses(run_of(toml)) == [
        ("One", "+a +spur", []),
        ("Two", "+a -b", []),
        ("c", "+c", []),
    ]
    planned = plan(run_of(toml))
    assert [cable.make.fibre_count for cable in planned.layout.cables] == [24, 96, 24]
    assert sum(leg.length_mm for leg in planned.ground.legs) == pytest.approx(3_900_000, abs=20)


def test_a_ring_comes_back_to_its_site() -> None:
    """Lines of one cable round a ring are one cable that begins and ends at one node."""
    corners = [(0, 0), (1000, 0), (1000, 900), (0, 1000)]
    ring = [
        make_line(lonlat(corners[k], corners[(k + 1) % 4]), "duct", leg=f"r{k}", cable="Ring")
        for k in range(4)
    ]
    places = [make_place("site", lonlat(at)[0], f"Site {k}") for k, at in enumerate(corners)]
    assert courses(make_run(ring, places)) == [("Ring", "+r0 +r1 +r2 +r3", [])]


@pytest.mark.parametrize(
    ("legs", "message"),
    [
        ('["a", "bb"]', 'names a leg that the geometry does not have ("bb"'),
        ('["a", "c"]', 'names legs that do not meet end to end ("a", "c")'),
        ('["c", "a", "b"]', 'names legs that do not meet end to end ("c", "a")'),
    ],
)
def test_what_is_wrong_with_legs_is_named(legs: str, message: str) -> None:
    """An unknown leg and a gap between two are named with the cable."""
    with pytest.raises(RunFileError) as caught:
        plan(run_of(f"[cables.Trunk]\nlegs = {legs}"))
    assert f"cables.Trunk.legs: {message}" in str(caught.value)


# ------------------------------------------------------------------ totals


def figures(planned: Plan) -> dict[str, int]:
    """Return every total of a plan that a crew or a buyer would see. [mm, cents]"""
    layout = planned.layout
    return {
        "ground": sum(leg.length_mm for leg in planned.ground.legs),
        "sheath": sum(section.sheath_mm for section in layout.sections),
        "glass": sum(int(rulers.glass_mm[-1]) for rulers in layout.rulers),
        "ordered": sum(reel.length_mm for reel in layout.reels),
        "joints": len(layout.joints),
        "splices": sum(planned.splice_counts.values()),
        "cents": layout.proof.cost_cents,
    }


@pytest.mark.parametrize("seed", range(25))
def test_a_site_passed_changes_nothing(seed: int) -> None:
    """Sites that a cable passes uncut leave every total as it is without them, to a millimetre."""
    run = random_run(seed, with_existing=False)
    toml = '[[circuit]]\nname = "P"\nfrom = "Studio"\nto = "Mast"\n'
    circuits = make_run(run.lines, toml=toml).circuits
    named = [replace(line, cable="Through") for line in run.lines]
    plain = replace(run, lines=tuple(named), circuits=circuits)
    sites = [
        make_place("site", line.lonlat[0], f"Passed {number}")
        for number, line in enumerate(named[1:])
    ]
    try:
        without = plan(plain)
    except InfeasibleError:
        with pytest.raises(InfeasibleError):
            plan(replace(plain, places=(*plain.places, *sites)))
        return
    passing = plan(replace(plain, places=(*plain.places, *sites)))
    assert len(passing.ground.nodes) == 2 + len(sites)
    (cable,) = passing.layout.cables
    assert len(cable.legs) == 1 + len(sites)
    found, expected = figures(passing), figures(without)
    for key in ("ground", "sheath", "glass", "ordered"):
        # Each leg rounds its own length to a millimetre.
        slack_mm = 2 * len(sites) * (1 if key != "ordered" else 10_000)
        assert abs(found[key] - expected[key]) <= slack_mm, key
    assert (found["joints"], found["splices"]) == (expected["joints"], expected["splices"])


def test_a_plant_drawn_the_other_way_has_the_same_totals() -> None:
    """Reversing every line mirrors a plant: the same lengths, joints, splices and cost."""
    compared = 0
    for seed in range(0, 150, 2):
        run = random_plant(seed)
        if any(make.legs for make in run.cables.values()):
            continue
        try:
            there, back = laid_out(run), laid_out(reversed_run(run))
        except InputError:
            continue
        assert there == back, seed
        compared += 1
    assert compared > 30


def laid_out(run: Run) -> dict[str, object]:
    """Return what a plant comes to, whichever way it was drawn."""
    ground = lay_ground(run)
    laid = lay_cables(run, ground)
    fibres = circuit_fibres(ground, laid, run.circuits)
    layout = put_together(run, ground, laid, fibres.uses)
    counts = joint_splice_count(layout.joints, layout.sections, layout.cables, fibres.uses)
    return {
        "cables": sorted(
            (int(each.rulers.sheath_mm[-1]), int(each.rulers.glass_mm[-1])) for each in laid
        ),
        "sections": sorted((each.sheath_mm, each.needed_mm) for each in layout.sections),
        "joints": sorted(
            (each.node is None, len(each.ends), len(each.opened)) for each in layout.joints
        ),
        "splices": sum(counts.values()),
        "cents": layout.proof.cost_cents,
        "changes": fibres.change_count,
    }


# ------------------------------------------------------------------ entering


def test_a_site_beside_a_cable_cuts_only_its_own_fibres() -> None:
    """A circuit to a site that is passed takes two fibres out there; all others pass uncut."""
    toml = (
        '[[circuit]]\nname = "Past"\nfrom = "West"\nto = "East"\n'
        '[[circuit]]\nname = "In"\nfrom = "Mid"\nto = "West"\n'
        '[[circuit]]\nname = "On"\nfrom = "Mid"\nto = "East"\n'
    )
    planned = plan(run_of(toml, a="Main", b="Main", c="Main"))
    (drop,) = (joint for joint in planned.layout.joints if not joint.ends)
    node = planned.ground.node(str(drop.node))
    assert (node.name, planned.splice_counts[drop.id]) == ("Mid", 4)
    costs = planned.run.practice.costs
    assert drop.cost_cents == round(100 * (costs.joint_each + 4 * costs.splice_each))
    uses = {
        name: sorted(use.fibre for use in circuit.uses)
        for circuit in planned.circuits
        for name in [circuit.order.name]
    }
    assert uses == {"Past": [1, 2], "In": [3, 4], "On": [3, 4]}
    glass_m = {
        circuit.order.name: sum(getattr(step, "glass_m", 0.0) for step in circuit.paths[0].steps)
        for circuit in planned.circuits
    }
    assert glass_m["In"] + glass_m["On"] == pytest.approx(glass_m["Past"], abs=1e-6)


def test_entering_takes_a_loop() -> None:
    """Where a cable can be entered a loop is stored, of the length the run file says."""
    toml = '[slack]\nmidspan_loop_m = {}\n[[circuit]]\nname = "In"\nfrom = "Mid"\nto = "West"\n'
    lengths = []
    for loop_m in (0.0, 10.0, 25.5):
        planned = plan(run_of(toml.format(loop_m), a="Main", b="Main", c="Main"))
        lengths.append(int(planned.layout.rulers[0].sheath_mm[-1]))
    # One loop at the branch, one at the site.
    assert [length - lengths[0] for length in lengths] == [0, 20_000, 51_000]


def test_a_named_way_is_kept() -> None:
    """A circuit that names its cables takes them, though another way has less glass."""
    ring = [
        make_line(lonlat((0, 0), (1000, 0)), "duct", leg="short", cable="Short"),
        make_line(lonlat((0, 0), (500, 900), (1000, 0)), "duct", leg="long", cable="Long"),
    ]
    places = [make_place("site", lonlat(at)[0], n) for n, at in (("A", (0, 0)), ("B", (1000, 0)))]
    toml = '[[circuit]]\nname = "P"\nfrom = "A"\nto = "B"\n'
    for more, cable in (("", "Short"), ('via = ["Long"]\nfibres = [7, 3]\n', "Long")):
        planned = plan(make_run(ring, places, toml=toml + more))
        names = {each.id: each.name for each in planned.layout.cables}
        (circuit,) = planned.circuits
        assert {names[use.cable] for use in circuit.uses} == {cable}
        if more:
            assert [use.fibre for use in circuit.uses] == [7, 3]
