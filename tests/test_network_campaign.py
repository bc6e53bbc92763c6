"""Random networks against a solution of their full equations that shares no code with ours.

The reference keeps every potential and every branch current: E X' = A X with the sources as an
autonomous system of their own (a constant, a ramp, a rotation, a decay) appended to X, one such
system between any two breaks of the sources. It is split into its finite and its infinite part by
ordered QZ (scipy.linalg.ordqz) and the finite part moved on by scipy.linalg.expm. At t = 0 and at
each break the data E X before it (charges and fluxes) start the next stretch, which is what the
Laplace transform of the equations says. The state until t = 0 is one least-squares solution.

The reference works in units in which every value is near 1; ours gets the same network in ohms,
farads, henries and seconds, decades away.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.linalg import expm, lstsq, null_space, ordqz

from tausheet.functions import (
    network,
    network_at,
    network_crossing,
    network_energy,
    network_peak,
)
from tausheet.functions.errors import ErrorKind, NotAvailable, error_codes
from tausheet.functions.network_elements import Kind

Array = NDArray[Any]

BEYOND = 3e3
"""Eigenvalues larger than this are infinite: those of the networks here lie below 300."""

HEADINGS = ["Name", "Kind", "From", "To", "Value", "Before", "Start", "Control", "Shape"]
HEADINGS += list("ABCDE")


@dataclass
class Part:
    """An element in the units of the reference; a switch has the value 1 when closed."""

    name: str
    kind: str
    tail: str
    head: str
    value: float = 0.0
    before: float | None = None
    start: float | None = None
    control: str = ""
    shape: tuple[Any, ...] = ()

    def at(self, after: bool) -> float:
        return self.value if after or self.before is None else self.before


@dataclass
class Circuit:
    parts: list[Part] = field(default_factory=list)
    nodes: list[str] = field(default_factory=lambda: ["ground"])

    def node(self) -> str:
        self.nodes.append(f"n{len(self.nodes)}")
        return self.nodes[-1]

    def add(self, kind: str, tail: str, head: str, value: float = 0.0, **more: Any) -> Part:
        letter = "".join(word[0] for word in kind.replace("-", " ").split())
        part = Part(f"{letter}{len(self.parts) + 1}", kind, tail, head, value, **more)
        self.parts.append(part)
        return part


# ---- the reference -------------------------------------------------------------------------


class Reference:
    def __init__(self, circuit: Circuit) -> None:
        self.parts = circuit.parts
        self.nodes = circuit.nodes[1:]
        self.size = len(self.nodes) + len(self.parts)
        self.index = {part.name: i for i, part in enumerate(self.parts)}

    def potential(self, node: str) -> Array:
        row = np.zeros(self.size)
        if node != "ground":
            row[self.nodes.index(node)] = 1.0
        return row

    def across(self, part: Part) -> Array:
        return self.potential(part.tail) - self.potential(part.head)

    def through(self, part: Part) -> Array:
        row = np.zeros(self.size)
        row[len(self.nodes) + self.index[part.name]] = 1.0
        return row

    def equations(self, after: bool) -> tuple[Array, Array, Array]:
        """E X' + F X = G, G a column a source."""
        e = np.zeros((self.size, self.size))
        f = np.zeros((self.size, self.size))
        g = np.zeros((self.size, len(self.parts)))
        for i, part in enumerate(self.parts):
            v, current = self.across(part), self.through(part)
            for sign, node in ((1.0, part.tail), (-1.0, part.head)):
                if node != "ground":
                    f[self.nodes.index(node)] += sign * current
            row = len(self.nodes) + i
            value = part.at(after)
            words = part.control.split()
            if len(words) == 2:
                control = self.potential(words[0]) - self.potential(words[1])
            elif words:
                control = self.through(self.parts[self.index[words[0]]])
            if part.kind == "resistor":
                f[row] = v - value * current
            elif part.kind == "capacitor":
                e[row], f[row] = value * v, -current
            elif part.kind == "inductor":
                e[row], f[row] = value * current, -v
            elif part.kind == "switch":
                f[row] = v if value else current
            elif part.kind == "op-amp":
                f[row] = control
            elif part.kind == "voltage source":
                f[row], g[row, i] = -v, 1.0
            elif part.kind == "current source":
                f[row], g[row, i] = current, 1.0
            elif part.kind.endswith("voltage source"):
                f[row] = v + value * control
            else:
                f[row] = current - value * control
        return e, f, g

    def stores(self) -> list[Part]:
        return [p for p in self.parts if p.kind in ("capacitor", "inductor")]

    def state_row(self, part: Part) -> Array:
        return self.across(part) if part.kind == "capacitor" else self.through(part)

    def before(self) -> tuple[Array, Array, bool]:
        """X until t = 0, the directions the network leaves open, whether it has a solution."""
        _, f, g = self.equations(after=False)
        right = g @ np.array([p.at(False) if p.kind in SOURCES else 0.0 for p in self.parts])
        for part in self.stores():
            row = len(self.nodes) + self.index[part.name]
            if part.start is not None:
                f[row], right[row] = self.state_row(part), part.start
            else:
                other = self.through(part) if part.kind == "capacitor" else self.across(part)
                f[row], right[row] = other, 0.0
        for part in self.stores():  # what a Start leaves open has settled
            other = self.through(part) if part.kind == "capacitor" else self.across(part)
            loose = null_space(f, rcond=1e-10)
            if loose.size and np.abs(other @ loose).max() > 1e-9:
                f, right = np.vstack([f, other]), np.append(right, 0.0)
        x = lstsq(f, right)[0]
        fits = bool(np.allclose(f @ x, right, atol=1e-9))
        return x, null_space(f, rcond=1e-10), fits

    def eigenvalues(self) -> Array:
        e, f, _ = self.equations(after=True)
        _, _, alpha, beta, _, _ = ordqz(-f, e, sort=_finite, output="complex")
        keep = _finite(alpha, beta)
        return alpha[keep] / beta[keep]


