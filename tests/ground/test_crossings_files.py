"""Layers read from vector files and extracts: what is what, whose, and where."""

from __future__ import annotations

import json
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
import shapely

from routeplan.errors import CrsError, GeometryError
from routeplan.ground.crossings import find_crossings
from routeplan.ground.feature_files import box_around, is_osm, read_features, read_osm
from routeplan.ground.feature_tags import other_tags, what_of_tags
from routeplan.ground.features import feature_layer
from tests.ground.crossing_layers import leg_of

EXTRACT = Path(__file__).parents[1] / "reference" / "streets" / "helsinki_centre.osm.pbf"

OSM = """<?xml version="1.0" encoding="UTF-8"?>
<osm version="0.6">
<node id="1" lat="0.0" lon="9.0"/><node id="2" lat="0.0" lon="9.01"/>
<node id="3" lat="0.01" lon="9.01"/><node id="4" lat="0.01" lon="9.0"/>
{ways}
</osm>
"""


def osm_file(folder: Path, *ways: str, closed: bool = False) -> Path:
    """Write an extract; each way is given by its tags, `key=value,key=value`."""
    refs = "".join(f'<nd ref="{n}"/>' for n in ((1, 2, 3, 4, 1) if closed else (1, 3)))
    text = []
    for number, tags in enumerate(ways, 10):
        pairs = (tag.split("=", 1) for tag in tags.split(","))
        inside = "".join(f'<tag k="{key}" v="{value}"/>' for key, value in pairs)
        text.append(f'<way id="{number}">{refs}{inside}</way>')
    path = folder / "made.osm"
    path.write_text(OSM.format(ways="\n".join(text)))
    return path


def geojson(path: Path, *features: tuple[list, dict], crs: str | None = None) -> Path:
    content = {
        "type": "FeatureCollection",
        "features": [
            {
                "type": "Feature",
                "properties": properties,
                "geometry": {"type": "LineString", "coordinates": points},
            }
            for points, properties in features
        ],
    }
    if crs:
        content["crs"] = {"type": "name", "properties": {"name": crs}}
    path.write_text(json.dumps(content))
    return path


LINE = [[9.0, 0.0], [9.01, 0.0]]


@pytest.mark.parametrize(
    ("tags", "expected"),
    [
        ("highway=primary", ("road", "primary", "")),
        ("highway=footway,operator=Parks", ("road", "footway", "Parks")),
        ("highway=proposed", None),
        ("railway=rail,owner=Track Trust,operator=Trains", ("rail", "rail", "Track Trust")),
        ("railway=abandoned", None),
        ("railway=platform", None),
        ("highway=residential,railway=tram", ("road", "residential", "")),
        ("waterway=stream", ("water", "stream", "")),
        ("waterway=dam", None),
        ("power=line,operator=Grid", ("power", "line", "Grid")),
        ("power=minor_line", ("power", "minor_line", "")),
        ("man_made=pipeline,substance=gas", ("pipeline", "gas", "")),
        ("man_made=pipeline", ("pipeline", "", "")),
        ("man_made=pier", None),
        ("boundary=administrative,admin_level=8", ("boundary", "administrative 8", "")),
        ("barrier=fence", None),
    ],
)
def test_lines_of_an_extract_are_what_their_tags_say(
    tmp_path: Path, tags: str, expected: tuple[str, str, str] | None
) -> None:
    """Roads and rails in being, water, power lines, pipelines, boundaries; nothing else."""
    lines, areas = read_osm(osm_file(tmp_path, tags, "highway=track,name=Kept"))
    own = list(zip(lines.kinds, lines.classes, lines.owners, strict=True))
    assert own == ([expected] if expected else []) + [("road", "track", "")]
    assert lines.names[-1] == "Kept"
    assert areas.kinds == ()


