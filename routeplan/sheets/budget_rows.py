"""A budget as the row that `plan.json` holds."""

from __future__ import annotations

from routeplan.light.model import Budget
from routeplan.sheets.columns import Row
from routeplan.sheets.rows import row_of

__all__ = ["budget_row"]


def budget_row(budget: Budget) -> Row:
    """Return a budget in the catalogue's order and digits, with every line."""
    return row_of(
        "budgets",
        budget,
        delay_us=budget.delay_ns / 1000,
        reasons=list(budget.reasons),
        lines=[row_of("budget_lines", line) for line in budget.lines],
    )
