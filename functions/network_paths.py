"""A quantity of a network as stretches of first-order motion, for crossings, extremes, energy.

q = lag + sum w x + sum w x' + sum w integral of x obeys tau q' + q = F, with
F = what the lag heads for + sum w (x + tau x') + ..., of the same kinds as the sources; an
integrator obeys q' = F. q jumps where a source does that acts at once.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from decimal import Decimal

import numpy as np

from tausheet.functions.course import Course
from tausheet.functions.crossing import UNDECIDED
from tausheet.functions.digits import ZERO, fall, fifty_digits, sine_and_cosine, turns_of
from tausheet.functions.network_quantity import Response, derivatives, totals
from tausheet.functions.network_shapes import integral
from tausheet.functions.paths import Repeating
from tausheet.functions.roots import Forcing, Path, Undecided
from tausheet.functions.shapes import NEVER
from tausheet.functions.sources import Source

_SAME = Decimal("1e-12")
"""Share of its terms by which a quantity must change at a moment for it to be a jump."""

_PATHS = 100_000
"""Stretches looked into before a search is given up."""

Weighted = tuple[float, Forcing]
Stretch = tuple[Decimal, Decimal]
"""From when to when."""


def sources_of(*responses: Response) -> list[Source]:
    """Every source that moves one of the quantities."""
    found: dict[Source, None] = {}
    for response in responses:
        found.update(dict.fromkeys(response.driven))
        for weighted in (*response.direct, response.integrated):
            found.update(dict.fromkeys(source for _, source in weighted))
    return list(found)


class Stretches:
    """The moments between which no source changes its formula, and the sources there."""

    def __init__(self, sources: Iterable[Source]) -> None:
        self.course = Course(list(sources), 1.0, 0.0)
        self._single = {source: Course([source], 1.0, 0.0) for source in self.course.sources}

    def between(self, origin: Decimal, end: Decimal) -> Iterator[Stretch]:
        """Stretch by stretch from one moment to another."""
        while origin < end:
            change = min(self.course.next_change(origin), end)
            yield origin, change
            origin = change

    def after(self, t: Decimal) -> Stretch:
        """The stretch that begins at a moment."""
        return t, self.course.next_change(t)

    def forcing(self, source: Source, origin: Decimal, end: Decimal) -> Forcing:
        """One source on a stretch."""
        return self._single[source].path(origin, end).forcing


@fifty_digits
def value_of(forcing: Forcing, s: Decimal) -> Decimal:
    """A forcing after s."""
    x = Decimal(forcing.a) + s * (Decimal(forcing.b) + s * Decimal(forcing.c))
    for size, frequency, phase in forcing.sines:
        turns = turns_of(Decimal(frequency), s) + Decimal(phase)
        x += Decimal(size) * sine_and_cosine(turns)[0]
    for size, own in forcing.decays:
        x += Decimal(size) * fall(s / Decimal(own))
    return x


def antiderivative(forcing: Forcing) -> Forcing:
    """A forcing whose rate of change is the given one."""
    return Forcing(
        0.0,
        forcing.a,
        forcing.b / 2,
        tuple((size / (math.tau * f), f, phase - 0.25) for size, f, phase in forcing.sines),
        tuple((-size * own, own) for size, own in forcing.decays),
    )


class Track:
    """The motion of one quantity, stretch by stretch."""

    def __init__(self, response: Response, stretches: Stretches) -> None:
        self.response, self.stretches = response, stretches
        tau = 1.0 if response.tau is None else response.tau
        lag = [Source("constant", (response.heads,)), *response.driven]
        self._lag = Course(lag, tau, response.start)
        self._tau = math.inf if response.tau is None else response.tau

    def parts(self, origin: Decimal, end: Decimal) -> list[Weighted]:
        """What is added to the lag on a stretch: weights and forcings."""
        parts: list[Weighted] = []
        for derivative, weighted in enumerate(self.response.direct):
            for weight, source in weighted:
                forcing = self.stretches.forcing(source, origin, end)
                for _ in range(derivative):
                    forcing = forcing.slope()
                parts.append((weight, forcing))
        begin = float(origin)
        if self.response.slope:
            parts.append((self.response.slope, Forcing(begin, 1.0)))
        for weight, source in self.response.integrated:
            rising = antiderivative(self.stretches.forcing(source, origin, end))
            before = float(integral(np.asarray(begin), source)) - rising(0.0)
            parts += [(weight, rising), (weight, Forcing(before))]
        return parts

    @fifty_digits
    def path(self, origin: Decimal, end: Decimal, goes_on: Path | None = None) -> Path:
        """The quantity on a stretch; `goes_on`: the path it continues, unless it jumps."""
        response = self.response
        parts = self.parts(origin, end)
        heads = [self.stretches.forcing(source, origin, end) for source in response.driven]
        terms = [(1.0, Forcing(response.heads)), *((1.0, forcing) for forcing in heads)]
        if response.tau is None:
            terms = [(weight, forcing.slope()) for weight, forcing in parts]
        else:
            for weight, forcing in parts:
                terms += [(weight, forcing), (weight * response.tau, forcing.slope())]
        levels = tuple(weight * forcing.a for weight, forcing in terms)
        forcing = Forcing(
            math.fsum(levels),
            math.fsum(weight * forcing.b for weight, forcing in terms),
            math.fsum(weight * forcing.c for weight, forcing in terms),
            tuple((w * a, f, phase) for w, forcing in terms for a, f, phase in forcing.sines),
            tuple((w * a, own) for w, forcing in terms for a, own in forcing.decays),
        )

        @fifty_digits
        def exact(s: Decimal) -> Decimal:
            value = self.lag(origin + s)
            return value + sum((Decimal(w) * value_of(f, s) for w, f in parts), ZERO)

        start: float | None = float(exact(ZERO))
        if goes_on is not None and goes_on.exact is not None:
            size = abs(self.lag(origin))
            size += sum((abs(Decimal(w) * value_of(f, ZERO)) for w, f in parts), ZERO)
            before = goes_on.exact(origin - goes_on.origin)
            if abs(exact(ZERO) - before) <= _SAME * max(size, abs(before)):
                start = None
        return Path(origin, float(end - origin), self._tau, forcing, levels, exact, start)

    def impulses(self, before: Stretch | None, after: Stretch) -> tuple[float, ...]:
        """Weights of an impulse between two stretches and of its derivatives; `before` None: t = 0.

        From the stretches and not from a moment in doubles, which may lie beside the jump.
        """
        orders = []
        for order in range(self.response.depth):
            terms = list(self.response.struck[order : order + 1]) if before is None else []
            for derivative in range(order + 1, len(self.response.direct)):
                for weight, source in self.response.direct[derivative]:
                    sides = [(after, 1, 0.0)]
                    if before is not None:
                        sides.append((before, -1, float(before[1] - before[0])))
                    for (origin, end), sign, s in sides:
                        forcing = self.stretches.forcing(source, origin, end)
                        for _ in range(derivative - 1 - order):
                            forcing = forcing.slope()
                        terms.append(sign * weight * forcing(s))
            orders.append(terms)
        return totals(orders)

    def lag(self, t: Decimal) -> Decimal:
        """The first-order part, to fifty digits."""
        if self.response.tau is None:
            return Decimal(self.response.start)
        return self._lag.value(t)

    def along(self, begin: Decimal, end: Decimal) -> Iterator[Path]:
        """The paths from one moment to another."""
        last: Path | None = None
        for origin, change in self.stretches.between(begin, end):
            last = self.path(origin, change, last)
            yield last

    def paths(self, t_from: float, level: float | None = None) -> Iterator[Path | Repeating]:
        """The paths from t_from on, and what repeats when all else is over.

        level: what an integrator that drifts for ever is watched for; it ends when that is passed.
        """
        origin = Decimal(max(t_from, 0.0))
        repetition = self.stretches.course.repetition()
        if repetition is None or self.stretches.course.next_change(repetition[0]) == NEVER:
            yield from _guarded(self.along(origin, NEVER))
            return
        begin, period = max(repetition[0], origin), repetition[1]
        last: Path | None = None
        for last in self.along(origin, begin):
            yield last
        drift = self._drift(begin, period)
        if not drift:
            yield Repeating(list(self.along(begin, _sum(begin, period))), period)
            return
        yield from _guarded(self._drifting(begin, period, last, drift, level))

    def _drifting(
        self, t: Decimal, period: Decimal, last: Path | None, drift: float, level: float | None
    ) -> Iterator[Path]:
        while level is None or not self._is_past(level, drift, t, period):
            end = _sum(t, period)
            for origin, change in self.stretches.between(t, end):
                last = self.path(origin, change, last)
                yield last
            t = end

    def _drift(self, begin: Decimal, period: Decimal) -> float:
        """By how much integrals grow in each period."""
        response = self.response
        ends = np.array([float(begin), float(_sum(begin, period))])
        terms = [response.slope * float(period)]
        terms += [w * float(np.diff(integral(ends, x))[0]) for w, x in response.integrated]
        total = math.fsum(terms)
        return 0.0 if abs(total) <= 1e-12 * math.fsum(map(abs, terms)) else total

    def _is_past(self, level: float, drift: float, t: Decimal, period: Decimal) -> bool:
        """Whether a drifting quantity has left the level behind for good."""
        response = self.response
        swing = abs(drift) + 2 * (abs(response.start) + abs(response.heads))
        swing += 2 * math.fsum(_size(source) for source in response.driven)
        for derivative, weighted in enumerate(response.direct):
            for weight, source in weighted:
                swing += 2 * sum(abs(weight) * _size(x) for x in derivatives(source, derivative))
        swing += math.fsum(abs(w) * _size(x) for w, x in response.integrated) * float(period)
        now = float(response.at(np.asarray(float(t))))
        return math.copysign(1.0, drift) * (now - level) > swing


@fifty_digits
def _sum(a: Decimal, b: Decimal) -> Decimal:
    return a + b


def _guarded(paths: Iterable[Path]) -> Iterator[Path]:
    """The paths, until there are too many to go on looking."""
    for number, path in enumerate(paths):
        if number > _PATHS:
            raise Undecided(UNDECIDED)
        yield path


def _size(source: Source) -> float:
    return max(map(abs, source.values[:2] if source.shape == "square" else source.values[:1]))
