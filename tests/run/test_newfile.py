"""New run files and the reference of keys: complete, and true to what is read."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from routeplan.errors import InputError
from routeplan.run import assumed_values, practice_rows, read_run
from routeplan.run.newfile import new_run_text
from routeplan.run.practice import RunFile
from routeplan.run.reference import key_rows, run_file_schema

Feature = Callable[..., dict[str, Any]]


def test_a_new_run_file_reads_back_as_the_same_run(
    collection: Callable[..., Path], road: object, write: Callable[..., Path]
) -> None:
    """With every key commented out, the run file changes nothing but that it names itself."""
    path = collection(road)
    run = read_run(write("run.toml", new_run_text(path)))
    bare = read_run(path)
    assert run.practice == bare.practice
    assert run.cable == bare.cable
    assert run.title == bare.title
    assert assumed_values(run) == assumed_values(bare)
    assert run.circuits == ()


def test_a_new_run_file_joins_the_sites_that_were_found(
    collection: Callable[..., Path],
    road: object,
    feature: Feature,
    write: Callable[..., Path],
) -> None:
    """Two declared sites get a circuit; names of other people's files stay text."""
    names = ['Stu"dio\\', "Mast\u2028[x]\n# y"]
    sites = [
        feature("Point", [10.0, 50.0 + at / 100], name=name, kind="site")
        for at, name in enumerate(names)
    ]
    run = read_run(write("run.toml", new_run_text(collection(road, *sites))))
    (circuit,) = run.circuits
    assert [circuit.from_, circuit.to] == [place.name for place in run.places]


def test_every_key_of_a_new_run_file_holds_when_its_comment_is_taken_away(
    collection: Callable[..., Path], road: object, write: Callable[..., Path]
) -> None:
    """What stands there as the default is the default, and is spelt as it is read."""
    text = new_run_text(collection(road))
    lines = [re.sub(r"^# ((\w+ = |\[interface|\[\[\w+).*)$", r"\1", x) for x in text.split("\n")]
    whole = "\n".join(lines).replace('interface = "10GBASE-LR"', 'interface = "own-link"')
    whole = whole.replace("wavelengths_nm = [1310, 1550]", "wavelengths_nm = [1310]")
    given = tomllib.loads(whole)
    run = read_run(write("run.toml", whole))
    assert assumed_values(run) == ()
    practice = {row.name: row.value for row in practice_rows()}
    for section, keys in given.items():
        for key, value in keys.items() if isinstance(keys, dict) else ():
            default = practice.get(f"{section}.{key}")
            if default is not None:
                assert value == (list(default) if isinstance(default, tuple) else default)


def test_a_geometry_that_cannot_be_planned_gives_no_run_file(write: Callable[..., Path]) -> None:
    """`new` says what is wrong with the geometry, as `check` does."""
    with pytest.raises(InputError):
        new_run_text(write("route.geojson", "{}"))
    with pytest.raises(InputError, match="no vector file a run file can name"):
        new_run_text(write("run.toml", ""))


def test_the_reference_has_every_key_with_its_meaning() -> None:
    """The page made of these rows is complete: each key has a meaning, numbers have a unit."""
    rows = key_rows()
    names = [row.name for row in rows]
    assert len(set(names)) == len(names)
    for row in rows:
        assert row.description, row.name
        if row.type.endswith("number") and not row.key.endswith(("_nm", "_db", "_dbm", "_m")):
            assert row.unit, row.name
    for practice in practice_rows():
        section, _, key = practice.name.rpartition(".")
        named = f"interface.NAME.{key}" if section == "interface" else practice.name
        (row,) = [row for row in rows if row.name == named]
        assert (row.default, row.venue, row.source) == (
            practice.value,
            practice.venue,
            practice.source,
        )


def test_units_of_keys_are_those_of_their_names() -> None:
    """A key that ends in `_m` is in metres, and so on: a wrong unit is the likeliest mistake."""
    units = {"_m": "m", "_db": "dB", "_dbm": "dBm", "_nm": "nm", "_ratio": "-", "_gbps": "Gbit/s"}
    for row in key_rows():
        for ending, unit in units.items():
            if row.key.endswith(ending) and not row.key.endswith(("_per_m", "_per_nm")):
                assert row.unit == unit, row.name


def test_the_schema_takes_what_the_reader_takes(
    run_with: Callable[[str], Path],
) -> None:
    """Editors that check run files by the schema agree with the reader."""
    jsonschema = pytest.importorskip("jsonschema")
    schema = run_file_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    good = 'purpose = "venue"\n[slack]\nentry_m = 1\n[[circuit]]\nfrom = "A"\nto = "B"\n'
    assert read_run(run_with(good)).purpose == "venue"
    jsonschema.validate(tomllib.loads(good), schema)
    for bad in ("[slack]\nentry_m = -1", "slak = 1", '[cable]\nfibre_count = "12"'):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate(tomllib.loads(bad), schema)
    assert set(schema["properties"]) == set(RunFile.model_fields)
