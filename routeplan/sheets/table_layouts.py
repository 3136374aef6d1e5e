"""How each published table is best read: what belongs together, what comes first."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

__all__ = ["LAYOUTS", "Layout", "layout_of"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Layout:
    """
    A hint how to show a table; everything is shown whatever it says.

    `group` keys become headings over the rows that share them; `is_dotted` makes headings of what
    stands before the dot of the first column. `first` keys are the leading columns, `below` go on
    lines under their row, `stacked` lists run down their column, `numbered` lists become numbered
    grids. `across` is row key, column key and value key of a table that is shown as a matrix.
    `labels` are words for keys that do not say enough by themselves.
    """

    group: tuple[str, ...] = ()
    is_dotted: bool = False
    first: tuple[str, ...] = ()
    below: tuple[str, ...] = ("reason", "text")
    stacked: tuple[str, ...] = ()
    numbered: tuple[str, ...] = ()
    across: tuple[str, str, str] | None = None
    labels: Mapping[str, str] = field(default_factory=dict)


LAYOUTS: Mapping[str, Layout] = {
    "attenuation": Layout(group=("fibre_types",)),
    "attenuation_ceilings": Layout(group=("fibre_types",)),
    "bends": Layout(group=("fibre_type",)),
    "cautions": Layout(below=("topic", "text", "when")),
    "colours": Layout(
        below=("title", "aliases"),
        numbered=("fibre_order", "tube_order"),
        labels={
            "aliases": "also",
            "fibre_order": "fibres",
            "tube_order": "tubes",
            "mark": "mark beyond the order",
            "mark_colour": "its colour",
            "mark_colour_on_black": "on black",
            "black_when_marked": "black becomes",
            "marks_max_count": "marked rounds of fibres",
            "tube_marks_max_count": "marked rounds of tubes",
            "tube_rest": "further tubes, by counting",
        },
    ),
    "connectors": Layout(first=("name", "mean_db", "sigma_db", "limit_db")),
    "dispersion_bounds": Layout(group=("fibre_type",)),
    "fibres": Layout(across=("quantity", "fibre_types", "value")),
    "interfaces": Layout(
        group=("family", "basis"),
        first=(
            "name",
            "bit_rate_gbps",
            "wavelengths_nm",
            "tx_min_dbm",
            "tx_max_dbm",
            "rx_sensitivity_dbm",
            "rx_overload_dbm",
            "channel_loss_db",
            "penalty_db",
            "reach_m",
            "bands_nm",
        ),
        stacked=("wavelengths_nm", "bands_nm"),
        labels={
            "bit_rate_gbps": "rate",
            "wavelengths_nm": "centre",
            "rx_sensitivity_dbm": "rx sens",
            "rx_sensitivity_oma_dbm": "rx sens OMA",
            "fibre_count": "fibres",
        },
    ),
    "light_constants": Layout(first=("name", "value", "unit")),
    "practice": Layout(is_dotted=True, first=("name", "value", "venue", "unit")),
    "timing": Layout(group=("kind",)),
}


def layout_of(name: str) -> Layout:
    """Return the hint for a table; an empty one where none is needed."""
    return LAYOUTS.get(name, Layout())
