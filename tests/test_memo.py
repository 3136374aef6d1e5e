"""A memo: the same plans as without one, only sooner, and never more kept than is of use."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pytest

from routeplan.memo import Memo, fingerprint, remembered, swept
from routeplan.planning import plan
from routeplan.run.model import Run
from routeplan.sheets.document import plan_document
from tests.drawn_runs import declared, lonlat, make_line, make_place, make_run

TOML = """
[[circuit]]
name = "Programme"
from = "Studio"
to = "Mast"
wavelengths_nm = [1310, 1550]
"""


def base_run() -> Run:
    """Return a run of three legs that meet at a branch, with points on all of them."""
    lines = (
        make_line(lonlat((0, 0), (40, 900), (0, 1900)), "duct"),
        make_line(lonlat((0, 1900), (30, 3000), (0, 4100)), "aerial"),
        make_line(lonlat((0, 1900), (1500, 1950)), "buried", cable="Spur"),
    )
    places = [
        make_place("site", lonlat((0, 0)), "Studio", role="studio"),
        make_place("site", lonlat((0, 4100)), "Mast", role="transmitter"),
        *(make_place("handhole", lonlat((20, y)), f"HH {y}") for y in (500, 900, 1400)),
        make_place("pole", lonlat((15, 2500)), "P 1"),
    ]
    return make_run(lines, places, toml=TOML)


def with_vertex(run: Run, line: int, vertex: int, north_deg: float) -> Run:
    """Return the run with one vertex moved."""
    old = run.lines[line]
    moved = old.lonlat.copy()
    moved[vertex, 1] += north_deg
    new = replace(old, lonlat=moved, datum_lonlat=moved)
    return replace(run, lines=(*run.lines[:line], new, *run.lines[line + 1 :]))


def with_place(run: Run, number: int, **changes: Any) -> Run:
    """Return the run with one place changed."""
    new = replace(run.places[number], **changes)
    return replace(run, places=(*run.places[:number], new, *run.places[number + 1 :]))


def with_practice(run: Run, part: str, **changes: Any) -> Run:
    """Return the run with house rules changed."""
    new = getattr(run.practice, part).model_copy(update=changes)
    return replace(run, practice=run.practice.model_copy(update={part: new}))


def with_circuit(run: Run) -> Run:
    """Return the run with its circuit on other wavelengths."""
    (order,) = run.circuits
    return replace(run, circuits=(order.model_copy(update={"wavelengths_nm": (1490.0,)}),))


def changed_runs() -> dict[str, Run]:
    """Return the run with one thing changed at a time."""
    run = base_run()
    more = declared("[cable]\nfibre_count = 48").cable
    assert more is not None
    return {
        "vertex": with_vertex(run, 0, 1, 2e-4),
        "vertex of another leg": with_vertex(run, 2, 1, -3e-4),
        "vertex at the branch": with_vertex(run, 0, 2, 1e-6),
        "point moved": with_place(run, 3, lat=run.places[3].lat + 1e-3),
        "point renamed": with_place(run, 3, name="Other"),
        "properties only": with_place(run, 3, properties={"owner": "us"}),
        "loop": with_place(run, 3, loop_m=33.0),
        "slack": with_practice(run, "slack", entry_m=7.0),
        "joining": with_practice(run, "joining", reach_distance_max_m=40.0),
        "loss": with_practice(run, "loss", splice_mean_db=0.2),
        "costs": with_practice(run, "costs", cable_per_m=2.0),
        "cable": replace(run, cable=more),
        "placement": replace(
            run, lines=(replace(run.lines[0], placement="buried"), *run.lines[1:])
        ),
        "title": replace(run, title="Another"),
        "circuit": with_circuit(run),
        "grid": replace(run, crs="EPSG:3035"),
    }


CHANGED = changed_runs()
UNSEEN = ("properties only", "joining")
"""Changes that a plan takes in but no sheet of it shows."""


@pytest.mark.parametrize("change", CHANGED)
def test_a_re_plan_equals_a_fresh_plan(change: str) -> None:
    """Whatever is changed, a plan with the memo of the run before says what a fresh one says."""
    memo = Memo()
    plan(base_run(), memo=memo)
    planned = plan_document(plan(CHANGED[change], memo=memo))
    assert planned == plan_document(plan(CHANGED[change]))
    assert (planned == plan_document(plan(base_run()))) == (change in UNSEEN)
    back = plan_document(plan(base_run(), memo=memo))
    assert back == plan_document(plan(base_run()))


def test_many_changes_in_a_row() -> None:
    """Changes one after another, and back again, never show what was before."""
    memo = Memo()
    runs = [*CHANGED.values(), *reversed(CHANGED.values())]
    for run in runs:
        assert plan_document(plan(run, memo=memo)) == plan_document(plan(run))


def test_only_what_changed_is_laid_again() -> None:
    """Moving a vertex of one leg lays one cable again; the others are the very same."""
    memo = Memo()
    before = plan(base_run(), memo=memo)
    after = plan(with_vertex(base_run(), 2, 1, -3e-4), memo=memo)
    same = [old is new for old, new in zip(before.laid, after.laid, strict=True)]
    assert same == [True, True, False]
    assert plan(with_circuit(base_run()), memo=memo).ground is before.ground


def test_memory_stays_bounded() -> None:
    """A long drag keeps the results of the last few plans only."""
    memo = Memo()
    sizes = []
    for step in range(30):
        plan(with_vertex(base_run(), 0, 1, step * 1e-6), memo=memo)
        sizes.append((len(memo.results), len(memo.prints)))
    assert sizes[29] == sizes[10]


def test_what_a_plan_used_lately_is_kept() -> None:
    """A result is kept while one of the last three plans used it, then forgotten."""
    memo = Memo()
    calls: list[str] = []

    def compute(name: str) -> str:
        calls.append(name)
        return name

    remembered(memo, ("a",), lambda: compute("a"))
    for _ in range(3):
        swept(memo)
        remembered(memo, ("b",), lambda: compute("b"))
    assert calls == ["a", "b"]
    remembered(memo, ("a",), lambda: compute("a"))
    assert calls == ["a", "b"]
    for _ in range(4):
        swept(memo)
    remembered(memo, ("a",), lambda: compute("a"))
    assert calls == ["a", "b", "a"]


def test_without_a_memo_everything_is_computed() -> None:
    """None computes each time."""
    calls: list[int] = []
    for _ in range(2):
        remembered(None, ("a",), lambda: calls.append(1))
    swept(None)
    assert len(calls) == 2


# ------------------------------------------------------------------ fingerprints


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Thing:
    name: str
    values: Any


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Other:
    name: str
    values: Any


def test_equal_inputs_have_equal_fingerprints() -> None:
    """Arrays by content, mappings whatever their order, frozen things by their fields."""
    one = _Thing(name="a", values={"x": np.arange(3), "y": [1, None, "b"]})
    other = _Thing(name="a", values={"y": (1, None, "b"), "x": np.arange(3)})
    assert fingerprint(one) == fingerprint(other)
    assert hash(fingerprint(one)) == hash(fingerprint(other))
    memo = Memo()
    assert fingerprint(one, memo) == fingerprint(other, memo) == fingerprint(one)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        (np.arange(3), np.arange(4)),
        (np.arange(4), np.arange(4).reshape(2, 2)),
        (np.zeros(2), np.zeros(2, dtype=np.float32)),
        (np.array([0.0]), np.array([5e-324])),
        (_Thing(name="a", values=1), _Thing(name="a", values=2)),
        (_Thing(name="a", values=1), _Other(name="a", values=1)),
        (declared("").cable, declared("[cable]\nfibre_count = 12").cable),
        ({"a": 1}, {"a": 2}),
        (("ab", "c"), ("a", "bc")),
    ],
)
def test_different_inputs_have_different_fingerprints(one: object, other: object) -> None:
    """Anything that differs, in shape, kind or content, differs in its fingerprint."""
    assert fingerprint(one) != fingerprint(other)


def test_a_thing_without_a_fingerprint_is_refused() -> None:
    """What has no content to go by is refused, not confused with another."""
    with pytest.raises(TypeError, match="no fingerprint of object"):
        fingerprint(object())


def test_the_identity_of_a_forgotten_thing_is_not_reused() -> None:
    """A fingerprint kept by identity keeps its thing alive, so that no other takes its place."""
    memo = Memo()
    for number in range(1000):
        assert fingerprint(_Thing(name=str(number), values=()), memo) == (
            "_Thing",
            str(number),
            (),
        )
