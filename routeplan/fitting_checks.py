"""What keeps circuits, panels, joints and measured sections from fitting the plan they are in."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import chain

from routeplan.cable.layout import LaidCable
from routeplan.cable.model import Layout
from routeplan.circuit_ways import CircuitWay
from routeplan.errors import Problem
from routeplan.ground.model import Ground
from routeplan.light.fittings import check_panel
from routeplan.light.grid import check_coarse_channels, coarse_channel_count
from routeplan.light.interfaces import check_fibre_count, check_wavelengths, find_interface
from routeplan.run.model import Run
from routeplan.run.optics import ANY_INTERFACE, CircuitOrder
from routeplan.run.trouble import nearest_hint, one_of, shown

__all__ = ["fitting_problems", "optics_problems", "way_problems"]

_LISTED = 12


def optics_problems(run: Run, orders: Sequence[CircuitOrder]) -> list[Problem]:
    """Return what keeps the interfaces and the channels of circuits from working."""
    problems: list[Problem] = []
    for number, order in enumerate(orders, start=1):
        where = f'circuit {number} "{order.name}"'
        problems += _channel_problems(order, where=f"{where}, wavelengths_nm")
        if order.interface in (None, ANY_INTERFACE):
            continue
        pair = find_interface(str(order.interface), run.interfaces)
        problems += check_wavelengths(pair, order.wavelengths_nm, where=f"{where}, wavelengths_nm")
        problems += check_fibre_count(pair, order.fibre_count, where=f"{where}, fibre_count")
    return problems


def fitting_problems(
    run: Run, ground: Ground, laid: Sequence[LaidCable], layout: Layout
) -> Iterator[Problem]:
    """
    Yield what is wrong with panels, joints and sections.

    Parameters
    ----------
    run
        What was declared.
    ground
        Its sites.
    laid
        Its cables, with every place on them.
    layout
        Its sections and joints.
    """
    sites = [node.name for node in ground.nodes if node.is_site]
    for panel in run.panels:
        if panel.site not in sites:
            yield _unknown(f'panel "{panel.site}", site', "site", panel.site, sites)
        yield from check_panel(run.practice.loss, panel)
    places = list(dict.fromkeys(_place_names(ground, laid, layout)))
    for joint in run.joints:
        if joint.place not in places:
            yield _unknown(f'joint "{joint.place}", place', "place", joint.place, places)
    names = [section.id for section in layout.sections]
    for section in run.sections:
        if section.name not in names:
            where = f'section "{section.name}", name'
            yield _unknown(where, "section of this plan", section.name, names)


def way_problems(order: CircuitOrder, way: CircuitWay) -> Iterator[Problem]:
    """Yield everything a circuit names that is not on its way."""
    where = f'circuit "{order.name}"'
    sites = [name for name, place in way.places.items() if place.anchor[0] == "site"]
    steady = [name for name, place in way.places.items() if place.anchor[0] != "section"]
    for site in dict.fromkeys(order.patch):
        if site not in sites:
            yield _off_the_way(f"{where}, patch", site, sites)
    for site in order.leads:
        ends = (way.start, *way.patched, way.end)
        if site not in ends:
            yield _off_the_way(f"{where}, leads", site, ends)
    for place in order.rolls:
        if place not in way.places:
            yield _off_the_way(f"{where}, rolls", place, way.places)
    for number, part in enumerate(order.part, start=1):
        if part.at is not None and part.at not in steady:
            yield _off_the_way(f"{where}, part {number}, at", part.at, steady)
    for number, bend in enumerate(order.bend, start=1):
        if bend.place not in way.places:
            yield _off_the_way(f"{where}, bend {number}, place", bend.place, way.places)


def _channel_problems(order: CircuitOrder, *, where: str) -> Iterator[Problem]:
    """Yield what keeps the wavelengths of a circuit from passing its coarse multiplexers."""
    counts = [coarse_channel_count(part.name or "") for part in order.part if part.kind is None]
    most = min((count for count in counts if count), default=None)
    if most is None:
        return
    yield from check_coarse_channels(order.wavelengths_nm, where=where)
    if len(order.wavelengths_nm) > most:
        yield Problem(
            where=where,
            what="has more wavelengths than its multiplexers have channels",
            value=f"{len(order.wavelengths_nm)} wavelengths",
            limit=f"{most} channels",
            remedy="Take multiplexers with more channels.",
        )


def _place_names(ground: Ground, laid: Sequence[LaidCable], layout: Layout) -> Iterator[str]:
    yield from (node.name for node in ground.nodes)
    yield from (spot.name for cable in laid for spot in cable.way.spots)
    yield from chain.from_iterable((joint.id, joint.reach_name) for joint in layout.joints)


def _unknown(where: str, what: str, name: str, known: Sequence[str]) -> Problem:
    hint = nearest_hint(name, known)
    return Problem(
        where=where,
        what=f"is not a {what}",
        value=shown(name),
        limit="" if hint and len(known) > _LISTED else _some(known),
        remedy=hint,
    )


def _off_the_way(where: str, name: str, known: Iterable[str]) -> Problem:
    names = list(known)
    return Problem(
        where=where,
        what="is not on the circuit's way",
        value=shown(name),
        limit=_some(names),
        remedy=nearest_hint(name, names),
    )


def _some(names: Sequence[str]) -> str:
    more = f" and {len(names) - _LISTED} more" if len(names) > _LISTED else ""
    return one_of(names[:_LISTED]) + more
