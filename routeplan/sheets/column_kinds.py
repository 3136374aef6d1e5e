"""Columns of the kinds the catalogue has many of, one short call each."""

from __future__ import annotations

from routeplan.sheets.columns import Column

__all__ = [
    "choice_column",
    "count_column",
    "decibels_column",
    "metres_column",
    "money_column",
    "number_column",
    "numbers_column",
    "power_column",
    "rows_column",
    "text_column",
]


def text_column(key: str, text: str, **more: object) -> Column:
    """Return a column of text."""
    return Column(key=key, kind="text", text=text, **more)  # type: ignore[arg-type]


def choice_column(key: str, text: str, *choices: str) -> Column:
    """Return a column of text that holds one of a few words."""
    listed = f"{', '.join(choices[:-1])} or {choices[-1]}"
    return Column(key=key, kind="text", text=f"{text}: {listed}.", choices=choices)


def number_column(key: str, text: str, unit: str, digits: int, **more: object) -> Column:
    """Return a column of numbers."""
    return Column(key=key, kind="number", text=text, unit=unit, digits=digits, **more)  # type: ignore[arg-type]


def metres_column(key: str, text: str, **more: object) -> Column:
    """Return a column of lengths. [m]"""
    return number_column(key, text, "m", 3, **more)


def decibels_column(key: str, text: str, **more: object) -> Column:
    """Return a column of decibels. [dB]"""
    return number_column(key, text, "dB", 3, **more)


def count_column(key: str, text: str, **more: object) -> Column:
    """Return a column of whole numbers."""
    return Column(key=key, kind="integer", text=text, **more)  # type: ignore[arg-type]


def rows_column(key: str, of: str, text: str) -> Column:
    """Return a column of rows of another table."""
    return Column(key=key, kind="rows", of=of, text=text)


def numbers_column(key: str, text: str, unit: str) -> Column:
    """Return a column of lists of numbers, for programs only."""
    return Column(key=key, kind="numbers", text=text, unit=unit, is_listed=False)


def power_column(key: str, text: str) -> Column:
    """Return a column of powers, null where not known. [dBm]"""
    return number_column(key, text, "dBm", 3, may_be_null=True)


def money_column(key: str, text: str, **more: object) -> Column:
    """Return a column of money."""
    return number_column(key, text, "currency", 2, **more)
