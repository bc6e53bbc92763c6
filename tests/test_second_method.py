"""The second method of `tausheet verify`, against closed forms in mpmath at 50 digits.

The closed forms are written out here: solutions of tau dy/dt + y = x(t) by an integrating factor.
"""

from __future__ import annotations

import math
import random
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import mpmath as mp
import pytest

from tausheet.addin.review import second_method
from tausheet.addin.review.second_method_course import Course, constant
from tausheet.addin.review.second_method_results import METHODS
from tausheet.addin.review.verify import verify
from tausheet.functions.catalogue import CATALOGUE

mp.mp.dps = 50


def natural(t: Any, tau: Any, start: Any) -> Any:
    return start * mp.exp(-mp.mpf(t) / tau)


def step(t: Any, tau: Any, start: Any, end: Any) -> Any:
    return end + (start - end) * mp.exp(-mp.mpf(t) / tau)


def ramp(t: Any, tau: Any, start: Any, a: Any, b: Any, duration: Any) -> Any:
    """x = a + k t: y = a + k (t - tau) + (start - a + k tau) exp(-t / tau), then a step."""
    k = (mp.mpf(b) - a) / duration
    u = min(mp.mpf(t), mp.mpf(duration))
    y = a + k * (u - tau) + (start - a + k * tau) * mp.exp(-u / tau)
    return y if t <= duration else step(mp.mpf(t) - duration, tau, y, b)


def sine(t: Any, tau: Any, start: Any, amplitude: Any, f: Any, degrees: Any, offset: Any) -> Any:
    """The settled part is Im(A exp(j(w t + phase)) / (1 + j w tau))."""
    w = 2 * mp.pi * f
    settled = amplitude * mp.exp(1j * mp.pi * mp.mpf(degrees) / 180) / (1 + 1j * w * mp.mpf(tau))
    now = offset + (settled * mp.exp(1j * w * mp.mpf(t))).imag
    return now + (start - offset - settled.imag) * mp.exp(-mp.mpf(t) / tau)


def decay(t: Any, tau: Any, start: Any, amplitude: Any, source: Any, offset: Any) -> Any:
    """x = offset + A exp(-t / s): A s / (s - tau) (exp(-t / s) - exp(-t / tau))."""
    t, tau, source = mp.mpf(t), mp.mpf(tau), mp.mpf(source)
    own = amplitude * source / (source - tau) * (mp.exp(-t / source) - mp.exp(-t / tau))
    return step(t, tau, start, offset) + own


def time_to(level: Any, tau: Any, start: Any, end: Any) -> Any:
    return tau * mp.log((mp.mpf(end) - start) / (mp.mpf(end) - level))


def i2t(tau: Any, start: Any, end: Any, t_from: Any, t_to: Any) -> Any:
    """(end + d e)^2 integrated: end^2 t - 2 end d tau e - d^2 tau e^2 / 2."""
    d = mp.mpf(start) - end

    def whole(t: Any) -> Any:
        e = mp.exp(-mp.mpf(t) / tau)
        return end**2 * mp.mpf(t) - 2 * end * d * tau * e - d**2 * tau * e**2 / 2

    return whole(t_to) - whole(t_from)


def fault(t: Any, rms: Any, r: Any, x: Any, f: Any, degrees: Any) -> Any:
    phi, w = mp.atan2(x, r), 2 * mp.pi * f
    a = mp.pi * mp.mpf(degrees) / 180 - phi
    return mp.sqrt(2) * rms * (mp.sin(w * t + a) - mp.sin(a) * mp.exp(-w * t * r / mp.mpf(x)))


def ripple_pp(tau: Any, low: Any, high: Any, period: Any, duty: Any, _: Any) -> Any:
    a, b = mp.mpf(duty) * period / tau, (1 - mp.mpf(duty)) * period / tau
    return (high - low) * (1 - mp.exp(-a)) * (1 - mp.exp(-b)) / (1 - mp.exp(-a - b))


