"""Heights that cannot be are named, and those that can are kept."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from routeplan.errors import GeometryError
from routeplan.run import read_run


def written(folder: Path, height: float) -> Path:
    """Write a line with one vertex at a height."""
    path = folder / "road.geojson"
    line = [[10.0, 50.0, 5.0], [10.01, 50.0, height]]
    path.write_text(json.dumps({"type": "LineString", "coordinates": line}), "utf-8")
    return path


@pytest.mark.parametrize("height", [1e308, -1e20, 50_001.0])
def test_a_height_nowhere_on_earth_is_named(tmp_path: Path, height: float) -> None:
    """A height beyond any ground or sea floor, in metres or feet, is an error with its vertex."""
    with pytest.raises(GeometryError, match=r"nowhere on earth \(vertex 2\)"):
        read_run(written(tmp_path, height))


@pytest.mark.parametrize("height", [8849.0, -10_935.0, 29_032.0])
def test_the_highest_and_lowest_places_are_kept(tmp_path: Path, height: float) -> None:
    """The highest mountain, in metres and in feet, and the deepest sea floor pass."""
    (line,) = read_run(written(tmp_path, height)).lines
    assert line.heights_m is not None
    assert line.heights_m.tolist() == [5.0, height]
