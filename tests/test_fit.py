"""The fit: recovery of known curves, coverage of its errors, and when it says it cannot tell."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import curve_fit

from tausheet.addin import cells
from tausheet.functions import fit, fit_from
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import (
    CellError,
    DomainError,
    ErrorKind,
    InputError,
    NotAvailable,
    PassedOn,
    error_kind,
)
from tausheet.functions.fit import _runs_chance


def curve(s: Any, tau: float, initial: float, final: float) -> Any:
    return initial - (final - initial) * np.expm1(-np.asarray(s) / tau)


@given(
    st.floats(-9, 6).map(lambda e: 10.0**e),
    st.floats(0.5, 20),
    st.floats(-1000, 1000),
    st.floats(1, 1000),
    st.sampled_from([5, 20, 101]),
)
def test_an_exact_curve_comes_back(
    tau: float, window: float, initial: float, step: float, n: int
) -> None:
    times = np.linspace(0, window * tau, n)
    values = curve(times, tau, initial, initial + step)
    result = fit(times, values)
    # what the rounding of the values leaves open
    assert abs(result.tau - tau) <= 1e-14 * tau + 10 * result.tau_error
    assert result.tau == pytest.approx(tau, rel=1e-8)
    assert result.initial == pytest.approx(initial, abs=1e-8 * (abs(initial) + step))
    assert result.final == pytest.approx(initial + step, abs=1e-8 * (abs(initial) + step))
    assert result.residual <= 1e-14 * (abs(initial) + step)
    known = fit_from(times, values, 0.0, initial)
    assert known.tau == pytest.approx(tau, rel=1e-8)


@pytest.mark.parametrize("window", [1e-3, 1e-2, 0.1, 1.0, 10.0, 100.0])
def test_short_and_long_windows_of_an_exact_curve(window: float) -> None:
    times = np.linspace(0, window, 200)
    values = curve(times, 1.0, 7.0, 10.0)
    result = fit(times, values)
    assert abs(result.tau - 1.0) < 5 * result.tau_error + 1e-14
    assert result.tau_error < 1e-15 * (10 + 10 / window**3)


def noisy(seed: int) -> dict[str, Any]:
    """A measured transient: windows of 0.5 to 20 tau, noise to 5 % of the step, 20 points on."""
    rng = np.random.default_rng(seed)
    tau = 10 ** rng.uniform(-9, 6)
    window = 10 ** rng.uniform(math.log10(0.5), math.log10(20)) * tau
    n = int(10 ** rng.uniform(math.log10(20), 3))
    even = rng.random() < 0.5
    s = np.linspace(0, window, n) if even else np.sort(rng.uniform(0, window, n))
    step = 10 ** rng.uniform(-3, 3) * rng.choice([-1, 1])
    initial = rng.uniform(-5, 5) * abs(step)
    noise = rng.uniform(0, 0.05) * abs(step)
    start = rng.uniform(-10, 10) * tau
    values = curve(s, tau, initial, initial + step) + noise * rng.normal(size=n)
    # the standard error that the true curve would have, from its own Jacobian
    x = (s - s[0]) / tau
    swing = step * math.exp(-s[0] / tau)
    jacobian = np.column_stack([np.exp(-x), -np.expm1(-x), swing * x * np.exp(-x)])
    open_to = noise * math.sqrt(np.linalg.inv(jacobian.T @ jacobian)[2, 2])
    return {
        "t": s + start, "y": values, "tau": tau, "start": start, "initial": initial,
        "open": open_to,
    }  # fmt: skip


def coverage(count: int, first: int) -> tuple[float, float, int]:
    """Shares within four standard errors (fit, fit_from), and refusals that had no reason."""
    within: list[list[bool]] = [[], []]
    refused = 0
    for seed in range(first, first + count):
        case = noisy(seed)
        calls = (
            lambda c=case: fit(c["t"], c["y"]),
            lambda c=case: fit_from(c["t"], c["y"], c["start"], c["initial"]),
        )
        for hits, call in zip(within, calls, strict=True):
            try:
                result = call()
            except NotAvailable:
                refused += case["open"] < 0.2
            else:
                hits.append(abs(result.tau - case["tau"]) <= 4 * result.tau_error)
    return float(np.mean(within[0])), float(np.mean(within[1])), refused


def test_tau_lies_within_four_standard_errors() -> None:
    shares = coverage(200, 0)
    assert shares[0] >= 0.99
    assert shares[1] >= 0.99
    assert shares[2] == 0


@pytest.mark.campaign
def test_tau_lies_within_four_standard_errors_in_5000_cases() -> None:
    shares = coverage(5000, 1_000_000)
    assert shares[0] >= 0.99
    assert shares[1] >= 0.99
    assert shares[2] == 0


@pytest.mark.parametrize("seed", range(12))
def test_parameters_and_errors_are_those_of_a_general_least_squares(seed: int) -> None:
    """scipy's curve_fit, started at the true values."""
    case = noisy(seed)
    s, y, tau = case["t"] - case["t"][0], case["y"], case["tau"]
    try:
        ours = fit(case["t"], y)
    except CellError:
        assert case["open"] > 0.2
        return

    def slopes(t: Any, a: float, b: float, log_tau: float) -> Any:
        x = t / (math.exp(log_tau) * tau)
        return np.column_stack([np.exp(-x), -np.expm1(-x), (a - b) * x * np.exp(-x)])

    best, covariance = curve_fit(
        lambda t, a, b, log_tau: curve(t, math.exp(log_tau) * tau, a, b),
        s, y, [y[0], y[-1], 0.0], jac=slopes, ftol=1e-15, xtol=1e-15, gtol=1e-15,
    )  # fmt: skip
    errors = np.sqrt(np.diag(covariance))
    assert ours.initial == pytest.approx(best[0], abs=1e-6 * errors[0])
    assert ours.final == pytest.approx(best[1], abs=1e-6 * errors[1])
    assert math.log(ours.tau / tau) == pytest.approx(best[2], abs=1e-6 * errors[2])
    found = [ours.initial_error, ours.final_error, ours.tau_error / ours.tau]
    np.testing.assert_allclose(found, errors, rtol=1e-5)
    squares = np.sum((y - curve(s, math.exp(best[2]) * tau, best[0], best[1])) ** 2)
    assert ours.residual == pytest.approx(math.sqrt(squares / (y.size - 3)), rel=1e-9)


