"""Corner, gain, phase and noise bandwidth against mpmath at 50 digits."""

from __future__ import annotations

import math
from collections.abc import Iterator

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from tausheet.functions import corner_frequency, gain_db, noise_bandwidth, phase, step, tau_at
from tausheet.functions.errors import DomainError


@pytest.fixture(autouse=True, scope="module")
def digits() -> Iterator[None]:
    """Digits of the references, set back afterwards since mpmath keeps them globally."""
    with mp.workdps(50):
        yield


MAGNITUDES = st.floats(-150, 150).map(lambda e: 10.0**e)


@given(MAGNITUDES)
def test_corner_and_tau_are_inverse(value: float) -> None:
    assert abs(corner_frequency(value) * 2 * mp.pi * value - 1) < 5e-16
    assert abs(tau_at(value) * 2 * mp.pi * value - 1) < 5e-16
    assert tau_at(corner_frequency(value)) == pytest.approx(value, rel=5e-16)
    assert noise_bandwidth(value) == pytest.approx(0.25 / value, rel=1e-16)


@given(MAGNITUDES, MAGNITUDES)
def test_gain_and_phase_at_any_magnitude(frequency: float, tau: float) -> None:
    with mp.workdps(700):
        w = 2 * mp.pi * mp.mpf(frequency) * mp.mpf(tau)
        gains = {"low-pass": -10 * mp.log10(1 + w**2), "high-pass": -10 * mp.log10(1 + 1 / w**2)}
        phases = {"low-pass": -mp.degrees(mp.atan(w)), "high-pass": mp.degrees(mp.atan(1 / w))}
    for kind in ("low-pass", "high-pass"):
        error = abs(gain_db(frequency, tau, kind) - gains[kind])
        assert error <= 1e-15 * abs(gains[kind]) + mp.mpf(10) ** -300
        error = abs(phase(frequency, tau, kind) - phases[kind])
        assert error <= 1e-15 * abs(phases[kind]) + mp.mpf(10) ** -300


def test_the_product_may_leave_the_range_of_numbers() -> None:
    # 20 log10(2 pi 1e400), from the logarithms
    assert gain_db(1e200, 1e200) == pytest.approx(-20 * (400 + math.log10(2 * math.pi)), rel=1e-15)
    assert gain_db(1e-200, 1e-200, "high-pass") == pytest.approx(
        -20 * (400 - math.log10(2 * math.pi)), rel=1e-15
    )
    assert phase(1e200, 1e200) == -90.0
    assert phase(1e200, 1e200, "high-pass") == 0.0


def test_common_practice() -> None:
    tau = 0.001
    corner = corner_frequency(tau)
    assert gain_db(corner, tau) == pytest.approx(-3.0103, abs=1e-5)
    assert gain_db(corner, tau, "high-pass") == pytest.approx(-3.0103, abs=1e-5)
    assert phase(corner, tau) == pytest.approx(-45.0, rel=1e-15)
    # 20 dB per decade far above the corner
    fall = gain_db(1e4 * corner, tau) - gain_db(1e5 * corner, tau)
    assert fall == pytest.approx(20.0, abs=1e-7)
    # f_c x t_r = 0.35
    rise = tau * math.log(9)
    assert corner * rise == pytest.approx(0.35, abs=0.0005)


def test_at_frequency_zero() -> None:
    assert gain_db(0.0, 1.0) == 0.0
    assert math.copysign(1.0, gain_db(0.0, 1.0)) == 1.0
    assert phase(0.0, 1.0) == 0.0
    assert phase(0.0, 1.0, "high-pass") == 90.0
    with pytest.raises(DomainError, match="frequency is 0, at which a high-pass lets nothing"):
        gain_db(0.0, 1.0, "high-pass")


def test_a_corner_beyond_the_range_of_numbers() -> None:
    for function in (corner_frequency, tau_at, noise_bandwidth):
        with pytest.raises(DomainError, match="beyond the range of numbers"):
            function(1e-310)


def test_noise_bandwidth_is_the_integral_of_the_power_gain() -> None:
    tau = 0.25
    total, _ = quad(lambda f: 10 ** (gain_db(f, tau) / 10), 0, np.inf, epsabs=0, epsrel=1e-10)
    assert noise_bandwidth(tau) == pytest.approx(total, rel=1e-9)


def test_gain_is_that_of_the_settled_response_to_a_sine() -> None:
    """The step response's weighting function, integrated against a sine (scipy quad)."""
    tau, frequency = 0.3, 0.8
    w = 2 * math.pi * frequency

    def weight(s: float) -> float:
        return (1.0 - step(s, tau, 0.0, 1.0)) / tau

    real, _ = quad(lambda s: weight(s) * math.cos(w * s), 0, 60 * tau, limit=500, epsabs=1e-12)
    imaginary, _ = quad(lambda s: -weight(s) * math.sin(w * s), 0, 60 * tau, limit=500,
                        epsabs=1e-12)  # fmt: skip
    assert gain_db(frequency, tau) == pytest.approx(20 * math.log10(math.hypot(real, imaginary)))
    assert phase(frequency, tau) == pytest.approx(math.degrees(math.atan2(imaginary, real)))
