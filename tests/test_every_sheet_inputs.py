"""Every calc sheet: no bad input passes, and no check can be turned round unnoticed."""

from __future__ import annotations

import random
from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import pytest
import random_sets
from filled import Filled, assert_refused, bad_cells, bad_values, short
from printed import assert_no_text_is_cut, shown

from tausheet import templates
from tausheet.addin import embedded
from tausheet.templates import writer
from tausheet.templates.model import Choice, Entry, Sense

FAILS: dict[str, set[str]] = {}
"""Checks that the demo page fails, by sheet: none but where a FAIL is the honest page."""

# one of each way in which a cell can be wrong; the campaign takes all
BASIC = (
    "blank", "not a number", "error", "zero", "negative", "huge", "half", "wrong unit",
    "lowest text", "highest on the wrong side", "other case",
)  # fmt: skip

CASES = [
    pytest.param(name, entry.symbol, id=f"{name} {entry.symbol}")
    for name, sheet in templates.SHEETS.items()
    for entry in sheet.entries()
]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Any:
    """The demo of the sheet named, in the embedded engine, short, made once."""
    folder = tmp_path_factory.mktemp("every")
    return cache(lambda name: Filled.demo(templates.SHEETS[name], folder))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_demo_page(demo: Any, name: str) -> None:
    filled: Filled = demo(name).put()
    assert filled.inputs_are_valid()
    failing = {key for key, result in filled.checks().items() if result != "PASS"}
    assert failing == FAILS.get(name, set())
    assert filled["verdict"] == ("FAIL" if failing else "PASS")
    random_sets.assert_both_ways_agree(filled)
    for quantity in filled.sheet.quantities():
        if quantity.second:
            assert filled[f"{quantity.symbol}_diff"] < 1e-12, quantity.symbol


@pytest.mark.parametrize("name", templates.SHEETS)
def test_a_check_turned_round_is_noticed(demo: Any, name: str, tmp_path: Path) -> None:
    """With every comparison reversed, no check says what the demo page above must say."""
    right: Filled = demo(name).put()
    other = {Sense.AT_MOST: Sense.AT_LEAST, Sense.AT_LEAST: Sense.AT_MOST}
    sheet = right.sheet
    turned = replace(
        sheet, checks=tuple(replace(check, sense=other[check.sense]) for check in sheet.checks)
    )
    wrong = Filled.demo(turned, tmp_path).put()
    for check in sheet.checks:
        assert {right[f"check_{check.key}"], wrong[f"check_{check.key}"]} == {"PASS", "FAIL"}
    assert wrong["verdict"] == "FAIL"


def wrong_values(entry: Entry, basic: bool) -> Iterator[tuple[str, dict[str, Any]]]:
    return ((kind, bad) for kind, bad in bad_values(entry) if not basic or kind in BASIC)


def asked_for(filled: Filled, entry: Entry) -> dict[str, Any]:
    """Cells with which the input is asked for: none, or one other choice."""
    choices = [e for e in filled.sheet.entries() if isinstance(e, Choice)]
    others = [{f"value_of_{e.symbol}": option} for e in choices for option in e.options]
    for cells in ({}, *others):
        blank = filled.put(**cells, **{f"value_of_{entry.symbol}": None})
        if blank.state(entry.symbol) == "AT FAULT":
            return cells
    raise AssertionError(f"{entry.symbol} is never asked for")


@pytest.mark.parametrize(("name", "symbol"), CASES)
def test_bad_input_never_passes(demo: Any, name: str, symbol: str) -> None:
    every_bad_value(demo(name), symbol, basic=True)


@pytest.mark.parametrize("name", templates.SHEETS)
def test_bad_cells_of_tables_never_pass(demo: Any, name: str) -> None:
    filled: Filled = demo(name)
    for table in filled.sheet.filled_in:
        for kind, bad in bad_cells(table):
            try:
                assert_refused(filled.put(**bad), table)
            except AssertionError as error:
                raise AssertionError(f"{kind}: {error}") from None


@pytest.mark.campaign
@pytest.mark.parametrize(("name", "symbol"), CASES)
def test_every_bad_input_never_passes(demo: Any, name: str, symbol: str) -> None:
    every_bad_value(demo(name), symbol, basic=False)


def every_bad_value(filled: Filled, symbol: str, basic: bool) -> None:
    entry = next(e for e in filled.sheet.entries() if e.symbol == symbol)
    asked = asked_for(filled, entry) if entry.needed else {}
    for kind, bad in wrong_values(entry, basic):
        try:
            # one choice may ask for several inputs, all of which the demo leaves out
            assert_refused(filled.put(**asked, **bad), entry, alone=not asked)
        except AssertionError as error:
            raise AssertionError(f"{symbol}, {kind}: {error}") from None


@pytest.mark.parametrize("name", templates.SHEETS)
def test_blank_form_fails_and_asks_for_everything(name: str) -> None:
    sheet = short(templates.SHEETS[name])
    workbook = writer.build(sheet)
    blank = Filled(sheet, workbook).put()
    assert blank["verdict"] == "FAIL"
    for entry in sheet.entries():
        waits = "cannot be judged" if entry.needed else "is missing"
        assert blank[f"remark_on_{entry.symbol}"].startswith(f"{entry.symbol} {waits}")
    assert set(blank.checks().values()) == {"FAIL"}
    assert_no_text_is_cut(workbook, shown(workbook, blank.values))


def test_what_is_left_from_earlier_sets_is_computed_anew(demo: Any) -> None:
    """The engine computes only what changed; after many changes that is what a new book says."""
    draw = random.Random(7)
    filled: Filled = demo("bleed")
    for _ in range(10):
        cells = random_sets.a_valid_set(filled, draw)
        filled.put(**random_sets.an_invalid_set(filled, cells, draw)[1])
    filled.put(**cells)
    fresh = writer.build(short(filled.sheet), demo=True)
    for name, value in cells.items():
        title, cell = filled.places[name]
        fresh[title][cell] = value
    assert embedded.Book(fresh).values() == filled.values
