"""The decorator that makes a function a cell function, and the list of them.

    @cell_function("FO_STEP", "Response")
    def step(t: Finite, tau: Positive, initial: Finite, final: Finite,
             delay: NonNegative = 0.0) -> Numbers:
        '''<docstring, from which the wizard's help is taken>'''
        return final + (initial - final) * np.exp(...)

The decorated function is the kernel: it gets float64 arrays that broadcast, every element inside
the range its annotation states, and returns an array (or a named tuple of arrays), or an
`Answer` with refusals where no result exists. The wrapper around it converts the arguments,
gives every wrong element its error and lets the rest compute.

Called with single values, a wrong argument raises its CellError. Called with arrays, a wrong
element becomes a NaN that carries the kind of its error (`errors.error_codes`).
"""

from __future__ import annotations

import functools
import inspect
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any, ParamSpec, TypeVar, get_type_hints

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.arguments import (
    PASSED,
    REQUIRED,
    Argument,
    Parameter,
    Spec,
    is_blank,
    is_range,
    shown,
)
from tausheet.functions.errors import (
    CellError,
    DomainError,
    ErrorKind,
    InputError,
    error_codes,
    nan_of,
)

P = ParamSpec("P")
R = TypeVar("R")

_TOO_LARGE = "the result lies beyond the range of numbers"


@dataclass
class Answer:
    """A kernel's result, with the elements for which it refuses one."""

    values: Any
    refusals: list[tuple[Any, type[CellError], str]] = field(default_factory=list)

    def unless(self, mask: Any, error: type[CellError], message: str) -> Answer:
        """Refuse the elements of `mask` (the first refusal that holds decides).

        `message` may name arguments in braces: "{level} is never reached".
        """
        self.refusals.append((mask, error, message))
        return self


@dataclass(frozen=True)
class CellFunction:
    """A function that an engineer types into a cell."""

    name: str
    group: str
    python_name: str
    summary: str
    parameters: tuple[Parameter, ...]
    variadic: bool
    matrix: bool
    texts: bool
    function: Callable[..., Any]
    kernel: Callable[..., Any]
    scalar: Callable[..., float | None] | None

    def reason(self, arguments: Sequence[object]) -> str:
        """Why a call gives an error, in words; an empty text when it does not."""
        try:
            if self.variadic:
                self.kernel(*arguments)
                return ""
            return _evaluate(self, arguments).sentence()
        except CellError as error:
            return str(error)
        except TypeError:
            count = len(self.parameters)
            return f"{self.name} takes {count} arguments, but got {len(arguments)}; leave some out"


CATALOGUE: dict[str, CellFunction] = {}
"""Every cell function by its cell name, in the order of their definition."""


def cell_function(
    name: str,
    group: str,
    *,
    scalar: Callable[..., float | None] | None = None,
    matrix: bool = False,
    texts: bool = False,
) -> Callable[[Callable[P, R]], Callable[P, R]]:
    """Make a function a cell function and list it.

    name: what is typed into the cell. group: where the index and the wizard list it.
    scalar: a quick way for plain floats; it returns None for anything it will not decide.
    matrix: the result is a matrix of its own shape, not one value an element.
    texts: the result is a text, or texts.
    """

    def decorate(kernel: Callable[P, R]) -> Callable[P, R]:
        @functools.wraps(kernel)
        def function(*args: P.args, **kwargs: P.kwargs) -> R:
            if scalar is not None and not kwargs:
                try:
                    quick = scalar(*args)
                except (TypeError, OverflowError):
                    quick = None
                if quick is not None:
                    return quick  # type: ignore[return-value]
            if entry.variadic:
                return kernel(*args, **kwargs)
            return _evaluate(entry, _positional(entry, args, kwargs)).value()  # type: ignore[no-any-return]

        entry = _describe(name, group, kernel, function, scalar, matrix, texts)
        function.cell = entry  # type: ignore[attr-defined]
        CATALOGUE[name] = entry
        return function

    return decorate


