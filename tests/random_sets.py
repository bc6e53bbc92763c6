"""Random valid and invalid sets of inputs for any calc sheet, drawn around its demo values."""

from __future__ import annotations

import math
import random
from typing import Any

from filled import Filled, bad_values

from tausheet.functions.errors import ErrorKind
from tausheet.functions.units import in_unit
from tausheet.templates.model import COUNT, Choice, Entry, Input, Tolerance

TRIES = 60
SPREADS = (0.05, 0.2, 0.6)
NEAREST = 1e-11
"""How near a value may come to its limit, as a share of it: two engines may differ below that."""


def valid(filled: Filled, draw: random.Random) -> dict[str, Any]:
    """Cells of a set that the sheet's own rules accept, no check of which is a tie.

    What a rule refuses is drawn again, everything now and then; nearer to the demo each time.
    """
    entries = list(filled.sheet.entries())
    spread = draw.choice(SPREADS)
    cells = _drawn(filled, draw, entries, spread)
    for number in range(TRIES):
        filled.put(**cells)
        refused = [entry for entry in entries if filled.state(entry.symbol) == "AT FAULT"]
        if not refused and not _tie(filled):
            return cells
        again = entries if number % 5 == 4 else refused or entries
        symbols = {entry.symbol for entry in again}
        cells = {name: x for name, x in cells.items() if name.split("_of_")[1] not in symbols}
        cells |= _drawn(filled, draw, again, spread * (1 - number / TRIES))
    raise AssertionError(f"{filled.sheet.name}: no valid set in {TRIES} draws")


def invalid(
    filled: Filled, base: dict[str, Any], draw: random.Random
) -> tuple[str, dict[str, Any]]:
    """An input's symbol, and the cells of a valid set but for this input, which is at fault."""
    entry = draw.choice(list(filled.sheet.entries()))
    # an empty cell may be allowed; and LibreOffice goes on showing TRUE where TRUE once stood
    kinds = [bad for kind, bad in bad_values(entry) if kind not in ("blank", "truth")]
    return entry.symbol, base | draw.choice(kinds)


def _tie(filled: Filled) -> bool:
    title, first = filled.places["check_margins"]
    row = int(first[1:])
    margins = [filled.values[title][f"G{row + 2 * i}"] for i in range(len(filled.keys()))]
    return any(isinstance(m, float) and abs(m) < NEAREST for m in margins)


def _drawn(
    filled: Filled, draw: random.Random, entries: list[Entry], spread: float
) -> dict[str, Any]:
    cells: dict[str, Any] = {}
    for entry in entries:
        name = f"value_of_{entry.symbol}"
        if isinstance(entry, Choice):
            if draw.random() < spread:
                cells[name] = draw.choice(entry.options)
        elif filled.typed[name] is not None:
            cells |= _number(filled, entry, draw, spread)
    return cells


def _number(filled: Filled, entry: Input, draw: random.Random, spread: float) -> dict[str, Any]:
    symbol = entry.symbol
    unit = filled.typed.get(f"unit_of_{symbol}") or ""
    typed = float(filled.typed[f"value_of_{symbol}"])
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
                max(filled.typed[name] * share, bound)
                if bound < 0
                else min(filled.typed[name] * share, bound)
            )
        elif entry.tolerance is Tolerance.ABSOLUTE:
            scale = value / typed if typed and entry.quantity != "temperature" else 1.0
            cells[name] = within(value + (filled.typed[name] - typed) * scale * share)
    return cells


def assert_both_ways_agree(filled: Filled) -> None:
    """Each principal result and its second way are the same number, or neither is one."""
    for quantity in filled.sheet.quantities():
        if quantity.second:
            first, second = filled[quantity.symbol], filled[f"{quantity.symbol}_hand"]
            if isinstance(first, ErrorKind):
                assert isinstance(second, ErrorKind), quantity.symbol
            else:
                assert math.isclose(first, second, rel_tol=1e-9), (quantity.symbol, first, second)
