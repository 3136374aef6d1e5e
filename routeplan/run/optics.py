"""What a run file says of light: interfaces, circuits, panels, joints and measured sections."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Literal, TypeAlias

from pydantic import AfterValidator, Field, Strict

from routeplan.run.fields import (
    Decibels,
    Name,
    PowerDbm,
    Section,
    WavelengthNm,
    without_repeats,
)

__all__ = [
    "ANY_INTERFACE",
    "CircuitBend",
    "CircuitOrder",
    "CircuitPart",
    "Finish",
    "Interface",
    "JointFigures",
    "MeasuredAttenuation",
    "Panel",
    "SectionFigures",
]

ANY_INTERFACE = "any"
"""Stands for every interface that closes a circuit."""

Finish: TypeAlias = Literal["PC", "UPC", "APC"]
_SHORTEST_NM, _LONGEST_NM = 1260.0, 1625.0  # the light that is planned at all


class MeasuredAttenuation(Section):
    """Attenuation of the delivered cable as measured at one wavelength."""

    wavelength_nm: WavelengthNm = Field(description="Vacuum wavelength. [nm]")
    attenuation_db_per_km: float = Field(
        gt=0, le=10, description="Attenuation, taken as typical and as maximum. [dB/km]"
    )
    sigma_db_per_km: float = Field(
        default=0.0, ge=0, le=10, description="Standard deviation between sections. [dB/km]"
    )


class Panel(Section):
    """What is mated at one site."""

    site: Name = Field(description="Site whose mated pairs these are.")
    grade: Name | None = Field(
        default=None, description="Grade of its pairs, of the table `connectors`."
    )
    polish: Finish | None = Field(
        default=None, description="Polish of the panel's side; left out: loss.connector_polish."
    )
    lead_polish: Finish | None = Field(
        default=None, description="Polish of the patch lead; left out: the panel's."
    )
    measured_db: Decibels | None = Field(
        default=None, description="Loss of each pair as measured, instead of a grade. [dB]"
    )


class JointFigures(Section):
    """What the splices in one joint lose, where that differs from practice."""

    place: Name = Field(description="Place or node the joint stands at.")
    splice_mean_db: Decibels | None = Field(
        default=None, description="Mean loss of a splice there; left out: as practice. [dB]"
    )
    splice_sigma_db: Decibels | None = Field(
        default=None, description="Standard deviation there; left out: as practice. [dB]"
    )
    splice_limit_db: Decibels | None = Field(
        default=None, description="Loss to meet there; left out: as practice. [dB]"
    )
    measured_db: Decibels | None = Field(
        default=None, description="Loss of each splice as measured, instead. [dB]"
    )


class SectionFigures(Section):
    """Attenuation of one section of cable as measured."""

    name: Name = Field(description="Section as the plan names it, for example S2.")
    measured: Annotated[tuple[MeasuredAttenuation, ...], Strict(False)] = Field(
        min_length=1, description="Measured attenuation of this section."
    )


class Interface(Section):
    """An optical interface of one's own: by channel loss, or by power and sensitivity."""

    wavelength_nm: WavelengthNm | None = Field(
        default=None, description="Wavelength, where there is one only. [nm]"
    )
    wavelength_min_nm: WavelengthNm | None = Field(
        default=None, description="Shortest wavelength of its band. [nm]"
    )
    wavelength_max_nm: WavelengthNm | None = Field(
        default=None, description="Longest wavelength of its band. [nm]"
    )
    tx_min_dbm: PowerDbm | None = Field(default=None, description="Least launch power. [dBm]")
    tx_max_dbm: PowerDbm | None = Field(
        default=None, description="Most launch power; left out: overload unknown. [dBm]"
    )
    rx_sensitivity_dbm: PowerDbm | None = Field(
        default=None, description="Least power the receiver needs. [dBm]"
    )
    rx_overload_dbm: PowerDbm | None = Field(
        default=None, description="Most power the receiver stands. [dBm]"
    )
    channel_loss_db: Decibels | None = Field(
        default=None, description="Largest channel insertion loss, penalty included. [dB]"
    )
    channel_loss_min_db: Decibels | None = Field(
        default=None, description="Least channel loss the receiver needs before it. [dB]"
    )
    penalty_db: Decibels = Field(description="Power penalty on the sensitivity basis. [dB]")
    dispersion_max_ps_per_nm: float | None = Field(
        default=None, gt=0, le=1e6, description="Most dispersion borne. [ps/nm]"
    )
    bit_rate_gbps: float | None = Field(
        default=None, gt=0, le=1e5, description="Line rate. [Gbit/s]"
    )
    line_width_nm: float | None = Field(
        default=None, gt=0, le=100, description="Spectral width of the laser, rms. [nm]"
    )
    return_loss_min_db: Decibels | None = Field(
        default=None, description="Least return loss the transmitter bears. [dB]"
    )
    rx_return_loss_db: Decibels | None = Field(
        default=None, description="Return loss of the receiver itself. [dB]"
    )
    rf: bool = Field(
        default=False, description="Whether it carries radio frequency on the light's amplitude."
    )
    slope_w_per_a: float | None = Field(
        default=None, gt=0, le=10, description="Radio frequency: slope of the laser. [W/A]"
    )
    responsivity_a_per_w: float | None = Field(
        default=None, gt=0, le=10, description="Radio frequency: of the diode. [A/W]"
    )
    modulation_ratio: float | None = Field(
        default=None, gt=0, le=1, description="Radio frequency: modulation index of a carrier. [-]"
    )
    bandwidth_hz: float | None = Field(
        default=None, gt=0, le=1e11, description="Radio frequency: noise bandwidth. [Hz]"
    )
    intensity_noise_db_per_hz: float | None = Field(
        default=None, ge=-300, le=0, description="Radio frequency: noise of the laser. [dB/Hz]"
    )
    thermal_a_per_sqrt_hz: float | None = Field(
        default=None, ge=0, le=1e-6, description="Radio frequency: receiver noise. [A/sqrt(Hz)]"
    )

    @property
    def is_open_band(self) -> bool:
        """Whether it does not say its light at all."""
        given = (self.wavelength_nm, self.wavelength_min_nm, self.wavelength_max_nm)
        return all(each is None for each in given)

    @property
    def band_nm(self) -> tuple[float, float]:
        """Return the shortest and the longest wavelength; all that is planned if none said. [nm]"""
        if self.wavelength_nm is not None:
            return self.wavelength_nm, self.wavelength_nm
        if self.is_open_band:
            return _SHORTEST_NM, _LONGEST_NM
        assert self.wavelength_min_nm is not None
        assert self.wavelength_max_nm is not None
        return self.wavelength_min_nm, self.wavelength_max_nm


