"""The equations of a network, and what is left of them once only free stores remain.

Unknown are the node potentials, the currents of elements that fix a voltage, and for each store
its state y (voltage of a capacitor, current of an inductor) and its dual d (the current of the
capacitor, the voltage of the inductor), with value * y' = d. Kirchhoff's current law and one row
an element make G x + C x' = B u; potentials and currents are eliminated first, then the duals.
A row that is left without a dual ties states together or to a source: it is differentiated, and
so on until every dual is known. What remains is y' = A y + B0 u + B1 u' + ... of the free states.
"""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal

from tausheet.functions.errors import InputError
from tausheet.functions.network_algebra import (
    Row,
    Substitution,
    add,
    eliminate,
    exact,
    nonzero_eigenvalues,
    solved_for,
    substitute,
)
from tausheet.functions.network_elements import (
    CURRENT_TYPE,
    REFERENCE,
    STORES,
    VOLTAGE_TYPE,
    Element,
    Kind,
    Network,
)
from tausheet.functions.network_faults import fault

_ONE = Decimal(1)
CONSTANT = 0
"""The input that is 1 from t = 0 on (until t = 0 in the equations before it)."""


class Tableau:
    """The rows of a network and the columns of its unknowns, before or from t = 0 on."""

    def __init__(self, network: Network, before: bool) -> None:
        self.network = network
        self.before = before
        elements = network.elements
        self.values = [exact(e.before if before else e.value) for e in elements]
        self.stores = [i for i, e in enumerate(elements) if e.kind in STORES]
        self.shaped = [i for i, e in enumerate(elements) if e.source is not None and not before]
        self._base = len(network.nodes)
        self._size = len(elements)
        self.tie = 1 + len(self.shaped)
        self._inputs = self.tie + 1

    def current_column(self, element: int) -> int:
        """Column of the unknown current of an element that fixes a voltage."""
        return self._base + element

    def dual(self, store: int) -> int:
        """Column of the current of a capacitor, the voltage of an inductor."""
        return self._base + self._size + store

    def state(self, store: int) -> int:
        """Column of the voltage of a capacitor, the current of an inductor."""
        return self._base + 2 * self._size + store

    def input(self, number: int, derivative: int = 0) -> int:
        """Column of an input (the constants, the shaped sources, the ties) or its derivative."""
        return self._base + 3 * self._size + derivative * self._inputs + number

    def store_of(self, column: int) -> int | None:
        """The store whose state stands in a column, if any does."""
        store = column - self.state(0)
        return store if 0 <= store < self._size else None

    def input_of(self, column: int) -> tuple[int, int]:
        """Number and derivative of the input in a column."""
        derivative, number = divmod(column - self.input(0), self._inputs)
        return number, derivative

    def is_input(self, column: int) -> bool:
        """Whether a column is an input."""
        return column >= self.input(0)

    def potential(self, tail: int, head: int) -> Row:
        """Potential of one node minus that of another."""
        row = {} if tail == REFERENCE else {tail: _ONE}
        return row if head == REFERENCE else add(row, -_ONE, {head: _ONE})

    def across(self, element: int) -> Row:
        """Potential at From minus potential at To."""
        return self.potential(self.network.elements[element].tail, self._head(element))

    def _head(self, element: int) -> int:
        return self.network.elements[element].head

    def through(self, index: int) -> Row:
        """The current that flows From to To inside an element."""
        element, value = self.network.elements[index], self.values[index]
        if element.kind is Kind.RESISTOR:
            return {column: sign / value for column, sign in self.across(index).items()}
        if element.kind is Kind.CAPACITOR:
            return {self.dual(index): _ONE}
        if element.kind is Kind.INDUCTOR:
            return {self.state(index): _ONE}
        if element.kind is Kind.CURRENT:
            return self._drive(index)
        if element.kind is Kind.VCCS:
            return {c: sign * value for c, sign in self.potential(*element.control).items()}
        if self._has_current(element, value):
            return {self.current_column(index): _ONE}
        return {}  # an open switch

    def _has_current(self, element: Element, value: Decimal) -> bool:
        return (
            element.kind in VOLTAGE_TYPE
            or element.kind is Kind.CCCS
            or (element.kind is Kind.SWITCH and value != 0)
        )

    def _drive(self, index: int) -> Row:
        value = self.values[index]
        row = {self.input(CONSTANT): value} if value else {}
        if index in self.shaped:
            row[self.input(1 + self.shaped.index(index))] = _ONE
        return row

    def unknowns(self) -> list[int]:
        """Columns of the potentials and of the unknown currents."""
        currents = [
            self.current_column(index)
            for index, element in enumerate(self.network.elements)
            if self._has_current(element, self.values[index])
        ]
        return [*range(self._base), *currents]

    def rows(self) -> list[Row]:
        """Kirchhoff's current law at each node, then what each element demands."""
        nodes: list[Row] = [{} for _ in self.network.nodes]
        demands = []
        for index, element in enumerate(self.network.elements):
            current = self.through(index)
            if element.tail != REFERENCE:
                add(nodes[element.tail], _ONE, current)
            if element.head != REFERENCE:
                add(nodes[element.head], -_ONE, current)
            demand = self._demand(index, element)
            if demand is not None:
                demands.append(demand)
        return nodes + demands

    def _demand(self, index: int, element: Element) -> Row | None:
        kind, value = element.kind, self.values[index]
        if kind is Kind.OPAMP:
            return self.potential(*element.control)
        if kind is Kind.CCCS:
            row = {self.current_column(index): _ONE}
            return add(row, -value, self.through(element.control[0]))
        if kind in CURRENT_TYPE or kind is Kind.RESISTOR or not self.through(index):
            return None
        row = self.across(index)
        if kind is Kind.CAPACITOR:
            return add(row, -_ONE, {self.state(index): _ONE})
        if kind is Kind.INDUCTOR:
            return add(row, -_ONE, {self.dual(index): _ONE})
        if kind is Kind.VOLTAGE:
            return add(row, _ONE, self._drive(index))
        if kind is Kind.VCVS:
            return add(row, value, self.potential(*element.control))
        if kind is Kind.CCVS:
            return add(row, value, self.through(element.control[0]))
        return row  # a closed switch


