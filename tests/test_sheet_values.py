"""What `build` takes for the values of a calc sheet, and what it refuses."""

from __future__ import annotations

from typing import Any

import pytest

from tausheet import templates
from tausheet.functions.errors import TausheetError
from tausheet.templates import values

SHEET = templates.SHEETS["bleed"]


def typed(given: dict[str, Any], symbol: str, demo: bool = False) -> values.Typed:
    return values.read(SHEET, given, demo)[0][symbol]


@pytest.mark.parametrize(
    ("given", "value", "unit"),
    [
        ("4.7 mF", 4.7, "mF"),
        ("4.7mF", 4.7, "mF"),
        (" 4700 µF ", 4700.0, "uF"),
        ("4700 uF", 4700.0, "uF"),
        ("0.0047", 4.7, "mF"),
        (0.0047, 4.7, "mF"),
        ("4.7e-3 F", 0.0047, "F"),
        ("4.7e9 pF", 4.7e9, "pF"),
        (2e-9, 2.0, "nF"),
        (3, 3.0, "F"),
        (-0.0047, -4.7, "mF"),
        (0, 0.0, "mF"),
    ],
)
def test_numbers_with_units(given: object, value: float, unit: str) -> None:
    assert typed({"C_unit": given}, "C_unit") == values.Typed(value, unit)


def test_extremes_stand_in_the_unit_of_the_value() -> None:
    entry = typed({"V_start_hi": "0.68 kV", "V_start": "565 V", "V_start_lo": 510}, "V_start")
    assert (entry.value, entry.unit, entry.lowest, entry.highest) == (565.0, "V", 510.0, 680.0)
    entry = typed({"V_start": "0.565 kV"}, "V_start", demo=True)
    assert (entry.unit, entry.lowest, entry.highest) == ("kV", 0.51, 0.68)


@pytest.mark.parametrize(("given", "percent"), [("-5 %", -5.0), ("-5%", -5.0), (-0.05, -5.0)])
def test_tolerances(given: object, percent: float) -> None:
    assert typed({"R_unit_lo": given}, "R_unit").lowest == percent


def test_blank_stays_blank_and_demo_is_overridden() -> None:
    assert typed({}, "C_unit") == values.Typed(unit="mF")
    assert typed({"C_unit": None}, "C_unit", demo=True).value is None
    assert typed({"C_unit": ""}, "C_unit", demo=True).value is None
    assert typed({"C_unit_source": None}, "C_unit", demo=True).source == ""
    assert typed({"C_unit": "1 mF"}, "C_unit", demo=True).value == 1.0
    assert typed({"n_s": "3", "C_unit_source": "x"}, "n_s") == values.Typed(3.0)
    assert typed({"limit": "own limit"}, "limit").value == "own limit"


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        ({"R_x": 1}, '"R_x".*its inputs are: C_unit'),
        ({"R_unit": "4.7 uF"}, 'R_unit.*"uF" is no unit of it; use kohm, ohm, Mohm'),
        ({"R_unit": "4.7 furlong"}, '"furlong" is no unit'),
        ({"n_s": "2 V"}, "give the number alone"),
        ({"C_unit": "abc"}, 'C_unit is "abc", which is not a number'),
        ({"C_unit": "1E400 F"}, "C_unit is beyond the range of numbers"),
        ({"C_unit": float("nan")}, "C_unit is beyond the range of numbers"),
        ({"C_unit": float("inf")}, "C_unit is beyond the range of numbers"),
        ({"C_unit": "nan"}, "not a number"),
        ({"C_unit": "1_000 uF"}, "no unit|not a number"),
        ({"C_unit_lo": "-5 V"}, "a tolerance is given in %"),
        ({"V_cap_lo": 5}, "no input"),
        ({"tapped": "maybe"}, "tapped.*use one of: yes; no"),
        ({"limit": "50 V in 5 s"}, "limit.*use one of: 60 V in 5 s"),
        ({"status": "done"}, "status.*use one of: draft"),
        ({"doc_title": "x" * 201}, "doc_title has 201 characters"),
        ({"project": "a\x00b"}, "project holds a character"),
    ],
)
def test_refusals_are_one_sentence(given: dict[str, Any], sentence: str) -> None:
    with pytest.raises(TausheetError, match=sentence) as refused:
        templates.build("bleed", given)
    assert "\n" not in str(refused.value)


def test_unknown_sheet() -> None:
    with pytest.raises(TausheetError, match='"blead" is no calc sheet; use one of: bleed'):
        templates.build("blead")


def test_inputs_are_described() -> None:
    rows = {row[0]: row for row in templates.describe_inputs("bleed")}
    assert rows["C_unit"] == ("C_unit", "capacitance of one capacitor", "mF, µF, nF, F", "4.7 mF")
    assert rows["tapped"][2] == "yes; no"
    assert rows.keys() == {entry.symbol for entry in SHEET.entries()}


def test_many_numbers_are_converted_as_each_alone() -> None:
    numbers = [1.5, -2e-9, 0.0, 3.3e7, 1 / 3]
    for unit, to in (("", "us"), ("ms", "us"), ("ms", ""), ("h", "ms"), ("s", "s")):
        alone = [values.converted(number, unit, to) for number in numbers]
        assert values.all_converted(numbers, unit, to) == alone
    with pytest.raises(TausheetError, match="beyond the range of numbers"):
        values.all_converted([1.0, 1e308], "", "us")
