"""Where a first-order response passes a level, told apart without sampling.

On one stretch of time tau h' + h = g, h = y - level and g = forcing - level. While g keeps its
sign, h exp(s / tau) is monotonic: between two zeros of g there is at most one zero of h. So the
zeros of h are told apart by the zeros of g, and those by bounds of g and g' over whole windows.
What is left is a list of marks: moments with the side on which y is, at most one passage between
neighbours. Where doubles cannot tell the side, fifty digits do.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from decimal import Decimal, localcontext

from tausheet.functions.digits import fifty_digits
from tausheet.functions.errors import DomainError
from tausheet.functions.forcing import EPS, PAD, Forcing, turns_after

__all__ = ["Forcing", "Lag", "Mark", "Path", "Undecided"]

_WINDOWS = 30_000
"""Windows looked into on one stretch before a search is given up."""


@dataclass(frozen=True)
class Path:
    """A stretch on which tau y' + y = forcing; with tau infinite y' = forcing.

    origin: its start, to all digits; levels: the parts of which forcing.a is the sum;
    exact: y after s to fifty digits, None when there is nothing better than doubles;
    start: y at s = 0, None when it goes on from the stretch before.
    """

    origin: Decimal
    length: float
    tau: float
    forcing: Forcing
    levels: tuple[float, ...]
    exact: Callable[[Decimal], Decimal] | None = None
    start: float | None = None

    def moment(self, s: float | Decimal) -> float:
        """The double next to the moment s after the start."""
        with localcontext(prec=60):
            return float(self.origin + Decimal(s))


class Undecided(DomainError):
    """More turning points lie before the moment asked for than can be told apart."""


@dataclass(frozen=True)
class Mark:
    """A moment s and the side of the level there: -1, 0 or 1."""

    s: float
    side: int


class Lag:
    """h = y - level on a path: tau h' + h = g, h(0) = start, which may be off by error."""

    def __init__(self, path: Path, level: float, start: float, error: float = 0.0) -> None:
        g = replace(path.forcing, a=math.fsum((*path.levels, -level)))
        if math.isinf(path.tau):
            g = path.forcing
        self.path, self.level = path, Decimal(level)
        self.g, self.slope, self.tau = g, g.slope(), path.tau
        self.start, self.error = start, error + PAD * abs(start)
        self._sines = [self._settled(*sine) for sine in g.sines]
        self._ripple = sum(math.hypot(p, q) for _, _, p, q, _ in self._sines)

    def _settled(self, a: float, f: float, phase: float) -> tuple[float, ...]:
        """frequency, phase, and the settled response p sin + q cos with its value at s = 0."""
        k = math.tau * f * self.tau
        if math.isinf(self.tau):
            p, q = 0.0, -a / (math.tau * f)
        elif k < 1e150:
            p, q = a / (1 + k * k), -a * k / (1 + k * k)
        else:
            p, q = 0.0, -a / k
        angle = math.tau * phase
        return f, phase, p, q, p * math.sin(angle) + q * math.cos(angle)

    def _ripples(self, s: float) -> list[float]:
        settled = []
        for f, phase, p, q, _ in self._sines:
            angle = math.tau * turns_after(f, s, phase)
            settled.append(p * math.sin(angle) + q * math.cos(angle))
        return settled

    def at(self, s: float) -> tuple[float, float, float]:
        """h, how far it may be off, and the settled ripple in it, after s."""
        g = self.g
        if math.isinf(self.tau):
            fall, step = 1.0, s
            slope, bow = s * s / 2, s * s * s / 3
        else:
            u = s / self.tau
            fall, step = math.exp(-u), -math.expm1(-u)
            slope = self.tau * (u - step)
            bow = self.tau * self.tau * (u * u - 2 * (u - step))
        terms = [self.start * fall, g.a * step, g.b * slope, g.c * bow]
        size = sum(map(abs, terms)) + abs(g.b) * s * min(1.0, step) + abs(g.c) * s * s
        size += abs(terms[0]) * s / self.tau
        ripples = self._ripples(s)
        for (*_, p, q, first), ripple in zip(self._sines, ripples, strict=True):
            terms.append(ripple)
            terms.append(-first * fall)
            size += 4 * (abs(p) + abs(q))
        for amplitude, source_tau in g.decays:
            term, rough = self._decayed(amplitude, source_tau, s, fall)
            terms.append(term)
            size += rough
        return math.fsum(terms), PAD * size + self.error * fall, math.fsum(ripples)

    def _decayed(self, a: float, source_tau: float, s: float, fall: float) -> tuple[float, float]:
        """Response to a decay, and the size of what was added up for it."""
        own = math.exp(-s / source_tau)
        if math.isinf(self.tau):
            term = -a * source_tau * math.expm1(-s / source_tau)
            return term, abs(term)
        x = s * ((source_tau - self.tau) / source_tau / self.tau)
        if abs(x) < 1:
            term = a * s / self.tau * fall * (math.expm1(x) / x if x else 1.0)
            return term, abs(term) * (1 + s / self.tau)
        share = a * (source_tau / (source_tau - self.tau))
        size = abs(share) * (own * (1 + s / source_tau) + fall * (1 + s / self.tau))
        return share * (own - fall), size

    @fifty_digits
    def side(self, s: float) -> int:
        """Which side of the level y is on after s."""
        h, error, _ = self.at(s)
        if abs(h) > error:
            return 1 if h > 0 else -1
        if self.path.exact is None:
            return 0
        digits = self.path.exact(Decimal(s)) - self.level
        if abs(digits) <= Decimal(error) * _NOTHING:
            return 0
        return 1 if digits > 0 else -1

    def marks(self, left: float, right: float) -> Iterator[Mark]:
        """Marks from left to right, at most one zero of h between neighbours."""
        yield Mark(left, self.side(left))
        stack = [(left, right)]
        looked = 0
        while stack:
            left, right = stack.pop()
            looked += 1
            if looked > _WINDOWS:
                raise Undecided(_TOO_MANY)
            clear = self._clear(left, right)
            if clear:
                yield Mark(right, clear)
                continue
            if not self.one_sided(self.g, left, right):
                if not self.one_sided(self.slope, left, right):
                    middle = left + (right - left) / 2
                    if left < middle < right and right - left > 4 * EPS * right:
                        stack += [(middle, right), (left, middle)]
                        continue
                elif (turn := self._turn(left, right)) is not None:
                    yield Mark(turn, self.side(turn))
            yield Mark(right, self.side(right))

    def turns(self, left: float, right: float) -> list[float]:
        """Zeros of g from left to right, and moments too close to one to tell."""
        found: list[float] = []
        stack = [(left, right)]
        for _ in range(_WINDOWS):
            if not stack:
                return found
            left, right = stack.pop()
            if self.one_sided(self.g, left, right):
                continue
            if self.one_sided(self.slope, left, right):
                turn = self._turn(left, right)
                found += [] if turn is None else [turn]
                continue
            middle = left + (right - left) / 2
            if right - left > 4 * EPS * right:
                stack += [(middle, right), (left, middle)]
            else:
                found.append(middle)
        raise Undecided(_TOO_MANY)

    @staticmethod
    def one_sided(forcing: Forcing, left: float, right: float) -> bool:
        """Whether a forcing provably keeps its sign from left to right."""
        low, high = forcing.bounds(left, right)
        return low >= 0 or high <= 0

    def _clear(self, left: float, right: float) -> int:
        """The side on which y provably stays all the way from left to right; 0 when unknown."""
        low, high = self.reach(left, right)
        return (low > 0) - (high < 0)

    def reach(self, left: float, right: float) -> tuple[float, float]:
        """Numbers that h stays between from left to right."""
        h, error, ripple = self.at(left)
        fall, step = self._weights(right - left)
        low, high = -math.inf, math.inf
        for value, (least, most), margin in (
            (h, self.g.bounds(left, right), error),
            (h - ripple, self.g.slow_bounds(left, right), error + self._ripple * (1 + PAD)),
        ):
            down, up = value * fall + least * step, value * fall + most * step
            margin += PAD * (abs(value) + max(abs(least), abs(most)) * step)
            low = max(low, min(value, down) - margin)
            high = min(high, max(value, up) + margin)
            if not self._sines:
                break
        return low, high

    def _weights(self, width: float) -> tuple[float, float]:
        """What is left of h after a width, and what a constant g adds."""
        if math.isinf(self.tau):
            return 1.0, width
        return math.exp(-width / self.tau), -math.expm1(-width / self.tau)

    def _turn(self, left: float, right: float) -> float | None:
        """The zero of a monotonic g between left and right."""
        first, last = self.g(left), self.g(right)
        if (first < 0) == (last < 0):
            return None
        while True:
            middle = left + (right - left) / 2
            if not left < middle < right:
                return right
            if (self.g(middle) < 0) == (first < 0):
                left = middle
            else:
                right = middle

    def root(self, left: float, right: float, side: int) -> Decimal:
        """The one zero of h between marks that lie on different sides; `side` is left's."""
        s = left + (right - left) / 2
        a, b = left, right
        for turn in range(200):
            h, error, _ = self.at(s)
            guess = s + self._step(h, self.g(s))
            if abs(h) <= error:
                s = guess if a < guess < b else s
                break
            if (h > 0) == (side > 0):
                a = s
            else:
                b = s
            if not a < guess < b or turn % 4 == 3:
                guess = a + (b - a) / 2
            if not a < guess < b:
                break
            s = guess
        return self._polished(s, Decimal(left), Decimal(right), side)

    def _step(self, h: float, g: float) -> float:
        """From where y is to the level, were the forcing constant."""
        if g == 0:
            return math.nan
        ratio = -h / g
        if math.isinf(self.tau):
            return ratio
        return self.tau * math.log1p(ratio) if ratio > -1 else math.nan

    @fifty_digits
    def _polished(self, s: float, a: Decimal, b: Decimal, side: int) -> Decimal:
        """The zero to about twenty digits, from a good guess between a and b."""
        x = Decimal(s)
        exact = self.path.exact
        if exact is None:
            return x
        last: tuple[Decimal, Decimal] | None = None
        for _ in range(400):
            h = exact(x) - self.level
            before = (h > 0) == (side > 0) and h != 0
            a, b = (x, b) if before else (a, x)
            g = self.g(float(x))
            if h == 0:
                return x
            if abs(float(h)) < 1e-3 * abs(g):
                guess = x + Decimal(self._step(float(h), g))
            elif last is not None and h != last[1]:  # y keeps close to the forcing: a secant
                guess = x - h * (x - last[0]) / (h - last[1])
            else:
                guess = x + abs(x) * _NEAR * (1 if before else -1)
            last = x, h
            if not a < guess < b:
                guess = (a + b) / 2
            if abs(guess - x) <= abs(guess) * _FINE or b - a <= abs(b) * _FINE:
                return guess
            x = guess
        return x

    def settles(self) -> float | None:
        """A moment behind which h keeps its side for ever; None when a sine keeps it moving."""
        longest = max([0.0 if math.isinf(self.tau) else self.tau, *(t for _, t in self.g.decays)])
        line = self._settled_line()
        first = abs(self.start) + abs(line[0]) + self._ripple
        if not any(line[1:]) and abs(line[0]) <= self._ripple * (1 + PAD):
            return None if self._ripple else 750 * longest
        s = longest or 1.0
        while s < math.inf:
            value = slope = 0.0
            for power in (3, 2, 1, 0):
                slope = slope * s + value
                value = value * s + line[power]
            left = self._left(s, first)
            away = value * slope >= 0 and all(value * part >= 0 for part in line[2:])
            if away and abs(value) > (self._ripple + left) * (1 + PAD) + PAD * abs(line[0]):
                return s
            s *= 2
        raise Undecided(_TOO_MANY)

    def _settled_line(self) -> tuple[float, float, float, float]:
        """What h settles to apart from the ripple: coefficients of 1, s, s^2, s^3."""
        g, tau = self.g, self.tau
        if math.isinf(tau):
            ripple = math.fsum(first for *_, first in self._sines)
            charge = math.fsum(a * source_tau for a, source_tau in g.decays)
            return self.start - ripple + charge, g.a, g.b / 2, g.c / 3
        return g.a - tau * (g.b - 2 * g.c * tau), g.b - 2 * g.c * tau, g.c, 0.0

    def _left(self, s: float, first: float) -> float:
        """Bound of what is still to die away after s."""
        if math.isinf(self.tau):
            return sum(abs(a) * t * math.exp(-s / t) for a, t in self.g.decays)
        left = first * math.exp(-s / self.tau)
        for a, source_tau in self.g.decays:
            left += abs(a) * (s / self.tau) * math.exp(-s / max(source_tau, self.tau))
        return left


_NOTHING = Decimal("1e-24")
"""Share of a double's uncertainty that fifty digits count as 0."""
_FINE = Decimal("1e-20")
_NEAR = Decimal("1e-14")
_TOO_MANY = "more turning points of y have to be looked at than can be told apart"