class CircuitPart(Section):
    """A passive part in a circuit: of the table, or one's own."""

    name: Name | None = Field(
        default=None, description="Row of the table `optical_parts`, or what an own part is called."
    )
    kind: Literal["own"] | None = Field(
        default=None, description='"own" for a part that is not of the table.'
    )
    at: Name | None = Field(
        default=None, description="Site on its way, or place of a joint; left out: `from`."
    )
    count: int = Field(default=1, ge=1, le=100, description="How many one after the other. [-]")
    loss_db: Decibels | None = Field(default=None, description="Own part: mean loss. [dB]")
    sigma_db: Decibels | None = Field(
        default=None, description="Own part: standard deviation; left out: none. [dB]"
    )
    limit_db: Decibels | None = Field(
        default=None, description="Own part: most it loses; left out: its mean. [dB]"
    )
    return_loss_db: Decibels | None = Field(
        default=None, description="Return loss; left out: sends nothing back. [dB]"
    )


class CircuitBend(Section):
    """A bend that the fibres of a circuit have to take."""

    place: Name = Field(description="Site, joint or reach place on the circuit's way.")
    radius_mm: float = Field(gt=0, le=10_000, description="Radius. [mm]")
    turns: float = Field(gt=0, le=10_000, description="Turns together; a right angle is 0.25. [-]")


class CircuitOrder(Section):
    """One light path asked for: between which sites, on how many fibres, for what light."""

    name: Name = Field(description="Name, unique in the run.")
    from_: Name | None = Field(
        default=None, alias="from", description="Site; left out: an end of the longest leg."
    )
    to: Name | None = Field(
        default=None, description="Site; left out: the other end of the longest leg."
    )
    fibre_count: Literal[1, 2] = Field(description="Fibres of the circuit. [-]")
    via: Annotated[tuple[Name, ...], Strict(False)] = Field(
        default=(),
        max_length=100,
        description="Cables its way takes; left out: those with the least glass.",
    )
    fibres: Annotated[
        tuple[Annotated[int, Field(ge=1, le=6912)], ...],
        Strict(False),
        AfterValidator(without_repeats),
    ] = Field(
        default=(),
        max_length=2,
        description="Fibre numbers it takes all the way, one for each fibre; left out: chosen. [-]",
    )
    interface: Name | None = Field(
        default=None,
        description='Interface, of the table `interfaces` or one\'s own; "any": all that close it.',
    )
    wavelengths_nm: Annotated[
        tuple[WavelengthNm, ...], Strict(False), AfterValidator(without_repeats)
    ] = Field(min_length=1, max_length=200, description="Wavelengths to be used. [nm]")
    attenuator_db: Decibels | None = Field(
        default=None, description="Attenuator fitted at each receiver, a stock step. [dB]"
    )
    patch: Annotated[tuple[Name, ...], Strict(False)] = Field(
        default=(),
        max_length=100,
        description="Sites on its way with a further panel: a mated pair for each time named.",
    )
    leads: Mapping[Name, Literal["crossed", "straight"]] = Field(
        default_factory=dict,
        description="Patch leads by site: crossed or straight; left out: crossed.",
    )
    rolls: Annotated[tuple[Name, ...], Strict(False)] = Field(
        default=(),
        max_length=100,
        description="Places where the pair is rolled once more than planned.",
    )
    standby_for: Name | None = Field(
        default=None, description="Circuit it stands by for; their delays are compared."
    )
    part: Annotated[tuple[CircuitPart, ...], Strict(False)] = Field(
        default=(), max_length=100, description="Passive parts in its way, `[[circuit.part]]`."
    )
    bend: Annotated[tuple[CircuitBend, ...], Strict(False)] = Field(
        default=(), max_length=100, description="Bends in its way, `[[circuit.bend]]`."
    )
