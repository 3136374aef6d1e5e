"""What the planner declares: reading run files and every vector file into a `Run`."""

from __future__ import annotations

from routeplan.run.defaults import assumed_values, default_value, practice_rows, value_of
from routeplan.run.reading import read_run

__all__ = ["assumed_values", "default_value", "practice_rows", "read_run", "value_of"]
