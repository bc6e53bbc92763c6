"""Time constant of a measured transient, by least squares without a starting guess.

For a given tau the other parameters are linear and are solved for (variable projection), so
that only the sum of squares over ln(tau) is searched: on a grid over every tau that the times
could show, then, in each of its lowest valleys, by the zero of its derivative.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Annotated, Any, NamedTuple, TypeAlias

import numpy as np

from tausheet.functions.arguments import Column, Number, shown, words
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import DomainError, InputError, NotAvailable
from tausheet.functions.exact import Array

Measured: TypeAlias = Annotated[Any, Column(blanks="keep")]
One: TypeAlias = Annotated[Any, Number(one_cell=True)]
OneTime: TypeAlias = Annotated[Any, Number(one_cell=True, zero_is_a_value=True)]


class Fit(NamedTuple):
    """Fitted step response with everything unknown."""

    tau: Any
    initial: Any
    final: Any
    tau_error: Any
    initial_error: Any
    final_error: Any
    residual: Any


class FitFrom(NamedTuple):
    """Fitted step response that starts at a known value."""

    tau: Any
    final: Any
    tau_error: Any
    final_error: Any
    residual: Any


@cell_function("FO_FIT", "Measured data")
def fit(
    times: Measured,
    values: Measured,
    what: Annotated[
        str | None,
        words("tau", "initial", "final", "tau error", "initial error", "final error", "residual"),
    ] = None,
    t_from: OneTime = -math.inf,
    t_to: OneTime = math.inf,
) -> Any:
    """Least-squares fit of a step response to measured points: tau, initial, final, their errors.

        y = final + (initial - final) exp(-(t - t0) / tau),   t0 the earliest time in the window

    The points may come in any order, and times may repeat. A row is left out only when both its
    cells are blank.

    Arguments:
        times: times of the points (s); a range, each any number
        values: what was measured at them, as many; a range, each any number
        what: one result alone, all seven when left out; "tau", "initial", "final", "tau error",
            "initial error", "final error", "residual"
        t_from: earliest time to use (s), all when left out; any number
        t_to: latest time to use (s), all when left out; any number

    Result: tau (s); initial (at t0) and final in the unit of values; the standard errors of the
    three; the residual standard deviation, with 3 parameters counted.

    Errors: #N/A when the data cannot tell: fewer than 4 points or 3 different times; flat (a
    constant fits about as well: F test, p > 0.01); tau not found, or its standard error above
    tau/2; residuals plainly not random (runs test, p < 1E-6, left out where they are within
    the resolution of the values). #VALUE! when times and values differ in number, for a text, or
    a blank beside a number. #NUM! when t_to is not after t_from.

    Assumes: independent errors of equal size in the values, exact times, one time constant.

    Example:
        >>> t = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]
        >>> y = [0.00, 3.14, 4.34, 4.74, 4.92, 4.96]
        >>> round(fit(t, y, "tau"), 3), round(fit(t, y, "tau error"), 3)
        (1.006, 0.011)

    References: G. H. Golub, V. Pereyra, SIAM J. Numer. Anal. 10 (1973) 413 (variable projection);
    standard errors from the Jacobian, as certified by NIST StRD nonlinear regression; A. Wald,
    J. Wolfowitz, Ann. Math. Stat. 11 (1940) 147 (runs test).
    """
    times, values = _points(times, values, t_from, t_to)
    found = _fitted(times - times[0], values, values[0], free=True)
    result = Fit(
        found.tau,
        found.initial,
        found.final,
        found.tau_error,
        found.initial_error,
        found.final_error,
        found.residual,
    )
    return result if what is None else getattr(result, what.replace(" ", "_"))


@cell_function("FO_FIT_FROM", "Measured data")
def fit_from(
    times: Measured,
    values: Measured,
    t_initial: One,
    initial: One,
    what: Annotated[
        str | None, words("tau", "final", "tau error", "final error", "residual")
    ] = None,
    t_from: OneTime = -math.inf,
    t_to: OneTime = math.inf,
) -> Any:
    """Least-squares fit of a step response with a known start: tau, final, their errors.

        y = final + (initial - final) exp(-(t - t_initial) / tau)

    The points may come in any order, and times may repeat. A row is left out only when both its
    cells are blank.

    Arguments:
        times: times of the points (s); a range, each any number
        values: what was measured at them, as many; a range, each any number
        t_initial: time at which y is known, not after the points used (s); any number
        initial: the known value of y at t_initial; any number
        what: one result alone, all five when left out; "tau", "final", "tau error",
            "final error", "residual"
        t_from: earliest time to use (s), all when left out; any number
        t_to: latest time to use (s), all when left out; any number

    Result: tau (s); final in the unit of values; the standard errors of the two; the residual
    standard deviation, with 2 parameters counted.

    Errors: #N/A when the data cannot tell: fewer than 4 points or 2 different times after
    t_initial; flat (initial fits about as well: F test, p > 0.01); tau not found, or its
    standard error above tau/2; residuals plainly not random (runs test, p < 1E-6, left out where
    they are within the resolution of the values). #VALUE! when times and values differ in number,
    for a text, or a blank beside a number. #NUM! when t_to is not after t_from, or a point used
    lies before t_initial.

    Assumes: independent errors of equal size in the values, exact times, one time constant.

    Example:
        >>> t = [1.0, 2.0, 3.0, 4.0, 5.0]
        >>> y = [3.14, 4.34, 4.74, 4.92, 4.96]
        >>> round(fit_from(t, y, 0, 0, "tau"), 3)
        1.006

    References: as for fit.
    """
    times, values = _points(times, values, t_from, t_to)
    if times[0] < t_initial:
        raise DomainError(
            f"t_initial is {shown(float(t_initial))}, but times begins at "
            f"{shown(float(times[0]))}; enter a t_from that leaves out what lies before "
            "t_initial"
        )
    found = _fitted(times - t_initial, values, float(initial), free=False)
    result = FitFrom(found.tau, found.final, found.tau_error, found.final_error, found.residual)
    return result if what is None else getattr(result, what.replace(" ", "_"))


def _points(times: Array, values: Array, t_from: float, t_to: float) -> tuple[Array, Array]:
    """Times and values of the points to use, in the order of their times."""
    if times.size != values.size:
        raise InputError(
            f"times has {times.size} cells and values has {values.size}; "
            "enter ranges of equal length"
        )
    blank_time, blank_value = np.isnan(times), np.isnan(values)
    for row in np.flatnonzero(blank_time != blank_value)[:1]:
        blank, other = ("times", "values") if blank_time[row] else ("values", "times")
        raise InputError(
            f"{blank} is blank in row {row + 1} of the range, where {other} is not; "
            "fill the cell, or empty both"
        )
    if t_to <= t_from:
        raise DomainError(
            f"t_to is {shown(float(t_to))}, which is not after t_from, {shown(float(t_from))}; "
            "enter a window that ends after it begins"
        )
    used = ~blank_time & (times >= t_from) & (times <= t_to)
    times, values = times[used], values[used]
    if times.size < 4:
        raise NotAvailable(
            f"times has {times.size} points in the window; a fit needs at least 4; "
            "enter more points, or a wider window"
        )
    order = np.argsort(times, kind="stable")
    return times[order], values[order]


@dataclass(frozen=True)
class _Found:
    tau: float
    initial: float
    final: float
    tau_error: float
    initial_error: float
    final_error: float
    residual: float


_GRID = 6
"""Trial time constants a decade; the sum of squares has no feature narrower than a decade."""

_FLAT = 0.01
"""Chance, in an F test against a constant, above which values count as flat."""

_LONGEST = 1e6
"""Longest trial time constant, in lengths of the window."""


def _fitted(s: Array, values: Array, origin: float, free: bool) -> _Found:
    """Fit of `values` at times s >= 0 after the start, whose level is `free` or is `origin`."""
    parameters = 3 if free else 2
    later = s[s > 0]
    if np.unique(s if free else later).size < parameters:
        raise NotAvailable(
            f"times has fewer than {parameters} different moments; enter points at more moments"
        )
    lifted = values - origin
    largest, span = float(np.abs(lifted).max()), float(s[-1])
    if not math.isfinite(largest + span):
        raise DomainError("times or values span more than the range of numbers; check for a slip")
    scale, unit = (math.ldexp(1.0, math.frexp(size)[1] - 1) for size in (largest, span))
    s = s / unit
    search = _Search(s, lifted / scale, free)
    if search.flat_squares == 0:
        raise NotAvailable("values is flat: there is no step to fit; enter a window with the step")
    tau = search.best(float(s[s > 0][0]) / 40, _LONGEST * float(s[-1]))
    if tau is None:
        raise NotAvailable(
            "values shows no time constant: the fit improves without end towards a jump or a "
            "straight line; enter a window that holds more of the curve"
        )
    squares = search.squares(tau)
    degrees = s.size - parameters
    if (squares / search.flat_squares) ** (degrees / 2) > _FLAT:
        raise NotAvailable(
            "values is flat: a constant fits about as well as a step; enter a window with the step"
        )
    level, swing = search.level, search.swing
    rounding = 2.0**-53 * float(np.abs(values).max()) / scale
    residual = math.sqrt(squares / degrees)
    start_error, end_error, log_error = (
        max(residual, rounding) * error for error in search.leverages(tau)
    )
    if not log_error <= 0.5:
        raise NotAvailable(
            f"values leaves tau open: the best is {shown(tau * unit)} with a standard error "
            f"of {shown(tau * unit * log_error)}, above half of it; enter more points, or a window "
            "that holds more of the curve"
        )
    fine = max(100 * rounding, _resolution(values) / scale / 2)
    if residual > fine and _runs_chance(search.rest) < 1e-6:
        raise NotAvailable(
            "values departs from a step response in a plain pattern (runs test of the residuals); "
            "enter a window with one time constant, without the time before switching"
        )
    return _Found(
        tau * unit,
        origin + scale * level,
        origin + scale * (level + swing),
        tau * unit * log_error,
        scale * start_error,
        scale * end_error,
        scale * residual,
    )


class _Search:
    """Least squares of y = level + swing u, u = 1 - exp(-s/tau), over tau."""

    def __init__(self, s: Array, y: Array, free: bool) -> None:
        self.s, self.free = s, free
        self.mean = float(y.mean()) if free else 0.0
        self.y = y - self.mean
        self.flat_squares = float(self.y @ self.y)
        self.level = self.swing = 0.0
        self.rest = self.y

    def squares(self, tau: float) -> float:
        """Smallest sum of squares at tau; leaves level, swing and the residuals behind."""
        u = -np.expm1(self.s / -tau)
        middle = float(u.mean()) if self.free else 0.0
        u -= middle
        weight = float(u @ u)
        self.swing = float(u @ self.y) / weight if weight > 0 else 0.0
        self.level = self.mean - self.swing * middle
        self.rest = self.y - self.swing * u
        return float(self.rest @ self.rest)

    def slope(self, tau: float) -> float:
        """Half the derivative of the sum of squares by ln(tau)."""
        self.squares(tau)
        x = self.s / tau
        u, v = -np.expm1(-x), x * np.exp(-x)
        if self.free:
            u, v = u - u.mean(), v - v.mean()
        # the residuals are at right angles to u only to rounding: take u out of v as well
        v -= u * (float(u @ v) / float(u @ u))
        return self.swing * float(self.rest @ v)

    def best(self, shortest: float, longest: float) -> float | None:
        """The tau of least squares, None when it lies at an end of the range."""
        count = math.ceil(_GRID * math.log10(longest / shortest)) + 1
        trials = np.geomspace(shortest, longest, count)
        squares = np.array([self.squares(tau) for tau in trials.tolist()])
        inner = np.flatnonzero((squares[1:-1] <= squares[:-2]) & (squares[1:-1] <= squares[2:]))
        candidates = [
            tau
            for k in inner[np.argsort(squares[1:-1][inner])][:3]
            if (tau := self._valley(*trials[[k, k + 2]].tolist())) is not None
        ]
        best = min(candidates, key=self.squares, default=None)
        if best is None or self.squares(best) > min(squares[0], squares[-1]):
            return None
        return best

    def _valley(self, low: float, high: float) -> float | None:
        """The tau between two where the sum of squares stops falling and begins to rise."""
        middle = math.sqrt(low * high)
        steps = np.linspace(math.log(low / middle), math.log(high / middle), 9).tolist()
        slopes = [self.slope(middle * math.exp(x)) for x in steps]
        for a, b, before, after in zip(steps, steps[1:], slopes, slopes[1:], strict=False):
            if before < 0 <= after:
                x = _zero(lambda x: self.slope(middle * math.exp(x)), a, b, before, after)
                return middle * math.exp(x)
        return None

    def leverages(self, tau: float) -> tuple[float, float, float]:
        """Standard errors of start, end and ln(tau) for residuals of standard deviation 1."""
        x = self.s / tau
        e = np.exp(-x)
        columns = [-np.expm1(-x), self.swing * x * e]
        if self.free:
            columns.insert(0, e)
        jacobian = np.column_stack(columns)
        sizes = np.sqrt((jacobian * jacobian).sum(axis=0))
        if not sizes.all():
            return 0.0, math.inf, math.inf
        triangle = np.linalg.qr(jacobian / sizes, mode="r")
        if np.abs(np.diag(triangle)).min() < 1e-14:
            return 0.0, math.inf, math.inf
        inverse = np.linalg.inv(triangle)
        errors = np.sqrt((inverse * inverse).sum(axis=1)) / sizes
        start = float(errors[0]) if self.free else 0.0
        return start, float(errors[-2]), float(errors[-1])


def _zero(f: Callable[[float], float], a: float, b: float, at_a: float, at_b: float) -> float:
    """The zero of f between a and b, where its signs differ, to the last bits.

    T. R. Chandrupatla, Adv. Eng. Software 28 (1997) 145: inverse quadratic where it is safe,
    else halving. scipy's own is as good, but to import it takes longer than all fits of a sheet.
    """
    c, at_c, share = a, at_a, 0.5
    for _ in range(200):
        x = a + share * (b - a)
        at_x = f(x)
        if (at_x > 0) == (at_a > 0):
            c, at_c = a, at_a
        else:
            c, b, at_c, at_b = b, a, at_b, at_a
        a, at_a = x, at_x
        best = a if abs(at_a) < abs(at_b) else b
        smallest = (4e-16 * abs(best) + 1e-16) / abs(b - a) if a != b else 1.0
        if smallest > 0.5 or at_x == 0:
            return best
        place, height = (a - b) / (c - b), (at_a - at_b) / (at_c - at_b)
        share = 0.5
        if height**2 < place and (1 - height) ** 2 < 1 - place:
            share = at_a / (at_b - at_a) * at_c / (at_b - at_c)
            share += (c - a) / (b - a) * at_a / (at_c - at_a) * at_b / (at_c - at_b)
        share = min(max(share, smallest), 1 - smallest)
    return a


def _resolution(values: Array) -> float:
    """Step of the grid that all values lie on, as from an instrument; 0 when there is none."""
    distinct = np.unique(values)
    step = float(np.diff(distinct).min())
    places = (distinct - distinct[0]) / step
    return step if float(np.abs(places - np.rint(places)).max()) < 0.01 else 0.0


def _runs_chance(residuals: Array) -> float:
    """Chance of as many or as few runs of one sign in random residuals (normal approximation)."""
    above = residuals[residuals != 0] > 0
    n, positive = above.size, int(above.sum())
    pairs = 2.0 * positive * (n - positive)
    if n < 2 or pairs == 0:
        return 1.0
    runs = 1 + int(np.count_nonzero(above[1:] != above[:-1]))
    expected = pairs / n + 1
    variance = pairs * (pairs - n) / (n * n * (n - 1.0))
    if variance <= 0:
        return 1.0
    return math.erfc(abs(runs - expected) / math.sqrt(2 * variance))
