"""The published numbers are shown whole, with their sources."""

from __future__ import annotations

import json
import re
import tomllib
from collections.abc import Iterable
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
    assert isinstance(parts, Iterable)
    return [number for part in parts for number in numbers_in(part)]


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
        for key, value in row.items():
            if isinstance(value, str) and key != "quantity":
                assert all(" ".join(part.split()) in text for part in spoken(name, key, value))


def spoken(name: str, key: str, value: str) -> list[str]:
    """Return how a text is said: dotted keys of practice as their heading and what is below it."""
    if (name, key) != ("practice", "name") or "." not in value:
        return [value]
    section, _, own = value.rpartition(".")
    return [f"[{section}]", own]


@pytest.mark.parametrize("name", table_names())
def test_lines_fit_a_page(name: str) -> None:
    """No line is wider than a terminal of 100 columns, and none ends in blanks."""
    lines = published_text(name).splitlines()
    assert max(map(len, lines)) <= 100
    assert all(line == line.rstrip() for line in lines)


def test_a_quantity_has_the_value_of_its_type() -> None:
    """In the matrix of fibre types each value stands in the row and the column it belongs to."""
    lines = published_text("fibres").splitlines()
    head = next(line for line in lines if "G.652.D" in line)
    row = next(line for line in lines if line.startswith("zero dispersion max, nm"))
    assert row[head.index("G.652.D") :].split()[0] == "1324"
    assert row[head.index("G.654.E") :].strip() == ""


def test_types_of_one_column_are_alike() -> None:
    """Types that share a column of the matrix share every value and source."""
    values: dict[str, list[object]] = {}
    for row in raw_rows("fibres"):
        types = row["fibre_types"]
        assert isinstance(types, list)
        for fibre_type in types:
            rest = (row["quantity"], row["value"], row["source"])
            values.setdefault(fibre_type, []).append(rest)
    for line in published_text("fibres").splitlines():
        assert "G.655.C" not in line or line.split() == ["G.655.C"]
    assert set(values["G.655.C"]) == set(values["G.655.E"]) == set(values["G.655"])


def test_lanes_run_down_beside_their_interface() -> None:
    """The wavelengths of four lanes stand one below the other in one column."""
    lines = published_text("interfaces").splitlines()
    start = next(n for n, line in enumerate(lines) if line.startswith("40GBASE-LR4 "))
    assert lines[start].split()[:3] == ["40GBASE-LR4", "40", "1271"]
    at = lines[start].index("1271")
    assert [line[at:].strip() for line in lines[start + 1 : start + 4]] == ["1291", "1311", "1331"]


def test_colours_are_numbered_lists() -> None:
    """Each code lists its colours from 1 to 12, and says how fibres beyond are marked."""
    text = published_text("colours")
    block = text.partition("DIN VDE 0888  [")[2].partition("\n\n")[0]
    words = " ".join(block.split())
    assert "fibres 1 red 2 green 3 blue" in words
    assert "12 pink" in words
    assert "mark beyond the order: ring" in words


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
