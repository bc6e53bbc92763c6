"""FO_VERSION and FO_REASON."""

from __future__ import annotations

import math
import re
from pathlib import Path

import pytest

from tausheet.addin import cells
from tausheet.functions import reason, version
from tausheet.functions.errors import ErrorKind, InputError, PassedOn, error_kind

PROJECT = Path(__file__).parent.parent / "pyproject.toml"


def test_the_version_is_that_of_the_project() -> None:
    stated = re.search(r'^version = "(.+)"$', PROJECT.read_text(), re.MULTILINE)
    assert stated is not None
    assert version() == stated[1]
    assert cells.call("FO_VERSION", []) == stated[1]


def test_the_version_takes_no_argument() -> None:
    result = cells.call("FO_VERSION", [1.0])
    assert isinstance(result, float)
    assert error_kind(result) is ErrorKind.VALUE


@pytest.mark.parametrize("name", ["FO_STEP", "fo_step", " Fo_Step "])
def test_a_good_call_has_no_reason(name: str) -> None:
    assert reason(name, 1.0, 2.0, 0.0, 5.0) == ""
    assert cells.call("FO_REASON", [name, 1.0, 2.0, 0.0, 5.0]) == ""


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        ((1.0, 0.0, 0.0, 5.0), "FO_STEP: tau is 0; allowed: number > 0; enter the time constant"),
        ((1.0, None, 0.0, 5.0), "FO_STEP: tau is blank; allowed: number > 0"),
        ((1.0, "uF", 0.0, 5.0), 'FO_STEP: tau is the text "uF"'),
        ((1.0, math.nan, 0.0, 5.0), "FO_STEP: tau is nan"),
        ((1.0,), "FO_STEP: tau is blank"),
        ((1.0, [[1.0], [-2.0], [-3.0]], 0.0, 5.0), "FO_STEP: tau is -2"),
        (([[1.0, 2.0]], [[1.0, 2.0, 3.0]], 0.0, 5.0), "do not fit together (t 1 x 2, tau 1 x 3)"),
    ],
)
def test_the_reason_names_argument_value_and_remedy(
    arguments: tuple[object, ...], sentence: str
) -> None:
    assert sentence in reason("FO_STEP", *arguments)


def test_the_remedy_is_a_sentence_whatever_the_help_begins_with() -> None:
    said = reason("FO_CROSSING", 2.5, 1.0, 0.0, [["step", 5.0]], "up")
    assert said.endswith('allowed: "either", "rising", "falling"; enter which passages count')
    assert reason("FO_SI", 4.7, None).endswith("enter its unit, for example uF")


def test_several_results_beyond_the_range_of_numbers_have_a_reason() -> None:
    """From -1E308 to 1E308 the ripple itself is 2E308, which no cell holds."""
    settled = ("FO_RIPPLE", 1.0, -1e308, 1e308, 1.0, 0.5)
    assert "beyond the range of numbers" in reason(*settled)
    assert "beyond the range of numbers" in reason(*settled, "pp")
    assert reason("FO_RIPPLE", 1.0, -1e307, 1e307, 1.0, 0.5) == ""


def test_too_many_arguments_have_a_reason() -> None:
    assert "takes 5 arguments, but got 6" in reason("FO_STEP", 1, 1, 0, 5, 0, 7)


@pytest.mark.parametrize(
    ("name", "words"),
    [
        (None, "cell_function is blank"),
        ("", "cell_function is blank"),
        ("FO_NOTHING", 'cell_function is the text "FO_NOTHING", which is no cell function'),
        (7.0, 'cell_function is the text "7.0"'),
        (["FO_STEP", "FO_STEP"], "is a range of 2 cells"),
    ],
)
def test_a_name_that_is_no_cell_function(name: object, words: str) -> None:
    with pytest.raises(InputError, match=words):
        reason(name, 1.0)
    result = cells.call("FO_REASON", [name, 1.0])
    assert isinstance(result, float)
    assert error_kind(result) is ErrorKind.VALUE


@pytest.mark.parametrize("kind", list(ErrorKind))
def test_an_error_value_comes_out_unchanged(kind: ErrorKind) -> None:
    for arguments in ([kind, 1.0], ["FO_STEP", 1.0, kind, 0.0, 5.0]):
        result = cells.call("FO_REASON", arguments)
        assert isinstance(result, float)
        assert error_kind(result) is kind
    with pytest.raises(PassedOn, match="holds the error"):
        reason("FO_STEP", kind)
