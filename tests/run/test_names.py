"""The names a run file may use agree with what light knows of them."""

from __future__ import annotations

import pytest

from routeplan.light.interfaces import (
    check_wavelengths,
    default_wavelengths_nm,
    find_interface,
    interface_names,
)
from routeplan.run.names import interface_classes


def test_a_run_file_may_name_every_interface() -> None:
    """Rows of the table and the names that two ends of one fibre share."""
    assert set(interface_classes()) == set(interface_names())
    assert "1000BASE-BX10" in interface_classes()


@pytest.mark.parametrize("name", interface_names())
def test_a_circuit_takes_the_light_of_both_ends(name: str) -> None:
    """A circuit with no wavelengths has those its interface needs in both directions."""
    pair = find_interface(name, {})
    light = interface_classes()[name]
    assert light.wavelengths_nm == default_wavelengths_nm(pair)
    assert not check_wavelengths(pair, light.wavelengths_nm, where="circuit")
    assert all(
        any(low <= nm <= high for low, high in light.bands_nm) for nm in light.wavelengths_nm
    )
