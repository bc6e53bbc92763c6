"""What a first-order network is: order, time constant, first and last state, equivalents."""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal
from typing import Annotated, Any, NamedTuple

import numpy as np

from tausheet.functions.arguments import words
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import DomainError, ErrorKind, InputError, NotAvailable
from tausheet.functions.network_algebra import add, eliminate, exact, exactly
from tausheet.functions.network_elements import (
    REFERENCE,
    Kind,
    Network,
    listed,
)
from tausheet.functions.network_equations import CONSTANT, Dynamics, Tableau
from tausheet.functions.network_quantity import Response, current, voltage
from tausheet.functions.network_shapes import settled
from tausheet.functions.network_state import Motion, motion, reduction
from tausheet.functions.network_table import NetworkTable, OneText

_ONE = Decimal(1)
_ZERO = Decimal(0)
_GROWS = 1e-9
"""A real part beyond this share of the largest natural frequency grows; below, it is rounding."""


class FirstOrder(NamedTuple):
    """What a network reduces to."""

    order: Any
    tau: Any
    resistance: Any
    initial: Any
    final: Any


class Equivalent(NamedTuple):
    """What two nodes look like from outside."""

    voltage: Any
    current: Any
    resistance: Any


@cell_function("FO_NETWORK", "Networks")
def network(
    network: Annotated[Any, NetworkTable()],
    what: Annotated[str | None, words("order", "tau", "resistance", "initial", "final")] = None,
) -> Any:
    """Order, time constant, resistance seen by the store, its first and its final value.

        tau = R C  or  L / R,  R seen by the store; order = natural frequencies that are not zero

    The store is the first in the table that takes part in the time constant. Of merged stores R
    is what the resistive part draws from them: voltage squared over power, or power over current
    squared, the other stores held.

    Arguments:
        network: range with a heading row: Name, Kind, From, To, Value, and if wanted Before,
            Start, Control, Shape, A to E; a network table
        what: one result alone, all five when left out;
            "order", "tau", "resistance", "initial", "final"

    Result: order, time constant (s), resistance (ohm), value of the store just after t = 0 and
    its final value (V of a capacitor, A of an inductor).

    Errors: #VALUE! for a table that cannot be read or a network that is not of first order, #NUM!
    for a value outside its range or a natural frequency that grows, #N/A for what does not exist
    (tau of an integrator, final under a forcing that never settles). "order" alone is given
    whatever it is.

    Assumes: linear, constant elements. Until t = 0 stores with a Start hold it and all others
    have settled; at t = 0 charge and flux are conserved, so a store whose value changes there
    keeps its charge or flux. Names and nodes are the same in capitals and small letters.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value", "Before"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
        ...         ["R1", "resistor", "in", "out", 1000.0, None],
        ...         ["C1", "capacitor", "out", "ground", 1e-6, None]]
        >>> network(rows)
        FirstOrder(order=1.0, tau=0.001, resistance=1000.0, initial=0.0, final=24.0)

    References: modified nodal analysis; common practice.
    """
    found: Network = network
    if what == "order":
        return float(reduction(found).order)
    moving = motion(found)
    parts = {
        "order": lambda: float(moving.dynamics.order),
        "tau": lambda: _tau(moving),
        "resistance": lambda: _resistance(found, moving),
        "initial": lambda: _first(found, moving).just_after(),
        "final": lambda: _first(found, moving).final(),
    }
    if what is not None:
        return parts[what]()
    return FirstOrder(*(_or_not_available(part) for part in parts.values()))


def _or_not_available(part: Any) -> float:
    try:
        number: float = part()
    except NotAvailable:
        return ErrorKind.NA.nan
    return number


def _tau(moving: Motion) -> float:
    if moving.rate is None:
        raise NotAvailable(
            "network is an integrator: its only natural frequency is zero, so it has no time "
            "constant; FO_NETWORK_AT gives its response"
        )
    return float(-_ONE / moving.rate)


def _first(found: Network, moving: Motion) -> Response:
    return (voltage if _is_capacitor(found, moving.first) else current)(found, moving.first)


def _is_capacitor(found: Network, store: int) -> bool:
    return found.elements[store].kind is Kind.CAPACITOR


@exactly
def _resistance(found: Network, moving: Motion) -> float:
    """From the power that the resistive part gives the stores when only the first one is at 1."""
    reduced, first = moving.dynamics, moving.first
    power = _ZERO
    for store in reduced.tableau.stores:
        state = reduced.reduced({reduced.tableau.state(store): _ONE})[0].get(first, _ZERO)
        if state:
            dual = reduced.reduced({reduced.tableau.dual(store): _ONE})[0].get(first, _ZERO)
            power += state * dual
    if not _is_capacitor(found, first):
        return float(-power)
    if not power:
        raise NotAvailable(
            f"network: {found.elements[first].name} sees no resistance, only an open circuit"
        )
    return float(-_ONE / power)


