"""Corners and draws: the algorithm once more from its docstring, and the refusals."""

from __future__ import annotations

import math
from itertools import product
from statistics import NormalDist
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tausheet.addin import cells
from tausheet.functions import corners, draw
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import DomainError, ErrorKind, InputError, PassedOn, error_kind


@pytest.mark.parametrize("parts", range(1, 13))
def test_corners_are_every_combination_once(parts: int) -> None:
    low = np.arange(1.0, parts + 1)
    table = corners(low, low + 0.5)
    assert table.shape == (2**parts, parts)
    expected = {tuple(c) for c in product(*([a, a + 0.5] for a in low.tolist()))}
    assert set(map(tuple, table.tolist())) == expected
    for row in range(2**parts):
        assert [value > a for value, a in zip(table[row], low, strict=True)] == [
            bool(row & 1 << part) for part in range(parts)
        ]


def test_corners_of_a_row_a_column_and_a_single_cell() -> None:
    row = corners([[1.0, 2.0]], [[3.0, 4.0]])
    assert row.tolist() == corners([[1.0], [2.0]], [[3.0], [4.0]]).tolist()
    assert corners(5.0, 6.0).tolist() == [[5.0], [6.0]]
    assert cells.plain_grid(cells.call("FO_CORNERS", [5.0, 5.0])) == [[5.0], [5.0]]


class WrittenDown:
    """PCG64 as the docstring of `draw` has it, in whole numbers."""

    M = 47026247687942121848144207491837523525
    D = 117397592171526113268558934119004209487

    def __init__(self, seed: int) -> None:
        self.state = ((self.D + seed) * self.M + self.D) % 2**128

    def number(self) -> int:
        self.state = (self.state * self.M + self.D) % 2**128
        x = (self.state >> 64) ^ (self.state % 2**64)
        turn = self.state >> 122
        return (x >> turn | x << (64 - turn)) % 2**64


def written_down(low: list[float], high: list[float], n: int, how: str, seed: int) -> list[Any]:
    numbers = WrittenDown(seed)
    normal = NormalDist()
    columns = []
    for a, b in zip(low, high, strict=True):
        keys = [numbers.number() for _ in range(n)]
        fractions = [numbers.number() for _ in range(n)]
        column = []
        for i in range(n):
            rank = sum(k < keys[i] for k in keys) + sum(k == keys[i] for k in keys[:i])
            p = (rank + (fractions[i] >> 11) / 2**53) / n
            if how == "normal":
                below = normal.cdf(-3)
                z = normal.inv_cdf(below + p * (normal.cdf(3) - below))
                value = (a / 2 + b / 2) + (b / 2 - a / 2) * z / 3
            else:
                x = p
                if how == "triangular":
                    x = math.sqrt(p / 2) if p < 0.5 else 1 - math.sqrt((1 - p) / 2)
                value = a + (b - a) * x
            column.append(min(max(value, a), b))
        columns.append(column)
    return [list(row) for row in zip(*columns, strict=True)]


@pytest.mark.parametrize("seed", [1, 2, 987654321, 10**15])
@pytest.mark.parametrize("count", [1, 2, 7, 100])
@pytest.mark.parametrize("how", ["uniform", "normal", "triangular"])
def test_the_docstring_is_enough_to_draw_the_same(seed: int, count: int, how: str) -> None:
    low, high = [9.0, -4.0, 0.0], [11.0, -3.0, 1e-9]
    ours = draw(low, high, count, how, seed)
    theirs = np.array(written_down(low, high, count, how, seed))
    if how == "normal":  # another inverse of the normal distribution, good to fewer digits
        assert np.all(np.abs(ours - theirs) <= [2e-12, 1e-12, 1e-21])
    else:
        assert ours.tolist() == theirs.tolist()


def test_a_draw_is_the_same_again_and_seeds_differ() -> None:
    first = draw([1.0, 2.0], [3.0, 4.0], 50)
    assert first.tolist() == draw([1.0, 2.0], [3.0, 4.0], 50, "uniform", 1).tolist()
    assert first.tolist() != draw([1.0, 2.0], [3.0, 4.0], 50, "uniform", 2).tolist()


@given(
    st.integers(1, 200),
    st.integers(1, 10**15),
    st.sampled_from(["uniform", "normal", "triangular"]),
    st.floats(-1e6, 1e6),
    st.floats(0, 1e6),
)
def test_each_slice_is_drawn_from_once(
    n: int, seed: int, how: str, low: float, width: float
) -> None:
    high = low + width
    values = draw([low], [high], n, how, seed)[:, 0]
    assert values.min() >= low
    assert values.max() <= high
    if high - low < 1e-3:
        return
    x = np.sort(values - low) / (high - low)
    if how == "normal":
        below = NormalDist().cdf(-3)
        p = np.array([(NormalDist().cdf(v) - below) / (1 - 2 * below) for v in (x - 0.5) * 6])
    elif how == "triangular":
        p = np.where(x < 0.5, 2 * x**2, 1 - 2 * (1 - x) ** 2)
    else:
        p = x
    assert np.all(np.abs(p * n - np.arange(n) - 0.5) < 0.5 + 1e-6 * n)


