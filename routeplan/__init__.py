"""
Plan outside-plant singlemode fibre runs: lengths, reels, joints, fibres, light.

>>> import routeplan
>>> run = routeplan.read_run("demo_routes/quenmoor_link")  # doctest: +SKIP
>>> planned = routeplan.plan(run)  # doctest: +SKIP
>>> routeplan.write_sheets(planned, "sheets")  # doctest: +SKIP
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from routeplan.planning import Plan
    from routeplan.planning import plan as plan
    from routeplan.run import read_run
    from routeplan.run.model import Run
    from routeplan.sheets.write import write_sheets

__all__ = ["Plan", "Run", "plan", "read_run", "write_sheets"]
__version__ = "0.1.0"

_HOMES = {
    "Plan": "routeplan.planning",
    "Run": "routeplan.run.model",
    "plan": "routeplan.planning",
    "read_run": "routeplan.run",
    "write_sheets": "routeplan.sheets.write",
}


def __getattr__(name: str) -> object:
    """Import a public name when it is first used: nothing heavy until then."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value
