"""Every station is told on all three rulers and from its section's own start."""

from __future__ import annotations

from typing import Any

import pytest

from routeplan.planning import Plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.stations import station_rows
from tests.sheets.plans import equator, line, planned, point

Row = dict[str, Any]

RULERS = ("ground_m", "sheath_from_m", "sheath_to_m", "glass_from_m", "glass_to_m")


def told(row: Row) -> tuple[object, ...]:
    """Return what a station is and what its rulers read."""
    kinds = (row["kind"], row["name"], row["reach_kind"], row["placement"])
    return (*kinds, *(row[key] for key in RULERS), row["section"], row["section_m"])


def test_duct_run_by_hand(duct_plan: Plan) -> None:
    """
    Every station of the duct run reads what is worked out by hand.

    Sheath: entry 20; at 500 m 20 + 505; at H1 20 + 808 = 828 and 30 of loop; at H2 858 + 404 =
    1262 and two tails of 15; at the end 1292 + 808 = 2100 and 20 of entry. Glass is 1.012 times
    each piece: 20.24; 20.24 + 511.06; 20.24 + 817.696 = 837.936, loop 30.36; + 408.848 =
    1277.144, tails 30.36; + 817.696 = 2125.2; + 20.24. Metres of the section count from its
    start: at the joint the arriving one is read, to its very end 1277; S2 is 15 + 808 + 20 = 843.
    """
    rows = [told(row) for row in station_rows(duct_plan)]
    hole = "handhole"
    assert rows == [
        ("site", "Studio", None, "duct", 0.0, 0.0, 20.0, 0.0, 20.24, "S1", 0.0),
        ("vertex", None, None, "duct", 500.0, 525.0, 525.0, 531.3, 531.3, "S1", 525.0),
        ("loop", "H1", hole, "duct", 800.0, 828.0, 858.0, 837.936, 868.296, "S1", 828.0),
        ("joint", "J1", hole, "duct", 1200.0, 1262.0, 1292.0, 1277.144, 1307.504, "S1", 1277.0),
        ("site", "Hill", None, "duct", 2000.0, 2100.0, 2120.0, 2125.2, 2145.44, "S2", 843.0),
    ]


def test_mixed_run_by_hand(mixed_plan: Plan) -> None:
    """
    Crossing, its loops, maintenance hole and riser read what is worked out by hand.

    The railway is 20 m wide about 300 m: loops of 10 at 290 and 310. Sheath: 20 + 292.9 = 312.9;
    322.9 + 10.1 = 333 in the middle; 343.1, 353.1; + 292.9 = 646 and 3 of racking; 649 + 404 =
    1053 and 10 of riser; 1063 + 1005 = 2068 and 20. Glass, each piece to the millimetre: 20.24 +
    296.415 = 316.655; 326.775 + 20.442 = 347.217; 357.337 + 296.415 = 653.752; 656.788 + 408.848
    = 1065.636; 1075.756 + 1017.06 = 2092.816; + 20.24. The vertex at 1000 m is taken for a pole,
    but nothing is there: it stays a vertex.
    """
    rows = [told(row) for row in station_rows(mixed_plan)]
    hole, rail = "maintenance_hole", "Branch line"
    assert rows == [
        ("site", "Studio", None, "duct", 0.0, 0.0, 20.0, 0.0, 20.24, "S1", 0.0),
        ("loop", rail, None, "duct", 290.0, 312.9, 322.9, 316.655, 326.775, "S1", 312.9),
        ("crossing", rail, None, "duct", 300.0, 333.0, 333.0, 336.996, 336.996, "S1", 333.0),
        ("loop", rail, None, "duct", 310.0, 343.1, 353.1, 347.217, 357.337, "S1", 343.1),
        ("reach", "M1", hole, "duct", 600.0, 646.0, 649.0, 653.752, 656.788, "S1", 646.0),
        ("vertex", None, None, "aerial", 1000.0, 1053.0, 1063.0, 1065.636, 1075.756, "S1", 1053.0),
        ("site", "Hill", None, "aerial", 2000.0, 2068.0, 2088.0, 2092.816, 2113.056, "S1", 2088.0),
    ]


def test_positions_are_on_the_line(duct_plan: Plan) -> None:
    """Longitude follows the metres along the equator; nine decimals are a tenth of a millimetre."""
    for row in station_rows(duct_plan):
        lon, lat = equator(float(row["ground_m"]))  # type: ignore[arg-type]
        assert row["lon"] == pytest.approx(lon, abs=2e-9)
        assert row["lat"] == lat