@given(st.integers(0, 10**6), st.floats(-100, 100), st.floats(0.01, 100), st.floats(-50, 50))
def test_scaling_and_shifting_carry_through(
    seed: int, shift: float, factor: float, offset: float
) -> None:
    rng = np.random.default_rng(seed)
    times = np.sort(rng.uniform(0, 4, 40))
    values = curve(times, 1.0, 0.0, 1.0) + 0.01 * rng.normal(size=40)
    plain = fit(times, values)
    moved = fit(times * factor + shift, values * -factor + offset)
    assert moved.tau == pytest.approx(plain.tau * factor, rel=1e-7)
    assert moved.tau_error == pytest.approx(plain.tau_error * factor, rel=1e-6)
    assert moved.final == pytest.approx(plain.final * -factor + offset, abs=1e-6 * factor)
    assert moved.residual == pytest.approx(plain.residual * factor, rel=1e-6)


TIMES = np.linspace(0.0, 5.0, 60)
VALUES = curve(TIMES, 1.25, 2.0, 12.0) + 0.02 * np.random.default_rng(4).normal(size=60)


def test_what_picks_one_result() -> None:
    row = cells.plain_grid(cells.call("FO_FIT", [TIMES[:, None], VALUES[:, None]]))
    assert isinstance(row, list)
    names = ["tau", "initial", "final", "tau error", "initial error", "final error", "residual"]
    assert row == [[fit(TIMES, VALUES, name.upper()) for name in names]]
    row = cells.plain_grid(cells.call("FO_FIT_FROM", [TIMES[:, None], VALUES[:, None], 0.0, 2.0]))
    names = ["tau", "final", "tau error", "final error", "residual"]
    assert row == [[fit_from(TIMES, VALUES, 0.0, 2.0, name) for name in names]]


def test_a_window_leaves_points_out() -> None:
    used = (TIMES >= 1.0) & (TIMES <= 4.0)
    assert fit(TIMES, VALUES, None, 1.0, 4.0) == fit(TIMES[used], VALUES[used])
    assert fit(TIMES, VALUES, None, 0.0) == fit(TIMES, VALUES)
    late = fit_from(TIMES, VALUES, 0.5, 5.3, None, 0.5, 4.0)
    used = (TIMES >= 0.5) & (TIMES <= 4.0)
    assert late == fit_from(TIMES[used], VALUES[used], 0.5, 5.3)


def test_initial_belongs_to_the_first_time_of_the_window() -> None:
    result = fit(TIMES, VALUES, None, 1.0)
    first = TIMES[TIMES >= 1.0][0]
    assert abs(result.initial - curve(first, 1.25, 2.0, 12.0)) < 4 * result.initial_error


def test_order_and_repeated_times() -> None:
    shuffled = np.random.default_rng(1).permutation(60)
    np.testing.assert_allclose(
        fit(TIMES[shuffled], VALUES[shuffled]), fit(TIMES, VALUES), rtol=1e-9
    )
    again = VALUES + 0.02 * np.random.default_rng(5).normal(size=60)
    twice = fit(np.repeat(TIMES, 2), np.column_stack([VALUES, again]).ravel())
    mean = fit(TIMES, (VALUES + again) / 2)
    assert twice.tau == pytest.approx(mean.tau, rel=1e-9)


