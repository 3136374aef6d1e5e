"""Small inputs of every format, and seeded ways to spoil them."""

from __future__ import annotations

import io
import json
import random
import re
import zipfile
from collections.abc import Callable
from pathlib import Path

from tests.sheets.plans import DUCT_FEATURES, MIXED_FEATURES, equator, polygon

RUN_TOML = """geometry = ["route.geojson"]
title = "Seed"
purpose = "link"
crs = "EPSG:4326"
placement = "duct"
units = "metric"
[joining]
join_tolerance_m = 1.0
reach_distance_max_m = 25.0
site_distance_max_m = 50.0
track_tolerance_m = 2.0
[cable]
fibre_count = 12
fibre_type = "G.652.D"
glass_over_sheath_ratio = 0.012
measured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.33 } ]
[cables.thin]
legs = ["Studio - Hill"]
fibre_count = 4
[slack]
joint_tail_m = 15.0
entry_m = 20.0
loop_every_m = { duct = 700.0 }
undulation_ratio = { duct = 0.01 }
ordering_ratio = 0.02
[reels]
buy = ["put-ups", "to-length"]
put_ups_m = [1500]
max_m = 3000
round_up_m = 10
[joints]
assumed_spacing_m = 400.0
max_count = 40
max_section_m = { duct = 6000 }
[costs]
currency = "EUR"
cable_per_m = 1.20
reel_each = 120.0
joint_each = 450.0
splice_each = 18.0
[loss]
splice_mean_db = 0.05
connector_pairs = 2
sigma_count = 3.0
margin_db = 3.0
verdict_on = "worst"
[interface.own]
wavelength_min_nm = 1300
wavelength_max_nm = 1560
tx_min_dbm = -8.0
tx_max_dbm = -3.0
rx_sensitivity_dbm = -23.0
rx_overload_dbm = -3.0
penalty_db = 1.0
[[circuit]]
name = "Programme"
from = "Studio"
to = "Hill"
fibre_count = 2
interface = "own"
wavelengths_nm = [1310, 1550]
[[circuit]]
name = "Spare"
fibre_count = 1
"""

_ENDS = [equator(0), equator(700), equator(1500)]
GPX = f"""<?xml version="1.0" encoding="UTF-8"?>
<gpx version="1.1" creator="hand" xmlns="http://www.topografix.com/GPX/1/1">
<wpt lat="0.0" lon="{_ENDS[0][0]}"><ele>12.5</ele><name>Start</name></wpt>
<rte><name>Way</name><rtept lat="0.0" lon="{_ENDS[0][0]}"/><rtept lat="0.0" lon="{_ENDS[1][0]}"/>
</rte><trk><name>Track</name><trkseg>
<trkpt lat="0.0" lon="{_ENDS[1][0]}"><ele>12.5</ele><time>2024-05-01T10:00:00Z</time></trkpt>
<trkpt lat="0.0" lon="{_ENDS[2][0]}"><ele>19.0</ele><time>2024-05-01T10:09:00Z</time></trkpt>
</trkseg></trk></gpx>
"""
KML = f"""<?xml version="1.0" encoding="UTF-8"?>
<kml xmlns="http://www.opengis.net/kml/2.2"><Document><name>Job</name>
<Folder><name>Ways</name><Placemark><name>Road</name>
<ExtendedData><Data name="placement"><value>aerial</value></Data></ExtendedData>
<LineString><coordinates>{_ENDS[0][0]},0,5 {_ENDS[1][0]},0,6 {_ENDS[2][0]},0,7</coordinates>
</LineString></Placemark></Folder>
<Folder><name>Places</name><Placemark><name>Pole</name>
<ExtendedData><Data name="kind"><value>pole</value></Data></ExtendedData>
<Point><coordinates>{_ENDS[1][0]},0</coordinates></Point></Placemark></Folder>
</Document></kml>
"""


def geojson() -> bytes:
    """Return a small GeoJSON file with every kind of feature."""
    ring = [equator(100), equator(200), [equator(200)[0], 0.001], equator(100)]
    area = polygon(ring, name="Wood", kind="avoid")
    features = [*MIXED_FEATURES, *DUCT_FEATURES[3:], area]
    return json.dumps({"type": "FeatureCollection", "features": features}, indent=1).encode()


def gpkg(folder: Path) -> bytes:
    """Return a small GeoPackage in a grid, lines and points in layers of their own."""
    lines, points = _frames()
    path = folder / "seed.gpkg"
    lines.to_crs("EPSG:32632").to_file(path, layer="ways", driver="GPKG")
    points.to_crs("EPSG:32632").to_file(path, layer="places", driver="GPKG")
    return path.read_bytes()


def shapefile_zip(folder: Path) -> bytes:
    """Return a small shapefile in a zip, stored without compression so that bytes can be hit."""
    lines, _ = _frames()
    lines.to_file(folder / "seed.shp", driver="ESRI Shapefile")
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_STORED) as archive:
        for suffix in ("shp", "shx", "dbf", "prj", "cpg"):
            name = zipfile.ZipInfo(f"seed.{suffix}", (2024, 1, 1, 0, 0, 0))
            archive.writestr(name, (folder / f"seed.{suffix}").read_bytes())
    return out.getvalue()


