"""Collecting everything that is wrong with an input, so that one attempt shows it all."""

from __future__ import annotations

import difflib
import json
import os
import unicodedata
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field
from pathlib import Path

from routeplan.errors import InputError, Problem

__all__ = [
    "Trouble",
    "cleaned_text",
    "is_plain_text",
    "listed",
    "looked_in",
    "nearest_hint",
    "number_hint",
    "one_of",
    "shown",
]

_SHOWN_OF_A_KIND = 20
_SHOWN_CHARACTERS = 80
_LIKENESS_MIN_RATIO = 0.6


@dataclass(slots=True)
class Trouble:
    """
    The problems and warnings of one reading; past twenty of a kind they are only counted.

    Two problems are of one kind if they say the same of the same file: `what` names the kind, so
    values belong in `value`.
    """

    problems: list[Problem] = field(default_factory=list)
    warnings: list[tuple[str, str]] = field(default_factory=list)
    _types: set[type[InputError]] = field(default_factory=set)
    _counts: Counter[tuple[str, str, str]] = field(default_factory=Counter)

    def add(self, error: type[InputError], problem: Problem, *, file: str = "") -> None:
        """Note a problem of the kind of error it would be alone."""
        self._types.add(error)
        if self._is_shown("problem", file, problem.what):
            self.problems.append(problem)

    def warn(self, where: str, message: str, *, file: str = "", kind: str = "") -> None:
        """Note something worth knowing that does not stop the reading."""
        if self._is_shown("warning", file, kind or message):
            self.warnings.append((where, message))

    def closed_warnings(self) -> tuple[tuple[str, str], ...]:
        """Return the warnings, those left out counted at the end."""
        return (*self.warnings, *((where, text) for where, text in self._left_out("warning")))

    def raise_if_any(self) -> None:
        """Raise all problems together, as their own kind of error if they are of one kind."""
        if not self.problems:
            return
        error = self._types.pop() if len(self._types) == 1 else InputError
        rest = (Problem(where=where, what=text) for where, text in self._left_out("problem"))
        raise error([*self.problems, *rest])

    def _is_shown(self, sort: str, file: str, kind: str) -> bool:
        self._counts[sort, file, kind] += 1
        return self._counts[sort, file, kind] <= _SHOWN_OF_A_KIND

    def _left_out(self, sort: str) -> Iterable[tuple[str, str]]:
        for (counted, file, kind), count in self._counts.items():
            if counted == sort and count > _SHOWN_OF_A_KIND:
                yield file, f"and {count - _SHOWN_OF_A_KIND} more of the same kind: {kind}"


def shown(value: object) -> str:
    """
    Return a value as a message shows it: text in quotes, on one line, never long.

    Examples
    --------
    >>> shown("duct"), shown(True), shown([1, 2]), shown(10**400)
    ('"duct"', 'true', '[1, 2]', 'a whole number of 1329 bits')
    """
    if isinstance(value, int) and value.bit_length() > 256:
        return f"a whole number of {value.bit_length()} bits"
    if isinstance(value, dict) and len(value) > 5:
        return f"a table of {len(value)} keys"
    if isinstance(value, list | tuple) and len(value) > 10:
        return f"a list of {len(value)} values"
    try:
        text = json.dumps(value, ensure_ascii=False, default=str)
    except (ValueError, RecursionError):
        return f"a nested {type(value).__name__}"
    text = cleaned_text(text)
    return text if len(text) <= _SHOWN_CHARACTERS else text[: _SHOWN_CHARACTERS - 3] + "..."


def listed(values: Iterable[object]) -> str:
    """Return the values of a choice as a message lists them."""
    return ", ".join(str(value) for value in values)


def looked_in(path: Path) -> str:
    """Return where a file that is not there was looked for, as the remedy of a problem."""
    folder = Path(os.path.abspath(path)).parent  # noqa: PTH100  # `..` is resolved, links are not
    if folder.is_dir():
        return f"It is looked for in {folder}."
    return f"It is looked for in {folder}, and there is no such folder."


def one_of(values: Iterable[object]) -> str:
    """
    Return the values of a choice as the limit of a problem; nothing if there are none.

    Examples
    --------
    >>> one_of(["yes", "avoid", "no"]), one_of(["Main"]), one_of([])
    ('one of yes, avoid, no', 'only Main', '')
    """
    known = list(values)
    return f"{'one of' if len(known) > 1 else 'only'} {listed(known)}" if known else ""


def nearest_hint(
    value: object,
    known: Iterable[str],
    *,
    template: str = 'Did you mean "{}"?',
    likeness_min_ratio: float = _LIKENESS_MIN_RATIO,
) -> str:
    """
    Return a hint at the known name nearest to `value`, or nothing if none is near.

    Examples
    --------
    >>> nearest_hint("aeriel", ["aerial", "duct"])
    'Did you mean "aerial"?'
    """
    if not isinstance(value, str):
        return ""
    by_folded = {name.casefold(): name for name in known}
    near = difflib.get_close_matches(
        value[:100].casefold(), by_folded, n=1, cutoff=likeness_min_ratio
    )
    return template.format(by_folded[near[0]]) if near else ""


def number_hint(value: object) -> str:
    """
    Return how to write what should be a number and is text; nothing for anything else.

    Examples
    --------
    >>> number_hint("20"), number_hint("20 m"), number_hint(True)
    ('Write the number without quotes.', 'Write the number alone, without unit or quotes.', '')
    """
    if not isinstance(value, str):
        return ""
    try:
        float(value)
    except ValueError:
        return "Write the number alone, without unit or quotes."
    return "Write the number without quotes."


def is_plain_text(text: str) -> bool:
    """Tell whether text can be written to any sheet: no control characters, no half characters."""
    return text.isprintable() or not any(_is_unprintable(mark) for mark in text)


def cleaned_text(text: str) -> str:
    """Return text with what no sheet can hold replaced."""
    if text.isprintable():
        return text
    return "".join("\ufffd" if _is_unprintable(mark) else mark for mark in text)


def _is_unprintable(mark: str) -> bool:
    code = ord(mark)
    if mark in "\t\n\r":
        return False
    return unicodedata.category(mark) in ("Cc", "Cs") or code in (0xFFFE, 0xFFFF)
