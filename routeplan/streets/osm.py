"""Reading streets, and what they cross, from OpenStreetMap extracts: .osm, .osm.pbf, .osm.bz2."""

from __future__ import annotations

import bz2
import contextlib
import tempfile
import warnings
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from routeplan.errors import GeometryError, Problem
from routeplan.streets.assemble import Lines, Places
from routeplan.streets.model import Floats

__all__ = ["Extract", "read_osm"]

_NO_WAY = (  # not there (any more, yet), or nothing a cable can be laid along from place to place
    "abandoned",
    "bus_stop",
    "construction",
    "corridor",
    "demolished",
    "elevator",
    "emergency_bay",
    "platform",
    "proposed",
    "razed",
    "rest_area",
    "services",
    "disused",
)
_RAIL = ("rail", "light_rail", "narrow_gauge", "preserved")
_WATER = ("river", "canal", "tidal_channel")
_PLACES = {  # tag and value: what it is to a cable
    ("man_made", "utility_pole"): "pole",
    ("power", "pole"): "pole",
    ("telecom", "pole"): "pole",
    ("man_made", "street_cabinet"): "cabinet",
    ("man_made", "manhole"): "maintenance_hole",
    ("manhole", "telecom"): "maintenance_hole",
    ("manhole", "telecommunications"): "maintenance_hole",
}
_NOT_OURS = ("sewer", "drain", "water", "gas")  # manholes of others


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Extract:
    """What an extract holds: streets, what they may cross, poles and manholes, and remarks."""

    lines: Lines
    obstacles: tuple[tuple[str, Floats], ...]
    places: Places
    notes: tuple[tuple[str, str], ...]


def read_osm(path: Path) -> Extract:
    """
    Read an extract through GDAL; every way with a `highway` that exists is a street.

    Parameters
    ----------
    path
        The file; one that ends in .bz2 is unpacked first.

    Raises
    ------
    GeometryError
        If it cannot be read, or holds no street.
    """
    with _unpacked(path) as plain:
        fields, geometry = _layer(plain, "lines", file=path.name)
        point_fields, points = _layer(plain, "points", file=path.name)
    shapes, first = _coordinates(geometry)
    tags = _Tags(fields, len(geometry))
    highway = tags.column("highway")
    is_street = np.array([bool(word) and word not in _NO_WAY for word in highway], dtype=bool)
    is_street &= np.diff(first) > 1
    if not is_street.any():
        raise GeometryError(
            Problem(
                where=path.name,
                what="holds no street",
                value=f"{len(geometry)} lines, none with a highway tag",
                remedy="Give an extract that holds ways with their highway tags.",
            )
        )
    return Extract(
        lines=_lines(shapes, first, tags, np.flatnonzero(is_street)),
        obstacles=_obstacles(shapes, first, tags),
        places=_places(point_fields, points),
        notes=_left_out(path.name, highway),
    )


@contextlib.contextmanager
def _unpacked(path: Path) -> Iterator[Path]:
    """Yield the path of the extract itself."""
    if path.suffix.lower() != ".bz2":
        yield path
        return
    with tempfile.TemporaryDirectory() as folder:
        plain = Path(folder) / "extract.osm"
        try:
            with bz2.open(path) as packed, plain.open("wb") as out:
                while block := packed.read(1 << 22):
                    out.write(block)
        except (OSError, EOFError, ValueError) as error:
            what = "is damaged or breaks off before its end"
            raise GeometryError(
                Problem(where=path.name, what=what, value=str(error)[:200])
            ) from None
        yield plain


def _layer(path: Path, layer: str, *, file: str) -> tuple[dict[str, Any], Any]:
    """Return the columns and the geometries of one layer."""
    import pyogrio
    import shapely

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of ways that the extract's edge cuts short
            meta, _, wkb, columns = pyogrio.raw.read(path.absolute(), layer=layer)
        geometry = shapely.from_wkb(wkb)
    except Exception as error:  # damaged files bring out faults of the library itself
        text = str(error).replace(str(path.absolute().parent), "")
        raise GeometryError(
            Problem(
                where=file,
                what="cannot be read as an OpenStreetMap extract",
                value=text.replace("extract.osm", file)[:200],
                remedy="It may be damaged or cut short: fetch or export it again.",
            )
        ) from None
    return dict(zip((str(name) for name in meta["fields"]), columns, strict=True)), geometry


