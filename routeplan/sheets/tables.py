"""The one catalogue of tables: every column with its unit, digits and where it comes from."""

from __future__ import annotations

from collections.abc import Mapping

from routeplan.sheets.column_kinds import (
    choice_column,
    count_column,
    decibels_column,
    metres_column,
    money_column,
    number_column,
    rows_column,
    text_column,
)
from routeplan.sheets.columns import Column, Json, Row, Table
from routeplan.sheets.tables_light import LIGHT_TABLES, VERDICTS
from routeplan.sheets.tables_ways import WAY_TABLES

__all__ = ["HEAD", "SCHEMA", "TABLES", "Column", "Json", "Row", "Table", "csv_tables", "table"]

SCHEMA = 1
"""Version of the layout of `plan.json`."""

_PLACEMENTS = ("aerial", "duct", "buried", "surface", "indoor", "bridge", "water", "existing")


HEAD = (
    count_column("schema", "Version of this layout."),
    text_column("title", "Title of the run."),
    choice_column("purpose", "Set of defaults", "link", "venue"),
    choice_column("verdict", "Worst of all checks", *VERDICTS),
    choice_column("units", "What people are shown, this file being SI", "metric", "us"),
    text_column("currency", "Currency of all costs, as the run file names it."),
    count_column("fibres_per_tray", "Splices on a tray."),
    text_column("digest", "SHA-256 of all input files, one after the other."),
)
"""What stands at the head of `plan.json`, before its tables."""

_LON = number_column("lon", "Longitude, WGS 84.", "deg", 9)
_LAT = number_column("lat", "Latitude, WGS 84.", "deg", 9)

_FIBRE_END = (
    text_column("cable", "Cable the fibre is in."),
    text_column("section", "Section the fibre is in, or existing or panel."),
    text_column("side", "Its end in the joint, start or end: entered at mid-span it has both."),
    count_column("fibre", "Fibre number."),
    text_column("tube_colour", "Colour of its tube."),
    text_column("fibre_colour", "Colour of the fibre."),
)

