"""Reading GPX: tracks, routes and waypoints together, heights and times as they were recorded."""

from __future__ import annotations

import math
from collections.abc import Iterator
from xml.etree import ElementTree as ET

import numpy as np

from routeplan.errors import GeometryError, Problem
from routeplan.run.crs import crs_or_none
from routeplan.run.model import Source
from routeplan.run.shapes import Layer, Shape, feature_label
from routeplan.run.trouble import Trouble, shown

__all__ = ["layers_from_gpx", "xml_problem"]

_TEXTS = ("name", "desc", "cmt", "type", "sym")


def layers_from_gpx(content: bytes, *, file: str, trouble: Trouble) -> list[Layer]:
    """
    Read the bytes of a GPX file; what is wrong is noted in `trouble`.

    A track segment is a line of its own; a track whose points have times is a recording. A height
    that is missing is NaN, not 0.

    Parameters
    ----------
    content
        The file's bytes.
    file
        Its name, for messages.
    trouble
        Where problems are noted.
    """
    problem = xml_problem(content, file=file)
    root = None
    if problem is None:
        try:
            root = ET.fromstring(content)
        except (ET.ParseError, ValueError, LookupError, RecursionError) as error:
            problem = Problem(where=file, what="is not well-formed XML", value=str(error))
    if problem is None and root is not None and _local(root) != "gpx":
        problem = Problem(where=file, what="is not GPX", value=f"root element {_local(root)}")
    if problem is not None or root is None:
        trouble.add(GeometryError, problem or Problem(where=file, what="is empty"), file=file)
        return []
    layer = Layer(file=file, name=None, crs=crs_or_none("OGC:CRS84"), default_crs=None, loose=True)
    for number, element in enumerate(root, start=1):
        layer.shapes.extend(_shapes(element, number, file=file, trouble=trouble))
    return [layer]


def xml_problem(content: bytes, *, file: str) -> Problem | None:
    """Return what speaks against parsing XML at all: entities, or bytes that are no text."""
    if b"<!ENTITY" in content:
        return Problem(
            where=file,
            what="declares XML entities, which a map file has no need of",
            remedy="Export it again.",
        )
    head = content[:200].lower()
    if (b"encoding" in head and b"utf-8" not in head) or content[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return None
    try:
        content.decode("utf-8")
    except UnicodeDecodeError as error:
        byte = f"byte {error.start} is 0x{content[error.start]:02x}"
        return Problem(
            where=file, what="is not UTF-8 text", value=byte, remedy="Save the file as UTF-8."
        )
    return None


def _local(element: ET.Element) -> str:
    return str(element.tag).rpartition("}")[2]


def _shapes(element: ET.Element, number: int, *, file: str, trouble: Trouble) -> Iterator[Shape]:
    kind = _local(element)
    groups = {"wpt": [[element]], "rte": [_children(element, "rtept")], "trk": []}.get(kind)
    if groups is None:
        return
    if kind == "trk":
        groups = [_children(part, "trkpt") for part in _children(element, "trkseg")]
    properties = _properties(element)
    source = Source(
        file=file, layer=kind, feature=feature_label(properties.get("name"), None, number)
    )
    for part, points in enumerate(groups, start=1):
        if len(points) < (1 if kind == "wpt" else 2):
            trouble.warn(str(source), "has a part of less than two points, left out", file=file)
            continue
        vertices = _vertices(points, source, trouble)
        if vertices is None:
            continue
        yield Shape(
            kind="point" if kind == "wpt" else "line",
            xy=np.ascontiguousarray(vertices[:, :2]),
            z=np.ascontiguousarray(vertices[:, 2]),
            properties=properties,
            source=source,
            is_track=kind == "trk" and any(_children(point, "time") for point in points),
            part=part,
        )


def _children(element: ET.Element, name: str) -> list[ET.Element]:
    return [child for child in element if _local(child) == name]


def _properties(element: ET.Element) -> dict[str, object]:
    """Return the texts of an element and of everything in its extensions."""
    found: dict[str, object] = {}
    for child in element:
        name = _local(child)
        if name in _TEXTS and child.text:
            found[name] = child.text
        elif name == "extensions":
            leaves = (leaf for leaf in child.iter() if not len(leaf) and leaf.text)
            found.update((_local(leaf), leaf.text) for leaf in leaves if leaf is not child)
    return found


def _vertices(
    points: list[ET.Element], source: Source, trouble: Trouble
) -> np.ndarray[tuple[int, int], np.dtype[np.float64]] | None:
    rows = np.empty((len(points), 3))
    for number, point in enumerate(points):
        height = next((child.text for child in point if _local(child) == "ele"), None)
        texts = (point.get("lon"), point.get("lat"), "nan" if height is None else height)
        try:
            rows[number] = [math.nan if text is None else float(text) for text in texts]
        except ValueError:
            bad = " ".join(str(text) for text in texts if text is not None)
            problem = Problem(
                where=str(source),
                what="has a point that is not numbers",
                value=f"point {number + 1}: {shown(bad)}",
            )
            trouble.add(GeometryError, problem, file=source.file)
            return None
    return rows
