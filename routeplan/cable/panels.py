"""What comes out at the panel of each site: port by port, the fibre behind it and its circuit."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal, TypeAlias

from routeplan.cable.model import Cable, FibreUse, Layout, Section

__all__ = ["Port", "panel_ports"]

_End: TypeAlias = tuple[bool, int]  # whether at the higher end of its piece, fibre


@dataclass(frozen=True, slots=True, kw_only=True)
class Port:
    """
    One port of a site's panel.

    `light` tells which way it goes there: "out" is sent into the fibre, "in" comes from it.
    `section` is "" where somebody else's fibre comes in. `is_entered` says that the fibre was cut
    out of a cable that passes: its pigtail splice is in the closure there.
    """

    site: str
    port: int
    cable: str
    section: str
    fibre: int
    circuit: str
    light: Literal["out", "in", "both", "none"]
    is_entered: bool


def panel_ports(
    layout: Layout,
    uses: Sequence[FibreUse],
    *,
    site_names: Mapping[str, str],
    fibre_counts: Mapping[str, int],
) -> tuple[Port, ...]:
    """
    Return the ports of all panels: by site, by cable in run order, by fibre.

    A port has every fibre of a circuit that begins, ends or is patched at the site; and every
    other fibre of a cable that ends there, if all of it is terminated.

    Parameters
    ----------
    layout
        Cables, sections and joints.
    uses
        Fibres of the circuits.
    site_names
        Name of every site, by node id, in the order wanted.
    fibre_counts
        Fibres of each circuit, by its name. [-]
    """
    sections: defaultdict[str, list[Section]] = defaultdict(list)
    for section in layout.sections:
        sections[section.cable].append(section)
    cables = {cable.id: cable for cable in layout.cables}
    length_mm = {rulers.cable: int(rulers.chain_mm[-1]) for rulers in layout.rulers}
    used: defaultdict[tuple[str, str], dict[_End, tuple[FibreUse, bool]]] = defaultdict(dict)
    for use in uses:
        cable = cables[use.cable]
        for is_far, node in zip((False, True), use.nodes(cable.start, cable.end), strict=True):
            if node in site_names:
                used[node, cable.id][is_far == use.forward, use.fibre] = (use, is_far)
    ports: list[Port] = []
    for node, site in site_names.items():
        at_site = ((cable, end) for cable in layout.cables for end in _ends(cable, node, used))
        for number, (cable, end) in enumerate(at_site, start=1):
            found = used[node, cable.id].get(end)
            bounds = (found and found[0].span_mm) or (0, length_mm[cable.id])
            ports.append(
                Port(
                    site=site,
                    port=number,
                    cable=cable.id,
                    section=_section_at(sections[cable.id], bounds[end[0]]),
                    fibre=end[1],
                    circuit=found[0].circuit if found else "",
                    light=_light(*found, fibre_counts) if found else "none",
                    is_entered=node not in (cable.start, cable.end),
                )
            )
    return tuple(ports)


def _ends(
    cable: Cable, node: str, used: Mapping[tuple[str, str], Mapping[_End, object]]
) -> list[_End]:
    """Return the fibre ends of a cable that have a port at a node."""
    ends = set(used.get((node, cable.id), ()))
    if cable.make.terminate == "all":
        for is_high, end in ((False, cable.start), (True, cable.end)):
            if end == node:
                ends |= {(is_high, fibre) for fibre in range(1, cable.make.fibre_count + 1)}
    return sorted(ends)


def _section_at(sections: Sequence[Section], at_mm: int) -> str:
    """Return the section that reaches a chain value; none where the cable is somebody else's."""
    found = (s.id for s in sections if s.start_chain_mm <= at_mm <= s.end_chain_mm)
    return next(found, "")


def _light(
    use: FibreUse, is_far: bool, fibre_counts: Mapping[str, int]
) -> Literal["out", "in", "both"]:
    """Return which way light goes at an end: strand 1 carries it from `from` to `to`, 2 back."""
    if fibre_counts[use.circuit] == 1:
        return "both"
    return "in" if is_far == (use.strand == 1) else "out"
