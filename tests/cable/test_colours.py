"""Colours of fibres and tubes against the published orders."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.cable.colours import cable_colours, colour_code, colour_codes, fibre_colours
from routeplan.errors import InputError, RangeError

REFERENCE = Path(__file__).parents[1] / "reference" / "fibre_colours.csv"
PUBLISHED = list(csv.DictReader(REFERENCE.read_text("utf-8").splitlines()))
CODES = [code.name for code in colour_codes()]


@pytest.mark.parametrize(
    "row", PUBLISHED, ids=lambda row: f"{row['code']}-{row['fibre']}-{row['fibres_per_tube']}"
)
def test_published_colours(row: dict[str, str]) -> None:
    """A fibre has the tube and fibre colour of the source named beside it."""
    found = fibre_colours(
        int(row["fibre"]), code=row["code"], fibres_per_tube=int(row["fibres_per_tube"])
    )
    assert found == (row["tube_colour"], row["fibre_colour"])


@pytest.mark.parametrize("name", CODES)
def test_order_has_twelve_colours(name: str) -> None:
    """Every code orders twelve different colours, as IEC 60304 defines twelve."""
    order = colour_code(name).fibre_order
    assert len(order) == len(set(order)) == 12


@pytest.mark.parametrize(
    ("fibre", "code", "fibres_per_tube", "expected"),
    [
        (25, "DIN VDE 0888", 48, ("red", "numbered 25")),
        (61, "TIA-598", 72, ("blue", "numbered 61")),
        (60, "TIA-598", 72, ("blue", "aqua with 4 black tracers")),
        (289, "TIA-598", 12, ("numbered 25", "blue")),
        (1, "FOTAG", 12, ("numbered 1", "red")),
        (13, "FIN2012", 24, ("numbered 1", "numbered 13")),
    ],
)
def test_no_colour_is_invented(
    fibre: int, code: str, fibres_per_tube: int, expected: tuple[str, str]
) -> None:
    """Where no published rule was read, fibres and tubes are called by number."""
    assert fibre_colours(fibre, code=code, fibres_per_tube=fibres_per_tube) == expected


@given(
    fibre_count=st.integers(1, 900),
    fibres_per_tube=st.integers(1, 144),
    code=st.sampled_from(CODES),
)
def test_whole_cable(fibre_count: int, fibres_per_tube: int, code: str) -> None:
    """A cable's list says of each fibre what is said of it alone, and no two fibres look alike."""
    found = cable_colours(fibre_count, code=code, fibres_per_tube=fibres_per_tube)
    assert len(found) == len(set(found)) == fibre_count
    for fibre in {1, fibre_count // 2 + 1, fibre_count}:
        alone = fibre_colours(
            fibre, code=code, fibres_per_tube=fibres_per_tube, fibre_count=fibre_count
        )
        assert found[fibre - 1] == alone


@pytest.mark.parametrize(("fibre", "fibre_count"), [(0, None), (-3, 12), (25, 24)])
def test_fibre_out_of_range(fibre: int, fibre_count: int | None) -> None:
    """A fibre the cable hasn't got is an error that names it."""
    with pytest.raises(RangeError, match=f"fibre {fibre}: is not a fibre of the cable"):
        fibre_colours(fibre, code="TIA-598", fibres_per_tube=12, fibre_count=fibre_count)


@pytest.mark.parametrize(("fibre_count", "fibres_per_tube"), [(0, 12), (12, 0)])
def test_counts_too_small(fibre_count: int, fibres_per_tube: int) -> None:
    """A cable or a tube of no fibres is an error."""
    with pytest.raises(RangeError, match="is too small"):
        cable_colours(fibre_count, code="TIA-598", fibres_per_tube=fibres_per_tube)


def test_other_names_of_a_code() -> None:
    """A code is found by any of its names, in any case."""
    assert colour_code("tia/eia-598").name == "TIA-598"
    assert colour_code(" vde 0888 ").name == "DIN VDE 0888"


def test_names_are_of_one_code_only() -> None:
    """No name stands for two codes."""
    names = [name.casefold() for code in colour_codes() for name in (code.name, *code.aliases)]
    assert len(names) == len(set(names))


def test_unknown_code_suggests_the_nearest() -> None:
    """An unknown code is an error with the nearest known one and a list of all."""
    with pytest.raises(InputError, match=r'Did you mean "TIA-598"\? Known are .*"FOTAG"'):
        colour_code("TIA 589")
    with pytest.raises(InputError) as caught:
        colour_code("qqq")
    assert "Did you mean" not in str(caught.value)
