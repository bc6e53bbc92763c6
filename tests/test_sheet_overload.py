"""The calc sheet `overload`: trip and cooling times against mpmath and the heat's own equation."""

from __future__ import annotations

import itertools
import math
from typing import Any

import mpmath
import numpy as np
import pytest
from filled import Filled
from scipy import integrate

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["overload"]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("overload"))


def trip(pickup: float, tau: float, prior: float, current: float) -> float:
    """Hot curve of IEC 60255-149 (cold with prior 0), from memory, at 50 digits."""
    with mpmath.workdps(50):
        k, p, i = map(mpmath.mpf, (pickup, prior, current))
        return float(tau * mpmath.log((i**2 - p**2) / (i**2 - k**2)))


def pickup(factor: float, ambient: float) -> float:
    """Setting 198 A; limit 155, reference 40 degC."""
    return factor * 198 * math.sqrt((155 - ambient) / (155 - 40))


LOW, HIGH = pickup(1.045, 45), pickup(1.155, 15)


def test_demo_agrees_with_hand_calculation(demo: Filled) -> None:
    demo.put()
    assert demo["I_pick"] == pytest.approx(pickup(1.1, 30), rel=1e-14)
    expected = {
        "t_cold": trip(pickup(1.1, 30), 420, 0, 317),
        "t_hot": trip(pickup(1.1, 30), 420, 150, 317),
        "t_cold_max": trip(HIGH, 441, 0, 310),
        "t_hot_min": trip(LOW, 399, 170, 325),
        "t_run": trip(LOW, 399, 170, 1045),
        "t_stall": trip(HIGH, 441, 0, 920),
        "t_stall_hot": trip(HIGH, 441, 198, 920),
        "T_pick": 45 + 80 * (pickup(1.155, 45) / 198) ** 2,
    }
    for name, value in expected.items():
        assert demo[name] == pytest.approx(value, rel=1e-12), name
    assert set(demo.checks().values()) == {"PASS"}
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == set()
    assert demo["t_cold_highest_corner"] == (
        "k_pick highest, T_amb lowest, tau_heat highest, I_act lowest"
    )


def test_heat_reaches_the_trip_when_the_sheet_says(demo: Filled) -> None:
    """tau dH/dt = I^2 - H, solved step by step; after the trip the motor is at rest."""
    demo.put()
    squared, limit = 317.0**2, demo["I_pick"] ** 2

    def heat(tau: float, source: float, begin: float, until: float) -> float:
        solved = integrate.solve_ivp(
            lambda _t, h: (source - h) / tau, (0, until), [begin], rtol=1e-11, atol=1e-6
        )
        return float(solved.y[0, -1])

    assert heat(420, squared, 0, demo["t_cold"]) == pytest.approx(limit, rel=1e-8)
    assert heat(420, squared, 150.0**2, demo["t_hot"]) == pytest.approx(limit, rel=1e-8)
    # cool from the trip, then start: the start just reaches the trip again
    cooled = heat(1680, 0.0, limit, demo["t_restart"])
    assert cooled / limit == pytest.approx(demo["q_ok"], rel=1e-8)
    assert heat(420, 990.0**2, cooled, 2.5) == pytest.approx(limit, rel=1e-8)


