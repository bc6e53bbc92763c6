"""Crossings, extremes and energy of networks: against hand calculation, samples and quadrature."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tausheet.addin.cells import call, plain_grid
from tausheet.functions import (
    crossing,
    network_at,
    network_crossing,
    network_energy,
    network_peak,
    peak,
    reason,
)
from tausheet.functions.errors import (
    DomainError,
    ErrorKind,
    InputError,
    NotAvailable,
    error_codes,
)

HEADINGS = ["Name", "Kind", "From", "To", "Value", "Before", "Start", "Control"]
HEADINGS += ["Shape", "A", "B", "C", "D", "E"]


def table(*rows: tuple[Any, ...]) -> list[list[Any]]:
    return [HEADINGS, *([*row, *[None] * (len(HEADINGS) - len(row))] for row in rows)]


def low_pass(shape: tuple[Any, ...], value: float = 0.0) -> list[list[Any]]:
    """R 2 kilohm, C 250 microfarad: tau 0.5 s; a second capacitor hangs on the source."""
    return table(
        ("V1", "voltage source", "ground", "in", value, 0.0, None, None, *shape),
        ("R1", "resistor", "in", "out", 2000.0),
        ("C1", "capacitor", "out", "ground", 250e-6),
        ("C2", "capacitor", "in", "ground", 40e-6),
    )


SHAPES: list[tuple[Any, ...]] = [
    ("constant", 5.0),
    ("step", 5.0, 0.2),
    ("ramp", 5.0, 0.7, 0.2),
    ("slope", 1.5, 0.2),
    ("sine", 5.0, 1.3, 40.0, 0.2),
    ("decay", 5.0, 0.5, 0.2),
    ("decay", 5.0, 0.5000000001, 0.2),
    ("pulse", 5.0, 0.4, 0.2),
    ("square", -3.0, 5.0, 0.6, 0.4, 0.2),
]
SHARED = table(
    ("C1", "capacitor", "a", "ground", 1e-6, None, 10.0),
    ("S1", "switch", "a", "b", "closed", "open"),
    ("C2", "capacitor", "b", "ground", 3e-6, None, 0.0),
    ("R1", "resistor", "b", "ground", 100.0),
)
"""Charge shared at t = 0: 10 V becomes 2.5 V, then dies away with 0.4 ms."""


@pytest.mark.parametrize("shape", SHAPES, ids=str)
@pytest.mark.parametrize("level", [1.3, -0.4, 3.9])
def test_the_output_of_a_low_pass_crosses_as_the_plain_response_does(
    shape: tuple[Any, ...], level: float
) -> None:
    """The same forcing and tau without a network: FO_CROSSING, which has checks of its own."""
    rows, plain = low_pass(shape), [list(shape)]
    for count in (1, 2, 5):
        try:
            expected = crossing(level, 0.5, 0.0, plain, "either", count)
        except NotAvailable:
            with pytest.raises(NotAvailable, match="does not pass the level"):
                network_crossing(level, rows, "voltage at out", "either", count)
            continue
        got = network_crossing(level, rows, "voltage at out", "either", count)
        assert got == pytest.approx(expected, rel=1e-13)
    window = (0.1, 7.0)
    assert network_peak(rows, "voltage at out", *window) == pytest.approx(
        peak(0.5, 0.0, plain, *window), rel=1e-13
    )


@pytest.mark.parametrize("shape", SHAPES, ids=str)
@pytest.mark.parametrize("quantity", ["current through R1", "current through V1", "voltage at in"])
def test_crossings_and_extremes_against_samples(shape: tuple[Any, ...], quantity: str) -> None:
    """20,000 samples: no passage that they show is missed, no sample beyond the extremes."""
    rows = low_pass(shape)
    t = np.linspace(1e-6, 5.0, 20_001)
    q = network_at(t, rows, quantity)
    fine = error_codes(q) == 0
    t, q = t[fine], q[fine]
    for kind, best in (("max", q.max()), ("min", q.min())):
        found = network_peak(rows, quantity, float(t[0]), float(t[-1]), kind)
        step = np.abs(np.diff(q)).max()
        assert abs(found.value - best) <= step + 1e-12
        assert (found.value - best) * (1 if kind == "max" else -1) >= -1e-12 * np.abs(q).max()
    level = float(q.min() + 0.6180339 * (q.max() - q.min()))
    passed = np.flatnonzero(np.diff(np.sign(q - level)))
    for count, index in enumerate(passed[:4], start=1):
        found = network_crossing(level, rows, quantity, "either", count, float(t[0]))
        assert t[index] <= found <= t[index + 1]


def test_a_jump_counts_at_its_moment() -> None:
    assert network_crossing(5.0, SHARED, "voltage across C1", "falling", 1, -1.0) == 0.0
    with pytest.raises(NotAvailable):
        network_crossing(5.0, SHARED, "voltage across C1")
    expected = 4e-4 * math.log(2.5)
    assert network_crossing(1.0, SHARED, "voltage across C1") == pytest.approx(expected, rel=1e-14)
    assert network_peak(SHARED, "voltage across C1", -1.0, 1.0) == (10.0, -1.0)
    assert network_peak(SHARED, "voltage across C1", 0.0, 1.0) == pytest.approx((2.5, 0.0))
    assert network_peak(SHARED, "voltage across C2", -2.0, -1.0, "abs") == (0.0, -2.0)


def test_a_square_of_a_million_periods() -> None:
    """Settled: current after an edge is 10 V / 2 k / (1 + exp(-0.6)) in alternating sense."""
    rows = low_pass(("square", -5.0, 5.0, 0.6, 0.5))
    settled = 10 / 2000 / (1 + math.exp(-0.6))
    high, _ = network_peak(rows, "current through R1", 6e5, 6.00001e5)
    assert high == pytest.approx(settled, rel=1e-12)
    late = network_crossing(0.0, rows, "current through R1", "rising", 1_000_000)
    assert late == pytest.approx(0.6 * 1_000_000, rel=1e-9)
    with pytest.raises(NotAvailable):
        network_crossing(1.01 * settled, rows, "current through R1", "rising", 2)


def test_an_integrator_driven_by_a_slope_and_by_a_square() -> None:
    """C v' = t: v = t^2 / 2 passes 2 V after 2 s; a square of mean 0.5 A passes at last."""
    slope = table(
        ("I1", "current source", "ground", "a", 0.0, None, None, None, "slope", 1.0),
        ("C1", "capacitor", "a", "ground", 1.0, None, 0.0),
    )
    assert network_crossing(2.0, slope, "voltage at a") == pytest.approx(2.0, rel=1e-14)
    square = table(
        (
            "I1",
            "current source",
            "ground",
            "a",
            0.0,
            None,
            None,
            None,
            "square",
            0.0,
            1.0,
            2.0,
            0.5,
        ),
        ("C1", "capacitor", "a", "ground", 1.0, None, 0.0),
    )
    assert network_crossing(100.25, square, "voltage at a") == pytest.approx(200.25, rel=1e-13)
    with pytest.raises(NotAvailable):
        network_crossing(-1.0, square, "voltage at a")
    with pytest.raises(NotAvailable):
        network_crossing(100.25, square, "voltage at a", "falling")


