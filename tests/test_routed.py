"""Legs along streets in a run: found when it is planned, remembered, and wrong by name."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from routeplan.errors import InputError
from routeplan.memo import Memo
from routeplan.planning import Plan, assumptions, plan
from routeplan.protection import standbys
from routeplan.route_options import order_of
from routeplan.routed import routed_run
from routeplan.routing import find_ways
from routeplan.run import read_run
from routeplan.sheets.document import plan_document

STEP_LON, STEP_LAT = 0.0045, 0.0027  # about 320 m and 300 m
SITES = {"A": (0.1, 0.1), "B": (4.1, 2.1), "C": (2.1, 1.1)}
STREETS = '[streets]\nfiles = ["town.geojson"]\n'
MAIN = '[[leg]]\nname = "Main"\nfrom = "A"\nto = "B"\n'
STANDBY = '[[leg]]\nname = "Standby"\nseparate_from = "Main"\n'
CIRCUITS = """
[[circuit]]
name = "P"
from = "A"
to = "B"
[[circuit]]
name = "S"
from = "B"
to = "A"
standby_for = "P"
"""


def at(east: float, north: float) -> list[float]:
    """Return a place by its number of blocks from a corner of the town."""
    return [round(10.0 + STEP_LON * east, 9), round(50.0 + STEP_LAT * north, 9)]


def feature(shape: str, coordinates: object, **known: object) -> dict[str, Any]:
    geometry = {"type": shape, "coordinates": coordinates}
    return {"type": "Feature", "properties": known, "geometry": geometry}


def grid() -> list[dict[str, Any]]:
    """Return the streets of a town of four blocks by two, each corner a vertex."""
    rows = [[at(x, y) for x in range(5)] for y in range(3)]
    columns = [[at(x, y) for y in range(3)] for x in range(5)]
    return [
        feature("LineString", line, name=f"Street {number}")
        for number, line in enumerate((*rows, *columns), start=1)
    ]


def two_towns() -> list[dict[str, Any]]:
    """Return two squares that one bridge joins."""
    left, right = ([[at(x, y) for x, y in ring] for ring in (
        [(0, 0), (1, 0), (1, 1), (0, 1), (0, 0)], [(2, 0), (3, 0), (3, 1), (2, 1), (2, 0)],
    )])  # fmt: skip
    bridge = feature("LineString", [at(1, 1), at(2, 1)], name="Weir Bridge", bridge=True)
    return [feature("LineString", left), feature("LineString", right), bridge]


def written(
    folder: Path,
    toml: str,
    *,
    streets: list[dict[str, Any]] | None = None,
    sites: dict[str, tuple[float, float]] | None = None,
    more: tuple[dict[str, Any], ...] = (),
) -> Path:
    """Write a run with its sites and streets; return the run file."""
    folder.mkdir(parents=True, exist_ok=True)
    points = [
        feature("Point", at(*where), name=name, kind="site")
        for name, where in (SITES if sites is None else sites).items()
    ]
    for name, features in (("sites", [*points, *more]), ("town", streets or grid())):
        text = json.dumps({"type": "FeatureCollection", "features": features})
        (folder / f"{name}.geojson").write_text(text, "utf-8")
    file = folder / "run.toml"
    file.write_text('geometry = ["sites.geojson"]\n' + toml, "utf-8")
    return file


@pytest.fixture
def told(tmp_path: Path) -> Callable[..., list[str]]:
    """Return what is said of a run that cannot be planned."""

    def said(toml: str, **given: Any) -> list[str]:
        with pytest.raises(InputError) as caught:
            plan(read_run(written(tmp_path, toml, **given)))
        return [str(problem) for problem in caught.value.problems]

    return said


AB = {name: SITES[name] for name in "AB"}


@pytest.fixture(scope="module")
def pair(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of two separate legs with a circuit that stands by for another."""
    folder = tmp_path_factory.mktemp("pair")
    toml = STREETS + MAIN + STANDBY + CIRCUITS + "[reels]\nput_ups_m = [1000]\n"
    return plan(read_run(written(folder, toml, sites=AB)))


def test_a_run_is_planned_as_the_file_of_the_route_command_is(pair: Plan, tmp_path: Path) -> None:
    """Ways, reach points and joints are those of the same ways from a geometry file."""
    written(tmp_path, "", sites=AB)
    ends = {key: ",".join(map(str, at(*AB[name]))) for key, name in (("start", "A"), ("end", "B"))}
    more = {"no_plan": True, "no_map": True, "separate": "streets"}
    out = tmp_path / "route.geojson"
    given = {**ends, **more, "streets": [str(tmp_path / "town.geojson")], "out": str(out)}
    find_ways(order_of(given))
    toml = tmp_path / "other.toml"
    toml.write_text('geometry = ["route.geojson"]\n[reels]\nput_ups_m = [1000]\n', "utf-8")
    other = plan(read_run(toml))
    assert [leg.name for leg in pair.ground.legs] == ["Main", "Standby"]
    for mine, its in zip(pair.ground.legs, other.ground.legs, strict=True):
        assert (mine.name, mine.length_mm) == (its.name, its.length_mm)
        assert np.array_equal(mine.lonlat, its.lonlat)
        assert [p.place.name for p in mine.points] == [p.place.name for p in its.points]
    places = [(joint.reach_name, joint.lon, joint.lat) for joint in pair.layout.joints]
    assert places == [(joint.reach_name, joint.lon, joint.lat) for joint in other.layout.joints]


