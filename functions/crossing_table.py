"""Crossings under a forcing of points: all stretches of the table looked at at once."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import Decimal
from typing import Annotated, Any

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.arguments import Finite, Flag, Numbers, Positive
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.crossing import NEVER, UNDECIDED, WAYS, Count, Direction, each
from tausheet.functions.digits import fifty_digits
from tausheet.functions.errors import DomainError, NotAvailable
from tausheet.functions.exact import Array
from tausheet.functions.forcing import Forcing
from tausheet.functions.from_rest import excess
from tausheet.functions.pairs import add, exponential_fall, less, over, times
from tausheet.functions.paths import value_after
from tausheet.functions.roots import Lag, Path, Undecided
from tausheet.functions.table import Nodes, Points, check_points

_NOISE = 2e-13
"""Share of the scale within which a double does not tell the side of the level."""
_SAME = Decimal("2e-16")
"""Share of the scale below which y is at the level."""
_LONG = 45.0
"""Time constants after which what went before no longer counts in nineteen digits."""
_UNCLEAR = 2000
"""Moments at which doubles do not tell the side, beyond which a table is not decided."""

Sides = NDArray[np.int8]


@dataclass
class _Table:
    """A table under one tau, initial and level; h = y - level at the nodes."""

    nodes: Nodes
    tau: float
    initial: float
    level: float

    def __post_init__(self) -> None:
        nodes = self.nodes
        self.t, self.after = nodes.t, nodes.after
        lengths = np.diff(self.t)
        rises = nodes.before_next - self.after[:-1]
        self.slopes = np.append(rises / np.where(lengths > 0, lengths, 1.0), 0.0)
        self.lengths = np.append(lengths, math.inf)
        self.h = nodes.responses(self.tau, self.initial) - self.level
        largest = max(np.abs(self.after).max(), np.abs(nodes.before_next).max(initial=0.0))
        self.scale = float(max(largest, abs(self.initial), abs(self.level)))
        self.known: dict[int, Decimal] = {}

    def value(self, k: int) -> Decimal:
        """y at node k to about seventeen digits: every stretch before it has its share."""
        if k not in self.known:
            self.known[k] = self._value(k)
        return self.known[k]

    @fifty_digits
    def _value(self, k: int) -> Decimal:
        if k == 0:
            return Decimal(self.initial)
        first = int(np.searchsorted(self.t, self.t[k] - _LONG * self.tau))
        first = min(first, k - 1)
        begin, end = self.t[first:k], self.t[first + 1 : k + 1]
        tau = self.tau, 0.0
        d = over(add((end, 0.0), (-begin, 0.0)), tau)
        lag = add((1.0, 0.0), less(exponential_fall(d)))
        left = exponential_fall(over(add((self.t[k], 0.0), (-end, 0.0)), tau))
        rise = self.nodes.before_next[first:k] - self.after[first:k]
        positive = d[0] > 0
        share = np.where(positive, excess(d[0]) / np.where(positive, d[0], 1.0), 0.0)
        small = d[0] < 1e-3  # the pair's own difference would lose its digits
        exact_lag = np.where(small, -np.expm1(-d[0]), lag[0]), np.where(small, 0.0, lag[1])
        added = add(times((self.after[first:k], 0.0), exact_lag), times((rise, 0.0), (share, 0.0)))
        total = times(added, left)
        rest = exponential_fall(over(add((self.t[k], 0.0), (-begin[:1], 0.0)), tau))
        start = self.initial if first == 0 else self.h[first] + self.level
        high, low = (start * part for part in rest)
        return sum(
            (Decimal(math.fsum(part)) for part in ([*total[0], *high], [*total[1], *low])),
            Decimal(0),
        )

    def path(self, k: int) -> Path:
        """The stretch behind node k."""
        start = self.value(k)
        forcing = Forcing(float(self.after[k]), float(self.slopes[k]))
        path = Path(
            Decimal(float(self.t[k])), float(self.lengths[k]), self.tau, forcing, (forcing.a,)
        )
        return Path(
            path.origin,
            path.length,
            path.tau,
            forcing,
            path.levels,
            lambda s: value_after(path, start, s),
            float(start),
        )

    @fifty_digits
    def side(self, k: int, s: float) -> int:
        """The side of the level at s behind node k, at the level when closer than rounding."""
        path = self.path(k)
        assert path.exact is not None
        h = path.exact(Decimal(s)) - Decimal(self.level)
        if abs(h) <= _SAME * Decimal(self.scale):
            return 0
        return 1 if h > 0 else -1

    def marks(self) -> tuple[NDArray[np.intp], Array, Sides]:
        """Node, moment behind it and side, in order: every node, and where the line between two
        is at the level. Between two marks y passes the level at most once."""
        n = self.t.size
        drive = self.after - self.level
        end = np.append(self.nodes.before_next - self.level, drive[-1])
        turning = np.flatnonzero(drive * end < 0)
        s = -drive[turning] / self.slopes[turning]
        u = s / self.tau
        h_turn = self.h[turning] * np.exp(-u) - drive[turning] * np.expm1(-u)
        h_turn += self.slopes[turning] * (self.tau * excess(u))
        node = np.concatenate([np.arange(n), turning])
        moment = np.concatenate([np.zeros(n), s])
        h = np.concatenate([self.h, h_turn])
        order = np.lexsort((moment, node))
        node, moment, h = node[order], moment[order], h[order]
        sides = np.sign(h).astype(np.int8)
        unclear = np.abs(h) <= _NOISE * self.scale
        at_rest = self.initial == self.level
        if at_rest:  # y has not moved before the forcing first leaves the level
            moved = np.flatnonzero((drive != 0) | (end != 0))
            resting = node <= (moved[0] if moved.size else n)
            resting &= (moment == 0) | (node < (moved[0] if moved.size else n))
            sides[resting] = 0
            unclear &= ~resting
        doubtful = np.flatnonzero(unclear)
        if doubtful.size > _UNCLEAR:
            raise Undecided(UNDECIDED)
        for i in doubtful:
            sides[i] = self.side(int(node[i]), float(moment[i]))
        return node, moment, sides

    def crossing(self, way: int, count: float, after: float) -> float | None:
        """The count-th moment behind `after` at which y passes the level."""
        node, moment, sides = self.marks()
        lag = self._last_lag()
        final = lag.settles() or 0.0
        node, moment = np.append(node, self.t.size - 1), np.append(moment, final)
        sides = np.append(sides, lag.side(final) if final else sides[-1])
        t = self.t[node] + moment
        clear = np.flatnonzero(sides)
        before, behind = clear[:-1], clear[1:]
        passed = sides[before] != sides[behind]
        if way:
            passed &= sides[behind] == way
        before, behind = before[passed], behind[passed]
        touching = before + 1 < behind
        latest = np.where(touching, t[before + 1], t[behind])
        candidates = np.flatnonzero(latest > after)
        if candidates.size and not touching[first := candidates[0]] and t[before[first]] <= after:
            root = self._root(node, moment, sides, int(before[first]))
            candidates = candidates if root > after else candidates[1:]
        if candidates.size < count:
            return None
        chosen = candidates[int(count) - 1]
        if touching[chosen]:
            return float(t[before[chosen] + 1])
        return self._root(node, moment, sides, int(before[chosen]))

    def _last_lag(self) -> Lag:
        path = self.path(self.t.size - 1)
        assert path.start is not None
        return Lag(path, self.level, path.start - self.level, abs(path.start) * 2e-16)

    def _root(self, node: NDArray[np.intp], s: Array, sides: Sides, i: int) -> float:
        k = int(node[i])
        path = self.path(k)
        assert path.start is not None
        right = float(s[i + 1]) if node[i + 1] == k else float(self.lengths[k])
        lag = Lag(path, self.level, path.start - self.level)
        return path.moment(lag.root(float(s[i]), right, int(sides[i])))


@cell_function("FO_TABLE_CROSSING", "Crossing time")
def table_crossing(
    level: Finite,
    tau: Positive,
    initial: Finite,
    times: Points,
    levels: Points,
    held: Annotated[Any, Flag()] = False,
    direction: Direction = "either",
    count: Count = 1,
    after: Finite = 0.0,
) -> Numbers:
    """The count-th moment after `after` at which y under a forcing of points passes a level.

        on a straight line (y - level) exp(t / tau) turns once at most, where the line is at the
        level; on either side of that y passes the level at most once

    A touch, or a stretch at the level, counts only when y leaves on the other side, at the moment
    it arrived.

    Arguments:
        level: value of y to be passed; any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        times: moments of the points (s), never falling; a range, each any number
        levels: level of the forcing at each of them; a range, each any number
        held: TRUE to hold each level until the next point, FALSE when left out; TRUE or FALSE
        direction: which passages count; "either", "rising", "falling"
        count: which of them is asked for, 1 when left out; whole number >= 1
        after: time after which they count (s), 0 when left out; any number

    Result: time (s), in the broadcast shape of level, tau, initial, count and after.

    Errors: #N/A when y does not pass the level so often; #VALUE! for a blank, a text, an unknown
    word, or when times and levels differ in number; #NUM! outside the ranges, when the times
    fall, or when y is within rounding of the level at more than 2,000 points.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(table_crossing(2.5, 1.0, 0.0, [0.0, 1.0], [5.0, 5.0]), 12)
        0.69314718056

    References: closed form of tau dy/dt + y = x on each straight line.
    """
    check_points(times, levels)
    nodes, way = Nodes(times, levels, held), WAYS[direction]

    def one(level: float, tau: float, initial: float, count: float, after: float) -> float | None:
        return _Table(nodes, tau, initial, level).crossing(way, count, after)

    arguments = np.broadcast_arrays(level, tau, initial, count, after)
    values, never, undecided = each(one, *arguments)
    return (
        Answer(values).unless(undecided, DomainError, UNDECIDED).unless(never, NotAvailable, NEVER)
    )
