"""The calc sheet `filter`: the circuit integrated over the bounces, unequal paths, adding up."""

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

SHEET = templates.SHEETS["filter"]
PATTERN = ((0.8e-3, 0.6e-3), (1.2e-3, 0.4e-3), (0.5e-3, 0.9e-3), (0.3e-3, 0.2e-3))
"""The demo's bounces: in the new state for, back in the old one for."""

LIMITS = {
    "R_flt": (0.98 * 22e3, 1.02 * 22e3), "C_flt": (0.88 * 470e-9, 1.12 * 470e-9),
    "R_load": (98e3, 102e3), "V_on": (20.4, 28.8), "R_off": (0.95 * 4700, 1.05 * 4700),
    "I_in": (-1e-6, 1e-6),
}  # fmt: skip


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("filter"))


def node(x: dict[str, float], closed: bool, u: float) -> float:
    """Current into the capacitor by Kirchhoff's law at its node."""
    path = (100 if closed else x["R_off"]) + x["R_flt"]
    return ((x["V_on"] if closed else 0.0) - u) / path - u / x["R_load"] - x["I_in"]


def rest(x: dict[str, float], closed: bool) -> float:
    """The level at which no current flows into the capacitor: node() is a straight line in u."""
    at_0, at_1 = node(x, closed, 0.0), node(x, closed, 1.0)
    return at_0 / (at_0 - at_1)


def time_to(x: dict[str, float], closed: bool, level: float) -> float:
    """From the rest of the other state to a level, integrated."""

    def there(_: float, u: Any) -> float:
        return float(u[0] - level)

    there.terminal = True  # type: ignore[attr-defined]
    run = solve_ivp(
        lambda _, u: [node(x, closed, u[0]) / x["C_flt"]], (0, 1), (rest(x, not closed),),
        "DOP853", events=there, rtol=1e-10, atol=1e-12, max_step=0.01,
    )  # fmt: skip
    return float(run.t_events[0][0]) if len(run.t_events[0]) else math.inf


def reached(x: dict[str, float], closing: bool, pattern: Any = PATTERN) -> float:
    """The farthest level during the bounces, integrated from state to state."""
    u, seen = rest(x, not closing), []
    for new, old in pattern:
        for length, closed in ((new, closing), (old, not closing)):
            run = solve_ivp(
                lambda _, u, c: [node(x, c, u[0]) / x["C_flt"]], (0, length), (u,), "DOP853",
                args=(closed,), rtol=1e-9, atol=1e-12,
            )  # fmt: skip
            u = float(run.y[0, -1])
            seen.append(u)
    return max(seen) if closing else min(seen)


def test_demo_by_hand(demo: Filled) -> None:
    """Dividers, parallel resistors, 1 / (2 pi tau) and 10 log10(1 + (f / fc)^2), by hand."""
    demo.put()
    tau_on = 470e-9 / (1 / 22.1e3 + 1 / 100e3)
    tau_off = 470e-9 / (1 / 26.7e3 + 1 / 100e3)
    assert demo["tau_on"] == pytest.approx(tau_on, rel=1e-13)
    assert demo["tau_off"] == pytest.approx(tau_off, rel=1e-13)
    assert demo["f_c"] == pytest.approx(1 / (2 * math.pi * tau_on), rel=1e-13)
    assert demo["k_path"] == pytest.approx(tau_off / tau_on, rel=1e-13)
    slow = 1.12 * 470e-9 / (1 / (1.02 * 22e3 + 1.05 * 4.7e3) + 1 / 102e3)
    fast = 0.88 * 470e-9 / (1 / (0.98 * 22e3 + 100) + 1 / 98e3)
    loss = 10 * math.log10(1 + (5 * 2 * math.pi * slow) ** 2)
    assert demo["a_sig"] == pytest.approx(loss, rel=1e-11)
    stop = 10 * math.log10(1 + (2000 * 2 * math.pi * fast) ** 2)
    assert demo["a_noise"] == pytest.approx(stop, rel=1e-12)
    assert demo["t_bounce"] == pytest.approx(4.9e-3, rel=1e-13)
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == {"bounces_that_add_up"}


