"""Whatever stands in an input file, reading gives a run or a clear error and nothing else."""

from __future__ import annotations

import json
import math
import random
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from routeplan.errors import InputError
from routeplan.run import assumed_values, read_run
from routeplan.run.attributes import LINE_KEYS, PLACE_KEYS
from routeplan.run.model import Run
from routeplan.run.reference import key_rows, toml_value

EXAMPLES = settings(
    max_examples=200,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)
ROAD = '{"type": "LineString", "coordinates": [[10.0, 50.0], [10.0, 50.01]]}'

numbers = st.one_of(
    st.integers(-(10**30), 10**30),
    st.floats(allow_nan=True, allow_infinity=True),
    st.floats(-180, 180),
    st.sampled_from([0, 1e308, 10**400, -0.0, 90.0, 180.0]),
)
texts = st.one_of(st.text(max_size=8), st.sampled_from(["duct", "site", "Point", "LineString"]))
leaves = st.one_of(st.none(), st.booleans(), numbers, texts)
values = st.recursive(
    leaves,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(texts, inner, max_size=3),
    max_leaves=8,
)
positions = st.lists(numbers, min_size=0, max_size=4)
lines = st.lists(positions, max_size=6)
kinds = st.sampled_from(
    ["Point", "MultiPoint", "LineString", "MultiLineString", "Polygon", "MultiPolygon", "Blob"]
)
geometries = st.one_of(
    st.none(),
    values,
    st.fixed_dictionaries(
        {
            "type": kinds,
            "coordinates": st.one_of(
                positions, lines, st.lists(lines, max_size=2), st.lists(st.lists(lines), max_size=2)
            ),
        }
    ),
)
keys = st.sampled_from([*LINE_KEYS, *PLACE_KEYS, "Name", "other"])
features = st.fixed_dictionaries(
    {
        "type": st.just("Feature"),
        "properties": st.one_of(st.dictionaries(keys, values, max_size=4), values),
        "geometry": geometries,
    },
    optional={"id": values},
)
roots = st.one_of(
    values,
    features,
    st.fixed_dictionaries(
        {"type": st.just("FeatureCollection"), "features": st.lists(features, max_size=4)},
        optional={"crs": values},
    ),
)


def read_or_said(path: Path) -> None:
    """Read; what is not a sound run has to be problems that can be printed."""
    try:
        run = read_run(path)
    except InputError as error:
        problems = error.problems
    else:
        check_sound(run)
        return
    assert problems
    for problem in problems:
        str(problem).encode("utf-8")
        assert problem.what


def check_sound(run: Run) -> None:
    assert run.lines
    for line in run.lines:
        assert np.isfinite(line.lonlat).all()
        assert np.isfinite(line.datum_lonlat).all()
        assert len(line.lonlat) >= 2
        assert np.abs(line.lonlat).max() <= 180
        json.dumps(line.properties, allow_nan=False, ensure_ascii=False).encode("utf-8")
    for place in run.places:
        assert place.name
        assert math.isfinite(place.lon + place.lat)
        json.dumps(place.properties, allow_nan=False, ensure_ascii=False).encode("utf-8")
    for assumed in assumed_values(run):
        assert assumed.reason


@EXAMPLES
@given(root=roots)
def test_any_json_gives_a_run_or_a_clear_error(root: object, tmp_path: Path) -> None:
    """Values of any type, size and depth, in the places of every kind of geometry."""
    path = tmp_path / "route.geojson"
    path.write_text(json.dumps(root), encoding="utf-8")
    read_or_said(path)


@EXAMPLES
@given(data=st.binary(max_size=200))
def test_any_bytes_give_a_clear_error(data: bytes, tmp_path: Path) -> None:
    """Bytes that are no file at all."""
    for name in ("route.geojson", "run.toml", "route.gpx"):
        (tmp_path / name).write_bytes(data)
        read_or_said(tmp_path / name)


def toml_text(value: object) -> str:
    """Return a value as TOML writes it, or as near as it can."""
    if isinstance(value, dict):
        inner = ", ".join(f"{json.dumps(str(k))} = {toml_text(v)}" for k, v in value.items())
        return f"{{ {inner} }}"
    if isinstance(value, list):
        return f"[{', '.join(toml_text(each) for each in value)}]"
    if isinstance(value, float) and not math.isfinite(value):
        return str(value)
    return json.dumps("" if value is None else value)


@EXAMPLES
@given(
    changes=st.dictionaries(
        st.sampled_from([row.name for row in key_rows() if row.name != "geometry"]),
        values,
        min_size=1,
        max_size=5,
    )
)
def test_any_value_at_any_key_gives_a_run_or_a_clear_error(
    changes: dict[str, object], tmp_path: Path
) -> None:
    """Every key of a run file takes its own values and refuses all others by name."""
    (tmp_path / "route.geojson").write_text(ROAD, encoding="utf-8")
    sections: dict[str, list[str]] = {"": ['geometry = ["route.geojson"]']}
    for name, value in changes.items():
        section, _, key = name.rpartition(".")
        sections.setdefault(section, []).append(f"{key} = {toml_text(value)}")
    text = "\n".join(sections.pop(""))
    for section, entries in sections.items():
        head = "[[circuit]]" if section == "circuit" else f"[{section}]"
        text += f"\n{head}\n" + "\n".join(entries)
    path = tmp_path / "run.toml"
    path.write_text(text, encoding="utf-8")
    read_or_said(path)


@pytest.mark.parametrize("seed", range(10))
def test_broken_bytes_of_good_files_give_a_run_or_a_clear_error(
    seed: int, tmp_path: Path, write: Callable[..., Path]
) -> None:
    """Files cut off, spliced and with bytes changed, as disks and mails do it."""
    defaults = (f"{row.key} = {toml_value(row.default)}" for row in key_rows() if row.default)
    good = {
        "run.toml": ('geometry = ["route.geojson"]\n[slack]\n' + "\n".join(defaults)).encode(),
        "route.geojson": ROAD.encode(),
        "walk.gpx": b'<gpx><trk><name>W</name><trkseg><trkpt lat="50" lon="10"><ele>3</ele>'
        b'</trkpt><trkpt lat="50.01" lon="10"/></trkseg></trk></gpx>',
    }
    chance = random.Random(seed)
    write("route.geojson", good["route.geojson"])
    for _ in range(30):
        name = chance.choice(list(good))
        path = write(name, broken(good[name], chance))
        read_or_said(path)
        write("route.geojson", good["route.geojson"])


def broken(content: bytes, chance: random.Random) -> bytes:
    """Return content with one accident in it."""
    at, to = sorted(chance.randrange(len(content) + 1) for _ in range(2))
    accidents = (
        content[:at],
        content[:at] + content[to:],
        content[:at] + content[at:to][::-1] + content[to:],
        content[:at] + bytes([chance.randrange(256)]) + content[at + 1 :],
        content[:at] + content[at:to] * 2 + content[to:],
        content[:at]
        + chance.choice([b"NaN", b"-1e999", b"\xff", b"{", b"999999999"])
        + content[at:],
    )
    return chance.choice(accidents)
