"""Small runs to write sheets of: two worked out by hand, and a seeded family of others."""

from __future__ import annotations

import json
import math
import random
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from routeplan.planning import Plan

Row = dict[str, Any]

EQUATOR_M = 6378137.0
"""Semi-major axis of WGS 84: along the equator a geodesic is an arc of this circle. [m]"""


def equator(at_m: float, *, lon: float = 10.0) -> list[float]:
    """Return the point so many metres east of a longitude on the equator."""
    return [lon + math.degrees(at_m / EQUATOR_M), 0.0]


def line(points: list[list[float]], **properties: object) -> Row:
    """Return a GeoJSON line."""
    return _feature("LineString", points, properties)


def point(at: list[float], **properties: object) -> Row:
    """Return a GeoJSON point."""
    return _feature("Point", at, properties)


def polygon(ring: list[list[float]], **properties: object) -> Row:
    """Return a GeoJSON polygon of one ring."""
    return _feature("Polygon", [ring], properties)


def _feature(kind: str, coordinates: object, properties: Row) -> Row:
    geometry = {"type": kind, "coordinates": coordinates}
    return {"type": "Feature", "properties": properties, "geometry": geometry}


def write_run(folder: Path, features: list[Row], toml: str = "") -> Path:
    """Write geometry and run file into a folder and return the run file."""
    folder.mkdir(parents=True, exist_ok=True)
    route = {"type": "FeatureCollection", "features": features}
    (folder / "route.geojson").write_text(json.dumps(route, ensure_ascii=False), "utf-8")
    path = folder / "run.toml"
    path.write_text(f'geometry = ["route.geojson"]\n{toml}', "utf-8")
    return path


def planned(folder: Path, features: list[Row], toml: str = "") -> Plan:
    """Write a run into a folder and plan it."""
    return _planned(write_run(folder, features, toml))


def random_plan(folder: Path, seed: int) -> Plan:
    """Write a run drawn from a seed into a folder and plan it."""
    return _planned(random_run(folder, seed))


def _planned(path: Path) -> Plan:
    from routeplan.planning import plan
    from routeplan.run import read_run

    return plan(read_run(path))


DUCT_FEATURES = [
    line([equator(0), equator(500), equator(2000)], name="Duct", placement="duct"),
    point(equator(0), name="Studio", kind="site", role="studio"),
    point(equator(2000), name="Hill", kind="site", role="transmitter"),
    point(equator(800), name="H1", kind="handhole", joint="no", loop_m=30),
    point(equator(1200), name="H2", kind="handhole"),
]
DUCT_TOML = """
title = "Two kilometres of duct"
[cable]
fibre_count = 12
glass_over_sheath_ratio = 0.012
[slack]
joint_tail_m = 15.0
entry_m = 20.0
loop_every_m = {}
undulation_ratio = { duct = 0.01 }
ordering_ratio = 0.02
[reels]
buy = ["put-ups"]
put_ups_m = [1500]
[joints]
assumed_spacing_m = 5000.0
[costs]
cable_per_m = 1.20
reel_each = 120.0
joint_each = 450.0
splice_each = 18.0
"""

MIXED_FEATURES = [
    line([equator(0), equator(1000)], name="Duct", placement="duct"),
    line([equator(1000), equator(2000)], name="Poles", placement="aerial"),
    point(equator(0), name="Studio", kind="site"),
    point(equator(2000), name="Hill", kind="site"),
    point(equator(300), name="Branch line", kind="crossing", crosses="rail", width_m=20),
    point(equator(600), name="M1", kind="maintenance_hole"),
]
MIXED_TOML = """
title = "Duct and poles"
[cable]
glass_over_sheath_ratio = 0.012
[slack]
entry_m = 20.0
riser_m = 10.0
racking_m = 3.0
crossing_loop_m = 10.0
loop_every_m = {}
undulation_ratio = { duct = 0.01, aerial = 0.005 }
ordering_ratio = 0.02
[reels]
buy = ["to-length"]
max_m = 6000
round_up_m = 10
[joints]
assumed_spacing_m = 5000.0
[costs]
cable_per_m = 1.20
reel_each = 120.0
"""

HOSTILE_NAMES = ("=1+1", "+A1", "-2", "@SUM(A1)", "\tx", "\rx", "a,b;\"c\"\n'd'", "<b>&amp;</b>")


