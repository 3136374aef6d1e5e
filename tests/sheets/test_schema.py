"""plan.json keeps to its schema, and the committed schema is the code's."""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest

from routeplan.sheets.schema import plan_schema, plan_schema_text

Row = dict[str, Any]

COMMITTED = Path(__file__).parents[2] / "docs" / "plan.schema.json"


@pytest.fixture(scope="module")
def validator() -> jsonschema.Draft202012Validator:
    """Return a validator of the committed schema."""
    schema = json.loads(COMMITTED.read_text("utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_the_committed_schema_is_fresh() -> None:
    """The schema in the docs is what the catalogue gives."""
    assert COMMITTED.read_text("utf-8") == plan_schema_text()


def test_plans_keep_to_it(
    validator: jsonschema.Draft202012Validator, many_documents: list[Row]
) -> None:
    """Every plan is valid."""
    for document in many_documents:
        assert [error.message for error in validator.iter_errors(document)] == []


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (["schema"], 2),
        (["purpose"], "tour"),
        (["totals", "ground_m"], None),
        (["totals", "reel_count"], 1.5),
        (["legs", 0, "line", 0], [1.0, 2.0]),
        (["legs", 0, "stretches", 0, "placement"], "cellar"),
        (["stations", 0, "kind"], "place"),
        (["stations", 0, "section"], 1),
        (["joints", 0, "assumed"], "yes"),
        (["joints", 0, "ends", 0, "side"], None),
        (["splices", 0, "in"], None),
        (["circuits", 0, "budgets", 0, "reasons"], "none"),
        (["layout", "one_fewer"], {"joint_count": 1}),
        (["cables", 0, "more"], 1),
        (["more"], []),
    ],
    ids=lambda value: ".".join(map(str, value)) if isinstance(value, list) else "",
)
def test_what_is_wrong_is_found(
    validator: jsonschema.Draft202012Validator,
    many_documents: list[Row],
    path: list[Any],
    value: object,
) -> None:
    """A wrong type, word, key or null is not valid."""
    document = copy.deepcopy(next(d for d in many_documents if d["joints"]))
    place: Any = document
    for key in path[:-1]:
        place = place[key]
    place[path[-1]] = value
    assert not validator.is_valid(document)


def test_every_key_is_required(
    validator: jsonschema.Draft202012Validator, many_documents: list[Row]
) -> None:
    """No key of the top may be left out."""
    for key in many_documents[0]:
        document = {name: value for name, value in many_documents[0].items() if name != key}
        assert not validator.is_valid(document)


def test_the_schema_explains_itself() -> None:
    """Every value of the schema has a description, with its unit."""
    for table in plan_schema()["$defs"].values():  # type: ignore[union-attr]
        for value in table["properties"].values():  # type: ignore[index, call-overload, union-attr]
            assert value["description"]  # type: ignore[index, call-overload]
