"""Random valid and invalid sets of inputs for any calc sheet, drawn around its demo values."""

from __future__ import annotations

import math
import random
from pathlib import Path
from typing import Any

from filled import Filled, assert_refused, bad_cells, bad_values, differences

from tausheet import templates
from tausheet.addin import calc
from tausheet.functions.errors import ErrorKind
from tausheet.functions.units import in_unit
from tausheet.templates.formulas import LONG
from tausheet.templates.model import (
    COUNT,
    Choice,
    Entry,
    EntryTable,
    Input,
    NumberColumn,
    Sense,
    Tolerance,
)

TRIES = 60
SPREADS = (0.05, 0.2, 0.6)
NEAREST = 1e-11
"""How near a value may come to its limit, as a share of it: two engines may differ below that."""


def a_valid_set(filled: Filled, draw: random.Random) -> dict[str, Any]:
    """Cells of a set that the sheet's own rules accept, no check of which is a tie.

    What a rule refuses is drawn again, everything now and then; nearer to the demo each time.
    """
    entries = (*filled.sheet.entries(), *filled.sheet.filled_in)
    spread = draw.choice(SPREADS)
    drawn = {entry.symbol: _drawn(filled, entry, draw, spread) for entry in entries}
    for number in range(TRIES):
        cells = {name: value for each in drawn.values() for name, value in each.items()}
        filled.put(**cells)
        refused = [entry for entry in entries if filled.at_fault(entry)]
        if not refused and not _tie(filled):
            return cells
        spread_now = spread * (1 - number / TRIES)
        for entry in entries if number % 5 == 4 else refused or entries:
            drawn[entry.symbol] = _drawn(filled, entry, draw, spread_now)
    raise AssertionError(f"{filled.sheet.name}: no valid set in {TRIES} draws")


def an_invalid_set(
    filled: Filled, base: dict[str, Any], draw: random.Random
) -> tuple[Entry | EntryTable, dict[str, Any]]:
    """An input or a table, and the cells of a valid set but for it, which is at fault."""
    entry = draw.choice((*filled.sheet.entries(), *filled.sheet.filled_in))
    wrong = bad_cells(entry) if isinstance(entry, EntryTable) else bad_values(entry)
    # an empty cell may be allowed; and LibreOffice goes on showing TRUE where TRUE once stood
    kinds = [bad for kind, bad in wrong if kind not in ("blank", "truth")]
    return entry, base | draw.choice(kinds)


def _tie(filled: Filled) -> bool:
    title, first = filled.places["check_margins"]
    # a page may end between two checks, so that they are not evenly spaced
    below = range(int(first[1:]), int(first[1:]) + 4 * len(filled.keys()))
    margins = [filled.values[title].get(f"G{row}") for row in below]
    return any(isinstance(m, float) and abs(m) < NEAREST for m in margins)


def _drawn(
    filled: Filled, entry: Entry | EntryTable, draw: random.Random, spread: float
) -> dict[str, Any]:
    """New cells for an input or a table; those that it leaves out stay as in the demo."""
    if isinstance(entry, EntryTable):
        return _table(filled, entry, draw, spread)
    name = f"value_of_{entry.symbol}"
    if isinstance(entry, Choice):
        return {name: draw.choice(entry.options)} if draw.random() < spread else {}
    if filled.typed[name] is None and not entry.needed:
        return {}
    return _number(filled, entry, draw, spread)


def _table(filled: Filled, table: EntryTable, draw: random.Random, spread: float) -> dict[str, Any]:
    """Some numbers of a table changed; of a long one, those of the first row."""
    cells = {}
    for column in table.columns:
        name = f"{table.symbol}_{column.name}"
        places = [f"value_of_{name}_{row + 1}" for row in range(table.rows)]
        if table.rows > LONG:  # the first cell of the whole column, which alone has a name
            places = [f"values_of_{name}"]
        for place in places:
            typed = filled.typed[place]
            measured = isinstance(column, NumberColumn) and column.quantity != COUNT
            if measured and isinstance(typed, (int, float)) and draw.random() < 0.5:
                cells[place] = typed * math.exp(draw.uniform(-spread, spread))
    return cells


