"""Ripple against mpmath at 50 digits, and against the response itself run until it settles."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tausheet.addin import cells
from tausheet.functions import ripple, step
from tausheet.functions.errors import ErrorKind


@pytest.fixture(autouse=True, scope="module")
def digits() -> Iterator[None]:
    """Digits of the references, set back afterwards since mpmath keeps them globally."""
    with mp.workdps(50):
        yield


RATIOS = [10.0**e for e in range(-15, 3)] + [0.3, 3.0, 30.0, 350.0, 700.0, 1e5, 1e-300]
DUTIES = [0.0, 1e-12, 1e-3, 0.25, 0.5, 0.75, 0.999, 1 - 1e-12, 1.0]


def exact(tau: float, low: float, high: float, period: float, duty: float) -> dict[str, Any]:
    with mp.workdps(400):
        tau, low, high, period, duty = map(mp.mpf, (tau, low, high, period, duty))
        a, b = duty * period / tau, (1 - duty) * period / tau
        share = -mp.expm1(-a) / -mp.expm1(-a - b)
        ends = [low + (high - low) * share, low + (high - low) * share * mp.exp(-b)]
        return {
            "min": min(ends),
            "max": max(ends),
            "pp": abs(high - low) * mp.expm1(-a) * mp.expm1(-b) / -mp.expm1(-a - b),
            "mean": low + (high - low) * duty,
        }


@pytest.mark.parametrize("ratio", RATIOS)
@pytest.mark.parametrize(("low", "high"), [(0.0, 10.0), (-3.0, 24.0), (5.0, -5.0), (7.0, 7.0)])
def test_against_the_closed_form(ratio: float, low: float, high: float) -> None:
    for duty in DUTIES:
        results = ripple(1.0, low, high, ratio, duty)
        for what, value in zip(("min", "max", "pp", "mean"), results, strict=True):
            expected = exact(1.0, low, high, ratio, duty)[what]
            scale = abs(expected) if what == "pp" else max(abs(low), abs(high))
            assert abs(mp.mpf(value) - expected) <= 4e-15 * scale + mp.mpf(10) ** -300
            assert ripple(1.0, low, high, ratio, duty, what) == value


def test_from_zero_each_extreme_is_good_to_its_own_size() -> None:
    for ratio in RATIOS[:-1]:
        for duty in DUTIES:
            results = ripple(2.0, 0.0, 10.0, 2.0 * ratio, duty)
            expected = exact(2.0, 0.0, 10.0, 2.0 * ratio, duty)
            for what, value in zip(("min", "max", "pp", "mean"), results, strict=True):
                allowed = 1e-13 * max(1, ratio / 350) * abs(expected[what])
                assert abs(mp.mpf(value) - expected[what]) <= allowed + mp.mpf(10) ** -300


@given(st.floats(0.05, 20), st.floats(0.01, 0.99), st.floats(-100, 100), st.floats(-100, 100))
def test_the_extremes_are_where_the_response_settles(
    period: float, duty: float, low: float, high: float
) -> None:
    y = low
    for _ in range(int(60 / period) + 2):
        top = step(duty * period, 1.0, y, high)
        y = step((1 - duty) * period, 1.0, top, low)
    results = ripple(1.0, low, high, period, duty)
    assert results.minimum == pytest.approx(min(y, top), abs=1e-11)
    assert results.maximum == pytest.approx(max(y, top), abs=1e-11)
    assert results.peak_to_peak == pytest.approx(abs(top - y), abs=1e-11)


def test_duty_zero_and_one_leave_no_ripple() -> None:
    assert ripple(0.3, 1.1, 5.3, 0.1, 0.0) == (1.1, 1.1, 0.0, 1.1)
    assert ripple(0.3, 1.1, 5.3, 0.1, 1.0) == (5.3, 5.3, 0.0, 5.3)


def test_a_period_beyond_measure_reaches_both_levels() -> None:
    assert ripple(1e-9, 1.1, 5.3, 1e300, 0.5) == (1.1, 5.3, 5.3 - 1.1, (1.1 + 5.3) / 2)


def test_the_ripple_is_largest_at_half_duty() -> None:
    duty = np.linspace(0, 1, 201)
    swing = ripple(1.0, 0.0, 24.0, 0.5, duty, "pp")
    assert np.argmax(swing) == 100


def test_a_small_ripple_is_the_triangle_of_common_practice() -> None:
    # swing x duty x (1 - duty) x period / tau
    assert ripple(1.0, 0.0, 24.0, 1e-6, 0.3, "pp") == pytest.approx(24 * 0.21e-6, rel=1e-9)


def test_four_cells_in_a_row_and_a_row_for_each_of_a_column() -> None:
    row = cells.call("FO_RIPPLE", [1.0, 0.0, 10.0, 0.2, 0.5])
    assert np.shape(row) == (1, 4)
    column = cells.plain_grid(cells.call("FO_RIPPLE", [1.0, 0.0, 10.0, 0.2, [[0.5], [2.0]]]))
    assert column == [cells.plain_grid(row)[0], [ErrorKind.NUM] * 4]  # type: ignore[index]
    assert cells.call("FO_RIPPLE", [1.0, 0.0, 10.0, 0.2, 0.5, "MAX"]) == row[0][1]  # type: ignore[index]
