"""Rows of what legs cross, touch, run along and go through, and of their steep stretches."""

from __future__ import annotations

from collections.abc import Iterator

from routeplan.ground.model import Crossing, FoundCrossing, Leg
from routeplan.planning import Plan
from routeplan.sheets.rows import shaped
from routeplan.sheets.tables import Json, Row
from routeplan.units import m_from_mm

__all__ = ["crossing_rows", "steep_rows"]


def crossing_rows(planned: Plan) -> list[Row]:
    """
    Return everything that legs meet, leg by leg and along each.

    Parameters
    ----------
    planned
        The plan.
    """
    ground = planned.ground
    names = {leg.id: leg.name for leg in ground.legs}
    order = {leg.id: number for number, leg in enumerate(ground.legs)}
    rows = [
        *(
            ((order[each.leg], each.ground_mm), _crossing(each, names[each.leg]))
            for each in ground.crossings
        ),
        *(
            ((order[each.leg], each.start_mm), _beside(each, names[each.leg]))
            for each in ground.beside
        ),
    ]
    rows.sort(key=lambda item: item[0])
    return [row for _, row in rows]


def _crossing(each: Crossing, leg: str) -> Row:
    met = each.met
    inside_m = m_from_mm(met.length_mm) if met is not None and met.how == "inside" else None
    return _row(
        {
            "leg": leg,
            "name": each.name,
            "crosses": each.crosses,
            "how": met.how if met else "crosses",
            "ground_m": m_from_mm(each.ground_mm),
            "length_m": inside_m,
            "width_m": each.width_m,
            "ask": met.ask if met else each.name,
            "source": "declared" if each.is_declared else "found",
            "lon": each.lon,
            "lat": each.lat,
        },
        met,
    )


def _beside(each: FoundCrossing, leg: str) -> Row:
    return _row(
        {
            "leg": leg,
            "name": each.name,
            "crosses": each.kind,
            "how": each.how,
            "ground_m": m_from_mm((each.start_mm + each.end_mm) // 2),
            "length_m": m_from_mm(each.length_mm) if each.length_mm else None,
            "width_m": None,
            "ask": each.ask,
            "source": "found",
            "lon": each.lon,
            "lat": each.lat,
        },
        each,
    )


def _row(row: Row, met: FoundCrossing | None) -> Row:
    found: dict[str, Json] = {
        "class": met.feature_class if met else "",
        "angle_deg": met.angle_deg if met else None,
        "file": met.file if met else None,
    }
    return shaped("crossings", row | found)


def steep_rows(leg: Leg) -> Iterator[Row]:
    """
    Yield the steep stretches of a leg.

    Parameters
    ----------
    leg
        The leg.
    """
    for each in leg.steep:
        yield shaped(
            "steep",
            {
                "from_ground_m": each.start_m,
                "to_ground_m": each.end_m,
                "rise_m": each.rise_m,
                "slope_max_ratio": each.slope_max_ratio,
            },
        )
