"""Every kind of street file, what is wrong with some, and the network kept beside its source."""

from __future__ import annotations

import bz2
import json
import shutil
import warnings
from dataclasses import fields
from pathlib import Path
from typing import Any

import networkx as nx
import numpy as np
import pytest
from geographiclib.geodesic import Geodesic

from routeplan.errors import CrsError, GeometryError, InputError
from routeplan.streets import cache
from routeplan.streets.cache import cache_path
from routeplan.streets.layers import read_polygons
from routeplan.streets.model import CROSSING_KINDS, Network
from routeplan.streets.reading import StreetSource, read_network
from tests.streets.small_networks import REFERENCE

NODES = {1: (10.0, 50.0), 2: (10.001, 50.0), 3: (10.002, 50.0), 4: (10.001, 50.001),
         5: (10.0005, 49.999), 6: (10.0005, 50.002), 7: (10.0015, 49.999), 8: (10.0015, 50.002),
         9: (10.0012, 50.00002)}  # fmt: skip


def osm_text(*, extra: str = "", missing: bool = False) -> str:
    """Return a hand-made extract: a street, a bridge, a rail line, a river, a pole."""
    nodes = "".join(
        f'<node id="{n}" version="1" lat="{lat}" lon="{lon}">'
        + ('<tag k="man_made" v="utility_pole"/>' if n == 9 else "")
        + "</node>"
        for n, (lon, lat) in NODES.items()
    )
    ways = [
        (11, (1, 2), {"highway": "residential", "name": 'Long "Mile" Road'}),
        (12, (2, 3), {"highway": "residential", "name": "Long Mile Road", "bridge": "yes"}),
        (13, (2, 4), {"highway": "secondary_link", "ref": "B7", "tunnel": "yes"}),
        (14, (5, 6), {"railway": "rail"}),
        (15, (7, 8), {"waterway": "river"}),
        (16, (3, 4), {"highway": "proposed"}),
        (17, (1, 4), {"building": "yes"}),
    ]
    if missing:
        ways.append((18, (3, 99), {"highway": "service"}))
    body = "".join(
        f'<way id="{n}" version="1">'
        + "".join(f'<nd ref="{ref}"/>' for ref in refs)
        + "".join(f'<tag k="{k}" v="{v.replace(chr(34), "&quot;")}"/>' for k, v in tags.items())
        + "</way>"
        for n, refs, tags in ways
    )
    return f'<?xml version="1.0"?><osm version="0.6">{nodes}{body}{extra}</osm>'


@pytest.fixture
def extract(tmp_path: Path) -> Path:
    """Return a hand-made extract."""
    path = tmp_path / "town.osm"
    path.write_text(osm_text(), "utf-8")
    return path


def test_an_extract_is_read(extract: Path) -> None:
    """Ways with a highway that exists are streets, with class, name, bridge and tunnel."""
    network = read_network(extract)
    assert len(network.length_m) == 3
    assert len(network.node_lonlat) == 4
    names = [network.name_words[code] for code in network.name]
    assert names == ['Long "Mile" Road', "Long Mile Road", "B7"]
    assert [network.class_words[code] for code in network.road_class] == [
        "residential", "residential", "secondary_link",
    ]  # fmt: skip
    assert network.is_bridge.tolist() == [False, True, False]
    assert network.is_tunnel.tolist() == [False, False, True]
    assert "1 proposed" in network.notes[0][1]
    exact = Geodesic.WGS84.Inverse(50.0, 10.0, 50.0, 10.001)["s12"]
    assert network.length_m[0] == pytest.approx(exact, rel=1e-8)


def test_crossings_and_poles_are_found(extract: Path) -> None:
    """The street crosses the railway, its bridge the river, and the pole is kept."""
    network = read_network(extract)
    found = sorted(
        (CROSSING_KINDS[kind], int(edge))
        for kind, edge in zip(network.crossing_kind, network.crossing_edge, strict=True)
    )
    assert found == [("rail", 0), ("water", 1)]
    half = Geodesic.WGS84.Inverse(50.0, 10.0, 50.0, 10.0005)["s12"]
    assert network.crossing_m[0] == pytest.approx(half, abs=0.01)
    assert [network.place_words[code] for code in network.place_kind] == ["pole"]


def test_a_clipped_extract_keeps_what_it_holds(tmp_path: Path) -> None:
    """A way whose far end is not in the extract does not stop the reading."""
    path = tmp_path / "clipped.osm"
    path.write_text(osm_text(missing=True), "utf-8")
    assert len(read_network(path).length_m) == 3


