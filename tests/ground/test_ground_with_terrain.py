"""A run with a terrain: its heights, its length, and what is said where they are not known."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from pyproj import CRS

from routeplan import plan, read_run
from routeplan.errors import GeometryError, InputError
from routeplan.memo import Memo
from routeplan.planning import assumptions
from tests.ground.runs_on_ground import planned_with, two_km, write_asc
from tests.sheets.plans import equator, line, write_run

TERRAIN = 'terrain = "hills.asc"\n'


def heights_said(planned: object) -> tuple[str, str, str]:
    """Return value, source and reason of what is assumed of the one leg's heights."""
    (said,) = [one for one in assumptions(planned) if one.name.startswith("heights of leg")]
    return str(said.value), said.source, said.reason


def test_a_tilted_plane_gives_its_slope_length(tmp_path: Path) -> None:
    """On an even slope of 10 % the ground is longer by the root of 1.01, however it is smoothed."""
    write_asc(tmp_path / "hills.asc", lambda at: 100.0 + 0.1 * at)
    (leg,) = planned_with(tmp_path, TERRAIN).ground.legs
    # R / (R + h) shortens no step and lengthens each by h / R: 200 m up that is 31 ppm.
    assert leg.length_mm / 1000 == pytest.approx(
        2_000 * np.sqrt(1.01) * (1 + 200 / 6.371e6), rel=4e-6
    )
    assert leg.heights_m is not None
    assert leg.heights_m[[0, -1]] == pytest.approx([100.0, 300.0], abs=0.05)
    assert leg.heights_from == ("terrain",)
    assert leg.smoothed_off_m == pytest.approx(0.0, abs=0.01)


def test_stations_of_the_raster_are_no_places(tmp_path: Path) -> None:
    """The profile has a height at every cell; the list of stations keeps the drawn vertices."""
    from routeplan.sheets.document import plan_document

    write_asc(tmp_path / "hills.asc", lambda at: 100.0 + 0.1 * at)
    planned = planned_with(tmp_path, TERRAIN)
    document = plan_document(planned)
    (leg,) = planned.ground.legs
    assert len(leg.lonlat) > 60
    assert leg.is_drawn is not None
    assert leg.is_drawn.sum() == 2
    vertices = [row for row in document["stations"] if row["kind"] == "vertex"]  # type: ignore[union-attr]
    assert vertices == []
    assert len(document["legs"][0]["line"]) == len(leg.lonlat)  # type: ignore[index,call-overload]


@pytest.mark.parametrize("placement", ["bridge", "water"])
def test_a_bridge_spans_the_valley(tmp_path: Path, placement: str) -> None:
    """Between the ends of a bridge the ground does not count."""
    write_asc(tmp_path / "hills.asc", lambda at: 200.0 - 100.0 * np.sin(np.pi * at / 2_000))
    (leg,) = planned_with(tmp_path, TERRAIN, two_km(placement=placement)).ground.legs
    assert leg.length_mm / 1000 == pytest.approx(2_000 * (1 + 200 / 6.371e6), abs=0.02)


def test_a_run_half_covered_is_level_on_the_other_half(tmp_path: Path) -> None:
    """Off the terrain a way keeps its ellipsoid length, and the stations are said."""
    write_asc(tmp_path / "hills.asc", lambda at: 0.1 * at, to_m=1_000.0)
    planned = planned_with(tmp_path, TERRAIN)
    (leg,) = planned.ground.legs
    assert leg.length_mm / 1000 == pytest.approx(1_000 * np.sqrt(1.01) + 1_000, abs=0.5)
    (said,) = [text for where, text in planned.warnings if "outside the terrain" in text]
    assert "to 20" in said
    assert "taken as level" in said
    assert np.isnan(leg.heights_m[-1])  # type: ignore[index]


def test_a_hole_is_bridged_and_said(tmp_path: Path) -> None:
    """Over a void of the raster heights go straight between those known."""
    write_asc(tmp_path / "hills.asc", lambda at: -9999.0 if 800 < at < 1_200 else 0.1 * at)
    planned = planned_with(tmp_path, TERRAIN)
    (leg,) = planned.ground.legs
    assert leg.length_mm / 1000 == pytest.approx(2_000 * np.sqrt(1.01), abs=0.1)
    (said,) = [text for where, text in planned.warnings if "has no height" in text]
    assert "taken straight between the known heights" in said


def test_noise_is_smoothed_and_said(tmp_path: Path) -> None:
    """Three metres of noise in every cell add no length, and a warning says what was taken off."""
    noise = iter(np.random.Generator(np.random.PCG64(3)).normal(0.0, 3.0, 500).tolist())
    write_asc(tmp_path / "hills.asc", lambda at: 100.0 + next(noise))
    planned = planned_with(tmp_path, TERRAIN)
    (leg,) = planned.ground.legs
    assert leg.length_mm / 1000 == pytest.approx(2_000, rel=0.001)
    assert leg.smoothed_off_m > 4.0
    assert any("smoothing took" in text for _, text in planned.warnings)
    rough = planned_with(tmp_path / "rough", f"{TERRAIN.replace('hills', '../hills')}"
                         "[ground]\nsmooth_wave_m = 0.0\n")  # fmt: skip
    assert rough.ground.legs[0].length_mm / 1000 == pytest.approx(
        leg.length_mm / 1000 + leg.smoothed_off_m, abs=0.01
    )