@pytest.mark.parametrize("shape", SHAPES, ids=str)
@pytest.mark.parametrize("element", ["V1", "R1", "C1"])
def test_peak_power_against_samples(shape: tuple[Any, ...], element: str) -> None:
    """20,000 samples: none lies beyond the extreme, and one lies next to it."""
    rows = low_pass(shape, 1.0)
    t = np.linspace(0.0, 4.0, 20_001)
    p = network_at(t, rows, f"power in {element}")
    t, p = t[error_codes(p) == 0], p[error_codes(p) == 0]
    step = np.abs(np.diff(p)).max()
    for kind, best in (("max", p.max()), ("min", p.min()), ("abs", np.abs(p).max())):
        value, moment = network_peak(rows, f"power in {element}", float(t[0]), 4.0, kind)
        size = {"max": value, "min": -value, "abs": abs(value)}[kind]
        beyond = size - (-best if kind == "min" else best)
        assert -1e-12 * np.abs(p).max() <= beyond <= step + 1e-15
        assert t[0] <= moment <= 4.0


def test_peak_power_into_a_capacitor() -> None:
    """v i = V^2/R (1 - e) e is largest at e = 1/2: V^2/(4 R) at tau ln 2."""
    rows = low_pass((), 12.0)
    value, moment = network_peak(rows, "power in C1", -1.0, 9.0)
    assert value == pytest.approx(144 / 8000, rel=1e-14)
    assert moment == pytest.approx(0.5 * math.log(2), rel=1e-7)
    assert network_peak(rows, "power in R1", 0.0, 9.0) == pytest.approx((144 / 2000, 0.0))
    assert network_peak(rows, "power in R1", -2.0, -1.0) == (0.0, -2.0)


