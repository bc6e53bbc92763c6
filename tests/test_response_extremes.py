"""Responses at the edges of what numbers can hold, against mpmath with 700 digits."""

from __future__ import annotations

import math
from collections.abc import Iterator

import exact_responses as book
import mpmath
import pytest
from mpmath import mpf

from tausheet import functions as fo
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import DomainError

LARGEST = 1.7976931348623157e308
TINY = 1e-310  # has lost digits already
ALMOST_1 = 1 + 2**-52

# t, tau, initial, the forcing
STEP = [
    (1.0, 1.0, LARGEST, -LARGEST, 0.0),
    (0.1, 1.0, LARGEST, -LARGEST, 0.0),
    (3.7, 1.0, LARGEST, LARGEST, 0.0),
    (1e308, 1e308, LARGEST, LARGEST, 1e300),
    (1.0, TINY, 1.0, 5.0, 0.0),
    (TINY, TINY, 1.0, 5.0, 0.0),
    (1.0, 1e300, 0.0, 5.0, 0.0),
    (1e300, 1e-300, 0.0, 5.0, 0.0),
    (1.0, 5e-324, 0.0, 5.0, 0.0),
    (1e9 + 2**-20, 1.0, 0.0, 5.0, 1e9),
    (700.0, 1.0, 5.0, 0.0, 0.0),
]
RAMP = [
    (1.0, 1.0, LARGEST, -LARGEST, LARGEST, 2.0),
    (3.0, 1.0, LARGEST, LARGEST, LARGEST, 2.0),
    (1.0, 1.0, 0.0, 0.0, 5.0, 1e-300),
    (1.0, 1.0, 0.0, 0.0, 5.0, 5e-324),
    (1.0, 1e300, 0.0, 0.0, 5.0, 1e-300),
    (1.0, 1e300, 0.0, 0.0, 5.0, 1e300),
    (1e308, 1e300, 1.0, 2.0, 5.0, LARGEST),
    (1.0, 1e-300, 1.0, 2.0, 5.0, 3.0),
    (1.0, TINY, 1.0, 2.0, 5.0, 3.0),
    (1e300, 1e-300, 0.0, 0.0, 5.0, 1e300),
    (1e-9, 1.0, 0.0, 1.0, 0.0, 1e-9),
    (1e-9, 1.0, 0.0, 1.0, 0.0, 2e-9),
    (1.0, 1e-3, 0.0, 1.0, 0.0, 1.0),
    (1.0000001, 1e-3, 0.0, 1.0, 0.0, 1.0),
    (0.5, 1e-9, 0.0, 1.0, 0.0, 1.0),
]
SINE = [
    # amplitude, frequency, phase, offset
    (1.0, 1.0, LARGEST, -LARGEST, 1.0, 90.0, LARGEST),
    (1.0, 1e300, 0.0, 5.0, 1e300, 30.0, 0.0),
    (1e300, 1e300, 0.0, 5.0, 1e300, 30.0, 0.0),
    (1e300, 1.0, 0.0, 5.0, 1e300, 30.0, 0.0),
    (1e300, 1e-300, 0.0, 5.0, 1e-300, 30.0, 0.0),
    (1e300, 1e-300, 0.0, 5.0, 1e300, 30.0, 1.0),
    (1e-300, 1e-300, 0.0, 5.0, 1e300, 0.0, 5.0),
    (1.1e-308, 1e-308, 0.0, 5.0, 1e308, 0.0, 0.0),
    (1.1e7 + 0.1, 1e6, 0.0, 5.0, 1e10 + 0.3, 0.0, 0.0),
    (1.0, TINY, 0.0, 5.0, 1e-3, 0.0, 0.0),
    (1e-3, TINY, 1.0, 5.0, 1.0, 30.0, 2.0),
    (1e-12, 1.0, 0.0, 5.0, 1.0, 0.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1.0, 180.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1.0, 90.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1e-12, 0.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1e12, 0.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1e15, 0.0, 0.0),
    (700.0, 1.0, 0.0, 5.0, 1e-12, 0.0, 0.0),
    (0.9, 1.0, 0.0, 5.0, 1e9, 0.0, 0.0),
    (0.9, 1.0, 0.0, 5.0, 1e-9, 0.0, 0.0),
    (1.1, 1.0, 0.0, 5.0, 1e-9, 180.0, 0.0),
    (0.99999, 1.0, 0.0, 5.0, 0.1, 0.0, 0.0),
    (1.00001, 1.0, 0.0, 5.0, 0.1, 0.0, 0.0),
    (0.3, 1.0, 0.0, 5.0, 0.41, 0.0, 0.0),
    (0.3, 1.0, 0.0, 5.0, 0.42, 0.0, 0.0),
    (1.0, 1.0, 0.0, 5.0, 50.0, 1e300, 0.0),
    (1.0, 1.0, 0.0, 5.0, 50.0, 360.0 * 2**40 + 30, 0.0),
    (1e6, 1e4, 0.0, 5.0, 49.999, 0.0, 0.0),
    (0.3, 1e140, 0.0, 5e150, 1e10, 0.0, 0.0),
    (0.3, 1e160, 0.0, 5e160, 1.2, 0.0, 0.0),
]
DECAY = [
    # amplitude, source_tau, offset
    (1.0, 1.0, LARGEST, -LARGEST, 1.0, LARGEST),
    (1.0, 1.0, 0.0, LARGEST, 5.0, 0.0),
    (0.0, 1.0, 2.0, 5.0, TINY, 0.0),
    (1.0, 1e300, 0.0, 5.0, 1e-300, 0.0),
    (1.0, 1e-300, 0.0, 5.0, 1e300, 0.0),
    (1e300, 1e-300, 0.0, 5.0, 1e-300, 0.0),
    (1e300, 1e299, 0.0, 5.0, 1e-300, 1.0),
    (1e10, 1.0, 0.0, 5.0, ALMOST_1, 0.0),
    (1.0, TINY, 0.0, 5.0, TINY, 0.0),
    (TINY, TINY, 0.0, 5.0, TINY, 0.0),
    (1.0, TINY, 0.0, 5.0, 1.0, 0.0),
    (1.0, 1.0, 0.0, 5.0, TINY, 0.0),
    (700.0, 1.0, 0.0, 5.0, ALMOST_1, 0.0),
    (700.0, 1.0, 0.0, 5.0, 1.0001, 0.0),
    (700.0, 1.0, 0.0, 5.0, 0.99, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1.0, 0.0),
    (1e-12, 1.0, 0.0, 5.0, 1e-14, 0.0),
]
PULSE = [
    # resting, level, duration, delay
    (1.0, 1.0, LARGEST, -LARGEST, LARGEST, 1.0, 0.5),
    (3.0, 1.0, LARGEST, LARGEST, LARGEST, 1.0, 0.5),
    (LARGEST, 1.0, 1.0, 2.0, 3.0, LARGEST, LARGEST),
    (LARGEST, 1e308, 1.0, 2.0, 3.0, LARGEST, 1e308),
    (1e9 + 1e-3, 1.0, 0.0, 0.0, 5.0, 1e-3, 1e9),
    (1e9 + 2e-3, 1.0, 0.0, 0.0, 5.0, 1e-3, 1e9),
    (1.0, 1e300, 0.0, 0.0, 5.0, 0.5, 0.1),
    (1.0, 1e-300, 0.0, 0.0, 5.0, 0.9, 0.1),
    (1.0, TINY, 0.0, 0.0, 5.0, 0.9, 0.1),
    (700.0, 1.0, 0.0, 0.0, 1.0, 1e-3, 699.5),
    (700.1, 1.0, 0.0, 1.0, 0.0, 0.1, 700.0),
    (1e9 + 0.100001, 1.0, 0.0, 1.0, 0.0, 1e9, 0.1),
]
SQUARE = [
    # low, high, period, duty
    (1.0, 1.0, LARGEST, -LARGEST, LARGEST, 0.3, 0.5),
    (3.0, 1.0, LARGEST, LARGEST, LARGEST, 0.3, 0.5),
    (1e6 * 0.1, 1.0, 0.0, 0.0, 5.0, 0.1, 0.5),
    (1e6 * 0.1, 1e6, 0.0, 0.0, 5.0, 0.1, 0.5),
    (1e5, 1e-7, 0.0, 1.0, 0.0, 0.1, 0.5),
    (1.0, 1e300, 0.0, 0.0, 5.0, 1e-3, 0.5),
    (1e300, 1e300, 0.0, 0.0, 5.0, 1e-300, 0.3),
    (1.0, 1e-300, 0.0, 0.0, 5.0, 1e300, 0.3),
    (1.0, TINY, 0.0, 0.0, 5.0, 0.1, 0.3),
    (1.0, 1.0, 0.0, 0.0, 5.0, 1e305, 0.3),
    (1e308, 1.0, 0.0, 0.0, 5.0, 1e305, 0.3),
    (1.0, 1.0, 0.0, 1.0, 0.0, 1e-18, 0.3),
    (1.0, 1.0, 0.0, 0.0, 5.0, 5e-324, 0.3),
    (1e308, 1.0, 0.0, 1.0, 2.0, 1e-308, 0.25),
    (3.05, 1.0, 0.0, 1.0, 2.0, 0.1, 0.0),
    (3.05, 1.0, 0.0, 1.0, 2.0, 0.1, 1.0),
    (3.05, 1.0, 0.0, 1.0, 2.0, 0.1, 5e-324),
    (3.05, 1.0, 0.0, 1.0, 2.0, 0.1, 1 - 2**-53),
    (1.0, 1e17, 0.0, 1.0, 2.0, 1.5, 0.25),
    (2.0, 1e17, 0.0, 1.0, 2.0, 1.5, 0.25),
    (600.0001, 1.0, 0.0, 1.0, 0.0, 1000.0, 0.6),
]
ROWS = [
    pytest.param(name, row, id=f"{name}-{i}")
    for name, rows in {
        "step": STEP,
        "ramp": RAMP,
        "sine": SINE,
        "decay": DECAY,
        "pulse": PULSE,
        "square": SQUARE,
    }.items()
    for i, row in enumerate(rows)
]


