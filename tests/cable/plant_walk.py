"""A walk through a laid plant, from panel to panel, that knows nothing of how it was planned."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

from routeplan.cable.model import Joint, Layout, Splice
from routeplan.cable.panels import Port
from routeplan.cable.schedule import EXISTING, PANEL


@dataclass(frozen=True, kw_only=True)
class Arrival:
    """Where light comes out: site, cable and fibre; and the rows it met on the way."""

    site: str
    cable: str
    fibre: int
    rows: tuple[Splice, ...]


class PlantWalker:
    """Follows light through sections and joints by the rows of the schedule alone."""

    def __init__(
        self, layout: Layout, rows: Sequence[Splice], *, site_names: dict[str, str]
    ) -> None:
        """Note which joint is at each end of a section and where it is entered between them."""
        self.sections = {section.id: section for section in layout.sections}
        self.site_names = site_names
        self.ends: dict[tuple[str, str], Joint] = {}
        self.entries: defaultdict[str, list[tuple[int, Joint]]] = defaultdict(list)
        for joint in layout.joints:
            for end in joint.ends:
                assert (end.section, end.side) not in self.ends, "a cable end is in two joints"
                self.ends[end.section, end.side] = joint
            for section, at in zip(joint.opened, joint.opened_mm, strict=True):
                self.entries[section].append((at, joint))
        self.rows: dict[tuple[str, str, str, int], Splice] = {}
        for row in rows:
            for end in (row.a, row.b):
                if end is not None and end.section not in (EXISTING, PANEL):
                    key = (row.joint, end.section, end.side, end.fibre)
                    assert key not in self.rows, "a fibre stands twice in one joint"
                    self.rows[key] = row
        self.passed: Counter[tuple[str, int, int, int]] = Counter()

    def enter(self, port: Port) -> Arrival:
        """Go in at a port's fibre and return where the light comes out."""
        section = self.sections[port.section]
        for at, joint in self.entries[port.section]:
            if port.is_entered and self.site_names.get(joint.node or "") == port.site:
                forward = self._panel_side(joint, port) == "start"
                return self._walk(port.section, port.fibre, at, forward=forward)
        assert not port.is_entered
        if section.start == port.site and (port.section, "start") not in self.ends:
            found = self._walk(port.section, port.fibre, section.start_chain_mm, forward=True)
            if section.end != port.site or found.site != port.site:
                return found
        return self._walk(port.section, port.fibre, section.end_chain_mm, forward=False)

    def _panel_side(self, joint: Joint, port: Port) -> str:
        for side in ("start", "end"):
            row = self.rows[joint.id, port.section, side, port.fibre]
            if row.kind == "splice" and row.circuit == port.circuit:
                assert row.b is not None
                assert row.b.section == PANEL
                return side
        raise AssertionError("no row leads to this port")

    def _walk(self, section: str, fibre: int, at: int, *, forward: bool) -> Arrival:
        met: list[Splice] = []
        while True:
            own = self.sections[section]
            ahead = [
                entry
                for entry in self.entries[section]
                if (entry[0] > at if forward else entry[0] < at)
            ]
            side = "end" if forward else "start"
            limit = own.end_chain_mm if forward else own.start_chain_mm
            reach, joint = (
                (min(ahead) if forward else max(ahead))
                if ahead
                else (limit, self.ends.get((section, side)))
            )
            self.passed[section, fibre, min(at, reach), max(at, reach)] += 1
            if joint is None:
                site = own.end if forward else own.start
                return Arrival(site=site, cable=own.cable, fibre=fibre, rows=tuple(met))
            row = self.rows[joint.id, section, side, fibre]
            assert row.kind != "stored", "a circuit runs into a stored fibre"
            met.append(row)
            is_a = (row.a.section, row.a.side, row.a.fibre) == (section, side, fibre)
            far = row.b if is_a else row.a
            assert far is not None
            if far.section == PANEL:
                site = self.site_names[joint.node or ""]
                return Arrival(site=site, cable=own.cable, fibre=fibre, rows=tuple(met))
            section, fibre, forward = far.section, far.fibre, far.side == "start"
            own = self.sections[section]
            entered = [reach for reach, other in self.entries[section] if other is joint]
            at = own.start_chain_mm if forward else own.end_chain_mm
            at = entered[0] if (section, far.side) not in self.ends or entered else at
