"""The whole pipeline on one page: from what was declared to what is planned."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

from routeplan.cable.assembly import fewer_joints, put_together
from routeplan.cable.fibres import FibrePlan
from routeplan.cable.layout import LaidCable, lay_cables
from routeplan.cable.marks import mark_warnings
from routeplan.cable.model import Layout, Splice
from routeplan.cable.panels import Port, panel_ports
from routeplan.cable.schedule import joint_splice_count, splice_rows
from routeplan.check import Check
from routeplan.circuits import CircuitPlan, circuit_fibres, joint_figures, light_circuits
from routeplan.errors import InputError, Problem
from routeplan.ground.heights import assumed_heights
from routeplan.ground.legs import lay_ground
from routeplan.ground.model import Ground
from routeplan.memo import Memo, remembered, swept
from routeplan.protection import guarded_orders
from routeplan.routed import RoutedPair, routed_run
from routeplan.run.defaults import AssumedValue, assumed_values, default_value
from routeplan.run.model import Run
from routeplan.run.practice import CircuitOrder
from routeplan.verify import plan_checks
from routeplan.verify_cable import closure_checks, make_checks
from routeplan.verify_light import light_warnings

__all__ = ["CircuitPlan", "Plan", "assumptions", "one_fewer", "plan", "ports", "splices"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Plan:
    """
    A run planned; `run` has its legs along streets among its lines, `pairs` those kept separate.

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
    pairs: tuple[RoutedPair, ...] = ()
    assumed: tuple[AssumedValue, ...] = ()

    @property
    def verdict(self) -> Literal["fits", "fails", "unknown"]:
        """Whether anything fails: `unknown` is not failing."""
        verdicts = {check.verdict for check in self.checks}
        return "fails" if "fails" in verdicts else "unknown" if "unknown" in verdicts else "fits"


def plan(run: Run, *, memo: Memo | None = None) -> Plan:
    """
    Plan a run: ways along streets, ground, cables, joints and reels, fibres, light.

    Parameters
    ----------
    run
        What was declared; see `routeplan.run.read_run`.
    memo
        Results of earlier plans; passing the same one again re-plans only what changed.

    Raises
    ------
    InputError
        If points, names, wavelengths or fibre counts do not fit the geometry, or a leg has no way.
    InfeasibleError
        If no layout keeps every limit.
    """
    swept(memo)
    routed = routed_run(run, memo=memo)
    run = routed.run
    ground = remembered(
        memo, ("ground", run.lines, run.places, run.areas, run.placement, run.crs, run.terrain,
               run.layers, run.practice.joining, run.practice.ground),
        lambda: lay_ground(run),
    )  # fmt: skip
    orders, order_warnings = _orders(run, ground)
    called = frozenset(str(end) for order in orders for end in (order.from_, order.to))
    laid = lay_cables(run, ground, memo=memo, called=called)
    orders = guarded_orders(orders, laid, routed.pairs)
    fibres, problems = _fibres(ground, laid, orders)
    uses = fibres.uses
    layout = put_together(run, ground, laid, uses)
    circuits = light_circuits(run, ground, laid, layout, orders, uses=uses, problems=problems)
    counts = joint_splice_count(layout.joints, layout.sections, layout.cables, uses)
    return Plan(
        run=run,
        ground=ground,
        laid=laid,
        layout=layout,
        circuits=circuits,
        splice_counts=counts,
        checks=(
            *plan_checks(run, layout, circuits),
            *closure_checks(run, layout, counts),
            *make_checks(run, ground, laid),
        ),
        warnings=(
            *run.warnings,
            *ground.warnings,
            *order_warnings,
            *(warning for cable in laid for warning in cable.warnings),
            *_fibre_warnings(fibres),
            *mark_warnings(run.marks, layout),
            *light_warnings(run, layout, circuits),
        ),
        pairs=routed.pairs,
        assumed=routed.assumed,
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


def _fibres(
    ground: Ground, laid: Sequence[LaidCable], orders: Sequence[CircuitOrder]
) -> tuple[FibrePlan, tuple[Problem, ...]]:
    """Return the fibres of circuits; none, and why, where they cannot have them."""
    try:
        return circuit_fibres(ground, laid, orders), ()
    except InputError as error:
        return FibrePlan(uses=(), change_count=0, is_proven=True), tuple(error.problems)


def _fibre_warnings(fibres: FibrePlan) -> Iterator[tuple[str, str]]:
    if not fibres.is_proven:
        count = fibres.change_count
        yield (
            "circuits",
            f"fibres change number from cable to cable {count} times; whether fewer would do was "
            "not searched to the end",
        )


def _default_order(run: Run, start: str, end: str) -> CircuitOrder:
    values = {
        key: default_value(f"circuit.{key}", run.purpose)
        for key in ("fibre_count", "wavelengths_nm")
    }
    ends = {"name": "Circuit 1", "from": start, "to": end}
    return CircuitOrder.model_validate({**values, **ends})


def splices(planned: Plan) -> tuple[Splice, ...]:
    """Return the splice schedule of a plan, closure by closure and fibre by fibre."""
    run = planned.run
    rows = splice_rows(
        planned.layout.joints,
        planned.layout.sections,
        planned.layout.cables,
        [use for circuit in planned.circuits for use in circuit.uses],
        fibres_per_tray=run.practice.joints.fibres_per_tray,
        limit_db=run.practice.loss.splice_limit_db,
    )
    measured = {figures.place for figures in run.joints if figures.measured_db is not None}
    limits_db = {
        joint.id: own[joint.id].limit_db
        for own in (joint_figures(run, planned.layout),)
        for joint in planned.layout.joints
        if joint.id in own and not {joint.id, joint.reach_name} & measured
    }
    return tuple(replace(row, limit_db=limits_db.get(row.joint, row.limit_db)) for row in rows)


def ports(planned: Plan) -> tuple[Port, ...]:
    """Return the panel ports of every site, in the order of the nodes."""
    return panel_ports(
        planned.layout,
        [use for circuit in planned.circuits for use in circuit.uses],
        site_names={node.id: node.name for node in planned.ground.nodes if node.is_site},
        fibre_counts={one.order.name: one.order.fibre_count for one in planned.circuits},
    )


def one_fewer(planned: Plan) -> tuple[int, int] | None:
    """Return joint count and cost [cents] of the cheapest layout with one joint fewer, or None."""
    return fewer_joints(planned.laid, planned.layout)


def assumptions(planned: Plan) -> tuple[AssumedValue, ...]:
    """Return everything the plan rests on that the run did not say."""
    return (*planned.assumed, *_assumed_ground(planned), *assumed_values(planned.run))


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
    yield from assumed_heights(planned.run, ground)
