"""Preferred numbers, and the codes printed on resistors and capacitors."""

from __future__ import annotations

import re
from decimal import Context, Decimal
from typing import Annotated, Any

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.arguments import Code, Numbers, Positive, words
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError, InputError
from tausheet.functions.exact import Array

_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82,
        91)  # fmt: skip
# the standard's one departure from the rounded powers: 920 stands where rounding gives 919
_E192 = tuple({919: 920}.get(n, n) for n in (round(100 * 10 ** (i / 192)) for i in range(192)))

SERIES = {
    **{f"E{n}": tuple(10 * m for m in _E24[:: 24 // n]) for n in (3, 6, 12, 24)},
    **{f"E{n}": _E192[:: 192 // n] for n in (48, 96, 192)},
}
"""The preferred numbers of each series in one decade, as whole numbers from 100 to 999."""

_SAME = 1e-12
"""Numbers that agree this closely, relatively, are one: 4700.0000000000009 is 4700."""


@cell_function("FO_PREFERRED", "Parts and units")
def preferred(
    value: Positive,
    series: Annotated[str, words("E3", "E6", "E12", "E24", "E48", "E96", "E192")],
    direction: Annotated[str, words("up", "down", "nearest")] = "nearest",
) -> Numbers:
    """Preferred number of a series, at, above or below a value, in any decade.

    "nearest" goes by ratio: the lower number a and the higher b change over at sqrt(a b), which
    itself counts as nearest to a. A value that agrees with a preferred number to 12 digits is
    that number, in every direction.

    Arguments:
        value: value to be replaced; number > 0
        series: series of preferred numbers; "E3", "E6", "E12", "E24", "E48", "E96", "E192"
        direction: which preferred number, nearest when left out; "up", "down", "nearest"

    Result: the preferred number, in the unit and the shape of value.

    Errors: #NUM! outside the range, #VALUE! for a blank, a text or an unknown word.

    Assumes: nothing about availability.

    Example:
        >>> preferred(4.6e3, "E24"), preferred(4.7e-9, "E12", "up"), preferred(919.0, "E192", "up")
        (4700.0, 4.7e-09, 920.0)

    References: IEC 60063, preferred number series for resistors and capacitors.
    """
    numbers = np.array(SERIES[series])
    size = numbers.size
    logarithm = np.log10(value)
    decade = np.floor(logarithm)
    within = 10.0 ** (logarithm - decade + 2)
    place = np.searchsorted(np.append(numbers, 1000), within * (1 + _SAME), side="right") - 1
    extended = np.append(numbers, [1000, 10 * numbers[1]]).astype(np.float64)
    lower, upper = extended[place], extended[place + 1]
    above = within > lower * (1 + _SAME)
    if direction == "down":
        above = np.zeros_like(above)
    elif direction == "nearest":
        above &= within * within > lower * upper * (1 + _SAME)
    place = decade.astype(np.int64) * size + place + above
    return _numbers_at(place, numbers)


def _numbers_at(place: NDArray[np.int64], numbers: NDArray[np.int64]) -> Array:
    """The preferred numbers at places counted through all decades, as exact decimals."""
    different, inverse = np.unique(place, return_inverse=True)
    decades, within = np.divmod(different, numbers.size)
    exact = [
        float(f"{number}e{decade - 2}")
        for number, decade in zip(numbers[within].tolist(), decades.tolist(), strict=True)
    ]
    return np.array(exact)[inverse].reshape(place.shape)


_LETTERS = {
    "R": 0, "r": 0, "F": 0, "K": 3, "k": 3, "M": 6, "G": 9, "T": 12,
    "m": -3, "u": -6, "\u00b5": -6, "\u03bc": -6, "n": -9, "p": -12,
}  # fmt: skip
_CODE = re.compile(f"([0-9]*)([{''.join(_LETTERS)}])([0-9]*)[BCDFGJKMN]?")


@cell_function("FO_RKM", "Parts and units")
def rkm(code: Code) -> Numbers:
    """Number that a letter-and-digit code stands for: the letter is the decimal point.

    Letters: R (or r) for 1 ohm, F for 1 farad, K (or k) 1E3, M 1E6, G 1E9, T 1E12; m 1E-3, u or µ
    1E-6, n 1E-9, p 1E-12. m and M differ. One tolerance letter B, C, D, F, G, J, K, M or N may
    follow, and is not part of the number.

    Arguments:
        code: digits with one letter as the decimal point, such as 4K7; a text

    Result: the number in ohm or farad, in the shape of code.

    Errors: #VALUE! for a text that is no such code, a number or a blank.

    Assumes: nothing.

    Example:
        >>> rkm("4K7"), rkm("R47"), rkm("2M2"), rkm("4n7"), rkm("100RJ")
        (4700.0, 0.47, 2200000.0, 4.7e-09, 100.0)

    References: IEC 60062, marking codes for resistors and capacitors; the tolerance letters from
    memory.
    """
    found = [_CODE.fullmatch(text) for text in code.ravel().tolist()]
    values = [
        float(f"{m[1] or 0}.{m[3] or 0}e{_LETTERS[m[2]]}") if m and (m[1] or m[3]) else np.nan
        for m in found
    ]
    numbers = np.reshape(values, code.shape)
    return Answer(numbers).unless(
        np.isnan(numbers),
        InputError,
        'code is the text "{code}", which is no code of digits with one letter as the decimal '
        "point; enter one such as 4K7, R47, 2M2, 4n7 or 100R",
    )


# unit: the letter of each power of 1000 from the smallest on, that power, and the limits
_MARKS = {"ohm": ("RKMGT", 0, 1e-6, 1e15), "F": ("pnµmF", -4, 1e-15, 1e3)}


@cell_function("FO_RKM_TEXT", "Parts and units", texts=True)
def rkm_text(value: Positive, unit: Code) -> Any:
    """Letter-and-digit code for a number: the letter is the decimal point.

    The number is taken with 15 digits, so that FO_RKM gives it back.

    Arguments:
        value: number in ohm or farad; number > 0
        unit: ohm or F; a text

    Result: the code, as a text, in the broadcast shape of the arguments.

    Errors: #NUM! outside the range, below 1 microohm or 1 femtofarad, from 1E15 ohm or 1000 F on;
    #VALUE! for another unit, a blank, or a text as value.

    Assumes: nothing.

    Example:
        >>> rkm_text(4700.0, "ohm"), rkm_text(0.47, "ohm"), rkm_text(4.7e-9, "F")
        ('4K7', 'R47', '4n7')

    References: IEC 60062, marking codes for resistors and capacitors.
    """
    values, units = np.broadcast_arrays(value, unit)
    names = [{"Ω": "ohm", "\u2126": "ohm"}.get(text, text) for text in units.ravel().tolist()]
    codes = np.empty(values.shape, dtype=object)
    unknown = np.zeros(values.shape, dtype=bool)
    outside = np.zeros(values.shape, dtype=bool)
    for i, (number, name) in enumerate(zip(values.ravel().tolist(), names, strict=True)):
        letters, power, least, limit = _MARKS.get(name, _MARKS["ohm"])
        unknown.ravel()[i] = name not in _MARKS
        outside.ravel()[i] = not least <= number < limit
        codes.ravel()[i] = "" if outside.ravel()[i] else _coded(number, letters, power)
    return (
        Answer(codes)
        .unless(
            unknown,
            InputError,
            'unit is the text "{unit}", for which there is no code; enter ohm or F',
        )
        .unless(
            outside,
            DomainError,
            "value is {value}, which the letters do not reach; enter 1E-6 to 1E15 ohm, or 1E-15 to "
            "1000 F",
        )
    )


def _coded(number: float, letters: str, power: int) -> str:
    rounded = Context(prec=15).create_decimal(Decimal(number))
    group = min(max(rounded.adjusted() // 3, power), power + len(letters) - 1)
    whole, _, fraction = f"{rounded.scaleb(-3 * group):f}".partition(".")
    return whole.lstrip("0") + letters[group - power] + fraction.rstrip("0")