@pytest.mark.parametrize(
    "cells",
    [{}, {"value_of_corrected": "no"}, {"value_of_I_before": 190, "value_of_t_prior": 3},
     {"value_of_t_start": 6, "lowest_of_tau_cool": -50}],
    ids=["demo", "not corrected", "heavier before", "long start"],
)  # fmt: skip
def test_worst_cases_against_a_grid(demo: Filled, cells: dict[str, Any]) -> None:
    """No point of a grid over all parts lies outside what the corners say."""
    demo.put(**cells)

    def ends(symbol: str, number: int = 4) -> Any:
        return np.linspace(demo[f"{symbol}_lo"], demo[f"{symbol}_hi"], number)

    cold, hot, restart = [], [], []
    for factor, ambient, tau in itertools.product(ends("k_pick"), ends("T_amb"), ends("tau_heat")):
        k = pickup(factor, ambient) if demo["corrected"] == "yes" else factor * 198
        for current in ends("I_act"):
            cold.append(tau * math.log(current**2 / (current**2 - k**2)))
            for prior in ends("I_prior"):
                # whatever the heat's true course: it lies between that of prior and of before
                left = max(0.0, demo["I_before"] ** 2 - prior**2)
                squared = prior**2 + left * math.exp(-demo["t_prior"] / tau)
                hot.append(
                    tau * math.log((current**2 - squared) / (current**2 - k**2))
                    if squared < k**2
                    else 0.0
                )
        for cooling, start in itertools.product(ends("tau_cool", 2), ends("I_start")):
            grown = math.exp(demo["t_start"] / tau)
            share = (start / k) ** 2 - ((start / k) ** 2 - 1) * grown
            restart.append(cooling * math.log(1 / share) if share > 0 else math.inf)
    assert demo["t_cold_max"] == pytest.approx(max(cold), rel=1e-12)
    assert demo["t_hot_min"] <= min(hot) * (1 + 1e-12)
    if math.isinf(max(restart)):
        assert isinstance(demo["t_restart_max"], ErrorKind)
        assert demo["check_restart"] == "FAIL"
    else:
        assert demo["t_restart_max"] == pytest.approx(max(restart), rel=1e-10)
    if not cells:
        assert demo["t_hot_min"] == pytest.approx(min(hot), rel=1e-12)


@pytest.mark.parametrize(("seconds", "least"), [(10, 4), (20, 6), (30, 9)])
def test_against_the_trip_classes_of_iec_60947_4_1(
    demo: Filled, seconds: float, least: float
) -> None:
    """At 7.2 x the setting from cold: class 10 trips in 4 to 10 s, 20 in 6 to 20, 30 in 9 to 30.

    A time constant just short enough for the class's longest time keeps its shortest, too.
    """
    tau = 0.98 * seconds * (7.2 / 1.1) ** 2
    demo.put(
        value_of_tau_heat=tau, unit_of_tau_heat="s", lowest_of_tau_heat=0, highest_of_tau_heat=0,
        value_of_k_pick=1.1, lowest_of_k_pick=1.1, highest_of_k_pick=1.1,
        value_of_corrected="no", value_of_I_start=7.2 * 198,
        lowest_of_I_start=7.2 * 198, highest_of_I_start=7.2 * 198, value_of_t_lock_cold=seconds,
        value_of_t_lock_hot=seconds,
    )  # fmt: skip
    assert least < demo["t_stall"] < seconds
    assert demo["check_lock_cold"] == "PASS"


FAILING: dict[str, dict[str, Any]] = {
    "trip": {"value_of_t_most": 7.9},
    "duty": {"value_of_t_duty": 69},
    "start": {"value_of_t_start": 4.6},
    "lock_cold": {"value_of_t_lock_cold": 34},
    "lock_hot": {"value_of_t_lock_hot": 13},
    "restart": {"value_of_t_wait": 5.5},
    "winding": {"value_of_T_limit": 146, "value_of_corrected": "no"},
    "rated": {"value_of_I_rated": 203},
}


@pytest.mark.parametrize("key", FAILING)
def test_each_check_fails_beyond_its_limit(demo: Filled, key: str) -> None:
    demo.put(**FAILING[key])
    assert {k for k, result in demo.checks().items() if result == "FAIL"} == {key}
    assert demo["verdict"] == "FAIL"


# the last column of the table of sheets: what a reviewer would send it back for


def test_cooling_time_constant_taken_equal_to_heating(demo: Filled) -> None:
    honest = demo.put()["t_restart"]
    assert demo["t_same"] == pytest.approx(honest / 4, rel=1e-12)  # 28 min and 7 min
    demo.put(value_of_tau_cool=7)
    assert "cooling_taken_as_heating" in demo.warnings()
    assert demo["t_restart"] == pytest.approx(honest / 4, rel=1e-12)
    assert "hardly longer" in str(list(demo.values["Calc sheet"].values()))


