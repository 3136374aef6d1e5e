"""What a run file says of ways along streets: where streets are, what they cost, which legs."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from typing import Annotated, Literal, TypeAlias

from pydantic import BeforeValidator, Field, Strict

from routeplan.errors import Problem
from routeplan.run.fields import AnyPlacement, Name, OwnPlacement, PositiveMetres, Section
from routeplan.run.trouble import is_plain_text, listed, nearest_hint, one_of, shown

__all__ = ["LegOrder", "StreetRules", "leg_problems", "stop_problems"]

_Text: TypeAlias = Annotated[str, Field(min_length=1)]
_Price: TypeAlias = Annotated[float, Field(ge=0, allow_inf_nan=True)]
_Texts: TypeAlias = Annotated[tuple[_Text, ...], Strict(False)]


def _dotted(value: object) -> object:
    """Return a table of prices with `road.primary` for a table `road` with `primary` in it."""
    if not isinstance(value, Mapping):
        return value
    flat: dict[str, object] = {}
    for key, entry in value.items():
        if isinstance(entry, Mapping):
            flat.update({f"{key}.{inner}": price for inner, price in entry.items()})
        else:
            flat[str(key)] = entry
    return flat


class StreetRules(Section):
    """Where ways of legs are found, and what they cost."""

    files: _Texts = Field(
        min_length=1,
        description="Streets: .osm, .osm.pbf, .osm.bz2, .graphml or any layer of lines.",
    )
    existing: _Texts = Field(
        default=(), description="Duct routes and pole lines that are there, at their own price."
    )
    existing_placement: AnyPlacement = Field(
        default="duct", description="What existing routes are that do not say; left out: duct."
    )
    node_lines: bool = Field(
        default=False, description="Whether there is a junction wherever lines cross or touch."
    )
    avoid: _Texts = Field(default=(), description="Files of polygons no street in is used.")
    keep_to: _Texts = Field(default=(), description="Files of polygons streets are used in.")
    placement: OwnPlacement | None = Field(
        default=None, description="How cable lies along streets; left out: by road class."
    )
    costs: Annotated[
        Mapping[str, _Price],
        BeforeValidator(
            _dotted, json_schema_input_type=Mapping[str, _Price | Mapping[str, _Price]]
        ),
    ] = Field(
        default_factory=dict,
        description="Prices of the table `street_costs` that differ; inf closes a road class. [-]",
    )
    off_street_max_m: PositiveMetres | None = Field(
        default=None, description="Longest walk from a site to its street; left out: 500. [m]"
    )
    apart: Literal["streets", "junctions"] = Field(
        default="streets", description="What two separate ways do not share; left out: streets."
    )
    apart_m: PositiveMetres | None = Field(
        default=None,
        description="How far apart two separate ways are driven; left out: not at all. [m]",
    )
    share_least: bool = Field(
        default=False, description="Whether two separate ways may share what every way has to take."
    )


class LegOrder(Section):
    """One leg whose way is to be found along streets."""

    name: Name = Field(description="Name of the leg, unique in the run.")
    way: Literal["streets"] = Field(
        default="streets", description='How its way is found: "streets".'
    )
    from_: Name | None = Field(
        default=None, alias="from", description="Site; left out beside separate_from: its own."
    )
    to: Name | None = Field(
        default=None, description="Site; left out beside separate_from: its own."
    )
    through: _Texts = Field(
        default=(), max_length=100, description="Sites the way passes, in order."
    )
    separate_from: Name | None = Field(
        default=None, description="Leg it is kept separate from; both are found together."
    )


def leg_problems(legs: Sequence[LegOrder], *, is_street_given: bool) -> Iterator[Problem]:
    """
    Yield what contradicts itself among the legs to be found.

    Parameters
    ----------
    legs
        The legs.
    is_street_given
        Whether the run file says where their ways are found.
    """
    if legs and not is_street_given:
        yield Problem(
            where="streets",
            what="names no streets, but legs are to be found along them",
            value=listed(shown(leg.name) for leg in legs),
            remedy='Name the streets, for example [streets] files = ["streets.geojson"].',
        )
    counts = Counter(leg.name for leg in legs)
    yield from (
        Problem(
            where=_where(name), what=f"stands {count} times", remedy="Give every leg its own name."
        )
        for name, count in counts.items()
        if count > 1
    )
    partners = Counter(leg.separate_from for leg in legs if leg.separate_from)
    named = {leg.name: leg for leg in legs}
    for leg in legs:
        if not is_plain_text(leg.name):
            yield Problem(where=_where(leg.name), what="holds characters that cannot be printed")
        if leg.separate_from is None:
            yield from _end_problems(leg)
        else:
            yield from _pair_problems(leg, named, partners[leg.separate_from])


def stop_problems(legs: Sequence[LegOrder], sites: Sequence[str]) -> Iterator[Problem]:
    """
    Yield every end, and every site passed, that the geometry does not have.

    Parameters
    ----------
    legs
        The legs.
    sites
        Names of the sites that stand in the geometry as points.
    """
    for leg in legs:
        stops = [("from", leg.from_), ("to", leg.to), *(("through", name) for name in leg.through)]
        for key, name in stops:
            if name is not None and name not in sites:
                yield Problem(
                    where=f"{_where(leg.name)}, {key}",
                    what="is not a site that stands in the geometry as a point",
                    value=shown(name),
                    limit=one_of(sites) or "none is there",
                    remedy=nearest_hint(name, sites),
                )


def _where(name: str) -> str:
    return f"leg {shown(name)}"


def _end_problems(leg: LegOrder) -> Iterator[Problem]:
    missing = [key for key, name in (("from", leg.from_), ("to", leg.to)) if name is None]
    if missing:
        yield Problem(
            where=_where(leg.name),
            what=f"does not say {' and '.join(missing)}",
            remedy="Name the sites where it begins and ends.",
        )
        return
    stops = Counter([leg.from_, *leg.through, leg.to])
    for name, count in stops.items():
        if count > 1:
            yield Problem(
                where=_where(leg.name),
                what="meets one site more than once",
                value=shown(name),
                remedy="Make a leg of its own of each part.",
            )


def _pair_problems(leg: LegOrder, named: Mapping[str, LegOrder], count: int) -> Iterator[Problem]:
    where = f"{_where(leg.name)}, separate_from"
    main = named.get(str(leg.separate_from))
    if main is None or main is leg:
        others = [name for name in named if name != leg.name]
        yield Problem(
            where=where,
            what="is not another leg that is found along streets",
            value=shown(leg.separate_from),
            limit=one_of(others) or "there is none",
            remedy=nearest_hint(leg.separate_from, others),
        )
        return
    if main.separate_from is not None:
        yield Problem(
            where=where,
            what="is a leg that is kept separate from another itself",
            value=shown(main.name),
            remedy="Name the main leg of the two.",
        )
    if count > 1:
        yield Problem(
            where=where,
            what="is a leg that others are kept separate from, too",
            value=shown(main.name),
            limit="2 ways are found together",
        )
    for each in (main, leg):
        if each.through:
            yield Problem(
                where=f"{_where(each.name)}, through",
                what="does not go together with separate ways",
                remedy="Take it out, or give the stretches between sites legs of their own.",
            )
    for key, own, other in (("from", leg.from_, main.from_), ("to", leg.to, main.to)):
        if own not in (None, other):
            yield Problem(
                where=f"{_where(leg.name)}, {key}",
                what="is not that of the leg it is kept separate from",
                value=shown(own),
                limit=shown(other),
                remedy="Two separate ways run between the same two sites, in one direction.",
            )
