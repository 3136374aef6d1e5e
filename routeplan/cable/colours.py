"""Colours of fibres and tubes by published colour code, and their marks beyond the first twelve."""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache

from routeplan.errors import InputError, Problem, RangeError
from routeplan.tables import load_rows

__all__ = ["ColourCode", "cable_colours", "colour_code", "colour_codes", "fibre_colours"]


@dataclass(frozen=True, slots=True, kw_only=True)
class ColourCode:
    """
    One published order of fibre and tube colours.

    Where the order is over it starts again with marks, `marks_max_count` times at most; positions
    beyond have no published colour and are called by number.
    """

    name: str
    title: str
    fibre_order: tuple[str, ...]
    source: str
    confidence: str
    aliases: tuple[str, ...] = ()
    mark: str = ""
    mark_colour: str = ""
    mark_colour_on_black: str = ""
    black_when_marked: str = "black"
    marks_max_count: int = 0
    tube_order: tuple[str, ...] = ()
    tube_rest: str = ""
    tube_marks_max_count: int = 0
    note: str = ""


def colour_codes() -> tuple[ColourCode, ...]:
    """Return every colour code of the tables."""
    return load_rows("colours", ColourCode)


def colour_code(name: str) -> ColourCode:
    """
    Return the colour code called `name`, or one of its other names; case does not matter.

    Raises
    ------
    InputError
        If no code has this name; the nearest known one is suggested.

    Examples
    --------
    >>> colour_code("tia-598-d").name
    'TIA-598'
    """
    by_name = {
        known.casefold(): code for code in colour_codes() for known in (code.name, *code.aliases)
    }
    wanted = name.strip().casefold()
    if wanted in by_name:
        return by_name[wanted]
    near = get_close_matches(wanted, by_name, n=1, cutoff=0.5)
    known = ", ".join(f'"{code.name}"' for code in colour_codes())
    remedy = f'Did you mean "{by_name[near[0]].name}"? ' if near else ""
    raise InputError(
        Problem(
            where=f'colour code "{name}"',
            what="is not in the tables",
            remedy=f"{remedy}Known are {known}.",
        )
    )


def fibre_colours(
    fibre: int, *, code: str, fibres_per_tube: int, fibre_count: int | None = None
) -> tuple[str, str]:
    """
    Return the tube colour and the fibre colour of one fibre of a cable, in words.

    Fibre n lies in tube ceil(n / `fibres_per_tube`); both colours follow the code's order [1]_. A
    repeated colour is named with its mark ("blue with black tracer"), a tube that the code tells
    apart by counting with its number ("natural/white 3"), and a position no published rule
    covers is "numbered" with its number.

    Parameters
    ----------
    fibre
        Number of the fibre in its cable, from 1. [-]
    code
        Name of a colour code of the tables.
    fibres_per_tube
        Fibres in each tube. [-]
    fibre_count
        Fibres in the cable, where known: the highest number allowed. [-]

    Raises
    ------
    RangeError
        If there is no such fibre.
    InputError
        If there is no such code.

    References
    ----------
    .. [1] Table `colours`, with the source of each code.

    Examples
    --------
    >>> fibre_colours(37, code="TIA-598", fibres_per_tube=12)
    ('brown', 'blue')
    >>> fibre_colours(22, code="DIN VDE 0888", fibres_per_tube=24)
    ('red', 'transparent with black ring')
    """
    if fibre < 1 or (fibre_count is not None and fibre > fibre_count):
        raise RangeError(
            Problem(
                where=f"fibre {fibre}",
                what="is not a fibre of the cable",
                limit=f"1 to {fibre_count}" if fibre_count is not None else "1 or more",
            )
        )
    _check_count("fibres per tube", fibres_per_tube)
    tube, position = divmod(fibre - 1, fibres_per_tube)
    known = colour_code(code)
    return _tube_colour(tube + 1, known), _fibre_colour(position + 1, known)


@cache
def cable_colours(
    fibre_count: int, *, code: str, fibres_per_tube: int
) -> tuple[tuple[str, str], ...]:
    """
    Return tube and fibre colour of every fibre of a cable, fibre 1 first.

    Parameters
    ----------
    fibre_count, fibres_per_tube
        Fibres in the cable and in each tube. [-]
    code
        Name of a colour code of the tables.

    Raises
    ------
    RangeError
        If a count is under 1.
    InputError
        If there is no such code.

    Examples
    --------
    >>> cable_colours(4, code="DIN VDE 0888", fibres_per_tube=2)[3]
    ('green', 'green')
    """
    _check_count("fibre count", fibre_count)
    _check_count("fibres per tube", fibres_per_tube)
    known = colour_code(code)
    tube_count = -(-fibre_count // fibres_per_tube)
    tubes = [_tube_colour(number, known) for number in range(1, tube_count + 1)]
    fibres = [_fibre_colour(n, known) for n in range(1, min(fibre_count, fibres_per_tube) + 1)]
    pairs = [(tube, fibre) for tube in tubes for fibre in fibres]
    return tuple(pairs[:fibre_count])


def _fibre_colour(position: int, code: ColourCode) -> str:
    """Return the colour of the fibre at `position` in its tube."""
    again, index = divmod(position - 1, len(code.fibre_order))
    if again > code.marks_max_count:
        return _numbered(position)
    return _marked(code.fibre_order[index], again, code)


def _tube_colour(number: int, code: ColourCode) -> str:
    """Return the colour of tube `number`."""
    if code.tube_rest and number > len(code.tube_order):
        return f"{code.tube_rest} {number}"
    if not code.tube_order:
        return _numbered(number)
    again, index = divmod(number - 1, len(code.tube_order))
    if again > code.tube_marks_max_count:
        return _numbered(number)
    return _marked(code.tube_order[index], again, code)


def _marked(colour: str, mark_count: int, code: ColourCode) -> str:
    """Return `colour` with its marks in words."""
    if mark_count == 0:
        return colour
    mark_colour = code.mark_colour
    if colour == "black":
        colour = code.black_when_marked
        if colour == "black":
            mark_colour = code.mark_colour_on_black
    mark = f"{mark_colour} {code.mark}".strip()
    return f"{colour} with {mark}" if mark_count == 1 else f"{colour} with {mark_count} {mark}s"


def _numbered(position: int) -> str:
    return f"numbered {position}"


def _check_count(what: str, count: int) -> None:
    if count < 1:
        raise RangeError(Problem(where=what, what="is too small", value=str(count), limit="1"))
