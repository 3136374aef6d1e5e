"""GeoJSON: what it holds, and every way it can be wrong."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from routeplan.errors import GeometryError, InputError
from routeplan.run import read_run

Feature = Callable[..., dict[str, Any]]
STREETS = Path(__file__).parents[1] / "reference" / "streets"
LINE = [[10.0, 50.0], [10.0, 50.01]]


def test_a_bare_line_is_a_run() -> None:
    """One road line without a property is all that is needed."""
    run = read_run(STREETS / "helsinki_road.geojson")
    (line,) = run.lines
    assert run.title == "helsinki_road"
    assert line.name == ""
    assert line.placement is None
    assert line.heights_m is None
    assert line.datum_lonlat is line.lonlat
    assert (line.semi_major_m, line.inverse_flattening) == (6378137.0, 298.257223563)
    assert run.warnings == ()


def test_vertices_are_those_of_the_file() -> None:
    """Degrees on WGS 84 come through unchanged, and cannot be changed."""
    path = STREETS / "helsinki_streets.geojson"
    drawn = json.loads(path.read_text(encoding="utf-8"))["features"]
    for line, feature in zip(read_run(path).lines, drawn, strict=True):
        assert line.name == feature["properties"]["name"]
        assert line.lonlat.tolist() == feature["geometry"]["coordinates"]
        with pytest.raises(ValueError, match="read-only"):
            line.lonlat[0, 0] = 0.0


@pytest.mark.parametrize("wrap", ["FeatureCollection", "Feature", "Geometry", "Collection"])
def test_every_root_is_read(wrap: str, write: Callable[..., Path], feature: Feature) -> None:
    """A file may hold features, one feature, a geometry, or a collection of geometries."""
    one = feature("LineString", LINE)
    roots: dict[str, object] = {
        "FeatureCollection": {"type": "FeatureCollection", "features": [one]},
        "Feature": one,
        "Geometry": one["geometry"],
        "Collection": {
            "type": "GeometryCollection",
            "geometries": [{"type": "GeometryCollection", "geometries": [one["geometry"]]}],
        },
    }
    run = read_run(write("route.geojson", roots[wrap]))
    assert [line.lonlat.tolist() for line in run.lines] == [LINE]


def test_parts_of_multi_geometries_are_lines_and_places_of_their_own(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Parts keep the properties of their feature; points beyond the first are numbered."""
    run = read_run(
        collection(
            feature("MultiLineString", [LINE, [[10.0, 50.01], [10.0, 50.02]]], placement="duct"),
            feature("MultiPoint", [LINE[0], LINE[1]], name="Hole", kind="handhole"),
            feature("MultiPolygon", [[[*LINE, [10.1, 50.0], LINE[0]]]], kind="avoid"),
        )
    )
    assert [line.placement for line in run.lines] == ["duct", "duct"]
    assert [place.name for place in run.places] == ["Hole", "Hole (2)"]
    assert [len(ring) for ring in run.areas[0].rings] == [4]


