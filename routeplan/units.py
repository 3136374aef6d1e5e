"""Exact conversions between what people write and what the package counts in."""

from __future__ import annotations

from decimal import ROUND_HALF_UP, Decimal
from fractions import Fraction

__all__ = [
    "amount_from_cents",
    "cents_from_amount",
    "exact_from_number",
    "ft_from_m",
    "m_from_ft",
    "m_from_mm",
    "mm_from_m",
    "n_from_lbf",
    "n_per_m_from_lb_per_ft",
]

_M_PER_FT = 0.3048  # international foot, exact by definition
_N_PER_LBF = 4.4482216152605  # exact by definition


def exact_from_number(value: float) -> Fraction:
    """Return the decimal number a person wrote, exactly: 0.02 becomes 1/50."""
    return Fraction(repr(float(value)))


def mm_from_m(length_m: float) -> int:
    """Return whole millimetres, the half rounded up."""
    return int((Decimal(repr(float(length_m))) * 1000).to_integral_value(ROUND_HALF_UP))


def m_from_mm(length_mm: int) -> float:
    """Return metres, the float nearest to the exact decimal."""
    return length_mm / 1000


def cents_from_amount(amount: float) -> int:
    """Return whole cents of an amount of money, the half rounded up."""
    return int((Decimal(repr(float(amount))) * 100).to_integral_value(ROUND_HALF_UP))


def amount_from_cents(cents: int) -> float:
    """Return an amount of money, the float nearest to the exact decimal."""
    return cents / 100


def ft_from_m(length_m: float) -> float:
    """Return international feet."""
    return length_m / _M_PER_FT


def m_from_ft(length_ft: float) -> float:
    """Return metres."""
    return length_ft * _M_PER_FT


def n_from_lbf(force_lbf: float) -> float:
    """Return newtons."""
    return force_lbf * _N_PER_LBF


def n_per_m_from_lb_per_ft(weight_lb_per_ft: float) -> float:
    """Return newtons a metre."""
    return weight_lb_per_ft * _N_PER_LBF / _M_PER_FT
