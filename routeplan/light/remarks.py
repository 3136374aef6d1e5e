"""What is to be said of a circuit beside its power: PMD, reflections, hazard, unlike fibre."""

from __future__ import annotations

from collections.abc import Sequence

from routeplan.light.attenuation import attenuation_of, ceiling_db_per_km
from routeplan.light.bends import bend_loss
from routeplan.light.contributions import Measured, measured_of, unlike_joints
from routeplan.light.fibres import Fibre, find_fibre
from routeplan.light.hazard import launch_hazard
from routeplan.light.interfaces import Optic
from routeplan.light.model import Bend, BudgetLine, Glass, Path
from routeplan.light.penalties import dgd_limit_ps, intersymbol_penalty_db, spread_ratio
from routeplan.light.pmd import link_pmd_ps
from routeplan.light.power import printed_db
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.light.verdict import Finding

__all__ = [
    "hazard_findings",
    "path_findings",
    "penalty_lines",
    "pmd_findings",
    "return_loss_findings",
]

_SAFE_LEVEL = "1"


def penalty_lines(
    dispersion_ps_per_nm: tuple[float, float], optic: Optic | None
) -> tuple[BudgetLine, ...]:
    """
    Return the dispersion penalty as a line of the budget, where nothing else holds it.

    That is on the sensitivity basis, with no penalty stated and a line width and rate known. A
    penalty takes from what may be lost; it does not weaken the light.
    """
    if optic is None or optic.basis == "channel" or optic.penalty_db > 0.0:
        return ()
    rate_gbps = optic.lane_gbd or optic.bit_rate_gbps
    if rate_gbps is None or optic.line_width_nm is None:
        return ()
    worst = max(dispersion_ps_per_nm, key=abs)
    ratio = spread_ratio(rate_gbps, worst, optic.line_width_nm)
    penalty_db = printed_db(intersymbol_penalty_db(ratio))
    line = BudgetLine(
        item="dispersion penalty",
        count=1,
        each_db=penalty_db,
        sigma_db=0.0,
        limit_db=penalty_db,
        source=f"ITU-T G-series supplement 39, {ratio:.3f} of a bit at {worst:.1f} ps/nm",
    )
    return (line,)


def pmd_findings(spans: Sequence[tuple[Fibre, float]], optic: Optic | None) -> list[Finding]:
    """Return a failing finding where PMD takes more than a tenth of a symbol."""
    rate_gbd = (optic.lane_gbd or optic.bit_rate_gbps) if optic else None
    if optic is None or rate_gbd is None:
        return []
    pmd_ps, limit_ps = round(link_pmd_ps(spans), 3), round(dgd_limit_ps(rate_gbd), 3)
    if pmd_ps <= limit_ps:
        return []
    text = (
        f"PMD may reach {pmd_ps:.3f} ps; {optic.name} bears {limit_ps:.3f} ps, a tenth of a symbol."
    )
    return [Finding(verdict="fails", text=text)]


def return_loss_findings(return_loss_db: float | None, optic: Optic | None) -> list[Finding]:
    """Return a failing finding where more comes back than the transmitter bears."""
    least_db = optic.return_loss_min_db if optic else None
    if optic is None or least_db is None or return_loss_db is None:
        return []
    if printed_db(return_loss_db) >= least_db:
        return []
    text = (
        f"Return loss may be as low as {return_loss_db:.1f} dB; {optic.name} needs {least_db:g} dB."
    )
    return [Finding(verdict="fails", text=text)]


def hazard_findings(optic: Optic | None) -> list[Finding]:
    """Return a remark where the launched light is above hazard level 1."""
    launched = launch_hazard(optic) if optic else None
    if optic is None or launched is None or launched[1] == _SAFE_LEVEL:
        return []
    text = (
        f"{optic.name} may launch {launched[0]:.1f} dBm, hazard level {launched[1]}: never look "
        "into an open end."
    )
    return [Finding(verdict=None, text=text)]


def path_findings(path: Path, wavelength_nm: float, *, measured: Measured) -> list[Finding]:
    """Return remarks on unlike fibre, tight bends, and measured cable above its ceiling."""
    found = [
        Finding(
            verdict=None,
            text=f"{before} meets {behind} at {where}: traces read wrong there from one side, so "
            "measure from both.",
        )
        for where, before, behind in unlike_joints(path)
    ]
    for step in path.steps:
        if isinstance(step, Bend):
            found += _bend_findings(step, wavelength_nm)
    texts = dict.fromkeys(
        _ceiling_text(step, wavelength_nm, measured)
        for step in path.steps
        if measured and isinstance(step, Glass)
    )
    found += [Finding(verdict=None, text=text) for text in texts if text]
    return found


def _bend_findings(step: Bend, wavelength_nm: float) -> list[Finding]:
    """Return an unknown finding for a bend that no limit of the fibre type covers."""
    fibre = find_fibre(step.fibre_type)
    if bend_loss(fibre, step.radius_mm, step.turns, wavelength_nm=wavelength_nm) is not None:
        return []
    text = (
        f"The bend of {step.radius_mm:g} mm at {step.where} is tighter than {step.fibre_type} is "
        f"tested for, {fibre.bend_radius_min_mm:g} mm: its loss is not known."
    )
    return [Finding(verdict="unknown", text=text)]


def _ceiling_text(step: Glass, wavelength_nm: float, measured: Measured) -> str:
    points = measured_of(step, measured)
    ceiling = ceiling_db_per_km(wavelength_nm, find_fibre(step.fibre_type))
    if not points or ceiling is None:
        return ""
    found = attenuation_db_per_km(wavelength_nm, attenuation_of(step.fibre_type, points).maximum)
    if round(found, 3) <= ceiling:
        return ""
    return (
        f"Measured attenuation is {found:.3f} dB/km at {wavelength_nm:g} nm, above the "
        f"{ceiling:g} dB/km that {step.fibre_type} is allowed."
    )
