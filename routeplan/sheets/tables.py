"""The one catalogue of tables: every column with its unit, digits and where it comes from."""

from __future__ import annotations

from collections.abc import Mapping

from routeplan.sheets.columns import Column, Json, Row, Table

__all__ = ["HEAD", "SCHEMA", "TABLES", "Column", "Json", "Row", "Table", "csv_tables", "table"]

SCHEMA = 1
"""Version of the layout of `plan.json`."""

_PLACEMENTS = ("aerial", "duct", "buried", "surface", "indoor", "bridge", "water", "existing")
_VERDICTS = ("fits", "fails", "unknown")


def _text(key: str, text: str, **more: object) -> Column:
    return Column(key=key, kind="text", text=text, **more)  # type: ignore[arg-type]


def _choice(key: str, text: str, *choices: str) -> Column:
    listed = f"{', '.join(choices[:-1])} or {choices[-1]}"
    return Column(key=key, kind="text", text=f"{text}: {listed}.", choices=choices)


def _number(key: str, text: str, unit: str, digits: int, **more: object) -> Column:
    return Column(key=key, kind="number", text=text, unit=unit, digits=digits, **more)  # type: ignore[arg-type]


def _metres(key: str, text: str, **more: object) -> Column:
    return _number(key, text, "m", 3, **more)


def _decibels(key: str, text: str, **more: object) -> Column:
    return _number(key, text, "dB", 3, **more)


def _count(key: str, text: str, **more: object) -> Column:
    return Column(key=key, kind="integer", text=text, **more)  # type: ignore[arg-type]


def _rows(key: str, of: str, text: str) -> Column:
    return Column(key=key, kind="rows", of=of, text=text)


def _numbers(key: str, text: str, unit: str) -> Column:
    return Column(key=key, kind="numbers", text=text, unit=unit, is_listed=False)


def _power(key: str, text: str) -> Column:
    return _number(key, text, "dBm", 3, may_be_null=True)


def _money(key: str, text: str, **more: object) -> Column:
    return _number(key, text, "currency", 2, **more)


HEAD = (
    _count("schema", "Version of this layout."),
    _text("title", "Title of the run."),
    _choice("purpose", "Set of defaults", "link", "venue"),
    _choice("verdict", "Worst of all checks", *_VERDICTS),
    _choice("units", "What people are shown, this file being SI", "metric", "us"),
    _text("currency", "Currency of all costs, as the run file names it."),
    _count("fibres_per_tray", "Splices on a tray."),
    _text("digest", "SHA-256 of all input files, one after the other."),
)
"""What stands at the head of `plan.json`, before its tables."""

_LON = _number("lon", "Longitude, WGS 84.", "deg", 9)
_LAT = _number("lat", "Latitude, WGS 84.", "deg", 9)

_FIBRE_END = (
    _text("cable", "Cable the fibre is in."),
    _text("section", "Section the fibre is in."),
    _count("fibre", "Fibre number."),
    _text("tube_colour", "Colour of its tube."),
    _text("fibre_colour", "Colour of the fibre."),
)