def test_what_was_put_there_by_rule_is_called_assumed(pair: Plan) -> None:
    """Joints at such places say so, and the assumptions count them for each leg."""
    joints = [joint for joint in pair.layout.joints if joint.ends]
    assert joints
    assert all(joint.assumed for joint in joints)
    rows = {row.name: row for row in assumptions(pair)}
    for leg in pair.ground.legs:
        row = rows[f"reach points of leg {leg.name}"]
        assert row.value == sum("assumed" in point.place.properties for point in leg.points)
        assert f"placement along leg {leg.name}" in rows
    assert rows["streets.costs"].value == "none given"


def test_a_standby_circuit_takes_the_standby_leg_by_itself(pair: Plan) -> None:
    """Nobody said `via`, and yet no cable carries both; the delays stand side by side."""
    (found,) = standbys(pair.circuits, pair.layout.cables)
    assert (found.main.order.name, found.standby.order.name) == ("P", "S")
    cables = {cable.id: cable.name for cable in pair.layout.cables}
    taken = [{cables[use.cable] for use in circuit.uses} for circuit in pair.circuits]
    assert taken == [{"Main"}, {"Standby"}]
    assert found.shared_cables == ()
    glass_m = {
        cable.name: int(rulers.glass_mm[-1]) / 1000
        for cable, rulers in zip(pair.layout.cables, pair.layout.rulers, strict=True)
    }
    # Light takes about 4.9 us a kilometre of glass; both ends of each way are alike.
    difference_m = abs(glass_m["Main"] - glass_m["Standby"])
    assert found.difference_ns == pytest.approx(difference_m * 4.9, rel=0.01, abs=1)


@pytest.mark.parametrize(
    ("main", "standby", "taken"),
    [
        ('via = ["Standby"]\n', "", [{"Standby"}, {"Main"}]),
        ('via = ["Main"]\n', 'via = ["Main"]\n', [{"Main"}, {"Main"}]),
    ],
)
def test_a_way_of_its_own_is_kept(
    main: str, standby: str, taken: list[set[str]], tmp_path: Path
) -> None:
    """A circuit that says `via` goes there, the other elsewhere; both in one cable is warned of."""
    first, second = CIRCUITS.split("[[circuit]]")[1:]
    toml = f"{STREETS}{MAIN}{STANDBY}[[circuit]]{first}{main}[[circuit]]{second}{standby}"
    planned = plan(read_run(written(tmp_path, toml, sites=AB)))
    cables = {cable.id: cable.name for cable in planned.layout.cables}
    assert [{cables[use.cable] for use in each.uses} for each in planned.circuits] == taken
    (found,) = standbys(planned.circuits, planned.layout.cables)
    assert found.shared_cables == (("Main",) if taken[0] == taken[1] else ())
    warned = any('stands by for "P" but shares' in text for _, text in planned.warnings)
    assert warned == (taken[0] == taken[1])


def test_planning_again_what_was_planned_changes_nothing(pair: Plan) -> None:
    """The run of a plan has its ways among its lines; they are not put there twice."""
    again = plan(pair.run)
    assert len(again.run.lines) == len(pair.run.lines)
    assert plan_document(again) == plan_document(pair)


def test_a_run_without_such_legs_is_left_alone(duct_plan: Plan) -> None:
    """Nothing is read, and the run is the very same."""
    assert routed_run(duct_plan.run).run is duct_plan.run


def test_network_and_ways_are_found_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """With a memo only what changed is found again: another leg, not the network or the first."""
    counts = {"read_network": 0, "best_way": 0}
    for module, name in (("reading", "read_network"), ("best", "best_way")):
        path = f"routeplan.streets.{module}.{name}"
        monkeypatch.setattr(path, _counted(path, name, counts))
    toml = STREETS + MAIN + '[[leg]]\nname = "Spur"\nfrom = "A"\nto = "C"\n'
    run = read_run(written(tmp_path, toml))
    memo = Memo()
    first = plan(run, memo=memo)
    assert counts == {"read_network": 1, "best_way": 2}
    assert plan_document(plan(run, memo=memo)) == plan_document(first)
    assert counts == {"read_network": 1, "best_way": 2}
    moved = [
        replace(each, lon=each.lon + 0.0003) if each.name == "C" else each for each in run.places
    ]
    other = replace(run, places=tuple(moved))
    for _ in range(5):  # longer than a result that nobody asks for is kept
        plan(other, memo=memo)
    assert counts == {"read_network": 1, "best_way": 3}
    plan(run, memo=memo)
    assert counts["read_network"] == 1


