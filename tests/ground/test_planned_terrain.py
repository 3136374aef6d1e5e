"""Whole runs over GeoTIFF terrains: run file in, plan document out."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pyproj
import pytest
from numpy.typing import NDArray

from routeplan.errors import InputError
from routeplan.sheets.document import plan_document
from tests.ground.runs_on_ground import planned_with
from tests.ground.terrain_rasters import NORTH, SPHERE_M, WEST, lonlat_of, surface, write_tiff
from tests.sheets.plans import line

Floats = NDArray[np.float64]
Row = dict[str, Any]
TERRAIN = 'terrain = "hills.tif"\n'
SCALE = 0.9996  # of UTM on its central meridian, along which and across which the way goes


def way(*east_south_m: tuple[float, float], placement: str = "duct") -> Row:
    """Return a line through points so many metres from the rasters' outer corner."""
    at = np.array(east_south_m, dtype=float)
    points = lonlat_of(at[:, 0], at[:, 1]).tolist()
    return line(points, name="Way", placement=placement)


ALONG = way((105.0, 205.0), (2_105.0, 205.0))


def plane(east_m: Floats, south_m: Floats) -> Floats:
    """Return heights that rise by a tenth to the east and by a twentieth to the south. [m]"""
    return 100.0 + 0.1 * east_m + 0.05 * south_m


def document_of(folder: Path, *features: Row, toml: str = TERRAIN) -> Row:
    """Return the plan document of a run in a folder."""
    document: Row = plan_document(planned_with(folder, toml, *features))
    return document


def leg_of(document: Row) -> Row:
    """Return its only leg."""
    (leg,) = document["legs"]
    found: Row = leg
    return found


def warnings_of(document: Row, text: str) -> list[str]:
    """Return the warnings that hold a text."""
    return [one["message"] for one in document["warnings"] if text in one["message"]]


def slope_length_m(grid_m: float, rise_m: float, *, middle_m: float) -> float:
    """Return the length over an even slope drawn on the grid, at a height above the ellipsoid."""
    return float(np.hypot(grid_m / SCALE * (1 + middle_m / SPHERE_M), rise_m))


@pytest.mark.parametrize(
    ("ends", "rise_m"),
    [
        (((105.0, 205.0), (2_105.0, 205.0)), 200.0),
        (((205.0, 105.0), (205.0, 2_105.0)), 100.0),
        (((105.0, 105.0), (2_105.0, 2_105.0)), 300.0),
    ],
)
def test_a_tilted_plane_in_a_grid_gives_its_slope_length(
    tmp_path: Path, ends: tuple[tuple[float, float], ...], rise_m: float
) -> None:
    """Eastward, southward and across, the ground is as long as the plane's slope says."""
    write_tiff(tmp_path / "hills.tif", surface(plane, side=250, step_m=10.0))
    document = document_of(tmp_path, way(*ends))
    leg = leg_of(document)
    first, last = (plane(np.array(east), np.array(south)) for east, south in ends)
    grid_m = float(np.hypot(*np.subtract(ends[1], ends[0])))
    expected = slope_length_m(grid_m, rise_m, middle_m=float(first + last) / 2)
    # The expected length takes a sphere's radius for the ellipsoid's: 0.3 % of h / R, 0.2 ppm.
    assert leg["ground_m"] == pytest.approx(expected, rel=1e-6)
    assert leg["line"][0][2] == pytest.approx(float(first), abs=0.002)
    assert leg["line"][-1][2] == pytest.approx(float(last), abs=0.002)
    assert leg["heights_from"] == ["terrain"]
    (said,) = [one for one in document["assumptions"] if one["name"] == "heights of leg Way"]
    assert said["source"] == "hills.tif"
    assert "took 0.0 m off" in said["reason"]


