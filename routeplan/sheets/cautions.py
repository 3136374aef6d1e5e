"""Which cautions the sheets of a run have to carry, chosen by what the run has in it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.tables import load_rows

__all__ = ["Caution", "cautions_for"]

_UNDERGROUND = {"buried", "duct"}
_OVER_WATER = {"water", "bridge"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Caution:
    """One caution of the table; it is printed where one word of `when` holds for the run."""

    name: str
    topic: str
    text: str
    when: tuple[str, ...]
    source: str = ""


def cautions_for(document: Mapping[str, object]) -> list[dict[str, str]]:
    """
    Return the cautions that a run's sheets carry, in the order of the table.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds; its legs, stations, nodes and checks decide.

    Returns
    -------
    cautions_for
        Topic and text of each.

    Examples
    --------
    >>> [caution["topic"] for caution in cautions_for({})]
    ['Local rules come first', 'Laser light', 'Lifting and reels']
    """
    holds = _what_holds(document)
    return [
        {"topic": row.topic, "text": " ".join(row.text.split())}
        for row in load_rows("cautions", Caution)
        if holds.intersection(row.when)
    ]


def _what_holds(document: Row) -> set[str]:
    placements = {
        text_at(stretch, "placement")
        for leg in rows_at(document, "legs")
        for stretch in rows_at(leg, "stretches")
    }
    stations = rows_at(document, "stations")
    reach_kinds = {text_at(row, "reach_kind") for row in stations}
    crossings = [row for row in stations if text_at(row, "kind") == "crossing"]
    crossed = {text_at(row, "crosses") for row in crossings} | {
        text_at(row, "crosses") for row in rows_at(document, "crossings")
    }
    roles = {text_at(node, "role") for node in rows_at(document, "nodes")}
    facts = {
        "always": True,
        "bright": any(map(_is_bright, rows_at(document, "checks"))),
        "underground": bool(placements & _UNDERGROUND),
        "aerial": "aerial" in placements or "pole" in reach_kinds or "power" in crossed,
        "maintenance_hole": "maintenance_hole" in reach_kinds,
        "crossing": bool(crossings) or "road" in crossed,
        "rail": "rail" in crossed,
        "power": "power" in crossed,
        "pipeline": "pipeline" in crossed,
        "water": bool(placements & _OVER_WATER) or "water" in crossed,
        "venue": text_at(document, "purpose") == "venue",
        "transmitter": "transmitter" in roles,
    }
    return {name for name, is_so in facts.items() if is_so}


def _is_bright(check: Row) -> bool:
    """Return whether a check finds laser light above hazard level 1."""
    launched_dbm, level_dbm = value_at(check, "value"), value_at(check, "limit")
    if text_at(check, "kind") != "laser hazard" or launched_dbm is None or level_dbm is None:
        return False
    return launched_dbm > level_dbm
