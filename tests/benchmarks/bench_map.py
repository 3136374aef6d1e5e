"""
How a map of 5,000 points compares with one folium marker per point, in one run.

Prints three ratios: time to write the page, size of the page, and time until Chromium, its network
off, has the page ready. Both pages carry the same points and texts and the same local Leaflet, so
that neither waits for a network. Run it from the top of the repository:

    python tests/benchmarks/bench_map.py
"""

from __future__ import annotations

import argparse
import re
import shutil
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from routeplan.sheets.map import _leaflet_css, _leaflet_js, map_html
from tests.sheets.made_up_run import Row, made_up_run

READY = "window.loaded === true || document.documentElement.dataset.ready === 'yes'"


def run_of(points_count: int) -> Row:
    """Return a run whose stations are as many as asked for, most of them reach points."""
    document = made_up_run(length_m=points_count * 20, step_m=20, reach_step_m=20)
    kinds = {row["kind"] for row in document["stations"]}
    assert {"site", "joint", "loop", "reach"} <= kinds
    return document


def marker_map_html(document: Row) -> str:
    """Return a page with one folium marker and popup for each station."""
    import folium

    leg = document["legs"][0]
    page = folium.Map(location=leg["line"][0][1::-1], tiles=None)
    folium.PolyLine([(lat, lon) for lon, lat, _ in leg["line"]]).add_to(page)
    for row in document["stations"]:
        text = (
            f"{row['name']}: ground {row['ground_m']} m, sheath {row['sheath_from_m']} m, "
            f"glass {row['glass_from_m']} m, {row['section']} {row['section_m']} m"
        )
        folium.Marker((row["lat"], row["lon"]), popup=text).add_to(page)
    return _offline(page.get_root().render())


def _offline(html: str) -> str:
    """Return the marker page with the same local Leaflet in place of its links, and a flag."""
    html = re.sub(r'<script src="[^"]*"></script>|<link rel="stylesheet"[^>]*>', "", html)
    shim = (
        "window.$ = (html) => { const box = document.createElement('template');"
        "box.innerHTML = html.trim(); return [box.content.firstChild]; };"
        "L.Icon.Default.imagePath = 'data:,';"
    )
    head = f"<head><style>{_leaflet_css()}</style><script>{_leaflet_js()};{shim}</script>"
    end = "<script>requestAnimationFrame(() => { window.loaded = true; });</script></html>"
    return html.replace("<head>", head, 1).replace("</html>", end)


def write_s(make: Callable[[Row], str], document: Row, repeats: int) -> tuple[float, str]:
    """Return the median time to make a page, and the page; the first making is not counted."""
    html = make(document)
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        html = make(document)
        times.append(time.perf_counter() - start)
    return statistics.median(times), html


def ready_s(html: str, repeats: int) -> float | None:
    """Return the median time until the page is ready in Chromium; None if there is none."""
    path = shutil.which("chromium") or shutil.which("google-chrome")
    if path is None:
        return None
    from playwright.sync_api import sync_playwright

    with tempfile.TemporaryDirectory() as folder, sync_playwright() as playwright:
        file = Path(folder) / "map.html"
        file.write_text(html, "utf-8")
        browser = playwright.chromium.launch(executable_path=path)
        times = []
        for _ in range(repeats):
            context = browser.new_context(offline=True, viewport={"width": 1280, "height": 860})
            page = context.new_page()
            start = time.perf_counter()
            page.goto(file.as_uri(), timeout=120_000)
            page.wait_for_function(READY, timeout=120_000)
            times.append(time.perf_counter() - start)
            context.close()
        browser.close()
    return statistics.median(times)


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__.strip().splitlines()[0])
    parser.add_argument("--points", type=int, default=5000)
    parser.add_argument("--repeats", type=int, default=3)
    wanted = parser.parse_args()
    document = run_of(wanted.points)
    print(f"{len(document['stations'])} stations on {len(document['legs'][0]['line'])} vertices")
    ours_s, ours = write_s(map_html, document, wanted.repeats)
    theirs_s, theirs = write_s(marker_map_html, document, 1)
    print(f"write  {ours_s * 1e3:9.1f} ms  {theirs_s * 1e3:9.1f} ms  {theirs_s / ours_s:6.1f} x")
    print(
        f"size   {len(ours) / 1e6:9.2f} MB  {len(theirs) / 1e6:9.2f} MB  "
        f"{len(theirs) / len(ours):6.1f} x"
    )
    ours_ready_s, theirs_ready_s = ready_s(ours, wanted.repeats), ready_s(theirs, wanted.repeats)
    if ours_ready_s is None or theirs_ready_s is None:
        print("ready  no Chromium on this machine")
        return
    print(
        f"ready  {ours_ready_s * 1e3:9.1f} ms  {theirs_ready_s * 1e3:9.1f} ms  "
        f"{theirs_ready_s / ours_ready_s:6.1f} x"
    )


if __name__ == "__main__":
    main()