SOURCES = ("voltage source", "current source")


def _finite(alpha: Any, beta: Any) -> Any:
    return np.abs(alpha) < BEYOND * np.abs(beta)


def _infinite(alpha: Any, beta: Any) -> Any:
    return np.abs(alpha) >= BEYOND * np.abs(beta)


class Motion:
    """E X' = A X from the data d = E X before: X(s) = V exp(J s) eta."""

    def __init__(self, e: Array, a: Array, data: Array) -> None:
        ai, ei, alpha, beta, _, z = ordqz(a, e, sort=_finite, output="complex")
        count = int(np.count_nonzero(_finite(alpha, beta)))
        _, _, _, _, q, _ = ordqz(a, e, sort=_infinite, output="complex")
        left = q[:, q.shape[1] - count :].conj().T
        # turned at random: expm takes a triangular matrix apart in a way of its own, and with
        # almost equal eigenvalues (those of ramps and constants) it was seen to fail (scipy 1.17)
        turn = np.linalg.qr(np.random.default_rng(0).normal(size=(count, count)))[0]
        self.v = z[:, :count] @ turn
        self.j = turn.T @ np.linalg.solve(ei[:count, :count], ai[:count, :count]) @ turn
        self.eta = np.linalg.solve(left @ e @ self.v, left @ data)
        self.impulse = np.linalg.norm(e @ (self.v @ self.eta) - data)

    def at(self, s: float) -> Array:
        return np.real(self.v @ (expm(self.j * s) @ self.eta))


def breaks_of(part: Part, until: float) -> list[float]:
    if not part.shape:
        return []
    word, *a = part.shape
    starts = {"constant": 1, "step": 1, "ramp": 2, "slope": 1, "sine": 3, "decay": 2, "pulse": 2}
    if word == "constant":
        return []
    where = starts.get(word, 4)
    start = a[where] if len(a) > where else 0.0
    if word in ("ramp", "pulse"):
        return [start, start + a[1]]
    if word == "square":
        count = int(max(0.0, until - start) / a[2]) + 2
        return [start + k * a[2] + d for k in range(count) for d in (0.0, a[3] * a[2])]
    return [start]


