"""The pieces a report is built of: tables, sections, figures and colour swatches."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from routeplan.sheets.lookup import Row, text_at, value_at
from routeplan.sheets.text import UNKNOWN, number_text, safe
from routeplan.units import ft_from_m

__all__ = [
    "Column",
    "amount",
    "db",
    "length",
    "number",
    "section",
    "swatch",
    "swatch_fills",
    "table",
    "table_row",
    "verdict_mark",
    "words",
]

# What the colour words of fibres and tubes look like on paper; the word always stands beside it.
_SWATCHES = {
    "blue": "#1c63b7", "orange": "#ee7d1a", "green": "#2a9147", "brown": "#7d4b26",
    "slate": "#8a949b", "grey": "#8a949b", "gray": "#8a949b", "white": "#ffffff",
    "red": "#cf2a27", "black": "#16191b", "yellow": "#f5d22c", "violet": "#7b3f9e",
    "purple": "#7b3f9e", "rose": "#f2a0b5", "pink": "#f2a0b5", "aqua": "#5cc9d6",
    "turquoise": "#31b3b0", "natural": "#f1ead6", "lime": "#b3d334", "olive": "#7d7f30",
    "magenta": "#c83a8b", "tan": "#cfae80", "ivory": "#f3ecd2",
}  # fmt: skip


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A column of a report table: its head and how a row's cell is written, as safe HTML."""

    head: str
    cell: Callable[[Row], str]
    is_number: bool = False
    is_long: bool = False


def words(head: str, key: str, *, is_long: bool = True) -> Column:
    """Return a column of text; a long one breaks inside words if it has to."""
    return Column(head=head, cell=lambda row: safe(text_at(row, key)) or UNKNOWN, is_long=is_long)


def number(head: str, key: str, *, digits: int = 0) -> Column:
    """Return a column of numbers."""
    return Column(
        head=head,
        cell=lambda row: safe(number_text(value_at(row, key), digits=digits)),
        is_number=True,
    )


def db(head: str, key: str) -> Column:
    """Return a column of decibels, to a thousandth."""
    return number(head, key, digits=3)


def amount(head: str, key: str) -> Column:
    """Return a column of money, to the cent."""
    return number(head, key, digits=2)


def length(head: str, key: str, *, units: str, digits: int = 3) -> Column:
    """Return a column of lengths in metres, for US units with feet behind them."""

    def cell(row: Row) -> str:
        length_m = value_at(row, key)
        text = safe(number_text(length_m, digits=digits))
        if length_m is None or units != "us":
            return text
        return f"{text} <i>({safe(number_text(ft_from_m(length_m), digits=1))})</i>"

    return Column(head=f"{head}, m{' (ft)' if units == 'us' else ''}", cell=cell, is_number=True)


def table(columns: Sequence[Column], rows: Iterable[Row], *, name: str = "", foot: str = "") -> str:
    """Return a table; `foot` is its last row as HTML."""
    heads = "".join(
        f'<th scope="col"{_class(column)}>{safe(column.head)}</th>' for column in columns
    )
    body = "\n".join(table_row(columns, row) for row in rows)
    kind = f' class="{safe(name)}"' if name else ""
    tail = f"<tfoot>{foot}</tfoot>" if foot else ""
    return f"<table{kind}><thead><tr>{heads}</tr></thead>\n<tbody>{body}</tbody>{tail}</table>\n"


def table_row(columns: Sequence[Column], row: Row) -> str:
    """Return one row of a table."""
    cells = "".join(f"<td{_class(column)}>{column.cell(row)}</td>" for column in columns)
    return f"<tr>{cells}</tr>"


def section(name: str, heading: str, body: str) -> str:
    """Return a section under a heading, with a name to link to; nothing if it has no body."""
    if not body:
        return ""
    return f'<section id="{safe(name)}"><h2>{safe(heading)}</h2>\n{body}</section>\n'


def verdict_mark(verdict: str) -> str:
    """Return a verdict as a mark that colour and shape tell apart."""
    sign = {"fits": "\N{CHECK MARK}", "fails": "\N{MULTIPLICATION SIGN}"}.get(verdict, "?")
    return f'<span class="verdict {safe(verdict)}"><b>{sign}</b> {safe(verdict)}</span>'


def swatch(colour: str) -> str:
    """
    Return a patch of a fibre or tube colour, with the stripe of a marked one, and its word.

    A colour nobody has defined here gets an empty patch: the word is what counts.
    """
    known = swatch_fills(colour)
    fill = known[0] if known else "transparent"
    if len(known) > 1:
        fill = f"linear-gradient({fill} 34%,{known[1]} 34% 66%,{fill} 66%)"
    return f'<span class="swatch" style="background:{fill}"></span>{safe(colour)}'


def swatch_fills(colour: str) -> list[str]:
    """Return what the words of a colour look like, the mark after the ground; nothing unknown."""
    return [_SWATCHES[word] for word in colour.lower().split() if word in _SWATCHES]


def _class(column: Column) -> str:
    return ' class="n"' if column.is_number else ' class="w"' if column.is_long else ""
