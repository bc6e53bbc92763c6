"""Sparse elimination that never takes a rounding error for a number.

The rows of a network's equations are eliminated with 100 decimal digits from the values as they
were typed, so a sum of conductances fifteen decades apart keeps both, and what cancels exactly in
theory leaves a rest 50 decades below its terms, which is then zero. Rank decisions, and with them
the order of a network, are therefore exact.
"""

from __future__ import annotations

import heapq
import math
from collections.abc import Callable, Iterable
from decimal import Context, Decimal, DivisionByZero, InvalidOperation, Overflow, localcontext
from fractions import Fraction
from functools import wraps
from typing import ParamSpec, TypeVar

P = ParamSpec("P")
R = TypeVar("R")

Row = dict[int, Decimal]
"""An equation or an expression: coefficient by column."""

Substitution = tuple[int, Row]
"""A column and the expression that stands for it."""

_CANCELLED = 50
"""A difference that lies so many decades below its terms is zero."""
_CONTEXT = Context(prec=100, traps=[InvalidOperation, DivisionByZero, Overflow])
_LARGEST_DENOMINATOR = 10**6


def exactly(function: Callable[P, R]) -> Callable[P, R]:
    """Run a function with the decimal digits that this module counts on."""

    @wraps(function)
    def inside(*args: P.args, **kwargs: P.kwargs) -> R:
        with localcontext(_CONTEXT):
            return function(*args, **kwargs)

    return inside


def exact(value: float) -> Decimal:
    """The number that was meant by a float.

    Up to 15 digits it is what was typed. A longer one was computed: 1000/3 in a cell is taken for
    exactly 1000/3 when that fraction lies within one unit in the last place, so that values which
    belong together (a ratio that makes a bridge balance) still do.
    """
    typed = Decimal(repr(value))
    if len(typed.as_tuple().digits) <= 15:
        return typed
    scale = Decimal(1).scaleb(typed.adjusted())
    mantissa = Fraction(typed / scale)
    near = mantissa.limit_denominator(_LARGEST_DENOMINATOR)
    if abs(near - mantissa) <= Fraction(math.ulp(float(mantissa))):
        return Decimal(near.numerator) * scale / Decimal(near.denominator)
    return typed


def add(row: Row, factor: Decimal, other: Row) -> Row:
    """row += factor * other, in place; what cancels is removed."""
    for column, coefficient in other.items():
        term = factor * coefficient
        old = row.get(column)
        if old is None:
            if term:
                row[column] = term
            continue
        new = old + term
        if new and new.adjusted() > old.adjusted() - _CANCELLED:
            row[column] = new
        else:
            del row[column]
    return row


def substitute(row: Row, substitutions: Iterable[Substitution]) -> Row:
    """Put expressions in place of columns, in their order, in place."""
    for column, expression in substitutions:
        factor = row.pop(column, None)
        if factor is not None:
            add(row, factor, expression)
    return row


def solved_for(row: Row, column: int) -> Row:
    """The expression that row = 0 gives for one of its columns."""
    pivot = -row[column]
    return {other: value / pivot for other, value in row.items() if other != column}


def eliminate(rows: list[Row], columns: Iterable[int]) -> tuple[list[Substitution], list[Row]]:
    """Eliminate columns from rows (each row = 0) as far as they allow.

    Sparsest column first, and in it the sparsest row: with these digits no pivot is too small.
    Returns the substitutions in their order, and the rows left, free of these columns.
    The rows are used up.
    """
    where: dict[int, set[int]] = {column: set() for column in columns}
    for index, row in enumerate(rows):
        for column in row.keys() & where.keys():
            where[column].add(index)
    queue = [(len(indices), column) for column, indices in where.items() if indices]
    heapq.heapify(queue)
    substitutions: list[Substitution] = []
    used: set[int] = set()
    while queue:
        count, column = heapq.heappop(queue)
        if column not in where or len(where[column]) != count or not count:
            continue  # a newer entry of the queue stands for this column
        indices = where.pop(column)
        chosen = min(indices, key=lambda index: (len(rows[index]), index))
        expression = solved_for(rows[chosen], column)
        used.add(chosen)
        substitutions.append((column, expression))
        touched = expression.keys() & where.keys()
        for other in touched:
            where[other].discard(chosen)
        for index in indices:
            if index == chosen:
                continue
            row = rows[index]
            add(row, row.pop(column), expression)
            for other in touched:
                if other in row:
                    where[other].add(index)
                else:
                    where[other].discard(index)
        for other in touched:
            if where[other]:
                heapq.heappush(queue, (len(where[other]), other))
    return substitutions, [row for index, row in enumerate(rows) if index not in used]


def nonzero_eigenvalues(matrix: dict[int, Row]) -> int:
    """How many eigenvalues of a square matrix are not zero, each as often as it occurs.

    With A = B C, B of full column and C of full row rank, A and C B have the same eigenvalues
    that are not zero; C B is smaller unless A is regular.
    """
    while True:
        rows = [dict(row) for row in matrix.values() if row]
        found, _ = eliminate(rows, sorted({column for row in rows for column in row}))
        if len(found) == len(matrix):
            return len(found)
        if not found:
            return 0
        solved: dict[int, Row] = {}
        for column, expression in reversed(found):
            solved[column] = substitute(expression, solved.items())
        product: dict[int, Row] = {}
        for column, expression in solved.items():
            total = {c: v for c, v in matrix[column].items() if c in solved}
            for other, value in expression.items():
                within = {c: v for c, v in matrix.get(other, {}).items() if c in solved}
                add(total, -value, within)
            product[column] = total
        matrix = product
