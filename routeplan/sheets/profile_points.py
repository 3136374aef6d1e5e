"""The rows of crossings, loops and reach points below the strip chart of a leg."""

from __future__ import annotations

from collections.abc import Sequence

from routeplan.sheets.lookup import Row, rows_at, text_at, value_at
from routeplan.sheets.svg_parts import HAIR, INK, MUTED, PAPER, Scale, svg_text

__all__ = ["points_svg"]

_STEP_Y = 13.0
_LETTERS = {  # a letter is read without colour, and where marks are small
    "road": "R",
    "rail": "T",
    "water": "W",
    "power": "E",
    "pipeline": "P",
}
_WORDS = {"R": "road", "T": "rail", "W": "water", "E": "power", "P": "pipeline"}
_TALL = {"pole": 3.0, "reach": 3.0}  # half heights of ticks; places with a lid are taller


def points_svg(document: Row, leg: str, along: Scale, y: float) -> list[str]:
    """
    Return crossings, loops and reach points of a leg in three rows, each under its name.

    Parameters
    ----------
    document
        The mapping that `plan.json` holds.
    leg
        Name of the leg.
    along
        From ground metres to drawing units.
    y
        Where the first row is.
    """
    stations = [row for row in rows_at(document, "stations") if text_at(row, "leg") == leg]
    crossed = [
        row
        for row in rows_at(document, "crossings")
        if text_at(row, "leg") == leg and text_at(row, "how") in ("crosses", "inside", "")
    ]
    loops = [row for row in stations if _is_loop(row)]
    reached = [row for row in stations if text_at(row, "reach_kind")]
    return [
        *_crossings(crossed, along, y),
        *_loops(loops, along, y + _STEP_Y),
        *_reach(reached, along, y + 2 * _STEP_Y),
    ]


def _is_loop(station: Row) -> bool:
    """Return whether cable is stored at a station that is no joint and no end."""
    before_m, after_m = value_at(station, "sheath_from_m"), value_at(station, "sheath_to_m")
    is_longer = before_m is not None and after_m is not None and after_m - before_m > 5.0
    return text_at(station, "kind") == "loop" or (
        is_longer and text_at(station, "kind") in ("crossing", "reach")
    )


def _row(name: str, along: Scale, y: float) -> list[str]:
    line = f'<path d="M{along.start:.1f} {y:.1f}H{along.end:.1f}" stroke="{HAIR}"/>'
    return [line, svg_text(along.start - 4, y + 3.5, name, anchor="end", colour=MUTED)]


def _crossings(rows: Sequence[Row], along: Scale, y: float) -> list[str]:
    drawn = [row for row in rows if text_at(row, "crosses") in _LETTERS]
    if not drawn:
        return []
    parts, free_from = _row("Cross", along, y), 0.0
    used: dict[str, None] = {}
    for row in sorted(drawn, key=lambda row: value_at(row, "ground_m") or 0.0):
        x = along.at(value_at(row, "ground_m") or 0.0)
        letter = _LETTERS[text_at(row, "crosses")]
        parts.append(f'<path d="M{x:.1f} {y - 5:.1f}v10" stroke="{INK}" stroke-width="1"/>')
        if x - 4 >= free_from:
            parts.append(
                f'<circle cx="{x:.1f}" cy="{y:.1f}" r="5" fill="{PAPER}" stroke="{INK}" '
                f'stroke-width=".9"/>{svg_text(x, y + 3.2, letter, anchor="middle")}'
            )
            free_from = x + 6
        used[letter] = None
    key = ", ".join(f"{letter} {_WORDS[letter]}" for letter in used)
    return [*parts, svg_text(along.end + 40, y + 2 * _STEP_Y + 18, key, anchor="end", colour=MUTED)]


def _loops(rows: Sequence[Row], along: Scale, y: float) -> list[str]:
    if not rows:
        return []
    marks = "".join(
        f'<circle cx="{along.at(value_at(row, "ground_m") or 0.0):.1f}" cy="{y:.1f}" r="3.4" '
        f'fill="none" stroke="{INK}" stroke-width="1.3"/>'
        for row in rows
    )
    return [*_row("Loops", along, y), marks]


def _reach(rows: Sequence[Row], along: Scale, y: float) -> list[str]:
    if not rows:
        return []
    path = ""
    for row in rows:
        half = _TALL.get(text_at(row, "reach_kind"), 5.0)
        x = along.at(value_at(row, "ground_m") or 0.0)
        path += f"M{x:.1f} {y - half:.1f}v{2 * half:.1f}"
    return [*_row("Reach", along, y), f'<path d="{path}" stroke="{INK}" stroke-width="1"/>']
