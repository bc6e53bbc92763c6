"""Units: a closed list of ours, conversion to and from base SI, and texts for reports.

Numbers are converted as the decimals they are written as: 0.1 uF is exactly the double nearest
to 1E-7. A conversion is by a ratio of whole numbers, kept in `_RATIOS`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from decimal import ROUND_HALF_UP, Context, Decimal
from typing import Annotated, Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.arguments import Code, Finite, Number, Numbers
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import InputError

Digits: TypeAlias = Annotated[Any, Number(low=1, high=15, whole=True)]

_POWERS = {"f": -15, "p": -12, "n": -9, "u": -6, "m": -3, "": 0, "k": 3, "M": 6, "G": 9}

# root of a family of units: its size in base SI as a ratio, and the prefixes it takes
_FAMILIES: dict[str, tuple[int, int, str]] = {
    "s": (1, 1, "fpnum"),
    "min": (60, 1, ""),
    "h": (3600, 1, ""),
    "d": (86400, 1, ""),
    "Hz": (1, 1, "umkMG"),
    "1/s": (1, 1, ""),
    "1/min": (1, 60, ""),
    "1/h": (1, 3600, ""),
    "ohm": (1, 1, "numkMG"),
    "S": (1, 1, "pnumk"),
    "F": (1, 1, "fpnum"),
    "H": (1, 1, "pnum"),
    "V": (1, 1, "numkM"),
    "A": (1, 1, "fpnumk"),
    "W": (1, 1, "pnumkMG"),
    "VA": (1, 1, "mkMG"),
    "var": (1, 1, "mkMG"),
    "J": (1, 1, "pnumkMG"),
    "Wh": (3600, 1, "mkMG"),
    "C": (1, 1, "pnumk"),
    "Ah": (3600, 1, "um"),
    "Wb": (1, 1, "num"),
    "T": (1, 1, "num"),
    "V/s": (1, 1, "mkM"),
    "V/ms": (1000, 1, ""),
    "V/us": (1_000_000, 1, ""),
    "A/s": (1, 1, "mkM"),
    "A/ms": (1000, 1, ""),
    "A/us": (1_000_000, 1, ""),
    "A2s": (1, 1, ""),  # "kA2s" is read as 1E3 by some and as 1E6 by others: left out
    "degC": (1, 1, ""),
    "K": (1, 1, "um"),
    "K/W": (1, 1, "m"),
    "J/K": (1, 1, "mkM"),
    "J/(kg K)": (1, 1, "k"),
    "g": (1, 1000, "umk"),
    "deg": (1, 1, ""),
    "%": (1, 100, ""),
    "ppm": (1, 1_000_000, ""),
    "1": (1, 1, ""),
}

_RATIOS: dict[str, tuple[int, int]] = {}
_ROOT: dict[str, str] = {}
for _root, (_over, _under, _prefixes) in _FAMILIES.items():
    for _prefix in ("", *_prefixes):
        _power = _POWERS[_prefix]
        _RATIOS[_prefix + _root] = (_over * 10 ** max(_power, 0), _under * 10 ** max(-_power, 0))
        _ROOT[_prefix + _root] = _root

_SPELLINGS = str.maketrans(
    {"\u00b5": "u", "\u03bc": "u", "\u2126": "ohm", "\u03a9": "ohm", "\u00b2": "2"}
)

_QUANTITIES = {
    "resistance": "uohm, mohm, ohm, kohm, Mohm, Gohm",
    "conductance": "nS, uS, mS, S",
    "capacitance": "pF, nF, uF, mF, F",
    "inductance": "nH, uH, mH, H",
    "time": "ns, us, ms, s, min, h, d",
    "frequency": "mHz, Hz, kHz, MHz, GHz",
    "rate of operation": "1/h, 1/min, 1/s",
    "voltage": "uV, mV, V, kV",
    "current": "pA, nA, uA, mA, A, kA",
    "power": "uW, mW, W, kW, MW",
    "apparent power": "VA, kVA, MVA",
    "reactive power": "var, kvar, Mvar",
    "energy": "nJ, uJ, mJ, J, kJ, MJ, Wh, kWh",
    "charge": "pC, nC, uC, mC, C, mAh, Ah",
    "square integral": "A2s",
    "voltage slope": "V/s, V/ms, V/us",
    "current slope": "A/s, A/ms, A/us",
    "temperature": "degC",
    "temperature difference": "K",
    "thermal resistance": "mK/W, K/W",
    "heat capacity": "J/K, kJ/K",
    "specific heat": "J/(kg K), kJ/(kg K)",
    "mass": "g, kg",
    "angle": "deg",
    "ratio": "ppm, %, 1",
}

# units that a value is never turned into by itself, since another of the list reads better
_ONLY_ON_REQUEST = {"d", "Wh", "kWh", "mAh", "Ah", "ppm", "1"}
# these read well only from ten of them on: 536 s rather than 8.93 min
_FROM_TEN = {"min", "h"}

_CONTEXT = Context(prec=60)


def canonical(unit: str) -> str | None:
    """The list's own spelling of a unit, None when the list does not hold it."""
    text = unit.translate(_SPELLINGS)
    text = text.replace("\u00b0C", "degC").replace("\u00b0", "deg")
    return text if text in _RATIOS else None


