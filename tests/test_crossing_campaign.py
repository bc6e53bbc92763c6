"""Crossings against an independent count of roots: mpmath's interval arithmetic, subdivided.

The reference shares nothing with the code: it steps from change to change with mpmath, writes y
on each stretch as a sum of exponentials and sines, and splits the stretch until each part
provably holds no root of y - level, or exactly one.
"""

from __future__ import annotations

import math
import random
from dataclasses import dataclass
from itertools import pairwise

import pytest
from mpmath import iv, mp, mpf

from tausheet.functions import crossing, stays_within, table_crossing
from tausheet.functions.errors import DomainError, NotAvailable

CASES = 2000
IN_CI = 150


@pytest.fixture(autouse=True)
def _digits():
    before = iv.dps
    iv.dps = 45
    with mp.workdps(45):
        yield
    iv.dps = before


@dataclass
class Piece:
    """y = a + b s + sum k exp(-r s) + sum k sin(w s + p) for s = t - t0, up to t1."""

    t0: mpf
    t1: mpf
    a: mpf
    b: mpf
    falls: list
    sines: list

    def value(self, s, c):
        y = c.mpf(self.a) + c.mpf(self.b) * s
        for k, r in self.falls:
            y += c.mpf(k) * c.exp(-c.mpf(r) * s)
        for k, w, p in self.sines:
            y += c.mpf(k) * c.sin(c.mpf(w) * s + c.mpf(p))
        return y

    def rate(self, s, c):
        y = c.mpf(self.b)
        for k, r in self.falls:
            y -= c.mpf(k) * c.mpf(r) * c.exp(-c.mpf(r) * s)
        for k, w, p in self.sines:
            y += c.mpf(k) * c.mpf(w) * c.cos(c.mpf(w) * s + c.mpf(p))
        return y


def changes(rows, horizon):
    times = {mpf(0), mpf(horizon)}
    for shape, values, start in rows:
        start = mpf(start)
        times.add(start)
        if shape in ("ramp", "pulse"):
            times.add(start + mpf(values[1]))
        if shape == "square":
            period, on = mpf(values[2]), mpf(values[2]) * mpf(values[3])
            n = 0
            while start + n * period < horizon:
                times.update((start + n * period, start + n * period + on))
                n += 1
    return sorted(t for t in times if 0 <= t <= horizon)


def pieces_of(rows, tau, initial, horizon):
    """y stretch by stretch, each starting where the one before ended."""
    tau, y = mpf(tau), mpf(initial)
    pieces = []
    times = changes(rows, horizon)
    for t0, t1 in pairwise(times):
        a, b, falls, sines = mpf(0), mpf(0), [], []
        middle = (t0 + t1) / 2
        for shape, values, start in rows:
            local, inside = t0 - mpf(start), middle - mpf(start)
            if inside < 0:
                continue
            v = [mpf(x) for x in values]
            if shape in ("constant", "step"):
                a += v[0]
            elif shape == "slope" or (shape == "ramp" and inside < v[1]):
                slope = v[0] if shape == "slope" else v[0] / v[1]
                a += slope * (local - tau)
                b += slope
            elif shape == "ramp" or (shape == "pulse" and inside < v[1]):
                a += v[0]
            elif shape == "sine":
                w = 2 * mp.pi * v[1]
                gain = v[0] / mp.sqrt(1 + (w * tau) ** 2)
                sines.append((gain, w, w * local + v[2] * mp.pi / 180 - mp.atan(w * tau)))
            elif shape == "decay":
                falls.append((v[0] * mp.exp(-local / v[1]) / (1 - tau / v[1]), 1 / v[1]))
            elif shape == "square":
                a += v[1] if inside - mp.floor(inside / v[2]) * v[2] < v[2] * v[3] else v[0]
        at_start = a + sum(k for k, _ in falls) + sum(k * mp.sin(p) for k, _, p in sines)
        piece = Piece(t0, t1, a, b, [*falls, (y - at_start, 1 / tau)], sines)
        pieces.append(piece)
        y = piece.value(t1 - t0, mp)
    return pieces


def side(x):
    return 1 if x > 0 else -1 if x < 0 else 0


def roots_in(piece, level):
    """Bounds of each root of y - level with its way: every part holds none, or exactly one."""
    level = mpf(level)
    parts = [(mpf(0), piece.t1 - piece.t0)]
    while parts:
        left, right = parts.pop()
        middle = (left + right) / 2
        whole = iv.mpf([left, right])
        rate = piece.rate(whole, iv)
        here = piece.value(iv.mpf(middle), iv) - iv.mpf(level)
        around = here + rate * (whole - middle)
        if around.a > 0 or around.b < 0:
            continue
        if rate.a > 0 or rate.b < 0:
            first, last = (side(piece.value(s, mp) - level) for s in (left, right))
            if first * last < 0:
                yield piece.t0 + left, piece.t0 + right, last
            elif last == 0 or first == 0:
                raise ArithmeticError("an exact root at the edge of a part")
            continue
        if right - left < mpf(10) ** -30:
            raise ArithmeticError("a root that even 45 digits do not tell from a touch")
        parts += [(middle, right), (left, middle)]


