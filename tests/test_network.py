"""Networks worked by hand, and every refusal with its sentence.

Circuit facts are common practice (any textbook of electric circuits); the numbers are worked out
beside each check.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from tausheet.functions import (
    equivalent,
    network,
    network_at,
    reason,
)
from tausheet.functions.errors import (
    DomainError,
    ErrorKind,
    InputError,
    NotAvailable,
    error_codes,
    error_kind,
)

HEADINGS = ["Name", "Kind", "From", "To", "Value", "Before", "Start", "Control"]
HEADINGS += ["Shape", "A", "B", "C", "D", "E"]


def table(*rows: tuple[Any, ...]) -> list[list[Any]]:
    return [HEADINGS, *([*row, *[None] * (len(HEADINGS) - len(row))] for row in rows)]


def one(name: str, kind: str, tail: Any, head: Any, value: Any = None, **more: Any) -> tuple:
    shape = more.pop("shape", ())
    row = [name, kind, tail, head, value]
    row += [more.get(heading) for heading in ("before", "start", "control")]
    return (*row, *shape)


CHARGE = table(
    one("Supply", "voltage source", "ground", "in", 24.0, before=0.0),
    one("R1", "resistor", "in", "out", 1000.0),
    one("C1", "capacitor", "out", "ground", 1e-6),
)
"""24 V switched onto 1 kilohm and 1 microfarad: tau 1 ms."""


# ---- facts -----------------------------------------------------------------------------------


def test_charging() -> None:
    assert network(CHARGE) == (1.0, 0.001, 1000.0, 0.0, 24.0)
    t = np.array([[-1.0], [0.0], [1e-3], [5e-3]])
    expected = 24 * (1 - np.exp(-np.maximum(t, 0) / 1e-3))
    np.testing.assert_allclose(network_at(t, CHARGE, "voltage at out"), expected, rtol=1e-14)
    assert network_at(1e-3, CHARGE, "current through C1") == pytest.approx(0.024 / math.e)
    assert network_at(0.0, CHARGE, "power in Supply") == pytest.approx(-24 * 0.024)
    assert network_at(2.0, CHARGE, "voltage across Supply") == 24.0


def test_thevenin_of_a_divider() -> None:
    """24 V over 3 k and 1 k: 6 V open, 8 mA joined, 750 ohm; a capacitor there has tau 0.75 ms."""
    divider = [
        one("Supply", "voltage source", "ground", "in", 24.0, before=0.0),
        one("R1", "resistor", "in", "out", 3000.0),
        one("R2", "resistor", "out", "ground", 1000.0),
    ]
    assert equivalent(table(*divider), "out", "ground") == pytest.approx((6.0, 0.008, 750.0))
    assert equivalent(table(*divider), "ground", "out", "voltage") == pytest.approx(-6.0)
    loaded = table(*divider, one("C1", "capacitor", "out", "ground", 1e-6))
    assert network(loaded) == pytest.approx((1, 7.5e-4, 750, 0, 6))


def test_wheatstone_bridge() -> None:
    """10 V; arms 100 and 150 ohm, 200 and 300 ohm: balanced; 330 for 300: 0.226 V, 178.5 ohm."""

    def bridge(r4: float) -> list[list[Any]]:
        return table(
            one("Supply", "voltage source", "earth", "top", 10.0),
            one("R1", "resistor", "top", "left", 100.0),
            one("R2", "resistor", "left", "earth", 150.0),
            one("R3", "resistor", "top", "right", 200.0),
            one("R4", "resistor", "right", "earth", r4),
        )

    assert equivalent(bridge(300.0), "left", "right", "voltage") == 0.0
    voltage = 10 * (150 / 250 - 330 / 530)
    resistance = 100 * 150 / 250 + 200 * 330 / 530
    assert equivalent(bridge(330.0), "left", "right") == pytest.approx(
        (voltage, voltage / resistance, resistance)
    )


def test_a_balanced_bridge_from_computed_values_is_balanced() -> None:
    """R4 = R2 R3 / R1 as a cell computes it (702.1276595744681) still balances exactly."""
    rows = table(
        one("Supply", "voltage source", "earth", "top", 10.0),
        one("R1", "resistor", "top", "left", 4700.0),
        one("R2", "resistor", "left", "earth", 3300.0),
        one("R3", "resistor", "top", "right", 1000.0),
        one("R4", "resistor", "right", "earth", 1000 * 3300 / 4700),
    )
    assert equivalent(rows, "left", "right", "voltage") == 0.0


def test_inductor_current_and_free_wheel() -> None:
    """24 V, coil 12 ohm and 0.6 H: 2 A; on opening it dies away through 48 ohm: tau 10 ms."""
    coil = table(
        one("Supply", "voltage source", "ground", "in", 24.0),
        one("S1", "switch", "in", "a", "open", before="closed"),
        one("Rcoil", "resistor", "a", "b", 12.0),
        one("Coil", "inductor", "b", "ground", 0.6),
        one("Rd", "resistor", "a", "ground", 48.0),
    )
    assert network(coil) == pytest.approx((1, 0.01, 60, 2, 0))
    assert network_at(-1.0, coil, "voltage at a") == pytest.approx(24.0)
    assert network_at(0.0, coil, "voltage at a") == pytest.approx(-96.0)
    assert network_at(0.01, coil, "current through coil") == pytest.approx(2 / math.e)
    assert network_at(0.0, coil, "voltage across S1") == pytest.approx(120.0)


def test_op_amp_integrator() -> None:
    """1 V into 10 k, 1 uF back to the output: -100 V/s; order 0, tau and final do not exist."""
    rows = table(
        one("Vin", "voltage source", "ground", "in", 1.0, before=0.0),
        one("R1", "resistor", "in", "minus", 1e4),
        one("C1", "capacitor", "minus", "out", 1e-6, start=0.0),
        one("U1", "op-amp", "ground", "out", control="ground minus"),
    )
    result = network(rows)
    assert result.order == 0.0
    assert result.initial == 0.0
    for name in ("tau", "final", "resistance"):
        assert error_kind(getattr(result, name)) is ErrorKind.NA
        with pytest.raises(NotAvailable):
            network(rows, name)
    assert network_at(0.3, rows, "voltage at out") == pytest.approx(-30.0)
    assert network_at(0.3, rows, "current through U1") == pytest.approx(-1e-4)


def test_op_amp_low_pass() -> None:
    """Feedback 20 k parallel 1 uF, input 10 k: gain -2, tau 20 ms."""
    rows = table(
        one("Vin", "voltage source", "ground", "in", 1.0, before=0.0),
        one("R1", "resistor", "in", "minus", 1e4),
        one("R2", "resistor", "minus", "out", 2e4),
        one("C1", "capacitor", "minus", "out", 1e-6),
        one("U1", "op-amp (ideal)", "ground", "out", control="ground minus"),
    )
    assert network(rows) == pytest.approx((1, 0.02, 2e4, 0, 2))
    assert network_at(0.02, rows, "voltage at out") == pytest.approx(-2 * (1 - 1 / math.e))


def test_charge_moves_from_one_capacitor_to_another() -> None:
    """C1 - R - C2: one natural frequency that is not zero, one that is (check-values.md).

    1 uF at 10 V and 3 uF at 0 V through 100 ohm: both end at 2.5 V, tau = R C1 C2 / (C1 + C2).
    """
    rows = table(
        one("C1", "capacitor", "a", "ground", 1e-6, start=10.0),
        one("S1", "switch", "a", "b", "closed", before="open"),
        one("R1", "resistor", "b", "c", 100.0),
        one("C2", "capacitor", "c", "ground", 3e-6, start=0.0),
    )
    assert network(rows) == pytest.approx((1, 75e-6, 100, 10, 2.5))
    assert network_at(75e-6, rows, "voltage at c") == pytest.approx(2.5 * (1 - 1 / math.e))


def test_charge_shared_between_capacitors() -> None:
    """1 uF at 10 V switched onto 3 uF: both at 2.5 V at once; then they discharge together."""
    rows = table(
        one("C1", "capacitor", "a", "ground", 1e-6, start=10.0),
        one("S1", "switch", "a", "b", "closed", before="open"),
        one("C2", "capacitor", "b", "ground", 3e-6, start=0.0),
        one("R1", "resistor", "b", "ground", 100.0),
    )
    assert network(rows) == pytest.approx((1, 4e-4, 100, 2.5, 0))
    assert network_at(-1.0, rows, "voltage across C1") == 10.0
    assert network_at(0.0, rows, "voltage across C2") == pytest.approx(2.5)
    with pytest.raises(NotAvailable, match="impulse"):
        network_at(0.0, rows, "current through S1")
    assert network_at(1e-9, rows, "current through S1") == pytest.approx(0.025 / 4, rel=1e-4)


def test_flux_is_conserved() -> None:
    """1 H carrying 3 A put in series with 2 H carrying nothing: 1 A in both."""
    rows = table(
        one("Supply", "current source", "ground", "a", 0.0, before=3.0),
        one("Ra", "resistor", "a", "ground", 60.0),
        one("L1", "inductor", "a", "m", 1.0),
        one("S1", "switch", "m", "ground", "open", before="closed"),
        one("L2", "inductor", "m", "ground", 2.0, start=0.0),
    )
    result = network(rows)
    assert result == pytest.approx((1, 3 / 60, 60, 1, 0))
    with pytest.raises(NotAvailable, match="impulse"):
        network_at(0.0, rows, "voltage at m")
    assert network_at(0.05, rows, "current through L2") == pytest.approx(1 / math.e)


def test_a_capacitor_that_changes_keeps_its_charge() -> None:
    """10 V on 1 uF that becomes 4 uF at t = 0 behind 1 k: 2.5 V, back to 10 V with tau 4 ms."""
    rows = table(
        one("Supply", "voltage source", "ground", "in", 10.0),
        one("R1", "resistor", "in", "out", 1000.0),
        one("C1", "capacitor", "out", "ground", 4e-6, before=1e-6),
    )
    assert network(rows) == pytest.approx((1, 4e-3, 1000, 2.5, 10))
    assert network_at(-1.0, rows, "voltage at out") == pytest.approx(10.0)


def test_a_step_forced_onto_a_capacitor() -> None:
    """Two capacitors across a source that steps later: the divider jumps, the current is #N/A."""
    rows = table(
        one("V1", "voltage source", "ground", "in", 0.0, shape=("step", 12.0, 2.0)),
        one("C1", "capacitor", "in", "mid", 1e-6),
        one("C2", "capacitor", "mid", "ground", 3e-6),
        one("R1", "resistor", "mid", "ground", 1e6),
    )
    result = network(rows)
    assert result[:4] == pytest.approx((1, 4.0, 1e6, 0))
    assert network_at(1.9, rows, "voltage at mid") == 0.0
    assert network_at(2.0, rows, "voltage at mid") == pytest.approx(3.0)
    assert network_at(6.0, rows, "voltage at mid") == pytest.approx(3 / math.e)
    answers = network_at([1.0, 2.0, 6.0], rows, "current through C1")
    assert error_codes(answers).tolist() == [0, ErrorKind.NA.value, 0]
    assert "impulse" in reason("FO_NETWORK_AT", 2.0, rows, "current through C1")


