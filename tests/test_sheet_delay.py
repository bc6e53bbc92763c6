"""The calc sheet `delay`: Kirchhoff's law integrated, both reviewer's cases, each check failing."""

from __future__ import annotations

import math
import random
import re
from typing import Any

import pytest
from filled import Filled
from scipy.integrate import solve_ivp
from scipy.special import lambertw

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["delay"]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("delay"))


def same(symbol: str, value: float) -> dict[str, float]:
    """An input without a tolerance, given in volts and the like."""
    return {f"{kind}_of_{symbol}": value for kind in ("value", "lowest", "highest")}


def crossing(
    r: float,
    c: float,
    v: float,
    level: float,
    ramp: float,
    i: float = 0.0,
    leak: float = 0.0,
    start: float = 0.0,
) -> float:
    """Time to the level: C du/dt = (v(t) - u) / R - u leak / 50 V - i(t), the rise and after it."""

    def slope(t: float, u: Any) -> Any:
        share = min(t / ramp, 1.0) if ramp else 1.0
        return ((v * share - u) / r - u * leak / 50 - i * share) / c

    def there(_: float, u: Any) -> float:
        return float(u[0] - level)

    there.terminal = True  # type: ignore[attr-defined]
    there.direction = 1  # type: ignore[attr-defined]
    at, u = 0.0, start
    for until in (ramp, ramp + 60 * r * c):
        if until > at:
            run = solve_ivp(slope, (at, until), (u,), "DOP853", events=there, rtol=1e-10,
                            atol=1e-12)  # fmt: skip
            if len(run.t_events[0]):
                return float(run.t_events[0][0])
            at, u = until, float(run.y[0, -1])
    return math.inf


def test_demo_against_the_circuit_integrated(demo: Filled) -> None:
    demo.put()
    nominal = crossing(1e5, 1e-6, 5, 2.8, 0.03, 0, 1e-8)
    latest = crossing(1.02e5, 1.12e-6, 4.75, 3.2, 0.03, 1e-6, 5e-8)
    earliest = crossing(0.98e5, 0.88e-6, 5.25, 2.4, 0.03, -1e-6)
    assert demo["t_switch"] == pytest.approx(nominal, rel=1e-8)
    assert demo["t_switch_max"] == pytest.approx(latest, rel=1e-8)
    assert demo["t_switch_min"] == pytest.approx(earliest, rel=1e-8)
    assert demo["t_after"] == pytest.approx(earliest - 0.03, rel=1e-8)
    soon = crossing(0.98e5, 0.88e-6, 5.25, 2.4, 0.005, -1e-6)
    assert demo["t_soon"] == pytest.approx(soon, rel=1e-8)
    assert demo["t_switch_max"] == pytest.approx(148.6e-3, abs=5e-5)
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == {"supply_not_short_against_tau"}


def test_demo_by_hand(demo: Filled) -> None:
    """Thevenin and the natural response, worked out by hand."""
    demo.put()
    assert demo["V_fin"] == pytest.approx(5 / (1 + 1e5 * 1e-8 / 50), rel=1e-14)
    assert demo["tau"] == pytest.approx(0.1 / (1 + 1e5 * 1e-8 / 50), rel=1e-14)
    least = (4.75 - 0.102) / (1 + 1.02e5 * 5e-8 / 50)
    assert demo["V_least"] == pytest.approx(least, rel=1e-13)
    full, tau = 5.25 + 0.102, 1050 * 1.12e-6
    assert demo["V_full"] == pytest.approx(full, rel=1e-14)
    assert demo["t_reset"] == pytest.approx(tau * math.log((full - 0.75) / (1 - 0.75)), rel=1e-12)
    back = 0.75 + (full - 0.75) * math.exp(-0.01 / tau)
    assert demo["V_back"] == pytest.approx(back, rel=1e-12)
    again = crossing(0.98e5, 0.88e-6, 5.25, 2.4, 0.03, -1e-6, start=back)
    assert demo["t_again"] == pytest.approx(again - 0.03, rel=1e-8)


def test_step_of_half_takes_ln_2(demo: Filled) -> None:
    """Supply at once, no leakage, threshold at half of it: tau ln 2 (closed form)."""
    demo.put(
        **same("t_ramp", 0), **same("I_leak", 0), **same("I_in", 0), **same("V_th", 2.5),
        **same("V_sup", 5),
    )  # fmt: skip
    assert demo["t_switch"] == pytest.approx(0.1 * math.log(2), rel=1e-14)
    assert demo["t_switch"] == demo["t_step"]
    assert demo["check_agreement"] == "PASS"


