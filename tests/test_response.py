"""What must hold of every response and step time, whatever the numbers; and published values."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from tausheet import functions as fo
from tausheet.addin import cells
from tausheet.functions.catalogue import CATALOGUE, _evaluate
from tausheet.functions.errors import DomainError, ErrorKind, InputError, NotAvailable, error_codes

LEVEL = st.floats(-1e3, 1e3)
SHARE = st.floats(0.0, 1.0)
TAU = st.floats(-9, 6).map(lambda e: 10.0**e)
LAGS = st.one_of(st.just(0.0), st.floats(-12, math.log10(700.0)).map(lambda e: 10.0**e))
"""A time in time constants."""

# the levels that a response is linear in, then what else its forcing has, in its own order
FORCINGS: dict[str, tuple[str, ...]] = {
    "natural": (),
    "step": ("level", "delay"),
    "ramp": ("level", "level", "time"),
    "sine": ("level", "frequency", "angle", "level"),
    "decay": ("level", "lag", "level"),
    "pulse": ("level", "level", "time", "time"),
    "square": ("level", "level", "period", "share"),
}
DRAWN = {
    "level": LEVEL,
    "delay": LAGS,
    "time": LAGS,
    "frequency": LAGS,
    "angle": st.floats(-720, 720),
    "lag": LAGS.filter(bool),
    "period": st.floats(1e-3, 1e3),
    "share": SHARE,
}
NAMES = st.sampled_from(sorted(FORCINGS))


def in_units_of_tau(name: str, tau: float, values: list[float]) -> list[float]:
    """Drawn in time constants, made seconds and hertz."""
    scale = {"delay": tau, "time": tau, "lag": tau, "period": tau, "frequency": 1 / tau}
    return [v * scale.get(kind, 1.0) for kind, v in zip(FORCINGS[name], values, strict=True)]


@st.composite
def calls(draw: st.DrawFn, names: st.SearchStrategy[str] = NAMES) -> tuple[str, float, list[float]]:
    name = draw(names)
    values = [draw(DRAWN[kind]) for kind in FORCINGS[name]]
    return name, draw(TAU), values


def y(name: str, t: Any, tau: float, initial: float, forcing: list[float]) -> Any:
    return getattr(fo, name)(t, tau, initial, *forcing)


def size(name: str, initial: float, forcing: list[float]) -> float:
    own = zip(FORCINGS[name], forcing, strict=True)
    return max(abs(initial), *(abs(v) for kind, v in own if kind == "level"), 1e-300)


@given(calls(), LAGS, LEVEL, LEVEL)
def test_superposition(
    call: tuple[str, float, list[float]], lags: float, first: float, second: float
) -> None:
    """The response to everything is the response to nothing but the forcing plus the natural."""
    name, tau, values = call
    forcing, t = in_units_of_tau(name, tau, values), lags * tau
    both = y(name, t, tau, first + second, forcing)
    apart = y(name, t, tau, first, forcing) + fo.natural(t, tau, second)
    if name == "step":  # rests, rather than decays, until its delay
        assume(t > forcing[1])
        apart = y(name, t, tau, first, forcing) + fo.natural(t - forcing[1], tau, second)
    scale = size(name, abs(first) + abs(second), forcing)
    assert abs(both - apart) <= 1e-13 * max(1, lags / 350) * scale


@given(calls(), LAGS, LEVEL, st.integers(-40, 40))
def test_scaling_levels_and_time(
    call: tuple[str, float, list[float]], lags: float, initial: float, power: int
) -> None:
    """Powers of two change no digit."""
    name, tau, values = call
    k = 2.0**power
    forcing, t = in_units_of_tau(name, tau, values), lags * tau
    plain = y(name, t, tau, initial, forcing)
    own = list(zip(FORCINGS[name], forcing, strict=True))
    assume(all(abs(v) > 1e-200 for _, v in own if v))
    larger = [v * k if kind == "level" else v for kind, v in own]
    assert y(name, t, tau, initial * k, larger) == plain * k
    slower = [
        v * k if kind in ("delay", "time", "lag", "period") else v / k if kind == "frequency" else v
        for kind, v in own
    ]
    assert y(name, t * k, tau * k, initial, slower) == pytest.approx(
        plain, rel=1e-13, abs=1e-15 * size(name, initial, forcing)
    )


@given(calls(st.sampled_from(["natural", "step", "ramp", "pulse", "square"])), LAGS, LEVEL)
def test_y_stays_between_the_levels(
    call: tuple[str, float, list[float]], lags: float, initial: float
) -> None:
    name, tau, values = call
    forcing = in_units_of_tau(name, tau, values)
    levels = [v for kind, v in zip(FORCINGS[name], forcing, strict=True) if kind == "level"]
    hull = [initial, *levels, *([0.0] if name == "natural" else [])]
    result = y(name, lags * tau, tau, initial, forcing)
    assert min(hull) <= result <= max(hull)


@given(calls(), LEVEL, st.integers(0, 10**7))
def test_y_is_continuous_at_every_break(
    call: tuple[str, float, list[float]], initial: float, period: int
) -> None:
    """One step of the numbers before, at and after a switching moment: no jump, no gap."""
    name, tau, values = call
    forcing = in_units_of_tau(name, tau, values)
    breaks = [0.0]
    if name in ("step", "ramp"):
        breaks.append(forcing[-1])
    elif name == "pulse":
        breaks += [forcing[3], forcing[3] + forcing[2]]
    elif name == "square":
        breaks += [period * forcing[2], (period + forcing[3]) * forcing[2]]
    for moment in breaks:
        around = [math.nextafter(moment, -math.inf), moment, math.nextafter(moment, math.inf)]
        results = [y(name, t, tau, initial, forcing) for t in around]
        # what y can move in two steps of the numbers, and the rounding of the results
        allowed = 2 * size(name, initial, forcing) * (2 * math.ulp(moment) / tau + 1e-15)
        assert max(results) - min(results) <= allowed


@given(calls(), LEVEL)
def test_it_rests_at_initial_until_it_is_switched(
    call: tuple[str, float, list[float]], initial: float
) -> None:
    name, tau, values = call
    forcing = in_units_of_tau(name, tau, values)
    assert y(name, -tau, tau, initial, forcing) == initial
    assert y(name, 0.0, tau, initial, forcing) == initial


@given(calls(), LEVEL)
def test_alone_in_a_column_and_in_a_table_it_is_the_same(
    call: tuple[str, float, list[float]], initial: float
) -> None:
    name, tau, values = call
    forcing = in_units_of_tau(name, tau, values)
    t = np.array([-1.0, 0.0, 1e-12, 0.3, 0.7, 5.0, 700.0]) * tau
    column = y(name, t, tau, initial, forcing)
    table = y(name, t.reshape(-1, 1), np.array([tau, 3 * tau]), initial, forcing)
    for row, one in enumerate(t):
        alone = y(name, float(one), tau, initial, forcing)
        scale = 4 * np.spacing(max(size(name, initial, forcing), abs(alone)))
        assert abs(alone - column[row]) <= scale
        assert abs(alone - table[row, 0]) <= scale


def test_a_long_column_is_its_parts() -> None:
    """Longer than the blocks in which it is worked on, early and late moments mixed."""
    rng = np.random.default_rng(4)
    t = rng.permutation(np.linspace(-1, 12, 100_001)).reshape(-1, 1)
    for name, forcing in {
        "natural": [],
        "step": [5.0, 0.3],
        "ramp": [1.0, 5.0, 2.0],
        "sine": [5.0, 3.0, 30.0, 1.0],
        "decay": [5.0, 1.5, 1.0],
        "pulse": [1.0, 5.0, 2.0, 0.3],
        "square": [1.0, 5.0, 0.3, 0.4],
    }.items():
        whole = y(name, t, 1.0, 2.0, forcing)
        assert whole.shape == t.shape
        for row in range(0, len(t), 977):
            alone = y(name, float(t[row, 0]), 1.0, 2.0, forcing)
            assert abs(whole[row, 0] - alone) <= 4 * np.spacing(5.0)


def test_a_column_handed_in_is_neither_changed_nor_handed_back() -> None:
    t = np.linspace(0.0, 1.0, 50_000)
    kept = t.copy()
    first = fo.step(t, 1.0, 0.0, 5.0)
    first[:] = 0.0
    assert np.array_equal(t, kept)
    lends = replace(CATALOGUE["FO_TAU_RC"], kernel=lambda resistance, _: resistance)
    assert not np.may_share_memory(_evaluate(lends, [t, 1.0]).value(), t)


def test_in_a_long_column_only_the_wrong_moments_are_errors() -> None:
    t = np.linspace(0.0, 10.0, 100_000)
    t[[5, 70_000]] = np.nan, np.inf
    codes = error_codes(fo.step(t, 1.0, 0.0, 5.0))
    assert np.flatnonzero(codes).tolist() == [5, 70_000]
    assert set(codes[[5, 70_000]]) == {ErrorKind.NUM.value}


@given(TAU, LEVEL, LEVEL, st.floats(1e-9, 1 - 1e-9), LAGS)
def test_the_response_is_at_the_level_at_the_time_to_it(
    tau: float, initial: float, final: float, share: float, delay: float
) -> None:
    level = initial + (final - initial) * share
    assume(min(initial, final) < level < max(initial, final))
    t = fo.time_to(level, tau, initial, final, delay * tau)
    allowed = 1e-14 * max(abs(initial), abs(final)) * max(1.0, delay)
    assert abs(fo.step(t, tau, initial, final, delay * tau) - level) <= allowed
    until = fo.time_until_below if final < initial else fo.time_until_above
    assert until(level, tau, initial, final) == fo.time_to(level, tau, initial, final)
    own_tau = fo.tau_for(level, 1.0, initial, final)
    assert abs(fo.step(1.0, own_tau, initial, final) - level) <= allowed


@given(LEVEL, TAU, LEVEL, LEVEL)
def test_below_is_above_upside_down(level: float, tau: float, initial: float, final: float) -> None:
    below = cells.plain_grid(cells.call("FO_TIME_UNTIL_BELOW", [level, tau, initial, final]))
    above = cells.plain_grid(cells.call("FO_TIME_UNTIL_ABOVE", [-level, tau, -initial, -final]))
    assert below == above
    if initial <= level and final <= level:
        assert below == 0.0
    elif final >= level:
        assert below is ErrorKind.NA


@given(TAU, st.floats(1e-6, 0.5), st.floats(0.5, 1 - 1e-6))
def test_rise_and_settling_times_by_the_response(tau: float, low: float, high: float) -> None:
    assume(low < high)
    rise = fo.rise_time(tau, low, high)
    assert rise == pytest.approx(
        fo.time_to(high, tau, 0.0, 1.0) - fo.time_to(low, tau, 0.0, 1.0), rel=1e-9, abs=1e-14 * tau
    )
    settled = fo.step(fo.settling_time(tau, low), tau, 0.0, 1.0)
    assert settled == pytest.approx(1 - low, rel=1e-14)


NEVER = [
    (fo.time_to, (5.0, 1.0, 0.0, 5.0), "level is 5, which is never reached .* from initial, 0, to"),
    (fo.time_until_below, (5.0, 1.0, 9.0, 5.0), "y never stays at or below level, 5, on its way"),
    (fo.time_until_above, (5.0, 1.0, 1.0, 5.0), "y never stays at or above level, 5, on its way"),
    (fo.tau_for, (5.0, 1.0, 0.0, 5.0), "level is 5, which is not strictly between initial, 0, and"),
]


@pytest.mark.parametrize(("function", "arguments", "sentence"), NEVER)
def test_what_never_comes_says_so(
    function: Any, arguments: tuple[float, ...], sentence: str
) -> None:
    with pytest.raises(NotAvailable, match=sentence):
        function(*arguments)
    assert error_codes(function([arguments[0]] * 2, *arguments[1:])).tolist() == [32767] * 2


def test_rise_needs_its_shares_in_order() -> None:
    for low, high in ((0.9, 0.1), (0.5, 0.5)):
        with pytest.raises(DomainError, match=r"high is .*, which is not above low, .*; enter a"):
            fo.rise_time(1.0, low, high)


# ---- parts in parallel


@pytest.mark.parametrize(
    ("values", "error", "sentence"),
    [
        ([1.0, -2.0], DomainError, "FO_PARALLEL: values is -2; allowed: number >= 0"),
        ([1.0, math.nan], DomainError, "FO_PARALLEL: values is nan"),
        ([1.0, math.inf], DomainError, "FO_PARALLEL: values is inf"),
        ([1.0, 10**400], DomainError, "FO_PARALLEL: values is 1000"),
        ([1.0, "10k"], InputError, 'FO_PARALLEL: values is the text "10k"'),
        ([None, ""], InputError, "FO_PARALLEL: values is blank"),
        (None, InputError, "FO_PARALLEL: values is blank"),
        ([], InputError, "FO_PARALLEL: values: a range must have at least one cell"),
        (
            [[1.0, 2.0], [3.0]],
            InputError,
            "FO_PARALLEL: values: the rows of a range must",
        ),
    ],
)
def test_parallel_refuses(values: Any, error: type[Exception], sentence: str) -> None:
    with pytest.raises(error, match=sentence):
        fo.parallel(values)
    assert CATALOGUE["FO_PARALLEL"].reason([values]).startswith(sentence)


@pytest.mark.parametrize("kind", list(ErrorKind))
def test_parallel_passes_an_error_on(kind: ErrorKind) -> None:
    assert cells.plain_grid(cells.call("FO_PARALLEL", [[[1.0, kind]]])) is kind
    assert cells.plain_grid(cells.call("FO_PARALLEL", [[[1.0, "x", kind]]])) is kind


# ---- published values and common practice


def test_common_practice() -> None:
    """ln 9 from 10 % to 90 %, 63.2 % at tau, 99.3 % at 5 tau, bandwidth x rise time = 0.35."""
    assert round(fo.rise_time(1.0), 3) == 2.197
    assert fo.rise_time(1.0) == pytest.approx(math.log(9), rel=1e-15)
    assert round(100 * fo.step(1.0, 1.0, 0.0, 1.0), 1) == 63.2
    assert round(100 * fo.step(5.0, 1.0, 0.0, 1.0), 1) == 99.3
    assert round(fo.rise_time(2.0) / (2 * math.pi * 2.0), 2) == 0.35


@pytest.mark.parametrize("bits", [8, 12, 16, 24])
def test_settling_to_half_a_least_bit(bits: int) -> None:
    """(N + 1) ln 2 time constants for N bits (common practice)."""
    expected = (bits + 1) * math.log(2)
    assert fo.settling_time(1.0, 0.5 ** (bits + 1)) == pytest.approx(expected, rel=1e-15)


def test_copper_and_aluminium_by_the_standards() -> None:
    """IEC 60028: 0.00393 per kelvin at 20 C for copper, that is a straight line to -234.45 C.

    IEC 60034-1 rounds the lines to 235 + T for copper and 225 + T for aluminium: the two rules
    agree to the third digit. The aluminium coefficient, 0.00403 of IEC 60889, is from memory.
    """
    assert fo.resistance_at(1.0, 21.0) - 1.0 == pytest.approx(0.00393, rel=1e-12)
    assert fo.resistance_at(1.0, 21.0, "Aluminium") - 1.0 == pytest.approx(0.00403, rel=1e-12)
    assert fo.resistance_at(1.0, 20.0) == fo.resistance_at(1.0, 20.0, "aluminium") == 1.0
    for temperature in (-40.0, 0.0, 75.0, 120.0, 155.0):
        for material, rounded in (("copper", 235), ("aluminium", 225)):
            by_rule = (rounded + temperature) / (rounded + 20)
            assert fo.resistance_at(1.0, temperature, material) == pytest.approx(by_rule, rel=0.011)
    assert round(1 / 0.00393, 2) == 254.45 == 234.45 + 20