def test_energy_by_hand() -> None:
    """Charging to V: C V^2 / 2 stored and as much lost, whatever the resistance."""
    rows = low_pass((), 12.0)
    whole = 250e-6 * 12**2
    assert network_energy(rows, "C1", 0.0, 50.0) == pytest.approx(whole / 2, rel=1e-13)
    assert network_energy(rows, "R1", 0.0, 50.0) == pytest.approx(whole / 2, rel=1e-13)
    assert network_energy(rows, "V1", 0.0, 50.0) == pytest.approx(-whole, rel=1e-13)
    # across t = 0 the source also charges C2 at once, at half its voltage on the mean
    assert network_energy(rows, "C2", -1.0, 0.0) == pytest.approx(40e-6 * 144 / 2, rel=1e-13)
    assert network_energy(rows, "V1", -1.0, 0.0) == pytest.approx(-40e-6 * 144 / 2, rel=1e-13)


def test_half_the_energy_is_lost_when_charge_is_shared() -> None:
    """1 uF at 10 V onto an equal one: half of 50 uJ goes into the switch (check-values.md)."""
    rows = table(
        ("C1", "capacitor", "a", "ground", 1e-6, None, 10.0),
        ("S1", "switch", "a", "b", "closed", "open"),
        ("C2", "capacitor", "b", "ground", 1e-6, None, 0.0),
        ("R1", "resistor", "b", "ground", 1e9),
    )
    assert network_energy(rows, "S1", -1.0, 0.0) == pytest.approx(25e-6, rel=1e-13)
    assert network_energy(rows, "C2", -1.0, 0.0) == pytest.approx(12.5e-6, rel=1e-13)


@pytest.mark.parametrize("shape", SHAPES, ids=str)
@pytest.mark.parametrize("element", ["V1", "R1", "C1"])
def test_energy_against_quadrature(shape: tuple[Any, ...], element: str) -> None:
    """Gauss-Legendre between the shapes' moments, 40 nodes on each tenth of a second."""
    rows = low_pass(shape)
    moments = [0.44, 0.6, 0.8, 0.9, 1.04, 1.4, 1.64, 2.0, 2.24]
    edges = np.unique(np.round(np.r_[np.linspace(0.3, 2.5, 23), moments], 9))
    nodes, weights = np.polynomial.legendre.leggauss(40)
    half = np.diff(edges)[:, None] / 2
    t = edges[:-1, None] + half * (nodes + 1)
    power = network_at(t, rows, f"power in {element}")
    expected = float((half * weights * power).sum())
    got = network_energy(rows, element, 0.3, 2.5)
    if element == "V1":  # impulses of the current into C2 at the jumps inside the window
        jumps = {"pulse": [(0.6, 5.0, 0.0)]}.get(shape[0], [])
        if shape[0] == "square":
            moments = [0.44, 0.8, 1.04, 1.4, 1.64, 2.0, 2.24]
            levels = [(5.0, -3.0), (-3.0, 5.0)]
            jumps = [(m, *levels[i % 2]) for i, m in enumerate(moments)]
        expected -= sum(40e-6 * (late - early) * (late + early) / 2 for _, early, late in jumps)
    assert got == pytest.approx(expected, rel=1e-11, abs=1e-15)


number = st.floats(-50, 50).map(lambda x: round(x, 3))
positive = st.floats(-2, 2).map(lambda x: round(10**x, 4))


