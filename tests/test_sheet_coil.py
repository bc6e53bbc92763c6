"""The calc sheet `coil`: against integration and hand calculation, worst corners, warnings."""

from __future__ import annotations

import itertools
import math
from typing import Any

import pytest
from filled import Filled
from scipy.integrate import solve_ivp

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["coil"]
HOT, COLD = (1 + 0.00393 * (t - 20) for t in (115, -20))
RESISTOR = {"value_of_suppressor": "resistor", "value_of_R_sup": 150}


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("coil"))


def let_go(
    henry: float, start: float, ohm: float, more: float, volt: float, level: float
) -> dict[str, float]:
    """L di/dt = -((R + R_sup) i + V) until zero, energies beside it (scipy, DOP853)."""

    def rates(t: float, y: Any) -> list[float]:
        return [-((ohm + more) * y[0] + volt) / henry, more * y[0] ** 2 + volt * y[0]]

    def reached(t: float, y: Any) -> float:
        return float(y[0] - level)

    def zero(t: float, y: Any) -> float:
        return float(y[0])

    zero.terminal = True  # type: ignore[attr-defined]
    run = solve_ivp(
        rates, (0, 40 * henry / (ohm + more)), [start, 0.0], "DOP853", events=(reached, zero),
        rtol=1e-11, atol=1e-13,
    )  # fmt: skip
    return {"t": run.t_events[0][0], "E": run.y[1, -1]}


def test_copper_at_its_temperatures_against_iec_60028(demo: Filled) -> None:
    """R = R20 (1 + 0.00393 (T - 20)); 1 / 0.00393 = 234.5 + 20 (IEC 60028)."""
    demo.put()
    assert demo["R_hot"] == pytest.approx(96 * 1.05 * (234.5 + 115) / 254.5, rel=3e-4)
    assert demo["R_hot"] == pytest.approx(96 * 1.05 * HOT, rel=1e-14)
    assert demo["R_cold"] == pytest.approx(96 * 0.95 * COLD, rel=1e-14)


def test_demo_against_integration(demo: Filled) -> None:
    demo.put()
    cold = 96 * 0.95 * COLD
    slow = let_go(9.5 * 1.1, 226 / cold, cold, 0.0, 190.6, 0.25)
    assert demo["t_rel_max"] == pytest.approx(slow["t"], rel=1e-8)
    hard = let_go(9.5 * 1.1, 226 / cold, cold, 0.0, 221.1, 0.25)
    assert demo["E_take"] == pytest.approx(hard["E"], rel=1e-7)
    assert demo["P_take"] == pytest.approx(hard["E"] * 240 / 3600, rel=1e-7)
    assert demo["V_peak"] == pytest.approx(226 + 1.1 + 220, rel=1e-14)
    hot = 96 * 1.05 * HOT
    slowest = -6.6 / hot * math.log(1 - 1.0 * hot / 184)
    assert demo["t_pull_max"] == pytest.approx(slowest, rel=1e-12)
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == set()


def test_resistor_as_suppressor_against_integration(demo: Filled) -> None:
    demo.put(**RESISTOR, lowest_of_R_sup=-5, highest_of_R_sup=5)
    cold = 96 * 0.95 * COLD
    start = 226 / cold
    assert demo["V_peak"] == pytest.approx(226 + start * 157.5, rel=1e-12)
    hard = let_go(10.45, start, cold, 157.5, 0.0, 0.25)
    assert demo["E_take"] == pytest.approx(hard["E"], rel=1e-6)
    times = [
        9.5 * size / (r + 142.5) * math.log(v / r / i)
        for v, r20, t, size, i in itertools.product(
            (184, 226), (91.2, 100.8), (HOT, COLD), (0.9, 1.1), (0.25, 0.45)
        )
        for r in [r20 * t]
    ]
    assert demo["t_rel_max"] == pytest.approx(max(times), rel=1e-12)