def _coordinates(geometry: Any) -> tuple[Floats, Any]:
    import shapely

    lonlat, owner = shapely.get_coordinates(geometry, return_index=True)
    counts = np.bincount(owner, minlength=len(geometry))
    return lonlat, np.concatenate([[0], np.cumsum(counts)])


class _Tags:
    """The tags of features: columns of their own, or one text that holds the rest."""

    def __init__(self, fields: dict[str, Any], count: int) -> None:
        self.fields = fields
        self.count = count
        self.other = [text or "" for text in fields.get("other_tags", [""] * count)]

    def column(self, key: str) -> list[str]:
        """Return the values of one tag, "" where there is none."""
        if key in self.fields:
            return [value or "" for value in self.fields[key]]
        mark = f'"{key}"=>"'
        return [_value(text, mark) if mark in text else "" for text in self.other]


def _value(text: str, mark: str) -> str:
    start = text.index(mark) + len(mark)
    end = start
    while (end := text.find('"', end)) > 0 and text[end - 1] == "\\":
        end += 1
    return text[start:end].replace('\\"', '"') if end > 0 else ""


def _lines(shapes: Floats, first: Any, tags: _Tags, rows: Any) -> Lines:
    sizes = np.diff(first)[rows]
    ends = np.cumsum(sizes)
    within = np.arange(ends[-1]) - np.repeat(ends - sizes, sizes)
    columns = {key: tags.column(key) for key in ("highway", "name", "ref", "bridge", "tunnel")}
    names = [columns["name"][row] or columns["ref"][row] for row in rows]
    tunnels = [columns["tunnel"][row] not in ("", "no", "building_passage") for row in rows]
    return Lines(
        lonlat=shapes[np.repeat(first[:-1][rows], sizes) + within],
        first=np.concatenate([[0], ends]).astype(np.int64),
        road_class=[columns["highway"][row] for row in rows],
        name=[" ".join(name.split()) for name in names],
        placement=[""] * len(rows),
        is_bridge=np.array([columns["bridge"][row] not in ("", "no") for row in rows], dtype=bool),
        is_tunnel=np.array(tunnels, dtype=bool),
    )


def _obstacles(shapes: Floats, first: Any, tags: _Tags) -> tuple[tuple[str, Floats], ...]:
    """Return rail lines, watercourses and motorways that lie open; not those in tunnels."""
    railway, waterway = tags.column("railway"), tags.column("waterway")
    highway, tunnel = tags.column("highway"), tags.column("tunnel")
    found = []
    for row in range(tags.count):
        if tunnel[row] not in ("", "no"):
            continue
        kind = ""
        if railway[row] in _RAIL:
            kind = "rail"
        elif waterway[row] in _WATER:
            kind = "water"
        elif highway[row] == "motorway":
            kind = "motorway"
        if kind:
            found.append((kind, shapes[first[row] : first[row + 1]]))
    return tuple(found)


def _places(fields: dict[str, Any], points: Any) -> Places:
    import shapely

    tags = _Tags(fields, len(points))
    kinds = [""] * len(points)
    for (key, value), kind in _PLACES.items():
        for row, own in enumerate(tags.column(key)):
            if own == value and not kinds[row]:
                kinds[row] = kind
    others = tags.column("manhole")
    rows = [row for row, kind in enumerate(kinds) if kind and others[row] not in _NOT_OURS]
    if not rows:
        return Places()
    return Places(
        kind=tuple(kinds[row] for row in rows), lonlat=shapely.get_coordinates(points[rows])
    )


def _left_out(file: str, highway: list[str]) -> tuple[tuple[str, str], ...]:
    counts = Counter(word for word in highway if word in _NO_WAY)
    if not counts:
        return ()
    told = ", ".join(f"{count} {word}" for word, count in sorted(counts.items()))
    return ((file, f"ways that are no street to lay cable along are left out: {told}"),)
