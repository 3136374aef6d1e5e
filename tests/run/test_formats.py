"""Every vector format: KML, KMZ, GPX, GeoPackage, shapefiles and others, and how they break."""

from __future__ import annotations

import warnings
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyproj
import pytest

from routeplan.run import read_run

STREETS = Path(__file__).parents[1] / "reference" / "streets"

KML = """<?xml version="1.0" encoding="UTF-8"?>
<kml xmlns="http://www.opengis.net/kml/2.2" xmlns:gx="http://www.google.com/kml/ext/2.2">
<Document>
  <Folder><name>Ways</name>
    <Placemark id="x1"><name>Hill &amp; dale</name><description>a note</description>
      <ExtendedData><Data name="placement"><value>aerial</value></Data>
        <Data name="owner"><value>them</value></Data></ExtendedData>
      <LineString><coordinates>10,50,3 10,50.01,4</coordinates></LineString></Placemark>
    <Folder><name>Deep</name>
      <Placemark><name>Mast</name><Point><coordinates>10,50.01,4</coordinates></Point></Placemark>
    </Folder>
  </Folder>
  <Folder><name>Ways</name>
    <Placemark><name>Ride</name><gx:Track>
      <when>2010-05-28T02:02:09Z</when><when>2010-05-28T02:02:35Z</when>
      <gx:coord>10 50.01 5</gx:coord><gx:coord>10 50.02 6</gx:coord></gx:Track></Placemark>
    <Placemark><name>Both</name><MultiGeometry>
      <Point><coordinates>10,50.02</coordinates></Point>
      <LineString><coordinates>10,50.02 10,50.03</coordinates></LineString>
    </MultiGeometry></Placemark>
    <Placemark><name>Nothing</name></Placemark>
  </Folder>
  <Placemark><name>Hole 1</name>
    <ExtendedData><Data name="kind"><value>handhole</value></Data>
      <Data name="loop_m"><value>12.5</value></Data>
      <Data name="joint"><value>Avoid</value></Data>
      <Data name="role"><value></value></Data></ExtendedData>
    <Point><coordinates>10,50.005</coordinates></Point></Placemark>
</Document></kml>
"""

GPX = """<?xml version="1.0" encoding="UTF-8"?>
<gpx xmlns="http://www.topografix.com/GPX/1/1" version="1.1" xmlns:r="urn:x">
  <wpt lat="50.0" lon="10.0"><ele>7</ele><name>Studio</name><extensions>
    <r:kind>site</r:kind><r:role>studio</r:role></extensions></wpt>
  <wpt lat="50.03" lon="10.0"><name>End</name></wpt>
  <rte><name>Plan</name><rtept lat="50.02" lon="10.0"/><rtept lat="50.03" lon="10.0"/></rte>
  <trk><name>Walk</name><extensions><r:placement>buried</r:placement></extensions>
    <trkseg>
      <trkpt lat="50.0" lon="10.0"><ele>7</ele><time>2010-01-01T00:00:00Z</time></trkpt>
      <trkpt lat="50.01" lon="10.0"><time>2010-01-01T00:01:00Z</time></trkpt>
      <trkpt lat="50.015" lon="10.0"><ele>9</ele><time>2010-01-01T00:01:30Z</time></trkpt>
    </trkseg>
    <trkseg><trkpt lat="50.015" lon="10.0"/><trkpt lat="50.02" lon="10.0"/></trkseg>
    <trkseg><trkpt lat="50.015" lon="10.0"/></trkseg>
  </trk>
</gpx>
"""


def write_lines(
    path: Path,
    lines: list[Any],
    driver: str,
    crs: str | None,
    *,
    append: bool = False,
    layer: str | None = None,
    **columns: list[object],
) -> Path:
    """Write lines with columns through GDAL."""
    import shapely
    from pyogrio.raw import write

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        write(
            path,
            shapely.to_wkb(np.array(lines, dtype=object), output_dimension=3),
            [
                np.array(values, dtype=object if isinstance(values[0], str) else None)
                for values in columns.values()
            ],
            list(columns),
            driver=driver,
            crs=crs,
            geometry_type=lines[0].geom_type + (" Z" if lines[0].has_z else ""),
            layer=layer,
            append=append,
        )
    return path


def a_line(*positions: tuple[float, ...]) -> Any:
    import shapely

    return shapely.LineString(positions)