@pytest.mark.parametrize(
    ("tags", "expected"),
    [
        ("natural=water,water=lake,name=Loch", ("water", "lake", "Loch")),
        ("natural=water", ("water", "water", "")),
        ("landuse=reservoir", ("water", "reservoir", "")),
        ("boundary=national_park,name=Park", ("boundary", "national_park", "Park")),
        ("building=yes", None),
        ("natural=wood", None),
    ],
)
def test_areas_of_an_extract_are_what_their_tags_say(
    tmp_path: Path, tags: str, expected: tuple[str, str, str] | None
) -> None:
    """Water and boundaries come as areas."""
    lines, areas = read_osm(osm_file(tmp_path, tags, closed=True))
    own = list(zip(areas.kinds, areas.classes, areas.names, strict=True))
    assert own == ([expected] if expected else [])
    assert lines.kinds == ()
    leg = leg_of([[8.995, 0.005], [9.015, 0.005]])
    hits = [one.how for one in find_crossings([leg], [areas])]
    assert hits == (["inside"] if expected else [])


def test_a_real_extract_is_read_and_crossed() -> None:
    """Streets, tram lines and water of a city's centre; a leg through it crosses streets."""
    lines, areas = read_osm(EXTRACT)
    counts = Counter(lines.kinds)
    assert counts["road"] > 2000
    assert counts["rail"] > 100
    assert set(areas.kinds) <= {"water", "boundary"}
    leg = leg_of([[24.937, 60.166], [24.951, 60.174]])
    hits = find_crossings([leg], [lines, areas])
    way = shapely.LineString(leg.shape_lonlat)
    expected = sum(
        len(shapely.get_parts(shapely.intersection(way, line)))
        for line in lines.geometries[shapely.intersects(way, lines.geometries)]
    )
    met = [one for one in hits if one.how in ("crosses", "touches") and one.file.endswith("lines")]
    assert len(met) == expected
    assert expected > 30


def test_a_box_keeps_what_lies_near() -> None:
    """The box around the legs holds all that they cross, and far less than the file."""
    leg = leg_of([[24.940, 60.168], [24.942, 60.169]])
    box = box_around([leg], margin_deg=0.001)
    assert box == pytest.approx((24.939, 60.167, 24.943, 60.170))
    few, many = read_osm(EXTRACT, box=box)[0], read_osm(EXTRACT)[0]
    assert len(few.kinds) < len(many.kinds) / 3
    keys = [
        [(one.start_mm, one.how, one.kind, one.name) for one in find_crossings([leg], [layer])]
        for layer in (few, many)
    ]
    assert keys[0] == keys[1]


def test_no_box_at_the_antimeridian_and_around_nothing() -> None:
    """There a box would have to be two."""
    assert box_around([]) is None
    assert box_around([leg_of([[179.999, 0.0], [-179.999, 0.0]])]) is None


def test_a_file_of_one_kind_needs_no_column(tmp_path: Path) -> None:
    """Usual names of columns are found by themselves, whatever their case."""
    path = geojson(
        tmp_path / "p.geojson", (LINE, {"Name": "North", "OPERATOR": "Grid", "class": "high"})
    )
    layer = read_features(path, kind="power")
    assert (layer.kinds, layer.names, layer.owners, layer.classes) == (
        ("power",),
        ("North",),
        ("Grid",),
        ("high",),
    )


def test_columns_and_kinds_are_mapped(tmp_path: Path) -> None:
    """Own columns, own words for the kinds; other words are left out."""
    path = geojson(
        tmp_path / "m.geojson",
        (LINE, {"art": "strasse", "bez": "Damm", "wem": None, "stufe": 2}),
        (LINE, {"art": "gleis", "bez": None, "wem": "Bahn", "stufe": None}),
        (LINE, {"art": "zaun", "bez": "x", "wem": "y", "stufe": None}),
    )
    layer = read_features(
        path,
        columns={"kind": "art", "name": "bez", "owner": "wem", "class": "stufe"},
        kinds={"strasse": "road", "gleis": "rail"},
    )
    assert layer.kinds == ("road", "rail")
    assert layer.names == ("Damm", "")
    assert layer.owners == ("", "Bahn")
    assert layer.classes[1] == ""
    assert layer.classes[0].startswith("2")


