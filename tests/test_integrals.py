"""Mean and root-mean-square against scipy.integrate.quad, mpmath, and series over periods."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mpf
from scipy.integrate import quad

from tausheet import functions as fo
from tausheet.functions import integrals
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import CellError, error_codes

N = None
SUM: list[list[Any]] = [
    ["sine", 2.0, 1.5, 40.0, 0.3, N],
    ["decay", -4.0, 0.45, 0.1, N, N],
    ["square", -1.0, 2.0, 0.35, 0.3, 0.15],
    ["ramp", 3.0, 0.7, 0.2, N, N],
    ["slope", -0.5, 0.4, N, N, N],
    ["pulse", 5.0, 0.4, 0.9, N, N],
]
EDGES = sorted(
    [0.0, 0.1, 0.15, 0.2, 0.3, 0.4, 0.9, 1.3]
    + [0.15 + 0.35 * k + on for k in range(9) for on in (0.0, 0.105)]
)
TAU, INITIAL = 0.45, 0.25


@pytest.fixture(autouse=True)
def _fifty_digits() -> Iterator[None]:
    with mpmath.workdps(50):
        yield


def numerically(rows: list[list[Any]], a: float, b: float, power: int) -> float:
    """scipy's quadrature between the moments at which a formula changes."""
    cuts = [a, *[edge for edge in EDGES if a < edge < b], b]
    return math.fsum(
        quad(lambda t: fo.superpose(t, TAU, INITIAL, rows) ** power, low, high, epsabs=1e-13)[0]
        for low, high in itertools.pairwise(cuts)
    )


@pytest.mark.parametrize("rows", [SUM, *[[row] for row in SUM]])
@pytest.mark.parametrize(
    "window", [(0.0, 0.5), (0.2, 3.0), (-1.0, 2.0), (1.87, 1.8700001), (-3, -1)]
)
def test_the_integrals_agree_with_quadrature(
    rows: list[list[Any]], window: tuple[float, float]
) -> None:
    a, b = window
    first, second = (numerically(rows, a, b, power) for power in (1, 2))
    assert fo.mean(TAU, INITIAL, rows, a, b) == pytest.approx(first / (b - a), rel=1e-9, abs=1e-11)
    assert fo.rms(TAU, INITIAL, rows, a, b) == pytest.approx(math.sqrt(second / (b - a)), rel=1e-9)


@pytest.mark.parametrize("tau", [1e-9, 1e-3, 1.0, 1e6])
@pytest.mark.parametrize("near", [1.0, 1 + 1e-15, 1 + 1e-8, 0.3])
def test_a_decay_with_a_time_constant_near_tau_loses_nothing(tau: float, near: float) -> None:
    own, window = tau * near, 2.5 * tau
    k, m, end = 1 / mpf(tau), 1 / mpf(own), mpf(window)

    def y(t: Any) -> Any:
        if k == m:
            return k * t * mpmath.exp(-k * t)
        return k / (k - m) * (mpmath.exp(-m * t) - mpmath.exp(-k * t))

    rows = [["decay", 1.0, own]]
    with mpmath.workdps(60):
        first = mpmath.quad(y, [0, end]) / end
        second = mpmath.sqrt(mpmath.quad(lambda t: y(t) ** 2, [0, end]) / end)
    assert abs(mpf(fo.mean(tau, 0.0, rows, 0.0, window)) / first - 1) <= 1e-14
    assert abs(mpf(fo.rms(tau, 0.0, rows, 0.0, window)) / second - 1) <= 1e-14


def test_a_small_ripple_on_a_large_level_keeps_its_digits() -> None:
    rows = [["constant", 1e6, N, N], ["sine", 1.0, 50.0, N]]
    w, tau = 2 * mpmath.pi * 50, mpf(0.01)
    swing = 1 / mpmath.sqrt(1 + (w * tau) ** 2)
    exact = mpmath.sqrt(mpf(10) ** 12 + swing**2 / 2)
    got = fo.rms(0.01, 1e6, rows, 100.0, 100.2)
    assert abs(mpf(got) - exact) <= 1e-15 * exact


