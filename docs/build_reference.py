"""Write the reference pages from the code again: python docs/build_reference.py [--check]."""

from __future__ import annotations

import argparse
import itertools
import json
from collections.abc import Callable, Iterable, Iterator, Sequence
from pathlib import Path

from routeplan.cli import make_parser
from routeplan.run.names import (
    colour_codes,
    connector_grades,
    fibre_types,
    interface_classes,
    optical_parts,
)
from routeplan.run.reference import KeyRow, key_rows, run_file_schema, toml_value
from routeplan.sheets.schema import plan_schema_text
from routeplan.sheets.tables import HEAD, TABLES, Column, Table
from routeplan.sheets.write import LIST_NAME, SHEET_NAMES

__all__ = ["PAGES", "commands_page", "main", "run_file_page", "run_file_schema_text", "sheets_page"]

_OPTIONS_SHOWN = 4  # in a heading; more of them only stand in the table below it
_MADE = "<!-- Made from the code by docs/build_reference.py: change the code, then run it. -->"

_INTRODUCTIONS = {  # what a reader has to know before the keys of a section of a run file
    "joining": "How lines become legs and points find them: [lengths](lengths.md).",
    "streets": "Where the ways of `[[leg]]` are found, and what they cost: "
    "[streets](streets.md). `costs` may be written as tables, `[streets.costs.road]` with "
    '`primary = 2.5`, or in one, `costs = { "road.primary" = 2.5 }`. Areas of the geometry that '
    "are to be avoided are avoided.",
    "leg": "A leg whose way is found along streets when the run is planned, between sites that "
    "stand in the geometry as points; the heading stands once for each. Two legs of which one is "
    "`separate_from` the other are found together, at least total cost; `from` and `to` may be "
    "left out there.",
    "ground": "Heights of a terrain, and what is near enough to be met: "
    "[terrain and crossings](terrain_and_crossings.md).",
    "layer": "A file of lines and areas whose columns have names of their own; the heading stands "
    "once for each. A file with columns `kind`, `class`, `name`, `owner`, or an OpenStreetMap "
    "extract, can stand in `layers` instead.",
    "cable": "The default cable. `measured` is a list of tables, for example "
    "`measured = [ { wavelength_nm = 1310, attenuation_db_per_km = 0.33 } ]`: attenuation of "
    "the delivered cable, taken as typical and as maximum; `sigma_db_per_km` is 0 if left out.",
    "cables.NAME": "Another cable, named NAME, along the legs in `legs`, one after the other, or "
    "along lines whose `cable` is NAME. Keys left out are those of `[cable]`. It passes nodes and "
    "sites uncut; two cables may take one leg. How: [fibres](fibres.md).",
    "slack": "What each figure does: [slack and rulers](slack_and_rulers.md).",
    "reels": "How they are chosen: [reels and joints](reels_and_joints.md).",
    "costs": "The default prices are invented, so that a first plan can weigh reels and joints; "
    "every sheet says so. Replace them with your own before an order is placed.",
    "loss": "How the figures are added up: [light](light.md). `connector_grade` stands instead of "
    "`connector_mean_db`, `connector_sigma_db` and `connector_limit_db`.",
    "panel": "What is mated at one site: every mated pair there, of every circuit. Give `grade` or "
    "`measured_db`; with neither, pairs lose what `[loss]` says. An angled end (APC) on a flat one "
    "is an error.",
    "joint": "What the splices lose in the joint that stands at a place: as measured, or as "
    "assumed where that differs from `[loss]`. If no joint ends up there a warning says so.",
    "section": "Measured attenuation of one section of cable, which goes before that of its cable. "
    "Plan once to learn the names of sections.",
    "mark": "What is printed on the jacket of a reel that is there, where its section begins: "
    "stations, cable ends and cards then show printed marks. Plan once to learn reels' names.",
    "interface.NAME": "An optical interface of your own, for circuits to name. Give its light as "
    "`wavelength_nm`, or as `wavelength_min_nm` and `wavelength_max_nm`; what may be lost as "
    "`channel_loss_db`, or as `tx_min_dbm` and `rx_sensitivity_dbm`. `channel_loss_db` alone is "
    "enough: it is then taken to work at any wavelength. With `rf = true` it carries radio "
    "frequency on the light's amplitude, where a decibel of light is two of signal.",
    "circuit": "One light path; the heading stands once for each. Where `wavelengths_nm` is left "
    "out and an interface is named, the wavelengths are the interface's. "
    '`interface = "any"` lists every interface that closes the circuit, at its own wavelengths '
    "unless some are given. A pair of fibres is taken to have crossed leads at both ends and to be "
    "rolled once on the way.",
    "circuit.part": "A passive part in the way of the circuit above it: a row of the table "
    '`optical_parts`, or one of your own with `kind = "own"` and `loss_db`. Where a part is a '
    "`cwdm` pair every wavelength has to have a channel of the coarse grid to itself.",
    "circuit.bend": "Fibre of the circuit above it that is wound or bent. A radius tighter than "
    "the fibre type is made for is a failing check.",
}

