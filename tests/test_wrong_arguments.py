"""Each argument of a cell function given wrongly: the right error, and a sentence that names it.

The domains are written down here a second time, apart from the annotations they check.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import pytest

from tausheet.addin import cells
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind, error_kind

VALUE, NUM = ErrorKind.VALUE, ErrorKind.NUM


@dataclass(frozen=True)
class Good:
    """A call that works, and for each argument: its name, its domain, a good value."""

    name: str
    arguments: tuple[tuple[str, str, Any], ...]


def good(name: str, *arguments: tuple[str, str, Any]) -> Good:
    return Good(name, arguments)


# domains: those of NUMBERS, "word", "code"; a "?" after it means that it may be left out
GOOD = [
    good("FO_TAU_RC", ("resistance", ">=0", 47e3), ("capacitance", ">=0", 0.0047)),
    good("FO_TAU_RL", ("resistance", ">0", 20.0), ("inductance", ">=0", 1.5)),
    good(
        "FO_TAU_RX",
        ("resistance", ">0", 0.1),
        ("reactance", ">=0", 1.0),
        ("frequency", ">0", 50.0),
    ),
    good(
        "FO_TAU_FOR",
        ("level", "any", 60.0),
        ("t", ">0", 5.0),
        ("initial", "any", 680.0),
        ("final", "any", 10.0),
    ),
    good(
        "FO_RESISTANCE_AT",
        ("resistance_20", ">=0", 10.0),
        ("temperature", "-200..1000", 120.0),
        ("material", "word?", "aluminium"),
    ),
    good("FO_NATURAL", ("t", "any", 0.1), ("tau", ">0", 0.2), ("initial", "any", 5.0)),
    good(
        "FO_STEP",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("final", "any", 1.0),
        ("delay", ">=0?", 0.0),
    ),
    good(
        "FO_RAMP",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("level_from", "any", 1.0),
        ("level_to", "any", 2.0),
        ("duration", ">=0", 0.3),
    ),
    good(
        "FO_SINE",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("amplitude", "any", 325.0),
        ("frequency", ">=0", 50.0),
        ("phase", "any?", 0.0),
        ("offset", "any?", 0.0),
    ),
    good(
        "FO_DECAY",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("amplitude", "any", 1.0),
        ("source_tau", ">0", 0.2),
        ("offset", "any?", 0.0),
    ),
    good(
        "FO_PULSE",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("resting", "any", 1.0),
        ("level", "any", 9.0),
        ("duration", ">=0", 0.3),
        ("delay", ">=0?", 0.0),
    ),
    good(
        "FO_SQUARE",
        ("t", "any", 0.1),
        ("tau", ">0", 0.2),
        ("initial", "any", 5.0),
        ("low", "any", 1.0),
        ("high", "any", 9.0),
        ("period", ">0", 0.3),
        ("duty", "0..1", 0.3),
    ),
    good(
        "FO_TIME_TO",
        ("level", "any", 60.0),
        ("tau", ">0", 5.0),
        ("initial", "any", 680.0),
        ("final", "any", 10.0),
        ("delay", ">=0?", 0.0),
    ),
    good(
        "FO_TIME_UNTIL_BELOW",
        ("level", "any", 60.0),
        ("tau", ">0", 5.0),
        ("initial", "any", 680.0),
        ("final", "any", 10.0),
    ),
    good(
        "FO_TIME_UNTIL_ABOVE",
        ("level", "any", 600.0),
        ("tau", ">0", 5.0),
        ("initial", "any", 10.0),
        ("final", "any", 680.0),
    ),
    good(
        "FO_RISE_TIME",
        ("tau", ">0", 5.0),
        ("low", "0<..<1?", 0.1),
        ("high", "0<..<1?", 0.9),
    ),
    good("FO_SETTLING_TIME", ("tau", ">0", 5.0), ("tolerance", "0<..1", 0.01)),
    good("FO_ENERGY_C", ("capacitance", ">0", 0.0047), ("voltage", "any", 680.0)),
    good("FO_ENERGY_L", ("inductance", ">0", 1.5), ("current", "any", 8.0)),
    good("FO_C_FOR_ENERGY", ("energy", ">0", 32.0), ("v_from", ">0", 100.0), ("v_to", ">=0", 60.0)),
    good(
        "FO_I2T",
        ("tau", ">0", 0.5),
        ("initial", "any", 10.0),
        ("final", "any", 0.0),
        ("t_from", "any?", 0.0),
        ("t_to", "any?", 1.0),
    ),
    good(
        "FO_DISSIPATED",
        ("resistance", ">0", 100.0),
        ("quantity", "word", "voltage"),
        ("tau", ">0", 0.5),
        ("initial", "any", 10.0),
        ("final", "any", 0.0),
        ("t_from", "any?", 0.0),
        ("t_to", "any?", 1.0),
    ),
    good(
        "FO_RIDE_THROUGH",
        ("capacitance", ">0", 0.01),
        ("v_from", ">0", 100.0),
        ("v_to", ">=0", 60.0),
        ("demand", ">0", 500.0),
        ("kind", "word", "power"),
        ("series_resistance", ">=0?", 0.5),
    ),
    good("FO_SI", ("value", "any", 470.0), ("unit", "code", "uF")),
    good("FO_IN", ("value", "any", 0.00047), ("unit", "code", "uF")),
    good(
        "FO_TEXT",
        ("value", "any", 0.00047),
        ("unit", "code", "F"),
        ("digits", ">0?", 3.0),
    ),
    good(
        "FO_PREFERRED",
        ("value", ">0", 4600.0),
        ("series", "word", "E24"),
        ("direction", "word?", "up"),
    ),
    good("FO_RKM", ("code", "code", "4K7")),
    good("FO_RKM_TEXT", ("value", ">0", 4700.0), ("unit", "code", "ohm")),
    good(
        "FO_RIPPLE",
        ("tau", ">0", 1.0),
        ("low", "any", 0.0),
        ("high", "any", 10.0),
        ("period", ">0", 0.2),
        ("duty", "0..1", 0.5),
        ("what", "word?", "pp"),
    ),
    good("FO_CORNER_FREQUENCY", ("tau", ">0", 0.001)),
    good("FO_TAU_AT", ("frequency", ">0", 50.0)),
    good(
        "FO_GAIN_DB",
        ("frequency", ">=0", 1000.0),
        ("tau", ">0", 0.001),
        ("kind", "word?", "low-pass"),
    ),
    good(
        "FO_PHASE",
        ("frequency", ">=0", 1000.0),
        ("tau", ">0", 0.001),
        ("kind", "word?", "low-pass"),
    ),
    good("FO_NOISE_BANDWIDTH", ("tau", ">0", 0.001)),
    good(
        "FO_TRIP_TIME",
        ("pickup", ">0", 100.0),
        ("tau", ">0", 600.0),
        ("prior", ">=0", 0.0),
        ("current", ">=0", 200.0),
    ),
    good(
        "FO_FAULT_CURRENT",
        ("t", "any", 0.01),
        ("rms", ">0", 10000.0),
        ("resistance", ">=0", 0.1),
        ("reactance", ">=0", 1.0),
        ("frequency", ">0", 50.0),
        ("closing_angle", "any?", 0.0),
    ),
    good(
        "FO_DC_OFFSET",
        ("t", "any", 0.01),
        ("rms", ">0", 10000.0),
        ("resistance", ">=0", 0.1),
        ("reactance", ">=0", 1.0),
        ("frequency", ">0", 50.0),
        ("closing_angle", "any", 0.0),
    ),
    good(
        "FO_DC_WORST",
        ("t", "any", 0.01),
        ("rms", ">0", 10000.0),
        ("resistance", ">=0", 0.1),
        ("reactance", ">=0", 1.0),
        ("frequency", ">0", 50.0),
    ),
    good("FO_PEAK_FACTOR", ("resistance", ">=0", 0.1), ("reactance", ">=0", 1.0)),
    good(
        "FO_FAULT_I2T",
        ("rms", ">0", 10000.0),
        ("resistance", ">=0", 0.1),
        ("reactance", ">=0", 1.0),
        ("frequency", ">0", 50.0),
        ("closing_angle", "any", 0.0),
        ("t_to", ">0", 0.02),
    ),
]

NUMBERS = (">0", ">=0", "0..1", "0<..1", "0<..<1", "-200..1000", "any")
FRACTIONS = ("0..1", "0<..1", "0<..<1")
EVERY = (*NUMBERS, "word", "code")
NOT_FINITE = {**dict.fromkeys(NUMBERS, NUM), "word": VALUE, "code": VALUE}

WRONG: list[tuple[str, Any, dict[str, ErrorKind]]] = [
    # what is wrong, the value, the kind of error for numbers, words and codes
    ("above one", 1.001, dict.fromkeys(FRACTIONS, NUM)),
    ("one", 1.0, {"0<..<1": NUM}),
    ("too cold", -200.1, {"-200..1000": NUM}),
    ("too hot", 1000.1, {"-200..1000": NUM}),
    (
        "negative",
        -1.0,
        {**dict.fromkeys((*FRACTIONS, ">0", ">=0"), NUM), "word": VALUE, "code": VALUE},
    ),
    ("zero", 0.0, {**dict.fromkeys(("0<..1", "0<..<1", ">0"), NUM), "word": VALUE, "code": VALUE}),
    ("blank", None, dict.fromkeys(EVERY, VALUE)),
    ("empty text", "", dict.fromkeys(EVERY, VALUE)),
    ("text", "Quay 4", dict.fromkeys(EVERY, VALUE)),
    ("unit", "uF", dict.fromkeys((*NUMBERS, "word"), VALUE)),
    ("another unit", "uf", {"code": VALUE}),
    ("digits as text", "1E400", dict.fromkeys(EVERY, VALUE)),
    ("NaN", math.nan, NOT_FINITE),
    ("infinity", math.inf, NOT_FINITE),
    ("too large", 10**400, NOT_FINITE),
    *((kind.text, kind, dict.fromkeys(EVERY, kind)) for kind in ErrorKind),
]


def stands_for_the_default(base: str, value: Any) -> bool:
    """A blank does; and a 0 where a word belongs, as LibreOffice passes an empty cell."""
    return value is None or value == "" or (base == "word" and value == 0)


CASES = [
    pytest.param(call, index, value, kinds[base], id=f"{call.name}-{name}-{what}")
    for call in GOOD
    for index, (name, domain, _) in enumerate(call.arguments)
    for base in [domain.rstrip("?")]
    for what, value, kinds in WRONG
    if base in kinds and not (domain.endswith("?") and stands_for_the_default(base, value))
]


def result(name: str, arguments: list[Any]) -> Any:
    return cells.call(name, arguments)


@pytest.mark.parametrize("call", GOOD, ids=lambda call: call.name)
def test_the_good_call_works_and_has_no_reason(call: Good) -> None:
    arguments = [value for _, _, value in call.arguments]
    assert [p.name for p in CATALOGUE[call.name].parameters] == [n for n, _, _ in call.arguments]
    value = result(call.name, arguments)
    assert isinstance(value, str) or error_kind(value) is None
    assert CATALOGUE[call.name].reason(arguments) == ""


@pytest.mark.parametrize(("call", "index", "value", "kind"), CASES)
def test_one_wrong_argument(call: Good, index: int, value: Any, kind: ErrorKind) -> None:
    arguments = [good_value for _, _, good_value in call.arguments]
    arguments[index] = value
    assert error_kind(result(call.name, arguments)) is kind
    sentence = CATALOGUE[call.name].reason(arguments)
    assert sentence.startswith(f"{call.name}: {call.arguments[index][0]} ")
    assert "{" not in sentence


@pytest.mark.parametrize("call", GOOD, ids=lambda call: call.name)
def test_optional_arguments_may_be_blank(call: Good) -> None:
    required = [value for _, domain, value in call.arguments if not domain.endswith("?")]
    blanks: list[Any] = [None] * (len(call.arguments) - len(required))
    with_blanks, without = (
        cells.plain_grid(result(call.name, arguments))
        for arguments in ([*required, *blanks], required)
    )
    assert with_blanks == without


ELEMENTWISE = [
    call
    for call in GOOD
    if sum(domain.rstrip("?") != "word" for _, domain, _ in call.arguments) > 1
]


@pytest.mark.parametrize("call", ELEMENTWISE, ids=lambda call: call.name)
def test_ranges_that_do_not_fit_together(call: Good) -> None:
    arguments = [value for _, _, value in call.arguments]
    spots = [i for i, (_, domain, _) in enumerate(call.arguments) if domain != "word"]
    arguments[spots[0]] = [[arguments[spots[0]]]] * 3
    arguments[spots[1]] = [[arguments[spots[1]]]] * 2
    assert error_kind(result(call.name, arguments)) is VALUE
    sentence = CATALOGUE[call.name].reason(arguments)
    assert call.arguments[spots[0]][0] in sentence
    assert call.arguments[spots[1]][0] in sentence


@pytest.mark.parametrize("call", GOOD, ids=lambda call: call.name)
def test_in_a_range_only_the_wrong_element_is_an_error(call: Good) -> None:
    arguments = [value for _, _, value in call.arguments]
    alone = result(call.name, arguments)
    spot = next(i for i, (_, domain, _) in enumerate(call.arguments) if domain != "word")
    arguments[spot] = [[arguments[spot]], [None], [arguments[spot]], [ErrorKind.NAME]]
    column = cells.plain_grid(result(call.name, arguments))
    assert column == [[alone], [VALUE], [alone], [ErrorKind.NAME]]
