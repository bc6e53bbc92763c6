"""A network stepped through its full circuit equations, whatever order they are.

Node voltages and branch currents obey E dx/dt + G x = s(t). They are stepped by Radau IIA with
three stages (order 5, stiffly accurate): E. Hairer, G. Wanner, Solving Ordinary Differential
Equations II, IV.5. A step takes over E x, which is charge and flux, so both are conserved at
t = 0. Nothing is reduced to one order and no exponential is taken.
"""

from __future__ import annotations

import copy
import math
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from tausheet.addin.review import second_method_shapes as shapes
from tausheet.addin.review.second_method_course import Expected, Forcing, TooLong

_ROOT = math.sqrt(6)
_NODES = np.array([(4 - _ROOT) / 10, (4 + _ROOT) / 10, 1.0])
_MATRIX = np.array(
    [
        [(88 - 7 * _ROOT) / 360, (296 - 169 * _ROOT) / 1800, (-2 + 3 * _ROOT) / 225],
        [(296 + 169 * _ROOT) / 1800, (88 + 7 * _ROOT) / 360, (-2 - 3 * _ROOT) / 225],
        [(16 - _ROOT) / 36, (16 + _ROOT) / 36, 1 / 9],
    ]
)
MOST_STEPS = 20_000
_REFERENCES = ("reference", "ground", "earth")
_POSITIVE_AT_TO = ("voltage source", "current source")


