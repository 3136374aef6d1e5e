"""Rasters, layers of what may be crossed and streets: found, and their bytes counted in."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from routeplan.errors import GeometryError, Problem
from routeplan.run.geometry import file_and_layer
from routeplan.run.model import LayerSource, RasterSource, StreetFile, StreetFiles
from routeplan.run.practice import LayerColumns
from routeplan.run.street_rules import StreetRules
from routeplan.run.trouble import Trouble, looked_in

if TYPE_CHECKING:
    from hashlib import _Hash

__all__ = ["layer_sources", "raster_sources", "street_files"]

_BLOCK_BYTES = 1 << 20  # rasters and extracts are counted in without being held in memory
_BESIDE = {  # what else belongs to a file: its CRS, its place, its table
    ".asc": (".prj",),
    ".tif": (".tfw", ".tif.aux.xml", ".tif.msk"),
    ".tiff": (".tfw", ".tiff.aux.xml", ".tiff.msk"),
    ".shp": (".cpg", ".dbf", ".prj", ".shx"),
}


def raster_sources(
    names: Sequence[str], folder: Path, *, digest: _Hash, trouble: Trouble
) -> tuple[RasterSource, ...]:
    """
    Return the rasters of heights that a run names, in its order; they are not opened yet.

    Parameters
    ----------
    names
        Files and folders as the run file has them.
    folder
        What relative names are relative to.
    digest
        Of all input bytes; theirs are added.
    trouble
        Where problems are noted.
    """
    found = []
    for name in names:
        path = folder / name
        own = _digest(path, name, digest=digest, trouble=trouble)
        if own is not None:
            found.append(RasterSource(file=name, path=str(path), digest=own))
    return tuple(found)


def layer_sources(
    declared: Sequence[LayerColumns], folder: Path, *, digest: _Hash, trouble: Trouble
) -> tuple[LayerSource, ...]:
    """
    Return the layers of what may be crossed that a run names; they are not read yet.

    Parameters
    ----------
    declared
        Files with their columns, as the run file has them.
    folder
        What relative names are relative to.
    digest
        Of all input bytes; theirs are added.
    trouble
        Where problems are noted.
    """
    found = []
    for columns in declared:
        file, layer = file_and_layer(columns.file, folder)
        path = folder / file
        own = _digest(path, file, digest=digest, trouble=trouble)
        if own is not None:
            source = LayerSource(
                file=file, path=str(path), layer=layer, columns=columns, digest=own
            )
            found.append(source)
    return tuple(found)


def street_files(
    rules: StreetRules, folder: Path, *, digest: _Hash, trouble: Trouble
) -> StreetFiles:
    """
    Return the files in which ways of legs are found; they are not read yet.

    Parameters
    ----------
    rules
        What the run file says of streets.
    folder
        What relative names are relative to.
    digest
        Of all input bytes; theirs are added.
    trouble
        Where problems are noted.
    """

    def found(names: Sequence[str]) -> tuple[StreetFile, ...]:
        files = []
        for name in names:
            file, _ = file_and_layer(name, folder)
            own = _digest(folder / file, file, digest=digest, trouble=trouble)
            if own is not None:
                files.append(StreetFile(file=name, path=str(folder / name), digest=own))
        return tuple(files)

    return StreetFiles(
        rules=rules,
        streets=found(rules.files),
        existing=found(rules.existing),
        avoid=found(rules.avoid),
        keep_to=found(rules.keep_to),
    )


def _digest(path: Path, name: str, *, digest: _Hash, trouble: Trouble) -> str | None:
    """Return the digest of a file and what belongs to it, or None with the problem noted."""
    own = hashlib.sha256()
    try:
        for part in _parts(path):
            with part.open("rb") as file:
                while block := file.read(_BLOCK_BYTES):
                    own.update(block)
                    digest.update(block)
    except FileNotFoundError:
        _refuse(trouble, name, "is not there", remedy=looked_in(path))
    except PermissionError:
        _refuse(trouble, name, "may not be read by this user")
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        _refuse(trouble, name, "cannot be read", value=reason or type(error).__name__)
    else:
        return own.hexdigest()
    return None


def _parts(path: Path) -> Iterator[Path]:
    """Yield a file and those beside it that belong to it; of a folder, all files in it."""
    if path.is_dir():
        yield from (part for part in sorted(path.iterdir()) if part.is_file())
        return
    yield path
    for suffix in _BESIDE.get(path.suffix.lower(), ()):
        beside = path.with_name(path.stem + suffix)
        if beside.is_file():
            yield beside


def _refuse(trouble: Trouble, file: str, what: str, *, value: str = "", remedy: str = "") -> None:
    problem = Problem(where=file, what=what, value=value, remedy=remedy)
    trouble.add(GeometryError, problem, file=file)