def test_a_capacitor_across_a_ramp_takes_c_dv_dt() -> None:
    rows = table(
        one("V1", "voltage source", "ground", "in", 0.0, shape=("ramp", 10.0, 2.0)),
        one("C1", "capacitor", "in", "ground", 1e-3),
        one("R1", "resistor", "in", "out", 100.0),
        one("C2", "capacitor", "out", "ground", 1e-3),
    )
    assert network(rows, "order") == 1.0
    assert network_at(1.0, rows, "current through C1") == pytest.approx(5e-3)
    assert network_at(3.0, rows, "current through C1") == 0.0


def test_op_amp_differentiator_before_a_low_pass() -> None:
    """-R C dv/dt of a 50 Hz sine, then 1 k and 1 uF; the input capacitor's Start is redundant."""
    rows = table(
        one("V1", "voltage source", "ground", "in", 0.0, shape=("sine", 1.0, 50.0)),
        one("C1", "capacitor", "in", "minus", 1e-6, start=0.0),
        one("R1", "resistor", "minus", "out", 1e4),
        one("U1", "op-amp", "ground", "out", control="ground minus"),
        one("R2", "resistor", "out", "p", 1e3),
        one("C2", "capacitor", "p", "ground", 1e-6),
        one("E1", "voltage-controlled voltage source", "ground", "e", 0.0, control="out p"),
        one("RE", "resistor", "e", "ground", 1.0),
    )
    assert network(rows, "tau") == pytest.approx(1e-3)
    assert network(rows, "initial") == 0.0
    t = np.linspace(0.0, 0.02, 9)
    expected = -1e-2 * 100 * math.pi * np.cos(100 * math.pi * t)
    np.testing.assert_allclose(network_at(t, rows, "voltage at out"), expected, atol=1e-13)
    assert network_at(0.005, rows, "voltage at e") == 0.0


