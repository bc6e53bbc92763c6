"""The calc sheet `sequence`: stages against scipy's integration, bounds against every corner."""

from __future__ import annotations

import itertools
import math
from pathlib import Path
from typing import Any

import pytest
from filled import Filled
from scipy.integrate import solve_ivp

from tausheet import templates
from tausheet.functions.errors import ErrorKind

SHEET = templates.SHEETS["sequence"]
ROW = tuple(column.name for column in SHEET.filled_in[0].columns)


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("sequence"))


def stages(*rows: tuple[Any, ...]) -> dict[str, Any]:
    """Cells of the stage table in s, ohm, %, V, A; rows not given are blank."""
    padded = [*rows, *[()] * (10 - len(rows))]
    return {
        f"value_of_stage_{name}_{number}": cell
        for number, row in enumerate(padded, start=1)
        for name, cell in itertools.zip_longest(ROW, row)
    }


INDUCTOR = {
    "value_of_store": "inductor", "value_of_C_store": None, "value_of_L_store": 2.0,
    "lowest_of_L_store": -10, "highest_of_L_store": 10, "value_of_y_start": 0.0,
    "lowest_of_y_start": 0.0, "highest_of_y_start": 0.0, "value_of_y_level": 10.0,
    "value_of_direction": "rising", "value_of_y_upper": 100.0, "value_of_y_rated": 100.0,
    "value_of_W_rated": 100.0, "unit_of_W_rated": "kJ",
}  # fmt: skip


def integrated(
    rows: list[tuple[float, ...]], store: float, kind: str, start: float, end: float
) -> list[tuple[float, float, float]]:
    """Begin, end and heat of each stage by scipy's DOP853: rows of start, R, E."""
    found = []
    y = start
    for number, (begin, resistance, source) in enumerate(rows):
        length = (rows[number + 1][0] if number + 1 < len(rows) else end) - begin

        def slope(_: float, state: Any, r: float = resistance, e: float = source) -> list[float]:
            if kind == "capacitor":
                return [(e - state[0]) / r / store, (e - state[0]) ** 2 / r]
            return [(e - r * state[0]) / store, state[0] ** 2 * r]

        tau = resistance * store if kind == "capacitor" else store / resistance
        done = solve_ivp(slope, (0, length), [y, 0.0], "DOP853", rtol=1e-12, atol=1e-11,
                         max_step=max(tau / 2, length / 5000))  # fmt: skip
        found.append((y, float(done.y[0, -1]), float(done.y[1, -1])))
        y = found[-1][1]
    return found


def test_demo_against_scipy(demo: Filled) -> None:
    demo.put()
    # the held stage from 3 s to 4 s leaves the voltage as it is
    on = integrated([(0, 47, 565), (1.5, 0.1, 565)], 4.7e-3, "capacitor", 0, 1.52)
    off = integrated([(4, 220, 0)], 4.7e-3, "capacitor", 565.0, 10)
    assert demo["y_ask"] == pytest.approx(565 * math.exp(-5 / (220 * 4.7e-3)), rel=1e-9)
    assert demo["t_cross"] == pytest.approx(4 + 220 * 4.7e-3 * math.log(565 / 60), rel=1e-9)
    assert demo["E_end"] == pytest.approx(4.7e-3 * off[0][1] ** 2 / 2, rel=1e-7)
    assert demo["W_all"] == pytest.approx(sum(heat for _, _, heat in (*on, *off)), rel=1e-8)
    # charging from 0 to E turns half of what the source gives, C E^2 / 2, into heat, whatever R is
    assert demo["W_all"] == pytest.approx(2 * 4.7e-3 * 565**2 / 2, rel=1e-5)
    assert demo.warnings() == set()


