"""The catalogue's tables of separate ways, what they share, and circuits that stand by."""

from __future__ import annotations

from routeplan.sheets.column_kinds import (
    choice_column,
    decibels_column,
    metres_column,
    number_column,
    rows_column,
    text_column,
)
from routeplan.sheets.columns import Column, Table

__all__ = ["WAY_TABLES"]


def _delay_column(key: str, text: str) -> Column:
    return number_column(key, text, "us", 3)


WAY_TABLES = (
    Table(
        name="exposures",
        title="What separate ways share or pass near",
        path=("separate_ways", "exposures"),
        carried=(("main", "main"), ("standby", "standby")),
        columns=(
            choice_column("kind", "How the two come together", "shared", "junction", "near"),
            metres_column("from_ellipsoid_m", "Where it begins along the main way."),
            metres_column("to_ellipsoid_m", "Where it ends along the main way."),
            metres_column("ellipsoid_m", "Length along the main way."),
            metres_column("nearest_m", "How near they come; 0 where they are one."),
            text_column("name", "Street, or its class."),
            Column(key="bridge", kind="flag", text="Whether it is on a bridge."),
            number_column("lon", "Longitude of its middle, WGS 84.", "deg", 9),
            number_column("lat", "Latitude of its middle, WGS 84.", "deg", 9),
        ),
    ),
    Table(
        name="separate_ways",
        title="Separate ways",
        path=("separate_ways",),
        columns=(
            text_column("main", "Main leg."),
            text_column("standby", "Leg kept separate from it."),
            text_column("from", "Site where both begin."),
            text_column("to", "Site where both end."),
            text_column("rule", "What was asked of the two."),
            Column(key="exact", kind="flag", text="Whether no pair costs less under that rule."),
            metres_column("main_ellipsoid_m", "Length of the main way."),
            metres_column("standby_ellipsoid_m", "Length of the standby way."),
            metres_column("distance_m", "Nearer to each other than this is listed."),
            metres_column("exposed_ellipsoid_m", "Main way that one event could cut with it."),
            rows_column("exposures", "exposures", "All that they share or pass near."),
        ),
    ),
    Table(
        name="standbys",
        title="Circuits that stand by",
        path=("standbys",),
        columns=(
            text_column("main", "Circuit."),
            text_column("standby", "Circuit that stands by for it."),
            decibels_column("main_margin_db", "Least margin of the circuit.", may_be_null=True),
            decibels_column("standby_margin_db", "Least margin of the standby.", may_be_null=True),
            decibels_column("main_worst_db", "Most that the circuit loses."),
            decibels_column("standby_worst_db", "Most that the standby loses."),
            _delay_column("main_delay_us", "Delay of the circuit, from-to."),
            _delay_column("standby_delay_us", "Delay of the standby, from-to."),
            _delay_column("difference_us", "Between the two."),
            Column(key="shared_cables", kind="texts", text="Cables that both are in."),
        ),
    ),
)
"""Tables of ways that are kept apart, for the catalogue."""