def test_controlled_sources() -> None:
    """1 mF into 100 ohm; a v-c current source of 2.5 mS across it adds 400 ohm in parallel."""
    rows = table(
        one("V1", "voltage source", "ground", "in", 10.0, before=0.0),
        one("R1", "resistor", "in", "out", 100.0),
        one("C1", "capacitor", "out", "ground", 1e-3),
        one(
            "G1", "voltage-controlled current source", "out", "ground", 2.5e-3, control="out ground"
        ),
        one("E1", "voltage-controlled voltage source", "ground", "e", -3.0, control="out ground"),
        one("RE", "resistor", "e", "ground", 10.0),
        one("H1", "current-controlled voltage source", "ground", "h", 50.0, control="R1"),
        one("RH", "resistor", "h", "ground", 10.0),
        one("F1", "current-controlled current source", "ground", "f", 4.0, control="v1"),
        one("RF", "resistor", "f", "ground", 10.0),
    )
    assert network(rows) == pytest.approx((1, 0.08, 80, 0, 8))
    assert network_at(1e3, rows, "voltage at e") == pytest.approx(-24.0)
    assert network_at(1e3, rows, "voltage at h") == pytest.approx(1.0)
    assert network_at(1e3, rows, "voltage at f") == pytest.approx(0.8)


