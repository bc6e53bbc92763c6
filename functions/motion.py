"""A quantity on a stretch as a sum of terms s^n exp(rate s), and integrals of products of such.

In decimals with many digits: where two time constants almost agree, half of them cancel.
"""

from __future__ import annotations

import math
from collections import defaultdict
from decimal import Context, Decimal, DivisionByZero, InvalidOperation, Overflow, localcontext

from tausheet.functions.digits import TURN, sine_and_cosine
from tausheet.functions.roots import Path

CONTEXT = Context(
    prec=120, Emax=10**9, Emin=-(10**9), traps=[InvalidOperation, DivisionByZero, Overflow]
)
"""Where two time constants almost agree half of these digits cancel."""
_SMALL = Decimal("1e-3")
_ENOUGH = Decimal("1e-60")
ZERO, ONE = Decimal(0), Decimal(1)

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
    old = terms.get(term, (ZERO, ZERO))
    terms[term] = (old[0] + factor[0], old[1] + factor[1])


def _forcing(path: Path) -> Sum:
    terms: Sum = {}
    forcing = path.forcing
    for power, value in enumerate((forcing.a, forcing.b, forcing.c)):
        if value:
            _put(terms, (power, (ZERO, ZERO)), (Decimal(value), ZERO))
    for size, frequency, phase in forcing.sines:
        sine, cosine = sine_and_cosine(Decimal(phase))
        rate, half = TURN * Decimal(frequency), Decimal(size) / 2
        # A sin(ws + p) = A/2 (sin p - i cos p) exp(iws) + its conjugate
        _put(terms, (0, (ZERO, rate)), (half * sine, -half * cosine))
        _put(terms, (0, (ZERO, -rate)), (half * sine, half * cosine))
    for size, own in forcing.decays:
        _put(terms, (0, (-ONE / Decimal(own), ZERO)), (Decimal(size), ZERO))
    return terms


def motion(path: Path) -> Sum:
    """The quantity on a path: q' + k q = k F, with q' = F when tau is infinite."""
    k = ZERO if math.isinf(path.tau) else ONE / Decimal(path.tau)
    scale = k or ONE
    terms: Sum = {}
    for (power, rate), factor in _forcing(path).items():
        shifted = (rate[0] + k, rate[1])
        part = (factor[0] * scale, factor[1] * scale)
        if shifted == (ZERO, ZERO):
            _put(terms, (power + 1, rate), (part[0] / (power + 1), part[1] / (power + 1)))
            continue
        # p' + a p = c s^n: p = c (s^n / a - n s^(n-1) / a^2 + ...)
        for left in range(power, -1, -1):
            part = _over(part, shifted)
            _put(terms, (left, rate), part)
            part = (-left * part[0], -left * part[1])
    assert path.exact is not None
    start = path.exact(ZERO) - sum((f[0] for (n, _), f in terms.items() if n == 0), ZERO)
    _put(terms, (0, (-k, ZERO)), (start, ZERO))
    return terms


def _exponential(rate: Complex, s: Decimal) -> Complex:
    size = (rate[0] * s).exp()
    if not rate[1]:
        return size, ZERO
    sine, cosine = sine_and_cosine(rate[1] * s / TURN)
    return size * cosine, size * sine


def _integral(power: int, rate: Complex, end: Complex, s: Decimal) -> Complex:
    """Integral of s^n exp(rate s) from 0 to s; end = exp(rate s)."""
    if rate == (ZERO, ZERO):
        return s ** (power + 1) / (power + 1), ZERO
    x = (rate[0] * s, rate[1] * s)
    if max(abs(x[0]), abs(x[1])) < _SMALL:
        total, term, k = (ZERO, ZERO), (ONE, ZERO), 0
        while max(abs(term[0]), abs(term[1])) > _ENOUGH:
            total = (total[0] + term[0] / (power + k + 1), total[1] + term[1] / (power + k + 1))
            k += 1
            term = _times(term, (x[0] / k, x[1] / k))
        scale = s ** (power + 1)
        return scale * total[0], scale * total[1]
    value = _over((end[0] - ONE, end[1]), rate)
    for n in range(1, power + 1):
        raised = s**n
        value = _over((raised * end[0] - n * value[0], raised * end[1] - n * value[1]), rate)
    return value


def product_integral(a: Path, b: Path, length: Decimal) -> Decimal:
    """Integral of the product of two quantities on their common stretch, in closed form."""
    with localcontext(CONTEXT):
        return integral_of_product(motion(a), motion(b), length)


def integral_of_product(first: Sum, second: Sum, length: Decimal) -> Decimal:
    """Integral of the product of two sums of terms from 0 to length."""
    with localcontext(CONTEXT):
        ends = {rate: _exponential(rate, length) for _, rate in {**first, **second}}
        product: defaultdict[Term, Complex] = defaultdict(lambda: (ZERO, ZERO))
        grown: dict[Complex, Complex] = {}
        for (n, rate), factor in first.items():
            for (m, other), weight in second.items():
                both = (rate[0] + other[0], rate[1] + other[1])
                _put(product, (n + m, both), _times(factor, weight))
                grown[both] = _times(ends[rate], ends[other])
        total = ZERO
        for (power, rate), factor in product.items():
            part = _integral(power, rate, grown[rate], length)
            total += _times(factor, part)[0]
        return total
