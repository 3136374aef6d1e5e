"""The strip chart for print: height and loss against ground metres, ways and joints below."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence

from routeplan.sheets.lookup import Row, numbers, rows_at, text_at, value_at
from routeplan.sheets.map_style import LineStyle, line_style
from routeplan.sheets.picture_parts import step_digits
from routeplan.sheets.profile_points import points_svg
from routeplan.sheets.svg_parts import (
    HAIR,
    INK,
    MUTED,
    PAPER,
    Scale,
    curve_path,
    nice_step,
    svg_text,
)
from routeplan.sheets.text import number_text, plain, safe

__all__ = ["line_svg", "nice_step", "profile_svg"]

_WIDTH, _HEIGHT = 760, 280
_LEFT, _RIGHT, _TOP, _BOTTOM = 44, _WIDTH - 44, 36, 176
_BAND_Y = _BOTTOM + 12
_AXIS_Y = _BAND_Y + 26


def profile_svg(document: Mapping[str, object], leg_number: int = 0) -> str:
    """
    Return the strip chart of one leg as an SVG picture.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.
    leg_number
        Which of its legs.

    Returns
    -------
    profile_svg
        An `svg` element; heights and loss are drawn where the document has them, and below them
        the leg's placements, joints, crossings, loops and reach points.
    """
    leg = rows_at(document, "legs")[leg_number]
    length_m = value_at(leg, "ground_m") or 0.0
    along = Scale(
        low=0.0, high=length_m, step=nice_step(length_m, 10) or 1.0, start=_LEFT, end=_RIGHT
    )
    joints = [
        row
        for row in rows_at(document, "joints")
        if text_at(row, "leg") == text_at(leg, "name") and row.get("node") is None
    ]
    rows_count, height_parts = _heights(leg, along)
    parts = [
        *height_parts,
        *_loss(document, leg_number, along, rows_count),
        *_axis(along, length_m),
        *_ways(leg, along),
        *points_svg(document, text_at(leg, "name"), along, _AXIS_Y + 16),
        *_joints(joints, along),
        svg_text(_LEFT - 40, 11, f"{text_at(leg, 'from')}", bold=True),
        svg_text(_RIGHT + 40, 11, f"{text_at(leg, 'to')}", anchor="end", bold=True),
    ]
    label = safe(f"Height and loss along {text_at(leg, 'name')}")
    return (
        f'<svg class="profile" viewBox="0 0 {_WIDTH} {_HEIGHT}" role="img" aria-label="{label}" '
        f'xmlns="http://www.w3.org/2000/svg">{"".join(parts)}</svg>'
    )


def _heights(leg: Row, along: Scale) -> tuple[int, list[str]]:
    """Return how many rows the grid has, and the height profile on it."""
    ground_m = numbers(leg.get("line_ground_m"))
    line = leg.get("line")
    heights_m = [_third(vertex) for vertex in line] if isinstance(line, list) else []
    known_m = [height_m for height_m in heights_m if height_m is not None]
    if not known_m:
        return 4, [svg_text(_LEFT + 6, _TOP + 14, "No heights in the input.", colour=MUTED)]
    step_m = nice_step(max(max(known_m) - min(known_m), 10.0), 4)
    low_m = math.floor(min(known_m) / step_m) * step_m
    high_m = math.ceil(max(known_m) / step_m) * step_m
    scale = Scale(low=low_m, high=high_m, step=step_m, start=_BOTTOM, end=_TOP)
    pairs = [
        (along.at(at_m), scale.at(height_m))
        for at_m, height_m in zip(ground_m, heights_m, strict=False)
        if height_m is not None
    ]
    edge = curve_path(pairs)
    closed = f"M{pairs[0][0]:.1f} {_BOTTOM}L{edge[1:]}L{pairs[-1][0]:.1f} {_BOTTOM}Z"
    grid = [_gridline(scale.at(tick), tick) for tick in scale.ticks()]
    return len(scale.ticks()) - 1, [
        f'<path d="{closed}" fill="{HAIR}"/>',
        *grid,
        f'<path d="{edge}" fill="none" stroke="#8b8778" stroke-width="1.2"/>',
        svg_text(_LEFT - 40, _TOP - 11, "Height, m", colour=MUTED),
    ]


def _gridline(y: float, height_m: float) -> str:
    return f'<path d="M{_LEFT} {y:.1f}H{_RIGHT}" stroke="#d8d4c8" stroke-width=".6"/>' + svg_text(
        _LEFT - 6, y + 3.5, number_text(height_m), anchor="end", colour=MUTED
    )


def _loss(document: Row, leg_number: int, along: Scale, rows_count: int) -> list[str]:
    """Return the first circuit's loss along this leg, if the document holds one."""
    name = text_at(rows_at(document, "legs")[leg_number], "name")
    for circuit in rows_at(document, "circuits"):
        rows = [
            row
            for row in rows_at(circuit, "power")
            if text_at(row, "leg") == name or ("leg" not in row and leg_number == 0)
        ]
        wavelength_nm = value_at(rows[0], "wavelength_nm") if rows else None
        rows = [row for row in rows if value_at(row, "wavelength_nm") == wavelength_nm]
        if rows:
            title = f"Loss of {text_at(circuit, 'name')}"
            title += ", dB" if wavelength_nm is None else f" at {wavelength_nm:g} nm, dB"
            return _loss_parts(rows, along, rows_count, title)
    return []