def reference(rows, tau, initial, level, horizon):
    return [
        root for piece in pieces_of(rows, tau, initial, horizon) for root in roots_in(piece, level)
    ]


def response(pieces, t):
    t = mpf(t)
    for piece in pieces:
        if t <= piece.t1:
            return piece.value(t - piece.t0, mp)
    raise AssertionError("t lies behind the horizon")


def random_rows(rng, tau):
    def amount():
        return round(rng.gauss(0, 1), 3) or 0.5

    def time():
        return tau * round(10 ** rng.uniform(-1.5, 0.7), 3)

    rows = [("step", (amount(),), rng.choice([0.0, 0.0, time()]))]
    for _ in range(rng.randrange(0, 3)):
        shape = rng.choice(["ramp", "slope", "sine", "decay", "pulse", "square"])
        start = rng.choice([0.0, 0.0, time()])
        if shape == "sine":
            frequency = round(10 ** rng.uniform(-1.5, 0.7), 2) / tau
            values = (amount(), frequency, rng.choice([0.0, 90.0, round(rng.uniform(-180, 360))]))
        elif shape == "decay":
            values = (amount(), tau * rng.choice([0.1, 0.8, 1.3, 3.0, 5.0]))
        elif shape == "square":
            values = (amount(), amount(), time() + 0.1 * tau, round(rng.uniform(0.1, 0.9), 2))
        elif shape == "slope":
            values = (amount() / tau,)
        else:
            values = (amount(), time())
        rows.append((shape, values, start))
    return rows


def extreme(rng, pieces):
    """A smooth extreme of y away from changes, as piece and local time; None when there is none."""
    found = []
    for piece in pieces:
        length = piece.t1 - piece.t0
        steps = [length * k / 40 for k in range(41)]
        rates = [piece.rate(s, mp) for s in steps]
        for k in range(40):
            if rates[k] * rates[k + 1] < 0:
                found.append((piece, steps[k], steps[k + 1]))
    if not found:
        return None
    piece, a, b = rng.choice(found)
    first = side(piece.rate(a, mp))
    for _ in range(120):
        middle = (a + b) / 2
        a, b = (middle, b) if side(piece.rate(middle, mp)) == first else (a, middle)
    return piece, a


def case(seed):
    """Rows, tau, initial, level and horizon of one case; every fourth is made to be nasty."""
    rng = random.Random(seed)
    tau = rng.choice([1.0, round(10 ** rng.uniform(-6, 4), 9)])
    initial = rng.choice([0.0, round(rng.gauss(0, 1), 3)])
    rows = random_rows(rng, tau)
    horizon = tau * rng.choice([3.0, 8.0])
    kind = ["plain", "twin", "plain", "touch", "plain", "edge", "plain", "settled", "ripple"][
        seed % 9
    ]
    if seed % 90 == 9:  # a square with a thousand periods
        period, duty = tau * round(rng.uniform(0.002, 0.02), 4), rng.choice([0.25, 0.5, 0.6])
        rows = [("square", (0.0, 1.0, period, duty), 0.0)]
        return rows, tau, 0.0, duty * rng.uniform(0.3, 1.001), 1000 * period
    if kind == "ripple":  # a fast small sine on a slow large step
        frequency = round(rng.uniform(20, 60), 1) / tau
        rows = [("step", (1.0,), 0.0), ("sine", (rng.uniform(0.5, 5), frequency, 0.0), 0.0)]
        initial, horizon = 0.0, 3 * tau
        level = rng.choice([0.3, 0.6, 0.9, 0.95])
        return rows, tau, initial, level, horizon
    if kind == "settled":
        rows = [row for row in rows if row[0] in ("step", "ramp", "pulse", "decay")]
        final = math.fsum(row[1][0] for row in rows if row[0] in ("step", "ramp"))
        return rows, tau, initial, final, horizon
    pieces = pieces_of(rows, tau, initial, horizon)
    level = float(response(pieces, horizon * rng.uniform(0.02, 0.98)))
    if kind == "edge":
        level = float(pieces[-1 - rng.randrange(max(1, len(pieces) - 1))].value(0, mp))
    if kind in ("twin", "touch") and (found := extreme(rng, pieces)):
        piece, s = found
        tiny = mpf(tau) / 10**9
        bend = (piece.rate(s + tiny, mp) - piece.rate(s - tiny, mp)) / (2 * tiny)
        gap = mpf(tau) * mpf(10) ** -6 if kind == "twin" else mpf(0)
        level = float(piece.value(s, mp) + bend * gap**2 / 8)
    if abs(level - initial) < 1e-30:  # at rest on the level: see test_crossing.py
        level += 1e-3
    return rows, tau, initial, level, horizon


