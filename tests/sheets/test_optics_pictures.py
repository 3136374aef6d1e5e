"""The pictures of a circuit's light show its figures, and stay readable and harmless."""

from __future__ import annotations

import re
from itertools import combinations
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as ET

import pytest

from routeplan.light.attenuation import attenuation_of
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.sheets.document import plan_document
from routeplan.sheets.optics_pictures import PICTURES_MOST, level_svg, spectrum_svg
from routeplan.sheets.report import report_html
from tests.sheets.plans import DUCT_FEATURES, DUCT_TOML, planned

SVG = "{http://www.w3.org/2000/svg}"
CIRCUITS = """
[[circuit]]
name = "Programme"
interface = "10GBASE-LR"
[[circuit]]
name = "Lanes"
interface = "100GBASE-LR4"
[[circuit]]
name = "One fibre"
fibre_count = 1
interface = "1000BASE-BX10"
[[circuit]]
name = "No optic"
wavelengths_nm = [1310, 1550, 1625]
[[circuit]]
name = "Grid"
wavelengths_nm = [1271, 1291, 1311, 1331, 1351, 1371]
"""
Row = dict[str, Any]


@pytest.fixture(scope="module")
def circuits(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Row]:
    """Return the circuits of a planned run by name, as plan.json holds them."""
    folder = tmp_path_factory.mktemp("pictures")
    document: Row = plan_document(planned(folder, DUCT_FEATURES, DUCT_TOML + CIRCUITS))
    return {row["name"]: row for row in document["circuits"]}


def pictures(circuit: Row) -> list[str]:
    """Return all pictures of a circuit."""
    return [spectrum_svg(circuit), *(level_svg(circuit, row) for row in circuit["levels"])]


def texts(picture: str) -> list[str]:
    """Return what stands in a picture."""
    return [element.text or "" for element in ET.fromstring(picture).iter(f"{SVG}text")]


def test_the_spectrum_is_that_of_the_fibre(circuits: dict[str, Row]) -> None:
    """Values of the document are those of the formulas, water peak and ordered limits included."""
    spectrum = circuits["Programme"]["spectrum"]
    assert spectrum["fibre_types"] == ["G.652.D"]
    assert (spectrum["wavelengths_nm"][0], spectrum["wavelengths_nm"][-1]) == (1260.0, 1625.0)
    own = attenuation_of("G.652.D")
    for nm, typical, most in zip(
        spectrum["wavelengths_nm"],
        spectrum["typical_db_per_km"],
        spectrum["max_db_per_km"],
        strict=True,
    ):
        assert typical == pytest.approx(attenuation_db_per_km(nm, own.typical), abs=5e-5)
        assert most == pytest.approx(attenuation_db_per_km(nm, own.maximum), abs=5e-5)
    assert {row["max_db_per_km"] for row in spectrum["ceilings"]} == {0.4, 0.3}


def test_levels_end_where_the_budget_does(circuits: dict[str, Row]) -> None:
    """The loss at the far end is the budget's but for rounding, and never falls on the way."""
    for circuit in circuits.values():
        for levels in circuit["levels"]:
            budget = next(
                row
                for row in circuit["budgets"]
                if all(row[key] == levels[key] for key in ("wavelength_nm", "direction"))
            )
            assert levels["nominal_db"][-1] == pytest.approx(budget["nominal_db"], abs=0.002)
            assert levels["worst_db"][-1] == pytest.approx(budget["worst_db"], abs=0.002)
            for key in ("glass_m", "nominal_db", "worst_db"):
                assert levels[key] == sorted(levels[key])
            assert levels["glass_m"][-1] == pytest.approx(circuit["glass_m"], abs=0.001)
            if budget["overload_db"] is not None:
                arrives_dbm = levels["tx_max_dbm"] - levels["least_db"][-1]
                overload_db = arrives_dbm - levels["rx_overload_dbm"]
                assert overload_db == pytest.approx(budget["overload_db"], abs=0.003)


def test_marks_lie_at_joints_and_panels(circuits: dict[str, Row]) -> None:
    """Panels stand at both ends, the joint between them, in order along the glass."""
    marks = circuits["Programme"]["marks"]
    assert [row["kind"] for row in marks] == ["panel", "joint", "panel"]
    assert [row["name"] for row in marks] == ["Studio", "J1", "Hill"]
    assert marks[-1]["glass_m"] == pytest.approx(circuits["Programme"]["glass_m"], abs=0.001)


def test_every_picture_is_well_formed(circuits: dict[str, Row]) -> None:
    """Each has a name for those who cannot see it, axis units and the title."""
    for circuit in circuits.values():
        spectrum, *levels = pictures(circuit)
        assert {"dB/km", "nm", "typical"} <= set(texts(spectrum))
        for picture in levels:
            shown = texts(picture)
            assert {"dBm", "dB"} & set(shown)
            assert any(text.endswith("km glass") for text in shown)
        for picture in (spectrum, *levels):
            root = ET.fromstring(picture)
            assert root.get("aria-label")
            assert root.get("aria-label") == texts(picture)[0]