def test_earlier_load_not_in_equilibrium(demo: Filled) -> None:
    """The least trip time possible is taken, and a warning says that it is not the true one."""
    settled = demo.put()["t_hot_min"]
    demo.put(value_of_t_prior=10)
    assert "earlier_load_not_in_equilibrium" in demo.warnings()
    assert demo["t_hot_min"] == settled
    true = 170 * math.sqrt(1 - math.exp(-600 / 399))  # the heat really reached from cold
    assert settled < trip(LOW, 399, true, 325)
    demo.put(value_of_t_prior=10, value_of_I_before=195)
    assert demo["t_hot_min"] < settled
    left = math.sqrt(170**2 + (195**2 - 170**2) * math.exp(-600 / 441))
    assert demo["I_hot_hi"] == pytest.approx(left, rel=1e-12)
    assert "earlier_load_not_in_equilibrium" not in demo.put(value_of_t_prior=23).warnings()


def test_locked_rotor_at_low_voltage_takes_longest(demo: Filled) -> None:
    assert demo.put(lowest_of_I_start=800)["check_lock_cold"] == "FAIL"


def test_ambient_not_corrected(demo: Filled) -> None:
    demo.put(value_of_corrected="no")
    assert "ambient_not_corrected" in demo.warnings()
    assert demo["T_pick"] == pytest.approx(45 + 80 * 1.155**2, rel=1e-12)
    # a cold motor behind a correcting relay bears more, a hot one less
    assert demo.put(highest_of_T_amb=60)["check_rated"] == "FAIL"


@pytest.mark.parametrize(
    ("name", "cells"),
    [
        ("set_above_rated", {"value_of_I_set": 200}),
        ("hot_start_has_little_room", {"value_of_t_start": 4}),
    ],
)
def test_named_warnings(demo: Filled, name: str, cells: dict[str, Any]) -> None:
    assert name in demo.put(**cells).warnings()


def test_overload_that_never_trips_fails(demo: Filled) -> None:
    """At or below the highest pick-up there is no latest trip; the reason stands on the page."""
    demo.put(value_of_I_act=253, lowest_of_I_act=250, highest_of_I_act=260)
    assert isinstance(demo["t_cold_max"], ErrorKind)
    assert demo["check_trip"] == demo["verdict"] == "FAIL"
    demo.put(value_of_I_act=220, lowest_of_I_act=220, highest_of_I_act=220)
    assert isinstance(demo["t_cold"], ErrorKind)
    assert "never trips" in str(list(demo.values["Calc sheet"].values()))


def test_earlier_load_above_an_overload_that_never_trips(demo: Filled) -> None:
    """Both differences of squares are negative, their ratio is not: still no trip time."""
    demo.put(
        value_of_I_act=180, lowest_of_I_act=180, highest_of_I_act=180,
        value_of_I_prior=190, highest_of_I_prior=190,
    )  # fmt: skip
    assert isinstance(demo["t_hot"], ErrorKind)
    assert isinstance(demo["t_hot_hand"], ErrorKind)
    assert demo["check_duty"] == demo["check_trip"] == "FAIL"


def test_start_below_the_pickup_needs_no_pause(demo: Filled) -> None:
    demo.put(value_of_I_set=5000)
    assert demo["t_restart"] == demo["t_restart_hand"] == 0
    assert demo["verdict"] == "FAIL"


def test_start_that_not_even_a_cold_motor_survives_fails(demo: Filled) -> None:
    demo.put(
        value_of_t_start=20, value_of_t_lock_hot=30, value_of_I_start=1150, highest_of_I_start=1200
    )
    assert demo["q_ok"] < 0
    assert isinstance(demo["t_restart"], ErrorKind)
    assert demo["check_restart"] == demo["verdict"] == "FAIL"


def test_load_above_pickup_has_tripped_already(demo: Filled) -> None:
    demo.put(highest_of_I_prior=210)
    assert demo["t_hot_min"] == demo["t_run"] == 0
    assert demo["check_duty"] == demo["check_start"] == "FAIL"


@pytest.mark.parametrize(
    ("cells", "symbol"),
    [
        ({"lowest_of_I_start": 290}, "I_start"),
        ({"value_of_t_start": 21}, "t_start"),
        ({"value_of_t_lock_hot": 41}, "t_lock_hot"),
        ({"value_of_T_ref": 75, "value_of_T_limit": 80}, "T_ref"),
    ],
)
def test_inputs_that_contradict_each_other(
    demo: Filled, cells: dict[str, Any], symbol: str
) -> None:
    demo.put(**cells)
    assert demo["verdict"] == "FAIL"
    assert demo.state(symbol) == "AT FAULT"
