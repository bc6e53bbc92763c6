"""The whole parity suite through xlwings' registration and call code, and a fuzz of its arguments.

Below xlwings Windows is replaced (windows_stand_in.py): this is Excel's door, not Excel.
"""

from __future__ import annotations

import datetime
import itertools
import math
from collections.abc import Callable
from decimal import Decimal
from typing import Any

import pytest
import windows_stand_in as windows
from hypothesis import given, settings
from hypothesis import strategies as st
from parity_cases import Case, Omitted, cases
from test_parity_of_hosts import agree, python_result

from tausheet.addin import cells
from tausheet.addin.excel import registration, wrappers
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind

windows.install()

# the numbers of error values in VBA, from Microsoft's documentation of CVErr (xlErrNA = 2042 ...)
EXCEL_ERRORS = {
    "#NULL!": 2000,
    "#DIV/0!": 2007,
    "#VALUE!": 2015,
    "#REF!": 2023,
    "#NAME?": 2029,
    "#NUM!": 2036,
    "#N/A": 2042,
}
NUMBER = {kind: windows.ERROR_BASE + EXCEL_ERRORS[kind.text] for kind in ErrorKind}
KIND = {number: kind for kind, number in NUMBER.items()}
GOOD = [case for case in cases() if case.what.startswith(("good", "defaults"))]
DAY_0 = datetime.datetime(1899, 12, 30)


def in_excel(name: str, arguments: list[Any]) -> Any:
    """A call as the generated wrapper makes it: it hands every argument over, or says missing."""
    entry = CATALOGUE[name]
    if not entry.variadic:
        arguments = arguments + [windows.MISSING] * (len(entry.parameters) - len(arguments))
    return windows.call(wrappers.PYTHON_MODULE, name, *arguments)


def cell(value: Any) -> Any:
    return NUMBER[value] if isinstance(value, ErrorKind) else value


def as_range(value: Any) -> Any:
    """In cells; Excel hands the value of one cell over as a single value, of more as rows."""
    if isinstance(value, Omitted):
        return windows.MISSING
    if not isinstance(value, list):
        return windows.Range(cell(value))
    width = max(map(len, value))
    rows = [[*map(cell, row), *[None] * (width - len(row))] for row in value]
    return windows.Range(rows[0][0] if len(rows) == width == 1 else tuple(map(tuple, rows)))


def as_constant(value: Any) -> Any:
    """In the formula itself; of an array constant of one row a one-dimensional array arrives."""
    if isinstance(value, Omitted):
        return windows.MISSING
    if not isinstance(value, list):
        return cell(value)
    width = max(map(len, value))
    if any(one is None for row in value for one in row) or any(len(r) < width for r in value):
        return as_range(value)  # an array constant has no blanks
    rows = tuple(tuple(map(cell, row)) for row in value)
    return rows[0] if len(rows) == 1 else rows


def as_dates(value: Any) -> Any:
    """Numbers as dates and times where a date holds them without loss, otherwise as they are."""
    if type(value) is not float or not -600_000 < value < 2_900_000:
        return value
    moment = DAY_0 + datetime.timedelta(days=value)
    if (moment - DAY_0) / datetime.timedelta(days=1) != value:
        return value
    return windows.PyTime(*moment.timetuple()[:6], moment.microsecond, tzinfo=datetime.timezone.utc)


def as_currency(value: Any) -> Any:
    """Numbers as Excel's currency, which has four decimals, where it holds them without loss."""
    if type(value) is not float or abs(value) > 9e14 or round(value, 4) != value:
        return value
    return Decimal(repr(value))


def with_numbers(change: Callable[[Any], Any]) -> Callable[[Any], Any]:
    def given(value: Any) -> Any:
        if isinstance(value, list):
            return as_constant([[change(one) for one in row] for row in value])
        return as_constant(change(value))

    return given


def rows_of(result: Any) -> list[list[Any]]:
    """Rows of cells; xlwings hands a single row over as a one-dimensional array."""
    if not isinstance(result, list):
        return [[result]]
    return result if isinstance(result[0], list) else [result]


def values_of(result: Any) -> list[list[Any]]:
    """What the cells show after the wrapper has turned the numbers of errors into errors."""
    return [[KIND.get(v, v) if type(v) is int else v for v in row] for row in rows_of(result)]


def differences(hand_over: Callable[[Any], Any], chosen: list[Case]) -> list[str]:
    wrong = []
    for case in chosen:
        expected = python_result(case)
        found = values_of(in_excel(case.function, [hand_over(a) for a in case.arguments]))
        shapes = [len(row) for row in found] == [len(row) for row in expected]
        pairs = zip(itertools.chain(*found), itertools.chain(*expected), strict=False)
        if not shapes or not all(agree(a, b, case) for a, b in pairs):
            wrong.append(f"{case}: {found} instead of {expected}")
    return wrong