@st.composite
def shapes(draw: Any) -> tuple[Any, ...]:
    word = draw(st.sampled_from(["constant", "step", "ramp", "slope", "sine", "decay", "pulse"]))
    level, time, start = draw(number), draw(positive), draw(positive)
    return {
        "constant": (word, level),
        "step": (word, level, start),
        "ramp": (word, level, time, start),
        "slope": (word, level, start),
        "sine": (word, level, min(time, 3.0), level, start),
        "decay": (word, level, time, start),
        "pulse": (word, level, time, start),
    }[word]


@settings(max_examples=60, deadline=None)
@given(shapes(), number, number, positive, positive, positive, positive, st.booleans())
def test_energy_balance(
    shape: tuple[Any, ...],
    value: float,
    start: float,
    r1: float,
    r2: float,
    c: float,
    t_to: float,
    coil: bool,
) -> None:
    """Stored + dissipated = supplied: common practice (conservation of energy)."""
    kind = "inductor" if coil else "capacitor"
    rows = table(
        ("V1", "voltage source", "ground", "in", value, None, None, None, *shape),
        ("R1", "resistor", "in", "out", r1),
        ("X1", kind, "out", "mid", c, None, start),
        ("R2", "resistor", "mid", "ground", r2),
        ("X2", "capacitor", "in", "ground", c),
    )
    supplied = -network_energy(rows, "V1", -1.0, t_to)
    dissipated = [network_energy(rows, name, -1.0, t_to) for name in ("R1", "R2")]
    stored = [network_energy(rows, name, -1.0, t_to) for name in ("X1", "X2")]
    size = max(map(abs, (supplied, *dissipated, *stored))) + 1e-300
    assert sum(stored) + sum(dissipated) == pytest.approx(supplied, abs=1e-11 * size)
    assert min(dissipated) >= 0
    quantity = "current through X1" if coil else "voltage across X1"
    late = network_at(t_to, rows, quantity)
    # until t = 0 the store is held at its Start by whatever gave it that value
    held = network_energy(rows, "X1", -1.0, -1e-300)
    assert stored[0] - held == pytest.approx(c * (late**2 - start**2) / 2, abs=1e-11 * size)


@settings(max_examples=40, deadline=None)
@given(shapes(), shapes(), positive, positive, positive, positive, st.booleans())
def test_superposition(
    first: tuple[Any, ...],
    second: tuple[Any, ...],
    r1: float,
    r2: float,
    value: float,
    t: float,
    coil: bool,
) -> None:
    """Both sources together do what each does alone, added up: common practice (linearity)."""

    def rows(*shaped: tuple[Any, ...]) -> list[list[Any]]:
        return table(
            ("V1", "voltage source", "ground", "a", 0.0, *[None] * 3, *shaped[0]),
            ("R1", "resistor", "a", "b", r1),
            ("I1", "current source", "ground", "b", 0.0, *[None] * 3, *shaped[1]),
            ("R2", "resistor", "b", "ground", r2),
            ("X1", "inductor" if coil else "capacitor", "b", "ground", value),
        )

    for quantity in ("voltage at b", "current through X1", "current through V1"):
        parts = [network_at(t, rows(*case), quantity) for case in ((first, ()), ((), second))]
        size = max(map(abs, parts)) + 1e-9
        together = network_at(t, rows(first, second), quantity)
        # a current is what is left of the sources' currents through both resistors
        scale = size + 1e-3 * max(abs(first[1]), abs(second[1])) / min(r1, r2)
        assert together == pytest.approx(sum(parts), abs=1e-11 * scale)


