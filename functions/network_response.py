"""Quantities of a network over time: at a moment, crossings, extremes, energy."""

from __future__ import annotations

from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import Finite, Numbers, shown, words
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.crossing import (
    UNDECIDED,
    WAYS,
    Count,
    Direction,
    crossing_of,
    each,
)
from tausheet.functions.errors import DomainError, InputError, NotAvailable
from tausheet.functions.extremes import Peak, peak_of
from tausheet.functions.network_paths import Stretches, Track, sources_of
from tausheet.functions.network_power import power_peak
from tausheet.functions.network_quantity import FORMS, Power, Response
from tausheet.functions.network_quantity import quantity as asked
from tausheet.functions.network_table import NetworkTable, OneText
from tausheet.functions.roots import Undecided

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


@cell_function("FO_NETWORK_CROSSING", "Networks")
def network_crossing(
    level: Finite,
    network: Annotated[Any, _NETWORK],
    quantity: Annotated[Any, OneText(FORMS)],
    direction: Direction = "either",
    count: Count = 1,
    after: Finite = 0.0,
) -> Numbers:
    """The count-th moment after `after` at which a voltage or current passes a level.

    The quantity obeys tau dq/dt + q = F with F made of the sources' own shapes, so that, as for
    FO_CROSSING, the zeros of F - level bound the search. A jump across the level counts at its
    moment, the one at t = 0 too when `after` is negative.

    Arguments:
        level: value of the quantity to be passed (V or A); any number
        network: range with a heading row, as for FO_NETWORK; a network table
        quantity: a voltage or a current, with a node or an element of the table;
            "voltage at NODE", "voltage across NAME", "current through NAME" or "power in NAME"
        direction: which passages count; "either", "rising", "falling"
        count: which of them is asked for, 1 when left out; whole number >= 1
        after: time after which they count (s), 0 when left out; any number

    Result: time (s), in the broadcast shape of level, count and after.

    Errors: #N/A when the quantity does not pass the level so often; #VALUE! for a power and as for
    FO_NETWORK_AT; #NUM! outside the ranges, or when too many turning points had to be told apart.

    Assumes: linear, constant elements; at t = 0 charge and flux are conserved.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value", "Before"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
        ...         ["R1", "resistor", "in", "out", 1000.0, None],
        ...         ["C1", "capacitor", "out", "ground", 1e-6, None]]
        >>> round(network_crossing(12.0, rows, "voltage at out"), 9)
        0.000693147

    References: modified nodal analysis, superposition.
    """
    response = asked(network, quantity)
    if isinstance(response, Power):
        raise InputError(
            f"quantity is {shown(quantity)}, a power; enter a voltage or a current, which a power "
            "follows from"
        )
    track = Track(response, Stretches(sources_of(response)))

    def one(level: float, count: float, after: float) -> float | None:
        earlier = response.before if after < 0 else None
        return crossing_of(track.paths(after, level), level, WAYS[direction], count, after, earlier)

    values, never, undecided = each(one, level, count, after)
    return (
        Answer(values)
        .unless(undecided, DomainError, UNDECIDED)
        .unless(
            never,
            NotAvailable,
            "the quantity does not pass the level, {level}, so often after the time after, "
            "{after}; enter a level that it passes, a smaller count or an earlier after",
        )
    )


@cell_function("FO_NETWORK_PEAK", "Networks")
def network_peak(
    network: Annotated[Any, _NETWORK],
    quantity: Annotated[Any, OneText(FORMS)],
    t_from: Finite,
    t_to: Finite,
    kind: Annotated[str, words("max", "min", "abs")] = "max",
) -> Any:
    """The extreme value of a voltage, current or power of a network in a window, and when.

        tau dq/dt + q = F: dq/dt is 0 at most once between two zeros of dF/dt or jumps; a power
        turns where d(v i)/dt is 0, told apart by bounds of its rate and of the rate of that

    Both ends of the window and both sides of every jump are looked at; impulses are left out. Of
    equal extremes the earliest counts.

    Arguments:
        network: range with a heading row, as for FO_NETWORK; a network table
        quantity: what is asked for, with a node or an element of the table;
            "voltage at NODE", "voltage across NAME", "current through NAME" or "power in NAME"
        t_from: start of the window (s); any number
        t_to: end of the window (s), not before t_from; any number
        kind: largest, smallest, or largest magnitude (with its sign); "max", "min", "abs"

    Result: value (V, A or W) and time (s), each in the broadcast shape of t_from and t_to.

    Errors: #NUM! for t_to before t_from, or when too many turning points had to be told apart;
    #N/A where the network before t = 0 leaves the quantity open; #VALUE! as for FO_NETWORK_AT.

    Assumes: linear, constant elements; at t = 0 charge and flux are conserved.

    Example:
        >>> rows = [["Name", "Kind", "From", "To", "Value", "Before"],
        ...         ["Supply", "voltage source", "ground", "in", 24.0, 0.0],
        ...         ["R1", "resistor", "in", "out", 1000.0, None],
        ...         ["C1", "capacitor", "out", "ground", 1e-6, None]]
        >>> network_peak(rows, "current through R1", -1.0, 1.0)
        Peak(value=0.024, time=0.0)

    References: modified nodal analysis, superposition.
    """
    response = asked(network, quantity)
    begin, end = np.broadcast_arrays(t_from, t_to)
    found = Peak(np.zeros(begin.shape), np.zeros(begin.shape))
    undecided = np.zeros(begin.shape, bool)
    backward = end < begin
    unknown = (begin < 0) & (response.before is None)
    for index in np.ndindex(begin.shape):
        if backward[index] or unknown[index]:
            continue
        try:
            one = _peak(response, float(begin[index]), float(end[index]), kind)
        except Undecided:
            undecided[index] = True
            continue
        found.value[index], found.time[index] = one
    return (
        Answer(found)
        .unless(
            backward,
            DomainError,
            "t_to is {t_to}, before t_from, {t_from}; enter a t_to that is not before t_from",
        )
        .unless(
            unknown,
            NotAvailable,
            "t_from is {t_from}, and the network before t = 0 does not determine the quantity; "
            "enter a t_from of 0 or later",
        )
        .unless(undecided, DomainError, UNDECIDED)
    )


def _peak(quantity: Response | Power, t_from: float, t_to: float, kind: str) -> Peak:
    if isinstance(quantity, Power):
        return power_peak(quantity, t_from, t_to, kind)
    if t_to < 0:
        return Peak(quantity.before, t_from)
    track = Track(quantity, Stretches(sources_of(quantity)))
    found = peak_of(track.paths(t_from), t_from, t_to, kind, quantity.before)
    # a moment is a sum of doubles and may come out one step beside the window's end
    return Peak(found.value, min(max(found.time, t_from), t_to))