def test_heights_of_the_geometry_go_first(tmp_path: Path) -> None:
    """A line with heights keeps them, one without takes the terrain's, and both are said."""
    write_asc(tmp_path / "hills.asc", lambda at: 500.0)
    with_heights = line([[*equator(0), 10.0], [*equator(1_000), 30.0]], name="Low")
    without = line([equator(1_000), equator(2_000)], name="High")
    planned = planned_with(tmp_path, TERRAIN, with_heights, without)
    (leg,) = planned.ground.legs
    assert leg.heights_from == ("geometry", "terrain")
    assert leg.heights_m is not None
    assert leg.heights_m[0] == 10.0
    assert leg.heights_m[-1] == pytest.approx(500.0)
    assert heights_said(planned)[:2] == ("geometry and terrain", "geometry; hills.asc")
    alone = planned_with(tmp_path / "alone", TERRAIN.replace("hills", "../hills"), with_heights)
    assert heights_said(alone)[:2] == ("geometry", "geometry")


def test_steep_stretches_are_listed(tmp_path: Path) -> None:
    """A ramp of 20 % between level ground is the one stretch over 15 %."""
    write_asc(tmp_path / "hills.asc", lambda at: 0.2 * min(max(at - 600.0, 0.0), 800.0))
    (leg,) = planned_with(tmp_path, TERRAIN).ground.legs
    (steep,) = leg.steep
    assert steep.start_m == pytest.approx(600, abs=70)
    assert steep.end_m - steep.start_m == pytest.approx(816, abs=140)
    assert steep.slope_max_ratio == pytest.approx(0.2, abs=0.02)
    gentle = planned_with(
        tmp_path / "gentle", 'terrain = "../hills.asc"\n[ground]\nsteep_ratio = 0.25\n'
    )
    assert gentle.ground.legs[0].steep == ()


def test_a_track_takes_its_length_from_the_terrain(tmp_path: Path) -> None:
    """The noisy heights of a recorded track do not count unless the run file says so."""
    times = [f"2026-05-01T10:{minute:02d}:00Z" for minute in range(41)]
    points = "".join(
        f'<trkpt lat="0" lon="{equator(50.0 * at)[0]:.9f}"><ele>{100 + 5 * (at % 2)}</ele>'
        f"<time>{time}</time></trkpt>"
        for at, time in enumerate(times)
    )
    track = f'<gpx version="1.1" creator="x"><trk><trkseg>{points}</trkseg></trk></gpx>'
    (tmp_path / "walk.gpx").write_text(track, "utf-8")
    write_asc(tmp_path / "hills.asc", lambda at: 0.1 * at)
    text = 'geometry = ["walk.gpx"]\nterrain = "hills.asc"\n'
    (tmp_path / "run.toml").write_text(text, "utf-8")
    (leg,) = plan(read_run(tmp_path)).ground.legs
    assert leg.heights_from == ("terrain",)
    assert leg.length_mm / 1000 == pytest.approx(2_000 * np.sqrt(1.01), rel=1e-4)
    counted = f"{text}[ground]\ntrack_heights = true\n[joining]\ntrack_tolerance_m = 0.0\n"
    (tmp_path / "run.toml").write_text(counted, "utf-8")
    (leg,) = plan(read_run(tmp_path)).ground.legs
    assert leg.heights_from == ("geometry",)
    assert leg.length_mm / 1000 == pytest.approx(40 * np.hypot(50.0, 5.0), rel=1e-4)


def test_a_terrain_elsewhere_is_an_error(tmp_path: Path) -> None:
    """A raster in the wrong zone covers no part of the run, which is said with both places."""
    utm = CRS.from_epsg(32633).to_wkt("WKT1_ESRI")
    path = write_asc(tmp_path / "hills.asc", lambda at: 10.0, crs=utm)
    text = path.read_text("utf-8").replace(f"cellsize {0.0003}", "cellsize 30.0")
    lines = text.splitlines()
    lines[2], lines[3] = "xllcorner 400000", "yllcorner 100000"
    path.write_text("\n".join(lines) + "\n", "utf-8")
    with pytest.raises(GeometryError, match="covers no part of the run"):
        planned_with(tmp_path, TERRAIN)


def test_what_cannot_be_a_terrain_is_an_error(tmp_path: Path) -> None:
    """No CRS, no such file, no raster: each is named."""
    write_asc(tmp_path / "hills.asc", lambda at: 10.0, crs="")
    with pytest.raises(GeometryError, match="does not say which CRS"):
        planned_with(tmp_path, TERRAIN)
    with pytest.raises(InputError, match=r"fells\.tif: is not there"):
        planned_with(tmp_path, 'terrain = ["fells.tif"]\n')
    with pytest.raises(InputError, match="no kind of raster"):
        planned_with(tmp_path, 'terrain = "route.geojson"\n')


def test_a_changed_raster_is_another_run(tmp_path: Path) -> None:
    """Heights changed under the same name change the digest, and are not taken from a memo."""
    write_asc(tmp_path / "hills.asc", lambda at: 100.0)
    path = write_run(tmp_path, [two_km()], TERRAIN)
    memo = Memo()
    level = plan(read_run(path), memo=memo)
    write_asc(tmp_path / "hills.asc", lambda at: 100.0 + 0.1 * at)
    steep = plan(read_run(path), memo=memo)
    assert level.run.digest != steep.run.digest
    assert steep.ground.legs[0].length_mm > level.ground.legs[0].length_mm + 9_000
    assert plan(read_run(path), memo=memo).ground is steep.ground


def test_a_way_drawn_the_other_way_is_as_long(tmp_path: Path) -> None:
    """Turning the line mirrors every station to the millimetre."""
    write_asc(tmp_path / "hills.asc", lambda at: 60.0 + 20.0 * np.sin(at / 150.0))
    there = planned_with(tmp_path, TERRAIN).ground.legs[0]
    turned = line([equator(2_000), equator(0)], name="Way", placement="duct")
    back = planned_with(tmp_path, TERRAIN, turned).ground.legs[0]
    assert (back.length_mm - back.ground_mm[::-1]).tolist() == there.ground_mm.tolist()
