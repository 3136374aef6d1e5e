"""Joints and reels of one span at least cost, proven optimal under every limit."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

from routeplan.cable.reel_limits import Room, keeps, limited_path, room_of
from routeplan.cable.reel_models import (
    BoughtSection,
    SpanLayout,
    SpanProblem,
    check_layout,
    needed_mm,
    reel_for,
)
from routeplan.cable.reel_paths import Table, forward, make_costs, make_table, path_of

__all__ = ["cheapest_layout", "one_joint_fewer"]


def cheapest_layout(problem: SpanProblem, *, work_most: int | None = None) -> SpanLayout | None:
    """
    Return the cheapest joints and reels of a span, or None if no layout keeps the limits.

    Least cost; among equals fewest joints, then fewest at assumed places, then the smallest
    sum of `tie_key`. Exact: a shortest path over the n places in O(n (p + g) log n) for p
    put-ups and g places worth starting a made piece from. A limit on joints that binds is
    searched in layers, O(joints n log n) at worst; joints that weigh unequally are searched
    with labels, which may take very long and alone obey `work_most`.

    Parameters
    ----------
    problem
        The span.
    work_most
        Most sections weighed before the label search gives up; the layout then says
        `stopped_by="work"` and carries the bound reached. [-]

    Returns
    -------
    cheapest_layout
        Checked again against the raw problem before it is returned.

    Examples
    --------
    >>> from fractions import Fraction
    >>> from routeplan.cable.reel_models import Buying
    >>> buying = Buying(put_ups_mm=(4000,), cable_cents_per_m=Fraction(120), reel_each_cents=9)
    >>> span = SpanProblem(
    ...     chain_mm=(0, 3000, 6000), arrive_mm=(0, 3000, 6000), leave_mm=(0, 3000, 6000),
    ...     joint_cost_cents=(0, 500, 0), assumed=(False,) * 3, tie_key=(1, 2, 3),
    ...     ordering_ratio=Fraction(0), buying=buying,
    ... )
    >>> layout = cheapest_layout(span)
    >>> layout.places, layout.cost_cents
    ((0, 1, 2), 1478)
    """
    room = room_of(problem)
    table = make_table(problem)
    path = path_of(forward(table, make_costs(table)))
    if path is None or room.joints_most < 0:
        return None
    if keeps(room, path):
        return _layout(problem, path)
    return _limited(problem, table, room, work_most=work_most)


def one_joint_fewer(
    problem: SpanProblem, layout: SpanLayout, *, work_most: int | None = None
) -> SpanLayout | None:
    """
    Return the cheapest layout with exactly one joint fewer than `layout`, or None.

    Exact, under the problem's other limits; see `cheapest_layout` for the cost of the search.
    """
    joints = layout.joint_count - 1
    if joints < 0:
        return None
    room = replace(room_of(replace(problem, joints_most=joints)), exact=True)
    if room.joints_most < joints:
        return None
    return _limited(problem, make_table(problem), room, work_most=work_most)


def _limited(
    problem: SpanProblem, table: Table, room: Room, *, work_most: int | None
) -> SpanLayout | None:
    """Return the best layout under a limit on joints that the free optimum breaks."""
    found = limited_path(problem, table, room, work_most=work_most)
    if found is None:
        return None
    path, floor = found
    return _layout(problem, path, floor_cents=None if floor is None else floor >> table.shift)


def _layout(
    problem: SpanProblem, path: tuple[int, ...], *, floor_cents: int | None = None
) -> SpanLayout:
    """Return the layout of a path, checked; with a floor below its cost if it is not proven."""
    sections = tuple(_section(problem, start, end) for start, end in pairwise(path))
    cost = sum(section.price_cents for section in sections)
    cost += sum(problem.joint_cost_cents[place] for place in path[1:-1])
    layout = SpanLayout(
        places=path,
        sections=sections,
        cost_cents=cost,
        lower_bound_cents=cost if floor_cents is None else floor_cents,
        optimal=floor_cents is None,
        stopped_by="" if floor_cents is None else "work",
    )
    check_layout(problem, layout)
    return layout


def _section(problem: SpanProblem, start: int, end: int) -> BoughtSection:
    """Return a section with the cheapest reel for it."""
    length_mm = needed_mm(problem, start, end)
    reel = reel_for(problem.buying, length_mm)
    if reel is None:
        raise AssertionError(f"reel search chose a section of {length_mm} mm that no reel holds")
    return BoughtSection(
        start=start,
        end=end,
        sheath_mm=problem.arrive_mm[end] - problem.leave_mm[start],
        needed_mm=length_mm,
        way=reel[2],
        reel_mm=reel[1],
        price_cents=reel[0],
    )
