"""What comes back: return loss of a circuit as seen from one end."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import e, log10
from typing import TYPE_CHECKING, ClassVar, TypeAlias

from routeplan.light.attenuation import MeasuredPoint, attenuation_of
from routeplan.light.constants import constant
from routeplan.light.contributions import Measured, measured_of, step_loss
from routeplan.light.delay import group_index
from routeplan.light.fibres import find_fibre
from routeplan.light.model import ExistingSpan, Glass, Mating, Part, Path, Step
from routeplan.light.spectrum import attenuation_db_per_km
from routeplan.tables import load_rows

if TYPE_CHECKING:
    from routeplan.run.practice import Loss as LossPractice

__all__ = [
    "BackscatterRow",
    "Reflection",
    "backscatter_return_loss_db",
    "combined_return_loss_db",
    "fresnel_return_loss_db",
    "reflections",
    "return_loss_db",
]

_M_PER_KM = 1000.0
_S_PER_NS = 1e-9

_Lit: TypeAlias = tuple[float, float]  # attenuation per km and group index at one wavelength


@dataclass(frozen=True, slots=True, kw_only=True)
class BackscatterRow:
    """How far below a pulse of one nanosecond its backscatter lies."""

    KEY: ClassVar[tuple[str, ...]] = ("wavelength_nm",)

    wavelength_nm: float
    coefficient_db: float
    source: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Reflection:
    """One thing that sends light back, as seen from the end of the path's start."""

    where: str
    return_loss_db: float
    before_db: float

    @property
    def seen_db(self) -> float:
        """Its return loss with the way there and back. [dB]"""
        return self.return_loss_db + 2.0 * self.before_db


def fresnel_return_loss_db(index: float, outside_index: float = 1.0) -> float:
    r"""
    Return the return loss of a flat end of glass.

    .. math:: -10 \log_{10} \left(\frac{n - n_0}{n + n_0}\right)^2

    Parameters
    ----------
    index
        Refractive index of the glass. [-]
    outside_index
        Of what lies beyond: 1 for air. [-]

    Returns
    -------
    fresnel_return_loss_db
        Above 0. [dB]

    References
    ----------
    .. [1] Fresnel's formula at right angles.

    Examples
    --------
    >>> round(fresnel_return_loss_db(1.4682), 2)
    14.44
    """
    return -20.0 * log10(abs(index - outside_index) / (index + outside_index))


def combined_return_loss_db(seen_db: Iterable[float]) -> float | None:
    """
    Return the return loss of several reflections together, their powers added.

    Parameters
    ----------
    seen_db
        Return loss of each as seen from the same end. [dB]

    Returns
    -------
    combined_return_loss_db
        Never more than the least of them; None of nothing. [dB]

    References
    ----------
    .. [1] Powers add where the light is not coherent over the distances between.

    Examples
    --------
    >>> round(combined_return_loss_db([40.0, 40.0]), 2)
    36.99
    """
    back = sum(10.0 ** (-each / 10.0) for each in seen_db)
    return -10.0 * log10(back) if back > 0.0 else None


def backscatter_return_loss_db(
    glass_m: float, loss_db_per_km: float, *, wavelength_nm: float, index: float
) -> float | None:
    r"""
    Return the return loss of the glass itself.

    .. math:: -10 \log_{10} \left[ \kappa \frac{1 - e^{-2 \alpha L}}{2 \alpha} \right]

    with :math:`\kappa` the backscatter of a pulse over half the length it takes up.

    Parameters
    ----------
    glass_m
        Length of the fibre. [m]
    loss_db_per_km
        Its attenuation, above 0. [dB/km]
    wavelength_nm
        Vacuum wavelength. [nm]
    index
        Group index. [-]

    Returns
    -------
    backscatter_return_loss_db
        About 31 dB for long fibre at 1550 nm; None for none. [dB]

    References
    ----------
    .. [1] Backscatter of a 1 ns pulse: table `backscatter`.

    Examples
    --------
    >>> round(backscatter_return_loss_db(50_000.0, 0.19, wavelength_nm=1550.0, index=1.4682), 1)
    31.1
    """
    half_pulse_m = constant("speed_of_light_m_per_s") * _S_PER_NS / (2.0 * index)
    per_m = 10.0 ** (_backscatter_db(wavelength_nm) / 10.0) / half_pulse_m
    twice_per_m = 2.0 * loss_db_per_km / (10.0 * log10(e)) / _M_PER_KM
    back = (
        per_m * (1.0 - 10.0 ** (-2.0 * loss_db_per_km * glass_m / _M_PER_KM / 10.0)) / twice_per_m
    )
    return -10.0 * log10(back) if back > 0.0 else None


