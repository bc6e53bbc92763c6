"""The mechanism behind every cell function: conversion, element-wise errors, sentences."""

from __future__ import annotations

import inspect
import math
from decimal import Decimal

import numpy as np
import pytest

from tausheet.addin import cells
from tausheet.functions import errors
from tausheet.functions.arguments import Flag, Number, Parameter, Word
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import (
    CellError,
    DomainError,
    ErrorKind,
    InputError,
    NotAvailable,
    PassedOn,
    error_codes,
)
from tausheet.functions.response import step

MAPPING = {DomainError: "#NUM!", InputError: "#VALUE!", NotAvailable: "#N/A"}
RAISED_WITH = {PassedOn: ("as it came", ErrorKind.REF)}


def every_error_class() -> list[type[CellError]]:
    found = [c for _, c in inspect.getmembers(errors, inspect.isclass) if issubclass(c, CellError)]
    return [c for c in found if c is not CellError]


def codes(values: object) -> list[int]:
    return error_codes(np.asarray(values)).ravel().tolist()


@pytest.mark.parametrize("error", every_error_class())
def test_every_error_class_becomes_one_cell_error(
    error: type[CellError], monkeypatch: pytest.MonkeyPatch
) -> None:
    raised = error(*RAISED_WITH.get(error, ("a sentence",)))
    expected = MAPPING.get(error, "#REF!")

    def refuse(*_: object) -> float:
        raise raised

    entry = CATALOGUE["FO_STEP"]
    replaced = entry.__class__(**{**vars(entry), "function": refuse})
    monkeypatch.setitem(CATALOGUE, "FO_STEP", replaced)
    assert cells.plain_grid(cells.call("FO_STEP", [1])) == ErrorKind.from_text(expected)


@pytest.mark.parametrize("kind", list(ErrorKind))
def test_an_error_travels_as_a_nan_and_back(kind: ErrorKind) -> None:
    assert math.isnan(kind.nan)
    assert errors.error_kind(kind.nan) is kind
    assert errors.carried_kind(kind.nan) is kind
    assert ErrorKind.from_text(kind.text) is kind
    in_an_array = np.array([1.0, kind.nan])[[1, 0]].copy()
    assert codes(in_an_array) == [kind.value, 0]


def test_a_text_that_is_no_error_is_refused() -> None:
    with pytest.raises(ValueError, match="not a cell error"):
        ErrorKind.from_text("#OTHER!")


@pytest.mark.parametrize(
    ("tau", "error", "sentence"),
    [
        (0, DomainError, "FO_STEP: tau is 0; allowed: number > 0; enter the time constant"),
        (-5, DomainError, "tau is -5"),
        (math.nan, DomainError, "tau is nan"),
        (math.inf, DomainError, "tau is inf"),
        (10**400, DomainError, "tau is 1000000"),
        (None, InputError, "tau is blank"),
        ("", InputError, "tau is blank"),
        ("5", InputError, 'tau is the text "5"'),
        ("uF", InputError, 'tau is the text "uF"'),
        (ErrorKind.REF, PassedOn, "tau holds the error #REF!"),
        (ErrorKind.NA.nan, PassedOn, "tau holds the error #N/A"),
        (1 + 2j, InputError, "tau is the text"),
    ],
)
def test_a_wrong_single_value_raises_its_error(
    tau: object, error: type[CellError], sentence: str
) -> None:
    with pytest.raises(error, match=sentence) as caught:
        step(1, tau, 0, 5)
    assert CATALOGUE["FO_STEP"].reason([1, tau, 0, 5]) == str(caught.value)


@pytest.mark.parametrize("one", [1, 1.0, True, Decimal(1), np.float32(1), np.int64(1)])
def test_any_real_number_counts_as_its_value(one: object) -> None:
    assert step(one, one, 0, 5) == step(1.0, 1.0, 0.0, 5.0)


def test_only_the_wrong_elements_of_a_range_become_errors() -> None:
    tau = [[1.0, 0.0, None, "x", ErrorKind.DIV0, math.nan, 2.0]]
    result = step([[1.0], [2.0]], tau, 0, 5)
    assert result.shape == (2, 7)
    assert codes(result[0]) == [0, 503, 519, 519, 532, 503, 0]
    assert codes(result[1]) == codes(result[0])
    assert result[1, 6] == step(2, 2, 0, 5)


def test_the_first_wrong_argument_decides_and_error_values_before_it() -> None:
    assert codes(step(["a", "a", "a"], [0, 1, ErrorKind.REF], 0, 5)) == [519, 519, 524]
    assert codes(step([1, 1], [0, -1], "x", 5)) == [503, 503]


def test_ranges_that_do_not_fit_are_one_error() -> None:
    with pytest.raises(InputError, match=r"do not fit together \(t 3, tau 2\)"):
        step([1, 2, 3], [1, 2], 0, 5)
    assert cells.plain_grid(cells.call("FO_STEP", [[[1, 2]], [[1, 2, 3]], 0, 5])) is ErrorKind.VALUE