def _number(filled: Filled, entry: Input, draw: random.Random, spread: float) -> dict[str, Any]:
    symbol = entry.symbol
    unit = filled.typed.get(f"unit_of_{symbol}") or ""
    typed, ends = _typed(filled, entry, draw)
    low, high = ((float(in_unit(x, unit)) if unit else x) for x in (entry.low, entry.high))

    def within(number: float) -> float:
        return min(max(number, low), high)

    if entry.quantity == COUNT:
        some = max(1, round(typed * spread))
        return {f"value_of_{symbol}": float(within(typed + draw.randint(-some, some)))}
    if entry.quantity == "temperature":
        value = within(typed + draw.uniform(-30, 30) * spread)
    else:
        value = within(typed * math.exp(draw.uniform(-spread, spread)))
    cells = {f"value_of_{symbol}": value}
    for end in ("lowest", "highest"):
        name = f"{end}_of_{symbol}"
        share = draw.uniform(0, 1 + spread)
        if entry.tolerance is Tolerance.PERCENT:
            bound = -90 if end == "lowest" else 200
            cells[name] = (
                max(ends[end] * share, bound) if bound < 0 else min(ends[end] * share, bound)
            )
        elif entry.tolerance is Tolerance.ABSOLUTE:
            scale = value / typed if typed and entry.quantity != "temperature" else 1.0
            cells[name] = within(value + (ends[end] - typed) * scale * share)
    return cells


def _typed(filled: Filled, entry: Input, draw: random.Random) -> tuple[float, dict[str, float]]:
    """Value and extremes of the demo, or numbers that suit the unit offered first."""
    ends = {end: filled.typed.get(f"{end}_of_{entry.symbol}") for end in ("lowest", "highest")}
    value = filled.typed[f"value_of_{entry.symbol}"]
    if value is not None:
        return float(value), ends
    value = 10 ** draw.uniform(0, 2)
    percent = entry.tolerance is Tolerance.PERCENT
    return value, {"lowest": -10.0, "highest": 10.0} if percent else {
        "lowest": 0.9 * value,
        "highest": 1.1 * value,
    }


def assert_both_ways_agree(filled: Filled) -> None:
    """Each principal result and its second way are the same number, or neither is one."""
    for quantity in filled.sheet.quantities():
        if quantity.second:
            first, second = filled[quantity.symbol], filled[f"{quantity.symbol}_hand"]
            if isinstance(first, ErrorKind):
                assert isinstance(second, ErrorKind), quantity.symbol
            else:
                assert math.isclose(first, second, rel_tol=1e-9), (quantity.symbol, first, second)


def assert_verdict_follows(filled: Filled) -> None:
    """Each check says what its value and limit say when compared here, and the verdict sums up."""
    for check in filled.sheet.checks:
        if {check.value, check.limit} <= filled.places.keys():
            value, limit = filled[check.value], filled[check.limit]
            if isinstance(value, ErrorKind) or isinstance(limit, ErrorKind):
                kept = False
            elif check.sense is Sense.AT_MOST:
                kept = value <= limit or math.isclose(value, limit, rel_tol=1e-12)
            else:
                kept = value >= limit or math.isclose(value, limit, rel_tol=1e-12)
            assert filled[f"check_{check.key}"] == ("PASS" if kept else "FAIL"), check.key
    passed = set(filled.checks().values()) == {"PASS"} and filled.inputs_are_valid()
    assert filled["verdict"] == ("PASS" if passed else "FAIL")


def compare_in_calc(
    office: calc.Calc, folder: Path, name: str, valid: int, invalid: int, seed: int
) -> None:
    """Every cell of every set in one open document: numbers to 1e-12, all else exactly."""
    draw = random.Random(seed)
    here = Filled.demo(templates.SHEETS[name], folder)
    path = folder / f"{name}.xlsx"
    with office.open(path) as book:
        there = Filled(here.sheet, path, book)
        assert differences(here.put(), there.put()) == []
        sets = []
        for number in range(valid):
            sets.append(cells := a_valid_set(here, draw))
            assert_both_ways_agree(here)
            assert_verdict_follows(here)
            assert differences(here, there.put(**cells)) == [], (number, cells)
        for number in range(invalid):
            entry, cells = an_invalid_set(here, draw.choice(sets), draw)
            assert_refused(here.put(**cells), entry)
            assert differences(here, there.put(**cells)) == [], (number, cells)
