"""Make the maps of the demo runs again: python demo_routes/build_maps.py [--no-pictures]."""

from __future__ import annotations

import argparse
import json
import re
import shutil
from collections.abc import Iterator, Sequence
from importlib.util import find_spec
from pathlib import Path

from routeplan import plan, read_run
from routeplan.sheets.write import make_sheets

__all__ = ["data_text", "demo_runs", "main", "map_text", "take_picture"]

_HERE = Path(__file__).parent
_BROWSERS = ("chromium", "chromium-browser", "google-chrome", "chrome", "msedge")
_WIDTH, _HEIGHT = 1280, 800
_POINTER = (860, 680)  # over the strip chart, so that the readings show a place on the way


def demo_runs() -> Iterator[Path]:
    """Yield the folder of every demo run, in order of their names."""
    yield from sorted(path.parent for path in _HERE.glob("*/run.toml"))


def map_text(run: Path) -> str:
    """Return the map of a run as a page."""
    return make_sheets(plan(read_run(run)))["map.html"]


def data_text(page: str) -> str:
    """Return the data a map page draws from, one entry of its own a line."""
    found = re.search(
        r'<script type="application/json" id="run-data">(.*?)</script>', page, re.DOTALL
    )
    assert found is not None
    data: dict[str, object] = json.loads(found[1])
    lines = (
        f"{json.dumps(key)}: {json.dumps(value, ensure_ascii=False)}" for key, value in data.items()
    )
    return "{\n" + ",\n".join(lines) + "\n}\n"


def take_picture(page: Path, picture: Path) -> bool:
    """Take a picture of a page, offline; False where there is no browser or no playwright."""
    browser = next(filter(None, map(shutil.which, _BROWSERS)), None)
    if browser is None or find_spec("playwright") is None:
        return False
    from playwright.sync_api import sync_playwright

    with sync_playwright() as started:
        # The one page opened is of our own making, and root cannot run a sandbox.
        chromium = started.chromium.launch(executable_path=browser, args=["--no-sandbox"])
        context = chromium.new_context(viewport={"width": _WIDTH, "height": _HEIGHT}, offline=True)
        shown = context.new_page()
        shown.goto(page.absolute().as_uri())
        shown.mouse.move(*_POINTER)
        shown.wait_for_timeout(1000)
        shown.screenshot(path=picture)
        chromium.close()
    return True


def main(arguments: Sequence[str] | None = None) -> int:
    """Write map and data of every demo run, and a picture of it where a browser is found."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, default=_HERE.parent / "maps", metavar="FOLDER")
    parser.add_argument("--no-pictures", action="store_true", help="write the pages only")
    asked = parser.parse_args(arguments)
    asked.out.mkdir(parents=True, exist_ok=True)
    for run in demo_runs():
        page = asked.out / f"{run.name}.html"
        text = map_text(run)
        page.write_text(text, "utf-8", newline="\n")
        data = page.with_suffix(".json")
        data.write_text(data_text(text), "utf-8", newline="\n")
        print(page, data, sep="\n")
        if not asked.no_pictures:
            picture = page.with_suffix(".png")
            print(
                picture
                if take_picture(page, picture)
                else "no picture: it takes playwright and a Chromium"
            )
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