def generator(part: Part, t: float) -> tuple[Array, Array, Array]:
    """S, w0 and c with shape(t + s) = c exp(S s) w0 on the stretch that starts at t."""
    word, *a = part.shape
    line = np.array([[0.0, 1.0], [0.0, 0.0]])
    pick = np.array([1.0, 0.0])

    def straight(level: float, rate: float = 0.0) -> tuple[Array, Array, Array]:
        return line, np.array([level, rate]), pick

    middle = t + 1e-9
    starts = {"constant": 9, "step": 1, "ramp": 2, "slope": 1, "sine": 3, "decay": 2, "pulse": 2}
    where = starts.get(word, 4)
    start = a[where] if len(a) > where else 0.0
    if middle < start:
        return straight(0.0)
    if word in ("constant", "step"):
        return straight(a[0])
    if word == "ramp":
        done = middle > start + a[1]
        return straight(a[0]) if done else straight(a[0] * (t - start) / a[1], a[0] / a[1])
    if word == "slope":
        return straight(a[0] * (t - start), a[0])
    if word == "pulse":
        return straight(0.0 if middle > start + a[1] else a[0])
    if word == "square":
        phase = (middle - start) / a[2] % 1.0
        return straight(a[1] if phase < a[3] else a[0])
    if word == "decay":
        level = a[0] * math.exp(-(t - start) / a[1])
        return np.array([[-1.0 / a[1]]]), np.array([level]), np.array([1.0])
    omega = 2 * math.pi * a[1]
    angle = omega * (t - start) + math.radians(a[2])
    turn = np.array([[0.0, omega], [-omega, 0.0]])
    return turn, a[0] * np.array([math.sin(angle), math.cos(angle)]), pick


class Solution:
    """X at any time, of the full equations."""

    def __init__(self, reference: Reference, until: float) -> None:
        self.reference = reference
        self.rest, self.open, self.fits = reference.before()
        e, f, g = reference.equations(after=True)
        parts = reference.parts
        data = np.zeros(reference.size)
        for part in reference.stores():
            row = len(reference.nodes) + reference.index[part.name]
            data[row] = part.at(False) * self.reached(part)
        moments = sorted({0.0, *(b for p in parts for b in breaks_of(p, until) if 0 <= b <= until)})
        self.moments = [m for k, m in enumerate(moments) if k == 0 or m - moments[k - 1] > 1e-9]
        self.motions = []
        for k, moment in enumerate(self.moments):
            size = reference.size
            blocks, states, outputs = [np.zeros((1, 1))], [np.ones(1)], []
            outputs.append(g @ np.array([p.value if p.kind in SOURCES else 0.0 for p in parts]))
            columns = [outputs[0][:, None]]
            for i, part in enumerate(parts):
                if part.shape:
                    s, w, c = generator(part, moment)
                    blocks.append(s)
                    states.append(w)
                    columns.append(np.outer(g[:, i], c))
            own = sum(len(w) for w in states)
            big_e = np.eye(size + own)
            big_e[:size, :size] = e
            big_a = np.zeros((size + own, size + own))
            big_a[:size, :size] = -f
            big_a[:size, size:] = np.hstack(columns)
            at = size
            for s in blocks:
                big_a[at : at + len(s), at : at + len(s)] = s
                at += len(s)
            if k:
                data = e @ self.motions[-1].at(moment - self.moments[k - 1])[:size]
            self.motions.append(Motion(big_e, big_a, np.concatenate([data, *states])))

    def reached(self, part: Part) -> float:
        """State of a store with which t = 0 is reached."""
        rest = float(self.reference.state_row(part) @ self.rest)
        return rest if part.start is None else part.start

    def at(self, t: float) -> Array:
        if t < 0:
            return self.rest
        k = max(i for i, moment in enumerate(self.moments) if moment <= t + 1e-12)
        return self.motions[k].at(t - self.moments[k])[: self.reference.size]

    def quantities(self) -> dict[str, Any]:
        r = self.reference
        rows: dict[str, Any] = {f"voltage at {n}": (r.potential(n),) for n in r.nodes}
        for part in r.parts:
            source = part.kind.endswith("source") or part.kind == "op-amp"
            rows[f"voltage across {part.name}"] = ((-1 if source else 1) * r.across(part),)
            rows[f"current through {part.name}"] = (r.through(part),)
            rows[f"power in {part.name}"] = (r.across(part), r.through(part))
        return rows


# ---- the circuits --------------------------------------------------------------------------


