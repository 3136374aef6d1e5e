"""What would turn a failing circuit, how far a fitting one could be stretched, what decides."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

from routeplan.light.budget import circuit_verdict
from routeplan.light.circuits import circuit_budgets, closing_interfaces
from routeplan.light.connectors import connector_grades, connector_loss
from routeplan.light.contributions import Measured
from routeplan.light.interfaces import OpticPair
from routeplan.light.model import (
    Budget,
    BudgetLine,
    Direction,
    Glass,
    Mating,
    PartLoss,
    Path,
    SpliceStep,
)

if TYPE_CHECKING:
    from routeplan.run.practice import Interface
    from routeplan.run.practice import Loss as LossPractice

__all__ = ["Change", "Circuit", "deciding_line", "mending_changes", "stretch_limit_m", "stretched"]

_FARTHEST_M = 1_000_000
_END_PANELS = 2
_LENGTH_STEPS = 200  # a window between too weak and too strong may be narrow


@dataclass(frozen=True, slots=True, kw_only=True)
class Circuit:
    """A circuit as its budgets are computed."""

    paths: Mapping[Direction, Path]
    pair: OpticPair
    wavelengths_nm: tuple[float, ...]
    practice: LossPractice
    measured: Measured

    def budgets(self, change: Callable[[Path], Path]) -> tuple[Budget, ...]:
        """Return its budgets once each path is changed."""
        return circuit_budgets(
            {direction: change(path) for direction, path in self.paths.items()},
            self.pair,
            self.wavelengths_nm,
            practice=self.practice,
            measured=self.measured,
        )

    def fits(self, change: Callable[[Path], Path] = lambda path: path) -> bool:
        """Return whether every budget fits once each path is changed."""
        return circuit_verdict(self.budgets(change)) == "fits"


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One change that by itself turns a failing circuit into one that fits."""

    kind: str
    text: str


def mending_changes(
    circuit: Circuit, *, own: Mapping[str, Interface] | None = None, fibre_count: int = 2
) -> tuple[Change, ...]:
    """
    Return the smallest change of each kind that would make a failing circuit fit.

    Each was tried on the whole circuit: another interface of the same bit rate at its own
    wavelength, a better connector grade, fewer pairs beyond the end panels, fewer joints with the
    glass as it is, less glass. Nothing is returned for a kind that cannot mend it.
    """
    if circuit.fits():
        return ()
    found = [
        _other_interface(circuit, own, fibre_count),
        _better_grade(circuit),
        _fewer(circuit, Mating, "connector pair", keep=_END_PANELS),
        _fewer(circuit, SpliceStep, "joint", keep=0),
        _less_glass(circuit),
    ]
    return tuple(change for change in found if change is not None)


def stretch_limit_m(circuit: Circuit) -> int | None:
    """
    Return how many metres of glass a circuit could be longer, its joints held.

    Every section grows in proportion. The answer fits and a metre more fails.

    Returns
    -------
    stretch_limit_m
        None for a circuit that does not fit as it is. [m]

    References
    ----------
    .. [1] Search by halving; see `circuit_budget`.
    """
    if not circuit.fits():
        return None
    fits, fails = 0, 1
    while circuit.fits(partial(stretched, more_m=fails)):
        fits, fails = fails, fails * 2
        if fails > _FARTHEST_M:
            return fits
    while fails - fits > 1:
        middle = (fits + fails) // 2
        if circuit.fits(partial(stretched, more_m=middle)):
            fits = middle
        else:
            fails = middle
    return fits


def stretched(path: Path, more_m: float) -> Path:
    """
    Return a path with so much more glass in all, its sections in proportion.

    Parameters
    ----------
    path
        The path.
    more_m
        Glass to add; negative takes away. [m]

    Returns
    -------
    stretched
        The same joints, connectors and existing spans.

    References
    ----------
    .. [1] House rule.
    """
    glass_m = sum(step.glass_m for step in path.steps if isinstance(step, Glass))
    if glass_m <= 0.0:
        return path
    factor = max(0.0, 1.0 + more_m / glass_m)
    steps = tuple(
        replace(step, glass_m=step.glass_m * factor) if isinstance(step, Glass) else step
        for step in path.steps
    )
    return replace(path, steps=steps)