@pytest.mark.parametrize("ramp", [0.0, 1e-6, 0.01, 1.0, 20.0, 400.0, 4e4])
def test_both_ways_agree_for_any_rise(demo: Filled, ramp: float) -> None:
    """During the rise also by Lambert's W (scipy): s = 1 + q + W(-exp(-1 - q)), in tau."""
    demo.put(
        **same("t_ramp", ramp), unit_of_t_ramp="s", **same("I_in", 0), **same("I_leak", 0),
        value_of_t_most=1e6, unit_of_t_most="s",
    )  # fmt: skip
    assert demo["t_switch_diff"] < 1e-11
    assert demo["t_soon_diff"] < 1e-11
    assert demo["V_rise_diff"] < 1e-9
    q = ramp / 0.1 * 2.8 / 5
    during = 0.1 * (1 + q + lambertw(-math.exp(-1 - q)).real)
    if during < ramp:
        assert demo["t_switch"] == pytest.approx(during, rel=1e-9)
    else:
        assert demo["t_switch"] == pytest.approx(crossing(1e5, 1e-6, 5, 2.8, ramp), rel=1e-8)


def test_worst_corners_hold_for_every_set_within_the_tolerances(demo: Filled) -> None:
    """Brute force, the rise included: latest, earliest after the rise, earliest of all."""
    demo.put()
    draw = random.Random(3)
    for number in range(60):
        pick = (lambda a, b: draw.choice((a, b))) if number < 30 else draw.uniform
        ramp = pick(0.005, 0.03)
        t = crossing(
            pick(0.98e5, 1.02e5), pick(0.88e-6, 1.12e-6), pick(4.75, 5.25), pick(2.4, 3.2),
            ramp, pick(-1e-6, 1e-6), pick(0, 5e-8),
        )  # fmt: skip
        assert t <= demo["t_switch_max"] * (1 + 1e-8)
        assert t - ramp >= demo["t_after"] * (1 - 1e-8)
        assert t >= demo["t_soon"] * (1 - 1e-8)


# the last column of the table of sheets: what a reviewer would send it back for


def test_supply_ramp_not_short_against_tau(demo: Filled) -> None:
    """A rise of 400 ms: the input switches while the supply still rises, 0.4 s too early."""
    demo.put(value_of_t_ramp=300, highest_of_t_ramp=400, value_of_t_most=900, value_of_t_hold=0)
    assert demo["t_after"] < 0
    assert demo["check_earliest"] == demo["verdict"] == "FAIL"
    assert {"supply_not_short_against_tau", "switches_while_the_supply_rises"} <= demo.warnings()
    assert demo["t_switch"] > 2 * demo["t_step"]
    demo.put(value_of_t_ramp=5, highest_of_t_ramp=8)
    assert "supply_not_short_against_tau" not in demo.warnings()


def test_rise_makes_a_delay_late_that_seemed_in_time(demo: Filled) -> None:
    """131 ms would be kept if the supply came at once; with the rise it is not."""
    at_once = demo.put(**same("t_ramp", 0))["t_switch_max"]
    assert at_once < 0.14
    demo.put(value_of_t_most=140)
    assert demo["check_latest"] == demo["verdict"] == "FAIL"


@pytest.mark.parametrize(
    "cells",
    [
        {"value_of_I_leak": 300, "highest_of_I_leak": 400, "unit_of_I_leak": "uA",
         "lowest_of_I_leak": 0},
        {"highest_of_I_in": 20},
        {"highest_of_V_th": 4.7},
    ],
    ids=["leakage", "input current", "threshold"],
)  # fmt: skip
def test_leakage_that_keeps_it_below_the_threshold(demo: Filled, cells: dict[str, Any]) -> None:
    """400 uA at 50 V are 125 kohm: the divider with 102 kohm leaves 2.6 V of 4.75 V."""
    demo.put(**cells)
    assert demo["check_level"] == demo["check_latest"] == demo["verdict"] == "FAIL"
    assert isinstance(demo["t_switch_max"], ErrorKind)
    assert "never_switches" in demo.warnings()


def test_input_current_beyond_the_supply(demo: Filled) -> None:
    demo.put(value_of_I_in=80, highest_of_I_in=90)
    assert demo["V_fin"] < 0
    assert isinstance(demo["t_switch"], ErrorKind)
    assert isinstance(demo["t_switch_hand"], ErrorKind)
    assert demo["verdict"] == "FAIL"


