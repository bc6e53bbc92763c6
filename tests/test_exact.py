"""Sums of products against exact fractions."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from tausheet.functions.exact import sum_of_products, two_product, two_sum

NUMBERS = st.floats(-1e8, 1e8).filter(lambda x: x == 0 or abs(x) > 1e-8)


@given(NUMBERS, NUMBERS)
def test_a_product_or_sum_and_its_error_are_exact(a: float, b: float) -> None:
    product, error = two_product(a, b)
    assert Fraction(product) + Fraction(error) == Fraction(a) * Fraction(b)
    total, error = two_sum(a, b)
    assert Fraction(total) + Fraction(error) == Fraction(a) + Fraction(b)


@given(st.lists(st.tuples(NUMBERS, NUMBERS), min_size=1, max_size=5))
def test_a_sum_keeps_twice_the_digits(pairs: list[tuple[float, float]]) -> None:
    exact = sum(Fraction(a) * Fraction(b) for a, b in pairs)
    size = sum(abs(Fraction(a) * Fraction(b)) for a, b in pairs)
    error = abs(Fraction(float(sum_of_products(*pairs))) - exact)
    assert error <= abs(exact) * Fraction(2) ** -53 + size * 25 * Fraction(2) ** -104


def test_a_difference_of_squares_that_cancels() -> None:
    a, b = 1.0 + 2.0**-30, 1.0 + 2.0**-31
    difference = sum_of_products((np.array([a]), a), (-b, b))
    assert Fraction(float(difference[0])) == Fraction(a) ** 2 - Fraction(b) ** 2