@pytest.mark.parametrize("suffix", [".kml", ".kmz"])
def test_kml_is_read_with_all_its_folders(suffix: str, write: Callable[..., Path]) -> None:
    """Lines, points and tracks come from every folder, with extended data as properties."""
    path = write("route.kml", KML)
    if suffix == ".kmz":
        path = path.with_suffix(".kmz")
        with zipfile.ZipFile(path, "w") as archive:
            archive.writestr("doc.kml", KML)
    run = read_run(path)
    lines = {line.name: line for line in run.lines}
    places = {place.name: place for place in run.places}
    assert set(lines) == {"Hill & dale", "Ride", "Both"}
    assert lines["Hill & dale"].placement == "aerial"
    assert lines["Hill & dale"].properties == {"description": "a note", "owner": "them"}
    assert lines["Hill & dale"].heights_m is not None
    assert lines["Hill & dale"].heights_m.tolist() == [3.0, 4.0]
    assert [lines[name].is_track for name in ("Hill & dale", "Ride", "Both")] == [
        False,
        True,
        False,
    ]
    assert set(places) == {"Mast", "Both", "Hole 1"}
    hole = places["Hole 1"]
    assert (hole.kind, hole.loop_m, hole.joint, hole.role) == ("handhole", 12.5, "avoid", None)
    assert "kind_assumed" in places["Mast"].properties
    assert "kind_assumed" not in hole.properties
    assert [message for _, message in run.warnings] == ["has no geometry and plays no part"]
    assert 'feature "Nothing"' in run.warnings[0][0]


def test_gpx_is_read_whole(write: Callable[..., Path]) -> None:
    """Tracks, routes and waypoints come together; a missing height is NaN, never 0."""
    run = read_run(write("route.gpx", GPX))
    assert [line.name for line in run.lines] == ["Plan", "Walk", "Walk"]
    assert [line.is_track for line in run.lines] == [False, True, False]
    assert [line.placement for line in run.lines] == [None, "buried", "buried"]
    heights = run.lines[1].heights_m
    assert heights is not None
    assert np.array_equal(heights, [7.0, np.nan, 9.0], equal_nan=True)
    assert run.lines[0].heights_m is None
    studio, end = run.places
    assert (studio.name, studio.kind, studio.role, studio.height_m) == (
        "Studio",
        "site",
        "studio",
        7,
    )
    assert (end.name, end.kind, end.height_m) == ("End", "site", None)
    assert "kind_assumed" in end.properties
    assert [message for _, message in run.warnings] == [
        "has a part of less than two points, left out"
    ]


