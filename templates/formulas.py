"""The formulas of a sheet: what they name, and whether the sheet as a whole is sound.

A sheet module is written by hand; a slip in it must stop the build, not reach a page.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Mapping
from functools import cache

from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token

from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import TausheetError
from tausheet.functions.units import units_of
from tausheet.templates.model import COUNT, UNITLESS, Formed, Input, NumberColumn, Sheet, Tolerance

BUILT_INS = frozenset(
    """
    IF IFERROR AND OR NOT ABS EXP LN LOG10 SQRT SIN COS ATAN PI INT MOD ROUND MIN MAX SUM SUMSQ
    SUMPRODUCT COUNT COUNTA COUNTIF ISNUMBER ISERROR ISTEXT ISBLANK
    ISLOGICAL INDEX MATCH EXACT ROW ROWS NA
    LEN SIGN LARGE SMALL CHOOSE
    """.split()  # noqa: SIM905
)
"""The built-in functions that a sheet may use: those that every engine of ours computes alike."""


ELEMENTWISE = frozenset(
    ("IF", "ISNUMBER", "ABS", "SIGN", "INT", "MOD", "ROUND", "LEN", "EXACT", "EXP", "LN", "SQRT")
)
"""Those that every engine computes row by row where they are given a column."""

LONG = 100
"""Rows of a table beyond which it has a formula a column instead of one a cell."""

PAGE_COLUMNS = 7
"""Columns of the page that a table may take."""

_ROW = ("here", "above")


class SheetError(TausheetError):
    """A sheet module that contradicts itself."""


@cache
def _tokens(formula: str) -> tuple[Token, ...]:
    return tuple(Tokenizer("=" + formula).items)


def names_in(formula: str) -> set[str]:
    """The symbols a formula uses."""
    return {
        token.value
        for token in _tokens(formula)
        if token.type == Token.OPERAND and token.subtype == Token.RANGE
    }


def functions_in(formula: str) -> set[str]:
    """The functions a formula calls."""
    return {
        token.value[:-1]
        for token in _tokens(formula)
        if token.type == Token.FUNC and token.subtype == Token.OPEN
    }


def renamed(formula: str, new: Mapping[str, str]) -> str:
    """The formula with some of its symbols replaced, by cells for instance."""
    return "".join(
        new.get(token.value, token.value)
        if token.type == Token.OPERAND and token.subtype == Token.RANGE
        else token.value
        for token in _tokens(formula)
    )


def outer_call(formula: str) -> tuple[str, list[str]] | None:
    """The function of ours that a formula is one call of, with its arguments; else None."""
    tokens = _tokens(formula)
    if not tokens or tokens[0].type != Token.FUNC or tokens[0].value[:-1] not in CATALOGUE:
        return None
    depth, arguments = 0, [""]
    for place, token in enumerate(tokens):
        depth += {Token.OPEN: 1, Token.CLOSE: -1}.get(token.subtype, 0)
        if depth == 0:
            return (tokens[0].value[:-1], arguments) if place == len(tokens) - 1 else None
        if token.type == Token.SEP and depth == 1:
            arguments.append("")
        elif place:
            arguments[-1] += token.value
    return None


def dependencies(sheet: Sheet) -> dict[str, set[str]]:
    """For every name of a sheet, the names its cell depends on directly."""
    graph: dict[str, set[str]] = {}
    for entry in sheet.entries():
        own = {entry.symbol, f"{entry.symbol}_lo", f"{entry.symbol}_hi"}
        texts = [entry.needed] if entry.needed else []
        if isinstance(entry, Input):
            texts += [rule.holds for rule in entry.rules]
        used = set().union(*(names_in(text) for text in texts)) - own
        toleranced = isinstance(entry, Input) and entry.tolerance is not Tolerance.NONE
        for name in own if toleranced else {entry.symbol}:
            graph[name] = used
    for quantity in sheet.quantities():
        graph[quantity.symbol] = names_in(quantity.formula)
        if quantity.second:
            graph[f"{quantity.symbol}_hand"] = names_in(quantity.second)
    for worst in sheet.worst_cases:
        used = names_in(worst.formula)
        for part in worst.parts:
            used |= {f"{part.symbol}_lo", f"{part.symbol}_hi"}
            used |= names_in(part.inside) if part.inside else set()
        graph[f"{worst.of}_min"] = graph[f"{worst.of}_max"] = used
    for table in sheet.tables:
        for column in table.columns:
            graph[f"{table.name}_{column.name}"] = set()
    for filled in sheet.filled_in:
        columns = {f"{filled.symbol}_{column.name}" for column in filled.columns}
        used = set().union(*(names_in(rule.holds) for rule in filled.rules))
        own = {re.sub(rf"^{filled.symbol}_", f"{kind}_", name) for name in columns for kind in _ROW}
        for name in (*columns, f"{filled.symbol}_count"):
            graph[name] = used - own - {"here_row"}
        graph[filled.symbol] = columns
    for formed in sheet.formed:
        cells = cells_of(formed)
        for heading in formed.columns:
            used = set().union(*(names_in(text) for _, at, text in cells if at == heading))
            graph[f"{formed.name}_{heading}"] = {
                re.sub(r"^(here|above)_", f"{formed.name}_", name) for name in used
            }
        graph[formed.name] = {f"{formed.name}_{column}" for column in formed.columns}
    return graph


def tables_of(sheet: Sheet) -> set[str]:
    """The names of every table that formulas or the engineer fill, and of their columns."""
    names = {f"{formed.name}_{column}" for formed in sheet.formed for column in formed.columns}
    names |= {f"{table.symbol}_{c.name}" for table in sheet.filled_in for c in table.columns}
    return names | {f.name for f in sheet.formed} | {table.symbol for table in sheet.filled_in}


def cells_of(formed: Formed) -> list[tuple[int, str, str]]:
    """Every cell of a formed table that is not blank: row from 0, column, formula."""
    return [
        (row, column, text)
        for row, line in enumerate(formed.rows)
        for column, text in zip(formed.columns, line, strict=True)
        if text
    ]


def reachable(start: Iterable[str], graph: Mapping[str, set[str]]) -> set[str]:
    """Everything that the names in `start` depend on, they included."""
    found: set[str] = set()
    todo = list(start)
    while todo:
        name = todo.pop()
        if name not in found:
            found.add(name)
            todo += graph.get(name, ())
    return found


def computed_by_ours(sheet: Sheet) -> set[str]:
    """The names whose own formula calls a function of ours."""
    names = {q.symbol for q in sheet.quantities() if _ours(q.formula)}
    names |= {f"{q.symbol}_hand" for q in sheet.quantities() if q.second and _ours(q.second)}
    for worst in sheet.worst_cases:
        if _ours(worst.formula):
            names |= {f"{worst.of}_min", f"{worst.of}_max"}
    for formed in sheet.formed:
        names |= {f"{formed.name}_{at}" for _, at, text in cells_of(formed) if _ours(text)}
    return names


def _ours(formula: str) -> bool:
    return any(name.startswith("FO_") for name in functions_in(formula))


def check(sheet: Sheet) -> None:
    """Refuse a sheet with an unknown symbol or function, a cycle, a bad name, an unfair second way.

    The message names the sheet and the place.
    """
    graph = dependencies(sheet)
    _check_names(sheet, graph)
    for where, formula, extra in _formulas(sheet):
        for name in names_in(formula) - graph.keys() - extra:
            raise SheetError(f"{sheet.name}: {where} uses {name}, which is not defined")
        for function in functions_in(formula) - BUILT_INS - CATALOGUE.keys():
            raise SheetError(f"{sheet.name}: {where} calls {function}, which is not allowed")
    # rows of a formed table build on the row above, so its columns may depend on each other
    columns = {f"{formed.name}_{column}" for formed in sheet.formed for column in formed.columns}
    for name in graph.keys() - columns:
        if name in reachable(graph[name], graph):
            raise SheetError(f"{sheet.name}: {name} depends on itself")
    ours = computed_by_ours(sheet)
    for quantity in sheet.quantities():
        second = f"{quantity.symbol}_hand"
        if quantity.second and (tainted := reachable([second], graph) & ours):
            raise SheetError(
                f"{sheet.name}: the second way of {quantity.symbol} depends on a function of ours "
                f"({', '.join(sorted(tainted))}); it must do without"
            )
    _check_worst_cases(sheet, graph)
    _check_filled_in(sheet)


def _check_names(sheet: Sheet, graph: Mapping[str, set[str]]) -> None:
    symbols = [e.symbol for e in sheet.entries()] + [q.symbol for q in sheet.quantities()]
    for symbol, times in Counter(symbol.lower() for symbol in symbols).items():
        if times > 1:
            raise SheetError(f"{sheet.name}: {symbol} is used {times} times (case does not count)")
    for name in graph:
        if not fit_for_a_name(name):
            raise SheetError(f"{sheet.name}: {name} reads as a cell, so it cannot be a name")
    if len({name.lower() for name in graph}) < len(graph):
        raise SheetError(f"{sheet.name}: two names differ only by case")
    columns = [column for table in sheet.filled_in for column in table.columns]
    for item in (*sheet.entries(), *sheet.quantities(), *columns):
        quantity = getattr(item, "quantity", COUNT)
        if quantity in UNITLESS:
            continue
        if not set(getattr(item, "units", ())) <= units_of(quantity).keys():
            named = getattr(item, "symbol", getattr(item, "name", ""))
            raise SheetError(f"{sheet.name}: {named} offers a unit that does not fit")


def fit_for_a_name(name: str) -> bool:
    """Whether a spreadsheet takes a text for a name, not for a cell, a row or a column."""
    legal = re.fullmatch(r"[A-Za-z_][A-Za-z0-9_]*", name)
    as_cell = re.fullmatch(r"[A-Za-z]{1,3}[0-9]+|[Rr][0-9]*([Cc][0-9]*)?|[Cc][0-9]*", name)
    return bool(legal) and not as_cell and name.upper() not in ("TRUE", "FALSE")


def _check_filled_in(sheet: Sheet) -> None:
    for table in sheet.filled_in:
        where = f"{sheet.name}: the table {table.symbol}"
        names = [column.name for column in table.columns]
        if {"source", "count"} & set(names) or len(set(names)) < len(names):
            raise SheetError(f"{where} has a column name twice, or one of its own (source, count)")
        if any(len(row) != len(names) for row in table.demo) or len(table.demo) > table.rows:
            raise SheetError(f"{where} has a demo that does not fit into it")
        if not table.worksheet and sum(column.span for column in table.columns) > PAGE_COLUMNS:
            raise SheetError(f"{where} is wider than the page; give it a worksheet")
        for column in table.columns:
            options = getattr(column, "options", ())
            if len(",".join(options)) > 255 or any("," in option for option in options):
                raise SheetError(f"{where} offers words that no drop-down list can hold")
        if table.rows > LONG and not all(
            isinstance(column, NumberColumn) and column.needed and column.quantity != COUNT
            for column in table.columns
        ):
            raise SheetError(f"{where} is long, so that it can hold columns of quantities alone")
        for rule in table.rules if table.rows > LONG else ():
            if wrong := functions_in(rule.holds) - ELEMENTWISE:
                raise SheetError(
                    f"{where} is long, so that its rules are computed for all rows at once, which "
                    f"{', '.join(sorted(wrong))} cannot; use {', '.join(sorted(ELEMENTWISE))}"
                )


def _formulas(sheet: Sheet) -> Iterable[tuple[str, str, set[str]]]:
    """Every formula of a sheet: where it is, its text, and further names it may use."""
    for entry in sheet.entries():
        if entry.needed:
            yield f"input {entry.symbol}", entry.needed, set()
        for rule in entry.rules if isinstance(entry, Input) else ():
            yield f"a rule of {entry.symbol}", rule.holds, set()
    for quantity in sheet.quantities():
        yield quantity.symbol, quantity.formula, set()
        if quantity.second:
            yield f"the second way of {quantity.symbol}", quantity.second, set()
    for worst in sheet.worst_cases:
        yield f"the worst case of {worst.of}", worst.formula, set()
        for part in worst.parts:
            if part.inside:
                yield f"the worst case of {worst.of}", part.inside, set()
    for filled in sheet.filled_in:
        places = {f"{kind}_{column.name}" for column in filled.columns for kind in _ROW}
        for rule in filled.rules:
            yield f"a rule of {filled.symbol}", rule.holds, places | {"here_row"}
    for formed in sheet.formed:
        places = {f"here_{column}" for column in formed.columns}
        for row, column, text in cells_of(formed):
            above = {f"above_{column}" for column in formed.columns} if row else set()
            yield f"row {row + 1} of {formed.name}, {column},", text, places | above
    for listing in sheet.listings:
        yield f"the table {listing.name}", listing.shown, {"here_row"}
        for shown in listing.columns:
            yield f"the table {listing.name}", shown.formula, {"here_row"}
            yield f"the table {listing.name}", shown.unit or '""', {"here_row"}
    for one in sheet.checks:
        yield f"check {one.key}", one.value, set()
        yield f"check {one.key}", one.limit, set()
    for hazard in sheet.hazards:
        yield f"warning {hazard.name}", hazard.when, set()
        for symbol in symbols_in_braces(hazard.sentence):
            yield f"warning {hazard.name}", symbol, set()
    curve = sheet.curve
    yield "the curve", curve.end, set()
    for trace in curve.traces:
        yield "the curve", trace.formula, {"t"}
    for text in (*(level.value for level in curve.levels), *(m.time for m in curve.moments)):
        yield "the curve", text, set()
    for mark in curve.marks:
        yield "the curve", mark.time, set()
        yield "the curve", mark.value, set()


def symbols_in_braces(sentence: str) -> list[str]:
    """The symbols that a warning's sentence shows the values of."""
    return re.findall(r"{(\w+)}", sentence)


def _check_worst_cases(sheet: Sheet, graph: Mapping[str, set[str]]) -> None:
    quantities = {q.symbol for q in sheet.quantities()}
    toleranced = {
        e.symbol
        for e in sheet.entries()
        if isinstance(e, Input) and e.tolerance is not Tolerance.NONE
    }
    for worst in sheet.worst_cases:
        if worst.of not in quantities:
            raise SheetError(f"{sheet.name}: the worst case of {worst.of}, which is no quantity")
        for part in worst.parts:
            if part.symbol not in toleranced:
                raise SheetError(f"{sheet.name}: {part.symbol} varies but has no tolerance")
            if part.symbol not in names_in(worst.formula):
                raise SheetError(
                    f"{sheet.name}: {part.symbol} varies, but the worst case of {worst.of} "
                    "does not use it"
                )
        varied = {part.symbol for part in worst.parts}
        for name in names_in(worst.formula) - varied:
            if hidden := reachable([name], graph) & varied:
                raise SheetError(
                    f"{sheet.name}: the worst case of {worst.of} uses {name}, which depends on the "
                    f"varied {', '.join(sorted(hidden))}; write it out in inputs"
                )
