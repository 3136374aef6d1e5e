"""The known name nearest to one that is not known."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches

__all__ = ["nearest_name"]


def nearest_name(name: str, known: Iterable[str]) -> str | None:
    """
    Return the known name that looks most like `name`, whatever its case; None if none does.

    Examples
    --------
    >>> nearest_name("10gbase-er", ["10GBASE-LR", "10GBASE-ER"])
    '10GBASE-ER'
    """
    by_folded = {entry.casefold(): entry for entry in known}
    found = get_close_matches(name.casefold(), by_folded, n=1, cutoff=0.6)
    return by_folded[found[0]] if found else None
