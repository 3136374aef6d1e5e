"""What a budget with no map can be told on the command line, and reading it with all its faults."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

from routeplan.errors import InputError, Problem

if TYPE_CHECKING:
    from routeplan.quick import QuickOrder
    from routeplan.run.defaults import AssumedValue, Purpose
    from routeplan.run.runfile import Declared

__all__ = ["ANY", "OPTIONS", "Option", "order_from_options"]

ANY = "any"
"""Name that asks for every interface that closes."""

Given: TypeAlias = Mapping[str, str | Sequence[str] | None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Option:
    """
    One option: its name, the key of a run file it stands for, and what it says.

    Those without a key are of this command alone; `metavar` is what its value is.
    """

    name: str
    key: str = ""
    metavar: str
    kind: Literal["number", "text"] = "number"
    is_repeated: bool = False
    text: str

    @property
    def label(self) -> str:
        """The option as it is typed."""
        return "--" + self.name.replace("_", "-")


_CIRCUIT, _OWN = "quick", "own interface"

OPTIONS = (
    Option(name="glass_km", metavar="KM", text="length of the fibre; this or --sheath-km"),
    Option(name="sheath_km", metavar="KM", text="length of the cable, from which the fibre's"),
    Option(name="splices", metavar="N", text="splices in joints (default: from the reels)"),
    Option(
        name="reel_km",
        metavar="KM",
        text="cable on a reel: one joint fewer than reels (default: the longest put-up)",
    ),
    Option(
        name="connector_pairs",
        key="loss.connector_pairs",
        metavar="N",
        text="mated connector pairs (default: by practice)",
    ),
    Option(
        name="pigtail_splices",
        key="loss.pigtail_splices",
        metavar="N",
        text="pigtail splices behind the panels (default: by practice)",
    ),
    Option(
        name="fibre_type",
        key="cable.fibre_type",
        metavar="TYPE",
        kind="text",
        text="fibre type, a name of table `fibres` (default: by practice)",
    ),
    Option(
        name="fibre_count",
        key="circuit.fibre_count",
        metavar="N",
        text="fibres of the circuit, 1 or 2 (default: by practice)",
    ),
    Option(
        name="interface",
        key="circuit.interface",
        metavar="NAME",
        kind="text",
        text="a name of table `interfaces`, or any: every one that closes",
    ),
    Option(
        name="wavelength_nm",
        key="circuit.wavelengths_nm",
        metavar="NM",
        is_repeated=True,
        text="wavelength; may be given again (default: the interface's own)",
    ),
    Option(
        name="purpose",
        key="purpose",
        metavar="PURPOSE",
        kind="text",
        text="set of defaults, link or venue (default: by practice)",
    ),
    Option(
        name="margin_db",
        key="loss.margin_db",
        metavar="DB",
        text="loss kept in hand (default: that of the purpose)",
    ),
    *(
        Option(name=name, key=f"interface.{_OWN}.{name}", metavar=metavar, text=text)
        for name, metavar, text in (
            ("tx_min_dbm", "DBM", "your own interface: least launch power"),
            ("tx_max_dbm", "DBM", "your own interface: most launch power"),
            ("rx_sensitivity_dbm", "DBM", "your own interface: least power it needs"),
            ("rx_overload_dbm", "DBM", "your own interface: most power it stands"),
            ("penalty_db", "DB", "your own interface: power penalty"),
            ("channel_loss_db", "DB", "your own interface: most loss, penalty included"),
            ("dispersion_max_ps_per_nm", "PS", "your own interface: most dispersion, ps/nm"),
            ("bit_rate_gbps", "GBPS", "your own interface: line rate"),
        )
    ),
)
"""Every option, in the order they are shown."""

_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?|[+-]?(nan|inf|infinity)", re.IGNORECASE)
_ANY_NM = 1310.0
_LONGEST_KM = 1000.0
_MOST_SPLICES = 1000
_M_PER_KM = 1000.0


def order_from_options(given: Given) -> QuickOrder:
    """
    Return what is asked, practice and interfaces as a run file would have them.

    Parameters
    ----------
    given
        Text of every option by its name; None or nothing where it is left out.

    Raises
    ------
    InputError
        With everything that is wrong; `where` is the option.
    """
    from routeplan.run.runfile import declared_from_table
    from routeplan.run.trouble import Trouble

    values = {option.name: _value(option, given.get(option.name)) for option in OPTIONS}
    values = {name: value for name, value in values.items() if value is not None}
    trouble = Trouble()
    declared = declared_from_table(_table(values), file=_FILE, trouble=trouble)
    problems = [*_own_problems(values), *(_said(p, values) for p in trouble.problems)]
    if not problems:
        problems += _light_problems(declared)
    if problems:
        raise InputError(dict.fromkeys(problems))
    return _order(values, declared)


_FILE = "command line"


def _value(option: Option, text: str | Sequence[str] | None) -> Any:
    """Return a number where the text is one, else the text, which is refused later."""
    if text is None or option.kind == "text":
        return text
    if not isinstance(text, str):
        return [_number(each) for each in text] or None
    return _number(text)


def _number(text: str) -> float | int | str:
    if not _NUMBER.fullmatch(text.strip()):
        return text
    try:
        return int(text)
    except ValueError:
        return float(text)


def _table(values: Mapping[str, Any]) -> dict[str, Any]:
    """Return the run file that says what the options say."""
    table: dict[str, Any] = {"circuit": [{"name": _CIRCUIT}]}
    circuit = table["circuit"][0]
    keys = {option.name: option.key for option in OPTIONS if option.key}
    for name, value in values.items():
        section, _, key = keys.get(name, "-").rpartition(".")
        if section == "circuit":
            if value != ANY:
                circuit[key] = value
        elif section.startswith("interface."):
            if values.get("interface", ANY) != ANY:
                continue  # refused elsewhere: two interfaces
            table.setdefault("interface", {}).setdefault(_OWN, {})[key] = value
        elif name in keys:
            (table.setdefault(section, {}) if section else table)[key] = value
    if own := table.get("interface"):
        own[_OWN].update(_own_band(values.get("wavelength_nm")))
        circuit.setdefault("interface", _OWN)
    return table


def _own_band(wavelengths_nm: object) -> dict[str, Any]:
    """Return the band of an interface of one's own: all wavelengths it is to send."""
    numbers = wavelengths_nm if isinstance(wavelengths_nm, list) else []
    known = [nm for nm in numbers if isinstance(nm, int | float)]
    if len(known) > 1:
        return {"wavelength_min_nm": min(known), "wavelength_max_nm": max(known)}
    # Without any it is refused elsewhere, once; what else is wrong is still to be found.
    return {"wavelength_nm": known[0] if known else _ANY_NM}


