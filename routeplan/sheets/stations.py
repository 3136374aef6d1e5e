"""Every station of every cable: what is there, on all three rulers and from its section's start."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from routeplan.cable.layout import LaidCable
from routeplan.cable.marks import printed_mark_mm, printed_marks
from routeplan.cable.model import Millimetres, Section
from routeplan.cable.rulers import readings
from routeplan.cable.way import positions_on
from routeplan.ground.model import Leg
from routeplan.planning import Plan
from routeplan.sheets.tables import Json, Row, table

__all__ = ["station_rows"]

_KINDS = ("site", "joint", "crossing", "loop", "reach", "vertex")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Mark:
    """What stands at one chain value."""

    kind: str
    name: str
    reach_kind: str | None = None


def station_rows(planned: Plan) -> Iterator[Row]:
    """
    Yield the stations of all legs, in order along each.

    There is one row for each station; its kind is the first that applies of site, joint,
    crossing, loop, reach and vertex.

    Parameters
    ----------
    planned
        The plan.
    """
    for laid in planned.laid:
        marks = _marks(planned, laid)
        for leg, forward, offset in laid.way.legs:
            yield from _leg_rows(planned, laid, leg, forward=forward, offset=offset, marks=marks)


def _marks(planned: Plan, laid: LaidCable) -> dict[int, list[_Mark]]:
    marks: dict[int, list[_Mark]] = {}

    def put(chain_mm: int, kind: str, name: str, reach_kind: str | None = None) -> None:
        marks.setdefault(chain_mm, []).append(_Mark(kind=kind, name=name, reach_kind=reach_kind))

    way = laid.way
    own = [joint for joint in planned.layout.joints if joint.mark.cable == way.cable.id]
    for at, mark in _node_marks(planned, laid):
        marks.setdefault(at, []).append(mark)
    for joint in own:
        if joint.node is None:
            put(joint.mark.chain_mm, "joint", joint.id)
    for leg, forward, offset in way.legs:
        for one in leg.crossings:
            at = offset + (one.ground_mm if forward else leg.length_mm - one.ground_mm)
            put(at, "crossing", one.name)
    for step in laid.steps:
        if step.kind == "loop":
            put(step.chain_mm, "loop", step.name)
    chosen = {joint.mark.chain_mm for joint in own}
    for spot in way.spots:
        if not spot.assumed or spot.chain_mm in chosen:
            reach_kind = None if spot.kind == "assumed" else spot.kind
            put(spot.chain_mm, "reach", spot.name, reach_kind)
    return marks


def _node_marks(planned: Plan, laid: LaidCable) -> Iterator[tuple[int, _Mark]]:
    """Yield what stands at a cable's ends and at the nodes it passes."""
    way = laid.way
    joints = {joint.node: joint.id for joint in planned.layout.joints if joint.node}
    for at, node_id in ((0, way.cable.start), (way.length_mm, way.cable.end)):
        node = planned.ground.node(node_id)
        reach = node.place.kind if node.place and not node.is_site else None
        kind = "site" if node.is_site else "joint"
        name = node.name if node.is_site else joints.get(node_id, node.name)
        yield at, _Mark(kind=kind, name=name, reach_kind=reach)
    for passed in way.passed:
        node = passed.node
        if node.is_site:
            yield passed.chain_mm, _Mark(kind="site", name=node.name)
        elif passed.is_entered and node.id in joints:
            yield passed.chain_mm, _Mark(kind="joint", name=joints[node.id])


