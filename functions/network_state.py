"""State of a network until and at t = 0, and its motion from then on when one order remains."""

from __future__ import annotations

from dataclasses import dataclass, field
from decimal import Decimal

from tausheet.functions.errors import DomainError, InputError
from tausheet.functions.network_algebra import Row, add, eliminate, exact, exactly, substitute
from tausheet.functions.network_elements import (
    Kind,
    Network,
    listed,
)
from tausheet.functions.network_equations import CONSTANT, Dynamics, Tableau, dynamics

_ZERO = Decimal(0)
_ONE = Decimal(1)


class Before:
    """The network until t = 0, at rest: stores with a Start hold it, the others have settled."""

    def __init__(self, network: Network) -> None:
        self.network = network
        self.tableau = tableau = Tableau(network, before=True)
        rows = tableau.rows()
        unknowns = tableau.unknowns()
        for store in tableau.stores:
            unknowns += [tableau.dual(store), tableau.state(store)]
            start = network.elements[store].start
            if start is None:
                rows.append({tableau.dual(store): _ONE})
            else:
                row = {tableau.state(store): _ONE}
                rows.append(add(row, -_ONE, {tableau.input(CONSTANT): exact(start)}))
        self._substitutions, left = eliminate(rows, unknowns)
        self.contradicts = any(left)
        self._settle(unknowns)

    def _settle(self, unknowns: list[int]) -> None:
        """A store with a Start has settled too, where that does not contradict its Start."""
        for store in self.tableau.stores:
            rest = substitute({self.tableau.dual(store): _ONE}, self._substitutions)
            self._substitutions += eliminate([rest], rest.keys() & set(unknowns))[0]

    def value(self, expression: Row) -> Decimal | None:
        """A quantity until t = 0; None when the network does not determine it."""
        if self.contradicts:
            return None
        row = substitute(dict(expression), self._substitutions)
        constant = row.pop(self.tableau.input(CONSTANT), _ZERO)
        return None if row else constant

    def states(self) -> dict[int, Decimal]:
        """State of each store; refused where neither the network nor a Start determines it."""
        states: dict[int, Decimal] = {}
        missing = []
        for store in self.tableau.stores:
            start = self.network.elements[store].start
            state = self.value({self.tableau.state(store): _ONE}) if start is None else exact(start)
            if state is None:
                missing.append(store)
            else:
                states[store] = state
        if missing:
            raise InputError(self._undetermined(missing))
        return states

    def _undetermined(self, missing: list[int]) -> str:
        elements = [self.network.elements[store] for store in missing]
        kinds = {e.kind for e in elements}
        what = {Kind.CAPACITOR: "charge", Kind.INDUCTOR: "flux"}
        named = " or ".join(word for kind, word in what.items() if kind in kinds)
        why = (
            "contradicts itself (its sources and Start values do not fit together), so it does not"
            if self.contradicts
            else "does not"
        )
        return (
            f"network: the network before t = 0 {why} determine the {named} of "
            f"{listed([e.name for e in elements])}; enter in Start the voltage of a capacitor or "
            "the current of an inductor before t = 0"
        )


@dataclass
class Linear:
    """A quantity from t = 0 on: level + share * mode + sum of weighted inputs.

    The mode obeys tau m' + m = sum of drive * input. Inputs are numbered as in the tableau:
    0 is 1 from t = 0 on, the shaped sources follow, then the ties, which act at t = 0 only.
    """

    level: Decimal
    share: Decimal
    direct: list[Row]
    """By derivative of the inputs."""
    integral: Row
    """Weights of the inputs' integrals from 0 on."""

    def direct_of(self, number: int, derivative: int) -> Decimal:
        """Weight of a derivative of one input."""
        return (
            self.direct[derivative].get(number, _ZERO) if derivative < len(self.direct) else _ZERO
        )


@dataclass
class Motion:
    """How the free stores move: one mode that decays, the others hold a charge or integrate."""

    dynamics: Dynamics
    rate: Decimal | None
    """The natural frequency that is not zero; None when there is none."""
    first: int
    """The first store in the table that takes part."""
    shares: Row
    """The mode in each free store, as a multiple of the mode in the first."""
    weights: Row
    """weights . states = rate * mode"""
    forced: list[dict[int, Row]] = field(default_factory=list)
    """By derivative: states = continuous part + sum of forced[m + 1] times the m-th derivative."""
    drive: Row = field(default_factory=dict)
    integrating: dict[int, Row] = field(default_factory=dict)

    def quantity(self, expression: Row, offsets: Row) -> Linear:
        """A quantity; `offsets` is the constant part of each state that the mode leaves alone."""
        states, inputs = self.dynamics.reduced(expression)
        depth = max(len(inputs), len(self.forced) - 1)
        direct = [dict(inputs[m]) if m < len(inputs) else {} for m in range(depth)]
        integral: Row = {}
        share = level = _ZERO
        for store, value in states.items():
            share += value * self.shares.get(store, _ZERO)
            level += value * offsets.get(store, _ZERO)
            add(integral, value, self.integrating.get(store, {}))
            for derivative, forced in enumerate(self.forced[1:]):
                add(direct[derivative], value, forced.get(store, {}))
        return Linear(level, share, direct, integral)

    def initial(self, states: dict[int, Decimal]) -> tuple[Decimal, Row]:
        """Mode and offsets just after t = 0, from the states with which it is reached.

        The input of the ties steps from 1 to 0 there, so what hangs on it is taken away.
        """
        tie = self.dynamics.tableau.tie
        pulled = self.forced[1] if len(self.forced) > 1 else {}
        start = {
            store: states[store] - pulled.get(store, {}).get(tie, _ZERO)
            for store in self.dynamics.free
        }
        mode = _ZERO
        if self.rate is not None:
            mode = sum((w * start[s] for s, w in self.weights.items()), _ZERO) / self.rate
        return mode, {s: v - self.shares.get(s, _ZERO) * mode for s, v in start.items()}


