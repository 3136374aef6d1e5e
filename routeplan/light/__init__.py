"""
Whether it works: attenuation, dispersion, reflections, delay, interfaces and budgets.

What the pipeline needs, in order of use:

    fibres.check_fibre_type(name, where=...) -> list[Problem]
    interfaces.check_interface(name, own, where=...) -> list[Problem]   own = run.interfaces
    interfaces.find_interface(name, own) -> OpticPair                   at_from, at_to: Optic
    interfaces.default_wavelengths_nm(pair) -> tuple[float, ...]        for a circuit with none
    interfaces.check_wavelengths(pair, wavelengths_nm, where=...) -> list[Problem]
    interfaces.check_fibre_count(pair, fibre_count, where=...) -> list[Problem]
    interfaces.channels(pair or None, wavelengths_nm) -> tuple[Channel(direction, wavelength_nm,
        optic)]                                                         what is to be computed
    budget.circuit_budget(path, wavelength_nm, practice=run.practice.loss, optic=channel.optic,
        measured={section or cable id: make.measured}) -> Budget        path of that direction
    budget.circuit_verdict(budgets) -> "fits" | "fails" | "unknown"
    circuits.circuit_budgets(paths, pair, wavelengths_nm, practice=...)  all of them at once
    circuits.closing_interfaces(paths, practice=...)                    for interface = "any"
    changes.Circuit(...), mending_changes, stretch_limit_m, deciding_line

Set `cable` on a path's `Glass` steps (any id) where that cable has measured points. One fibre
working both ways ("1000BASE-BX10") is two interfaces that belong together: list both wavelengths,
and each direction has the one its end sends. Splices and matings may carry their own `loss`;
`Part` and `Bend` are steps of a path like any other.

Formulas, on floats and, where they are arithmetic, on arrays: `spectrum`, `attenuation`,
`dispersion`, `delay`, `pmd`, `power`, `splices`, `connectors`, `bends`, `penalties`,
`reflections`, `hazard`, `timing`, `life`, `grid`, `polarity`, `rf`.
"""