@cell_function("FO_EQUIVALENT", "Networks")
def equivalent(
    network: Annotated[Any, NetworkTable()],
    from_node: Annotated[Any, OneText()],
    to_node: Annotated[Any, OneText()],
    what: Annotated[str | None, words("voltage", "current", "resistance")] = None,
) -> Any:
    """Open-circuit voltage, short-circuit current and resistance between two nodes once settled.

        voltage = current x resistance

    After t = 0 with the stores settled: capacitors open, inductors shorted, shaped sources at the
    value they settle at. Any order will do, none included.

    Arguments:
        network: range with a heading row, as for FO_NETWORK; a network table
        from_node: node that counts as positive; a text
        to_node: the other node; a text
        what: one result alone, all three when left out; "voltage", "current", "resistance"

    Result: open-circuit voltage (V), current from from_node to to_node when they are joined (A),
    equivalent resistance (ohm).

    Errors: #VALUE! for a table that cannot be read, a network without a single solution or an
    unknown node; #NUM! when a natural frequency grows; #N/A for what does not exist (the
    short-circuit current of an ideal voltage source) or does not settle.

    Assumes: linear, constant elements.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0],
        ...         ["R1", "resistor", "in", "out", 3000.0],
        ...         ["R2", "resistor", "out", "ground", 1000.0]]
        >>> equivalent(rows, "out", "ground")
        Equivalent(voltage=6.0, current=0.008, resistance=750.0)

    References: Thevenin's and Norton's theorems, common practice.
    """
    found: Network = network
    nodes = []
    for argument, name in (("from_node", from_node), ("to_node", to_node)):
        node = found.node(name)
        if node is None:
            raise InputError(
                f"{argument} is {name}, which is no node of the table; its nodes are "
                f"{listed([*found.nodes, found.reference], 12)}"
            )
        nodes.append(node)
    if nodes[0] == nodes[1]:
        raise InputError(f"from_node and to_node are both {from_node}; enter two nodes")
    reduced = reduction(found)
    _refuse_growth(reduced)
    port = _port(found, reduced.tableau, nodes[0], nodes[1])
    parts = {"voltage": port.voltage, "current": port.current, "resistance": port.resistance}
    if what is not None:
        return parts[what]()
    return Equivalent(*(_or_not_available(part) for part in parts.values()))


def _refuse_growth(reduced: Dynamics) -> None:
    index = {store: i for i, store in enumerate(reduced.free)}
    matrix = np.zeros((len(index), len(index)))
    for store, row in reduced.matrix.items():
        for other, value in row.items():
            matrix[index[store], index[other]] = float(value)
    if not matrix.any():
        return
    rates = np.linalg.eigvals(matrix)
    if rates.real.max() > _GROWS * np.abs(rates).max():
        raise DomainError(
            "network has a natural frequency that grows, so it never settles; check the signs of "
            "the controlled sources and which input of each op-amp is fed back"
        )


@dataclass(frozen=True)
class _Port:
    """across * voltage + into * current + driven = 0, the current flowing in at from_node."""

    across: Decimal
    into: Decimal
    driven: Decimal | None
    """None when the forcing does not settle."""

    def voltage(self) -> float:
        """With nothing between the nodes."""
        if not self.across:
            raise NotAvailable(
                "network: nothing settles the open-circuit voltage between the nodes, which is "
                "what a charge that stays or an ideal current source makes it; FO_NETWORK_AT "
                "gives it at any time"
            )
        return float(-self._settled() / self.across)

    def current(self) -> float:
        """With the nodes joined."""
        if not self.into:
            raise NotAvailable(
                "network: the nodes have no short-circuit current, since an ideal voltage source "
                "or a closed switch stands between them"
            )
        return float(self._settled() / self.into)

    def resistance(self) -> float:
        """With every source at rest."""
        if not self.across:
            raise NotAvailable(
                "network: no current can flow between the nodes, so the resistance between them is "
                "infinite"
            )
        return float(-self.into / self.across)

    def _settled(self) -> Decimal:
        if self.driven is None:
            raise NotAvailable("network: a shaped source never settles, and neither do the nodes")
        return self.driven


@exactly
def _port(found: Network, tableau: Tableau, from_node: int, to_node: int) -> _Port:
    voltage, current = -2, -3  # columns beside those of the tableau
    rows = tableau.rows()
    for sign, node in ((-_ONE, from_node), (_ONE, to_node)):
        if node != REFERENCE:
            add(rows[node], sign, {current: _ONE})
    rows.append(add(tableau.potential(from_node, to_node), -_ONE, {voltage: _ONE}))
    unknowns = tableau.unknowns()
    for store in tableau.stores:
        rows.append({tableau.dual(store): _ONE})
        unknowns += [tableau.dual(store), tableau.state(store)]
    left = [row for row in eliminate(rows, unknowns)[1] if row]
    if any(not row.keys() & {voltage, current} for row in left):
        raise NotAvailable(
            "network integrates a source, so that it never settles; FO_NETWORK_AT gives its "
            "response"
        )
    if len(left) != 1:
        raise NotAvailable(
            "network: with the capacitors open and the inductors shorted nothing determines what "
            "is between the nodes (a charge or flux that stays, or ideal elements alone)"
        )
    row = left[0]
    driven: Decimal | None = row.get(tableau.input(CONSTANT), _ZERO)
    for number, index in enumerate(tableau.shaped, start=1):
        weight = row.get(tableau.input(number))
        source = found.elements[index].source
        if weight and source is not None and driven is not None:
            level = settled(source)
            driven = None if level is None else driven + weight * exact(level)
    return _Port(row.get(voltage, _ZERO), row.get(current, _ZERO), driven)
