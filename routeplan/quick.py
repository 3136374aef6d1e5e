"""A budget with no map: so much glass, so many splices and connectors, an optic at each end."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from routeplan.light.budget import circuit_verdict
from routeplan.light.changes import Change, Circuit, mending_changes, stretch_limit_m, stretched
from routeplan.light.circuits import Closing, circuit_budgets, closing_interfaces
from routeplan.light.fittings import panel_mating
from routeplan.light.interfaces import OpticPair, find_interface
from routeplan.light.model import Budget, Direction, Mating, Path, Verdict
from routeplan.light.quick import quick_path
from routeplan.light.years import life_lines, with_years
from routeplan.quick_options import ANY

if TYPE_CHECKING:
    from routeplan.run.defaults import AssumedValue
    from routeplan.run.practice import Interface, Loss

__all__ = ["QuickAnswer", "QuickOrder", "quick_answer"]

_FIGURE = re.compile(r"-?\d+(\.\d+)?")


@dataclass(frozen=True, slots=True, kw_only=True)
class QuickOrder:
    """
    What is asked: the path, what stands at its ends, and the practice it is judged by.

    `joints_from` says where the number of splices comes from, `assumed` what was not said.
    """

    glass_m: float
    sheath_m: float
    splices: int
    joints_from: str
    fibre_type: str
    fibre_count: int
    interface: str | None
    wavelengths_nm: tuple[float, ...]
    practice: Loss
    joint_tail_m: float
    own: Mapping[str, Interface]
    assumed: tuple[AssumedValue, ...]

    @property
    def pair(self) -> OpticPair | None:
        """What stands at the two ends, None where no interface or any is named."""
        if self.interface in (None, ANY):
            return None
        return find_interface(self.interface or "", self.own)


@dataclass(frozen=True, slots=True, kw_only=True)
class QuickAnswer:
    """
    Budgets and verdict; what would mend a failing one, how far a fitting one could be stretched.

    `stretch_ended_by` says what fails a metre on. `closing` holds the interfaces that close where
    any was asked for, least capable first.
    """

    order: QuickOrder
    budgets: tuple[Budget, ...]
    verdict: Verdict
    changes: tuple[Change, ...] = ()
    stretch_m: int | None = None
    stretch_ended_by: str = ""
    closing: tuple[Closing, ...] = ()


def quick_answer(order: QuickOrder) -> QuickAnswer:
    """
    Return budgets and verdict of a path with no map behind it, by the formulas of a plan.

    Parameters
    ----------
    order
        What is asked. With any interface, its wavelengths are those each has to send; none: each
        at its own.

    Raises
    ------
    RangeError
        If a wavelength is outside 1260 to 1625 nm.
    """
    paths = _paths(order)
    if order.interface == ANY:
        return _any_interface(order, paths)
    pair = order.pair
    budgets = circuit_budgets(paths, pair, order.wavelengths_nm, practice=order.practice)
    verdict = circuit_verdict(budgets)
    aged = _with_years(order, paths, budgets)
    answer = QuickAnswer(order=order, budgets=aged, verdict=verdict)
    if pair is None:
        return answer
    circuit = Circuit(
        paths=paths,
        pair=pair,
        wavelengths_nm=order.wavelengths_nm,
        practice=order.practice,
        measured={},
    )
    if verdict == "fails":
        changes = mending_changes(circuit, own=order.own, fibre_count=order.fibre_count)
        return replace(answer, changes=changes)
    stretch_m = stretch_limit_m(circuit)
    ended_by = "" if stretch_m is None else _failure(circuit, stretch_m + 1)
    return replace(answer, stretch_m=stretch_m, stretch_ended_by=ended_by)


def _failure(circuit: Circuit, more_m: int) -> str:
    """Return what is said of a stretched circuit that was not said before; it fails by that."""
    before, after = (
        circuit_budgets(
            {way: stretched(path, length_m) for way, path in circuit.paths.items()},
            circuit.pair,
            circuit.wavelengths_nm,
            practice=circuit.practice,
        )
        for length_m in (more_m - 1, more_m)
    )
    for fitting, failing in zip(before, after, strict=True):
        said = {_FIGURE.sub("", reason) for reason in fitting.reasons}
        for reason in failing.reasons:
            if failing.verdict == "fails" and _FIGURE.sub("", reason) not in said:
                return reason
    return ""


def _paths(order: QuickOrder) -> dict[Direction, Path]:
    path = quick_path(
        order.glass_m,
        fibre_type=order.fibre_type,
        splices=order.splices,
        connector_pairs=order.practice.connector_pairs,
        pigtail_splices=order.practice.pigtail_splices,
    )
    mating = replace(panel_mating(order.practice), where="panel")
    steps = tuple(mating if isinstance(step, Mating) else step for step in path.steps)
    there = replace(path, steps=steps)
    back = replace(path, direction="to-from", steps=steps[::-1])
    return {"from-to": there, "to-from": back}


def _with_years(
    order: QuickOrder, paths: Mapping[Direction, Path], budgets: Sequence[Budget]
) -> tuple[Budget, ...]:
    """Return budgets with the margins of the first day and of the end of life."""
    return tuple(
        with_years(
            budget,
            life_lines(
                paths[budget.direction],
                budget.wavelength_nm,
                practice=order.practice,
                tail_m=order.joint_tail_m,
            ),
        )
        for budget in budgets
    )


def _any_interface(order: QuickOrder, paths: Mapping[Direction, Path]) -> QuickAnswer:
    """Return the interfaces that close; the budgets of the path itself have none."""
    closing = closing_interfaces(
        paths,
        practice=order.practice,
        own=order.own,
        wavelengths_nm=order.wavelengths_nm,
        fibre_count=order.fibre_count,
    )
    from routeplan.run.defaults import default_value

    usual_nm = default_value("circuit.wavelengths_nm")
    assert isinstance(usual_nm, tuple)
    wavelengths_nm = order.wavelengths_nm or tuple(float(nm) for nm in usual_nm)
    budgets = circuit_budgets(paths, None, wavelengths_nm, practice=order.practice)
    return QuickAnswer(
        order=order,
        budgets=_with_years(order, paths, budgets),
        verdict="fits" if closing else "fails",
        closing=closing,
    )