class Maker:
    """A random network of one order, or an integrator."""

    def __init__(self, seed: int) -> None:
        self.rng = np.random.default_rng(seed)
        self.c = Circuit()

    def value(self) -> float:
        return float(np.round(10 ** self.rng.uniform(-0.7, 0.7), 3))

    def level(self) -> float:
        return float(np.round(self.rng.uniform(-10, 10), 2))

    def often(self, chance: float) -> bool:
        return bool(self.rng.random() < chance)

    def any_node(self, *without: str) -> str:
        return str(self.rng.choice([n for n in self.c.nodes if n not in without]))

    def resistor(self, a: str, b: str) -> Part:
        before = self.value() if self.often(0.15) else None
        return self.c.add("resistor", a, b, self.value(), before=before)

    def source(self, kind: str, a: str, b: str) -> Part:
        before = self.level() if self.often(0.6) else None
        return self.c.add(kind, a, b, self.level(), before=before, shape=self.shape())

    def shape(self) -> tuple[Any, ...]:
        if self.often(0.55):
            return ()
        level, time, start = self.level(), self.value(), self.value() * float(self.often(0.6))
        shapes: list[tuple[Any, ...]] = [
            ("constant", level),
            ("step", level, start),
            ("ramp", level, time, start),
            ("slope", level / 10, start),
            ("sine", level, float(np.round(self.rng.uniform(0.05, 2), 3)), 30.0 * level, start),
            ("decay", level, time, start),
            ("pulse", level, time, start),
            ("square", self.level(), level, 2 * time + 0.5, 0.25, start),
        ]
        return shapes[int(self.rng.integers(len(shapes)))]

    def make(self) -> Circuit:
        most = 12 if self.often(0.3) else 5
        for _ in range(int(self.rng.integers(1, most + 1))):
            a = self.any_node()
            self.resistor(a, self.c.node())
        for _ in range(int(self.rng.integers(0, most))):
            if len(self.c.nodes) > 2:
                a = self.any_node()
                self.resistor(a, self.any_node(a))
        for _ in range(int(self.rng.integers(1, 4))):
            self.feed()
        for _ in range(int(self.rng.integers(0, 3))):
            self.extra()
        stores = [name for name in dir(self) if name.startswith("store_")]
        getattr(self, stores[int(self.rng.integers(len(stores)))])()
        if self.often(0.25):
            self.passenger()
        return self.c

    def feed(self) -> None:
        if self.often(0.4):
            a = self.any_node()
            self.source("current source", a, self.any_node(a))
            return
        a, b = self.any_node(), self.c.node()
        self.source("voltage source", a, b)
        self.resistor(b, self.any_node(a, b) if len(self.c.nodes) > 2 else a)

    def extra(self) -> None:
        a = self.any_node()
        b, gain = self.any_node(a), self.level() / 15
        what = int(self.rng.integers(7))
        resistor = next(p for p in self.c.parts if p.kind == "resistor")
        if what == 0:
            self.c.add("voltage-controlled current source", a, b, gain / 4, control=f"{b} {a}")
        elif what == 1:
            self.c.add("current-controlled current source", a, b, gain, control=resistor.name)
        elif what in (2, 3):
            new = self.c.node()
            word, control = ("voltage", f"{a} {b}") if what == 2 else ("current", resistor.name)
            self.c.add(f"{word}-controlled voltage source", a, new, gain, control=control)
            self.resistor(new, b)
        elif what == 4:
            minus, out = self.c.node(), self.c.node()
            self.resistor(a, minus)
            self.resistor(minus, out)
            self.c.add("op-amp", "ground", out, control=f"ground {minus}")
            self.resistor(out, self.any_node(out, minus))
        elif what == 5:
            out = self.c.node()
            self.c.add("op-amp", "ground", out, control=f"{a} {out}")
            self.resistor(out, b if b != out else "ground")
        else:
            new = self.c.node()
            self.switch(a, new)
            self.resistor(new, b)

    def switch(self, a: str, b: str, value: float | None = None) -> Part:
        after = float(self.often(0.5)) if value is None else value
        before = None if self.often(0.3) else 1.0 - after
        return self.c.add("switch", a, b, after, before=before)

    def store(self, kind: str, a: str, b: str) -> Part:
        before = self.value() if self.often(0.2) else None
        start = self.level() if self.often(0.2) else None
        return self.c.add(kind, a, b, self.value(), before=before, start=start)

    def two(self) -> tuple[str, str]:
        a = self.any_node()
        return a, self.any_node(a)

    def store_one_capacitor(self) -> None:
        self.store("capacitor", *self.two())

    def store_one_inductor(self) -> None:
        self.store("inductor", *self.two())

    def store_parallel(self) -> None:
        a, b = self.two()
        for _ in range(int(self.rng.integers(2, 4))):
            self.store("capacitor", a, b)

    def store_series(self) -> None:
        kind = "capacitor" if self.often(0.6) else "inductor"
        a, b = self.two()
        middle = self.c.node()
        self.store(kind, a, middle)
        self.store(kind, middle, b)

    def store_across_a_resistor(self) -> None:
        """C1 - R - C2, or two inductors in parallel: one charge or flux stays."""
        a, new = self.any_node(), self.c.node()
        self.resistor(a, new)
        if self.often(0.5):
            self.store("capacitor", new, self.any_node(new))
            return
        self.store("inductor", new, "ground")
        self.store("inductor", new, "ground")

    def store_shared(self) -> None:
        """A capacitor switched onto another one: charge is shared at t = 0."""
        a, b = self.two()
        new = self.c.node()
        self.store("capacitor", a, b)
        self.c.add("switch", a, new, 1.0, before=0.0)
        self.store("capacitor", new, b)
        if self.often(0.5):
            self.resistor(new, self.any_node(new))

    def store_split(self) -> None:
        """Two capacitors parted at t = 0: one of them keeps its charge."""
        a, b = self.two()
        new = self.c.node()
        self.store("capacitor", a, b)
        self.c.add("switch", a, new, 0.0, before=1.0)
        self.store("capacitor", new, b)

    def store_bridged(self) -> None:
        """A capacitor from the store to a voltage source: tied together by the source."""
        a, new = self.any_node(), self.c.node()
        self.source("voltage source", "ground", new)
        self.store("capacitor", a, "ground") if a != "ground" else self.resistor(new, "ground")
        self.store("capacitor", new, a)

    def store_forced_inductor(self) -> None:
        """An inductor in series with a current source, and a free one."""
        a, b = self.two()
        new = self.c.node()
        self.source("current source", a, new)
        self.store("inductor", new, b)
        self.store("inductor", *self.two())

    def store_switched_inductors(self) -> None:
        """Two inductors put in series at t = 0: flux is conserved."""
        a, b = self.two()
        middle = self.c.node()
        self.store("inductor", a, middle)
        self.c.add("switch", middle, "ground", 0.0, before=1.0)
        self.store("inductor", middle, b)

    def store_integrator(self) -> None:
        a, minus, out = self.any_node(), self.c.node(), self.c.node()
        self.resistor(a, minus)
        self.c.add("op-amp", "ground", out, control=f"ground {minus}")
        part = self.store("capacitor", minus, out)
        if self.often(0.5):
            self.resistor(minus, out)
        elif part.start is None:
            part.start = self.level()

    def store_charged(self) -> None:
        """A current source into a capacitor."""
        new = self.c.node()
        self.source("current source", "ground", new)
        self.store("capacitor", new, "ground")

    def passenger(self) -> None:
        """A store that a source holds, or that nothing moves."""
        new = self.c.node()
        if self.often(0.5):
            self.source("voltage source", "ground", new)
            self.store("capacitor", new, "ground")
        else:
            self.switch(self.any_node(new), new, 0.0)
            self.store("capacitor", new, "ground")