def test_first_kind_that_applies_is_taken(tmp_path: Any) -> None:
    """Where several things are at one station the first of the list counts, names of it joined."""
    features = [
        line([equator(0), equator(1000), equator(2000)], placement="duct"),
        point(equator(1000), name="H1", kind="handhole", loop_m=5),
        point(equator(1000), name="H2", kind="cabinet", joint="no"),
        point(equator(1000), name="Lane", kind="crossing", crosses="road"),
    ]
    kinds = {row["ground_m"]: row for row in station_rows(planned(tmp_path, features))}
    assert (kinds[1000.0]["kind"], kinds[1000.0]["name"]) == ("crossing", "Lane")
    without = [f for f in features if f["properties"].get("kind") != "crossing"]
    kinds = {row["ground_m"]: row for row in station_rows(planned(tmp_path, without))}
    assert (kinds[1000.0]["kind"], kinds[1000.0]["name"]) == ("loop", "H1")
    for feature in without[1:]:
        feature["properties"].pop("loop_m", None)
    toml = "[slack]\nloop_every_m = {}"
    kinds = {row["ground_m"]: row for row in station_rows(planned(tmp_path, without, toml))}
    assert (kinds[1000.0]["kind"], kinds[1000.0]["name"]) == ("reach", "H1; H2")


def test_assumed_places_show_only_where_used(tmp_path: Any) -> None:
    """An assumed place is no station unless a joint is there, on whichever cable."""
    hub = equator(0)
    arms = ([10.0, 0.04], [10.04, 0.0], [9.96, 0.0])  # 4.4 km each: a joint on every one
    features = [line([hub, arm], leg=f"Arm {n}") for n, arm in enumerate(arms)]
    plan = planned(tmp_path, features, "[reels]\nput_ups_m = [3000]\n")
    document: Row = plan_document(plan)
    for row in document["stations"]:
        assert row["kind"] in ("site", "joint", "vertex")
    on_leg = [joint for joint in document["joints"] if joint["node"] is None]
    assert len(on_leg) >= 3
    assert all(joint["assumed"] for joint in on_leg)


def test_existing_fibre_has_no_section(tmp_path: Any) -> None:
    """Along somebody's fibre no section is named, and its metres count as glass only."""
    features = [
        line([equator(0), equator(1000)], placement="duct", leg="Leg"),
        line(
            [equator(1000), equator(1500), equator(2000)],
            placement="existing",
            leg="Leg",
            existing_m=1100,
        ),
        line([equator(2000), equator(3000)], placement="duct", leg="Leg"),
    ]
    rows = list(station_rows(planned(tmp_path, features, "[joints]\nassumed_spacing_m = 5000")))
    told_at = {row["ground_m"]: row for row in rows}
    inside = told_at[1500.0]
    assert (inside["section"], inside["section_m"], inside["placement"]) == (None, None, "existing")
    assert told_at[1000.0]["section"] == "S1"
    assert (told_at[2000.0]["section"], told_at[2000.0]["section_m"]) == ("S2", 0.0)
    assert told_at[2000.0]["glass_from_m"] - told_at[1000.0]["glass_to_m"] == pytest.approx(1100)


def test_stations_run_from_end_to_end(many_documents: list[Row]) -> None:
    """Along each leg stations rise from 0 to its length, and no ruler ever falls."""
    for document in many_documents:
        for leg in document["legs"]:
            rows = [row for row in document["stations"] if row["leg"] == leg["name"]]
            ground = [row["ground_m"] for row in rows]
            assert (ground[0], ground[-1]) == (0.0, leg["ground_m"])
            assert ground == sorted(set(ground))
            for ruler in ("sheath", "glass"):
                readings = [row[f"{ruler}_{end}_m"] for row in rows for end in ("from", "to")]
                assert readings == sorted(readings)
                assert readings[0] == 0.0


def test_cables_end_where_their_last_station_does(many_documents: list[Row]) -> None:
    """The last station reads the cable's whole sheath and glass."""
    for document in many_documents:
        for cable in document["cables"]:
            last = [row for row in document["stations"] if row["cable"] == cable["name"]][-1]
            assert last["sheath_to_m"] == cable["sheath_m"]
            assert last["glass_to_m"] == cable["glass_m"]


def test_section_metres_end_at_the_sections_length(many_documents: list[Row]) -> None:
    """At its last station a section's metres are its sheath length, and never more before."""
    for document in many_documents:
        for section in document["sections"]:
            metres = [
                row["section_m"]
                for row in document["stations"]
                if row["section"] == section["name"]
            ]
            assert metres == sorted(metres)
            assert metres[-1] == section["sheath_m"]
            assert metres[0] >= 0.0


def test_every_vertex_joint_and_crossing_has_a_station(many_documents: list[Row]) -> None:
    """Every vertex of a leg, every joint on it and every crossing is a station."""
    for document in many_documents:
        at = {(row["leg"], row["ground_m"]) for row in document["stations"]}
        for leg in document["legs"]:
            assert {(leg["name"], ground_m) for ground_m in leg["line_ground_m"]} <= at
        crossed = [row for row in document["crossings"] if row["how"] == "crosses"]
        for row in (*document["joints"], *crossed):
            assert (row["leg"], row["ground_m"]) in at


def test_heights_are_told_where_known(tmp_path: Any) -> None:
    """Heights are interpolated between vertices that have one, null where there is none."""
    low, high = [*equator(0), 10.0], [*equator(1000), 30.0]
    features = [line([low, high]), point(equator(500), name="H", kind="handhole")]
    rows = list(station_rows(planned(tmp_path, features)))
    assert [row["height_m"] for row in rows] == [10.0, pytest.approx(20.0, abs=0.001), 30.0]