def test_current_out_of_the_input_raises_the_final_value(demo: Filled) -> None:
    demo.put(**same("I_in", -10), **same("I_leak", 0))
    assert demo["V_least"] == pytest.approx(4.75 + 0.98, rel=1e-12)  # the lowest resistor
    assert demo["V_full"] == pytest.approx(5.25 + 1.02, rel=1e-12)


def test_other_warnings(demo: Filled) -> None:
    assert "threshold_close_to_the_final_value" in demo.put(highest_of_V_th=4.3).warnings()
    assert "slow_edge_without_hysteresis" in demo.put(value_of_V_off=2.4).warnings()


FAILING: dict[str, tuple[dict[str, Any], set[str]]] = {
    "earliest": ({"value_of_t_hold": 37}, {"earliest", "again"}),
    "latest": ({"value_of_t_most": 148}, {"latest"}),
    "reset": ({"value_of_t_dip": 3.4}, {"reset"}),
    "again": ({"value_of_t_hold": 27}, {"again"}),
    "level": ({"highest_of_V_th": 4.7}, {"level", "latest", "earliest"}),
}


@pytest.mark.parametrize("key", FAILING)
def test_each_check_fails_by_its_own_input(demo: Filled, key: str) -> None:
    cells, failing = FAILING[key]
    demo.put(**cells)
    assert {name for name, word in demo.checks().items() if word != "PASS"} == failing
    assert demo["verdict"] == "FAIL"


def test_discharge_that_stops_above_the_reset_level_fails(demo: Filled) -> None:
    """A diode's drop of 1.1 V above a supply that collapses to 0: never below 1 V."""
    demo.put(highest_of_V_dis=1.1)
    assert isinstance(demo["t_reset"], ErrorKind)
    assert isinstance(demo["t_reset_hand"], ErrorKind)
    assert demo["check_reset"] == demo["verdict"] == "FAIL"


def test_loss_so_short_that_the_input_never_falls_back(demo: Filled) -> None:
    demo.put(value_of_t_dip=0.1)
    assert demo["V_back"] > 2.4
    assert isinstance(demo["t_again"], ErrorKind)
    assert demo["check_again"] == demo["check_reset"] == demo["verdict"] == "FAIL"


def test_slips_are_refused(demo: Filled) -> None:
    demo.put(value_of_V_off=2.5)
    assert demo["remark_on_V_off"].startswith("V_off is above the lowest V_th")
    demo.put(value_of_t_most=35)
    assert demo["remark_on_t_most"].startswith("t_most leaves no room")


def test_lowest_final_value_where_the_input_gives_current_and_the_capacitor_leaks(
    demo: Filled,
) -> None:
    """Kirchhoff at rest: (V - u) / R = u leak / 50 V + I, for the lowest and highest resistor."""
    demo.put(
        value_of_I_in=-10, lowest_of_I_in=-12, highest_of_I_in=-8, value_of_I_leak=20,
        highest_of_I_leak=40, unit_of_I_leak="uA",
    )  # fmt: skip
    levels = [(4.75 / r + 8e-6) / (1 / r + 40e-6 / 50) for r in (0.98e5, 1.02e5)]
    assert demo["V_least"] == pytest.approx(min(levels), rel=1e-12)
    demo.put(
        value_of_I_in=-60, lowest_of_I_in=-70, highest_of_I_in=-50, value_of_I_leak=1,
        highest_of_I_leak=2, unit_of_I_leak="uA",
    )  # fmt: skip
    levels = [(4.75 / r + 50e-6) / (1 / r + 2e-6 / 50) for r in (0.98e5, 1.02e5)]
    assert levels[0] < levels[1]
    assert demo["V_least"] == pytest.approx(levels[0], rel=1e-12)
    assert demo["V_least_hand"] == pytest.approx(levels[0], rel=1e-12)


def test_curve_follows_the_circuit(demo: Filled) -> None:
    """Both lines against the closed form of a ramp's response, after the rise."""
    demo.put()
    curve = demo.values["Curve"]
    slow_final = 1 / (1 + 1.02e5 * 5e-8 / 50)
    lines = (
        ("C", 1.02e5 * 1.12e-6 * slow_final, (4.75 - 0.102) * slow_final),
        ("D", 0.98e5 * 0.88e-6, 5.25 + 0.098),
    )
    later = [cell for cell in curve if re.fullmatch(r"A\d+", cell) and curve[cell] > 0.03]
    assert max(curve[cell] for cell in later) > 0.24
    for cell in later:
        for column, tau, final in lines:
            behind = tau / 0.03 * (math.exp(0.03 / tau) - 1) * math.exp(-curve[cell] / tau)
            assert curve[f"{column}{cell[1:]}"] == pytest.approx(final * (1 - behind), rel=1e-9)