def _counted(path: str, name: str, counts: dict[str, int]) -> Callable[..., Any]:
    import importlib

    module, _, own = path.rpartition(".")
    real = getattr(importlib.import_module(module), own)

    def counting(*args: Any, **more: Any) -> Any:
        counts[name] += 1
        return real(*args, **more)

    return counting


def test_every_byte_of_the_streets_counts(tmp_path: Path) -> None:
    """A digest that stayed the same would call two runs one."""
    digests = []
    for number, name in enumerate(("Hill", "Dale")):
        streets = [*grid(), feature("LineString", [at(0, 3), at(1, 3)], name=name)]
        file = written(tmp_path / str(number), STREETS + MAIN, streets=streets)
        digests.append(read_run(file).digest)
    assert digests[0] != digests[1]


def test_a_leg_through_a_site_is_two_legs_and_one_cable(tmp_path: Path) -> None:
    """The site is a node on the way; the cable passes it uncut."""
    toml = STREETS + MAIN + 'through = ["C"]\n'
    planned = plan(read_run(written(tmp_path, toml)))
    assert [leg.name for leg in planned.ground.legs] == ["Main (1)", "Main (2)"]
    assert [cable.name for cable in planned.layout.cables] == ["Main"]


def test_drawn_and_found_legs_meet(tmp_path: Path) -> None:
    """A drawn line goes on where a found way ends."""
    drawn = feature("LineString", [at(4.1, 2.1), at(5, 3)], name="Spur")
    end = feature("Point", at(5, 3), name="D", kind="site")
    toml = STREETS + MAIN + '[[circuit]]\nname = "P"\nfrom = "A"\nto = "D"\n'
    planned = plan(read_run(written(tmp_path, toml, sites=AB, more=(drawn, end))))
    assert {leg.name for leg in planned.ground.legs} == {"Spur", "Main"}
    assert len(planned.circuits[0].uses) == 2 * planned.circuits[0].order.fibre_count


def test_areas_to_avoid_are_avoided(tmp_path: Path) -> None:
    """A way goes round an area of the geometry, of a file, and a price closes a class."""
    ring = [at(1.4, -0.5), at(1.6, -0.5), at(1.6, 1.5), at(1.4, 1.5), at(1.4, -0.5)]
    area = feature("Polygon", [ring], kind="avoid", name="Mire")
    sites = {"A": (0.1, 0.0), "B": (3.9, 0.0)}
    direct = plan(read_run(written(tmp_path / "direct", STREETS + MAIN, sites=sites)))
    round_it = plan(
        read_run(written(tmp_path / "round", STREETS + MAIN, sites=sites, more=(area,)))
    )
    assert direct.ground.legs[0].lonlat[:, 1].max() < at(0, 0.5)[1]
    assert round_it.ground.legs[0].lonlat[:, 1].max() == pytest.approx(at(0, 2)[1])
    folder = tmp_path / "file"
    file = written(folder, STREETS + 'avoid = ["mire.geojson"]\n' + MAIN, sites=sites)
    text = json.dumps({"type": "FeatureCollection", "features": [area]})
    (folder / "mire.geojson").write_text(text, "utf-8")
    by_file = plan(read_run(file))
    assert by_file.ground.legs[0].length_mm == round_it.ground.legs[0].length_mm
    streets = grid()
    streets[0]["properties"]["road_class"] = "primary"
    closed = STREETS + "[streets.costs.road]\nprimary = inf\n" + MAIN
    priced = plan(read_run(written(tmp_path / "priced", closed, sites=sites, streets=streets)))
    assert priced.ground.legs[0].lonlat[:, 1].max() == pytest.approx(at(0, 1)[1])


def test_no_separate_pair_names_the_bridge(told: Callable[..., list[str]]) -> None:
    """The bottleneck is named, under the leg that asks for what there is not."""
    sites = {"A": (0.0, 0.1), "B": (3.0, 0.1)}
    (said,) = told(STREETS + MAIN + STANDBY, streets=two_towns(), sites=sites)
    assert said.startswith('leg "Standby", A to B: there are no two separate ways: every way takes')
    assert 'the bridge "Weir Bridge"' in said