def test_rows_blank_in_both_columns_are_left_out() -> None:
    times = [[t] for t in TIMES.tolist()]
    values = [[v] for v in VALUES.tolist()]
    expected = fit(TIMES, VALUES)
    assert fit([*times, [None], [""]], [*values, [None], [None]]) == expected
    assert fit([[None], *times], [[""], *values]) == expected


ROWS = list(range(5))


@pytest.mark.parametrize(
    ("times", "values", "error", "words"),
    [
        ([0, 1, 2, 3, 4], [1, 2, 3, 4], InputError, "times has 5 cells and values has 4"),
        ([0, None, 2, 3, 4], ROWS, InputError, "times is blank in row 2 of the range, where val"),
        (ROWS, [0, 1, 2, "", 4], InputError, "values is blank in row 4 of the range, where tim"),
        ([0, "x", 2, 3, 4], ROWS, InputError, 'times is the text "x"'),
        (ROWS, [0, "uF", 2, 3, 4], InputError, 'values is the text "uF"'),
        (ROWS, [0, "1E400", 2, 3, 4], InputError, 'values is the text "1E400"'),
        (ROWS, [0, math.nan, 2, 3, 4], DomainError, "values is nan"),
        (ROWS, np.array([0, math.nan, 2, 3, 4]), DomainError, "values is nan"),
        ([0, math.inf, 2, 3, 4], ROWS, DomainError, "times is inf"),
        ([0, 10**400, 2, 3, 4], ROWS, DomainError, "times is 1000"),
        ([0, ErrorKind.REF, 2, 3, 4], ROWS, PassedOn, "times holds the error #REF!"),
        (ROWS, [0, ErrorKind.NA.nan, 2, 3, 4], PassedOn, "values holds the error #N/A"),
        ([-1.7e308, 0, 1, 2, 1.7e308], [4, 3, 2, 1, 0], DomainError, "more than the range of num"),
        ([0, 1, 2], [0, 1, 1.5], NotAvailable, "times has 3 points in the window"),
        (None, None, NotAvailable, "times has 0 points in the window"),
        ([1, 1, 1, 2, 2], ROWS, NotAvailable, "fewer than 3 different moments"),
        (ROWS, [3, 3, 3, 3, 3], NotAvailable, "values is flat: there is no step"),
        (ROWS, ROWS, NotAvailable, "values shows no time constant"),
        (ROWS, np.exp(ROWS), NotAvailable, "values shows no time constant"),
        (ROWS, [0, 0, 0, 1, 1], NotAvailable, "values (shows no time constant|is flat)"),
    ],
)
def test_points_that_cannot_be_used(times: Any, values: Any, error: Any, words: str) -> None:
    with pytest.raises(error, match=words):
        fit(times, values)
    sentence = CATALOGUE["FO_FIT"].reason([times, values])
    assert sentence.startswith("FO_FIT: ")
    result = cells.call("FO_FIT", [times, values])
    assert isinstance(result, float)
    assert error_kind(result) in (error.kind, ErrorKind.REF, ErrorKind.NA)


@pytest.mark.parametrize(
    ("options", "error", "words"),
    [
        (("slope",), InputError, 'what is the text "slope"; allowed: "tau", "initial"'),
        ((None, "x"), InputError, 't_from is the text "x"'),
        ((None, 2.0, 1.0), DomainError, "t_to is 1, which is not after t_from, 2"),
        ((None, 2.0, 2.0), DomainError, "t_to is 2, which is not after t_from, 2"),
        ((None, math.nan), DomainError, "t_from is nan"),
        ((None, None, math.inf), DomainError, "t_to is inf"),
        ((None, None, ErrorKind.NAME), PassedOn, "t_to holds the error #NAME"),
        ((None, [1.0, 2.0]), InputError, "is a range of 2 cells"),
        ((None, 4.9), NotAvailable, "times has 2 points in the window"),
    ],
)
def test_wrong_options(options: tuple[Any, ...], error: Any, words: str) -> None:
    with pytest.raises(error, match=words):
        fit(TIMES, VALUES, *options)
    with pytest.raises(error, match=words.replace('"tau", "initial"', '"tau", "final"')):
        fit_from(TIMES, VALUES, 0.0, 2.0, *options)


