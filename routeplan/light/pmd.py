"""How far the two polarisations of a pulse drift apart."""

from __future__ import annotations

from collections.abc import Iterable
from math import sqrt

from routeplan.light.fibres import Fibre

__all__ = ["link_pmd_ps"]

_M_PER_KM = 1000.0


def link_pmd_ps(spans: Iterable[tuple[Fibre, float]]) -> float:
    r"""
    Return the polarisation mode dispersion a link may reach by its link design values.

    .. math:: \sqrt{\sum PMD_{Q,i}^2 \, L_i}

    Parameters
    ----------
    spans
        Fibre type and glass length of each span. [m]

    Returns
    -------
    link_pmd_ps
        Mean differential group delay at the link design value. [ps]

    References
    ----------
    .. [1] ITU-T G.652 (11/2016), table 2 and appendix I: PMD_Q for 20 sections at 0.01 %.

    Examples
    --------
    >>> from routeplan.light.fibres import find_fibre
    >>> link_pmd_ps([(find_fibre("G.652.D"), 100_000.0)])
    2.0
    """
    return sqrt(
        sum(fibre.pmd_q_max_ps_per_sqrt_km**2 * glass_m / _M_PER_KM for fibre, glass_m in spans)
    )
