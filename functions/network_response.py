"""Quantities of a network over time: at a moment, crossings, extremes, energy."""

from __future__ import annotations

from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import Finite, Numbers
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import NotAvailable
from tausheet.functions.network_quantity import FORMS, Response
from tausheet.functions.network_quantity import quantity as asked
from tausheet.functions.network_table import NetworkTable, OneText

_NETWORK = NetworkTable()


@cell_function("FO_NETWORK_AT", "Networks")
def network_at(
    t: Finite,
    network: Annotated[Any, _NETWORK],
    quantity: Annotated[Any, OneText(FORMS)],
) -> Numbers:
    """A voltage, current or power of a network at time t, exactly.

    Before t = 0 the network is at rest as its column Before has it; at t = 0 and wherever a
    source jumps the value is the one just after.

    Arguments:
        t: time after switching (s); any number
        network: range with a heading row, as for FO_NETWORK; a network table
        quantity: what is asked for, with a node or an element of the table;
            "voltage at NODE", "voltage across NAME", "current through NAME" or "power in NAME"

    Result: V, A or W, in the shape of t. Voltage across a resistor, capacitor, inductor or switch
    is positive at From, across a source or an op-amp at To; current flows From to To inside the
    element; power is what it absorbs.

    Errors: #VALUE! for a table that cannot be read, a network that is not of first order, an
    unknown node or element; #NUM! for a value outside its range; #N/A at an impulse (a step
    forced onto a capacitor) and where the network before t = 0 leaves the quantity open.

    Assumes: linear, constant elements; at t = 0 charge and flux are conserved.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value", "Before"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
        ...         ["R1", "resistor", "in", "out", 1000.0, None],
        ...         ["C1", "capacitor", "out", "ground", 1e-6, None]]
        >>> round(network_at(0.001, rows, "voltage at out"), 6)
        15.170893

    References: modified nodal analysis, superposition.
    """
    found = asked(network, quantity)
    responses = [found] if isinstance(found, Response) else [found.voltage, found.current]
    values = [_at(response, t) for response in responses]
    impulses = np.any([response.impulsive(t) for response in responses], axis=0)
    unknown = (t < 0) & any(response.before is None for response in responses)
    return (
        Answer(values[0] if len(values) == 1 else values[0] * values[1])
        .unless(
            unknown,
            NotAvailable,
            "t is {t}, and the network before t = 0 does not determine the quantity; "
            "enter a t of 0 or later",
        )
        .unless(
            impulses,
            NotAvailable,
            "t is {t}, where the quantity is an impulse; enter a t before or after it",
        )
    )


def _at(response: Response, t: Any) -> Any:
    after = response.at(np.maximum(t, 0.0))
    earlier = response.before if response.before is not None else 0.0
    return np.where(t < 0, earlier, after)