def test_bootstrapped_resistance() -> None:
    """A Howland current source into a capacitor integrates exactly: order 0 (matched resistors)."""
    rows = table(
        one("Vin", "voltage source", "ground", "in", 1.0, before=0.0),
        one("R1", "resistor", "in", "load", 1000.0),
        one("R2", "resistor", "load", "out", 1000 * 3300 / 4700),
        one("R3", "resistor", "ground", "minus", 4700.0),
        one("R4", "resistor", "minus", "out", 3300.0),
        one("U1", "op-amp", "ground", "out", control="load minus"),
        one("C1", "capacitor", "load", "ground", 1e-6, start=0.0),
    )
    assert network(rows, "order") == 0.0
    assert network_at(1e-3, rows, "voltage at load") == pytest.approx(1.0, rel=1e-12)


def test_values_of_every_size_keep_their_order() -> None:
    """1 milliohm against a gigohm leak: tau = C (R + leak), not lost in the sum."""
    rows = table(
        one("C1", "capacitor", "a", "ground", 1e-12, start=5.0),
        one("R1", "resistor", "a", "b", 1e-3),
        one("R2", "resistor", "b", "ground", 1e12),
        one("R3", "resistor", "b", "c", 1e-3),
        one("R4", "resistor", "c", "b", 2e-3),
    )
    assert network(rows, "tau") == pytest.approx(1.0, rel=1e-14)


def test_names_and_headings() -> None:
    """Headings in any order, numbers as nodes (1 is 1.0), no difference between a and A."""
    rows = [
        ["To", "Value", "name", "From", "Kind"],
        [1, 10.0, "V", "ground", "Voltage Source"],
        [2.0, 100.0, "r", "1", "RESISTOR"],
        [None, None, None, None, None],
        ["GROUND", 1e-3, "C", 2, "capacitor"],
    ]
    assert network(rows) == pytest.approx((1, 0.1, 100, 10, 10))
    assert network_at(0.0, rows, "Voltage  at 2") == pytest.approx(10.0)
    assert network_at(0.0, rows, "current through R") == 0.0
    assert network_at(0.0, rows, "voltage at ground") == 0.0


# ---- refusals --------------------------------------------------------------------------------

V1 = one("V1", "voltage source", "ground", "a", 10.0)
R1 = one("R1", "resistor", "a", "b", 1000.0)
C1 = one("C1", "capacitor", "b", "ground", 1e-6)

