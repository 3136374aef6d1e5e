"""What the tests of reading share: writing small inputs, and catching what is said of them."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from routeplan.errors import InputError
from routeplan.run import read_run


@pytest.fixture
def write(tmp_path: Path) -> Callable[..., Path]:
    """Return a function that writes text, bytes or JSON into the test's folder."""

    def writer(name: str, content: object) -> Path:
        path = tmp_path / name
        if isinstance(content, bytes):
            path.write_bytes(content)
        else:
            text = content if isinstance(content, str) else json.dumps(content)
            path.write_text(text, encoding="utf-8")
        return path

    return writer


@pytest.fixture
def feature() -> Callable[..., dict[str, Any]]:
    """Return a function that makes a GeoJSON feature of a geometry type and coordinates."""

    def maker(kind: str, coordinates: object, /, **properties: object) -> dict[str, Any]:
        return {
            "type": "Feature",
            "properties": properties,
            "geometry": {"type": kind, "coordinates": coordinates},
        }

    return maker


@pytest.fixture
def collection(write: Callable[..., Path]) -> Callable[..., Path]:
    """Return a function that writes features into `route.geojson`."""

    def writer(*features: object, name: str = "route.geojson", **members: object) -> Path:
        return write(name, {"type": "FeatureCollection", "features": list(features), **members})

    return writer


@pytest.fixture
def road(feature: Callable[..., dict[str, Any]]) -> dict[str, Any]:
    """Return a plain line of two vertices, about 1.1 km long."""
    return feature("LineString", [[10.0, 50.0], [10.0, 50.01]], name="Road")


@pytest.fixture
def run_with(write: Callable[..., Path], road: dict[str, Any]) -> Callable[[str], Path]:
    """Return a function that writes a run file over a plain road, geometry named already."""

    def writer(toml: str) -> Path:
        write("route.geojson", {"type": "FeatureCollection", "features": [road]})
        return write("run.toml", f'geometry = ["route.geojson"]\n{toml}')

    return writer


@pytest.fixture
def said() -> Callable[[Path], list[str]]:
    """Return a function that gives what is wrong with an input, one sentence a problem."""

    def reader(path: Path) -> list[str]:
        with pytest.raises(InputError) as caught:
            read_run(path)
        return [str(problem) for problem in caught.value.problems]

    return reader
