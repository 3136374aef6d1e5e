"""What `plan.json` holds: a plan as plain rows, in the catalogue's order and digits."""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from collections.abc import Iterator

import numpy as np

from routeplan.cable.colours import fibre_colours
from routeplan.cable.layout import LaidCable
from routeplan.cable.marks import printed_mark_mm, printed_marks
from routeplan.cable.model import FibreEnd, Joint
from routeplan.cable.way import Spot
from routeplan.circuit_answers import changes, radio_figures, stretch_m, times
from routeplan.ground.model import Leg
from routeplan.light.circuits import Closing
from routeplan.planning import CircuitPlan, Plan, assumptions, one_fewer, ports, splices
from routeplan.sheets.bill import bill_rows, pigtail_splice_count
from routeplan.sheets.budget_rows import budget_row
from routeplan.sheets.cautions import cautions_for
from routeplan.sheets.crossing_rows import crossing_rows, steep_rows
from routeplan.sheets.levels import level_rows, mark_rows
from routeplan.sheets.power import power_rows
from routeplan.sheets.rows import row_of, shaped
from routeplan.sheets.spectrum import spectrum_row
from routeplan.sheets.stations import station_rows
from routeplan.sheets.tables import SCHEMA, Json, Row
from routeplan.sheets.way_rows import separate_way_rows, standby_rows
from routeplan.units import amount_from_cents, m_from_mm

__all__ = ["plan_document"]


def plan_document(planned: Plan) -> dict[str, Json]:
    """
    Return everything a plan says, as `plan.json` holds it.

    Parameters
    ----------
    planned
        The plan.
    """
    run = planned.run
    document: dict[str, Json] = {
        "schema": SCHEMA,
        "title": run.title,
        "purpose": run.purpose,
        "verdict": planned.verdict,
        "units": run.units,
        "currency": run.practice.costs.currency,
        "fibres_per_tray": run.practice.joints.fibres_per_tray,
        "digest": run.digest,
        "totals": _totals(planned),
        "nodes": [row_of("nodes", node) for node in planned.ground.nodes],
        "legs": [_leg(planned, leg) for leg in planned.ground.legs],
        "crossings": list(crossing_rows(planned)),
        "cables": [_cable(laid) for laid in planned.laid],
        "stations": list(station_rows(planned)),
        "sections": list(_sections(planned)),
        "reels": list(_reels(planned)),
        "layout": _layout(planned),
        "joints": list(_joints(planned)),
        "splices": list(_splices(planned)),
        "panels": list(_panels(planned)),
        "circuits": [_circuit(planned, circuit) for circuit in planned.circuits],
        "separate_ways": [*separate_way_rows(planned)],
        "standbys": [*standby_rows(planned)],
        "checks": [row_of("checks", check) for check in planned.checks],
        "bill": [],
        "assumptions": [row_of("assumptions", entry) for entry in assumptions(planned)],
        "warnings": [
            shaped("warnings", {"where": where, "message": message})
            for where, message in planned.warnings
        ],
        "areas": [
            row_of("areas", area, rings=[np.round(ring, 9).tolist() for ring in area.rings])
            for area in run.areas
        ],
        "cautions": [],
    }
    document["bill"] = [shaped("bill", row) for row in bill_rows(planned)]
    document["cautions"] = [shaped("cautions", row) for row in cautions_for(document)]
    return document


def _totals(planned: Plan) -> Row:
    layout = planned.layout
    bought = [reel for reel in layout.reels if reel.source != "stock"]
    stock_ids = {reel.id for reel in layout.reels if reel.source == "stock"}
    sections = {section.id: section for section in layout.sections}
    stock_mm = sum(sections[cut.section].needed_mm for cut in layout.cuts if cut.reel in stock_ids)
    return shaped(
        "totals",
        {
            "ground_m": m_from_mm(sum(leg.length_mm for leg in planned.ground.legs)),
            "sheath_m": m_from_mm(sum(section.sheath_mm for section in layout.sections)),
            "glass_m": m_from_mm(sum(int(rulers.glass_mm[-1]) for rulers in layout.rulers)),
            "ordered_m": m_from_mm(sum(reel.length_mm for reel in bought)),
            "stock_m": m_from_mm(stock_mm),
            "reel_count": len(layout.reels),
            "section_count": len(layout.sections),
            "joint_count": len(layout.joints),
            "closure_count": sum(
                joint.kind == "splice" and not joint.closure for joint in layout.joints
            ),
            "splice_count": sum(planned.splice_counts.values()),
            "pigtail_splice_count": pigtail_splice_count(planned),
            "cost": amount_from_cents(layout.proof.cost_cents),
        },
    )