_RUN_FILE_HEAD = """\
# The run file

A TOML file, usually `run.toml` beside its geometry. Every key is optional: `routeplan new GEOMETRY`
writes a file with all of them commented out. A key that is not known is an error that names the
nearest known one. All problems of a file are reported together.

```toml
title = "Studio to hill"
geometry = ["route.geojson", "survey.gpkg|poles"]   # file|layer takes one layer

[cable]
fibre_count = 48

[[circuit]]
name = "Programme"
from = "Studio"
to = "Hill"
interface = "10GBASE-ER"
```

Names end in their unit: `_m` metres, `_db` decibels, `_nm` nanometres, `_ratio` a share (0.02 is
2 %). Files are SI whatever `units` says. Keys by placement take a table, for example
`undulation_ratio = { aerial = 0.005, duct = 0.012 }`. In `loop_m` and `undulation_ratio` a
placement left out keeps its default; any other table that is given replaces the whole default.

`purpose` chooses between two sets of defaults and nothing else; a default for a venue run is shown
where it differs. Editors that read JSON Schema can use
[run_file.schema.json](run_file.schema.json).
"""

_NOT_YET = """\
## Not in this version

`reels.stock` and `"stock"` in `reels.buy` are refused, not ignored.
"""

_COMMANDS_HEAD = """\
# Commands

`routeplan COMMAND ...`, or `python -m routeplan COMMAND ...`. None uses the network, save `route`
where it is asked to download streets.
"""

_COMMANDS_TAIL = """\
## Exit codes

| code | meaning |
|---|---|
| 0 | nothing fails (`unknown` is not failing) |
| 1 | planned and all sheets written, but some check fails: see `checks.csv`; a budget that fails |
| 2 | the input is wrong or no layout is possible: one line a problem, nothing written |

## What `--json` prints

- `plan`: what `plan.json` holds, see [sheets](sheets.md).
- `check`: `problems`, which is empty, and `warnings` with `where` and `message`.
- `budget`: verdict, what was asked, `budgets` as in `plan.json`, `changes`, `stretch_m`, `closing`
  and `assumptions`; see [light](light.md).
- `tables`: title, source, confidence and rows.
- With exit code 2: `{"problems": [{"where", "what", "value", "limit", "remedy"}]}`.

Problems and warnings for people go to stderr.

## Where `plan` writes

`--out DIR`, or else `sheets/` beside the run file, or `STEM_sheets/` beside a bare geometry file
STEM.*. Only files that an earlier `plan` wrote there are replaced or, when they are no longer made,
removed: their names and SHA-256 sums stand in `sheets.sha256`. If a file in the way is not one of
them, or was changed since, nothing is written and the file is named. Sheets are made in a folder
beside DIR first and moved in when all are done, `plan.json` last.

`new` writes `run.toml` beside the geometry, or the file of `--out`, never over one that is there.
"""

_SHEETS_HEAD = """\
# Sheets

What `routeplan plan` writes. Same input, same bytes, on any day and in any folder.

| file | what |
|---|---|
"""

_SHEET_TEXTS = {
    "plan.json": "everything, for programs",
    "cards.txt": "a card for the lid of each closure, one page each",
    "map.html": "the map: one file that opens without a network",
    "report.html": "the report, made to be printed",
    LIST_NAME: "names and SHA-256 sums of these files; `sha256sum -c sheets.sha256` checks them",
}