@dataclass
class Dynamics:
    """What is left: y' = sum A y + sum over derivatives of B u, of the free stores."""

    tableau: Tableau
    substitutions: list[Substitution]
    free: list[int]
    matrix: dict[int, Row]
    drives: list[dict[int, Row]]
    """By derivative of the inputs, by free store: coefficient by input."""
    order: int

    def reduced(self, expression: Row) -> tuple[Row, list[Row]]:
        """A quantity by free store, and by derivative and input."""
        states: Row = {}
        inputs: list[Row] = []
        for column, value in substitute(dict(expression), self.substitutions).items():
            store = self.tableau.store_of(column)
            if store is not None:
                states[store] = value
                continue
            number, derivative = self.tableau.input_of(column)
            while len(inputs) <= derivative:
                inputs.append({})
            inputs[derivative][number] = value
        return states, inputs


def dynamics(network: Network, states: dict[int, Decimal] | None) -> Dynamics:
    """The equations from t = 0 on, reduced; a network without a single solution is refused.

    states: state of each store with which t = 0 is reached, None when that is not known.
    A tie that these do not satisfy gets an input of its own, which they do satisfy until t = 0
    and which steps to nothing there: this is what pulls tied states together.
    """
    tableau = Tableau(network, before=False)
    unknowns = tableau.unknowns()
    found, rows = eliminate(tableau.rows(), unknowns)
    if len(found) < len(unknowns):
        raise InputError(fault(network, set(unknowns) - {column for column, _ in found}))
    duals = [tableau.dual(store) for store in tableau.stores]
    tied: list[Substitution] = []
    first = True
    while True:
        solved, ties = eliminate(rows, duals)
        if not ties:
            break
        # taken up again as rows: with the new ones beside them a sparser order may be found
        rows = [{column: -_ONE, **expression} for column, expression in solved]
        for tie in ties:
            if first and states is not None:
                _let_go(tableau, tie, states)
            substitute(tie, tied)
            column = max((c for c in tie if tableau.store_of(c) is not None), default=None)
            if column is None:
                raise InputError(fault(network, set(duals) - {column for column, _ in solved}))
            tied.append((column, solved_for(tie, column)))
            rows.append(_derivative(tableau, tie))
        first = False
    dependent = {column for column, _ in tied}
    free = [store for store in tableau.stores if tableau.state(store) not in dependent]
    result = Dynamics(tableau, found + solved + tied, free, {}, [], 0)
    _fill(result)
    return result


def _let_go(tableau: Tableau, tie: Row, states: dict[int, Decimal]) -> None:
    gap: Row = {}
    for column, value in tie.items():
        store = tableau.store_of(column)
        if store is not None:
            add(gap, -value, {tableau.input(tableau.tie): states[store]})
    tie.update(gap)


def _derivative(tableau: Tableau, tie: Row) -> Row:
    row: Row = {}
    for column, value in tie.items():
        store = tableau.store_of(column)
        if store is not None:
            row[tableau.dual(store)] = value / tableau.values[store]
        else:
            number, derivative = tableau.input_of(column)
            row[tableau.input(number, derivative + 1)] = value
    return row


def _fill(result: Dynamics) -> None:
    tableau = result.tableau
    for store in result.free:
        rate = {tableau.dual(store): _ONE / tableau.values[store]}
        result.matrix[store], inputs = result.reduced(rate)
        while len(result.drives) < len(inputs):
            result.drives.append({})
        for derivative, row in enumerate(inputs):
            if row:
                result.drives[derivative][store] = row
    result.order = nonzero_eigenvalues(result.matrix)