class Network:
    """The equations of a network table with resistors, stores, switches and sources."""

    def __init__(self, rows: Sequence[Sequence[Any]]) -> None:
        heads = [str(cell).casefold() if cell not in (None, "") else "" for cell in rows[0]]
        self.elements: list[dict[str, Any]] = []
        for row in rows[1:]:
            if all(cell in (None, "") for cell in row):
                continue
            cells = {h: (None if c == "" else c) for h, c in zip(heads, row, strict=True) if h}
            cells["kind"] = " ".join(str(cells["kind"]).casefold().split())
            self.elements.append(cells)
        nodes = {_name(e[end]) for e in self.elements for end in ("from", "to")}
        self.nodes = {n: i for i, n in enumerate(sorted(nodes - {*_REFERENCES}))}
        self.size = len(self.nodes)
        self.branches: dict[str, int] = {}
        for element in self.elements:
            kind = element["kind"]
            if kind not in ("resistor", "capacitor", "inductor", "switch", *_POSITIVE_AT_TO):
                raise ValueError(f"{kind} is not known here")
            self.branches[_name(element["name"])] = self.size
            self.size += 1
        self.g, self.e = self._matrices("value", still=False)
        self.forcings = [self._forcing(element) for element in self.elements]
        self.rates = self._rates()
        self.first = self._before()

    def _matrices(self, column: str, still: bool) -> tuple[Any, Any]:
        """G and E; still: stores held at their Start, or settled."""
        g, e = np.zeros((self.size, self.size)), np.zeros((self.size, self.size))
        for element in self.elements:
            kind, at = element["kind"], self.branches[_name(element["name"])]
            value: Any = element["value"] if element.get(column) is None else element[column]
            for end, sign in (("from", 1.0), ("to", -1.0)):
                node = self.nodes.get(_name(element[end]))
                if node is not None:
                    g[node, at] += sign  # the current leaves the node From
                    if kind != "current source":
                        g[at, node] += sign  # v(From) - v(To)
            held = still and element.get("start") is not None
            if kind == "resistor":
                g[at, at] -= float(value)
            elif kind == "current source":
                g[at, at] = 1.0
            elif (kind == "switch" and str(value).casefold() == "open") or (
                kind == "inductor" and held
            ):
                g[at, :] = 0.0
                g[at, at] = 1.0
            elif kind == "inductor" and not still:
                e[at, at] -= float(element["value"])
            elif kind == "capacitor" and still and not held:
                g[at, :] = 0.0
                g[at, at] = 1.0
            elif kind == "capacitor" and not still:
                e[at, :] = float(element["value"]) * g[at, :]
                g[at, :] = 0.0
                g[at, at] = -1.0
        return g, e

    def _forcing(self, element: dict[str, Any]) -> Forcing | None:
        if element["kind"] not in _POSITIVE_AT_TO:
            return None
        sign = -1.0 if element["kind"] == "voltage source" else 1.0
        given = [element.get(letter) for letter in ("shape", *"abcde")]
        held = shapes.step(float(element["value"]), -math.inf)
        parts = [held] if given[0] is None else [held, shapes.of_table([given])]
        return Forcing(
            lambda t: sign * sum(part.level(t) for part in parts),
            parts[-1].breaks if len(parts) > 1 else (),
            parts[-1].period,
            parts[-1].marks,
            parts[-1].quick,
            sum(part.scale for part in parts),
        )

    def _before(self) -> Any:
        """What holds until t = 0: stores settled, or at their Start."""
        g, _ = self._matrices("before", still=True)
        s = np.zeros(self.size)
        for element in self.elements:
            at = self.branches[_name(element["name"])]
            value: Any = element["value"] if element.get("before") is None else element["before"]
            if element["kind"] == "voltage source":
                s[at] = -float(value)
            elif element["kind"] == "current source":
                s[at] = float(value)
            elif element["kind"] in ("capacitor", "inductor") and element.get("start") is not None:
                s[at] = float(element["start"])
        if np.linalg.matrix_rank(g) < self.size:
            raise ValueError("before t = 0 a quantity is open")
        return np.linalg.solve(g, s)

    def _rates(self) -> list[float]:
        """The natural frequencies, for the length of the steps alone."""
        import scipy.linalg

        rates = scipy.linalg.eigvals(-self.g, self.e)
        finite = rates[np.isfinite(rates)]
        size = np.abs(finite)
        return [float(rate) for rate in size if rate < 1e6 * max(size.min(), 1e-300)]

    def at(self, t: float, refine: int = 1) -> Any:
        """Every voltage and current at t."""
        x = self.first
        if t < 0:
            return x
        if t == 0:
            t = 1e-11 / max(self.rates, default=1.0)
        sources = [f for f in self.forcings if f is not None]
        moments = sorted({0.0, t}.union(*(f.between(0.0, t) for f in sources)))
        quick = min((f.quick for f in sources), default=math.inf) / 24
        longest = min(quick, 0.05 / max(self.rates, default=1e-300)) / refine
        for begin, end in zip(moments, moments[1:], strict=False):  # noqa: RUF007
            # the first steps after a jump are short: it leaves algebraic parts to settle
            count = max(2, math.ceil((end - begin) / longest))
            if count > MOST_STEPS:
                raise TooLong
            x = self._steps(x, begin, end, count)
        return x

    def _steps(self, x: Any, begin: float, end: float, count: int) -> Any:
        h, size = (end - begin) / count, self.size
        whole = np.kron(np.eye(3), self.e) + h * np.kron(_MATRIX, self.g)
        inverse = np.linalg.inv(whole)
        moments = begin + h * (np.arange(count)[:, None] + _NODES)
        inside = np.nextafter(end, begin)  # the level before a jump at the end of the piece
        s = np.zeros((count, 3, size))
        for element, forcing in zip(self.elements, self.forcings, strict=True):
            if forcing is not None:
                at = self.branches[_name(element["name"])]
                s[:, :, at] = forcing.level(np.minimum(moments, inside))
        pushed = h * np.einsum("ij,njk->nik", _MATRIX, s).reshape(count, 3 * size)
        for push in pushed:
            x = (inverse @ (np.tile(self.e @ x, 3) + push))[2 * size :]
        return x

    def undriven(self) -> Network:
        """The same network without sources, its stores left with something in them."""
        other = copy.copy(self)
        other.forcings = [None] * len(self.elements)
        other.first = np.zeros(self.size)
        for element in self.elements:
            at = self.branches[_name(element["name"])]
            if element["kind"] == "inductor":
                other.first[at] = 1.0
            elif element["kind"] == "capacitor":
                for end, side in (("from", 1.0), ("to", -1.0)):
                    node = self.nodes.get(_name(element[end]))
                    if node is not None:
                        other.first[node] = side
                        break
        return other

    def size_of(self, quantity: str, x: Any) -> float:
        """How large such quantities are in the network."""
        count = len(self.nodes)
        volts, amperes = (
            float(np.max(np.abs(part), initial=0.0)) for part in (x[:count], x[count:])
        )
        kind = quantity.casefold().split()[0]
        return {"voltage": volts, "current": amperes}.get(kind, volts * amperes)

    def quantity(self, text: str) -> Callable[[Any], float]:
        """A function of x for "voltage at NODE", "voltage across NAME" and their like."""
        words = text.casefold().split()
        what, which = " ".join(words[:2]), " ".join(words[2:])
        if what == "voltage at":
            node = self.nodes.get(which)
            if node is None and which not in _REFERENCES:
                raise ValueError(f"no node {which}")
            return lambda x: 0.0 if node is None else float(x[node])
        element = next(e for e in self.elements if _name(e["name"]) == which)
        at = self.branches[which]
        ends = [self.nodes.get(_name(element[end])) for end in ("from", "to")]

        def across(x: Any) -> float:
            first, last = (0.0 if node is None else float(x[node]) for node in ends)
            return first - last

        sign = -1.0 if element["kind"] in _POSITIVE_AT_TO else 1.0
        if what == "voltage across":
            return lambda x: sign * across(x)
        if what == "current through":
            return lambda x: float(x[at])
        if what == "power in":
            return lambda x: across(x) * float(x[at])
        raise ValueError(f"{what} is not known here")


