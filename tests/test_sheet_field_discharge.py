"""The calc sheet `field-discharge`: against integration, worst corners, warnings."""

from __future__ import annotations

import itertools
import math
from typing import Any

import pytest
from filled import Filled
from scipy.integrate import solve_ivp

from tausheet import templates

SHEET = templates.SHEETS["field-discharge"]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("field-discharge"))


def integrated(
    henry: float,
    i: float,
    d: float,
    c: float,
    v: float,
    level: float,
) -> dict[str, float]:
    """L di/dt = -(R i + V) with the energies beside it, step by step to zero (scipy, DOP853)."""

    def rates(t: float, y: Any) -> list[float]:
        return [-((d + c) * y[0] + v) / henry, d * y[0] ** 2, c * y[0] ** 2, v * y[0]]

    def reached(t: float, y: Any) -> float:
        return float(y[0] - level)

    def zero(t: float, y: Any) -> float:
        return float(y[0])

    zero.terminal = True  # type: ignore[attr-defined]
    run = solve_ivp(
        rates, (0, 40 * henry / (d + c)), [i, 0, 0, 0], "DOP853", events=(reached, zero),
        rtol=1e-11, atol=1e-12,
    )  # fmt: skip
    dump, wind, arc = run.y[1:, -1]
    return {"t": run.t_events[0][0], "dump": dump, "wind": wind, "arc": arc}


def test_demo_against_numerical_integration(demo: Filled) -> None:
    demo.put()
    ran = integrated(4.5, 24.0, 47.0, 9.5, 20.0, 1.0)
    assert demo["t_end"] == pytest.approx(ran["t"], rel=1e-8)
    for name in ("dump", "wind", "arc"):
        assert demo[f"E_{name}"] == pytest.approx(ran[name], rel=1e-7)
    assert demo["E_coil"] == 4.5 * 24**2 / 2
    assert demo["V_peak"] == 47 * 24 + 20
    assert demo["verdict"] == "PASS"
    assert demo.warnings() == {"solid_iron", "hot_resistor"}


def test_without_an_arc_the_resistances_share_all(demo: Filled) -> None:
    """E_dump = E R_dump / (R_dump + R_coil), common practice; i = I exp(-t / tau)."""
    demo.put(value_of_V_arc=0, lowest_of_V_arc=0, highest_of_V_arc=0)
    assert demo["E_arc"] == 0
    assert demo["E_dump"] == pytest.approx(1296 * 47 / 56.5, rel=1e-13)
    assert demo["t_end"] == pytest.approx(4.5 / 56.5 * math.log(24), rel=1e-13)
    demo.put(value_of_V_arc=0, lowest_of_V_arc=0, highest_of_V_arc=0, value_of_I_end=0)
    assert (demo["check_time"], demo["verdict"]) == ("FAIL", "FAIL")  # zero is never reached


def test_worst_corners_against_brute_force(demo: Filled) -> None:
    demo.put()
    dumps, voltages, times = [], [], []
    for l, i, d, c, v in itertools.product(  # noqa: E741
        (4.0, 6.0), (20.0, 28.0), (44.65, 51.7), (7.8, 11.0), (10.0, 30.0)
    ):
        r = d + c
        times.append(l / r * math.log((i + v / r) / (1 + v / r)))
        stop = l / r * math.log(1 + i * r / v)
        dumps.append((l * i * i / 2 - v * (l * i - v * stop) / r) * d / r)
        voltages.append(d * i + v)
    assert demo["t_end_max"] == pytest.approx(max(times), rel=1e-12)
    assert demo["t_field"] == pytest.approx(max(times) + 0.15, rel=1e-12)
    assert demo["E_dump_hi"] == pytest.approx(max(dumps), rel=1e-12)
    assert demo["V_worst"] == pytest.approx(max(voltages), rel=1e-14)
    rise = max(dumps) / (0.028 * 440)
    assert demo["T_dump"] == pytest.approx(80 + rise, rel=1e-12)
    assert demo["k_heat"] == pytest.approx(rise / 270, rel=1e-12)


@pytest.mark.parametrize(
    ("cells", "failing"),
    [
        ({"value_of_V_ins": 1.4}, {"voltage"}),
        ({"value_of_t_ok": 500}, {"time"}),
        ({"value_of_m_dump": 10}, {"heat"}),
        ({"value_of_rated_by": "energy", "value_of_E_rated": 2}, {"heat"}),
        ({"value_of_rated_by": "energy", "value_of_E_rated": 2.1}, set()),
    ],
)
def test_each_check_fails_by_its_own_input(
    demo: Filled, cells: dict[str, Any], failing: set[str]
) -> None:
    demo.put(**cells)
    assert {key for key, word in demo.checks().items() if word == "FAIL"} == failing


def test_a_dump_path_that_is_open_never_passes(demo: Filled) -> None:
    """Hardly any path at all: the voltage fails; a path that has to close first is a warning."""
    demo.put(value_of_R_dump=1e6)
    assert demo["check_voltage"] == "FAIL"
    assert "dump_path_may_stay_open" in demo.put(value_of_path="switched in").warnings()


def test_a_dump_resistor_without_a_diode_is_heated_in_service(demo: Filled) -> None:
    """V^2 / R at the voltage of the coil, warm (24 A, 9.5 ohm) or cold (28 A, 7.8 ohm)."""
    assert demo.put()["P_serv"] == 0
    demo.put(value_of_path="always connected")
    assert demo["P_serv"] == pytest.approx((24 * 9.5) ** 2 / 44.65, rel=1e-13)
    assert "dump_resistor_fed_in_service" in demo.warnings()
    demo.put(value_of_path="always connected", highest_of_I_start=32)
    assert demo["P_serv"] == pytest.approx((32 * 7.8) ** 2 / 44.65, rel=1e-13)


def test_iron_has_its_warnings(demo: Filled) -> None:
    assert "saturated_inductance" in demo.put(highest_of_L_coil=4.5).warnings()
    with_iron = demo.put()["t_field"]
    laminated = demo.put(value_of_iron="laminated")
    assert laminated["t_field"] == pytest.approx(with_iron - 0.15, rel=1e-12)
    assert "solid_iron" not in laminated.warnings()


def test_an_arc_that_takes_much_has_its_warning(demo: Filled) -> None:
    demo.put(value_of_V_arc=300, lowest_of_V_arc=200, highest_of_V_arc=400)
    assert "arc_takes_a_share" in demo.warnings()
