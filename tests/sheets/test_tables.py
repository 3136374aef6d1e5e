"""The catalogue of tables is consistent in itself."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import chain

import pytest

from routeplan.sheets.rows import flat_rows, row_of, shaped
from routeplan.sheets.tables import HEAD, TABLES, csv_tables, table

NUMERIC = ("number", "integer")
DIGITS = {"m": 3, "dB": 3, "currency": 2, "deg": 9, "us": 3, "ps/nm": 3, "ps": 3, "nm": 3}
"""Lengths are whole millimetres, money cents, dB 0.001, delay 1 ns, degrees nine decimals."""


def test_keys_are_unique_in_each_table() -> None:
    """No table has a key twice, and a CSV's carried columns clash with none of its own."""
    for entry in TABLES.values():
        keys = [*(key for key, _ in entry.carried), *(column.key for column in entry.columns)]
        assert len(keys) == len(set(keys)), entry.name


def test_csv_names_and_tops_are_unique() -> None:
    """Each CSV and each key of plan.json belongs to one table."""
    names = [entry.csv for entry in csv_tables()]
    tops = [entry.path[0] for entry in TABLES.values() if len(entry.path) == 1]
    assert len(names) == len(set(names)) >= 7
    assert len(tops) == len(set(tops))
    assert not set(tops) & {column.key for column in HEAD}


def test_nested_columns_name_a_table() -> None:
    """A column that holds rows names the table they belong to, and no other column names one."""
    for column in chain.from_iterable(entry.columns for entry in TABLES.values()):
        assert (column.of in TABLES) == (column.kind in ("row", "rows")), column.key


def test_a_nested_table_lies_where_its_column_says() -> None:
    """The path of a nested table leads through columns that name the next table."""
    for entry in TABLES.values():
        if len(entry.path) < 2:
            continue
        outer = next(t for t in TABLES.values() if t.path == entry.path[:-1])
        column = next(c for c in outer.columns if c.key == entry.path[-1])
        assert column.of == entry.name


def test_only_numbers_have_units_and_digits() -> None:
    """A unit stands with numbers only, and every quantity is rounded as its unit asks."""
    for column in chain.from_iterable(entry.columns for entry in TABLES.values()):
        if column.unit:
            assert column.kind in (*NUMERIC, "numbers"), column.key
        if column.kind == "number":
            if column.key != "angle_deg":  # degrees of a place are finer than of an angle
                assert column.digits == DIGITS.get(column.unit, column.digits), column.key
            assert column.digits is not None, column.key


def test_keys_end_in_their_unit() -> None:
    """Every number with a unit has it in its key, but for degrees and money."""
    for column in chain.from_iterable(entry.columns for entry in TABLES.values()):
        if column.unit and column.unit not in ("deg", "currency"):
            suffix = column.unit.replace("/", "_per_").lower()
            assert column.key.endswith(f"_{suffix}"), column.key


def test_every_column_is_explained() -> None:
    """Every column says in a sentence what it holds."""
    for column in (*HEAD, *chain.from_iterable(entry.columns for entry in TABLES.values())):
        assert column.text.endswith(".")
        assert column.text[0].isupper()


def test_choices_are_words_of_text_columns() -> None:
    """Only text is limited to words, and the explanation names them all."""
    for column in chain.from_iterable(entry.columns for entry in TABLES.values()):
        if column.choices:
            assert column.kind == "text"
            assert all(word in column.text for word in column.choices)


def test_shaped_orders_and_rounds() -> None:
    """A row comes back in the catalogue's order, rounded, and without a negative zero."""
    row = shaped("stretches", {"to_ground_m": -0.0, "placement": "duct", "from_ground_m": 1.23456})
    assert list(row) == ["placement", "from_ground_m", "to_ground_m"]
    assert row["from_ground_m"] == 1.235
    assert str(row["to_ground_m"]) == "0.0"


@pytest.mark.parametrize(
    "row",
    [
        {"where": "x"},
        {"where": "x", "message": "y", "more": "z"},
        {"where": "x", "massage": "y"},
    ],
    ids=["missing", "extra", "misspelt"],
)
def test_shaped_refuses_other_keys(row: dict[str, str]) -> None:
    """A row with a key missing, one more, or a misspelt one is an error that names it."""
    with pytest.raises(KeyError, match="table warnings"):
        shaped("warnings", dict(row))


def test_row_of_takes_attributes_but_for_those_given() -> None:
    """Columns are attributes of the source, or what is given in their stead."""

    @dataclass
    class Found:
        where: str
        message: str

    assert row_of("warnings", Found("a", "b"), message="c") == {"where": "a", "message": "c"}
    with pytest.raises(AttributeError):
        row_of("nodes", Found("a", "b"))


def test_flat_rows_carry_what_is_around_them() -> None:
    """A line of a nested table begins with the columns it carries; nested rows are joined on."""
    end = {"cable": "C", "section": "S1", "side": "end", "fibre": 1}
    end |= {"tube_colour": "blue", "fibre_colour": "red"}
    splice = {
        "joint": "J1",
        "tray": 1,
        "position": 2,
        "in": end,
        "out": None,
        "kind": "stored",
        "circuit": "",
        "limit_db": 0.1,
    }
    (line,) = flat_rows({"splices": [splice]}, "splices")
    assert (line["in_fibre"], line["in_fibre_colour"], line["out_fibre"]) == (1, "red", None)
    stretch = {"placement": "duct", "from_ground_m": 0.0, "to_ground_m": 1.0}
    (line,) = flat_rows({"legs": [{"name": "Leg", "stretches": [stretch]}]}, "stretches")
    assert list(line) == ["leg", "placement", "from_ground_m", "to_ground_m"]
    assert line["leg"] == "Leg"


def test_rows_that_are_null_give_no_line() -> None:
    """Where the row around is null there is nothing to list."""
    assert list(flat_rows({"layout": {"one_fewer": None}}, "one_fewer")) == []


def test_table_finds_by_name() -> None:
    """A table is found by its name."""
    assert table("reels").csv == "reels.csv"
