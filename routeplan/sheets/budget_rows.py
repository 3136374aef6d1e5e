"""A budget as the row that `plan.json` holds."""

from __future__ import annotations

from routeplan.light.changes import deciding_line
from routeplan.light.model import Budget, BudgetLine
from routeplan.sheets.columns import Row
from routeplan.sheets.rows import row_of

__all__ = ["budget_row"]


def budget_row(budget: Budget) -> Row:
    """Return a budget in the catalogue's order and digits, with every line."""
    deciding = deciding_line(budget)
    return row_of(
        "budgets",
        budget,
        delay_us=budget.delay_ns / 1000,
        reasons=list(budget.reasons),
        lines=[row_of("budget_lines", line) for line in budget.lines],
        deciding=deciding.item if deciding else None,
        life_lines=[_life_line(line) for line in budget.life_lines],
    )


def _life_line(line: BudgetLine) -> Row:
    source, _, reason = line.source.partition(": ")
    return row_of("life_lines", line, source=source, reason=reason)
