"""Mean and root-mean-square of a response over a window of time, in closed form.

Between two changes of a formula y is a sum of terms s^n exp(rate s), which integrate as they are;
periods of a forcing that repeats are summed as geometric series.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from decimal import Decimal, localcontext
from typing import Any

import numpy as np

from tausheet.functions.arguments import Finite, Numbers, Positive
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.course import Course
from tausheet.functions.digits import fall, lag
from tausheet.functions.errors import DomainError
from tausheet.functions.exact import Array
from tausheet.functions.motion import CONTEXT, ONE, ZERO, Sum, integral_of_product, motion
from tausheet.functions.sources import Source, Sources

_STRETCHES = 5_000
"""Changes of a formula that one window may hold where nothing repeats."""
_PERIODS = 4
"""Whole periods from which on they are summed as a series."""

_NOTHING: Sum = {(0, (ZERO, ZERO)): (ONE, ZERO)}
"""The constant 1: y times it is y."""


class _Integral:
    """Integral of y, or of y squared, over a window."""

    def __init__(self, sources: Sequence[Source], tau: float, initial: float, square: bool) -> None:
        self.course = Course(sources, tau, initial)
        self.initial, self.square = Decimal(initial), square
        self.tau = Decimal(tau)

    def over(self, t_from: float, t_to: float) -> Decimal:
        """From t_from to t_to; y rests at its initial value before t = 0."""
        with localcontext(CONTEXT):
            begin, end = Decimal(t_from), Decimal(t_to)
            rest = max(min(end, ZERO) - begin, ZERO)
            total = rest * (self.initial**2 if self.square else self.initial)
            begin = max(begin, ZERO)
            if end <= begin:
                return total
            repetition = self.course.repetition()
            if repetition is not None:
                settled, period = max(repetition[0], begin), repetition[1]
                whole = int((end - settled) / period)
                if whole >= _PERIODS:
                    total += self._stretches(begin, settled)
                    total += self._periods(settled, period, whole)
                    begin = settled + whole * period
            return total + self._stretches(begin, end)

    def _stretches(self, begin: Decimal, end: Decimal) -> Decimal:
        parts = self._between(begin, end)
        return sum((self._part(terms, terms, length) for terms, length, _ in parts), ZERO)

    def _between(self, begin: Decimal, end: Decimal) -> list[tuple[Sum, Decimal, Decimal]]:
        """Terms of y, length and origin of each stretch without a change of formula."""
        found = []
        while begin < end:
            change = min(self.course.next_change(begin), end)
            found.append((motion(self.course.path(begin, change)), change - begin, begin))
            if len(found) > _STRETCHES:
                raise DomainError(
                    f"the window holds more than {_STRETCHES} changes of the sources, which "
                    "together never repeat; enter a shorter one"
                )
            begin = change
        return found

    def _part(self, one: Sum, two: Sum, length: Decimal) -> Decimal:
        return integral_of_product(one, two if self.square else _NOTHING, length)

    def _periods(self, begin: Decimal, period: Decimal, count: int) -> Decimal:
        """`count` periods: y = p + e q^n in period n, p settled and e what is left of the start."""
        rate = period / self.tau
        change = self.course.value(begin) - self.course.value(begin + period)
        left = change / lag(rate)
        once, twice = lag(count * rate) / lag(rate), lag(2 * count * rate) / lag(2 * rate)
        total = ZERO
        for terms, length, origin in self._between(begin, begin + period):
            start = left * fall((origin - begin) / self.tau)
            term = (0, (-ONE / self.tau, ZERO))
            transient: Sum = {term: (start, ZERO)}
            settled = dict(terms)
            settled[term] = (settled[term][0] - start, ZERO)
            total += count * self._part(settled, settled, length)
            if self.square:
                total += 2 * once * integral_of_product(settled, transient, length)
                total += twice * integral_of_product(transient, transient, length)
            else:
                total += once * self._part(transient, transient, length)
        return total


def _each_window(
    tau: Array,
    initial: Array,
    sources: Sequence[Source],
    t_from: Array,
    t_to: Array,
    finish: Callable[[Decimal, Decimal], float],
    square: bool,
) -> Answer:
    tau, initial, t_from, t_to = np.broadcast_arrays(tau, initial, t_from, t_to)
    values = np.zeros(tau.shape)
    for at in np.ndindex(tau.shape):
        if t_from[at] < t_to[at]:
            begin, end = float(t_from[at]), float(t_to[at])
            total = _Integral(sources, float(tau[at]), float(initial[at]), square).over(begin, end)
            with localcontext(CONTEXT):
                values[at] = finish(total, Decimal(end) - Decimal(begin))
    return Answer(values).unless(
        t_to <= t_from,
        DomainError,
        "t_to is {t_to}, which is not after t_from, {t_from}; enter a window that ends after it "
        "begins",
    )


@cell_function("FO_MEAN", "Energy and integrals")
def mean(tau: Positive, initial: Finite, sources: Sources, t_from: Finite, t_to: Finite) -> Numbers:
    """Mean of y over a window of time, for any sum of shapes, in closed form.

        integral from t_from to t_to of y dt / (t_to - t_from)

    Before t = 0, y rests at initial.

    Arguments:
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E
        t_from: start of the window (s); any number
        t_to: end of the window (s), after t_from; any number

    Result: mean in the unit of y, in the broadcast shape of tau, initial, t_from and t_to.

    Errors: #NUM! outside the ranges, when t_to is not after t_from, or for a window with thousands
    of changes of sources that never repeat; #VALUE! for a blank, a text or a malformed table.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(mean(1.0, 0.0, [["step", 5.0]], 0.0, 1.0), 12)
        1.839397205857

    References: closed form of the integral on each stretch, geometric series over the periods.
    """
    return _each_window(tau, initial, sources, t_from, t_to, lambda i, w: float(i / w), False)


@cell_function("FO_RMS", "Energy and integrals")
def rms(tau: Positive, initial: Finite, sources: Sources, t_from: Finite, t_to: Finite) -> Any:
    """Root-mean-square of y over a window of time, for any sum of shapes, in closed form.

        square root of (integral from t_from to t_to of y^2 dt / (t_to - t_from))

    Before t = 0, y rests at initial.

    Arguments:
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E
        t_from: start of the window (s); any number
        t_to: end of the window (s), after t_from; any number

    Result: root-mean-square in the unit of y, in the broadcast shape of tau, initial, t_from and
    t_to.

    Errors: #NUM! outside the ranges, when t_to is not after t_from, or for a window with thousands
    of changes of sources that never repeat; #VALUE! for a blank, a text or a malformed table.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(rms(1.0, 5.0, [["constant", 0.0]], 0.0, 1.0), 12)
        3.287599269914

    References: closed form of the integral on each stretch, geometric series over the periods.
    """

    def root(integral: Decimal, window: Decimal) -> float:
        return float((max(integral, ZERO) / window).sqrt())

    return _each_window(tau, initial, sources, t_from, t_to, root, True)