_TABLES = (
    Table(
        name="totals",
        title="Totals",
        path=("totals",),
        is_single=True,
        columns=(
            metres_column("ground_m", "Way on the ground, all legs."),
            metres_column("sheath_m", "Cable along the jacket, all sections."),
            metres_column("glass_m", "Fibre along the glass, all cables, existing spans included."),
            metres_column("ordered_m", "Bought reels."),
            metres_column("stock_m", "Used from stock."),
            count_column("reel_count", "Reels."),
            count_column("section_count", "Sections of cable."),
            count_column("joint_count", "Joints."),
            count_column("closure_count", "Closures: joints that hold splices."),
            count_column("splice_count", "Splices in closures."),
            count_column("pigtail_splice_count", "Pigtail splices behind panels."),
            money_column("cost", "Reels and joints."),
        ),
    ),
    Table(
        name="nodes",
        title="Nodes",
        path=("nodes",),
        columns=(
            text_column("name", "Name of the site or branch point."),
            text_column("role", "Role of a site.", may_be_null=True),
            _LON,
            _LAT,
        ),
    ),
    Table(
        name="stretches",
        title="Stretches",
        path=("legs", "stretches"),
        carried=(("leg", "name"),),
        columns=(
            choice_column("placement", "How the cable lies", *_PLACEMENTS),
            metres_column("from_ground_m", "Where it begins."),
            metres_column("to_ground_m", "Where it ends."),
        ),
    ),
    Table(
        name="steep",
        title="Steep stretches",
        path=("legs", "steep"),
        carried=(("leg", "name"),),
        columns=(
            metres_column("from_ground_m", "Where it begins."),
            metres_column("to_ground_m", "Where it ends."),
            metres_column("rise_m", "How much higher its end is, negative where it falls."),
            number_column("slope_max_ratio", "Greatest slope in it, rise over level.", "", 4),
        ),
    ),
    Table(
        name="legs",
        title="Legs",
        path=("legs",),
        columns=(
            text_column("name", "Name."),
            text_column("from", "Node it starts at."),
            text_column("to", "Node it ends at."),
            metres_column("grid_m", "Length in the grid.", may_be_null=True),
            text_column("grid_crs", "The grid."),
            number_column(
                "grid_scale_factor", "Grid over ellipsoid length.", "", 9, may_be_null=True
            ),
            metres_column("ellipsoid_m", "Geodesic length on the ellipsoid."),
            metres_column("ground_m", "Length on the ground."),
            Column(
                key="heights_from",
                kind="texts",
                text="Where heights are from: geometry, terrain, both, or nothing.",
            ),
            metres_column("smoothed_off_m", "What smoothing of a terrain took off the length."),
            rows_column("stretches", "stretches", "Its placements in order."),
            rows_column("steep", "steep", "Its steep stretches in order."),
            Column(key="line", kind="points", text="Vertices: lon, lat, height.", is_listed=False),
            Column(
                key="line_ground_m",
                kind="numbers",
                text="Their stations.",
                unit="m",
                is_listed=False,
            ),
        ),
    ),
    Table(
        name="crossings",
        title="Crossings",
        path=("crossings",),
        csv="crossings.csv",
        columns=(
            text_column("leg", "Leg."),
            text_column("name", "Name."),
            choice_column(
                "crosses",
                "What is met",
                *("road", "rail", "water", "power", "pipeline", "boundary", "avoid", "permit"),
            ),
            text_column("class", "Its class, as a road's."),
            choice_column("how", "How it is met", "crosses", "touches", "along", "inside"),
            metres_column("ground_m", "Middle of it, on the ground from the leg's start."),
            metres_column("length_m", "Ground along it or inside it.", may_be_null=True),
            metres_column(
                "width_m",
                "Ground kept for crossing it, from edge to edge: declared, inside an area, or "
                "taken for a line.",
                may_be_null=True,
            ),
            number_column("angle_deg", "Between it and the leg.", "deg", 1, may_be_null=True),
            text_column("ask", "Who has to be asked: the owner, else the name, else the class."),
            choice_column("source", "Who says so", "declared", "found"),
            text_column("file", "Layer it was found in.", may_be_null=True),
            _LON,
            _LAT,
        ),
    ),
    Table(
        name="cables",
        title="Cables",
        path=("cables",),
        columns=(
            text_column("name", "Name."),
            Column(key="legs", kind="texts", text="Legs it passes, in order."),
            count_column("fibre_count", "Fibres."),
            text_column("fibre_type", "Fibre type."),
            metres_column("sheath_m", "Cable along the jacket."),
            metres_column("glass_m", "Fibre from end to end."),
        ),
    ),
    Table(
        name="stations",
        title="Stations",
        path=("stations",),
        csv="stations.csv",
        columns=(
            text_column("leg", "Leg."),
            text_column("cable", "Cable."),
            choice_column(
                "kind",
                "First that applies",
                *("site", "joint", "crossing", "loop", "reach", "vertex"),
            ),
            text_column("name", "Name of what is there.", may_be_null=True),
            text_column("reach_kind", "Kind of reach point.", may_be_null=True),
            choice_column("placement", "Placement of the way on from here", *_PLACEMENTS),
            metres_column("ground_m", "On the ground from the leg's start."),
            metres_column("sheath_from_m", "Jacket before the cable stored here."),
            metres_column("sheath_to_m", "Jacket after the cable stored here."),
            metres_column("glass_from_m", "Glass before the cable stored here."),
            metres_column("glass_to_m", "Glass after the cable stored here."),
            text_column("section", "Section of cable.", may_be_null=True),
            metres_column("section_m", "Jacket from the section's own start.", may_be_null=True),
            _LON,
            _LAT,
            metres_column("height_m", "Height.", may_be_null=True),
            metres_column("jacket_mark_m", "Mark printed on the jacket there.", may_be_null=True),
        ),
    ),
    Table(
        name="sections",
        title="Sections",
        path=("sections",),
        columns=(
            text_column("name", "Name."),
            text_column("cable", "Cable it is part of."),
            text_column("from", "Joint or site it starts at."),
            text_column("to", "Joint or site it ends at."),
            metres_column("sheath_m", "Jacket between its ends, tails included."),
            metres_column("needed_m", "With the ordering allowance."),
            text_column("reel", "Reel it is cut from."),
        ),
    ),
    Table(
        name="reels",
        title="Reels",
        path=("reels",),
        csv="reels.csv",
        columns=(
            text_column("name", "Name."),
            metres_column("length_m", "Length ordered, or of the stock reel."),
            choice_column("source", "How it is come by", "put-up", "to-length", "stock"),
            metres_column("used_m", "Needed by its sections."),
            metres_column("spare_m", "Left over."),
            money_column("cost", "Price."),
            Column(key="sections", kind="texts", text="Sections cut from it, outer end first."),
        ),
    ),
    Table(
        name="layout",
        title="Layout",
        path=("layout",),
        is_single=True,
        columns=(
            Column(key="optimal", kind="flag", text="Whether the cost is proven least."),
            money_column("cost", "Reels and joints."),
            money_column("lower_bound", "No layout costs less than this."),
            Column(
                key="one_fewer",
                kind="row",
                of="one_fewer",
                may_be_null=True,
                text="Cheapest with one joint fewer.",
            ),
            text_column("stopped_by", "What ended the search early, if anything did."),
        ),
    ),
    Table(
        name="one_fewer",
        title="One joint fewer",
        path=("layout", "one_fewer"),
        is_single=True,
        columns=(count_column("joint_count", "Joints."), money_column("cost", "Reels and joints.")),
    ),
    Table(
        name="ends",
        title="Cable ends",
        path=("joints", "ends"),
        columns=(
            text_column("section", "Section."),
            choice_column("side", "End of the section", "start", "end"),
            metres_column("jacket_mark_m", "Mark printed on the jacket there.", may_be_null=True),
        ),
    ),
    Table(
        name="joints",
        title="Joints",
        path=("joints",),
        columns=(
            text_column("name", "Name."),
            text_column("node", "Node, where it is at one.", may_be_null=True),
            text_column("reach_name", "Place it is at."),
            text_column("reach_kind", "Kind of place.", may_be_null=True),
            text_column("leg", "Leg."),
            metres_column("ground_m", "On the ground from the leg's start."),
            _LON,
            _LAT,
            choice_column("kind", "How ends are joined", "splice", "mated"),
            Column(key="assumed", kind="flag", text="Whether the place is assumed."),
            count_column("splice_count", "Splices."),
            money_column("cost", "Closure, visit and splices."),
            rows_column("ends", "ends", "Cable ends that meet in it."),
            Column(key="opened", kind="texts", text="Sections that it enters at mid-span."),
            text_column("closure", "Joint in whose closure it is: its own, or one it shares."),
        ),
    ),
    Table(name="fibre_end", title="Fibre end", path=(), columns=_FIBRE_END),
    Table(
        name="splices",
        title="Splice schedule",
        path=("splices",),
        csv="splice_schedule.csv",
        columns=(
            text_column("joint", "Joint."),
            count_column("tray", "Tray; 0 for fibres that pass uncut, on none."),
            count_column("position", "Position on the tray."),
            Column(key="in", kind="row", of="fibre_end", text="Fibre coming in."),
            Column(key="out", kind="row", of="fibre_end", may_be_null=True, text="Fibre going on."),
            choice_column("kind", "What is done with the fibre", "splice", "express", "stored"),
            text_column("circuit", "Circuit, empty for a spare."),
            decibels_column("limit_db", "Loss to meet, average of both directions."),
        ),
    ),
    Table(
        name="panels",
        title="Panels",
        path=("panels",),
        csv="panels.csv",
        columns=(
            text_column("site", "Site."),
            count_column("port", "Port of its panel."),
            text_column("cable", "Cable behind it."),
            text_column("section", "Its section; none: somebody else's.", may_be_null=True),
            count_column("fibre", "Fibre behind it."),
            text_column("tube_colour", "Colour of its tube."),
            text_column("fibre_colour", "Colour of the fibre."),
            text_column("circuit", "Circuit, empty for a spare."),
            choice_column("light", "Which way light goes there", "out", "in", "both", "none"),
            text_column("connector", "Polish of its connector."),
        ),
    ),
    *LIGHT_TABLES,
    *WAY_TABLES,
    Table(
        name="checks",
        title="Checks",
        path=("checks",),
        csv="checks.csv",
        columns=(
            text_column("kind", "What is checked."),
            text_column("where", "Where."),
            number_column("value", "Found.", "", 3, may_be_null=True),
            number_column("limit", "Limit.", "", 3, may_be_null=True),
            text_column("unit", "Unit of both."),
            choice_column("verdict", "Verdict", *VERDICTS),
            text_column("source", "Where the limit comes from."),
        ),
    ),
    Table(
        name="bill",
        title="Bill",
        path=("bill",),
        csv="bill.csv",
        columns=(
            text_column("item", "What."),
            number_column("quantity", "How many or how much.", "", 3),
            text_column("unit", "Unit of the quantity."),
            money_column("each", "Price of one.", may_be_null=True),
            money_column("total", "Price of all.", may_be_null=True),
            text_column("note", "Note."),
        ),
    ),
    Table(
        name="assumptions",
        title="Assumptions",
        path=("assumptions",),
        csv="assumptions.csv",
        columns=(
            text_column("name", "Key or matter."),
            Column(key="value", kind="value", text="Value taken."),
            text_column("unit", "Unit."),
            text_column("source", "Where it comes from."),
            text_column("reason", "Why it is taken."),
        ),
    ),
    Table(
        name="warnings",
        title="Warnings",
        path=("warnings",),
        columns=(text_column("where", "Where."), text_column("message", "What.")),
    ),
    Table(
        name="areas",
        title="Areas",
        path=("areas",),
        columns=(
            text_column("name", "Name."),
            choice_column("kind", "What it is", "avoid", "permit"),
            Column(key="rings", kind="rings", text="Rings of lon, lat.", is_listed=False),
        ),
    ),
    Table(
        name="cautions",
        title="Cautions",
        path=("cautions",),
        columns=(text_column("topic", "Hazard."), text_column("text", "What to mind.")),
    ),
)

TABLES: Mapping[str, Table] = {entry.name: entry for entry in _TABLES}


def table(name: str) -> Table:
    """Return the table with this name."""
    return TABLES[name]


def csv_tables() -> tuple[Table, ...]:
    """Return the tables that are written as CSV, in file order."""
    return tuple(entry for entry in _TABLES if entry.csv)
