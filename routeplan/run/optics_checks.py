"""Checks of what a run file says of light that take more than one value to see."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING

from routeplan.errors import Problem
from routeplan.run.names import attenuator_steps_db, connector_grades, optical_parts
from routeplan.run.optics import (
    CircuitOrder,
    CircuitPart,
    Interface,
    JointFigures,
    MeasuredAttenuation,
    Panel,
    SectionFigures,
)
from routeplan.run.practice import Loss
from routeplan.run.trouble import is_plain_text, nearest_hint, one_of, shown

if TYPE_CHECKING:
    from routeplan.run.runfile import Declared

__all__ = ["measured_problems", "optics_problems"]

_GRADED = ("connector_mean_db", "connector_sigma_db", "connector_limit_db")
_RF = (
    "slope_w_per_a",
    "responsivity_a_per_w",
    "modulation_ratio",
    "bandwidth_hz",
    "intensity_noise_db_per_hz",
    "thermal_a_per_sqrt_hz",
)


def optics_problems(declared: Declared) -> Iterator[Problem]:
    """Yield what is wrong with connectors, panels, joints, sections, interfaces and circuits."""
    yield from _grade_problems(declared)
    yield from _panel_problems(declared.panels)
    if declared.practice:
        yield from _joint_problems(declared.joints, declared.practice.loss)
    yield from _section_problems(declared.sections)
    yield from _repeated("mark", [mark.reel for mark in declared.marks])
    for name, interface in declared.interfaces.items():
        yield from _interface_problems(f"interface.{name}", interface)
    names = [circuit.name for circuit in declared.circuits]
    for circuit in declared.circuits:
        where = f"circuit {shown(circuit.name)}"
        yield from _fitted_problems(where, circuit)
        yield from _polarity_problems(where, circuit)
        yield from _standby_problems(where, circuit, names)
        for number, part in enumerate(circuit.part, start=1):
            yield from _part_problems(f"{where}, part {number}", part)


def measured_problems(where: str, points: Sequence[MeasuredAttenuation]) -> Iterator[Problem]:
    """Yield a problem for each wavelength that is measured more than once."""
    counts = Counter(point.wavelength_nm for point in points)
    for wavelength, count in counts.items():
        if count > 1:
            yield Problem(
                where=where, what="gives a wavelength more than once", value=f"{wavelength:g} nm"
            )


def _grade_problems(declared: Declared) -> Iterator[Problem]:
    grade = declared.practice.loss.connector_grade if declared.practice else None
    if grade is None:
        return
    if grade not in connector_grades():
        yield _unknown("loss.connector_grade", "connector grade", grade, connector_grades())
    for key in _GRADED:
        if f"loss.{key}" in declared.given:
            yield Problem(
                where=f"loss.{key}",
                what="is given beside connector_grade, which says it already",
                value=shown(grade),
                remedy="Keep one of the two.",
            )


def _panel_problems(panels: Sequence[Panel]) -> Iterator[Problem]:
    yield from _repeated("panel", [panel.site for panel in panels])
    for panel in panels:
        where = f"panel {shown(panel.site)}"
        if panel.grade is not None and panel.grade not in connector_grades():
            yield _unknown(f"{where}, grade", "connector grade", panel.grade, connector_grades())
        if panel.grade is not None and panel.measured_db is not None:
            yield Problem(
                where=where,
                what="gives both grade and measured_db, which are two ways of saying what is lost",
                remedy="Keep one.",
            )


def _joint_problems(joints: Sequence[JointFigures], loss: Loss) -> Iterator[Problem]:
    yield from _repeated("joint", [joint.place for joint in joints])
    for joint in joints:
        where = f"joint {shown(joint.place)}"
        own = (joint.splice_mean_db, joint.splice_sigma_db, joint.splice_limit_db)
        if joint.measured_db is not None and any(each is not None for each in own):
            yield Problem(
                where=where,
                what="gives measured_db beside what a splice there is assumed to lose",
                remedy="Keep one.",
            )
        elif joint.measured_db is None and all(each is None for each in own):
            yield Problem(
                where=where,
                what="says nothing of its splices",
                remedy="Give measured_db, or any of splice_mean_db, splice_sigma_db and "
                "splice_limit_db.",
            )
        mean_db, limit_db = joint.splice_mean_db, joint.splice_limit_db
        mean_db = loss.splice_mean_db if mean_db is None else mean_db
        limit_db = loss.splice_limit_db if limit_db is None else limit_db
        if (joint.splice_mean_db, joint.splice_limit_db) != (None, None) and limit_db < mean_db:
            yield Problem(
                where=f"{where}, splice_limit_db",
                what="is below the mean",
                value=f"{limit_db:g} dB",
                limit=f"at least {mean_db:g} dB",
                remedy="Give splice_mean_db and splice_limit_db together.",
            )


def _section_problems(sections: Sequence[SectionFigures]) -> Iterator[Problem]:
    yield from _repeated("section", [section.name for section in sections])
    for section in sections:
        yield from measured_problems(f"section {shown(section.name)}, measured", section.measured)


def _interface_problems(where: str, interface: Interface) -> Iterator[Problem]:
    least, most = interface.channel_loss_min_db, interface.channel_loss_db
    if least is not None and most is not None and least > most:
        yield Problem(
            where=f"{where}.channel_loss_min_db",
            what="is above channel_loss_db",
            value=f"{least:g} dB",
            limit=f"at most {most:g} dB",
        )
    given = [key for key in _RF if getattr(interface, key) is not None]
    if given and not interface.rf:
        yield Problem(
            where=f"{where}.{given[0]}",
            what="is a figure of a radio-frequency link, which this interface is not",
            remedy="Add rf = true, or take the key out.",
        )


def _fitted_problems(where: str, circuit: CircuitOrder) -> Iterator[Problem]:
    steps_db = attenuator_steps_db()
    fitted_db = circuit.attenuator_db
    if fitted_db is not None and fitted_db not in steps_db:
        yield Problem(
            where=f"{where}, attenuator_db",
            what="is not an attenuator of the stock",
            value=f"{fitted_db:g} dB",
            limit=", ".join(f"{step:g}" for step in steps_db) + " dB",
            remedy="Name the one that is fitted, or give it as an own part with loss_db.",
        )


def _polarity_problems(where: str, circuit: CircuitOrder) -> Iterator[Problem]:
    for key in ("leads", "rolls"):
        if circuit.fibre_count == 1 and getattr(circuit, key):
            yield Problem(
                where=f"{where}, {key}",
                what="is given for a circuit on one fibre, where no pair can be swapped",
                value=shown(getattr(circuit, key)),
                remedy="Take the key out, or plan two fibres.",
            )


def _standby_problems(where: str, circuit: CircuitOrder, names: list[str]) -> Iterator[Problem]:
    main = circuit.standby_for
    if main is None:
        return
    if main == circuit.name:
        yield Problem(
            where=f"{where}, standby_for",
            what="stands by for itself",
            value=shown(main),
            remedy="Name another circuit.",
        )
    elif main not in names:
        yield _unknown(f"{where}, standby_for", "circuit of this run", main, names)


def _part_problems(where: str, part: CircuitPart) -> Iterator[Problem]:
    if part.name is not None and not is_plain_text(part.name):
        yield Problem(where=where, what="holds characters that cannot be printed")
    if part.kind is None:
        yield from _table_part_problems(where, part)
    elif part.loss_db is None:
        yield Problem(
            where=where, what="is an own part that does not say its loss", remedy="Add loss_db."
        )
    elif part.limit_db is not None and part.limit_db < part.loss_db:
        yield Problem(
            where=f"{where}, limit_db",
            what="is below the mean",
            value=f"{part.limit_db:g} dB",
            limit=f"at least loss_db, {part.loss_db:g} dB",
        )


def _table_part_problems(where: str, part: CircuitPart) -> Iterator[Problem]:
    if part.name is None:
        yield Problem(
            where=where,
            what="names no part",
            limit=one_of(optical_parts()),
            remedy='Give name, or kind = "own" and loss_db.',
        )
    elif part.name not in optical_parts():
        yield _unknown(f"{where}, name", "passive part", part.name, optical_parts())
    elif any(each is not None for each in (part.loss_db, part.sigma_db, part.limit_db)):
        yield Problem(
            where=where,
            what="gives a loss of its own beside a part of the table",
            value=shown(part.name),
            remedy='Take the figures out, or add kind = "own".',
        )


def _repeated(what: str, names: Sequence[str]) -> Iterator[Problem]:
    for name, count in Counter(names).items():
        if not is_plain_text(name):
            yield Problem(
                where=f"{what} {shown(name)}", what="holds characters that cannot be printed"
            )
        if count > 1:
            yield Problem(
                where=f"{what} {shown(name)}",
                what=f"stands {count} times",
                remedy="Say everything of it in one place.",
            )


def _unknown(
    where: str, what: str, name: str, known: Mapping[str, object] | Sequence[str]
) -> Problem:
    hint = nearest_hint(name, known)
    return Problem(
        where=where,
        what=f"is not a known {what}",
        value=shown(name),
        limit="" if hint and len(known) > 12 else one_of(known),
        remedy=hint,
    )
