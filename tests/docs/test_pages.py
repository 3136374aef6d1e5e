"""The pages agree with the code, and lead to each other."""

from __future__ import annotations

import re
import runpy
from collections.abc import Iterator
from pathlib import Path
from types import UnionType
from typing import Any, Union, get_args, get_origin

import jsonschema
import pytest
from pydantic import BaseModel

from routeplan import plan, read_run
from routeplan.cli import make_parser
from routeplan.run.attributes import AREA_KEYS, LINE_KEYS, PLACE_KEYS
from routeplan.run.defaults import default_value
from routeplan.run.model import AREA_KINDS, CROSSES, PLACE_KINDS, PLACEMENTS, ROLES
from routeplan.run.practice import RunFile
from routeplan.run.reference import run_file_schema
from routeplan.sheets.cautions import Caution
from routeplan.sheets.document import plan_document
from routeplan.sheets.tables import TABLES
from routeplan.sheets.write import LIST_NAME, SHEET_NAMES
from routeplan.tables import CONFIDENCES, load_rows

ROOT = Path(__file__).parents[2]
PAGES = sorted(
    path
    for path in ROOT.rglob("*.md")
    if not any(part.startswith(".") or part == "sheets" for part in path.relative_to(ROOT).parts)
)
MADE = runpy.run_path(str(ROOT / "docs/build_reference.py"))["PAGES"]


def page(name: str) -> str:
    """Return the text of a page in docs/."""
    return (ROOT / "docs" / name).read_text("utf-8")


def part(text: str, heading: str) -> str:
    """Return what stands under a heading of the second rank."""
    return text.partition(f"\n## {heading}\n")[2].partition("\n## ")[0]


def words(text: str) -> set[str]:
    """Return everything a page sets in code letters."""
    return set(re.findall(r"`([^`\n]+)`", text))


def keys_of(model: type[BaseModel], path: str = "") -> Iterator[tuple[str, str]]:
    """Yield heading and key of every field of a run file's model."""
    for name, field in model.model_fields.items():
        inner = next(iter(models_in(field.annotation)), None)
        key = field.alias or name
        if inner is None or path:
            yield path, key
        else:
            yield from keys_of(inner, key)


def models_in(annotation: Any) -> Iterator[type[BaseModel]]:
    """Yield the models an annotation is made of."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        yield annotation
    elif get_origin(annotation) in (Union, UnionType) or get_args(annotation):
        for inner in get_args(annotation):
            yield from models_in(inner)


@pytest.mark.parametrize("name", MADE)
def test_a_made_page_is_fresh(name: str) -> None:
    """A page made from the code is what the code makes now; docs/build_reference.py mends it."""
    assert page(name) == MADE[name]()


def test_every_key_of_a_run_file_is_documented() -> None:
    """Each field of the models stands in the table under its own heading."""
    text = page("run_file.md")
    for section, key in keys_of(RunFile):
        if (section, key) == ("cable", "legs"):  # for a named cable only
            continue
        forms = (f"`[{section}]`", f"`[[{section}]]`", f"`[{section}.NAME]`")
        headings = forms if section else ("Top of the file",)
        below = "".join(part(text, heading) for heading in headings)
        assert f"| `{key}` |" in below, f"{section}.{key}"


def test_the_schema_takes_the_demo_and_refuses_a_slip_of_the_pen() -> None:
    """A run file's JSON Schema accepts the demo run and no key that is misspelt."""
    import tomllib

    run = tomllib.loads((ROOT / "demo_routes/quenmoor_link/run.toml").read_text("utf-8"))
    schema = run_file_schema()
    jsonschema.validate(run, schema)
    run["slack"]["joint_tial_m"] = 12.0
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(run, schema)


def test_every_command_and_option_is_documented() -> None:
    """Each command has a heading, and each of its arguments a row below it."""
    text = page("commands.md")
    commands = next(
        a.choices for a in make_parser()._actions if isinstance(getattr(a, "choices", None), dict)
    )
    assert set(commands) == set(re.findall(r"^## `routeplan (\w+)", text, re.MULTILINE))
    for name, command in commands.items():
        below = text.partition(f"\n## `routeplan {name}")[2].partition("\n## ")[0]
        for action in command._actions:
            for label in action.option_strings or [action.metavar]:
                assert label in ("-h", "--help") or label in below, f"{name} {label}"


def test_every_sheet_and_every_key_of_the_plan_is_documented() -> None:
    """What `plan.json` holds for the demo, key by key, stands on the page of the sheets."""
    text = page("sheets.md")
    assert {*SHEET_NAMES, LIST_NAME} <= words(text)
    document = plan_document(plan(read_run(ROOT / "demo_routes/quenmoor_link")))
    by_path = {entry.path: entry.title for entry in TABLES.values()}
    head = words(part(text, "The head of plan.json"))
    for key, value in document.items():
        if (key,) not in by_path:
            assert key in head
            continue
        rows = value if isinstance(value, list) else [value]
        known = words(part(text, by_path[(key,)]))
        for row in rows:
            assert isinstance(row, dict)
            assert set(row) <= known, key


