"""What tests of several rooms share: plans of many small runs."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import pytest

from tests.sheets import plans

if TYPE_CHECKING:
    from routeplan.planning import Plan


@pytest.fixture(scope="session")
def duct_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of two kilometres of duct with one loop and one joint."""
    return plans.planned(tmp_path_factory.mktemp("duct"), plans.DUCT_FEATURES, plans.DUCT_TOML)


@pytest.fixture(scope="session")
def mixed_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of a kilometre of duct and one of poles, bought to length."""
    return plans.planned(tmp_path_factory.mktemp("mixed"), plans.MIXED_FEATURES, plans.MIXED_TOML)


@pytest.fixture(scope="session")
def hostile_plan(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    """Return the plan of a run whose names spreadsheets and pages could misread."""
    folder = tmp_path_factory.mktemp("hostile")
    return plans.planned(folder, plans.hostile_features(), 'title = "=Title"')


@pytest.fixture(scope="session")
def many_plans(tmp_path_factory: pytest.TempPathFactory) -> list[Plan]:
    """Return the plans of forty runs drawn from seeds."""
    folder = tmp_path_factory.mktemp("many")
    return [plans.random_plan(folder / str(seed), seed) for seed in range(40)]


@pytest.fixture(scope="session")
def many_documents(
    many_plans: list[Plan], duct_plan: Plan, mixed_plan: Plan, hostile_plan: Plan
) -> list[dict[str, Any]]:
    """Return what plan.json holds for all of them."""
    from routeplan.sheets.document import plan_document

    return [plan_document(each) for each in (*many_plans, duct_plan, mixed_plan, hostile_plan)]
