"""Properties of lines, points and polygons: what they mean, and what they may not be."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from routeplan.run import read_run

Feature = Callable[..., dict[str, Any]]
AT = [10.0, 50.005]
RING = [[[10.0, 50.0], [10.1, 50.0], [10.1, 50.1], [10.0, 50.0]]]


@pytest.mark.parametrize(
    ("kind", "joint"),
    [
        ("handhole", "yes"),
        ("maintenance_hole", "yes"),
        ("cabinet", "yes"),
        ("pedestal", "yes"),
        ("building", "yes"),
        ("pole", "avoid"),
        ("site", "yes"),
    ],
)
def test_reach_points_are_fit_for_a_joint_by_kind(
    kind: str, joint: str, collection: Callable[..., Path], feature: Feature, road: object
) -> None:
    """A joint may stand in a hole or cabinet, is avoided on a pole, and yields to `joint`."""
    plain = feature("Point", AT, name="P", kind=kind)
    said_no = feature("Point", AT, name="Q", kind=kind, joint="no")
    places = read_run(collection(road, plain, said_no)).places
    assert [place.joint for place in places] == [joint, "no"]


def test_a_crossing_bears_no_joint(
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """A crossing is known by what it crosses; a joint there is refused."""
    crossing = feature("Point", AT, name="Lunn", kind="crossing", crosses="water", width_m=30)
    (place,) = read_run(collection(road, crossing)).places
    assert (place.joint, place.crosses, place.width_m) == ("no", "water", 30.0)
    crossing["properties"]["joint"] = "yes"
    assert said(collection(road, crossing)) == [
        'route.geojson, feature "Lunn", joint: cannot be allowed at a crossing ("yes", limit no).'
    ]


def test_words_are_known_however_they_are_written(
    collection: Callable[..., Path], feature: Feature, road: dict[str, Any]
) -> None:
    """Case does not matter, nor whether a space, a hyphen or an underscore joins two words."""
    road["properties"]["placement"] = "Aerial"
    points = [
        feature("Point", AT, name="P", kind="Maintenance hole", joint="AVOID"),
        feature("Point", AT, name="Q", kind=" maintenance-Hole "),
        feature("Point", AT, name="R", kind="Site", role="Studio"),
        feature("Point", AT, name="S", kind="Crossing", crosses="Water"),
    ]
    run = read_run(collection(road, *points))
    assert {line.placement for line in run.lines} == {"aerial"}
    assert [(place.kind, place.role, place.joint, place.crosses) for place in run.places] == [
        ("maintenance_hole", None, "avoid", None),
        ("maintenance_hole", None, "yes", None),
        ("site", "studio", "yes", None),
        ("crossing", None, "no", "water"),
    ]


def test_every_property_of_a_point_is_read(
    collection: Callable[..., Path], feature: Feature, road: object
) -> None:
    """Known properties become fields; the others pass through."""
    hole = feature(
        "Point", AT, name="MH 7", kind="maintenance_hole", loop_m=12, joint_cost_factor=2.5, lid="x"
    )
    site = feature("Point", [10.0, 50.0], name="Mast", kind="site", role="transmitter")
    first, second = read_run(collection(road, hole, site)).places
    assert (first.loop_m, first.joint_cost_factor, first.properties) == (12.0, 2.5, {"lid": "x"})
    assert (second.role, second.joint_cost_factor, second.loop_m) == ("transmitter", 1.0, None)
    assert (second.lon, second.lat, second.height_m) == (10.0, 50.0, None)


def test_every_property_of_a_line_is_read(
    collection: Callable[..., Path], feature: Feature
) -> None:
    """Somebody's dark fibre comes with its own length and loss."""
    line = feature(
        "LineString",
        [[10.0, 50.0], [10.0, 50.01]],
        name="Lease",
        placement="existing",
        leg="Trunk",
        cable="Old",
        existing_m=1300,
        existing_db=0.9,
        owner="them",
    )
    (read,) = read_run(collection(line)).lines
    assert (read.name, read.placement, read.leg, read.cable) == (
        "Lease",
        "existing",
        "Trunk",
        "Old",
    )
    assert (read.existing_m, read.existing_db) == (1300.0, 0.9)
    assert read.properties == {"owner": "them"}
    assert str(read.source) == 'route.geojson, feature "Lease"'


