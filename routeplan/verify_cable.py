"""Checks of what goes into closures, against what they hold."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from routeplan.cable.model import Layout
from routeplan.check import Check, verdict_on
from routeplan.run.model import Run

__all__ = ["closure_checks"]


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
    for joint in layout.joints:
        if joint.kind != "splice":
            continue
        where = f"{joint.id}, {joint.reach_name}"
        found = {
            "closure splices": (splice_counts[joint.id], joints.closure_splices_max),
            "closure ports": (len(joint.ends) + 2 * len(joint.opened), joints.closure_ports),
        }
        for kind, (value, limit) in found.items():
            if limit is not None:
                key = "closure_splices_max" if kind == "closure splices" else "closure_ports"
                yield Check(
                    kind=kind,
                    where=where,
                    value=float(value),
                    limit=float(limit),
                    unit="",
                    verdict=verdict_on(value <= limit),
                    source=f"joints.{key}",
                )
