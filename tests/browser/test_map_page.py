"""The map page in a real browser with no network: seen, read and switched as a user would."""

from __future__ import annotations

import re
from bisect import bisect_right
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

from routeplan import plan, read_run
from routeplan.sheets.document import plan_document
from routeplan.sheets.map import map_html
from tests.sheets.made_up_run import HOSTILE_NAMES, Row, made_up_run

if TYPE_CHECKING:
    from playwright.sync_api import Page

DEMO = Path(__file__).parents[2] / "demo_routes/quenmoor_link"
SPOT = """(ground) => {
  const { map, layer } = runSheet;
  const at = map.latLngToContainerPoint(layer.spotLatLng({ leg: 0, ground }));
  const box = map.getContainer().getBoundingClientRect();
  return [box.left + at.x, box.top + at.y];
}"""
PIXEL = """(ground) => {
  const { map, layer } = runSheet;
  const at = map.latLngToLayerPoint(layer.spotLatLng({ leg: 0, ground }));
  const density = window.devicePixelRatio;
  const { min } = layer._bounds;
  const copy = document.createElement("canvas");
  const ctx = copy.getContext("2d", { willReadFrequently: true });
  ctx.drawImage(layer._container, -Math.round((at.x - min.x) * density),
    -Math.round((at.y - min.y) * density));
  return Array.from(ctx.getImageData(0, 0, 1, 1).data).slice(0, 3);
}"""
GREY = """() => {
  const from = runSheet.layer._container;
  const copy = document.createElement("canvas");
  copy.width = from.width;
  copy.height = from.height;
  const ctx = copy.getContext("2d", { willReadFrequently: true });
  ctx.drawImage(from, 0, 0);
  const { data } = ctx.getImageData(0, 0, copy.width, copy.height);
  let count = 0;
  for (let i = 0; i < data.length; i += 4) if (data[i] === 0xcf && data[i + 1] === 0xca) count += 1;
  return count;
}"""
LOOK_AT = """(ground) => runSheet.map.setView(
  runSheet.layer.spotLatLng({ leg: 0, ground }), 16, { animate: false })"""
DUCT, NOTHING = [0x15, 0x48, 0x7F], [0, 0, 0]


def _readings(page: Page) -> dict[str, str]:
    cells: dict[str, str] = page.evaluate(
        """Object.fromEntries([...document.querySelectorAll('[data-reading]')]
        .map((cell) => [cell.dataset.reading, cell.textContent]))"""
    )
    return {name: re.sub(r"[\xa0\u202f]", "", text) for name, text in cells.items()}


def _hover(page: Page, ground_m: float) -> dict[str, str]:
    """Look closely at a place on the way, put the pointer on it and return the readings."""
    ground_mm = round(ground_m * 1000)
    page.evaluate(LOOK_AT, ground_mm)
    page.mouse.move(*page.evaluate(SPOT, ground_mm))
    page.wait_for_timeout(50)
    return _readings(page)


def _metres(text: str) -> float:
    return float(re.match(r"[\d.]+", text)[0])  # type: ignore[index]


def _expected_m(document: Row, ground_m: float, ruler: str) -> float:
    """Return a ruler's reading between two stations of the document."""
    stations = document["stations"]
    after = bisect_right([row["ground_m"] for row in stations], ground_m)
    here, there = stations[after - 1], stations[after]
    part = (ground_m - here["ground_m"]) / (there["ground_m"] - here["ground_m"])
    start_m: float = here[f"{ruler}_to_m"]
    reading_m: float = start_m + part * (there[f"{ruler}_from_m"] - start_m)
    return reading_m


def _counts(page: Page) -> dict[str, int]:
    counts: dict[str, int] = page.evaluate("runSheet.layer.counts")
    return counts


def _switch(page: Page, layer: str) -> None:
    page.locator(f'input[data-layer="{layer}"]').click()