@pytest.mark.parametrize(
    ("t_initial", "initial", "error", "words"),
    [
        (None, 2.0, InputError, "t_initial is blank"),
        (0.0, None, InputError, "initial is blank"),
        ("x", 2.0, InputError, 't_initial is the text "x"'),
        (0.0, math.inf, DomainError, "initial is inf"),
        (0.0, [2.0, 2.0], InputError, "is a range of 2 cells"),
        (ErrorKind.DIV0, 2.0, PassedOn, "t_initial holds the error #DIV/0!"),
        (1.0, 7.0, DomainError, "t_initial is 1, but times begins at 0; enter a t_from"),
    ],
)
def test_wrong_starts(t_initial: Any, initial: Any, error: Any, words: str) -> None:
    with pytest.raises(error, match=words):
        fit_from(TIMES, VALUES, t_initial, initial)


def test_noise_alone_shows_no_time_constant() -> None:
    rng = np.random.default_rng(8)
    for n in (4, 5, 10, 20, 100, 1000):
        found = 0
        for _ in range(50):
            try:
                fit(np.linspace(0, 1, n), rng.normal(size=n))
                found += 1
            except NotAvailable:
                pass
        assert found <= 1


def test_a_standard_error_above_half_of_tau_is_refused_and_below_is_not() -> None:
    times = np.linspace(0, 0.6, 20)
    errors = np.random.default_rng(3).normal(size=20)
    refused, told = 0, 0
    for noise in np.geomspace(1e-4, 0.1, 30):
        try:
            result = fit(times, curve(times, 1.0, 0.0, 1.0) + noise * errors)
            assert result.tau_error <= result.tau / 2
            told += 1
        except NotAvailable as error:
            refused += "half of it" in str(error) or "no time constant" in str(error)
    assert told > 5
    assert refused == 30 - told > 5


def test_residuals_in_a_plain_pattern_are_refused() -> None:
    times = np.linspace(0, 10, 200)
    rng = np.random.default_rng(6)
    noise = 0.003 * rng.normal(size=200)
    two = curve(times, 0.5, 0.0, 0.5) + curve(times, 3.0, 0.0, 0.5)
    with pytest.raises(NotAvailable, match="plain pattern"):
        fit(times, two + noise)
    with pytest.raises(NotAvailable, match="plain pattern"):
        fit_from(times, two, 0.0, 0.0)
    before = np.linspace(-2, 6, 200)
    with pytest.raises(NotAvailable, match="plain pattern"):
        fit(before, curve(np.maximum(before, 0), 1.0, 0.0, 1.0) + noise)
    assert fit(before, curve(np.maximum(before, 0), 1.0, 0.0, 1.0) + noise, "tau", 0.0) > 0.9


def test_the_steps_of_an_instrument_are_no_pattern() -> None:
    """Values rounded to 8 bits, or to the digits of a display, depart in runs, within a step."""
    times = np.linspace(0, 5, 4000)
    exact = curve(times, 1.3, 10.0, 7.0)
    for step in (10 / 256, 0.001):
        result = fit(times, np.round(exact / step) * step)
        assert result.tau == pytest.approx(1.3, rel=2e-3)
        assert result.residual < step / 2


def test_runs() -> None:
    # exact: 2 runs of 20 signs, 10 of each, are 2 of the C(20, 10) arrangements
    assert _runs_chance(np.repeat([1.0, -1.0], 10)) == pytest.approx(4e-5, rel=0.15)
    assert _runs_chance(np.tile([1.0, -1.0], 50)) < 1e-6
    assert _runs_chance(np.repeat([1.0, -1.0], 50)) < 1e-6
    assert _runs_chance(np.random.default_rng(2).normal(size=10_000)) > 1e-3
    assert _runs_chance(np.ones(30)) == 1.0
    assert _runs_chance(np.zeros(30)) == 1.0
    assert _runs_chance(np.array([1.0, -1.0])) == 1.0


def test_a_wide_spread_of_gaps() -> None:
    times = np.concatenate([[0.0, 1e-15], np.linspace(0.1, 5, 40)])
    values = curve(times, 1.0, 1.0, 0.0) + 0.01 * np.random.default_rng(1).normal(size=42)
    result = fit(times, values)
    assert abs(result.tau - 1.0) < 4 * result.tau_error


def test_magnitudes_near_the_ends_of_the_range_of_numbers() -> None:
    times = np.linspace(0, 5, 30)
    for size in (1e-290, 1e290):
        result = fit(times * size, size * curve(times, 1.3, 1.0, 0.0))
        assert result.tau == pytest.approx(1.3 * size, rel=1e-12)


def test_ten_thousand_points() -> None:
    times = np.linspace(0, 5, 10_000)
    values = curve(times, 1.3, 5.0, 3.0) + 0.02 * np.random.default_rng(0).normal(size=10_000)
    result = fit(times, values)
    assert abs(result.tau - 1.3) < 4 * result.tau_error
    assert result.residual == pytest.approx(0.02, rel=0.03)
