"""A voltage, current or power of a network over time."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.errors import InputError, NotAvailable
from tausheet.functions.exact import Array
from tausheet.functions.network_algebra import Row, exactly
from tausheet.functions.network_elements import (
    REFERENCE,
    SOURCES,
    Kind,
    Network,
    listed,
)
from tausheet.functions.network_equations import CONSTANT, Tableau
from tausheet.functions.network_shapes import (
    integral,
    integral_to_infinity,
    jump,
    may_jump,
    scaled,
    settled,
    slope,
)
from tausheet.functions.network_state import before, motion, reached
from tausheet.functions.sources import Source, forcing, superposed

_ONE = Decimal(1)
_ZERO = Decimal(0)
_NOTHING = 1e-12
"""Share of its terms below which an impulse is none."""

FORMS = '"voltage at NODE", "voltage across NAME", "current through NAME" or "power in NAME"'

Weighted = tuple[tuple[float, Source], ...]


@dataclass(frozen=True)
class Response:
    """A voltage or current: a first-order response plus sources, their rates and integrals."""

    name: str
    before: float | None
    """Until t = 0; None when the network does not determine it."""
    tau: float | None
    """None for an integrator, which has no first-order part."""
    start: float
    """The first-order part just after t = 0."""
    heads: float
    """The constant part of what it heads for."""
    slope: float
    """The steady rate of an integrated constant."""
    driven: tuple[Source, ...]
    """What it heads for besides."""
    direct: tuple[Weighted, ...]
    """Sources that act at once, by derivative."""
    integrated: Weighted
    struck: tuple[float, ...]
    """Impulses at t = 0 from what is constant before and after, by derivative of an impulse."""

    def at(self, t: Array) -> Array:
        """The quantity just after t, for t >= 0, impulses left out."""
        if self.tau is None:
            q = np.asarray(self.start + self.slope * t)
        else:
            sources = [Source("constant", (self.heads,)), *self.driven]
            q = superposed(t, np.asarray(self.tau), np.asarray(self.start), sources)
            if self.slope:
                q = q + self.slope * t
        for derivative, weighted in enumerate(self.direct):
            for weight, source in weighted:
                for own in derivatives(source, derivative):
                    q = q + weight * forcing(t, own)
        for weight, source in self.integrated:
            q = q + weight * integral(t, source)
        return np.asarray(q)

    def just_after(self) -> float:
        """The quantity just after t = 0."""
        return float(self.at(np.asarray(0.0)))

    def impulses(self, t: float) -> tuple[float, ...]:
        """Weights of an impulse at t and of its derivatives; empty when there is none."""
        orders = []
        for order in range(self.depth):
            terms = [self.struck[order]] if t == 0 and order < len(self.struck) else []
            for derivative in range(order + 1, len(self.direct)):
                for weight, source in self.direct[derivative]:
                    own = derivatives(source, derivative - 1 - order)
                    terms += [weight * jump(t, each) for each in own]
            orders.append(terms)
        return totals(orders)

    @property
    def depth(self) -> int:
        """How many kinds of impulses there may be: an impulse, its derivative, and so on."""
        return max(len(self.direct) - 1, len(self.struck))

    def impulsive(self, t: Array) -> NDArray[np.bool_]:
        """Where the quantity is an impulse."""
        mask = np.asarray(t == 0) if self.struck else np.zeros(np.shape(t), dtype=bool)
        for weighted in self.direct[1:]:
            for _, source in weighted:
                mask = mask | may_jump(t, source)
        found: NDArray[np.bool_] = np.array(mask)
        for index in map(tuple, np.argwhere(found)):
            found[index] = bool(self.impulses(float(t[index])))
        return found

    def final(self) -> float:
        """The value for t to infinity."""
        if self.tau is None:
            raise NotAvailable(
                "network is an integrator: its only natural frequency is zero, so it has no final "
                "value; FO_NETWORK_AT gives its response"
            )
        total = self.heads
        at_once = [
            (weight, own)
            for derivative, weighted in enumerate(self.direct)
            for weight, source in weighted
            for own in derivatives(source, derivative)
        ]
        for weight, source in (*((1.0, own) for own in self.driven), *at_once):
            level = settled(source)
            if level is None:
                raise NotAvailable(
                    f"network: {self.name} has no final value, since a {source.shape} never settles"
                )
            total += weight * level
        areas = [(weight, integral_to_infinity(own)) for weight, own in self.integrated]
        if self.slope or any(area is None for _, area in areas):
            raise NotAvailable(
                f"network: {self.name} has no final value, since it integrates a source"
            )
        return total + sum(weight * area for weight, area in areas if area is not None)


def totals(orders: Sequence[Sequence[float]]) -> tuple[float, ...]:
    """The sum of the terms of each order; empty when there is nothing but rounding in them."""
    sums = tuple(math.fsum(terms) for terms in orders)
    sizes = [math.fsum(map(abs, terms)) for terms in orders]
    real = [abs(total) > _NOTHING * size for total, size in zip(sums, sizes, strict=True)]
    return sums if any(real) else ()


def derivatives(source: Source, count: int) -> list[Source]:
    """The source differentiated so many times, between its jumps; nothing when it is constant."""
    for _ in range(count):
        change = slope(source)
        if change is None:
            return []
        source = change
    return [source]


@dataclass(frozen=True)
class Power:
    """What an element absorbs: voltage from From to To, times the current that flows that way."""

    voltage: Response
    current: Response

    @property
    def before(self) -> float | None:
        """Until t = 0; None when the network does not determine it."""
        v, i = self.voltage.before, self.current.before
        return None if v is None or i is None else v * i


def quantity(network: Network, text: str) -> Response | Power:
    """The quantity that a text asks for."""
    key = ("quantity", text.casefold())
    return network.remember(key, exactly(lambda: _quantity(network, text)))  # type: ignore[no-any-return]


def _quantity(network: Network, text: str) -> Response | Power:
    words = text.split(" ", 2)
    form, name = " ".join(words[:2]).casefold(), words[2] if len(words) > 2 else ""
    if form not in ("voltage at", "voltage across", "current through", "power in") or not name:
        raise InputError(f'quantity is the text "{text[:60]}"; allowed: {FORMS}')
    if form == "voltage at":
        node = network.node(name)
        if node is None:
            raise InputError(
                f"quantity asks for the node {name}, which is no node of the table; its nodes are "
                f"{listed([*network.nodes, network.reference], 12)}"
            )
        return _response(network, text, lambda tableau: tableau.potential(node, REFERENCE))
    index = network.element(name)
    if index < 0:
        raise InputError(
            f"quantity asks for {name}, which is no element of the table; its elements are "
            f"{listed([e.name for e in network.elements], 12)}"
        )
    if form == "current through":
        return current(network, index)
    if form == "power in":
        return Power(voltage(network, index), current(network, index))
    kind = network.elements[index].kind
    outwards = kind in SOURCES or kind is Kind.OPAMP
    return voltage(network, index, -1 if outwards else 1)


def voltage(network: Network, element: int, sign: int = 1) -> Response:
    """Voltage across an element, from From to To."""
    name = f"the voltage across {network.elements[element].name}"
    return _response(
        network, name, lambda tableau: {c: sign * v for c, v in tableau.across(element).items()}
    )


def current(network: Network, element: int) -> Response:
    """Current through an element, from From to To."""
    name = f"the current through {network.elements[element].name}"
    return _response(network, name, lambda tableau: tableau.through(element))


@exactly
def _response(network: Network, name: str, expression: Callable[[Tableau], Row]) -> Response:
    moving = motion(network)
    tableau = moving.dynamics.tableau
    mode, offsets = moving.initial(reached(network))
    earlier = before(network)
    linear = moving.quantity(expression(tableau), offsets)
    old = earlier.value(expression(earlier.tableau))
    sources = [network.elements[index].source for index in tableau.shaped]

    def weighted(row: Row) -> Weighted:
        return tuple(
            (float(row[number]), source)
            for number, source in enumerate(sources, start=1)
            if source is not None and number in row
        )

    constant = linear.level + linear.direct_of(CONSTANT, 0)
    drive = moving.drive
    driven = {number: linear.share * weight for number, weight in drive.items() if linear.share}
    return Response(
        name,
        None if old is None else float(old),
        None if moving.rate is None else float(-_ONE / moving.rate),
        _rounded(constant, linear.share * mode),
        _rounded(constant, linear.share * drive.get(CONSTANT, _ZERO)),
        float(linear.integral.get(CONSTANT, _ZERO)),
        tuple(scaled(source, weight) for weight, source in weighted(driven)),
        tuple(weighted(row) for row in linear.direct),
        weighted(linear.integral),
        tuple(
            _rounded(linear.direct_of(CONSTANT, order), -linear.direct_of(tableau.tie, order))
            for order in range(1, len(linear.direct))
        ),
    )


def _rounded(a: Decimal, b: Decimal) -> float:
    """a + b, exactly 0 when they cancel."""
    total = a + b
    return 0.0 if abs(total) <= abs(a).scaleb(-50) else float(total)