def _name(cell: Any) -> str:
    return f"{cell:.15g}" if isinstance(cell, float) else " ".join(str(cell).casefold().split())


_known: dict[str, Network] = {}


def network_of(rows: Sequence[Sequence[Any]]) -> Network:
    """The network of a table, set up once."""
    key = repr(rows)
    if key not in _known:
        _known.clear()
        _known[key] = Network(rows)
    return _known[key]


def value(r: float, t: float, rows: Any, quantity: str) -> Expected:
    """A quantity at t; near is what halving the steps has changed, and the size of the network."""
    network = network_of(rows)
    read = network.quantity(quantity)
    states = [network.at(t, refine) for refine in (2, 1)]
    fine, coarse = map(read, states)
    return fine, 4 * abs(fine - coarse) + 1e-10 * network.size_of(quantity, states[0])


def crossing(
    r: float, level: float, rows: Any, quantity: str, direction: str = "either",
    count: float = 1, after: float = 0.0,
) -> Expected | None:  # fmt: skip
    """The passage asked for, earlier ones told by points between."""
    if r <= 0:
        return None
    network = network_of(rows)
    read = network.quantity(quantity)
    begin = max(after, 0.0)
    moments = [begin + (r - begin) * k / 40 for k in range(40)] + [r * (1 - 1e-6)]
    sides = [read(network.at(moment)) > level for moment in moments]
    wanted = {"rising": (True,), "falling": (False,)}.get(direction, (True, False))
    turns = [b for a, b in zip(sides, sides[1:], strict=False) if a != b and b in wanted]  # noqa: RUF007
    if len(turns) != count - 1:
        return None
    here, near = value(r, r, rows, quantity)
    h = 1e-5 * r
    slope = (read(network.at(r + h)) - read(network.at(r - h))) / (2 * h)
    return None if slope == 0 else (r - (here - level) / slope, near / abs(slope))


def peak(
    r: tuple[float, float], rows: Any, quantity: str, t_from: float, t_to: float,
    kind: str = "max",
) -> Expected | None:  # fmt: skip
    """The value at the moment given, unless the quantity goes further elsewhere in the window."""
    sign = {"max": 1.0, "min": -1.0}.get(kind)
    if sign is None:
        return None
    network = network_of(rows)
    read = network.quantity(quantity)
    here, near = value(r[0], r[1], rows, quantity)
    moments = [t_from + (t_to - t_from) * k / 60 for k in range(61)]
    furthest = max(sign * read(network.at(moment)) for moment in moments)
    return sign * max(sign * here, furthest - near), near


def of_store(r: float, rows: Any, what: str) -> Expected | None:
    """The only store: its value at first and at last, or the time in which it decays to 1/e."""
    network = network_of(rows)
    stores = [e for e in network.elements if e["kind"] in ("capacitor", "inductor")]
    if len(stores) != 1 or what not in ("tau", "initial", "final"):
        return None
    kind = "voltage across" if stores[0]["kind"] == "capacitor" else "current through"
    quantity = f"{kind} {_name(stores[0]['name'])}"
    if what == "initial":
        return value(r, 0.0, rows, quantity)
    if what == "final":
        return value(r, 40 / min(network.rates), rows, quantity)
    read, undriven = network.quantity(quantity), network.undriven()
    start, end = read(undriven.at(0.0)), read(undriven.at(r))
    share = end / start
    # one Newton step from the time given to that at which the share is 1/e
    return r * (1 + (share - math.exp(-1)) / math.exp(-1)), 1e-9 * r
