"""Marks printed on jackets: metres along a section turned into what a crew reads on the cable."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from routeplan.cable.model import Layout
from routeplan.run.practice import JacketMark
from routeplan.units import mm_from_m

__all__ = ["PrintedMarks", "mark_warnings", "printed_mark_mm", "printed_marks"]


@dataclass(frozen=True, slots=True, kw_only=True)
class PrintedMarks:
    """What is printed where a section begins, and whether it falls from there."""

    start_mm: int
    falling: bool


def printed_marks(marks: Sequence[JacketMark], layout: Layout) -> dict[str, PrintedMarks]:
    """Return the marks of every section whose reel has some, by section id."""
    by_reel = {
        mark.reel: PrintedMarks(start_mm=mm_from_m(mark.start_m), falling=mark.falling)
        for mark in marks
    }
    return {cut.section: by_reel[cut.reel] for cut in layout.cuts if cut.reel in by_reel}


def printed_mark_mm(
    marks: Mapping[str, PrintedMarks], section: str | None, along_mm: int | None
) -> int | None:
    """
    Return the mark printed so far along a section; None where it is not known. [mm]

    Examples
    --------
    >>> marks = {"S1": PrintedMarks(start_mm=12_000, falling=False)}
    >>> printed_mark_mm(marks, "S1", 1_500), printed_mark_mm(marks, "S2", 1_500)
    (13500, None)
    """
    own = marks.get(section or "")
    if own is None or along_mm is None:
        return None
    printed = own.start_mm - along_mm if own.falling else own.start_mm + along_mm
    return printed if printed >= 0 else None


def mark_warnings(marks: Sequence[JacketMark], layout: Layout) -> Iterator[tuple[str, str]]:
    """Yield marks of reels that there are not, and those that fall below nothing."""
    reels = {reel.id for reel in layout.reels}
    lengths = {section.id: section.sheath_mm for section in layout.sections}
    known = printed_marks(marks, layout)
    for mark in marks:
        if mark.reel not in reels:
            yield f'mark "{mark.reel}"', "no reel has this name, so its marks are not used"
    for section, own in known.items():
        if own.falling and own.start_mm < lengths[section]:
            yield (
                f"section {section}",
                f"its marks fall from {own.start_mm / 1000:g} m, but it is "
                f"{lengths[section] / 1000:g} m long",
            )
