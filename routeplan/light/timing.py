"""What delay means: asymmetry, clocks, single-frequency networks, a standby way."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from routeplan.light.constants import constant
from routeplan.light.delay import link_delay_ns
from routeplan.light.fibres import Fibre
from routeplan.tables import load_rows

__all__ = [
    "TimingFigure",
    "TimingRow",
    "clock_error_ns",
    "glass_for_delay_m",
    "glass_for_error_m",
    "pair_asymmetry_ns",
    "thermal_delay_ns",
    "timing_figures",
    "wavelength_asymmetry_ns",
]

_NS_PER_US = 1000.0
_PS_PER_NS = 1000.0
_M_PER_KM = 1000.0


@dataclass(frozen=True, slots=True, kw_only=True)
class TimingRow:
    """A time that a link's delay is set beside."""

    name: str
    kind: str
    limit_us: float
    source: str
    confidence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class TimingFigure:
    """A figure of a link beside a published limit; what it uses of it, as a ratio."""

    name: str
    kind: str
    value_us: float
    limit_us: float
    source: str

    @property
    def share_ratio(self) -> float:
        """How much of the limit is used. [-]"""
        return self.value_us / self.limit_us


def pair_asymmetry_ns(there_ns: float, back_ns: float) -> float:
    """
    Return how much longer one way of a link takes than the other.

    Parameters
    ----------
    there_ns
        Delay one way. [ns]
    back_ns
        Delay the other way. [ns]

    Returns
    -------
    pair_asymmetry_ns
        Never negative. [ns]

    References
    ----------
    .. [1] IEEE 1588: delay asymmetry.

    Examples
    --------
    >>> pair_asymmetry_ns(100.0, 90.0)
    10.0
    """
    return abs(there_ns - back_ns)


def clock_error_ns(asymmetry_ns: float) -> float:
    """
    Return the error of a clock set over a link that believes both ways to take the same time.

    Parameters
    ----------
    asymmetry_ns
        Difference of the two delays. [ns]

    Returns
    -------
    clock_error_ns
        Half of it. [ns]

    References
    ----------
    .. [1] IEEE 1588: offset from half the round trip.

    Examples
    --------
    >>> from routeplan.light.delay import delay_ns
    >>> round(clock_error_ns(delay_ns(100.0, 1.4682)), 1)
    244.9
    """
    return asymmetry_ns / 2.0


def wavelength_asymmetry_ns(
    there_nm: float, back_nm: float, spans: Sequence[tuple[Fibre, float]]
) -> float:
    """
    Return the asymmetry of one fibre that works both ways at two wavelengths.

    Parameters
    ----------
    there_nm
        Wavelength one way. [nm]
    back_nm
        Wavelength the other way. [nm]
    spans
        Fibre type and glass length of each span. [m]

    Returns
    -------
    wavelength_asymmetry_ns
        Never negative. [ns]

    References
    ----------
    .. [1] See `group_index`.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> round(wavelength_asymmetry_ns(1310.0, 1490.0, [(find_fibre("G.652.D"), 1000.0)]), 1)
    1.2
    """
    return pair_asymmetry_ns(link_delay_ns(there_nm, spans), link_delay_ns(back_nm, spans))


def glass_for_delay_m(delay_us: float, index: float) -> float:
    """
    Return how much glass takes a time.

    Parameters
    ----------
    delay_us
        One way. [us]
    index
        Group index. [-]

    Returns
    -------
    glass_for_delay_m
        [m]

    References
    ----------
    .. [1] See `delay_ns`.

    Examples
    --------
    >>> round(glass_for_delay_m(224.0, 1.4682) / 1000.0, 1)
    45.7
    """
    return delay_us * constant("speed_of_light_m_per_s") / index / 1e6


def glass_for_error_m(error_ns: float, index: float) -> float:
    """
    Return how unlike in length two fibres of a pair may be for a clock error.

    Parameters
    ----------
    error_ns
        Highest error of the clock. [ns]
    index
        Group index. [-]

    Returns
    -------
    glass_for_error_m
        Difference of the two lengths. [m]

    References
    ----------
    .. [1] See `clock_error_ns`.

    Examples
    --------
    >>> round(glass_for_error_m(1000.0, 1.4682))
    408
    """
    return glass_for_delay_m(2.0 * error_ns / _NS_PER_US, index)


def thermal_delay_ns(glass_m: float, kelvin: float) -> float:
    """
    Return how much the delay of cabled fibre moves with its temperature.

    Parameters
    ----------
    glass_m
        Length of the fibre. [m]
    kelvin
        Change of temperature. [K]

    Returns
    -------
    thermal_delay_ns
        Same sign as `kelvin`. [ns]

    References
    ----------
    .. [1] Table `light_constants`, from memory.

    Examples
    --------
    >>> round(thermal_delay_ns(10_000.0, 30.0), 1)
    11.4
    """
    return constant("thermal_ps_per_km_k") * glass_m / _M_PER_KM * kelvin / _PS_PER_NS


def timing_figures(
    there_ns: float, back_ns: float, *, standby_ns: float | None = None
) -> tuple[TimingFigure, ...]:
    """
    Return the times of a link beside every published limit they belong to.

    Delay beside guard intervals and packet times, clock error beside clock limits, and the
    difference to a standby way, where there is one, beside what receivers bridge.

    Parameters
    ----------
    there_ns
        Delay from-to. [ns]
    back_ns
        Delay to-from. [ns]
    standby_ns
        Delay of the standby way. [ns]

    Returns
    -------
    timing_figures
        One for each row that applies. [us]

    References
    ----------
    .. [1] Table `timing`.
    """
    values: dict[str, float | None] = {
        "guard interval": there_ns,
        "packet time": there_ns,
        "time error": clock_error_ns(pair_asymmetry_ns(there_ns, back_ns)),
        "path difference": None if standby_ns is None else abs(there_ns - standby_ns),
    }
    return tuple(
        TimingFigure(
            name=row.name,
            kind=row.kind,
            value_us=value / _NS_PER_US,
            limit_us=row.limit_us,
            source=row.source,
        )
        for row in load_rows("timing", TimingRow)
        if (value := values.get(row.kind)) is not None
    )
