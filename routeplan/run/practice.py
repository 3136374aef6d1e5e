"""
The house rules of a run, its cables, interfaces and circuits, as the run file names them.

The models carry no default numbers: those are rows of the table `practice`, merged beneath what
the planner gives (see `defaults`). Bounds are sanity limits: they catch a wrong unit or a slip of
the decimal point, not bad engineering.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Literal, TypeAlias

from pydantic import AfterValidator, BeforeValidator, Field, Strict

from routeplan.run.fields import (
    AnyPlacement,
    Count,
    Decibels,
    Metres,
    Money,
    Name,
    OwnPlacement,
    PositiveMetres,
    Ratio,
    Section,
    rising,
    without_repeats,
)
from routeplan.run.optics import (
    CircuitOrder,
    Finish,
    Interface,
    JointFigures,
    MeasuredAttenuation,
    Panel,
    SectionFigures,
)
from routeplan.run.street_rules import LegOrder, StreetRules

__all__ = [
    "CableMake",
    "CircuitOrder",
    "Costs",
    "FeatureKind",
    "GroundRules",
    "Interface",
    "JacketMark",
    "Joining",
    "Joints",
    "LayerColumns",
    "Loss",
    "MeasuredAttenuation",
    "Practice",
    "ReachKind",
    "Reels",
    "RunFile",
    "RunHead",
    "Slack",
]

ReachKind = Literal[
    "handhole", "maintenance_hole", "pole", "cabinet", "pedestal", "building", "assumed"
]

FeatureKind = Literal["road", "rail", "water", "power", "pipeline", "boundary", "avoid", "permit"]

MetresByPlacement: TypeAlias = Mapping[OwnPlacement, PositiveMetres]
Text: TypeAlias = Annotated[str, Field(min_length=1)]


def _listed(value: object) -> object:
    """Return one text as a list of one."""
    return [value] if isinstance(value, str) else value


class Joining(Section):
    """How lines become legs and points find them."""

    join_tolerance_m: Metres = Field(description="Line ends nearer than this are one node. [m]")
    reach_distance_max_m: Metres = Field(
        description="A reach point farther from every leg is an error. [m]"
    )
    site_distance_max_m: Metres = Field(
        description="A site farther from every leg is an error. [m]"
    )
    track_tolerance_m: Metres = Field(description="How far thinning may move a recorded track. [m]")


class GroundRules(Section):
    """How the height of the ground counts, and what is near enough to be met."""

    smooth_wave_m: Metres = Field(
        description="Waves of the terrain so long are halved, shorter ones more; 0: none. [m]"
    )
    track_heights: bool = Field(
        description="Whether the heights of a recorded track count for its length."
    )
    steep_ratio: Ratio = Field(description="Slope over which a stretch is listed as steep. [-]")
    steep_length_m: Metres = Field(description="Shorter steep stretches are not listed. [m]")
    crossing_width_m: Metres = Field(
        description="Taken for a line found in a layer, from edge to edge and square to it. [m]"
    )
    along_distance_m: Metres = Field(
        description="A line of a layer farther to the side is not run along. [m]"
    )
    along_length_m: PositiveMetres = Field(description="Least length of running along a line. [m]")


class LayerColumns(Section):
    """One layer of lines and areas that may be crossed, and which columns say what they are."""

    file: Text = Field(description="Vector file or OpenStreetMap extract; file.gpkg|layer.")
    kind: FeatureKind | None = Field(
        default=None, description="What all of it is; left out: what a column says."
    )
    kind_column: Text | None = Field(
        default=None, description="Column of the kind; left out: `kind` or `crosses`."
    )
    kinds: Mapping[str, FeatureKind] | None = Field(
        default=None, description="Kind for each value of that column; other values are left out."
    )
    class_column: Text | None = Field(
        default=None, description="Column of the class, as a road's; left out: `class`."
    )
    name_column: Text | None = Field(
        default=None, description="Column of the name; left out: `name`."
    )
    owner_column: Text | None = Field(
        default=None, description="Column of who is asked; left out: `owner` or `operator`."
    )


class CableMake(Section):
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
    make: Name | None = Field(
        default=None,
        description="Make, a name of the table `cable_makes`; left out: not known. Unless given, "
        "glass_over_sheath_ratio is its own.",
    )
    metal: bool | None = Field(
        default=None, description="Whether metal is in it; left out: as its make."
    )
    located: bool = Field(
        default=False, description="Whether something to find it by is laid with it."
    )
    indoor_max_m: Metres | None = Field(
        default=None,
        description="How far its jacket may be carried indoors; left out: as its make. [m]",
    )
    terminate: Literal["circuits", "all"] = Field(
        default="circuits",
        description="Fibres that get a pigtail at the panels: those of circuits, or all.",
    )
    legs: Annotated[tuple[Name, ...], Strict(False)] = Field(
        default=(),
        max_length=1000,
        description="Legs a named cable takes, in order along it; it passes nodes and sites uncut.",
    )


class JacketMark(Section):
    """What is printed on the jacket of one reel's cable where its section begins."""

    reel: Name = Field(description="Reel as the plan names it, for example R1.")
    start_m: float = Field(
        ge=0, le=1_000_000, description="Mark printed where its section begins. [m]"
    )
    falling: bool = Field(default=False, description="Whether marks fall along the section.")


class Slack(Section):
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
    midspan_loop_m: Metres = Field(
        description="Loop where a cable can be entered at mid-span without being cut. [m]"
    )
    undulation_ratio: Mapping[OwnPlacement, Ratio] = Field(
        description="How much longer the sheath is than the ground, by placement. [-]"
    )
    ordering_ratio: Ratio = Field(description="Ordered beyond what the ruler says. [-]")