def peak_factor(r: Any, x: Any) -> Any:
    """The largest of sqrt(1 - 2 cos(u) e + e^2), where its slope is 0."""
    k = mp.mpf(r) / x
    u = mp.findroot(lambda u: mp.sin(u) - k * (mp.exp(-k * u) - mp.cos(u)), 3.0 - r / x)
    e = mp.exp(-k * u)
    return mp.sqrt(1 - 2 * mp.cos(u) * e + e * e)


CASES: list[tuple[str, tuple[Any, ...], Callable[..., Any]]] = [
    ("FO_NATURAL", (1.3, 0.4, 5.0), natural),
    ("FO_NATURAL", (40.0, 0.4, 5.0), natural),  # 100 time constants
    ("FO_STEP", (0.001, 4.0, -3.0, 7.0), step),
    ("FO_STEP", (20.0, 4.0, -3.0, 7.0), step),
    ("FO_RAMP", (0.5, 0.3, 1.0, 0.0, 5.0, 2.0), ramp),
    ("FO_RAMP", (2.5, 0.3, 1.0, 0.0, 5.0, 2.0), ramp),
    ("FO_SINE", (0.013, 0.01, 2.0, 325.0, 50.0, 30.0, 1.0), sine),
    ("FO_SINE", (3.0, 1.0, 2.0, 325.0, 50.0, 30.0, 1.0), sine),
    ("FO_DECAY", (1.0, 1.0, 2.0, 5.0, 0.7, 1.0), decay),
    ("FO_TIME_TO", (60.0, 220.9, 680.0, 0.0), time_to),
    ("FO_TIME_UNTIL_BELOW", (60.0, 220.9, 680.0, 0.0), time_to),
    ("FO_TIME_UNTIL_ABOVE", (4.999, 0.1, 0.0, 5.0), time_to),
    ("FO_RISE_TIME", (2.0, 0.1, 0.9), lambda tau, a, b: tau * mp.log((1 - a) / (1 - mp.mpf(b)))),
    ("FO_SETTLING_TIME", (2.0, 0.001), lambda tau, share: tau * -mp.log(mp.mpf(share))),
    ("FO_TAU_FOR", (60.0, 300.0, 680.0, 0.0), lambda v, t, a, b: t / mp.log((b - a) / (b - v))),
    ("FO_TRIP_TIME", (100.0, 600.0, 80.0, 200.0),
     lambda k, tau, p, i: tau * mp.log((mp.mpf(i) ** 2 - p**2) / (mp.mpf(i) ** 2 - k**2))),
    ("FO_I2T", (0.5, 10.0, 2.0, 0.1, 3.0), i2t),
    ("FO_DISSIPATED", (100.0, "voltage", 2.0, 50.0, 0.0),
     lambda r, q, tau, v, _: tau * v**2 / (2 * r)),
    ("FO_ENERGY_C", (0.0047, 680.0), lambda c, v: mp.mpf(c) * v**2 / 2),
    ("FO_ENERGY_L", (2.0, 3.0), lambda store, i: mp.mpf(store) * i**2 / 2),
    ("FO_C_FOR_ENERGY", (32.0, 100.0, 60.0), lambda w, a, b: 2 * mp.mpf(w) / (a**2 - b**2)),
    ("FO_RIDE_THROUGH", (0.01, 100.0, 60.0, 500.0, "current"),
     lambda c, a, b, i, _: c * (a - b) / i),
    ("FO_RIDE_THROUGH", (0.01, 100.0, 60.0, 500.0, "power"),
     lambda c, a, b, p, _: mp.mpf(c) * (a**2 - b**2) / (2 * p)),
    ("FO_FAULT_CURRENT", (0.01, 1e4, 0.1, 1.0, 50.0, 10.0), fault),
    ("FO_PEAK_FACTOR", (0.1, 1.0), peak_factor),
    ("FO_RIPPLE", (1.0, 0.0, 10.0, 0.2, 0.3, "pp"), ripple_pp),
    ("FO_GAIN_DB", (1000.0, 0.001), lambda f, tau: -10 * mp.log10(1 + (2 * mp.pi * f * tau) ** 2)),
    ("FO_PHASE", (1000.0, 0.001, "high-pass"),
     lambda f, tau, _: 90 - mp.degrees(mp.atan(2 * mp.pi * f * tau))),
    ("FO_CORNER_FREQUENCY", (0.001,), lambda tau: 1 / (2 * mp.pi * mp.mpf(tau))),
    ("FO_NOISE_BANDWIDTH", (0.001,), lambda tau: 1 / (4 * mp.mpf(tau))),
    ("FO_TAU_RC", (4700.0, 0.001), lambda r, c: mp.mpf(r) * c),
    ("FO_TAU_RL", (4.0, 0.5), lambda r, inductance: mp.mpf(inductance) / r),
    ("FO_TAU_RX", (0.1, 1.0, 50.0), lambda r, x, f: x / (2 * mp.pi * f * r)),
]  # fmt: skip


