"""Calls of every cell function, good and bad, alone and in ranges, made from the catalogue.

What an argument may be comes from its specification; what makes sense in it from its name, which
means the same in every function. A function added to the catalogue is covered without a change
here, unless it brings a table of its own kind.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from tausheet.functions.arguments import Column, Flag, Number, Parameter, Table, Texts, Word
from tausheet.functions.catalogue import CATALOGUE, CellFunction
from tausheet.functions.errors import ErrorKind

SOURCES = [
    [
        ["step", 5.0, 0.0, None, None, None],
        ["sine", 1.0, 0.3, 30.0, None, None],
    ],
    [["Shape", "A", "B", "C", "D", "E"], ["constant", 2.0, None, None, None, None]],
    [["square", -1.0, 4.0, 2.0, 0.25, None], ["decay", 3.0, 0.5, 1.0, None, None]],
    [["ramp", 10.0, 2.0, None, None, None], ["pulse", -4.0, 1.0, 0.5, None, None]],
    [["slope", 0.5, None], ["step", -1.0, 3.0]],
]
STAGES = [
    [[0.0, 1.0, 5.0], [2.0, 0.5, 0.0]],
    [
        ["Starts at", "Time constant", "Heads for", "Jump to", "Stops at"],
        [0.0, 2.0, 8.0, None, 4.0],
        [3.0, "hold", None, 1.0, None],
        [4.0, "rate", -0.5, None, None],
    ],
]
NETWORK = [
    ["Name", "Kind", "From", "To", "Value", "Before", "Start"],
    ["V1", "voltage source", "ground", "in", 680.0, 0.0, None],
    ["S1", "switch", "in", "a", "closed", None, None],
    ["R1", "resistor", "a", "b", 47000.0, None, None],
    ["R2", "resistor", "b", "ground", 100000.0, None, None],
    ["C1", "capacitor", "b", "ground", 0.0047, None, 12.0],
]

GLOSSARY: dict[str, list[Any]] = {
    "t": [1.0, 0.25, 3.5, 0.0, 40.0, -1.0],
    "tau": [1.0, 0.5, 2.5, 0.02, 100.0, 1.0],
    "initial": [0.0, 5.0, -3.0, 680.0, 1.0, 2.0],
    "final": [5.0, 0.0, 12.0, -1.0, 60.0, 0.0],
    "level": [2.5, 1.0, 0.5, 60.0, -0.5, 4.0],
    "low": [0.125, 0.25, 0.5, 0.0625, 0.375, 0.1],
    "high": [0.875, 0.75, 0.625, 0.9375, 0.5, 0.9],
    "FO_NETWORK_CROSSING level": [100.0, 400.0, 200.0],
    "FO_NETWORK_CROSSING quantity": ["voltage at b", "voltage across R2", "voltage across C1"],
    "FO_STAYS_WITHIN low": [-100.0],
    "FO_STAYS_WITHIN high": [100.0],
    "duty": [0.5, 0.25, 0.75, 0.1, 1.0, 0.0],
    "tolerance": [0.01, 0.05, 0.5, 0.001, 0.2, 0.125],
    "t_from": [0.0, 0.5, 1.0, 0.25, 0.0, 2.0],
    "t_to": [3.0, 2.0, 5.0, 4.0, 10.0, 8.0],
    "t_end": [20.0, 5.0, 50.0, 2.0, 10.0, 8.0],
    "t_initial": [0.0, -0.5, 0.0, -1.0, 0.0, 0.0],
    "after": [0.0, 0.5, 1.0, 0.25, 0.0, 2.0],
    "count": [1.0, 2.0, 3.0, 1.0, 4.0, 2.0],
    "v_from": [100.0, 680.0, 24.0, 48.0, 400.0, 12.0],
    "v_to": [60.0, 400.0, 18.0, 36.0, 0.0, 9.0],
    "current": [200.0, 8.0, 1.5, 400.0, 120.0, 50.0],
    "pickup": [100.0, 5.0, 1.0, 300.0, 100.0, 20.0],
    "prior": [0.0, 4.0, 0.5, 100.0, 90.0, 30.0],
    "temperature": [75.0, 20.0, -20.0, 115.0, 0.0, 40.0],
    "period": [2.0, 0.5, 4.0, 1.0, 10.0, 0.25],
    "lowest": [[[0.9, 1.8]], [[1.0, 2.0, 3.0]]],
    "highest": [[[1.1, 2.2]], [[1.0, 2.5, 4.0]]],
    "unit": ["F", "kohm", "mH", "V", "ms", "uF"],
    "FO_RKM_TEXT unit": ["ohm", "F"],
    "code": ["4K7", "R47", "2M2", "4n7", "100", "1K"],
    "times": [[[float(n) / 4] for n in range(9)], [[0.0, 1.0, 1.0, 2.0, 4.0, 5.0]]],
    "levels": [
        [[0.0], [1.0], [3.0], [3.0], [2.0], [0.0], [-1.0], [-1.5], [4.0]],
        [[0.0, 1.0, 4.0, 4.0, 2.0, 2.5]],
    ],
    "values": [
        [[5.0], [4.1], [3.2], [2.75], [2.3], [2.05], [1.8], [1.7], [1.55]],
        [[5.0, 3.5, 3.6, 2.4, 1.5, 1.2]],
    ],
    "sources": SOURCES,
    "stages": STAGES,
    "network": [NETWORK],
    "quantity": ["voltage at b", "voltage across R1", "current through C1", "power in R2"],
    "element": ["R1", "C1", "R2"],
    "from_node": ["a", "b"],
    "to_node": ["ground"],
    "cell_function": ["FO_STEP", "FO_TAU_RC", "FO_TIME_TO", "FO_NOTHING", "fo_sine "],
    "arguments": [1.0, 0.5, -2.0, 3.0, 0.25, 7.0],
}
NUMBERS = [1.0, 0.5, 2.5, 10.0, 0.001, 47000.0]

VARIADIC = 4
"""How many arguments are given to a function that takes any number of them."""


@dataclass(frozen=True)
class Omitted:
    """An argument left out between the commas."""


@dataclass(frozen=True)
class Case:
    """One call."""

    function: str
    what: str
    arguments: tuple[Any, ...]
    error_in_range: bool = False
    """LibreOffice then gives an error of its own (cell-functions.md); never a number."""
    inline: bool = False
    """Numbers and texts stand in the formula itself, not in cells."""

    def __str__(self) -> str:
        return f"{self.function}{self.arguments} ({self.what})"


def good_values(function: CellFunction, parameter: Parameter) -> list[Any]:
    """Values that make sense for an argument."""
    spec = parameter.spec
    if isinstance(spec, Word):
        return list(spec.choices)
    if isinstance(spec, Flag):
        return [True, False]
    known = GLOSSARY.get(f"{function.name} {parameter.name}", GLOSSARY.get(parameter.name))
    if isinstance(spec, Texts):
        return known or ["V"]
    if isinstance(spec, (Column, Table)):
        return known if known and isinstance(known[0], list) else [[[0.5], [1.0], [2.0]]]
    if isinstance(spec, Number):
        fitting = [v for v in known or [] if isinstance(v, float) and _fits(spec, v)]
        return fitting or [v for v in NUMBERS if _fits(spec, v)] or [spec.safe]
    return known or NUMBERS


def _fits(spec: Number, value: float) -> bool:
    return spec.low <= value <= spec.high and not (spec.whole and value != int(value))


def good_call(function: CellFunction, number: int, optional: bool = True) -> tuple[Any, ...]:
    """The good call of that number; with its optional arguments, or without them."""
    given: list[Any] = []
    for parameter in function.parameters:
        values = good_values(function, parameter)
        if function.variadic and parameter is function.parameters[-1]:
            given += [values[(number + i) % len(values)] for i in range(VARIADIC)]
        elif parameter.required or optional:
            given.append(values[number % len(values)])
    return tuple(given)


BAD: list[tuple[str, Any]] = [
    ("zero", 0.0),
    ("negative", -1.0),
    ("above one", 1.5),
    ("text", "Quay 4"),
    ("empty text", ""),
    ("digits as text", "1E400"),
    ("TRUE", True),
    ("very large", 1e300),
    ("very small", 1e-300),
    ("left out", Omitted()),
    ("blank", [[None]]),
    ("range of the wrong shape", [[1.0, 2.0, 3.0, 4.0], [5.0, 6.0, 7.0, 8.0]]),
]
IN_RANGE: list[tuple[str, Any]] = [
    ("blank", None),
    ("text", "Quay 4"),
    ("zero", 0.0),
    ("negative", -1.0),
    ("TRUE", True),
    ("error", ErrorKind.NA),
]
_KINDS = itertools.cycle(ErrorKind)


def cases() -> list[Case]:
    """Every call."""
    return [case for name in sorted(CATALOGUE) for case in _cases_of(CATALOGUE[name])]


def _cases_of(function: CellFunction) -> Iterator[Case]:
    name = function.name
    for number in range(6):
        yield Case(name, "good", good_call(function, number))
    for number in range(3):
        yield Case(name, "good, inline", good_call(function, number), inline=True)
        yield Case(name, "defaults", good_call(function, number, optional=False))
    base = good_call(function, 0)
    for spot, value in enumerate(base):
        yield from _bad_singles(name, base, spot)
        spec = function.parameters[min(spot, len(function.parameters) - 1)].spec
        if isinstance(spec, (Column, Table)):
            yield from _bad_tables(name, base, spot)
        elif spec.elementwise:
            yield from _ranges(function, base, spot, value)
        if not function.variadic:
            for what, bad in BAD[1:4]:
                asked = (name, *_with(base, spot, bad))
                yield Case("FO_REASON", f"{name}, argument {spot + 1}: {what}", asked)
    yield from _tables_of_results(function, base)
    if len(base) > 1:
        yield Case(name, "nothing given", ())
        yield Case(name, "the last is missing", good_call(function, 0, optional=False)[:-1])


def _with(base: tuple[Any, ...], spot: int, value: Any) -> tuple[Any, ...]:
    return (*base[:spot], value, *base[spot + 1 :])


def _bad_singles(name: str, base: tuple[Any, ...], spot: int) -> Iterator[Case]:
    for what, value in BAD:
        yield Case(name, f"argument {spot + 1}: {what}", _with(base, spot, value))
    kind = next(_KINDS)
    yield Case(name, f"argument {spot + 1}: {kind.text}", _with(base, spot, kind))


def _bad_tables(name: str, base: tuple[Any, ...], spot: int) -> Iterator[Case]:
    rows = base[spot]
    for what, value in IN_RANGE:
        changed = [list(row) for row in rows]
        changed[-1][min(1, len(changed[-1]) - 1)] = value
        arguments, is_error = _with(base, spot, changed), isinstance(value, ErrorKind)
        yield Case(name, f"table {spot + 1}: {what} in it", arguments, is_error)
    shorter = rows[:-1] if len(rows) > 1 else [rows[0][:-1]]
    yield Case(name, f"table {spot + 1}: shorter", _with(base, spot, shorter))
    yield Case(name, f"table {spot + 1}: one cell", _with(base, spot, 1.0))


def _ranges(function: CellFunction, base: tuple[Any, ...], spot: int, value: Any) -> Iterator[Case]:
    def case(what: str, rows: list[list[Any]], is_error: bool = False) -> Case:
        arguments = _with(base, spot, rows)
        return Case(function.name, f"argument {spot + 1}: {what}", arguments, is_error)

    parameter = function.parameters[min(spot, len(function.parameters) - 1)]
    others = good_values(function, parameter)
    column = [[other] for other in others[:4]]
    yield case("one cell as a range", [[value]])
    yield case("column", column)
    yield case("row", [[cell for (cell,) in column]])
    bad = [[cell] for _, cell in IN_RANGE]
    yield case("column with bad cells", [[value], *bad[:-1], [others[-1]]])
    yield case("column with an error", [[value], bad[-1], [others[-1]]], is_error=True)


def _tables_of_results(function: CellFunction, base: tuple[Any, ...]) -> Iterator[Case]:
    spots = [i for i, p in enumerate(function.parameters) if p.spec.elementwise]
    for one, other in itertools.pairwise(spots):
        first, second = (good_values(function, function.parameters[i]) for i in (one, other))
        column, row = [[value] for value in first[:3]], [second[:4]]
        table = _with(_with(base, one, column), other, row)
        yield Case(function.name, f"column {one + 1} x row {other + 1}", table)
        unlike = _with(_with(base, one, [*column, *column]), other, [[v] for v in second[:2]])
        if len(column) * 2 != len(second[:2]):
            yield Case(function.name, f"columns {one + 1}, {other + 1} unlike", unlike)
