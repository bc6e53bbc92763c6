"""The calc sheet `precharge`: Kirchhoff's laws integrated, and what a reviewer looks for."""

from __future__ import annotations

import itertools
import math
import random
import re
from typing import Any

import pytest
from filled import Filled
from scipy.integrate import solve_ivp

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["precharge"]
MEAN = 3 * math.sqrt(2) / math.pi
"""Mean of a six-pulse rectifier over the line voltage (closed form)."""


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("precharge"))


def charge(
    v: float, r: float, c: float, par: float, load: float, until: float, level: float = math.inf
) -> tuple[float, float]:
    """Time to a level and heat in the resistor until a time: C du/dt = (v - u)/r - u/par - load."""

    def slope(_: float, y: Any) -> list[float]:
        u = y[0]
        return [((v - u) / r - u / par - load) / c, (v - u) ** 2 / r]

    def there(_: float, y: Any) -> float:
        return float(y[0] - level)

    done = solve_ivp(slope, (0, until), (0.0, 0.0), "DOP853", events=there, rtol=1e-10, atol=1e-10)
    crossed = done.t_events[0]
    return (float(crossed[0]) if len(crossed) else math.inf), float(done.y[1, -1])


def test_demo_against_the_circuit_integrated(demo: Filled) -> None:
    demo.put()
    slow = charge(MEAN * 380, 74.8, 5.64e-3, 14.2e3, 0.1, 5, 470)[0]
    nominal = charge(MEAN * 400, 68, 4.7e-3, 14.2e3, 0.06, 5, 460)[0]
    fast = charge(MEAN * 420, 61.2, 3.76e-3, 14.2e3, 0.03, 5, 450)[0]
    assert demo["t_close"] == pytest.approx(nominal, rel=1e-7)
    assert demo["t_close_max"] == pytest.approx(slow, rel=1e-7)
    assert demo["t_close_min"] == pytest.approx(fast, rel=1e-7)
    assert demo["t_close_max"] == pytest.approx(1.1426, abs=5e-5)
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == {"second_try_on_a_shorted_bank"}


def test_demo_by_hand(demo: Filled) -> None:
    """Ohm's law and half of C V^2, worked out by hand."""
    demo.put()
    peak = math.sqrt(2) * 420
    assert demo["V_peak"] == pytest.approx(peak, rel=1e-15)
    assert demo["I_first"] == pytest.approx(peak / 61.2, rel=1e-14)
    assert demo["P_short"] == pytest.approx(peak**2 / 61.2, rel=1e-14)
    assert demo["E_short"] == pytest.approx(peak**2 / 61.2 * 1.6, rel=1e-14)
    assert demo["I_close"] == pytest.approx((peak - 450) / 0.12, rel=1e-14)
    assert demo["P_most"] == pytest.approx(demo["E_charge_max"] / 60, rel=1e-15)
    assert demo["E_allow"] == pytest.approx(0.85 * 12e3, rel=1e-15)
    assert demo["P_allow"] == pytest.approx(0.85 * 200, rel=1e-15)


def test_without_a_load_half_of_the_energy_is_lost(demo: Filled) -> None:
    """A charge through a resistor loses C V^2 / 2 (closed form), whatever the resistance."""
    none = {"value_of_I_load": 0, "lowest_of_I_load": 0, "highest_of_I_load": 0}
    for ohms in (50, 68, 90):
        demo.put(value_of_R_pre=ohms, value_of_R_par=1, unit_of_R_par="Gohm", **none)
        assert demo["E_charge"] == pytest.approx(0.5 * 4.7e-3 * 2 * 400**2, rel=1e-6)
        assert demo["V_end"] == pytest.approx(MEAN * 400, rel=1e-6)


def test_dc_supply(demo: Filled) -> None:
    demo.put(value_of_supply="d.c. supply", value_of_V_in=540)
    assert demo["k_peak"] == demo["k_mean"] == 1
    assert demo["V_peak"] == pytest.approx(567, rel=1e-15)
    expected = charge(513, 74.8, 5.64e-3, 14.2e3, 0.1, 5, 470)[0]
    assert demo["t_close_max"] == pytest.approx(expected, rel=1e-7)


def six_pulse(t: float, line: float) -> float:
    """Output of a six-pulse rectifier on a 50 Hz line: the highest of the line voltages."""
    return math.sqrt(2) * line * math.cos((t * 100 * math.pi + math.pi / 6) % (math.pi / 3)
                                          - math.pi / 6)  # fmt: skip