def _loss_parts(rows: Sequence[Row], along: Scale, rows_count: int, title: str) -> list[str]:
    most_db = max(value_at(row, "loss_db") or 0.0 for row in rows)
    step_db = nice_step(max(most_db, 0.1), rows_count)
    scale = Scale(low=0.0, high=step_db * rows_count, step=step_db, start=_BOTTOM, end=_TOP)
    curve = curve_path(
        [
            (along.at(value_at(row, "ground_m") or 0.0), scale.at(value_at(row, "loss_db") or 0.0))
            for row in rows
        ]
    )
    digits = step_digits(step_db)
    ticks = [
        svg_text(_RIGHT + 6, scale.at(tick) + 3.5, number_text(tick, digits=digits))
        for tick in scale.ticks()
    ]
    return [
        f'<path d="{curve}" fill="none" stroke="{PAPER}" stroke-width="3.6"/>',
        f'<path d="{curve}" fill="none" stroke="{INK}" stroke-width="1.6"/>',
        *ticks,
        svg_text(_RIGHT + 40, _TOP - 11, title, anchor="end"),
    ]


def _axis(along: Scale, length_m: float) -> list[str]:
    digits = next(d for d in range(4) if d == 3 or (along.step / 1000 * 10**d) % 1 < 1e-9)
    ticks = [tick for tick in along.ticks() if tick < length_m - along.step * 0.45]
    labels = [
        svg_text(along.at(tick), _AXIS_Y, number_text(tick / 1000, digits=digits), anchor="middle")
        for tick in ticks
    ]
    marks = "".join(f"M{along.at(tick):.1f} {_BAND_Y + 9}v5" for tick in (*ticks, length_m))
    end = svg_text(
        _RIGHT + 40, _AXIS_Y, f"{number_text(length_m / 1000, digits=3)} km", anchor="end"
    )
    return [f'<path d="{marks}" stroke="#8b8778" stroke-width=".8"/>', *labels, end]


def _ways(leg: Row, along: Scale) -> list[str]:
    parts = []
    for stretch in rows_at(leg, "stretches"):
        start = along.at(value_at(stretch, "from_ground_m") or 0.0)
        end = max(along.at(value_at(stretch, "to_ground_m") or 0.0), start + 0.8)
        parts.append(line_svg(line_style(text_at(stretch, "placement")), start, end, _BAND_Y))
    return parts


def line_svg(style: LineStyle, start: float, end: float, y: float) -> str:
    """Return a placement's line, drawn level from `start` to `end`."""

    def line(colour: str, width: float, dash: Sequence[float] = (), cap: str = "butt") -> str:
        dashes = f' stroke-dasharray="{" ".join(f"{d:g}" for d in dash)}"' if dash else ""
        return (
            f'<path d="M{start:.1f} {y:g}H{end:.1f}" stroke="{colour}" stroke-width="{width:g}" '
            f'stroke-linecap="{cap}"{dashes} fill="none"/>'
        )

    width = style.width_px * 0.85
    drawn: dict[str, Callable[[], str]] = {
        "ticks": lambda: line(style.colour, width) + line(style.colour, 8, (1.4, 9)),
        "dots": lambda: line(style.colour, width, style.dash_px, "round"),
        "double": lambda: line(style.colour, width) + line(PAPER, width - 2.4),
        "rail": lambda: (
            line(style.colour, width) + line(PAPER, width - 2.4) + line(style.colour, 1, (4, 4))
        ),
    }
    return drawn.get(style.form, lambda: line(style.colour, width, style.dash_px))()


def _joints(joints: Sequence[Row], along: Scale) -> list[str]:
    parts, free_from = [], 0.0
    for joint in joints:
        x = along.at(value_at(joint, "ground_m") or 0.0)
        name = plain(text_at(joint, "name"))
        fill = PAPER if joint.get("assumed") else INK
        parts.append(
            f'<path d="M{x:.1f} {_TOP}V{_BOTTOM}" stroke="#8b8778" stroke-width=".7" '
            f'stroke-dasharray="2 2.5"/><path d="M{x:.1f} {_BAND_Y - 6}l6 6l-6 6l-6 -6Z" '
            f'fill="{fill}" stroke="{INK}" stroke-width="1.3"/>'
        )
        half = 3.2 * len(name) + 3
        if x - half >= max(free_from, _LEFT + 22) and x + half < _RIGHT - 90:
            parts.append(svg_text(x, _TOP - 11, name, anchor="middle", bold=True))
            free_from = x + half
    return parts


def _third(vertex: object) -> float | None:
    if not isinstance(vertex, list | tuple) or len(vertex) < 3 or vertex[2] is None:
        return None
    return float(vertex[2])
