"""Keeping a network beside its source, so that it is read once."""

from __future__ import annotations

import contextlib
import hashlib
import io
import json
import os
import tempfile
import zipfile
import zlib
from collections.abc import Callable, Sequence
from dataclasses import fields
from pathlib import Path
from typing import Any

import numpy as np

from routeplan.streets.model import Network

__all__ = ["cache_path", "cached_network", "file_digest"]

_VERSION = 3  # raise it whenever what is kept, or how it is worked out, changes
_TEXT = ("class_words", "name_words", "placement_words", "place_words", "notes")
_BROKEN = (OSError, EOFError, ValueError, KeyError, TypeError, zipfile.BadZipFile, zlib.error)


def file_digest(path: Path) -> str:
    """Return the BLAKE2 digest of a file's bytes."""
    digest = hashlib.blake2b(digest_size=20)
    with path.open("rb") as file:
        while block := file.read(1 << 22):
            digest.update(block)
    return digest.hexdigest()


def cache_path(source: Path) -> Path:
    """Return where the network of a file is kept."""
    return source.with_name(f"{source.name}.network.npz")


def cached_network(
    sources: Sequence[Path], options: Sequence[object], build: Callable[[], Network]
) -> Network:
    """
    Return the network kept beside the first source, or build and keep it.

    What is kept counts only if every byte of the sources, the options and the version of this
    package's format are the same; anything else, or a damaged file, is built anew. Where nothing
    can be written nothing is kept.

    Parameters
    ----------
    sources
        The files the network is made of.
    options
        What else it depends on.
    build
        Makes it.
    """
    stamp = json.dumps(
        [_VERSION, [file_digest(source) for source in sources], list(map(str, options))]
    )
    place = cache_path(sources[0])
    kept = _load(place, stamp)
    if kept is not None:
        return kept
    network = build()
    with contextlib.suppress(OSError):
        _store(network, place, stamp, mode=sources[0].stat().st_mode)
    return network


def _load(place: Path, stamp: str) -> Network | None:
    try:
        with place.open("rb") as file, np.load(file, allow_pickle=False) as held:
            if bytes(held["stamp"]).decode() != stamp:
                return None
            text = json.loads(bytes(held["text"]).decode())
            arrays = {key: held[key] for key in held.files if key not in ("stamp", "text")}
        words: dict[str, Any] = {key: tuple(text[key]) for key in _TEXT}
        words["notes"] = tuple((where, message) for where, message in text["notes"])
        network = Network(**arrays, **words)
    except _BROKEN:
        return None
    return network if _is_whole(network) else None


def _is_whole(network: Network) -> bool:
    """Tell whether the arrays of a kept network belong together."""
    edges, nodes = len(network.length_m), len(network.node_lonlat)
    return (
        len(network.edge_start) == len(network.edge_end) == len(network.road_class) == edges
        and len(network.row_node) == len(network.row_edge) == 2 * edges
        and len(network.row_first) == nodes + 1
        and len(network.shape_first) == edges + 1
        and int(network.shape_first[-1]) == len(network.shape_lonlat)
    )


def _store(network: Network, place: Path, stamp: str, *, mode: int) -> None:
    text = {key: getattr(network, key) for key in _TEXT}
    arrays = {
        field.name: getattr(network, field.name)
        for field in fields(network)
        if field.name not in _TEXT
    }
    arrays["stamp"] = np.frombuffer(stamp.encode(), dtype=np.uint8)
    arrays["text"] = np.frombuffer(json.dumps(text).encode(), dtype=np.uint8)
    handle, name = tempfile.mkstemp(dir=place.parent, prefix=f".{place.name}.")
    try:
        with io.open(handle, "wb") as file:  # noqa: UP020
            np.savez(file, **arrays)
        os.chmod(name, 0o666 & mode)  # noqa: PTH101
        os.replace(name, place)
    except BaseException:
        with contextlib.suppress(OSError):
            os.unlink(name)  # noqa: PTH108
        raise