def test_a_resistor_is_fed_by_the_supply_while_the_coil_is_on(demo: Filled) -> None:
    """V^2 / R at the highest supply and the lowest resistance, besides the energy of the coil."""
    demo.put(**RESISTOR, lowest_of_R_sup=-5, highest_of_R_sup=5)
    power = demo["E_take"] * 240 / 3600 + 226**2 / 142.5
    assert demo["P_take"] == pytest.approx(power, rel=1e-12)
    assert (demo["check_power"], demo["verdict"]) == ("FAIL", "FAIL")
    demo.put(**RESISTOR, lowest_of_R_sup=-5, highest_of_R_sup=5, value_of_P_sup=361)
    assert demo["check_power"] == "PASS"
    demo.put(**RESISTOR, lowest_of_R_sup=-5, highest_of_R_sup=5, value_of_P_sup=360)
    assert demo["check_power"] == "FAIL"
    demo.put(value_of_suppressor="diode")
    assert demo["P_stay"] == 0


def test_a_hot_coil_at_low_supply_that_never_pulls_in_fails_without_a_time(demo: Filled) -> None:
    demo.put(lowest_of_V_sup=130)
    assert (demo["check_holds"], demo["check_pull"]) == ("FAIL", "FAIL")
    assert isinstance(demo["t_pull_max"], ErrorKind)
    assert demo["verdict"] == "FAIL"
    assert demo["check_release"] == "PASS"


def test_the_closed_gap_decides_the_release_and_the_open_one_the_pull_in(demo: Filled) -> None:
    before = demo.put()["t_pull_max"], demo["t_rel_max"]
    demo.put(value_of_L_shut=19)
    assert demo["t_pull_max"] == before[0]
    assert demo["t_rel_max"] == pytest.approx(2 * before[1], rel=1e-12)
    demo.put(value_of_L_shut=6)
    assert "one_inductance_for_both_gaps" in demo.warnings()


def test_the_current_stops_at_zero_behind_a_diode(demo: Filled) -> None:
    """The curve never goes below zero, nor does the charge that the suppressor takes."""
    demo.put(value_of_I_drop=0.01, lowest_of_I_drop=0.005, highest_of_I_drop=0.02)
    assert "current_stops_at_zero" in demo.warnings()
    assert demo["t_rel_max"] < 10.45 / demo["R_cold"] * math.log(1 + 2.9403 * 76.9 / 190.6) + 0.001
    curve = demo.values["Curve"]
    drawn = [value for cell, value in curve.items() if cell.startswith("C")]
    assert min(value for value in drawn if isinstance(value, float)) == 0
    assert demo["E_take"] < demo["E_coil"]


@pytest.mark.parametrize(
    ("cells", "warning"),
    [
        ({"value_of_suppressor": "diode"}, "diode_alone"),
        ({"lowest_of_V_sup": 160}, "little_reserve_to_pull_in"),
        ({"value_of_n_op": 4, "unit_of_n_op": "1/s"}, "operates_faster_than_it_settles"),
    ],
)
def test_hazards_have_their_warning(demo: Filled, cells: dict[str, Any], warning: str) -> None:
    assert warning in demo.put(**cells).warnings()


@pytest.mark.parametrize(
    ("cells", "failing"),
    [
        ({"highest_of_I_pull": 1.35}, {"holds", "pull"}),
        ({"value_of_t_in": 60}, {"pull"}),
        ({"value_of_t_out": 90}, {"release"}),
        ({"value_of_suppressor": "diode"}, {"release"}),
        ({"value_of_V_sw": 440}, {"voltage"}),
        ({"value_of_E_sup": 27}, {"energy"}),
        ({"value_of_P_sup": 1.8}, {"power"}),
    ],
)
def test_each_check_fails_by_its_own_input(
    demo: Filled, cells: dict[str, Any], failing: set[str]
) -> None:
    demo.put(**cells)
    assert {key for key, word in demo.checks().items() if word == "FAIL"} == failing