def test_two_tiles_are_one_terrain(tmp_path: Path) -> None:
    """Cut in two on its way, a plane gives the length and heights of the uncut one."""
    heights = surface(plane, side=250, step_m=10.0)
    write_tiff(tmp_path / "hills.tif", heights)
    tiles = tmp_path / "tiles"
    tiles.mkdir()
    write_tiff(tiles / "west.tif", heights[:, :117])
    write_tiff(tiles / "east.tif", heights[:, 117:], move=(WEST + 1_170.0, NORTH, 10.0, -10.0))
    whole = leg_of(document_of(tmp_path, ALONG))
    cut = document_of(tmp_path, ALONG, toml='terrain = "tiles"\n')
    assert leg_of(cut)["line"] == whole["line"]
    assert leg_of(cut)["ground_m"] == whole["ground_m"]
    assert not warnings_of(cut, "has no height")
    listed = document_of(tmp_path, ALONG, toml='terrain = ["tiles/east.tif", "tiles/west.tif"]\n')
    assert leg_of(listed)["line"] == whole["line"]


def test_a_hole_is_named_by_its_stations(tmp_path: Path) -> None:
    """Where cells declare no height the warning says from where to where, and the slope goes on."""
    heights = surface(plane, side=250, step_m=10.0)
    heights[:, 60:100] = 777.0  # centres from 605 to 995 m: 500 to 890 m along the way
    write_tiff(tmp_path / "hills.tif", heights, nodata=777.0)
    document = document_of(tmp_path, ALONG)
    (said,) = warnings_of(document, "has no height")
    words = said.split()
    begin_m, end_m = float(words[words.index("from") + 1]), float(words[words.index("to") + 1])
    # Ground metres are 1.005 of the grid's; stations stand at most a cell of 10 m apart.
    assert begin_m == pytest.approx(490 * 1.0054, abs=11.0)
    assert end_m == pytest.approx(900 * 1.0054, abs=11.0)
    assert "straight between the known heights" in said
    expected = slope_length_m(2_000.0, 200.0, middle_m=220.0)
    assert leg_of(document)["ground_m"] == pytest.approx(expected, rel=2e-6)


def test_a_raster_over_half_the_run_leaves_the_rest_level(tmp_path: Path) -> None:
    """East of the raster the way is as long as on the ellipsoid, and the stretch is said."""
    write_tiff(tmp_path / "hills.tif", surface(plane, side=110, step_m=10.0))
    document = document_of(tmp_path, ALONG)
    (said,) = warnings_of(document, "outside the terrain")
    assert "taken as level" in said
    expected = slope_length_m(995.0, 99.5, middle_m=165.0) + 1_005.0 / SCALE
    leg = leg_of(document)
    # The step over the raster's edge counts as level with its known end: at most 10 m of slope.
    assert leg["ground_m"] == pytest.approx(expected, abs=0.06)
    assert leg["line"][0][2:] == pytest.approx([plane(np.array(105.0), np.array(205.0))], abs=0.01)


def test_a_wrong_crs_tag_is_a_named_problem(tmp_path: Path) -> None:
    """Another zone, degrees on metres, and no CRS are refused with the raster's name."""
    heights = surface(plane, side=250, step_m=10.0)
    for crs, said in (
        ("EPSG:32633", "covers no part of the run"),
        ("EPSG:4326", "is not in degrees"),
        (None, "does not say which CRS"),
    ):
        write_tiff(tmp_path / "hills.tif", heights, crs=crs)
        with pytest.raises(InputError, match=said) as caught:
            document_of(tmp_path, ALONG)
        assert "hills.tif" in str(caught.value)


def real_heights() -> tuple[Floats, Floats, Floats]:
    """
    Return a real terrain, row 0 in the north, with longitudes and latitudes of its centres.

    3 arc-seconds in the Appalachians, from the sample data of the matplotlib wheel; what it calls
    `ymin` is the northern edge.
    """
    cbook = pytest.importorskip("matplotlib.cbook")
    data = cbook.get_sample_data("jacksboro_fault_dem.npz")
    heights = data["elevation"].astype(np.float64)
    rows, cols = heights.shape
    lon = float(data["xmin"]) + (np.arange(cols) + 0.5) * float(data["dx"])
    lat = float(data["ymin"]) - (np.arange(rows) + 0.5) * float(data["dy"])
    return heights, lon, lat


