"""The made-up run, for every test of the sheets."""

from __future__ import annotations

import pytest

from tests.sheets.made_up_run import Row, made_up_run


@pytest.fixture
def document() -> Row:
    """Return a whole document of a 20 km run with every placement."""
    return made_up_run()


@pytest.fixture
def hostile_document() -> Row:
    """Return the same run with names that would be run if a page took them for its own."""
    return made_up_run(hostile=True)