def test_three_decibels_at_the_corner(demo: Filled) -> None:
    """At the corner half of the power is left, 3.0103 dB (definition)."""
    corner = demo.put()["f_low"]
    demo.put(value_of_f_sig=corner)
    assert demo["a_sig"] == pytest.approx(10 * math.log10(2), rel=1e-12)
    assert demo["check_signal"] == "FAIL"


def test_times_against_the_circuit_integrated(demo: Filled) -> None:
    demo.put()
    nominal = {"R_flt": 22e3, "C_flt": 470e-9, "R_load": 100e3, "V_on": 24.0, "R_off": 4700.0}
    # the sheet leaves R_load out of the lowest start: a shade on the safe side
    against = time_to(nominal | {"I_in": 1e-6}, True, 13)
    assert against <= demo["t_close"] <= against * 1.01
    assert demo["t_open"] > time_to(nominal | {"I_in": 1e-6}, False, 8.5)
    nothing = nominal | {"I_in": 0.0}
    demo.put(value_of_I_in=0)
    assert demo["t_close"] == pytest.approx(time_to(nothing, True, 13), rel=1e-7)
    assert demo["t_open"] == pytest.approx(time_to(nothing, False, 8.5), rel=1e-7)
    slowest = {name: limits[1] for name, limits in LIMITS.items()} | {"I_in": 0.0}
    close = time_to(slowest | {"R_load": 98e3, "V_on": 20.4}, True, 14)
    open_ = time_to(slowest, False, 7.5)
    assert demo["t_close_max"] == pytest.approx(close, rel=1e-7)
    assert demo["t_open_max"] == pytest.approx(open_, rel=1e-7)
    assert demo["t_sure"] == pytest.approx(4.9e-3 + max(close, open_), rel=1e-7)


def test_bounds_hold_for_every_set_within_the_tolerances(demo: Filled) -> None:
    """Brute force: every corner, and sets between them, integrated through the bounces."""
    demo.put()
    draw = random.Random(2)
    corners = itertools.product(*LIMITS.values())
    sets = [values for values in corners if draw.random() < 0.5]
    sets += [tuple(draw.uniform(*limits) for limits in LIMITS.values()) for _ in range(20)]
    peaks, dips = [], []
    for values in sets:
        x = dict(zip(LIMITS, values, strict=True))
        peaks.append(reached(x, True))
        dips.append(reached(x, False))
        assert demo["V_least"] - 1e-9 <= rest(x, False) <= demo["V_low"] + 1e-9
        assert demo["V_high"] - 1e-9 <= rest(x, True) <= demo["V_top"] + 1e-9
    assert max(peaks) <= demo["V_peak"]
    assert min(dips) >= demo["V_dip"]
    # the bounds are not far off
    assert demo["V_peak"] < 1.1 * max(peaks)
    assert demo["V_dip"] > 0.9 * min(dips)
    times = [time_to(dict(zip(LIMITS, values, strict=True)), True, 14.0) for values in sets[:12]]
    assert max(times) <= demo["t_close_max"] * (1 + 1e-9)


@pytest.mark.parametrize("state", [True, False])
def test_level_in_the_bounces_without_tolerances(demo: Filled, state: bool) -> None:
    """With every tolerance 0 the bound is the circuit's own level."""
    ends = {
        f"{end}_of_{name}": 24 if name == "V_on" else 0
        for end in ("lowest", "highest")
        for name in ("R_flt", "C_flt", "R_load", "R_off", "V_on")
    }
    demo.put(**ends, value_of_I_in=0)
    x = {"R_flt": 22e3, "C_flt": 470e-9, "R_load": 100e3, "V_on": 24.0, "R_off": 4700.0,
         "I_in": 0.0}  # fmt: skip
    assert demo["V_peak" if state else "V_dip"] == pytest.approx(reached(x, state), rel=1e-8)