_SHEETS_MIDDLE = """\
CSV files are UTF-8, separated by commas, with a point for decimals. Their heads are the keys below,
with the unit behind where the key itself does not end in it. Rows nested in one column become
columns of their own (`in_fibre`, `out_fibre`). Text that starts with = + - @, a tab or a return
gets an apostrophe in front, so that no spreadsheet takes it for a formula; numbers never do.

Lengths are whole millimetres written in metres, and totals are their exact sums. Decibels are
rounded to 0.001, delays to a nanosecond, longitude and latitude to nine decimals. What cannot be
known is `null`, an empty cell in a CSV. Words are explained in the [glossary](glossary.md).

[plan.schema.json](plan.schema.json) is the JSON Schema of `plan.json`.

## The head of plan.json

"""


def run_file_page() -> str:
    """Return the text of docs/run_file.md."""
    rows = key_rows()
    parts = [_MADE, _RUN_FILE_HEAD]
    for section, own in itertools.groupby(rows, key=lambda row: row.section):
        text = _INTRODUCTIONS.get(section)
        parts += [f"## {_heading(section)}\n", *([text + "\n"] if text else []), _key_table(own)]
    parts += [_names_part(), _NOT_YET, "## Defaults, and why\n", _default_table(rows)]
    return "\n".join(parts)


def _heading(section: str) -> str:
    if not section:
        return "Top of the file"
    head = run_file_schema()["properties"][section.partition(".")[0]]
    return f"`[[{section}]]`" if head.get("type") == "array" else f"`[{section}]`"


def _key_table(rows: Iterable[KeyRow]) -> str:
    head = ("key", "what", "type", "unit", "limits", "default", "for a venue")
    return _table(head, map(_key_cells, rows))


def _key_cells(row: KeyRow) -> tuple[str, ...]:
    is_named_cable = row.section.startswith("cables")
    return (
        f"`{row.key}`",
        row.description,
        row.type,
        row.unit.removeprefix("-"),
        row.limits.replace("1e+06", "1 000 000").replace("1e+09", "1 000 000 000"),
        "" if is_named_cable else _default(row.default),
        _default(row.venue),
    )


def _default(value: object) -> str:
    return "" if value is None else f"`{toml_value(value)}`"  # type: ignore[arg-type]


def _names_part() -> str:
    lines = [
        "## Names the file can use\n",
        f"- `cable.fibre_type`: {_listed(fibre_types())}.",
        f"- `cable.colour_code`: {_listed(colour_codes())}.",
        f"- `loss.connector_grade`, `panel.grade`: {_listed(connector_grades())}.",
        f"- `circuit.part.name`: {_listed(optical_parts())}.",
        f"- `circuit.interface`: `any`, one of `[interface.NAME]`, or "
        f"{_listed(interface_classes())}.",
        "\n`routeplan tables fibres`, `colours` and `interfaces` show them with sources.\n",
    ]
    return "\n".join(lines)


def _listed(names: Iterable[str]) -> str:
    return ", ".join(f"`{name}`" for name in names)


def _default_table(rows: Sequence[KeyRow]) -> str:
    cells = (
        (
            f"`{r.name}`",
            _default(r.default),
            _default(r.venue),
            r.unit.strip("-"),
            r.source,
            r.reason,
        )
        for r in rows
        if r.default is not None and not r.section.startswith("cables")
    )
    return _table(("key", "link", "venue", "unit", "source", "why"), cells)


def commands_page() -> str:
    """Return the text of docs/commands.md."""
    parser = make_parser()
    parts = [_MADE, _COMMANDS_HEAD, _argument_table(_actions(parser))]
    for action in _actions(parser):
        if not isinstance(action, argparse._SubParsersAction):
            continue
        helps = {choice.dest: choice.help for choice in action._get_subactions()}
        for name, command in action.choices.items():
            parts.append(f"## `{_usage(name, command)}`\n")
            parts.append(f"{_sentence(helps.get(name) or '')}\n")
            parts.append(_argument_table(_actions(command)))
    return "\n".join([*parts, _COMMANDS_TAIL])


def _actions(parser: argparse.ArgumentParser) -> list[argparse.Action]:
    return [a for a in parser._actions if not isinstance(a, argparse._HelpAction)]


def _usage(name: str, command: argparse.ArgumentParser) -> str:
    words = [f"routeplan {name}"]
    options = [action for action in _actions(command) if action.option_strings]
    if len(options) > _OPTIONS_SHOWN:
        return f"{words[0]} [OPTIONS]"
    for action in _actions(command):
        if action.option_strings:
            words.append(f"[{_label(action)}]")
        else:
            words.append(f"[{_label(action)}]" if action.nargs == "?" else _label(action))
    return " ".join(words)