def test_parts_are_not_correlated() -> None:
    table = draw([0.0] * 6, [1.0] * 6, 4096, "uniform", 7)
    off_diagonal = np.corrcoef(table.T) - np.eye(6)
    assert np.abs(off_diagonal).max() < 4.5 / math.sqrt(4096)


def test_without_tolerance_a_draw_is_the_value_itself() -> None:
    for how in ("uniform", "normal", "triangular"):
        assert set(draw([0.1, 4.7e-9], [0.1, 4.7e-9], 20, how).ravel().tolist()) == {0.1, 4.7e-9}


@pytest.mark.parametrize("function", [corners, lambda low, high: draw(low, high, 3)])
@pytest.mark.parametrize(
    ("low", "high", "error", "words"),
    [
        ([1, 2], [3], InputError, "lowest has 2 values and highest has 1"),
        ([1, 5], [3, 4], DomainError, "lowest is 5 and highest is 4 for part 2"),
        ([1, None], [3, 4], InputError, "lowest is blank"),
        ([1, "x"], [3, 4], InputError, 'lowest is the text "x"'),
        ([1, 2], [3, math.nan], DomainError, "highest is nan"),
        ([1, 2], [3, math.inf], DomainError, "highest is inf"),
        ([1, ErrorKind.REF], [3, 4], PassedOn, "lowest holds the error #REF!"),
        (None, [3], InputError, "lowest is blank"),
        ([1], "", InputError, "highest is blank"),
    ],
)
def test_wrong_limits(function: Any, low: Any, high: Any, error: Any, words: str) -> None:
    with pytest.raises(error, match=words):
        function(low, high)


def test_at_most_twelve_parts_in_a_corner_table() -> None:
    with pytest.raises(InputError, match="lowest has 13 parts, but at most 12"):
        corners([1.0] * 13, [2.0] * 13)


@pytest.mark.parametrize(
    ("arguments", "kind", "words"),
    [
        ((0,), ErrorKind.NUM, "count is 0; allowed: whole number >= 1 and <= 1e+06"),
        ((-1,), ErrorKind.NUM, "count is -1"),
        ((2.5,), ErrorKind.NUM, "count is 2.5"),
        ((1e7,), ErrorKind.NUM, "count is 10000000"),
        ((None,), ErrorKind.VALUE, "count is blank"),
        (("x",), ErrorKind.VALUE, 'count is the text "x"'),
        (([3, 3],), ErrorKind.VALUE, "is a range of 2 cells"),
        ((np.array([3.0, 3.0]),), ErrorKind.VALUE, "is a range of 2 cells"),
        ((3, "gauss"), ErrorKind.VALUE, 'distribution is the text "gauss"; allowed: "uniform"'),
        ((3, 7), ErrorKind.VALUE, "distribution is 7"),
        ((3, ["normal", "normal"]), ErrorKind.VALUE, "distribution is a range of 2 cells"),
        ((3, "normal", -1), ErrorKind.NUM, "seed is -1"),
        ((3, "normal", 1.5), ErrorKind.NUM, "seed is 1.5"),
        ((3, "normal", 0), ErrorKind.NUM, "seed is 0"),
        ((3, "normal", "x"), ErrorKind.VALUE, 'seed is the text "x"'),
        ((3, "normal", 2e15), ErrorKind.NUM, "seed is 2"),
        ((3, "normal", ErrorKind.NA), ErrorKind.NA, "seed holds the error #N/A"),
    ],
)
def test_wrong_options(arguments: tuple[Any, ...], kind: ErrorKind, words: str) -> None:
    result = cells.call("FO_DRAW", [[[1.0]], [[2.0]], *arguments])
    assert isinstance(result, float)
    assert error_kind(result) is kind
    assert words in CATALOGUE["FO_DRAW"].reason([[[1.0]], [[2.0]], *arguments])


def test_options_in_any_case_and_left_out() -> None:
    expected = draw([1.0], [2.0], 5).tolist()
    assert draw([1.0], [2.0], 5, "Uniform").tolist() == expected
    assert draw([1.0], [2.0], 5, None, None).tolist() == expected
    assert draw([1.0], [2.0], 5, 0).tolist() == expected  # an empty cell, as LibreOffice passes it


def test_a_draw_too_large_for_the_memory_is_refused() -> None:
    with pytest.raises(DomainError, match="count is 1000000 for 11 parts, more than 10000000"):
        draw([1.0] * 11, [2.0] * 11, 1_000_000)
