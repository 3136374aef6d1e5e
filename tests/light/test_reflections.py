"""Return loss as seen from one end."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from routeplan.light.budget import circuit_budget
from routeplan.light.interfaces import find_interface
from routeplan.light.model import Mating, Path
from routeplan.light.reflections import (
    backscatter_return_loss_db,
    combined_return_loss_db,
    fresnel_return_loss_db,
    reflections,
    return_loss_db,
)
from tests.light.small_paths import path, practice


@pytest.mark.parametrize(("index", "expected_db"), [(1.45, 14.72), (1.4682, 14.44), (1.5, 13.98)])
def test_glass_in_air(index: float, expected_db: float) -> None:
    """Fresnel: about 4 % comes back, to the printed digit."""
    assert fresnel_return_loss_db(index) == pytest.approx(expected_db, abs=0.005)


def test_equal_reflections_add_by_power() -> None:
    """Two are 3 dB more, ten are 10 dB more; nothing comes back of nothing."""
    assert combined_return_loss_db([50.0] * 2) == pytest.approx(46.99, abs=0.005)
    assert combined_return_loss_db([50.0] * 10) == pytest.approx(40.0)
    assert combined_return_loss_db([]) is None


def test_backscatter_grows_to_a_limit() -> None:
    """Short glass sends back by its length; long glass no more than its attenuation lets return."""

    def of(glass_m: float) -> float:
        found = backscatter_return_loss_db(glass_m, 0.19, wavelength_nm=1550.0, index=1.4682)
        assert found is not None
        return found

    assert of(10.0) - of(100.0) == pytest.approx(10.0, abs=0.02)
    assert of(80_000.0) == pytest.approx(of(200_000.0), abs=0.15)
    assert 30.0 < of(200_000.0) < 33.0
    # One nanosecond of pulse fills 0.102 m there and back: that much glass is the coefficient.
    assert of(299_792_458e-9 / 2.0 / 1.4682) == pytest.approx(81.5, abs=0.01)
    assert backscatter_return_loss_db(0.0, 0.19, wavelength_nm=1550.0, index=1.4682) is None


@settings(max_examples=40, deadline=None)
@given(st.lists(st.floats(20.0, 65.0), min_size=1, max_size=6), st.floats(100.0, 9000.0))
def test_never_better_than_the_worst_reflection_seen_from_that_end(
    back_db: list[float], glass_m: float
) -> None:
    """The whole is no better than its worst part, from either end."""
    glass = path([glass_m], matings=0, pigtails=0).steps
    pairs = tuple(Mating(where=f"P{i}", return_loss_db=db) for i, db in enumerate(back_db))
    steps = (*pairs[:1], *glass, *pairs[1:])
    for turned in (steps, steps[::-1]):
        whole = Path(circuit="c", direction="from-to", steps=turned)
        found = reflections(whole, 1550.0, practice=practice())
        assert found is not None
        total_db = return_loss_db(found)
        assert total_db is not None
        assert total_db <= min(each.seen_db for each in found) + 1e-9


def test_a_far_reflection_is_seen_through_the_way_there_and_back() -> None:
    """A pair of 30 dB behind 10 km at 1310 nm is 6.6 dB weaker, and 0 dB from its own side."""
    there = Path(
        circuit="c",
        direction="from-to",
        steps=(
            *path([10_000.0], matings=0, pigtails=0).steps,
            Mating(where="far", return_loss_db=30.0),
        ),
    )
    found = reflections(there, 1310.0, practice=practice())
    assert found is not None
    assert found[-1].seen_db == pytest.approx(30.0 + 2.0 * 3.3)
    back = reflections(replace(there, steps=there.steps[::-1]), 1310.0, practice=practice())
    assert back is not None
    assert back[0].seen_db == 30.0


def test_an_unknown_connector_leaves_the_whole_unknown() -> None:
    """No figure is made up: without a return loss for each pair there is none for the circuit."""
    assert return_loss_db(reflections(path([1000.0]), 1310.0, practice=practice())) is None
    assert circuit_budget(path([1000.0]), 1310.0, practice=practice()).return_loss_db is None


def test_an_interface_that_bears_less_fails() -> None:
    """10GBASE-ER needs 21 dB: two open flat ends of 14 dB are too much, angled ones are not."""
    link = find_interface("10GBASE-ER", {}).at_from
    given = {"practice": practice(margin_db=1.0), "optic": link}
    bad = circuit_budget(path([20_000.0]), 1550.0, connector_return_loss_db=14.4, **given)
    good = circuit_budget(path([20_000.0]), 1550.0, connector_return_loss_db=60.0, **given)
    assert bad.verdict == "fails"
    assert any("Return loss" in reason for reason in bad.reasons)
    assert good.return_loss_db is not None
    assert good.verdict == "fits"
    assert 21.0 < good.return_loss_db < 33.0  # what the glass alone sends back
