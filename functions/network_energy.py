"""Energy that an element of a network absorbs in a window of time."""

from __future__ import annotations

from collections.abc import Sequence
from decimal import Decimal, localcontext
from itertools import islice
from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import Finite, Numbers
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError, InputError, NotAvailable
from tausheet.functions.motion import CONTEXT, ZERO, product_integral
from tausheet.functions.network_elements import listed
from tausheet.functions.network_paths import Stretch, Stretches, Track, sources_of
from tausheet.functions.network_quantity import Response, current, voltage
from tausheet.functions.network_table import NetworkTable, OneText
from tausheet.functions.roots import Path, Undecided

_STRETCHES = 2_000
"""Stretches between jumps of the sources that one window may hold."""
_TOO_LONG = f"the window holds more than {_STRETCHES} jumps of the sources; enter a shorter one"


class _Absorbed:
    """Voltage from From to To and current that way, both along the same stretches."""

    def __init__(self, responses: Sequence[Response]) -> None:
        self.responses = responses
        stretches = Stretches(sources_of(*responses))
        self.stretches = stretches
        self.tracks = [Track(response, stretches) for response in responses]

    def energy(self, t_from: float, t_to: float) -> float:
        """From just after t_from to just after t_to."""
        total = ZERO
        before = [r.before for r in self.responses]
        if t_from < 0:
            if before[0] is None or before[1] is None:
                raise NotAvailable(
                    "the network before t = 0 does not determine the power of the element; enter "
                    "a t_from of 0 or later"
                )
            rest = Decimal(before[0]) * Decimal(before[1])
            total += rest * (min(Decimal(t_to), ZERO) - Decimal(t_from))
            if t_to < 0:
                return float(total)
            total += self._strike(None, [Decimal(b or 0.0) for b in before], ZERO)
        begin, end = Decimal(max(t_from, 0.0)), Decimal(t_to)
        stretches = list(islice(self.stretches.between(begin, end), _STRETCHES + 1))
        if len(stretches) > _STRETCHES:
            raise Undecided(_TOO_LONG)
        with localcontext(CONTEXT):
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
            return ZERO
        if all(impulses) or any(any(weights[1:]) for weights in impulses):
            raise NotAvailable(
                "the energy has no end, since an impulse meets an impulse; put a resistor where "
                "it flows, or ask from after it on"
            )
        late = _ends([track.path(*after) for track in self.tracks], t)
        mean = [(a + b) / 2 for a, b in zip(before, late, strict=True)]
        flux, charge = (Decimal(weights[0]) if weights else ZERO for weights in impulses)
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