def test_refusals() -> None:
    rows = low_pass(("step", 5.0, 0.2))
    with pytest.raises(InputError, match="a power; enter a voltage or a current"):
        network_crossing(1.0, rows, "power in R1")
    with pytest.raises(DomainError, match="t_to is 1, before t_from, 2"):
        network_peak(rows, "voltage at out", 2.0, 1.0)
    with pytest.raises(DomainError, match="t_to is 1, before t_from, 2"):
        network_energy(rows, "R1", 2.0, 1.0)
    with pytest.raises(InputError, match="element is R7, which is no element of the table; its"):
        network_energy(rows, "R7", 0.0, 1.0)
    lost = table(
        ("V1", "voltage source", "ground", "in", 5.0),
        ("S1", "switch", "in", "a", "closed", "open"),
        ("S2", "switch", "a", "b", "closed", "open"),
        ("R1", "resistor", "b", "ground", 10.0),
        ("C1", "capacitor", "b", "ground", 1e-3),
        ("R2", "resistor", "in", "c", 10.0),
        ("C2", "capacitor", "c", "ground", 1e-3),
    )
    with pytest.raises(NotAvailable, match="before t = 0 does not determine the quantity"):
        network_peak(lost, "voltage at a", -1.0, 1.0)
    with pytest.raises(NotAvailable, match="before t = 0 does not determine the quantity"):
        network_at(-1.0, lost, "voltage at a")
    assert network_at(0.0, lost, "voltage at a") == 5.0
    both = reason("FO_NETWORK_ENERGY", lost, "S2", -1.0, 1.0)
    assert "enter a t_from of 0 or later" in both
    many = low_pass(("square", -5.0, 5.0, 1e-4, 0.5))
    with pytest.raises(DomainError, match="more than 2000 jumps of the sources"):
        network_energy(many, "R1", 0.0, 10.0)
    some = network_energy(many, "R1", 0.0, [0.01, 10.0])
    assert error_codes(some).tolist() == [0, ErrorKind.NUM.value]
    with pytest.raises(DomainError, match="more turning points"):
        network_peak(many, "power in R1", 0.0, 10.0)


CALLS = {
    "FO_NETWORK_AT": [("t", 1.0), ("network", None), ("quantity", "voltage at out")],
    "FO_NETWORK_CROSSING": [
        ("level", 1.0),
        ("network", None),
        ("quantity", "voltage at out"),
        ("direction", "rising"),
        ("count", 1.0),
        ("after", 0.0),
    ],
    "FO_NETWORK_PEAK": [
        ("network", None),
        ("quantity", "voltage at out"),
        ("t_from", 0.0),
        ("t_to", 1.0),
        ("kind", "min"),
    ],
    "FO_NETWORK_ENERGY": [("network", None), ("element", "R1"), ("t_from", 0.0), ("t_to", 1.0)],
    "FO_NETWORK": [("network", None), ("what", "tau")],
    "FO_EQUIVALENT": [
        ("network", None),
        ("from_node", "out"),
        ("to_node", "ground"),
        ("what", "voltage"),
    ],
}
OPTIONAL = {"direction", "count", "after", "kind", "what"}
TEXTS = {"quantity", "element", "from_node", "to_node", "direction", "kind", "what"}


@pytest.mark.parametrize("name", CALLS)
def test_each_argument_given_wrongly(name: str) -> None:
    """The right error for each kind of slip, and a sentence that names the argument."""
    good = [low_pass(("step", 5.0)) if a == "network" else value for a, value in CALLS[name]]
    assert reason(name, *good) == ""
    for place, (argument, _) in enumerate(CALLS[name]):
        slips: list[tuple[Any, ErrorKind]] = [(ErrorKind.REF, ErrorKind.REF)]
        if argument not in OPTIONAL:
            slips += [(None, ErrorKind.VALUE), ("", ErrorKind.VALUE)]
        if argument in TEXTS or argument == "network":
            slips += [("wobble", ErrorKind.VALUE), ([["a", "b"]], ErrorKind.VALUE)]
            slips += [] if argument in OPTIONAL else [(0.0, ErrorKind.VALUE)]
        else:
            slips += [
                ("4 V", ErrorKind.VALUE),
                (math.inf, ErrorKind.NUM),
                (math.nan, ErrorKind.NUM),
            ]
        if argument == "count":
            slips += [(0.0, ErrorKind.NUM), (1.5, ErrorKind.NUM), (-1.0, ErrorKind.NUM)]
        for slip, kind in slips:
            arguments = [*good[:place], slip, *good[place + 1 :]]
            shown = plain_grid(call(name, arguments))
            while isinstance(shown, list):
                shown = shown[0]
            assert shown is kind, (argument, slip)
            if kind is not ErrorKind.REF:
                assert argument in reason(name, *arguments), (argument, slip)
