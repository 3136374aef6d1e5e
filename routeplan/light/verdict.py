"""Why a circuit fits, fails, or cannot be judged, in plain words."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

from routeplan.light.fibres import Fibre
from routeplan.light.interfaces import Optic, dispersion_limits_ps_per_nm
from routeplan.light.model import Verdict
from routeplan.light.power import Loss, printed_db

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = [
    "Finding",
    "PowerFigures",
    "dispersion_findings",
    "power_findings",
    "verdict_of",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing found, and what it means by itself; None for a remark that decides nothing."""

    verdict: Verdict | None
    text: str


class PowerFigures(Protocol):
    """What the findings on power are drawn from."""

    @property
    def available_db(self) -> float | None:
        """What may be lost. [dB]"""

    @property
    def margin_db(self) -> float | None:
        """What the worst loss leaves. [dB]"""

    @property
    def statistical_margin_db(self) -> float | None:
        """What the statistical loss leaves. [dB]"""

    @property
    def overload_db(self) -> float | None:
        """Excess at the receiver. [dB]"""

    @property
    def attenuator_db(self) -> float | None:
        """Attenuator that takes the excess away. [dB]"""


def verdict_of(verdicts: Iterable[Verdict | None]) -> Verdict:
    """Return the verdict of several: one failing fails all; one fitting is needed to fit."""
    given = {verdict for verdict in verdicts if verdict is not None}
    if "fails" in given:
        return "fails"
    return "fits" if given == {"fits"} else "unknown"


def power_findings(
    power: PowerFigures, loss: Loss, optic: Optic | None, *, practice: LossPractice
) -> list[Finding]:
    """Return what is to be said of loss, margin, overload and attenuator."""
    found: list[Finding] = []
    if loss.is_capped:
        text = (
            f"Nominal plus {practice.sigma_count:g} sigma goes beyond the worst loss, so the "
            f"worst, {loss.worst_db:.3f} dB, stands for the statistical loss."
        )
        found.append(Finding(verdict=None, text=text))
    if optic is None:
        text = "No interface is named, so there is nothing to hold the loss against."
        return [*found, Finding(verdict="unknown", text=text)]
    found.append(_margin_finding(power, loss, optic, practice))
    found += _overload_findings(power, optic, practice)
    return found


def dispersion_findings(
    dispersion_ps_per_nm: tuple[float, float],
    spans: Sequence[tuple[Fibre, float]],
    optic: Optic | None,
    *,
    wavelength_nm: float,
) -> list[Finding]:
    """Return what is to be said of single-mode working and dispersion."""
    found: list[Finding] = []
    for name in sorted({f.name for f, _ in spans if wavelength_nm < f.cutoff_max_nm}):
        text = (
            f"{name} is sure to carry a single mode only above its cable cut-off, "
            f"which may lie over {wavelength_nm:g} nm."
        )
        found.append(Finding(verdict="unknown", text=text))
    limits = dispersion_limits_ps_per_nm(optic, wavelength_nm) if optic else None
    if optic is None or limits is None:
        return found
    low, high = (round(value, 3) for value in dispersion_ps_per_nm)
    if low < round(limits[0], 3) or high > round(limits[1], 3):
        text = (
            f"Dispersion may be {low:.1f} to {high:.1f} ps/nm; {optic.name} is made for "
            f"{limits[0]:.1f} to {limits[1]:.1f} ps/nm at {wavelength_nm:g} nm."
        )
        found.append(Finding(verdict="fails", text=text))
    return found


def _judged_db(power: PowerFigures, practice: LossPractice) -> float | None:
    """Return the margin that the verdict is on."""
    if practice.verdict_on == "worst":
        return power.margin_db
    return power.statistical_margin_db


def _margin_finding(
    power: PowerFigures, loss: Loss, optic: Optic, practice: LossPractice
) -> Finding:
    margin_db = _judged_db(power, practice)
    if margin_db is None or power.available_db is None:
        text = (
            f"{optic.name} states neither a channel loss nor both launch and sensitivity, so what "
            "may be lost is not known."
        )
        return Finding(verdict="unknown", text=text)
    worst = practice.verdict_on == "worst"
    lost_db = loss.worst_db if worst else loss.statistical_db
    text = (
        f"{optic.name} allows {power.available_db:.3f} dB; the "
        f"{'worst' if worst else 'statistical'} loss is {lost_db:.3f} dB and "
        f"{practice.margin_db:.3f} dB are kept in hand"
    )
    if margin_db >= 0.0:
        return Finding(verdict="fits", text=f"{text}: {margin_db:.3f} dB are left.")
    text = f"{text} (loss.margin_db): {-margin_db:.3f} dB are missing"
    return Finding(verdict="fails", text=f"{text}{_on_statistical(power, practice)}.")


def _on_statistical(power: PowerFigures, practice: LossPractice) -> str:
    """Return what a verdict on the statistical loss would rest on, if it is on the worst."""
    margin_db = power.statistical_margin_db
    if practice.verdict_on != "worst" or margin_db is None or margin_db == power.margin_db:
        return ""
    if margin_db < 0.0:
        return f"; on the statistical loss {-margin_db:.3f} dB would be missing, too"
    return f"; on the statistical loss {margin_db:.3f} dB would be left (loss.verdict_on)"


def _overload_findings(power: PowerFigures, optic: Optic, practice: LossPractice) -> list[Finding]:
    margin_db = _judged_db(power, practice)
    if power.overload_db is None:
        text = (
            f"{optic.name} does not state both its highest launch and its overload, so light that "
            "is too strong cannot be ruled out."
        )
        return [Finding(verdict=None, text=text)]
    if power.overload_db <= 0.0:
        return []
    strong = f"The receiver may get {power.overload_db:.3f} dB more than it stands"
    if power.attenuator_db is None:
        return [Finding(verdict="fails", text=f"{strong}; no stock attenuator is that large.")]
    mend = f"a {power.attenuator_db:g} dB attenuator at the receiver"
    if margin_db is None:
        return [Finding(verdict="unknown", text=f"{strong}: it needs {mend}.")]
    left_db = printed_db(margin_db - power.attenuator_db)
    if left_db < 0.0:
        text = f"{strong}, and with {mend} the margin would be {left_db:.3f} dB."
        return [Finding(verdict="fails", text=text)]
    text = f"{strong}: with {mend} the margin is {left_db:.3f} dB."
    return [Finding(verdict="fits", text=text)]
