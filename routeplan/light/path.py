"""All that the light of a circuit meets, read off the layout of its cables."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace

from routeplan.cable.model import Cable, FibreUse, Joint, Section
from routeplan.light.fittings import Fittings
from routeplan.light.model import Direction, ExistingSpan, Glass, Part, Path, SpliceStep, Step

__all__ = ["CableTrack", "cable_track", "circuit_paths"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CableTrack:
    """
    Glass, joints and existing spans along one cable, in its own direction, for any fibre.

    `spans_mm` are the chain values between which each step lies; `readings_mm` the glass before
    the chain values at which it can be entered, and before the start of each section.
    """

    cable: str
    start: str
    end: str
    steps: tuple[Step, ...]
    spans_mm: tuple[tuple[int, int], ...] = ()
    readings_mm: Mapping[int, int] = field(default_factory=dict)


def cable_track(
    cable: Cable,
    sections: Sequence[Section],
    joints: Sequence[Joint],
    existing: Sequence[tuple[int, ExistingSpan]],
    entered_mm: Mapping[int, int] | None = None,
) -> CableTrack:
    """
    Return what lies along one cable.

    Parameters
    ----------
    cable
        The cable.
    sections
        Its sections.
    joints
        Joints on its chain, not those at its ends.
    existing
        Somebody else's spans in its way, each with the chain value where it begins. [mm]
    entered_mm
        Glass reading at each chain value where the cable can be entered at mid-span. [mm]
    """
    along: list[tuple[int, int, int, Step]] = []
    for section in sections:
        glass = Glass(
            section=section.id,
            cable=cable.id,
            fibre=0,
            fibre_type=cable.make.fibre_type,
            glass_m=section.glass_mm / 1000,
        )
        along.append((section.start_chain_mm, 1, section.end_chain_mm, glass))
    # Nothing is entered inside an existing span, so that its end does not matter.
    along.extend((chain_mm, 1, chain_mm, span) for chain_mm, span in existing)
    for joint in joints:
        at = joint.mark.chain_mm
        along.append((at, 0, at, SpliceStep(where=joint.id)))
    ordered = sorted(along, key=lambda item: item[:2])
    return CableTrack(
        cable=cable.id,
        start=cable.start,
        end=cable.end,
        steps=tuple(step for *_, step in ordered),
        spans_mm=tuple((start, end) for start, _, end, _ in ordered),
        readings_mm={
            **{section.start_chain_mm: section.start_glass_mm for section in sections},
            **{section.end_chain_mm: section.end_glass_mm for section in sections},
            **(entered_mm or {}),
        },
    )


def circuit_paths(
    circuit: str,
    uses: Sequence[FibreUse],
    tracks: Mapping[str, CableTrack],
    *,
    joint_at: Mapping[str, str],
    site_names: Mapping[str, str],
    ends: tuple[int, int],
    fittings: Fittings | None = None,
) -> tuple[Path, Path]:
    """
    Return the path from end to end and the path back.

    Strand 1 carries light from `from` to `to`; the way back is strand 2, or strand 1 of a circuit
    on one fibre. Where a circuit goes on through a site, a patch joins two panels: two pigtail
    splices and two mated pairs more.

    Parameters
    ----------
    circuit
        Name of the circuit.
    uses
        Its fibres, by strand and in order along it.
    tracks
        What lies along each cable, by cable id.
    joint_at
        Joint id of every node that has one, but for sites.
    site_names
        Name of every site, by node id.
    ends
        Mated pairs and pigtail splices of the whole circuit, shared between its two ends. [-]
    fittings
        Panels, splices, parts and bends of its own.
    """
    fitted = fittings or Fittings()
    paths: list[Path] = []
    directions: tuple[Direction, Direction] = ("from-to", "to-from")
    for strand, direction in zip((1, 2), directions, strict=True):
        own = [use for use in uses if use.strand == strand]
        strand_uses = own or [use for use in uses if use.strand == 1]
        steps = tuple(
            _steps(
                strand_uses,
                tracks,
                joint_at=joint_at,
                site_names=site_names,
                ends=ends,
                fitted=fitted,
            )
        )
        turned = steps if direction == "from-to" else steps[::-1]
        receiver = _ends_of(strand_uses[-1], tracks)[1]
        if direction == "to-from":
            receiver = _ends_of(strand_uses[0], tracks)[0]
        turned += _attenuator(fitted, site_names[receiver])
        paths.append(Path(circuit=circuit, direction=direction, steps=turned))
    return paths[0], paths[1]


def _steps(
    uses: Sequence[FibreUse],
    tracks: Mapping[str, CableTrack],
    *,
    joint_at: Mapping[str, str],
    site_names: Mapping[str, str],
    ends: tuple[int, int],
    fitted: Fittings,
) -> Iterator[Step]:
    matings, pigtails = ends
    first, last = uses[0], uses[-1]
    start = site_names[_ends_of(first, tracks)[0]]
    end = site_names[_ends_of(last, tracks)[1]]
    yield from [fitted.pair(start)] * (matings - matings // 2)
    yield from fitted.put_at("site", start)
    yield from [SpliceStep(where=start, is_pigtail=True)] * (pigtails - pigtails // 2)
    for number, use in enumerate(uses):
        if number:
            met = tuple(_through(_ends_of(use, tracks)[0], joint_at, site_names, fitted))
            # Whichever way a circuit runs, what stands at a node stands in one order.
            yield from met if uses[number - 1].cable < use.cable else met[::-1]
        track = _steps_of(use, tracks[use.cable])
        along = [met for step in track for met in _along(step, use, fitted)]
        yield from along if use.forward else reversed(along)
    yield from [SpliceStep(where=end, is_pigtail=True)] * (pigtails // 2)
    yield from reversed(tuple(fitted.put_at("site", end)))
    yield from [fitted.pair(end)] * (matings // 2)


def _steps_of(use: FibreUse, track: CableTrack) -> Sequence[Step]:
    """Return what lies along the piece of a cable that a fibre is used on."""
    if use.span_mm is None:
        return track.steps
    low, high = use.span_mm
    found: list[Step] = []
    for step, (start, end) in zip(track.steps, track.spans_mm, strict=True):
        if isinstance(step, Glass) and start < high and low < end:
            if start < low or high < end:
                glass_mm = track.readings_mm[min(end, high)] - track.readings_mm[max(start, low)]
                found.append(replace(step, glass_m=glass_mm / 1000))
            else:
                found.append(step)
        elif not isinstance(step, Glass) and low <= start and end <= high:
            found.append(step)
    return found


def _along(step: Step, use: FibreUse, fitted: Fittings) -> Iterator[Step]:
    """Yield a step of a cable, in the cable's direction, and what is put behind it."""
    match step:
        case Glass():
            yield replace(step, fibre=use.fibre)
            yield from fitted.put_at("section", step.section)
        case SpliceStep():
            yield fitted.splice(step.where)
            yield from fitted.put_at("joint", step.where)
        case _:
            yield step


def _ends_of(use: FibreUse, tracks: Mapping[str, CableTrack]) -> tuple[str, str]:
    track = tracks[use.cable]
    return use.nodes(track.start, track.end)


def _attenuator(fitted: Fittings, site: str) -> tuple[Step, ...]:
    if fitted.attenuator is None:
        return ()
    return (Part(where=site, item="attenuator", loss=fitted.attenuator),)


def _through(
    node: str, joint_at: Mapping[str, str], site_names: Mapping[str, str], fitted: Fittings
) -> Iterator[Step]:
    site = site_names.get(node, "")
    if node in joint_at:
        yield fitted.splice(joint_at[node])
        yield from fitted.put_at("joint", joint_at[node])
        yield from fitted.put_at("site", site)
        return
    pigtail, mating = SpliceStep(where=site, is_pigtail=True), fitted.pair(site)
    yield from (pigtail, mating)
    yield from fitted.put_at("site", site)
    yield from (mating, pigtail)