def test_rows_of_unequal_length_and_empty_ranges_are_refused() -> None:
    with pytest.raises(InputError, match="equally long"):
        step([[1, 2], [3]], 1, 0, 5)
    with pytest.raises(InputError, match="at least one cell"):
        step([], 1, 0, 5)


def test_a_result_beyond_the_numbers_is_an_error_with_a_reason() -> None:
    tau_rc = CATALOGUE["FO_TAU_RC"]
    with pytest.raises(DomainError, match="beyond the range of numbers"):
        tau_rc.function(1e200, 1e200)
    assert codes(tau_rc.function([1.0, 1e200], 1e200)) == [0, 503]
    assert "beyond the range of numbers" in tau_rc.reason([[1.0, 1e200], 1e200])


def test_reason_finds_the_first_error_in_reading_order() -> None:
    reason = CATALOGUE["FO_STEP"].reason([[[1.0], [2.0]], [[1.0, -2.0]], 0, 5])
    assert reason == "FO_STEP: tau is -2; allowed: number > 0; enter the time constant (s)"
    assert CATALOGUE["FO_STEP"].reason([1, 1, 0, 5]) == ""
    assert "takes 5 arguments, but got 6" in CATALOGUE["FO_STEP"].reason([1] * 6)


def test_reason_explains_reason() -> None:
    ask = CATALOGUE["FO_REASON"].reason
    assert "cell_function is blank" in ask([None])
    assert "which is no cell function" in ask(["FO_NOTHING"])
    assert ask(["FO_STEP", 1, 0, 0, 5]) == ""
    assert "cell_function is" in ask([0.5, None])


def test_keywords_mean_the_same_as_positions() -> None:
    assert step(1, final=5, tau=2, initial=0) == step(1, 2, 0, 5)
    with pytest.raises(TypeError, match="unexpected argument 'tua'"):
        step(1, tua=2)


def test_a_scalar_given_with_an_array_equals_the_scalar_alone() -> None:
    t = np.linspace(0, 700, 5001)
    alone = np.array([step(float(one), 1.0, -3.0, 5.0, 0.25) for one in t])
    together = step(t, 1.0, -3.0, 5.0, 0.25)
    assert np.all(np.abs(alone - together) <= 4 * np.spacing(5.0))


OPTIONAL = Parameter("low", Number(low=0, high=1), 0.1, "the lower level; number >= 0 and <= 1")


def test_a_zero_that_cannot_be_told_from_a_blank_is_refused() -> None:
    with pytest.raises(DomainError, match=r"low is 0, which here cannot be told .* for 0\.1"):
        OPTIONAL.spec.element(0, OPTIONAL)
    assert OPTIONAL.spec.element(None, OPTIONAL) == 0.1
    assert codes(np.where(OPTIONAL.spec.convert([0.0, 0.5], OPTIONAL).codes, math.nan, 0)) == [
        503,
        0,
    ]
    a_time = Parameter("t_to", Number(zero_is_a_value=True), math.inf, "end; any number")
    assert a_time.spec.element(0, a_time) == 0


def test_a_word_is_one_cell_in_any_case_and_zero_is_its_default() -> None:
    kind = Parameter("kind", Word(("max", "min")), "max", "which extreme")
    for raw, chosen in [
        (None, "max"),
        ("", "max"),
        (0, "max"),
        ("MIN ", "min"),
        ([["min"]], "min"),
    ]:
        assert kind.spec.element(raw, kind) == chosen
    for raw in ["mean", 1, True, ["max", "min"]]:
        with pytest.raises(InputError, match="kind"):
            kind.spec.element(raw, kind)
    with pytest.raises(PassedOn, match="kind holds the error #N/A"):
        kind.spec.element(ErrorKind.NA, kind)


def test_a_flag_takes_truth_values_and_numbers_only() -> None:
    held = Parameter("held", Flag(), False, "TRUE to hold each level")
    results = [held.spec.element(raw, held) for raw in (None, True, 0, 2.5, [[True]])]
    assert results == [False, True, False, True, True]
    with pytest.raises(InputError, match="held"):
        held.spec.element("yes", held)
    with pytest.raises(DomainError, match="held"):
        held.spec.element(math.nan, held)


def test_no_two_functions_share_a_python_name() -> None:
    names = [entry.python_name for entry in CATALOGUE.values()]
    assert len(names) == len(set(names))
    for name, entry in CATALOGUE.items():
        expected = {"FO_IN": "in_unit"}.get(name, name.removeprefix("FO_").lower())
        assert entry.python_name == expected


def test_a_defect_of_ours_is_an_error_in_the_cell(monkeypatch: pytest.MonkeyPatch) -> None:
    entry = CATALOGUE["FO_STEP"]
    broken = entry.__class__(**{**vars(entry), "function": lambda *_: 1 / 0})
    monkeypatch.setitem(CATALOGUE, "FO_STEP", broken)
    assert cells.plain_grid(cells.call("FO_STEP", [1])) is ErrorKind.VALUE