@pytest.fixture(autouse=True)
def _many_digits() -> Iterator[None]:
    with mpmath.workdps(700):
        yield


@pytest.mark.parametrize(("name", "row"), ROWS)
def test_every_digit_counts_even_there(name: str, row: tuple[float, ...]) -> None:
    """Relative to y itself: none of these is a difference that cancels."""
    exact = getattr(book, name)(*map(mpf, row))
    allowed = mpf(1e-13) * max(1, mpf(row[0]) / (350 * mpf(row[1]))) * abs(exact)
    alone = getattr(fo, name)(*row)
    in_a_range = getattr(fo, name)([row[0]] * 2, *row[1:])[1]
    for got in (alone, in_a_range):
        assert abs(mpf(float(got)) - exact) <= max(allowed, mpf(1e-300)), (got, float(exact))


@pytest.mark.parametrize(
    ("name", "levels"), [("step", 1), ("ramp", 2), ("pulse", 2), ("square", 2), ("decay", 0)]
)
def test_where_all_levels_are_one_y_is_exactly_that(name: str, levels: int) -> None:
    rest = {"ramp": [0.7], "pulse": [0.7, 0.3], "square": [0.7, 0.3], "decay": [0.0, 0.7, 0.1]}
    for level in (0.1, 1 / 3, 5.0, 1e300):
        for t in [k * 0.37 for k in range(40)]:
            more = [0.0, 0.7, level] if name == "decay" else rest.get(name, [])
            assert getattr(fo, name)(t, 1.0, *[level] * (1 + levels), *more) == level


