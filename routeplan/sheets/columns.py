"""What a column and a table of the catalogue are."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

__all__ = ["Column", "Json", "Kind", "Row", "Table"]

Json: TypeAlias = bool | int | float | str | list["Json"] | dict[str, "Json"] | None
Row: TypeAlias = dict[str, Json]
Kind = Literal[
    "text",
    "number",
    "integer",
    "flag",
    "value",  # a number or text
    "texts",
    "numbers",
    "points",  # of longitude, latitude and height or null
    "rings",  # each a list of points of longitude and latitude
    "rows",
    "row",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """
    One column: its key, kind, unit, printed digits and meaning.

    `of` names the table that rows nested in it belong to; `choices` are the only words it may
    hold; `may_be_null` says that what cannot be known is null; `is_listed` is false for what only
    programs read.
    """

    key: str
    kind: Kind
    text: str
    unit: str = ""
    digits: int | None = None
    of: str = ""
    choices: tuple[str, ...] = ()
    may_be_null: bool = False
    is_listed: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """
    One table of a plan.

    `path` says where its rows are in `plan.json`, outer lists first; a CSV also shows the columns
    `carried` from the rows around them. Where `is_single` there is one row and no list.
    """

    name: str
    title: str
    path: tuple[str, ...]
    columns: tuple[Column, ...]
    csv: str = ""
    carried: tuple[tuple[str, str], ...] = ()
    is_single: bool = False
