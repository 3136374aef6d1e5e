"""How placements and points are drawn on map and strip chart: by form as well as by colour."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["LINE_STYLES", "POINT_WORDS", "LineStyle", "line_style"]

Form = Literal["solid", "dash", "dots", "ticks", "double", "rail"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LineStyle:
    """
    How one placement is drawn.

    `ticks` crosses a thin line with short strokes, `double` is two thin lines, `rail` two lines
    with a dashed one between; each can be told from the others without its colour.
    """

    word: str
    colour: str
    form: Form
    width_px: float
    dash_px: tuple[float, ...] = ()


# Hues keep apart for the three kinds of colour blindness, and differ in lightness for print.
LINE_STYLES: dict[str, LineStyle] = {
    "duct": LineStyle(word="duct", colour="#15487f", form="solid", width_px=4.0),
    "buried": LineStyle(
        word="buried", colour="#94510f", form="dash", width_px=4.0, dash_px=(13.0, 5.0)
    ),
    "aerial": LineStyle(word="aerial", colour="#c2410c", form="ticks", width_px=2.0),
    "surface": LineStyle(
        word="surface", colour="#7a6a00", form="dots", width_px=4.5, dash_px=(0.1, 8.0)
    ),
    "indoor": LineStyle(
        word="indoor", colour="#8a3f86", form="dash", width_px=3.0, dash_px=(4.0, 3.0)
    ),
    "bridge": LineStyle(word="bridge", colour="#1f2528", form="double", width_px=6.0),
    "water": LineStyle(
        word="water", colour="#0b7fab", form="dash", width_px=3.0, dash_px=(14.0, 4.0, 2.0, 4.0)
    ),
    "existing": LineStyle(
        word="existing", colour="#5f6b70", form="rail", width_px=6.0, dash_px=(5.0, 5.0)
    ),
}
_UNKNOWN = LineStyle(word="not stated", colour="#5f6b70", form="solid", width_px=2.0)

# One word each for legend and hover; the shape belongs to the drawing.
POINT_WORDS: dict[str, str] = {
    "site": "site",
    "transmitter": "transmitter",
    "joint": "joint",
    "assumed_joint": "joint, place assumed",
    "loop": "slack loop",
    "crossing": "crossing",
    "handhole": "handhole",
    "maintenance_hole": "maintenance hole",
    "pole": "pole",
    "cabinet": "cabinet",
    "pedestal": "pedestal",
    "building": "building",
    "reach": "reach point",
}


def line_style(placement: str) -> LineStyle:
    """Return how a placement is drawn; an unknown one as a thin grey line."""
    return LINE_STYLES.get(placement, _UNKNOWN)