# the last column of the table of sheets: what a reviewer would send it back for


def test_unequal_charge_and_discharge_paths(demo: Filled) -> None:
    """Nothing but the input discharges: tau_off 47 ms against 8.5 ms, and far too slow to open."""
    demo.put(value_of_R_off=1, unit_of_R_off="Gohm", value_of_I_in=0)
    assert demo["tau_off"] == pytest.approx(470e-9 * 100e3, rel=1e-3)
    assert "unequal_charge_and_discharge" in demo.warnings()
    assert demo["t_open"] > 4 * demo["t_close"]
    assert demo["check_time"] == demo["verdict"] == "FAIL"
    assert "unequal_charge_and_discharge" not in demo.put().warnings()


def test_bounces_that_add_up(demo: Filled) -> None:
    """Each of 8 bounces of 1.2 ms alone reaches 3.6 V; together they pass 12 V."""
    pattern = {}
    for row in range(1, 9):
        pattern |= {f"value_of_bounce_new_{row}": 1.2, f"value_of_bounce_old_{row}": 0.2}
    demo.put(**pattern)
    assert demo["V_one"] < 4
    assert demo["V_peak"] > 12
    assert demo["check_bounce_closing"] == demo["verdict"] == "FAIL"
    assert "bounces_that_add_up" in demo.warnings()
    # one bounce alone adds up to nothing
    alone = {f"value_of_bounce_{kind}_{row}": None for row in (2, 3, 4) for kind in ("new", "old")}
    demo.put(**alone)
    assert demo["V_peak"] == pytest.approx(demo["V_one"], rel=1e-12)
    assert "bounces_that_add_up" not in demo.warnings()
    # after a pause of 20 ms little is left of the first one: no warning below a tenth of 12 V
    demo.put(
        value_of_bounce_old_1=20,
        **{name: None for name in alone if not name.endswith("_2")},
    )
    assert demo["V_one"] < demo["V_peak"] < demo["V_one"] + 0.1 * 12
    assert "bounces_that_add_up" not in demo.warnings()


def test_highest_level_need_not_be_at_the_last_bounce(demo: Filled) -> None:
    demo.put(value_of_bounce_old_3=5)
    assert demo["t_peak"] == pytest.approx(0.8e-3 + 0.6e-3 + 1.2e-3 + 0.4e-3 + 0.5e-3, rel=1e-12)
    assert demo["check_agreement"] == "PASS"


FAILING: dict[str, tuple[dict[str, Any], set[str]]] = {
    "signal": ({"value_of_a_pass": 0.5}, {"signal"}),
    "noise": ({"value_of_a_stop": 40}, {"noise"}),
    "closed": ({"highest_of_V_up": 16.6}, {"closed", "time"}),
    "open": ({"value_of_V_idle": 10}, {"open", "time", "bounce_closing"}),
    "time": ({"value_of_t_most": 22}, {"time"}),
    "bounce_closing": ({"value_of_bounce_new_2": 5}, {"bounce_closing", "bounce_opening"}),
    "bounce_opening": ({"highest_of_V_dn": 12.6, "highest_of_V_up": 14}, {"bounce_opening"}),
}


@pytest.mark.parametrize("key", FAILING)
def test_each_check_fails_by_its_own_input(demo: Filled, key: str) -> None:
    cells, failing = FAILING[key]
    demo.put(**cells)
    assert {name for name, word in demo.checks().items() if word != "PASS"} - {
        "agreement"
    } == failing
    assert demo["verdict"] == "FAIL"


def test_bounce_when_it_closes_only(demo: Filled) -> None:
    demo.put(value_of_bouncing="closes only", highest_of_V_dn=12.6)
    assert demo["V_dip"] == demo["V_high"]
    assert demo["verdict"] == "PASS"


