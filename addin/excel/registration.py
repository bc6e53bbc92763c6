"""The catalogue as xlwings user-defined functions: raw values in, raw values and errors out."""

from __future__ import annotations

import datetime
import faulthandler
import inspect
import os
import queue
import threading
import time
from collections.abc import Callable, Sequence
from decimal import Decimal
from typing import Any

import numpy as np

from tausheet.addin import cells
from tausheet.addin.calc.answer import trimmed
from tausheet.addin.excel import names
from tausheet.functions.arguments import Parameter
from tausheet.functions.catalogue import CATALOGUE, CellFunction
from tausheet.functions.errors import ErrorKind, TausheetError

ERROR_BASE = -2146828288
"""0x800A0000 as a signed 32-bit number: an error cell reaches Python as this plus its number."""

EXCEL_NUMBERS = {
    ErrorKind.NULL: 2000,
    ErrorKind.DIV0: 2007,
    ErrorKind.VALUE: 2015,
    ErrorKind.REF: 2023,
    ErrorKind.NAME: 2029,
    ErrorKind.NUM: 2036,
    ErrorKind.NA: 2042,
}
_KINDS = {number: kind for kind, number in EXCEL_NUMBERS.items()}
_DAY_0 = datetime.datetime(1899, 12, 30)

TIME_LIMIT = 60.0
"""Seconds after which a call gives an error instead of holding Excel up."""

END_LIMIT = 90.0
"""Seconds after which this Python ends, when not even the time limit could be kept."""


class NameRefused(TausheetError):
    """A function whose names cannot be used in Excel."""


def from_excel(value: Any) -> Any:
    """An argument as xlwings' raw converter hands it over, as a cell value or rows of them."""
    if isinstance(value, tuple):
        rows = value if value and isinstance(value[0], tuple) else (value,)
        return [[_cell(cell) for cell in row] for row in rows]
    return _cell(value)


def _cell(value: Any) -> Any:
    if type(value) is int:  # Excel hands numbers over as floats: an int is an error's number
        return _KINDS.get(value - ERROR_BASE, ErrorKind.VALUE)
    if isinstance(value, Decimal):  # a cell formatted as currency
        return float(value)
    if isinstance(value, datetime.datetime):
        return (value.replace(tzinfo=None) - _DAY_0) / datetime.timedelta(days=1)
    return value


def to_excel(result: cells.Raw) -> list[list[Any]]:
    """Rows for xlwings' raw converter; an error as the number that the wrapper turns back."""
    rows = result.tolist() if isinstance(result, np.ndarray) else [[result]]
    return [[_shown(value) for value in row] for row in rows]


def _shown(value: Any) -> Any:
    value = cells.plain(value)
    return ERROR_BASE + EXCEL_NUMBERS[value] if isinstance(value, ErrorKind) else value


class _Worker:
    """A thread that makes one call at a time; one that hangs is left behind."""

    def __init__(self) -> None:
        self._calls: queue.SimpleQueue[tuple[str, Sequence[Any]]] = queue.SimpleQueue()
        self._results: queue.SimpleQueue[cells.Raw] = queue.SimpleQueue()
        # a daemon, so that a call that hangs does not keep Python from ending
        threading.Thread(target=self._work, daemon=True, name="tausheet").start()

    def _work(self) -> None:
        while True:
            self._results.put(cells.call(*self._calls.get()))

    def call(self, name: str, arguments: Sequence[Any]) -> cells.Raw:
        """The result; queue.Empty when it takes longer than the time limit."""
        self._calls.put((name, arguments))
        return self._results.get(timeout=TIME_LIMIT)


_worker = _Worker()


def _within_the_time(name: str, arguments: Sequence[Any]) -> cells.Raw:
    """A call that hangs gives an error, and the next one works."""
    global _worker
    try:
        return _worker.call(name, arguments)
    except queue.Empty:
        _worker = _Worker()
        return ErrorKind.VALUE.nan


def end_when_stuck() -> None:
    """End this Python when one call stops every thread of it, so that no time limit is kept.

    Excel then shows the error and starts another Python for the next call. The alarm is put off
    again and again by a thread, which only a stuck Python keeps from doing so.
    """
    nowhere = open(os.devnull, "w")  # noqa: SIM115 - open as long as this Python runs

    def put_off() -> None:
        while True:
            faulthandler.dump_traceback_later(END_LIMIT, exit=True, file=nowhere)
            time.sleep(END_LIMIT / 10)

    threading.Thread(target=put_off, daemon=True, name="tausheet alarm").start()


def description(entry: CellFunction) -> str:
    """What the function wizard says of a function."""
    return entry.summary[: names.LONGEST_DESCRIPTION]


def argument_description(parameter: Parameter) -> str:
    """What the function wizard says of an argument."""
    need = "required" if parameter.required else "optional"
    return f"{parameter.help} ({need})"[: names.LONGEST_DESCRIPTION]


def check_names(entry: CellFunction) -> None:
    """Refuse a function whose names VBA or a formula would misread."""
    optional = sum(not p.required for p in entry.parameters) if not entry.variadic else 0
    found = names.problems(
        entry.name,
        [p.name for p in entry.parameters],
        variadic=entry.variadic,
        optional=optional,
    )
    if found:
        raise NameRefused("; ".join(found))


def expose(entry: CellFunction, xlwings: Any) -> Callable[..., Any]:
    """One cell function as xlwings registers it."""
    check_names(entry)

    def udf(*arguments: Any) -> Any:
        given = [from_excel(argument) for argument in trimmed(arguments)]
        return to_excel(_within_the_time(entry.name, given))

    udf.__name__ = udf.__qualname__ = entry.name
    udf.__doc__ = description(entry)
    udf.__signature__ = _signature(entry)  # type: ignore[attr-defined]
    exposed: Callable[..., Any] = udf
    for parameter in entry.parameters:
        doc = argument_description(parameter)
        exposed = xlwings.arg(parameter.name, "raw", doc=doc)(exposed)
    exposed = xlwings.ret("raw")(exposed)
    # last, since arg and ret set the category back
    result: Callable[..., Any] = xlwings.func(category=f"tausheet: {entry.group}")(exposed)
    return result


def _signature(entry: CellFunction) -> inspect.Signature:
    parameters = []
    for position, parameter in enumerate(entry.parameters, start=1):
        variable = entry.variadic and position == len(entry.parameters)
        kind = (
            inspect.Parameter.VAR_POSITIONAL
            if variable
            else inspect.Parameter.POSITIONAL_OR_KEYWORD
        )
        left_out = inspect.Parameter.empty if parameter.required or variable else None
        parameters.append(inspect.Parameter(parameter.name, kind, default=left_out))
    return inspect.Signature(parameters)


def register(namespace: dict[str, Any], xlwings: Any) -> None:
    """Put every cell function into a module's namespace, where xlwings looks for them."""
    for entry in CATALOGUE.values():
        namespace[entry.name] = expose(entry, xlwings)
