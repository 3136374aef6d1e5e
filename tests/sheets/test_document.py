"""What plan.json holds is complete, exact and consistent in itself."""

from __future__ import annotations

import json
import math
from collections import Counter
from collections.abc import Iterator
from typing import Any

import pytest

from routeplan.planning import Plan
from routeplan.sheets.document import plan_document
from routeplan.sheets.tables import HEAD, TABLES

Row = dict[str, Any]

# What plan.json promises to hold at least, key by key.
PROMISED = {
    "": "schema title purpose totals nodes legs cables stations sections reels layout joints "
    "splices circuits checks assumptions warnings",
    "totals": "ground_m sheath_m glass_m ordered_m stock_m reel_count section_count joint_count "
    "closure_count splice_count pigtail_splice_count cost",
    "nodes": "name role lon lat",
    "legs": "name from to grid_m grid_crs grid_scale_factor ellipsoid_m ground_m stretches",
    "legs.stretches": "placement from_ground_m to_ground_m",
    "cables": "name legs fibre_count fibre_type sheath_m glass_m",
    "stations": "leg cable kind name ground_m sheath_from_m sheath_to_m glass_from_m glass_to_m "
    "section section_m lon lat height_m",
    "sections": "name cable from to sheath_m needed_m reel",
    "reels": "name length_m source used_m spare_m cost",
    "layout": "optimal cost lower_bound one_fewer stopped_by",
    "layout.one_fewer": "joint_count cost",
    "joints": "name node reach_name leg ground_m lon lat kind assumed splice_count cost ends",
    "joints.ends": "section side",
    "splices": "joint tray position in out kind circuit limit_db",
    "splices.in": "cable section fibre tube_colour fibre_colour",
    "splices.out": "cable section fibre tube_colour fibre_colour",
    "circuits": "name from to fibres glass_m delay_us verdict budgets",
    "circuits.fibres": "cable fibre",
    "circuits.budgets": "wavelength_nm direction nominal_db statistical_db worst_db available_db "
    "margin_db statistical_margin_db overload_db attenuator_db dispersion_min_ps_per_nm "
    "dispersion_max_ps_per_nm pmd_ps return_loss_db verdict reasons lines",
    "circuits.budgets.lines": "item count each_db sigma_db limit_db source",
    "checks": "kind where value limit unit verdict source",
    "assumptions": "name value unit source reason",
    "warnings": "where message",
}


def rows_at(place: Row, path: str) -> Iterator[Row]:
    """Yield the rows under a dotted path, through lists and single rows."""
    head, _, rest = path.partition(".")
    found = place[head] if head else place
    for row in found if isinstance(found, list) else [found]:
        if row is None:
            continue
        if rest:
            yield from rows_at(row, rest)
        else:
            yield row


@pytest.mark.parametrize("path", PROMISED)
def test_promised_keys_are_there(path: str, many_documents: list[Row]) -> None:
    """Every row of every run has at least the promised keys, and some run has such a row."""
    count = 0
    for document in many_documents:
        for row in rows_at(document, path):
            assert set(PROMISED[path].split()) <= row.keys()
            count += 1
    assert count


def test_keys_are_those_of_the_catalogue_in_order(many_documents: list[Row]) -> None:
    """Every row has the catalogue's keys in the catalogue's order, and nothing else."""
    heads = [column.key for column in HEAD]
    tops = {entry.path[0] for entry in TABLES.values() if len(entry.path) == 1}
    for document in many_documents:
        assert list(document)[: len(heads)] == heads
        assert set(document) == {*heads, *tops}
        for entry in TABLES.values():
            for row in rows_at(document, ".".join(entry.path)) if entry.path else ():
                assert list(row) == [column.key for column in entry.columns]


def mm(value: float) -> int:
    """Return a length in whole millimetres, having checked that it is one."""
    whole = round(value * 1000)
    assert value == whole / 1000
    return whole


def cents(value: float) -> int:
    """Return money in whole cents, having checked that it is so."""
    whole = round(value * 100)
    assert value == whole / 100
    return whole


