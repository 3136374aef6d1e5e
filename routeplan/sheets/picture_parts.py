"""What the two pictures of light share: size, frame, legend, and a band between two curves."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from routeplan.sheets.svg_parts import HAIR, INK, MUTED, Scale, curve_path, svg_text
from routeplan.sheets.text import number_text, safe

__all__ = [
    "CHARACTER",
    "DASHED",
    "LEFT",
    "RIGHT",
    "TICK",
    "WIDTH",
    "band",
    "cut_text",
    "frame",
    "legend",
    "picture",
    "step_digits",
]

WIDTH = 760
LEFT, RIGHT = 52, WIDTH - 64
CHARACTER = 6.1  # drawing units a character takes, on the safe side
TICK = "#8b8778"
DASHED = 'stroke-dasharray="6 3"'
_GRID = "#d8d4c8"


def picture(parts: Iterable[str], *, height: int, label: str) -> str:
    """Return the parts as one `svg` element with a name for those who cannot see it."""
    return (
        f'<svg class="profile" viewBox="0 0 {WIDTH} {height}" role="img" '
        f'aria-label="{safe(label)}" xmlns="http://www.w3.org/2000/svg">{"".join(parts)}</svg>'
    )


def frame(up: Scale, *, unit: str, title: str, bottom: int) -> list[str]:
    """Return title, level lines with their values, and the unit above them."""
    digits = step_digits(up.step)
    lines = "".join(f"M{LEFT} {up.at(tick):.1f}H{RIGHT}" for tick in up.ticks())
    values = [
        svg_text(
            LEFT - 9, up.at(t) + 3.5, number_text(t, digits=digits), anchor="end", colour=MUTED
        )
        for t in up.ticks()
    ]
    return [
        svg_text(LEFT - 44, 14, cut_text(title, WIDTH - 8), bold=True),
        f'<path d="{lines}" stroke="{_GRID}" stroke-width=".6"/>',
        f'<path d="M{LEFT} {bottom}H{RIGHT}" stroke="{INK}" stroke-width="1"/>',
        svg_text(LEFT - 9, 48, unit, anchor="end", colour=MUTED),
        *values,
    ]


def step_digits(step: float) -> int:
    """Return how many decimals a step needs, three at most."""
    return next(d for d in range(4) if d == 3 or abs(step * 10**d - round(step * 10**d)) < 1e-9)


def cut_text(text: str, room: float) -> str:
    """Return a text that fits into so many drawing units."""
    most = int(room / (CHARACTER + 0.6))
    return text if len(text) <= most else f"{text[: most - 3]}..."


def band(
    x: Sequence[float],
    upper: Sequence[float],
    lower: Sequence[float],
    across: Scale,
    up: Scale,
) -> list[str]:
    """Return two curves with the ground between them tinted: upper dashed, lower full."""
    above = curve_path([(across.at(a), up.at(b)) for a, b in zip(x, upper, strict=True)])
    below = curve_path([(across.at(a), up.at(b)) for a, b in zip(x, lower, strict=True)])
    back = curve_path([(across.at(a), up.at(b)) for a, b in zip(x[::-1], lower[::-1], strict=True)])
    return [
        f'<path d="{above}L{back[1:]}Z" fill="{HAIR}"/>',
        f'<path d="{above}" fill="none" stroke="{INK}" stroke-width="1.3" {DASHED}/>',
        f'<path d="{below}" fill="none" stroke="{INK}" stroke-width="1.8"/>',
    ]


def legend(entries: Sequence[tuple[str, str]], *, y: float) -> list[str]:
    """Return samples of lines with their names in a row."""
    parts, x = [], float(LEFT)
    for text, style in entries:
        parts.append(f'<path d="M{x:.1f} {y - 3.5:.1f}h26" stroke="{INK}" fill="none" {style}/>')
        parts.append(svg_text(x + 32, y, text))
        x += 32 + CHARACTER * len(text) + 22
    return parts
