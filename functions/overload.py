"""Thermal overload: when a current heats something to its limit."""

from __future__ import annotations

import numpy as np

from tausheet.functions.arguments import NonNegative, Numbers, Positive
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import NotAvailable


@cell_function("FO_TRIP_TIME", "Thermal overload")
def trip_time(pickup: Positive, tau: Positive, prior: NonNegative, current: NonNegative) -> Numbers:
    """Time until a thermal overload trips, from cold (prior 0) or from an earlier load.

        t = tau ln((I^2 - Ip^2) / (I^2 - Ik^2))

    Ik is the pick-up current, up to which it never trips, Ip the earlier current, I the current
    from t = 0 on. When Ip is at or above Ik it has tripped already, and t is 0.

    Arguments:
        pickup: pick-up current Ik: setting times pick-up factor (A); number > 0
        tau: heating time constant (s); number > 0
        prior: earlier current Ip, in equilibrium (A), 0 from cold; number >= 0
        current: current I that flows from t = 0 on (A); number >= 0

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when the current does not exceed the pick-up current; #NUM! outside the ranges,
    #VALUE! for a blank or a text.

    Assumes: a temperature rise that follows the current squared with one time constant; the
    earlier load long enough to be in equilibrium; ambient as the setting takes it.

    Example:
        >>> round(trip_time(100.0, 600.0, 0.0, 200.0), 3)
        172.609

    References: IEC 60255-149, cold and hot curves (the equations' numbers not confirmed).
    """
    over = (pickup - prior) / (current - pickup) * ((pickup + prior) / (current + pickup))
    tripped = prior >= pickup
    return Answer(np.where(tripped, 0.0, tau * np.log1p(over))).unless(
        ~tripped & (current <= pickup),
        NotAvailable,
        "current is {current}, which does not exceed pickup, {pickup}, so that it never trips; "
        "enter a larger current",
    )