def boxes(picture: str) -> list[tuple[str, float, float, float, float]]:
    """Return every text with the room it takes, in letters of a common width."""
    found = []
    for element in ET.fromstring(picture).iter(f"{SVG}text"):
        text = element.text or ""
        width = len(text) * (6.4 if element.get("font-weight") else 5.8)
        x, y = float(element.get("x", "0")), float(element.get("y", "0"))
        left = (
            x
            - {"start": 0.0, "middle": 0.5, "end": 1.0}[element.get("text-anchor", "start")] * width
        )
        found.append((text, left, left + width, y - 8, y + 2))
    return found


def test_no_labels_lie_on_each_other(circuits: dict[str, Row]) -> None:
    """No text overlaps another or leaves the picture, whatever the circuit."""
    for circuit in circuits.values():
        for picture in pictures(circuit):
            found = boxes(picture)
            for (one, a1, a2, a3, a4), (other, b1, b2, b3, b4) in combinations(found, 2):
                apart = a2 <= b1 or b2 <= a1 or a4 <= b3 or b4 <= a3
                assert apart, (one, other)
            height = float((ET.fromstring(picture).get("viewBox") or "").split()[3])
            for text, left, right, top, bottom in found:
                assert left >= 0, text
                assert right <= 768, text
                assert top >= 0, text
                assert bottom <= height, text


def test_wavelengths_and_their_channels_are_marked(circuits: dict[str, Row]) -> None:
    """Each wavelength has its line, those close together share a name, used channels are filled."""
    lanes = spectrum_svg(circuits["Lanes"])
    assert "1295.56 to 1309.14" in texts(lanes)
    path = next(p for p in re.findall(r'<path d="([^"]+)"', lanes) if p.count("V") == 4)
    assert path.count("M") == 4
    grid = ET.fromstring(spectrum_svg(circuits["Grid"]))
    fills = [element.get("fill") for element in grid.iter(f"{SVG}rect")]
    assert len(fills) == 18
    assert [fill != "#ffffff" for fill in fills] == [True] * 6 + [False] * 12


def test_limits_stand_in_the_picture(circuits: dict[str, Row]) -> None:
    """Overload and the least that is allowed are lines with figures, and so is the arrival."""
    circuit = circuits["Programme"]
    levels = circuit["levels"][0]
    shown = texts(level_svg(circuit, levels))
    least_dbm = levels["tx_min_dbm"] - circuit["budgets"][0]["available_db"]
    plain = [text.replace("\N{MINUS SIGN}", "-") for text in shown]
    assert f"overload {levels['rx_overload_dbm']:.1f} dBm" in plain
    assert f"least the interface allows {least_dbm:.1f} dBm" in plain
    assert f"{levels['tx_min_dbm'] - levels['worst_db'][-1]:.1f}" in plain


def test_without_an_optic_loss_is_drawn_from_zero(circuits: dict[str, Row]) -> None:
    """A circuit with no interface shows how far its light falls, and no limit."""
    circuit = circuits["No optic"]
    shown = texts(level_svg(circuit, circuit["levels"][0]))
    assert shown[0].startswith("Loss along the glass at 1310 nm")
    assert not any("dBm" in text for text in shown)


def test_the_way_back_is_turned(circuits: dict[str, Row]) -> None:
    """Light that is sent from the far end only is drawn from there."""
    circuit = circuits["One fibre"]
    titles = [texts(picture)[0] for picture in pictures(circuit)[1:]]
    assert any(title.endswith("Hill to Studio") for title in titles)
    assert any(title.endswith("Studio to Hill") for title in titles)


def test_lines_differ_without_colour(circuits: dict[str, Row]) -> None:
    """The curves and limits of a picture differ in width or dash, not in colour alone."""
    for circuit in circuits.values():
        for picture in pictures(circuit):
            curves = re.findall(
                r'<path d="M[^"]+L[^"]+" fill="none" stroke="#\w+" ([^/]+)/>', picture
            )
            assert len(curves) == len(set(curves)) == 2


def test_names_stay_text(circuits: dict[str, Row]) -> None:
    """What a file calls its sites and circuits never becomes part of the drawing."""
    circuit = {
        **circuits["Programme"],
        "name": "<script>alert(1)</script>",
        "from": '"><svg onload=x>',
        "marks": [{"glass_m": 0.0, "kind": "panel", "name": "</text><image/>"}],
    }
    for picture in pictures(circuit):
        tags = {element.tag for element in ET.fromstring(picture).iter()}
        assert tags <= {f"{SVG}{tag}" for tag in ("svg", "path", "text", "rect", "circle")}


def test_nothing_is_drawn_of_nothing() -> None:
    """A circuit without the data has no pictures and no heading for them."""
    assert spectrum_svg({}) == ""
    assert level_svg({}, {}) == ""
    assert level_svg({}, {"glass_m": [0.0, 0.0], "least_db": [0, 0], "worst_db": [0, 1]}) == ""


def test_the_report_holds_a_few_and_counts_the_rest(tmp_path: Path) -> None:
    """Pictures stand under their circuit; beyond four wavelengths the others are counted."""
    document = plan_document(planned(tmp_path, DUCT_FEATURES, DUCT_TOML + CIRCUITS))
    page = report_html(document)
    assert page.count("Pictures</h4>") == 5
    grid = page[page.index("Attenuation of G.652.D along Grid") :]
    assert grid.count("Loss along the glass at") == 2 * PICTURES_MOST  # its name and its title
    assert "Power at 2" in grid
    assert report_html(document) == page