def test_a_bridge_that_has_to_be_shared_is_an_exposure(tmp_path: Path) -> None:
    """Where sharing is allowed both ways take it, and it is listed with its length."""
    sites = {"A": (0.0, 0.1), "B": (3.0, 0.1)}
    toml = STREETS + "share_least = true\n" + MAIN + STANDBY
    file = written(tmp_path, toml, streets=two_towns(), sites=sites)
    (found,) = routed_run(read_run(file)).pairs
    shared = [each for each in found.ways.exposures if each.is_bridge]
    assert [each.kind for each in shared] == ["shared"]
    assert [each.name for each in found.ways.bottlenecks] == ["Weir Bridge"]


def test_all_that_keeps_legs_from_ways_is_said_at_once(told: Callable[..., list[str]]) -> None:
    """No way and no street near: each under its own leg."""
    streets = [*grid(), feature("LineString", [at(8, 8), at(9, 8)])]
    sites = {**SITES, "Isle": (8.5, 8.0), "Far": (20.0, 20.0)}
    toml = STREETS + "".join(
        f'[[leg]]\nname = "{name}"\nfrom = "A"\nto = "{end}"\n'
        for name, end in (("One", "Isle"), ("Two", "Far"))
    )
    said = told(toml, streets=streets, sites=sites)
    assert len(said) == 2
    assert said[0].startswith('leg "One", ')
    assert said[1].startswith('leg "Two", Far: ')


@pytest.mark.parametrize(
    ("toml", "messages"),
    [
        (
            MAIN,
            [
                "run.toml, streets: names no streets, but legs are to be found along them "
                '("Main"). Name the streets, for example [streets] files = ["streets.geojson"].'
            ],
        ),
        (
            STREETS + '[[leg]]\nname = "Main"\nfrom = "A"\nto = "Bee"\n',
            [
                'run.toml, leg "Main", to: is not a site that stands in the geometry as a point '
                '("Bee", one of A, B, C).'
            ],
        ),
        (
            STREETS + '[[leg]]\nname = "Main"\nfrom = "A"\n',
            ['run.toml, leg "Main": does not say to. Name the sites where it begins and ends.'],
        ),
        (
            STREETS + MAIN + 'through = ["A"]\n',
            [
                'run.toml, leg "Main": meets one site more than once ("A"). '
                "Make a leg of its own of each part."
            ],
        ),
        (
            STREETS + MAIN + '[[leg]]\nname = "S"\nseparate_from = "Mian"\n',
            [
                'run.toml, leg "S", separate_from: is not another leg that is found along streets '
                '("Mian", only Main). Did you mean "Main"?'
            ],
        ),
        (
            STREETS + MAIN + STANDBY + 'from = "C"\n',
            [
                'run.toml, leg "Standby", from: is not that of the leg it is kept separate from '
                '("C", limit "A"). Two separate ways run between the same two sites, in one '
                "direction."
            ],
        ),
        (
            STREETS + MAIN + STANDBY + '[[leg]]\nname = "T"\nseparate_from = "Standby"\n',
            [
                'run.toml, leg "T", separate_from: is a leg that is kept separate from another '
                'itself ("Standby"). Name the main leg of the two.'
            ],
        ),
        (
            STREETS + MAIN + MAIN,
            ['run.toml, leg "Main": stands 2 times. Give every leg its own name.'],
        ),
        (
            STREETS + MAIN + 'way = "rails"\n',
            [
                'run.toml, leg "Main", way: is not one of the values it can take ("rails", only '
                "streets)."
            ],
        ),
        (
            '[streets]\nfiles = ["twon.geojson"]\n' + MAIN,
            ["twon.geojson: is not there. It is looked for in {folder}."],
        ),
        (
            "[streets]\n" + MAIN,
            [
                "run.toml, streets.files: is missing.",
                'run.toml, streets: names no streets, but legs are to be found along them '
                '("Main"). Name the streets, for example [streets] files = ["streets.geojson"].',
            ],
        ),
        (
            STREETS + "costs = { road.primry = 2.0 }\n" + MAIN,
            [
                'streets, cost "road.primry": is not a known price. '
                'Did you mean "road.primary"?'
            ],
        ),
    ],
)  # fmt: skip
def test_what_contradicts_itself_is_said(
    toml: str, messages: list[str], told: Callable[..., list[str]], tmp_path: Path
) -> None:
    """Each with its key, the value, what could stand there and the remedy."""
    assert told(toml) == [message.format(folder=tmp_path) for message in messages]


def test_streets_without_legs_are_said_to_play_no_part(tmp_path: Path) -> None:
    """Nothing that was declared is left out in silence."""
    drawn = feature("LineString", [at(0.1, 0.1), at(4.1, 2.1)])
    run = read_run(written(tmp_path, STREETS, sites=AB, more=(drawn,)))
    assert (
        "run.toml, streets",
        "plays no part: no leg is to be found along streets",
    ) in run.warnings
