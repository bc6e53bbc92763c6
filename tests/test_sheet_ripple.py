"""The calc sheet `ripple`: its numbers against step-by-step switching, its limits, its warnings."""

from __future__ import annotations

import itertools
import math
from typing import Any

import pytest
from filled import Filled

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["ripple"]

MAGNET: dict[str, Any] = {
    "value_of_circuit": "R-L",
    "value_of_reverse": "no",
    "value_of_V_low": -1,
    "lowest_of_V_low": -1.2,
    "highest_of_V_low": -0.6,
    "value_of_V_high": 230,
    "lowest_of_V_high": 215,
    "highest_of_V_high": 240,
    "value_of_f_sw": 0.4,
    "value_of_R_ser": 0.2e-3,
    "value_of_R_load": 4e-6,
    "value_of_L_out": 400,
    "lowest_of_L_out": -10,
    "highest_of_L_out": 10,
    "value_of_I_top": 75,
    "value_of_I_bottom": 1,
    "value_of_I_pp": 0.6,
    "value_of_k_loss": 10,
    "value_of_t_ok": 1000,
}
"""The lifting magnet: 4 ohm and 0.4 H on a chopper of 400 Hz with a free-wheeling diode."""


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("ripple"))


def switched(
    tau: float, low: float, high: float, period: float, duty: float
) -> tuple[float, float]:
    """Lowest and highest of the settled response, by switching until nothing changes."""
    y = duty * high + (1 - duty) * low
    top = y
    for _ in range(100_000):
        top = high + (y - high) * math.exp(-duty * period / tau)
        after = low + (top - low) * math.exp(-(1 - duty) * period / tau)
        if abs(after - y) <= 1e-15 * max(abs(high), abs(low)):
            break
        y = after
    return y, top


def test_demo_against_step_by_step_switching(demo: Filled) -> None:
    """And by hand: k = 1/1.01, tau = 9.901 ms, about 10 V x 0.2 ms / 4 tau at 50 %."""
    demo.put()
    k, tau = 1 / 1.01, 1e4 / 1.01 * 1e-6
    low, high = switched(tau, 0.0, 10 * k, 2e-4, 0.5)
    assert demo["tau"] == pytest.approx(tau, rel=1e-14)
    assert demo["V_min"] == pytest.approx(low, rel=1e-11)
    assert demo["V_max"] == pytest.approx(high, rel=1e-11)
    assert demo["V_rip"] == pytest.approx(10 * k * 2e-4 / 4 / tau, rel=1e-4)
    assert demo["V_mean"] == pytest.approx(5 * k, rel=1e-14)
    assert demo["k_drop"] == pytest.approx(10.1e3 / (10.1e3 + 0.8e6), rel=1e-13)
    slow = 10.1e3 * 1.2e6 / (10.1e3 + 1.2e6) * 1.1e-6
    assert demo["t_set"] == pytest.approx(slow * math.log(100), rel=1e-13)
    assert demo["verdict"] == "PASS"
    assert set(demo.checks().values()) == {"PASS"}


def test_worst_ripple_against_brute_force(demo: Filled) -> None:
    """Every corner and 81 duties from 10 to 90 %: the greatest is at 50 %, inside the range."""
    demo.put()
    found = 0.0
    for r, load, c, f in itertools.product((9.9e3, 10.1e3), (0.8e6, 1.2e6), (0.9e-6, 1.1e-6),
                                           (4900, 5100)):  # fmt: skip
        k, tau = load / (r + load), r * load / (r + load) * c
        for percent in range(10, 91):
            a, b = (math.exp(-d / f / tau) for d in (percent / 100, 1 - percent / 100))
            found = max(found, 10 * k * (1 - a) * (1 - b) / (1 - a * b))
    assert demo["k_pp_max"] == pytest.approx(found / 0.1, rel=1e-11)
    assert demo["d_worst"] == 0.5
    assert "d_on at its inner extreme" in demo["k_pp_highest_corner"]
    assert demo["k_swing"] == pytest.approx(found / 0.1 * 1.01, rel=1e-11)