def test_a_packed_extract_is_the_same(extract: Path, tmp_path: Path) -> None:
    """An .osm.bz2 gives the network of the .osm in it."""
    packed = tmp_path / "town.osm.bz2"
    packed.write_bytes(bz2.compress(extract.read_bytes()))
    same(read_network(packed), read_network(extract))


def same(one: Network, other: Network, *, notes: bool = False) -> None:
    for field in fields(Network):
        if field.name == "notes" and not notes:
            continue
        mine, its = getattr(one, field.name), getattr(other, field.name)
        if isinstance(mine, np.ndarray):
            assert mine.dtype == its.dtype, field.name
            np.testing.assert_array_equal(mine, its, err_msg=field.name)
        else:
            assert mine == its, field.name


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("cut.osm", osm_text().encode()[:900]),
        ("noise.osm", b"not an extract at all"),
        ("empty.osm", b""),
        ("none.osm", b'<?xml version="1.0"?><osm version="0.6"></osm>'),
        ("noise.osm.pbf", b"\x00\x00\x00\x0dnonsense" * 9),
        ("cut.osm.bz2", bz2.compress(osm_text().encode())[:200]),
        ("noise.osm.bz2", b"BZh9 nonsense"),
        ("noise.graphml", b"<graphml>"),
        ("noise.geojson", b"{"),
        ("point.geojson", b'{"type":"Point","coordinates":[10,50]}'),
        ("noise.gpkg", b"SQLite format 3\x00 nonsense"),
    ],
)
def test_what_is_no_street_file_is_refused(name: str, content: bytes, tmp_path: Path) -> None:
    """Damaged, empty and foreign files raise one clear error that names the file."""
    path = tmp_path / name
    path.write_bytes(content)
    with pytest.raises(GeometryError) as caught:
        read_network(path)
    assert name in str(caught.value)
    assert str(tmp_path) not in str(caught.value)
    assert not cache_path(path).exists()


def test_a_missing_file_and_a_folder_are_told_apart(tmp_path: Path) -> None:
    """A file that is not there, and a folder, are refused with what may be given."""
    with pytest.raises(GeometryError, match="is not there"):
        read_network(tmp_path / "none.osm")
    with pytest.raises(GeometryError, match="is a folder"):
        read_network(tmp_path)


def test_a_cut_real_extract_is_refused_or_read(tmp_path: Path) -> None:
    """A packed extract cut anywhere raises an error of ours or gives the streets it still holds."""
    whole = (REFERENCE / "helsinki_centre.osm.pbf").read_bytes()
    for share in (0.02, 0.3, 0.6, 0.95):
        path = tmp_path / "cut.osm.pbf"
        path.write_bytes(whole[: int(share * len(whole))])
        try:
            network = read_network(path)
        except GeometryError:
            continue
        assert len(network.length_m) < 4671


def feature(coordinates: list[Any], **known: object) -> dict[str, Any]:
    geometry = {"type": "LineString", "coordinates": coordinates}
    return {"type": "Feature", "properties": known, "geometry": geometry}


def write_layer(path: Path, *features: dict[str, Any], crs: str | None = None) -> Path:
    layer: dict[str, Any] = {"type": "FeatureCollection", "features": list(features)}
    if crs:
        layer["crs"] = {"type": "name", "properties": {"name": crs}}
    path.write_text(json.dumps(layer), "utf-8")
    return path


def test_a_line_layer_in_a_grid_is_measured_on_the_earth(tmp_path: Path) -> None:
    """Lines in web mercator are as long as on the ellipsoid, not as on the grid."""
    shutil.copy(REFERENCE / "prague_streets_3857.geojson", tmp_path / "prague.geojson")
    network = read_network(tmp_path / "prague.geojson")
    exact = sum(
        Geodesic.WGS84.Inverse(a[1], a[0], b[1], b[0])["s12"]
        for first, last in zip(network.shape_first, network.shape_first[1:], strict=False)
        for a, b in zip(
            network.shape_lonlat[first : last - 1],
            network.shape_lonlat[first + 1 : last],
            strict=True,
        )
    )
    assert network.length_m.sum() == pytest.approx(exact, rel=2e-8)
    layer = json.loads((tmp_path / "prague.geojson").read_text("utf-8"))
    grid = sum(
        float(np.hypot(*np.diff(np.array(f["geometry"]["coordinates"])[:, :2], axis=0).T).sum())
        for f in layer["features"]
    )
    assert grid / exact == pytest.approx(1 / np.cos(np.radians(50.1)), rel=0.01)