_TABLES = (
    Table(
        name="totals",
        title="Totals",
        path=("totals",),
        is_single=True,
        columns=(
            _metres("ground_m", "Way on the ground, all legs."),
            _metres("sheath_m", "Cable along the jacket, all sections."),
            _metres("glass_m", "Fibre along the glass, all cables, existing spans included."),
            _metres("ordered_m", "Bought reels."),
            _metres("stock_m", "Used from stock."),
            _count("reel_count", "Reels."),
            _count("section_count", "Sections of cable."),
            _count("joint_count", "Joints."),
            _count("closure_count", "Closures: joints that hold splices."),
            _count("splice_count", "Splices in closures."),
            _count("pigtail_splice_count", "Pigtail splices behind panels."),
            _money("cost", "Reels and joints."),
        ),
    ),
    Table(
        name="nodes",
        title="Nodes",
        path=("nodes",),
        columns=(
            _text("name", "Name of the site or branch point."),
            _text("role", "Role of a site.", may_be_null=True),
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
            _choice("placement", "How the cable lies", *_PLACEMENTS),
            _metres("from_ground_m", "Where it begins."),
            _metres("to_ground_m", "Where it ends."),
        ),
    ),
    Table(
        name="legs",
        title="Legs",
        path=("legs",),
        columns=(
            _text("name", "Name."),
            _text("from", "Node it starts at."),
            _text("to", "Node it ends at."),
            _metres("grid_m", "Length in the grid.", may_be_null=True),
            _text("grid_crs", "The grid."),
            _number("grid_scale_factor", "Grid over ellipsoid length.", "", 9, may_be_null=True),
            _metres("ellipsoid_m", "Geodesic length on the ellipsoid."),
            _metres("ground_m", "Length on the ground."),
            _rows("stretches", "stretches", "Its placements in order."),
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
        columns=(
            _text("leg", "Leg."),
            _text("name", "Name."),
            _choice("crosses", "What is crossed", "road", "rail", "water", "power"),
            _metres("ground_m", "Middle of it, on the ground from the leg's start."),
            _metres("width_m", "From edge to edge.", may_be_null=True),
            _LON,
            _LAT,
        ),
    ),
    Table(
        name="cables",
        title="Cables",
        path=("cables",),
        columns=(
            _text("name", "Name."),
            Column(key="legs", kind="texts", text="Legs it passes, in order."),
            _count("fibre_count", "Fibres."),
            _text("fibre_type", "Fibre type."),
            _metres("sheath_m", "Cable along the jacket."),
            _metres("glass_m", "Fibre from end to end."),
        ),
    ),
    Table(
        name="stations",
        title="Stations",
        path=("stations",),
        csv="stations.csv",
        columns=(
            _text("leg", "Leg."),
            _text("cable", "Cable."),
            _choice(
                "kind",
                "First that applies",
                *("site", "joint", "crossing", "loop", "reach", "vertex"),
            ),
            _text("name", "Name of what is there.", may_be_null=True),
            _text("reach_kind", "Kind of reach point.", may_be_null=True),
            _choice("placement", "Placement of the way on from here", *_PLACEMENTS),
            _metres("ground_m", "On the ground from the leg's start."),
            _metres("sheath_from_m", "Jacket before the cable stored here."),
            _metres("sheath_to_m", "Jacket after the cable stored here."),
            _metres("glass_from_m", "Glass before the cable stored here."),
            _metres("glass_to_m", "Glass after the cable stored here."),
            _text("section", "Section of cable.", may_be_null=True),
            _metres("section_m", "Jacket from the section's own start.", may_be_null=True),
            _LON,
            _LAT,
            _metres("height_m", "Height.", may_be_null=True),
        ),
    ),
    Table(
        name="sections",
        title="Sections",
        path=("sections",),
        columns=(
            _text("name", "Name."),
            _text("cable", "Cable it is part of."),
            _text("from", "Joint or site it starts at."),
            _text("to", "Joint or site it ends at."),
            _metres("sheath_m", "Jacket between its ends, tails included."),
            _metres("needed_m", "With the ordering allowance."),
            _text("reel", "Reel it is cut from."),
        ),
    ),
    Table(
        name="reels",
        title="Reels",
        path=("reels",),
        csv="reels.csv",
        columns=(
            _text("name", "Name."),
            _metres("length_m", "Length ordered, or of the stock reel."),
            _choice("source", "How it is come by", "put-up", "to-length", "stock"),
            _metres("used_m", "Needed by its sections."),
            _metres("spare_m", "Left over."),
            _money("cost", "Price."),
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
            _money("cost", "Reels and joints."),
            _money("lower_bound", "No layout costs less than this."),
            Column(
                key="one_fewer",
                kind="row",
                of="one_fewer",
                may_be_null=True,
                text="Cheapest with one joint fewer.",
            ),
            _text("stopped_by", "What ended the search early, if anything did."),
        ),
    ),
    Table(
        name="one_fewer",
        title="One joint fewer",
        path=("layout", "one_fewer"),
        is_single=True,
        columns=(_count("joint_count", "Joints."), _money("cost", "Reels and joints.")),
    ),
    Table(
        name="ends",
        title="Cable ends",
        path=("joints", "ends"),
        columns=(
            _text("section", "Section."),
            _choice("side", "End of the section", "start", "end"),
        ),
    ),
    Table(
        name="joints",
        title="Joints",
        path=("joints",),
        columns=(
            _text("name", "Name."),
            _text("node", "Node, where it is at one.", may_be_null=True),
            _text("reach_name", "Place it is at."),
            _text("reach_kind", "Kind of place.", may_be_null=True),
            _text("leg", "Leg."),
            _metres("ground_m", "On the ground from the leg's start."),
            _LON,
            _LAT,
            _choice("kind", "How ends are joined", "splice", "mated"),
            Column(key="assumed", kind="flag", text="Whether the place is assumed."),
            _count("splice_count", "Splices."),
            _money("cost", "Closure, visit and splices."),
            _rows("ends", "ends", "Cable ends that meet in it."),
        ),
    ),
    Table(name="fibre_end", title="Fibre end", path=(), columns=_FIBRE_END),
    Table(
        name="splices",
        title="Splice schedule",
        path=("splices",),
        csv="splice_schedule.csv",
        columns=(
            _text("joint", "Joint."),
            _count("tray", "Tray."),
            _count("position", "Position on the tray."),
            Column(key="in", kind="row", of="fibre_end", text="Fibre coming in."),
            Column(key="out", kind="row", of="fibre_end", may_be_null=True, text="Fibre going on."),
            _choice("kind", "What is done with the fibre", "splice", "express", "stored"),
            _text("circuit", "Circuit, empty for a spare."),
            _decibels("limit_db", "Loss to meet, average of both directions."),
        ),
    ),
    Table(
        name="circuit_fibres",
        title="Fibres of circuits",
        path=("circuits", "fibres"),
        carried=(("circuit", "name"),),
        columns=(_text("cable", "Cable."), _count("fibre", "Fibre number.")),
    ),
    Table(
        name="budget_lines",
        title="Loss budget",
        path=("circuits", "budgets", "lines"),
        csv="loss_budget.csv",
        carried=(
            ("circuit", "circuits.name"),
            ("wavelength_nm", "budgets.wavelength_nm"),
            ("direction", "budgets.direction"),
        ),
        columns=(
            _text("item", "Contribution."),
            _count("count", "How many."),
            _decibels("each_db", "Loss of each."),
            _decibels("sigma_db", "Standard deviation of each."),
            _decibels("limit_db", "Most that each may lose."),
            _text("source", "Where the figures come from."),
        ),
    ),
    Table(
        name="budgets",
        title="Budgets",
        path=("circuits", "budgets"),
        carried=(("circuit", "circuits.name"),),
        columns=(
            _number("wavelength_nm", "Wavelength.", "nm", 3),
            _choice("direction", "Way the light goes", "from-to", "to-from"),
            _decibels("nominal_db", "Sum of means."),
            _decibels("statistical_db", "Means and k standard deviations."),
            _decibels("worst_db", "Everything at its limit."),
            _decibels("available_db", "What the interface allows.", may_be_null=True),
            _decibels("margin_db", "Available less worst less margin kept.", may_be_null=True),
            _decibels(
                "statistical_margin_db", "The same with the statistical loss.", may_be_null=True
            ),
            _decibels("overload_db", "Above zero the receiver gets too much.", may_be_null=True),
            _decibels("attenuator_db", "Smallest that mends the overload.", may_be_null=True),
            _number("dispersion_min_ps_per_nm", "Least chromatic dispersion.", "ps/nm", 3),
            _number("dispersion_max_ps_per_nm", "Greatest chromatic dispersion.", "ps/nm", 3),
            _number("pmd_ps", "Polarisation mode dispersion.", "ps", 3, may_be_null=True),
            _decibels("return_loss_db", "Return loss.", may_be_null=True),
            _number("delay_us", "One-way delay.", "us", 3),
            _choice("verdict", "Verdict", *_VERDICTS),
            Column(key="reasons", kind="texts", text="Why."),
            _rows("lines", "budget_lines", "Every contribution."),
        ),
    ),
    Table(
        name="circuits",
        title="Circuits",
        path=("circuits",),
        columns=(
            _text("name", "Name."),
            _text("from", "Site."),
            _text("to", "Site."),
            _text("interface", "Interface.", may_be_null=True),
            _rows("fibres", "circuit_fibres", "Fibres in order along it, strand by strand."),
            _metres("glass_m", "Glass of its first fibre."),
            _number("delay_us", "One-way delay at its first wavelength.", "us", 3),
            _choice("verdict", "Verdict", *_VERDICTS),
            _rows("budgets", "budgets", "By wavelength and direction."),
            Column(
                key="power",
                kind="rows",
                of="power",
                text="Nominal loss along it.",
                is_listed=False,
            ),
            Column(
                key="levels",
                kind="rows",
                of="levels",
                text="Losses along its glass, for the first budget of each wavelength.",
                is_listed=False,
            ),
            Column(
                key="marks",
                kind="rows",
                of="marks",
                text="What is met along its glass, from one end to the other.",
                is_listed=False,
            ),
            Column(
                key="spectrum",
                kind="row",
                of="spectrum",
                text="Attenuation of its glass against wavelength.",
                is_listed=False,
            ),
        ),
    ),
    Table(
        name="levels",
        title="Levels along circuits",
        path=("circuits", "levels"),
        columns=(
            _number("wavelength_nm", "Wavelength.", "nm", 3),
            _choice("direction", "Way the light goes", "from-to", "to-from"),
            _power("tx_min_dbm", "Least launched."),
            _power("tx_max_dbm", "Most launched."),
            _power("rx_sensitivity_dbm", "Least the receiver needs, penalties left out."),
            _power("rx_overload_dbm", "Most the receiver stands."),
            _numbers("glass_m", "Glass from the end that sends.", "m"),
            _numbers("nominal_db", "Lost so far, means.", "dB"),
            _numbers("least_db", "Lost so far, means less k standard deviations.", "dB"),
            _numbers("worst_db", "Lost so far, everything at its limit.", "dB"),
        ),
    ),
    Table(
        name="marks",
        title="Met along circuits",
        path=("circuits", "marks"),
        columns=(
            _metres("glass_m", "Glass from the end the circuit starts at."),
            _choice("kind", "What is met", "joint", "panel", "part", "bend"),
            _text("name", "Its name, or where it is."),
        ),
    ),
    Table(
        name="spectrum",
        title="Attenuation against wavelength",
        path=("circuits", "spectrum"),
        is_single=True,
        columns=(
            Column(key="fibre_types", kind="texts", text="Types of its fibre."),
            _numbers("wavelengths_nm", "Wavelengths.", "nm"),
            _numbers("typical_db_per_km", "As delivered, the mean of its glass.", "dB/km"),
            _numbers("max_db_per_km", "As ordered, the mean of its glass.", "dB/km"),
            _rows("ceilings", "ceilings", "What the recommendation allows, for glass of one type."),
        ),
    ),
    Table(
        name="ceilings",
        title="Attenuation allowed",
        path=("circuits", "spectrum", "ceilings"),
        columns=(
            _number("wavelength_min_nm", "From.", "nm", 3),
            _number("wavelength_max_nm", "To.", "nm", 3),
            _number("max_db_per_km", "Allowed.", "dB/km", 3),
        ),
    ),
    Table(
        name="power",
        title="Loss along circuits",
        path=("circuits", "power"),
        carried=(("circuit", "name"),),
        columns=(
            _text("leg", "Leg."),
            _number("wavelength_nm", "Wavelength.", "nm", 3),
            _metres("ground_m", "On the ground from the leg's start."),
            _decibels("loss_db", "Lost so far, nominal."),
        ),
    ),
    Table(
        name="checks",
        title="Checks",
        path=("checks",),
        csv="checks.csv",
        columns=(
            _text("kind", "What is checked."),
            _text("where", "Where."),
            _number("value", "Found.", "", 3, may_be_null=True),
            _number("limit", "Limit.", "", 3, may_be_null=True),
            _text("unit", "Unit of both."),
            _choice("verdict", "Verdict", *_VERDICTS),
            _text("source", "Where the limit comes from."),
        ),
    ),
    Table(
        name="bill",
        title="Bill",
        path=("bill",),
        csv="bill.csv",
        columns=(
            _text("item", "What."),
            _number("quantity", "How many or how much.", "", 3),
            _text("unit", "Unit of the quantity."),
            _money("each", "Price of one.", may_be_null=True),
            _money("total", "Price of all.", may_be_null=True),
            _text("note", "Note."),
        ),
    ),
    Table(
        name="assumptions",
        title="Assumptions",
        path=("assumptions",),
        csv="assumptions.csv",
        columns=(
            _text("name", "Key or matter."),
            Column(key="value", kind="value", text="Value taken."),
            _text("unit", "Unit."),
            _text("source", "Where it comes from."),
            _text("reason", "Why it is taken."),
        ),
    ),
    Table(
        name="warnings",
        title="Warnings",
        path=("warnings",),
        columns=(_text("where", "Where."), _text("message", "What.")),
    ),
    Table(
        name="areas",
        title="Areas",
        path=("areas",),
        columns=(
            _text("name", "Name."),
            _choice("kind", "What it is", "avoid", "permit"),
            Column(key="rings", kind="rings", text="Rings of lon, lat.", is_listed=False),
        ),
    ),
    Table(
        name="cautions",
        title="Cautions",
        path=("cautions",),
        columns=(_text("topic", "Hazard."), _text("text", "What to mind.")),
    ),
)

TABLES: Mapping[str, Table] = {entry.name: entry for entry in _TABLES}


def table(name: str) -> Table:
    """Return the table with this name."""
    return TABLES[name]


def csv_tables() -> tuple[Table, ...]:
    """Return the tables that are written as CSV, in file order."""
    return tuple(entry for entry in _TABLES if entry.csv)
