"""The built-in spreadsheet functions that the calc sheets use, and no others."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from tausheet.addin.embedded.operators import subtracted
from tausheet.addin.embedded.values import (
    Grid,
    NotHere,
    PassedOn,
    Scalar,
    Value,
    cells,
    compared,
    each,
    finite,
    folded,
    in_order,
    number,
    text,
    top_left,
    truth,
)
from tausheet.functions.errors import ErrorKind

VALUE = ErrorKind.VALUE


@dataclass(frozen=True)
class Builtin:
    """A built-in function: what it does, and how many arguments it takes.

    whole: it takes ranges as they are; otherwise it is applied to each element of a range.
    sees_errors: an error in an argument is for it to judge; otherwise it comes out.
    """

    call: Callable[..., Value]
    least: int
    most: int
    whole: bool = False
    sees_errors: bool = False

    def __call__(self, *values: Value) -> Value:
        """The result for evaluated arguments."""
        return self.call(*values) if self.whole else each(self._one, *values)

    def _one(self, *values: Scalar) -> Scalar:
        if not self.sees_errors:
            for value in values:
                if isinstance(value, ErrorKind):
                    return value
        result: Scalar = self.call(*values)
        return result


def _of_numbers(function: Callable[..., float | ErrorKind]) -> Callable[..., Scalar]:
    """A function of numbers as one of cell values; what the mathematics forbids is #VALUE!."""

    def on_values(*values: Scalar) -> Scalar:
        numbers = [number(value) for value in values]
        for value in numbers:
            if isinstance(value, ErrorKind):
                return value
        try:
            result = function(*numbers)
        except ValueError:  # LibreOffice's own error for this is stored as #VALUE! in a file
            return VALUE
        except OverflowError:
            return ErrorKind.NUM
        return result if isinstance(result, ErrorKind) else finite(float(result))

    return on_values


def _round(value: float, places: float = 0.0) -> float:
    """Halves away from zero, on the number as 15 digits show it."""
    count = math.trunc(places)
    if abs(count) > 300:
        raise NotHere("ROUND to more than 300 places")
    if value == 0:
        return value
    shown = abs(value)
    scale = 10.0 ** abs(count)
    scaled = shown * scale if count > 0 else shown / scale
    if not math.isfinite(scaled) or scaled >= 2.0**52:
        return value
    scaled = float(f"{scaled:.15g}")
    rounded = math.floor(scaled + 0.5)
    return math.copysign(rounded / scale if count > 0 else rounded * scale, value)


def _mod(value: float, divisor: float) -> float | ErrorKind:
    if divisor == 0:
        return ErrorKind.DIV0
    return subtracted(value, math.floor(_settled(value / divisor)) * divisor)


def _settled(value: float) -> float:
    """A number to 15 digits, so that 2.9999999999999996 counts as 3; large ones as they are."""
    return float(f"{value:.15g}") if abs(value) < 2.0**41 else value


def _circular(function: Callable[[float], float]) -> Callable[[float], float | ErrorKind]:
    return lambda angle: function(angle) if abs(angle) < 2.0**63 else VALUE


def _numbers(values: tuple[Value, ...]) -> Iterator[float | ErrorKind]:
    """The numbers among arguments: texts and blanks in a range do not count, single ones must."""
    for value in values:
        if type(value) is list:
            for cell in cells(value):
                if isinstance(cell, ErrorKind):
                    yield cell
                elif isinstance(cell, (float, bool)):
                    yield float(cell)
        else:
            yield VALUE if isinstance(value, str) else number(value)


def _over_numbers(function: Callable[[list[float]], float]) -> Callable[..., Scalar]:
    def on_values(*values: Value) -> Scalar:
        found = []
        for value in _numbers(values):
            if isinstance(value, ErrorKind):
                return value
            found.append(value)
        try:
            return finite(function(found))
        except OverflowError:
            return ErrorKind.NUM

    return on_values


