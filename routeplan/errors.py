"""
The errors the package raises on purpose; nothing else is.

    RouteplanError
      InputError (also a ValueError)     the user's input is wrong
        RunFileError                     a key or value of the run file
        GeometryError                    a line, point or area of a vector file
        CrsError                         a coordinate reference system
        RangeError                       a number outside what a formula holds for
      TableError                         a published table of the package is broken
      InfeasibleError                    no layout keeps every limit

Every message says where, what, the value, the limit and the remedy; an error carries all the
problems of an input, so that one attempt shows them all.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import asdict, dataclass

__all__ = [
    "CrsError",
    "GeometryError",
    "InfeasibleError",
    "InputError",
    "Problem",
    "RangeError",
    "RouteplanError",
    "RunFileError",
    "TableError",
]

_CHOICES = ("one of ", "only ")  # a limit that is a list of words says so itself


@dataclass(frozen=True, slots=True, kw_only=True)
class Problem:
    """One thing that is wrong: where, what, the value, the limit, the remedy."""

    where: str
    what: str
    value: str = ""
    limit: str = ""
    remedy: str = ""

    def __str__(self) -> str:
        """Return the problem as one or two sentences."""
        text = f"{self.where}: {self.what}" if self.where else self.what
        is_choice = self.limit.startswith(_CHOICES)
        facts = [self.value, f"limit {self.limit}" if self.limit and not is_choice else self.limit]
        shown = ", ".join(fact for fact in facts if fact)
        if shown:
            text += f" ({shown})"
        return f"{text}. {self.remedy}".strip() if self.remedy else f"{text}."

    def as_dict(self) -> dict[str, str]:
        """Return the problem as the mapping that `--json` prints."""
        return asdict(self)


class RouteplanError(Exception):
    """Base of every error raised on purpose."""

    def __init__(self, problems: Problem | Iterable[Problem]) -> None:
        """Keep the problems; the message is all of them, one a line."""
        self.problems: tuple[Problem, ...] = (
            (problems,) if isinstance(problems, Problem) else tuple(problems)
        )
        super().__init__("\n".join(str(problem) for problem in self.problems))


class InputError(RouteplanError, ValueError):
    """The user's input is wrong."""


class RunFileError(InputError):
    """A key or value of the run file is wrong."""


class GeometryError(InputError):
    """A line, point or area of a vector file is wrong."""


class CrsError(InputError):
    """A coordinate reference system is unknown or contradicts the coordinates."""


class RangeError(InputError):
    """A number lies outside the range a formula or table holds for."""


class TableError(RouteplanError):
    """A published table of the package is broken."""


class InfeasibleError(RouteplanError):
    """No layout keeps every limit; the problem names the stretch and the smallest relaxation."""