@pytest.mark.parametrize(
    "hand_over",
    [as_range, as_constant, with_numbers(as_dates), with_numbers(as_currency)],
    ids=["ranges", "constants", "dates", "currency"],
)
def test_excel_agrees_with_python(hand_over: Callable[[Any], Any]) -> None:
    every = hand_over in (as_range, as_constant)
    assert differences(hand_over, cases() if every else GOOD) == []


def test_dates_and_currencies_do_arrive_as_such() -> None:
    """The two runs above would prove nothing if no number were changed."""
    changed = {as_dates: 0, as_currency: 0}
    for case in GOOD:
        for value in case.arguments:
            for change in changed:
                changed[change] += change(value) is not value
    assert min(changed.values()) > 1_000


def test_a_difference_is_seen(monkeypatch: pytest.MonkeyPatch) -> None:
    """What the comparison is worth: three defects of the call path, each found."""
    chosen = [case for case in cases() if case.function in ("FO_STEP", "FO_TABLE")]
    assert differences(as_range, chosen) == []
    monkeypatch.setattr(registration, "_KINDS", {2042: ErrorKind.NUM})
    assert differences(as_range, chosen)
    monkeypatch.undo()
    monkeypatch.setattr(registration, "_cell", lambda value: 0.0 if value is None else value)
    assert differences(as_range, chosen)
    monkeypatch.undo()
    monkeypatch.setattr(cells, "plain", lambda value: value)
    assert differences(as_range, chosen)


NUMBERS = st.floats(allow_nan=False, allow_infinity=False) | st.sampled_from(
    [0.0, -0.0, 1.0, 0.5, -1.0, 1e-300, 1.7e308, 5e-324, 2.0**53, 1e6]
)
TEXTS = st.text(max_size=12) | st.sampled_from(
    ["", " ", "5", "1E400", "step", "V", "4K7", "FO_STEP", "R1", "hold", "=1+1", "a\x00b", "\ud800"]
)
SINGLE = st.one_of(
    NUMBERS,
    st.sampled_from([1.0, 0.5, 2.0, 5.0]),
    TEXTS,
    st.booleans(),
    st.none(),
    st.sampled_from([*NUMBER.values(), *(windows.ERROR_BASE + n for n in (2043, 2045, 2050))]),
    st.decimals(-(10**14), 10**14, places=4, allow_nan=False),
    st.datetimes(datetime.datetime(1900, 1, 1), datetime.datetime(9999, 12, 31)).map(
        lambda d: windows.PyTime(*d.timetuple()[:6], d.microsecond)
    ),
)
ROWS = st.integers(1, 4).flatmap(
    lambda width: st.lists(
        st.lists(SINGLE, min_size=width, max_size=width).map(tuple), min_size=1, max_size=5
    ).map(tuple)
)
ARGUMENTS = st.one_of(
    SINGLE,
    SINGLE.map(windows.Range),
    ROWS,
    ROWS.map(windows.Range),
    st.lists(SINGLE, min_size=1, max_size=4).map(tuple),
    st.just(windows.MISSING),
    st.just(windows.Range(((1.0,), (2.0,)), areas=2)),
)


def shows_only_what_a_cell_may(name: str, result: Any) -> None:
    rows = rows_of(result)
    assert len({len(row) for row in rows}) == 1, "every row has one length"
    for value in itertools.chain(*rows):
        if type(value) is int:
            assert value in KIND, value
        elif isinstance(value, str):
            assert CATALOGUE[name].texts, f"{name} gives the text {value!r}"
        else:
            assert type(value) is float, f"{name} gives {value!r}"
            assert math.isfinite(value), f"{name} gives {value}"


@settings(max_examples=600)
@given(st.data())
def test_no_call_raises_through_to_a_text(data: st.DataObject) -> None:
    name = data.draw(st.sampled_from(sorted(CATALOGUE)))
    entry = CATALOGUE[name]
    most = 6 if entry.variadic else len(entry.parameters)
    arguments = data.draw(st.lists(ARGUMENTS, max_size=most))
    shows_only_what_a_cell_may(name, in_excel(name, arguments))


@settings(max_examples=400)
@given(st.data())
def test_one_odd_argument_in_a_good_call_raises_nothing_either(data: st.DataObject) -> None:
    case = data.draw(st.sampled_from(GOOD))
    arguments = [as_range(a) for a in case.arguments]
    if arguments:
        arguments[data.draw(st.integers(0, len(arguments) - 1))] = data.draw(ARGUMENTS)
    shows_only_what_a_cell_may(case.function, in_excel(case.function, arguments))
