"""The whole pipeline on one page: from what was declared to what is planned."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from routeplan.cable.assembly import fewer_joints, put_together
from routeplan.cable.fibres import assign_fibres
from routeplan.cable.layout import LaidCable, lay_cables
from routeplan.cable.model import FibreUse, Layout, Splice
from routeplan.cable.rulers import existing_glass_mm
from routeplan.cable.schedule import joint_splice_count, splice_rows
from routeplan.cable.way import existing_name
from routeplan.errors import InputError, Problem
from routeplan.ground.legs import lay_ground
from routeplan.ground.model import Ground
from routeplan.light.budget import circuit_budget, circuit_verdict
from routeplan.light.interfaces import (
    channels,
    check_fibre_count,
    check_wavelengths,
    find_interface,
)
from routeplan.light.model import Budget, ExistingSpan, Path, Verdict
from routeplan.light.path import CableTrack, cable_track, circuit_paths
from routeplan.memo import Memo, remembered, swept
from routeplan.run.defaults import AssumedValue, assumed_values, default_value
from routeplan.run.model import Run
from routeplan.run.practice import CircuitOrder
from routeplan.units import m_from_mm
from routeplan.verify import Check, plan_checks

__all__ = ["CircuitPlan", "Plan", "assumptions", "one_fewer", "plan", "splices"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuitPlan:
    """One circuit: its order, fibres, paths both ways and budgets."""

    order: CircuitOrder
    uses: tuple[FibreUse, ...]
    paths: tuple[Path, Path]
    budgets: tuple[Budget, ...]
    verdict: Verdict


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Plan:
    """
    A run planned.

    Whatever takes long and is not always wanted is worked out when asked for: `splices(plan)`,
    `one_fewer(plan)`, `assumptions(plan)`.
    """

    run: Run
    ground: Ground
    laid: tuple[LaidCable, ...]
    layout: Layout
    circuits: tuple[CircuitPlan, ...]
    splice_counts: Mapping[str, int]
    checks: tuple[Check, ...]
    warnings: tuple[tuple[str, str], ...]

    @property
    def verdict(self) -> Literal["fits", "fails", "unknown"]:
        """Whether anything fails: `unknown` is not failing."""
        verdicts = {check.verdict for check in self.checks}
        return "fails" if "fails" in verdicts else "unknown" if "unknown" in verdicts else "fits"


def plan(run: Run, *, memo: Memo | None = None) -> Plan:
    """
    Plan a run: ground, cables, joints and reels, fibres, light.

    Parameters
    ----------
    run
        What was declared; see `routeplan.run.read_run`.
    memo
        Results of earlier plans; passing the same one again re-plans only what changed.

    Raises
    ------
    InputError
        If points, names, wavelengths or fibre counts do not fit the geometry.
    InfeasibleError
        If no layout keeps every limit.
    """
    swept(memo)
    ground = remembered(
        memo, ("ground", run.lines, run.places, run.placement, run.crs, run.practice.joining),
        lambda: lay_ground(run),
    )  # fmt: skip
    orders, order_warnings = _orders(run, ground)
    laid = lay_cables(run, ground, memo=memo)
    layout = put_together(run, ground, laid)
    circuits = _light_circuits(run, ground, laid, layout, orders)
    uses = [use for circuit in circuits for use in circuit.uses]
    counts = joint_splice_count(layout.joints, layout.sections, layout.cables, uses)
    return Plan(
        run=run,
        ground=ground,
        laid=laid,
        layout=layout,
        circuits=circuits,
        splice_counts=counts,
        checks=plan_checks(run, layout, [b for c in circuits for b in c.budgets]),
        warnings=(
            *run.warnings,
            *ground.warnings,
            *order_warnings,
            *(warning for cable in laid for warning in cable.warnings),
        ),
    )


def _orders(run: Run, ground: Ground) -> tuple[tuple[CircuitOrder, ...], list[tuple[str, str]]]:
    """Return the circuits with both ends named; without any, one over the longest leg."""
    longest = max(ground.legs, key=lambda leg: leg.length_mm)
    start, end = ground.node(longest.start), ground.node(longest.end)
    has_ends = start.is_site and end.is_site and start.id != end.id
    if not run.circuits:
        if not has_ends:
            return (), [("circuits", "none is given and the longest leg does not join two sites")]
        return (_default_order(run, start.name, end.name),), []
    orders = []
    problems = []
    for number, order in enumerate(run.circuits, start=1):
        if (order.from_ is None or order.to is None) and not has_ends:
            problems.append(
                Problem(
                    where=f'circuit {number} "{order.name}"',
                    what="names no ends, and the longest leg does not join two sites",
                    remedy="Give from and to",
                )
            )
            continue
        ends = {"from_": order.from_ or start.name, "to": order.to or end.name}
        orders.append(order.model_copy(update=ends))
    if problems:
        raise InputError(problems)
    return tuple(orders), []


def _default_order(run: Run, start: str, end: str) -> CircuitOrder:
    values = {
        key: default_value(f"circuit.{key}", run.purpose)
        for key in ("fibre_count", "wavelengths_nm")
    }
    ends = {"name": "Circuit 1", "from": start, "to": end}
    return CircuitOrder.model_validate({**values, **ends})


def _light_circuits(
    run: Run,
    ground: Ground,
    laid: Sequence[LaidCable],
    layout: Layout,
    orders: Sequence[CircuitOrder],
) -> tuple[CircuitPlan, ...]:
    _refuse_optics(run, orders)
    site_nodes = {node.name: node.id for node in ground.nodes if node.is_site}
    glass_mm = {rulers.cable: int(rulers.glass_mm[-1]) for rulers in layout.rulers}
    uses = assign_fibres(orders, layout.cables, site_nodes=site_nodes, glass_mm=glass_mm)
    tracks = {track.cable: track for track in _tracks(laid, layout)}
    joint_at = {joint.node: joint.id for joint in layout.joints if joint.node}
    site_names = {node_id: name for name, node_id in site_nodes.items()}
    loss = run.practice.loss
    circuits = []
    for order in orders:
        own = tuple(use for use in uses if use.circuit == order.name)
        paths = circuit_paths(
            order.name,
            own,
            tracks,
            joint_at=joint_at,
            site_names=site_names,
            ends=(loss.connector_pairs, loss.pigtail_splices),
        )
        budgets = _budgets(run, order, paths, layout)
        circuits.append(
            CircuitPlan(
                order=order,
                uses=own,
                paths=paths,
                budgets=budgets,
                verdict=circuit_verdict(budgets),
            )
        )
    return tuple(circuits)


def _budgets(
    run: Run, order: CircuitOrder, paths: tuple[Path, Path], layout: Layout
) -> tuple[Budget, ...]:
    pair = find_interface(order.interface, run.interfaces) if order.interface else None
    measured = {cable.id: cable.make.measured for cable in layout.cables if cable.make.measured}
    by_direction = {path.direction: path for path in paths}
    return tuple(
        circuit_budget(
            by_direction[channel.direction],
            channel.wavelength_nm,
            practice=run.practice.loss,
            optic=channel.optic,
            measured=measured,
        )
        for channel in channels(pair, order.wavelengths_nm)
    )


def _refuse_optics(run: Run, orders: Sequence[CircuitOrder]) -> None:
    problems: list[Problem] = []
    for number, order in enumerate(orders, start=1):
        if order.interface is None:
            continue
        pair = find_interface(order.interface, run.interfaces)
        where = f'circuit {number} "{order.name}"'
        problems += check_wavelengths(pair, order.wavelengths_nm, where=f"{where}, wavelengths_nm")
        problems += check_fibre_count(pair, order.fibre_count, where=f"{where}, fibre_count")
    if problems:
        raise InputError(problems)


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
        )


def splices(planned: Plan) -> tuple[Splice, ...]:
    """Return the splice schedule of a plan, closure by closure and fibre by fibre."""
    run = planned.run
    return splice_rows(
        planned.layout.joints,
        planned.layout.sections,
        planned.layout.cables,
        [use for circuit in planned.circuits for use in circuit.uses],
        fibres_per_tray=run.practice.joints.fibres_per_tray,
        limit_db=run.practice.loss.splice_limit_db,
    )


def one_fewer(planned: Plan) -> tuple[int, int] | None:
    """Return joint count and cost [cents] of the cheapest layout with one joint fewer, or None."""
    return fewer_joints(planned.laid, planned.layout)


def assumptions(planned: Plan) -> tuple[AssumedValue, ...]:
    """Return everything the plan rests on that the run did not say."""
    return (*_assumed_ground(planned), *assumed_values(planned.run))


def _assumed_ground(planned: Plan) -> Iterator[AssumedValue]:
    ground = planned.ground
    for node in ground.nodes:
        if node.assumed:
            yield AssumedValue(
                name=f"site {node.name}",
                value=f"{node.lat:.6f}, {node.lon:.6f}",
                unit="deg",
                source="geometry",
                reason="an end of a line with no site near it is taken as a site",
            )
    for cable in planned.laid:
        count = sum(spot.assumed for spot in cable.way.spots)
        if count:
            yield AssumedValue(
                name=f"places on cable {cable.way.cable.name}",
                value=count,
                unit="places",
                source="joints.assumed_spacing_m; vertices of an aerial stretch without poles",
                reason="no place fit for a joint is declared there; find real ones on the ground",
            )
    for leg in ground.legs:
        if leg.heights_m is None:
            yield AssumedValue(
                name=f"heights of leg {leg.name}",
                value="none",
                unit="m",
                source="geometry",
                reason="the geometry has no heights: measured on the ellipsoid, without slope",
            )
