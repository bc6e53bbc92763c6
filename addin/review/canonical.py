"""Formulas and values in one spelling, whichever program wrote the file.

LibreOffice drops spaces, spells our functions with a long prefix, writes numbers and TRUE in its
own way; none of that changes what a formula says.
"""

from __future__ import annotations

import functools
import re
from typing import Any

from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token, TokenizerError
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.functions.errors import ErrorKind

_PREFIXES = re.compile(r"ORG\.TAUSHEET\.FUNCTIONS\.|_XLFN\.|_XLWS\.", re.IGNORECASE)
_ONE_CELL = re.compile(r"(\$?[A-Za-z]{1,3}\$?[0-9]{1,7}):\1")
_QUOTED_TITLE = re.compile(r"'([A-Za-z_]\w*)'!")


def content(cell: Any) -> str:
    """What a cell holds, typed or formula, as one text; "" for nothing."""
    value = cell.value
    if value is None:
        return ""
    if isinstance(value, ArrayFormula):
        return f"block {reference(value.ref)} {formula(str(value.text))}"
    if cell.data_type == "f":
        return f"formula {formula(str(value))}"
    return f"error {value}" if cell.data_type == "e" else constant(value)


def constant(value: Any) -> str:
    """A value as one text: numbers at 15 digits."""
    if isinstance(value, ErrorKind):
        return f"error {value.text}"
    if isinstance(value, bool):
        return f"logical {value}"
    if isinstance(value, (int, float)):
        return f"number {value + 0.0:.15g}"
    return f"text {value}"


@functools.lru_cache(maxsize=20_000)
def formula(text: str) -> str:
    """A formula without what only its writer chose."""
    try:
        tokens = Tokenizer(text if text[:1] == "=" else f"={text}").items
    except (TokenizerError, IndexError):
        return f"unreadable {text}"
    pieces = [_piece(token) for token in tokens if token.type != Token.WSPACE]
    for at in range(len(pieces) - 2, -1, -1):
        if pieces[at] in ("TRUE(", "FALSE(") and pieces[at + 1] == ")":
            pieces[at : at + 2] = [pieces[at][:-1]]
    return "=" + "".join(pieces)


def reference(text: str) -> str:
    """What a defined name stands for, in one spelling."""
    return _ONE_CELL.sub(r"\1", _QUOTED_TITLE.sub(r"\1!", _PREFIXES.sub("", text)))


def _piece(token: Token) -> str:
    value: str = token.value
    if token.type == Token.FUNC:
        return _PREFIXES.sub("", value).upper()
    if token.type != Token.OPERAND:
        return value.replace(";", ",")
    if token.subtype == Token.NUMBER:
        return f"{float(value):.15g}"
    if token.subtype in (Token.LOGICAL, Token.ERROR):
        return value.upper()
    return reference(value).casefold() if token.subtype == Token.RANGE else value
