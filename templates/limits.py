"""Published limits for the discharge of capacitors, with clause and how each was checked.

A limit's `lowest` and `highest` bound the start voltages for which this list offers it. They are
on the safe side where a rule speaks of a rated voltage: a longer time is offered only above it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from tausheet.templates.model import Column, Table

OWN = "own limit"
"""The choice with which the engineer enters voltage and time."""


@dataclass(frozen=True)
class Limit:
    """One published limit: not above `voltage` when `time` has passed."""

    name: str
    voltage: float
    time: float
    lowest: float
    highest: float
    source: str
    applies: str
    checked: str


_MEMORY = "from memory"
_CLAUSE = "from memory, clause unsure"

DISCHARGE = (
    Limit(
        "60 V in 5 s (IEC 60204-1)",
        60.0, 5.0, 0.0, math.inf, "IEC 60204-1, 6.2.4",
        "machines: live parts after the supply is off, unless the charge is 60 µC or less", _MEMORY,
    ),
    Limit(
        "60 V in 1 s (IEC 60204-1, plug)",
        60.0, 1.0, 0.0, math.inf, "IEC 60204-1, 6.2.4",
        "machines: exposed pins of a plug that is withdrawn", _MEMORY,
    ),
    Limit(
        "60 V in 5 s (IEC 61800-5-1)",
        60.0, 5.0, 0.0, math.inf, "IEC 61800-5-1",
        "power drive systems; 50 µC instead of 60 V is allowed there and not used here", _CLAUSE,
    ),
    Limit(
        "50 V in 1 min (NFPA 70, 460.6)",
        50.0, 60.0, 0.0, 1500.0, "NFPA 70, 460.6",
        "capacitors of 1000 V, nominal, or less", _MEMORY,
    ),
    Limit(
        "50 V in 5 min (NFPA 70, 460.28)",
        50.0, 300.0, 1000.0, math.inf, "NFPA 70, 460.28(A), numbering of the 2020 edition",
        "capacitors over 1000 V, nominal", _CLAUSE,
    ),
    Limit(
        "75 V in 3 min (IEC 60831-1)",
        75.0, 180.0, 0.0, 1500.0, "IEC 60831-1",
        "power capacitors up to 1000 V a.c., from sqrt(2) x rated voltage", _CLAUSE,
    ),
    Limit(
        "75 V in 10 min (IEC 60871-1)",
        75.0, 600.0, 1414.0, math.inf, "IEC 60871-1",
        "power capacitors above 1000 V a.c., from sqrt(2) x rated voltage", _CLAUSE,
    ),
    Limit(
        "50 V in 1 min (IEEE 18)",
        50.0, 60.0, 0.0, 850.0, "IEEE 18",
        "shunt capacitors rated 600 V or less", _CLAUSE,
    ),
    Limit(
        "50 V in 5 min (IEEE 18)",
        50.0, 300.0, 850.0, math.inf, "IEEE 18",
        "shunt capacitors rated above 600 V", _CLAUSE,
    ),
)  # fmt: skip

CONFIRM = "Confirm each against the edition in force where the equipment is used."

_BEYOND = 1e9
"""Stands for "no upper bound" in a cell, which cannot hold an infinity."""


def as_table(limits: tuple[Limit, ...] = DISCHARGE) -> Table:
    """The list as a table: formulas know its columns as limit_name, limit_voltage and so on."""
    return Table(
        name="limit",
        title=f"Published limits offered. {CONFIRM}",
        columns=(
            Column("name", "limit", tuple(limit.name for limit in limits), 2),
            Column("voltage", "V", tuple(limit.voltage for limit in limits)),
            Column("time", "s", tuple(limit.time for limit in limits)),
            Column("lowest", "from V", tuple(limit.lowest for limit in limits)),
            Column("highest", "to V", tuple(min(limit.highest, _BEYOND) for limit in limits)),
            Column("source", "source, clause", tuple(limit.source for limit in limits), 2),
            Column("applies", "applies to", tuple(limit.applies for limit in limits), 3),
            Column("checked", "checked", tuple(limit.checked for limit in limits), 1),
        ),
    )


def names(limits: tuple[Limit, ...] = DISCHARGE) -> tuple[str, ...]:
    """What the list of choices offers: the published limits, then the engineer's own."""
    return (*(limit.name for limit in limits), OWN)