def before(network: Network) -> Before:
    """The network until t = 0."""
    result: Before = network.remember(Before, exactly(lambda: Before(network)))
    return result


def reached(network: Network) -> dict[int, Decimal]:
    """State with which each store reaches t = 0; refused where it is not determined.

    A store that changes its value there keeps its charge or flux.
    """

    def work_out() -> dict[int, Decimal]:
        old = before(network)
        new = Tableau(network, before=False).values
        return {s: v * old.tableau.values[s] / new[s] for s, v in old.states().items()}

    result: dict[int, Decimal] = network.remember("reached", exactly(work_out))
    return result


def reduction(network: Network) -> Dynamics:
    """The reduced equations from t = 0 on."""

    def work_out() -> Dynamics:
        try:
            states = reached(network)
        except InputError:  # refused once the state is asked for: order and tau need none
            states = None
        return dynamics(network, states)

    result: Dynamics = network.remember(Dynamics, exactly(work_out))
    return result


def motion(network: Network) -> Motion:
    """The motion of a network of order one, or of an integrator; all others are refused."""
    result: Motion = network.remember(Motion, exactly(lambda: _motion(network)))
    return result


def _motion(network: Network) -> Motion:
    reduced = reduction(network)
    moving = [store for store in reduced.free if reduced.matrix[store]]
    names = [network.elements[store].name for store in moving]
    if reduced.order > 1:
        raise InputError(
            f"network is of order {reduced.order}: the stores {listed(names)} move independently; "
            "networks of order 1 are solved, so merge stores or leave some out"
        )
    if not reduced.free:
        tied = [network.elements[store].name for store in reduced.tableau.stores]
        why = f"{listed(tied)} cannot move freely" if tied else "it has no capacitor or inductor"
        raise InputError(
            f"network is of order 0 and has no zero natural frequency: {why}, so there is no time "
            "constant; FO_EQUIVALENT gives its settled voltages and currents"
        )
    if reduced.order == 0:
        if moving:
            raise InputError(_chained(reduced))
        result = Motion(reduced, None, reduced.free[0], {}, {})
    else:
        result = _decaying(reduced, moving, names)
    _force(result)
    return result


def _chained(reduced: Dynamics) -> str:
    linked = {store for row in reduced.matrix.values() for store in row}
    elements = reduced.tableau.network.elements
    names = [elements[s].name for s in reduced.free if s in linked or reduced.matrix[s]]
    return (
        f"network integrates an integral, or a decay and its integral, in {listed(names)} (a zero "
        "natural frequency that is no conserved charge or flux): that is beyond the first order; "
        "leave out an integrator"
    )


def _decaying(reduced: Dynamics, moving: list[int], names: list[str]) -> Motion:
    first = moving[0]
    weights = reduced.matrix[first]
    probe = next(iter(weights))
    shares: Row = {}
    for store in moving:
        row = reduced.matrix[store]
        share = row.get(probe, _ZERO) / weights[probe]
        if add(dict(row), -share, weights):
            raise InputError(_chained(reduced))
        shares[store] = share
    rate = sum((weights.get(s, _ZERO) * share for s, share in shares.items()), _ZERO)
    if rate > 0:
        raise DomainError(
            f"network has a natural frequency that grows, as exp(t / {float(1 / rate):.3g} s), "
            f"with {listed(names)}; check the signs of the controlled sources and which input of "
            "each op-amp is fed back"
        )
    return Motion(reduced, rate, first, shares, weights)


def _force(result: Motion) -> None:
    """Rewrite the drive by derivatives of the inputs as a continuous part and a forced one."""
    weights, shares = result.weights, result.shares
    later: dict[int, Row] = {}
    forced = []
    for drive in reversed(result.dynamics.drives):
        # forced[m] = B[m] + A forced[m + 1], with A = shares weights^T
        pull = _projected(weights, later)
        own = {store: dict(row) for store, row in drive.items()}
        for store, share in shares.items():
            if pull:
                add(own.setdefault(store, {}), share, pull)
        forced.append(own)
        later = own
    result.forced = forced[::-1]
    slope = result.forced[0] if forced else {}
    result.integrating = {store: dict(row) for store, row in slope.items()}
    if result.rate is None:
        return
    pull = _projected(weights, slope)
    result.drive = {number: -value / result.rate**2 for number, value in pull.items()}
    for store, share in shares.items():
        if pull:
            add(result.integrating.setdefault(store, {}), -share / result.rate, pull)


def _projected(weights: Row, rows: dict[int, Row]) -> Row:
    total: Row = {}
    for store, row in rows.items():
        if store in weights:
            add(total, weights[store], row)
    return total
