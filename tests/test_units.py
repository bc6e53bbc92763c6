"""Conversion and report texts: exact decimals, spellings, refusals."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tausheet.addin import cells
from tausheet.functions import in_unit, si, text
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind, InputError
from tausheet.functions.units import _QUANTITIES, _RATIOS, readable_unit, units_of

UNITS = sorted(_RATIOS)


def decimal_exponent(unit: str) -> int | None:
    over, under = _RATIOS[unit]
    size = Fraction(over, under)
    power = round(math.log10(size))
    return power if size == Fraction(10) ** power else None


@given(
    st.integers(-(10**15), 10**15),
    st.integers(-12, 12),
    st.sampled_from([unit for unit in UNITS if decimal_exponent(unit) is not None]),
)
def test_decimals_stay_decimals(digits: int, power: int, unit: str) -> None:
    shift = decimal_exponent(unit)
    assert shift is not None
    assert si(float(f"{digits}e{power}"), unit) == float(f"{digits}e{power + shift}")
    assert in_unit(float(f"{digits}e{power}"), unit) == float(f"{digits}e{power - shift}")


@given(st.integers(-(10**14), 10**14), st.integers(-20, 20), st.sampled_from(UNITS))
def test_there_and_back(digits: int, power: int, unit: str) -> None:
    value = float(f"{digits}e{power}")
    assert in_unit(si(value, unit), unit) == pytest.approx(value, rel=4e-16)
    if decimal_exponent(unit) is not None:
        assert in_unit(si(value, unit), unit) == value


def test_the_examples_of_the_interface() -> None:
    assert si(470, "uF") == 0.00047
    assert in_unit(0.00047, "uF") == 470.0
    assert text(0.00047, "F") == "470 µF"


@pytest.mark.parametrize("micro", ["u", "\u00b5", "\u03bc"])
def test_a_micro_in_three_spellings(micro: str) -> None:
    assert si(470, f"{micro}F") == 0.00047
    assert si(3, f"V/{micro}s") == 3e6
    assert text(470, f"{micro}F") == "470 \u00b5F"


@pytest.mark.parametrize("ohm", ["ohm", "\u2126", "\u03a9"])
def test_an_ohm_in_three_spellings(ohm: str) -> None:
    assert si(4.7, f"k{ohm}") == 4700.0
    assert si(4.7, f"m{ohm}") == 0.0047
    assert si(4.7, f"M{ohm}") == 4.7e6


def test_other_spellings() -> None:
    assert si(25, "°C") == si(25, "degC") == 25.0
    assert si(30, "°") == si(30, "deg") == 30.0
    assert si(7, "A²s") == si(7, "A2s") == 7.0
    assert si(7, " uF ") == 7e-6


@pytest.mark.parametrize(
    "unit", ["OHM", "uf", "KV", "kA2s", "x", "m", "k", "kHZ", "uuF", "Ohm", "m**9**9", "V A"]
)
@pytest.mark.parametrize("function", [si, in_unit, text])
def test_what_is_not_in_the_list_is_refused(function: Any, unit: str) -> None:
    with pytest.raises(InputError, match=r"unit is the text .* not in the list of units"):
        function(1.0, unit)


def test_in_a_range_only_the_unknown_unit_is_an_error() -> None:
    row = cells.call("FO_SI", [[[1.0], [2.0]], [["mV", "?", "kV", None]]])
    assert cells.plain_grid(row) == [
        [0.001, ErrorKind.VALUE, 1000.0, ErrorKind.VALUE],
        [0.002, ErrorKind.VALUE, 2000.0, ErrorKind.VALUE],
    ]
    texts = cells.call("FO_TEXT", [[[1.0, ErrorKind.NUM, "x"]], "V"])
    assert cells.plain_grid(texts) == [["1.00 V", ErrorKind.NUM, ErrorKind.VALUE]]
    assert 'the text "?"' in CATALOGUE["FO_SI"].reason([1.0, [["mV", "?"]]])


def test_beyond_the_range_of_numbers() -> None:
    column = cells.call("FO_SI", [[[1e308], [1.0]], "MV"])
    assert cells.plain_grid(column) == [[ErrorKind.NUM], [1e6]]


@pytest.mark.parametrize(
    ("value", "unit", "digits", "expected"),
    [
        (999.4, "V", 3, "999 V"),
        (999.5, "V", 3, "1.00 kV"),
        (-0.0104, "A", 3, "-10.4 mA"),
        (2.345, "V", 3, "2.35 V"),
        (2.345, "V", 15, "2.34500000000000 V"),
        (47000, "ohm", 1, "50 kΩ"),
        (47000, "ohm", 2, "47 kΩ"),
        (0.47, "mF", 3, "470 µF"),
        (0.25, "g", 3, "250 mg"),
        (2500, "kg", 3, "2500 kg"),
        (5400, "s", 3, "5400 s"),
        (12345.6, "s", 3, "12300 s"),
        (90, "min", 3, "90.0 min"),
        (1234567, "s", 3, "1.23E+06 s"),
        (1e-20, "F", 2, "1.0E-20 F"),
        (0.5, "%", 3, "0.500 %"),
        (25, "degC", 3, "25.0 °C"),
        (30, "deg", 3, "30.0°"),
        (0.5, "1", 2, "0.50"),
        (0, "uF", 3, "0 µF"),
        (-0.0, "V", 3, "0 V"),
        (5, "A2s", 3, "5.00 A²s"),
        (5, "V/us", 2, "5.0 V/µs"),
    ],
)
def test_report_texts(value: float, unit: str, digits: int, expected: str) -> None:
    assert text(value, unit, digits) == expected


@given(
    st.floats(1e-12, 1e6),
    st.sampled_from(["V", "A", "ohm", "F", "H", "s", "W", "J", "Hz", "degC"]),
    st.integers(1, 15),
)
def test_a_report_text_reads_back_to_its_digits(value: float, unit: str, digits: int) -> None:
    number, shown_unit = text(value, unit, digits).split(" ")
    rounding = 0.500001 * 10.0 ** (1 - digits)
    assert si(float(number), shown_unit) == pytest.approx(value, rel=rounding)


@pytest.mark.parametrize("quantity", sorted(_QUANTITIES))
def test_units_of_a_quantity_rise_and_agree_with_the_conversion(quantity: str) -> None:
    units = units_of(quantity)
    sizes = list(units.values())
    assert sizes == sorted(sizes) or quantity in ("energy", "charge")
    for unit, size in units.items():
        assert si(1.0, unit) == size


def test_an_unknown_quantity_is_refused() -> None:
    with pytest.raises(InputError, match=r"'resistence' is no quantity .* resistance, cond"):
        units_of("resistence")


@pytest.mark.parametrize(
    ("value", "quantity", "unit"),
    [
        (0.00047, "capacitance", "uF"),
        (-0.0047, "capacitance", "mF"),
        (4700.0, "resistance", "kohm"),
        (536.0, "time", "s"),
        (1800.0, "time", "min"),
        (90000.0, "time", "h"),
        (1e-30, "capacitance", "pF"),
        (1e30, "voltage", "kV"),
        (0.0, "voltage", "V"),
        (0.05, "ratio", "%"),
        (25.0, "temperature", "degC"),
        (1086.6, "energy", "kJ"),
        (0.0, "square integral", "A2s"),
    ],
)
def test_a_unit_that_reads_well(value: float, quantity: str, unit: str) -> None:
    assert readable_unit(value, quantity) == unit


def test_arrays_equal_single_calls() -> None:
    values = np.array([0.1, 4.7, 33.0, 1 / 3])
    together = si(values[:, np.newaxis], ["uF", "min", "%", "kWh"])
    for i, value in enumerate(values):
        for j, unit in enumerate(["uF", "min", "%", "kWh"]):
            assert together[i, j] == si(float(value), unit)