def test_totals_are_exact_sums(many_documents: list[Row]) -> None:
    """Every total is the sum of its parts to the millimetre, the cent and the splice."""
    for document in many_documents:
        totals = document["totals"]
        reels, joints, sections = document["reels"], document["joints"], document["sections"]
        bought = [reel for reel in reels if reel["source"] != "stock"]
        assert mm(totals["ground_m"]) == sum(mm(leg["ground_m"]) for leg in document["legs"])
        assert mm(totals["sheath_m"]) == sum(mm(s["sheath_m"]) for s in sections)
        assert mm(totals["sheath_m"]) == sum(mm(c["sheath_m"]) for c in document["cables"])
        assert mm(totals["glass_m"]) == sum(mm(c["glass_m"]) for c in document["cables"])
        assert mm(totals["ordered_m"]) == sum(mm(reel["length_m"]) for reel in bought)
        assert totals["stock_m"] == 0
        assert totals["reel_count"] == len(reels)
        assert totals["section_count"] == len(sections)
        assert totals["joint_count"] == len(joints)
        assert totals["closure_count"] == sum(
            joint["kind"] == "splice" and joint["closure"] == joint["name"] for joint in joints
        )
        assert totals["splice_count"] == sum(joint["splice_count"] for joint in joints)
        assert cents(totals["cost"]) == sum(cents(r["cost"]) for r in (*reels, *joints))
        assert totals["cost"] == document["layout"]["cost"]


def test_reels_hold_their_sections(many_documents: list[Row]) -> None:
    """Every section is cut from one reel, which is long enough and has the rest to spare."""
    for document in many_documents:
        needed = {s["name"]: mm(s["needed_m"]) for s in document["sections"]}
        assert sorted(n for reel in document["reels"] for n in reel["sections"]) == sorted(needed)
        for reel in document["reels"]:
            used = sum(needed[name] for name in reel["sections"])
            assert mm(reel["used_m"]) == used
            assert mm(reel["spare_m"]) == mm(reel["length_m"]) - used >= 0
        by_section = {s["name"]: s["reel"] for s in document["sections"]}
        for reel in document["reels"]:
            assert {by_section[name] for name in reel["sections"]} == {reel["name"]}


def test_layout_proves_its_cost(many_documents: list[Row]) -> None:
    """The bound never exceeds the cost and equals the optimum; one fewer is one fewer."""
    for document in many_documents:
        layout = document["layout"]
        assert cents(layout["lower_bound"]) <= cents(layout["cost"])
        if layout["optimal"]:
            assert layout["lower_bound"] == layout["cost"]
        if layout["one_fewer"]:
            assert layout["one_fewer"]["joint_count"] == len(document["joints"]) - 1
            assert cents(layout["one_fewer"]["cost"]) >= cents(layout["cost"])


def test_joints_and_splices_agree(many_documents: list[Row]) -> None:
    """A joint's ends are ends of sections there, and its splices are those of the schedule."""
    for document in many_documents:
        sections = {s["name"]: s for s in document["sections"]}
        counted = Counter(s["joint"] for s in document["splices"] if s["kind"] == "splice")
        for joint in document["joints"]:
            assert joint["splice_count"] == counted[joint["name"]]
            assert joint["ends"]
            for end in joint["ends"]:
                section = sections[end["section"]]
                assert section["from" if end["side"] == "start" else "to"] == joint["name"]
        places = {joint["name"] for joint in document["joints"]}
        places |= {node["name"] for node in document["nodes"]}
        assert {s[side] for s in sections.values() for side in ("from", "to")} <= places


def test_stretches_fill_their_leg(many_documents: list[Row]) -> None:
    """The stretches of a leg follow each other from its start to its end."""
    for document in many_documents:
        for leg in document["legs"]:
            at = 0
            for stretch in leg["stretches"]:
                assert mm(stretch["from_ground_m"]) == at
                at = mm(stretch["to_ground_m"])
            assert at == mm(leg["ground_m"])
            assert leg["line_ground_m"][-1] == leg["ground_m"]
            assert len(leg["line"]) == len(leg["line_ground_m"])


def test_grid_scale_factor_is_their_quotient(many_documents: list[Row]) -> None:
    """The scale factor of the grid is grid over ellipsoid length."""
    for document in many_documents:
        for leg in document["legs"]:
            quotient = leg["grid_m"] / leg["ellipsoid_m"]
            assert leg["grid_scale_factor"] == pytest.approx(quotient, abs=1e-5)


