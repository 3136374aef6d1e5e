"""Streets and legs of a run file as they are read."""

from __future__ import annotations

import json
import math
from pathlib import Path

import pytest

from routeplan.errors import InputError
from routeplan.run import read_run

HEAD = 'geometry = ["sites.geojson"]\n[streets]\nfiles = ["town.geojson"]\n'
LEG = '[[leg]]\nname = "Main"\nfrom = "A"\nto = "B"\n'


def written(folder: Path, toml: str) -> Path:
    """Write two sites and a run file beside them, and streets that nobody reads yet."""
    features = [
        {
            "type": "Feature",
            "properties": {"name": name, "kind": "site"},
            "geometry": {"type": "Point", "coordinates": [lon, 50.0]},
        }
        for name, lon in (("A", 10.0), ("B", 10.01))
    ]
    text = json.dumps({"type": "FeatureCollection", "features": features})
    (folder / "sites.geojson").write_text(text, "utf-8")
    (folder / "town.geojson").write_text("not read before ways are found", "utf-8")
    file = folder / "run.toml"
    file.write_text(toml, "utf-8")
    return file


def test_prices_may_be_tables_or_dotted(tmp_path: Path) -> None:
    """Both ways of writing a price are one, and a class may be closed."""
    prices = (
        "[streets.costs]\nbridge_factor = 2\nroad.primary = 2.5\n"
        "[streets.costs.crossing]\nrail = inf\n",
        'costs = { bridge_factor = 2, "road.primary" = 2.5, "crossing.rail" = inf }\n',
    )
    for text in prices:
        run = read_run(written(tmp_path, HEAD + text + LEG))
        assert run.streets is not None
        assert run.streets.rules.costs == {
            "bridge_factor": 2.0,
            "road.primary": 2.5,
            "crossing.rail": math.inf,
        }


def test_streets_are_not_taken_for_the_geometry_beside_a_run_file(tmp_path: Path) -> None:
    """Of two vector files beside a run file that names no geometry, the streets are not it."""
    run = read_run(written(tmp_path, '[streets]\nfiles = ["town.geojson"]\n' + LEG))
    assert [place.name for place in run.places] == ["A", "B"]
    assert run.lines == ()
    assert run.streets is not None
    assert [each.file for each in run.streets.streets] == ["town.geojson"]
    assert run.legs[0].from_ == "A"


def test_points_alone_are_no_run_without_legs_to_be_found(tmp_path: Path) -> None:
    """Where no way is to be found, the geometry has to hold one."""
    with pytest.raises(InputError, match=r"sites\.geojson: holds no line"):
        read_run(written(tmp_path, 'geometry = ["sites.geojson"]\n'))


@pytest.mark.parametrize(
    ("toml", "message"),
    [
        ("apart = 'roads'", "run.toml, streets.apart: is not one of the values it can take"),
        ("apart_m = 0", "run.toml, streets.apart_m: is too small"),
        ("fils = []", 'run.toml, streets.fils: is not a known key. Did you mean "files"?'),
        ("costs = { bridge_factor = -1 }", "run.toml, streets.costs.bridge_factor: is too small"),
        ("costs = { bridge_factor = nan }", "run.toml, streets.costs.bridge_factor: is"),
        ("placement = 'existing'", "run.toml, streets.placement: is not one of the values"),
    ],
)
def test_what_is_wrong_has_its_key(toml: str, message: str, tmp_path: Path) -> None:
    """Each problem says where it is; all else in the file is read."""
    with pytest.raises(InputError) as caught:
        read_run(written(tmp_path, f"{HEAD}{toml}\n{LEG}"))
    (said,) = map(str, caught.value.problems)
    assert said.startswith(message)
