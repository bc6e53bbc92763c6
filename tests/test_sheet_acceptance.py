"""The calc sheet `acceptance`: fit against NIST and scipy, guard band and probe by hand."""

from __future__ import annotations

import math
import random
import re
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from filled import Filled, short
from scipy.optimize import curve_fit

from tausheet import templates
from tausheet.functions.errors import ErrorKind
from tausheet.templates import writer
from tausheet.templates.model import Sheet
from tausheet.templates.sheets import acceptance

SHEET = templates.SHEETS["acceptance"]
DEMO = np.array([[float(cell.split()[0]) for cell in row] for row in acceptance.MEASURED.demo]).T
TAU_SEEN = 0.01 / 1.001 + 1e4 / 1.001 * 15e-12
NIST = Path(__file__).parent / "references" / "nist-strd-misra1a.dat"


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("acceptance"))


def made(
    times: Sequence[float], values: Sequence[float], sheet: Sheet | None = None, **inputs: Any
) -> Filled:
    """A sheet whose record holds these points, in s and V; inputs as for `tausheet new`."""
    given: dict[str, Any] = {
        f"measured.{name}.{row}": cell
        for name, cells in (("time", times), ("value", values))
        for row, cell in enumerate(cells, start=1)
    }
    blanks = {
        f"measured.{name}.{row}": None
        for name in ("time", "value")
        for row in range(len(times) + 1, len(acceptance.MEASURED.demo) + 1)
    }
    sheet = sheet or short(SHEET)
    return Filled(sheet, writer.build(sheet, {**given, **blanks, **inputs}, demo=True)).put()


def test_demo_against_scipy_and_by_hand(demo: Filled) -> None:
    demo.put()
    time, value = DEMO[0] / 1e3, DEMO[1]
    used = (time >= 0.5e-3 - 1e-9) & (time <= 50e-3 + 1e-9)
    assert (demo["n_before"], demo["n_used"]) == (50, used.sum())

    def curve(t: Any, tau: float, first: float, end: float) -> Any:
        return end + (first - end) * np.exp(-(t - 0.5e-3) / tau)

    (tau, first, end), spread = curve_fit(
        curve, time[used], value[used], (0.012, 1, 20), xtol=1e-14, ftol=1e-14
    )
    assert demo["tau_fit"] == pytest.approx(tau, rel=1e-7)
    assert demo["V_first"] == pytest.approx(first, rel=1e-6)
    assert demo["V_end"] == pytest.approx(end, rel=1e-7)
    assert demo["u_fit"] == pytest.approx(math.sqrt(spread[0, 0]), rel=1e-4)
    true = tau * 1.001 - 1e4 * 15e-12  # R_node / R_probe = 0.001
    combined = math.hypot(
        math.sqrt(spread[0, 0]) * 1.001, true * 1e-4, true * 5e-3, (true - tau) * 0.2
    )
    assert demo["tau_true"] == pytest.approx(true, rel=1e-7)
    assert demo["tau_up"] == pytest.approx(true + 2 * combined, rel=1e-7)
    assert demo["tau_down"] == pytest.approx(true - 2 * combined, rel=1e-7)
    assert demo["tau_seen"] == pytest.approx(TAU_SEEN, rel=1e-12)
    # the record was made with 10.3 ms: found within two standard errors
    assert abs(demo["tau_fit"] - 10.3e-3) < 2 * demo["u_fit"]
    assert demo.warnings() == set()


def test_misra1a_of_nist_through_the_sheet() -> None:
    """NIST StRD Misra1a: y = b1 (1 - exp(-b2 x)), certified to eleven digits."""
    text = NIST.read_text().splitlines()
    (b1, _), (b2, b2_sd) = (
        map(float, re.findall(r"[0-9.]+E[-+][0-9]+", line)) for line in text[40:42]
    )
    residual = float(re.findall(r"[0-9.]+E[-+][0-9]+", text[44])[0])
    volume, pressure = np.loadtxt(NIST, skiprows=60, unpack=True)
    filled = made(
        pressure, volume, start="known", V_0=0.0, t_switch=0.0, t_from=1.0, t_to=1000.0,
        tau_design="1800 s", tau_design_lo="1700 s", tau_design_hi="1900 s",
    )  # fmt: skip
    assert filled["n_used"] == 14
    assert filled["tau_fit"] == pytest.approx(1 / b2, rel=5e-9)
    assert filled["u_fit"] == pytest.approx(b2_sd / b2**2, rel=5e-6)
    assert filled["V_end"] == pytest.approx(b1, rel=5e-9)
    assert filled["V_res"] == pytest.approx(residual, rel=5e-9)
    # 0.4 time constants are too short a window, and 14 points are few
    assert filled["check_window"] == "FAIL"
    assert filled["verdict"] == "FAIL"
    assert "few_points" in filled.warnings()


def record(tau: float, seed: int = 1, before: int = 0, noise: float = 0.01) -> tuple[Any, Any]:
    """A step to 10 V every 0.1 ms with noise, some points before switching at 0."""
    draw = random.Random(seed)
    times = [i * 1e-4 for i in range(-before, 600)]
    values = [10 * (1 - math.exp(-max(t, 0.0) / tau)) + draw.gauss(0, noise) for t in times]
    return times, values


def test_points_before_switching_are_left_out_or_refused(demo: Filled) -> None:
    demo.put(value_of_t_from=-1)
    assert demo["remark_on_t_from"].startswith("t_from lies before t_switch: points before")
    assert demo["verdict"] == "FAIL"
    # the true moment of switching is 0, but it is entered 5 ms too early
    demo.put(value_of_t_switch=-5, value_of_t_from=-5)
    assert demo["verdict"] == "FAIL"
    assert isinstance(demo["tau_fit"], ErrorKind)
    assert "no_fit" in demo.warnings()