def _label(action: argparse.Action) -> str:
    value = str(action.metavar or action.dest.upper())
    if not action.option_strings:
        return value
    return ", ".join(action.option_strings) + (f" {value}" if action.nargs != 0 else "")


def _argument_table(actions: Iterable[argparse.Action]) -> str:
    cells = ((f"`{_label(a)}`", _help(a)) for a in actions if not isinstance(a.choices, dict))
    return _table(("argument", "what"), cells)


def _help(action: argparse.Action) -> str:
    # The parser's own words for --version differ between versions of Python.
    is_version = isinstance(action, argparse._VersionAction)
    return "Print the version." if is_version else _sentence(action.help or "")


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}."


def sheets_page() -> str:
    """Return the text of docs/sheets.md."""
    csv_texts = {entry.csv: entry.title.lower() for entry in TABLES.values() if entry.csv}
    texts = {**csv_texts, **_SHEET_TEXTS}
    files = "".join(f"| `{name}` | {texts[name]} |\n" for name in (*SHEET_NAMES, LIST_NAME))
    head = _table(("key", "kind", "what"), [(f"`{c.key}`", c.kind, c.text) for c in HEAD])
    tables = (_sheet_part(entry) for entry in TABLES.values())
    return "\n".join([_MADE, _SHEETS_HEAD + files, _SHEETS_MIDDLE + head, *tables])


def _sheet_part(entry: Table) -> str:
    where = f"`{'.'.join(entry.path)}`" if entry.path else "inside rows of other tables"
    line = f"In `plan.json`: {where}." + (f" As CSV: `{entry.csv}`." if entry.csv else "")
    if entry.csv and entry.carried:
        line += f" The CSV begins with {_listed(key for key, _ in entry.carried)}."
    head = ("column", "kind", "unit", "decimals", "what")
    return f"## {entry.title}\n\n{line}\n\n" + _table(head, map(_column_cells, entry.columns))


def _column_cells(column: Column) -> tuple[str, ...]:
    kind = {
        "rows": f"list of {TABLES[column.of].title.lower()}" if column.of else "",
        "row": TABLES[column.of].title.lower() if column.of else "",
        "flag": "true or false",
        "texts": "list of text",
        "points": "list of points",
        "numbers": "list of numbers",
    }.get(column.kind, column.kind)
    digits = "" if column.digits is None else str(column.digits)
    null = " Null where it cannot be known or does not apply." if column.may_be_null else ""
    unlisted = "" if column.is_listed else " In `plan.json` only."
    return (f"`{column.key}`", kind, column.unit, digits, column.text + null + unlisted)


def run_file_schema_text() -> str:
    """Return the text of docs/run_file.schema.json."""
    return json.dumps(run_file_schema(), ensure_ascii=False, indent=1) + "\n"


def _table(head: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """Return a Markdown table without the columns that are empty in every row."""
    body = [tuple(cell.replace("|", "\\|") for cell in row) for row in rows]
    kept = [k for k in range(len(head)) if any(row[k] for row in body)]
    return "".join(f"| {' | '.join(line)} |\n" for line in _lines(head, body, kept))


def _lines(
    head: Sequence[str], body: Iterable[Sequence[str]], kept: Sequence[int]
) -> Iterator[list[str]]:
    yield [head[k] for k in kept]
    yield ["---" for _ in kept]
    for row in body:
        yield [row[k] for k in kept]


PAGES: dict[str, Callable[[], str]] = {
    "run_file.md": run_file_page,
    "run_file.schema.json": run_file_schema_text,
    "commands.md": commands_page,
    "plan.schema.json": plan_schema_text,
    "sheets.md": sheets_page,
}


def main(arguments: Sequence[str] | None = None) -> int:
    """Write the pages that changed, or with --check only name them; 1 if --check names any."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--check", action="store_true", help="write nothing, name what is stale")
    check = parser.parse_args(arguments).check
    stale = []
    for name, make in PAGES.items():
        path = Path(__file__).parent / name
        text = make()
        if not path.is_file() or path.read_text("utf-8") != text:
            stale.append(name)
            if not check:
                path.write_text(text, "utf-8", newline="\n")
    print("\n".join(f"{'stale' if check else 'wrote'} {name}" for name in stale) or "all fresh")
    return 1 if check and stale else 0


if __name__ == "__main__":
    raise SystemExit(main())
