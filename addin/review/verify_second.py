"""The results of a workbook's cell functions beside those of the second method."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from openpyxl.utils import get_column_letter

from tausheet.addin.review import second_method
from tausheet.addin.review.finding import Finding
from tausheet.addin.review.workbook_file import Call, WorkbookFile, shown

_MOST_SHOWN = 20
"""Differences of one function that are listed."""


@dataclass
class Tally:
    """The results of one cell function in a workbook, each set of arguments once."""

    checked: int = 0
    recomputed_only: int = 0
    differ: int = 0


def check(file: WorkbookFile, tallies: dict[str, Tally]) -> Iterator[Finding]:
    """Results that the second method does not confirm; counts every result in `tallies`."""
    seen: set[tuple[str, str]] = set()
    for call in file.calls:
        key = (call[1], repr(call[2]))
        if key in seen or call[1] == "FO_REASON":
            continue
        seen.add(key)
        yield from _call(call, tallies.setdefault(call[1], Tally()))


def _call(call: Call, tally: Tally) -> Iterator[Finding]:
    (title, row, column), name, arguments, result = call
    for outcome in second_method.check(name, arguments, result):
        if not outcome.checked:
            tally.recomputed_only += 1
            continue
        tally.checked += 1
        if outcome.agrees:
            continue
        tally.differ += 1
        if tally.differ <= _MOST_SHOWN:
            where = f"{title}!{get_column_letter(column)}{row}"
            expected = f"{shown(outcome.expected)}, {second_method.how(name)}"
            found = f"{name}: {shown(outcome.found)}"
            yield Finding("second method differs", where, found, expected)


def recomputed_only(tallies: dict[str, Tally]) -> Iterator[Finding]:
    """What no second method has confirmed, in one sentence."""
    left = [f"{name} ({t.recomputed_only})" for name, t in tallies.items() if t.recomputed_only]
    if left:
        yield Finding(
            "recomputed only", "", ", ".join(left), "no second method for these", counts=False
        )
