"""Runs from TOML to plan and document, for tests of what a run file says of light."""

from __future__ import annotations

from functools import cache

from routeplan.errors import InputError
from routeplan.planning import Plan, plan
from routeplan.run.model import Place, Run
from routeplan.sheets.document import plan_document
from tests.drawn_runs import make_line, make_place, make_run, straight
from tests.sheets.plans import Row

STUDIO, HUT, HILL = "Studio", "Hut", "Hill"
HEAD = """
[slack]
loop_every_m = {}
[reels]
buy = ["put-ups"]
put_ups_m = [4000]
[joints]
assumed_spacing_m = 100000
"""
CIRCUIT = '[[circuit]]\nname = "P"\nfrom = "Studio"\nto = "Hill"\n'


def _at(at_m: float) -> object:
    return straight(1.0, start_m=at_m)[0]


def _places(spots: dict[str, float]) -> list[Place]:
    return [make_place("handhole", _at(at_m), name) for name, at_m in spots.items()]  # type: ignore[arg-type]


def straight_run(toml: str, *, length_m: float = 9000.0) -> Run:
    """Return one leg from Studio to Hill with a handhole every kilometre: HH 1, HH 2 ..."""
    spots = {f"HH {k}": 1000.0 * k for k in range(1, int(length_m / 1000.0))}
    sites = [
        make_place("site", _at(0.0), STUDIO),  # type: ignore[arg-type]
        make_place("site", _at(length_m), HILL),  # type: ignore[arg-type]
    ]
    line = make_line(straight(length_m), "duct", name="Way")
    return make_run([line], [*sites, *_places(spots)], toml=toml + HEAD)


def two_leg_run(toml: str, *, hut_is_site: bool = True) -> Run:
    """Return two legs of 3 km, Studio to Hut and Hut to Hill, each with a cable of its own."""
    lines = [
        make_line(straight(3000.0), "duct", name="Near", cable="near"),
        make_line(straight(3000.0, start_m=3000.0), "duct", name="Far", cable="far"),
    ]
    names = {STUDIO: 0.0, HILL: 6000.0} | ({HUT: 3000.0} if hut_is_site else {})
    sites = [make_place("site", _at(at_m), name) for name, at_m in names.items()]  # type: ignore[arg-type]
    return make_run(lines, sites, toml=toml + HEAD + "[cables.near]\n[cables.far]\n")


@cache
def planned(toml: str, length_m: float = 9000.0) -> Plan:
    """Return the plan of a straight run."""
    return plan(straight_run(toml, length_m=length_m))


@cache
def document(toml: str, length_m: float = 9000.0) -> Row:
    """Return what plan.json holds of a straight run."""
    return plan_document(planned(toml, length_m))


def circuit_of(toml: str, length_m: float = 9000.0) -> Row:
    """Return the first circuit of a straight run."""
    found: Row = document(toml, length_m)["circuits"][0]
    return found


def lines_of(circuit: Row) -> dict[str, Row]:
    """Return the lines of a circuit's first budget by item."""
    return {line["item"]: line for line in circuit["budgets"][0]["lines"]}


def checks_of(found: Row, kind: str) -> list[Row]:
    """Return the checks of one kind."""
    return [check for check in found["checks"] if check["kind"] == kind]


def problems_of(run: Run) -> list[str]:
    """Return what keeps a run from being planned."""
    try:
        plan(run)
    except InputError as error:
        return [str(problem) for problem in error.problems]
    return []