@pytest.mark.parametrize("periods", [5, 10.0, 37.3, 64.9])
@pytest.mark.parametrize("begin", [-0.2, 0.0, 0.03])
def test_periods_summed_as_a_series_are_the_periods(
    periods: float, begin: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    rows = [["square", -1.0, 5.0, 0.1, 0.3], ["sine", 2.0, 20.0, 10.0, N]]
    for function in (fo.mean, fo.rms):
        summed = function(2.0, 1.0, rows, begin, periods * 0.1)
        with monkeypatch.context() as patch:
            patch.setattr(integrals, "_PERIODS", 10**9)
            one_by_one = function(2.0, 1.0, rows, begin, periods * 0.1)
        assert summed == pytest.approx(one_by_one, rel=1e-15)


def test_a_million_periods_settle_to_the_ripple() -> None:
    rows = [["square", 0.0, 5.0, 1e-3, 0.3]]
    settled = fo.ripple(2e-3, 0.0, 5.0, 1e-3, 0.3)
    assert fo.mean(2e-3, settled.mean, rows, 1.0, 1001.0) == pytest.approx(1.5, rel=1e-12)
    one = fo.rms(2e-3, 0.0, rows, 1.0, 1.001)
    assert fo.rms(2e-3, 0.0, rows, 1.0, 1001.0) == pytest.approx(one, rel=1e-12)
    assert settled.minimum < one < settled.maximum


@settings(max_examples=40, deadline=None)
@given(st.floats(0.01, 100), st.floats(-10, 10), st.floats(0, 3), st.floats(0.01, 3))
def test_the_mean_times_the_window_adds_up_and_the_rms_is_not_below_it(
    tau: float, initial: float, begin: float, length: float
) -> None:
    middle, end = begin + length / 3, begin + length
    whole = fo.mean(tau, initial, SUM, begin, end) * (end - begin)
    parts = fo.mean(tau, initial, SUM, begin, middle) * (middle - begin)
    parts += fo.mean(tau, initial, SUM, middle, end) * (end - middle)
    assert whole == pytest.approx(parts, rel=1e-12, abs=1e-12)
    rms = fo.rms(tau, initial, SUM, begin, end)
    assert rms >= abs(fo.mean(tau, initial, SUM, begin, end)) * (1 - 1e-15)


def test_single_responses_have_their_known_integrals() -> None:
    assert fo.rms(0.5, 10.0, [["constant", 0.0]], 0.0, 3.0) ** 2 * 3 == pytest.approx(
        fo.i2t(0.5, 10.0, 0.0, 0.0, 3.0), rel=1e-14
    )
    column = fo.mean([[0.5], [1.0]], 0.0, [["step", 5.0]], 0.0, [[1.0, 2.0]])
    assert column.shape == (2, 2)
    assert column[1, 0] == fo.mean(1.0, 0.0, [["step", 5.0]], 0.0, 1.0)


@pytest.mark.parametrize("name", ["FO_MEAN", "FO_RMS"])
@pytest.mark.parametrize(
    ("arguments", "kind", "sentence"),
    [
        ((1, 0, [["step", 5]], 1, 1), "#NUM!", "t_to is 1, which is not after t_from, 1"),
        ((0, 0, [["step", 5]], 0, 1), "#NUM!", "tau is 0"),
        ((1, 0, [["wave", 5]], 0, 1), "#VALUE!", "constant, step, ramp"),
        ((1, 0, [["step", 5]], None, 1), "#VALUE!", "t_from is blank"),
        ((1, 0, [["step", 5]], 0, "x"), "#VALUE!", 't_to is the text "x"'),
        (
            (1, 0, [["square", 0, 1, 1e-3, 0.5], ["slope", 1, N, N, N]], 0, 1e3),
            "#NUM!",
            "never repeat",
        ),
    ],
)
def test_a_wrong_argument_has_its_sentence(
    name: str, arguments: tuple[Any, ...], kind: str, sentence: str
) -> None:
    with pytest.raises(CellError) as refused:
        CATALOGUE[name].function(*arguments)
    assert refused.value.kind.text == kind
    assert sentence in str(refused.value)


def test_only_the_wrong_windows_of_a_range_are_errors() -> None:
    result = fo.mean(1.0, 0.0, [["step", 5.0]], np.array([0.0, 2.0]), 1.0)
    assert (error_codes(result) != 0).tolist() == [False, True]
