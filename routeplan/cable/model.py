"""What is ordered and joined: cables, rulers, sections, reels, joints, splices."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from routeplan.run.practice import CableMake

__all__ = [
    "Cable",
    "CableEnd",
    "Cut",
    "FibreEnd",
    "FibreUse",
    "Joint",
    "Layout",
    "Mark",
    "Millimetres",
    "Proof",
    "Reel",
    "Rulers",
    "Section",
    "Splice",
    "Splicing",
]

Millimetres: TypeAlias = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Cable:
    """
    What is ordered: one make of cable along one leg or several.

    `legs` holds (leg id, forward) pairs in the cable's own direction; the *chain* is the ground
    distance along them from the cable's start.
    """

    id: str
    name: str
    legs: tuple[tuple[str, bool], ...]
    make: CableMake
    start: str
    end: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Rulers:
    """
    Chain, sheath and glass readings at the knots of one cable, all (n,) and never falling.

    Between knots every ruler is linear; a loop, a joint or an entry repeats a chain value while
    sheath and glass step.
    """

    cable: str
    chain_mm: Millimetres
    sheath_mm: Millimetres
    glass_mm: Millimetres


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """A point on a cable, wherever it is."""

    cable: str
    chain_mm: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Reel:
    """A drum of cable: bought to a put-up or to length, or from stock."""

    id: str
    length_mm: int
    source: Literal["put-up", "to-length", "stock"]
    cost_cents: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """The piece of cable between two joints; readings are on the cable's own rulers."""

    id: str
    cable: str
    start: str
    end: str
    start_chain_mm: int
    end_chain_mm: int
    start_sheath_mm: int
    end_sheath_mm: int
    start_glass_mm: int
    end_glass_mm: int
    needed_mm: int

    @property
    def sheath_mm(self) -> int:
        """Sheath length between the two ends, tails and entries included. [mm]"""
        return self.end_sheath_mm - self.start_sheath_mm

    @property
    def glass_mm(self) -> int:
        """Fibre length between the two ends. [mm]"""
        return self.end_glass_mm - self.start_glass_mm


@dataclass(frozen=True, slots=True, kw_only=True)
class Cut:
    """A section cut from a reel, `offset_mm` from its outer end."""

    reel: str
    offset_mm: int
    section: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CableEnd:
    """One cable end in a joint: a section's `start` or `end`."""

    section: str
    side: Literal["start", "end"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Joint:
    """
    Where cable ends meet; `node` is set where that is a node and not a place on a leg.

    `opened` are sections of cables that pass, entered at mid-span, each at its chain value of
    `opened_mm`. A joint at a site has nothing but those: what is cut there goes to the panel.
    `closure` is the joint of another cable whose closure it shares, empty if it has its own.
    """

    id: str
    node: str | None
    mark: Mark
    leg: str
    ground_mm: int
    lon: float
    lat: float
    reach_name: str
    kind: Literal["splice", "mated"]
    assumed: bool
    ends: tuple[CableEnd, ...]
    cost_cents: int
    opened: tuple[str, ...] = ()
    opened_mm: tuple[int, ...] = ()
    closure: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Proof:
    """How good a layout is: its cost, a bound no layout can beat, and what stopped the search."""

    optimal: bool
    cost_cents: int
    lower_bound_cents: int
    stopped_by: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Layout:
    """Cables laid out: rulers, sections, joints, reels, cuts and the proof of least cost."""

    cables: tuple[Cable, ...]
    rulers: tuple[Rulers, ...]
    sections: tuple[Section, ...]
    joints: tuple[Joint, ...]
    reels: tuple[Reel, ...]
    cuts: tuple[Cut, ...]
    proof: Proof


@dataclass(frozen=True, slots=True, kw_only=True)
class FibreEnd:
    """
    One fibre where it comes into a joint, with its tube and fibre colours.

    `side` is the end of the section it is at there; where the section is entered at mid-span,
    "end" is the piece from its start, which ends there, and "start" the piece that goes on.
    """

    cable: str
    section: str
    fibre: int
    tube_colour: str
    fibre_colour: str
    side: Literal["start", "end", ""] = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Splice:
    """One row of the schedule: what meets what, on which tray, for which circuit."""

    joint: str
    tray: int
    position: int
    a: FibreEnd
    b: FibreEnd | None
    kind: Literal["splice", "express", "stored"]
    circuit: str
    limit_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FibreUse:
    """
    One fibre of one cable that a circuit runs on; `strand` counts the circuit's own fibres.

    `span_mm` are the chain values between which it does, and `start` and `end` the nodes there,
    in the cable's own direction; left out they are the cable's ends.
    """

    circuit: str
    strand: int
    cable: str
    fibre: int
    forward: bool
    span_mm: tuple[int, int] | None = None
    start: str = ""
    end: str = ""

    def nodes(self, start: str, end: str) -> tuple[str, str]:
        """Return the nodes it comes from and goes to, of a cable from `start` to `end`."""
        nodes = self.start or start, self.end or end
        return nodes if self.forward else nodes[::-1]

    def covers(self, chain_mm: int) -> bool:
        """Return whether a chain value of its cable lies on it, its ends among them."""
        return self.span_mm is None or self.span_mm[0] <= chain_mm <= self.span_mm[1]


@dataclass(frozen=True, slots=True, kw_only=True)
class Splicing:
    """Fibres of every circuit, in order along it, and every splice."""

    uses: tuple[FibreUse, ...]
    splices: tuple[Splice, ...]