def test_an_inductor_against_scipy(demo: Filled) -> None:
    rows = [(0.0, 8.0, 110.0), (1.0, 40.0, -20.0)]
    cells = {**INDUCTOR, **stages((0, "through R", 8, None, 110), (1, "through R", 40, None, -20)),
             "value_of_t_end": 2.0, "value_of_t_ask": 1.2}  # fmt: skip
    demo.put(**cells)
    (_, i_on, w_on), (_, _, w_off) = integrated(rows, 2.0, "inductor", 0.0, 2.0)
    assert demo["y_ask"] == pytest.approx(-0.5 + (i_on + 0.5) * math.exp(-0.2 * 40 / 2), rel=1e-9)
    assert demo["W_all"] == pytest.approx(w_on + w_off, rel=1e-8)
    assert demo["t_cross"] == pytest.approx(-2 / 8 * math.log(1 - 10 / (110 / 8)), rel=1e-9)
    assert demo["V_kick"] == pytest.approx(i_on * 40, rel=1e-9)
    assert "inductive_kick" in demo.warnings()
    assert demo["check_agreement"] == "PASS"


def test_a_diode_stops_the_current_at_zero(demo: Filled) -> None:
    demo.put(**{**INDUCTOR, **stages((0, "through R", 8, None, 110),
                                     (1, "through R and diode", 40, None, -20)),
                "value_of_t_end": 2.0, "value_of_t_ask": 1.5})  # fmt: skip
    assert demo["y_ask"] == demo["y_high"] == 0
    i_on = 110 / 8 * (1 - math.exp(-4))
    stopped = 2 / 40 * math.log(1 + i_on / 0.5)
    # ends when i is 0: integral of i^2 R by hand for i = -h + (b + h) exp(-t / tau), h = 0.5 A
    b, h, tau, t = i_on, -0.5, 0.05, stopped
    by_hand = 40 * (
        h * h * t
        + 2 * h * (b - h) * tau * (1 - math.exp(-t / tau))
        + (b - h) ** 2 * tau / 2 * (1 - math.exp(-2 * t / tau))
    )
    on = integrated([(0.0, 8.0, 110.0)], 2.0, "inductor", 0.0, 1.0)[0][2]
    assert demo["W_all"] == pytest.approx(on + by_hand, rel=1e-8)


def test_heat_behind_a_diode_is_bounded_by_what_is_stored(demo: Filled) -> None:
    """Into a counter-voltage: the resistor takes less than L I^2 / 2 at its highest, by hand."""
    demo.put(**{**INDUCTOR, **stages((0, "through R", 8, None, 110),
                                     (1, "through R and diode", 4, None, -100)),
                "value_of_t_end": 2.0, "value_of_t_ask": 1.5})  # fmt: skip
    high = 110 * 1.1 / (8 * 0.95)
    title, first = demo.places["heat_worst"]
    column, row = first[:-1], int(first[-1])
    second = demo.values[title][f"{column}{row + 1}"]
    nominal = demo.values[title][f"{demo.places['heat_ours'][1][:-1]}{row + 1}"]
    assert nominal < second < 2.2 * high**2 / 2


def test_a_constant_current(demo: Filled) -> None:
    cells = stages((0, "constant current", 10, None, None, 2.0), (0.5, "held"))
    demo.put(**cells, value_of_direction="rising", value_of_t_end=1.0, value_of_t_ask=0.25,
             value_of_y_upper=400.0)  # fmt: skip
    assert demo["y_ask"] == pytest.approx(2 / 4.7e-3 * 0.25, rel=1e-12)  # V = I t / C
    assert demo["t_cross"] == pytest.approx(60 * 4.7e-3 / 2, rel=1e-12)
    assert demo["W_all"] == pytest.approx(2**2 * 10 * 0.5, rel=1e-12)
    assert demo["y_high"] == pytest.approx(20 + 2.2 / 3.76e-3 * 0.25, rel=1e-12)
    assert demo["y_low"] == pytest.approx(1.8 / 5.64e-3 * 0.25, rel=1e-12)
    assert demo["W_worst"] == pytest.approx(2.2**2 * 10.5 * 0.5, rel=1e-12)


