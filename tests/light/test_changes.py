"""What would turn a circuit, how far it stretches, what decides."""

from __future__ import annotations

import re
from dataclasses import replace
from functools import partial

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.light.budget import circuit_budget
from routeplan.light.changes import (
    Circuit,
    deciding_line,
    mending_changes,
    stretch_limit_m,
    stretched,
)
from routeplan.light.interfaces import OpticPair, find_interface
from routeplan.light.model import Glass
from tests.light.small_paths import optic, path, practice


def circuit(
    lengths_m: list[float],
    name: str = "10GBASE-ER",
    *,
    wavelength_nm: float = 1550.0,
    matings: int = 2,
    margin_db: float = 3.0,
) -> Circuit:
    """Return a circuit of two fibres."""
    there = path(lengths_m, matings=matings)
    back = replace(there, direction="to-from", steps=there.steps[::-1])
    return Circuit(
        paths={"from-to": there, "to-from": back},
        pair=find_interface(name, {}),
        wavelengths_nm=(wavelength_nm,),
        practice=practice(margin_db=margin_db),
        measured={},
    )


@settings(max_examples=12, deadline=None)
@given(st.lists(st.floats(2000.0, 6000.0), min_size=4, max_size=6))
def test_the_stretch_limit_just_fits_and_ten_metres_more_fails(lengths_m: list[float]) -> None:
    """Joints held, glass in proportion."""
    link = circuit(lengths_m)
    limit_m = stretch_limit_m(link)
    if limit_m is None:
        assert not link.fits()
        return
    assert link.fits(partial(stretched, more_m=limit_m))
    assert not link.fits(partial(stretched, more_m=limit_m + 10))


def test_stretching_keeps_joints_and_adds_what_it_says() -> None:
    """A path is longer by the metres asked for and otherwise the same."""
    before = path([1000.0, 3000.0])
    after = stretched(before, 500.0)
    glass = [step.glass_m for step in after.steps if isinstance(step, Glass)]
    assert glass == pytest.approx([1125.0, 3375.0])
    assert len(after.steps) == len(before.steps)


def test_a_fitting_circuit_needs_no_change_and_a_failing_one_has_no_stretch() -> None:
    """Suggestions are for failures only."""
    good, bad = circuit([5000.0] * 4), circuit([5000.0] * 10)
    assert good.fits()
    assert mending_changes(good) == ()
    assert not bad.fits()
    assert stretch_limit_m(bad) is None


def test_less_glass_is_the_least_that_would_do() -> None:
    """The metres named mend the circuit; one fewer does not."""
    bad = circuit([5000.0] * 8)
    (text,) = [change.text for change in mending_changes(bad) if change.kind == "length"]
    metres = int(re.match(r"(\d+) m of glass less", text).group(1))  # type: ignore[union-attr]
    assert bad.fits(partial(stretched, more_m=-metres))
    assert not bad.fits(partial(stretched, more_m=-(metres - 1)))


def test_another_class_and_so_another_optic() -> None:
    """27.6 km are too much for 10GBASE-LR; the class for 1550 nm is named as other equipment."""
    found = mending_changes(circuit([4600.0] * 6, "10GBASE-LR", wavelength_nm=1310.0))
    (text,) = [change.text for change in found if change.kind == "interface"]
    assert text.startswith("10GBASE-ER at 1550 nm")
    assert "another optic" in text


def test_connectors_saved_or_bettered_where_that_is_enough() -> None:
    """Six pairs: a better grade would do, and so would the fewest pairs named."""
    bad = circuit([2000.0], "10GBASE-LR", wavelength_nm=1310.0, matings=6)
    kinds = {change.kind: change.text for change in mending_changes(bad)}
    assert "grade" in kinds["connectors"]
    assert kinds["connector pairs"] == "2 connector pairs fewer would do."


def test_nothing_is_suggested_that_would_not_do() -> None:
    """With 79 joints held no single change mends it, so none is named."""
    assert mending_changes(circuit([2000.0] * 80)) == ()


def test_the_deciding_line_is_the_one_that_takes_most() -> None:
    """Fibre decides a long link, connectors a short one."""
    far = circuit_budget(path([5000.0] * 4), 1310.0, practice=practice())
    near = circuit_budget(path([100.0]), 1310.0, practice=practice())
    assert [line.item for line in (deciding_line(far), deciding_line(near)) if line] == [
        "fibre G.652.D",
        "connector pairs",
    ]


def test_an_interface_with_no_rate_gets_no_other_class() -> None:
    """What rate is wanted is not known, so no class is recommended."""
    own = optic(basis="channel", channel_loss_db=3.0)
    bad = replace(
        circuit([5000.0], wavelength_nm=1310.0),
        pair=OpticPair(name="own", at_from=own, at_to=own),
    )
    assert not bad.fits()
    assert "interface" not in {change.kind for change in mending_changes(bad)}