def as_table(rows):
    return [[shape, *v, start, *([None] * (4 - len(v)))] for shape, v, start in rows]


def check(rows, tau, initial, level, horizon, rng):
    pieces = pieces_of(rows, tau, initial, horizon)
    roots = [root for piece in pieces for root in roots_in(piece, level)]
    way = rng.choice(["either", "either", "rising", "falling"])
    after = rng.choice([0.0, 0.0, float(horizon) * rng.random()])
    counted = [
        (left, right)
        for left, right, sign in roots
        if way in ("either", {1: "rising", -1: "falling"}[sign])
    ]
    behind = [bounds for bounds in counted if bounds[0] > after]
    if any(left <= after <= right for left, right in counted):
        after, behind = 0.0, counted
    table = as_table(rows)
    count = rng.randrange(1, len(behind) + 2) if behind else 1
    try:
        t = crossing(level, tau, initial, table, way, count, after)
    except NotAvailable:
        t = math.inf
    except DomainError:  # too many turning points: neither missed nor invented, but only there
        assert count > len(behind)
        t = math.inf
    if count > len(behind):
        assert t > horizon * (1 - 1e-15), f"invented a crossing at {t}"
        return
    left, right = behind[count - 1]
    assert t >= after
    assert float(left) * (1 - 1e-15) <= t <= float(right) * (1 + 1e-15), "not the count-th"
    scale = max(abs(level), abs(initial))
    off = abs(response(pieces, t) - mpf(level)) / scale if scale else mpf(1)
    if off > 1e-15:  # then t must be the nearest double to the root
        below, above = (response(pieces, math.nextafter(t, w)) - level for w in (0, math.inf))
        here = response(pieces, t) - level
        assert abs(here) <= min(abs(below), abs(above)), f"y misses the level by {float(off)}"


def run(seed):
    rows, tau, initial, level, horizon = case(seed)
    try:
        check(rows, tau, initial, level, horizon, random.Random(seed + 10**6))
    except ArithmeticError as exact:
        pytest.fail(f"the reference cannot tell: {exact}")


@pytest.mark.parametrize("seed", range(20))
def test_table_against_interval_arithmetic(seed):
    """Points in sixty-fourths, so that lines between them are ramps without rounding."""
    rng = random.Random(seed)
    times = sorted({rng.randrange(1, 512) / 64 for _ in range(rng.randrange(3, 30))})
    levels = [rng.randrange(-64, 65) / 64 for _ in times]
    rows = [("step", (levels[0],), 0.0)]
    for (t0, x0), (t1, x1) in pairwise(zip(times, levels, strict=True)):
        rows.append(("ramp", (x1 - x0, t1 - t0), t0))
    tau, initial = rng.choice([0.05, 0.5, 5.0]), rng.randrange(-64, 65) / 64
    pieces = pieces_of(rows, tau, initial, 9.0)
    level = float(response(pieces, rng.uniform(0.1, 8.9)))
    for count, (left, right, _) in enumerate(
        (root for piece in pieces for root in roots_in(piece, level)), start=1
    ):
        t = table_crossing(level, tau, initial, times, levels, False, "either", count)
        assert float(left) * (1 - 1e-15) <= t <= float(right) * (1 + 1e-15)
        # half the last place of t, which y may move in, comes on top
        assert abs(response(pieces, t) - level) <= 1e-15 + math.ulp(t) / tau


@pytest.mark.parametrize("seed", [*range(0, 60, 2), *range(1, 60, 18)])
def test_stay_inside_limits_against_interval_arithmetic(seed):
    rows, tau, initial, middle, horizon = case(seed)
    t_end = float(horizon) * 0.99
    pieces = pieces_of(rows, tau, initial, t_end)
    there = response(pieces, t_end)
    width = abs(float(there) - middle) * 1.5 + 1e-3
    low, high = middle - width, middle + width
    last = mpf(0)
    for limit, inwards in ((low, 1), (high, -1)):
        for piece in pieces:
            for _, right, way in roots_in(piece, limit):
                if way == inwards:
                    last = max(last, right)
    t = stays_within(low, high, tau, initial, as_table(rows), t_end)
    if last:
        assert t <= float(last)
        assert min(abs(response(pieces, t) - limit) for limit in (low, high)) <= 1e-13 * width
    else:
        assert t == 0


@pytest.mark.parametrize("seed", range(IN_CI))
def test_against_interval_arithmetic(seed):
    run(seed)


@pytest.mark.campaign
@pytest.mark.parametrize("first", range(IN_CI, CASES, 50))
def test_campaign(first):
    for seed in range(first, min(first + 50, CASES)):
        run(seed)
