"""Response to a forcing that is measured or drawn: points with straight lines between them."""

from __future__ import annotations

from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import Column, Finite, Flag, Numbers, Positive
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import DomainError, InputError
from tausheet.functions.exact import Array
from tausheet.functions.from_rest import excess, fall_and_lag

Points = Annotated[Any, Column()]

_BLOCK = 16384
_LONGEST = 500.0
"""Time constants that a block may span, so that exp of them stays a number."""


def check_points(times: Array, levels: Array) -> None:
    """Refuse points that are not as many times as levels, or times that fall."""
    if times.size != levels.size:
        raise InputError(
            f"times has {times.size} values and levels has {levels.size}; enter one of each a point"
        )
    falls = times[1:] < times[:-1]
    if falls.any():
        at = int(np.argmax(falls))
        raise DomainError(
            f"times falls from {times[at]:.15g} to {times[at + 1]:.15g} at point {at + 2}; "
            "put the points in order"
        )


class Nodes:
    """A table from t = 0 on: moments, the level just after each, and the level before the next."""

    def __init__(self, times: Array, levels: Array, held: bool) -> None:
        behind = int(np.searchsorted(times, 0.0, side="right"))
        if behind == 0:
            first = levels[0]
        elif behind == times.size or held:
            first = levels[behind - 1]
        else:
            t0, t1 = times[behind - 1], times[behind]
            share = -t0 / (t1 - t0)
            first = levels[behind - 1] * (1 - share) + levels[behind] * share
        self.t = np.concatenate([[0.0], times[behind:]])
        self.after = np.concatenate([[first], levels[behind:]])
        self.before_next = self.after[:-1] if held else levels[behind:]

    def responses(self, tau: float, initial: float) -> Array:
        """y at every node."""
        y = np.empty(self.t.size)
        y[0] = initial
        start = 0
        while start < self.t.size - 1:
            end = min(start + _BLOCK, self.t.size - 1)
            if (self.t[end] - self.t[start]) / tau > _LONGEST:
                limit = self.t[start] + _LONGEST * tau
                end = max(int(np.searchsorted(self.t, limit, side="right")) - 1, start + 1)
                end = min(end, start + _BLOCK)
            y[start + 1 : end + 1] = self._block(start, end, tau, y[start])
            start = end
        return y

    def _block(self, start: int, end: int, tau: float, y: float) -> Array:
        """y at the nodes after `start`, up to `end`, from y at `start`.

        Each segment adds c = level p(d) + rise q(d), d its length in time constants, which then
        falls away: y_k = E_k (y + sum of c_j / E_j), E_k = exp(-(t_k - t_start) / tau). E is
        computed from the times themselves, so that nothing builds up over a million points.
        """
        t = self.t[start : end + 1]
        d = np.diff(t)
        d /= tau
        level = self.after[start:end]
        p, q = _segment(d)
        added = p
        added *= level
        rise = np.subtract(self.before_next[start:end], level, out=d)
        rise *= q
        added += rise
        fall = np.subtract(t[0], t[1:], out=q)
        fall /= tau
        np.exp(fall, out=fall)
        if end == start + 1:
            alone: Array = y * fall + added
            return alone
        added /= fall
        result: Array = np.cumsum(added, out=added)
        result += y
        result *= fall
        return result


_SERIES = (-1 / 5040, 1 / 720, -1 / 120, 1 / 24, -1 / 6, 1 / 2)


def _segment(d: Array) -> tuple[Array, Array]:
    """1 - exp(-d), and the share of a rise over d: 1 - (1 - exp(-d)) / d.

    Both in arrays of their own, worked out in place: a new array a step takes twice as long.
    """
    largest = d.max(initial=0.0)
    if largest < 0.01:
        q = d * _SERIES[0]
        for coefficient in _SERIES[1:]:
            q += coefficient
            q *= d
        p = d * q
        return np.subtract(d, p, out=p), q
    p = -np.expm1(-d)
    q = np.where(d > 0, excess(d) / np.where(d > 0, d, 1.0), 0.0)
    return p, q