def reflections(
    path: Path,
    wavelength_nm: float,
    *,
    practice: LossPractice,
    connector_return_loss_db: float | None = None,
    receiver_return_loss_db: float | None = None,
    measured: Measured | None = None,
) -> tuple[Reflection, ...] | None:
    """
    Return everything that sends light back, in order along the path, or None if a pair is unknown.

    Each is seen through the nominal loss before it, there and back. Fusion splices send nothing
    back that matters.

    Parameters
    ----------
    path
        From the end that looks.
    wavelength_nm
        Vacuum wavelength. [nm]
    practice
        The `loss` section of the run's practice.
    connector_return_loss_db
        Of mated pairs that do not say their own. [dB]
    receiver_return_loss_db
        Of the receiver at the far end, where it is known. [dB]
    measured
        Measured attenuation by section or cable.

    Returns
    -------
    reflections
        Connectors, parts, glass, receiver. [dB]

    References
    ----------
    .. [1] See `combined_return_loss_db` and `backscatter_return_loss_db`.
    """
    measured = measured or {}
    found: list[Reflection] = []
    kinds: dict[tuple[str, tuple[MeasuredPoint, ...]], _Lit] = {}
    before_db = 0.0
    for step in path.steps:
        glass = _glass(step, wavelength_nm, measured, kinds)
        own_db = glass[0] if glass else _own_db(step, connector_return_loss_db)
        if own_db is None and isinstance(step, Mating):
            return None
        if own_db is not None:
            where = step.section if isinstance(step, Glass) else step.where
            found.append(Reflection(where=where, return_loss_db=own_db, before_db=before_db))
        if glass:
            before_db += glass[1]
        else:
            loss = step_loss(step, wavelength_nm, practice=practice, measured=measured)
            before_db += loss.mean_db if loss else 0.0
    if receiver_return_loss_db is not None:
        end = Reflection(
            where="receiver", return_loss_db=receiver_return_loss_db, before_db=before_db
        )
        found.append(end)
    return tuple(found)


def return_loss_db(found: Sequence[Reflection] | None) -> float | None:
    """
    Return the return loss of a circuit as seen from the end its reflections were listed from.

    Parameters
    ----------
    found
        What `reflections` returned.

    Returns
    -------
    return_loss_db
        None where it cannot be known. [dB]

    References
    ----------
    .. [1] See `reflections`.
    """
    if found is None:
        return None
    return combined_return_loss_db(each.seen_db for each in found)


def _own_db(step: Step, connector_return_loss_db: float | None) -> float | None:
    """Return the return loss of one step, None if it sends nothing back or that is not known."""
    match step:
        case Mating():
            own_db = step.return_loss_db
            return connector_return_loss_db if own_db is None else own_db
        case Part():
            return step.return_loss_db
        case _:
            return None


def _glass(
    step: Step,
    wavelength_nm: float,
    measured: Measured,
    kinds: dict[tuple[str, tuple[MeasuredPoint, ...]], _Lit],
) -> tuple[float | None, float] | None:
    """Return what glass sends back and what it loses; each kind of it is looked up once."""
    if not isinstance(step, Glass | ExistingSpan):
        return None
    points = tuple(measured_of(step, measured)) if isinstance(step, Glass) else ()
    kind = step.fibre_type, points
    if kind not in kinds:
        curve = attenuation_of(step.fibre_type, points).typical
        kinds[kind] = (
            attenuation_db_per_km(wavelength_nm, curve),
            group_index(wavelength_nm, find_fibre(step.fibre_type)),
        )
    db_per_km, index = kinds[kind]
    back_db = backscatter_return_loss_db(
        step.glass_m, db_per_km, wavelength_nm=wavelength_nm, index=index
    )
    loss_db = step.loss_db if isinstance(step, ExistingSpan) else None
    return back_db, db_per_km * (step.glass_m / _M_PER_KM) if loss_db is None else loss_db


def _backscatter_db(wavelength_nm: float) -> float:
    """Return the coefficient, straight in wavelength through the two rows."""
    first, last = sorted(load_rows("backscatter", BackscatterRow), key=lambda r: r.wavelength_nm)
    share = (wavelength_nm - first.wavelength_nm) / (last.wavelength_nm - first.wavelength_nm)
    rise_db: float = last.coefficient_db - first.coefficient_db
    return float(first.coefficient_db + share * rise_db)