def units_of(quantity: str) -> dict[str, float]:
    """The units that fit a quantity, small to large, each with its size in base SI."""
    if quantity not in _QUANTITIES:
        known = ", ".join(_QUANTITIES)
        raise InputError(f"{quantity!r} is no quantity of the list of units; use one of: {known}")
    units = _QUANTITIES[quantity].split(", ")
    return {unit: _RATIOS[unit][0] / _RATIOS[unit][1] for unit in units}


def readable_unit(value: float, quantity: str) -> str:
    """The unit of a quantity in which a base SI value reads well: uF for 0.00047 of capacitance."""
    units = units_of(quantity)
    offered = {u: size for u, size in units.items() if u not in _ONLY_ON_REQUEST}
    return _largest_below(
        abs(value) or 1.0,
        ((size * (10 if u in _FROM_TEN else 1), u) for u, size in offered.items()),
    )


def _largest_below(value: Any, sizes: Iterable[tuple[Any, str]]) -> str:
    """The unit of the largest size not above the value, or else of the smallest."""
    ordered = sorted(sizes)
    fitting = [unit for size, unit in ordered if size <= value]
    return fitting[-1] if fitting else ordered[0][1]


def _converted(value: float, over: int, under: int) -> float:
    if over == under:
        return value
    exact = _CONTEXT.divide(_CONTEXT.multiply(Decimal(repr(value)), Decimal(over)), Decimal(under))
    return float(exact)


def _each(values: Any, units: NDArray[Any], use: Callable[[Any, str], Any]) -> Answer:
    """`use` each value with its unit; an unknown unit is refused."""
    values, units = np.broadcast_arrays(values, units)
    spellings = {unit: canonical(unit) for unit in set(units.ravel().tolist())}
    unknown = np.reshape([spellings[u] is None for u in units.ravel().tolist()], units.shape)
    results = np.empty(values.shape, dtype=object)
    results.ravel()[:] = [
        0.0 if (unit := spellings[text]) is None else use(value, unit)
        for value, text in zip(values.ravel().tolist(), units.ravel().tolist(), strict=True)
    ]
    return Answer(results).unless(
        unknown,
        InputError,
        'unit is the text "{unit}", which is not in the list of units (capitals count); enter one '
        "such as mV, kohm, uF, ms, kW or %",
    )


def _as_numbers(answer: Answer) -> Answer:
    return Answer(np.asarray(answer.values, dtype=np.float64), answer.refusals)


@cell_function("FO_SI", "Parts and units")
def si(value: Finite, unit: Code) -> Numbers:
    """Number in base SI units, from a number in another unit.

        result = value x (size of the unit in base SI)

    Base units are s, Hz, ohm, S, F, H, V, A, W, VA, var, J, C, Wb, T, kg, K; fractions for %;
    degrees for angles. Degrees Celsius (degC) stay as they are. A micro may be written u or µ,
    an ohm as ohm or Ω. Capitals count: mohm is a thousandth of an ohm, Mohm a million.

    Arguments:
        value: number in the unit; any number
        unit: its unit, for example uF; a text

    Result: the number in base SI, in the broadcast shape of the arguments; the double nearest to
    the decimal that the conversion gives.

    Errors: #VALUE! for a unit that is not in the list, for a blank, or a text as value.

    Assumes: nothing.

    Example:
        >>> si(470, "uF"), si(2.5, "h"), si(5, "%")
        (0.00047, 9000.0, 0.05)

    References: the International System of Units (SI), 9th edition, for prefixes and units.
    """
    return _as_numbers(_each(value, unit, lambda v, u: _converted(v, *_RATIOS[u])))