def _frames():  # type: ignore[no-untyped-def]
    import geopandas
    import shapely

    lines = geopandas.GeoDataFrame(
        {"name": ["Road", "Poles"], "placement": ["duct", "aerial"]},
        geometry=[shapely.LineString(_ENDS[:2]), shapely.LineString(_ENDS[1:])],
        crs="EPSG:4326",
    )
    points = geopandas.GeoDataFrame(
        {"name": ["Start", "P1"], "kind": ["site", "pole"]},
        geometry=[shapely.Point(_ENDS[0]), shapely.Point(_ENDS[1])],
        crs="EPSG:4326",
    )
    return lines, points


ODD_TEXTS = [
    *(b"NaN", b"nan", b"-Infinity", b"inf", b"1e308", b"-1e309", b"1e-320", b"9" * 400, b"-0.0"),
    *(b"0", b"-1", b"0.001", b"1e6", b"181", b"91", b"1e5", b"null", b"true", b"[]", b"{}", b'""'),
    *(b'"x"', b"0x10", b"1_000", b"+1", b"2024-01-01", b"[[[]]]", b"'", b'"', b"\\", b"#", b","),
    *(b"\x00", b"\xff\xfe", b"\xef\xbb\xbf", b"\xed\xa0\x80", b'"\\ud800"', b"\xe2\x80\xae"),
    *(b"<!DOCTYPE a [<!ENTITY b 'c'>]>", b"&b;", b"]]>", b"<a>", b"%s%n", b"../../x", b"|", b"="),
]
NUMBER = re.compile(rb"-?\d+(\.\d+)?([eE][-+]?\d+)?")
WORD = re.compile(rb"[A-Za-z_.]{2,}")
Mutation = Callable[[random.Random, bytes, bytes], bytes]


def _cut(rng: random.Random, data: bytes) -> tuple[int, int]:
    start = rng.randrange(len(data) + 1)
    return start, min(len(data), start + int(rng.expovariate(1 / 30)))


def truncated(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return the beginning or the end of an input."""
    at = rng.randrange(len(data) + 1)
    return rng.choice([data[:at], data[at:]])


def spliced(rng: random.Random, data: bytes, other: bytes) -> bytes:
    """Return the beginning of one input and the end of another."""
    return data[: rng.randrange(len(data) + 1)] + other[rng.randrange(len(other) + 1) :]


def flipped(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input with bits of some bytes turned."""
    spoilt = bytearray(data)
    for _turn in range(rng.randint(1, 8)):
        if spoilt:
            spoilt[rng.randrange(len(spoilt))] ^= 1 << rng.randrange(8)
    return bytes(spoilt)


def swapped(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input with two pieces in each other's place."""
    a, b = sorted((_cut(rng, data), _cut(rng, data)))
    if a[1] > b[0]:
        return data[: a[0]] + data[a[1] :]
    return data[: a[0]] + data[b[0] : b[1]] + data[a[1] : b[0]] + data[a[0] : a[1]] + data[b[1] :]


def repeated(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input with a piece several times."""
    start, end = _cut(rng, data)
    return data[:end] + data[start:end] * rng.randint(1, 40) + data[end:]


def renumbered(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input with some numbers replaced by odd ones, other types or each other."""
    return _replaced(rng, data, NUMBER, [match[0] for match in NUMBER.finditer(data)][:50])


def reworded(rng: random.Random, data: bytes, other: bytes) -> bytes:
    """Return an input with some words replaced by others."""
    return _replaced(rng, data, WORD, [match[0] for match in WORD.finditer(data + other)])


def _replaced(
    rng: random.Random, data: bytes, pattern: re.Pattern[bytes], own: list[bytes]
) -> bytes:
    found = list(pattern.finditer(data))
    if not found:
        return data
    for match in sorted(rng.sample(found, min(len(found), rng.randint(1, 3))), reverse=True,
                        key=lambda match: match.start()):  # fmt: skip
        new = rng.choice(own) if own and rng.random() < 0.4 else rng.choice(ODD_TEXTS)
        data = data[: match.start()] + new + data[match.end() :]
    return data


def inserted(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input with something odd in it."""
    at = rng.randrange(len(data) + 1)
    return data[:at] + rng.choice(ODD_TEXTS) + data[at:]


def nested(rng: random.Random, data: bytes, _: bytes) -> bytes:
    """Return an input nested very deep at one place."""
    at = rng.randrange(len(data) + 1)
    depth = rng.choice([50, 1000, 100_000])
    opening, closing = rng.choice([(b"[", b"]"), (b'{"a":', b"}"), (b"<a>", b"</a>"), (b"(", b")")])
    return data[:at] + opening * depth + closing * rng.choice([0, depth]) + data[at:]


MUTATIONS: tuple[Mutation, ...] = (
    truncated,
    spliced,
    flipped,
    swapped,
    repeated,
    renumbered,
    renumbered,
    renumbered,
    reworded,
    reworded,
    inserted,
    nested,
)


def mutated(rng: random.Random, data: bytes, other: bytes) -> bytes:
    """Return an input spoilt in one way, now and then in several."""
    for _ in range(rng.choice([1, 1, 1, 2, 3])):
        data = rng.choice(MUTATIONS)(rng, data, other)
    return data
