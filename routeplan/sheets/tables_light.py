"""The tables of circuits: fibres, budgets, what closes them, times, loss along the way."""

from __future__ import annotations

from routeplan.sheets.column_kinds import (
    choice_column,
    count_column,
    decibels_column,
    metres_column,
    number_column,
    numbers_column,
    power_column,
    rows_column,
    text_column,
)
from routeplan.sheets.columns import Column, Table

__all__ = ["LIGHT_TABLES", "VERDICTS"]

VERDICTS = ("fits", "fails", "unknown")
_DIRECTIONS = ("from-to", "to-from")

LIGHT_TABLES = (
    Table(
        name="circuit_fibres",
        title="Fibres of circuits",
        path=("circuits", "fibres"),
        carried=(("circuit", "name"),),
        columns=(text_column("cable", "Cable."), count_column("fibre", "Fibre number.")),
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
            text_column("item", "Contribution."),
            count_column("count", "How many."),
            decibels_column("each_db", "Loss of each."),
            decibels_column("sigma_db", "Standard deviation of each."),
            decibels_column("limit_db", "Most that each may lose."),
            text_column("source", "Where the figures come from."),
        ),
    ),
    Table(
        name="life_lines",
        title="What a circuit loses more over its life",
        path=("circuits", "budgets", "life_lines"),
        carried=(
            ("circuit", "circuits.name"),
            ("wavelength_nm", "budgets.wavelength_nm"),
            ("direction", "budgets.direction"),
        ),
        columns=(
            text_column("item", "Allowance."),
            count_column("count", "How many."),
            decibels_column("each_db", "Loss of each."),
            decibels_column("sigma_db", "Standard deviation of each."),
            decibels_column("limit_db", "Most that each may lose."),
            text_column("source", "Where the figures come from."),
            text_column("reason", "Why it is allowed for."),
        ),
    ),
    Table(
        name="budgets",
        title="Budgets",
        path=("circuits", "budgets"),
        carried=(("circuit", "circuits.name"),),
        columns=(
            number_column("wavelength_nm", "Wavelength.", "nm", 3),
            choice_column("direction", "Way the light goes", *_DIRECTIONS),
            decibels_column("nominal_db", "Sum of means."),
            decibels_column("statistical_db", "Means and k standard deviations."),
            decibels_column("worst_db", "Everything at its limit."),
            decibels_column("available_db", "What the interface allows.", may_be_null=True),
            decibels_column(
                "margin_db", "Available less worst less margin kept.", may_be_null=True
            ),
            decibels_column(
                "statistical_margin_db", "The same with the statistical loss.", may_be_null=True
            ),
            decibels_column(
                "first_day_margin_db",
                "Available less worst, nothing kept in hand.",
                may_be_null=True,
            ),
            decibels_column(
                "end_of_life_margin_db", "The same less every line of life.", may_be_null=True
            ),
            decibels_column(
                "overload_db", "Above zero the receiver gets too much.", may_be_null=True
            ),
            decibels_column("attenuator_db", "Smallest that mends the overload.", may_be_null=True),
            number_column("dispersion_min_ps_per_nm", "Least chromatic dispersion.", "ps/nm", 3),
            number_column("dispersion_max_ps_per_nm", "Greatest chromatic dispersion.", "ps/nm", 3),
            number_column("pmd_ps", "Polarisation mode dispersion.", "ps", 3, may_be_null=True),
            decibels_column("return_loss_db", "Return loss.", may_be_null=True),
            number_column("delay_us", "One-way delay.", "us", 3),
            choice_column("verdict", "Verdict", *VERDICTS),
            Column(key="reasons", kind="texts", text="Why."),
            rows_column("lines", "budget_lines", "Every contribution."),
            text_column("deciding", "Contribution with most of the worst loss.", may_be_null=True),
            rows_column("life_lines", "life_lines", "What is to be lost more over its life."),
        ),
    ),
    Table(
        name="closing",
        title="Interfaces that close a circuit",
        path=("circuits", "closing"),
        carried=(("circuit", "name"),),
        columns=(
            text_column("interface", "Interface, the least capable first."),
            Column(key="wavelengths_nm", kind="numbers", text="Its wavelengths.", unit="nm"),
            decibels_column("margin_db", "Least margin, any attenuator taken off."),
        ),
    ),
    Table(
        name="timing",
        title="Times of circuits",
        path=("circuits", "timing"),
        carried=(("circuit", "name"),),
        columns=(
            text_column("figure", "What it is a figure of."),
            number_column("value", "Figure.", "", 6),
            text_column("unit", "Unit of both."),
            number_column("limit", "Published limit it stands beside.", "", 6, may_be_null=True),
            text_column("source", "Where it comes from."),
        ),
    ),
    Table(
        name="radio",
        title="Radio frequency over circuits",
        path=("circuits", "radio"),
        carried=(("circuit", "name"),),
        columns=(
            number_column("wavelength_nm", "Wavelength.", "nm", 3),
            choice_column("direction", "Way the light goes", *_DIRECTIONS),
            text_column("figure", "What it is a figure of."),
            number_column("value", "Figure.", "", 3),
            text_column("unit", "Its unit."),
            text_column("source", "Where it comes from."),
        ),
    ),
    Table(
        name="circuits",
        title="Circuits",
        path=("circuits",),
        columns=(
            text_column("name", "Name."),
            text_column("from", "Site."),
            text_column("to", "Site."),
            text_column("interface", "Interface, or any.", may_be_null=True),
            text_column("optic", "Interface the budgets are of.", may_be_null=True),
            text_column("standby_for", "Circuit it stands by for.", may_be_null=True),
            rows_column("fibres", "circuit_fibres", "Fibres in order along it, strand by strand."),
            metres_column("glass_m", "Glass of its first fibre."),
            number_column("delay_us", "One-way delay at its first wavelength.", "us", 3),
            choice_column("verdict", "Verdict", *VERDICTS),
            rows_column("budgets", "budgets", "By wavelength and direction."),
            rows_column("closing", "closing", "For a circuit that takes any: those that close it."),
            Column(key="changes", kind="texts", text="What would each make a failing one fit."),
            metres_column(
                "stretch_m", "Glass it could be longer by, joints held.", may_be_null=True
            ),
            rows_column("timing", "timing", "Delays and what they mean."),
            rows_column("radio", "radio", "For a link of radio frequency."),
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
            number_column("wavelength_nm", "Wavelength.", "nm", 3),
            choice_column("direction", "Way the light goes", *_DIRECTIONS),
            power_column("tx_min_dbm", "Least launched."),
            power_column("tx_max_dbm", "Most launched."),
            power_column("rx_sensitivity_dbm", "Least the receiver needs, penalties left out."),
            power_column("rx_overload_dbm", "Most the receiver stands."),
            numbers_column("glass_m", "Glass from the end that sends.", "m"),
            numbers_column("nominal_db", "Lost so far, means.", "dB"),
            numbers_column("least_db", "Lost so far, means less k standard deviations.", "dB"),
            numbers_column("worst_db", "Lost so far, everything at its limit.", "dB"),
        ),
    ),
    Table(
        name="marks",
        title="Met along circuits",
        path=("circuits", "marks"),
        columns=(
            metres_column("glass_m", "Glass from the end the circuit starts at."),
            choice_column("kind", "What is met", "joint", "panel", "part", "bend"),
            text_column("name", "Its name, or where it is."),
        ),
    ),
    Table(
        name="spectrum",
        title="Attenuation against wavelength",
        path=("circuits", "spectrum"),
        is_single=True,
        columns=(
            Column(key="fibre_types", kind="texts", text="Types of its fibre."),
            numbers_column("wavelengths_nm", "Wavelengths.", "nm"),
            numbers_column("typical_db_per_km", "As delivered, the mean of its glass.", "dB/km"),
            numbers_column("max_db_per_km", "As ordered, the mean of its glass.", "dB/km"),
            rows_column(
                "ceilings", "ceilings", "What the recommendation allows, for glass of one type."
            ),
        ),
    ),
    Table(
        name="ceilings",
        title="Attenuation allowed",
        path=("circuits", "spectrum", "ceilings"),
        columns=(
            number_column("wavelength_min_nm", "From.", "nm", 3),
            number_column("wavelength_max_nm", "To.", "nm", 3),
            number_column("max_db_per_km", "Allowed.", "dB/km", 3),
        ),
    ),
    Table(
        name="power",
        title="Loss along circuits",
        path=("circuits", "power"),
        carried=(("circuit", "name"),),
        columns=(
            text_column("leg", "Leg."),
            number_column("wavelength_nm", "Wavelength.", "nm", 3),
            metres_column("ground_m", "On the ground from the leg's start."),
            decibels_column("loss_db", "Lost so far, nominal."),
        ),
    ),
)