def test_a_point_that_does_not_say_is_taken_for_a_site(
    collection: Callable[..., Path], feature: Feature, road: object
) -> None:
    """People mark ends with plain waypoints; what was assumed is marked."""
    points = [
        feature("Point", AT, name="Studio"),
        feature("Point", AT),
        feature("Point", AT, name="Mast", role="transmitter"),
        feature("Point", AT, name="Beck", crosses="water"),
    ]
    places = read_run(collection(road, *points)).places
    assert [place.name for place in places] == ["Studio", "Point 2", "Mast", "Beck"]
    assert [place.kind for place in places] == ["site", "site", "site", "crossing"]
    assert ["kind_assumed" in place.properties for place in places] == [True, True, False, False]


def test_unnamed_places_get_a_name(
    collection: Callable[..., Path], feature: Feature, road: object
) -> None:
    """Sheets need a name for every place."""
    holes = [feature("Point", AT, kind="maintenance_hole") for _ in range(2)]
    numbered = feature("Point", AT, kind="pole", name=17)
    places = read_run(collection(road, *holes, numbered)).places
    assert [place.name for place in places] == ["Maintenance hole 1", "Maintenance hole 2", "17"]


def test_areas_are_read_and_unkinded_polygons_left_out(
    collection: Callable[..., Path], feature: Feature, road: object
) -> None:
    """A polygon that does not say what it is plays no part, and that is said."""
    hole = [[[10.02, 50.01], [10.04, 50.01], [10.04, 50.02], [10.02, 50.01]]]
    run = read_run(
        collection(
            road,
            feature("Polygon", RING + hole, name="Marsh", kind="avoid"),
            feature("Polygon", RING, name="Wood"),
        )
    )
    (area,) = run.areas
    assert (area.name, area.kind) == ("Marsh", "avoid")
    assert [ring.tolist() for ring in area.rings] == RING + hole
    assert run.warnings[0][0] == 'route.geojson, feature "Wood"'
    assert "plays no part" in run.warnings[0][1]


