"""Preferred numbers and part codes: directions, decades, round trips, refusals."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tausheet.addin import cells
from tausheet.functions import preferred, rkm, rkm_text
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import DomainError, ErrorKind, InputError
from tausheet.functions.parts import SERIES

NAMES = list(SERIES)
VALUES = st.floats(-300, 300).map(lambda e: 10.0**e)


@given(st.sampled_from(NAMES), st.integers(0, 191), st.integers(-300, 300))
def test_a_preferred_number_is_itself_in_every_direction(name: str, i: int, power: int) -> None:
    number = SERIES[name][i % len(SERIES[name])]
    value = float(f"{number}e{power}")
    for direction in ("up", "down", "nearest"):
        assert preferred(value, name, direction) == value
        assert preferred(value * (1 + 3e-16), name, direction) == value
        assert preferred(value * (1 - 3e-16), name, direction) == value


@given(st.sampled_from(NAMES), VALUES)
def test_up_and_down_enclose_and_nearest_is_one_of_them(name: str, value: float) -> None:
    down, up = preferred(value, name, "down"), preferred(value, name, "up")
    nearest = preferred(value, name)
    assert down <= value * (1 + 1e-12)
    assert up >= value * (1 - 1e-12)
    assert nearest in (down, up)
    if down < up:
        assert preferred(down * (1 + 1e-9), name, "up") == up
        better = down if math.log(value / down) <= math.log(up / value) else up
        middle = math.sqrt(down) * math.sqrt(up)
        assert nearest == better or abs(value / middle - 1) < 1e-11


@given(st.sampled_from(NAMES), VALUES)
def test_the_digits_are_in_the_series(name: str, value: float) -> None:
    digits = f"{preferred(value, name):.14e}".split("e")[0].replace(".", "")
    assert int(digits[:3]) in SERIES[name]
    assert set(digits[3:]) == {"0"}


def test_the_middle_by_ratio_goes_down() -> None:
    # 2.0 and 2.2 in E24 change over at sqrt(4.4), below their mean of 2.1
    assert preferred(2.097, "E24") == 2.0
    assert preferred(2.098, "E24") == 2.2
    assert preferred(math.sqrt(4.4), "E24") == 2.0


def test_from_one_decade_into_the_next() -> None:
    assert preferred(9.2, "E24", "up") == 10.0
    assert preferred(0.99999, "E24", "down") == 0.91
    assert preferred(989.0, "E192", "up") == 1000.0
    assert preferred(4.71e-12, "E3", "up") == 1e-11
    assert preferred(9.99e-13, "E96") == 1e-12


def test_a_range_of_values_equals_single_calls() -> None:
    values = np.geomspace(1e-13, 1e13, 500).reshape(50, 10)
    together = preferred(values, "E48", "up")
    assert together.tolist() == [[preferred(v, "E48", "up") for v in row] for row in values]


def test_beyond_the_range_of_numbers_there_is_none() -> None:
    with pytest.raises(DomainError, match="beyond the range of numbers"):
        preferred(1.79e308, "E3", "up")


@pytest.mark.parametrize(
    ("code", "number"),
    [
        # IEC 60062, from memory
        ("4K7", 4700.0),
        ("R47", 0.47),
        ("2M2", 2.2e6),
        ("4n7", 4.7e-9),
        # the same scheme
        ("100R", 100.0),
        ("0R22", 0.22),
        ("R047", 0.047),
        ("4k7", 4700.0),
        ("1G", 1e9),
        ("1T5", 1.5e12),
        ("59R04", 59.04),
        ("1p5", 1.5e-12),
        ("p33", 3.3e-13),
        ("47u", 4.7e-5),
        ("47\u00b5", 4.7e-5),
        ("4\u03bc7", 4.7e-6),
        ("2m2", 2.2e-3),
        ("1F5", 1.5),
        ("0R", 0.0),
        # with a tolerance letter
        ("4K7J", 4700.0),
        ("4K7K", 4700.0),
        ("100RF", 100.0),
        ("47KM", 47000.0),
        ("10nM", 1e-8),
        ("10FF", 10.0),
    ],
)
def test_codes(code: str, number: float) -> None:
    assert rkm(code) == number


@pytest.mark.parametrize(
    "code",
    ["R", "K7J7", "4K7%", "4.7K", "4700", "4K7KK", "1mH", "4L7", "-4K7", "4 K7", "uF", "470uFx",
     "4N7", "P33", "x", "4K7-", "\u0664K7"],
)  # fmt: skip
def test_what_is_no_code_is_refused(code: str) -> None:
    with pytest.raises(InputError, match=r"code is the text .* no code of digits with one letter"):
        rkm(code)


def test_a_milli_is_not_a_mega() -> None:
    assert rkm("4m7") * 1e9 == rkm("4M7")


def test_an_endless_code_is_beyond_the_range_of_numbers() -> None:
    with pytest.raises(DomainError, match="beyond the range"):
        rkm("9" * 400 + "K")


@given(st.integers(1, 10**15 - 1), st.integers(-20, 0), st.sampled_from(["ohm", "F"]))
def test_number_to_code_and_back(digits: int, power: int, unit: str) -> None:
    value = float(f"{digits}e{power}")
    low, high = (1e-6, 1e15) if unit == "ohm" else (1e-15, 1e3)
    if low <= value < high:
        assert rkm(rkm_text(value, unit)) == value


@pytest.mark.parametrize(
    ("value", "unit", "code"),
    [
        (4700, "ohm", "4K7"),
        (47, "ohm", "47R"),
        (4.7, "Ω", "4R7"),
        (0.0047, "ohm", "R0047"),
        (1e6, "ohm", "1M"),
        (100, "ohm", "100R"),
        (999.9, "ohm", "999R9"),
        (1e14, "ohm", "100T"),
        (4.7e-9, "F", "4n7"),
        (1e-7, "F", "100n"),
        (3.3e-13, "F", "p33"),
        (4.7e-5, "F", "47µ"),
        (2.2e-3, "F", "2m2"),
        (1.5, "F", "1F5"),
        (0.1 + 0.2, "ohm", "R3"),
    ],
)
def test_codes_for_numbers(value: float, unit: str, code: str) -> None:
    assert rkm_text(value, unit) == code


def test_codes_for_numbers_that_have_none() -> None:
    with pytest.raises(InputError, match='unit is the text "H", for which there is no code'):
        rkm_text(1.0, "H")
    for value, unit in ((9e-7, "ohm"), (1e15, "ohm"), (9e-16, "F"), (1000.0, "F")):
        with pytest.raises(DomainError, match="which the letters do not reach"):
            rkm_text(value, unit)


def test_a_table_of_codes() -> None:
    result = cells.call("FO_RKM", [[["4K7", "?"], [None, 4700.0], [ErrorKind.REF, "R1"]]])
    assert cells.plain_grid(result) == [
        [4700.0, ErrorKind.VALUE],
        [ErrorKind.VALUE, ErrorKind.VALUE],
        [ErrorKind.REF, 0.1],
    ]
    table = cells.call("FO_RKM_TEXT", [[[4700.0], [-1.0], [1e-7]], [["ohm", "F", "x"]]])
    assert cells.plain_grid(table) == [
        ["4K7", ErrorKind.NUM, ErrorKind.VALUE],
        [ErrorKind.NUM, ErrorKind.NUM, ErrorKind.NUM],
        [ErrorKind.NUM, "100n", ErrorKind.VALUE],
    ]
    assert CATALOGUE["FO_RKM"].reason([[["4K7", "?"]]]).startswith('FO_RKM: code is the text "?"')


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((4.7, "E5"), 'series is the text "E5"; allowed: "E3", "E6"'),
        ((4.7, None), "series is blank"),
        ((4.7, 24), "series is 24"),
        ((4.7, ["E24", "E24"]), "series is a range of 2 cells"),
        ((4.7, "E24", "sideways"), 'direction is the text "sideways"'),
    ],
)
def test_wrong_words(arguments: tuple[Any, ...], words: str) -> None:
    with pytest.raises(InputError, match=words):
        preferred(*arguments)