def write_real(path: Path, heights: Floats, lon: Floats, lat: Floats) -> None:
    """Write heights at centres given in degrees."""
    dx, dy = lon[1] - lon[0], lat[1] - lat[0]
    move = (lon[0] - dx / 2, lat[0] - dy / 2, dx, dy)
    write_tiff(path, heights.astype("float32"), move=move, crs="EPSG:4326")


def plain_bilinear(heights: Floats, lon: Floats, lat: Floats, points: Floats) -> list[float]:
    """Return heights of points one by one, from the four centres around each."""
    found = []
    for x, y in points.tolist():
        col, row = int(np.searchsorted(lon, x)) - 1, int(np.searchsorted(-lat, -y)) - 1
        u = (x - lon[col]) / (lon[col + 1] - lon[col])
        v = (y - lat[row]) / (lat[row + 1] - lat[row])
        north = heights[row, col] * (1 - u) + heights[row, col + 1] * u
        south = heights[row + 1, col] * (1 - u) + heights[row + 1, col + 1] * u
        found.append(float(north * (1 - v) + south * v))
    return found


REAL_WAY = [[-84.38, 36.70], [-84.25, 36.66], [-84.20, 36.52]]


def test_heights_of_a_real_terrain_are_bilinear(tmp_path: Path) -> None:
    """Every station of the plan has the height that four real cells around it give."""
    heights, lon, lat = real_heights()
    write_real(tmp_path / "hills.tif", heights, lon, lat)
    toml = f"{TERRAIN}[ground]\nsmooth_wave_m = 0.0\n"
    leg = leg_of(document_of(tmp_path, line(REAL_WAY, name="Way"), toml=toml))
    stations = np.array(leg["line"])
    assert len(stations) > 300
    expected = plain_bilinear(heights, lon, lat, stations[:, :2])
    # The document's degrees are rounded to 1 mm: on the steepest cells that is less in height.
    assert np.abs(stations[:, 2] - expected).max() < 0.002
    geod = pyproj.Geod(ellps="WGS84")
    _, _, level_m = geod.inv(*stations[:-1, :2].T, *stations[1:, :2].T)
    middle = (stations[1:, 2] + stations[:-1, 2]) / 2
    steps_m = np.hypot(level_m * (1 + middle / SPHERE_M), np.diff(stations[:, 2]))
    assert leg["ground_m"] == pytest.approx(float(steps_m.sum()), rel=1e-6)


def test_invented_noise_on_a_real_terrain_is_taken_off_and_said(tmp_path: Path) -> None:
    """Noise of 2 m in every cell of 9 m leaves the length within 0.2 %, and a warning shows."""
    heights, lon, lat = real_heights()
    # A window of the real terrain, ten times as fine, so that noise has a cell of 9 m to stand on.
    fine_lon = np.linspace(lon[45], lon[90], 451)
    fine_lat = np.linspace(lat[40], lat[60], 201)
    points = np.stack(np.meshgrid(fine_lon + 1e-9, fine_lat - 1e-9), axis=-1).reshape(-1, 2)
    quiet = np.array(plain_bilinear(heights, lon, lat, points)).reshape(201, 451)
    noisy = quiet + np.random.Generator(np.random.PCG64(7)).normal(0.0, 2.0, quiet.shape)
    way = line([[fine_lon[5], fine_lat[10]], [fine_lon[440], fine_lat[180]]], name="Way")
    write_real(tmp_path / "hills.tif", quiet, fine_lon, fine_lat)
    raw = document_of(tmp_path, way, toml=f"{TERRAIN}[ground]\nsmooth_wave_m = 0.0\n")
    still = document_of(tmp_path, way)
    write_real(tmp_path / "hills.tif", noisy, fine_lon, fine_lat)
    loud = document_of(tmp_path, way)
    length_m = leg_of(loud)["ground_m"]
    assert length_m == pytest.approx(leg_of(still)["ground_m"], rel=0.002)
    assert length_m == pytest.approx(leg_of(raw)["ground_m"], rel=0.002)
    assert warnings_of(loud, "its terrain is noisy")
    assert not warnings_of(still, "its terrain is noisy")
    assert leg_of(loud)["smoothed_off_m"] > 0.005 * length_m