@pytest.mark.parametrize("level", [300.0, 470.0, 500.0])
def test_mean_for_the_time_and_peak_for_the_heat_are_on_the_safe_side(
    demo: Filled, level: float
) -> None:
    """A rectifier that blocks when the bank stands higher, in steps of 20 us.

    The phase of the ripple, 3.3 ms long, shifts the time by less than 0.2 ms either way.
    """
    r, c, step, u, t, heat, crossed = 68.0, 4.7e-3, 2e-5, 0.0, 0.0, 0.0, 0.0
    while t < 3:
        current = max(six_pulse(t, 400) - u, 0) / r
        heat += current**2 * r * step
        u += (current - u / 14.2e3 - 0.06) / c * step
        t += step
        crossed = crossed or (t if u >= level else 0.0)
    demo.put(value_of_V_close=level, lowest_of_V_close=level, highest_of_V_close=level)
    peak_would_say = charge(math.sqrt(2) * 400, r, c, 14.2e3, 0.06, 3, level)[0]
    assert peak_would_say < crossed - 2e-4
    assert crossed <= demo["t_close"] + 2e-4
    assert heat < demo["E_charge"]


def test_worst_corners_hold_for_every_set_within_the_tolerances(demo: Filled) -> None:
    """Brute force: random sets inside the limits, the circuit solved for each."""
    draw = random.Random(3)
    wide = {"highest_of_I_load": 400, "lowest_of_R_pre": -50, "highest_of_R_pre": 10}
    demo.put(**wide)
    assert demo["verdict"] == "FAIL"
    root2 = math.sqrt(2)
    times, heats = [], []
    for number in range(60):
        ends = number < 20
        pick = (lambda a, b: draw.choice((a, b))) if ends else draw.uniform
        v, r = pick(380, 420), pick(34, 74.8)
        c, load = pick(3.76e-3, 5.64e-3), pick(0.03, 0.4)
        level, out = pick(450, 470), pick(1.4, 1.6)
        times.append(charge(MEAN * v, r, c, 14.2e3, load, 4, level)[0])
        heats.append(charge(root2 * v, r, c, 14.2e3, load, out)[1])
    assert max(times) <= demo["t_close_max"] * (1 + 1e-7)
    assert demo["t_close_min"] <= min(times) * (1 + 1e-7)
    assert max(heats) <= demo["E_charge_max"] * (1 + 1e-7)
    # the bound is not far off: its own corner, solved until the time-out
    corner = charge(root2 * 420, 74.8, 5.64e-3, 14.2e3, 0.4, 1.6)[1]
    assert demo["E_charge_max"] == pytest.approx(corner, rel=1e-2)


FAILING: dict[str, tuple[dict[str, Any], set[str]]] = {
    "level": ({"value_of_I_load": 700, "highest_of_I_load": 900}, {"level", "time"}),
    "time": ({"value_of_t_out": 1.1, "lowest_of_t_out": 1.1, "highest_of_t_out": 1.2}, {"time"}),
    "first_current": ({"value_of_I_allow": 9}, {"first_current"}),
    "energy": ({"value_of_E_pulse": 1.1}, {"energy", "short"}),
    "short": ({"value_of_E_pulse": 10}, {"short"}),
    "power": ({"value_of_P_rated": 19}, {"power"}),
    "step": ({"value_of_I_step": 1.1, "unit_of_I_step": "kA"}, {"step"}),
}


@pytest.mark.parametrize("key", FAILING)
def test_each_check_fails_by_its_own_input(demo: Filled, key: str) -> None:
    cells, failing = FAILING[key]
    demo.put(**cells)
    assert key in failing
    assert {name for name, word in demo.checks().items() if word != "PASS"} == failing
    assert demo["verdict"] == "FAIL"


def test_energy_of_one_charge_is_checked_by_itself(demo: Filled) -> None:
    """1.026 kJ are taken; the limit just below and just above."""
    taken = demo.put()["E_charge_max"]
    for factor, word in ((1.0, "PASS"), (1 - 1e-9, "FAIL")):
        demo.put(value_of_E_pulse=taken * factor, unit_of_E_pulse="J", value_of_k_amb=100)
        assert demo["check_energy"] == word


# the last column of the table of sheets: what a reviewer would send it back for


