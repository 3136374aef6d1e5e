"""Rasters that are opened, and what is said of those that cannot be."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest

from routeplan.errors import CrsError, GeometryError, InputError
from routeplan.ground.terrain import KNOWN, OUTSIDE, far_from_run, heights_at, open_terrain
from tests.ground.terrain_rasters import NORTH, UTM, WEST, lonlat_of, write_tiff

FLAT = np.full((20, 20), 7.0, dtype="float32")


def write_hgt(folder: Path, name: str, values: np.ndarray) -> Path:
    path = folder / name
    values.astype(">i2").tofile(path)
    return path


def write_asc(path: Path, values: np.ndarray, *, head: str, line: str = "\n") -> Path:
    rows = line.join(" ".join(f"{value:g}" for value in row) for row in values)
    path.write_text(f"ncols {values.shape[1]}\nnrows {values.shape[0]}\n{head}\n{rows}\n")
    path.with_suffix(".prj").write_text(UTM)
    return path


def said(error: pytest.ExceptionInfo[InputError]) -> str:
    return str(error.value)


def test_hgt_squares_lie_where_their_names_say_and_share_their_edges(tmp_path: Path) -> None:
    """Samples of a square lie on whole degrees; two neighbours make one sheet without a seam."""
    row, col = np.mgrid[0:1201, 0:1201]
    west = write_hgt(tmp_path, "N36W085.hgt", col + 0 * row)
    east = write_hgt(tmp_path, "n36w084.HGT", 1200 - row + 1200)
    terrain = open_terrain([west, east])
    assert len(terrain.sheets) == 1
    assert (terrain.sheets[0].rows, terrain.sheets[0].cols) == (1201, 2401)
    at = np.array([[-85.0, 36.5], [-84.75, 36.5], [-83.9, 36.75], [-83.5, 36.25]])
    found = heights_at(terrain, at)
    assert np.allclose(found.heights_m, [0.0, 300.0, 2100.0, 1500.0], atol=0.01)
    assert heights_at(terrain, np.array([[-85.1, 36.5]])).state.tolist() == [OUTSIDE]


def test_southern_and_half_wide_hgt_squares_are_read(tmp_path: Path) -> None:
    """S means south; 3601 x 1801 samples are a one-second square of high latitudes."""
    row = np.repeat(np.arange(3601), 1801).reshape(3601, 1801)
    path = write_hgt(tmp_path, "S61E010.hgt", row)
    found = heights_at(open_terrain([path]), np.array([[10.5, -60.25], [10.5, -61.0]]))
    assert np.allclose(found.heights_m, [900.0, 3600.0])


def test_voids_of_an_hgt_square_are_holes(tmp_path: Path) -> None:
    """-32768 stands for no height."""
    values = np.full((1201, 1201), 100)
    values[600, 600] = -32768
    path = write_hgt(tmp_path, "N00E000.hgt", values)
    found = heights_at(open_terrain([path]), np.array([[0.5, 0.5], [0.25, 0.25]]))
    assert np.isnan(found.heights_m).tolist() == [True, False]


@pytest.mark.parametrize(
    ("name", "size", "word"),
    [("hill.hgt", 8, "square it is"), ("N01E001.hgt", 10, "10 bytes"), ("N01E001.hgt", 0, "0 byt")],
)
def test_a_wrong_hgt_file_is_named(tmp_path: Path, name: str, size: int, word: str) -> None:
    """A name that says no square, and a size that is none."""
    (tmp_path / name).write_bytes(bytes(size))
    with pytest.raises(GeometryError) as error:
        open_terrain([tmp_path / name])
    assert word in said(error)


@pytest.mark.parametrize(
    ("head", "shift"),
    [
        (f"xllcorner {WEST}\nyllcorner {NORTH - 60}\ncellsize 10", 0.0),
        (f"XLLCENTER {WEST}\nYLLCENTER {NORTH - 60}\nCELLSIZE 10", 5.0),
        (f"xllcorner {WEST}\nyllcorner {NORTH - 60}\ndx 10\ndy 10", 0.0),
    ],
)
@pytest.mark.parametrize("line", ["\n", "\r\n", "\n\n", " "])
def test_a_text_raster_lies_where_its_head_says(
    tmp_path: Path, head: str, shift: float, line: str
) -> None:
    """The lower left corner and centre differ by half a cell; rows may run together."""
    values = np.arange(48.0).reshape(6, 8)
    path = write_asc(tmp_path / "t.asc", values, head=f"{head}\nNODATA_value 47", line=line)
    terrain = open_terrain([path])
    east, south = np.array([5.0, 35.0, 75.0]) - shift, np.array([5.0, 25.0, 55.0]) + shift
    found = heights_at(terrain, lonlat_of(east, south))
    assert np.allclose(found.heights_m[:2], [0.0, 19.0], atol=1e-4)
    assert np.isnan(found.heights_m[2])


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("ncols 2\nnrows 2\n1 2\n3 4\n", "has no head"),
        ("ncols 2\nnrows 2\nxllcorner 5e5\nyllcorner 53e5\ncellsize -1\n1 2\n3 4\n", "impossible"),
        ("", "has no head"),
        ("ncols two\nnrows 2\n", "has no head"),
    ],
)
def test_a_wrong_head_of_a_text_raster_is_named(tmp_path: Path, text: str, word: str) -> None:
    """A head without a step or with an impossible one is no raster."""
    (tmp_path / "t.asc").write_text(text)
    with pytest.raises(GeometryError) as error:
        open_terrain([tmp_path / "t.asc"], crs=UTM)
    assert word in said(error)


@pytest.mark.parametrize(("rows", "word"), [("1 2\n3", "3 values"), ("1 2\n3 x", "no number")])
def test_wrong_values_of_a_text_raster_are_named_when_met(
    tmp_path: Path, rows: str, word: str
) -> None:
    """Too few values, or one that is none: said with the file's name."""
    head = f"ncols 2\nnrows 2\nxllcorner {WEST}\nyllcorner {NORTH - 20}\ncellsize 10\n"
    (tmp_path / "t.asc").write_text(head + rows)
    terrain = open_terrain([tmp_path / "t.asc"], crs=UTM)
    with pytest.raises(GeometryError) as error:
        heights_at(terrain, lonlat_of(np.array([10.0]), np.array([10.0])))
    assert word in said(error)
    assert "t.asc" in said(error)