def test_heights_are_kept_and_missing_ones_are_not_zero(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """A vertex without a height has NaN; a line without any has None."""
    mixed = [[10.0, 50.0, 5.0], [10.0, 50.01], [10.0, 50.02, None], [10.0, 50.03, 7.0, 99.0]]
    run = read_run(
        collection(
            feature("LineString", mixed),
            feature("LineString", [[10.0, 50.03], [10.0, 50.04]]),
            feature("Point", [10.0, 50.0, 5.5], name="A", kind="site"),
        )
    )
    assert run.lines[0].heights_m is not None
    assert np.array_equal(run.lines[0].heights_m, [5.0, np.nan, np.nan, 7.0], equal_nan=True)
    assert run.lines[1].heights_m is None
    assert run.places[0].height_m == 5.5


def test_heights_that_are_all_zero_are_taken_as_unknown(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Programs write 0 where they know no height: a profile of zeros would be a false one."""
    run = read_run(collection(feature("LineString", [[10.0, 50.0, 0], [10.0, 50.01, 0]])))
    assert run.lines[0].heights_m is None
    assert run.warnings == (("route.geojson", "all heights are 0: taken as not known"),)


def test_repeated_vertices_are_dropped(collection: Callable[..., Path], feature: Feature) -> None:
    """A vertex drawn twice is one; of its heights the one that is known stays."""
    drawn = [[10.0, 50.0], [10.0, 50.0, 4.0], [10.0, 50.01, 6.0], [10.0, 50.01, 8.0]]
    (line,) = read_run(collection(feature("LineString", drawn))).lines
    assert line.lonlat.tolist() == LINE
    assert line.heights_m is not None
    assert line.heights_m.tolist() == [4.0, 6.0]


def test_longitudes_beyond_the_antimeridian_are_brought_back(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Lines over the antimeridian are often written on to 181 degrees."""
    (line,) = read_run(collection(feature("LineString", [[179.99, -17.0], [180.01, -17.0]]))).lines
    assert line.lonlat[:, 0] == pytest.approx([179.99, -179.99])


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "route.geojson: is empty."),
        (b" \n", "route.geojson: is empty."),
        (
            b'{"type": "LineString", "name": "\xff"}',
            "route.geojson: is not UTF-8 text (byte 32 is 0xff). Save the file as UTF-8.",
        ),
        (
            b'{"type": "LineString", "coordinates": [[1, 2], [1,',
            "route.geojson: breaks off before its end (Expecting value in line 1, column 51).",
        ),
        (
            b'{"type": "LineStr',
            "route.geojson: breaks off before its end "
            "(Unterminated string starting at in line 1, column 10).",
        ),
        (
            b'{"type": nothing}',
            "route.geojson: is not JSON (Expecting value in line 1, column 10).",
        ),
        (b"[1, 2]", "route.geojson: is JSON but not GeoJSON ([1, 2])."),
        (b"[" * 100_000, "route.geojson: is nested too deeply."),
        (b"1" + b"0" * 5000, "route.geojson: holds a number with too many digits."),
        (
            b'{"type": "Topology"}',
            'route.geojson: is not GeoJSON (type is "Topology", one of FeatureCollection, Feature, '
            "Point, MultiPoint, LineString, MultiLineString, Polygon, MultiPolygon, "
            "GeometryCollection).",
        ),
        (b'{"type": "FeatureCollection"}', "route.geojson: has no list of features."),
        (
            b'{"type": "FeatureCollection", "features": []}',
            "route.geojson: holds no line. Draw the way of the cable as at least one line.",
        ),
        (
            b'{"type": "FeatureCollection", "features": [5]}',
            "route.geojson, feature 1: is not a GeoJSON Feature (5).",
        ),
    ],
)
def test_a_file_that_is_not_geojson_is_named(
    content: bytes, message: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """Broken files are told apart: empty, cut off, not text, not JSON, not GeoJSON."""
    assert said(write("route.geojson", content)) == [message]


@pytest.mark.parametrize(
    ("kind", "coordinates", "message"),
    [
        (
            "LineString",
            [[10.0, 50.0]],
            "is a line of no length: all its vertices are one point (10, 50).",
        ),
        (
            "LineString",
            [[10.0, 50.0]] * 3,
            "is a line of no length: all its vertices are one point (10, 50).",
        ),
        ("LineString", "10, 50", 'has coordinates that are not a list of positions ("10, 50").'),
        ("LineString", None, "has coordinates that are not a list of positions (null)."),
        (
            "LineString",
            [["10", "50"], ["10", "51"]],
            'has a position that is not two or three numbers (["10", "50"]).',
        ),
        (
            "LineString",
            [[10.0], [11.0]],
            "has a position that is not two or three numbers ([10.0]).",
        ),
        (
            "LineString",
            [10.0, 50.0],
            "has a position that is not two or three numbers (10.0).",
        ),
        (
            "LineString",
            [[True, False], [False, True]],
            "has a position that is not two or three numbers ([true, false]).",
        ),
        (
            "LineString",
            [[10**400, 50], [10, 51]],
            "has a position that is not two or three numbers ([1" + "0" * 75 + "...).",
        ),
        ("MultiLineString", 5, "has MultiLineString coordinates that are not a list (5)."),
        ("Polygon", 5, "has Polygon coordinates that are not a list (5)."),
        ("Circle", LINE, 'has a geometry of a type that plays no part here ("Circle").'),
    ],
)
def test_wrong_coordinates_are_named(
    kind: str,
    coordinates: object,
    message: str,
    *,
    collection: Callable[..., Path],
    feature: Feature,
    said: Callable[[Path], list[str]],
) -> None:
    """A feature whose coordinates cannot be read is named, not skipped."""
    path = collection(feature(kind, coordinates, name="Hill"))
    assert said(path) == [f'route.geojson, feature "Hill": {message}']


@pytest.mark.parametrize("wrong", ["NaN", "Infinity", "1e999", "-1e999"])
@pytest.mark.parametrize("place", ["lon", "height"])
def test_numbers_that_are_not_finite_are_named(
    wrong: str, place: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """A vertex at infinity is named by its number; a height that is NaN is only not known."""
    vertex = f"[{wrong}, 50, 1]" if place == "lon" else f"[10, 50.01, {wrong}]"
    path = write(
        "route.geojson",
        f'{{"type": "LineString", "coordinates": [[10, 50, 1], {vertex}, [10, 50.02, 1]]}}',
    )
    if (wrong, place) == ("NaN", "height"):
        assert len(read_run(path).lines) == 1
    else:
        expected = "has a coordinate that is not a finite number (vertex 2)."
        assert said(path) == [f"route.geojson, feature 1: {expected}"]


@pytest.mark.parametrize(
    "geometry", [None, {"type": "LineString", "coordinates": []}], ids=["null", "empty"]
)
def test_features_without_geometry_are_left_out_with_a_warning(
    geometry: object, collection: Callable[..., Path], road: dict[str, Any]
) -> None:
    """Nothing is silently dropped: a feature with nothing to draw is warned of."""
    run = read_run(
        collection(road, {"type": "Feature", "id": 7, "properties": None, "geometry": geometry})
    )
    assert len(run.lines) == 1
    where = "route.geojson, feature id 7"
    assert run.warnings == ((where, "has no geometry and plays no part"),)


def test_a_collection_in_itself_is_not_followed_for_ever(
    collection: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """Deep nesting of collections is refused."""
    geometry: dict[str, Any] = {"type": "LineString", "coordinates": LINE}
    for _ in range(50):
        geometry = {"type": "GeometryCollection", "geometries": [geometry]}
    (message,) = said(collection({"type": "Feature", "properties": {}, "geometry": geometry}))
    assert "has a collection without a list of geometries" in message


def test_thousands_of_problems_are_summarised(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """Twenty of a kind are shown and the others counted, kind by kind."""
    dots = [feature("LineString", [[10.0, 50.0]], name=f"L{n}") for n in range(1000)]
    kinds = [feature("Point", [10.0, 50.0], name=f"P{n}", kind="tree") for n in range(30)]
    messages = said(collection(*dots, *kinds))
    assert len(messages) == 42
    assert messages[-2:] == [
        "route.geojson: and 980 more of the same kind: "
        "is a line of no length: all its vertices are one point.",
        "route.geojson: and 10 more of the same kind: is not a known kind.",
    ]


def test_warnings_are_summarised_too(collection: Callable[..., Path], road: object) -> None:
    """A file full of empty features gives twenty warnings and a count."""
    empty = {"type": "Feature", "properties": None, "geometry": None}
    run = read_run(collection(road, *[empty] * 50))
    assert len(run.warnings) == 21
    assert run.warnings[-1][1].startswith("and 30 more of the same kind")


def test_the_same_line_twice_is_an_error(
    collection: Callable[..., Path], feature: Feature, said: Callable[[Path], list[str]]
) -> None:
    """A line drawn twice, or back again, would be planned and paid for twice."""
    path = collection(
        feature("LineString", LINE, name="There"),
        feature("LineString", LINE, name="Again"),
        feature("LineString", LINE[::-1], name="Back"),
    )
    assert said(path) == [
        f'route.geojson, feature "{name}": is the same line as another '
        '(that of route.geojson, feature "There"). Take one out.'
        for name in ("Again", "Back")
    ]


def test_two_sites_of_one_name_are_an_error(
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """Circuits name their sites, so that a name has to mean one."""
    sites = [feature("Point", at, name="Mast", kind="site") for at in LINE]
    (message,) = said(collection(road, *sites))
    assert "is a site with the name of another" in message
    assert '"Mast"' in message


def test_a_long_jump_is_warned_of(collection: Callable[..., Path], feature: Feature) -> None:
    """A stray vertex many kilometres away is likelier than a span of that length."""
    run = read_run(collection(feature("LineString", [*LINE, [11.0, 50.01]], name="Hill")))
    ((where, message),) = run.warnings
    assert where == 'route.geojson, feature "Hill"'
    assert message == "jumps about 71 km between vertices 2 and 3"


def test_reading_geojson_imports_no_heavy_library(collection: Callable[..., Path]) -> None:
    """The fast path must stay fast: no data frames, no GDAL, not even shapely."""
    program = (
        "import sys; from routeplan.run import read_run; "
        f"run = read_run({str(STREETS / 'prague_streets_3857.geojson')!r}); "
        "print(len(run.lines), sorted({'geopandas', 'pandas', 'pyogrio', 'shapely', 'scipy'}"
        " & set(sys.modules)))"
    )
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True
    )
    assert done.stdout.split() == ["3", "[]"]


@pytest.mark.parametrize("text", ["\\ud800", "\\u0000", "\\u001b[31m"])
def test_names_that_no_sheet_can_hold_are_refused(
    text: str, write: Callable[..., Path], said: Callable[[Path], list[str]]
) -> None:
    """Half characters and control codes would break XML and spreadsheets later on."""
    path = write(
        "route.geojson",
        f'{{"type": "Feature", "properties": {{"name": "a{text}"}}, "geometry": '
        '{"type": "LineString", "coordinates": [[10, 50], [10, 51]]}}',
    )
    (message,) = said(path)
    assert "name: holds characters that cannot be printed" in message
    message.encode("utf-8")


def test_unknown_properties_pass_through_made_harmless(
    write: Callable[..., Path],
) -> None:
    """Other people's properties are kept as JSON can hold them."""
    path = write(
        "route.geojson",
        '{"type": "Feature", "properties": {"surface": "asphalt", "bad": "a\\ud800", "n": NaN, '
        '"big": 1e999, "long": 1' + "0" * 400 + ', "list": [1, {"a": null}], "ok": true}, '
        '"geometry": {"type": "LineString", "coordinates": [[10, 50], [10, 50.1]]}}',
    )
    properties = read_run(path).lines[0].properties
    assert properties["surface"] == "asphalt"
    assert properties["bad"] == "a\ufffd"
    assert properties["n"] is None
    assert properties["big"] is None
    assert properties["list"] == [1, {"a": None}]
    assert properties["ok"] is True
    json.dumps(properties, allow_nan=False).encode("utf-8")


def test_wrong_geometry_comes_as_a_geometry_error(collection: Callable[..., Path]) -> None:
    """Callers can tell wrong geometry from a wrong run file."""
    with pytest.raises(GeometryError) as caught:
        read_run(collection())
    assert isinstance(caught.value, InputError)
    assert caught.value.problems[0].as_dict()["where"] == "route.geojson"
