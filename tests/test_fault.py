"""Fault currents against mpmath, a numerical solution of the circuit, and their refusals."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp
from scipy.optimize import minimize_scalar

from tausheet.functions import (
    dc_offset,
    dc_worst,
    fault_current,
    fault_i2t,
    peak_factor,
)
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import DomainError

CIRCUITS = [(0.0, 1.0), (1.0, 0.0), (1e-9, 1.0), (0.01, 1.0), (0.3, 1.0), (1.0, 1.0), (1.0, 0.1),
            (1.0, 1e-6), (1.0, 1e-12)]  # fmt: skip
ANGLES = [0.0, 30.0, 90.0, -90.0, 137.0, 180.0, 1000.0]
FREQUENCY = 50.0


@pytest.fixture(autouse=True, scope="module")
def digits() -> Iterator[None]:
    """Digits of the references, set back afterwards since mpmath keeps them globally."""
    with mp.workdps(130):
        yield


def exact(t: float, r: float, x: float, angle: float) -> Any:
    """i(t) / (sqrt(2) rms), by the textbook form."""
    t, r, x, angle = map(mp.mpf, (t, r, x, angle))
    alpha, phi, w = angle * mp.pi / 180, mp.atan2(x, r), 2 * mp.pi * mp.mpf(FREQUENCY)
    decay = mp.exp(-t * w * r / x) if x else 0
    return mp.sin(w * t + alpha - phi) - mp.sin(alpha - phi) * decay


@pytest.mark.parametrize(("r", "x"), CIRCUITS)
@pytest.mark.parametrize("angle", ANGLES)
def test_current_from_the_first_instant_to_long_after(r: float, x: float, angle: float) -> None:
    for power in range(-14, 5):
        for t in (10.0**power, 0.7 * 10.0**power):
            expected = exact(t, r, x, angle)
            error = abs(fault_current(t, 1 / math.sqrt(2), r, x, FREQUENCY, angle) - expected)
            # relative to the value itself while both responses rise; later to the amplitude
            rising = 2 * math.pi * FREQUENCY * t < 1 and math.cos(math.radians(angle)) >= 0
            rising = rising and math.sin(math.radians(angle)) >= 0
            assert error <= 1e-14 * (abs(expected) if rising else 1)


def test_closed_at_a_zero_of_the_voltage_the_first_instants_keep_their_digits() -> None:
    for r, x in CIRCUITS:
        for t in (1e-15, 1e-12, 1e-9, 1e-6, 1e-4, 1e-3):
            expected = exact(t, r, x, 0.0) * mp.sqrt(2)
            assert abs(fault_current(t, 1.0, r, x, FREQUENCY) / expected - 1) < 2e-15


def test_current_is_the_solution_of_the_circuit() -> None:
    """L di/dt + R i = sqrt(2) V sin(w t + angle), integrated by scipy."""
    volts, r, x, angle = 230.0, 0.02, 0.09, 25.0
    w = 2 * math.pi * FREQUENCY

    def slope(t: float, i: list[float]) -> float:
        source = math.sqrt(2) * volts * math.sin(w * t + math.radians(angle))
        return (source - r * i[0]) / (x / w)

    times = np.linspace(0, 0.08, 33)
    solution = solve_ivp(slope, (0, 0.08), [0.0], "DOP853", times, rtol=1e-12, atol=1e-9)
    current = fault_current(times, volts / math.hypot(r, x), r, x, FREQUENCY, angle)
    np.testing.assert_allclose(current, solution.y[0], rtol=1e-9, atol=1e-6)


@given(st.floats(0, 1), st.floats(0, 360), st.sampled_from(CIRCUITS))
def test_current_is_the_settled_sine_and_the_direct_part(
    t: float, angle: float, circuit: tuple[float, float]
) -> None:
    r, x = circuit
    settled = fault_current(t, 1.0, r, x, FREQUENCY, angle) - dc_offset(
        t, 1.0, r, x, FREQUENCY, angle
    )
    beta = math.radians(angle) - math.atan2(x, r)
    assert settled == pytest.approx(
        math.sqrt(2) * math.sin(2 * math.pi * FREQUENCY * t + beta), abs=1e-12
    )


@pytest.mark.parametrize(("r", "x"), CIRCUITS)
def test_direct_part(r: float, x: float) -> None:
    w, tiny = 2 * mp.pi * FREQUENCY, mp.mpf(10) ** -300
    for t in (0.0, 1e-6, 0.004, 0.1, 1.0):
        decay = mp.exp(-mp.mpf(t) * w * r / x) if x else mp.mpf(0)
        assert abs(dc_worst(t, 1.0, r, x, FREQUENCY) - mp.sqrt(2) * decay) <= 1e-13 * decay + tiny
        for angle in ANGLES:
            beta = mp.mpf(angle) * mp.pi / 180 - mp.atan2(x, r)
            expected = -mp.sqrt(2) * mp.sin(beta) * decay
            error = abs(dc_offset(t, 1.0, r, x, FREQUENCY, angle) - expected)
            assert error <= 1e-15 * decay + 1e-13 * abs(expected) + tiny
        phi = math.degrees(math.atan2(x, r))
        worst = dc_offset(t, 1.0, r, x, FREQUENCY, phi - 90)
        assert worst == pytest.approx(dc_worst(t, 1.0, r, x, FREQUENCY), rel=1e-14)


def test_before_and_at_switching() -> None:
    for function in (fault_current, dc_offset):
        assert function(-1e-9, 1.0, 0.1, 1.0, 50.0, 70.0) == 0.0
    assert dc_worst(-1e-9, 1.0, 0.1, 1.0, 50.0) == 0.0
    assert fault_current(0.0, 1.0, 0.1, 1.0, 50.0, 70.0) == 0.0
    # without reactance the current jumps: at 0 the value just after
    assert fault_current(0.0, 1.0, 0.1, 0.0, 50.0, 90.0) == pytest.approx(math.sqrt(2), rel=1e-15)
    assert dc_worst(0.0, 1.0, 0.1, 0.0, 50.0) == 0.0
    # without resistance the direct part stays
    assert dc_worst(1e6, 1.0, 0.0, 1.0, 50.0) == math.sqrt(2)


def exact_i2t(t_to: float, r: float, x: float, angle: float) -> Any:
    """Integral of (i / (sqrt(2) rms))^2, multiplied out, by the textbook form."""
    t, r, x, angle = map(mp.mpf, (t_to, r, x, angle))
    alpha, phi, w = angle * mp.pi / 180, mp.atan2(x, r), 2 * mp.pi * mp.mpf(FREQUENCY)
    b = alpha - phi
    steady = t / 2 - (mp.sin(2 * w * t + 2 * b) - mp.sin(2 * b)) / (4 * w)
    if not x:
        return steady
    g = w * r / x
    mixed = (
        g * mp.sin(b) + w * mp.cos(b)
        - mp.exp(-g * t) * (g * mp.sin(w * t + b) + w * mp.cos(w * t + b))
    ) / (g * g + w * w)  # fmt: skip
    gone = (1 - mp.exp(-2 * g * t)) / (2 * g) if g else t
    return steady - 2 * mp.sin(b) * mixed + mp.sin(b) ** 2 * gone


@pytest.mark.parametrize(("r", "x"), CIRCUITS)
@pytest.mark.parametrize("angle", ANGLES)
def test_i2t(r: float, x: float, angle: float) -> None:
    for t_to in [10.0**p for p in range(-12, 4)] + [0.005, 0.0094, 0.0096, 0.02, 0.05]:
        expected = exact_i2t(t_to, r, x, angle) * 2 * 1000.0**2
        assert abs(fault_i2t(1000.0, r, x, FREQUENCY, angle, t_to) / expected - 1) < 1e-13


def test_i2t_is_the_integral_of_the_current() -> None:
    for t_to in (0.003, 0.03):
        expected, _ = quad(
            lambda t: fault_current(t, 8000.0, 0.1, 0.7, 60.0, 12.0) ** 2, 0, t_to,
            epsrel=1e-11, limit=200,
        )  # fmt: skip
        assert fault_i2t(8000.0, 0.1, 0.7, 60.0, 12.0, t_to) == pytest.approx(expected, rel=1e-10)


def test_i2t_of_a_column_equals_single_calls() -> None:
    t_to = np.geomspace(1e-6, 10, 40)
    r = np.array([[0.0], [0.2], [1.0]])
    together = fault_i2t(1.0, r, 1.0, 50.0, 30.0, t_to)
    alone = [[fault_i2t(1.0, a, 1.0, 50.0, 30.0, b) for b in t_to] for a in r.ravel()]
    np.testing.assert_allclose(together, alone, rtol=1e-15)


RATIOS = [0.0, 1e-300, 1e-9, 1e-4, 0.01, 0.05, 0.1, 0.3, 0.6366, 1.0, 2.0, 10.0, 1e6, 1e300]


@pytest.mark.parametrize("ratio", RATIOS)
def test_peak_factor_is_the_maximum(ratio: float) -> None:
    k = mp.mpf(ratio)

    def slope(u: Any) -> Any:
        return mp.sin(u) + k * mp.cos(u) - k * mp.exp(-k * u)

    low, high = mp.pi / 2, mp.pi
    for _ in range(180):
        middle = (low + high) / 2
        low, high = (middle, high) if slope(middle) > 0 else (low, middle)
    expected = mp.sqrt(1 - 2 * mp.cos(low) * mp.exp(-k * low) + mp.exp(-2 * k * low))
    assert abs(peak_factor(ratio, 1.0) / expected - 1) < 4e-16


@pytest.mark.parametrize("ratio", [0.0, 0.02, 0.2, 0.7, 3.0])
def test_no_closing_angle_and_time_give_a_higher_first_peak(ratio: float) -> None:
    """Searched on the current itself: over time by a grid, over angles by a fine scan."""
    times = np.linspace(0, 0.02, 4001)
    best = 0.0
    for angle in np.arange(-180.0, 180.0, 2.0):
        best = max(best, float(np.abs(fault_current(times, 1.0, ratio, 1.0, 50.0, angle)).max()))
    factor = peak_factor(ratio, 1.0) * math.sqrt(2)
    assert best <= factor * (1 + 1e-12)
    assert best > factor * (1 - 1e-3)

    def lowest(angle: float) -> float:
        return -float(np.abs(fault_current(times, 1.0, ratio, 1.0, 50.0, angle)).max())

    angles = np.arange(-180.0, 0.0, 5.0)
    start = float(angles[np.argmin([lowest(a) for a in angles])])
    found = minimize_scalar(lowest, bounds=(start - 5, start + 5), method="bounded")
    assert -found.fun == pytest.approx(factor, rel=1e-6)


def test_peak_factor_at_its_ends() -> None:
    assert peak_factor(0.0, 0.4) == 2.0
    assert peak_factor(0.4, 0.0) == 1.0
    factors = peak_factor(np.geomspace(1e-6, 1e6, 200), 1.0)
    assert np.all(np.diff(factors) <= 0)


@pytest.mark.parametrize(
    ("name", "arguments"),
    [
        ("FO_FAULT_CURRENT", (0.01, 1.0, 0.0, 0.0, 50.0, 0.0)),
        ("FO_DC_OFFSET", (0.01, 1.0, 0.0, 0.0, 50.0, 0.0)),
        ("FO_DC_WORST", (0.01, 1.0, 0.0, 0.0, 50.0)),
        ("FO_PEAK_FACTOR", (0.0, 0.0)),
        ("FO_FAULT_I2T", (1.0, 0.0, 0.0, 50.0, 0.0, 0.01)),
        ("FO_FAULT_I2T", (1.0, 0.0, 0.0, 50.0, 0.0, 10.0)),
    ],
)
def test_a_circuit_of_nothing_is_refused(name: str, arguments: tuple[float, ...]) -> None:
    with pytest.raises(DomainError, match="resistance and reactance are both 0"):
        CATALOGUE[name].function(*arguments)