def test_every_problem_of_all_files_is_said_at_once(tmp_path: Path) -> None:
    """Missing, of another kind, an empty folder, not what its name says: four problems."""
    (tmp_path / "x.png").write_bytes(b"x")
    (tmp_path / "bad.tif").write_bytes(b"II*\0 not a raster")
    (tmp_path / "empty").mkdir()
    names = ("none.tif", "x.png", "bad.tif", "empty")
    with pytest.raises(GeometryError) as error:
        open_terrain([tmp_path / name for name in names])
    assert len(error.value.problems) == 4
    assert [problem.where for problem in error.value.problems] == list(names)


def test_a_folder_stands_for_the_rasters_in_it(tmp_path: Path) -> None:
    """Other files of the folder are passed over."""
    write_tiff(tmp_path / "b.tif", FLAT)
    write_tiff(tmp_path / "a.tif", FLAT, move=(WEST + 200, NORTH, 10.0, -10.0))
    (tmp_path / "readme.txt").write_text("x")
    terrain = open_terrain([tmp_path])
    assert terrain.sheets[0].names == "a.tif, b.tif"


def test_a_missing_library_is_named_with_the_extra(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Without rasterio a GeoTIFF is refused, and the message says what to install."""
    path = write_tiff(tmp_path / "p.tif", FLAT)
    monkeypatch.setitem(sys.modules, "rasterio", None)
    with pytest.raises(GeometryError, match=r"routeplan\[terrain\]"):
        open_terrain([path])


def test_an_unknown_unit_of_height_is_refused(tmp_path: Path) -> None:
    """Fathoms are not guessed at."""
    path = write_tiff(tmp_path / "p.tif", FLAT, units="fathom")
    with pytest.raises(GeometryError, match="fathom"):
        open_terrain([path])


def test_a_file_cut_short_is_said_to_be_damaged(tmp_path: Path) -> None:
    """A block that cannot be decoded is a named problem, not a traceback of a library."""
    rng = np.random.default_rng(0)
    path = write_tiff(
        tmp_path / "cut.tif", rng.normal(size=(200, 200)).astype("float32"), compress="deflate"
    )
    content = path.read_bytes()
    path.write_bytes(content[:8] + bytes(len(content) // 2) + content[8 + len(content) // 2 :])
    with pytest.raises(GeometryError, match=r"cut\.tif"):
        heights_at(open_terrain([path]), lonlat_of(np.array([1000.0]), np.array([300.0])))


@pytest.mark.parametrize(
    ("crs", "move", "word"),
    [
        (None, (WEST, NORTH, 10.0, -10.0), "does not say which CRS"),
        ("EPSG:4326", (WEST, NORTH, 10.0, -10.0), "not in degrees"),
        (UTM, (9.0, 47.8, 0.001, -0.001), "looks like degrees"),
        ("EPSG:27700", (-3_000_000.0, -4_000_000.0, 10.0, -10.0), "nowhere near"),
        ("EPSG:2154", (WEST, 900_000.0, 10.0, -10.0), "nowhere near"),
    ],
)
def test_a_wrong_crs_tag_is_found(
    tmp_path: Path, crs: str | None, move: tuple[float, float, float, float], word: str
) -> None:
    """Values that cannot be in the CRS that the file declares."""
    path = write_tiff(tmp_path / "p.tif", FLAT, crs=crs, move=move)
    with pytest.raises(InputError, match=word) as error:
        open_terrain([path])
    assert isinstance(error.value, CrsError) == (crs is not None)


def test_a_wrong_zone_is_found_by_the_run_lying_elsewhere(tmp_path: Path) -> None:
    """A tag of the next zone is plausible in itself, but puts the ground 6 degrees away."""
    run = lonlat_of(np.array([50.0, 100.0]), np.array([50.0, 100.0]))
    right = open_terrain([write_tiff(tmp_path / "right.tif", FLAT)])
    wrong = open_terrain([write_tiff(tmp_path / "wrong.tif", FLAT, crs="EPSG:32633")])
    assert far_from_run(right, run) is None
    problem = far_from_run(wrong, run)
    assert problem is not None
    assert "EPSG:32633" in str(problem)
    assert "15.0" in problem.value
    assert (heights_at(wrong, run).state == OUTSIDE).all()


def test_a_raster_without_a_place_is_refused(tmp_path: Path) -> None:
    """No transform: it could lie anywhere."""
    path = write_tiff(tmp_path / "p.tif", FLAT, move=(0.0, 0.0, 1.0, 1.0))
    with pytest.raises(GeometryError, match="where on the earth"):
        open_terrain([path])


def test_the_crs_of_the_run_serves_files_that_say_none(tmp_path: Path) -> None:
    """A raster without a CRS takes the one that is given."""
    path = write_tiff(tmp_path / "p.tif", FLAT, crs=None)
    terrain = open_terrain([path], crs=UTM)
    at = lonlat_of(np.array([100.0]), np.array([100.0]))
    assert heights_at(terrain, at).state.tolist() == [KNOWN]