def _leg(planned: Plan, leg: Leg) -> Row:
    ground = planned.ground
    heights = leg.heights_m if leg.heights_m is not None else np.full(len(leg.lonlat), np.nan)
    points = np.column_stack([np.round(leg.lonlat, 9), np.round(heights, 3)])
    scale = leg.grid_m / leg.ellipsoid_m if leg.ellipsoid_m else math.nan
    return shaped(
        "legs",
        {
            "name": leg.name,
            "from": ground.node(leg.start).name,
            "to": ground.node(leg.end).name,
            "grid_m": _known(leg.grid_m),
            "grid_crs": leg.grid_crs,
            "grid_scale_factor": _known(scale),
            "ellipsoid_m": leg.ellipsoid_m,
            "ground_m": m_from_mm(leg.length_mm),
            "heights_from": list(leg.heights_from),
            "smoothed_off_m": leg.smoothed_off_m,
            "steep": list(steep_rows(leg)),
            "stretches": [
                shaped(
                    "stretches",
                    {
                        "placement": s.placement,
                        "from_ground_m": m_from_mm(s.start_mm),
                        "to_ground_m": m_from_mm(s.end_mm),
                    },
                )
                for s in leg.stretches
            ],
            "line": [[lon, lat, _known(height)] for lon, lat, height in points.tolist()],
            "line_ground_m": (leg.ground_mm / 1000).tolist(),
        },
    )