def test_input_that_never_switches_has_no_time(demo: Filled) -> None:
    """A load of 20 kohm leaves 20.4 V x 20 / 42.5 = 9.5 V, below V_up."""
    demo.put(value_of_R_load=20)
    assert isinstance(demo["t_close_max"], ErrorKind)
    assert isinstance(demo["t_sure"], ErrorKind)
    assert demo["check_closed"] == demo["check_time"] == demo["verdict"] == "FAIL"


def test_other_warnings(demo: Filled) -> None:
    assert "little_hysteresis" in demo.put(highest_of_V_dn=11.9).warnings()
    assert "bounces_take_much_of_the_time" in demo.put(value_of_t_most=9).warnings()


def test_slips_are_refused(demo: Filled) -> None:
    demo.put(value_of_f_noise=4, unit_of_f_noise="Hz")
    assert demo["remark_on_f_noise"].startswith("f_noise is not above the signal's")
    demo.put(highest_of_V_dn=15)
    assert demo["remark_on_V_dn"].startswith("V_dn is above V_up")
    demo.put(value_of_bounce_old_2=None)
    assert demo["verdict"] == "FAIL"


def test_blank_pattern_gives_no_time(demo: Filled) -> None:
    blank = {
        f"value_of_bounce_{kind}_{row}": None for row in range(1, 5) for kind in ("new", "old")
    }
    demo.put(**blank)
    assert isinstance(demo["t_bounce"], ErrorKind)
    assert demo["verdict"] == "FAIL"


@pytest.mark.parametrize("hertz", [1e-4, 0.01, 0.1, 0.11, 0.12, 1.0])
def test_small_attenuation_both_ways(demo: Filled, hertz: float) -> None:
    """10 log10(1 + x) for small x by log1p; the second way changes over to a series there."""
    demo.put(value_of_f_sig=hertz)
    slow = 1.12 * 470e-9 / (1 / (1.02 * 22e3 + 1.05 * 4.7e3) + 1 / 102e3)
    loss = 10 / math.log(10) * math.log1p((2 * math.pi * hertz * slow) ** 2)
    assert demo["a_sig"] == pytest.approx(loss, rel=1e-12)
    assert demo["a_sig_hand"] == pytest.approx(loss, rel=1e-11)


def test_opening_with_the_current_against_it(demo: Filled) -> None:
    """From the level with the current one way to that with it the other way: tau ln(...)."""
    demo.put(value_of_I_in=100)
    x = {"R_flt": 22e3, "C_flt": 470e-9, "R_load": 100e3, "V_on": 24.0, "R_off": 4700.0}
    start, end = rest(x | {"I_in": -1e-4}, True), rest(x | {"I_in": -1e-4}, False)
    tau = 470e-9 / (1 / 26.7e3 + 1 / 100e3)
    assert demo["t_open"] == pytest.approx(tau * math.log((start - end) / (8.5 - end)), rel=1e-12)


def test_curve_follows_the_bounces(demo: Filled) -> None:
    """Both lines from state to state by exponentials, and to rest after the last bounce."""
    demo.put()
    curve = demo.values["Curve"]
    lines = (
        ("C", ("on_fast", "V_top"), ("off_slow", "V_low"), "V_low"),
        ("D", ("on_slow", "V_high"), ("off_fast", "V_least"), "V_least"),
    )
    times = [cell for cell in curve if re.fullmatch(r"A\d+", cell) and int(cell[1:]) > 3]
    for cell, (column, new, old, start) in itertools.product(times, lines):
        t, u = curve[cell], demo[start]
        left = max(t, 0.0)
        for length, (tau, level) in [
            pair for new_for, old_for in PATTERN for pair in ((new_for, new), (old_for, old))
        ] + [(1.0, new)]:
            here = min(length, left)
            u = demo[level] + (u - demo[level]) * math.exp(-here / demo[tau])
            left -= here
        assert curve[f"{column}{cell[1:]}"] == pytest.approx(u, rel=1e-9)
