"""The elements and nodes of a network."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from enum import Enum
from typing import Any

from tausheet.functions.arguments import is_blank
from tausheet.functions.errors import CellError
from tausheet.functions.sources import Source

REFERENCE = -1
"""Index of the reference node."""


class Kind(Enum):
    """What an element is; the value is the word in the table."""

    RESISTOR = "resistor"
    CAPACITOR = "capacitor"
    INDUCTOR = "inductor"
    VOLTAGE = "voltage source"
    CURRENT = "current source"
    SWITCH = "switch"
    VCVS = "voltage-controlled voltage source"
    VCCS = "voltage-controlled current source"
    CCVS = "current-controlled voltage source"
    CCCS = "current-controlled current source"
    OPAMP = "op-amp"


STORES = (Kind.CAPACITOR, Kind.INDUCTOR)
INDEPENDENT = (Kind.VOLTAGE, Kind.CURRENT)
VOLTAGE_TYPE = (Kind.VOLTAGE, Kind.VCVS, Kind.CCVS, Kind.OPAMP)
"""Kinds that fix a voltage and let the network decide their current."""
CURRENT_TYPE = (Kind.CURRENT, Kind.VCCS, Kind.CCCS)
SOURCES = VOLTAGE_TYPE[:3] + CURRENT_TYPE


@dataclass(frozen=True)
class Element:
    """One row of the table; nodes and controlling elements as indices."""

    name: str
    kind: Kind
    tail: int
    """The node in From."""
    head: int
    """The node in To."""
    value: float
    """From t = 0 on; of a switch 1 is closed, 0 open."""
    before: float
    """Until t = 0."""
    start: float | None = None
    control: tuple[int, ...] = ()
    """Two nodes, or one element."""
    source: Source | None = None
    """What a source adds to its value from t = 0 on."""


@dataclass(eq=False)
class Network:
    """The elements and nodes of a table, and what has been worked out from them."""

    elements: tuple[Element, ...]
    nodes: tuple[str, ...]
    reference: str
    remembered: dict[Any, Any] = field(default_factory=dict)

    def remember(self, key: Any, work_out: Callable[[], Any]) -> Any:
        """What `work_out` gives, worked out once; a refusal is remembered too."""
        if key not in self.remembered:
            try:
                self.remembered[key] = work_out()
            except CellError as error:
                self.remembered[key] = error.with_traceback(None)
                self.remembered[key, "sentence"] = str(error)
        known = self.remembered[key]
        if isinstance(known, CellError):
            raise type(known)(self.remembered[key, "sentence"])
        return known

    def element(self, name: str) -> int:
        """Index of the element with that name, in any case; -1 when there is none."""
        index: int = self.remember("names", lambda: _index(e.name for e in self.elements)).get(
            name.casefold(), -1
        )
        return index

    def node(self, name: str) -> int | None:
        """Index of the node with that name, in any case; None when there is none."""
        known: dict[str, int] = self.remember(
            "nodes", lambda: _index(self.nodes) | {self.reference.casefold(): REFERENCE}
        )
        return known.get(name.casefold())


def _index(names: Any) -> dict[str, int]:
    return {name.casefold(): index for index, name in enumerate(names)}


def label(cell: object) -> str | None:
    """A name as it stands in a cell: 1 and 1.0 are the name 1; None for a blank cell."""
    if is_blank(cell):
        return None
    if isinstance(cell, (int, float)):
        return f"{float(cell):.15g}"
    return " ".join(str(cell).split()) or None


def listed(names: Sequence[str], limit: int = 6) -> str:
    """Names in a sentence: "R1, C1 and C2"."""
    if len(names) > limit:
        return ", ".join(names[:limit]) + f" and {len(names) - limit} more"
    return " and ".join(filter(None, [", ".join(names[:-1]), names[-1]]))