def _describe(
    name: str,
    group: str,
    kernel: Callable[..., Any],
    function: Callable[..., Any],
    scalar: Callable[..., float | None] | None,
    matrix: bool,
    texts: bool,
) -> CellFunction:
    hints = get_type_hints(kernel, include_extras=True)
    text = inspect.getdoc(kernel) or ""
    helps = argument_help(text)
    parameters = []
    variadic = False
    for parameter in inspect.signature(kernel).parameters.values():
        spec = next(m for m in hints[parameter.name].__metadata__ if isinstance(m, Spec))
        default = REQUIRED if parameter.default is parameter.empty else parameter.default
        if parameter.kind is parameter.VAR_POSITIONAL:
            variadic = True
            default = None
        parameters.append(Parameter(parameter.name, spec, default, helps.get(parameter.name, "")))
    summary = " ".join(text.split("\n\n")[0].replace("`", "").split())
    return CellFunction(
        name,
        group,
        kernel.__name__,
        summary,
        tuple(parameters),
        variadic,
        matrix,
        texts,
        function,
        kernel,
        scalar,
    )


def argument_help(text: str) -> dict[str, str]:
    """What a docstring's section "Arguments:" says of each argument."""
    match = re.search(r"^Arguments:\n((?:[ \t]+.*\n?|\n)+)", text, re.MULTILINE)
    helps: dict[str, str] = {}
    name = ""
    for line in (match.group(1) if match else "").splitlines():
        found = re.match(r"    (\w+): (.*)", line)
        if found:
            name = found.group(1)
            helps[name] = found.group(2).strip()
        elif name and line.strip():
            helps[name] += " " + line.strip()
    return helps


def _positional(
    entry: CellFunction, args: Sequence[object], kwargs: dict[str, Any]
) -> list[object]:
    if kwargs:
        names = [p.name for p in entry.parameters]
        filled = list(args) + [None] * (len(names) - len(args))
        for key, value in kwargs.items():
            if key not in names or names.index(key) < len(args):
                raise TypeError(f"{entry.python_name}() got an unexpected argument {key!r}")
            filled[names.index(key)] = value
        return filled
    return list(args)


@dataclass
class _Result:
    """One call: what the kernel gave, and what is wrong where."""

    entry: CellFunction
    arguments: list[Argument]
    shape: tuple[int, ...]
    codes: NDArray[np.uint16] | None
    answer: Answer | None

    @np.errstate(all="ignore")
    def value(self) -> Any:
        """The result; raises for single values, marks elements in arrays."""
        if self.shape == () and (sentence := self.error()) is not None:
            raise sentence
        if self.answer is None:
            return self._marked(np.full(self.shape, np.nan), self.codes)
        values = self.answer.values
        if isinstance(values, tuple) and hasattr(values, "_fields"):
            return type(values)(*(self._finish(v) for v in values))
        return self._finish(values)

    def _finish(self, values: Any) -> Any:
        if isinstance(values, str):
            return values
        array = np.asarray(values)
        if array.dtype == object:
            array = np.array(np.broadcast_to(array, self.shape))
            codes = self._all_codes()
            if codes is not None:
                for index in np.argwhere(codes):
                    array[tuple(index)] = float(nan_of(codes[tuple(index)] & ~np.uint16(PASSED)))
            return array.item() if self.shape == () else array
        matrix = self.entry.matrix
        shape = array.shape if matrix else self.shape
        if array.shape != shape:
            array = np.broadcast_to(array, shape)
        array = self._marked(array, None if matrix else self._all_codes())
        return float(array) if array.ndim == 0 else array

    def _all_codes(self) -> NDArray[np.uint16] | None:
        """Codes of the arguments and, where those are fine, of the kernel's refusals."""
        if self.answer is None or not self.answer.refusals:
            return self.codes
        codes = np.zeros(self.shape, np.uint16) if self.codes is None else self.codes.copy()
        for mask, error, _ in self.answer.refusals:
            codes[(codes == 0) & np.broadcast_to(mask, self.shape)] = error.kind.value
        return codes if codes.any() else None

    def _marked(self, array: NDArray[Any], codes: NDArray[np.uint16] | None) -> NDArray[Any]:
        array = np.asarray(array, dtype=np.float64)
        # a finite sum has finite terms, and is had in less time than it takes to look at each
        if codes is None and (np.isfinite(array.sum()) or np.isfinite(array).all()):
            lent = any(np.may_share_memory(array, a.value) for a in self.arguments)
            return array.copy() if lent or not array.flags.writeable else array
        marks = error_codes(array)
        if codes is not None:
            marks = np.where(codes != 0, codes & ~np.uint16(PASSED), marks)
        return np.where(marks != 0, nan_of(marks), array)

    def error(self, index: tuple[int, ...] = ()) -> CellError | None:
        """The error of one element, None when it is fine."""
        name = self.entry.name
        if self.codes is not None and self.codes[index]:
            code = int(self.codes[index])
            for parameter, argument in zip(self.entry.parameters, self.arguments, strict=True):
                own = argument.codes
                if own is not None and int(np.broadcast_to(own, self.shape)[index]) == code:
                    try:
                        parameter.spec.element(argument.element(index, self.shape), parameter)
                    except CellError as error:
                        error.args = (f"{name}: {error}",)
                        return error
            raise AssertionError("an argument with a code has a sentence")
        if self.answer is None:
            return None
        for mask, kind, message in self.answer.refusals:
            if np.broadcast_to(mask, self.shape)[index]:
                named = {
                    parameter.name: _plainly(argument.element(index, self.shape), parameter)
                    for parameter, argument in zip(
                        self.entry.parameters, self.arguments, strict=True
                    )
                }
                return kind(f"{name}: {message.format(**named)}")
        if self._beyond_numbers()[index]:
            return DomainError(f"{name}: {_TOO_LARGE}; check the arguments for a slip")
        return None

    def _beyond_numbers(self) -> NDArray[np.bool_]:
        """Where a result, or one of several that belong together, is no finite number."""
        beyond = np.zeros(self.shape, bool)
        if self.answer is None or isinstance(self.answer.values, str):
            return beyond
        several = isinstance(self.answer.values, tuple)
        for values in map(np.asarray, self.answer.values if several else (self.answer.values,)):
            if values.dtype.kind == "f":
                # a result that does not exist is marked as #N/A by the kernel itself
                wrong = ~np.isfinite(values) & (error_codes(values) != ErrorKind.NA.value)
                beyond |= wrong.any() if self.entry.matrix and not several else wrong
        return beyond

    def sentence(self) -> str:
        """The first error in reading order, in words; empty when there is none."""
        codes = self._all_codes()
        bad = self._beyond_numbers() if codes is None else (codes != 0) | self._beyond_numbers()
        if not bad.any():
            return ""
        first = tuple(int(i) for i in np.unravel_index(bad.argmax(), self.shape))
        return str(self.error(first))


