"""Crossings, stays and peaks: closed forms, corner cases, laws that must hold, refusals."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mp, mpf

from tausheet.functions import (
    crossing,
    peak,
    stages_crossing,
    stays_within,
    superpose,
    table,
    table_crossing,
)
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import DomainError, InputError, NotAvailable, error_kind

STEP = [["step", 5.0]]
SQUARE = [["square", 0.0, 1.0, 0.1, 0.5]]


def wave(step, amplitude, frequency, phase=0.0):
    return [["step", step, None, None], ["sine", amplitude, frequency, phase]]


# closed forms, common practice: a step passes its half after ln 2 time constants


def test_step_passes_its_half_after_ln_2():
    assert crossing(2.5, 1.0, 0.0, STEP) == math.log(2)
    assert crossing(2.5, 3.0, 0.0, STEP, "rising") == 3.0 * math.log(2)


def test_level_equal_to_the_settled_value_is_never_passed():
    for rows in (STEP, [["ramp", 5.0, 2.0]], [["step", 5.0, None], ["decay", -1.0, 3.0]]):
        with pytest.raises(NotAvailable):
            crossing(5.0, 1.0, 0.0, rows)


def test_decays_that_overshoot_pass_the_settled_value_once():
    # y - 5 = -5 exp(-t) + 4 (exp(-t/2) - exp(-t)): 0 where exp(t/2) = 9/4
    rows = [["step", 5.0, None], ["decay", 2.0, 2.0]]
    assert crossing(5.0, 1.0, 0.0, rows) == pytest.approx(2 * math.log(9 / 4), rel=1e-15)
    with pytest.raises(NotAvailable):
        crossing(5.0, 1.0, 0.0, rows, "either", 2)


def test_source_tau_equal_to_tau():
    # y = t exp(-t) is 1/4 at 0.357402956181389 and 2.153292364110349 (Lambert W, mpmath)
    rows = [["decay", 1.0, 1.0]]
    assert crossing(0.25, 1.0, 0.0, rows) == pytest.approx(0.357402956181388903, rel=1e-15)
    assert crossing(0.25, 1.0, 0.0, rows, "falling") == pytest.approx(
        2.15329236411034964, rel=1e-15
    )


def test_y_that_starts_at_the_level_does_not_pass_it():
    with pytest.raises(NotAvailable):
        crossing(0.0, 1.0, 0.0, STEP)
    with pytest.raises(NotAvailable):  # at rest on the level for a second first
        crossing(0.0, 1.0, 0.0, [["step", 5.0, 1.0]])


def test_only_later_passages_count():
    rows = [["pulse", 5.0, 1.0]]
    first = crossing(1.0, 1.0, 0.0, rows)
    assert first == pytest.approx(math.log(5 / 4), rel=1e-15)
    second = crossing(1.0, 1.0, 0.0, rows, "either", 1, first)
    assert second == pytest.approx(1 + math.log(5 * (1 - math.exp(-1))), rel=1e-15)
    assert crossing(1.0, 1.0, 0.0, rows, "falling") == second
    with pytest.raises(NotAvailable):
        crossing(1.0, 1.0, 0.0, rows, "either", 1, second)


def test_chain_of_after_meets_every_passage():
    rows, level = wave(1.0, 0.8, 1.3, 40.0), 0.95
    t = 0.0
    for count in range(1, 30):
        following = crossing(level, 0.5, 0.0, rows, "either", 1, t)
        assert following > t
        t = following
        assert crossing(level, 0.5, 0.0, rows, "either", count) == t


def test_a_far_passage_is_counted_not_walked_to():
    # settled, the sine passes the level once a period each way
    rows = wave(0.0, 1.0, 1.0)
    first = crossing(0.05, 0.5, 0.0, rows, "rising", 101)
    assert crossing(0.05, 0.5, 0.0, rows, "rising", 1_000_101) == pytest.approx(first + 1e6)
    assert crossing(0.5, 1.0, 0.0, SQUARE, "falling", 1_000_000, 100.0) == pytest.approx(
        crossing(0.5, 1.0, 0.0, SQUARE, "falling", 1, 100.0) + 0.1 * 999_999
    )


def test_ripple_that_stays_below_the_level():
    # settled ripple of a square, common practice: high share (1 - e^-a)/(1 - e^-2a), a = 0.05
    top = (1 - math.exp(-0.05)) / (1 - math.exp(-0.1))
    with pytest.raises(NotAvailable):
        crossing(top * (1 + 1e-12), 1.0, 0.0, SQUARE)
    assert crossing(top * (1 - 1e-12), 1.0, 0.0, SQUARE) > 10


def test_slope_and_square_end_the_search():
    rows = [["slope", -0.69, None, None, None], ["square", 0.67, -0.48, 0.15, 0.44]]
    t = crossing(-0.8, 0.5, -0.17, rows)
    with pytest.raises(NotAvailable):
        crossing(-0.8, 0.5, -0.17, rows, "either", 9, t)


def test_sines_without_a_common_period():
    rows = [*wave(1.0, 0.8, 1.3), ["sine", 0.5, math.pi, None]]
    with pytest.raises(NotAvailable):
        crossing(3.0, 0.5, 0.0, rows)
    t = crossing(1.2, 0.5, 0.0, rows)
    assert superpose(t, 0.5, 0.0, rows) == pytest.approx(1.2, abs=1e-15)


def test_square_and_sine_that_fit_as_typed():
    rows = [["square", 0.0, 1.0, 0.1, 0.5], ["sine", 0.2, 50.0, None, None]]
    with pytest.raises(NotAvailable):
        crossing(0.6, 1.0, 0.0, rows)
    t = crossing(0.5, 1.0, 0.0, rows, "rising", 1_000_000)
    assert superpose(t, 1.0, 0.0, rows) == pytest.approx(0.5, abs=1e-8)


def test_a_search_without_end_is_refused():
    # two sines whose sum comes near 2 only after very many beats, and the level just under it
    rows = [["sine", 1.0, 1.0], ["sine", 1.0, 1.0 + 2**-40]]
    with pytest.raises(DomainError, match="more turning points"):
        crossing(0.3140, 1.0, 0.0, rows, "either", 10**7)


# hosts and arrays


def test_arrays_agree_with_single_values():
    level, tau = np.linspace(0.1, 1.4, 14)[:, None], np.array([0.05, 0.5, 2.0])
    rows = wave(1.0, 0.8, 1.3, 40.0)
    together = crossing(level, tau, 0.0, rows, "either", 3)
    assert together.shape == (14, 3)
    for (i, j), value in np.ndenumerate(together):
        try:
            alone = crossing(float(level[i, 0]), float(tau[j]), 0.0, rows, "either", 3)
        except NotAvailable:
            assert error_kind(value).text == "#N/A"
        else:
            assert value == alone


def test_quick_way_agrees_with_the_search():
    """A decay of amplitude 0 keeps the quick way out and changes nothing."""
    random = np.random.default_rng(7)
    for _ in range(60):
        tau, level, initial = (
            10 ** random.uniform(-1, 1),
            random.uniform(-0.5, 1.6),
            random.normal(),
        )
        count, after = int(random.integers(1, 6)), random.choice([0.0, random.uniform(0, 5)])
        rows = wave(1.0, random.normal(), 10 ** random.uniform(-1, 1), random.uniform(-180, 180))
        if random.random() < 0.4:
            rows = [["ramp", 1.0, 0.7, 0.2], ["pulse", random.normal(), 1.0, 0.5]]
        slow = [*rows, ["decay", 0.0, 1.0, None]]
        answers = []
        for table_ in (rows, slow):
            try:
                answers.append(crossing(level, tau, initial, table_, "either", count, after))
            except NotAvailable:
                answers.append(math.inf)
        assert answers[0] == pytest.approx(answers[1], rel=4e-16, abs=1e-300)


# laws

numbers = st.floats(-3, 3).map(lambda x: round(x, 3))
spans = st.floats(0.01, 5).map(lambda x: round(x, 3))
sources = st.one_of(
    st.tuples(st.just("step"), numbers, spans),
    st.tuples(st.just("ramp"), numbers, spans, spans),
    st.tuples(st.just("pulse"), numbers, spans, spans),
    st.tuples(st.just("sine"), numbers, spans, st.floats(0, 360)),
    st.tuples(st.just("decay"), numbers, spans, spans),
    st.tuples(st.just("square"), numbers, numbers, spans, st.floats(0.1, 0.9)),
)


def as_table(rows):
    return [list(row) + [None] * (6 - len(row)) for row in rows]


def passage(*args):
    try:
        return crossing(*args)
    except NotAvailable:
        return None
    except DomainError as error:  # a search without end says so; it never guesses
        if "told apart" not in str(error):
            raise
        return None


def test_what_never_repeats_is_decided_by_where_y_settles():
    """The forcing goes from -2.3 to 4.3, but y itself settles between 0.79 and 1.21."""
    rows = [["sine", 2.269, 5.0, 0.0, None, None], ["square", 0.0, 2.0, 1.188, 0.5, None]]
    with pytest.raises(NotAvailable):
        crossing(0.0, 1.776, 0.0, rows, "rising")
    with pytest.raises(NotAvailable):
        crossing(1.3, 1.776, 0.0, rows)
    assert crossing(0.7, 1.776, 0.0, rows) > 0


@settings(max_examples=60, deadline=None)
@given(numbers, spans, numbers, st.lists(sources, min_size=1, max_size=3))
def test_response_at_a_crossing_is_the_level(level, tau, initial, rows):
    rows = as_table(rows)
    for way, count in itertools.product(("rising", "falling"), (1, 2)):
        t = passage(level, tau, initial, rows, way, count)
        if t is not None:
            scale = 3 * len(rows) + 3  # bounds |initial|, |forcing| and |y|
            assert superpose(t, tau, initial, rows) == pytest.approx(level, abs=1e-13 * scale)


@settings(max_examples=40, deadline=None)
@given(numbers, spans, st.lists(sources, min_size=1, max_size=2), st.sampled_from([2.0, 0.5, 64.0]))
def test_scaling_by_a_power_of_two(level, tau, rows, k):
    scaled = []
    for shape, first, *rest in rows:
        second = [rest[0] * k, *rest[1:]] if shape == "square" else rest
        scaled.append((shape, first * k, *second))
    assert passage(level, tau, 1.0, as_table(rows)) == passage(level * k, tau, k, as_table(scaled))


@settings(max_examples=40, deadline=None)
@given(numbers, spans, st.lists(sources, min_size=1, max_size=2), st.sampled_from([1.0, 4.0]))
def test_time_shift(level, tau, rows, shift):
    starts = {"step": 2, "ramp": 3, "pulse": 3, "sine": 4, "decay": 3, "square": 5}
    later = as_table(rows)
    for row in later:
        row[starts[row[0]]] = (row[starts[row[0]]] or 0.0) + shift
    plain = passage(level, tau, 0.0, as_table(rows))
    moved = passage(level, tau, 0.0, later)
    assert (plain is None) == (moved is None)
    if plain is not None:
        assert moved == pytest.approx(plain + shift, rel=1e-9)


# stages


def test_jump_counts_at_its_moment():
    rows = [[0.0, 1.0, 5.0, None], [2.0, 1.0, 5.0, -1.0]]
    assert stages_crossing(0.5, 0.0, rows, "falling") == 2.0
    assert stages_crossing(0.5, 0.0, rows, "rising", 2) == pytest.approx(2 + math.log(6 / 4.5))


def test_jump_at_0_needs_an_earlier_after():
    rows = [[0.0, 1.0, 0.0, 5.0]]
    with pytest.raises(NotAvailable):
        stages_crossing(2.0, 0.0, rows, "rising")
    assert stages_crossing(2.0, 0.0, rows, "rising", 1, -1.0) == 0.0


@pytest.mark.parametrize(("heads", "expected"), [(6.0, math.log(5)), (0.0, None)])
def test_stop_at_the_level_counts_when_y_leaves_on_the_other_side(heads, expected):
    rows = [[0.0, 1.0, 5.0, None, 4.0], [3.0, 1.0, heads, None, None]]
    if expected is None:
        with pytest.raises(NotAvailable):
            stages_crossing(4.0, 0.0, rows)
    else:
        assert stages_crossing(4.0, 0.0, rows) == pytest.approx(expected, rel=1e-15)


def test_hold_and_rate():
    rows = [[0.0, "rate", 2.0], [1.0, "hold", None], [4.0, "rate", -1.0]]
    assert stages_crossing(1.5, 0.0, rows) == 0.75
    assert stages_crossing(1.5, 0.0, rows, "falling") == 4.5
    with pytest.raises(NotAvailable):  # held at 2, then down again: a touch
        stages_crossing(2.0, 0.0, rows)


# tables


def test_table_of_a_ramp():
    expected = crossing(2.5, 1.0, 0.0, [["ramp", 5.0, 2.0]])
    assert table_crossing(2.5, 1.0, 0.0, [0.0, 2.0], [0.0, 5.0]) == pytest.approx(expected)


def test_table_against_sources_over_many_points():
    times = np.arange(0, 20, 0.05)
    levels = np.where(times % 1 < 0.5, 1.0, 0.0)
    rows = [["square", 0.0, 1.0, 1.0, 0.5]]
    for count in range(1, 12):
        ours = table_crossing(0.5, 1.0, 0.0, times, levels, True, "rising", count)
        assert table(ours, 1.0, 0.0, times, levels, True) == pytest.approx(0.5, abs=1e-14)
        assert ours == pytest.approx(crossing(0.5, 1.0, 0.0, rows, "rising", count), abs=1e-12)


def test_table_at_rest_on_the_level_first():
    # y leaves 0 after t = 2 and comes back through it once
    t = table_crossing(0.0, 1.0, 0.0, [0.0, 1.0, 2.0, 3.0, 4.0, 5.0], [0, 0, 0, 1, 1, -2])
    assert 4.0 < t < 6.0
    with pytest.raises(NotAvailable):
        table_crossing(0.0, 1.0, 0.0, [0.0, 1.0, 2.0, 3.0], [0, 0, 0, 1])


# inside limits


def test_stays_within_of_a_step():
    assert stays_within(4.9, 5.1, 1.0, 0.0, STEP, 20.0) == pytest.approx(math.log(50), rel=1e-14)
    assert stays_within(-1.0, 6.0, 1.0, 0.0, STEP, 20.0) == 0.0
    with pytest.raises(NotAvailable):
        stays_within(4.9, 5.1, 1.0, 0.0, STEP, 3.0)


def test_stays_within_over_a_million_periods():
    last = stays_within(0.0, 0.505, 1.0, 0.0, SQUARE, 1e5 + 0.01)
    assert last == pytest.approx(1e5, abs=0.1)
    assert superpose(last, 1.0, 0.0, SQUARE) == pytest.approx(0.505, abs=1e-9)
    first = stays_within(0.4, 0.6, 1.0, 0.0, SQUARE, 1e5)
    assert superpose(first, 1.0, 0.0, SQUARE) == pytest.approx(0.4, abs=1e-14)


# peaks


def test_peak_of_a_pulse_is_at_its_end():
    assert peak(1.0, 0.0, [["pulse", 5.0, 1.0]], 0.0, 10.0) == (5 * (1 - math.exp(-1)), 1.0)
    assert peak(1.0, 0.0, [["pulse", -5.0, 1.0]], 0.0, 10.0, "abs") == (
        -5 * (1 - math.exp(-1)),
        1.0,
    )
    assert peak(1.0, 0.0, [["pulse", 5.0, 1.0]], 0.0, 10.0, "min") == (0.0, 0.0)


def test_peak_of_a_decay_with_the_same_time_constant():
    value, time = peak(2.0, 0.0, [["decay", 3.0, 2.0]], 0.0, 50.0)
    assert (value, time) == (pytest.approx(3 / math.e, rel=1e-15), pytest.approx(2.0, rel=1e-14))


def test_peak_before_0_and_at_the_window_ends():
    assert peak(1.0, 2.0, [["step", 5.0]], -3.0, -1.0) == (2.0, -3.0)
    assert peak(1.0, 2.0, [["step", 1.0]], -3.0, 5.0) == (2.0, -3.0)
    assert peak(1.0, 0.0, STEP, 0.0, 2.0) == (5 * (1 - math.exp(-2)), 2.0)


@pytest.mark.parametrize("kind", ["max", "min", "abs"])
def test_peak_against_a_fine_grid(kind):
    random = np.random.default_rng(3)
    for _ in range(25):
        rows = wave(random.normal(), random.normal(), 10 ** random.uniform(-1, 1), 30.0)
        rows.append(["decay", random.normal(), random.uniform(0.1, 3), None])
        rows.append(["pulse", random.normal(), 0.5, random.uniform(0, 2)])
        begin = random.uniform(-1, 2)
        value, time = peak(1.0, 0.3, rows, begin, begin + 4, kind)
        grid = superpose(np.linspace(begin, begin + 4, 4001), 1.0, 0.3, rows)
        size = {"max": grid.max(), "min": -grid.min(), "abs": np.abs(grid).max()}[kind]
        found = {"max": value, "min": -value, "abs": abs(value)}[kind]
        assert size - 1e-13 <= found <= size + 1e-3
        assert superpose(time, 1.0, 0.3, rows) == pytest.approx(value, abs=1e-13)


def test_peak_lies_in_its_window():
    rng = np.random.default_rng(3)
    for _ in range(300):
        begin, end = sorted(rng.uniform(0.1, 5.0, 2).tolist())
        at, length, late = rng.uniform([0.0, 1.0, 0.0], [begin, 3.0, 2.0]).tolist()
        rising = [["step", 5.0, at, None], ["ramp", 3.0, length, late]]
        assert begin <= peak(1.0, 0.0, rising, begin, end).time <= end


def test_peak_of_a_fast_sine_on_a_slope_over_ten_thousand_periods():
    rows = [["slope", 1.0, None, None], ["sine", 1.0, 1000.0, None]]
    value, time = peak(0.5, 0.0, rows, 0.0, 10.0)
    gain = 1 / math.hypot(1, 2 * math.pi * 1000 * 0.5)
    assert value == pytest.approx(9.5 + gain, abs=1e-3)
    assert 9.99 < time < 10


# refusals, each with its sentence

REFUSALS = [
    ("FO_CROSSING", (2.5, 0.0, 0.0, STEP), DomainError, "tau is 0; allowed: number > 0"),
    ("FO_CROSSING", ("x", 1.0, 0.0, STEP), InputError, 'level is the text "x"'),
    ("FO_CROSSING", (None, 1.0, 0.0, STEP), InputError, "level is blank"),
    ("FO_CROSSING", (2.5, 1.0, math.inf, STEP), DomainError, "initial is inf"),
    ("FO_CROSSING", (2.5, 1.0, 0.0, [["stepp", 5.0]]), InputError, "stepp"),
    ("FO_CROSSING", (2.5, 1.0, 0.0, STEP, "up"), InputError, 'direction is the text "up"'),
    ("FO_CROSSING", (2.5, 1.0, 0.0, STEP, "rising", 0), DomainError, "count is 0"),
    ("FO_CROSSING", (2.5, 1.0, 0.0, STEP, "rising", 1.5), DomainError, "whole number >= 1"),
    ("FO_CROSSING", (2.5, 1.0, 0.0, STEP, "rising", 1, "x"), InputError, "after is the text"),
    ("FO_CROSSING", (7.5, 1.0, 0.0, STEP), NotAvailable, "does not pass the level, 7.5"),
    ("FO_STAGES_CROSSING", (7.5, 0.0, [[0.0, 1.0, 5.0]]), NotAvailable, "the level, 7.5"),
    ("FO_STAGES_CROSSING", (7.5, 0.0, [[0.0, "hld", 5.0]]), InputError, "hld"),
    ("FO_TABLE_CROSSING", (7.5, 1.0, 0.0, [0, 1], [5, 5]), NotAvailable, "the level, 7.5"),
    ("FO_TABLE_CROSSING", (7.5, 1.0, 0.0, [1, 0], [5, 5]), DomainError, "times falls"),
    ("FO_TABLE_CROSSING", (7.5, 1.0, 0.0, [0, 1], [5]), InputError, "times has 2 values"),
    ("FO_STAYS_WITHIN", (5.1, 4.9, 1.0, 0.0, STEP, 9.0), DomainError, "high is 4.9, below low"),
    ("FO_STAYS_WITHIN", (4.9, 5.1, 1.0, 0.0, STEP, 1.0), NotAvailable, "outside low, 4.9"),
    ("FO_STAYS_WITHIN", (4.9, 5.1, 1.0, 0.0, STEP, -1.0), DomainError, "t_end is -1"),
    ("FO_PEAK", (1.0, 0.0, STEP, 2.0, 1.0), DomainError, "t_to is 1, before t_from, 2"),
    ("FO_PEAK", (1.0, 0.0, STEP, 0.0, 1.0, "mean"), InputError, 'kind is the text "mean"'),
    ("FO_PEAK", (-1.0, 0.0, STEP, 0.0, 1.0), DomainError, "tau is -1"),
]


@pytest.mark.parametrize(("name", "arguments", "error", "sentence"), REFUSALS)
def test_refusals_say_why(name, arguments, error, sentence):
    entry = CATALOGUE[name]
    with pytest.raises(error) as caught:
        entry.function(*arguments)
    assert type(caught.value) is error
    assert sentence in str(caught.value)
    assert entry.reason(list(arguments)) == str(caught.value)


def test_only_the_bad_elements_of_a_range_are_errors():
    times = crossing([2.5, 7.5, 2.5], [1.0, 1.0, -1.0], 0.0, STEP)
    assert times[0] == math.log(2)
    assert [error_kind(t).text for t in times[1:]] == ["#N/A", "#NUM!"]


def stage_passages(rows, initial, level):
    """Passages stage by stage with mpmath: within one y moves in one direction only."""
    y, found = mpf(initial), []
    ends = [*(row[0] for row in rows[1:]), math.inf]
    for (start, tau, heads, jump, stop), end in zip(rows, ends, strict=True):
        if jump is not None:
            if (y - level) * (jump - level) < 0:
                found.append((mpf(start), 1 if jump > level else -1))
            y = mpf(jump)
        span = mpf(end) - start

        def value(s, y=y, tau=tau, heads=heads):
            if tau == "hold":
                return y
            return y + heads * s if tau == "rate" else heads + (y - heads) * mp.exp(-s / mpf(tau))

        def moment(to, y=y, tau=tau, heads=heads):
            if tau == "hold" or (tau == "rate" and not heads):
                return None
            if tau == "rate":
                s = (to - y) / mpf(heads)
            else:
                ratio = (y - heads) / (to - heads)
                s = mpf(tau) * mp.log(ratio) if ratio > 0 else mpf(-1)
            return s if s > 0 else None

        stopped = None if stop is None else moment(mpf(stop))
        moving = span if stopped is None else min(span, stopped)
        passed = moment(mpf(level))
        if passed is not None and passed < moving:
            found.append((start + passed, 1 if y < level else -1))
        y = mpf(stop) if stopped is not None and stopped <= span else value(span)
    return found


@pytest.mark.parametrize("seed", range(80))
def test_stages_against_mpmath(seed):
    random = np.random.default_rng(seed)
    start, rows = 0.0, []
    for _ in range(random.integers(1, 9)):
        kind = random.choice(["lag", "lag", "hold", "rate"])
        tau = float(random.uniform(0.05, 3)) if kind == "lag" else str(kind)
        heads = None if kind == "hold" else float(random.normal())
        jump = float(random.normal()) if random.random() < 0.3 else None
        stop = float(random.normal()) if kind != "hold" and random.random() < 0.3 else None
        rows.append([start, tau, heads, jump, stop])
        start += float(random.uniform(0.05, 2))
    initial, level = float(random.normal()), float(random.normal() / 2)
    with mp.workdps(40):
        expected = stage_passages(rows, initial, level)
        for way, sign in (("rising", 1), ("falling", -1)):
            moments = [t for t, own in expected if own == sign and t > 0]
            for count, t in enumerate(moments, start=1):
                found = stages_crossing(level, initial, rows, way, count)
                assert abs(found - t) <= math.ulp(found)
            with pytest.raises(NotAvailable):
                stages_crossing(level, initial, rows, way, len(moments) + 1)
