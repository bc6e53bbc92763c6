"""What is to stand in the input cells, read from texts such as "4.7 mF" or base SI numbers."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE

from tausheet.functions.errors import TausheetError
from tausheet.functions.units import canonical, in_unit, si, units_of
from tausheet.templates.model import (
    UNITLESS,
    Choice,
    Demo,
    Entry,
    Input,
    NumberColumn,
    Sheet,
    Tolerance,
)

FIELDS = (
    "doc_number",
    "doc_title",
    "project",
    "revision",
    "status",
    "prepared_by",
    "checked_by",
    "approved_by",
)
"""The entries of the heading and the sign-off, which are texts."""

STATUSES = ("draft", "for checking", "checked", "approved", "withdrawn")

LONGEST = 200
"""Characters of a text that still fit where it is shown."""


class ValueRefused(TausheetError):
    """A value given for a sheet that it cannot take."""


@dataclass(frozen=True)
class Typed:
    """What stands in the cells of one input."""

    value: float | str | None = None
    unit: str = ""
    lowest: float | None = None
    highest: float | None = None
    source: str = ""


def shown_unit(unit: str) -> str:
    """A unit as it is written on the page: µF for uF."""
    text = unit.replace("ohm", "Ω").replace("degC", "°C").replace("/us", "/µs")
    return "µ" + text[1:] if text.startswith("u") else text


def read(
    sheet: Sheet, values: Mapping[str, str | float | None] | None, demo: bool
) -> tuple[dict[str, Typed], dict[str, str]]:
    """The typed entries of every input, and the texts of the heading.

    Keys are an input's symbol, `SYMBOL_lo`, `SYMBOL_hi`, `SYMBOL_source`, or one of FIELDS; keys
    with a dot name cells of tables, which `values_tables` reads.
    """
    own = {key: value for key, value in (values or {}).items() if "." not in key}
    given = {k: v for k, v in own.items() if v is not None and v != ""}
    blanked = own.keys() - given.keys()
    entries = {entry.symbol: _blank(entry) for entry in sheet.entries()}
    texts = {"doc_title": sheet.title, "status": STATUSES[0]}
    if demo:
        entries = {entry.symbol: _demo(entry) for entry in sheet.entries()}
        heading = sheet.demo
        texts |= {
            "doc_number": heading.number,
            "doc_title": heading.title,
            "project": heading.project,
            "revision": heading.revision,
            "status": heading.status,
        }
    by_key = _keys(sheet)
    for key in (*given, *blanked):
        if key not in by_key and key not in FIELDS:
            known = ", ".join(e.symbol for e in sheet.entries())
            raise ValueRefused(f'{sheet.name} has no input "{key[:40]}"; its inputs are: {known}')
    for key in blanked:
        if key in FIELDS:
            texts[key] = ""
        else:
            entry, part = by_key[key]
            entries[entry.symbol] = _with(
                entries[entry.symbol], **{part: "" if part == "source" else None}
            )
    # values before their extremes, which stand in the unit of the value
    for key, value in sorted(given.items(), key=lambda item: item[0][-3:] in ("_lo", "_hi")):
        if key in FIELDS:
            texts[key] = checked_text(key, value)
            if key == "status" and texts[key] not in STATUSES:
                raise ValueRefused(f'status is "{texts[key]}"; use one of: {", ".join(STATUSES)}')
        else:
            entry, part = by_key[key]
            entries[entry.symbol] = _entered(entry, part, value, entries[entry.symbol])
    return entries, texts


def _keys(sheet: Sheet) -> dict[str, tuple[Entry, str]]:
    keys: dict[str, tuple[Entry, str]] = {}
    for entry in sheet.entries():
        keys[entry.symbol] = (entry, "value")
        keys[f"{entry.symbol}_source"] = (entry, "source")
        if isinstance(entry, Input) and entry.tolerance is not Tolerance.NONE:
            keys[f"{entry.symbol}_lo"] = (entry, "lowest")
            keys[f"{entry.symbol}_hi"] = (entry, "highest")
    return keys


def _with(typed: Typed, **changes: Any) -> Typed:
    return replace(typed, **changes)


def _blank(entry: Entry) -> Typed:
    return Typed(unit=entry.units[0] if isinstance(entry, Input) and entry.units else "")


def _demo(entry: Entry) -> Typed:
    demo: Demo = entry.demo
    typed = _blank(entry)
    for part in ("value", "lowest", "highest", "source"):
        if text := getattr(demo, part):
            typed = _entered(entry, part, text, typed)
    return typed


def _entered(entry: Entry, part: str, value: str | float, typed: Typed) -> Typed:
    if part == "source":
        return _with(typed, source=checked_text(f"{entry.symbol}_source", value))
    if isinstance(entry, Choice):
        text = checked_text(entry.symbol, value)
        if text not in entry.options:
            raise ValueRefused(
                f'{entry.symbol} is "{text}"; use one of: {"; ".join(entry.options)}'
            )
        return _with(typed, value=text)
    key = entry.symbol + {"value": "", "lowest": "_lo", "highest": "_hi"}[part]
    if part != "value" and entry.tolerance is Tolerance.PERCENT:
        return _with(typed, **{part: _percent(key, value)})
    number, unit = number_of(key, entry, value)
    if part == "value":
        if not unit:
            unit = readable(entry, number)
            number = _in(number, unit)
        extremes = {
            name: converted(limit, typed.unit, unit)
            for name in ("lowest", "highest")
            if entry.tolerance is Tolerance.ABSOLUTE and unit != typed.unit
            if (limit := getattr(typed, name)) is not None
        }
        return _with(typed, value=number, unit=unit, **extremes)
    if unit != typed.unit:
        number = converted(number, unit, typed.unit)
    return _with(typed, **{part: number})


def number_of(key: str, entry: Input | NumberColumn, value: str | float) -> tuple[float, str]:
    """A number with its unit; without one it is in base SI and the unit is ""."""
    if not isinstance(value, str):
        return _finite(key, float(value)), ""
    number, unit = _split(key, value)
    if not unit:
        return number, ""
    known = canonical(unit)
    if known is None or entry.quantity in UNITLESS or known not in units_of(entry.quantity):
        offered = f"use {', '.join(entry.units)}" if entry.units else "give the number alone"
        raise ValueRefused(
            f'{key} is "{value[:60]}", but "{unit[:20]}" is no unit of it; {offered}'
        )
    return number, known


def _percent(key: str, value: str | float) -> float:
    """A tolerance in percent; a bare number is a fraction, as everywhere in base SI."""
    if not isinstance(value, str):
        return float(in_unit(_finite(key, float(value)), "%"))
    number, unit = _split(key, value)
    if unit == "%":
        return number
    if unit:
        raise ValueRefused(f'{key} is "{value[:60]}", but a tolerance is given in %, e.g. -5 %')
    return float(in_unit(number, "%"))


_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)


def _split(key: str, text: str) -> tuple[float, str]:
    match = _NUMBER.fullmatch(text)
    if not match:
        raise ValueRefused(
            f'{key} is "{text[:60]}", which is not a number; give a number with its unit'
        )
    return _finite(key, float(match[1])), match[2]


def _finite(key: str, number: float) -> float:
    if not math.isfinite(number):
        raise ValueRefused(f"{key} is beyond the range of numbers; give a finite number")
    return number


def readable(entry: Input | NumberColumn, number: float) -> str:
    """The offered unit in which a base SI number reads well."""
    if not entry.units:
        return ""
    sizes = sorted((units_of(entry.quantity)[unit], unit) for unit in entry.units)
    fitting = [unit for size, unit in sizes if size <= abs(number) * (1 + 1e-12)]
    return fitting[-1] if fitting else entry.units[0] if number == 0 else sizes[0][1]


def converted(number: float, unit: str, to: str) -> float:
    """A number in one unit, "" for base SI, expressed in another."""
    return _in(_si(number, unit), to)


def all_converted(numbers: Sequence[float], unit: str, to: str) -> list[float]:
    """The same for many numbers at once, which takes a thousandth of the time for each."""
    if unit == to or not numbers:
        return list(numbers)
    found = np.asarray(numbers, dtype=np.float64)
    found = np.asarray(si(found, unit)) if unit else found
    found = np.asarray(in_unit(found, to)) if to else found
    for place in np.flatnonzero(~np.isfinite(found))[:1]:
        converted(numbers[place], unit, to)  # refuses with a sentence
    return [float(number) for number in found]


def _in(number: float, unit: str) -> float:
    return float(in_unit(number, unit)) if unit else number


def _si(number: float, unit: str) -> float:
    return float(si(number, unit)) if unit else number


def checked_text(key: str, value: str | float) -> str:
    """A text that a cell of the page can hold and show."""
    text = str(value).strip()
    if len(text) > LONGEST:
        raise ValueRefused(f"{key} has {len(text)} characters; at most {LONGEST} can be shown")
    if ILLEGAL_CHARACTERS_RE.search(text):
        raise ValueRefused(f"{key} holds a character that no workbook can hold")
    return text
