"""Checks of closures and of makes of cable, on small runs whose answers are plain."""

from __future__ import annotations

import pytest

from routeplan.check import Check
from routeplan.errors import RunFileError
from routeplan.planning import plan
from routeplan.run.defaults import default_value
from tests.drawn_runs import lonlat, make_line, make_place, make_run

LINES = (("duct", 0, 300), ("buried", 300, 900), ("indoor", 900, 930))


def checks(toml: str, *, role: str = "transmitter") -> dict[str, list[Check]]:
    """Return the checks of a run in duct, buried and indoors to a mast, by kind."""
    lines = [make_line(lonlat((0, a), (0, b)), placement) for placement, a, b in LINES]
    places = [
        make_place("site", lonlat((0, 0))[0], "Studio", role="studio"),
        make_place("site", lonlat((0, 930))[0], "Mast", role=role),
        make_place("handhole", lonlat((0, 300))[0], "Hole"),
    ]
    run = make_run(lines, places, toml="[reels]\nput_ups_m = [800]\n" + toml)
    found: dict[str, list[Check]] = {}
    for check in plan(run).checks:
        found.setdefault(check.kind, []).append(check)
    return found


def test_without_a_make_nothing_is_checked() -> None:
    """A cable whose make is not said has no check of it, nor has a closure of unknown size."""
    kinds = {"metal into a mast site", "buried cable can be found", "make for its placements"}
    kinds |= {"outdoor jacket indoors", "closure splices", "closure ports"}
    assert not kinds & checks("").keys()


@pytest.mark.parametrize(
    ("toml", "mast", "found"),
    [
        ('make = "armoured"', "unknown", "fits"),
        ('make = "all-dielectric"', "fits", "unknown"),
        ('make = "all-dielectric"\nlocated = true', "fits", "fits"),
        ('make = "loose tube"', "unknown", "unknown"),
        ('make = "loose tube"\nmetal = true', "unknown", "fits"),
        ("metal = false", "fits", "unknown"),
    ],
)
def test_metal(toml: str, mast: str, found: str) -> None:
    """Metal into a mast site is never said to fit; without metal buried cable is not found."""
    every = checks(f"[cable]\n{toml}\n")
    assert [check.verdict for check in every["metal into a mast site"]] == [mast]
    assert [check.verdict for check in every["buried cable can be found"]] == [found]
    elsewhere = checks(f"[cable]\n{toml}\n", role="studio")
    assert "metal into a mast site" not in elsewhere


def test_an_outdoor_jacket_indoors() -> None:
    """Thirty metres and an entry are more than the house rule, and as much as the run allows."""
    toml = '[cable]\nmake = "loose tube"\n'
    entry_m = float(default_value("slack.entry_m"))  # type: ignore[arg-type]
    (check,) = checks(toml)["outdoor jacket indoors"]
    assert check.value == pytest.approx(30.0 + entry_m, abs=0.02)
    assert (check.limit, check.verdict) == (15.0, "unknown")
    (check,) = checks(toml + f"indoor_max_m = {31 + entry_m}\n")["outdoor jacket indoors"]
    assert check.verdict == "fits"
    assert "outdoor jacket indoors" not in checks('[cable]\nmake = "tight-buffered"\n')


def test_a_make_where_it_does_not_belong() -> None:
    """A cable for buildings is asked about where it lies outdoors; one for outdoors is not."""
    (check,) = checks('[cable]\nmake = "tight-buffered"\n')["make for its placements"]
    assert (check.verdict, "buried, duct" in check.source) == ("unknown", True)
    (check,) = checks('[cable]\nmake = "armoured"\n')["make for its placements"]
    assert check.verdict == "fits"


def test_what_a_closure_holds() -> None:
    """A straight joint of 24 splices and two ends is held against both limits."""
    toml = "[joints]\nclosure_splices_max = {}\nclosure_ports = {}\n"
    every = checks(toml.format(24, 2))
    assert [(c.value, c.verdict) for c in every["closure splices"]] == [(24.0, "fits")]
    assert [(c.value, c.verdict) for c in every["closure ports"]] == [(2.0, "fits")]
    every = checks(toml.format(23, 1))
    assert [c.verdict for c in (*every["closure splices"], *every["closure ports"])] == [
        "fails",
        "fails",
    ]


def test_stranding_comes_with_the_make() -> None:
    """A make brings its own stranding, unless that is given; an unknown make is named."""
    line = make_line(lonlat((0, 0), (0, 100)))
    given = {
        "": 0.012,
        'make = "central tube"': 0.005,
        'make = "central tube"\nglass_over_sheath_ratio = 0.02': 0.02,
    }
    for toml, ratio in given.items():
        run = make_run([line], toml=f"[cable]\n{toml}\n[cables.X]\n")
        assert run.cable.glass_over_sheath_ratio == ratio
        assert run.cables["X"].glass_over_sheath_ratio == ratio
    run = make_run(
        [line], toml='[cable]\nglass_over_sheath_ratio = 0.02\n[cables.X]\nmake = "ribbon"'
    )
    assert run.cables["X"].glass_over_sheath_ratio == 0.01
    with pytest.raises(RunFileError, match="is not a known make of cable"):
        make_run([line], toml='[cable]\nmake = "loose tubes"')
