"""Energy that an element of a network absorbs in a window of time."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from decimal import Context, Decimal, DivisionByZero, InvalidOperation, Overflow, localcontext
from itertools import islice
from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import Finite, Numbers
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.digits import TURN, sine_and_cosine
from tausheet.functions.errors import DomainError, InputError, NotAvailable
from tausheet.functions.network_elements import listed
from tausheet.functions.network_paths import Stretch, Stretches, Track, sources_of
from tausheet.functions.network_quantity import Response, current, voltage
from tausheet.functions.network_table import NetworkTable, OneText
from tausheet.functions.roots import Path, Undecided

_CONTEXT = Context(
    prec=120, Emax=10**9, Emin=-(10**9), traps=[InvalidOperation, DivisionByZero, Overflow]
)
"""Where two time constants almost agree half of these digits cancel."""
_SMALL = Decimal("1e-3")
_ENOUGH = Decimal("1e-60")
_STRETCHES = 2_000
"""Stretches between jumps of the sources that one window may hold."""
_TOO_LONG = f"the window holds more than {_STRETCHES} jumps of the sources; enter a shorter one"
_ZERO, _ONE = Decimal(0), Decimal(1)

Complex = tuple[Decimal, Decimal]
Term = tuple[int, Complex]
"""Power of s and rate: s^n exp(rate s)."""
Sum = dict[Term, Complex]
"""A function of s as a sum of terms with complex factors; sines come in conjugate pairs."""


def _times(a: Complex, b: Complex) -> Complex:
    return a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]


def _over(a: Complex, b: Complex) -> Complex:
    size = b[0] * b[0] + b[1] * b[1]
    real, imaginary = _times(a, (b[0], -b[1]))
    return real / size, imaginary / size


def _put(terms: Sum, term: Term, factor: Complex) -> None:
    old = terms.get(term, (_ZERO, _ZERO))
    terms[term] = (old[0] + factor[0], old[1] + factor[1])


def _forcing(path: Path) -> Sum:
    terms: Sum = {}
    forcing = path.forcing
    for power, value in enumerate((forcing.a, forcing.b, forcing.c)):
        if value:
            _put(terms, (power, (_ZERO, _ZERO)), (Decimal(value), _ZERO))
    for size, frequency, phase in forcing.sines:
        sine, cosine = sine_and_cosine(Decimal(phase))
        rate, half = TURN * Decimal(frequency), Decimal(size) / 2
        # A sin(ws + p) = A/2 (sin p - i cos p) exp(iws) + its conjugate
        _put(terms, (0, (_ZERO, rate)), (half * sine, -half * cosine))
        _put(terms, (0, (_ZERO, -rate)), (half * sine, half * cosine))
    for size, own in forcing.decays:
        _put(terms, (0, (-_ONE / Decimal(own), _ZERO)), (Decimal(size), _ZERO))
    return terms


def _motion(path: Path) -> Sum:
    """The quantity on a path: q' + k q = k F, with q' = F when tau is infinite."""
    k = _ZERO if math.isinf(path.tau) else _ONE / Decimal(path.tau)
    scale = k or _ONE
    terms: Sum = {}
    for (power, rate), factor in _forcing(path).items():
        shifted = (rate[0] + k, rate[1])
        part = (factor[0] * scale, factor[1] * scale)
        if shifted == (_ZERO, _ZERO):
            _put(terms, (power + 1, rate), (part[0] / (power + 1), part[1] / (power + 1)))
            continue
        # p' + a p = c s^n: p = c (s^n / a - n s^(n-1) / a^2 + ...)
        for left in range(power, -1, -1):
            part = _over(part, shifted)
            _put(terms, (left, rate), part)
            part = (-left * part[0], -left * part[1])
    assert path.exact is not None
    start = path.exact(_ZERO) - sum((f[0] for (n, _), f in terms.items() if n == 0), _ZERO)
    _put(terms, (0, (-k, _ZERO)), (start, _ZERO))
    return terms


def _exponential(rate: Complex, s: Decimal) -> Complex:
    size = (rate[0] * s).exp()
    if not rate[1]:
        return size, _ZERO
    sine, cosine = sine_and_cosine(rate[1] * s / TURN)
    return size * cosine, size * sine


def _integral(power: int, rate: Complex, end: Complex, s: Decimal) -> Complex:
    """Integral of s^n exp(rate s) from 0 to s; end = exp(rate s)."""
    if rate == (_ZERO, _ZERO):
        return s ** (power + 1) / (power + 1), _ZERO
    x = (rate[0] * s, rate[1] * s)
    if max(abs(x[0]), abs(x[1])) < _SMALL:
        total, term, k = (_ZERO, _ZERO), (_ONE, _ZERO), 0
        while max(abs(term[0]), abs(term[1])) > _ENOUGH:
            total = (total[0] + term[0] / (power + k + 1), total[1] + term[1] / (power + k + 1))
            k += 1
            term = _times(term, (x[0] / k, x[1] / k))
        scale = s ** (power + 1)
        return scale * total[0], scale * total[1]
    value = _over((end[0] - _ONE, end[1]), rate)
    for n in range(1, power + 1):
        raised = s**n
        value = _over((raised * end[0] - n * value[0], raised * end[1] - n * value[1]), rate)
    return value


def product_integral(a: Path, b: Path, length: Decimal) -> Decimal:
    """Integral of the product of two quantities on their common stretch, in closed form."""
    with localcontext(_CONTEXT):
        first, second = _motion(a), _motion(b)
        ends = {rate: _exponential(rate, length) for _, rate in {**first, **second}}
        product: defaultdict[Term, Complex] = defaultdict(lambda: (_ZERO, _ZERO))
        grown: dict[Complex, Complex] = {}
        for (n, rate), factor in first.items():
            for (m, other), weight in second.items():
                both = (rate[0] + other[0], rate[1] + other[1])
                _put(product, (n + m, both), _times(factor, weight))
                grown[both] = _times(ends[rate], ends[other])
        total = _ZERO
        for (power, rate), factor in product.items():
            part = _integral(power, rate, grown[rate], length)
            total += _times(factor, part)[0]
        return total


class _Absorbed:
    """Voltage from From to To and current that way, both along the same stretches."""

    def __init__(self, responses: Sequence[Response]) -> None:
        self.responses = responses
        stretches = Stretches(sources_of(*responses))
        self.stretches = stretches
        self.tracks = [Track(response, stretches) for response in responses]

    def energy(self, t_from: float, t_to: float) -> float:
        """From just after t_from to just after t_to."""
        total = _ZERO
        before = [r.before for r in self.responses]
        if t_from < 0:
            if before[0] is None or before[1] is None:
                raise NotAvailable(
                    "the network before t = 0 does not determine the power of the element; enter "
                    "a t_from of 0 or later"
                )
            rest = Decimal(before[0]) * Decimal(before[1])
            total += rest * (min(Decimal(t_to), _ZERO) - Decimal(t_from))
            if t_to < 0:
                return float(total)
            total += self._strike(None, [Decimal(b or 0.0) for b in before], _ZERO)
        begin, end = Decimal(max(t_from, 0.0)), Decimal(t_to)
        stretches = list(islice(self.stretches.between(begin, end), _STRETCHES + 1))
        if len(stretches) > _STRETCHES:
            raise Undecided(_TOO_LONG)
        with localcontext(_CONTEXT):
            for stretch in stretches:
                paths = [track.path(*stretch) for track in self.tracks]
                total += product_integral(paths[0], paths[1], stretch[1] - stretch[0])
                total += self._strike(stretch, _ends(paths, stretch[1]), stretch[1])
        return float(total)

    def _strike(self, last: Stretch | None, before: Sequence[Decimal], t: Decimal) -> Decimal:
        """What an impulse brings: its charge times the mean voltage, its flux times the current."""
        after = self.stretches.after(t)
        impulses = [track.impulses(last, after) for track in self.tracks]
        if not any(impulses):
            return _ZERO
        if all(impulses) or any(any(weights[1:]) for weights in impulses):
            raise NotAvailable(
                "the energy has no end, since an impulse meets an impulse; put a resistor where "
                "it flows, or ask from after it on"
            )
        late = _ends([track.path(*after) for track in self.tracks], t)
        mean = [(a + b) / 2 for a, b in zip(before, late, strict=True)]
        flux, charge = (Decimal(weights[0]) if weights else _ZERO for weights in impulses)
        return charge * mean[0] + flux * mean[1]


def _ends(paths: Sequence[Path], t: Decimal) -> list[Decimal]:
    return [path.exact(t - path.origin) for path in paths if path.exact is not None]


@cell_function("FO_NETWORK_ENERGY", "Networks")
def network_energy(
    network: Annotated[Any, NetworkTable()],
    element: Annotated[Any, OneText()],
    t_from: Finite,
    t_to: Finite,
) -> Numbers:
    """Energy that an element absorbs in a window of time, in closed form.

        integral of v i dt from just after t_from to just after t_to

    A source that delivers has a negative result. An impulse counts with its charge times the mean
    of the voltage before and after it, so that stored + dissipated = supplied holds across it; what
    a switch absorbs when it joins charged capacitors is the energy lost there.

    Arguments:
        network: range with a heading row, as for FO_NETWORK; a network table
        element: name of an element of the table; a text
        t_from: start of the window (s); any number
        t_to: end of the window (s), not before t_from; any number

    Result: energy (J), in the broadcast shape of t_from and t_to.

    Errors: #NUM! for t_to before t_from or a window of more than 2,000 jumps; #N/A where the
    network before t = 0 leaves the power open, or where voltage and current have an impulse at
    once; #VALUE! for an unknown element and as for FO_NETWORK_AT.

    Assumes: linear, constant elements; at t = 0 charge and flux are conserved.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value", "Before"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
        ...         ["R1", "resistor", "in", "out", 1000.0, None],
        ...         ["C1", "capacitor", "out", "ground", 1e-6, None]]
        >>> round(network_energy(rows, "R1", 0.0, 1.0), 9), 1e-6 * 24**2 / 2
        (0.000288, 0.000288)

    References: modified nodal analysis; Tellegen's theorem.
    """
    index = network.element(element)
    if index < 0:
        raise InputError(
            f"element is {element}, which is no element of the table; its elements are "
            f"{listed([e.name for e in network.elements], 12)}"
        )
    absorbed = _Absorbed([voltage(network, index), current(network, index)])
    begin, end = np.broadcast_arrays(t_from, t_to)
    values, endless = np.zeros(begin.shape), np.zeros(begin.shape, bool)
    too_long = endless.copy()
    sentence = ""
    for at in np.ndindex(begin.shape):
        if end[at] < begin[at]:
            continue
        try:
            values[at] = absorbed.energy(float(begin[at]), float(end[at]))
        except Undecided:
            too_long[at] = True
        except NotAvailable as error:
            endless[at], sentence = True, str(error)
    return (
        Answer(values)
        .unless(
            end < begin,
            DomainError,
            "t_to is {t_to}, before t_from, {t_from}; enter a t_to that is not before t_from",
        )
        .unless(too_long, DomainError, _TOO_LONG)
        .unless(endless, NotAvailable, sentence)
    )