def settle_starts(circuit: Circuit, rng: np.random.Generator) -> Reference:
    """Give a Start to what the network before t = 0 leaves open."""
    reference = Reference(circuit)
    for _ in range(2):
        _, loose, fits = reference.before()
        for part in reference.stores():
            open_state = loose.size and np.abs(reference.state_row(part) @ loose).max() > 1e-9
            if part.start is None and (open_state or not fits):
                part.start = float(np.round(rng.uniform(-10, 10), 2))
    return reference


def found(seed: int) -> tuple[Circuit, Reference]:
    """The first network from this seed on that is of one order (or integrates) and is stable."""
    for attempt in range(200):
        circuit = Maker(1000 * seed + attempt).make()
        if not 3 <= len(circuit.parts) <= 30:
            continue
        reference = settle_starts(circuit, np.random.default_rng(seed))
        e, f, _ = reference.equations(after=True)
        if np.linalg.svd(0.37 * e + f, compute_uv=False)[-1] < 1e-6:
            continue
        values = reference.eigenvalues()
        moving = values[np.abs(values) > 1e-6]
        resting = len(values) - len(moving)
        if len(moving) > 1 or (len(moving) == 0 and not resting):
            continue
        if len(moving) == 0 or -100 < moving[0].real < -0.01:
            return circuit, reference
    raise AssertionError("no network found")


