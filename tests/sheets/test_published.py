"""The published numbers are shown whole, with their sources."""

from __future__ import annotations

import json
import re
import tomllib
from importlib.resources import files

import pytest

from routeplan.errors import InputError
from routeplan.sheets.published import published_json, published_text
from routeplan.tables import raw_rows, table_names


def test_the_list_names_every_table_with_its_title() -> None:
    """Without a name every table of the package is listed with its title."""
    text = published_text(None)
    names = {entry.name for entry in files("routeplan.tables").iterdir()}
    expected = {name.removesuffix(".toml") for name in names if name.endswith(".toml")}
    assert expected == set(table_names())
    shown = {line.split("  ")[0]: line for line in text.splitlines()}
    for name in expected:
        title = tomllib.loads((files("routeplan.tables") / f"{name}.toml").read_text("utf-8"))
        assert shown[name.strip()].endswith(title["meta"]["title"])


def numbers_in(value: object) -> list[float]:
    """Return all numbers of a nested value."""
    if isinstance(value, bool | str):
        return []
    if isinstance(value, int | float):
        return [value]
    parts = value.values() if isinstance(value, dict) else value
    return [number for part in parts for number in numbers_in(part)]  # type: ignore[union-attr]


@pytest.mark.parametrize("name", table_names())
def test_every_number_is_shown_in_full(name: str) -> None:
    """Every number of a table stands in its text with all its digits, and so does its source."""
    text = published_text(name)
    shown = re.split(r"[\s,;:]+", text)
    found = set()
    for word in shown:
        try:
            found.add(float(word))
        except ValueError:
            continue
    for row in raw_rows(name):
        missing = [number for number in numbers_in(row) if number not in found]
        assert not missing
    assert "Source: " in text
    assert text.endswith("\n")
    assert not text.endswith("\n\n")


@pytest.mark.parametrize("name", table_names())
def test_every_word_of_a_row_is_shown(name: str) -> None:
    """Sources, notes and names stand in the text, however they are wrapped."""
    text = " ".join(published_text(name).split())
    for row in raw_rows(name):
        for value in row.values():
            if isinstance(value, str):
                assert " ".join(value.split()) in text


@pytest.mark.parametrize("name", table_names())
def test_lines_fit_a_page(name: str) -> None:
    """No line is much wider than a page."""
    assert max(map(len, published_text(name).splitlines())) <= 140


@pytest.mark.parametrize("name", [None, *table_names()])
def test_json_is_the_whole_table(name: str | None) -> None:
    """As JSON a table is its meta data and its rows as they stand in the file."""
    found = json.loads(json.dumps(published_json(name), allow_nan=False))
    if name is None:
        assert set(found["tables"]) == set(table_names())
        return
    raw = tomllib.loads((files("routeplan.tables") / f"{name}.toml").read_text("utf-8"))
    assert found["name"] == name
    assert found["rows"] == raw["row"]
    assert raw["meta"].items() <= found["meta"].items()


@pytest.mark.parametrize("show", [published_text, published_json])
@pytest.mark.parametrize("name", ["fibers", "", "../practice", "x" * 100_000])
def test_an_unknown_table_is_named(show: object, name: str) -> None:
    """A name that is no table is an error that names the nearest and all there are."""
    with pytest.raises(InputError, match="no table of that name") as caught:
        show(name)  # type: ignore[operator]
    assert "attenuation" in str(caught.value)
    assert len(str(caught.value)) < 2000
    if name == "fibers":
        assert "Did you mean fibres?" in str(caught.value)
