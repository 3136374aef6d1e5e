"""What the run file puts in a circuit's way: panels, joints' own figures, parts, bends."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Literal, TypeAlias

from routeplan.errors import Problem
from routeplan.light.connectors import (
    Polish,
    check_mating,
    connector_grade,
    connector_loss,
    finish_reflection,
)
from routeplan.light.grid import part_loss
from routeplan.light.model import Mating, Part, PartLoss, SpliceStep, Step

if TYPE_CHECKING:
    from routeplan.run.optics import CircuitOrder, CircuitPart, Finish, JointFigures, Panel
    from routeplan.run.practice import Loss as LossPractice

__all__ = [
    "Anchor",
    "Fittings",
    "check_panel",
    "fitted_attenuator",
    "joint_loss",
    "panel_mating",
    "part_steps",
]


Anchor: TypeAlias = tuple[Literal["site", "joint", "section"], str]
"""Where along a path something stands: at a site, or behind a joint or a section."""

_PLAIN = Mating(where="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Fittings:
    """
    What is fitted to one circuit beside its glass.

    `panels` holds a mated pair of every site that has its own, `splices` what a splice loses in
    joints that have theirs, both by name; `mating` is a pair anywhere else. `placed` are steps to
    be put at a site, behind a joint or behind a section; `patches` are sites with a
    further pair each. `attenuator` stands before each receiver.
    """

    mating: Mating = _PLAIN
    panels: Mapping[str, Mating] = field(default_factory=dict)
    splices: Mapping[str, PartLoss] = field(default_factory=dict)
    placed: tuple[tuple[Anchor, Step], ...] = ()
    patches: tuple[str, ...] = ()
    attenuator: PartLoss | None = None

    def pair(self, site: str) -> Mating:
        """Return a mated pair at a site."""
        return self.panels.get(site) or replace(self.mating, where=site)

    def splice(self, joint: str) -> SpliceStep:
        """Return a splice in a joint."""
        return SpliceStep(where=joint, loss=self.splices.get(joint))

    def put_at(self, kind: Literal["site", "joint", "section"], name: str) -> Iterator[Step]:
        """Yield what is to be put at a site, joint or section: further pairs, then the rest."""
        if kind == "site":
            yield from [self.pair(name)] * self.patches.count(name)
        yield from (step for at, step in self.placed if at == (kind, name))


def panel_mating(practice: LossPractice, panel: Panel | None = None) -> Mating:
    """
    Return a mated pair of a panel: its loss, where it has its own, and what it sends back.

    Examples
    --------
    >>> from routeplan.run.optics import Panel
    >>> from types import SimpleNamespace
    >>> practice = SimpleNamespace(connector_grade=None, connector_polish="UPC")
    >>> panel_mating(practice, Panel(site="Studio", grade="grade B")).loss.limit_db
    0.25
    """
    grade = (panel and panel.grade) or practice.connector_grade
    where, loss = "", None
    if panel is not None:
        where = panel.site
        if panel.measured_db is not None:
            loss = _exactly(panel.measured_db, f"run file, panel {panel.site}, measured_db")
            grade = None
        elif panel.grade is not None:
            loss = connector_loss(panel.grade)
    row = connector_grade(grade) if grade else None
    back_db = row.return_loss_db if row else None
    if back_db is None:
        back_db = finish_reflection(_finish(practice, panel)).return_loss_db
    return Mating(where=where, loss=loss, return_loss_db=back_db)


def check_panel(practice: LossPractice, panel: Panel) -> list[Problem]:
    """Return a problem if a panel's side and the patch lead's are not polished alike."""
    finish = _finish(practice, panel)
    ends = (_polish(finish), _polish(panel.lead_polish or finish))
    return check_mating(*ends, where=f'panel "{panel.site}", lead_polish')


def joint_loss(practice: LossPractice, figures: JointFigures) -> PartLoss:
    """Return what a splice loses in a joint that has figures of its own."""
    where = f"run file, joint {figures.place}"
    if figures.measured_db is not None:
        return _exactly(figures.measured_db, f"{where}, measured_db")
    own = (figures.splice_mean_db, figures.splice_sigma_db, figures.splice_limit_db)
    by_practice = (practice.splice_mean_db, practice.splice_sigma_db, practice.splice_limit_db)
    mean_db, sigma_db, limit_db = (
        other if each is None else each for each, other in zip(own, by_practice, strict=True)
    )
    source = f"{where}; what it leaves out: practice loss.splice_mean_db and the two after it"
    return PartLoss(mean_db=mean_db, sigma_db=sigma_db, limit_db=limit_db, source=source)


def part_steps(part: CircuitPart, *, where: str, circuit: str) -> Iterator[Part]:
    """Yield the steps of a passive part, as many as there are one after the other."""
    name = part.name or "own part"
    if part.kind is None:
        loss = part_loss(name)
    else:
        mean_db = part.loss_db or 0.0
        loss = PartLoss(
            mean_db=mean_db,
            sigma_db=part.sigma_db or 0.0,
            limit_db=mean_db if part.limit_db is None else part.limit_db,
            source=f"run file, circuit {circuit}, part {name}",
        )
    step = Part(where=where, item=name, loss=loss, return_loss_db=part.return_loss_db)
    yield from [step] * part.count


def fitted_attenuator(order: CircuitOrder) -> PartLoss | None:
    """Return what the attenuator takes that is fitted before each receiver, if one is."""
    if not order.attenuator_db:
        return None
    return _exactly(order.attenuator_db, f"table attenuators, {order.attenuator_db:g} dB")


def _finish(practice: LossPractice, panel: Panel | None) -> Finish:
    return (panel and panel.polish) or practice.connector_polish


def _polish(finish: Finish) -> Polish:
    return finish_reflection(finish).polish


def _exactly(loss_db: float, source: str) -> PartLoss:
    return PartLoss(mean_db=loss_db, sigma_db=0.0, limit_db=loss_db, source=source)