def test_the_whole_run_is_in_view_when_the_page_opens(open_html: Any, document: Row) -> None:
    """Both sites, all joints and every stretch are drawn; nothing is logged or fetched."""
    page = open_html(map_html(document)).page
    counts = _counts(page)
    assert counts["site"] == 2
    assert counts["joint"] == 3
    assert counts["lines"] == len(document["legs"][0]["stretches"])
    assert page.title() == document["title"]


def test_the_way_is_drawn_in_the_colour_of_its_placement(open_html: Any, document: Row) -> None:
    """A pixel on a duct stretch has the duct colour, and none beside the way has it."""
    page = open_html(map_html(document)).page
    page.evaluate(LOOK_AT, 2_125_000)
    assert page.evaluate(PIXEL, 2_125_000) == DUCT
    _switch(page, "way duct")
    assert page.evaluate(PIXEL, 2_125_000) == NOTHING
    _switch(page, "way duct")
    assert page.evaluate(PIXEL, 2_125_000) == DUCT


@pytest.mark.parametrize("ground_m", [1_333.0, 9_137.0, 16_204.0])
def test_the_pointer_reads_all_three_rulers(open_html: Any, document: Row, ground_m: float) -> None:
    """Sheath, glass and section metres are those of the ground metres shown, to 0.1 m."""
    page = open_html(map_html(document)).page
    readings = _hover(page, ground_m)
    shown_m = _metres(readings["ground"])
    assert shown_m == pytest.approx(ground_m, abs=3)
    assert _metres(readings["sheath"]) == pytest.approx(
        _expected_m(document, shown_m, "sheath"), abs=0.16
    )
    assert _metres(readings["glass"]) == pytest.approx(
        _expected_m(document, shown_m, "glass"), abs=0.16
    )
    assert readings["section"].startswith("S")
    assert readings["height"].endswith("m")
    assert readings["loss"].endswith("dB")


def test_a_stored_loop_shows_both_readings(open_html: Any, document: Row) -> None:
    """At a loop the sheath ruler steps by 15 m, and the name of the place is shown."""
    loop = next(row for row in document["stations"] if row["kind"] == "loop")
    page = open_html(map_html(document)).page
    readings = _hover(page, loop["ground_m"])
    assert readings["sheath"] == f"{loop['sheath_from_m']:.1f}\N{EN DASH}{loop['sheath_to_m']:.1f}m"
    tip = page.locator(".tip").inner_text()
    assert loop["name"] in tip
    assert "slack loop" in tip


def test_map_and_strip_chart_move_together(open_html: Any, document: Row) -> None:
    """A pointer on the map moves the chart, and a pointer on the chart moves the map."""
    page = open_html(map_html(document)).page
    _hover(page, 9_137.0)
    assert page.evaluate("runSheet.strip.ground") == pytest.approx(9_137_000, abs=3000)
    box = page.locator("#strip-pointer").bounding_box()
    x = page.evaluate("runSheet.strip.xAt(16_204_000)")
    page.mouse.move(box["x"] + x, box["y"] + 60)
    assert _metres(_readings(page)["ground"]) == pytest.approx(16_204, abs=20)
    marker = page.locator(".pointer").bounding_box()
    spot = page.evaluate(SPOT, page.evaluate("runSheet.last().ground"))
    assert marker["x"] + marker["width"] / 2 == pytest.approx(spot[0], abs=1.5)
    assert marker["y"] + marker["height"] / 2 == pytest.approx(spot[1], abs=1.5)


def test_the_keyboard_moves_along_the_way(open_html: Any, document: Row) -> None:
    """Arrow keys on the chart step along the leg."""
    page = open_html(map_html(document)).page
    page.focus("#strip-pointer")
    page.keyboard.press("ArrowRight")
    page.keyboard.press("ArrowRight")
    assert page.evaluate("runSheet.last().ground") == pytest.approx(200_000, abs=100)