def hostile_features(names: tuple[str, ...] = HOSTILE_NAMES) -> list[Row]:
    """Return a run of 4 km whose names are what a spreadsheet or a page could misread."""
    ends = [point(equator(0), name=names[0], kind="site"), point(equator(4000), name=names[1])]
    places = [
        point(equator(400 * at), name=name, kind="handhole")
        for at, name in enumerate(names[2:], start=1)
    ]
    return [line([equator(0), equator(4000)], name=names[3]), *ends, *places]


def random_run(folder: Path, seed: int) -> Path:
    """
    Write a run drawn from a seed and return its run file.

    One to four legs from a hub or one after the other; stretches of every placement; places,
    crossings, loops, an area; both ways of buying; one or two circuits with and without interface.
    """
    rng = random.Random(seed)
    features = _random_lines(rng)
    features.append(
        polygon([[20.0, 40.0], [20.1, 40.0], [20.1, 40.1], [20.0, 40.0]], name="Wood", kind="avoid")
    )
    buy = rng.choice(['["put-ups"]', '["to-length"]', '["put-ups", "to-length"]'])
    toml = f"""
title = "Run {seed}"
purpose = "{rng.choice(["link", "venue"])}"
units = "{rng.choice(["metric", "us"])}"
[cable]
fibre_count = {rng.choice([2, 4, 12, 24, 60])}
fibre_type = "{rng.choice(["G.652.D", "G.657.A1"])}"
[slack]
ordering_ratio = {rng.choice([0.0, 0.02, 0.0333])}
entry_m = {rng.choice([0.0, 7.777, 20.0])}
undulation_ratio = {{ duct = {rng.uniform(0, 0.05):.6f}, aerial = 0.0123 }}
[reels]
buy = {buy}
put_ups_m = [{rng.choice(["1000, 2000, 4000", "2500.5, 6000"])}]
round_up_m = {rng.choice([0.5, 10, 33.3])}
[costs]
currency = "{rng.choice(["EUR", "=X", "GBP"])}"
cable_per_m = {rng.choice([0.0, 1.2, 0.333])}
joint_each = {rng.choice([0.0, 451.55])}
"""
    if rng.random() < 0.5:
        toml += '[[circuit]]\nname = "C one"\nfibre_count = 1\ninterface = "own"\n'
        toml += "wavelengths_nm = [1310]\n"
        toml += "[interface.own]\nwavelength_nm = 1310\nchannel_loss_db = "
        toml += f"{rng.choice([0.5, 4.0, 20.0])}\n"
    return write_run(folder, features, toml)


def _random_lines(rng: random.Random) -> list[Row]:
    features: list[Row] = []
    start = [20.0, 40.0]
    is_star = rng.random() < 0.5
    count = rng.randint(1, 4)
    for leg in range(count):
        at = [20.0, 40.0] if is_star else start
        heading = 2 * math.pi * leg / count if is_star else rng.uniform(-0.5, 0.5)
        for piece in range(rng.randint(1, 3)):
            points = [at]
            for _ in range(rng.randint(1, 6)):
                step = rng.uniform(0.0005, 0.008)
                turn = heading + rng.uniform(-0.4, 0.4)
                before = points[-1]
                points.append(
                    [
                        round(before[0] + step * math.cos(turn), 9),
                        round(before[1] + step * math.sin(turn), 9),
                    ]
                )
            placement = rng.choice(["duct", "aerial", "buried", "bridge", "existing", "surface"])
            if piece == 0:
                placement = rng.choice(["duct", "aerial", "buried"])
            features.append(line(points, placement=placement, leg=f"Leg {leg + 1}"))
            features += _random_places(rng, points, f"{leg + 1}.{piece + 1}")
            at = points[-1]
        start = at
        features.append(point(at, name=f"Site {leg + 1}", kind="site"))
    features.append(point([20.0, 40.0], name="Hub", kind="site" if count > 1 else "handhole"))
    return features


def _random_places(rng: random.Random, points: list[list[float]], label: str) -> list[Row]:
    places = []
    for number, at in enumerate(points[1:-1], start=1):
        kind = rng.choice(["handhole", "maintenance_hole", "pole", "cabinet", "crossing", None])
        if kind is None:
            continue
        extra: Row = {"crosses": rng.choice(["road", "rail"])} if kind == "crossing" else {}
        if kind == "handhole" and rng.random() < 0.3:
            extra["loop_m"] = rng.choice([5, 12.345])
        places.append(point(at, name=f"{kind} {label}.{number}", kind=kind, **extra))
    return places