REFUSED: list[tuple[type[Exception], str, list[list[Any]]]] = [
    (
        InputError,
        "of order 2: the stores C1 and L1 move independently",
        table(V1, R1, C1, one("L1", "inductor", "b", "ground", 1e-3)),
    ),
    (
        InputError,
        "of order 3: the stores C1, C2 and C3 move",
        table(
            V1,
            R1,
            C1,
            one("R2", "resistor", "b", "c", 10.0),
            one("C2", "capacitor", "c", "ground", 1e-6),
            one("R3", "resistor", "c", "d", 10.0),
            one("C3", "capacitor", "d", "ground", 1e-6),
        ),
    ),
    (
        InputError,
        "order 0 and has no zero natural frequency: it has no capacitor or inductor",
        table(V1, one("R1", "resistor", "a", "ground", 1.0)),
    ),
    (
        InputError,
        "order 0 and has no zero natural frequency: C1 cannot move freely",
        table(V1, one("C1", "capacitor", "a", "ground", 1e-6)),
    ),
    (
        InputError,
        "floating part: nothing connects nodes x and y with the reference",
        table(V1, R1, C1, one("R9", "resistor", "x", "y", 1.0)),
    ),
    (
        InputError,
        "floating part: nothing connects node x",
        table(V1, R1, C1, one("S1", "switch", "x", "b", "open", before="closed")),
    ),
    (
        InputError,
        "loop of voltage sources: V1 and V2",
        table(V1, R1, C1, one("V2", "voltage source", "ground", "a", 10.0)),
    ),
    (
        InputError,
        "loop of voltage sources: S1, S2 and V1",
        table(
            one("S1", "switch", "a", "x", "closed"),
            one("S2", "switch", "x", "ground", "closed"),
            V1,
            R1,
            C1,
        ),
    ),
    (
        InputError,
        "loop of voltage sources: V1 and E1",
        table(
            V1,
            R1,
            C1,
            one("E1", "voltage-controlled voltage source", "ground", "a", 1.0, control="b ground"),
        ),
    ),
    (
        InputError,
        "cut of current sources: only I1 and I2 lead to node x",
        table(
            V1,
            R1,
            C1,
            one("I1", "current source", "ground", "x", 1.0),
            one("I2", "current source", "x", "a", 1.0),
        ),
    ),
    (
        InputError,
        "no single solution: its equations do not determine .*op-amp is fed back",
        table(V1, R1, C1, one("U1", "op-amp", "ground", "b", control="a ground")),
    ),
    (
        InputError,
        "integrates an integral, .* in C1 and C2",
        table(
            V1,
            one("Ra", "resistor", "a", "m", 1e3),
            one("C1", "capacitor", "m", "o", 1e-6, start=0.0),
            one("U1", "op-amp", "ground", "o", control="ground m"),
            one("Rb", "resistor", "o", "n", 1e3),
            one("C2", "capacitor", "n", "p", 1e-6, start=0.0),
            one("U2", "op-amp", "ground", "p", control="ground n"),
        ),
    ),
    (
        DomainError,
        r"natural frequency that grows, as exp\(t / 0.001 s\), with C1",
        table(
            V1,
            R1,
            C1,
            one("G1", "voltage-controlled current source", "ground", "b", 2e-3, control="b ground"),
        ),
    ),
    (
        InputError,
        "before t = 0 does not determine the charge of C1; enter in Start",
        table(V1, one("S1", "switch", "a", "b", "closed", before="open"), R1, C1)[:2]
        + table(
            one("S1", "switch", "a", "x", "closed", before="open"),
            one("R1", "resistor", "x", "b", 10.0),
            C1,
        )[1:],
    ),
    (
        InputError,
        "before t = 0 does not determine the flux of L1 and L2",
        table(
            V1,
            R1,
            one("L1", "inductor", "b", "ground", 1.0),
            one("L2", "inductor", "b", "ground", 1.0),
        ),
    ),
    (
        InputError,
        r"before t = 0 contradicts itself .* of C1; enter in Start",
        table(
            one("I1", "current source", "ground", "b", 1.0),
            C1,
        ),
    ),
    (InputError, "the name R1 is used twice .row 3 too.", table(V1, R1, R1, C1)),
    (InputError, "the name r1 is used twice", table(R1, one("r1", *R1[1:5]), V1, C1)),
    (
        InputError,
        r"row 3 \(R1\): Value is blank: a missing value; enter the resistance",
        table(V1, one("R1", "resistor", "a", "b"), C1),
    ),
    (
        InputError,
        r'row 3 \(R1\): Value is the text "4k7", not a number',
        table(V1, one("R1", "resistor", "a", "b", "4k7"), C1),
    ),
    (
        DomainError,
        r"row 3 \(R1\): Value is 0; allowed: number > 0; .*a short is a closed switch",
        table(V1, one("R1", "resistor", "a", "b", 0.0), C1),
    ),
    (
        DomainError,
        r"row 4 \(C1\): Before is -1; allowed: number > 0",
        table(V1, R1, one("C1", "capacitor", "b", "ground", 1e-6, before=-1.0)),
    ),
    (
        InputError,
        'Kind is the text "coil"; allowed: resistor, capacitor, ',
        table(V1, one("L1", "coil", "a", "b", 1.0), C1),
    ),
    (InputError, "Kind is blank", table(V1, one("L1", None, "a", "b", 1.0), C1)),  # type: ignore[arg-type]
    (InputError, "Name is blank", table(V1, one(None, "resistor", "a", "b", 1.0), C1)),  # type: ignore[arg-type]
    (InputError, "To is blank", table(V1, one("R1", "resistor", "a", None, 1.0), C1)),
    (InputError, "From and To are the same", table(V1, one("R1", "resistor", "a", "A", 1.0), C1)),
    (
        InputError,
        'Value is the text "shut"; enter the position, "open" or "closed"',
        table(V1, one("S1", "switch", "a", "b", "shut"), C1),
    ),
    (
        InputError,
        "no reference node; name one node reference, ground or earth",
        table(one("V1", "voltage source", "0", "a", 1.0), one("R1", "resistor", "a", "0", 1.0)),
    ),
    (
        InputError,
        "has 2 reference nodes, ground and Earth",
        table(V1, R1, one("C1", "capacitor", "b", "Earth", 1e-6)),
    ),
    (
        InputError,
        "Control is X9, which is no element",
        table(
            V1,
            R1,
            C1,
            one(
                "F1", CCCS := "current-controlled current source", "b", "ground", 1.0, control="X9"
            ),
        ),
    ),
    (
        InputError,
        "Control is C1, which is no resistor and no source",
        table(V1, R1, C1, one("F1", CCCS, "b", "ground", 1.0, control="C1")),
    ),
    (
        InputError,
        "Control is blank; enter the name of the resistor",
        table(V1, R1, C1, one("F1", CCCS, "b", "ground", 1.0)),
    ),
    (
        InputError,
        "Control is a x, which does not name two nodes of the table",
        table(V1, R1, C1, one("U1", "op-amp", "ground", "u", control="a x")),
    ),
    (
        InputError,
        'Control is blank; enter two nodes as "node node"',
        table(V1, R1, C1, one("U1", "op-amp", "ground", "u")),
    ),
    (
        InputError,
        "Start is 3, but a resistor has none",
        table(V1, one("R1", "resistor", "a", "b", 1.0, start=3.0), C1),
    ),
    (
        InputError,
        'Start is the text "x", not a number',
        table(V1, R1, one("C1", "capacitor", "b", "ground", 1.0, start="x")),
    ),
    (
        InputError,
        "Value is 1, but an op-amp has none",
        table(V1, R1, C1, one("U1", "op-amp", "ground", "u", 1.0, control="a u")),
    ),
    (
        InputError,
        'Shape is the text "sine", but a resistor has none',
        table(V1, one("R1", "resistor", "a", "b", 1.0, shape=("sine", 1.0, 1.0)), C1),
    ),
    (
        InputError,
        'row 2 .V1.: .*"wobble"',
        table(one("V1", "voltage source", "ground", "a", 1.0, shape=("wobble", 1.0)), R1, C1),
    ),
    (
        InputError,
        'heading 6 is the text "Tolerance"; known headings: Name, Kind',
        [
            ["Name", "Kind", "From", "To", "Value", "Tolerance"],
            ["R", "resistor", "a", "b", 1.0, 2.0],
        ],
    ),
    (
        InputError,
        "heading 6 is blank",
        [["Name", "Kind", "From", "To", "Value", None], ["R", "resistor", "a", "b", 1.0, 2.0]],
    ),
    (
        InputError,
        "heading Value is repeated",
        [["Name", "Kind", "From", "To", "Value", "Value"], ["R", "resistor", "a", "b", 1.0, 2.0]],
    ),
    (
        InputError,
        "heading Value is missing",
        [["Name", "Kind", "From", "To"], ["R", "resistor", "a", "b"]],
    ),
    (InputError, "no row under its heading", [HEADINGS]),
]