# two equal capacitors, one charged: V / 2, and half of the energy is lost in the contact whatever
# its resistance (common textbook result: charge Q on C, then on 2 C)
SHARED = stages((0, "through R", 1, None, 100), (1, "held", None, 200, None, None, "charge/flux"))


def test_charge_is_kept_when_an_uncharged_part_is_added(demo: Filled) -> None:
    demo.put(**SHARED, value_of_direction="falling", value_of_y_upper=60.0)
    assert demo["y_ask"] == pytest.approx(50, rel=1e-12)
    assert demo["t_cross"] == 1
    assert demo["E_lost"] == pytest.approx(4.7e-3 * 100**2 / 4, rel=1e-12)
    assert demo["E_end"] == pytest.approx(4.7e-3 * 100**2 / 4, rel=1e-12)
    assert "charge_when_the_store_changes" in demo.warnings()
    # 110 V on both sides of it: the tolerance of the store cancels
    assert demo["y_high"] == pytest.approx(55, rel=1e-12)


def test_value_is_kept_when_a_part_is_switched_away(demo: Filled) -> None:
    rows = stages((0, "through R", 1, None, 50), (1, "held", None, 50, None, None, "value"))
    demo.put(**rows, value_of_direction="rising", value_of_y_level=40.0)
    assert demo["y_ask"] == pytest.approx(50, rel=1e-12)
    assert demo["E_end"] == pytest.approx(4.7e-3 / 2 * 50**2 / 2, rel=1e-12)
    assert "part_switched_away_charged" in demo.warnings()
    assert "energy_left" in demo.warnings()


FAULTS: list[tuple[dict[str, Any], str]] = [
    # R and C or L behind a tau not stated
    ({"value_of_stage_R_1": None}, "row 1: needs the resistance and the source voltage"),
    ({"value_of_stage_E_4": None}, "row 4: needs the resistance and the source voltage"),
    # the store changes and nothing is said of its charge
    ({"value_of_stage_share_2": 50}, "row 2: the store changes here: say whether its charge"),
    ({"value_of_stage_share_4": 200}, "row 4: the store changes here"),
    ({"value_of_stage_share_1": 50, "value_of_stage_kept_1": "value"}, "row 1: the first stage be"),
    ({"value_of_stage_kept_2": "value"}, "row 2: says what is kept"),
    ({"value_of_stage_start_1": 1}, "row 1: the first stage must start at 0"),
    ({"value_of_stage_start_3": 1.5}, "row 3: must start later"),
    ({"value_of_stage_start_4": 10}, "row 4: starts after t_end"),
    ({"value_of_stage_mode_1": "constant current"}, "row 1: a constant current goes with"),
    ({"value_of_stage_I_1": 3}, "row 1: a constant current goes with"),
    ({"value_of_stage_mode_1": "through R and diode"}, "row 1: the diode is meant for an inductor"),
    ({"value_of_stage_E_3": 5}, "row 3: has a source voltage"),
    ({"value_of_stage_R_3": 5}, "row 3: has a resistance"),
]


@pytest.mark.parametrize(("cells", "sentence"), FAULTS)
def test_a_stage_that_cannot_be_meant(demo: Filled, cells: dict[str, Any], sentence: str) -> None:
    demo.put(**cells)
    assert demo["remark_on_stage"].startswith(sentence)
    assert demo["verdict"] == "FAIL"
    assert isinstance(demo["y_ask"], ErrorKind)


def test_a_level_that_is_never_crossed_fails_and_says_so(demo: Filled) -> None:
    demo.put(value_of_y_level=700.0)
    assert demo["check_agreement"] == "FAIL"
    assert demo["verdict"] == "FAIL"
    assert "level_never_crossed" in demo.warnings()


def test_a_held_inductor_is_warned_of(demo: Filled) -> None:
    demo.put(**{**INDUCTOR, **stages((0, "through R", 8, None, 110), (1, "held"))})
    assert "current_chopped" in demo.warnings()


