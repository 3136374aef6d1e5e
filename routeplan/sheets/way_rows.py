"""Rows of separate ways, of what they still share, and of circuits that stand by for others."""

from __future__ import annotations

from routeplan.circuits import CircuitPlan
from routeplan.planning import Plan
from routeplan.protection import Standby, standbys
from routeplan.routed import RoutedPair
from routeplan.sheets.rows import row_of, shaped
from routeplan.sheets.tables import Row

__all__ = ["separate_way_rows", "standby_rows"]

_NS_PER_US = 1000.0


def separate_way_rows(planned: Plan) -> list[Row]:
    """
    Return the pairs of legs that were found together, each with all that they still share.

    Parameters
    ----------
    planned
        The plan.
    """
    return [_pair(pair) for pair in planned.pairs]


def _pair(pair: RoutedPair) -> Row:
    ways = pair.ways
    exposures = [
        row_of(
            "exposures",
            each,
            from_ellipsoid_m=each.from_m,
            to_ellipsoid_m=each.to_m,
            ellipsoid_m=each.length_m,
            bridge=each.is_bridge,
        )
        for each in ways.exposures
    ]
    return shaped(
        "separate_ways",
        {
            "main": pair.main,
            "standby": pair.standby,
            "from": pair.start,
            "to": pair.end,
            "rule": ways.rule,
            "exact": ways.is_exact,
            "main_ellipsoid_m": ways.main.length_m,
            "standby_ellipsoid_m": ways.standby.length_m,
            "distance_m": ways.distance_m,
            "exposed_ellipsoid_m": sum(each.length_m for each in ways.exposures),
            "exposures": [*exposures],
        },
    )


def standby_rows(planned: Plan) -> list[Row]:
    """
    Return every circuit that stands by for another beside it: margins, losses, delays.

    Parameters
    ----------
    planned
        The plan.
    """
    return [_standby(each) for each in standbys(planned.circuits, planned.layout.cables)]


def _standby(each: Standby) -> Row:
    main, standby = each.main, each.standby
    return shaped(
        "standbys",
        {
            "main": main.order.name,
            "standby": standby.order.name,
            "main_margin_db": _margin_db(main),
            "standby_margin_db": _margin_db(standby),
            "main_worst_db": max(budget.worst_db for budget in main.budgets),
            "standby_worst_db": max(budget.worst_db for budget in standby.budgets),
            "main_delay_us": each.main_delay_ns / _NS_PER_US,
            "standby_delay_us": each.standby_delay_ns / _NS_PER_US,
            "difference_us": each.difference_ns / _NS_PER_US,
            "shared_cables": [*each.shared_cables],
        },
    )


def _margin_db(circuit: CircuitPlan) -> float | None:
    """Return the least margin of a circuit; None where one is not known."""
    margins_db = [budget.margin_db for budget in circuit.budgets]
    known_db = [margin_db for margin_db in margins_db if margin_db is not None]
    return min(known_db) if len(known_db) == len(margins_db) else None
