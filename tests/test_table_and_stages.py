"""Table forcings and switching sequences: mpmath at 40 digits, scipy's ODE solver, properties."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mpf
from scipy.integrate import solve_ivp

from tausheet import functions as fo
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import CellError, error_codes


@pytest.fixture(autouse=True)
def _forty_digits() -> Iterator[None]:
    with mpmath.workdps(40):
        yield


def stretch(s: Any, tau: Any, y: Any, a: Any, slope: Any) -> Any:
    return a + slope * (s - tau) + (y - a + slope * tau) * mpmath.exp(-s / tau)


def table(t: float, tau: float, y0: float, times: Any, levels: Any, held: bool) -> Any:
    """The closed form on each stretch, one after the other."""
    points = [(mpf(float(a)), mpf(float(b))) for a, b in zip(times, levels, strict=True)]
    moment, y, tau, t = mpf(0), mpf(y0), mpf(tau), mpf(t)

    def forcing(s: Any, after: bool) -> Any:
        behind = [p for p in points if p[0] < s or (after and p[0] == s)]
        ahead = [p for p in points if p[0] > s or (not after and p[0] == s)]
        if not behind:
            return ahead[0][1]
        if held or not ahead:
            return behind[-1][1]
        (t0, x0), (t1, x1) = behind[-1], ahead[0]
        return x0 + (x1 - x0) * (s - t0) / (t1 - t0)

    for end in sorted({p[0] for p in points if 0 < p[0] < t} | {t}):
        a, b = forcing(moment, True), forcing(end, False)
        if end > moment:
            y = stretch(end - moment, tau, y, a, (b - a) / (end - moment))
        moment = end
    return y


rng = np.random.default_rng(7)


@pytest.mark.parametrize("held", [False, True])
@pytest.mark.parametrize("tau", [1e-6, 1e-2, 1.0, 1e3, 1e9])
@pytest.mark.parametrize("first", [-2.0, 0.0, 0.7])
def test_a_table_is_exact_at_any_time(held: bool, tau: float, first: float) -> None:
    times = first + np.cumsum(rng.exponential(0.2, 40))
    times[10], times[20] = times[9], times[19]
    levels = rng.normal(0, 10, 40)
    asked = np.concatenate([times[times > 0], rng.uniform(0, times[-1] + 3, 40), [0.0, 1e-9]])
    got = fo.table(asked, tau, 1.5, times, levels, held)
    for t, y in zip(asked, got, strict=True):
        exact = table(t, tau, 1.5, times, levels, held)
        assert abs(mpf(float(y)) - exact) <= 1e-13 * 40, t
    assert fo.table(-1.0, tau, 1.5, times, levels, held) == 1.5


def test_a_long_fine_table_does_not_drift() -> None:
    """Steps of a millionth of tau: a rounded factor a step would be off by 1e-11."""
    times = np.cumsum(rng.random(20_000)) * 1e-6
    levels = rng.normal(size=20_000)
    y, before, level = mpf(0.7), mpf(0), mpf(float(levels[0]))
    for moment, x in zip(map(mpf, times.tolist()), map(mpf, levels.tolist()), strict=True):
        y = stretch(moment - before, mpf(1), y, level, (x - level) / (moment - before))
        before, level = moment, x
    for asked in (times, times[-1:], times[::-1]):
        got = fo.table(asked, 1.0, 0.7, times, levels)
        assert abs(mpf(float(got[np.argmax(asked)])) - y) <= 1e-13


def test_a_table_of_a_ramp_is_the_ramp() -> None:
    t = np.linspace(-1, 5, 61)
    got = fo.table(t, 0.8, 2.0, [0.0, 1.5], [1.0, 4.0])
    np.testing.assert_allclose(got, fo.ramp(t, 0.8, 2.0, 1.0, 4.0, 1.5), rtol=1e-14)
    step = fo.table(t, 0.8, 2.0, [0.0, 1.5], [1.0, 4.0], True)
    stages = [[0.0, 0.8, 1.0], [1.5, 0.8, 4.0]]
    np.testing.assert_allclose(step, fo.stages(t, 2.0, stages), rtol=1e-14)


def test_a_table_broadcasts_and_one_point_is_a_level() -> None:
    got = fo.table([[0.5], [1.0]], [[1.0, 2.0]], 0.0, [0.0, 1.0], [0.0, 5.0])
    assert got.shape == (2, 2)
    assert got[1, 1] == fo.table(1.0, 2.0, 0.0, [0.0, 1.0], [0.0, 5.0])
    assert fo.table(2.0, 1.0, 0.0, [7.0], [5.0]) == pytest.approx(fo.step(2.0, 1.0, 0.0, 5.0))


def test_a_table_against_the_differential_equation() -> None:
    times, levels = [0.0, 0.3, 0.3, 1.0, 2.0], [0.0, 4.0, -2.0, 1.0, 3.0]
    y, at = 0.5, 0.0
    for k in range(4):
        span = (times[k], times[k + 1])
        if span[0] == span[1]:
            continue

        def rate(t: float, y: Any, k: int = k) -> Any:
            share = (t - times[k]) / (times[k + 1] - times[k])
            return (levels[k] * (1 - share) + levels[k + 1] * share - y) / 0.4

        y = solve_ivp(rate, span, [y], rtol=1e-11, atol=1e-12).y[0, -1]
        at = span[1]
        assert fo.table(at, 0.4, 0.5, times, levels) == pytest.approx(y, abs=1e-8)


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.floats(0.001, 1), min_size=2, max_size=8),
    st.floats(0.01, 100),
    st.floats(-5, 5),
    st.floats(0.1, 10),
)
def test_a_table_superposes_and_shifts(
    steps: list[float], tau: float, y0: float, shift: float
) -> None:
    times = np.cumsum(steps)
    one, two = rng.normal(size=times.size), rng.normal(size=times.size)
    t = np.linspace(0, times[-1] * 1.5, 17)
    both = fo.table(t, tau, y0, times, one + two)
    apart = fo.table(t, tau, y0, times, one) + fo.table(t, tau, 0.0, times, two)
    np.testing.assert_allclose(both, apart, atol=1e-12)
    rest = [times[0] * 0, *times]  # from rest at the first level, later is the same
    level = [one[0], *one]
    now = fo.table(t, tau, one[0], rest, level)
    later = fo.table(t + shift, tau, one[0], np.array(rest) + shift, level)
    np.testing.assert_allclose(now, later, atol=1e-11)


STAGES = [
    ["Starts at", "Time constant", "Heads for", "Jump to", "Stops at"],
    [0.0, 2.0, 10.0, None, None],
    [1.0, "hold", None, None, None],
    [2.0, "rate", -3.0, None, 0.0],
    [None, None, None, None, None],
    [4.0, 0.5, -8.0, 6.0, -2.0],
    [9.0, 1.0, 1.0, None, None],
]


def test_stages_follow_their_closed_forms() -> None:
    def at(t: float) -> float:
        return fo.stages(t, 1.0, STAGES)

    y1 = 10 - 9 * mpmath.exp(mpf(-1) / 2)
    assert at(1.0) == pytest.approx(float(y1), rel=1e-15)
    assert at(1.9) == at(1.0)
    assert at(2.5) == pytest.approx(float(y1 - mpf("1.5")), rel=1e-14)
    assert at(3.999) == 0.0
    assert at(4.0) == 6.0
    assert at(4.1) == pytest.approx(float(-8 + 14 * mpmath.exp(mpf("-0.2"))), rel=1e-13)
    assert at(8.0) == -2.0
    assert at(9.5) == pytest.approx(float(1 - 3 * mpmath.exp(mpf("-0.5"))), rel=1e-14)
    assert at(-1.0) == 1.0
    column = fo.stages([[0.5], [4.0]], [[1.0, 2.0]], STAGES)
    assert column[0, 0] == at(0.5)
    assert column[1, 1] == 6.0


def test_y_is_continuous_from_stage_to_stage_unless_it_jumps() -> None:
    for start in (1.0, 2.0, 9.0):
        before = fo.stages(np.nextafter(start, 0), 1.0, STAGES)
        assert fo.stages(start, 1.0, STAGES) == pytest.approx(before, abs=1e-13)


@pytest.mark.parametrize(
    ("name", "arguments", "kind", "sentence"),
    [
        ("FO_TABLE", (1, 1, 0, [0, 1], [1]), "#VALUE!", "times has 2 values and levels has 1"),
        (
            "FO_TABLE",
            (1, 1, 0, [0, 2, 1], [1, 1, 1]),
            "#NUM!",
            "times falls from 2 to 1 at point 3",
        ),
        ("FO_TABLE", (1, 1, 0, [0, None], [1, 1]), "#VALUE!", "times is blank"),
        ("FO_TABLE", (1, 1, 0, [0, 1], [1, "x"]), "#VALUE!", 'levels is the text "x"'),
        ("FO_TABLE", (1, 1, 0, [0, 1], [1, float("nan")]), "#NUM!", "levels is nan"),
        ("FO_TABLE", (1, 0, 0, [0, 1], [1, 1]), "#NUM!", "tau is 0"),
        ("FO_TABLE", (1, 1, 0, [0, 1], [1, 1], "x"), "#VALUE!", "held"),
        ("FO_STAGES", (1, 0, [[1, 1, 1]]), "#NUM!", "the first stage starts at 0"),
        ("FO_STAGES", (1, 0, [[0, 1, 1], [0, 1, 1]]), "#NUM!", "not after 0"),
        ("FO_STAGES", (1, 0, [[0, 0, 1]]), "#NUM!", "Time constant is 0"),
        ("FO_STAGES", (1, 0, [[0, "wait", 1]]), "#VALUE!", '"hold" or "rate"'),
        ("FO_STAGES", (1, 0, [[0, 1, None]]), "#VALUE!", "Heads for is blank"),
        ("FO_STAGES", (1, 0, [[0, None, 1]]), "#VALUE!", "Time constant is blank"),
        ("FO_STAGES", (1, 0, [[0, 1, 1, "x"]]), "#VALUE!", "Jump to"),
        ("FO_STAGES", (1, 0, [[0, 1, 1, 1, 1, 1]]), "#VALUE!", "more than the columns"),
        ("FO_STAGES", (1, 0, [[None]]), "#VALUE!", "no row with a stage"),
        ("FO_STAGES", (1, 0, [["starts at", 1, 1]]), "#VALUE!", "Starts at"),
        ("FO_SUPERPOSE", (1, 1, 0, [["wave", 1]]), "#VALUE!", "constant, step, ramp, slope"),
        ("FO_SUPERPOSE", (1, 1, 0, [["sine", 1]]), "#VALUE!", "frequency (Hz) of the sine"),
        ("FO_SUPERPOSE", (1, 1, 0, [["square", 0, 1, 0, 0.5]]), "#NUM!", "C is 0"),
        ("FO_SUPERPOSE", (1, 1, 0, [["square", 0, 1, 1, 1.5]]), "#NUM!", "D is 1.5"),
        ("FO_SUPERPOSE", (1, 1, 0, [["step", 1, -1]]), "#NUM!", "B is -1"),
        ("FO_SUPERPOSE", (1, 1, 0, [["constant", 1, 2]]), "#VALUE!", "nothing there"),
        ("FO_SUPERPOSE", (1, 1, 0, [[None, 1]]), "#VALUE!", "the shape is blank"),
        ("FO_SUPERPOSE", (1, 1, 0, 5), "#VALUE!", "the shape is 5"),
        ("FO_RATE", (1, 1, 0, [["step", "a"]]), "#VALUE!", "level of the step"),
    ],
)
def test_a_wrong_table_is_refused_with_its_place(
    name: str, arguments: tuple[Any, ...], kind: str, sentence: str
) -> None:
    with pytest.raises(CellError) as refused:
        CATALOGUE[name].function(*arguments)
    assert refused.value.kind.text == kind
    assert sentence in str(refused.value)
    assert CATALOGUE[name].reason(arguments) == str(refused.value)


SOURCES: list[list[Any]] = [
    ["Shape", "A", "B", "C", "D", "E"],
    ["constant", 1.0, None, None, None, None],
    ["STEP", 2.0, 0.5, None, None, None],
    ["ramp", 3.0, 0.7, 0.2, None, None],
    ["slope", -0.5, 0.4, None, None, None],
    ["sine", 2.0, 1.5, 40.0, 0.3, None],
    ["decay", -4.0, 0.6, 0.1, None, None],
    ["pulse", 5.0, 0.4, 0.9, None, None],
    ["square", -1.0, 2.0, 0.35, 0.3, 0.15],
]
BREAKS = [0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.9, 1.3]


def source(t: float, row: list[Any]) -> float:
    """The forcing as the interface words it."""
    shape = row[0].lower()
    position = {"constant": 9, "step": 2, "slope": 2, "square": 5, "sine": 4}.get(shape, 3)
    s = t - ((row[position] or 0.0) if position < len(row) else 0.0)
    if s < 0:
        return 0.0
    a, b, c, d = row[1:5]
    return float(
        {
            "constant": lambda: a,
            "step": lambda: a,
            "ramp": lambda: a * min(s / b, 1),
            "slope": lambda: a * s,
            "sine": lambda: a * np.sin(2 * np.pi * b * s + np.radians(c)),
            "decay": lambda: a * np.exp(-s / b),
            "pulse": lambda: a if s < b else 0.0,
            "square": lambda: b if s % c < d * c else a,
        }[shape]()
    )


@pytest.mark.parametrize("rows", [SOURCES, *[[row] for row in SOURCES[1:]]])
def test_a_sum_of_shapes_against_the_differential_equation(rows: list[list[Any]]) -> None:
    """scipy.integrate.solve_ivp between the moments at which a shape changes."""
    shapes = rows[1:] if rows[0][0] == "Shape" else rows
    square = [0.15 + k * 0.35 + on for k in range(6) for on in (0.0, 0.3 * 0.35)]
    edges = sorted({0.0, *BREAKS, *square, 2.0})
    edges = [edge for edge in edges if edge <= 2.0]
    y, tau = 0.25, 0.45
    for start, end in itertools.pairwise(edges):
        edge = 1e-9 * (end - start)

        def rate(t: float, y: Any, low: float = start + edge, high: float = end - edge) -> Any:
            inside = min(max(t, low), high)
            return (sum(source(inside, row) for row in shapes) - y) / tau

        y = solve_ivp(rate, (start, end), [y], rtol=1e-10, atol=1e-11).y[0, -1]
        assert fo.superpose(end, tau, 0.25, rows) == pytest.approx(y, abs=2e-7)


def test_the_rate_is_the_derivative_of_the_response() -> None:
    for t in (0.05, 0.33, 0.61, 1.17, 1.87):
        h = 1e-6
        slope = np.diff(fo.superpose([t - h, t + h], 0.45, 0.25, SOURCES))[0] / (2 * h)
        assert fo.rate(t, 0.45, 0.25, SOURCES) == pytest.approx(slope, rel=1e-7, abs=1e-7)
    for row in SOURCES[1:]:
        for t in (0.05, 0.33, 0.61, 1.17, 1.87):
            slope = np.diff(fo.superpose([t - h, t + h], 0.45, 0.0, [row]))[0] / (2 * h)
            assert fo.rate(t, 0.45, 0.0, [row]) == pytest.approx(slope, rel=1e-6, abs=1e-6)
    assert fo.rate(-1.0, 0.45, 0.25, SOURCES) == 0.0


def test_single_shapes_are_the_single_functions() -> None:
    t = np.linspace(-1, 4, 41)
    for row, expected in [
        (["step", 5.0, 0.5], fo.step(t, 0.8, 0.0, 5.0, 0.5)),
        (["ramp", 5.0, 0.5], fo.ramp(t, 0.8, 0.0, 0.0, 5.0, 0.5)),
        (["sine", 5.0, 3.0, 25.0], fo.sine(t, 0.8, 0.0, 5.0, 3.0, 25.0)),
        (["decay", 5.0, 0.8], fo.decay(t, 0.8, 0.0, 5.0, 0.8)),
        (["pulse", 5.0, 0.5, 1.0], fo.pulse(t, 0.8, 0.0, 0.0, 5.0, 0.5, 1.0)),
        (["square", 1.0, 5.0, 0.5, 0.3], fo.square(t, 0.8, 0.0, 1.0, 5.0, 0.5, 0.3)),
    ]:
        np.testing.assert_allclose(fo.superpose(t, 0.8, 0.0, [row]), expected, rtol=0, atol=4e-15)


def test_only_the_wrong_elements_of_a_range_are_errors() -> None:
    result = fo.superpose([1.0, 2.0, 3.0], [1.0, -1.0, 2.0], 0.0, SOURCES)
    assert (error_codes(result) != 0).tolist() == [False, True, False]
    assert (error_codes(fo.stages([1.0, "x"], 0.0, STAGES)) != 0).tolist() == [False, True]
    assert (error_codes(fo.table([1.0, None], 1.0, 0.0, [0], [5])) != 0).tolist() == [False, True]
