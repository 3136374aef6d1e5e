"""Text for people on our pages: harmless whatever a file says, and numbers as they are read."""

from __future__ import annotations

import json
import re
from html import escape

from routeplan.units import ft_from_m

__all__ = ["count_text", "data_block", "length_text", "number_text", "plain", "safe"]

NARROW_SPACE = "\N{NARROW NO-BREAK SPACE}"
NO_BREAK_SPACE = "\N{NO-BREAK SPACE}"
MINUS = "\N{MINUS SIGN}"
UNKNOWN = "\N{EN DASH}"

# Characters nobody sees but that reorder or break a line: C0 and C1 controls, bidi marks and
# overrides, line and paragraph separators, byte-order marks, lone surrogates.
_UNSEEN = re.compile(
    "[\x00-\x08\x0b-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff\ufffe\uffff"
    "\ud800-\udfff]"
)
_ENTITIES = {ord(mark): f"&#{ord(mark)};" for mark in "`$\\{}"}
_IN_SCRIPT = {ord(mark): f"\\u{ord(mark):04x}" for mark in "<>&\u2028\u2029"}


def plain(text: object) -> str:
    r"""
    Return text on one line, what cannot be seen made visible as a replacement character.

    Examples
    --------
    >>> plain("Hill\n top")
    'Hill top'
    """
    return " ".join(_UNSEEN.sub("\N{REPLACEMENT CHARACTER}", str(text)).split())


def safe(text: object) -> str:
    """
    Return text from a file as it may stand anywhere in one of our pages.

    Beyond what HTML needs, the marks that JavaScript and page templates give a meaning to become
    entities: the text stays text in an element, in an attribute, and where a template copies it.

    Examples
    --------
    >>> safe('<b title="`${1}`">')
    '&lt;b title=&quot;&#96;&#36;&#123;1&#125;&#96;&quot;&gt;'
    """
    return escape(plain(text), quote=True).translate(_ENTITIES)


def data_block(name: str, data: object) -> str:
    """Return data as a script element that no browser runs; `name` is its id."""
    text = json.dumps(data, separators=(",", ":"), allow_nan=False, ensure_ascii=False)
    text = _UNSEEN.sub("\N{REPLACEMENT CHARACTER}", text).translate(_IN_SCRIPT)
    return f'<script type="application/json" id="{safe(name)}">{text}</script>'


def number_text(value: float | None, *, digits: int = 0) -> str:
    """
    Return a number in groups of three, with a true minus sign; a dash for what is not known.

    Examples
    --------
    >>> number_text(-20541.25, digits=1).replace(NARROW_SPACE, "_")
    '\N{MINUS SIGN}20_541.2'
    """
    if value is None:
        return UNKNOWN
    text = f"{abs(value):,.{digits}f}".replace(",", NARROW_SPACE)
    return MINUS + text if value < 0 and text.strip(f"0.{NARROW_SPACE}") else text


def length_text(length_m: float | None, *, units: str = "metric", digits: int = 1) -> str:
    """
    Return a length in metres, for US units with whole feet behind it.

    Examples
    --------
    >>> length_text(100.0, units="us").replace(NO_BREAK_SPACE, " ")
    '100.0 m (328 ft)'
    """
    if length_m is None:
        return UNKNOWN
    text = f"{number_text(length_m, digits=digits)}{NO_BREAK_SPACE}m"
    if units != "us":
        return text
    return f"{text} ({number_text(ft_from_m(length_m))}{NO_BREAK_SPACE}ft)"


def count_text(count: float, noun: str, plural: str = "") -> str:
    """
    Return a count with its noun.

    Examples
    --------
    >>> count_text(3, "joint").split()
    ['3', 'joints']
    """
    word = noun if count == 1 else plural or f"{noun}s"
    return f"{number_text(count)}{NO_BREAK_SPACE}{word}"
