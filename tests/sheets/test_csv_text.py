"""CSV tables read back equal to plan.json, with units in their heads and nothing a formula."""

from __future__ import annotations

import csv
import io
from typing import Any

import pytest

from routeplan.planning import Plan
from routeplan.sheets.csv_text import csv_heads, csv_text, neutral
from routeplan.sheets.document import plan_document
from routeplan.sheets.rows import flat_rows
from routeplan.sheets.tables import TABLES, csv_tables, table
from tests.sheets.plans import HOSTILE_NAMES

Row = dict[str, Any]

NAMES = [entry.name for entry in csv_tables()]


def read_back(text: str) -> list[list[str]]:
    """Return the cells of a CSV."""
    return list(csv.reader(io.StringIO(text, newline=""), strict=True))


def value_of(cell: str, expected: object) -> object:
    """Return a cell as what it stands for, given what kind of value it should be."""
    if expected is None:
        return None if cell == "" else cell
    if isinstance(expected, bool):
        return {"yes": True, "no": False}.get(cell, cell)
    if isinstance(expected, int | float):
        return type(expected)(float(cell))
    return cell.removeprefix("'") if cell[1:2] in ("=", "+", "-", "@", "\t", "\r") else cell


@pytest.mark.parametrize("name", NAMES)
def test_cells_read_back_equal(name: str, many_documents: list[Row]) -> None:
    """Every cell of every CSV reads back as the value in plan.json."""
    count = 0
    for document in many_documents:
        heads, *lines = read_back(csv_text(document, table(name)))
        rows = list(flat_rows(document, name))
        assert len(lines) == len(rows)
        for cells, row in zip(lines, rows, strict=True):
            assert len(cells) == len(heads) == len(row)
            for cell, expected in zip(cells, row.values(), strict=True):
                if isinstance(expected, list):
                    assert cell.split(", ") == expected
                else:
                    assert value_of(cell, expected) == expected
                count += 1
    assert count


@pytest.mark.parametrize("name", NAMES)
def test_nothing_starts_like_a_formula(name: str, many_documents: list[Row]) -> None:
    """No cell starts with = + - @ tab or return, but for negative numbers and a lone dash."""
    for document in many_documents:
        for cells in read_back(csv_text(document, table(name))):
            for cell in cells:
                if cell.startswith(("=", "+", "-", "@", "\t", "\r")) and cell != "-":
                    assert cell.startswith("-")
                    assert float(cell) < 0


def test_hostile_names_are_all_neutralised(hostile_plan: Plan) -> None:
    """Every hostile name is in the stations as text, with an apostrophe where it needs one."""
    document = plan_document(hostile_plan)
    heads, *lines = read_back(csv_text(document, table("stations")))
    shown = {line[heads.index("name")] for line in lines}
    shown |= {line[heads.index("leg")] for line in lines}
    for row in document["stations"]:
        if row["name"]:
            assert neutral(row["name"]) in shown
    risky = [name for name in HOSTILE_NAMES if name[0] in "=+-@"]
    assert {f"'{name}" for name in risky} <= shown


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_each_start_is_neutralised(start: str) -> None:
    """Text with each of the six starts gets one apostrophe, text with them later none."""
    assert neutral(f"{start}1") == f"'{start}1"
    assert neutral(f"a{start}1") == f"a{start}1"
    assert neutral("") == ""


def test_the_unit_of_a_ratio_stays_a_dash() -> None:
    """A lone dash is no formula and gets no apostrophe; a dash before anything does."""
    assert neutral("-") == "-"
    assert neutral("- ") == "'- "


def test_numbers_are_never_neutralised() -> None:
    """A negative number stays a number, whatever column it is in; text that looks like one not."""
    document: Row = {
        "currency": "EUR",
        "checks": [
            {
                "kind": "-1",
                "where": "",
                "value": -1.5,
                "limit": -2,
                "unit": "dB",
                "verdict": "fits",
                "source": "+",
            }
        ],
        "assumptions": [
            {"name": "n", "value": -0.25, "unit": "", "source": "", "reason": ""},
            {"name": "n", "value": "-0.25", "unit": "", "source": "", "reason": ""},
        ],
    }
    _, cells = read_back(csv_text(document, table("checks")))
    assert cells == ["'-1", "", "-1.500", "-2", "dB", "fits", "'+"]
    _, first, second = read_back(csv_text(document, table("assumptions")))
    assert (first[1], second[1]) == ("-0.25", "'-0.25")


def test_heads_have_units_once() -> None:
    """Units stand in the heads, once: in the key where it ends in them, else behind it."""
    assert csv_heads(table("stations"), currency="EUR") == [
        *("leg", "cable", "kind", "name", "reach_kind", "placement"),
        *("ground_m", "sheath_from_m", "sheath_to_m", "glass_from_m", "glass_to_m"),
        *("section", "section_m", "lon_deg", "lat_deg", "height_m", "jacket_mark_m"),
    ]
    assert csv_heads(table("reels"), currency="EUR")[-2:] == ["cost_EUR", "sections"]
    assert csv_heads(table("budget_lines"), currency="EUR") == [
        *("circuit", "wavelength_nm", "direction", "item", "count"),
        *("each_db", "sigma_db", "limit_db", "source"),
    ]
    splices = csv_heads(table("splices"), currency="EUR")
    assert splices[:5] == ["joint", "tray", "position", "in_cable", "in_section"]
    assert splices[-4:] == ["out_fibre_colour", "kind", "circuit", "limit_db"]


def test_heads_are_unique_and_neutral() -> None:
    """No head stands twice, and a currency does not make one a formula."""
    for entry in TABLES.values():
        heads = csv_heads(entry, currency="=1+1")
        assert len(heads) == len(set(heads))
        assert all(neutral(head) == head for head in heads)


def test_lines_end_alike_on_every_system(hostile_plan: Plan) -> None:
    """Lines end in one newline; returns stand only inside quoted text."""
    text = csv_text(plan_document(hostile_plan), table("reels"))
    assert text.endswith("\n")
    assert "\r" not in text