@cell_function("FO_IN", "Parts and units")
def in_unit(value: Finite, unit: Code) -> Numbers:
    """Base SI number expressed in another unit.

        result = value / (size of the unit in base SI)

    The units are those of FO_SI.

    Arguments:
        value: number in base SI units; any number
        unit: unit wanted, for example uF; a text

    Result: the number in that unit, in the broadcast shape of the arguments; the double nearest
    to the decimal that the conversion gives.

    Errors: #VALUE! for a unit that is not in the list, for a blank, or a text as value.

    Assumes: nothing.

    Example:
        >>> in_unit(0.00047, "uF"), in_unit(9000.0, "h")
        (470.0, 2.5)

    References: the International System of Units (SI), 9th edition, for prefixes and units.
    """
    return _as_numbers(_each(value, unit, lambda v, u: _converted(v, *_RATIOS[u][::-1])))


@cell_function("FO_TEXT", "Parts and units", texts=True)
def text(value: Finite, unit: Code, digits: Digits = 3.0) -> Any:
    """Text for a report, with the prefix that reads best; for reading only, never to compare.

    The number is rounded to `digits` significant digits, halves away from 0, and shown from 1 to
    999 with a prefix of the unit's list where there is one. Beyond the prefixes it is shown
    plainly from 0.001 to 999999, else as a power of ten.

    Arguments:
        value: number in the unit; any number
        unit: its unit, for example F; a text
        digits: significant digits, 3 when left out; whole number >= 1 and <= 15

    Result: text, in the broadcast shape of the arguments.

    Errors: #VALUE! for a unit that is not in the list, for a blank, or a text as value; #NUM! for
    digits outside the range.

    Assumes: nothing.

    Example:
        >>> text(0.00047, "F"), text(4700, "ohm", 2), text(5400, "s")
        ('470 µF', '4.7 kΩ', '5400 s')

    References: the International System of Units (SI), 9th edition, for prefixes and units.
    """
    values, units, places = np.broadcast_arrays(value, unit, digits)
    numbers = np.empty(values.shape, dtype=object)
    numbers.ravel()[:] = list(zip(values.ravel().tolist(), places.ravel().tolist(), strict=True))
    return _each(numbers, units, lambda pair, u: _in_words(pair[0], u, int(pair[1])))


def _in_words(value: float, unit: str, digits: int) -> str:
    if value == 0:
        return _with_unit("0", unit)
    root = _ROOT[unit]
    rounding = Context(prec=digits, rounding=ROUND_HALF_UP)
    over, under = _RATIOS[unit]
    exact = _CONTEXT.divide(_CONTEXT.multiply(Decimal(repr(value)), Decimal(over)), Decimal(under))
    number = rounding.plus(exact)
    sizes = {
        u: _CONTEXT.divide(Decimal(_RATIOS[u][0]), Decimal(_RATIOS[u][1]))
        for u, r in _ROOT.items()
        if r == root
    }
    best = _largest_below(abs(number), ((size, u) for u, size in sizes.items()))
    shown = _CONTEXT.divide(number, sizes[best])
    if not Decimal("0.001") <= abs(shown) < 1_000_000:
        return _with_unit(f"{float(_CONTEXT.divide(number, sizes[root])):.{digits - 1}E}", root)
    decimals = max(digits - 1 - shown.adjusted(), 0)
    return _with_unit(f"{shown:.{decimals}f}", best)


_SHOWN = {"degC": "°C", "deg": "°", "1": ""}


def _with_unit(number: str, unit: str) -> str:
    root = _ROOT[unit]
    prefix = unit[: len(unit) - len(root)].replace("u", "µ")
    name = prefix + _SHOWN.get(root, root.replace("ohm", "Ω").replace("A2", "A²"))
    name = name.replace("/us", "/µs")
    return number + name if name in ("", "°") else f"{number} {name}"