def _all_or_any(decide: Callable[[list[bool]], bool]) -> Callable[..., Scalar]:
    def on_values(*values: Value) -> Scalar:
        found = []
        for value in _numbers(values):
            if isinstance(value, ErrorKind):
                return value
            found.append(value != 0)
        return decide(found) if found else VALUE

    return on_values


def _sumproduct(*values: Value) -> Scalar:
    grids: list[Grid] = [value if type(value) is list else [[value]] for value in values]
    height, width = len(grids[0]), len(grids[0][0])
    if any((len(grid), len(grid[0])) != (height, width) for grid in grids):
        return VALUE
    total = []
    for row in range(height):
        for column in range(width):
            product = 1.0
            for grid in grids:
                cell = grid[row][column]
                if isinstance(cell, ErrorKind):
                    return cell
                product *= float(cell) if isinstance(cell, (float, bool)) else 0.0
            total.append(product)
    return finite(math.fsum(total)) if all(map(math.isfinite, total)) else ErrorKind.NUM


def _count(*values: Value) -> float:
    counted = 0
    for value in values:
        if type(value) is list:
            counted += sum(isinstance(cell, (float, bool)) for cell in cells(value))
        else:
            counted += not isinstance(value, ErrorKind) and not isinstance(number(value), ErrorKind)
    return float(counted)


def _counta(*values: Value) -> float:
    return float(sum(cell is not None for value in values for cell in cells(value)))


def _countblank(area: Value) -> float:
    return float(sum(cell is None or cell == "" for cell in cells(area)))


_CRITERION = re.compile(r"(<=|>=|<>|=|<|>)?(.*)", re.DOTALL)


def _countif(area: Value, criterion: Value) -> Scalar:
    criterion = _single(criterion)
    if isinstance(criterion, ErrorKind) or criterion is None:
        raise NotHere("COUNTIF with a blank or an error as its criterion")
    sign, wanted = "=", criterion
    if isinstance(criterion, str):
        found = _CRITERION.fullmatch(criterion)
        assert found is not None
        sign, written = found[1] or "=", found[2]
        if re.search(r"[*?~]", written) or not written or folded(written) in ("true", "false"):
            raise NotHere("COUNTIF with a pattern or nothing as its criterion")
        as_number = number(written)
        if not found[1] and not isinstance(as_number, ErrorKind):
            raise NotHere("COUNTIF with a number written as a text")
        wanted = written if isinstance(as_number, ErrorKind) else as_number
    if isinstance(wanted, str) and sign not in ("=", "<>"):
        raise NotHere("COUNTIF with an order of texts")
    return float(sum(_meets(cell, sign, wanted) for cell in cells(area)))


def _meets(cell: Scalar, sign: str, wanted: Scalar) -> bool:
    same_kind = isinstance(cell, (float, bool)) == isinstance(wanted, (float, bool))
    if isinstance(cell, ErrorKind) or cell is None or not same_kind:
        return sign == "<>"
    order = compared(cell, wanted)
    assert isinstance(order, int)
    return {
        "=": order == 0,
        "<>": order != 0,
        "<": order < 0,
        ">": order > 0,
        "<=": order <= 0,
        ">=": order >= 0,
    }[sign]


def _index(area: Value, row: Value, column: Value = None) -> Scalar:
    grid: Grid = area if type(area) is list else [[area]]
    at = [number(_single(row)), 1.0 if column is None else number(_single(column))]
    for place in at:
        if isinstance(place, ErrorKind):
            return place
    down, across = (math.trunc(place) for place in at)  # type: ignore[arg-type]
    if column is None and len(grid[0]) > 1:
        if len(grid) > 1:
            raise NotHere("INDEX of a whole row or column")
        down, across = 1, down
    if down == 0 or across == 0:
        raise NotHere("INDEX of a whole row or column")
    if not (1 <= down <= len(grid) and 1 <= across <= len(grid[0])):
        return VALUE
    return grid[down - 1][across - 1]