def _own_problems(values: Mapping[str, Any]) -> Iterator[Problem]:
    """Yield what is wrong with the options that no run file has, and between options."""
    lengths = [name for name in ("glass_km", "sheath_km") if name in values]
    if len(lengths) != 1:
        yield Problem(
            where="--glass-km",
            what="stands beside --sheath-km" if lengths else "is missing",
            remedy="Give the length of the fibre, or of the cable with --sheath-km.",
        )
    for name in (*lengths, *(["reel_km"] if "reel_km" in values else [])):
        yield from _range_problems(name, values[name], most=_LONGEST_KM, unit=" km")
    if "splices" in values:
        yield from _range_problems("splices", values["splices"], most=_MOST_SPLICES, is_count=True)
    if "splices" in values and "reel_km" in values:
        remedy = "Keep one: splices follow from the reels."
        yield Problem(where="--reel-km", what="stands beside --splices", remedy=remedy)
    own = [o for o in OPTIONS if o.name in values and o.key.startswith("interface.")]
    is_named = values.get("interface", ANY) != ANY
    if own and is_named:
        yield Problem(
            where=own[0].label,
            what="stands beside --interface, which has its own figures",
            remedy="Name an interface, or give your own figures.",
        )
    elif own and "wavelength_nm" not in values:
        remedy = "Your own interface needs its wavelength."
        yield Problem(where="--wavelength-nm", what="is missing", remedy=remedy)


def _range_problems(
    name: str, value: object, *, most: float, unit: str = "", is_count: bool = False
) -> Iterator[Problem]:
    where = "--" + name.replace("_", "-")
    if isinstance(value, str) or (is_count and not isinstance(value, int)):
        yield _no_number(where, value, is_count=is_count)
        return
    assert isinstance(value, int | float)
    if not math.isfinite(value):
        yield Problem(where=where, what="is not a finite number", value=_shown(value))
    elif not (0 <= value <= most and (is_count or value > 0)):
        low = "0" if is_count else "more than 0"
        limit = f"{low} to {most:g}{unit}"
        yield Problem(where=where, what="is out of range", value=_shown(value), limit=limit)


def _no_number(where: str, value: object, *, is_count: bool = False) -> Problem:
    what = "is not a whole number" if is_count else "is not a number"
    mended = str(value).replace(",", ".")
    is_mended = isinstance(value, str) and mended != value and _NUMBER.fullmatch(mended)
    remedy = f"Write the decimals behind a point: {mended}." if is_mended else ""
    return Problem(where=where, what=what, value=_shown(value), remedy=remedy)


def _shown(value: object) -> str:
    from routeplan.run.trouble import shown

    return f"{value:g}" if isinstance(value, float) else shown(value)


def _said(problem: Problem, values: Mapping[str, Any]) -> Problem:
    """Return a problem of a run file in the words of the options."""
    where = _option_at(problem.where, values)
    if problem.what in ("is not a number", "is not a whole number"):
        is_count = "whole" in problem.what
        text = problem.value.strip('"')
        return _no_number(where, text, is_count=is_count)
    return Problem(
        where=where,
        what=_with_labels(problem.what),
        value=problem.value,
        limit=_with_labels(problem.limit),
        remedy=_with_labels(problem.remedy),
    )