@pytest.mark.parametrize(
    ("cells", "check"),
    [
        ({"value_of_y_upper": 13.3}, "upper"),
        ({"value_of_y_lower": 0.9}, "lower"),
        ({"value_of_y_rated": 621.0}, "peak"),
        ({"value_of_W_rated": 1.08}, "heat"),
    ],
)
def test_each_check_fails_by_its_own_limit(demo: Filled, cells: dict[str, Any], check: str) -> None:
    results = demo.put(**cells).checks()
    assert {key for key, result in results.items() if result == "FAIL"} == {check}


@pytest.mark.parametrize("kind", ["capacitor", "inductor"])
def test_bounds_hold_every_corner_and_are_met_by_one(demo: Filled, kind: str) -> None:
    """Brute force over every corner of store, R, E and start, in closed form, two stages."""
    rows = [(0.0, 50.0, 100.0), (0.2, 30.0, -40.0)]
    cells = stages(*((t, "through R", r, None, e) for t, r, e in rows))
    nominal = 4.7e-3 if kind == "capacitor" else 2.0
    spread = 0.2 if kind == "capacitor" else 0.1
    shared = {"value_of_t_ask": 0.3, "value_of_t_end": 0.5, "value_of_y_lower": -900.0}
    if kind == "inductor":
        shared = {**INDUCTOR, **shared, "highest_of_y_start": 0.5}
    demo.put(**cells, **shared)
    start_hi = 20.0 if kind == "capacitor" else 0.5
    ends, peaks = [], []
    for side, r, e, start in itertools.product(
        (1 - spread, 1 + spread), (0.95, 1.05), (0.9, 1.1), (0.0, start_hi)
    ):
        y = start
        values = [y]
        for (_, resistance, source), length in zip(rows, (0.2, 0.1), strict=True):
            if kind == "capacitor":
                tau, level = resistance * r * nominal * side, source * e
            else:
                tau, level = nominal * side / (resistance * r), source * e / (resistance * r)
            y = level + (y - level) * math.exp(-length / tau)
            values.append(y)
        ends.append(y)
        peaks.append(max(map(abs, values)))
    assert demo["y_low"] <= min(ends) + 1e-12
    assert demo["y_high"] >= max(ends) - 1e-12
    assert demo["y_peak"] >= max(peaks) - 1e-12
    # met exactly where the parts of each stage vary for themselves
    low, high = 0.0, start_hi
    for (_, resistance, source), length in zip(rows, (0.2, 0.1), strict=True):
        spreads = list(itertools.product((1 - spread, 1 + spread), (0.95, 1.05)))
        if kind == "capacitor":
            taus = [resistance * nominal * side * r for side, r in spreads]
            levels = [source * 0.9, source * 1.1]
        else:
            taus = [nominal * side / (resistance * r) for side, r in spreads]
            levels = [source * e / (resistance * r) for e in (0.9, 1.1) for r in (0.95, 1.05)]
        every = list(itertools.product((min(taus), max(taus)), levels, (low, high)))
        after = [level + (y - level) * math.exp(-length / tau) for tau, level, y in every]
        low, high = min(after), max(after)
    assert demo["y_low"] == pytest.approx(low, rel=1e-12)
    assert demo["y_high"] == pytest.approx(high, rel=1e-12)


def test_the_page_traces_each_time_constant(demo: Filled, tmp_path: Path) -> None:
    demo.put()
    title, first = demo.places["list_stages_tau"]
    row = int(first[1:])
    shown = [demo.values[title][f"B{row + i}"] for i in range(5)]
    assert shown[0] == "R C = 47.0 Ω x 4.70 mF = 220.9 ms"
    assert shown[2] == "held"
    assert shown[4] == ""
    begin = [demo.values[title][f"C{row + i}"] for i in range(4)]
    assert begin == ["0 V", "564.4 V", "565.0 V", "565.0 V"]