def test_a_result_beyond_the_numbers_is_refused() -> None:
    with pytest.raises(DomainError, match=r"FO_DECAY: the result lies beyond the range of num"):
        fo.decay(1e-3, 1e-3, LARGEST, LARGEST, 1e3, LARGEST)
    assert math.isnan(fo.sine([0.5], 1e-6, LARGEST, LARGEST, 0.5, 0.0, LARGEST)[0])
    with pytest.raises(DomainError, match="beyond the range of numbers"):
        fo.time_to(1.0, 1e308, 0.0, 1.0 + 1e-10)


@pytest.mark.parametrize("name", ["natural", "step", "ramp", "sine", "decay", "pulse", "square"])
def test_before_switching_y_is_initial_to_the_last_bit(name: str) -> None:
    entry = CATALOGUE[f"FO_{name.upper()}"]
    rest = [0.3] * (sum(p.required for p in entry.parameters) - 3)
    for initial in (0.1, -1 / 3, LARGEST):
        for t in (-LARGEST, -1.0, -5e-324, -0.0, 0.0):
            assert getattr(fo, name)(t, 1.0, initial, *rest) == initial
            assert getattr(fo, name)([t], 1.0, initial, *rest)[0] == initial


TO_LEVELS = [
    # level, tau, initial, final
    (0.0, 1.0, LARGEST, -LARGEST),
    (1e308, 1.0, LARGEST, -LARGEST),
    (1e-300, 1.0, 1e308, 0.0),
    (5e-324, 1.0, LARGEST, 0.0),
    (5e-324, 1e300, 0.0, 1.0),
    (1e-300, 1e300, 0.0, 1.0),
    (1 - 2**-53, 1e-300, 0.0, 1.0),
    (ALMOST_1, 1.0, 1.0, 2.0),
    (1e-323, 1.0, 0.0, 1.5e-323),
]


@pytest.mark.parametrize(("level", "tau", "initial", "final"), TO_LEVELS)
def test_times_to_a_level_at_the_edges(
    level: float, tau: float, initial: float, final: float
) -> None:
    y, y0, y1 = map(mpf, (level, initial, final))
    lags = mpmath.log((y1 - y0) / (y1 - y))
    until = fo.time_until_below if final < initial else fo.time_until_above
    for got in (
        fo.time_to(level, tau, initial, final),
        fo.time_to([level], tau, initial, final)[0],
        until(level, tau, initial, final),
        until([level], tau, initial, final)[0],
    ):
        assert abs(mpf(float(got)) / (mpf(tau) * lags) - 1) < 1e-14
    # and the time constant with which it is reached at 1e-30 s
    assert abs(mpf(fo.tau_for(level, 1e-30, initial, final)) * lags / mpf(1e-30) - 1) < 1e-14


@pytest.mark.parametrize(
    ("resistance", "reactance", "frequency"),
    [(1e-300, 1e300, 1e300), (1e300, 1e-300, 1e-300), (1e300, 1e300, LARGEST), (1.0, 0.0, 50.0)],
)
def test_no_overflow_on_the_way_to_a_time_constant(
    resistance: float, reactance: float, frequency: float
) -> None:
    exact = mpf(reactance) / (2 * mpmath.pi * mpf(frequency) * mpf(resistance))
    assert abs(mpf(fo.tau_rx(resistance, reactance, frequency)) - exact) <= 1e-15 * exact
