"""What is suspicious about lines and places taken together."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from routeplan.errors import CrsError, GeometryError, Problem
from routeplan.geodesy import wrapped
from routeplan.run.model import Floats, Line, Place
from routeplan.run.trouble import Trouble, shown

__all__ = ["check_together"]

_JUMP_KM = 20.0
_KM_PER_DEG = 111.0  # a rough one will do: it only decides what is worth a warning
_FAR_DEG = 2.0
_NEAR_DEG = 0.5


def check_together(lines: Sequence[Line], places: Sequence[Place], *, trouble: Trouble) -> None:
    """Note duplicate lines and site names, long jumps, and coordinates that look swapped."""
    _check_twins(lines, trouble)
    _check_site_names(places, trouble)
    for line in lines:
        _check_jumps(line, trouble)
    _check_swapped(lines, places, trouble)


def _check_twins(lines: Sequence[Line], trouble: Trouble) -> None:
    seen: dict[bytes, Line] = {}
    for line in lines:
        forward, backward = line.lonlat.tobytes(), line.lonlat[::-1].tobytes()
        twin = seen.setdefault(min(forward, backward), line)
        if twin is not line:
            problem = Problem(
                where=str(line.source),
                what="is the same line as another",
                value=f"that of {twin.source}",
                remedy="Take one out.",
            )
            trouble.add(GeometryError, problem, file=line.source.file)


def _check_site_names(places: Sequence[Place], trouble: Trouble) -> None:
    seen: dict[str, Place] = {}
    for place in places:
        if place.kind != "site" or "kind_assumed" in place.properties:
            continue
        twin = seen.setdefault(place.name, place)
        if twin is not place:
            problem = Problem(
                where=str(place.source),
                what="is a site with the name of another",
                value=f"{shown(place.name)}, as in {twin.source}",
                remedy="Give every site its own name.",
            )
            trouble.add(GeometryError, problem, file=place.source.file)


def _check_jumps(line: Line, trouble: Trouble) -> None:
    steps = np.diff(line.lonlat, axis=0)
    east = wrapped(steps[:, 0]) * np.cos(np.radians(line.lonlat[1:, 1]))
    far = np.hypot(east, steps[:, 1]) * _KM_PER_DEG
    at = int(np.argmax(far))
    if far[at] > _JUMP_KM:
        message = f"jumps about {far[at]:.0f} km between vertices {at + 1} and {at + 2}"
        kind = "jumps many kilometres between two vertices"
        trouble.warn(str(line.source), message, file=line.source.file, kind=kind)


def _check_swapped(lines: Sequence[Line], places: Sequence[Place], trouble: Trouble) -> None:
    """Note files whose points or lines lie far off, but near once latitude comes first."""
    groups: dict[tuple[str, str | None], list[Floats]] = {}
    for line in lines:
        groups.setdefault((line.source.file, "lines"), []).append(line.lonlat)
    if not groups:
        return
    main = np.concatenate(next(iter(groups.values())))
    for place in places:
        position = np.array([[place.lon, place.lat]])
        groups.setdefault((place.source.file, "points"), []).append(position)
    for (file, what), parts in list(groups.items())[1:]:
        middle = np.median(np.concatenate(parts), axis=0)
        if _off(middle, main) > _FAR_DEG and _off(middle[::-1], main) < _NEAR_DEG:
            problem = Problem(
                where=file,
                what=f"has {what} whose longitude and latitude look swapped",
                value=f"around {middle[0]:.4f}, {middle[1]:.4f}",
                remedy="Write longitude first.",
            )
            trouble.add(CrsError, problem, file=file)


def _off(position: Floats, main: Floats) -> float:
    """Return how many degrees a position lies outside the box of the main lines."""
    low, high = main.min(axis=0), main.max(axis=0)
    return float(np.maximum(np.maximum(low - position, position - high), 0.0).max())