def test_shorted_bank_is_held_against_the_pulse_energy(demo: Filled) -> None:
    """V^2 / R until the time-out: 594^2 / 61.2 = 5.765 kW, for 3 s 17.3 kJ."""
    demo.put(value_of_t_out=2.8, lowest_of_t_out=2.5, highest_of_t_out=3)
    assert demo["E_short"] == pytest.approx(2 * 420**2 / 61.2 * 3, rel=1e-14)
    assert demo["check_short"] == demo["verdict"] == "FAIL"
    demo.put(value_of_E_pulse=25)
    assert "second_try_on_a_shorted_bank" not in demo.warnings()


@pytest.mark.parametrize(
    "cells",
    [
        {"value_of_I_load": 1, "unit_of_I_load": "A", "highest_of_I_load": 1.2,
         "lowest_of_I_load": 0.9},
        {"value_of_R_par": 500, "unit_of_R_par": "ohm"},
        {"value_of_V_in": 370},
        {"value_of_V_close": 510, "lowest_of_V_close": 500, "highest_of_V_close": 520},
    ],
    ids=["current", "resistance", "low line", "threshold"],
)  # fmt: skip
def test_load_that_stops_the_charge_short_fails_without_a_time(
    demo: Filled, cells: dict[str, Any]
) -> None:
    demo.put(**cells)
    assert demo["check_level"] == demo["check_time"] == demo["verdict"] == "FAIL"
    assert isinstance(demo["t_close_max"], ErrorKind)
    assert "charge_stops_short_of_the_threshold" in demo.warnings()


def test_load_beyond_the_supply_gives_no_time_either(demo: Filled) -> None:
    """12 A through 68 ohm is more than the supply has: the bank heads for less than 0 V."""
    demo.put(value_of_I_load=12, unit_of_I_load="A", highest_of_I_load=13, lowest_of_I_load=11)
    assert demo["V_end"] < 0
    assert isinstance(demo["t_close"], ErrorKind)
    assert isinstance(demo["t_close_hand"], ErrorKind)
    assert demo["check_time"] == "FAIL"


def test_other_warnings(demo: Filled) -> None:
    assert (
        "threshold_close_to_the_end_of_the_charge"
        in demo.put(value_of_V_close=480, lowest_of_V_close=478, highest_of_V_close=490).warnings()
    )
    assert "threshold_far_below_the_peak" in demo.put(lowest_of_V_close=440).warnings()


def test_next_charge_before_the_time_out_is_refused(demo: Filled) -> None:
    demo.put(value_of_t_rep=1.5)
    assert demo["remark_on_t_rep"].startswith("t_rep is not above the time-out")
    assert demo["verdict"] == "FAIL"


def test_longest_time_is_monotone_in_every_part(demo: Filled) -> None:
    """Every corner by the closed form t = tau ln(V_end / (V_end - V_close))."""
    demo.put()
    times = []
    for r, c, v, level, load in itertools.product(
        (61.2, 74.8), (3.76e-3, 5.64e-3), (380, 420), (450, 470), (0.03, 0.1)
    ):
        end = (MEAN * v - load * r) * 14.2e3 / (14.2e3 + r)
        times.append(c / (1 / r + 1 / 14.2e3) * math.log(end / (end - level)))
    assert demo["t_close_max"] == pytest.approx(max(times), rel=1e-12)
    assert demo["t_close_min"] == pytest.approx(min(times), rel=1e-12)


def test_curve_follows_the_charge(demo: Filled) -> None:
    """Both lines by the closed form V_end (1 - exp(-t / tau)); 0 before switching."""
    demo.put()
    assert demo["tau_late"] == pytest.approx(5.64e-3 / (1 / 74.8 + 1 / 14.2e3), rel=1e-13)
    curve, shown = demo.values["Curve"], 0
    lines = (("C", MEAN * 380, 74.8, 5.64e-3, 0.1), ("D", MEAN * 400, 68, 4.7e-3, 0.06))
    for cell in [cell for cell in curve if re.fullmatch(r"A[1-9]\d*", cell) and int(cell[1:]) > 3]:
        t = curve[cell]
        for column, v, r, c, load in lines:
            end = (v - load * r) * 14.2e3 / (14.2e3 + r)
            there = -end * math.expm1(-t / c * (1 / r + 1 / 14.2e3)) if t > 0 else 0.0
            assert curve[f"{column}{cell[1:]}"] == pytest.approx(there, rel=1e-9, abs=1e-9)
            shown += t > 1.6
    assert shown  # well past the latest time-out
