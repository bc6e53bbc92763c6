"""Whether two formulas are the same, however a spreadsheet program has spelled them."""

from __future__ import annotations

import functools
import math

from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token, TokenizerError

_PREFIXES = ("org.tausheet.functions.", "_xlfn.")
_TURNED = [{"<", ">"}, {"<=", ">="}, {"<", ">="}, {"<=", ">"}, {"<", "<="}, {">", ">="}]

Pieces = tuple[tuple[str, str], ...]


@functools.lru_cache(maxsize=20_000)
def pieces(formula: str) -> Pieces:
    """The parts of a formula, each with its kind, without what spelling leaves free."""
    try:
        tokens = Tokenizer(formula if formula.startswith("=") else "=" + formula).items
    except (TokenizerError, IndexError):
        return (("unreadable", formula),)
    found = [_piece(token) for token in tokens if token.type != Token.WSPACE]
    for at in range(len(found) - 2, -1, -1):  # TRUE() for TRUE
        if found[at] in _WORDS and found[at + 1] == ("function", ")"):
            found[at : at + 2] = [("reference", found[at][1][:-1])]
    return tuple(found)


def _piece(token: Token) -> tuple[str, str]:
    value = token.value
    if token.type == Token.OPERAND and token.subtype == Token.TEXT:
        return "text", value
    if token.type == Token.OPERAND and token.subtype == Token.NUMBER:
        return "number", repr(float(value))
    lower = value.casefold()
    if token.type == Token.FUNC:
        for prefix in _PREFIXES:
            lower = lower.removeprefix(prefix)
        return "function", lower
    if token.type == Token.OPERAND:
        return "reference", lower.replace("'", "")
    kind = "operator" if token.type in (Token.OP_IN, Token.OP_PRE, Token.OP_POST) else "mark"
    return kind, lower


def same(one: str, other: str) -> bool:
    """Whether two formulas say the same."""
    if one == other:
        return True
    mine, theirs = pieces(one), pieces(other)
    return len(mine) == len(theirs) and all(map(_alike, mine, theirs))


def _alike(one: tuple[str, str], other: tuple[str, str]) -> bool:
    if one[0] == other[0] == "number":  # LibreOffice stores 15 digits of a number
        return math.isclose(float(one[1]), float(other[1]), rel_tol=2e-14)
    return one == other


def difference(found: str, expected: str) -> str:
    """In one class, what was done to a formula."""
    one, other = pieces(found), pieces(expected)
    if len(one) != len(other):
        signs = [tuple(p for p in side if p not in _SIGNS) for side in (one, other)]
        return "changed sign" if signs[0] == signs[1] else "changed formula"
    changed = [(a, b) for a, b in zip(one, other, strict=True) if not _alike(a, b)]
    if all(a[0] == b[0] == "number" for a, b in changed):
        return "changed number"
    if all(a[0] == b[0] == "operator" for a, b in changed):
        values = [{a[1], b[1]} for a, b in changed]
        if all(pair in _TURNED for pair in values):
            return "reversed comparison"
        if all(pair == {"+", "-"} for pair in values):
            return "changed sign"
    return "changed formula"


_WORDS = {("function", "true("), ("function", "false(")}
_SIGNS = {("operator", "-"), ("operator", "+")}