def _single(value: Value) -> Scalar:
    if type(value) is list and (len(value) != 1 or len(value[0]) != 1):
        raise NotHere("a range where a single value belongs")
    first: Scalar = top_left(value)
    return first


def _match(wanted: Value, area: Value, kind: Value = 1.0) -> Scalar:
    wanted, order = _single(wanted), number(_single(kind))
    listed = list(cells(area))
    for value in (wanted, order):
        if isinstance(value, ErrorKind):
            return value
    if order not in (0, 1):
        raise NotHere("MATCH in falling order")
    if wanted is None or (isinstance(wanted, str) and re.search(r"[*?~]", wanted)):
        raise NotHere("MATCH of a blank or of a pattern")
    if type(area) is list and len(area) > 1 and len(area[0]) > 1:
        raise NotHere("MATCH in more than one column")
    if order == 1:
        return _last_not_above(wanted, listed)
    for place, cell in enumerate(listed, start=1):
        if cell is None or isinstance(cell, ErrorKind):
            continue
        if isinstance(cell, str) == isinstance(wanted, str) and compared(cell, wanted) == 0:
            return float(place)
    return ErrorKind.NA


def _last_not_above(wanted: Scalar, listed: list[Scalar]) -> Scalar:
    """MATCH in a rising list, which may end in blanks; in any other its answer is an accident."""
    while listed and listed[-1] is None:
        listed.pop()
    if any(
        cell is None
        or isinstance(cell, ErrorKind)
        or isinstance(cell, str) != isinstance(wanted, str)
        for cell in listed
    ):
        raise NotHere("MATCH in a list with gaps or of mixed kinds")
    if any(in_order(a, b) == 1 for a, b in pairwise(listed)):
        raise NotHere("MATCH in a list that does not rise")
    below = [place for place, cell in enumerate(listed, 1) if in_order(cell, wanted) != 1]
    return float(below[-1]) if below else ErrorKind.NA


def _ranked(largest: bool) -> Callable[..., Scalar]:
    def pick(area: Value, rank: Value) -> Scalar:
        given = _single(rank)
        place = number(given)
        if isinstance(place, ErrorKind):
            return place
        if isinstance(given, str) or place != math.floor(place):
            raise NotHere("LARGE or SMALL of a rank that is no whole number")
        found = []
        for value in _numbers((area,)):
            if isinstance(value, ErrorKind):
                return value
            found.append(value)
        if not 1 <= place <= len(found):
            return VALUE
        return sorted(found, reverse=largest)[int(place) - 1]

    return pick


def _exact(a: Scalar, b: Scalar) -> Scalar:
    if isinstance(a, PassedOn) or isinstance(b, PassedOn):
        raise NotHere("EXACT of a cell that refers to an empty one")
    return text(a) == text(b)


class _ExactInArrays(Builtin):
    """EXACT over a range, where LibreOffice never finds a number in the range to be any text."""

    def __call__(self, *values: Value) -> Value:
        """The result for evaluated arguments."""
        spread = [type(value) is list for value in values]

        def one(*pair: Scalar) -> Scalar:
            same = self._one(*pair)
            numbers = [isinstance(value, (float, bool)) for value in pair]
            if same is True and any(n and s for n, s in zip(numbers, spread, strict=True)):
                raise NotHere("EXACT of a number in a range")
            return same

        return each(one, *values)


def _is_number(value: Scalar) -> Scalar:
    if isinstance(value, PassedOn):
        raise NotHere("ISNUMBER of a cell that refers to an empty one")
    return isinstance(value, (float, bool))


def _not(value: Scalar) -> Scalar:
    decided = truth(value)
    return decided if isinstance(decided, ErrorKind) else not decided


