"""The calc sheet `sampling`: its numbers by hand, the exact two-capacitor circuit, its warnings."""

from __future__ import annotations

import itertools
import math

import mpmath
import numpy as np
import pytest
from filled import Filled
from scipy.linalg import expm

from tausheet import templates

SHEET = templates.SHEETS["sampling"]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("sampling"))


def error(t: float, r: float, sw: float, c: float, stray: float, off: float) -> mpmath.mpf:
    """V_off exp(-t / tau), tau = (R_src + R_sw) C_samp + R_src C_stray, at 50 digits."""
    with mpmath.workdps(50):
        tau = (mpmath.mpf(r) + sw) * c + mpmath.mpf(r) * stray
        return off * mpmath.exp(-mpmath.mpf(t) / tau)


def test_demo_by_hand(demo: Filled) -> None:
    demo.put()
    lsb = 5 / 2**16
    off = 5 + 4e-12 / 12e-12
    assert demo["V_lsb"] == lsb
    assert demo["V_off"] == pytest.approx(off, rel=1e-15)
    assert demo["tau"] == pytest.approx(1200 * 15e-12 + 1000 * 20e-12, rel=1e-14)
    assert demo["tau_hi"] == pytest.approx((1020 + 400) * 18e-12 + 1020 * 26e-12, rel=1e-14)
    corners = [
        float(error(t, r, sw, c, stray, off) / lsb)
        for t, r, sw, c, stray in itertools.product(
            (0.99 * 0.75e-6, 1.01 * 0.75e-6),
            (980.0, 1020.0),
            (90.0, 400.0),
            (12e-12, 18e-12),
            (12e-12, 26e-12),
        )
    ]
    assert demo["e_set_max"] == pytest.approx(max(corners), rel=1e-12)
    assert demo["e_set_min"] == pytest.approx(min(corners), rel=1e-12)
    half = demo["tau_hi"] * math.log(off / (lsb / 2))
    assert demo["t_half_max"] == pytest.approx(half, rel=1e-13)
    slowest = 0.99 * 0.75e-6 / math.log(off / (0.5 * lsb))
    assert demo["R_max"] == pytest.approx((slowest - 400 * 18e-12) / (44e-12), rel=1e-12)
    assert set(demo.checks().values()) == {"PASS"}
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == {"two_capacitors"}


@pytest.mark.parametrize("bits", [8, 12, 16, 24])
def test_half_an_lsb_takes_so_many_bits_and_one_times_ln_2(demo: Filled, bits: int) -> None:
    """(N + 1) ln 2 tau from one span (common practice; handbooks of data conversion)."""
    demo.put(value_of_n_bits=bits, value_of_Q_kick=0, lowest_of_Q_kick=0, highest_of_Q_kick=0)
    assert demo["t_half"] == pytest.approx((bits + 1) * math.log(2) * demo["tau"], rel=1e-14)


def test_highest_source_resistance_is_where_the_error_meets_its_limit(demo: Filled) -> None:
    highest = demo.put()["R_max"]
    error_there = (
        error(0.99 * 0.75e-6, highest, 400.0, 18e-12, 26e-12, demo["V_off"]) / demo["V_lsb"]
    )
    assert float(error_there) == pytest.approx(0.5, rel=1e-11)


@pytest.mark.parametrize("both", [False, True])
def test_the_sum_of_time_constants_is_on_the_safe_side(both: bool) -> None:
    """The exact error of the two-capacitor circuit (scipy.linalg.expm) never exceeds the sheet's.

    From an error of the sample capacitor alone always; from one of both capacitors, the worst the
    kick-back can do, from two time constants on.
    """
    random = np.random.default_rng(6)
    for _ in range(40):
        r, sw = 1.0, 10 ** random.uniform(-2, 2)
        stray, c = 10 ** random.uniform(-2, 1), 1.0
        tau = (r + sw) * c + r * stray

        own = np.array([[-(1 / r + 1 / sw) / stray, 1 / sw / stray], [1 / sw / c, -1 / sw / c]])
        start = np.array([1.0 if both else 0.0, 1.0])
        for t in np.linspace(2.0 if both else 0.0, 20.0, 60) * tau:
            assert (expm(own * t) @ start)[1] <= math.exp(-t / tau) * (1 + 1e-9) + 1e-14


def test_slower_time_constant_by_its_roots(demo: Filled) -> None:
    """Eigenvalues of the circuit's own equations (numpy)."""
    demo.put()
    r, sw, c, stray = 1020.0, 400.0, 18e-12, 26e-12
    own = np.array([[-(1 / r + 1 / sw) / stray, 1 / sw / stray], [1 / sw / c, -1 / sw / c]])
    slowest = -1 / np.linalg.eigvals(own).max()
    assert demo["tau_slow"] == pytest.approx(slowest, rel=1e-10)
    assert demo["k_safe"] == pytest.approx(demo["tau_hi"] / slowest, rel=1e-10)


@pytest.mark.parametrize(
    ("cells", "warning"),
    [
        ({"value_of_t_acq": 0.1}, "too_early_to_tell"),
        ({"value_of_C_stray": 900, "highest_of_C_stray": 900}, "capacitor_at_the_pin"),
        ({"value_of_Q_kick": 20, "highest_of_Q_kick": 20}, "kick_back"),
    ],
)
def test_hazards_have_their_warning(demo: Filled, cells: dict[str, float], warning: str) -> None:
    assert warning not in demo.put().warnings()
    assert warning in demo.put(**cells).warnings()


def test_one_capacitor_gives_no_warning(demo: Filled) -> None:
    demo.put(value_of_C_stray=0, lowest_of_C_stray=0, highest_of_C_stray=0)
    assert demo["k_safe"] == 1
    assert demo.warnings() == set()


@pytest.mark.parametrize(
    ("cells", "failing"),
    [
        ({"value_of_t_acq": 0.6}, {"error", "half", "source"}),
        ({"value_of_e_ok": 0.04}, {"error", "source"}),
        ({"value_of_R_src": 1.4}, {"error", "half", "source"}),
        ({"value_of_e_ok": 2, "value_of_t_acq": 0.6}, {"half"}),
    ],
)
def test_each_check_fails_by_its_own_input(
    demo: Filled, cells: dict[str, float], failing: set[str]
) -> None:
    demo.put(**cells)
    assert {key for key, word in demo.checks().items() if word == "FAIL"} == failing
    assert demo["verdict"] == "FAIL"


def test_a_switch_too_slow_by_itself_leaves_no_source_resistance(demo: Filled) -> None:
    demo.put(value_of_R_sw=10e3, highest_of_R_sw=10e3)
    assert demo["check_source"] == "FAIL"
    assert not isinstance(demo["R_max"], float)
