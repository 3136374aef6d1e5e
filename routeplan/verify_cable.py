"""Checks of closures against what they hold, and of cables against where they go."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import groupby

from routeplan.cable.layout import LaidCable
from routeplan.cable.makes import MakeRow, has_metal, make_of
from routeplan.cable.model import Joint, Layout
from routeplan.check import Check, verdict_on
from routeplan.ground.model import Ground
from routeplan.light.model import Verdict
from routeplan.run.model import Run
from routeplan.units import mm_from_m

__all__ = ["closure_checks", "make_checks"]

_OUTDOOR = frozenset({"aerial", "duct", "buried", "surface", "bridge", "water"})


def closure_checks(run: Run, layout: Layout, splice_counts: Mapping[str, int]) -> Iterator[Check]:
    """
    Yield what goes into every closure against what one holds, where that is known.

    A cable entered at mid-span goes in and comes out: it takes two ports.

    Parameters
    ----------
    run
        What was declared.
    layout
        Its layout.
    splice_counts
        Splices in each joint, by joint id. [-]
    """
    joints = run.practice.joints
    sharing: dict[str, list[Joint]] = {}
    for joint in layout.joints:
        sharing.setdefault(joint.closure or joint.id, []).append(joint)
    for joint in layout.joints:
        if joint.kind != "splice" or joint.closure:
            continue
        inside = sharing[joint.id]
        where = f"{joint.id}, {joint.reach_name}"
        found = {
            "closure splices": (
                sum(splice_counts[each.id] for each in inside),
                joints.closure_splices_max,
            ),
            "closure ports": (
                sum(len(each.ends) + 2 * len(each.opened) for each in inside),
                joints.closure_ports,
            ),
        }
        for kind, (value, limit) in found.items():
            if limit is not None:
                key = "closure_splices_max" if kind == "closure splices" else "closure_ports"
                yield Check(
                    kind=kind,
                    where=where,
                    value=value,
                    limit=limit,
                    unit="",
                    verdict=verdict_on(value <= limit),
                    source=f"joints.{key}",
                )


def make_checks(run: Run, ground: Ground, laid: Sequence[LaidCable]) -> Iterator[Check]:
    """
    Yield what follows from the make of each cable for where it goes; nothing where it has none.

    None of these can be judged by a plan alone: at best it fits, else it is for the local code and
    for whoever knows the site.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    laid
        Its cables, laid out.
    """
    for cable in laid:
        row = make_of(cable.way.cable.make)
        if row is not None or cable.way.cable.make.metal is not None:
            yield from _metal_checks(ground, cable)
        if row is not None:
            yield from _placement_checks(cable, row)
            yield from _indoor_checks(run, ground, cable, row)


def _metal_checks(ground: Ground, cable: LaidCable) -> Iterator[Check]:
    """Yield that metal comes into a mast site, and that what has none cannot be found."""
    own = cable.way.cable
    metal = has_metal(own.make)
    nodes = (ground.node(own.start), *(p.node for p in cable.way.passed), ground.node(own.end))
    for node in nodes:
        if node.role == "transmitter":
            yield _asked(
                "metal into a mast site",
                f"cable {own.name}, {node.name}",
                "fits" if metal is False else "unknown",
                "metal carries lightning current and earth potential: earthing and isolation are "
                "for the local code and a competent person"
                if metal is not False
                else "no metal in it",
            )
    if any(stretch.placement == "buried" for stretch in cable.way.stretches):
        is_found = metal or own.make.located
        yield _asked(
            "buried cable can be found",
            f"cable {own.name}",
            "fits" if is_found else "unknown",
            "metal, or what is laid with it, is found from above"
            if is_found
            else "without metal it is not found from above: lay a wire or markers with it and set "
            "cable.located",
        )


def _placement_checks(cable: LaidCable, row: MakeRow) -> Iterator[Check]:
    own = cable.way.cable
    placements = {stretch.placement for stretch in cable.way.stretches} - {"existing"}
    unfit = sorted(
        placement
        for placement in placements
        if (placement in _OUTDOOR and not row.is_outdoor)
        or (placement == "buried" and not row.is_buried)
    )
    yield _asked(
        "make for its placements",
        f"cable {own.name}",
        "unknown" if unfit else "fits",
        f"a {row.name} cable is not usually made for: {', '.join(unfit)}; ask its maker"
        if unfit
        else f"table cable_makes: {row.source}",
    )


def _indoor_checks(run: Run, ground: Ground, cable: LaidCable, row: MakeRow) -> Iterator[Check]:
    """Yield how far a jacket made for outdoors is carried indoors at once, entries included."""
    own = cable.way.cable
    limit_m = row.indoor_max_m if own.make.indoor_max_m is None else own.make.indoor_max_m
    if limit_m is None:
        return
    entry_mm = mm_from_m(run.practice.slack.entry_m)
    bounds = {0: own.start, cable.way.length_mm: own.end}
    longest = 0
    for is_indoor, group in groupby(cable.way.stretches, key=lambda s: s.placement == "indoor"):
        stretches = list(group)
        ends = (stretches[0].start_mm, stretches[-1].end_mm)
        entries = sum(at in bounds and ground.node(bounds[at]).is_site for at in ends) * entry_mm
        longest = max(longest, ends[1] - ends[0] + entries if is_indoor else min(entries, entry_mm))
    yield Check(
        kind="outdoor jacket indoors",
        where=f"cable {own.name}",
        value=longest / 1000,
        limit=limit_m,
        unit="m",
        verdict="fits" if longest <= mm_from_m(limit_m) else "unknown",
        source="how far is for the local fire code to say; the limit is "
        + ("the run's" if own.make.indoor_max_m is not None else "a house rule, table cable_makes"),
    )


def _asked(kind: str, where: str, verdict: Verdict, source: str) -> Check:
    return Check(
        kind=kind, where=where, value=None, limit=None, unit="", verdict=verdict, source=source
    )