def _plainly(raw: object, parameter: Parameter) -> str:
    if is_blank(raw):
        return shown(parameter.default)
    if is_range(raw):
        return "the range"
    return raw if isinstance(raw, str) else shown(raw)


def _evaluate(entry: CellFunction, args: Sequence[object]) -> _Result:
    parameters = entry.parameters
    if len(args) > len(parameters):
        raise TypeError(f"{entry.python_name}() takes {len(parameters)} arguments, got {len(args)}")
    padded = list(args) + [None] * (len(parameters) - len(args))
    arguments = [p.spec.convert(raw, p) for p, raw in zip(parameters, padded, strict=True)]
    shapes = {
        p.name: np.shape(a.value)
        for p, a in zip(parameters, arguments, strict=True)
        if p.spec.elementwise
    }
    try:
        shape = np.broadcast_shapes(*shapes.values())
    except ValueError:
        sizes = ", ".join(
            f"{name} {' x '.join(map(str, size))}" for name, size in shapes.items() if size
        )
        raise InputError(
            f"{entry.name}: the ranges do not fit together ({sizes}); "
            "use ranges of one size, or single cells"
        ) from None
    codes = _merged([a.codes for a in arguments if a.codes is not None], shape)
    if codes is not None and codes.all():
        return _Result(entry, arguments, shape, codes, None)
    with np.errstate(all="ignore"):
        try:
            values: Any = entry.kernel(*(a.value for a in arguments))
        except CellError as error:
            error.args = (f"{entry.name}: {error}",)
            raise
    answer = values if isinstance(values, Answer) else Answer(values)
    return _Result(entry, arguments, shape, codes, answer)


def _merged(codes: list[NDArray[np.uint16]], shape: tuple[int, ...]) -> NDArray[np.uint16] | None:
    """Error values in arguments decide first, then the first wrong argument."""
    if not codes:
        return None
    merged = np.zeros(shape, dtype=np.uint16)
    for own in codes:
        merged = np.where((merged == 0) & (own >= PASSED), own, merged)
    for own in codes:
        merged = np.where(merged == 0, own, merged)
    return merged
