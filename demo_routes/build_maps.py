"""Make the maps of the demo runs again: python demo_routes/build_maps.py [--no-pictures]."""

from __future__ import annotations

import argparse
import shutil
import subprocess
import tempfile
from collections.abc import Iterator, Sequence
from pathlib import Path

from routeplan import plan, read_run
from routeplan.sheets.write import make_sheets

__all__ = ["demo_runs", "main", "map_text", "take_picture"]

_HERE = Path(__file__).parent
_BROWSERS = ("chromium", "chromium-browser", "google-chrome", "chrome", "msedge")
_SIZE = (1280, 800)


def demo_runs() -> Iterator[Path]:
    """Yield the folder of every demo run, in order of their names."""
    yield from sorted(path.parent for path in _HERE.glob("*/run.toml"))


def map_text(run: Path) -> str:
    """Return the map of a run as a page."""
    return make_sheets(plan(read_run(run)))["map.html"]


def take_picture(page: Path, picture: Path) -> bool:
    """Take a picture of a page with the browser there is, offline; False if there is none."""
    browser = next(filter(None, map(shutil.which, _BROWSERS)), None)
    if browser is None:
        return False
    with tempfile.TemporaryDirectory() as profile:
        options = [
            "--headless=new",
            "--no-sandbox",  # it opens one page of our own making, and root cannot run it otherwise
            "--disable-gpu",
            "--hide-scrollbars",
            "--proxy-server=127.0.0.1:9",  # nothing listens there: no network
            f"--user-data-dir={profile}",
            f"--window-size={_SIZE[0]},{_SIZE[1]}",
            "--virtual-time-budget=5000",
            f"--screenshot={picture.absolute()}",
        ]
        subprocess.run(
            [browser, *options, page.absolute().as_uri()],
            check=True,
            capture_output=True,
            stdin=subprocess.DEVNULL,
            timeout=120,
        )
    return True


def main(arguments: Sequence[str] | None = None) -> int:
    """Write the map of every demo run, and a picture of it where a browser is found."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, default=_HERE.parent / "maps", metavar="FOLDER")
    parser.add_argument("--no-pictures", action="store_true", help="write the pages only")
    asked = parser.parse_args(arguments)
    asked.out.mkdir(parents=True, exist_ok=True)
    for run in demo_runs():
        page = asked.out / f"{run.name}.html"
        page.write_text(map_text(run), "utf-8", newline="\n")
        print(page)
        if not asked.no_pictures:
            picture = page.with_suffix(".png")
            print(picture if take_picture(page, picture) else "no browser found: no picture")
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
