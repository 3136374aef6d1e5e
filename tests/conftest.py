"""What tests of several rooms share: plans of many small runs."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from routeplan.planning import Plan, plan
from routeplan.run import read_run
from routeplan.sheets.document import plan_document
from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, MIXED_FEATURES, MIXED_TOML
from tests.sheets.plans import hostile_features, planned, random_run


@pytest.fixture(scope="session")
def duct_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of two kilometres of duct with one loop and one joint."""
    return planned(tmp_path_factory.mktemp("duct"), DUCT_FEATURES, DUCT_TOML)


@pytest.fixture(scope="session")
def mixed_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of a kilometre of duct and one of poles, bought to length."""
    return planned(tmp_path_factory.mktemp("mixed"), MIXED_FEATURES, MIXED_TOML)


@pytest.fixture(scope="session")
def hostile_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of a run whose names spreadsheets and pages could misread."""
    return planned(tmp_path_factory.mktemp("hostile"), hostile_features(), 'title = "=Title"')


@pytest.fixture(scope="session")
def many_plans(tmp_path_factory: pytest.TempPathFactory) -> list[Plan]:
    """Return the plans of forty runs drawn from seeds."""
    folder = tmp_path_factory.mktemp("many")
    return [plan(read_run(random_run(Path(folder / str(seed)), seed))) for seed in range(40)]


@pytest.fixture(scope="session")
def many_documents(
    many_plans: list[Plan], duct_plan: Plan, mixed_plan: Plan, hostile_plan: Plan
) -> list[dict[str, Any]]:
    """Return what plan.json holds for all of them."""
    return [plan_document(each) for each in (*many_plans, duct_plan, mixed_plan, hostile_plan)]