def deciding_line(budget: Budget) -> BudgetLine | None:
    """Return the line of a budget that takes most of its worst loss."""
    return max(budget.lines, key=lambda line: line.count * line.limit_db, default=None)


def _other_interface(
    circuit: Circuit, own: Mapping[str, Interface] | None, fibre_count: int
) -> Change | None:
    """Return the least capable interface of the same bit rate that closes the circuit."""
    rate_gbps = circuit.pair.at_from.bit_rate_gbps
    closing = closing_interfaces(
        circuit.paths,
        practice=circuit.practice,
        own=own,
        measured=circuit.measured,
        fibre_count=fibre_count,
    )
    for found in closing:
        if rate_gbps is not None and found.pair.at_from.bit_rate_gbps == rate_gbps:
            at = ", ".join(f"{nm:g}" for nm in found.wavelengths_nm)
            text = f"{found.pair.name} at {at} nm would fit: another optic at both ends."
            return Change(kind="interface", text=text)
    return None


def _better_grade(circuit: Circuit) -> Change | None:
    """Return the worst connector grade that mends the circuit, at every pair of practice."""
    limit_db = circuit.practice.connector_limit_db
    better = [row for row in connector_grades() if row.limit_db < limit_db]
    for row in sorted(better, key=lambda grade: -grade.limit_db):
        if circuit.fits(partial(_with_connectors, loss=connector_loss(row.name))):
            text = f"Connectors of {row.name}, {row.limit_db:g} dB at most, would do."
            return Change(kind="connectors", text=text)
    return None


def _fewer(
    circuit: Circuit, kind: type[Mating] | type[SpliceStep], name: str, *, keep: int
) -> Change | None:
    """Return the fewest parts of a kind to be saved so that the circuit fits."""
    counts = [sum(_is_spare(step, kind) for step in p.steps) for p in circuit.paths.values()]
    for number in range(1, min(counts, default=0) - keep + 1):
        if circuit.fits(partial(_without, kind=kind, number=number)):
            plural = "" if number == 1 else "s"
            return Change(kind=f"{name}s", text=f"{number} {name}{plural} fewer would do.")
    return None


def _with_connectors(path: Path, loss: PartLoss) -> Path:
    """Return a path whose connectors of practice lose something else."""
    steps = tuple(
        replace(step, loss=loss) if isinstance(step, Mating) and step.loss is None else step
        for step in path.steps
    )
    return replace(path, steps=steps)


def _without(path: Path, kind: type[Mating] | type[SpliceStep], number: int) -> Path:
    """Return a path with so many parts of a kind fewer."""
    spare = [index for index, step in enumerate(path.steps) if _is_spare(step, kind)][:number]
    return replace(path, steps=tuple(s for i, s in enumerate(path.steps) if i not in spare))


def _is_spare(step: object, kind: type[Mating] | type[SpliceStep]) -> bool:
    return isinstance(step, kind) and not getattr(step, "is_pigtail", False)


def _less_glass(circuit: Circuit) -> Change | None:
    """Return by how many metres of glass the circuit is too long."""
    lengths: Sequence[float] = [
        sum(step.glass_m for step in path.steps if isinstance(step, Glass))
        for path in circuit.paths.values()
    ]
    whole_m = int(min(lengths, default=0.0))
    bare = circuit.budgets(partial(stretched, more_m=-whole_m))
    if any((_judged_db(budget, circuit.practice) or 0.0) < 0.0 for budget in bare):
        return None  # what is left without any glass is too much already
    fails = 0
    for number in range(1, _LENGTH_STEPS + 1):
        fits = whole_m * number // _LENGTH_STEPS
        if fits > fails and circuit.fits(partial(stretched, more_m=-fits)):
            break
        fails = fits
    else:
        return None
    while fits - fails > 1:
        middle = (fits + fails) // 2
        if circuit.fits(partial(stretched, more_m=-middle)):
            fits = middle
        else:
            fails = middle
    return Change(kind="length", text=f"{fits} m of glass less would do, joints as they are.")


def _judged_db(budget: Budget, practice: LossPractice) -> float | None:
    """Return the margin that the verdict is on."""
    return budget.margin_db if practice.verdict_on == "worst" else budget.statistical_margin_db