@pytest.mark.parametrize(
    ("options", "word"),
    [
        ({}, "does not say what its features are"),
        ({"columns": {"kind": "typ"}}, "typ"),
        ({"columns": {"kind": "art"}}, "strasse"),
        ({"kind": "road", "columns": {"colour": "art"}}, "colour"),
        ({"kind": "road", "layer": "nowhere"}, "cannot be read"),
    ],
)
def test_what_a_mapping_lacks_is_named(tmp_path: Path, options: dict, word: str) -> None:
    """A column that is not there, a value that is no kind, no kind at all."""
    path = geojson(tmp_path / "m.geojson", (LINE, {"art": "strasse"}))
    with pytest.raises(GeometryError, match=word):
        read_features(path, **options)


def test_a_file_in_a_grid_comes_out_in_degrees(tmp_path: Path) -> None:
    """Long segments of a grid are straight in the grid, not in degrees."""
    import pyogrio

    path = tmp_path / "grid.gpkg"
    way = shapely.LineString([(500_000.0, 5_300_000.0), (540_000.0, 5_300_000.0)])
    pyogrio.raw.write(
        path,
        np.array([way.wkb], dtype=object),
        field_data=[],
        fields=[],
        geometry_type="LineString",
        crs="EPSG:32632",
    )
    layer = read_features(path, kind="pipeline", box=(9.0, 47.0, 9.6, 48.0))
    (moved,) = layer.geometries
    assert len(moved.coords) == 41
    assert moved.coords[0][:2] == pytest.approx((9.0, 47.853), abs=0.01)
    assert read_features(path, kind="pipeline", box=(0.0, 0.0, 1.0, 1.0)).kinds == ()


def test_files_that_cannot_be_read_are_named(tmp_path: Path) -> None:
    """Missing, damaged, without a CRS."""
    (tmp_path / "bad.gpkg").write_bytes(b"nothing of the kind")
    (tmp_path / "bad.osm").write_text("<osm")
    (tmp_path / "no_crs.csv").write_text('WKT,name\n"LINESTRING (0 0,1 1)",x\n')
    for name in ("none.gpkg", "bad.gpkg"):
        with pytest.raises(GeometryError, match=name):
            read_features(tmp_path / name, kind="road")
    with pytest.raises(GeometryError, match=r"bad\.osm"):
        read_osm(tmp_path / "bad.osm")
    with pytest.raises(CrsError, match="which CRS"):
        read_features(tmp_path / "no_crs.csv", kind="road")
    assert read_features(tmp_path / "no_crs.csv", kind="road", crs="EPSG:4326").names == ("x",)


def test_extracts_are_known_by_their_names() -> None:
    """Text and packed extracts."""
    names = ("a.osm", "a.osm.pbf", "A.PBF", "a.geojson", "a.gpkg")
    assert [is_osm(Path(name)) for name in names] == [True, True, True, False, False]


def test_other_tags_are_taken_apart() -> None:
    """Quotes and backslashes within; nothing at all."""
    assert other_tags(None) == {}
    assert other_tags(r'"a"=>"b \"c\" \\ d","e"=>"f,\"g\"=>\"h\""') == {
        "a": r'b "c" \ d',
        "e": 'f,"g"=>"h"',
    }
    assert what_of_tags({}) is None


def test_points_and_empty_geometries_are_left_out_and_collections_taken_apart() -> None:
    """Rows stay matched with their columns."""
    both = shapely.GeometryCollection([shapely.Point(0, 0), shapely.LineString(LINE)])
    nested = shapely.GeometryCollection([shapely.GeometryCollection([shapely.box(0, 0, 1, 1)])])
    shapes = [
        shapely.Point(0, 0),
        None,
        shapely.LineString(),
        both,
        nested,
        shapely.LineString(LINE),
    ]
    layer = feature_layer("x", shapes, kinds=["road"] * 6, names=list("abcdef"))
    assert layer.names == ("d", "e", "f")
    assert [shape.geom_type for shape in layer.geometries] == [
        "MultiLineString",
        "MultiPolygon",
        "LineString",
    ]
