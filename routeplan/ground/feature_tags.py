"""What the tags of an OpenStreetMap extract say a feature is, and whose."""

from __future__ import annotations

import re
from collections.abc import Mapping

from routeplan.ground.features import FeatureKind

__all__ = ["OSM_COLUMNS", "OSM_WHERE", "other_tags", "owner_of_tags", "what_of_tags"]

OSM_COLUMNS = (
    "name",
    "highway",
    "railway",
    "waterway",
    "man_made",
    "boundary",
    "natural",
    "landuse",
    "admin_level",
    "other_tags",
)
"""Columns of the extract's layers that tell something; the rest stands in `other_tags`."""

OSM_WHERE = (
    ("highway", "highway IS NOT NULL"),
    ("railway", "railway IS NOT NULL"),
    ("waterway", "waterway IS NOT NULL"),
    ("man_made", "man_made = 'pipeline'"),
    ("boundary", "boundary IS NOT NULL"),
    ("natural", "\"natural\" IN ('water', 'bay', 'strait')"),
    ("landuse", "landuse IN ('reservoir', 'basin')"),
    ("other_tags", "other_tags LIKE '%\"power\"=>%' OR other_tags LIKE '%\"railway\"=>%'"),
    ("other_tags", "other_tags LIKE '%\"boundary\"=>%' OR other_tags LIKE '%\"waterway\"=>%'"),
)
"""What is asked of the file, by the column that the question needs."""

_TAG = re.compile(r'"((?:[^"\\]|\\.)*)"=>"((?:[^"\\]|\\.)*)"')

# Tags of things that are planned, gone, or stand beside the way instead of being it.
_NO_ROAD = frozenset(
    {"proposed", "abandoned", "razed", "platform", "rest_area", "services", "bus_stop", "corridor"}
)
_RAIL = frozenset(
    {
        "rail",
        "light_rail",
        "tram",
        "subway",
        "narrow_gauge",
        "monorail",
        "funicular",
        "preserved",
        "miniature",
        "construction",
        "disused",
    }
)
_WATERWAY = frozenset(
    {
        "river",
        "riverbank",
        "stream",
        "canal",
        "ditch",
        "drain",
        "tidal_channel",
        "fairway",
        "dock",
        "brook",
    }
)
_POWER = frozenset({"line", "minor_line", "cable"})
_WATER = {"natural": {"water", "bay", "strait"}, "landuse": {"reservoir", "basin"}}


def other_tags(text: str | None) -> dict[str, str]:
    r"""
    Return the tags that a text of the form "key"=>"value","key"=>"value" holds.

    Examples
    --------
    >>> other_tags('"power"=>"line","operator"=>"Grid \\"North\\""')
    {'power': 'line', 'operator': 'Grid "North"'}
    """
    found = _TAG.findall(text or "")
    return {_plain(key): _plain(value) for key, value in found}


def _plain(text: str) -> str:
    return re.sub(r"\\(.)", r"\1", text)


def what_of_tags(tags: Mapping[str, str]) -> tuple[FeatureKind, str] | None:
    """
    Return the kind and class that tags tell, or None if it is nothing that is crossed.

    Parameters
    ----------
    tags
        Key and value of every tag.

    Examples
    --------
    >>> what_of_tags({"highway": "primary"}), what_of_tags({"building": "yes"})
    (('road', 'primary'), None)
    """
    highway, railway = tags.get("highway", ""), tags.get("railway", "")
    if highway and highway not in _NO_ROAD:
        return "road", highway
    if railway in _RAIL:
        return "rail", railway
    if tags.get("waterway") in _WATERWAY:
        return "water", tags["waterway"]
    for key, values in _WATER.items():
        if tags.get(key) in values:
            return "water", tags.get("water", tags[key])
    if tags.get("power") in _POWER:
        return "power", tags["power"]
    if tags.get("man_made") == "pipeline":
        return "pipeline", tags.get("substance", "")
    if tags.get("boundary"):
        level = tags.get("admin_level")
        return "boundary", tags["boundary"] + (f" {level}" if level else "")
    return None


def owner_of_tags(tags: Mapping[str, str]) -> str:
    """Return the owner, else the operator, else nothing."""
    return tags.get("owner") or tags.get("operator") or ""