@pytest.mark.parametrize(
    ("properties", "message"),
    [
        (
            {"kind": "hand_hole"},
            'kind: is not a known kind ("hand_hole", one of site, handhole, maintenance_hole, '
            'pole, cabinet, pedestal, building, crossing). Did you mean "handhole"?',
        ),
        ({"kind": "Sites"}, 'Did you mean "site"?'),
        ({"kind": 5}, "kind: is not a known kind (5, one of"),
        (
            {"kind": "site", "role": "boss"},
            'role: is not a known role ("boss", one of studio, transmitter, venue, compound, '
            "position, repeater).",
        ),
        ({"kind": "pole", "role": "studio"}, "role: is for sites only (studio at a pole)."),
        (
            {"kind": "pole", "joint": True},
            "joint: is not a known joint (true, one of yes, avoid, no).",
        ),
        ({"kind": "pole", "loop_m": "12"}, 'loop_m: is not a number ("12"). Write the number'),
        (
            {"kind": "pole", "loop_m": "15 ft"},
            'loop_m: is not a number ("15 ft"). Write the number alone, without unit or quotes.',
        ),
        ({"kind": "pole", "loop_m": True}, "loop_m: is not a number (true)."),
        (
            {"kind": "pole", "loop_m": -1},
            "loop_m: is out of range (-1 m, limit at least 0 m, at most 10000 m).",
        ),
        (
            {"kind": "pole", "joint_cost_factor": 0},
            "joint_cost_factor: is out of range (0, limit more than 0, at most 10000).",
        ),
        (
            {"kind": "crossing"},
            "is a crossing that does not say what it crosses (one of road, rail",
        ),
        (
            {"kind": "crossing", "crosses": "lava"},
            'crosses: is nothing known to be crossed ("lava", one of road, rail, water, power, '
            "pipeline).",
        ),
        ({"kind": "pole", "crosses": "road"}, "crosses: is for crossings only (at a pole)."),
        ({"kind": "pole", "width_m": 3}, "width_m: is for crossings only (at a pole)."),
        ({"kind": "pole", "name": ["x"]}, 'name: is not text (["x"]).'),
        ({"kind": "pole", "name": "x" * 501}, "name: is too long (501 characters, limit 500"),
    ],
)
def test_wrong_properties_of_points_are_named(
    properties: dict[str, object],
    message: str,
    *,
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """Wrong words, types and numbers say what is allowed."""
    point = feature("Point", AT)
    point["properties"] = properties
    (text,) = said(collection(road, point))
    assert text.startswith("route.geojson, feature ")
    assert message in text


@pytest.mark.parametrize(
    ("properties", "message"),
    [
        (
            {"placement": "areal"},
            'placement: is not a known placement ("areal", one of aerial, duct, buried, surface, '
            'indoor, bridge, water, existing). Did you mean "aerial"?',
        ),
        (
            {"placement": "existing", "existing_m": 0},
            "existing_m: is out of range (0 m, limit more",
        ),
        (
            {"placement": "existing", "existing_db": -1},
            "existing_db: is out of range (-1 dB, limit",
        ),
        (
            {"placement": "duct", "existing_m": 5},
            "existing_m: is for existing fibre only (placement duct). "
            'Give the line the placement "existing", or take the value out.',
        ),
        (
            {"existing_db": 5},
            "existing_db: is for existing fibre only (placement duct (the run's)).",
        ),
        ({"leg": 3.5}, "leg: is not text (3.5)."),
        ({"cable": {}}, "cable: is not text ({})."),
    ],
)
def test_wrong_properties_of_lines_are_named(
    properties: dict[str, object],
    message: str,
    collection: Callable[..., Path],
    road: dict[str, Any],
    said: Callable[[Path], list[str]],
) -> None:
    """A line that says something impossible is not planned as if it had said nothing."""
    road["properties"] = properties
    (text,) = said(collection(road))
    assert message in text


def test_wrong_areas_are_named(
    collection: Callable[..., Path],
    feature: Feature,
    road: object,
    said: Callable[[Path], list[str]],
) -> None:
    """Areas are to avoid or take a permit, and have rings of four positions at least."""
    assert said(collection(road, feature("Polygon", RING, kind="park"))) == [
        'route.geojson, feature 2, kind: is not a known kind ("park", one of avoid, permit).'
    ]
    thin = [[[10.0, 50.0], [10.1, 50.0], [10.0, 50.0]]]
    assert said(collection(road, feature("Polygon", thin, kind="avoid"))) == [
        "route.geojson, feature 2: is a polygon with a ring of fewer than four positions."
    ]


def test_keys_are_known_in_any_case(
    collection: Callable[..., Path], road: dict[str, Any], feature: Feature
) -> None:
    """`Placement` is no unknown property; where both are there, the exact one holds."""
    road["properties"] = {"NAME": "Loud", "name": "Right", "Placement": "buried"}
    (line,) = read_run(collection(road)).lines
    assert (line.name, line.placement) == ("Right", "buried")
    assert line.properties == {"NAME": "Loud"}


def test_a_null_property_is_not_given(
    collection: Callable[..., Path], feature: Feature, road: dict[str, Any]
) -> None:
    """Programs write null into every column they have no value for."""
    road["properties"] = {"name": None, "placement": None, "existing_m": None}
    point = feature("Point", AT, name="P", kind=None, role=None, joint=None, loop_m=None)
    run = read_run(collection(road, point))
    assert run.lines[0].placement is None
    assert run.places[0].properties == {"kind_assumed": True}