@pytest.mark.parametrize(("kind", "sentence", "rows"), REFUSED, ids=lambda x: str(x)[:40])
def test_refusal(kind: type[Exception], sentence: str, rows: list[list[Any]]) -> None:
    for _ in range(2):  # a refusal that is remembered says the same
        with pytest.raises(kind, match=sentence):
            network(rows)
    with pytest.raises(kind):
        network_at(0.0, rows, "voltage at a")
    assert reason("FO_NETWORK", rows).startswith("FO_NETWORK: network")


def test_order_is_given_whatever_it_is() -> None:
    assert network(table(V1, R1, C1, one("L1", "inductor", "b", "ground", 1.0)), "order") == 2.0
    assert network(table(V1, one("R1", "resistor", "a", "ground", 1.0)), "order") == 0.0
    grows = one("G1", "voltage-controlled current source", "ground", "b", 1.0, control="b ground")
    assert network(table(V1, R1, C1, grows), "order") == 1.0


def test_tau_needs_no_start() -> None:
    """What the state before t = 0 leaves open concerns values, not the time constant."""
    rows = table(
        V1,
        one("S1", "switch", "a", "x", "closed", before="open"),
        one("R1", "resistor", "x", "b", 10.0),
        C1,
    )
    assert network(rows, "tau") == pytest.approx(1e-5)
    assert network(rows, "resistance") == pytest.approx(10.0)
    for what in (None, "initial"):
        with pytest.raises(InputError, match="Start"):
            network(rows, what)