def outcome(name: str, arguments: tuple[Any, ...], result: Any) -> second_method.Outcome:
    (one,) = second_method.check(name, arguments, result)
    return one


@pytest.mark.parametrize(("name", "arguments", "closed"), CASES)
def test_the_closed_form_is_confirmed_and_a_wrong_value_found(
    name: str, arguments: tuple[Any, ...], closed: Callable[..., Any]
) -> None:
    true = float(closed(*arguments))
    found = outcome(name, arguments, true)
    assert found.checked
    assert found.agrees, (found, true)
    if abs(true) < 1e-20:  # what has died away is compared in the size of the course
        return
    wrong = outcome(name, arguments, true * (1 + 1e-6) + 0.0)
    assert wrong.checked
    assert not wrong.agrees


def test_integration_at_random_times_keeps_eleven_digits() -> None:
    draw = random.Random(6)
    for _ in range(200):
        tau, start, end = draw.uniform(1e-6, 1e3), draw.uniform(-1e3, 1e3), draw.uniform(-1e3, 1e3)
        t = tau * 10 ** draw.uniform(-3, 2)
        true = float(step(t, tau, start, end))
        assert Course(tau, start, constant(end)).at(t) == pytest.approx(true, rel=0, abs=1e-9)


def test_a_source_table_and_its_crossing() -> None:
    table = [["step", 5.0, None], ["step", -5.0, 1.0]]
    y = step(1, 1, 0, 5)
    assert outcome("FO_SUPERPOSE", (2.0, 1.0, 0.0, table), float(natural(1, 1, y))).agrees
    first = float(time_to(2.5, 1, 0, 5))
    second = float(1 + mp.log(y / mp.mpf("2.5")))
    assert outcome("FO_CROSSING", (2.5, 1.0, 0.0, table), first).agrees
    assert outcome("FO_CROSSING", (2.5, 1.0, 0.0, table, "falling"), second).agrees
    late = outcome("FO_CROSSING", (2.5, 1.0, 0.0, table), second)  # the second for the first
    assert late.checked
    assert not late.agrees


def test_stages_with_a_hold() -> None:
    stages = [[0.0, 1.0, 5.0, None, None], [2.0, "hold", None, None, None]]
    assert outcome("FO_STAGES", (3.0, 0.0, stages), float(step(2, 1, 0, 5))).agrees
    assert outcome("FO_STAGES_CROSSING", (2.5, 0.0, stages), float(mp.log(2))).agrees


NETWORK = [
    ["Name", "Kind", "From", "To", "Value", "Before"],
    ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
    ["R1", "resistor", "in", "out", 3000.0, None],
    ["R2", "resistor", "out", "ground", 1000.0, None],
    ["C1", "capacitor", "out", "ground", 2e-6, None],
]
"""Seen from C1: 6 V behind 750 ohm, so tau = 1.5 ms (Thevenin, by hand)."""


