"""Sums of products in twice the working precision, for differences that nearly cancel."""

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
