"""The light of a plan: paths and budgets of every circuit, with all that is fitted to it."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from routeplan.cable.fibres import FibrePlan, assign_fibres
from routeplan.cable.hops import cable_hops, entered_glass_mm
from routeplan.cable.layout import LaidCable
from routeplan.cable.model import FibreUse, Layout
from routeplan.cable.rulers import existing_glass_mm
from routeplan.cable.way import existing_name
from routeplan.circuit_ways import CircuitWay, circuit_way
from routeplan.errors import InputError, Problem
from routeplan.fitting_checks import fitting_problems, optics_problems, way_problems
from routeplan.ground.model import Ground
from routeplan.light.budget import circuit_verdict
from routeplan.light.circuits import Closing, circuit_budgets, closing_interfaces
from routeplan.light.contributions import Measured
from routeplan.light.fittings import (
    Anchor,
    Fittings,
    fitted_attenuator,
    joint_loss,
    panel_mating,
    part_steps,
)
from routeplan.light.interfaces import OpticPair, find_interface
from routeplan.light.model import Bend, Budget, ExistingSpan, Mating, PartLoss, Path, Step, Verdict
from routeplan.light.path import CableTrack, cable_track, circuit_paths
from routeplan.light.years import life_lines, with_years
from routeplan.run.model import Run
from routeplan.run.optics import ANY_INTERFACE, CircuitOrder
from routeplan.units import m_from_mm

__all__ = ["CircuitPlan", "circuit_fibres", "joint_figures", "light_circuits", "measured_glass"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuitPlan:
    """
    One circuit: its order, fibres, paths both ways and budgets.

    `pair` is what the budgets are of, None where no interface is named or none closes the
    circuit; `closing` lists those that do, for a circuit that takes any.
    """

    order: CircuitOrder
    uses: tuple[FibreUse, ...]
    way: CircuitWay
    paths: tuple[Path, Path]
    pair: OpticPair | None
    wavelengths_nm: tuple[float, ...]
    closing: tuple[Closing, ...]
    budgets: tuple[Budget, ...]
    verdict: Verdict


@dataclass(frozen=True, slots=True, kw_only=True)
class _Plant:
    """What all circuits of a plan share."""

    run: Run
    tracks: Mapping[str, CableTrack]
    joint_at: Mapping[str, str]
    site_names: Mapping[str, str]
    panels: Mapping[str, Mating]
    splices: Mapping[str, PartLoss]
    measured: Measured


def light_circuits(
    run: Run,
    ground: Ground,
    laid: Sequence[LaidCable],
    layout: Layout,
    orders: Sequence[CircuitOrder],
    *,
    uses: Sequence[FibreUse],
    problems: Iterable[Problem] = (),
) -> tuple[CircuitPlan, ...]:
    """
    Return every circuit with its fibres, paths and budgets.

    Parameters
    ----------
    run
        What was declared.
    ground
        Where it goes.
    laid
        Its cables as laid.
    layout
        Sections and joints.
    orders
        Circuits, both ends of each named.
    uses
        Their fibres.
    problems
        What kept circuits from fibres, to be told with all the rest.

    Raises
    ------
    InputError
        With everything in the circuits, panels, joints and sections that does not fit the plan.
    """
    site_nodes = {node.name: node.id for node in ground.nodes if node.is_site}
    problems = [
        *optics_problems(run, orders),
        *fitting_problems(run, ground, laid, layout),
        *problems,
    ]
    ways = _ways(orders, uses, laid, layout, {name: key for key, name in site_nodes.items()})
    problems += _way_problems(orders, ways)
    if problems:
        raise InputError(problems)
    plant = _plant(run, laid, layout, site_nodes)
    return tuple(_circuit(plant, order, uses, ways[order.name]) for order in orders)


def circuit_fibres(
    ground: Ground, laid: Sequence[LaidCable], orders: Sequence[CircuitOrder]
) -> FibrePlan:
    """
    Return the fibres of circuits over the cables as laid.

    Raises
    ------
    InputError
        See `routeplan.cable.fibres.assign_fibres`.
    """
    site_nodes = {node.name: node.id for node in ground.nodes if node.is_site}
    cables = [cable.way.cable for cable in laid]
    return assign_fibres(orders, cables, site_nodes=site_nodes, hops=cable_hops(laid))


def joint_figures(run: Run, layout: Layout) -> dict[str, PartLoss]:
    """Return what a splice loses in each joint that has figures of its own, by joint."""
    return {
        joint.id: joint_loss(run.practice.loss, figures)
        for figures in run.joints
        for joint in layout.joints
        if figures.place in (joint.id, joint.reach_name)
    }


def measured_glass(run: Run, layout: Layout) -> Measured:
    """Return measured attenuation by cable and, where one was measured itself, by section."""
    cables = {cable.id: cable.make.measured for cable in layout.cables if cable.make.measured}
    return cables | {section.name: section.measured for section in run.sections}


def _ways(
    orders: Sequence[CircuitOrder],
    uses: Sequence[FibreUse],
    laid: Sequence[LaidCable],
    layout: Layout,
    site_names: Mapping[str, str],
) -> dict[str, CircuitWay]:
    """Return the ways of the circuits that have fibres."""
    found: dict[str, CircuitWay] = {}
    for order in orders:
        own = [use for use in uses if use.circuit == order.name and use.strand == 1]
        if own:
            found[order.name] = circuit_way(own, laid, layout, site_names=site_names)
    return found


def _way_problems(
    orders: Sequence[CircuitOrder], ways: Mapping[str, CircuitWay]
) -> Iterator[Problem]:
    for order in orders:
        if order.name in ways:
            yield from way_problems(order, ways[order.name])


def _plant(
    run: Run, laid: Sequence[LaidCable], layout: Layout, site_nodes: Mapping[str, str]
) -> _Plant:
    loss = run.practice.loss
    return _Plant(
        run=run,
        tracks={track.cable: track for track in _tracks(laid, layout)},
        joint_at={
            joint.node: joint.id
            for joint in layout.joints
            if joint.node and joint.node not in site_nodes.values()
        },
        site_names={node_id: name for name, node_id in site_nodes.items()},
        panels={panel.site: panel_mating(loss, panel) for panel in run.panels},
        splices=joint_figures(run, layout),
        measured=measured_glass(run, layout),
    )


def _circuit(
    plant: _Plant, order: CircuitOrder, uses: Sequence[FibreUse], way: CircuitWay
) -> CircuitPlan:
    loss = plant.run.practice.loss
    own = tuple(use for use in uses if use.circuit == order.name)
    paths = circuit_paths(
        order.name,
        own,
        plant.tracks,
        joint_at=plant.joint_at,
        site_names=plant.site_names,
        ends=(loss.connector_pairs, loss.pigtail_splices),
        fittings=_fittings(plant, order, way),
    )
    closing = _closing(plant, order, paths)
    pair, wavelengths_nm = closing[0].pair if closing else None, order.wavelengths_nm
    if closing:
        wavelengths_nm = closing[0].wavelengths_nm
    elif order.interface not in (None, ANY_INTERFACE):
        pair = find_interface(str(order.interface), plant.run.interfaces)
    budgets = _budgets(plant, order, paths, pair, wavelengths_nm)
    return CircuitPlan(
        order=order,
        uses=own,
        way=way,
        paths=paths,
        pair=pair,
        wavelengths_nm=wavelengths_nm,
        closing=closing,
        budgets=budgets,
        verdict=circuit_verdict(budgets),
    )


def _fittings(plant: _Plant, order: CircuitOrder, way: CircuitWay) -> Fittings:
    placed: list[tuple[Anchor, Step]] = []
    for part in order.part:
        where = part.at or str(order.from_)
        steps = part_steps(part, where=where, circuit=order.name)
        placed += ((way.places[where].anchor, step) for step in steps)
    for bend in order.bend:
        place = way.places[bend.place]
        step = Bend(
            where=bend.place,
            fibre_type=place.fibre_type,
            radius_mm=bend.radius_mm,
            turns=bend.turns,
        )
        placed.append((place.anchor, step))
    return Fittings(
        mating=panel_mating(plant.run.practice.loss),
        panels=plant.panels,
        splices=plant.splices,
        placed=tuple(placed),
        patches=order.patch,
        attenuator=fitted_attenuator(order),
    )


def _closing(plant: _Plant, order: CircuitOrder, paths: tuple[Path, Path]) -> tuple[Closing, ...]:
    """Return the interfaces that close a circuit that takes any."""
    if order.interface != ANY_INTERFACE:
        return ()
    is_given = f"circuit.{order.name}.wavelengths_nm" in plant.run.given
    return closing_interfaces(
        {path.direction: path for path in paths},
        practice=plant.run.practice.loss,
        own=plant.run.interfaces,
        measured=plant.measured,
        wavelengths_nm=order.wavelengths_nm if is_given else (),
        fibre_count=order.fibre_count,
    )


def _budgets(
    plant: _Plant,
    order: CircuitOrder,
    paths: tuple[Path, Path],
    pair: OpticPair | None,
    wavelengths_nm: tuple[float, ...],
) -> tuple[Budget, ...]:
    """Return the budgets of a circuit, with the margins of its years."""
    loss = plant.run.practice.loss
    by_direction = {path.direction: path for path in paths}
    budgets = circuit_budgets(
        by_direction, pair, wavelengths_nm, practice=loss, measured=plant.measured
    )
    tail_m = plant.run.practice.slack.joint_tail_m
    aged = (
        with_years(
            budget,
            life_lines(
                by_direction[budget.direction], budget.wavelength_nm, practice=loss, tail_m=tail_m
            ),
        )
        for budget in budgets
    )
    if order.interface == ANY_INTERFACE and pair is None:
        text = "No interface of the tables or of the run file closes this circuit."
        return tuple(replace(budget, verdict="fails", reasons=(text,)) for budget in aged)
    return tuple(aged)


def _tracks(laid: Sequence[LaidCable], layout: Layout) -> Iterator[CableTrack]:
    for cable in laid:
        own = cable.way.cable
        existing = [
            (
                stretch.start_mm,
                ExistingSpan(
                    where=existing_name(cable.way, stretch),
                    fibre_type=own.make.fibre_type,
                    glass_m=m_from_mm(existing_glass_mm(stretch)),
                    loss_db=stretch.existing_db,
                ),
            )
            for stretch in cable.way.stretches
            if stretch.placement == "existing"
        ]
        yield cable_track(
            own,
            [section for section in layout.sections if section.cable == own.id],
            [j for j in layout.joints if j.mark.cable == own.id and j.node is None],
            existing,
            entered_glass_mm(cable),
        )
