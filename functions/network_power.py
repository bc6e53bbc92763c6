"""The extreme values of a power, which is a product and so not of first order itself."""

from __future__ import annotations

import heapq
import math
from decimal import Decimal
from itertools import islice

from tausheet.functions.crossing import UNDECIDED
from tausheet.functions.digits import ZERO
from tausheet.functions.extremes import Peak
from tausheet.functions.network_paths import Stretches, Track, sources_of
from tausheet.functions.network_quantity import Power
from tausheet.functions.roots import Forcing, Lag, Path, Undecided

Bounds = tuple[float, float]

_EPS = 2.0**-53
_STRETCHES = 2_000
"""Stretches between jumps of the sources that one window may hold."""
_WINDOWS = 50_000
_TIE = 1e-14
"""Share by which a window must promise more than the best so far to be looked into."""


class _Rates:
    """A quantity on a path with its first and second rate of change: values and bounds."""

    def __init__(self, path: Path) -> None:
        start = path.start if path.start is not None else 0.0
        forcing, error = path.forcing, 0.0
        self.lags: list[Lag | Forcing] = [Lag(path, 0.0, start)]
        for _ in range(2):
            if math.isinf(path.tau):
                self.lags.append(forcing)
                forcing = forcing.slope()
                continue
            level = forcing(0.0)
            size = sum(map(abs, path.levels)) + abs(start)
            error = (error + 8 * _EPS * (abs(level) + size)) / path.tau
            start, forcing = (level - start) / path.tau, forcing.slope()
            own = Path(path.origin, path.length, path.tau, forcing, (forcing.a,))
            self.lags.append(Lag(own, 0.0, start, error))

    def at(self, order: int, s: float) -> float:
        """The quantity, or a rate of it, after s."""
        lag = self.lags[order]
        return lag(s) if isinstance(lag, Forcing) else lag.at(s)[0]

    def bounds(self, order: int, left: float, right: float) -> Bounds:
        """Numbers that it stays between from left to right."""
        lag = self.lags[order]
        return lag.bounds(left, right) if isinstance(lag, Forcing) else lag.reach(left, right)


def _product(a: Bounds, b: Bounds) -> Bounds:
    corners = [x * y for x in a for y in b]
    return min(corners), max(corners)


def _total(*parts: Bounds) -> Bounds:
    return sum(low for low, _ in parts), sum(high for _, high in parts)


class _Search:
    """The largest of sign p (of |p| for sign 0), and when."""

    def __init__(self, kind: str) -> None:
        self.sign = {"max": 1, "min": -1, "abs": 0}[kind]
        self.size, self.peak = -math.inf, Peak(math.nan, math.nan)

    def measure(self, p: float) -> float:
        """How large a power counts."""
        return self.sign * p if self.sign else abs(p)

    def offer(self, p: float, t: float) -> None:
        """Look at a value."""
        if self.measure(p) > self.size:
            self.size, self.peak = self.measure(p), Peak(p, t)

    def along(self, voltage: Path, current: Path) -> None:
        """Look at a whole stretch."""
        v, i = _Rates(voltage), _Rates(current)

        def power(s: float) -> float:
            assert voltage.exact is not None
            assert current.exact is not None
            return float(voltage.exact(Decimal(s))) * float(current.exact(Decimal(s)))

        for s in (0.0, voltage.length):
            self.offer(power(s), voltage.moment(s))
        windows = [(-math.inf, 0.0, voltage.length)]
        for _ in range(_WINDOWS):
            if not windows:
                return
            promise, left, right = heapq.heappop(windows)
            if -promise <= self.size + _TIE * abs(self.size):
                return
            vs = [v.bounds(order, left, right) for order in range(3)]
            cs = [i.bounds(order, left, right) for order in range(3)]
            if _one_sided(_total(_product(vs[1], cs[0]), _product(vs[0], cs[1]))):
                continue
            crossed = _product(vs[1], cs[1])
            bend = _total(_product(vs[2], cs[0]), crossed, crossed, _product(vs[0], cs[2]))
            if _one_sided(bend):
                turn = _turn(v, i, left, right)
                if turn is not None:
                    self.offer(power(turn), voltage.moment(turn))
                continue
            middle = left + (right - left) / 2
            self.offer(power(middle), voltage.moment(middle))
            if right - left <= 4 * _EPS * right:
                continue
            for a, b in ((left, middle), (middle, right)):
                reach = _product(v.bounds(0, a, b), i.bounds(0, a, b))
                heapq.heappush(windows, (-max(map(self.measure, reach)), a, b))
        raise Undecided(UNDECIDED)


def _one_sided(bounds: Bounds) -> bool:
    return bounds[0] >= 0 or bounds[1] <= 0


def _turn(v: _Rates, i: _Rates, left: float, right: float) -> float | None:
    """The zero of a monotonic rate of v i; None when it has none."""

    def rate(s: float) -> float:
        return v.at(1, s) * i.at(0, s) + v.at(0, s) * i.at(1, s)

    first = rate(left)
    if first * rate(right) >= 0:
        return None
    while True:
        middle = left + (right - left) / 2
        if not left < middle < right:
            return middle
        if rate(middle) * first > 0:
            left = middle
        else:
            right = middle


def power_peak(power: Power, t_from: float, t_to: float, kind: str) -> Peak:
    """Extreme value of a power from t_from to t_to, both sides of every jump included."""
    responses = (power.voltage, power.current)
    stretches = Stretches(sources_of(*responses))
    tracks = [Track(response, stretches) for response in responses]
    search = _Search(kind)
    if t_from < 0 and power.before is not None:
        search.offer(power.before, t_from)
    if t_to < 0:
        return search.peak
    begin, end = Decimal(max(t_from, 0.0)), Decimal(t_to)
    between = list(islice(stretches.between(begin, end), _STRETCHES + 1))
    if len(between) > _STRETCHES:
        raise Undecided(UNDECIDED)
    for stretch in between:
        search.along(*(track.path(*stretch) for track in tracks))
    # the end itself counts with the value just after it
    late = [track.path(*stretches.after(end)).exact for track in tracks]
    values = [float(exact(ZERO)) for exact in late if exact is not None]
    search.offer(values[0] * values[1], t_to)
    return search.peak