@pytest.mark.parametrize("layer", ["site", "joint", "loop", "reach", "crossing"])
def test_a_layer_switches_off_and_on(open_html: Any, document: Row, layer: str) -> None:
    """A row of the legend takes its points off the map and puts them back."""
    page = open_html(map_html(document)).page
    before = _counts(page)
    assert before[layer] > 0
    _switch(page, layer)
    assert _counts(page)[layer] == 0
    _switch(page, layer)
    assert _counts(page) == before


def test_all_reach_points_appear_close_up(open_html: Any, document: Row) -> None:
    """Thinned from afar so that symbols don't cover each other, all are drawn close up."""
    page = open_html(map_html(document)).page
    page.evaluate(LOOK_AT, 9_000_000)
    page.evaluate("runSheet.map.setZoom(15, { animate: false })")
    seen = page.evaluate(
        """runSheet.run.legs[0].points.filter((point) => {
        const [x, y] = runSheet.layer.place(point.at, runSheet.layer.view());
        return point.code >= 6 && runSheet.layer.inside(x, y); }).length"""
    )
    assert _counts(page)["reach"] == seen > 5


@pytest.mark.parametrize("width", [1280, 390])
def test_hostile_names_stay_text(open_html: Any, hostile_document: Row, width: int) -> None:
    """No dialog, no new element, no request; the names are there to be read as text."""
    page = open_html(map_html(hostile_document), width=width, height=800).page
    _hover(page, 0.0)
    assert page.locator(".tip").inner_text().startswith(HOSTILE_NAMES[0])
    assert page.locator("h1").inner_text() == HOSTILE_NAMES[2]
    assert page.title() == HOSTILE_NAMES[2]
    assert page.evaluate("document.querySelectorAll('img, iframe, [onerror]').length") == 0
    assert _readings(page)["way"] == "indoor"


def test_the_policy_stops_a_script_that_is_not_the_page_own(open_html: Any, document: Row) -> None:
    """Even markup put into the page by a mistake of ours would not run."""
    opened = open_html(map_html(document))
    opened.page.evaluate(
        """() => { const box = document.createElement("div");
        box.innerHTML = '<img src="data:," onerror="window.wasRun = true">';
        document.body.append(box);
        const script = document.createElement("script");
        script.textContent = "window.wasRun = true";
        document.body.append(script); }"""
    )
    opened.page.wait_for_timeout(100)
    assert opened.page.evaluate("window.wasRun") is None
    assert any("Content Security Policy" in line for line in opened.log)
    opened.log.clear()


def test_a_phone_shows_everything_without_sideways_scrolling(open_html: Any, document: Row) -> None:
    """At 390 pixels nothing overflows, the legend is folded, and a tap reads the rulers."""
    page = open_html(map_html(document), width=390, height=844, touch=True).page
    assert page.evaluate("document.documentElement.scrollWidth") == 390
    assert page.evaluate("document.documentElement.scrollHeight") == 844
    assert page.evaluate("document.querySelector('.legend').open") is False
    page.touchscreen.tap(*page.evaluate(SPOT, 9_137_000))
    page.wait_for_timeout(400)
    assert _metres(_readings(page)["ground"]) == pytest.approx(9_137, abs=250)
    assert page.locator(".folium-map").bounding_box()["height"] > 300


def test_us_units_show_feet_beside_metres(open_html: Any, document: Row) -> None:
    """Every reading has its feet in brackets."""
    document["units"] = "us"
    page = open_html(map_html(document)).page
    readings = _hover(page, 9_137.0)
    assert all("ft)" in readings[name] for name in ("ground", "sheath", "glass", "height"))


@pytest.mark.parametrize(("units", "width"), [("metric", 1280), ("us", 1280), ("us", 390)])
def test_readings_never_move_the_map(open_html: Any, document: Row, units: str, width: int) -> None:
    """Whatever is read, the map keeps its size: it must not slip away under the pointer."""
    document["units"] = units
    page = open_html(map_html(document), width=width, height=844).page
    size = page.locator(".folium-map").bounding_box()
    loop = next(row for row in document["stations"] if row["kind"] == "loop")
    for ground_m in (0.0, loop["ground_m"], 9_137.0, 20_000.0):
        page.evaluate("(ground) => runSheet.show({ leg: 0, ground })", ground_m * 1000)
        assert page.locator(".folium-map").bounding_box() == size