# ---- the comparison ------------------------------------------------------------------------


def table(circuit: Circuit, time: float, ohm: float) -> list[list[Any]]:
    """The same network in other units: powers of two, so that no moment is rounded."""
    factor = {
        "resistor": ohm,
        "capacitor": time / ohm,
        "inductor": time * ohm,
        "current source": 1 / ohm,
        "voltage-controlled current source": 1 / ohm,
        "current-controlled voltage source": ohm,
    }
    rows: list[list[Any]] = [HEADINGS]
    for part in circuit.parts:
        k = factor.get(part.kind, 1.0)
        value: Any = part.value * k
        before: Any = None if part.before is None else part.before * k
        if part.kind == "switch":
            words = ["open", "closed"]
            value = words[int(part.value)]
            before = None if part.before is None else words[int(part.before)]
        if part.kind == "op-amp":
            value = None
        start = part.start
        if start is not None and part.kind == "inductor":
            start /= ohm
        shape = [*scaled(part.shape, k, time), *[None] * 6][:6]
        row = [part.name, part.kind, part.tail, part.head, value, before, start]
        rows.append([*row, part.control or None, *shape])
    return rows


def scaled(shape: tuple[Any, ...], k: float, time: float) -> tuple[Any, ...]:
    if not shape:
        return ()
    units = {
        "constant": (k,),
        "step": (k, time),
        "ramp": (k, time, time),
        "slope": (k / time, time),
        "sine": (k, 1 / time, 1.0, time),
        "decay": (k, time, time),
        "pulse": (k, time, time),
        "square": (k, k, time, 1.0, time),
    }[shape[0]]
    return (shape[0], *(a * u for a, u in zip(shape[1:], units, strict=True)))


def compare(seed: int) -> None:
    circuit, reference = found(seed)
    rng = np.random.default_rng(seed)
    values = reference.eigenvalues()
    moving = values[np.abs(values) > 1e-6]
    tau = -1 / moving[0].real if len(moving) else 1.0
    begins = {breaks_of(part, 0.0)[0] for part in circuit.parts if breaks_of(part, 0.0)}
    solution = Solution(reference, max(15 * tau, *begins, 0.0))
    time, ohm = 2.0 ** int(rng.integers(-30, 8)), 2.0 ** int(rng.integers(-8, 18))
    rows = table(circuit, time, ohm)
    assert network(rows, "order") == len(moving)
    if len(moving):
        assert network(rows, "tau") == pytest.approx(tau * time, rel=1e-7)
    moments = [-5 * tau, -tau / 3, -1e-9 * tau, *sorted({0.0, *begins})[:4]]
    moments += list(tau * 10 ** rng.uniform(-3, 1.1, size=20 - len(moments)))
    states = [solution.at(t) for t in moments]
    impulses = {0.0: 0, **{m: k for k, m in enumerate(solution.moments)}}
    for quantity, vectors in solution.quantities().items():
        unit = 1.0
        if quantity.startswith("current"):
            unit = 1 / ohm
        if quantity.startswith("power"):
            unit = 1 / ohm
        expected = np.array([math.prod(v @ x for v in vectors) for x in states]) * unit
        got = network_at(np.array(moments) * time, rows, quantity)
        codes = error_codes(got)
        scale = max(1e-3 * unit, np.abs(expected).max())
        for t, wanted, value, code in zip(moments, expected, got, codes, strict=True):
            where = f"seed {seed}, {quantity}, t = {t} tau = {tau}"
            open_before = t < 0 and not determined(solution, vectors)
            if open_before or (t in impulses and impulsive(solution, impulses[t], vectors)):
                assert code == ErrorKind.NA.value, where
            else:
                assert code == 0, where
                assert value == pytest.approx(wanted, abs=1e-7 * scale), where


def determined(solution: Solution, vectors: tuple[Array, ...]) -> bool:
    loose = solution.open
    return solution.fits and all(not loose.size or np.abs(v @ loose).max() < 1e-9 for v in vectors)