def milli(value: float) -> int:
    """Return decibels in whole thousandths, having checked that they are so."""
    whole = round(value * 1000)
    assert value == pytest.approx(whole / 1000, abs=1e-12)
    return whole


def test_budgets_add_up(many_documents: list[Row], many_plans: list[Plan]) -> None:
    """Printed lines add up to printed losses, and margins are what is available less the loss."""
    for document, planned in zip(many_documents, many_plans, strict=False):
        loss = planned.run.practice.loss
        for budget in rows_at(document, "circuits.budgets"):
            lines = budget["lines"]
            nominal = sum(line["count"] * milli(line["each_db"]) for line in lines)
            worst = sum(line["count"] * milli(line["limit_db"]) for line in lines)
            spread = math.sqrt(sum(line["count"] * line["sigma_db"] ** 2 for line in lines))
            assert milli(budget["nominal_db"]) == nominal
            assert milli(budget["worst_db"]) == worst
            statistical_db = min(nominal / 1000 + loss.sigma_count * spread, worst / 1000)
            assert budget["statistical_db"] == pytest.approx(statistical_db, abs=0.0011)
            if budget["available_db"] is None:
                assert budget["margin_db"] is None
                assert budget["verdict"] == "unknown"
                continue
            available, kept = milli(budget["available_db"]), milli(loss.margin_db)
            assert milli(budget["margin_db"]) == available - worst - kept
            statistical = milli(budget["statistical_db"])
            assert milli(budget["statistical_margin_db"]) == available - statistical - kept


def test_circuit_glass_is_that_of_its_cables(many_documents: list[Row]) -> None:
    """A circuit runs over whole cables: its glass is the sum of theirs."""
    for document in many_documents:
        glass = {cable["name"]: mm(cable["glass_m"]) for cable in document["cables"]}
        for circuit in document["circuits"]:
            names = dict.fromkeys(fibre["cable"] for fibre in circuit["fibres"])
            assert mm(circuit["glass_m"]) == sum(glass[name] for name in names)
            budget = circuit["budgets"][0]
            assert circuit["delay_us"] == budget["delay_us"]


def test_verdict_is_the_worst_check(many_documents: list[Row]) -> None:
    """The plan fails if a check fails, and is unknown if one is and none fails."""
    found = set()
    for document in many_documents:
        verdicts = {check["verdict"] for check in document["checks"]}
        worst = next(v for v in ("fails", "unknown", "fits") if v in verdicts)
        assert document["verdict"] == worst
        found.add(worst)
    assert {"fails", "unknown"} <= found


def test_everything_is_json(many_documents: list[Row]) -> None:
    """No number is infinite or not a number, and nothing changes on the way through JSON."""
    for document in many_documents:
        assert json.loads(json.dumps(document, allow_nan=False)) == document


def test_two_documents_of_a_plan_are_equal(duct_plan: Plan) -> None:
    """Making the document changes nothing in the plan."""
    assert plan_document(duct_plan) == plan_document(duct_plan)


def test_crossings_are_listed(mixed_plan: Plan) -> None:
    """A declared crossing is listed with what is crossed, where, and how wide it is."""
    (crossing,) = plan_document(mixed_plan)["crossings"]
    assert crossing["name"] == "Branch line"
    assert (crossing["crosses"], crossing["ground_m"], crossing["width_m"]) == ("rail", 300.0, 20)


def test_areas_keep_their_rings(many_documents: list[Row]) -> None:
    """An area is listed with its rings as longitude and latitude."""
    (area,) = many_documents[0]["areas"]
    assert (area["name"], area["kind"]) == ("Wood", "avoid")
    assert area["rings"][0][0] == [20.0, 40.0]


