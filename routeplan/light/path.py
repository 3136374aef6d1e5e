"""All that the light of a circuit meets, read off the layout of its cables."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from routeplan.cable.model import Cable, FibreUse, Joint, Section
from routeplan.light.model import Direction, ExistingSpan, Glass, Mating, Path, SpliceStep, Step

__all__ = ["CableTrack", "cable_track", "circuit_paths"]


@dataclass(frozen=True, slots=True, kw_only=True)
class CableTrack:
    """Glass, joints and existing spans along one cable, in its own direction, for any fibre."""

    cable: str
    start: str
    end: str
    steps: tuple[Step, ...]


def cable_track(
    cable: Cable,
    sections: Sequence[Section],
    joints: Sequence[Joint],
    existing: Sequence[tuple[int, ExistingSpan]],
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
    """
    along: list[tuple[int, int, Step]] = []
    for section in sections:
        glass = Glass(
            section=section.id,
            cable=cable.id,
            fibre=0,
            fibre_type=cable.make.fibre_type,
            glass_m=section.glass_mm / 1000,
        )
        along.append((section.start_chain_mm, 1, glass))
    along.extend((chain_mm, 1, span) for chain_mm, span in existing)
    along.extend((joint.mark.chain_mm, 0, SpliceStep(where=joint.id)) for joint in joints)
    ordered = sorted(along, key=lambda item: item[:2])
    return CableTrack(
        cable=cable.id,
        start=cable.start,
        end=cable.end,
        steps=tuple(step for _, _, step in ordered),
    )


def circuit_paths(
    circuit: str,
    uses: Sequence[FibreUse],
    tracks: Mapping[str, CableTrack],
    *,
    joint_at: Mapping[str, str],
    site_names: Mapping[str, str],
    ends: tuple[int, int],
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
        Joint id of every node that has one.
    site_names
        Name of every site, by node id.
    ends
        Mated pairs and pigtail splices of the whole circuit, shared between its two ends. [-]
    """
    paths: list[Path] = []
    directions: tuple[Direction, Direction] = ("from-to", "to-from")
    for strand, direction in zip((1, 2), directions, strict=True):
        own = [use for use in uses if use.strand == strand]
        strand_uses = own or [use for use in uses if use.strand == 1]
        steps = tuple(
            _steps(strand_uses, tracks, joint_at=joint_at, site_names=site_names, ends=ends)
        )
        turned = steps if direction == "from-to" else steps[::-1]
        paths.append(Path(circuit=circuit, direction=direction, steps=turned))
    return paths[0], paths[1]


def _steps(
    uses: Sequence[FibreUse],
    tracks: Mapping[str, CableTrack],
    *,
    joint_at: Mapping[str, str],
    site_names: Mapping[str, str],
    ends: tuple[int, int],
) -> Iterator[Step]:
    matings, pigtails = ends
    first, last = uses[0], uses[-1]
    start = site_names[_ends_of(first, tracks)[0]]
    end = site_names[_ends_of(last, tracks)[1]]
    yield from [Mating(where=start)] * (matings - matings // 2)
    yield from [SpliceStep(where=start, is_pigtail=True)] * (pigtails - pigtails // 2)
    for number, use in enumerate(uses):
        if number:
            yield from _through(_ends_of(use, tracks)[0], joint_at, site_names)
        track = tracks[use.cable].steps
        for step in track if use.forward else reversed(track):
            yield replace(step, fibre=use.fibre) if isinstance(step, Glass) else step
    yield from [SpliceStep(where=end, is_pigtail=True)] * (pigtails // 2)
    yield from [Mating(where=end)] * (matings // 2)


def _ends_of(use: FibreUse, tracks: Mapping[str, CableTrack]) -> tuple[str, str]:
    track = tracks[use.cable]
    return (track.start, track.end) if use.forward else (track.end, track.start)


def _through(
    node: str, joint_at: Mapping[str, str], site_names: Mapping[str, str]
) -> Iterator[Step]:
    if node in joint_at:
        yield SpliceStep(where=joint_at[node])
        return
    site = site_names[node]
    pigtail, mating = SpliceStep(where=site, is_pigtail=True), Mating(where=site)
    yield from (pigtail, mating, mating, pigtail)
