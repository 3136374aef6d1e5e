"""Seeded ways to spoil an input and leave its format whole: one value, row or member."""

from __future__ import annotations

import io
import json
import random
import re
import sqlite3
import zipfile
from pathlib import Path
from typing import Any

from tests.mutations import flipped, inserted, renumbered

ODD_NUMBERS = (0, -1, 1, 0.001, 1e-9, 2, 12, 400, 5000, 1e5, 1e6, 1e9, 1e308, 90, -180, 181.0)
ODD_VALUES: tuple[Any, ...] = (
    *(None, True, False, "", "x", "duct", "existing", "avoid", "no", "site", "crossing", "pole"),
    *("\u202e=x", "a\nb", "\x00", "yes" * 200, [], {}, [1], {"a": 1}, [[[]]], "G.657.A1"),
    *ODD_NUMBERS,
)
NUMBER = re.compile(r"(?<![\w.])-?\d+(\.\d+)?(?![\w.])")


def near(rng: random.Random, number: float) -> float:
    """Return a number of the same order, or an odd one."""
    return rng.choice(
        [number * rng.choice([0.1, 0.5, 0.9, 1.1, 2, 10])] * 5
        + [number + 1, -number, round(number), rng.choice(ODD_NUMBERS), rng.choice(ODD_NUMBERS)]
    )


def _nodes(value: Any, into: list[tuple[Any, Any]]) -> list[tuple[Any, Any]]:
    """Return every (container, key) of a nested value."""
    if isinstance(value, dict | list):
        for key in value if isinstance(value, dict) else range(len(value)):
            into.append((value, key))
            _nodes(value[key], into)
    return into


def inside_json(rng: random.Random, data: bytes) -> bytes:
    """Return JSON with some of its values changed, left out or put elsewhere."""
    tree = json.loads(data)
    for _ in range(rng.randint(1, 3)):
        nodes = _nodes(tree, [])
        if not nodes:
            break
        place, key = rng.choice(nodes)
        turn = rng.random()
        if turn < 0.4 and isinstance(place[key], int | float):
            place[key] = near(rng, place[key])
        elif turn < 0.55:
            del place[key]
        elif turn < 0.8:
            other, at = rng.choice(nodes)
            place[key] = json.loads(json.dumps(other[at])) if _holds(other, at) else None
        else:
            place[key] = rng.choice(ODD_VALUES)
    return json.dumps(tree).encode()


def _holds(place: Any, key: Any) -> bool:
    return key in place if isinstance(place, dict) else key < len(place)


def inside_text(rng: random.Random, data: bytes) -> bytes:
    """Return text with numbers changed to near ones, or lines left out, doubled or swapped."""
    lines = data.decode().split("\n")
    for _ in range(rng.choice([1, 1, 2])):
        at, other = rng.randrange(len(lines)), rng.randrange(len(lines))
        turn = rng.random()
        if turn < 0.7:
            with_number = [k for k, text in enumerate(lines) if NUMBER.search(text)]
            at = rng.choice(with_number or [0])
            found = list(NUMBER.finditer(lines[at]))
            if found:
                match = rng.choice(found)
                new = str(near(rng, float(match[0])))
                lines[at] = lines[at][: match.start()] + new + lines[at][match.end() :]
        elif turn < 0.8:
            del lines[at]
        elif turn < 0.9:
            lines.insert(other, lines[at])
        else:
            lines[at], lines[other] = lines[other], lines[at]
    return "\n".join(lines).encode()


def inside_zip(rng: random.Random, data: bytes) -> bytes:
    """Return a zip with one of its members spoilt, renamed or left out, and its sums right."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as archive, zipfile.ZipFile(out, "w") as spoilt:
        names = archive.namelist()
        chosen = rng.choice(names)
        for name in names:
            content = archive.read(name)
            new = name
            if name == chosen:
                turn = rng.random()
                if turn < 0.1:
                    continue
                if turn < 0.2:
                    new = rng.choice(["../x.shp", "x/y.shp", "seed.txt", "\u202e.shp", name])
                elif turn < 0.8:
                    content = flipped(rng, content, b"")
                else:
                    content = rng.choice([renumbered, inserted])(rng, content, b"")
            spoilt.writestr(zipfile.ZipInfo(new, (2024, 1, 1, 0, 0, 0)), content)
    return out.getvalue()


def inside_database(rng: random.Random, data: bytes, folder: Path) -> bytes:
    """Return a GeoPackage with some of its cells changed, geometries among them."""
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "spoilt.gpkg"
    path.write_bytes(data)
    with sqlite3.connect(path) as base:
        base.isolation_level = None
        for _ in range(rng.randint(1, 3)):
            table = rng.choice(["ways", "places", "gpkg_contents", "gpkg_geometry_columns"])
            columns = [row[1] for row in base.execute(f"PRAGMA table_info({table})")]
            column = rng.choice(columns)
            row, old = rng.choice(base.execute(f"SELECT rowid, {column} FROM {table}").fetchall())
            new: Any = rng.choice([None, "", "x", 0, -1, 1e308, 4326, b"", b"GP\x00\x01" * 5])
            if isinstance(old, bytes) and rng.random() < 0.8:
                new = flipped(rng, old, b"")
            try:
                base.execute(f"UPDATE {table} SET {column} = ? WHERE rowid = ?", (new, row))
            except sqlite3.Error:  # a trigger or a rule of the table's own
                continue
    base.close()
    spoilt = path.read_bytes()
    path.unlink()
    return spoilt


def mutated_inside(rng: random.Random, name: str, data: bytes, folder: Path) -> bytes:
    """Return an input of the file's format spoilt without breaking the format."""
    suffix = Path(name).suffix
    if suffix == ".geojson":
        return inside_json(rng, data)
    if suffix == ".zip":
        return inside_zip(rng, data)
    if suffix == ".gpkg":
        return inside_database(rng, data, folder)
    return inside_text(rng, data)