def _along(nodes: Nodes, y: Array, t: Array, tau: float) -> Array:
    """y at any t >= 0 from y at the nodes."""
    out = np.empty(t.size)
    for start in range(0, t.size, _BLOCK):
        part = t[start : start + _BLOCK]
        ends = np.searchsorted(nodes.t, [part.min(), part.max()], side="right")
        out[start : start + _BLOCK] = _within(nodes, y, part, tau, int(ends[0]) - 1, int(ends[1]))
    return out


def _within(nodes: Nodes, y: Array, t: Array, tau: float, first: int, end: int) -> Array:
    """The same where only the nodes from `first` to `end` matter."""
    moments = nodes.t[first:end]
    at = np.searchsorted(moments, t, side="right") - 1
    lengths = np.diff(nodes.t[first : end + 1])
    rises = nodes.before_next[first:end] - nodes.after[first:end][: lengths.size]
    slopes = np.zeros(end - first)
    np.divide(rises[: lengths.size], lengths, out=slopes[: lengths.size], where=lengths > 0)
    s = t - moments[at]
    u = s / tau
    if u.max(initial=0.0) < 0.01:
        p, q = _segment(u)
        behind, fall, rest = q * u, 1 - p, p
    else:
        behind = excess(u)
        fall, rest = fall_and_lag(s, tau)
    own = y[first:end][at], nodes.after[first:end][at], slopes[at]
    result: Array = own[0] * fall + own[1] * rest + own[2] * (tau * behind)
    return result


@cell_function("FO_TABLE", "Response")
def table(
    t: Finite,
    tau: Positive,
    initial: Finite,
    times: Points,
    levels: Points,
    held: Annotated[Any, Flag()] = False,
) -> Numbers:
    """Response to points measured or drawn, with straight lines between them, or levels held.

    Before the first and after the last point the end levels hold; a repeated time is a jump. y
    starts at t = 0; points before it count only for the line that crosses 0.

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        times: moments of the points (s), never falling; a range, each any number
        levels: level of the forcing at each of them; a range, each any number
        held: TRUE to hold each level until the next point, FALSE when left out; TRUE or FALSE

    Result: y(t) in the unit of the levels, in the broadcast shape of t, tau and initial.

    Errors: #VALUE! for a blank, a text, or when times and levels differ in number; #NUM! outside
    the ranges or when the times fall.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(table(1.0, 1.0, 0.0, [0.0, 1.0], [0.0, 5.0]), 12)
        1.839397205857

    References: closed form of tau dy/dt + y = x on each straight line.
    """
    check_points(times, levels)
    nodes = Nodes(times, levels, held)
    shape = np.broadcast_shapes(np.shape(t), np.shape(tau), np.shape(initial))
    early = np.any(t < 0)
    late = np.maximum(t, 0.0) if early else t
    if np.ndim(tau) == np.ndim(initial) == 0:
        result = _response(nodes, late, float(tau), float(initial))
    else:
        result = np.empty(shape)
        whole = np.broadcast_to(late, shape)
        pairs = np.stack([np.broadcast_to(tau, shape), np.broadcast_to(initial, shape)], axis=-1)
        different, which = np.unique(pairs.reshape(-1, 2), axis=0, return_inverse=True)
        which = which.reshape(shape)
        for number, (one_tau, one_initial) in enumerate(different.tolist()):
            mask = which == number
            result[mask] = _response(nodes, whole[mask], one_tau, one_initial)
    return np.where(t < 0, initial, result) if early else result


def _response(nodes: Nodes, t: Array, tau: float, initial: float) -> Array:
    y = nodes.responses(tau, initial)
    t = np.asarray(t)
    if t.size == nodes.t.size - 1 and np.array_equal(t.ravel(), nodes.t[1:]):
        return y[1:].reshape(t.shape)  # asked at its own times
    if t.size == nodes.t.size and np.array_equal(t.ravel(), nodes.t):
        return y.reshape(t.shape)
    return _along(nodes, y, t.ravel(), tau).reshape(t.shape)