def test_columns_of_a_layer_are_used(tmp_path: Path) -> None:
    """Class, name, bridge, tunnel and placement come from the columns of those names."""
    path = write_layer(
        tmp_path / "layer.geojson",
        feature([[10, 50], [10.01, 50]], Highway="primary", NAME="High Street", bridge="T"),
        feature([[10, 50.01], [10.01, 50.01]], fclass="track", tunnel=1, bridge="no"),
        feature([[10, 50.02], [10.01, 50.02]], placement="aerial"),
    )
    network = read_network(path)
    assert network.class_words == ("primary", "track", "street")
    assert network.name_words == ("High Street", "")
    assert network.is_bridge.tolist() == [True, False, False]
    assert network.is_tunnel.tolist() == [False, True, False]
    assert network.placement_words == ("", "aerial")
    bad = write_layer(tmp_path / "bad.geojson", feature([[10, 50], [10.01, 50]], placement="areal"))
    with pytest.raises(GeometryError, match='Did you mean "aerial"'):
        read_network(bad)


def test_a_crs_that_is_none_is_refused(tmp_path: Path) -> None:
    """A CRS nobody knows, and grid coordinates without one, are named."""
    path = write_layer(tmp_path / "grid.geojson", feature([[532410, 181220], [532500, 181220]]))
    with pytest.raises(InputError, match="not degrees"):
        read_network(path)
    with pytest.raises(CrsError, match="is not a known CRS"):
        read_network(StreetSource(streets=(path,), crs="EPSG:nothing"))
    network = read_network(StreetSource(streets=(path,), crs="EPSG:27700"))
    assert network.length_m[0] == pytest.approx(90.0, rel=1e-3)


def test_several_files_are_one_network(tmp_path: Path) -> None:
    """Streets of two files meet where they share a vertex; existing routes are joined on."""
    one = write_layer(tmp_path / "one.geojson", feature([[10, 50], [10.001, 50]]))
    two = write_layer(tmp_path / "two.geojson", feature([[10.001, 50], [10.002, 50]]))
    duct = write_layer(tmp_path / "duct.geojson", feature([[10, 50.0001], [10.002, 50.0001]]))
    assert len(read_network(StreetSource(streets=(one, two))).notes) == 0
    both = read_network(StreetSource(streets=(one, two), existing=(duct,)))
    assert both.placement_words == ("", "duct")
    assert "link" in both.class_words
    assert len(both.notes) == 0


def test_polygons_are_read(tmp_path: Path) -> None:
    """Areas to avoid come from any polygon; a file without one is refused."""
    ring = [[10, 50], [10.1, 50], [10.1, 50.1], [10, 50.1], [10, 50]]
    hole = [[10.02, 50.02], [10.04, 50.02], [10.04, 50.04], [10.02, 50.04], [10.02, 50.02]]
    path = tmp_path / "area.geojson"
    path.write_text(json.dumps({"type": "Polygon", "coordinates": [ring, hole]}), "utf-8")
    polygons = read_polygons(path)
    assert [len(ring) for ring in polygons[0]] == [5, 5]
    with pytest.raises(GeometryError, match="no polygon"):
        read_polygons(write_layer(tmp_path / "line.geojson", feature([[10, 50], [10.1, 50]])))


# Graphs as OSMnx keeps them


def street_graph(crs: str = "EPSG:4326", *, directed: bool = True) -> Any:
    """Return a graph with one-way, two-way, parallel and bent edges, and lists as values."""
    from shapely.geometry import LineString

    graph = nx.MultiDiGraph(crs=crs) if directed else nx.MultiGraph(crs=crs)
    scale, x0, y0 = (1.0, 10.0, 50.0) if crs == "EPSG:4326" else (71_000.0, 5e5, 5.54e6)
    places = {1: (0.0, 0.0), 2: (0.001, 0.0), 3: (0.001, 0.001)}
    for node, (x, y) in places.items():
        graph.add_node(node, x=x0 + scale * x, y=y0 + scale * y)

    def line(*nodes: tuple[float, float]) -> LineString:
        return LineString([(x0 + scale * x, y0 + scale * y) for x, y in nodes])

    graph.add_edge(1, 2, osmid=[5, 6], highway=["residential", "service"], name="Mill Lane",
                   length=70.0)  # fmt: skip
    if directed:
        graph.add_edge(2, 1, osmid=5, highway="residential", name="Mill Lane", length=70.0)
    graph.add_edge(2, 3, osmid=7, highway="tertiary", bridge="yes", length=110.0)
    graph.add_edge(1, 2, osmid=8, highway="path", length=120.0,
                   geometry=line(places[1], (0.0005, -0.0005), places[2]))  # fmt: skip
    return graph


