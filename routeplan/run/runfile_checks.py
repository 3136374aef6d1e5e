"""Checks of a run file that take more than one value to see."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any, TypeGuard

from routeplan.errors import Problem, RunFileError
from routeplan.run.names import cable_makes, colour_codes, fibre_types, interface_classes
from routeplan.run.optics import ANY_INTERFACE
from routeplan.run.optics_checks import measured_problems, optics_problems
from routeplan.run.practice import CableMake, CircuitOrder, Interface, Loss, Slack
from routeplan.run.street_rules import leg_problems
from routeplan.run.trouble import Trouble, is_plain_text, nearest_hint, one_of, shown

if TYPE_CHECKING:
    from routeplan.run.runfile import Declared

__all__ = ["check_declared", "refuse_unbuilt", "wavelengths_of"]

_MULTIMODE = re.compile(
    r"OM[1-5]\b.*|A1[-.\w]*|(50|62\.5) ?/ ?125.*|G\.651.*|multi-?mode.*", re.IGNORECASE
)
_NOT_YET = "is not yet available in this version"


def refuse_unbuilt(raw: dict[str, Any], *, file: str, trouble: Trouble) -> None:
    """Refuse the keys of capabilities not yet built, and take them out of `raw`."""
    for where, value, remedy in _unbuilt(raw):
        problem = Problem(where=f"{file}, {where}", what=_NOT_YET, value=value, remedy=remedy)
        trouble.add(RunFileError, problem)


def check_declared(declared: Declared, *, file: str, trouble: Trouble) -> None:
    """Note what contradicts itself, or names what the tables do not have."""
    for problem in _contradictions(declared):
        where = f"{file}, {problem.where}" if problem.where else file
        trouble.add(
            RunFileError,
            Problem(
                where=where,
                what=problem.what,
                value=problem.value,
                limit=problem.limit,
                remedy=problem.remedy,
            ),
        )
    for name, interface in declared.interfaces.items():
        if (
            interface.channel_loss_db is not None
            and f"interface.{name}.penalty_db" in declared.given
        ):
            trouble.warn(
                f"{file}, interface.{name}.penalty_db",
                "is not used: a channel insertion loss already has the penalty inside it",
            )


def wavelengths_of(interface: object, own: Mapping[str, Any]) -> tuple[float, ...]:
    """Return the wavelengths a circuit takes from its interface, raw or of the table."""
    if not isinstance(interface, str):
        return ()
    table = own.get(interface)
    if isinstance(table, dict):
        return _own_wavelengths(table)
    known = interface_classes().get(interface)
    return known.wavelengths_nm if known else ()


def _own_wavelengths(table: Mapping[str, Any]) -> tuple[float, ...]:
    """Return the one wavelength of an own interface, or the middle of its band."""
    if _is_number(single := table.get("wavelength_nm")):
        return (single,)
    low, high = table.get("wavelength_min_nm"), table.get("wavelength_max_nm")
    return ((low + high) / 2,) if _is_number(low) and _is_number(high) else ()


def _is_number(value: object) -> TypeGuard[float]:
    return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < 1e6


def _unbuilt(raw: dict[str, Any]) -> Iterator[tuple[str, str, str]]:
    reels = raw.get("reels")
    if isinstance(reels, dict):
        yield from _unbuilt_stock(reels)


def _unbuilt_stock(reels: dict[str, Any]) -> Iterator[tuple[str, str, str]]:
    if "stock" in reels:
        value = shown(reels.pop("stock"))
        yield "reels.stock", value, "Take the key out and buy to length or in put-ups."
    buy = reels.get("buy")
    if isinstance(buy, list) and "stock" in buy:
        reels["buy"] = [way for way in buy if way != "stock"] or ["put-ups"]
        yield "reels.buy", '"stock"', "Buy to length or in put-ups."


def _contradictions(declared: Declared) -> Iterator[Problem]:
    if declared.practice:
        yield from _loss_problems(declared.practice.loss)
        yield from _slack_problems(declared.practice.slack)
    if declared.head and declared.head.title and not is_plain_text(declared.head.title):
        yield _unprintable("title")
    if declared.cable:
        yield from _cable_problems("cable", declared.cable)
        if declared.cable.legs:
            remedy = "It belongs in [cables.NAME]; the default cable takes every other leg."
            yield Problem(where="cable.legs", what="is not for the default cable", remedy=remedy)
    for name, cable in declared.cables.items():
        own = _cable_problems(f"cables.{name}", cable)
        yield from (each for each in own if each.where in declared.given)
    yield from _cable_leg_problems(declared.cables)
    yield from leg_problems(declared.legs, is_street_given="streets" in declared.given)
    for name, interface in declared.interfaces.items():
        yield from _interface_problems(f"interface.{name}", interface)
    yield from _circuit_problems(declared)
    yield from optics_problems(declared)


def _loss_problems(loss: Loss) -> Iterator[Problem]:
    for part in ("splice", "connector"):
        mean, limit = getattr(loss, f"{part}_mean_db"), getattr(loss, f"{part}_limit_db")
        if limit < mean:
            yield Problem(
                where=f"loss.{part}_limit_db",
                what="is below the mean",
                value=f"{limit:g} dB",
                limit=f"at least {part}_mean_db, {mean:g} dB",
                remedy=f"Give {part}_mean_db and {part}_limit_db together.",
            )


def _slack_problems(slack: Slack) -> Iterator[Problem]:
    for placement in slack.loop_every_m:
        if placement not in slack.loop_m:
            yield Problem(
                where=f"slack.loop_every_m.{placement}",
                what="asks for loops whose length is not given",
                remedy=f"Add {placement} to slack.loop_m.",
            )


def _cable_problems(where: str, cable: CableMake) -> Iterator[Problem]:
    if _MULTIMODE.fullmatch(cable.fibre_type.strip()):
        yield Problem(
            where=f"{where}.fibre_type",
            what="is a multimode fibre, which does not mix with the singlemode fibre planned here",
            value=shown(cable.fibre_type),
            limit=one_of(fibre_types()),
        )
    elif cable.fibre_type not in fibre_types():
        yield _unknown_name(f"{where}.fibre_type", "fibre type", cable.fibre_type, fibre_types())
    if cable.make is not None and cable.make not in cable_makes():
        yield _unknown_name(f"{where}.make", "make of cable", cable.make, tuple(cable_makes()))
    if cable.colour_code not in colour_codes():
        known = colour_codes()
        yield _unknown_name(f"{where}.colour_code", "colour code", cable.colour_code, known)
    yield from measured_problems(f"{where}.measured", cable.measured)


def _cable_leg_problems(cables: Mapping[str, CableMake]) -> Iterator[Problem]:
    for name, cable in cables.items():
        if not is_plain_text(name):
            yield _unprintable(f"cables.{shown(name)}")
        for leg, count in Counter(cable.legs).items():
            if count > 1:
                yield Problem(
                    where=f"cables.{name}.legs",
                    what=f"names a leg {count} times",
                    value=shown(leg),
                    remedy="A cable takes each leg once.",
                )


def _interface_problems(where: str, interface: Interface) -> Iterator[Problem]:
    yield from _band_problems(where, interface)
    low, high = interface.tx_min_dbm, interface.tx_max_dbm
    if low is not None and high is not None and low > high:
        yield _above(f"{where}.tx_min_dbm", low, "tx_max_dbm", high)
    low, high = interface.rx_sensitivity_dbm, interface.rx_overload_dbm
    if low is not None and high is not None and low >= high:
        yield _above(f"{where}.rx_sensitivity_dbm", low, "rx_overload_dbm", high)
    by_power = interface.tx_min_dbm is not None and interface.rx_sensitivity_dbm is not None
    if interface.channel_loss_db is not None and interface.rx_sensitivity_dbm is not None:
        yield Problem(
            where=where,
            what="gives both channel_loss_db and rx_sensitivity_dbm, which are two ways of "
            "saying what may be lost",
            remedy="Keep one.",
        )
    elif interface.channel_loss_db is None and not by_power:
        yield Problem(
            where=where,
            what="does not say what may be lost",
            remedy="Give channel_loss_db, or tx_min_dbm and rx_sensitivity_dbm.",
        )


def _band_problems(where: str, interface: Interface) -> Iterator[Problem]:
    if interface.is_open_band:
        return
    low, high = interface.wavelength_min_nm, interface.wavelength_max_nm
    single = interface.wavelength_nm is not None
    if single == (low is not None and high is not None) or (single and (low or high)):
        yield Problem(
            where=where,
            what="does not say its light in one way",
            remedy="Give wavelength_nm, or wavelength_min_nm and wavelength_max_nm.",
        )
    elif low is not None and high is not None and low > high:
        yield _above(f"{where}.wavelength_min_nm", low, "wavelength_max_nm", high, unit="nm")


def _above(where: str, low: float, name: str, high: float, *, unit: str = "dBm") -> Problem:
    return Problem(
        where=where,
        what=f"is not below {name}",
        value=f"{low:g} {unit}",
        limit=f"{name} is {high:g} {unit}",
    )


def _circuit_problems(declared: Declared) -> Iterator[Problem]:
    names = Counter(circuit.name for circuit in declared.circuits)
    for name, count in names.items():
        if count > 1:
            yield Problem(
                where=f"circuit {shown(name)}",
                what=f"stands {count} times",
                remedy="Give every circuit its own name.",
            )
    for circuit in declared.circuits:
        where = f"circuit {shown(circuit.name)}"
        if not is_plain_text(circuit.name):
            yield _unprintable(where)
        yield from _end_problems(where, circuit)
        if circuit.interface not in (None, ANY_INTERFACE):
            yield from _light_problems(where, circuit, circuit.interface, declared.interfaces)


def _end_problems(where: str, circuit: CircuitOrder) -> Iterator[Problem]:
    if (circuit.from_ is None) != (circuit.to is None):
        yield Problem(
            where=where,
            what="names one of its ends only",
            value=shown(circuit.from_ or circuit.to),
            remedy="Give both from and to, or neither: then it joins the ends of the longest leg.",
        )
    elif circuit.from_ is not None and circuit.from_ == circuit.to:
        yield Problem(
            where=where,
            what="ends where it starts",
            value=shown(circuit.to),
            remedy="Name two different sites in from and to.",
        )


def _light_problems(
    where: str, circuit: CircuitOrder, name: str, own: Mapping[str, Interface]
) -> Iterator[Problem]:
    known = interface_classes()
    if name in own:
        if any(_band_problems("", own[name])):
            return
        bands: tuple[tuple[float, float], ...] = (own[name].band_nm,)
    elif name in known:
        bands = known[name].bands_nm
    else:
        yield _unknown_name(f"{where}, interface", "interface", name, (*own, *known))
        return
    for wavelength in circuit.wavelengths_nm:
        if not any(low <= wavelength <= high for low, high in bands):
            yield Problem(
                where=f"{where}, wavelengths_nm",
                what="lies outside the band of its interface",
                value=f"{wavelength:g} nm",
                limit=" or ".join(f"{low:g} to {high:g} nm" for low, high in bands)
                + f" for {shown(name)}",
            )


def _unknown_name(where: str, what: str, name: str, known: tuple[str, ...]) -> Problem:
    hint = nearest_hint(name, known)
    return Problem(
        where=where,
        what=f"is not a known {what}",
        value=shown(name),
        limit="" if hint and len(known) > 12 else one_of(known),
        remedy=hint,
    )


def _unprintable(where: str) -> Problem:
    return Problem(where=where, what="holds characters that cannot be printed")
