"""Where things can stand on a circuit's way: its sites, its joints, the places it passes."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from routeplan.cable.layout import LaidCable
from routeplan.cable.model import Cable, FibreUse, Layout
from routeplan.light.fittings import Anchor

__all__ = ["CircuitWay", "WayPlace", "circuit_way"]


@dataclass(frozen=True, slots=True, kw_only=True)
class WayPlace:
    """A place on a circuit's way: where along its path that is, and the fibre type there."""

    anchor: Anchor
    fibre_type: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuitWay:
    """
    The places on a circuit's way by name, its ends, and the sites it is patched at.

    A site where two cables are spliced to each other is no patched one.
    """

    start: str
    end: str
    patched: tuple[str, ...]
    places: Mapping[str, WayPlace]


def circuit_way(
    uses: Sequence[FibreUse],
    laid: Sequence[LaidCable],
    layout: Layout,
    *,
    site_names: Mapping[str, str],
) -> CircuitWay:
    """
    Return the places on the way of one strand of a circuit.

    A name that stands for several things is the site's first, then a joint's, then a place's.

    Parameters
    ----------
    uses
        Its fibres in order along it.
    laid
        Cables as laid.
    layout
        Sections and joints.
    site_names
        Name of every site, by node id.
    """
    cables = {cable.id: cable for cable in layout.cables}
    nodes = [_ends_of(uses[0], cables)[0], *(_ends_of(use, cables)[1] for use in uses)]
    types = [cables[use.cable].make.fibre_type for use in uses]
    places: dict[str, WayPlace] = {}
    for node, fibre_type in zip(nodes, (types[0], *types), strict=True):
        if node in site_names:
            name = site_names[node]
            places.setdefault(name, WayPlace(anchor=("site", name), fibre_type=fibre_type))
    inner = [node for node in nodes[1:-1] if node not in site_names]
    for name, place in _along(uses, laid, layout, inner):
        places.setdefault(name, place)
    spliced = {joint.node for joint in layout.joints} - site_names.keys()
    return CircuitWay(
        start=site_names[nodes[0]],
        end=site_names[nodes[-1]],
        patched=tuple(site_names[node] for node in nodes[1:-1] if node not in spliced),
        places=places,
    )


def _along(
    uses: Sequence[FibreUse], laid: Sequence[LaidCable], layout: Layout, branches: Sequence[str]
) -> Iterator[tuple[str, WayPlace]]:
    """Yield joints by id and by place, then every other place of the cables."""
    ways = {cable.way.cable.id: cable.way for cable in laid}
    types = {cable.id: cable.make.fibre_type for cable in layout.cables}
    own = {use.cable: use for use in reversed(uses)}
    first = uses[0].cable
    for joint in layout.joints:
        on = own.get(joint.mark.cable)
        if joint.node is None:
            is_met = on is not None and on.covers(joint.mark.chain_mm)
        else:
            is_met = joint.node in branches
        if is_met:
            cable = joint.mark.cable if on else first
            place = WayPlace(anchor=("joint", joint.id), fibre_type=types[cable])
            yield from ((joint.id, place), (joint.reach_name, place))
    for use in uses:
        cable = use.cable
        sections = [section for section in layout.sections if section.cable == cable]
        ends = [section.end_chain_mm for section in sections]
        for spot in (spot for spot in ways[cable].spots if use.covers(spot.chain_mm)):
            number = bisect_left(ends, spot.chain_mm)
            if number < len(ends) and sections[number].start_chain_mm <= spot.chain_mm:
                anchor: Anchor = ("section", sections[number].id)
                yield spot.name, WayPlace(anchor=anchor, fibre_type=types[cable])


def _ends_of(use: FibreUse, cables: Mapping[str, Cable]) -> tuple[str, str]:
    cable = cables[use.cable]
    return use.nodes(cable.start, cable.end)