def _known(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _cable(laid: LaidCable) -> Row:
    cable = laid.way.cable
    return shaped(
        "cables",
        {
            "name": cable.name,
            "legs": [leg.name for leg, _, _ in laid.way.legs],
            "fibre_count": cable.make.fibre_count,
            "fibre_type": cable.make.fibre_type,
            "sheath_m": m_from_mm(int(laid.rulers.sheath_mm[-1])),
            "glass_m": m_from_mm(int(laid.rulers.glass_mm[-1])),
        },
    )


def _cable_names(planned: Plan) -> dict[str, str]:
    return {cable.id: cable.name for cable in planned.layout.cables}


def _sections(planned: Plan) -> Iterator[Row]:
    names = _cable_names(planned)
    reels = {cut.section: cut.reel for cut in planned.layout.cuts}
    for section in planned.layout.sections:
        yield shaped(
            "sections",
            {
                "name": section.id,
                "cable": names[section.cable],
                "from": section.start,
                "to": section.end,
                "sheath_m": m_from_mm(section.sheath_mm),
                "needed_m": m_from_mm(section.needed_mm),
                "reel": reels[section.id],
            },
        )


def _reels(planned: Plan) -> Iterator[Row]:
    layout = planned.layout
    needed = {section.id: section.needed_mm for section in layout.sections}
    for reel in layout.reels:
        own = [cut.section for cut in layout.cuts if cut.reel == reel.id]
        used_mm = sum(needed[section] for section in own)
        yield shaped(
            "reels",
            {
                "name": reel.id,
                "length_m": m_from_mm(reel.length_mm),
                "source": reel.source,
                "used_m": m_from_mm(used_mm),
                "spare_m": m_from_mm(reel.length_mm - used_mm),
                "cost": amount_from_cents(reel.cost_cents),
                "sections": list(own),
            },
        )


def _layout(planned: Plan) -> Row:
    proof = planned.layout.proof
    fewer = one_fewer(planned)
    return shaped(
        "layout",
        {
            "optimal": proof.optimal,
            "cost": amount_from_cents(proof.cost_cents),
            "lower_bound": amount_from_cents(proof.lower_bound_cents),
            "one_fewer": None
            if fewer is None
            else {"joint_count": fewer[0], "cost": amount_from_cents(fewer[1])},
            "stopped_by": proof.stopped_by,
        },
    )


def _joints(planned: Plan) -> Iterator[Row]:
    layout = planned.layout
    marks = printed_marks(planned.run.marks, layout)
    lengths_mm = {section.id: section.sheath_mm for section in layout.sections}
    for joint in layout.joints:
        ends: list[Json] = []
        for end in joint.ends:
            at_mm = lengths_mm[end.section] if end.side == "end" else 0
            mark_mm = printed_mark_mm(marks, end.section, at_mm)
            mark_m = None if mark_mm is None else m_from_mm(mark_mm)
            ends.append(row_of("ends", end, jacket_mark_m=mark_m))
        yield _joint(planned, joint, ends)


def _joint(planned: Plan, joint: Joint, ends: list[Json]) -> Row:
    ground = planned.ground
    leg = next(leg for leg in ground.legs if leg.id == joint.leg)
    return shaped(
        "joints",
        {
            "name": joint.id,
            "node": ground.node(joint.node).name if joint.node else None,
            "reach_name": joint.reach_name,
            "reach_kind": _reach_kind(planned, joint),
            "leg": leg.name,
            "ground_m": m_from_mm(joint.ground_mm),
            "lon": joint.lon,
            "lat": joint.lat,
            "kind": joint.kind,
            "assumed": joint.assumed,
            "splice_count": planned.splice_counts[joint.id],
            "cost": amount_from_cents(joint.cost_cents),
            "ends": ends,
            "opened": list(joint.opened),
            "closure": joint.closure or joint.id,
        },
    )


def _reach_kind(planned: Plan, joint: Joint) -> str | None:
    if joint.node:
        place = planned.ground.node(joint.node).place
        return place.kind if place else None
    laid = next(c for c in planned.laid if c.way.cable.id == joint.mark.cable)
    spots, at = laid.way.spots, joint.mark.chain_mm
    first = bisect_left(spots, at, key=_chain_mm)
    here = spots[first : bisect_right(spots, at, lo=first, key=_chain_mm)]
    named = [spot.kind for spot in here if spot.name == joint.reach_name]
    return next((kind for kind in named if kind != "assumed"), None)


def _chain_mm(spot: Spot) -> int:
    return spot.chain_mm


def _splices(planned: Plan) -> Iterator[Row]:
    names = _cable_names(planned)
    for splice in splices(planned):
        out = None if splice.b is None else _fibre_end(splice.b, names)
        yield row_of("splices", splice, **{"in": _fibre_end(splice.a, names)}, out=out)


def _panels(planned: Plan) -> Iterator[Row]:
    cables = {cable.id: cable for cable in planned.layout.cables}
    polish = {panel.site: panel.polish for panel in planned.run.panels if panel.polish}
    usual = planned.run.practice.loss.connector_polish
    for port in ports(planned):
        make = cables[port.cable].make
        tube, fibre = fibre_colours(
            port.fibre, code=make.colour_code, fibres_per_tube=make.fibres_per_tube
        )
        yield row_of(
            "panels",
            port,
            cable=cables[port.cable].name,
            section=port.section or None,
            tube_colour=tube,
            fibre_colour=fibre,
            connector=polish.get(port.site, usual),
        )


def _fibre_end(end: FibreEnd, names: dict[str, str]) -> Row:
    return row_of("fibre_end", end, cable=names.get(end.cable, end.cable))


def _circuit(planned: Plan, circuit: CircuitPlan) -> Row:
    names = _cable_names(planned)
    return row_of(
        "circuits",
        circuit.order,
        **{"from": circuit.order.from_},
        fibres=[{"cable": names[use.cable], "fibre": use.fibre} for use in circuit.uses],
        glass_m=sum(getattr(step, "glass_m", 0.0) for step in circuit.paths[0].steps),
        delay_us=circuit.budgets[0].delay_ns / 1000,
        verdict=circuit.verdict,
        optic=circuit.pair.name if circuit.pair else None,
        budgets=[budget_row(budget) for budget in circuit.budgets],
        closing=[_closing(closing) for closing in circuit.closing],
        changes=list(changes(planned, circuit)),
        stretch_m=stretch_m(planned, circuit),
        timing=[row_of("timing", figure) for figure in times(planned, circuit)],
        radio=[row_of("radio", figure) for figure in radio_figures(planned, circuit)],
        power=list(power_rows(planned, circuit)),
        levels=list(level_rows(planned, circuit)),
        marks=list(mark_rows(circuit)),
        spectrum=spectrum_row(planned, circuit),
    )


def _closing(closing: Closing) -> Row:
    wavelengths_nm: list[Json] = list(closing.wavelengths_nm)
    return row_of("closing", closing, interface=closing.pair.name, wavelengths_nm=wavelengths_nm)
