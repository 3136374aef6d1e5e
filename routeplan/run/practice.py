"""
The house rules of a run, its cables, interfaces and circuits, as the run file names them.

The models carry no default numbers: those are rows of the table `practice`, merged beneath what
the planner gives (see `defaults`). Bounds are sanity limits: they catch a wrong unit or a slip of
the decimal point, not bad engineering.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Literal, TypeAlias

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, Strict

__all__ = [
    "CableMake",
    "CircuitOrder",
    "Costs",
    "Interface",
    "Joining",
    "Joints",
    "Loss",
    "MeasuredAttenuation",
    "Practice",
    "Reels",
    "RunFile",
    "RunHead",
    "Slack",
]

AnyPlacement = Literal[
    "aerial", "duct", "buried", "surface", "indoor", "bridge", "water", "existing"
]
OwnPlacement = Literal["aerial", "duct", "buried", "surface", "indoor", "bridge", "water"]


def _without_repeats(values: tuple[float, ...]) -> tuple[float, ...]:
    if len(set(values)) < len(values):
        raise ValueError("a value stands twice")
    return values


def _rising(values: tuple[float, ...]) -> tuple[float, ...]:
    return tuple(sorted(_without_repeats(values)))


Metres: TypeAlias = Annotated[float, Field(ge=0, le=100_000)]
PositiveMetres: TypeAlias = Annotated[float, Field(gt=0, le=1_000_000)]
Ratio: TypeAlias = Annotated[float, Field(ge=0, le=0.5)]
Money: TypeAlias = Annotated[float, Field(ge=0, le=1e9)]
Decibels: TypeAlias = Annotated[float, Field(ge=0, le=100)]
PowerDbm: TypeAlias = Annotated[float, Field(ge=-100, le=50)]
Count: TypeAlias = Annotated[int, Field(ge=0, le=1000)]
WavelengthNm: TypeAlias = Annotated[float, Field(ge=1260, le=1625)]
Name: TypeAlias = Annotated[str, Field(min_length=1, max_length=500)]
MetresByPlacement: TypeAlias = Mapping[OwnPlacement, PositiveMetres]


class _Model(BaseModel):
    model_config = ConfigDict(
        frozen=True, extra="forbid", strict=True, allow_inf_nan=False, validate_by_name=True
    )


class Joining(_Model):
    """How lines become legs and points find them."""

    join_tolerance_m: Metres = Field(description="Line ends nearer than this are one node. [m]")
    reach_distance_max_m: Metres = Field(
        description="A reach point farther from every leg is an error. [m]"
    )
    site_distance_max_m: Metres = Field(
        description="A site farther from every leg is an error. [m]"
    )
    track_tolerance_m: Metres = Field(description="How far thinning may move a recorded track. [m]")


class MeasuredAttenuation(_Model):
    """Attenuation of the delivered cable as measured at one wavelength."""

    wavelength_nm: WavelengthNm = Field(description="Vacuum wavelength. [nm]")
    attenuation_db_per_km: float = Field(
        gt=0, le=10, description="Attenuation, taken as typical and as maximum. [dB/km]"
    )
    sigma_db_per_km: float = Field(
        default=0.0, ge=0, le=10, description="Standard deviation between sections. [dB/km]"
    )


class CableMake(_Model):
    """What cable is ordered."""

    fibre_count: int = Field(ge=1, le=6912, description="Fibres in the cable. [-]")
    fibre_type: Name = Field(description="Fibre type, a name of the table `fibres`.")
    fibres_per_tube: int = Field(ge=1, le=288, description="Fibres in each tube. [-]")
    colour_code: Name = Field(description="Colour code, a name of the table `colours`.")
    glass_over_sheath_ratio: Ratio = Field(
        description="How much longer the fibre is than the sheath, by stranding. [-]"
    )
    measured: Annotated[tuple[MeasuredAttenuation, ...], Strict(False)] = Field(
        default=(), description="Measured attenuation; replaces that of the fibre type."
    )
    legs: Annotated[tuple[Name, ...], Strict(False)] = Field(
        default=(), description="Legs the cable takes, for a named cable."
    )


class Slack(_Model):
    """Spare cable, and how much longer cable is than the way it lies on."""

    joint_tail_m: Metres = Field(description="Each cable end at a joint. [m]")
    pole_tail_m: Metres = Field(description="Each cable end at a joint on a pole. [m]")
    entry_m: Metres = Field(description="Cable inside, at each end site. [m]")
    riser_m: Metres = Field(
        description="Where a cable changes between aerial and another placement. [m]"
    )
    racking_m: Metres = Field(description="In each maintenance hole passed. [m]")
    loop_every_m: MetresByPlacement = Field(
        description="Longest ground distance between loops by placement; empty: none. [m]"
    )
    loop_m: MetresByPlacement = Field(description="Cable in one loop by placement. [m]")
    crossing_loop_m: Metres = Field(
        description="Loop on each side of a bridge, rail or water crossing. [m]"
    )
    undulation_ratio: Mapping[OwnPlacement, Ratio] = Field(
        description="How much longer the sheath is than the ground, by placement. [-]"
    )
    ordering_ratio: Ratio = Field(description="Ordered beyond what the ruler says. [-]")


class Reels(_Model):
    """How cable can be bought."""

    buy: Annotated[
        tuple[Literal["to-length", "put-ups"], ...],
        Strict(False),
        AfterValidator(_without_repeats),
    ] = Field(min_length=1, description="Ways of buying: to-length, put-ups.")
    put_ups_m: Annotated[tuple[PositiveMetres, ...], Strict(False), AfterValidator(_rising)] = (
        Field(min_length=1, max_length=100, description="Lengths the maker sells. [m]")
    )
    max_m: PositiveMetres = Field(description="To-length: longest piece made. [m]")
    round_up_m: PositiveMetres = Field(description="To-length: ordered in steps of. [m]")


class Joints(_Model):
    """Where joints may be, and how many."""

    assumed_spacing_m: PositiveMetres = Field(
        description="Longest gap between places fit for a joint before some are assumed. [m]"
    )
    max_count: Count | None = Field(
        default=None, description="Most joints in one cable; left out: no limit. [-]"
    )
    max_section_m: MetresByPlacement = Field(
        default_factory=dict,
        description="Longest section by placement; left out: no limit. [m]",
    )
    fibres_per_tray: Literal[12, 24] = Field(description="Splices a closure's tray holds. [-]")


class Costs(_Model):
    """What things cost, in one currency."""

    currency: Annotated[str, Field(min_length=1, max_length=12)] = Field(
        description="Currency, as it is to be printed."
    )
    cable_per_m: Money = Field(description="Bought cable. [currency/m]")
    stock_per_m: Money = Field(description="Cable from stock. [currency/m]")
    reel_each: Money = Field(description="Drum and haulage. [currency]")
    joint_each: Money = Field(description="Closure and visit. [currency]")
    splice_each: Money = Field(description="One fusion splice. [currency]")
    avoid_factor: float = Field(
        ge=1, le=1e6, description="A joint at a place to avoid costs so many times more. [-]"
    )


class Loss(_Model):
    """What splices and connectors lose, and what is kept in hand."""

    splice_mean_db: Decibels = Field(description="Mean loss of a splice. [dB]")
    splice_sigma_db: Decibels = Field(description="Standard deviation of a splice. [dB]")
    splice_limit_db: Decibels = Field(description="Loss a splice has to meet. [dB]")
    connector_mean_db: Decibels = Field(description="Mean loss of a mated pair. [dB]")
    connector_sigma_db: Decibels = Field(description="Standard deviation of a pair. [dB]")
    connector_limit_db: Decibels = Field(description="Loss a mated pair has to meet. [dB]")
    connector_pairs: Count = Field(description="Mated pairs in a circuit. [-]")
    pigtail_splices: Count = Field(description="Pigtail splices in a circuit. [-]")
    sigma_count: float = Field(
        ge=0, le=10, description="Standard deviations added for the statistical loss. [-]"
    )
    margin_db: Decibels = Field(description="Loss kept in hand. [dB]")
    verdict_on: Literal["worst", "statistical"] = Field(
        description="The loss that verdicts are on: worst or statistical."
    )


class Practice(_Model):
    """The house rules of a run."""

    joining: Joining
    slack: Slack
    reels: Reels
    joints: Joints
    costs: Costs
    loss: Loss


class Interface(_Model):
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
    penalty_db: Decibels = Field(description="Power penalty on the sensitivity basis. [dB]")
    dispersion_max_ps_per_nm: float | None = Field(
        default=None, gt=0, le=1e6, description="Most dispersion borne. [ps/nm]"
    )
    bit_rate_gbps: float | None = Field(
        default=None, gt=0, le=1e5, description="Line rate. [Gbit/s]"
    )

    @property
    def band_nm(self) -> tuple[float, float]:
        """Return the shortest and the longest wavelength [nm]."""
        if self.wavelength_nm is not None:
            return self.wavelength_nm, self.wavelength_nm
        assert self.wavelength_min_nm is not None
        assert self.wavelength_max_nm is not None
        return self.wavelength_min_nm, self.wavelength_max_nm


class CircuitOrder(_Model):
    """One light path asked for: between which sites, on how many fibres, for what light."""

    name: Name = Field(description="Name, unique in the run.")
    from_: Name | None = Field(
        default=None, alias="from", description="Site; left out: an end of the longest leg."
    )
    to: Name | None = Field(
        default=None, description="Site; left out: the other end of the longest leg."
    )
    fibre_count: Literal[1, 2] = Field(description="Fibres of the circuit. [-]")
    interface: Name | None = Field(
        default=None, description="Interface, of the table `interfaces` or one's own."
    )
    wavelengths_nm: Annotated[
        tuple[WavelengthNm, ...], Strict(False), AfterValidator(_without_repeats)
    ] = Field(min_length=1, max_length=200, description="Wavelengths to be used. [nm]")


class RunHead(_Model):
    """The keys at the top of a run file."""

    title: Annotated[str, Field(min_length=1, max_length=500)] | None = Field(
        default=None, description="Title of every sheet; left out: the geometry file's name."
    )
    purpose: Literal["link", "venue"] = Field(
        description="Chooses the set of defaults: link (permanent) or venue (temporary)."
    )
    geometry: Annotated[tuple[Annotated[str, Field(min_length=1)], ...], Strict(False)] | None = (
        Field(
            default=None,
            min_length=1,
            description="Vector files, beside the run file; file.gpkg|layer for one layer. "
            "Left out: the only one in the run file's folder.",
        )
    )
    crs: Name | None = Field(
        default=None, description="CRS of files that do not say, and the grid to report in."
    )
    background: Annotated[tuple[Annotated[str, Field(min_length=1)], ...], Strict(False)] = Field(
        default=(),
        description="Vector files of streets or a coast, drawn thin on the map and nothing else.",
    )
    placement: AnyPlacement = Field(description="Placement of lines that do not say.")
    units: Literal["metric", "us"] = Field(
        description="What people see: metric or us; files keep SI."
    )


class RunFile(RunHead):
    """A whole run file, defaults filled in."""

    joining: Joining
    cable: CableMake = Field(description="The default cable.")
    cables: Mapping[Name, CableMake] = Field(
        default_factory=dict, description="Other cables by name, over the default cable."
    )
    slack: Slack
    reels: Reels
    joints: Joints
    costs: Costs
    loss: Loss
    interface: Mapping[Name, Interface] = Field(
        default_factory=dict, description="Interfaces of one's own by name."
    )
    circuit: Annotated[tuple[CircuitOrder, ...], Strict(False)] = Field(
        default=(), description="Circuits; none: one between the ends of the longest leg."
    )