def test_the_drawing_stays_sharp_after_a_jump(open_html: Any, document: Row) -> None:
    """The canvas lies on whole pixels whatever the view was set to."""
    page = open_html(map_html(document)).page
    page.evaluate(LOOK_AT, 3_210_000)
    moved = page.evaluate("document.getElementById('run-canvas').style.transform")
    assert re.fullmatch(r"translate3d\(-?\d+px, -?\d+px, 0px\)", moved)


def test_a_run_over_the_antimeridian_is_drawn_in_one_piece(open_html: Any, document: Row) -> None:
    """Moved to 180 degrees, the run still fills the view and hover still reads."""
    for row in (*document["nodes"], *document["joints"], *document["stations"]):
        row["lon"] = (row["lon"] + 211.3 + 180) % 360 - 180
    for vertex in document["legs"][0]["line"]:
        vertex[0] = (vertex[0] + 211.3 + 180) % 360 - 180
    document["areas"] = []
    page = open_html(map_html(document)).page
    assert page.evaluate("runSheet.map.getZoom()") > 8
    assert _counts(page)["lines"] == len(document["legs"][0]["stretches"])
    assert _metres(_hover(page, 14_137.0)["ground"]) == pytest.approx(14_137, abs=3)


def test_each_leg_has_its_strip_chart(open_html: Any, document: Row) -> None:
    """With two legs, pointing at the second brings up its chart."""
    second = made_up_run(length_m=10_000)
    second["legs"][0]["name"] = "Leg 2"
    for vertex in second["legs"][0]["line"]:
        vertex[1] += 0.1
    for station in second["stations"]:
        station["leg"] = "Leg 2"
        station["lat"] += 0.1
    document["legs"] += second["legs"]
    document["stations"] += second["stations"]
    page = open_html(map_html(document)).page
    assert page.locator('select[data-choice="leg"] option').count() == 2
    page.select_option('select[data-choice="leg"]', "1")
    assert page.evaluate("runSheet.strip.leg.length") == 10_000_000
    assert page.evaluate("runSheet.strip.curves.length") == 0
    page.mouse.move(*page.evaluate(SPOT, 3_000_000))
    assert page.evaluate("runSheet.strip.leg.name") == "Leg 1"


def test_a_run_without_heights_or_loss_still_opens(open_html: Any, document: Row) -> None:
    """Only the ways and joints are charted then, and the readings say so with a dash."""
    for vertex in document["legs"][0]["line"]:
        vertex[2] = None
    for circuit in document["circuits"]:
        del circuit["power"]
    readings = _hover(open_html(map_html(document)).page, 9_137.0)
    assert (readings["height"], readings["loss"]) == ("\N{EN DASH}", "\N{EN DASH}")


def test_a_background_is_drawn_under_the_way(open_html: Any, document: Row) -> None:
    """Streets given with the run are drawn, and can be switched off."""
    start, end = document["legs"][0]["line"][0], document["legs"][0]["line"][-1]
    document["background"] = [[[start[0], end[1]], [end[0], end[1] + 0.01]]]
    page = open_html(map_html(document)).page
    assert page.locator('input[data-layer="background"]').count() == 1
    before = page.evaluate(GREY)
    _switch(page, "background")
    assert page.evaluate(GREY) < before


def test_the_pictures_of_light_unfold_below_the_map(open_html: Any) -> None:
    """Every circuit's pictures are in the page, folded away until they are asked for."""
    document = plan_document(plan(read_run(DEMO)))
    page = open_html(map_html(document)).page
    drawn = page.locator(".foot .light figure svg")
    assert drawn.count() == 4  # attenuation and power of each of the two circuits
    assert not drawn.first.is_visible()
    page.click(".foot .light summary")
    assert drawn.first.is_visible()
