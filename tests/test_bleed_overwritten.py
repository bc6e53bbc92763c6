"""A value put over an input's cell in base SI never passes: it is no longer what was typed."""

from __future__ import annotations

from typing import Any

import pytest

from tausheet import templates
from tausheet.addin.embedded import Book
from tausheet.addin.embedded.refused import Refused


@pytest.fixture(scope="module")
def workbook() -> Any:
    return templates.build("bleed", demo=True)


def cell_of(workbook: Any, name: str) -> tuple[str, str]:
    ((sheet, reference),) = workbook.defined_names[name].destinations
    return sheet, reference.replace("$", "").split(":")[0]


def said(workbook: Any, name: str) -> object:
    sheet, address = cell_of(workbook, name)
    return Book(workbook).values()[sheet][address]


@pytest.mark.parametrize("symbol", ["C_unit", "n_p", "I_leak", "k_back", "R_unit", "V_own"])
@pytest.mark.parametrize("value", [None, "abc", "60", "=NA()", True, 1.5])
def test_an_overwritten_input_fails(workbook: Any, symbol: str, value: Any) -> None:
    sheet, address = cell_of(workbook, symbol)
    before = workbook[sheet][address].value
    workbook[sheet][address].value = value
    try:
        if (symbol, value) == ("V_own", None):
            # V_safe then refers to an empty cell, which our engine refuses to tell from a number.
            with pytest.raises(Refused, match="refers to an empty one"):
                said(workbook, "verdict")
            return
        assert said(workbook, "verdict") == "FAIL"
        assert "at fault" in str(said(workbook, "decided_by"))
    finally:
        workbook[sheet][address].value = before


def test_the_sheet_as_made_passes(workbook: Any) -> None:
    assert said(workbook, "verdict") == "PASS"


@pytest.mark.parametrize(
    ("name", "criterion"),
    [
        ("P_allow", "Power of one resistor"),
        ("t_safe_hand", "Both ways of each principal result agree"),
    ],
)
def test_a_check_without_a_result_is_named(workbook: Any, name: str, criterion: str) -> None:
    """Also where another check fails by its numbers."""
    sheet, address = cell_of(workbook, name)
    limit = cell_of(workbook, "value_of_V_rated")
    before = workbook[sheet][address].value, workbook[limit[0]][limit[1]].value
    workbook[sheet][address].value, workbook[limit[0]][limit[1]].value = "=NA()", 400
    try:
        assert said(workbook, "verdict") == said(workbook, "check_resistor_voltage") == "FAIL"
        assert said(workbook, "decided_by") == f"{criterion}: no result"
    finally:
        workbook[sheet][address].value, workbook[limit[0]][limit[1]].value = before
