"""Fetching streets with OSMnx where there is a network: with a deadline, and clear errors."""

from __future__ import annotations

import multiprocessing
import os
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from routeplan.errors import InputError, Problem
from routeplan.streets.model import Network

__all__ = ["Request", "download_streets", "downloaded_network"]

_INSTEAD = "Give a local file with --streets: .osm, .osm.pbf, .osm.bz2, .graphml or a line layer."
_RADIUS_MAX_M = 100_000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Request:
    """
    What to fetch: a place by its name, a box (west, south, east, north), or a radius round a point.

    `server` is the address of another server of the same interface; None: OSMnx's own choice.
    """

    by: Literal["place", "box", "radius"]
    place: str = ""
    box: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)
    lon: float = 0.0
    lat: float = 0.0
    radius_m: float = 0.0
    server: str | None = None


def download_streets(request: Request, folder: Path, *, deadline_s: float = 120.0) -> Path:
    """
    Fetch streets as a GraphML file in a folder and return its path.

    The fetching runs in a process of its own, which is ended at the deadline: nothing hangs.

    Parameters
    ----------
    request
        What to fetch.
    folder
        Where the file goes; answers already there are used again.
    deadline_s
        How long it may take. [s]

    Raises
    ------
    InputError
        If the request makes no sense, the network or server fails, or the deadline passes.
    """
    _check(request, deadline_s)
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / f"streets_{_label(request)}.graphml"
    if path.is_file():
        return path
    handle, name = tempfile.mkstemp(dir=folder, suffix=".part.graphml")
    os.close(handle)
    part = Path(name)
    try:
        said = _in_time(request, part, folder, deadline_s)
        if said is not None:
            raise InputError(_problem(request, said, deadline_s))
        part.replace(path)
    finally:
        part.unlink(missing_ok=True)
    return path


def _check(request: Request, deadline_s: float) -> None:
    west, south, east, north = request.box
    problem = None
    if request.by == "place" and not request.place.strip():
        problem = ("has no name", "")
    elif request.by == "box" and not (
        -180.0 <= west < east <= 180.0 and -90.0 <= south < north <= 90.0
    ):
        problem = ("is no box", f"{west:g}, {south:g}, {east:g}, {north:g}")
    elif request.by == "radius" and not (
        abs(request.lon) <= 180.0
        and abs(request.lat) <= 90.0
        and 0.0 < request.radius_m <= _RADIUS_MAX_M
    ):
        problem = (
            "is out of range",
            f"{request.radius_m:g} m round {request.lon:g}, {request.lat:g}",
        )
    elif not deadline_s > 0.0:
        problem = ("has a deadline that is not more than 0 s", f"{deadline_s:g} s")
    if problem:
        raise InputError(
            Problem(where=f"streets by {request.by}", what=problem[0], value=problem[1])
        )


def _label(request: Request) -> str:
    from hashlib import blake2b

    return blake2b(repr(request).encode(), digest_size=8).hexdigest()


def _in_time(request: Request, path: Path, folder: Path, deadline_s: float) -> str | None:
    """Return what went wrong, or None once the file is there."""
    context = multiprocessing.get_context("spawn")
    receiver, sender = context.Pipe(duplex=False)
    worker = context.Process(
        target=_fetch, args=(request, str(path), str(folder), deadline_s, sender), daemon=True
    )
    worker.start()
    sender.close()
    try:
        if not receiver.poll(deadline_s):
            return "deadline"
        said = receiver.recv()
        return None if said is None else str(said)
    except EOFError:
        return "the fetching process ended without an answer"
    finally:
        if worker.is_alive():
            worker.terminate()
            worker.join(2.0)
            if worker.is_alive():
                worker.kill()
        worker.join(5.0)
        receiver.close()


def _fetch(request: Request, path: str, folder: str, deadline_s: float, sender: Any) -> None:
    """Fetch in a process of its own; send None, or what went wrong."""
    try:
        _fetch_graph(request, path, folder, deadline_s)
    except BaseException as error:  # whatever it is, the other side has to hear of it
        sender.send(f"{type(error).__name__}: {error}")
    else:
        sender.send(None)
    finally:
        sender.close()


def _fetch_graph(request: Request, path: str, folder: str, deadline_s: float) -> None:
    import osmnx

    settings: Mapping[str, object] = {
        "cache_folder": str(Path(folder) / "answers"),
        "use_cache": True,
        "overpass_rate_limit": False,  # asking for the limit is what hangs without a network
        "doh_url_template": None,  # addresses as the system resolves them
        "requests_timeout": max(deadline_s / 2.0, 1.0),
        "log_console": False,
    }
    for key, value in settings.items():
        setattr(osmnx.settings, key, value)
    if request.server:
        osmnx.settings.overpass_url = request.server
        osmnx.settings.nominatim_url = request.server
    kind: Any = {"network_type": "all", "retain_all": True, "simplify": True}
    if request.by == "place":
        graph = osmnx.graph_from_place(request.place, **kind)
    elif request.by == "box":
        graph = osmnx.graph_from_bbox(request.box, **kind)
    else:
        graph = osmnx.graph_from_point((request.lat, request.lon), dist=request.radius_m, **kind)
    osmnx.save_graphml(graph, path)


def _problem(request: Request, said: str, deadline_s: float) -> Problem:
    where = f"streets by {request.by}"
    if said == "deadline":
        what, value, limit = "did not arrive in time", "", f"{deadline_s:g} s"
        return Problem(where=where, what=what, value=value, limit=limit, remedy=_INSTEAD)
    kind, _, text = said.partition(": ")
    if kind in ("ConnectionError", "NewConnectionError", "gaierror", "SSLError", "ProxyError"):
        what = "cannot be fetched: there is no connection to the street server"
    elif kind in ("ReadTimeout", "ConnectTimeout", "Timeout"):
        what = "cannot be fetched: the street server does not answer"
    elif kind in ("InsufficientResponseError", "KeyError"):
        what = "cannot be fetched: the street server's answer holds no streets"
    elif kind == "ResponseStatusCodeError":
        what = "cannot be fetched: the street server refuses"
    else:
        what = "cannot be fetched"
    return Problem(where=where, what=what, value=f"{kind}: {text}"[:200], remedy=_INSTEAD)


def downloaded_network(request: Request, folder: Path, *, deadline_s: float = 120.0) -> Network:
    """Fetch streets and read them; see `download_streets` and `read_network`."""
    from routeplan.streets.reading import read_network

    return read_network(download_streets(request, folder, deadline_s=deadline_s))
