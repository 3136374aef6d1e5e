"""What the properties of lines, points and polygons mean."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from typing import Any, TypeAlias

from routeplan.errors import GeometryError, Problem
from routeplan.run.datum import PlacedShape
from routeplan.run.model import (
    AREA_KINDS,
    CROSSES,
    PLACE_KINDS,
    PLACEMENTS,
    ROLES,
    Area,
    JointFitness,
    Line,
    Place,
    PlaceKind,
)
from routeplan.run.trouble import (
    Trouble,
    cleaned_text,
    is_plain_text,
    listed,
    nearest_hint,
    number_hint,
    one_of,
    shown,
)

__all__ = ["AREA_KEYS", "LINE_KEYS", "PLACE_KEYS", "area_from", "line_from", "place_from"]

Known: TypeAlias = dict[str, Any]

LINE_KEYS = ("name", "placement", "leg", "cable", "existing_m", "existing_db")
PLACE_KEYS = (
    "name",
    "kind",
    "role",
    "joint",
    "loop_m",
    "joint_cost_factor",
    "crosses",
    "width_m",
)
AREA_KEYS = ("name", "kind")

_WORDS: dict[str, tuple[str, ...]] = {
    "placement": PLACEMENTS,
    "kind": PLACE_KINDS,
    "role": ROLES,
    "joint": ("yes", "avoid", "no"),
    "crosses": CROSSES,
}
_BOUNDS = {  # sanity limits: lowest, whether it may be the lowest itself, highest
    "existing_m": (0.0, False, 1e6),
    "existing_db": (0.0, True, 100.0),
    "loop_m": (0.0, True, 1e4),
    "joint_cost_factor": (0.0, False, 1e4),
    "width_m": (0.0, True, 1e5),
}
_NAME_LONGEST = 500
_DBF_LONGEST = 10  # a shapefile cuts the names of its columns to this
_JOINTS: dict[PlaceKind, JointFitness] = {"pole": "avoid", "crossing": "no"}


@dataclass(frozen=True, slots=True, kw_only=True)
class _Reading:
    """What reading one feature's properties takes: where it is, and how strict to be."""

    where: str
    file: str
    loose: bool
    trouble: Trouble

    def fault(self, key: str, what: str, **facts: str) -> None:
        problem = Problem(where=f"{self.where}, {key}" if key else self.where, what=what, **facts)
        self.trouble.add(GeometryError, problem, file=self.file)


def line_from(placed: PlacedShape, *, loose: bool, placement: str, trouble: Trouble) -> Line | None:
    """
    Return the line a shape declares, or None if it has no length.

    Parameters
    ----------
    placed
        The shape on the earth.
    loose
        Whether the format carries numbers as text.
    placement
        The run's placement, for lines that do not say.
    trouble
        Where problems are noted.
    """
    shape = placed.shape
    reading = _Reading(
        where=str(shape.source), file=shape.source.file, loose=loose, trouble=trouble
    )
    if len(shape.xy) < 2:
        what = "is a line of no length: all its vertices are one point"
        reading.fault("", what, value=f"{shape.xy[0, 0]:.9g}, {shape.xy[0, 1]:.9g}")
        return None
    known, rest = _sorted_properties(shape.properties, LINE_KEYS, reading)
    own_placement = _word(known, "placement", reading)
    existing_m = _number(known, "existing_m", reading)
    existing_db = _number(known, "existing_db", reading)
    if (own_placement or placement) != "existing":
        for key, value in (("existing_m", existing_m), ("existing_db", existing_db)):
            if value is not None:
                what = "is for existing fibre only"
                said = own_placement or f"{placement} (the run's)"
                remedy = 'Give the line the placement "existing", or take the value out.'
                reading.fault(key, what, value=f"placement {said}", remedy=remedy)
    return Line(
        name=_name(known, "name", reading),
        lonlat=placed.lonlat,
        datum_lonlat=placed.datum_lonlat,
        semi_major_m=placed.semi_major_m,
        inverse_flattening=placed.inverse_flattening,
        heights_m=placed.heights_m,
        placement=own_placement,  # type: ignore[arg-type]
        leg=_name(known, "leg", reading) or None,
        cable=_name(known, "cable", reading) or None,
        existing_m=existing_m,
        existing_db=existing_db,
        is_track=shape.is_track,
        is_drawn=placed.is_drawn,
        properties=rest,
        source=shape.source,
    )