@pytest.mark.parametrize("directed", [True, False])
@pytest.mark.parametrize("crs", ["EPSG:4326", "EPSG:32632"])
def test_a_graph_is_read(crs: str, directed: bool, tmp_path: Path) -> None:
    """GraphML, directed or not, in degrees or metres, lists as values, gives each street once."""
    import osmnx

    path = tmp_path / "graph.graphml"
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        osmnx.save_graphml(street_graph(crs, directed=directed), path)
    network = read_network(path)
    assert len(network.length_m) == 3
    assert len(network.node_lonlat) == 3
    assert set(network.class_words) == {"residential", "tertiary", "path"}
    assert network.is_bridge.sum() == 1
    straight = float(network.length_m[network.road_class == 0][0])
    assert straight == pytest.approx(71.0, abs=1.0)


def test_a_graph_without_places_is_refused(tmp_path: Path) -> None:
    """A graph whose nodes have no coordinates is named."""
    path = tmp_path / "bare.graphml"
    nx.write_graphml(nx.path_graph(3), path)
    with pytest.raises(GeometryError, match=r"bare\.graphml"):
        read_network(path)


# What is kept


def test_a_kept_network_is_the_same(extract: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The second reading takes what was kept, equal in every array and word."""
    first = read_network(extract)
    assert cache_path(extract).is_file()
    monkeypatch.setattr("routeplan.streets.reading._built", lambda _: pytest.fail("built again"))
    same(read_network(extract), first, notes=True)


def test_a_changed_source_is_read_again(extract: Path) -> None:
    """One byte more in the source, another option or another version: read anew."""
    before = read_network(extract)
    extract.write_text(osm_text().replace("residential", "primary"), "utf-8")
    assert "primary" in read_network(extract).class_words
    assert "primary" not in before.class_words


def test_another_option_is_read_again(tmp_path: Path) -> None:
    """Noding is part of what is kept."""
    path = write_layer(
        tmp_path / "cross.geojson",
        feature([[10, 50], [10.002, 50]]),
        feature([[10.001, 49.999], [10.001, 50.001]]),
    )
    assert len(read_network(path).length_m) == 2
    assert len(read_network(StreetSource(streets=(path,), noded=True)).length_m) == 4
    assert len(read_network(path).length_m) == 2


@pytest.mark.parametrize("damage", ["cut", "flipped", "noise", "empty", "other"])
def test_a_broken_cache_is_built_again(extract: Path, damage: str) -> None:
    """Whatever happened to the kept file, the network is right and kept anew."""
    first = read_network(extract)
    kept = cache_path(extract)
    content = bytearray(kept.read_bytes())
    if damage == "cut":
        content = content[: len(content) // 2]
    elif damage == "flipped":
        content[len(content) // 2] ^= 0xFF
    elif damage == "noise":
        content = bytearray(b"noise")
    elif damage == "empty":
        content = bytearray()
    if damage == "other":
        with kept.open("wb") as file:
            np.savez(file, stamp=np.zeros(3, dtype=np.uint8))
    else:
        kept.write_bytes(content)
    same(read_network(extract), first)
    assert kept.stat().st_size > 1000


def test_a_version_of_its_own(extract: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A network kept by another version is not used."""
    read_network(extract)
    monkeypatch.setattr(cache, "_VERSION", -1)
    monkeypatch.setattr("routeplan.streets.reading._built", lambda _: 1 / 0)
    with pytest.raises(ZeroDivisionError):
        read_network(extract)


def test_where_nothing_can_be_kept_nothing_is(
    extract: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A folder that cannot be written stops nothing, and no part of a file stays behind."""

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError

    monkeypatch.setattr(cache.os, "replace", refuse)
    assert len(read_network(extract).length_m) == 3
    assert [path.name for path in extract.parent.iterdir()] == ["town.osm"]