class Reels(Section):
    """How cable can be bought."""

    buy: Annotated[
        tuple[Literal["to-length", "put-ups"], ...],
        Strict(False),
        AfterValidator(without_repeats),
    ] = Field(min_length=1, description="Ways of buying: to-length, put-ups.")
    put_ups_m: Annotated[tuple[PositiveMetres, ...], Strict(False), AfterValidator(rising)] = Field(
        min_length=1, max_length=100, description="Lengths the maker sells. [m]"
    )
    max_m: PositiveMetres = Field(description="To-length: longest piece made. [m]")
    round_up_m: PositiveMetres = Field(description="To-length: ordered in steps of. [m]")


class Joints(Section):
    """Where joints may be, and how many."""

    assumed_spacing_m: Annotated[float, Field(ge=1, le=1_000_000)] = Field(
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
    keep_off_m: Metres | None = Field(
        default=None,
        description="How near no joint is put to a bridge, water or a crossing; left out: 0. [m]",
    )
    cost_factor_by_kind: Mapping[ReachKind, Annotated[float, Field(gt=0, le=1e4)]] = Field(
        default_factory=dict,
        description="A joint costs so many times more by kind of place; left out: as any. [-]",
    )
    closure_splices_max: int | None = Field(
        default=None,
        ge=1,
        le=10_000,
        description="Splices a closure holds; left out: not known. [-]",
    )
    closure_ports: int | None = Field(
        default=None,
        ge=1,
        le=100,
        description="Cable ends a closure takes; left out: not known. [-]",
    )


class Costs(Section):
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


class Loss(Section):
    """What splices and connectors lose, and what is kept in hand."""

    splice_mean_db: Decibels = Field(description="Mean loss of a splice. [dB]")
    splice_sigma_db: Decibels = Field(description="Standard deviation of a splice. [dB]")
    splice_limit_db: Decibels = Field(description="Loss a splice has to meet. [dB]")
    connector_mean_db: Decibels = Field(description="Mean loss of a mated pair. [dB]")
    connector_sigma_db: Decibels = Field(description="Standard deviation of a pair. [dB]")
    connector_limit_db: Decibels = Field(description="Loss a mated pair has to meet. [dB]")
    connector_grade: Name | None = Field(
        default=None,
        description="Grade of all pairs, of the table `connectors`, instead of the three figures.",
    )
    connector_polish: Finish = Field(description="Polish of all pairs: PC, UPC or APC.")
    connector_pairs: Count = Field(description="Mated pairs in a circuit. [-]")
    pigtail_splices: Count = Field(description="Pigtail splices in a circuit. [-]")
    sigma_count: float = Field(
        ge=0, le=10, description="Standard deviations added for the statistical loss. [-]"
    )
    margin_db: Decibels = Field(description="Loss kept in hand. [dB]")
    verdict_on: Literal["worst", "statistical"] = Field(
        description="The loss that verdicts are on: worst or statistical."
    )
    repairs_count: Count = Field(description="Repairs expected over the life. [-]")
    repair_cable_m: Metres = Field(description="New cable put in by a repair. [m]")


class Practice(Section):
    """The house rules of a run."""

    joining: Joining
    ground: GroundRules
    slack: Slack
    reels: Reels
    joints: Joints
    costs: Costs
    loss: Loss


class RunHead(Section):
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
    terrain: Annotated[
        tuple[Text, ...],
        Strict(False),
        BeforeValidator(_listed, json_schema_input_type=tuple[Text, ...] | Text),
    ] = Field(
        default=(),
        description="Rasters of heights (.tif, .hgt, .asc), for lines without heights: a file, "
        "a folder or a list of them, the finest first.",
    )
    layers: Annotated[tuple[Text, ...], Strict(False)] = Field(
        default=(),
        description="OpenStreetMap extracts and vector files of what may be crossed; see "
        "`[[layer]]` for files that name things in their own way.",
    )
    marks: Annotated[
        tuple[Text, ...],
        Strict(False),
        BeforeValidator(_listed, json_schema_input_type=tuple[Text, ...] | Text),
    ] = Field(
        default=(),
        description="CSV files of jacket marks, one line a reel, beside `[[mark]]`: a file "
        "or a list; columns `reel`, `start_m` in metres, `falling` (true or false, or left out).",
    )
    placement: AnyPlacement = Field(description="Placement of lines that do not say.")
    units: Literal["metric", "us"] = Field(
        description="What people see: metric or us; files keep SI."
    )


class RunFile(RunHead):
    """A whole run file, defaults filled in."""

    joining: Joining
    ground: GroundRules
    layer: Annotated[tuple[LayerColumns, ...], Strict(False)] = Field(
        default=(), description="Layers of what may be crossed, with their columns."
    )
    streets: StreetRules | None = Field(
        default=None, description="Where ways of legs are found, and what they cost."
    )
    leg: Annotated[tuple[LegOrder, ...], Strict(False)] = Field(
        default=(), description="Legs whose way is to be found along streets."
    )
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
    panel: Annotated[tuple[Panel, ...], Strict(False)] = Field(
        default=(), description="What is mated at a site, where it differs from practice."
    )
    joint: Annotated[tuple[JointFigures, ...], Strict(False)] = Field(
        default=(), description="Splices in one joint, where they differ from practice."
    )
    section: Annotated[tuple[SectionFigures, ...], Strict(False)] = Field(
        default=(), description="Sections of cable whose attenuation was measured."
    )
    mark: Annotated[tuple[JacketMark, ...], Strict(False)] = Field(
        default=(), description="Jacket marks of reels that are there, for every sheet."
    )
    circuit: Annotated[tuple[CircuitOrder, ...], Strict(False)] = Field(
        default=(), description="Circuits; none: one between the ends of the longest leg."
    )