def test_every_property_of_geometry_is_documented() -> None:
    """The formats page has every property that is read, and every value it may have."""
    text = page("formats.md")
    for heading, keys, values in (
        ("Properties of lines", LINE_KEYS, PLACEMENTS),
        ("Properties of points", PLACE_KEYS, (*PLACE_KINDS, *ROLES, *CROSSES)),
        ("Properties of polygons", AREA_KEYS, AREA_KINDS),
    ):
        section = part(text, heading)
        for key in keys:
            assert f"| `{key}` |" in section, key
        for value in values:
            assert re.search(rf"\b{value}\b", section), value


@pytest.mark.parametrize("name", ["slack_and_rulers.md", "lengths.md", "reels_and_joints.md"])
def test_defaults_quoted_on_a_page_are_those_of_the_code(name: str) -> None:
    """A default written as `key` (value m) is the default of that key."""
    quoted = re.findall(r"`([a-z_.]+_m)` \(([\d.]+) m\)", page(name).replace("\n", " "))
    sections = ("slack", "joining", "joints", "reels")
    for key, value in quoted:
        bare = key.rpartition(".")[2]
        found = [default_value(f"{s}.{bare}") for s in sections if _has(f"{s}.{bare}")]
        assert found == [float(value)], key
    assert quoted or name == "slack_and_rulers.md"


def _has(key: str) -> bool:
    from routeplan.run.defaults import practice_rows

    return any(row.name == key for row in practice_rows())


def test_the_table_of_slack_quotes_the_defaults() -> None:
    """Each row of the table of slack has the default of its key, by placement where it varies."""
    rows = re.findall(
        r"^\| [^|]+ \| `slack\.(\w+)`([^|]*)\| ([^|]+) \|",
        page("slack_and_rulers.md"),
        re.MULTILINE,
    )
    seen = set()
    for key, _, text in rows:
        value = default_value(f"slack.{key}")
        seen.add(key)
        numbers = set(re.findall(r"\d+(?:\.\d+)?", text.replace(",", "")))
        if isinstance(value, dict):
            factor = 100 if key.endswith("_ratio") else 1
            wanted = {f"{factor * each:g}" for each in value.values()}
        else:
            wanted = {f"{value:g}"}
        assert wanted <= numbers, key
    assert {"undulation_ratio", "entry_m", "joint_tail_m", "riser_m", "loop_m"} <= seen


def test_the_glossary_has_every_word_of_the_data() -> None:
    """Each word a file or sheet uses as a value, and each ending of a name, is in the glossary."""
    text = page("glossary.md")
    known = words(text) | set(re.findall(r"^\| ([^|]+?) \|", text, re.MULTILINE))
    values = {*PLACEMENTS, *ROLES, *AREA_KINDS, *PLACE_KINDS[1:-1], *CONFIDENCES}
    values |= {"splice", "mated", "fits", "fails", "unknown", "from-to", "to-from", "link", "venue"}
    assert values <= known
    for word in ("site", "crossing", "put-up", "to-length", "stock", "express", "stored"):
        assert re.search(rf"^\| [^|]*\b{word}\b[^|]* \|", text, re.MULTILINE), word
    keys = {column.key for entry in TABLES.values() for column in entry.columns}
    keys |= {key for _, key in keys_of(RunFile)}
    plain = {key for key in keys if not _ending(key, words(part(text, "Endings of names")))}
    assert not {key for key in plain if re.search(r"_(m|mm|km|nm|db|dbm|ps|us|ns)$", key)}


def _ending(key: str, endings: set[str]) -> bool:
    return any(key.endswith(ending) for ending in endings)


def test_every_caution_is_named() -> None:
    """Each topic of the table of cautions is on the page of cautions."""
    text = page("cautions.md")
    for row in load_rows("cautions", Caution):
        assert f"| {row.topic} |" in text


@pytest.mark.parametrize("path", PAGES, ids=lambda path: str(path.relative_to(ROOT)))
def test_links_of_a_page_lead_somewhere(path: Path) -> None:
    """Every relative link and picture is a file of the project."""
    text = re.sub(r"```.*?```", "", path.read_text("utf-8"), flags=re.DOTALL)
    for target in re.findall(r"\]\(([^)\s]+)\)", text):
        if not target.startswith(("http:", "https:", "#")):
            assert (path.parent / target.partition("#")[0]).exists(), target


def test_every_page_is_reached_from_the_readme() -> None:
    """Following links from the README leads to every page."""
    reached: set[Path] = set()
    pending = [ROOT / "README.md"]
    while pending:
        path = pending.pop()
        if path in reached:
            continue
        reached.add(path)
        found = re.findall(r"\]\(([^)\s#]+\.md)\)", path.read_text("utf-8"))
        pending.extend((path.parent / target).resolve() for target in found)
    assert set(PAGES) <= reached
