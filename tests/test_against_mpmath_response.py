"""Responses, time constants and step times against mpmath at 60 digits.

The references are the textbook closed forms, which at 60 digits lose nothing that matters; each
is itself checked against the differential equation in test_against_scipy_response.py.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Any

import exact_responses as book
import mpmath
import numpy as np
import pytest
from mpmath import mpf

from tausheet import functions as fo
from tausheet.functions.errors import CellError, error_codes

TOLERANCE = 1e-13
CASES = 1500
CORNERS = [1e-12, 1e-9, 1e-6, 1e-3, 0.499, 0.5, 0.501, 0.999, 1.0, 1.001, 2.0, 35.0, 350.0, 700.0]


@pytest.fixture(autouse=True)
def _sixty_digits() -> Iterator[None]:
    with mpmath.workdps(60):
        yield


rng = np.random.default_rng(20)


def spread(low: float, high: float, count: int = CASES) -> np.ndarray:
    return np.exp(rng.uniform(math.log(low), math.log(high), count))


def levels(count: int = CASES) -> np.ndarray:
    values = rng.choice([-1.0, 1.0], count) * spread(1e-3, 1e6, count)
    values[rng.random(count) < 0.2] = 0.0
    return values


def times(tau: np.ndarray) -> np.ndarray:
    u = spread(1e-12, 700.0, len(tau))
    u[: len(CORNERS)] = CORNERS
    return u * tau


def near(values: np.ndarray) -> np.ndarray:
    """Equal, almost equal, near and far."""
    close = 1 + rng.choice([-1, 1], len(values)) * 10 ** rng.uniform(-16, 0, len(values))
    close[::7] = 1.0
    far = spread(1e-6, 1e6, len(values))
    return values * np.where(rng.random(len(values)) < 0.7, np.abs(close) + 1e-300, far)


TAU = spread(1e-9, 1e6)
T = times(TAU)
SHAPES: dict[str, tuple[Callable[..., Any], tuple[np.ndarray, ...], tuple[int, ...]]] = {
    # reference, arguments after t and tau, which of them are levels
    "natural": (book.natural, (levels(),), (0,)),
    "step": (
        book.step,
        (levels(), levels(), T * rng.choice([0, 0.3, 0.999999, 1, 2], CASES)),
        (0, 1),
    ),
    "ramp": (book.ramp, (levels(), levels(), levels(), T * spread(1e-9, 1e3)), (0, 1, 2)),
    "sine": (
        book.sine,
        (levels(), levels(), spread(1e-9, 1e6) / TAU, rng.uniform(-720, 720, CASES), levels()),
        (0, 1, 4),
    ),
    "decay": (book.decay, (levels(), levels(), near(TAU), levels()), (0, 1, 3)),
    "pulse": (
        book.pulse,
        (levels(), levels(), levels(), T * spread(1e-6, 10), T * spread(1e-6, 2)),
        (0, 1, 2),
    ),
    "square": (
        book.square,
        (levels(), levels(), levels(), T * spread(1e-6, 1e2), rng.uniform(0, 1, CASES)),
        (0, 1, 2),
    ),
}


def exactly(reference: Callable[..., Any], *arguments: float) -> Any:
    return reference(*(mpf(float(a)) for a in arguments))


@pytest.mark.parametrize("name", SHAPES)
def test_a_response_is_exact_over_its_domain(name: str) -> None:
    reference, arguments, which = SHAPES[name]
    got = getattr(fo, name)(T, TAU, *arguments)
    worst = 0.0
    for row in range(CASES):
        own = [a[row] for a in arguments]
        exact = exactly(reference, T[row], TAU[row], *own)
        scale = max(*(abs(own[i]) for i in which), abs(exact))
        allowed = TOLERANCE * max(1.0, T[row] / (350 * TAU[row])) * scale
        if scale:
            worst = max(worst, float(abs(mpf(float(got[row])) - exact) / allowed))
    assert worst <= 1, worst


@pytest.mark.parametrize("name", SHAPES)
def test_a_single_level_is_exact_to_its_own_size(name: str) -> None:
    """With one level only, y is no difference: every digit of it counts."""
    reference, arguments, which = SHAPES[name]
    for kept in which:
        own = [
            np.where(arguments[i] == 0, 1.0, np.abs(arguments[i]))
            if i == kept
            else np.zeros(CASES)
            if i in which
            else a
            for i, a in enumerate(arguments)
        ]
        if name == "sine" and kept == 1:
            own[3] = np.zeros(CASES)  # a phase would make it a difference
            own[2] = np.minimum(own[2], 0.05 / T)
        got = getattr(fo, name)(T, TAU, *own)
        for row in range(0, CASES, 3):
            exact = exactly(reference, T[row], TAU[row], *(a[row] for a in own))
            allowed = TOLERANCE * max(1.0, T[row] / (350 * TAU[row])) * abs(exact)
            assert abs(mpf(float(got[row])) - exact) <= max(allowed, mpf("1e-300")), (
                name,
                kept,
                [a[row] for a in own],
            )


@pytest.mark.parametrize("name", SHAPES)
def test_alone_and_in_an_array_it_is_the_same(name: str) -> None:
    _, arguments, which = SHAPES[name]
    got = getattr(fo, name)(T, TAU, *arguments)
    for row in range(0, CASES, 5):
        own = [float(a[row]) for a in arguments]
        alone = getattr(fo, name)(float(T[row]), float(TAU[row]), *own)
        scale = max(*(abs(own[i]) for i in which), abs(alone))
        assert abs(alone - got[row]) <= 4 * np.spacing(scale), (name, own)


@pytest.mark.parametrize("periods", [0, 1, 2, 3, 10, 999_999, 1_000_000, 10**9])
@pytest.mark.parametrize("place", [0.0, 0.25, 0.3, 0.7, 0.999])
def test_a_square_is_exact_at_any_period(periods: int, place: float) -> None:
    for period, tau, duty in (
        (0.1, 5.0, 0.3),
        (0.1, 0.01, 0.3),
        (1 / 3, 1e7, 0.7),
        (3e-4, 2.0, 0.5),
    ):
        t = (periods + place) * period
        exact = exactly(book.square, t, tau, 2.0, -1.0, 5.0, period, duty)
        got = fo.square(t, tau, 2.0, -1.0, 5.0, period, duty)
        assert abs(mpf(got) - exact) <= 5 * TOLERANCE * max(1.0, t / (350 * tau)), (period, tau)


def test_the_edges_of_the_domain() -> None:
    assert fo.square(5.0, 1.0, 2.0, -1.0, 5.0, 1.0, 0.0) == pytest.approx(
        fo.step(5.0, 1.0, 2.0, -1.0), rel=1e-14
    )
    assert fo.square(5.0, 1.0, 2.0, -1.0, 5.0, 1.0, 1.0) == pytest.approx(
        fo.step(5.0, 1.0, 2.0, 5.0), rel=1e-14
    )
    assert fo.ramp(2.0, 1.0, 1.0, 7.0, 3.0, 0.0) == pytest.approx(
        fo.step(2.0, 1.0, 1.0, 3.0), rel=1e-15
    )
    assert fo.pulse(2.0, 1.0, 1.0, 3.0, 9.0, 0.0) == pytest.approx(
        fo.step(2.0, 1.0, 1.0, 3.0), rel=1e-15
    )
    assert fo.sine(2.0, 1.0, 1.0, 5.0, 0.0, 90.0, 2.0) == pytest.approx(
        fo.step(2.0, 1.0, 1.0, 7.0), rel=1e-15
    )
    assert fo.decay(1.0, 0.5, 0.0, 4.0, 0.5) == 4.0 * 2.0 * math.exp(-2.0)


@pytest.mark.parametrize("name", SHAPES)
def test_before_switching_y_is_its_initial_value(name: str) -> None:
    _, arguments, _ = SHAPES[name]
    own = [float(a[50]) for a in arguments]
    own[0] = 3.25
    for t in (-1e300, -1.0, -1e-300, 0.0):
        assert getattr(fo, name)(t, 2.0, *own) == 3.25


@pytest.mark.parametrize("tau", [1e-300, 1e300])
def test_a_time_constant_at_the_end_of_the_numbers_computes(tau: float) -> None:
    final = 5.0 if tau < 1 else 2.0
    assert fo.step(1.0, tau, 2.0, 5.0) == pytest.approx(final)
    assert fo.ramp(1.0, tau, 2.0, 5.0, 5.0, 0.5) == pytest.approx(final)
    assert fo.decay(1.0, tau, 2.0, 0.0, 1.0, 5.0) == pytest.approx(final)
    assert fo.pulse(1.0, tau, 2.0, 5.0, 5.0, 0.2, 0.3) == pytest.approx(final)
    assert fo.square(1.0, tau, 2.0, 5.0, 5.0, 0.3, 0.5) == pytest.approx(final)
    assert fo.sine(1.0, tau, 2.0, 0.0, 50.0, 0.0, 5.0) == pytest.approx(final)


@pytest.mark.parametrize("name", SHAPES)
def test_levels_at_the_end_of_the_numbers_do_not_overflow_on_the_way(name: str) -> None:
    _, arguments, which = SHAPES[name]
    own = [float(a[200]) for a in arguments]
    for i, sign in zip(which, (1, -1, 1), strict=False):
        own[i] = sign * 1.7e308
    if name in ("sine", "decay"):
        own[which[2]] = 0.0
    result = getattr(fo, name)([1.0, 1e-9], 1.0, *own)
    assert not error_codes(result).any()


def test_time_constants_and_parallel_parts() -> None:
    r, c, f = spread(1e-3, 1e9), spread(1e-15, 10), spread(1e-2, 1e9)
    for row in range(0, CASES, 5):
        a, b, g = (mpf(float(x[row])) for x in (r, c, f))
        close(fo.tau_rc(r[row], c[row]), a * b)
        close(fo.tau_rl(r[row], c[row]), b / a)
        close(fo.tau_rx(r[row], c[row], f[row]), b / (2 * mpmath.pi * g * a))
        some = [float(x) for x in r[row : row + 4]]
        close(fo.parallel(some), 1 / sum(1 / mpf(x) for x in some))
    assert fo.parallel([5.0, 0.0]) == 0.0
    assert fo.parallel([[10.0, None], ["", 10.0]]) == 5.0
    close(fo.parallel([1e308] * 3), mpf(1e308) / 3)
    close(fo.parallel([1e-300] * 3), mpf(1e-300) / 3)


def close(got: float, exact: Any, tolerance: float = 4e-16) -> None:
    assert abs(mpf(float(got)) - exact) <= tolerance * abs(exact), (got, exact)


def test_step_times_are_exact_from_both_ends() -> None:
    tau, first, last = spread(1e-9, 1e6), levels(), levels()
    share = np.concatenate([spread(1e-14, 0.5, CASES // 2), 1 - spread(1e-14, 0.5, CASES // 2)])
    for row in range(CASES):
        y0, y1, tc = (float(x[row]) for x in (first, last, tau))
        level = y0 + (y1 - y0) * float(share[row])
        if not min(y0, y1) < level < max(y0, y1):
            continue
        exact = mpf(tc) * mpmath.log((mpf(y1) - mpf(y0)) / (mpf(y1) - mpf(level)))
        close(fo.time_to(level, tc, y0, y1), exact, 1e-15)
        close(fo.time_to([level], tc, y0, y1)[0], exact, 1e-15)
        one = fo.time_until_below if y1 < y0 else fo.time_until_above
        close(one(level, tc, y0, y1), exact, 1e-15)
        close(fo.tau_for(level, float(exact), y0, y1), mpf(float(exact)) / exact * tc, 2e-15)
        close(
            fo.settling_time(tc, float(share[row])),
            -mpf(tc) * mpmath.log(mpf(float(share[row]))),
            1e-15,
        )


def test_rise_time_over_its_domain() -> None:
    lows, highs = np.sort(rng.uniform(1e-6, 1 - 1e-6, (2, 300)), axis=0)
    for low, high in zip(lows, highs, strict=True):
        exact = mpmath.log((1 - mpf(float(low))) / (1 - mpf(float(high))))
        close(fo.rise_time(1.0, low, high), exact, 2e-15)


@pytest.mark.parametrize(
    ("call", "expected"),
    [
        (lambda: fo.time_to(3.0, 1.0, 3.0, 5.0, 9.0), 0.0),
        (lambda: fo.time_to(3.0, 1.0, 3.0, 3.0), 0.0),
        (lambda: fo.time_to(5.0, 1.0, 0.0, 5.0), "#N/A"),
        (lambda: fo.time_to(6.0, 1.0, 0.0, 5.0), "#N/A"),
        (lambda: fo.time_to(-1.0, 1.0, 0.0, 5.0), "#N/A"),
        (lambda: fo.time_to(4.0, 1.0, 3.0, 3.0), "#N/A"),
        (lambda: fo.time_until_below(60.0, 1.0, 12.0, 0.0), 0.0),
        (lambda: fo.time_until_below(60.0, 1.0, 60.0, 0.0), 0.0),
        (lambda: fo.time_until_below(60.0, 1.0, 60.0, 60.0), 0.0),
        (lambda: fo.time_until_below(60.0, 1.0, 12.0, 60.0), 0.0),
        (lambda: fo.time_until_below(60.0, 1.0, 60.0, 61.0), "#N/A"),
        (lambda: fo.time_until_below(60.0, 1.0, 99.0, 60.0), "#N/A"),
        (lambda: fo.time_until_below(60.0, 1.0, 99.0, 70.0), "#N/A"),
        (lambda: fo.time_until_below(60.0, 1.0, 0.0, 70.0), "#N/A"),
        (lambda: fo.time_until_above(60.0, 1.0, 99.0, 60.0), 0.0),
        (lambda: fo.time_until_above(60.0, 1.0, 0.0, 60.0), "#N/A"),
        (lambda: fo.time_until_above(60.0, 1.0, 99.0, 0.0), "#N/A"),
        (lambda: fo.tau_for(5.0, 1.0, 0.0, 5.0), "#N/A"),
        (lambda: fo.tau_for(0.0, 1.0, 0.0, 5.0), "#N/A"),
        (lambda: fo.tau_for(1.0, 1.0, 3.0, 3.0), "#N/A"),
        (lambda: fo.rise_time(1.0, 0.9, 0.1), "#NUM!"),
        (lambda: fo.rise_time(1.0, 0.0, 0.9), "#NUM!"),
        (lambda: fo.settling_time(1.0, 1.0), 0.0),
        (lambda: fo.settling_time(1.0, 1.01), "#NUM!"),
        (lambda: fo.resistance_at(10.0, -300.0), "#NUM!"),
        (lambda: fo.resistance_at(10.0, 20.0, "steel"), "#VALUE!"),
        (lambda: fo.resistance_at(10.0, 20.0, 0), 10.0),
    ],
)
def test_what_exists_and_what_does_not(call: Callable[[], float], expected: object) -> None:
    if isinstance(expected, float):
        assert call() == expected
        return
    with pytest.raises(CellError) as refused:
        call()
    assert refused.value.kind.text == expected
