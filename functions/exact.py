"""Arithmetic that keeps its digits where the plain form cancels."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_SPLITTER = 134217729.0
"""2^27 + 1: splits a double into two halves whose products are exact."""


def _halves(a: Any) -> tuple[Any, Any]:
    scaled = _SPLITTER * a
    high = scaled - (scaled - a)
    return high, a - high


def two_product(a: Any, b: Any) -> tuple[Any, Any]:
    """a b as a rounded product and its rounding error, exactly (Dekker)."""
    product = a * b
    a_high, a_low = _halves(a)
    b_high, b_low = _halves(b)
    error = a_low * b_low - (((product - a_high * b_high) - a_low * b_high) - a_high * b_low)
    return product, error


def two_sum(a: Any, b: Any) -> tuple[Any, Any]:
    """a + b as a rounded sum and its rounding error, exactly (Knuth)."""
    total = a + b
    part = total - a
    return total, (a - (total - part)) + (b - part)


def sum_of_products(*pairs: tuple[Any, Any]) -> Array:
    """Sum of a b over the pairs, as if computed with twice the digits and then rounded.

    Ogita, Rump and Oishi, "Accurate sum and dot product", algorithm 5.3 (Dot2).
    """
    total, carry = two_product(*pairs[0])
    for a, b in pairs[1:]:
        product, product_error = two_product(a, b)
        total, sum_error = two_sum(total, product)
        carry = carry + (sum_error + product_error)
    result: Array = np.asarray(total + carry)
    return result


def quotient(top: Any, *below: Any) -> Array:
    """top / (a b ...), however large or small what lies between may be."""
    digits, exponent = np.frexp(top)
    for number in below:
        own_digits, own_exponent = np.frexp(number)
        digits, exponent = digits / own_digits, exponent - own_exponent
    result: Array = np.asarray(np.ldexp(digits, exponent))
    return result


def fraction_of_product(a: Any, b: Any) -> Array:
    """a b less the nearest whole number, from -0.5 to 0.5: the part of a turn, however many."""
    a, a_exponent = np.frexp(a)
    b, b_exponent = np.frexp(b)
    product, error = two_product(a, b)
    # with an exponent of 110 both parts are whole numbers already
    exponent = np.minimum(a_exponent + b_exponent, 110)
    product, error = np.ldexp(product, exponent), np.ldexp(error, exponent)
    rest = (product - np.rint(product)) + error
    result: Array = np.asarray(rest - np.rint(rest))
    return result


def lag_integrals(h: Array) -> tuple[Array, Array]:
    """Integrals from 0 to h of 1 - exp(-s) and of its square, each to full relative precision."""
    q = -np.expm1(-h)
    p1, p2 = h - q, h - q - q * q / 2
    s = np.minimum(h, 0.5)
    term = -s
    series1, series2 = np.zeros_like(s), np.zeros_like(s)
    for n in range(2, 20):
        term = term * -s / n
        series1 = series1 + term
        series2 = series2 + term * s * (2.0**n - 2) / (n + 1)
    return np.where(h < 0.5, series1, p1), np.where(h < 0.5, series2, p2)


def excess_over_sine(x: Array) -> Array:
    """x - sin(x) for x >= 0, to full relative precision."""
    s = np.minimum(x, 1.0)
    series = np.zeros_like(s)
    for n in range(18, 2, -2):  # nested: s^3/3! (1 - s^2/(4 5) (1 - s^2/(6 7) (...)))
        series = s * s / (n * (n + 1)) * (1 - series)
    return np.where(x < 1, s * (s * s / 6) * (1 - series), x - np.sin(x))