def _len(value: Scalar) -> Scalar:
    return float(len(str(text(value)).encode("utf-16-le")) // 2)


def _largest(found: list[float]) -> float:
    return max(found, default=0.0)


def _least(found: list[float]) -> float:
    return min(found, default=0.0)


_ANY = 255


def _each(call: Callable[..., Any], least: int, most: int | None = None) -> Builtin:
    return Builtin(call, least, least if most is None else most)


def _seen(call: Callable[..., Any]) -> Builtin:
    return Builtin(call, 1, 1, sees_errors=True)


def _whole(call: Callable[..., Any], least: int, most: int) -> Builtin:
    return Builtin(call, least, most, whole=True)


BUILTINS: dict[str, Builtin] = {
    "ABS": _each(_of_numbers(abs), 1),
    "ATAN": _each(_of_numbers(math.atan), 1),
    "COS": _each(_of_numbers(_circular(math.cos)), 1),
    "EXP": _each(_of_numbers(math.exp), 1),
    "INT": _each(_of_numbers(lambda x: float(math.floor(_settled(x)))), 1),
    "LN": _each(_of_numbers(math.log), 1),
    "LOG10": _each(_of_numbers(math.log10), 1),
    "MOD": _each(_of_numbers(_mod), 2),
    "ROUND": _each(_of_numbers(_round), 1, 2),
    "SIGN": _each(_of_numbers(lambda x: float((x > 0) - (x < 0))), 1),
    "SIN": _each(_of_numbers(_circular(math.sin)), 1),
    "SQRT": _each(_of_numbers(math.sqrt), 1),
    "PI": _each(lambda: math.pi, 0),
    "NA": _each(lambda: ErrorKind.NA, 0),
    "TRUE": _each(lambda: True, 0),
    "FALSE": _each(lambda: False, 0),
    "EXACT": _each(_exact, 2),
    "LEN": _each(_len, 1),
    "NOT": _each(_not, 1),
    "ISBLANK": _seen(lambda v: v is None),
    "ISERROR": _seen(lambda v: isinstance(v, ErrorKind)),
    "ISLOGICAL": _seen(lambda v: isinstance(v, bool)),
    "ISNUMBER": _seen(_is_number),
    "ISTEXT": _seen(lambda v: isinstance(v, str)),
    "AND": _whole(_all_or_any(all), 1, _ANY),
    "OR": _whole(_all_or_any(any), 1, _ANY),
    "COUNT": _whole(_count, 1, _ANY),
    "COUNTA": _whole(_counta, 1, _ANY),
    "COUNTBLANK": _whole(_countblank, 1, 1),
    "COUNTIF": _whole(_countif, 2, 2),
    "INDEX": _whole(_index, 2, 3),
    "LARGE": _whole(_ranked(largest=True), 2, 2),
    "SMALL": _whole(_ranked(largest=False), 2, 2),
    "MATCH": _whole(_match, 2, 3),
    "MAX": _whole(_over_numbers(_largest), 1, _ANY),
    "MIN": _whole(_over_numbers(_least), 1, _ANY),
    "ROWS": _whole(lambda area: float(len(area)) if type(area) is list else 1.0, 1, 1),
    "SUM": _whole(_over_numbers(math.fsum), 1, _ANY),
    "SUMSQ": _whole(_over_numbers(lambda xs: math.fsum(x * x for x in xs)), 1, _ANY),
    "SUMPRODUCT": _whole(_sumproduct, 1, _ANY),
}
"""By name; IF, IFERROR, CHOOSE and ROW are in the parser, since they do not need every argument."""

IN_ARRAYS: dict[str, Builtin | None] = {
    **BUILTINS,
    "EXACT": _ExactInArrays(_exact, 2, 2),
    "ISLOGICAL": None,
    "NOT": None,
}
"""By name, inside arrays, where LibreOffice takes some values of cells differently."""

TELL_CELLS_APART = {"AND", "OR", "COUNT", "COUNTA", "MAX", "MIN", "SUM", "SUMSQ", "SUMPRODUCT"}
"""Those to which a text or a blank in a cell is not what it is outside one."""
