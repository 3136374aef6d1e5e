"""Reading a network from files of any kind, kept beside its source."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from routeplan.errors import GeometryError, Problem
from routeplan.streets.cache import cached_network
from routeplan.streets.model import Floats, Network

__all__ = ["StreetSource", "options_of", "read_network"]

_OSM = (".osm", ".pbf", ".bz2")


@dataclass(frozen=True, slots=True, kw_only=True)
class StreetSource:
    """
    Where streets come from and how they are read.

    `existing` files hold routes that are there already; `existing_placement` is theirs where they
    do not say. `noded` puts a junction wherever lines of a layer cross or end on each other.
    """

    streets: Sequence[Path]
    existing: Sequence[Path] = ()
    existing_placement: str = "duct"
    link_m: float = 30.0
    crs: str | None = None
    noded: bool = False


def read_network(source: StreetSource | str | Path) -> Network:
    """
    Read streets, and routes that are there already, as one network.

    Formats: `.osm`, `.osm.pbf`, `.osm.bz2`, `.graphml`, and any vector file of lines in any CRS.

    Parameters
    ----------
    source
        What to read; a bare path is one file of streets.

    Raises
    ------
    GeometryError, CrsError
        With what is wrong with the files.
    """
    if not isinstance(source, StreetSource):
        source = StreetSource(streets=(Path(source),))
    files = [_file_of(path) for path in (*source.streets, *source.existing)]
    options = options_of(source)
    return cached_network(files, options, lambda: _built(source))


def options_of(source: StreetSource) -> tuple[object, ...]:
    """Return what a network depends on besides the bytes of its files."""
    return (
        len(source.streets),
        [path.name for path in (*source.streets, *source.existing)],
        source.existing_placement,
        source.link_m,
        source.crs,
        source.noded,
    )


def _file_of(path: Path) -> Path:
    """Return the file itself, without a layer's name; raise if it is not there."""
    name, bar, _ = path.name.rpartition("|")
    file = path.with_name(name) if bar and not path.exists() else path
    if file.is_file():
        return file
    what = "is a folder, not a file of streets" if file.is_dir() else "is not there"
    raise GeometryError(
        Problem(
            where=file.name,
            what=what,
            value=f"looked for in {file.absolute().parent}",
            remedy="Give an .osm, .osm.pbf, .osm.bz2 or .graphml file, or a layer of lines.",
        )
    )


def _built(source: StreetSource) -> Network:
    from routeplan.streets.assemble import Lines, Places, assembled, joined_lines
    from routeplan.streets.noding import linked_lines, noded_lines

    lines: list[Lines] = []
    obstacles: list[tuple[str, Floats]] = []
    notes: list[tuple[str, str]] = []
    places = Places()
    for path in source.streets:
        suffix = path.suffix.lower()
        if suffix in _OSM:
            from routeplan.streets.osm import read_osm

            extract = read_osm(path)
            lines.append(extract.lines)
            obstacles.extend(extract.obstacles)
            notes.extend(extract.notes)
            places = extract.places if extract.places.kind else places
        elif suffix == ".graphml":
            from routeplan.streets.graphml import read_graphml

            lines.append(read_graphml(path))
        else:
            from routeplan.streets.layers import read_layers

            layer, said = read_layers(path, crs=source.crs)
            lines.append(noded_lines(layer) if source.noded else layer)
            notes.extend(said)
    streets = joined_lines(lines)
    if source.existing:
        from routeplan.streets.layers import read_layers

        routes = []
        for path in source.existing:
            layer, said = read_layers(path, crs=source.crs, placement=source.existing_placement)
            routes.append(noded_lines(layer) if source.noded else layer)
            notes.extend(said)
        streets = linked_lines(streets, joined_lines(routes), link_m=source.link_m)
    where = ", ".join(path.name for path in source.streets)
    return assembled(streets, obstacles=obstacles, places=places, where=where, notes=notes)