def place_from(placed: PlacedShape, *, number: int, loose: bool, trouble: Trouble) -> Place:
    """
    Return the place a point declares; a point that does not say is taken for a site.

    Parameters
    ----------
    placed
        The shape on the earth.
    number
        Its number among the points of the run, for one without a name.
    loose
        Whether the format carries numbers as text.
    trouble
        Where problems are noted.
    """
    shape = placed.shape
    reading = _Reading(
        where=str(shape.source), file=shape.source.file, loose=loose, trouble=trouble
    )
    known, rest = _sorted_properties(shape.properties, PLACE_KEYS, reading)
    role = _word(known, "role", reading)
    crosses = _word(known, "crosses", reading)
    kind = _word(known, "kind", reading) or ("crossing" if crosses and not role else "site")
    if not (role or crosses or "kind" in known):
        rest["kind_assumed"] = True
    width_m = _number(known, "width_m", reading)
    _check_place(kind, role=role, crosses=crosses, width_m=width_m, known=known, reading=reading)
    name = _place_name(known, kind, number, "kind_assumed" in rest, reading)
    height = None if placed.heights_m is None else float(placed.heights_m[0])
    factor = _number(known, "joint_cost_factor", reading)
    return Place(
        name=f"{name} ({shape.part})" if shape.part > 1 and known.get("name") else name,
        kind=kind,  # type: ignore[arg-type]
        role=role,
        lon=float(placed.lonlat[0, 0]),
        lat=float(placed.lonlat[0, 1]),
        height_m=None if height is None or math.isnan(height) else height,
        joint=_joint(kind, known, reading),
        joint_cost_factor=1.0 if factor is None else factor,
        loop_m=_number(known, "loop_m", reading),
        crosses=crosses,
        width_m=width_m,
        properties=rest,
        source=shape.source,
    )


def area_from(placed: PlacedShape, *, loose: bool, trouble: Trouble) -> Area | None:
    """Return the area a polygon declares, or None, with a warning, if it does not say its kind."""
    shape = placed.shape
    reading = _Reading(
        where=str(shape.source), file=shape.source.file, loose=loose, trouble=trouble
    )
    known, rest = _sorted_properties(shape.properties, AREA_KEYS, reading)
    if "kind" not in known:
        message = f"is a polygon without a kind ({listed(AREA_KINDS)}) and plays no part"
        trouble.warn(reading.where, message, file=reading.file)
        return None
    kind = _word(known, "kind", reading, words=AREA_KINDS)
    ends = (*shape.ring_starts[1:], len(placed.lonlat))
    rings = tuple(
        placed.lonlat[start:end] for start, end in zip(shape.ring_starts, ends, strict=True)
    )
    if any(len(ring) < 4 for ring in rings):
        reading.fault("", "is a polygon with a ring of fewer than four positions")
    if kind is None:
        return None
    return Area(
        name=_name(known, "name", reading),
        kind=kind,  # type: ignore[arg-type]
        rings=rings,
        properties=rest,
        source=shape.source,
    )


def _place_name(known: Known, kind: str, number: int, is_assumed: bool, reading: _Reading) -> str:
    return _name(known, "name", reading) or f"{'Point' if is_assumed else _spoken(kind)} {number}"


def _check_place(
    kind: str,
    *,
    role: str | None,
    crosses: str | None,
    width_m: float | None,
    known: Known,
    reading: _Reading,
) -> None:
    if role is not None and kind != "site":
        reading.fault("role", "is for sites only", value=f"{role} at a {_spoken(kind).lower()}")
    for key, value in (("crosses", crosses), ("width_m", width_m)):
        if value is not None and kind != "crossing":
            reading.fault(key, "is for crossings only", value=f"at a {_spoken(kind).lower()}")
    if kind == "crossing" and crosses is None and "crosses" not in known:
        reading.fault("", "is a crossing that does not say what it crosses", limit=one_of(CROSSES))


def _joint(kind: str, known: Known, reading: _Reading) -> JointFitness:
    given = _word(known, "joint", reading)
    usual = _JOINTS.get(kind, "yes")  # type: ignore[call-overload]
    if kind == "crossing" and given not in (None, "no"):
        reading.fault("joint", "cannot be allowed at a crossing", value=shown(given), limit="no")
    return given or usual  # type: ignore[return-value]


