"""Optical formulas on a million values against the bare numpy expression, and budgets a second."""

from __future__ import annotations

from collections.abc import Callable
from time import perf_counter
from types import SimpleNamespace

import numpy as np

from routeplan.light.attenuation import attenuation_of
from routeplan.light.budget import circuit_budget
from routeplan.light.delay import delay_ns
from routeplan.light.dispersion import sellmeier_ps_per_nm_km
from routeplan.light.interfaces import find_interface
from routeplan.light.model import Glass, Mating, Path, SpliceStep, Step
from routeplan.light.power import overload_db
from routeplan.light.spectrum import attenuation_db_per_km, infrared_db_per_km
from routeplan.light.splices import mode_mismatch_db, offset_loss_db

COUNT = 1_000_000
REPEATS = 7


def best_s(work: Callable[[], object]) -> float:
    """Return the best time of several."""
    times = []
    for _ in range(REPEATS):
        start = perf_counter()
        work()
        times.append(perf_counter() - start)
    return min(times)


def bare_attenuation(nm: np.ndarray, knots: np.ndarray, floor: np.ndarray, peak: float) -> object:
    """Return floor, water peak and infrared edge as one writes them without checks."""
    um = nm / 1000.0
    line = 1.0 / (1.0 + ((nm - 1383.0) / 16.0) ** 2)
    return np.interp(um**-4.0, knots, floor) + peak * line + 7.81e11 * np.exp(-48.48 / um)


def budgets_a_second() -> float:
    """Return how many budgets of a circuit of 25 sections are computed in a second."""
    practice = SimpleNamespace(
        splice_mean_db=0.05,
        splice_sigma_db=0.03,
        splice_limit_db=0.10,
        connector_mean_db=0.25,
        connector_sigma_db=0.13,
        connector_limit_db=0.50,
        connector_grade=None,
        sigma_count=3.0,
        margin_db=3.0,
        verdict_on="worst",
    )
    steps: list[Step] = [Mating(where="A"), Mating(where="B")]
    for number in range(25):
        steps.append(SpliceStep(where=f"J{number}"))
        name = f"S{number}"
        steps.append(Glass(section=name, fibre=1, fibre_type="G.652.D", glass_m=4000.0))
    way = Path(circuit="c", direction="from-to", steps=tuple(steps))
    optic = find_interface("10GBASE-ER", {}).at_from

    def hundred() -> None:
        for _ in range(100):
            circuit_budget(way, 1550.0, practice=practice, optic=optic)  # type: ignore[arg-type]

    return 100.0 / best_s(hundred)


def main() -> None:
    """Print the ratios."""
    nm = np.linspace(1260.0, 1625.0, COUNT)
    curve = attenuation_of("G.652.D").typical
    knots, floor = np.array(curve.floor_per_um4), np.array(curve.floor_db_per_km)
    fields = np.linspace(8.0, 12.0, COUNT)
    pairs: dict[str, tuple[Callable[[], object], Callable[[], object]]] = {
        "attenuation": (
            lambda: attenuation_db_per_km(nm, curve),
            lambda: bare_attenuation(nm, knots, floor, curve.water_db_per_km),
        ),
        "infrared edge": (
            lambda: infrared_db_per_km(nm),
            lambda: 7.81e11 * np.exp(-48480.0 / nm),
        ),
        "dispersion": (
            lambda: sellmeier_ps_per_nm_km(nm, zero_dispersion_nm=1310.0, slope_ps_per_nm2_km=0.09),
            lambda: 0.09 / 4.0 * (nm - 1310.0**4 / (nm * nm * nm)),
        ),
        "mode mismatch": (
            lambda: mode_mismatch_db(fields, 9.2 + 0.0 * fields),
            lambda: -20.0 * np.log10(2.0 * fields * 9.2 / (fields * fields + 9.2 * 9.2)),
        ),
        "splice offset": (
            lambda: offset_loss_db(fields, 9.2),
            lambda: 10.0 / np.log(10.0) * (fields / 4.6) ** 2,
        ),
        "delay": (
            lambda: delay_ns(nm, 1.4682),
            lambda: nm * 1.4682 / 299792458.0 * 1e9,
        ),
        "overload": (
            lambda: overload_db(fields, 0.1 * fields, -1.0),
            lambda: fields - 0.1 * fields + 1.0,
        ),
    }
    for name, (ours, bare) in pairs.items():
        ours_s, bare_s = best_s(ours), best_s(bare)
        ratio = ours_s / bare_s
        print(f"{name}: {ours_s * 1e3:.1f} ms, bare {bare_s * 1e3:.1f} ms, ratio {ratio:.2f}")
    print(f"budgets of 25 sections: {budgets_a_second():.0f} a second")


if __name__ == "__main__":
    main()