@pytest.mark.parametrize(
    ("content", "part"),
    [
        ("<gpx><trk>", "is not well-formed XML (no element found: line 1, column 10)"),
        ("<kml/>", "is not GPX (root element kml)"),
        ("nothing", "is not well-formed XML (syntax error"),
        (
            '<!DOCTYPE g [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;">]><gpx>&b;</gpx>',
            "declares XML entities",
        ),
        ('<?xml version="1.0" encoding="x-no"?><gpx/>', "is not well-formed XML (unknown encoding"),
        ("<gpx/>", "holds no line"),
        (
            '<gpx><rte><rtept lat="x" lon="1"/><rtept lat="1" lon="2"/></rte></gpx>',
            'has a point that is not numbers (point 1: "1 x nan")',
        ),
        (
            '<gpx><rte><rtept lat="1"/><rtept lat="1" lon="2"/></rte></gpx>',
            "has a coordinate that is not a finite number (vertex 1)",
        ),
        (
            '<gpx><rte><rtept lat="95" lon="1"/><rtept lat="1" lon="2"/></rte></gpx>',
            "has a latitude beyond 90 degrees (95)",
        ),
        (b"<gpx>\xff</gpx>", "is not UTF-8 text (byte 5 is 0xff)"),
        (b"", "is empty"),
    ],
)
def test_broken_gpx_is_named(
    content: object, part: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """Files cut off, of another kind, or made to explode are told apart."""
    messages = said(write("route.gpx", content))
    assert any(part in message for message in messages), messages


@pytest.mark.parametrize(
    ("content", "part"),
    [
        (KML[:600], "route.kml: is damaged or breaks off before its end"),
        ("<kml>", "route.kml: is damaged or breaks off before its end"),
        (KML.replace("Mast", "\xff").encode("latin-1"), "route.kml: is not UTF-8 text (byte "),
        (
            '<!DOCTYPE kml [<!ENTITY a "a"><!ENTITY b "&a;&a;">]><kml>&b;</kml>',
            "route.kml: declares XML entities",
        ),
        ("plain text", "route.kml: is damaged or breaks off before its end (ERROR parsing"),
    ],
)
def test_broken_kml_is_named(
    content: object, part: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """What the library says of a broken file is put in plain words, without its path."""
    path = write("route.kml", content)
    (message,) = said(path)
    assert part in message
    assert str(path.parent) not in message


def test_a_geopackage_in_a_national_grid_is_put_on_the_earth(tmp_path: Path) -> None:
    """Real streets taken to a grid and read back are where they were, on WGS 84 and GRS 80."""
    streets = read_run(STREETS / "helsinki_streets.geojson").lines
    to_grid = pyproj.Transformer.from_crs("OGC:CRS84", "EPSG:3067", always_xy=True)
    lines = [a_line(*np.column_stack(to_grid.transform(*line.lonlat.T))) for line in streets]
    path = write_lines(
        tmp_path / "streets.gpkg", lines, "GPKG", "EPSG:3067", Name=[s.name for s in streets]
    )
    run = read_run(path)
    geod = pyproj.Geod(ellps="GRS80")
    for street, line in zip(streets, run.lines, strict=True):
        assert line.name == street.name
        assert line.lonlat == pytest.approx(street.lonlat, abs=1e-9)
        assert line.inverse_flattening == pytest.approx(298.257222101)
        expected_m = geod.line_length(*street.lonlat.T)
        assert geod.line_length(*line.datum_lonlat.T) == pytest.approx(expected_m, abs=1e-4)
    assert run.warnings == ()


def test_layers_of_a_geopackage_are_read_all_or_by_name(
    tmp_path: Path, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """A run may take the whole file, or one layer by `file|layer`; a wrong name lists them."""
    path = tmp_path / "net.gpkg"
    for at, layer in enumerate(("ways", "spurs")):
        line = a_line((10.0, 50.0 + at), (10.0, 50.01 + at))
        write_lines(
            path, [line], "GPKG", "EPSG:4326", layer=layer, append=bool(at), placement=["duct"]
        )
    assert [line.source.layer for line in read_run(path).lines] == ["ways", "spurs"]
    run = read_run(write("run.toml", 'geometry = ["net.gpkg|spurs"]'))
    assert [line.source.layer for line in run.lines] == ["spurs"]
    assert run.title == "net"
    assert said(write("run.toml", 'geometry = ["net.gpkg|spur"]')) == [
        'net.gpkg: has no such layer ("spur", one of ways, spurs). Did you mean "spurs"?'
    ]


@pytest.mark.parametrize("form", ["plain", "zipped", "shz"])
def test_shapefiles_are_read_plain_and_zipped(form: str, tmp_path: Path) -> None:
    """Column names cut to ten characters are known again; columns are text and numbers."""
    line = a_line((400_000.0, 700_000.0, 5.0), (400_100.0, 700_000.0, 6.0))
    columns: dict[str, list[object]] = {
        "name": ["Lease"],
        "placement": ["existing"],
        "existing_m": [120.0],
        "existing_d": [0.5],
    }
    suffix = "shz" if form == "shz" else "shp"
    path = tmp_path / f"route.{suffix}"
    write_lines(path, [line], "ESRI Shapefile", "EPSG:27700", **columns)
    if form == "zipped":
        with zipfile.ZipFile(tmp_path / "route.zip", "w") as archive:
            for part in tmp_path.glob("route.*"):
                if part.suffix != ".zip":
                    archive.write(part, part.name)
        path = tmp_path / "route.zip"
    (read,) = read_run(path).lines
    assert (read.name, read.placement, read.existing_m, read.existing_db) == (
        "Lease",
        "existing",
        120.0,
        0.5,
    )
    assert read.heights_m is not None
    assert read.heights_m.tolist() == [5.0, 6.0]
    assert read.semi_major_m == 6377563.396


def test_a_shapefile_without_a_crs_needs_one_named(
    tmp_path: Path, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """A file that does not say its CRS is not guessed at: the run file has to say it."""
    line = a_line((532_410.0, 181_220.0, 1.0), (532_510.0, 181_220.0, 1.0))
    path = write_lines(tmp_path / "route.shp", [line], "ESRI Shapefile", None, name=["STL"])
    assert said(path) == [
        'route.shp, layer "route": does not say which CRS it is in. '
        'Name their CRS, for example crs = "EPSG:27700".'
    ]
    run = read_run(write("run.toml", 'geometry = ["route.shp"]\ncrs = "EPSG:27700"'))
    assert run.lines[0].semi_major_m == 6377563.396


def test_a_shapefile_without_its_other_files_is_told(
    tmp_path: Path, said: Callable[[Path], list[str]]
) -> None:
    """Names are lost with the .dbf file, which is warned of; without .shx nothing can be read."""
    line = a_line((10.0, 50.0, 1.0), (10.0, 50.01, 1.0))
    path = write_lines(tmp_path / "r.shp", [line], "ESRI Shapefile", "EPSG:4326", name=["a"])
    path.with_suffix(".dbf").unlink()
    assert "has no .dbf file beside it" in read_run(path).warnings[0][1]
    path.with_suffix(".shx").unlink()
    (message,) = said(path)
    assert message.startswith("r.shp: cannot be read (Unable to open r.shx")


def test_a_shapefile_cut_short_is_an_error(
    tmp_path: Path, said: Callable[[Path], list[str]]
) -> None:
    """The library reads missing records as empty ones: lines would be lost without a word."""
    lines = [a_line((10.0, 50.0 + i, 0.0), (10.0, 50.01 + i, 0.0)) for i in range(5)]
    path = write_lines(
        tmp_path / "route.shp", lines, "ESRI Shapefile", "EPSG:4326", name=list("abcde")
    )
    content = path.read_bytes()
    path.write_bytes(content[: len(content) // 2])
    (message,) = said(path)
    assert f"breaks off before its end ({len(content) // 2} bytes, limit {len(content)}" in message


@pytest.mark.parametrize("driver", ["FlatGeobuf", "GML", "CSV"])
def test_other_formats_are_read(driver: str, tmp_path: Path, write: Callable[..., Path]) -> None:
    """Whatever GDAL reads is read; numbers that a format carries as text are numbers again."""
    if driver == "CSV":
        write("route.csv", 'name,placement,WKT\nHill,duct,"LINESTRING (10 50, 10 50.01)"\n')
        path = write("run.toml", 'geometry = ["route.csv"]\ncrs = "OGC:CRS84"')
    else:
        suffix = {"FlatGeobuf": "fgb", "GML": "gml"}[driver]
        path = write_lines(
            tmp_path / f"route.{suffix}",
            [a_line((10.0, 50.0), (10.0, 50.01))],
            driver,
            "EPSG:4326",
            name=["Hill"],
            placement=["duct"],
        )
    (line,) = read_run(path).lines
    assert (line.name, line.placement) == ("Hill", "duct")
    assert line.lonlat.tolist() == [[10.0, 50.0], [10.0, 50.01]]


@pytest.mark.parametrize(
    ("name", "content", "part"),
    [
        ("route.gpkg", b"", "route.gpkg: is empty"),
        ("route.gpkg", b"SQLite format 3\0" + b"\0" * 99, "is damaged or breaks off"),
        ("route.shz", b"PK\3\4broken", "is of no format that can be read"),
        ("route.kmz", b"PK\3\4broken", "is of no format that can be read"),
        ("route.csv", b"a,b\n1,2\n", "has no layer with a geometry (route)"),
        ("route.vrt", b"<OGRVRTDataSource/>", "points at data elsewhere instead of holding it"),
        ("ro!te.gpkg", b"x", "has an exclamation mark in its path"),
        ("route.xyz", bytes(range(256)), "is of no format that can be read"),
    ],
)
def test_files_of_no_use_are_named(
    name: str,
    content: bytes,
    part: str,
    write: Callable[..., Path],
    said: Callable[[Path], list[str]],
) -> None:
    """Empty, damaged and foreign files give a message of their own and no traceback."""
    (message,) = said(write(name, content))
    assert part in message


def test_a_geopackage_cut_short_is_an_error(
    tmp_path: Path, said: Callable[[Path], list[str]]
) -> None:
    """A damaged database is named as such."""
    lines = [a_line((10.0, 50.0 + i / 100), (10.0, 50.005 + i / 100)) for i in range(500)]
    path = write_lines(
        tmp_path / "r.gpkg", lines, "GPKG", "EPSG:4326", name=[f"n{i}" for i in range(500)]
    )
    content = path.read_bytes()
    path.write_bytes(content[: len(content) // 2])
    assert any("is damaged or breaks off before its end" in message for message in said(path))


def test_wrong_geometry_types_are_named(tmp_path: Path, said: Callable[[Path], list[str]]) -> None:
    """Points alone make no run."""
    import shapely

    path = write_lines(
        tmp_path / "r.gpkg", [shapely.Point(10.0, 50.0)], "GPKG", "EPSG:4326", name=["Mast"]
    )
    assert said(path) == ["r.gpkg: holds no line. Draw the way of the cable as at least one line."]
