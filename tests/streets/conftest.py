"""Real networks, read once."""

from __future__ import annotations

import pytest

from routeplan.streets.model import Network
from tests.streets.small_networks import real_network


@pytest.fixture(scope="session")
def nauru(tmp_path_factory: pytest.TempPathFactory) -> Network:
    """Return every street of Nauru."""
    return real_network("nauru.geojson", tmp_path_factory.mktemp("nauru"))


@pytest.fixture(scope="session")
def helsinki(tmp_path_factory: pytest.TempPathFactory) -> Network:
    """Return the centre of Helsinki."""
    return real_network("helsinki_centre.osm.pbf", tmp_path_factory.mktemp("helsinki"))
