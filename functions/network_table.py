"""A network as it stands in a range: an element a row, its columns found by their headings."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np

from tausheet.functions.arguments import Parameter, Spec, Table, shown, single
from tausheet.functions.errors import CellError, DomainError, InputError
from tausheet.functions.network_elements import (
    INDEPENDENT,
    REFERENCE,
    SOURCES,
    STORES,
    Element,
    Kind,
    Network,
    label,
    listed,
)
from tausheet.functions.sources import Source, read_source

REFERENCE_NAMES = ("reference", "ground", "earth")

HEADINGS = (
    *("Name", "Kind", "From", "To", "Value", "Before", "Start", "Control"),
    *("Shape", "A", "B", "C", "D", "E"),
)
_REQUIRED = HEADINGS[:5]
_SHAPE = HEADINGS[8:]
_HEADING = {heading.casefold(): heading for heading in HEADINGS}
_BY_VOLTAGE = (Kind.VCVS, Kind.VCCS, Kind.OPAMP)
_BY_CURRENT = (Kind.CCVS, Kind.CCCS)


def _word(text: str) -> str:
    return " ".join(text.casefold().replace("-", " ").split())


_KINDS = {_word(kind.value): kind for kind in Kind} | {_word("op-amp (ideal)"): Kind.OPAMP}

_VALUES = {
    Kind.RESISTOR: "resistance (ohm)",
    Kind.CAPACITOR: "capacitance (F)",
    Kind.INDUCTOR: "inductance (H)",
    Kind.VOLTAGE: "voltage (V)",
    Kind.CURRENT: "current (A)",
    Kind.SWITCH: 'position, "open" or "closed"',
    Kind.VCVS: "gain",
    Kind.VCCS: "transconductance (S)",
    Kind.CCVS: "transresistance (ohm)",
    Kind.CCCS: "gain",
}


class _Reader:
    """Reads the rows of one table; every refusal says where it stands and what to do."""

    def __init__(self, rows: Sequence[Sequence[Any]]) -> None:
        self.columns = _columns(rows)
        self.filled = [
            (number, row)
            for number, row in enumerate(rows[1:], start=2)
            if any(cell is not None for cell in row)
        ]
        self.number = 1
        self.row: Sequence[Any] = ()
        self.name = ""
        self.spelled: dict[str, str] = {}

    def network(self) -> Network:
        """The whole table."""
        if not self.filled:
            raise InputError("network has no row under its heading; enter an element a row")
        names = self._names()
        nodes = self._nodes()
        elements = []
        for index, (number, row) in enumerate(self.filled):
            self.number, self.row, self.name = number, row, names[index]
            elements.append(self._element(nodes, names))
        reference = next(name for name, index in nodes.items() if index == REFERENCE)
        spelled = self.spelled
        others = [spelled[key] for key, index in nodes.items() if index != REFERENCE]
        return Network(tuple(elements), tuple(others), spelled[reference])

    def cell(self, heading: str) -> Any:
        """The cell of the current row under a heading; None where the column is left out."""
        column = self.columns.get(heading)
        return None if column is None else self.row[column]

    def wrong(self, what: str, kind: type[CellError] = InputError) -> CellError:
        """The refusal of the current row."""
        where = f"row {self.number}" + (f" ({self.name})" if self.name else "")
        return kind(f"network, {where}: {what}")

    def _names(self) -> list[str]:
        names: list[str] = []
        seen: dict[str, int] = {}
        for number, row in self.filled:
            self.number, self.row = number, row
            name = label(self.cell("Name"))
            if name is None:
                raise self.wrong("Name is blank; give each element a name of its own")
            if name.casefold() in seen:
                raise self.wrong(
                    f"the name {name} is used twice (row {seen[name.casefold()]} too); "
                    "give each element a name of its own, capitals make no difference"
                )
            seen[name.casefold()] = self.number
            names.append(name)
        return names

    def _nodes(self) -> dict[str, int]:
        nodes: dict[str, int] = {}
        references: list[str] = []
        for number, row in self.filled:
            self.number, self.row = number, row
            self.name = label(self.cell("Name")) or ""
            ends = []
            for heading in ("From", "To"):
                name = label(self.cell(heading))
                if name is None:
                    raise self.wrong(f"{heading} is blank; enter the node at that end")
                key = name.casefold()
                ends.append(key)
                if key in nodes:
                    continue
                self.spelled[key] = name
                if key in REFERENCE_NAMES:
                    nodes[key] = REFERENCE
                    references.append(name)
                else:
                    nodes[key] = len(nodes) - len(references)
            if ends[0] == ends[1]:
                raise self.wrong("From and To are the same node; connect it to two nodes")
        if not references:
            raise InputError(
                "network has no reference node; name one node reference, ground or earth"
            )
        if len(references) > 1:
            raise InputError(
                f"network has {len(references)} reference nodes, {listed(references)}; "
                "use one of these names for all of them"
            )
        return nodes

    def _element(self, nodes: dict[str, int], names: list[str]) -> Element:
        word = self.cell("Kind")
        kind = _KINDS.get(_word(word)) if isinstance(word, str) else None
        if kind is None:
            found = "blank" if word is None else shown(word)
            known = ", ".join(k.value for k in Kind)
            raise self.wrong(f"Kind is {found}; allowed: {known}")
        tail, head = (nodes[(label(self.cell(end)) or "").casefold()] for end in ("From", "To"))
        self._refuse_unused(kind)
        value = 0.0 if kind is Kind.OPAMP else self._value(kind, "Value")
        before = value
        if self.cell("Before") is not None:
            before = self._value(kind, "Before")
        return Element(
            self.name,
            kind,
            tail,
            head,
            value,
            before,
            self._start(),
            self._control(kind, nodes, names),
            self._source(),
        )

    def _refuse_unused(self, kind: Kind) -> None:
        takes_control = kind in _BY_VOLTAGE or kind in _BY_CURRENT
        unused = {
            "Value": kind is Kind.OPAMP,
            "Before": kind is Kind.OPAMP,
            "Start": kind not in STORES,
            "Control": not takes_control,
            **dict.fromkeys(_SHAPE, kind not in INDEPENDENT),
        }
        for heading, refused in unused.items():
            found = self.cell(heading)
            if refused and found is not None:
                raise self.wrong(
                    f"{heading} is {shown(found)}, but {_article(kind)} has none; "
                    f"leave {heading} blank"
                )

    def _value(self, kind: Kind, heading: str) -> float:
        found = self.cell(heading)
        meaning = _VALUES[kind]
        if kind is Kind.SWITCH:
            word = found.casefold() if isinstance(found, str) else found
            if word not in ("open", "closed"):
                blank = "blank" if found is None else shown(found)
                raise self.wrong(f"{heading} is {blank}; enter the {meaning}")
            return float(word == "closed")
        if found is None:
            raise self.wrong(f"{heading} is blank: a missing value; enter the {meaning}")
        if not isinstance(found, float):
            raise self.wrong(
                f"{heading} is {shown(found)}, not a number; enter the {meaning} as a number"
            )
        if kind in (Kind.RESISTOR, *STORES) and found <= 0:
            hint = "; a short is a closed switch" if kind is Kind.RESISTOR else ""
            raise self.wrong(
                f"{heading} is {shown(found)}; allowed: number > 0; enter the {meaning}{hint}",
                DomainError,
            )
        return found

    def _start(self) -> float | None:
        found = self.cell("Start")
        if found is None or isinstance(found, float):
            return found
        raise self.wrong(
            f"Start is {shown(found)}, not a number; enter the voltage of the capacitor or the "
            "current of the inductor before t = 0, or leave it blank"
        )

    def _control(self, kind: Kind, nodes: dict[str, int], names: list[str]) -> tuple[int, ...]:
        found = label(self.cell("Control"))
        if kind in _BY_VOLTAGE:
            pair = (
                "the non-inverting and then the inverting input"
                if kind is Kind.OPAMP
                else "the positive and then the negative node"
            )
            return self._control_nodes(found, nodes, f'enter two nodes as "node node", {pair}')
        if kind in _BY_CURRENT:
            advice = "enter the name of the resistor or source whose current controls"
            if found is None:
                raise self.wrong(f"Control is blank; {advice}")
            wanted = found.casefold()
            for index, name in enumerate(names):
                if name.casefold() == wanted:
                    return (self._controlling(index, found, advice),)
            raise self.wrong(f"Control is {found}, which is no element of the table; {advice}")
        return ()

    def _controlling(self, index: int, name: str, advice: str) -> int:
        word = self.filled[index][1][self.columns["Kind"]]
        kind = _KINDS.get(_word(word)) if isinstance(word, str) else None
        if kind is not Kind.RESISTOR and kind not in SOURCES:
            raise self.wrong(f"Control is {name}, which is no resistor and no source; {advice}")
        return index

    def _control_nodes(
        self, found: str | None, nodes: dict[str, int], advice: str
    ) -> tuple[int, int]:
        if found is None:
            raise self.wrong(f"Control is blank; {advice}")
        parts = found.casefold().split()
        # a node's name may hold spaces: every cut is tried, and only one may fit
        cuts = [(" ".join(parts[:cut]), " ".join(parts[cut:])) for cut in range(1, len(parts))]
        fits = [cut for cut in cuts if cut[0] in nodes and cut[1] in nodes]
        if len(fits) == 1:
            return nodes[fits[0][0]], nodes[fits[0][1]]
        what = "fits in more than one way" if fits else "does not name two nodes of the table"
        raise self.wrong(f"Control is {found}, which {what}; {advice}")

    def _source(self) -> Source | None:
        cells = [self.cell(heading) for heading in _SHAPE]
        if all(cell is None for cell in cells):
            return None
        try:
            return read_source(cells)
        except CellError as error:
            raise self.wrong(str(error), type(error)) from None


def _article(kind: Kind) -> str:
    return f"{'an' if kind.value[0] in 'aeiou' else 'a'} {kind.value}"


def _columns(rows: Sequence[Sequence[Any]]) -> dict[str, int]:
    columns: dict[str, int] = {}
    for column, cell in enumerate(rows[0]):
        if cell is None and all(row[column] is None for row in rows):
            continue
        heading = _HEADING.get(cell.casefold()) if isinstance(cell, str) else None
        if heading is None:
            found = "blank" if cell is None else shown(cell)
            raise InputError(
                f"network: heading {column + 1} is {found}; known headings: {', '.join(HEADINGS)}"
            )
        if heading in columns:
            raise InputError(f"network: the heading {heading} is repeated; keep one column of it")
        columns[heading] = column
    for heading in _REQUIRED:
        if heading not in columns:
            raise InputError(
                f"network: the heading {heading} is missing; row 1 must hold {', '.join(_REQUIRED)}"
            )
    return columns


_SEEN: OrderedDict[tuple[Any, ...], Network] = OrderedDict()
_SEEN_LIMIT = 16


def _is_table(content: object) -> bool:
    return (
        isinstance(content, (list, tuple))
        and bool(content)
        and all(isinstance(row, (list, tuple)) for row in content)
        and len(set(map(len, content))) == 1
    )


def read_network(rows: Sequence[Sequence[Any]]) -> Network:
    """The network of a table whose cells are None, float or text."""
    return _Reader(rows).network()


@dataclass(frozen=True)
class NetworkTable(Table):
    """A network table; one whose cells were seen a short while ago is not read again."""

    text = "a network table"

    def element(self, raw: object, parameter: Parameter) -> Network:  # type: ignore[override]
        """The network, the same object for the same cells."""
        content = raw.tolist() if isinstance(raw, np.ndarray) else raw
        key: tuple[Any, ...] | None = None
        if _is_table(content):
            key = (len(content), *chain.from_iterable(content))  # type: ignore[arg-type]
            try:
                known = _SEEN.get(key)
            except TypeError:  # a cell that has no hash: it will be refused
                known, key = None, None
            if known is not None:
                _SEEN.move_to_end(key)  # type: ignore[arg-type]
                return known
        rows = super().element(raw, parameter)
        if rows == [[None]]:
            raise self.wrong(None, parameter, InputError)
        network = read_network(rows)
        if key is not None:
            _SEEN[key] = network
            if len(_SEEN) > _SEEN_LIMIT:
                _SEEN.popitem(last=False)
        return network


@dataclass(frozen=True)
class OneText(Spec):
    """A single cell that holds a text, or a number that serves as a name."""

    text: str = "a text"

    def element(self, raw: object, parameter: Parameter) -> str:
        """The text, its spaces evened out."""
        try:
            raw = single(raw)
        except InputError as error:
            raise InputError(f"{parameter.name} {error}") from None
        self.pass_on(raw, parameter)
        name = label(raw) if isinstance(raw, (str, int, float)) else None
        if name is None:
            raise self.wrong(raw, parameter, InputError)
        return name
