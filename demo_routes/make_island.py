"""Make the invented island Ostrellan again: python demo_routes/make_island.py [--out FOLDER]."""

from __future__ import annotations

import argparse
from pathlib import Path

from island.geojson import coast_text, lines_text, link_text, streets_text
from island.raster import crs_text, raster_text

__all__ = ["main", "write_island"]

_FILES = {
    "island/coast.geojson": coast_text,
    "island/lines.geojson": lines_text,
    "island/streets.geojson": streets_text,
    "island/terrain.asc": raster_text,
    "island/terrain.prj": crs_text,
    "quenmoor_link/route.geojson": link_text,
}


def write_island(folder: Path) -> list[Path]:
    """Write every made file below a folder and return their paths; nothing else is touched."""
    written = []
    for name, text in _FILES.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text().encode())
        written.append(path)
    return written


def main(arguments: list[str] | None = None) -> int:
    """Write the island where the command line says, beside this script if it says nothing."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, default=Path(__file__).parent, metavar="FOLDER")
    for path in write_island(parser.parse_args(arguments).out):
        print(f"{path} ({path.stat().st_size:,} bytes)")
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