def _option_at(where: str, values: Mapping[str, Any]) -> str:
    """Return the option that the last known key of a path stands for."""
    labels = {option.key.rpartition(".")[2]: option.label for option in OPTIONS if option.key}
    labels |= dict.fromkeys(_BAND_KEYS, "--wavelength-nm")
    own = [o.label for o in OPTIONS if o.name in values and o.key.startswith("interface.")]
    if own:
        labels[_OWN] = own[0]
    parts = re.split(r"[.,] ?", where.partition(_FILE)[2])
    return next((labels[part] for part in reversed(parts) if part in labels), where)


_BAND_KEYS = ("wavelength_nm", "wavelength_min_nm", "wavelength_max_nm")


def _with_labels(text: str) -> str:
    for option in OPTIONS:
        key = option.key.rpartition(".")[2]
        if "_" in key:
            text = re.sub(rf"\b{key}\b", option.label, text)
    return text


def _light_problems(declared: Declared) -> Iterator[Problem]:
    """Yield what keeps an interface from working as asked."""
    from routeplan.light.interfaces import check_fibre_count, check_wavelengths, find_interface

    (circuit,) = declared.circuits
    if circuit.interface is not None and "circuit.quick.interface" in declared.given:
        pair = find_interface(circuit.interface, declared.interfaces)
        nm = circuit.wavelengths_nm
        yield from check_wavelengths(pair, nm, where="--wavelength-nm")
        yield from check_fibre_count(pair, circuit.fibre_count, where="--interface")


def _order(values: Mapping[str, Any], declared: Declared) -> QuickOrder:
    from routeplan.quick import QuickOrder

    assert declared.practice
    assert declared.cable
    (circuit,) = declared.circuits
    is_any = values.get("interface") == ANY
    ratio = declared.cable.glass_over_sheath_ratio
    if "glass_km" in values:
        glass_m = values["glass_km"] * _M_PER_KM
        sheath_m = glass_m / (1.0 + ratio)
    else:
        sheath_m = values["sheath_km"] * _M_PER_KM
        glass_m = sheath_m * (1.0 + ratio)
    splices, joints_from = _joints(values, sheath_m, declared.practice.reels.put_ups_m)
    return QuickOrder(
        glass_m=round(glass_m, 3),
        sheath_m=round(sheath_m, 3),
        splices=splices,
        joints_from=joints_from,
        fibre_type=declared.cable.fibre_type,
        fibre_count=circuit.fibre_count,
        interface=ANY if is_any else circuit.interface,
        wavelengths_nm=() if is_any and "wavelength_nm" not in values else circuit.wavelengths_nm,
        practice=declared.practice.loss,
        joint_tail_m=declared.practice.slack.joint_tail_m,
        own=declared.interfaces,
        assumed=tuple(_assumed(values, declared)),
    )


def _joints(
    values: Mapping[str, Any], sheath_m: float, put_ups_m: Sequence[float]
) -> tuple[int, str]:
    """Return how many joints the reels make, laid end to end, and in words where it is from."""
    if "splices" in values:
        return values["splices"], "as given"
    own = values.get("reel_km")
    reel_m = max(put_ups_m) if own is None else own * _M_PER_KM
    reels = -(-round(sheath_m * _M_PER_KM) // max(1, round(reel_m * _M_PER_KM)))
    which = "as given" if own is not None else "the longest put-up of practice"
    return max(reels, 1) - 1, f"one fewer than reels of {reel_m:g} m, {which}"


def _assumed(values: Mapping[str, Any], declared: Declared) -> Iterator[AssumedValue]:
    """Yield the defaults the answer rests on, in the order of the run file."""
    from routeplan.run.defaults import AssumedValue, default_value, practice_rows

    purpose: Purpose = "venue" if values.get("purpose") == "venue" else "link"
    used = {"purpose", "cable.fibre_type", "circuit.fibre_count", "slack.joint_tail_m"}
    if "splices" not in values or "sheath_km" in values:
        used.add("cable.glass_over_sheath_ratio")
    if "splices" not in values and "reel_km" not in values:
        used.add("reels.put_ups_m")
    if declared.circuits[0].interface is None and values.get("interface") != ANY:
        used.add("circuit.wavelengths_nm")
    if any(own.channel_loss_db is None for own in declared.interfaces.values()):
        used.add("interface.penalty_db")
    named = {"circuit": f"circuit.{_CIRCUIT}", "interface": f"interface.{_OWN}"}
    for row in practice_rows():
        section, _, key = row.name.partition(".")
        full = f"{named.get(section, section)}.{key}" if key else section
        if (row.name in used or section == "loss") and full not in declared.given:
            value = default_value(row.name, purpose)
            yield AssumedValue(
                name=row.name,
                value=value if isinstance(value, int | float | str) else _listed(value),
                unit=row.unit.strip("-"),
                source=row.source,
                reason=row.reason,
            )


def _listed(value: object) -> str:
    return ", ".join(f"{each:g}" for each in value) if isinstance(value, tuple) else str(value)