@pytest.mark.parametrize(
    ("quantity", "sentence"),
    [
        ("voltage at q", "which is no node of the table; its nodes are in, out and ground"),
        ("voltage across q", "q, which is no element of the table; its elements are Supply, R1"),
        ("resistance of R1", 'allowed: "voltage at NODE"'),
        ("voltage at", 'allowed: "voltage at NODE"'),
        (None, "quantity is blank"),
        ([["voltage at in", "voltage at out"]], "must be a single cell"),
    ],
)
def test_unknown_quantity(quantity: Any, sentence: str) -> None:
    with pytest.raises(InputError, match=sentence):
        network_at(0.0, CHARGE, quantity)


def test_error_values_pass_through_a_table() -> None:
    rows = [list(row) for row in CHARGE]
    rows[2][4] = ErrorKind.REF
    with pytest.raises(Exception, match="network holds the error #REF!"):
        network(rows)


def test_what_equivalents_do_not_exist() -> None:
    ideal = table(V1, R1, C1)
    assert equivalent(ideal, "a", "ground", "voltage") == 10.0
    assert equivalent(ideal, "a", "ground", "resistance") == 0.0
    with pytest.raises(NotAvailable, match="no short-circuit current"):
        equivalent(ideal, "a", "ground", "current")
    feed = table(
        one("I1", "current source", "ground", "x", 2.0), one("C1", "capacitor", "x", "ground", 1.0)
    )
    assert equivalent(feed, "x", "ground", "current") == 2.0
    with pytest.raises(NotAvailable, match="nothing settles the open-circuit voltage"):
        equivalent(feed, "x", "ground", "voltage")
    with pytest.raises(NotAvailable, match="resistance between them is infinite"):
        equivalent(feed, "x", "ground", "resistance")
    with pytest.raises(NotAvailable, match="integrates a source"):
        equivalent(
            table(*feed[1:], V1, R1, one("R2", "resistor", "b", "ground", 1.0)), "b", "ground"
        )
    stays = table(
        one("C1", "capacitor", "x", "ground", 1.0),
        V1,
        R1,
        one("R2", "resistor", "b", "ground", 1.0),
    )
    held = equivalent(stays, "x", "ground")
    assert held.current == 0.0
    assert error_kind(held.voltage) is error_kind(held.resistance) is ErrorKind.NA
    assert equivalent(stays, "b", "ground", "resistance") == pytest.approx(1000 / 1001)


def test_equivalent_refuses() -> None:
    with pytest.raises(InputError, match="to_node is q, which is no node of the table; its"):
        equivalent(CHARGE, "out", "q")
    with pytest.raises(InputError, match="from_node and to_node are both out"):
        equivalent(CHARGE, "out", "OUT")
    grows = table(
        V1,
        R1,
        C1,
        one("G1", "voltage-controlled current source", "ground", "b", 2e-3, control="b ground"),
        one("R2", "resistor", "b", "c", 1.0),
        one("C2", "capacitor", "c", "ground", 1e-6),
    )
    with pytest.raises(DomainError, match="grows, so it never settles"):
        equivalent(grows, "b", "ground")