def test_a_network_stepped_through_all_its_equations() -> None:
    v = float(step(0.002, 0.0015, 0, 6))
    supply = -(24 - v) / 3000
    cases: list[tuple[str, tuple[Any, ...], Any]] = [
        ("FO_NETWORK_AT", (0.002, NETWORK, "voltage at out"), v),
        ("FO_NETWORK_AT", (0.002, NETWORK, "current through R2"), v / 1000),
        ("FO_NETWORK_AT", (0.002, NETWORK, "current through C1"), -supply - v / 1000),
        ("FO_NETWORK_AT", (0.002, NETWORK, "power in Supply"), 24 * supply),
        ("FO_NETWORK_AT", (0.0, NETWORK, "current through C1"), 0.008),
        ("FO_NETWORK_CROSSING", (3.0, NETWORK, "voltage at out"), float(0.0015 * mp.log(2))),
        ("FO_NETWORK", (NETWORK, "tau"), 0.0015),
        ("FO_NETWORK", (NETWORK, "final"), 6.0),
    ]
    for name, arguments, true in cases:
        assert outcome(name, arguments, true).checked, (name, arguments[-1])
        assert outcome(name, arguments, true).agrees, outcome(name, arguments, true)
        assert not outcome(name, arguments, true * (1 + 1e-6)).agrees, (name, arguments[-1])
    (peak,) = second_method.check(
        "FO_NETWORK_PEAK", (NETWORK, "current through C1", -1.0, 1.0), [[0.008, 0.0]]
    )
    assert peak.agrees
    (peak,) = second_method.check(
        "FO_NETWORK_PEAK", (NETWORK, "voltage at out", 0.0, 0.002), [[0.9 * v, 0.0018]]
    )
    assert peak.checked
    assert not peak.agrees


def test_a_range_is_checked_element_by_element() -> None:
    times = [[0.0], [1.0], [2.0]]
    values = [[5.0], [float(natural(1, 2, 5))], [1.0]]
    results = list(second_method.check("FO_NATURAL", (times, 2.0, 5.0), values))
    assert [one.agrees for one in results] == [True, True, False]


def test_a_fit_by_scipy() -> None:
    t = [[0.1 * i] for i in range(40)]
    noise = random.Random(1)
    y = [[5 - 4 * math.exp(-x / 0.7) + noise.gauss(0, 0.01)] for (x,) in t]
    from tausheet.functions import fit

    tau = float(fit(t, y, "tau"))
    assert outcome("FO_FIT", (t, y, "tau"), tau).agrees
    assert not outcome("FO_FIT", (t, y, "tau"), tau * 1.0001).agrees


def test_what_has_no_second_method_is_never_called_checked() -> None:
    for name in CATALOGUE.keys() - METHODS.keys():
        assert second_method.how(name) == ""
        assert not next(second_method.check(name, (1.0,), 1.0)).checked
    assert METHODS.keys() < CATALOGUE.keys()
    from tausheet.functions.errors import ErrorKind

    assert not outcome("FO_STEP", (1.0, 1.0, 0.0, 5.0), ErrorKind.NA).checked


def test_it_imports_nothing_that_computed_the_result() -> None:
    code = (
        "import sys, tausheet.addin.review.second_method; "
        "print([m for m in sys.modules if m.startswith(('tausheet.functions', "
        "'tausheet.templates', 'tausheet.addin.embedded', 'tausheet.addin.cells'))])"
    )
    said = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert said.stdout.strip() == "[]"


def test_a_wrong_function_is_found_in_a_workbook(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The engine is made to compute FO_STEP a millionth too high: all it stores agrees with it."""
    from tausheet.addin import cells
    from tausheet.addin.make import make_sheet

    true = cells.call

    def wrong(name: str, arguments: Any) -> Any:
        result = true(name, arguments)
        return result * (1 + 1e-6) if name == "FO_TIME_UNTIL_BELOW" else result

    monkeypatch.setattr(cells, "call", wrong)
    make_sheet("bleed", tmp_path / "wrong.xlsx", {}, demo=True)
    found = [one for one in verify(tmp_path / "wrong.xlsx").findings if one.counts]
    assert {one.kind for one in found} >= {"second method differs"}
    assert any("FO_TIME_UNTIL_BELOW" in one.found for one in found)
