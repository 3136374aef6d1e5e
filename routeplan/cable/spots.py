"""Spots: places on a cable's chain where it can be got at, and what a joint there costs."""

from __future__ import annotations

import zlib
from collections.abc import Mapping
from dataclasses import dataclass, replace

from routeplan.run.model import JointFitness, Place
from routeplan.run.practice import ReachKind

__all__ = ["Spot", "kind_factor", "spot_at", "tie_key", "weighed"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Spot:
    """A place on a cable's chain where the cable can be got at, declared or assumed."""

    chain_mm: int
    kind: str
    name: str
    fitness: JointFitness
    cost_factor: float
    loop_m: float | None
    assumed: bool
    tie_key: int
    place: Place | None = None


def spot_at(place: Place, chain_mm: int) -> Spot:
    """Return the spot of a reach point at a chain value; its file may call it assumed. [mm]"""
    return Spot(
        chain_mm=chain_mm,
        kind=place.kind,
        name=place.name,
        fitness=place.joint,
        cost_factor=place.joint_cost_factor,
        loop_m=place.loop_m,
        assumed=place.properties.get("assumed") is True,
        tie_key=tie_key(place.lon, place.lat, place.name),
        place=place,
    )


def tie_key(lon: float, lat: float, name: str) -> int:
    """Return a number that is a spot's own, whichever way the run is drawn."""
    return zlib.crc32(f"{lon:.9f} {lat:.9f} {name}".encode())


def weighed(spots: tuple[Spot, ...], factors: Mapping[ReachKind, float]) -> tuple[Spot, ...]:
    """Return the spots, a joint costing more at some kinds of place."""
    if not factors:
        return spots
    return tuple(
        replace(spot, cost_factor=spot.cost_factor * kind_factor(factors, spot.kind))
        for spot in spots
    )


def kind_factor(factors: Mapping[ReachKind, float], kind: str) -> float:
    """Return how many times more a joint costs at a kind of place. [-]"""
    return next((factor for name, factor in factors.items() if name == kind), 1.0)
