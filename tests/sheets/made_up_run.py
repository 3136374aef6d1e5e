"""A made-up run as `plan.json` would hold it: 20 km over the invented island, every placement."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import Any

Row = dict[str, Any]
Marks = dict[float, tuple[str, str, str | None, float]]

HOSTILE_NAMES = ("<img src=x onerror=alert(1)>", "`${1}`", "</script><script>alert(2)</script>")

COLOURS = (
    "blue orange green brown slate white red black yellow violet rose aqua".split()  # noqa: SIM905
)
STRETCHES = (
    ("indoor", 0, 60),
    ("duct", 60, 5200),
    ("bridge", 5200, 5420),
    ("duct", 5420, 7000),
    ("aerial", 7000, 12500),
    ("buried", 12500, 16900),
    ("water", 16900, 17500),
    ("surface", 17500, 17900),
    ("existing", 17900, 18700),
    ("buried", 18700, 20000),
)
JOINTS_AT_M = (5000, 10000, 15000)
LOSS_LINES = (
    ("fibre", 1, 6.982, 0.104, 7.912, "fibre table, typical at 1310 nm"),
    ("splices", 3, 0.05, 0.03, 0.1, "loss.splice_mean_db, default"),
    ("pigtail splices", 2, 0.05, 0.03, 0.1, "loss.pigtail_splices, default"),
    ("connector pairs", 2, 0.25, 0.13, 0.5, "loss.connector_pairs, default"),
)


def made_up_run(
    *, length_m: int = 20000, step_m: int = 100, reach_step_m: int = 250, hostile: bool = False
) -> Row:
    """Return a whole document; a longer or finer one for measurements, hostile names on demand."""
    line, ground_m = _line(length_m, step_m)
    scale = length_m / 20000
    stretches = [
        {"placement": name, "from_ground_m": a * scale, "to_ground_m": b * scale}
        for name, a, b in STRETCHES
    ]
    names = HOSTILE_NAMES if hostile else ("Ostrel House", "Quenmoor", "Leg 1")
    joints_at_m = [at * scale for at in JOINTS_AT_M]
    marks = _marks(
        ground_m, stretches, joints_at_m=joints_at_m, reach_step_m=reach_step_m, names=names
    )
    stations = _stations(line, ground_m, marks=marks, leg=names[2])
    sections = _sections(stations, names, joints_at_m)
    document: Row = {
        "schema": 1,
        "title": HOSTILE_NAMES[2] if hostile else "Quenmoor studio-to-transmitter link",
        "purpose": "link",
        "units": "metric",
        "currency": "EUR",
        "fibres_per_tray": 12,
        "nodes": [
            {"name": names[0], "role": "studio", "lon": line[0][0], "lat": line[0][1]},
            {"name": names[1], "role": "transmitter", "lon": line[-1][0], "lat": line[-1][1]},
        ],
        "legs": [_leg(names, line, ground_m, stretches)],
        "areas": [_area(line, names[2] if hostile else "Bird ground")],
        "stations": stations,
        "sections": sections,
        "joints": _joints(stations, joints_at_m),
    }
    document |= _cable_rows(document, names, stations)
    document |= _paper_rows(document, names[1])
    document["circuits"] = _circuits(names, ground_m, joints_at_m)
    return document


def _line(length_m: int, step_m: int) -> tuple[list[list[float]], list[float]]:
    """Return vertices winding north-east over a hill, and their ground metres."""
    count = length_m // step_m + 1
    ground_m = [float(index * step_m) for index in range(count)]
    lon, lat, line = -31.4, 46.9, []
    for index, at_m in enumerate(ground_m):
        part = index / (count - 1)
        height_m = 18 + 290 * math.exp(-(((part - 0.62) / 0.2) ** 2)) + 22 * math.sin(part * 29)
        line.append([round(lon, 9), round(lat, 9), round(max(2.0, height_m), 2)])
        bearing = 0.95 + 0.75 * math.sin(part * 7.3) + 0.35 * math.sin(part * 31 + at_m / 9e9)
        lon += step_m * math.sin(bearing) / (111320 * math.cos(math.radians(lat)))
        lat += step_m * math.cos(bearing) / 111200
    return line, ground_m


def _at(line: list[list[float]], ground_m: list[float], at_m: float) -> list[float]:
    step_m = ground_m[1] - ground_m[0]
    index = min(int(at_m / step_m), len(line) - 2)
    part = (at_m - ground_m[index]) / step_m
    pair = zip(line[index], line[index + 1], strict=True)
    return [round(a + (b - a) * part, 9) for a, b in pair]


def _stations(
    line: list[list[float]],
    ground_m: list[float],
    *,
    marks: Marks,
    leg: str,
) -> list[Row]:
    stations, sheath_m, glass_m, before_m, section = [], 0.0, 0.0, 0.0, 1
    section_start_m = 0.0
    for at_m in sorted(marks):
        kind, name, reach_kind, steps_m = marks[at_m]
        sheath_m = round(sheath_m + (at_m - before_m) * 1.01, 3)
        glass_m = round(glass_m + (at_m - before_m) * 1.01 * 1.012, 3)
        to_m = round(sheath_m + steps_m, 3)
        lon, lat, height_m = _at(line, ground_m, at_m)
        stations.append({
            "leg": leg, "cable": "Cable 1", "kind": kind, "name": name,
            "reach_kind": reach_kind, "ground_m": at_m,
            "sheath_from_m": sheath_m, "sheath_to_m": to_m,
            "glass_from_m": glass_m, "glass_to_m": round(glass_m + steps_m * 1.012, 3),
            "section": f"S{section}", "section_m": round(sheath_m - section_start_m, 3),
            "lon": lon, "lat": lat, "height_m": height_m,
        })  # fmt: skip
        if kind == "joint":
            section, section_start_m = section + 1, round(sheath_m + steps_m / 2, 3)
        sheath_m, glass_m, before_m = to_m, round(glass_m + steps_m * 1.012, 3), at_m
    return stations


def _marks(
    ground_m: list[float],
    stretches: list[Row],
    *,
    joints_at_m: list[float],
    reach_step_m: int,
    names: tuple[str, ...],
) -> Marks:
    """Return what stands at each ground station: kind, name, reach kind, sheath step."""
    marks: Marks = {}
    for at_m in ground_m:
        marks[at_m] = ("vertex", "", None, 0.0)
    end_m = ground_m[-1]
    for number in range(1, int(end_m / reach_step_m)):
        at_m = float(number * reach_step_m)
        placement = next(s["placement"] for s in stretches if at_m <= s["to_ground_m"])
        if placement not in ("duct", "aerial", "buried"):
            continue
        usual = {"duct": "handhole", "aerial": "pole", "buried": "pedestal"}[placement]
        reach_kind = "maintenance_hole" if placement == "duct" and number % 6 == 0 else usual
        name = f"{reach_kind[0].upper()}-{number:02d}"
        marks[at_m] = ("loop" if number % 5 == 3 else "reach", name, reach_kind, 0.0)
        if number % 5 == 3:
            marks[at_m] = ("loop", name, reach_kind, 15.0)
    marks[end_m * 0.215] = ("crossing", "Harbour Road", None, 0.0)
    for number, at_m in enumerate(joints_at_m, start=1):
        reach_kind = ("handhole", "pole", "pedestal")[number - 1]
        marks[at_m] = ("joint", f"J{number}", reach_kind, 30.0)
    marks[0.0] = ("site", names[0], None, 20.0)
    marks[end_m] = ("site", names[1], None, 20.0)
    return marks


def _sections(stations: list[Row], names: tuple[str, ...], joints_at_m: list[float]) -> list[Row]:
    ends = [names[0], *(f"J{n}" for n in range(1, len(joints_at_m) + 1)), names[1]]
    edges_m = [
        0.0,
        *((s["sheath_from_m"] + s["sheath_to_m"]) / 2 for s in stations if s["kind"] == "joint"),
        stations[-1]["sheath_to_m"],
    ]
    rows = []
    for number, (start, end) in enumerate(pairwise(edges_m), start=1):
        sheath_m = round(end - start, 3)
        rows.append({
            "name": f"S{number}", "cable": "Cable 1", "from": ends[number - 1], "to": ends[number],
            "sheath_m": sheath_m, "needed_m": round(sheath_m * 1.02, 3), "reel": f"R{number}",
        })  # fmt: skip
    return rows


def _joints(stations: list[Row], joints_at_m: list[float]) -> list[Row]:
    rows = []
    for number, station in enumerate((s for s in stations if s["kind"] == "joint"), start=1):
        rows.append({
            "name": f"J{number}", "node": None, "reach_name": ("H-20", "P-40", "")[number - 1],
            "leg": station["leg"], "ground_m": station["ground_m"], "lon": station["lon"],
            "lat": station["lat"], "kind": "splice", "assumed": number == 3, "splice_count": 24,
            "cost": 882.0,
            "ends": [{"section": f"S{number}", "side": "end"},
                     {"section": f"S{number + 1}", "side": "start"}],
        })  # fmt: skip
    return rows


def _leg(
    names: tuple[str, ...], line: list[list[float]], ground_m: list[float], stretches: list[Row]
) -> Row:
    return {
        "name": names[2], "from": names[0], "to": names[1], "grid_m": ground_m[-1] - 7.412,
        "grid_crs": "EPSG:32625", "grid_scale_factor": 0.99962, "ellipsoid_m": ground_m[-1] - 9.9,
        "ground_m": ground_m[-1], "stretches": stretches, "line": line, "line_ground_m": ground_m,
    }  # fmt: skip


def _area(line: list[list[float]], name: str) -> Row:
    lon, lat = line[len(line) // 3][:2]
    ring = [[lon + dx, lat + dy] for dx, dy in ((0.004, -0.012), (0.03, -0.015), (0.02, -0.003))]
    return {"name": name, "kind": "avoid", "rings": [[*ring, ring[0]]]}


def _cable_rows(document: Row, names: tuple[str, ...], stations: list[Row]) -> Row:
    sections, joints = document["sections"], document["joints"]
    last = stations[-1]
    reels = []
    for section in sections:
        length_m = 6000.0 if section["needed_m"] <= 6000 else math.ceil(section["needed_m"])
        used_m = section["needed_m"]
        reels.append({
            "name": section["reel"], "length_m": length_m, "source": "put-up", "used_m": used_m,
            "spare_m": round(length_m - used_m, 3), "cost": round(length_m * 1.2 + 120, 2),
        })  # fmt: skip
    ordered_m = sum(reel["length_m"] for reel in reels)
    cost = round(sum(r["cost"] for r in reels) + sum(j["cost"] for j in joints), 2)
    return {
        "totals": {
            "ground_m": last["ground_m"], "sheath_m": last["sheath_to_m"],
            "glass_m": last["glass_to_m"], "ordered_m": ordered_m, "stock_m": 0.0,
            "reel_count": len(reels), "section_count": len(sections), "joint_count": len(joints),
            "closure_count": len(joints), "splice_count": 24 * len(joints),
            "pigtail_splice_count": 8, "cost": cost,
        },
        "cables": [{
            "name": "Cable 1", "legs": [names[2]], "fibre_count": 24, "fibre_type": "G.652.D",
            "sheath_m": last["sheath_to_m"], "glass_m": last["glass_to_m"],
        }],
        "reels": reels,
        "layout": {"optimal": True, "cost": cost, "lower_bound": cost, "stopped_by": "proof",
                   "one_fewer": {"joint_count": 2, "cost": cost + 1312.4}},
        "splices": [row for joint in joints for row in _splices(joint)],
    }  # fmt: skip


def _splices(joint: Row) -> list[Row]:
    rows = []
    for fibre in range(1, 25):
        end = {
            "cable": "Cable 1", "fibre": fibre, "tube_colour": COLOURS[(fibre - 1) // 12],
            "fibre_colour": COLOURS[(fibre - 1) % 12],
        }  # fmt: skip
        rows.append({
            "joint": joint["name"], "tray": (fibre - 1) // 12 + 1, "position": (fibre - 1) % 12 + 1,
            "in": end | {"section": joint["ends"][0]["section"]},
            "out": end | {"section": joint["ends"][1]["section"]},
            "kind": "splice", "circuit": {1: "Programme", 2: "Programme", 3: "Return"}.get(fibre),
            "limit_db": 0.1,
        })  # fmt: skip
    return rows


def _circuits(names: tuple[str, ...], ground_m: list[float], joints_at_m: list[float]) -> list[Row]:
    rows = []
    for number, (name, fibres) in enumerate((("Programme", (1, 2)), ("Return", (3,)))):
        budgets = [
            _budget(wavelength_nm, direction, verdict="fits" if number == 0 else "unknown")
            for wavelength_nm in (1310, 1550)
            for direction in ("from-to", "to-from")
        ]
        power = [
            {
                "ground_m": at_m,
                "loss_db": round(
                    0.3 + at_m * 0.00036 + 0.05 * sum(j <= at_m for j in joints_at_m), 3
                ),
            }
            for at_m in ground_m[:: max(1, len(ground_m) // 200)]
        ]
        rows.append({
            "name": name, "from": names[0], "to": names[1],
            "fibres": [{"cable": "Cable 1", "fibre": fibre} for fibre in fibres],
            "glass_m": 20748.612, "delay_us": 101.631,
            "verdict": "fits" if number == 0 else "unknown", "budgets": budgets, "power": power,
        })  # fmt: skip
    return rows


def _budget(wavelength_nm: int, direction: str, *, verdict: str) -> Row:
    known = verdict == "fits"
    return {
        "wavelength_nm": wavelength_nm, "direction": direction, "nominal_db": 7.732,
        "statistical_db": 8.342, "worst_db": 9.412, "available_db": 15.0 if known else None,
        "margin_db": 2.588 if known else None, "statistical_margin_db": 3.658 if known else None,
        "overload_db": 1.2 if known else None, "attenuator_db": 2.0 if known else None,
        "dispersion_min_ps_per_nm": -20.9, "dispersion_max_ps_per_nm": 18.4,
        "pmd_ps": 0.912 if known else None, "return_loss_db": None, "verdict": verdict,
        "reasons": ["2 dB attenuator mends an overload of 1.200 dB"]
        if known else ["no interface was named"],
        "lines": [
            dict(zip(("item", "count", "each_db", "sigma_db", "limit_db", "source"), line,
                     strict=True))
            for line in LOSS_LINES
        ],
    }  # fmt: skip


def _paper_rows(document: Row, end_name: str) -> Row:
    reels = document["reels"]
    return {
        "checks": [
            {"kind": "span", "where": "P-30 to P-31", "value": 61.2, "limit": 60.0, "unit": "m",
             "verdict": "fails", "source": "mechanics.span_max_m, default"},
            {"kind": "margin", "where": "Programme", "value": 2.588, "limit": 0.0, "unit": "dB",
             "verdict": "fits", "source": "loss.margin_db, default"},
            {"kind": "bend", "where": "H-12", "value": None, "limit": 0.3, "unit": "m",
             "verdict": "unknown", "source": "no cable data"},
        ],
        "assumptions": [
            {"name": "slack.entry_m", "value": 20.0, "unit": "m", "source": "common practice",
             "reason": "the run file does not give it"},
            {"name": "costs.cable_per_m", "value": 1.2, "unit": "EUR", "source": "invented",
             "reason": "the run file does not give it"},
            {"name": "joints.assumed_spacing_m", "value": 250.0, "unit": "m",
             "source": "house rule", "reason": "no reach point was declared there"},
        ],
        "warnings": [{"where": f"leg to {end_name}", "message": "slope adds 1.4 % to the length"}],
        "bill": [
            {"item": "Cable, 24 fibres, G.652.D", "quantity": sum(r["length_m"] for r in reels),
             "unit": "m", "each": 1.2, "total": 1.2 * sum(r["length_m"] for r in reels),
             "note": f"{len(reels)} reels"},
            {"item": "Closure and visit", "quantity": 3, "unit": "each", "each": 450.0,
             "total": 1350.0, "note": ""},
        ],
        "cautions": [{"topic": "Laser light", "text": "Never look into a fibre end."}],
    }  # fmt: skip
