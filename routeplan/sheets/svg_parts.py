"""What our drawn charts share: scales, texts, curves and their few colours."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from routeplan.sheets.text import safe

__all__ = ["HAIR", "INK", "MUTED", "PAPER", "Scale", "curve_path", "nice_step", "svg_text"]

INK, MUTED, HAIR, PAPER = "#1c2326", "#5d6a70", "#e4e0d2", "#ffffff"


@dataclass(frozen=True, slots=True, kw_only=True)
class Scale:
    """A straight scale from values to drawing units, with a tick every `step`."""

    low: float
    high: float
    step: float
    start: float
    end: float

    def at(self, value: float) -> float:
        """Return where a value is drawn."""
        part = (value - self.low) / ((self.high - self.low) or 1.0)
        return self.start + part * (self.end - self.start)

    def ticks(self) -> list[float]:
        """Return the values that have a tick."""
        count = math.floor((self.high - self.low) / self.step + 1e-9)
        return [self.low + number * self.step for number in range(count + 1)]


def nice_step(span: float, count: float) -> float:
    """
    Return the smallest round step that divides a span into about `count` parts or fewer.

    Examples
    --------
    >>> nice_step(20000.0, 10), nice_step(7.4, 4)
    (2000.0, 2.0)
    """
    if span <= 0:
        return 0.0
    rough = span / count
    power = 10.0 ** math.floor(math.log10(rough))
    return next(each * power for each in (1, 2, 2.5, 5, 10) if each * power >= rough * 0.999999)


def curve_path(pairs: Sequence[tuple[float, float]]) -> str:
    """Return the path through points, those nearer than half a drawing unit left out."""
    kept = [pairs[0]]
    for x, y in pairs[1:-1]:
        if x - kept[-1][0] >= 0.5 or abs(y - kept[-1][1]) >= 0.5:
            kept.append((x, y))
    return "M" + "L".join(f"{x:.1f} {y:.1f}" for x, y in [*kept, pairs[-1]])


def svg_text(
    x: float, y: float, text: str, *, anchor: str = "start", colour: str = INK, bold: bool = False
) -> str:
    """Return a text of a drawing, made harmless."""
    weight = ' font-weight="600"' if bold else ""
    return (
        f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{colour}"{weight}>'
        f"{safe(text)}</text>"
    )
