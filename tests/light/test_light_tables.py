"""Every optical table loads, and each number says where it comes from."""

from __future__ import annotations

from typing import Any

import pytest

from routeplan.light.bends import BendRow
from routeplan.light.connectors import ConnectorGrade, ReflectionRow
from routeplan.light.constants import LightConstant, constant
from routeplan.light.fibres import (
    AttenuationCeiling,
    AttenuationRow,
    DispersionBound,
    FibreQuantity,
)
from routeplan.light.grid import CoarseChannel, OpticalPart
from routeplan.light.hazard import HazardRow
from routeplan.light.interfaces import Optic
from routeplan.light.life import AgeingRow
from routeplan.light.power import AttenuatorRow
from routeplan.light.reflections import BackscatterRow
from routeplan.light.timing import TimingRow
from routeplan.tables import load_meta, load_rows

TABLES: dict[str, type[Any]] = {
    "ageing": AgeingRow,
    "attenuation": AttenuationRow,
    "attenuation_ceilings": AttenuationCeiling,
    "attenuators": AttenuatorRow,
    "backscatter": BackscatterRow,
    "bends": BendRow,
    "connectors": ConnectorGrade,
    "cwdm_grid": CoarseChannel,
    "dispersion_bounds": DispersionBound,
    "fibres": FibreQuantity,
    "interfaces": Optic,
    "laser_hazard": HazardRow,
    "light_constants": LightConstant,
    "optical_parts": OpticalPart,
    "reflections": ReflectionRow,
    "timing": TimingRow,
}


@pytest.mark.parametrize("name", TABLES)
def test_rows_have_source_and_confidence(name: str) -> None:
    """No row is without its source."""
    assert load_meta(name).title
    for row in load_rows(name, TABLES[name]):
        assert row.source.strip()
        assert row.confidence in {"read", "from memory", "common practice", "house rule"}


def test_constants_are_the_published_ones() -> None:
    """Speed of light exactly; the infrared edge as four codes have it."""
    assert constant("speed_of_light_m_per_s") == 299_792_458.0
    assert (constant("infrared_db_per_km"), constant("infrared_um")) == (7.81e11, 48.48)
