"""Combinations of part values within their tolerances."""

from __future__ import annotations

from typing import Annotated, Any, TypeAlias

import numpy as np

from tausheet.functions.arguments import Column, Number, Numbers, shown, words
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import DomainError, InputError
from tausheet.functions.exact import Array

MOST_PARTS = 12
"""Parts in a corner table: 2^12 rows; a row more for each part would double it again."""

MOST_NUMBERS = 10_000_000
"""Numbers in one draw, so that a slip in `count` does not exhaust the memory."""

Parts: TypeAlias = Annotated[Any, Column()]
Count: TypeAlias = Annotated[Any, Number(low=1, high=1_000_000, whole=True, one_cell=True)]
Seed: TypeAlias = Annotated[Any, Number(low=1, high=1e15, whole=True, one_cell=True)]


def _check(lowest: Array, highest: Array) -> None:
    if lowest.size != highest.size:
        raise InputError(
            f"lowest has {lowest.size} values and highest has {highest.size}; "
            "enter one of each for every part"
        )
    for part in np.flatnonzero(lowest > highest)[:1]:
        raise DomainError(
            f"lowest is {shown(lowest[part])} and highest is {shown(highest[part])} for part "
            f"{part + 1}; enter a lowest that is not above the highest"
        )


@cell_function("FO_CORNERS", "Tolerances", matrix=True)
def corners(lowest: Parts, highest: Parts) -> Numbers:
    """Every combination of the extremes of the parts: k parts give 2^k rows of k columns.

    In row i (from 0) part j (from 0) is at its highest when bit j of i is set. Feed the columns
    to any other function as ranges. Corners bound a result that is monotonic in each part; an
    extreme inside the range (ripple at duty 0.5, a closing angle) must be sought by itself.

    Arguments:
        lowest: lowest value of each part, at most 12; a range, each any number
        highest: highest value of each part, as many; a range, each any number

    Result: matrix of 2^k rows and k columns, each column in the unit of its part.

    Errors: #VALUE! when lowest and highest differ in number, for more than 12 parts, for a blank
    or a text; #NUM! when a lowest is above its highest.

    Assumes: parts that vary independently of each other.

    Example:
        >>> corners([9.0, 4.0], [11.0, 5.0]).tolist()
        [[9.0, 4.0], [11.0, 4.0], [9.0, 5.0], [11.0, 5.0]]

    References: common practice (extreme value analysis).
    """
    _check(lowest, highest)
    if lowest.size > MOST_PARTS:
        raise InputError(
            f"lowest has {lowest.size} parts, but at most {MOST_PARTS} are combined; "
            "keep the parts that matter most, and set the others to their worst"
        )
    rows = np.arange(2**lowest.size)[:, np.newaxis]
    at_highest = rows >> np.arange(lowest.size) & 1
    return np.where(at_highest == 1, highest, lowest)


@cell_function("FO_DRAW", "Tolerances", matrix=True)
def draw(
    lowest: Parts,
    highest: Parts,
    count: Count,
    distribution: Annotated[str, words("uniform", "normal", "triangular")] = "uniform",
    seed: Seed = 1.0,
) -> Numbers:
    """Random values of the parts within their limits: `count` rows of k columns, from a seed.

    A draw is an estimate of how a result spreads, never a bound on it. Every column is a Latin
    hypercube: each of `count` equally probable slices of its distribution is drawn from once.

        p = (rank of the row + part of a slice) / count;   value = inverse distribution at p

    Arguments:
        lowest: lowest value of each part; a range, each any number
        highest: highest value of each part, as many; a range, each any number
        count: rows wanted; whole number >= 1 and <= 1e+06
        distribution: how the values are spread, uniform when left out; "uniform", "normal",
            "triangular"
        seed: start of the random numbers, 1 when left out; whole number >= 1 and <= 1e+15

    Result: matrix of `count` rows and k columns, each column in the unit of its part.

    Errors: #VALUE! when lowest and highest differ in number, for a blank, a text or an unknown
    word; #NUM! when a lowest is above its highest, outside the ranges, or for more than ten
    million numbers.

    Assumes: parts that vary independently of each other.

    Algorithm, with integers modulo 2^128 and n = count:

    1. Generator (PCG64, "XSL RR 128/64"). Constants M = 47026247687942121848144207491837523525
       and D = 117397592171526113268558934119004209487 (odd). The state starts at
       (D + seed) M + D. To get a number: state = state M + D; x = (upper 64 bits of state) xor
       (lower 64 bits of state); the number is x rotated right by (state >> 122) bits, 64 bits
       long.
    2. For each part, in order, get n numbers (the keys), then n more (the fractions).
    3. rank[i] is the count of keys below key i, plus that of equal keys in earlier rows.
       u[i] = (fraction i >> 11) / 2^53;   p[i] = (rank[i] + u[i]) / n.
    4. "uniform": x = p. "triangular": x = sqrt(p/2) for p < 1/2, else 1 - sqrt((1 - p)/2).
       Value = lowest + (highest - lowest) x.
       "normal": z = inverse of the normal distribution F at F(-3) + p (F(3) - F(-3));
       value = (lowest/2 + highest/2) + (highest/2 - lowest/2) z/3.
       A value that rounding puts outside its limits is set to the limit.

    Example:
        >>> draw([9.0], [11.0], 4).round(3).ravel().tolist()
        [10.652, 9.894, 9.115, 10.059]

    References: M. E. O'Neill, "PCG: a family of simple fast space-efficient statistically good
    algorithms for random number generation" (2014); M. D. McKay, R. J. Beckman, W. J. Conover,
    Technometrics 21 (1979) 239, for the hypercube.
    """
    _check(lowest, highest)
    n = int(count)
    if n * lowest.size > MOST_NUMBERS:
        raise DomainError(
            f"count is {n} for {lowest.size} parts, more than {MOST_NUMBERS} numbers; "
            "enter a smaller count"
        )
    raw = _generator(int(seed)).random_raw(2 * n * lowest.size).reshape(lowest.size, 2, n)
    values = np.empty((n, lowest.size))
    for part in range(lowest.size):
        low, high = lowest[part], highest[part]
        rank = np.empty(n)
        rank[np.argsort(raw[part, 0], kind="stable")] = np.arange(n)
        p = (rank + (raw[part, 1] >> np.uint64(11)) * 2.0**-53) / n
        values[:, part] = np.clip(_spread(p, low, high, distribution), low, high)
    return values


_INCREMENT = 117397592171526113268558934119004209487
_MULTIPLIER = 47026247687942121848144207491837523525


def _generator(seed: int) -> np.random.PCG64:
    """PCG64 started as the docstring of `draw` says, not by numpy's own seeding."""
    generator = np.random.PCG64(0)
    state = generator.state
    start = ((_INCREMENT + seed) * _MULTIPLIER + _INCREMENT) % 2**128
    state["state"] = {"state": start, "inc": _INCREMENT}
    generator.state = state
    return generator


def _spread(p: Array, low: float, high: float, distribution: str) -> Array:
    if distribution == "normal":
        from scipy.special import ndtr, ndtri

        below = ndtr(-3.0)
        z = ndtri(below + p * (ndtr(3.0) - below))
        result: Array = (low / 2 + high / 2) + (high / 2 - low / 2) * z / 3
        return result
    if distribution == "triangular":
        p = np.where(p < 0.5, np.sqrt(p / 2), 1 - np.sqrt((1 - p) / 2))
    return low + (high - low) * p
