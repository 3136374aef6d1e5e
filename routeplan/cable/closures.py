"""Closures that cables side by side share, where their joints fall on one place."""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass, replace

from routeplan.cable.model import Joint
from routeplan.run.practice import Joints

__all__ = ["StraightJoint", "shared_closures"]


@dataclass(frozen=True, slots=True, kw_only=True)
class StraightJoint:
    """A joint of a cable with itself: its place, alike for all cables there, and its splices."""

    place: Hashable
    splice_count: int
    splice_cents: int


def shared_closures(
    joints: Sequence[Joint], straight: Mapping[str, StraightJoint], practice: Joints
) -> tuple[Joint, ...]:
    """
    Return the joints, those of other cables at a place of one before in its closure.

    The first joint at a place pays closure and visit, those that go in with it their splices
    only. A joint gets a closure of its own where one may not hold both, and where its own cable
    has a joint in the other's.

    Parameters
    ----------
    joints
        Of one layout, in run order.
    straight
        What is known of those that may share, by joint id.
    practice
        What a closure holds.
    """
    most_splices, most_ports = practice.closure_splices_max, practice.closure_ports
    closures: dict[Hashable, list[Joint]] = {}
    found = []
    for joint in joints:
        own = straight.get(joint.id)
        if own is None:
            found.append(joint)
            continue
        together = closures.setdefault(own.place, [])
        splices = own.splice_count + sum(straight[other.id].splice_count for other in together)
        ports = len(joint.ends) + sum(len(other.ends) for other in together)
        if not together:
            together.append(joint)
        elif (
            all(other.mark.cable != joint.mark.cable for other in together)
            and (most_splices is None or splices <= most_splices)
            and (most_ports is None or ports <= most_ports)
        ):
            together.append(joint)
            found.append(replace(joint, closure=together[0].id, cost_cents=own.splice_cents))
            continue
        found.append(joint)
    return tuple(found)