def impulsive(solution: Solution, k: int, vectors: tuple[Array, ...]) -> bool:
    """Whether a quantity has an impulse at the k-th moment: E dX + F impulse = 0."""
    reference = solution.reference
    e, f, _ = reference.equations(after=True)
    after = solution.motions[k].at(0.0)[: reference.size]
    if k:
        span = solution.moments[k] - solution.moments[k - 1]
        data = e @ solution.motions[k - 1].at(span)[: reference.size]
    else:
        data = np.zeros(reference.size)
        for part in reference.stores():
            row = len(reference.nodes) + reference.index[part.name]
            data[row] = part.at(False) * solution.reached(part)
    step = e @ after - data
    impulse = lstsq(np.vstack([f, e]), np.concatenate([-step, np.zeros(len(step))]))[0]
    return any(abs(v @ impulse) > 1e-8 for v in vectors)


@pytest.mark.parametrize("seed", range(60))
def test_network(seed: int) -> None:
    compare(seed)


@pytest.mark.campaign
@pytest.mark.parametrize("seed", range(60, 560))
def test_network_of_the_campaign(seed: int) -> None:
    compare(seed)


def test_the_campaign_covers_every_kind() -> None:
    kinds = {part.kind for seed in range(60) for part in found(seed)[0].parts}
    assert kinds == {kind.value for kind in Kind}


def compare_energy(seed: int) -> None:
    """Stores against the reference's states, all elements against one another (Tellegen)."""
    circuit, reference = found(seed)
    solution = Solution(reference, 4.0)
    rows = table(circuit, 1.0, 1.0)
    begin, end = solution.at(0.0), solution.at(3.0)
    total, size = 0.0, 0.0
    for part in circuit.parts:
        try:
            energy = network_energy(rows, part.name, 0.0, 3.0)
        except NotAvailable as refused:  # a voltage and a current impulse at one later moment
            if "impulse meets an impulse" not in str(refused):
                raise
            total = math.nan
            continue
        total, size = total + energy, max(size, abs(energy))
        if part in reference.stores():
            state = reference.state_row(part)
            stored = part.value * ((state @ end) ** 2 - (state @ begin) ** 2) / 2
            assert energy == pytest.approx(stored, rel=1e-7, abs=1e-7 * max(1.0, size)), part.name
    assert math.isnan(total) or total == pytest.approx(0.0, abs=1e-11 * size)


def compare_crossings(seed: int) -> None:
    """Passages and extremes against samples of the quantity."""
    circuit, _ = found(seed)
    rows = table(circuit, 1.0, 1.0)
    rng = np.random.default_rng(seed)
    part = circuit.parts[int(rng.integers(len(circuit.parts)))]
    quantity = f"{rng.choice(['voltage across', 'current through'])} {part.name}"
    t = np.linspace(1e-3, 6.0, 3001) + 1e-7
    q = network_at(t, rows, quantity)
    t, q = t[error_codes(q) == 0], q[error_codes(q) == 0]
    span = float(t[0]), float(t[-1])
    scale = float(np.abs(q).max())
    step = float(np.abs(np.diff(q)).max()) + 1e-12 * scale
    for kind, sign in (("max", 1.0), ("min", -1.0)):
        value, moment = network_peak(rows, quantity, *span, kind)
        best = (sign * q).max()
        assert -1e-12 * scale <= sign * value - best <= step
        assert span[0] <= moment <= span[1]
    if np.ptp(q) < 1e-9 * scale:
        return
    level = float(q.min() + rng.uniform(0.05, 0.95) * np.ptp(q))
    passed = np.flatnonzero(np.diff(np.sign(q - level)))
    for count, index in enumerate(passed[:3], start=1):
        moment = network_crossing(level, rows, quantity, "either", count, span[0])
        assert t[index] <= moment <= t[index + 1]


@pytest.mark.parametrize("seed", range(20))
def test_network_energy(seed: int) -> None:
    compare_energy(seed)


@pytest.mark.parametrize("seed", range(30))
def test_network_crossings(seed: int) -> None:
    compare_crossings(seed)


@pytest.mark.campaign
@pytest.mark.parametrize("seed", range(60, 360))
def test_energy_and_crossings_of_the_campaign(seed: int) -> None:
    compare_energy(seed)
    compare_crossings(seed)
