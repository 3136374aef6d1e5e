"""What a way costs: prices by road class, placement, crossing and bend, and areas to mind."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import ClassVar

import numpy as np

from routeplan.errors import InputError, Problem
from routeplan.streets.bends import bend_counts
from routeplan.streets.inside import inside_ratios
from routeplan.streets.model import CROSSING_KINDS, Flags, Floats, Network
from routeplan.tables import load_rows

__all__ = [
    "CostRow",
    "Prices",
    "StreetCosts",
    "Zones",
    "all_rows",
    "class_of",
    "cost_words",
    "placements_of",
    "prices_of",
    "street_costs",
    "with_cost",
]

UNKNOWN_CLASS = "street"


@dataclass(frozen=True, slots=True, kw_only=True)
class CostRow:
    """One row of the table `street_costs`."""

    KEY: ClassVar[tuple[str, ...]] = ("kind", "name")
    name: str
    kind: str
    reason: str
    per_m: float | None = None
    each: float | None = None
    value: float | None = None
    unit: str = ""
    placement: str = ""
    reach_kind: str = ""
    spacing_m: float | None = None
    least_m: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class StreetCosts:
    """
    What a way costs, in any unit: one price for a metre of every kind, and for each crossing.

    A metre of street costs `road[class]` x `placement[placement]`, more on a bridge or in a
    tunnel; a metre of a route that is there already costs `existing[placement]`. An infinite
    factor closes an area.
    """

    road: Mapping[str, float]
    road_placement: Mapping[str, str]
    placement: Mapping[str, float]
    existing: Mapping[str, float]
    crossing: Mapping[str, float]
    bridge_factor: float
    tunnel_factor: float
    on_structure_ratio: float
    off_street_per_m: float
    sharp_bend_each: float
    sharp_bend_deg: float
    avoid_factor: float = math.inf
    outside_factor: float = math.inf
    usual_placement: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Zones:
    """Ground to avoid and ground to keep to, as polygons: rings of (n, 2), the outer one first."""

    avoid: tuple[tuple[Floats, ...], ...] = ()
    keep_to: tuple[tuple[Floats, ...], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Prices:
    """
    What every edge of a network costs: by the metre, in crossings and bends, and altogether.

    `cost` is infinite where the edge is closed. `crossing_each` has one price a crossing row.
    """

    costs: StreetCosts
    per_m: Floats
    crossing_each: Floats
    cost: Floats
    closed: Flags = field(default_factory=lambda: np.empty(0, dtype=bool))


def cost_words() -> tuple[str, ...]:
    """Return the names of every price that `street_costs` takes, such as `road.primary`."""
    table = _table()
    groups = ("road", "placement", "existing", "crossing")
    words = [f"{group}.{name}" for group in groups for name in table[group]]
    return (*words, *table["rule"], "avoid_factor", "outside_factor")


def street_costs(
    changes: Mapping[str, float] | None = None, placement: str | None = None
) -> StreetCosts:
    """
    Return the prices of the table `street_costs` with some of them changed.

    Parameters
    ----------
    changes
        New prices by name: `road.primary`, `placement.aerial`, `existing.duct`, `crossing.rail`,
        `bridge_factor` and the like; see `cost_words`. A road class or area factor may be
        infinite: closed.
    placement
        How cable lies along streets; None takes the usual placement of each road class.

    Raises
    ------
    InputError
        With every name that is not known and every price that is not a number of at least 0.

    Examples
    --------
    >>> street_costs({"road.primary": 2.5}).road["primary"]
    2.5
    """
    changes = dict(changes or {})
    table = _table()
    problems = [*_bad_changes(changes), *_bad_placement(placement, table)]
    if problems:
        raise InputError(problems)
    for key, value in changes.items():
        group, dot, name = key.partition(".")
        if dot:
            table[group][name] = float(value)
        else:
            table["rule"][key] = float(value)
    usual = {row.name: row.placement for row in _rows() if row.kind == "road"}
    return StreetCosts(
        road=MappingProxyType(table["road"]),
        road_placement=MappingProxyType(usual),
        placement=MappingProxyType(table["placement"]),
        existing=MappingProxyType(table["existing"]),
        crossing=MappingProxyType(table["crossing"]),
        usual_placement=placement,
        **table["rule"],
    )


def _rows() -> tuple[CostRow, ...]:
    return load_rows("street_costs", CostRow)


def _table() -> dict[str, dict[str, float]]:
    table: dict[str, dict[str, float]] = {}
    for row in _rows():
        value = next((v for v in (row.per_m, row.each, row.value) if v is not None), None)
        if value is not None:
            table.setdefault(row.kind, {})[row.name] = value
    return table


def _bad_changes(changes: Mapping[str, float]) -> list[Problem]:
    if not changes:
        return []
    from routeplan.run.trouble import nearest_hint, shown

    known = cost_words()
    problems = []
    for key, value in changes.items():
        where = f"cost {shown(key)}"
        if key not in known:
            problems.append(
                Problem(where=where, what="is not a known price", remedy=nearest_hint(key, known))
            )
        elif (
            isinstance(value, bool)
            or not isinstance(value, int | float)
            or not value >= 0.0
            or (math.isinf(value) and not _may_be_closed(key))
        ):
            problems.append(
                Problem(where=where, what="is not a price", value=shown(value), limit="at least 0")
            )
    return problems


def _may_be_closed(key: str) -> bool:
    return key.startswith(("road.", "existing.", "crossing.")) or key.endswith("_factor")


def _bad_placement(
    placement: str | None, table: Mapping[str, Mapping[str, float]]
) -> list[Problem]:
    if placement is None or placement in table["placement"]:
        return []
    from routeplan.run.trouble import nearest_hint, one_of, shown

    known = table["placement"]
    return [
        Problem(
            where="placement",
            what="is not a known placement",
            value=shown(placement),
            limit=one_of(known),
            remedy=nearest_hint(placement, known),
        )
    ]


def class_of(word: str, known: Mapping[str, float]) -> str:
    """Return the class a road is priced as: its own, that of the road a slip road serves, or none.

    Examples
    --------
    >>> class_of("primary_link", {"primary": 1.6, "street": 1.0})
    'primary'
    """
    word = word.strip().lower()
    for candidate in (word, word.removesuffix("_link")):
        if candidate in known:
            return candidate
    return UNKNOWN_CLASS


def placements_of(network: Network, costs: StreetCosts) -> tuple[str, ...]:
    """
    Return the placement of ordinary street of each road class of a network, in its order.

    A route that is there already has its own.
    """
    return tuple(
        costs.usual_placement or costs.road_placement[class_of(word, costs.road)]
        for word in network.class_words
    )


def prices_of(network: Network, costs: StreetCosts, *, zones: Zones | None = None) -> Prices:
    """
    Return what every edge of a network costs.

    Parameters
    ----------
    network
        The network.
    costs
        The prices.
    zones
        Ground to avoid or to keep to.
    """
    per_m = (
        _class_prices(network, costs)[network.road_class]
        if len(network.length_m)
        else (np.empty(0))
    )
    per_m = per_m * np.where(network.is_bridge, costs.bridge_factor, 1.0)
    per_m = per_m * np.where(network.is_tunnel, costs.tunnel_factor, 1.0)
    own = np.array([costs.existing.get(word, 0.0) for word in network.placement_words])
    is_own = np.array([bool(word) for word in network.placement_words])
    if is_own.any():
        per_m = np.where(is_own[network.placement], own[network.placement], per_m)
    each = _crossing_prices(network, costs)
    if zones is not None:
        per_m = per_m * _zone_factors(network, costs, zones)
    # Nothing times closed is closed: an edge of no length has none to be closed on.
    cost = np.where(network.length_m > 0, per_m, 0.0) * network.length_m
    cost += np.bincount(network.crossing_edge, weights=each, minlength=len(cost))[: len(cost)]
    if costs.sharp_bend_each:
        cost += costs.sharp_bend_each * bend_counts(network, sharp_deg=costs.sharp_bend_deg)
    return Prices(
        costs=costs, per_m=per_m, crossing_each=each, cost=cost, closed=~np.isfinite(cost)
    )


def _class_prices(network: Network, costs: StreetCosts) -> Floats:
    placements = placements_of(network, costs)
    return np.array(
        [
            costs.road[class_of(word, costs.road)] * costs.placement[placement]
            for word, placement in zip(network.class_words, placements, strict=True)
        ]
    )


def _crossing_prices(network: Network, costs: StreetCosts) -> Floats:
    prices = np.array([costs.crossing[kind] for kind in CROSSING_KINDS])
    edge = network.crossing_edge
    on_structure = (network.is_bridge | network.is_tunnel)[edge]
    share = np.where(on_structure, costs.on_structure_ratio, 1.0)
    return prices[network.crossing_kind] * share * network.crossing_weight


def _zone_factors(network: Network, costs: StreetCosts, zones: Zones) -> Floats:
    factor = np.ones(len(network.length_m))
    if zones.avoid:
        inside = inside_ratios(network, zones.avoid)
        factor *= _mixed(inside, costs.avoid_factor)
    if zones.keep_to:
        outside = 1.0 - inside_ratios(network, zones.keep_to)
        factor *= _mixed(outside, costs.outside_factor)
    return factor


def _mixed(ratio: Floats, factor: float) -> Floats:
    """Return the mean factor of an edge of which so much costs so much more."""
    touched = ratio > 1e-9
    return np.where(touched, 1.0 + np.where(touched, ratio, 1.0) * (factor - 1.0), 1.0)


def with_cost(prices: Prices, cost: Floats) -> Prices:
    """Return prices with other totals."""
    return replace(prices, cost=cost)


def all_rows(kind: str) -> Sequence[CostRow]:
    """Return the rows of one kind of the table."""
    return [row for row in _rows() if row.kind == kind]
