"""What the route command is told: its options, and reading them with all their faults."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from routeplan.errors import InputError, Problem

if TYPE_CHECKING:
    from routeplan.streets.download import Request

__all__ = ["ROUTE_OPTIONS", "RouteOption", "RouteOrder", "Stop", "order_of"]


@dataclass(frozen=True, slots=True, kw_only=True)
class RouteOption:
    """One option of the command; one without a `metavar` is a switch."""

    label: str
    metavar: str = ""
    is_repeated: bool = False
    text: str

    @property
    def key(self) -> str:
        """The name its value is given under."""
        return self.label.removeprefix("--").replace("-", "_")


ROUTE_OPTIONS = (
    RouteOption(
        label="--streets",
        metavar="FILE",
        is_repeated=True,
        text="streets: .osm, .osm.pbf, .osm.bz2, .graphml or any line layer; may be given again",
    ),
    RouteOption(label="--place", metavar="NAME", text="download the streets of a place instead"),
    RouteOption(label="--box", metavar="W,S,E,N", text="download the streets of a box, in degrees"),
    RouteOption(label="--radius-m", metavar="M", text="download the streets so far round FROM"),
    RouteOption(label="--deadline-s", metavar="S", text="give a download up after (default: 120)"),
    RouteOption(
        label="--existing",
        metavar="FILE",
        is_repeated=True,
        text="duct routes or pole lines that are there already, used at their own price",
    ),
    RouteOption(
        label="--existing-placement",
        metavar="PLACEMENT",
        text="what existing routes are that do not say (default: duct)",
    ),
    RouteOption(label="--crs", metavar="CRS", text="CRS of files that do not say"),
    RouteOption(
        label="--node-lines", text="put a junction wherever lines of a layer cross or touch"
    ),
    RouteOption(
        label="--through", metavar="PLACE", is_repeated=True, text="a place to pass, in order"
    ),
    RouteOption(
        label="--join",
        metavar="PLACE",
        is_repeated=True,
        text="a further site: all are joined by one tree at least total cost",
    ),
    RouteOption(label="--ways", metavar="N", text="how many sensibly different ways (default: 1)"),
    RouteOption(
        label="--separate",
        metavar="WHAT",
        text="two ways that share no streets, or no junctions either: streets or junctions",
    ),
    RouteOption(
        label="--share-least", text="let two separate ways share what every way has to take"
    ),
    RouteOption(
        label="--apart-m", metavar="M", text="drive two separate ways so far apart where possible"
    ),
    RouteOption(
        label="--avoid", metavar="FILE", is_repeated=True, text="polygons no street in is used"
    ),
    RouteOption(
        label="--keep-to", metavar="FILE", is_repeated=True, text="polygons streets are used in"
    ),
    RouteOption(
        label="--cost",
        metavar="NAME=VALUE",
        is_repeated=True,
        text="a price of table `street_costs`, such as road.primary=2.5 or crossing.rail=500",
    ),
    RouteOption(
        label="--placement",
        metavar="PLACEMENT",
        text="how cable lies along streets (default: by road class)",
    ),
    RouteOption(
        label="--off-street-max-m",
        metavar="M",
        text="longest walk from a site to its street (default: 500)",
    ),
    RouteOption(label="--run", metavar="RUN", text="a run whose site names FROM and TO may be"),
    RouteOption(
        label="--out", metavar="FILE", text="geometry file to write (default: route.geojson)"
    ),
    RouteOption(label="--force", text="write over files that are there"),
    RouteOption(label="--no-plan", text="only find ways: do not plan each for joints and loss"),
    RouteOption(label="--no-map", text="do not write a map of the ways"),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Stop:
    """A site: its name, place and, from a run, its role."""

    name: str
    lon: float
    lat: float
    role: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class RouteOrder:
    """What the command is to do."""

    stops: tuple[Stop, ...]
    streets: tuple[Path, ...]
    request: Request | None
    deadline_s: float
    existing: tuple[Path, ...]
    existing_placement: str
    crs: str | None
    is_noded: bool
    way_count: int
    separate: Literal["streets", "junctions"] | None
    share: Literal["never", "least"]
    apart_m: float | None
    is_tree: bool
    avoid: tuple[Path, ...]
    keep_to: tuple[Path, ...]
    costs: Mapping[str, float]
    placement: str | None
    off_street_max_m: float
    out: Path
    is_forced: bool
    is_planned: bool
    is_drawn: bool


def order_of(given: Mapping[str, Any]) -> RouteOrder:
    """
    Return what the command is to do.

    Parameters
    ----------
    given
        The arguments by name: `start`, `end`, and the options' keys.

    Raises
    ------
    InputError
        With everything that is wrong with them.
    """
    problems: list[Problem] = []
    known = _run_sites(given.get("run"))
    through, join = given.get("through") or (), given.get("join") or ()
    stops = _stops([given["start"], *through, given["end"], *join], known, problems)
    _check_choices(given, problems)
    separate = given.get("separate")
    box = _box(given.get("box"), problems)
    radius_m = _number(given, "radius_m", None, problems)
    numbers = {
        "deadline_s": _number(given, "deadline_s", 120.0, problems),
        "apart_m": _number(given, "apart_m", None, problems),
        "off_street_max_m": _number(given, "off_street_max_m", 500.0, problems),
        "ways": _number(given, "ways", 1.0, problems),
    }
    costs = _costs(given.get("cost") or (), problems)
    if problems:
        raise InputError(problems)
    return RouteOrder(
        stops=tuple(stops),
        streets=tuple(map(Path, given.get("streets") or ())),
        request=_request(given.get("place"), box, radius_m, stops[0]),
        deadline_s=numbers["deadline_s"] or 120.0,
        existing=tuple(map(Path, given.get("existing") or ())),
        existing_placement=given.get("existing_placement") or "duct",
        crs=given.get("crs"),
        is_noded=bool(given.get("node_lines")),
        way_count=int(numbers["ways"] or 1),
        separate=separate,
        share="least" if given.get("share_least") else "never",
        apart_m=numbers["apart_m"],
        is_tree=bool(join),
        avoid=tuple(map(Path, given.get("avoid") or ())),
        keep_to=tuple(map(Path, given.get("keep_to") or ())),
        costs=costs,
        placement=given.get("placement"),
        off_street_max_m=numbers["off_street_max_m"] or 500.0,
        out=Path(given.get("out") or "route.geojson"),
        is_forced=bool(given.get("force")),
        is_planned=not given.get("no_plan"),
        is_drawn=not given.get("no_map"),
    )


def _run_sites(run: str | None) -> dict[str, Stop]:
    """Return the sites of a run by name."""
    if run is None:
        return {}
    from routeplan.run import read_run

    return {
        place.name: Stop(name=place.name, lon=place.lon, lat=place.lat, role=place.role)
        for place in read_run(run).places
        if place.kind == "site"
    }


def _stops(texts: Sequence[str], known: Mapping[str, Stop], problems: list[Problem]) -> list[Stop]:
    """Return the sites in order; those without a name are called A, B and so on."""
    stops: list[Stop] = []
    for number, text in enumerate(texts):
        usual = chr(ord("A") + number) if number < 26 else f"P{number + 1}"
        stop = known.get(text) or _stop(text, usual)
        if stop is None:
            problems.append(_no_place(text, known))
        elif any(other.name == stop.name for other in stops):
            problems.append(Problem(where=stop.name, what="is the name of two places given"))
        else:
            stops.append(stop)
    return stops


def _stop(text: str, usual: str) -> Stop | None:
    name, equals, place = text.rpartition("=")
    numbers = _floats(place)
    if numbers is None or len(numbers) != 2:
        return None
    title = " ".join(name.split()) if equals and name.strip() else usual
    if not title.isprintable() or len(title) > 200:
        return None
    return Stop(name=title, lon=numbers[0], lat=numbers[1])


def _floats(text: str) -> list[float] | None:
    try:
        numbers = [float(part) for part in text.split(",")]
    except ValueError:
        return None
    return numbers if all(map(math.isfinite, numbers)) else None


def _no_place(text: str, known: Mapping[str, Stop]) -> Problem:
    from routeplan.run.trouble import nearest_hint, shown

    return Problem(
        where="place",
        what="is neither LON,LAT in degrees nor a site of --run",
        value=shown(text),
        remedy=nearest_hint(text, known) or "For example 24.94,60.17 or Studio=24.94,60.17.",
    )


def _check_choices(given: Mapping[str, Any], problems: list[Problem]) -> None:
    """Note what does not go together."""
    sources = [key for key in ("streets", "place", "box", "radius_m") if given.get(key)]
    if len(sources) != 1:
        problems.append(
            Problem(
                where="command line",
                what="takes one source of streets",
                value=f"{len(sources)} given",
                remedy="Give --streets FILE, or one of --place, --box and --radius-m to download.",
            )
        )
    separate = given.get("separate")
    if separate not in (None, "streets", "junctions"):
        problems.append(
            Problem(
                where="--separate",
                what="is not a known rule",
                value=str(separate)[:80],
                limit="one of streets, junctions",
            )
        )
    asked = [
        label
        for label, is_asked in (
            ("--ways", given.get("ways") not in (None, "1")),
            ("--separate", separate is not None),
            ("--join", bool(given.get("join"))),
        )
        if is_asked
    ]
    if len(asked) > 1:
        problems.append(
            Problem(where="command line", what=f"{' and '.join(asked)} do not go together")
        )
    for key, needs in (("share_least", "separate"), ("apart_m", "separate")):
        if given.get(key) and separate is None:
            label = "--" + key.replace("_", "-")
            problems.append(Problem(where=label, what=f"is for --{needs} only"))
    if given.get("through") and (separate is not None or given.get("join")):
        problems.append(
            Problem(where="--through", what="does not go together with --separate or --join")
        )


def _number(
    given: Mapping[str, Any], key: str, usual: float | None, problems: list[Problem]
) -> float | None:
    text = given.get(key)
    if text is None:
        return usual
    numbers = _floats(str(text))
    is_whole = key != "ways" or (numbers is not None and numbers[0].is_integer())
    if numbers is None or len(numbers) != 1 or not 0.0 < numbers[0] <= 1e6 or not is_whole:
        problems.append(
            Problem(
                where="--" + key.replace("_", "-"),
                what="is not a number that makes sense here",
                value=str(text)[:80],
                limit="more than 0, at most 1 000 000",
            )
        )
        return usual
    return numbers[0]


def _box(text: str | None, problems: list[Problem]) -> tuple[float, float, float, float] | None:
    if text is None:
        return None
    numbers = _floats(text)
    if numbers is None or len(numbers) != 4:
        problems.append(
            Problem(where="--box", what="is not west,south,east,north in degrees", value=text[:80])
        )
        return None
    west, south, east, north = numbers
    return west, south, east, north


def _costs(texts: Sequence[str], problems: list[Problem]) -> dict[str, float]:
    costs: dict[str, float] = {}
    for text in texts:
        name, equals, value = text.partition("=")
        try:
            number = float(value) if equals else math.nan
        except ValueError:
            number = math.nan
        if math.isnan(number):
            problems.append(
                Problem(
                    where="--cost",
                    what="is not NAME=VALUE",
                    value=text[:80],
                    remedy="For example road.primary=2.5; inf closes a class.",
                )
            )
        else:
            costs[name.strip()] = number
    return costs


def _request(
    place: str | None,
    box: tuple[float, float, float, float] | None,
    radius_m: float | None,
    start: Stop,
) -> Request | None:
    if place is None and box is None and radius_m is None:
        return None
    from routeplan.streets.download import Request

    if place is not None:
        return Request(by="place", place=place)
    if box is not None:
        return Request(by="box", box=box)
    assert radius_m is not None
    return Request(by="radius", lon=start.lon, lat=start.lat, radius_m=radius_m)