def test_duct_run_by_hand(duct_plan: Plan) -> None:
    """
    Two kilometres of duct give the figures worked out by hand.

    Ground 2000 m. Sheath: entry 20; 800 x 1.01 = 808 to H1; its loop 30; 400 x 1.01 = 404 to H2;
    two tails 15 there; 808 on; entry 20: 2120. S1 = 20 + 808 + 30 + 404 + 15 = 1277, S2 = 843.
    Needed: 1277 x 1.02 = 1302.54 and 843 x 1.02 = 859.86. Without the joint 2090 x 1.02 = 2131.8
    would not fit the only put-up of 1500, and H1 is no place for a joint. Glass 2120 x 1.012 =
    2145.44. A reel costs 1.2 x 1500 + 120 = 1920, the joint 450 + 12 x 18 = 666.
    """
    document: Row = plan_document(duct_plan)
    totals = document["totals"]
    assert totals == {
        "ground_m": 2000.0,
        "sheath_m": 2120.0,
        "glass_m": 2145.44,
        "ordered_m": 3000.0,
        "stock_m": 0.0,
        "reel_count": 2,
        "section_count": 2,
        "joint_count": 1,
        "closure_count": 1,
        "splice_count": 12,
        "pigtail_splice_count": 4,
        "cost": 4506.0,
    }
    assert [
        (s["name"], s["from"], s["to"], s["sheath_m"], s["needed_m"], s["reel"])
        for s in document["sections"]
    ] == [
        ("S1", "Studio", "J1", 1277.0, 1302.54, "R1"),
        ("S2", "J1", "Hill", 843.0, 859.86, "R2"),
    ]
    assert [
        (r["name"], r["length_m"], r["source"], r["used_m"], r["spare_m"], r["cost"])
        for r in document["reels"]
    ] == [
        ("R1", 1500.0, "put-up", 1302.54, 197.46, 1920.0),
        ("R2", 1500.0, "put-up", 859.86, 640.14, 1920.0),
    ]
    assert document["layout"] == {
        "optimal": True,
        "cost": 4506.0,
        "lower_bound": 4506.0,
        "one_fewer": None,
        "stopped_by": "",
    }
    (joint,) = document["joints"]
    ends = [
        {"section": "S1", "side": "end", "jacket_mark_m": None},
        {"section": "S2", "side": "start", "jacket_mark_m": None},
    ]
    assert joint.pop("lon") == pytest.approx(10 + math.degrees(1200 / 6378137.0), abs=2e-9)
    assert joint == {
        "name": "J1",
        "node": None,
        "reach_name": "H2",
        "reach_kind": "handhole",
        "leg": "Duct",
        "ground_m": 1200.0,
        "lat": 0.0,
        "kind": "splice",
        "assumed": False,
        "splice_count": 12,
        "cost": 666.0,
        "ends": ends,
        "opened": [],
        "closure": "J1",
    }


def test_mixed_run_by_hand(mixed_plan: Plan) -> None:
    """
    A kilometre of duct and one of poles give the figures worked out by hand.

    Entry 20; duct 1000 x 1.01 = 1010 with loops of 10 each side of the railway and 3 in the
    maintenance hole; riser 10; poles 1000 x 1.005 = 1005; entry 20: 2088. Glass 2088 x 1.012 =
    2113.056. Needed 2088 x 1.02 = 2129.76, made 2130: 1.2 x 2130 + 120 = 2676.
    """
    document: Row = plan_document(mixed_plan)
    (section,), (reel,) = document["sections"], document["reels"]
    assert (section["sheath_m"], section["needed_m"]) == (2088.0, 2129.76)
    assert (reel["length_m"], reel["source"], reel["cost"]) == (2130.0, "to-length", 2676.0)
    assert document["totals"]["glass_m"] == 2113.056
    assert document["joints"] == document["splices"] == []


def test_loss_along_the_ground_ends_at_the_whole_loss(many_documents: list[Row]) -> None:
    """The curve of each wavelength ends, at its far end, at the nominal loss of its budget."""
    count = 0
    for document in many_documents:
        for circuit in document["circuits"]:
            for budget in circuit["budgets"]:
                *_, before, last = (
                    row
                    for row in circuit["power"]
                    if row["wavelength_nm"] == budget["wavelength_nm"]
                )
                assert (last["leg"], last["ground_m"]) == (before["leg"], before["ground_m"])
                if budget["direction"] == "from-to":
                    rounding_db = 0.001 * len(circuit["power"])
                    assert last["loss_db"] == pytest.approx(budget["nominal_db"], abs=rounding_db)
                    count += 1
    assert count
