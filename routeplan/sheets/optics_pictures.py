"""Pictures of a circuit's light: attenuation against wavelength, and power along the glass."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from routeplan.light.grid import coarse_channels
from routeplan.sheets.lookup import Row, numbers, row_at, rows_at, text_at, value_at
from routeplan.sheets.picture_parts import (
    CHARACTER,
    DASHED,
    LEFT,
    RIGHT,
    TICK,
    WIDTH,
    band,
    cut_text,
    frame,
    legend,
    picture,
    step_digits,
)
from routeplan.sheets.svg_parts import (
    INK,
    MUTED,
    PAPER,
    Scale,
    nice_step,
    svg_text,
)
from routeplan.sheets.text import number_text, plain

__all__ = ["PICTURES_MOST", "circuit_pictures", "level_svg", "spectrum_svg"]

PICTURES_MOST = 4
"""Wavelengths of one circuit whose power is drawn; the others are in the data alone."""

_SENSITIVITY = "sensitivity"
_LINE = 12  # drawing units from one line of text to the next


@dataclass(frozen=True, slots=True, kw_only=True)
class _Limit:
    """A level with a name: drawn as a line across."""

    dbm: float
    text: str
    dash: str
    is_high: bool = False


def circuit_pictures(circuit: Row) -> list[str]:
    """
    Return the pictures of one circuit: attenuation against wavelength, power along the glass.

    Parameters
    ----------
    circuit
        A row of `circuits`; `PICTURES_MOST` wavelengths are drawn at most.
    """
    levels = rows_at(circuit, "levels")[:PICTURES_MOST]
    drawn = [spectrum_svg(circuit), *(level_svg(circuit, row) for row in levels)]
    return [picture for picture in drawn if picture]


def spectrum_svg(circuit: Row) -> str:
    """
    Return attenuation against wavelength of a circuit's glass, its wavelengths marked.

    Parameters
    ----------
    circuit
        A circuit of `plan.json`.

    Returns
    -------
    spectrum_svg
        An `svg` element; empty where the circuit has no spectrum.
    """
    spectrum = row_at(circuit, "spectrum")
    nm = numbers(spectrum.get("wavelengths_nm"))
    typical, highest = (numbers(spectrum.get(f"{k}_db_per_km")) for k in ("typical", "max"))
    if len(nm) < 2 or not len(nm) == len(typical) == len(highest):
        return ""
    top, bottom, height = 58, 212, 276
    ceilings = rows_at(spectrum, "ceilings")
    allowed = [value_at(row, "max_db_per_km") or 0.0 for row in ceilings]
    step_db = nice_step(max(*highest, *allowed) * 1.02, 5)
    most_db = math.ceil(max(*highest, *allowed) * 1.02 / step_db) * step_db
    across = Scale(low=nm[0], high=nm[-1], step=20.0, start=LEFT, end=RIGHT)
    up = Scale(low=0.0, high=most_db, step=step_db, start=bottom, end=top)
    used = sorted({value_at(row, "wavelength_nm") or 0.0 for row in rows_at(circuit, "budgets")})
    types = ", ".join(plain(each) for each in _texts(spectrum.get("fibre_types")))
    title = f"Attenuation of {types} along {text_at(circuit, 'name')}"
    parts = [
        *frame(up, unit="dB/km", title=title, bottom=bottom),
        *band(nm, highest, typical, across, up),
        *(_ceiling(row, across, up) for row in ceilings),
        *_used(used, across, top=top, bottom=bottom),
        *legend(_SPECTRUM_LEGEND if ceilings else _SPECTRUM_LEGEND[:2], y=34),
        *_wavelength_axis(across, bottom=bottom),
        *_channels(used, across, y=bottom + 28),
    ]
    return picture(parts, height=height, label=title)


def level_svg(circuit: Row, levels: Row) -> str:
    """
    Return power along the glass from transmitter to receiver, strongest and weakest, with limits.

    Without launch powers the picture shows how far the light has fallen, from zero.

    Parameters
    ----------
    circuit
        A circuit of `plan.json`.
    levels
        One of its `levels`.

    Returns
    -------
    level_svg
        An `svg` element; empty where there is nothing to draw.
    """
    glass_m, least_db, worst_db = (
        numbers(levels.get(key)) for key in ("glass_m", "least_db", "worst_db")
    )
    if len(glass_m) < 2 or glass_m[-1] <= 0.0 or not len(glass_m) == len(least_db) == len(worst_db):
        return ""
    least_tx, most_tx = value_at(levels, "tx_min_dbm"), value_at(levels, "tx_max_dbm")
    is_relative = least_tx is None
    low_tx = 0.0 if least_tx is None else least_tx
    high_tx = low_tx if is_relative or most_tx is None else most_tx
    strongest = [high_tx - loss_db for loss_db in least_db]
    weakest = [low_tx - loss_db for loss_db in worst_db]
    limits = [] if is_relative else _limits(circuit, levels, low_tx)
    top, bottom, height = 58, 232, 296
    seen = [*strongest, *weakest, *(limit.dbm for limit in limits)]
    step_db = nice_step(max(max(seen) - min(seen), 2.0) * 1.1, 6)
    low_dbm = math.floor((min(seen) - 0.04 * step_db) / step_db) * step_db
    high_dbm = math.ceil((max(seen) + 0.04 * step_db) / step_db) * step_db
    up = Scale(low=low_dbm, high=high_dbm, step=step_db, start=bottom, end=top)
    step_m = nice_step(glass_m[-1], 10)
    across = Scale(low=0.0, high=glass_m[-1], step=step_m, start=LEFT, end=RIGHT)
    title = _level_title(circuit, levels)
    parts = [
        *frame(up, unit="dB" if is_relative else "dBm", title=title, bottom=bottom),
        *_marks(circuit, levels, across, top=top, bottom=bottom),
        *band(glass_m, strongest, weakest, across, up),
        *_limit_parts(limits, strongest[-1], up),
        *legend(_level_legend(is_relative=is_relative, is_most_known=most_tx is not None), y=34),
        *_arrivals(strongest[-1], weakest[-1], up),
        *_glass_axis(across, bottom=bottom, y=height - 8),
    ]
    return picture(parts, height=height, label=title)


def _texts(value: object) -> list[str]:
    return [str(each) for each in value] if isinstance(value, list) else []


def _level_title(circuit: Row, levels: Row) -> str:
    ends = [plain(text_at(circuit, "from")), plain(text_at(circuit, "to"))]
    if text_at(levels, "direction") == "to-from":
        ends.reverse()
    nm = value_at(levels, "wavelength_nm") or 0.0
    what = "Loss" if value_at(levels, "tx_min_dbm") is None else "Power"
    return f"{what} along the glass at {nm:g} nm, {ends[0]} to {ends[1]}"


_DOTTED = 'stroke-dasharray="1.5 3"'
_SPECTRUM_LEGEND = (
    ("typical", 'stroke-width="1.8"'),
    ("as ordered, at most", f'stroke-width="1.3" {DASHED}'),
    ("ITU-T ceiling", f'stroke-width="2.2" {_DOTTED}'),
)


def _level_legend(*, is_relative: bool, is_most_known: bool) -> list[tuple[str, str]]:
    weakest, strongest = "worst loss", "least loss"
    if not is_relative:
        weakest = f"weakest: least launched, {weakest}"
        strongest = f"{'strongest: most' if is_most_known else 'least'} launched, {strongest}"
    return [(weakest, 'stroke-width="1.8"'), (strongest, f'stroke-width="1.3" {DASHED}')]


def _ceiling(row: Row, across: Scale, up: Scale) -> str:
    """Return one ceiling: a line over its band, a short one where it is for one wavelength."""
    y = up.at(value_at(row, "max_db_per_km") or 0.0)
    ends = [value_at(row, f"wavelength_{end}_nm") or 0.0 for end in ("min", "max")]
    start, end = (across.at(min(max(nm, across.low), across.high)) for nm in ends)
    if end - start < 8:
        start, end = start - 4, end + 4
    return (
        f'<path d="M{start:.1f} {y:.1f}H{end:.1f}" stroke="{INK}" stroke-width="2.2" '
        f'fill="none" {_DOTTED}/>'
    )


def _used(used: Sequence[float], across: Scale, *, top: int, bottom: int) -> list[str]:
    """Return a line at each wavelength of the circuit; those close together share a name."""
    lines = "".join(f"M{across.at(nm):.1f} {top - 4}V{bottom}" for nm in used)
    parts = [f'<path d="{lines}" stroke="{INK}" stroke-width=".9"/>'] if used else []
    groups: list[list[float]] = []
    for nm in used:
        if groups and across.at(nm) - across.at(groups[-1][-1]) < CHARACTER * 8:
            groups[-1].append(nm)
        else:
            groups.append([nm])
    for group in groups:
        text = f"{group[0]:g}" if len(group) == 1 else f"{group[0]:g} to {group[-1]:g}"
        half = (CHARACTER + 0.6) * len(text) / 2
        x = (across.at(group[0]) + across.at(group[-1])) / 2
        x = min(max(x, LEFT - 20 + half), WIDTH - half)
        parts.append(svg_text(x, top - 7, text, anchor="middle", bold=True))
    return parts


def _wavelength_axis(across: Scale, *, bottom: int) -> list[str]:
    """Return ticks of round wavelengths with every second one named."""
    first = math.ceil(across.low / across.step) * across.step
    count = int((across.high - first) / across.step) + 1
    ticks = [first + number * across.step for number in range(count)]
    marks = "".join(f"M{across.at(nm):.1f} {bottom}v4" for nm in ticks)
    named = [nm for nm in ticks if round(nm / across.step) % 2 == 1]
    return [
        f'<path d="{marks}" stroke="{TICK}" stroke-width=".8"/>',
        *(svg_text(across.at(nm), bottom + 16, f"{nm:g}", anchor="middle") for nm in named),
        svg_text(RIGHT + 60, bottom + 16, "nm", anchor="end"),
    ]


def _channels(used: Sequence[float], across: Scale, *, y: int) -> list[str]:
    """Return the channels of the coarse grid, those the circuit sends in filled."""
    parts = []
    for number, channel in enumerate(coarse_channels()):
        start = across.at(channel.centre_nm - channel.half_width_nm)
        end = across.at(channel.centre_nm + channel.half_width_nm)
        is_used = any(channel.holds(nm) for nm in used)
        fill = INK if is_used else PAPER
        parts.append(
            f'<rect x="{start:.1f}" y="{y}" width="{end - start:.1f}" height="8" fill="{fill}" '
            f'stroke="{TICK}" stroke-width=".8"/>'
        )
        if number % 2 == 0 or is_used:
            name = channel.name
            middle = across.at(channel.centre_nm)
            row = y + 19 + (_LINE if number % 2 else 0)
            parts.append(svg_text(middle, row, name, anchor="middle", colour=MUTED, bold=is_used))
    parts.append(svg_text(RIGHT + 60, y + 8, "CWDM", anchor="end", colour=MUTED))
    return parts


def _limits(circuit: Row, levels: Row, least_tx_dbm: float) -> list[_Limit]:
    """Return what the receiver and the class stand, as lines across the picture."""
    found = []
    overload = value_at(levels, "rx_overload_dbm")
    if overload is not None:
        found.append(_Limit(dbm=overload, text="overload", dash="8 3 2 3", is_high=True))
    keys = ("wavelength_nm", "direction")
    budget = next(
        (b for b in rows_at(circuit, "budgets") if all(b.get(k) == levels.get(k) for k in keys)), {}
    )
    available = value_at(budget, "available_db")
    sensitivity = value_at(levels, "rx_sensitivity_dbm")
    least = None if available is None else round(least_tx_dbm - available, 3)
    if least is not None:
        found.append(_Limit(dbm=least, text="least the interface allows", dash="3 2"))
    if sensitivity is not None and sensitivity != least:
        found.append(_Limit(dbm=sensitivity, text=_SENSITIVITY, dash="1 2"))
    return found


def _limit_parts(limits: Sequence[_Limit], strongest_dbm: float, up: Scale) -> list[str]:
    """Return the lines of limits, named where neither curve comes: high right, low left."""
    parts = []
    for limit in limits:
        y = up.at(limit.dbm)
        parts.append(
            f'<path d="M{LEFT} {y:.1f}H{RIGHT}" stroke="{INK}" stroke-width="1" '
            f'stroke-dasharray="{limit.dash}"/>'
        )
        text = f"{limit.text} {number_text(limit.dbm, digits=1)} dBm"
        x, anchor = (RIGHT - 4.0, "end") if limit.is_high else (LEFT + 8.0, "start")
        is_below = strongest_dbm > limit.dbm if limit.is_high else limit.text == _SENSITIVITY
        parts.append(_haloed(x, y + (12 if is_below else -4), text, anchor))
    return parts


def _haloed(x: float, y: float, text: str, anchor: str) -> str:
    """Return a text on a piece of paper colour, so that lines do not cross it."""
    width = CHARACTER * len(text)
    start = x - width if anchor == "end" else x
    return (
        f'<rect x="{start - 2:.1f}" y="{y - 9:.1f}" width="{width + 4:.1f}" height="11.5" '
        f'fill="{PAPER}" fill-opacity=".85"/>{svg_text(x, y, text, anchor=anchor)}'
    )


def _arrivals(strongest: float, weakest: float, up: Scale) -> list[str]:
    """Return the two levels that arrive, beside the ends of their curves."""
    high, low = up.at(strongest) + 3.5, up.at(weakest) + 3.5
    if low - high < _LINE:
        middle = (low + high) / 2
        high, low = middle - _LINE / 2, middle + _LINE / 2
    return [
        svg_text(RIGHT + 6, high, number_text(strongest, digits=1)),
        svg_text(RIGHT + 6, low, number_text(weakest, digits=1), bold=True),
    ]


def _marks(circuit: Row, levels: Row, across: Scale, *, top: int, bottom: int) -> list[str]:
    """Return joints, panels and parts as lines down to the axis, named where there is room."""
    parts, free_from = [], -math.inf
    rows = rows_at(circuit, "marks")
    is_back = text_at(levels, "direction") == "to-from"
    places: dict[float, list[Row]] = {}
    for row in rows:
        at_m = value_at(row, "glass_m") or 0.0
        places.setdefault(round(across.high - at_m if is_back else at_m, 3), []).append(row)
    for at_m, here in sorted(places.items()):
        x = across.at(at_m)
        kinds = {text_at(row, "kind") for row in here}
        parts.append(
            f'<path d="M{x:.1f} {top}V{bottom}" stroke="{TICK}" stroke-width=".7" '
            f'stroke-dasharray="2 2.5"/>{_mark_shape(x, bottom, kinds)}'
        )
        name = cut_text(", ".join(dict.fromkeys(plain(text_at(row, "name")) for row in here)), 150)
        width = (CHARACTER + 0.6) * len(name)
        start = min(max(x - width / 2, LEFT - 20), WIDTH - 8 - width)
        if start >= free_from + 6:
            parts.append(svg_text(start, bottom + 20, name, bold=True))
            free_from = start + width
    return parts


def _mark_shape(x: float, y: float, kinds: set[str]) -> str:
    """Return a sign on the axis: a diamond for a joint, a square for a panel, a dot else."""
    style = f'fill="{PAPER}" stroke="{INK}" stroke-width="1.2"'
    if "panel" in kinds:
        return f'<path d="M{x - 4:.1f} {y - 4}h8v8h-8Z" {style}/>'
    if "joint" in kinds:
        return f'<path d="M{x:.1f} {y - 5.5}l5.5 5.5l-5.5 5.5l-5.5 -5.5Z" {style}/>'
    return f'<circle cx="{x:.1f}" cy="{y}" r="3.5" {style}/>'


def _glass_axis(across: Scale, *, bottom: int, y: int) -> list[str]:
    digits = step_digits(across.step / 1000)
    ticks = [tick for tick in across.ticks() if tick < across.high - across.step * 0.5]
    marks = "".join(f"M{across.at(tick):.1f} {bottom + 28}v5" for tick in (*ticks, across.high))
    return [
        f'<path d="M{LEFT} {bottom + 28}H{RIGHT}" stroke="{TICK}" stroke-width=".8"/>',
        f'<path d="{marks}" stroke="{TICK}" stroke-width=".8"/>',
        *(
            svg_text(across.at(t), y, number_text(t / 1000, digits=digits), anchor="middle")
            for t in ticks
        ),
        svg_text(
            RIGHT + 60, y, f"{number_text(across.high / 1000, digits=3)} km glass", anchor="end"
        ),
    ]