def test_extremes_are_on_the_safe_side_of_brute_force(demo: Filled) -> None:
    demo.put()
    tops, dips = [], []
    for r, load, c, f in itertools.product((9.9e3, 10.1e3), (0.8e6, 1.2e6), (0.9e-6, 1.1e-6),
                                           (4900, 5100)):  # fmt: skip
        k, tau = load / (r + load), r * load / (r + load) * c
        tops.append(switched(tau, 0.05 * k, 10.1 * k, 1 / f, 0.9)[1])
        dips.append(switched(tau, 0.0, 9.9 * k, 1 / f, 0.1)[0])
    assert 0 <= demo["k_top"] - (max(tops) - 0.5) / 9 < 1e-3
    assert 0 <= (min(dips) - 0.5) / 9 - demo["k_bottom"] < 1e-3


def test_inductor_in_series_against_step_by_step_switching(demo: Filled) -> None:
    """A diode carries the current on; it never stops, so the results hold."""
    demo.put(**MAGNET)
    low, high = switched(0.4 / 4.2, -1.0, 230.0, 1 / 400, 0.5)
    assert demo["tau"] == pytest.approx(0.4 / 4.2, rel=1e-13)
    assert demo["V_min"] == pytest.approx(low * 4 / 4.2, rel=1e-11)
    assert demo["V_max"] == pytest.approx(high * 4 / 4.2, rel=1e-11)
    assert demo["I_mean"] == pytest.approx(114.5 / 4.2, rel=1e-12)
    # the shortest tau, 0.36 H / (0.202 + 4.8) ohm, 392 Hz, 10 %, lowest levels
    least = switched(0.36 / 5.002, -1.2, 215.0, 1 / 392, 0.1)[0] / 5.002
    assert demo["I_least"] == pytest.approx(least, rel=1e-9)
    assert (demo["verdict"], demo.state("C_out")) == ("PASS", "not used")
    stops = demo.put(**MAGNET | {"value_of_L_out": 1})
    assert stops["I_least"] < 0
    assert (stops["verdict"], stops["check_ripple"]) == ("FAIL", "FAIL")
    assert isinstance(stops["V_rip"], ErrorKind)


@pytest.mark.parametrize(
    ("key", "value"), [("I_top", 20), ("I_bottom", 20), ("I_pp", 0.2)]
)  # fmt: skip
def test_limits_of_the_current_decide_with_an_inductor(
    demo: Filled, key: str, value: float
) -> None:
    failing = {"I_top": "top", "I_bottom": "bottom", "I_pp": "ripple"}[key]
    demo.put(**MAGNET | {f"value_of_{key}": value})
    assert {name for name, word in demo.checks().items() if word == "FAIL"} == {failing}


@pytest.mark.parametrize(
    ("cells", "failing"),
    [
        ({"value_of_V_top": 9.0}, "top"),
        ({"value_of_V_bottom": 1.0}, "bottom"),
        ({"value_of_V_pp": 50}, "ripple"),
        ({"value_of_k_loss": 1}, "mean"),
        ({"value_of_t_ok": 50}, "settling"),
    ],
)
def test_each_check_fails_by_its_own_limit(
    demo: Filled, cells: dict[str, float], failing: str
) -> None:
    demo.put(**cells)
    assert {key for key, word in demo.checks().items() if word == "FAIL"} == {failing}
    assert demo["verdict"] == "FAIL"


def test_a_current_that_cannot_reverse_gives_no_result(demo: Filled) -> None:
    """With a diode the capacitor cannot flow back into the drive: conduction stops."""
    demo.put(value_of_reverse="no")
    assert demo["I_least"] < 0
    assert "current_that_cannot_reverse" in demo.warnings()
    for name in ("V_max", "V_min", "V_rip", "V_mean", "t_set", "k_pp_max"):
        assert isinstance(demo[name], ErrorKind), name
    assert demo["verdict"] == "FAIL"
    assert demo.checks()["ripple"] == "FAIL"


def test_close_to_losing_conduction_and_hardly_averaged(demo: Filled) -> None:
    assert demo.put().warnings() == {"worst_duty_inside_the_range"}
    assert "hardly_averaged" in demo.put(value_of_f_sw=0.1).warnings()
    narrow = {"value_of_d_on": 20, "lowest_of_d_on": 10, "highest_of_d_on": 30}
    assert demo.put(**narrow).warnings() == set()
    assert demo["d_worst"] == pytest.approx(0.3)
