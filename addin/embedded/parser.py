"""A formula as something to run: precedence climbing over openpyxl's tokens.

Whether an expression can be a range is known before anything is computed. A range where a
single value belongs would be cut to one cell by one spreadsheet and spread by another: refused.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any, Protocol

from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token, TokenizerError
from openpyxl.utils import range_boundaries

from tausheet.addin import cells
from tausheet.addin.embedded.builtin import BUILTINS, IN_ARRAYS, TELL_CELLS_APART
from tausheet.addin.embedded.operators import BINARY, BINDING, OF_ELEMENTS, negated, percent, plus
from tausheet.addin.embedded.values import Grid, NotHere, Scalar, Value, each, number, truth
from tausheet.addin.embedded.values import cells as cells_of
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind

STORED_PREFIX = "ORG.TAUSHEET.FUNCTIONS."
"""What LibreOffice puts before our functions when it stores an .xlsx."""

_DEEPEST = 200
MOST_CELLS = 2_000_000
"""More than this in a range, or in all ranges of a workbook, is left to LibreOffice."""
MOST_STEPS = 100_000
"""What a formula may stand for: a name of two names of two names doubles with each."""
MOST_STEPS_IN_ALL = 5_000_000

Run = Callable[[], Value]
Area = tuple[str, int, int, int, int]
"""Sheet, first column, first row, last column, last row."""


class Unknown(Exception):
    """Something in a formula that this engine does not compute; the text says what."""


class Cells(Protocol):
    """What a formula needs of its workbook."""

    known: dict[tuple[str, str, bool], tuple[Node, list[Area], int]]
    """What names have been parsed to, by sheet, name and kind of formula."""

    def value(self, sheet: str, row: int, column: int) -> Scalar:
        """Value of a cell, computed before."""

    def read_once(self, area: Area) -> Grid:
        """The values of a large range."""

    def named(self, sheet: str, name: str) -> str | None:
        """What a defined name stands for, None when there is none."""

    def has_sheet(self, sheet: str) -> bool:
        """Whether there is a worksheet of this name."""

    def called(self, name: str, arguments: list[Any], result: Value) -> None:
        """A formula has called a cell function."""


@dataclass
class Node:
    """A part of a formula: how to run it, and whether it is a range."""

    run: Run
    is_range: bool = False
    reference: Area | None = None
    constant: bool = False


class Formula:
    """A parsed formula, with the areas it refers to."""

    def __init__(self, book: Cells, sheet: str, row: int, text: str, array: bool = False) -> None:
        self._book, self._sheet, self._row, self._array = book, sheet, row, array
        self.areas: list[Area] = []
        self._names: list[str] = []
        self.steps = 0
        """How much there is to compute, with each name counted as often as it is used."""
        node = self._parsed(text)
        if node.is_range and not array and node.reference is None:
            raise Unknown("it gives a range where a single value belongs")
        if node.reference and not array and size(node.reference) > 1:
            raise Unknown("it gives a range where a single value belongs")
        self.run = node.run

    def _parsed(self, text: str) -> Node:
        if len(self._names) > _DEEPEST:
            raise Unknown("its names stand for names without end")
        try:
            tokens = [t for t in Tokenizer(text).items if t.type != Token.WSPACE]
        except (TokenizerError, IndexError):
            raise Unknown("it cannot be read") from None
        reader = _Tokens(tokens)
        node = self._expression(reader, 0, self._array)
        if not reader.at_end():
            raise Unknown(f'"{reader.peek().value}" is not expected there')
        return node

    def _expression(self, tokens: _Tokens, binding: int, array: bool) -> Node:
        tokens.deeper()
        left = self._operand(tokens, array)
        while not tokens.at_end():
            token = tokens.peek()
            if token.type == Token.OP_POST:
                tokens.next()
                left = self._applied(percent, array, left)
                continue
            if token.type != Token.OP_IN or BINDING.get(token.value, 0) <= binding:
                if token.type == Token.OP_IN and token.value not in BINDING:
                    raise Unknown(f'the operator "{token.value}" is not known')
                break
            tokens.next()
            right = self._expression(tokens, BINDING[token.value], array)
            known = OF_ELEMENTS if array else BINARY
            left = self._applied(known[token.value], array, left, right)
        tokens.back()
        return left

    def _applied(self, function: Callable[..., Scalar], array: bool, *nodes: Node) -> Node:
        """An operator or a function of single values; over ranges in an array formula only."""
        runs = [self._for_elements(node, array) for node in nodes]
        if not array:
            if len(runs) == 2:
                one, two = runs
                return Node(lambda: function(one(), two()))
            return Node(lambda: function(*(run() for run in runs)))
        return Node(lambda: each(function, *(run() for run in runs)), True)

    def _for_elements(self, node: Node, array: bool) -> Run:
        if array:
            return node.run
        if node.is_range:
            raise Unknown("a range stands where a single value belongs")
        run = node.run
        return run if node.reference or node.constant else lambda: _one(run())

    def _operand(self, tokens: _Tokens, array: bool) -> Node:
        self._count(1)
        token = tokens.next()
        if token.type == Token.OP_PRE:
            inner = self._expression(tokens, BINDING["prefix"], array)
            return self._applied(negated if token.value == "-" else plus, array, inner)
        if token.type == Token.PAREN and token.subtype == Token.OPEN:
            node = self._expression(tokens, 0, array)
            tokens.expect(Token.PAREN, Token.CLOSE)
            return node
        if token.type == Token.ARRAY and token.subtype == Token.OPEN:
            return self._constant_array(tokens)
        if token.type == Token.FUNC and token.subtype == Token.OPEN:
            return self._call(token.value[:-1].upper(), tokens, array)
        if token.type == Token.OPERAND:
            return self._constant(token) if token.subtype != Token.RANGE else self._named(token)
        raise Unknown(f'"{token.value}" is not expected there')

    def _constant(self, token: Token) -> Node:
        value = _literal(token)
        return Node(lambda: value, constant=True)

    def _constant_array(self, tokens: _Tokens) -> Node:
        rows: list[list[Scalar]] = [[]]
        while True:
            token = tokens.next()
            if token.type == Token.ARRAY and token.subtype == Token.CLOSE:
                break
            if token.type == Token.SEP and token.subtype == Token.ROW:
                rows.append([])
            elif token.type == Token.OP_PRE and token.value == "-":
                rows[-1].append(negated(_literal(tokens.next())))
            elif token.type == Token.OPERAND and token.subtype != Token.RANGE:
                rows[-1].append(_literal(token))
            elif token.type not in (Token.SEP, _ARRAY_ROW):
                raise Unknown("an array constant may hold constants only")
        if len({len(row) for row in rows}) != 1 or not rows[0]:
            raise Unknown("the rows of an array constant are not equally long")
        return Node(lambda: rows, True)

    def _named(self, token: Token) -> Node:
        """A reference, or a defined name."""
        text = token.value
        area = self._area(text)
        if area is not None:
            return self._referring(area)
        if "[" in text or "!" in text:
            raise Unknown(f"{text} refers to another workbook, a table or a missing worksheet")
        key = (self._sheet, text.casefold(), self._array)
        if key in self._book.known:
            node, areas, steps = self._book.known[key]
            self._count(steps)
            self.areas += areas
            return node
        first, steps = len(self.areas), self.steps
        content = self._book.named(self._sheet, text)
        if content is None:
            raise Unknown(f"the name {text} is not defined")
        if text.casefold() in self._names:
            raise Unknown(f"the name {text} stands for itself")
        self._names.append(text.casefold())
        if _RELATIVE.search(_QUOTED.sub("", content)):
            raise Unknown(f"the name {text} stands for a relative reference")
        node = self._parsed("=" + content.removeprefix("="))
        self._names.pop()
        if "ROW(" not in content.upper():  # which depends on the cell that uses the name
            self._book.known[key] = (node, self.areas[first:], self.steps - steps)
        return node

    def _count(self, steps: int) -> None:
        self.steps += steps
        if self.steps > MOST_STEPS:
            raise Unknown("its names stand for more than this engine computes")

    def _area(self, text: str) -> Area | None:
        sheet, _, local = text.rpartition("!")
        if not _A1.fullmatch(local):
            return None
        sheet = sheet.strip("'").replace("''", "'") if sheet else self._sheet
        if not self._book.has_sheet(sheet):
            return None
        bounds = [edge for edge in range_boundaries(local) if edge is not None]
        if len(bounds) != 4:
            return None
        left, top, right, bottom = bounds
        area = (sheet, min(left, right), min(top, bottom), max(left, right), max(top, bottom))
        if size(area) > MOST_CELLS:
            raise Unknown(f"{text} is larger than this engine reads")
        return area

    def _referring(self, area: Area) -> Node:
        self.areas.append(area)
        sheet, left, top, right, bottom = area
        value, book = self._book.value, self._book
        if size(area) == 1:
            return Node(lambda: value(sheet, top, left), False, area)
        if size(area) > MANY:
            return Node(lambda: book.read_once(area), True, area)
        rows, columns = range(top, bottom + 1), range(left, right + 1)
        return Node(lambda: [[value(sheet, r, c) for c in columns] for r in rows], True, area)

    def _call(self, name: str, tokens: _Tokens, array: bool) -> Node:
        if name.startswith(STORED_PREFIX):
            name = name.removeprefix(STORED_PREFIX)
        inside = array or name == "SUMPRODUCT"
        arguments = list(self._arguments(tokens, inside))
        if name in CATALOGUE:
            return self._cell_function(name, arguments)
        if name in _LAZY:
            return _LAZY[name](self, arguments, array)
        builtin = (IN_ARRAYS if array else BUILTINS).get(name)
        if builtin is None:
            where = "known outside arrays only" if name in BUILTINS else "not known"
            raise Unknown(f"the function {name} is {where}")
        if not builtin.least <= len(arguments) <= builtin.most:
            raise Unknown(f"{name} does not take {len(arguments)} arguments")
        if any(argument is None for argument in arguments):
            raise Unknown(f"{name} is called with an argument left out")
        given = [argument for argument in arguments if argument is not None]
        if builtin.whole:
            runs = [_as_range(node, name) for node in given]
            return Node(lambda: builtin(*(run() for run in runs)))
        if not array or not given:
            runs = [self._for_elements(node, inside) for node in given]
            return Node(lambda: builtin(*(run() for run in runs)), inside and bool(given))
        runs = [node.run for node in given]
        return Node(lambda: builtin(*(run() for run in runs)), True)

    def _arguments(self, tokens: _Tokens, array: bool) -> Iterator[Node | None]:
        if tokens.peek().type == Token.FUNC and tokens.peek().subtype == Token.CLOSE:
            tokens.next()
            return
        while True:
            token = tokens.peek()
            if token.type == Token.SEP or (
                token.type == Token.FUNC and token.subtype == Token.CLOSE
            ):
                yield None
            else:
                yield self._expression(tokens, 0, array)
            token = tokens.next()
            if token.type == Token.FUNC and token.subtype == Token.CLOSE:
                return
            if token.type != Token.SEP or token.subtype != Token.ARG:
                raise Unknown(f'"{token.value}" is not expected there')

    def _cell_function(self, name: str, arguments: list[Node | None]) -> Node:
        entry = CATALOGUE[name]
        if len(arguments) > len(entry.parameters) and not entry.variadic:
            raise Unknown(f"{name} does not take {len(arguments)} arguments")
        runs = [None if node is None else node.run for node in arguments]

        def run() -> Value:
            given = [None if one is None else one() for one in runs]
            result = cells.plain_grid(cells.call(name, given))
            self._book.called(name, given, result)
            return result

        return Node(run)

    def _if(self, arguments: list[Node | None], array: bool) -> Node:
        if not 2 <= len(arguments) <= 3:
            raise Unknown(f"IF does not take {len(arguments)} arguments")
        if arguments[0] is None:
            raise Unknown("IF is called without a condition")
        blank = Node(lambda: None)
        otherwise = arguments[2] if len(arguments) == 3 else Node(lambda: False)
        nodes = [arguments[0], arguments[1] or blank, otherwise or blank]
        runs = [self._for_elements(node, array) for node in nodes]
        condition, then, els = runs
        if array:
            return Node(lambda: _chosen_of_arrays(condition(), then, els), True)

        def run() -> Value:
            decided = truth(condition())
            if isinstance(decided, ErrorKind):
                return decided
            return then() if decided else els()

        return Node(run)

    def _iferror(self, arguments: list[Node | None], array: bool) -> Node:
        if len(arguments) != 2 or None in arguments:
            raise Unknown("IFERROR takes two arguments")
        runs = [self._for_elements(node, array) for node in arguments if node is not None]
        if array:
            return Node(lambda: _each_or_else(*(run() for run in runs)), True)
        first, second = runs

        def run() -> Value:
            value = first()
            return second() if isinstance(value, ErrorKind) else value

        return Node(run)

    def _choose(self, arguments: list[Node | None], array: bool) -> Node:
        if len(arguments) < 2 or None in arguments or array:
            raise Unknown("CHOOSE is known with all its arguments, outside array formulas, only")
        place, *choices = [self._for_elements(node, array) for node in arguments if node]

        def run() -> Value:
            which = number(place())
            if isinstance(which, ErrorKind):
                return which
            at = math.trunc(which)
            return choices[at - 1]() if 1 <= at <= len(choices) else ErrorKind.VALUE

        return Node(run)

    def _row_of(self, arguments: list[Node | None], array: bool) -> Node:
        if array or len(arguments) > 1:
            raise Unknown("ROW is known with at most one argument, outside array formulas, only")
        row = float(self._row)
        if arguments:
            node = arguments[0]
            if node is None or node.reference is None or size(node.reference) != 1:
                raise Unknown("ROW is known for a single cell only")
            row = float(node.reference[2])
        return Node(lambda: row)


_LAZY = {
    "IF": Formula._if,
    "IFERROR": Formula._iferror,
    "CHOOSE": Formula._choose,
    "ROW": Formula._row_of,
}

MANY = 500
"""Cells of a range from which on it is kept while a workbook is computed."""

_ARRAY_ROW = "ARRAYROW"
_QUOTED = re.compile(r"\"[^\"]*\"|'[^']*'")
_RELATIVE = re.compile(
    r"(?<![$A-Za-z0-9_.])(?:\$?[A-Za-z]{1,3}[0-9]+|[A-Za-z]{1,3}\$[0-9]+)(?![A-Za-z0-9_(.])"
)
_A1 = re.compile(r"\$?[A-Za-z]{1,3}\$?[0-9]{1,7}(:\$?[A-Za-z]{1,3}\$?[0-9]{1,7})?")


class _Tokens:
    """The tokens of a formula, one after the other."""

    def __init__(self, tokens: list[Token]) -> None:
        self._tokens, self._at, self._depth = tokens, 0, 0

    def at_end(self) -> bool:
        return self._at >= len(self._tokens)

    def peek(self) -> Token:
        if self.at_end():
            raise Unknown("it ends too early")
        return self._tokens[self._at]

    def next(self) -> Token:
        token = self.peek()
        self._at += 1
        return token

    def expect(self, kind: str, subtype: str) -> None:
        token = self.next()
        if (token.type, token.subtype) != (kind, subtype):
            raise Unknown(f'"{token.value}" is not expected there')

    def deeper(self) -> None:
        self._depth += 1
        if self._depth > _DEEPEST:
            raise Unknown("it is nested too deeply")

    def back(self) -> None:
        self._depth -= 1


def size(area: Area) -> int:
    """How many cells an area has."""
    return (area[3] - area[1] + 1) * (area[4] - area[2] + 1)


def _one(value: Value) -> Scalar:
    """The only element of a result; a spreadsheet may go on with all of several."""
    if type(value) is list:
        if len(value) != 1 or len(value[0]) != 1:
            raise NotHere("several results where a single value belongs")
        value = value[0][0]
    single: Scalar = value
    return single


def _as_range(node: Node, function: str) -> Run:
    """A reference to one cell is a range to a function that takes ranges."""
    run = node.run
    if node.reference:
        return run if node.is_range else lambda: [[run()]]
    if function not in TELL_CELLS_APART or node.constant:
        return run

    def known() -> Value:
        value = run()
        # LibreOffice looks whether IF, INDEX and their like have handed on a cell
        inside = cells_of(value) if function in ("AND", "OR", "MAX", "MIN") else [value]
        if any(one is None or isinstance(one, str) for one in inside):
            raise NotHere("a text or a blank from a formula as an argument that counts numbers")
        return value

    return known


def _literal(token: Token) -> Scalar:
    if token.subtype == Token.NUMBER:
        value = float(token.value)
        if not math.isfinite(value):
            raise Unknown(f"{token.value} lies beyond the numbers")
        return value
    if token.subtype == Token.TEXT:
        return str(token.value)[1:-1].replace('""', '"')
    if token.subtype == Token.LOGICAL:
        return bool(token.value.upper() == "TRUE")
    if token.subtype == Token.ERROR:
        try:
            return ErrorKind.from_text(token.value)
        except ValueError:
            raise Unknown(f"{token.value} is not a known error") from None
    raise Unknown(f'"{token.value}" is not a constant')


def _chosen(condition: Scalar, then: Scalar, otherwise: Scalar) -> Scalar:
    decided = truth(condition)
    if isinstance(decided, ErrorKind):
        return decided
    return then if decided else otherwise


def _chosen_of_arrays(condition: Value, then: Run, otherwise: Run) -> Value:
    """Element by element; a single condition takes one branch whole, and the other is left."""
    if type(condition) is list:
        return _chosen_elements(condition, then(), otherwise())
    if isinstance(condition, str):
        raise NotHere("IF with a text as a condition in an array")
    decided = truth(condition)
    if isinstance(decided, ErrorKind):
        return decided
    return then() if decided else otherwise()


def _chosen_elements(condition: Value, then: Value, otherwise: Value) -> Value:
    shape = _shape(condition)
    if any(_shape(value) not in ((1, 1), shape) for value in (then, otherwise)):
        raise NotHere("IF over ranges of different sizes")
    if any(isinstance(cell, str) for cell in cells_of(condition)):
        raise NotHere("IF with a text as a condition in an array")
    return each(_chosen, condition, then, otherwise)


def _shape(value: Value) -> tuple[int, int]:
    return (len(value), len(value[0])) if type(value) is list else (1, 1)


def _each_or_else(value: Value, otherwise: Value) -> Value:
    if _shape(otherwise) not in ((1, 1), _shape(value)):
        raise NotHere("IFERROR over ranges of different sizes")
    return each(_or_else, value, otherwise)


def _or_else(value: Scalar, otherwise: Scalar) -> Scalar:
    return otherwise if isinstance(value, ErrorKind) else value
