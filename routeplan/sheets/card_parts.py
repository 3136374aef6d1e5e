"""The pieces a card is drawn of, in millimetres: fitted texts, rules and patches of colour."""

from __future__ import annotations

from itertools import accumulate

from routeplan.sheets.report_parts import swatch_fills
from routeplan.sheets.svg_parts import INK, MUTED
from routeplan.sheets.text import plain, safe

__all__ = ["PATCH_MM", "SQUEEZE", "fitted_text", "letters_em", "patch", "rule"]

PATCH_MM = 3.2
SQUEEZE = 1.35  # how far letters are pressed together before a text is cut

_EM, _NARROW_EM, _WIDE_EM = 0.54, 0.28, 0.75  # widths of letters, in parts of the type size
_NARROW, _WIDE = frozenset("iljtfr.,:;'/ |!()"), frozenset("mwMWABCDEGHKNOPQRSUVXYZ@%")


def fitted_text(
    x_mm: float,
    y_mm: float,
    text: str,
    width_mm: float,
    *,
    size_mm: float,
    colour: str = INK,
    bold: bool = False,
) -> str:
    """Return a text no wider than its place: pressed together a little, then cut."""
    shown = plain(text)
    room_em = width_mm * SQUEEZE / size_mm
    if letters_em(shown) > room_em:
        widths_em = accumulate(letters_em(letter) for letter in shown)
        kept = sum(width_em <= room_em - 1.0 for width_em in widths_em)
        shown = shown[:kept] + "\N{HORIZONTAL ELLIPSIS}"
    pressed = size_mm * letters_em(shown) > width_mm
    fit = f' textLength="{width_mm:.2f}" lengthAdjust="spacingAndGlyphs"' if pressed else ""
    weight = ' font-weight="600"' if bold else ""
    return (
        f'<text x="{x_mm:.2f}" y="{y_mm:.2f}" font-size="{size_mm}" fill="{colour}"{weight}{fit}>'
        f"{safe(shown)}</text>"
    )


def rule(x_mm: float, y_mm: float, width_mm: float, height_mm: float) -> str:
    """Return a rule across."""
    return (
        f'<rect x="{x_mm:.2f}" y="{y_mm:.2f}" width="{width_mm:.2f}" height="{height_mm}" '
        f'fill="{INK}"/>'
    )


def patch(colour: str, x_mm: float, y_mm: float) -> str:
    """Return a patch of a colour with the stripe of a marked one; empty where it is unknown."""
    fills = swatch_fills(colour)
    at = f'x="{x_mm:.2f}" width="{PATCH_MM}"'
    edge = f'fill="{fills[0] if fills else "none"}" stroke="{MUTED}" stroke-width="0.15"'
    stripe = (
        f'<rect {at} y="{y_mm + 0.7:.2f}" height="0.7" fill="{fills[1]}"/>' if fills[1:] else ""
    )
    return f'<rect {at} y="{y_mm:.2f}" height="2.1" {edge}/>{stripe}'


def letters_em(text: str) -> float:
    """Return about how wide a text is, in parts of its type size."""
    return sum(
        _NARROW_EM if letter in _NARROW else _WIDE_EM if letter in _WIDE else _EM for letter in text
    )
