"""Reading a whole run: a run file, the folder it is in, or a bare geometry file."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from routeplan.errors import CrsError, Problem, RunFileError
from routeplan.run.crs import crs_or_none, unusable
from routeplan.run.geometry import (
    VECTOR_SUFFIXES,
    Geometry,
    background_from_files,
    file_bytes,
    geometry_from_files,
)
from routeplan.run.mark_files import marks_from_files
from routeplan.run.model import Run
from routeplan.run.practice import LayerColumns
from routeplan.run.runfile import Declared, declared_from_text
from routeplan.run.sources import layer_sources, raster_sources, street_files
from routeplan.run.street_rules import stop_problems
from routeplan.run.trouble import Trouble, listed, shown

if TYPE_CHECKING:
    from hashlib import _Hash

    from pyproj import CRS

__all__ = ["RUN_FILE", "read_run"]

RUN_FILE = "run.toml"
"""Name of the run file in a folder that is given as a run."""


def read_run(path: str | Path) -> Run:
    """
    Read a run and every vector file it names, defaults filled in.

    Parameters
    ----------
    path
        A run file, a folder holding `run.toml`, or a bare geometry file (all defaults).

    Raises
    ------
    InputError
        With every problem found in the run file and the geometry: `RunFileError`,
        `GeometryError` or `CrsError` if they are all of one kind.
    """
    trouble = Trouble()
    run = _read(Path(path), trouble)
    trouble.raise_if_any()
    assert run is not None
    return run


def _read(path: Path, trouble: Trouble) -> Run | None:
    if path.is_dir():
        path = path / RUN_FILE
        if not path.is_file():
            remedy = "Give a geometry file, or write a run file for one: routeplan new GEOMETRY."
            what = f"is a folder without a {RUN_FILE}"
            _refuse(trouble, str(path.parent), what, remedy=remedy)
            return None
    is_bare = path.suffix.lower() != ".toml"
    content: bytes | None = b""
    if not is_bare:
        content = file_bytes(path, file=path.name, trouble=trouble)
    if content is None:
        return None
    declared = declared_from_text(content, file=path.name, trouble=trouble)
    names = (path.name,) if is_bare else _geometry_names(declared, path, trouble)
    head = declared.head
    run_crs = _run_crs(head.crs if head else None, file=path.name, trouble=trouble)
    geometry = geometry_from_files(
        names,
        path.parent,
        run_crs=run_crs,
        placement=head.placement if head else "duct",
        trouble=trouble,
        may_lack_lines="leg" in declared.given,
    )
    _check_stops(declared, geometry, file=path.name, trouble=trouble)
    geometry.contents.insert(0, content)
    background = background_from_files(
        head.background if head else (),
        path.parent,
        run_crs=run_crs,
        geometry=geometry,
        trouble=trouble,
    )
    digest = _digest(geometry.contents)
    named = head.terrain if head else ()
    terrain = raster_sources(named, path.parent, digest=digest, trouble=trouble)
    layers = layer_sources(_layers(declared), path.parent, digest=digest, trouble=trouble)
    marks = marks_from_files(
        head.marks if head else (), path.parent, declared.marks, digest=digest, trouble=trouble
    )
    streets = None
    if declared.streets is not None:
        streets = street_files(declared.streets, path.parent, digest=digest, trouble=trouble)
    if trouble.problems:
        return None
    return replace(
        _run(declared, geometry, names, trouble),
        background=background,
        terrain=terrain,
        layers=layers,
        streets=streets,
        marks=marks,
        digest=digest.hexdigest(),
    )


def _refuse(trouble: Trouble, where: str, what: str, *, value: str = "", remedy: str = "") -> None:
    trouble.add(RunFileError, Problem(where=where, what=what, value=value, remedy=remedy))


def _geometry_names(declared: Declared, path: Path, trouble: Trouble) -> tuple[str, ...]:
    """Return the files a run names, or the only vector file beside a run file that names none."""
    if declared.head is None:
        return ()
    if declared.head.geometry is not None:
        return declared.head.geometry
    if "geometry" in declared.given:
        return ()
    streets = declared.streets.files if declared.streets else ()
    beside = sorted(
        p.name
        for p in path.parent.iterdir()
        if p.suffix.lower() in VECTOR_SUFFIXES and p.name not in streets
    )
    if len(beside) != 1:
        _refuse(
            trouble,
            f"{path.name}, geometry",
            "is not given, and the folder does not hold exactly one vector file",
            value=listed(beside) or "none",
            remedy='Name the file, for example geometry = ["route.geojson"].',
        )
        return ()
    return (beside[0],)


def _check_stops(declared: Declared, geometry: Geometry, *, file: str, trouble: Trouble) -> None:
    """Note the sites of legs to be found that the geometry does not have."""
    if declared.streets and not declared.legs:
        trouble.warn(f"{file}, streets", "plays no part: no leg is to be found along streets")
    if not geometry.places:
        return
    sites = [place.name for place in geometry.places if place.kind == "site"]
    for problem in stop_problems(declared.legs, sites):
        trouble.add(RunFileError, replace(problem, where=f"{file}, {problem.where}"))


def _run_crs(name: str | None, *, file: str, trouble: Trouble) -> CRS | None:
    if name is None:
        return None
    crs = crs_or_none(name)
    reason = unusable(crs) if crs else "is not a known CRS"
    if reason:
        problem = Problem(
            where=f"{file}, crs",
            what=reason,
            value=shown(name),
            remedy='Name it by code, for example crs = "EPSG:27700".',
        )
        trouble.add(CrsError, problem)
        return None
    return crs


def _run(declared: Declared, geometry: Geometry, names: tuple[str, ...], trouble: Trouble) -> Run:
    head = declared.head
    assert head is not None
    assert declared.cable is not None
    assert declared.practice is not None
    return Run(
        title=head.title or _title(names),
        purpose=head.purpose,
        units=head.units,
        crs=head.crs,
        lines=tuple(geometry.lines),
        places=tuple(geometry.places),
        areas=tuple(geometry.areas),
        placement=head.placement,
        cable=declared.cable,
        cables=declared.cables,
        interfaces=declared.interfaces,
        circuits=declared.circuits,
        panels=declared.panels,
        joints=declared.joints,
        sections=declared.sections,
        marks=declared.marks,
        legs=declared.legs,
        practice=declared.practice,
        given=declared.given,
        digest="",
        warnings=trouble.closed_warnings(),
    )


def _title(names: tuple[str, ...]) -> str:
    return Path(names[0].partition("|")[0]).name.partition(".")[0]


def _layers(declared: Declared) -> tuple[LayerColumns, ...]:
    """Return the layers a run names, those without columns of their own first."""
    plain = declared.head.layers if declared.head else ()
    return (*(LayerColumns(file=file) for file in plain), *declared.layers)


def _digest(contents: list[bytes]) -> _Hash:
    digest = hashlib.sha256()
    for content in contents:
        digest.update(content)
    return digest
