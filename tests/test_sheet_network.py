"""The calc sheet `network`: its results against Kirchhoff's laws by hand, its words, its faults."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from filled import Filled

from tausheet import templates
from tausheet.functions.errors import ErrorKind
from tausheet.templates import values_tables
from tausheet.templates.sheets import network

SHEET = templates.SHEETS["network"]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("network"))


def table(symbol: str, *rows: tuple[Any, ...]) -> dict[str, Any]:
    """Cells of a table; rows not given are blank."""
    found = next(t for t in SHEET.filled_in if t.symbol == symbol)
    padded = [*rows, *[()] * (found.rows - len(rows))]
    return {
        f"value_of_{symbol}_{column.name}_{number}": cell
        for number, row in enumerate(padded, start=1)
        for column, cell in itertools.zip_longest(found.columns, row)
    }


def texts(filled: Filled, name: str, count: int) -> list[Any]:
    title, first = filled.places[name]
    return [filled.values[title][f"{first[0]}{int(first[1:]) + i}"] for i in range(count)]


def coil(r: float = 1.0, x: float = 1.0, s: float = 1.0) -> dict[str, float]:
    """The demo by hand: 110 V, contact across 60 ohm opens; coil 40 ohm, 4 H, 400 ohm beside it."""
    before = 110 * s / (40 * r)
    # seen from the inductor: 40 + 60 || 400
    seen = 40 * r + 60 * 400 / 460 * r
    tau = 4 * x / seen
    beside = 40 * 400 / 440
    final = 110 * s * beside / (60 + beside) / (40 * r)
    return {
        "before": before, "seen": seen, "tau": tau, "final": final,
        "at": tau * math.log((before - final) / (1.4 - final)),
        "last": final + (before - final) * math.exp(-0.4 / tau),
    }  # fmt: skip


def test_demo_by_hand(demo: Filled) -> None:
    demo.put()
    hand = coil()
    assert demo["n_order"] == 1
    assert demo["tau"] == pytest.approx(hand["tau"], rel=1e-12)
    assert demo["R_seen"] == pytest.approx(hand["seen"], rel=1e-12)
    assert demo["y_before"] == demo["y_after"] == pytest.approx(2.75, rel=1e-12)
    assert demo["t_at_n"] == pytest.approx(hand["at"], rel=1e-12)
    ask = hand["final"] + (2.75 - hand["final"]) * math.exp(-0.02 / hand["tau"])
    assert demo["y_ask"] == pytest.approx(ask, rel=1e-12)
    # settled: 60 ohm against 400 || 40
    assert demo["V_port"] == pytest.approx(110 * (400 / 11) / (60 + 400 / 11), rel=1e-12)
    assert demo["I_port"] == pytest.approx(110 / 60, rel=1e-12)
    assert demo["R_port"] == pytest.approx(1 / (1 / 60 + 1 / 400 + 1 / 40), rel=1e-12)
    assert demo["P_left"] == 0
    assert demo.warnings() == set()


def test_worst_of_the_three_sets_by_hand(demo: Filled) -> None:
    """An inductor is slow with small R; the crossing of a falling current with much of a source."""
    demo.put()
    slow, fast = coil(0.96, 1.15, 1.05), coil(1.06, 0.85, 0.95)
    assert demo["tau_s"] == pytest.approx(slow["tau"], rel=1e-12)
    assert demo["tau_f"] == pytest.approx(fast["tau"], rel=1e-12)
    assert demo["y_high"] == pytest.approx(slow["before"], rel=1e-12)
    assert demo["y_low"] == pytest.approx(fast["last"], rel=1e-12)
    assert demo["t_late"] == pytest.approx(slow["at"], rel=1e-12)
    # brute force: no other corner of the three shares is slower, higher or lower
    corners = [
        coil(*shares) for shares in itertools.product((0.96, 1.06), (0.85, 1.15), (0.95, 1.05))
    ]
    assert max(c["tau"] for c in corners) == pytest.approx(slow["tau"])
    assert max(c["at"] for c in corners) == pytest.approx(slow["at"])
    assert max(c["before"] for c in corners) == pytest.approx(slow["before"])
    assert min(c["last"] for c in corners) == pytest.approx(fast["last"], rel=1e-4)


DIVIDER = {
    **table(
        "part",
        ("Supply", "voltage source", "ground", "in", 24, "V", 0),
        (1, "resistor", "in", "out", 10, "kΩ"),
        ("R2", "resistor", "out", "ground", 40, "kΩ"),
        ("C1", "capacitor", "out", "ground", 2.2, "µF"),
    ),
    **table("ask", ("voltage at", "out")),
    **table("port", ("out", "ground")),
    "value_of_y_upper": 30.0, "value_of_y_lower": -1.0, "value_of_y_level": 12.0,
    "value_of_direction": "rising", "value_of_t_own": 17.6,
}  # fmt: skip


def test_a_divider_with_a_capacitor(demo: Filled) -> None:
    demo.put(**DIVIDER)
    tau = 8e3 * 2.2e-6
    assert demo["tau"] == pytest.approx(tau, rel=1e-12)
    assert demo["y_before"] == demo["y_after"] == 0
    assert demo["t_at_n"] == pytest.approx(tau * math.log(19.2 / 7.2), rel=1e-12)
    # a capacitor is slow with large R; a rising level is reached last with little of the source
    late = tau * 1.06 * 1.15 * math.log(19.2 * 0.95 / (19.2 * 0.95 - 12))
    assert demo["t_late"] == pytest.approx(late, rel=1e-12)
    assert demo["verdict"] == "PASS"


def test_start_control_and_shape_reach_the_network(demo: Filled) -> None:
    """A capacitor with a start; an inverting low-pass with an op-amp; a ramp."""
    start = table("extra", ("C1", None, 9))
    demo.put(**DIVIDER, **start)
    assert demo["y_after"] == pytest.approx(9, rel=1e-12)
    ramp = table("wave", ("Supply", "ramp", 10, 0.02))
    parts = dict(DIVIDER) | {"value_of_part_value_1": 0.0, "value_of_y_level": 2.0}
    demo.put(**parts, **ramp)
    tau, t = 8e3 * 2.2e-6, 0.02  # y = k (t - tau (1 - exp(-t / tau))), k = 8 V in 20 ms
    assert demo["y_ask"] == pytest.approx(400 * (t - tau * (1 - math.exp(-t / tau))), rel=1e-9)
    opamp = {
        **DIVIDER,
        **table(
            "part",
            ("Supply", "voltage source", "ground", "in", 2, "V", 0),
            ("R1", "resistor", "in", "minus", 10, "kΩ"),
            ("R2", "resistor", "minus", "out", 30, "kΩ"),
            ("C1", "capacitor", "minus", "out", 1, "µF"),
            ("Amp", "op-amp", "ground", "out", None, "-"),
        ),
        **table("extra", ("Amp", "ground minus")),
    }
    demo.put(**{**opamp, "value_of_y_level": -3.0, "value_of_y_lower": -10.0})
    assert demo["tau"] == pytest.approx(30e-3, rel=1e-12)
    assert demo["y_ask"] == pytest.approx(-6 * (1 - math.exp(-20 / 30)), rel=1e-12)


def test_two_capacitors_joined_share_their_charge_and_warn(demo: Filled) -> None:
    """Equal capacitors, one charged: half the voltage each (check value, common practice)."""
    shared = {
        **DIVIDER,
        **table(
            "part",
            ("C1", "capacitor", "a", "ground", 1, "mF"),
            ("S1", "switch", "a", "b", 1, "-", 0),
            ("C2", "capacitor", "b", "ground", 1, "mF"),
            ("R1", "resistor", "b", "ground", 10, "Ω"),
        ),
        **table("ask", ("voltage across", "C1")),
        **table("extra", ("C1", None, 10), ("C2", None, 0)),
        **table("port"),
    }
    demo.put(**shared)
    assert demo["y_before"] == pytest.approx(10, rel=1e-12)
    assert demo["y_after"] == pytest.approx(5, rel=1e-12)
    assert demo["tau"] == pytest.approx(20e-3, rel=1e-12)
    assert "store_jumps" in demo.warnings()
    assert texts(demo, "list_stores_words", 3) == ["voltage across C1", "voltage across C2", ""]
    assert texts(demo, "list_stores_before", 2) == ["10.00 V", "0 V"]
    assert texts(demo, "list_stores_after", 2) == ["5.000 V", "5.000 V"]


def test_the_table_is_read_back_in_words(demo: Filled) -> None:
    demo.put()
    assert texts(demo, "list_elements_words", 7) == [
        "Supply: voltage source 110.0 V from ground to plus",
        "Contact: switch open from plus to coil, until t = 0 closed",
        "Economy: resistor 60.00 Ω from plus to coil",
        "Coil_R: resistor 40.00 Ω from coil to iron",
        "Coil_L: inductor 4.000 H from iron to ground",
        "Damper: resistor 400.0 Ω from coil to ground",
        "",
    ]
    demo.put(**DIVIDER, **table("extra", ("C1", None, 9)),
             **table("wave", ("Supply", "ramp", 10, 0.02)))  # fmt: skip
    said = texts(demo, "list_elements_words", 4)
    assert said[0].startswith("Supply: voltage source 24.00 V from ground to in, until t = 0 0 V")
    assert said[0].rstrip().endswith("plus ramp 10 0.02")
    assert said[1] == "1: resistor 10.00 kΩ from in to out"
    assert said[3] == "C1: capacitor 2.200 µF from out to ground, starts at 9"


def test_power_balance_of_the_elements(demo: Filled) -> None:
    demo.put()
    current = demo["y_ask"]
    coil_voltage = (110 / 60 - current) / (1 / 60 + 1 / 400)
    powers = [
        -110 * ((110 - coil_voltage) / 60),
        0.0,
        (110 - coil_voltage) ** 2 / 60,
        current**2 * 40,
        current * (coil_voltage - current * 40),
        coil_voltage**2 / 400,
    ]
    assert sum(powers) == pytest.approx(0, abs=1e-10)
    assert demo["P_all"] == pytest.approx(sum(map(abs, powers)), rel=1e-12)


def test_capitals_in_units_count(demo: Filled) -> None:
    demo.put(**{**DIVIDER, "value_of_part_unit_3": "MΩ"})
    assert demo["R_seen"] == pytest.approx(1 / (1e-4 + 1 / 40e6), rel=1e-12)
    demo.put(**{**DIVIDER, "value_of_part_unit_3": "mΩ"})
    assert demo["R_seen"] == pytest.approx(1 / (1e-4 + 25), rel=1e-12)
    assert len({unit.casefold() for unit in network.UNITS}) < len(network.UNITS)


def test_a_slip_in_a_node_is_warned_of(demo: Filled) -> None:
    demo.put(value_of_part_to_6="grund")
    assert "node_with_one_connection" in demo.warnings()
    assert texts(demo, "list_elements_words", 6)[5] == "Damper: resistor 400.0 Ω from coil to grund"


def test_second_order_fails_with_its_reason(demo: Filled) -> None:
    demo.put(value_of_part_kind_6="capacitor", value_of_part_unit_6="µF")
    assert demo["verdict"] == "FAIL"
    assert "not_of_first_order" in demo.warnings()
    assert isinstance(demo["tau"], ErrorKind)
    assert demo["check_time"] == "FAIL"


FAULTS: list[tuple[dict[str, Any], str, str]] = [
    ({"value_of_part_value_4": None}, "part", "element 4: needs its value as a number"),
    ({"value_of_part_value_4": 0}, "part", "element 4: has a resistance, capacitance or induct"),
    ({"value_of_part_value_4": -40}, "part", "element 4: has a resistance, capacitance or ind"),
    ({"value_of_part_before_5": 0}, "part", "element 5: has a value until t = 0 that is not"),
    ({"value_of_part_value_2": 2}, "part", "element 2: a switch has the value 1"),
    ({"value_of_part_before_2": 0.5}, "part", "element 2: a switch is 1, closed"),
    ({"value_of_part_unit_5": "F"}, "part", "element 5: its unit does not fit its kind"),
    ({"value_of_part_unit_4": "-"}, "part", "element 4: its unit does not fit its kind"),
    ({"value_of_part_kind_4": "diode"}, "part", "element 4: kind is not one of the list"),
    ({"value_of_part_kind_4": "op-amp"}, "part", "element 4: needs its value as a number (an op"),
    (table("extra", ("Coil", None, 1)), "extra", "line 1: is no element of the table above"),
    (table("extra", ("Coil_L",)), "extra", "line 1: says neither what controls"),
    (table("wave", ("Suply", "step", 1)), "wave", "line 1: is no element of the table above"),
]


@pytest.mark.parametrize(("cells", "symbol", "sentence"), FAULTS)
def test_what_cannot_be_meant(
    demo: Filled, cells: dict[str, Any], symbol: str, sentence: str
) -> None:
    demo.put(**cells)
    assert demo[f"remark_on_{symbol}"].startswith(sentence)
    assert demo["verdict"] == "FAIL"
    assert isinstance(demo["tau"], ErrorKind)


@pytest.mark.parametrize(
    ("cells", "check"),
    [
        ({"value_of_y_upper": 3.0}, "high"),
        ({"value_of_y_lower": 0.94}, "low"),
        ({"value_of_t_allowed": 101.0}, "time"),
        ({"value_of_t_own": 46.0}, "own"),
    ],
)
def test_each_check_fails_by_its_own_limit(demo: Filled, cells: dict[str, Any], check: str) -> None:
    results = demo.put(**cells).checks()
    assert {key for key, result in results.items() if result == "FAIL"} == {check}


def test_a_balance_that_is_off_fails(tmp_path: Path) -> None:
    """No input can make it so: the formula of one element's power is spoilt."""
    spoilt = []
    for formed in SHEET.formed:
        if formed.name == "state":
            first, *others = formed.rows
            formed = replace(formed, rows=((*first[:2], f"({first[2]})*1.00001"), *others))
        spoilt.append(formed)
    off = Filled.demo(replace(SHEET, formed=tuple(spoilt)), tmp_path).put()
    assert {key for key, result in off.checks().items() if result == "FAIL"} == {"balance"}


def test_a_level_that_is_never_crossed_fails(demo: Filled) -> None:
    demo.put(value_of_y_level=0.5)
    assert demo["check_time"] == "FAIL"
    assert demo["decided_by"].startswith("Time until the level is crossed: no result")


def test_units_may_be_typed_in_plain_letters() -> None:
    given = {"part.unit.1": "kohm", "part.unit.2": "uF", "part.unit.3": "Mohm"}
    cells = values_tables.read(SHEET, given, demo=False)["part"].cells
    assert [cells[i, "unit"] for i in (1, 2, 3)] == ["kΩ", "µF", "MΩ"]
