"""What light meets on its way, and what a budget says of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

__all__ = [
    "Bend",
    "Budget",
    "BudgetLine",
    "Direction",
    "ExistingSpan",
    "Glass",
    "Mating",
    "Part",
    "PartLoss",
    "Path",
    "SpliceStep",
    "Step",
    "Verdict",
]

Direction = Literal["from-to", "to-from"]
Verdict = Literal["fits", "fails", "unknown"]


@dataclass(frozen=True, slots=True, kw_only=True)
class PartLoss:
    """What one part loses, where that is known of itself and not from practice."""

    mean_db: float
    sigma_db: float
    limit_db: float
    source: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Glass:
    """Fibre of one section; `cable` is set where that cable's own attenuation is known."""

    section: str
    fibre: int
    fibre_type: str
    glass_m: float
    cable: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SpliceStep:
    """A splice: in a joint, or the pigtail behind a panel."""

    where: str
    is_pigtail: bool = False
    loss: PartLoss | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Mating:
    """A mated connector pair at a panel, and what it reflects where that is known."""

    where: str
    loss: PartLoss | None = None
    return_loss_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Something in the way that loses light: a multiplexer, a splitter, an attenuator."""

    where: str
    item: str
    loss: PartLoss
    return_loss_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Bend:
    """Fibre wound with a radius, so many turns together."""

    where: str
    fibre_type: str
    radius_mm: float
    turns: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ExistingSpan:
    """Somebody's fibre, with its own length and, where known, its own loss."""

    where: str
    fibre_type: str
    glass_m: float
    loss_db: float | None


Step: TypeAlias = Glass | SpliceStep | Mating | ExistingSpan | Part | Bend


@dataclass(frozen=True, slots=True, kw_only=True)
class Path:
    """All that the light of one circuit meets, in order, in one direction."""

    circuit: str
    direction: Direction
    steps: tuple[Step, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class BudgetLine:
    """One contribution to a loss: `count` of something, each with mean, sigma and limit."""

    item: str
    count: int
    each_db: float
    sigma_db: float
    limit_db: float
    source: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Budget:
    """
    Whether the light of one circuit arrives, at one wavelength in one direction.

    `first_day_margin_db` is what the worst loss leaves with nothing kept in hand;
    `end_of_life_margin_db` is that less `life_lines`, at their limits.
    """

    circuit: str
    wavelength_nm: float
    direction: Direction
    nominal_db: float
    statistical_db: float
    worst_db: float
    available_db: float | None
    margin_db: float | None
    statistical_margin_db: float | None
    overload_db: float | None
    attenuator_db: float | None
    dispersion_min_ps_per_nm: float
    dispersion_max_ps_per_nm: float
    pmd_ps: float | None
    return_loss_db: float | None
    delay_ns: int
    verdict: Verdict
    reasons: tuple[str, ...]
    lines: tuple[BudgetLine, ...]
    first_day_margin_db: float | None = None
    end_of_life_margin_db: float | None = None
    life_lines: tuple[BudgetLine, ...] = ()
