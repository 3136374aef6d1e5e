"""The text of a new run file: every key with its default and reason, and what was found."""

from __future__ import annotations

import itertools
import json
from collections.abc import Iterator
from pathlib import Path

from routeplan.errors import Problem, RunFileError
from routeplan.run.model import Run
from routeplan.run.reading import read_run
from routeplan.run.reference import KeyRow, key_rows, toml_value
from routeplan.run.trouble import is_plain_text, shown

__all__ = ["new_run_text"]

_SHOWN_NAMES = 30
_EXAMPLES = {  # keys without a default, as they would be written
    "crs": '"EPSG:27700"',
    "background": "[]",
    "terrain": "[]",
    "layers": "[]",
    "marks": "[]",
    "cable.measured": "[ { wavelength_nm = 1310, attenuation_db_per_km = 0.33 } ]",
    "cable.make": '"loose tube"',
    "cable.metal": "false",
    "cable.located": "false",
    "cable.indoor_max_m": "15.0",
    "joints.max_count": "40",
    "joints.keep_off_m": "20.0",
    "joints.cost_factor_by_kind": "{ pole = 2.0 }",
    "joints.closure_splices_max": "96",
    "joints.closure_ports": "6",
    "joints.max_section_m": "{ duct = 6000 }",
}
_OTHERWISE = ("loss.connector_grade",)  # instead of the keys before it
_OWN_TEXT = (  # headings that stand once for each entry, or need keys
    *("streets", "leg", "layer", "panel", "joint", "section", "mark", "circuit"),
)
_LAYER = """\
# Lines and areas the way may cross, in a file whose columns have names of their own:
#   [[layer]]
#   file = "roads.gpkg"
#   kind = "road"                  # or rail, water, power, pipeline, boundary, avoid, permit
#   class_column = "type"          # name_column, owner_column; kind_column and kinds
"""
_STREETS = """\
# Legs whose way is found along streets instead of drawn, between sites of the geometry:
#   [streets]
#   files = ["streets.geojson"]    # or .osm, .osm.pbf, .osm.bz2, .graphml
#   [[leg]]
#   name = "Main"
#   from = "A"
#   to = "B"
#   [[leg]]
#   name = "Standby"
#   separate_from = "Main"         # two ways that share no street
"""
_SITES_AND_JOINTS = """\
# What is mated at a site, what the splices of one joint lose, what a section was measured at:
# [[panel]]
# site = "A"
# grade = "grade B"                # of the table connectors; or measured_db
# polish = "APC"                   # lead_polish, where the patch lead's is another
# [[joint]]
# place = "H1"
# measured_db = 0.04               # or splice_mean_db, splice_sigma_db, splice_limit_db
# [[section]]
# name = "S1"
# measured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.33 } ]
# [[mark]]
# reel = "R1"                      # once it is there: what is printed where its section begins
# start_m = 12.0                   # falling = true, where the marks fall along it
"""
_OWN_INTERFACE = """\
# An optical interface of your own, to be named by a circuit:
# [interface.own-link]
# wavelength_nm = 1310             # or wavelength_min_nm and wavelength_max_nm
# tx_min_dbm = -8.0
# tx_max_dbm = -3.0
# rx_sensitivity_dbm = -23.0       # or channel_loss_db instead
# rx_overload_dbm = -3.0
# penalty_db = 1.0
# dispersion_max_ps_per_nm = 800   # if the data sheet states it
# bit_rate_gbps = 1.25             # if the data sheet states it
"""


def new_run_text(geometry_path: str | Path, *, named: str = "") -> str:
    """
    Return the text of a run file for a vector file, to be saved beside it.

    Every key stands in it commented out, with its default, unit and reason; the geometry, the
    title and, where two sites are declared, a circuit between them are filled in.

    Parameters
    ----------
    geometry_path
        The vector file.
    named
        What the run file calls it; left out: its own name, for a run file beside it.

    Raises
    ------
    InputError
        If the vector file cannot be planned as it is.
    """
    path = Path(geometry_path)
    if path.suffix.lower() == ".toml" or not is_plain_text(named or path.name):
        problem = Problem(
            where=path.name, what="is no vector file a run file can name", value=shown(path.name)
        )
        raise RunFileError(problem)
    run = read_run(path)
    own = (_LAYER, _STREETS, _SITES_AND_JOINTS, _OWN_INTERFACE, _circuit(run))
    return "\n".join([_head(run, named or path.name), *_sections(), *own])


def _head(run: Run, file: str) -> str:
    lines = [
        "# Run file. A key that is commented out keeps the default shown.",
        f"# Found: {_count(len(run.lines), 'line')}{_named(line.name for line in run.lines)}",
        f"#        {_count(len(run.places), 'point')}, "
        f"{_count(len(_sites(run)), 'site')}{_named(_sites(run))}",
        "",
        f"title = {_text(run.title)}",
        f"geometry = [{_text(file)}]",
    ]
    filled = ("title", "geometry")
    rows = [row for row in key_rows() if not row.section and row.key not in filled]
    return "\n".join([*lines, *(_commented(row) for row in rows), ""])


def _sections() -> Iterator[str]:
    for section, rows in itertools.groupby(key_rows(), key=lambda row: row.section):
        is_named = section in ("cables.NAME", "interface.NAME")
        if section and not is_named and section.partition(".")[0] not in _OWN_TEXT:
            yield "\n".join([f"[{section}]", *(_commented(row) for row in rows), ""])


def _commented(row: KeyRow) -> str:
    """Return a key on one line, and its meaning and reason on the line before."""
    value = _EXAMPLES.get(row.name, '""') if row.default is None else toml_value(row.default)
    unit = f" [{row.unit}]" if row.unit not in ("", "-") else ""
    reason = f" ({row.reason})" if row.reason else ""
    venue = "" if row.venue is None else f"    # venue: {toml_value(row.venue)}"
    either = "or " if row.name in _OTHERWISE else ""
    return f"# {row.description}{unit}{reason}\n# {either}{row.key} = {value}{venue}"


def _circuit(run: Run) -> str:
    sites = [place.name for place in run.places if place.kind == "site"]
    declared = [name for name in _sites(run) if name in sites][:2]
    mark = "" if len(declared) == 2 else "# "
    ends = declared if len(declared) == 2 else ["A", "B"]
    lines = [
        "[[circuit]]",
        'name = "Circuit 1"',
        f"from = {_text(ends[0])}",
        f"to = {_text(ends[1])}",
        *(
            f"# {row.key} = {toml_value(row.default)}    # {row.description}"
            for row in key_rows()
            if row.section == "circuit" and row.default is not None
        ),
        '# interface = "10GBASE-LR"    # a name of the table of interfaces, or your own',
    ]
    return "\n".join(line if line.startswith("#") else mark + line for line in lines) + "\n"


def _sites(run: Run) -> list[str]:
    places = (place for place in run.places if place.kind == "site")
    return [place.name for place in places if "kind_assumed" not in place.properties]


def _named(names: Iterator[str] | list[str]) -> str:
    known = [name for name in names if name]
    more = f" and {len(known) - _SHOWN_NAMES} more" if len(known) > _SHOWN_NAMES else ""
    return f": {', '.join(known[:_SHOWN_NAMES])}{more}" if known else ""


def _count(count: int, thing: str) -> str:
    return f"{count} {thing}{'' if count == 1 else 's'}"


def _text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)