def _leg_rows(
    planned: Plan,
    laid: LaidCable,
    leg: Leg,
    *,
    forward: bool,
    offset: int,
    marks: Mapping[int, list[_Mark]],
) -> Iterator[Row]:
    # Stations that only a terrain or a grid needed are no places to go to.
    drawn = leg.ground_mm if leg.is_drawn is None else leg.ground_mm[leg.is_drawn]
    vertices = offset + (drawn if forward else leg.length_mm - drawn)
    own = [at for at in marks if offset <= at <= offset + leg.length_mm]
    # Along the leg, whichever way the cable takes it.
    chain = np.unique(np.concatenate([vertices, np.array(own, dtype=np.int64)]))
    chain = chain if forward else chain[::-1]
    lonlat, heights = positions_on(laid.way, chain)
    (sheath_from, sheath_to), (glass_from, glass_to) = readings(laid.rulers, chain)
    sections = [s for s in planned.layout.sections if s.cable == laid.way.cable.id]
    at_section, section_mm = _sections_at(sections, chain, sheath_from)
    ground = chain - offset if forward else leg.length_mm - (chain - offset)
    columns: dict[str, list[Json]] = {
        "leg": [leg.name] * len(chain),
        "cable": [laid.way.cable.name] * len(chain),
        **_named(marks, chain),
        "placement": _placements(laid, chain, forward=forward),
        "ground_m": (ground / 1000).tolist(),
        "sheath_from_m": (sheath_from / 1000).tolist(),
        "sheath_to_m": (sheath_to / 1000).tolist(),
        "glass_from_m": (glass_from / 1000).tolist(),
        "glass_to_m": (glass_to / 1000).tolist(),
        "section": at_section,
        "section_m": [None if mm is None else mm / 1000 for mm in section_mm],
        "jacket_mark_m": _printed(planned, at_section, section_mm),
        "lon": (np.round(lonlat[:, 0], 9) + 0.0).tolist(),
        "lat": (np.round(lonlat[:, 1], 9) + 0.0).tolist(),
        "height_m": [
            None if unknown else height
            for height, unknown in zip(
                np.round(heights, 3).tolist(), np.isnan(heights).tolist(), strict=True
            )
        ],
    }
    keys = [column.key for column in table("stations").columns]
    for values in zip(*(columns[key] for key in keys), strict=True):
        yield dict(zip(keys, values, strict=True))


def _printed(planned: Plan, sections: Sequence[Json], along_mm: Sequence[int | None]) -> list[Json]:
    """Return the mark printed on the jacket at each station, where its reel's are known."""
    if not planned.run.marks:
        return [None] * len(along_mm)
    known = printed_marks(planned.run.marks, planned.layout)
    found = (
        printed_mark_mm(known, None if section is None else str(section), at)
        for section, at in zip(sections, along_mm, strict=True)
    )
    return [None if mark is None else mark / 1000 for mark in found]


def _named(marks: Mapping[int, list[_Mark]], chain: Millimetres) -> dict[str, list[Json]]:
    kinds: list[Json] = []
    names: list[Json] = []
    reaches: list[Json] = []
    for at in chain.tolist():
        here = marks.get(at)
        if here is None:
            kinds.append("vertex")
            names.append(None)
            reaches.append(None)
            continue
        kind = min((mark.kind for mark in here), key=_KINDS.index)
        named = dict.fromkeys(mark.name for mark in here if mark.kind == kind)
        kinds.append(kind)
        names.append("; ".join(named))
        reaches.append(next((mark.reach_kind for mark in here if mark.reach_kind), None))
    return {"kind": kinds, "name": names, "reach_kind": reaches}


def _placements(laid: LaidCable, chain: Millimetres, *, forward: bool) -> list[Json]:
    starts = [stretch.start_mm for stretch in laid.way.stretches]
    at = np.searchsorted(starts, chain, side="right" if forward else "left") - 1
    return [laid.way.stretches[max(k, 0)].placement for k in at.tolist()]


def _sections_at(
    sections: list[Section], chain: Millimetres, sheath_from: Millimetres
) -> tuple[list[Json], list[int | None]]:
    """Return the section at each chain value, the arriving one at a joint, and metres along it."""
    if not sections:
        return [None] * len(chain), [None] * len(chain)
    ends = np.array([section.end_chain_mm for section in sections])
    names: list[Json] = []
    metres: list[int | None] = []
    for k, at, reading in zip(
        np.minimum(np.searchsorted(ends, chain, side="left"), len(ends) - 1).tolist(),
        chain.tolist(),
        sheath_from.tolist(),
        strict=True,
    ):
        section = sections[k]
        if not section.start_chain_mm <= at <= section.end_chain_mm:
            names.append(None)
            metres.append(None)
            continue
        is_end = at == section.end_chain_mm
        names.append(section.id)
        metres.append(section.sheath_mm if is_end else reading - section.start_sheath_mm)
    return names, metres
