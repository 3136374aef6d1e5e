"""A path with no map behind it, for a quick answer."""

from __future__ import annotations

from routeplan.light.model import Glass, Mating, Part, Path, SpliceStep, Step

__all__ = ["quick_path"]


def quick_path(
    glass_m: float,
    *,
    fibre_type: str,
    splices: int,
    connector_pairs: int,
    pigtail_splices: int = 0,
    parts: tuple[Part, ...] = (),
) -> Path:
    """
    Return a path with no map behind it: so much glass in equal sections, splices and connectors.

    Parameters
    ----------
    glass_m
        Length of the fibre. [m]
    fibre_type
        Its type.
    splices
        Splices in joints; the glass is in one section more. [-]
    connector_pairs
        Mated pairs, shared between the two ends. [-]
    pigtail_splices
        Splices behind the panels, shared likewise. [-]
    parts
        Further parts, such as a splitter.

    Returns
    -------
    quick_path
        From one end to the other.

    References
    ----------
    .. [1] See `circuit_budget`.
    """
    steps: list[Step] = [Mating(where="panel")] * (connector_pairs - connector_pairs // 2)
    steps += parts
    pigtail = SpliceStep(where="panel", is_pigtail=True)
    steps += [pigtail] * (pigtail_splices - pigtail_splices // 2)
    for number in range(splices + 1):
        if number:
            steps.append(SpliceStep(where=f"J{number}"))
        section = f"S{number + 1}"
        piece_m = glass_m / (splices + 1)
        steps.append(Glass(section=section, fibre=1, fibre_type=fibre_type, glass_m=piece_m))
    steps += [pigtail] * (pigtail_splices // 2)
    steps += [Mating(where="panel")] * (connector_pairs // 2)
    return Path(circuit="quick", direction="from-to", steps=tuple(steps))