def test_a_probe_that_loads_is_taken_out_and_warned_of() -> None:
    """10 kohm and 1 uF seen by 100 kohm and 10 nF: 9.18 ms instead of 10 ms, by hand."""
    seen = 1e4 * 1e5 / 1.1e5 * (1e-6 + 10e-9)
    filled = made(*record(seen), R_probe="100 kohm", C_probe="10 nF")
    assert filled["tau_seen"] == pytest.approx(seen, rel=1e-12)
    assert filled["tau_true"] == pytest.approx(10e-3, abs=3 * filled["u_tau"])
    assert abs(filled["tau_fit"] - seen) < 4 * filled["u_fit"]
    assert filled["verdict"] == "PASS"
    assert "probe_loads_the_circuit" in filled.warnings()
    shunt = made(*record(seen), R_probe="100 kohm", C_probe="10 nF",
                 probed=acceptance.ON_SHUNT)  # fmt: skip
    assert shunt["tau_true"] == shunt["tau_fit"]
    assert shunt["tau_seen"] == 0.01


@pytest.mark.parametrize(
    ("cells", "check"),
    [
        ({"highest_of_tau_design": 10.4}, "upper"),  # 10.31 ms fits, but not with its guard band
        ({"lowest_of_tau_design": 9.9, "value_of_tau_design": 10.25, "value_of_u_lin": 2.5},
         "lower"),
        ({"value_of_t_to": 30}, "window"),
    ],
)  # fmt: skip
def test_each_check_fails_by_its_own_limit(demo: Filled, cells: dict[str, Any], check: str) -> None:
    results = demo.put(**cells).checks()
    assert {key for key, result in results.items() if result == "FAIL"} == {check}


def test_the_guard_band_decides_near_the_limit(demo: Filled) -> None:
    demo.put()
    true, band = demo["tau_true"] * 1e3, demo["w_guard"] * 1e3
    assert demo.put(highest_of_tau_design=true + band * 1.01)["verdict"] == "PASS"
    assert demo.put(highest_of_tau_design=true + band * 0.99)["verdict"] == "FAIL"
    assert demo["check_upper"] == "FAIL"


def test_a_second_time_constant_shows_as_a_pattern() -> None:
    draw = random.Random(3)
    times = [i * 1e-4 for i in range(600)]
    values = [
        10 - 9 * math.exp(-t / 0.0095) - math.exp(-t / 0.02) + draw.gauss(0, 0.05) for t in times
    ]
    filled = made(times, values)
    assert filled["check_pattern"] == "FAIL"
    assert filled["verdict"] == "FAIL"


@pytest.mark.parametrize(
    ("cells", "warning"),
    [
        ({"value_of_t_rise": 1, "unit_of_t_rise": "ms"}, "edge_inside_the_window"),
        ({"value_of_t_rise": 3, "unit_of_t_rise": "ms"}, "slow_instrument"),
        ({"value_of_u_lin": 3}, "uncertain_measurement"),
        ({"value_of_t_from": 0.5, "value_of_t_to": 3}, "few_points"),
    ],
)
def test_named_warnings(demo: Filled, cells: dict[str, Any], warning: str) -> None:
    assert warning in demo.put(**cells).warnings()


def test_a_flat_record_fails() -> None:
    draw = random.Random(5)
    filled = made([i * 1e-4 for i in range(600)], [5 + draw.gauss(0, 0.01) for _ in range(600)])
    assert filled["verdict"] == "FAIL"
    assert "no_fit" in filled.warnings()


FAULTS: list[tuple[dict[str, Any], str]] = [
    ({"values_of_measured_time": 99}, "row 2: times must rise"),
    ({"values_of_measured_value": "OL"}, "row 1: voltage is not a number"),
    ({"values_of_measured_value": None}, "row 1: voltage is missing"),
    ({"values_of_measured_time": 1e30}, "row 1: time is outside"),
    ({"unit_of_measured_time": "V"}, "time: its unit does not measure a time"),
]


@pytest.mark.parametrize(("cells", "sentence"), FAULTS)
def test_points_that_cannot_be_meant(demo: Filled, cells: dict[str, Any], sentence: str) -> None:
    demo.put(**cells)
    assert demo["remark_on_measured"].startswith(sentence)
    assert demo["verdict"] == "FAIL"
    assert isinstance(demo["tau_fit"], ErrorKind)


def test_residuals_are_listed(demo: Filled) -> None:
    demo.put()
    title, first = demo.places["list_residuals_off"]
    shown = [demo.values[title][f"{first[0]}{int(first[1:]) + i}"] for i in range(12)]
    assert all(re.fullmatch(r"[0-9.]+ (above|below)", text) for text in shown)
    # by hand for the first slice: the 21st point of the window
    time, value = DEMO[0][55 + 20] / 1e3, DEMO[1][55 + 20]
    curve = demo["V_end"] + (demo["V_first"] - demo["V_end"]) * math.exp(
        -(time - 0.5e-3) / demo["tau_fit"]
    )
    assert float(shown[0].split()[0]) == pytest.approx(
        abs(value - curve) / demo["V_res"], rel=0.06, abs=0.006
    )


def test_ten_thousand_points() -> None:
    draw = random.Random(8)
    times = [i * 5e-6 for i in range(10_000)]
    values = [10 * (1 - math.exp(-t / 9.9e-3)) + draw.gauss(0, 0.05) for t in times]
    filled = made(times, values, SHEET)
    assert filled["n_used"] == 9_900
    assert filled["tau_true"] == pytest.approx(9.91e-3, abs=4 * filled["u_fit"])
    assert filled["verdict"] == "PASS"