def _sorted_properties(
    properties: Mapping[str, object], keys: tuple[str, ...], reading: _Reading
) -> tuple[Known, dict[str, object]]:
    """Return what is known by its key, whatever its case, and everything else, made harmless."""
    known: Known = {}
    rest: dict[str, object] = {}
    exact = {key for key in properties if key in keys}
    for name, value in properties.items():
        key = name if name in exact else _key_of(name, keys, reading.loose)
        if key is None or (key in exact and name not in exact):
            rest[cleaned_text(name)] = _harmless(value)
        elif not _is_absent(value, reading.loose):
            known.setdefault(key, value)
    return known, rest


@cache
def _key_of(name: str, keys: tuple[str, ...], loose: bool) -> str | None:
    folded = name.strip().lower()
    if folded in keys:
        return folded
    if loose and len(folded) == _DBF_LONGEST:
        return next((key for key in keys if key[:_DBF_LONGEST] == folded), None)
    return None


def _is_absent(value: object, loose: bool) -> bool:
    if value is None:
        return True
    if isinstance(value, float) and math.isnan(value):
        return loose
    return isinstance(value, str) and loose and not value.strip()


def _harmless(value: object, depth: int = 0) -> object:
    """Return a value that JSON, and every sheet, can hold."""
    if isinstance(value, str):
        return cleaned_text(value)
    if value is None or isinstance(value, bool):
        return value
    if isinstance(value, int):
        return value if value.bit_length() <= 63 else shown(value)
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, dict) and depth < 10:
        return {cleaned_text(str(key)): _harmless(v, depth + 1) for key, v in value.items()}
    if isinstance(value, list | tuple) and depth < 10:
        return [_harmless(each, depth + 1) for each in value]
    return shown(value)


def _name(known: Known, key: str, reading: _Reading) -> str:
    value = known.get(key)
    if value is None:
        return ""
    if isinstance(value, int) and not isinstance(value, bool) and abs(value) < 10**18:
        return str(value)
    if isinstance(value, float) and reading.loose and value.is_integer() and abs(value) < 1e15:
        return str(int(value))
    if not isinstance(value, str):
        reading.fault(key, "is not text", value=shown(value))
        return ""
    if not is_plain_text(value):
        reading.fault(key, "holds characters that cannot be printed", value=shown(value))
        return ""
    text = " ".join(value.split())
    if len(text) > _NAME_LONGEST:
        reading.fault(
            key, "is too long", value=f"{len(text)} characters", limit=f"{_NAME_LONGEST} characters"
        )
    return text[:_NAME_LONGEST]


def _word(known: Known, key: str, reading: _Reading, *, words: tuple[str, ...] = ()) -> str | None:
    value = known.get(key)
    words = words or _WORDS[key]
    if value is None:
        return None
    if isinstance(value, str) and (word := _plain_word(value)) in words:
        return word
    reading.fault(
        key,
        f"is not a known {key}" if key != "crosses" else "is nothing known to be crossed",
        value=shown(value),
        limit=one_of(words),
        remedy=nearest_hint(value, words),
    )
    return None


def _plain_word(text: str) -> str:
    """Return text as the words of a choice are spelt: "Maintenance hole" is maintenance_hole."""
    return "_".join(text.casefold().replace("-", " ").replace("_", " ").split())


def _number(known: Known, key: str, reading: _Reading) -> float | None:
    value = known.get(key)
    if value is None:
        return None
    if isinstance(value, str) and reading.loose:
        value = _number_from(value)
    if isinstance(value, bool) or not isinstance(value, int | float):
        remedy = number_hint(value)
        reading.fault(key, "is not a number", value=shown(known[key]), remedy=remedy)
        return None
    low, may_be_low, high = _BOUNDS[key]
    unit = {"m": " m", "db": " dB"}.get(key.rsplit("_", 1)[1], "")
    if not (low <= value <= high) or (value == low and not may_be_low):
        bound = f"{'at least' if may_be_low else 'more than'} {low:g}{unit}, at most {high:g}{unit}"
        reading.fault(key, "is out of range", value=f"{shown(value)}{unit}", limit=bound)
        return None
    return float(value)


def _number_from(text: str) -> float | str:
    try:
        return float(text)
    except ValueError:
        return text


def _spoken(kind: str) -> str:
    return kind.replace("_", " ").capitalize()
