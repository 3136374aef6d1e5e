"""Small plants for tests: cables cut into sections, joints where they meet."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from routeplan.cable.model import Cable, CableEnd, Joint, Mark, Section
from routeplan.run.practice import CableMake, CircuitOrder


@dataclass(frozen=True, kw_only=True)
class SmallPlant:
    """Cables with their sections and joints; nodes in `sites` end in panels."""

    cables: tuple[Cable, ...]
    sections: tuple[Section, ...]
    joints: tuple[Joint, ...]
    sites: frozenset[str]


def make_cable(
    name: str, start: str, end: str, *, fibre_count: int = 24, code: str = "TIA-598"
) -> Cable:
    """Return a cable of twelve fibres a tube."""
    make = CableMake(
        fibre_count=fibre_count,
        fibre_type="G.652.D",
        fibres_per_tube=12,
        colour_code=code,
        glass_over_sheath_ratio=0.0,
    )
    legs = ((f"leg {name}", True),)
    return Cable(id=name, name=name, legs=legs, make=make, start=start, end=end)


def make_circuit(
    name: str, from_: str | None, to: str | None, *, fibre_count: int = 2
) -> CircuitOrder:
    """Return a circuit between two sites."""
    return CircuitOrder.model_validate(
        {
            "name": name,
            "from": from_,
            "to": to,
            "fibre_count": fibre_count,
            "wavelengths_nm": (1310.0,),
        }
    )


def make_joint(
    name: str,
    ends: Sequence[tuple[str, str]],
    *,
    node: str | None = None,
    kind: str = "splice",
    opened: tuple[str, ...] = (),
    opened_mm: tuple[int, ...] = (),
) -> Joint:
    """Return a joint of these (section, side) ends."""
    return Joint(
        id=name,
        node=node,
        mark=Mark(cable="", chain_mm=0),
        leg="",
        ground_mm=0,
        lon=0.0,
        lat=0.0,
        reach_name="",
        kind=kind,  # type: ignore[arg-type]
        assumed=False,
        ends=tuple(CableEnd(section=s, side=side) for s, side in ends),  # type: ignore[arg-type]
        cost_cents=0,
        opened=opened,
        opened_mm=opened_mm,
    )


def cut_cable(
    cable: Cable, section_count: int, *, owner_after: frozenset[int] = frozenset()
) -> tuple[list[Section], list[Joint]]:
    """
    Cut a cable into sections a kilometre long, with a joint between each two.

    After the sections in `owner_after`, counted from 1, somebody else's fibre comes between: two
    joints of one end each.
    """
    ids = [f"{cable.id}.{number}" for number in range(1, section_count + 1)]
    sections = []
    for number, name in enumerate(ids):
        span = (number * 1_000_000, (number + 1) * 1_000_000)
        sections.append(
            Section(
                id=name,
                cable=cable.id,
                start=cable.start if number == 0 else f"J {name} start",
                end=cable.end if number == section_count - 1 else f"J {name} end",
                start_chain_mm=span[0],
                end_chain_mm=span[1],
                start_sheath_mm=span[0],
                end_sheath_mm=span[1],
                start_glass_mm=span[0],
                end_glass_mm=span[1],
                needed_mm=1_000_000,
            )
        )
    joints = []
    for number in range(1, section_count):
        before, after = (ids[number - 1], "end"), (ids[number], "start")
        if number in owner_after:
            joints += [make_joint(f"J {end[0]} {end[1]}", [end]) for end in (before, after)]
        else:
            joints.append(make_joint(f"J {before[0]} end", [before, after]))
    return sections, joints


def make_plant(
    cables: Sequence[Cable],
    *,
    sites: Sequence[str],
    section_counts: Sequence[int] | None = None,
    owner_after: Sequence[frozenset[int]] | None = None,
) -> SmallPlant:
    """Cut every cable, and join cables at every node that is not a site."""
    sections: list[Section] = []
    joints: list[Joint] = []
    meeting: dict[str, list[tuple[str, str]]] = {}
    for index, cable in enumerate(cables):
        count = section_counts[index] if section_counts else 1
        cut, between = cut_cable(
            cable, count, owner_after=owner_after[index] if owner_after else frozenset()
        )
        sections += cut
        joints += between
        meeting.setdefault(cable.start, []).append((cut[0].id, "start"))
        meeting.setdefault(cable.end, []).append((cut[-1].id, "end"))
    joints += [
        make_joint(f"J {node}", ends, node=node)
        for node, ends in meeting.items()
        if node not in sites and len(ends) > 1
    ]
    return SmallPlant(
        cables=tuple(cables),
        sections=tuple(sections),
        joints=tuple(joints),
        sites=frozenset(sites),
    )
