"""Drives a headless LibreOffice from this Python: compute, fill in, store, print.

    with Calc() as calc:
        values = calc.compute(path)
        with calc.open(path) as book:
            book.set({"Sheet": {"C5": 0.0}})
            values = book.values()

One helper process owns one LibreOffice with a profile of its own and our extension, installed or
not. Each request has a time limit, after which both are ended. When LibreOffice dies it is
started again, and what was asked of it is tried once more.
"""

from __future__ import annotations

import itertools
import os
import shutil
import tempfile
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any, TypeVar

from tausheet.addin.calc.helper_process import CalcError, Died, HelperProcess
from tausheet.addin.cells import CellValue
from tausheet.functions.errors import ErrorKind

Values = dict[str, dict[str, CellValue]]
T = TypeVar("T")

TIME_LIMIT = 120.0
_READS = (".xlsx", ".xlsm", ".ods")

# a range with an error in it, and a built-in function's argument outside its domain: these are
# LibreOffice's own, and in an .xlsx it writes them as #VALUE! itself
_ALSO_VALUE = (502, 504)
_numbers = itertools.count(1)


class Calc:
    """A headless LibreOffice, started when first needed."""

    def __init__(
        self,
        time_limit: float = TIME_LIMIT,
        more_extensions: Mapping[str, Mapping[str, bytes]] | None = None,
    ) -> None:
        self.helper = HelperProcess(time_limit, more_extensions or {})

    def __enter__(self) -> Calc:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def compute(self, path: Path) -> Values:
        """The value of every formula cell, computed by LibreOffice; the file stays as it is."""
        return self._with(path, Book.values)

    def store(self, path: Path, out: Path) -> None:
        """Compute a workbook and store it as .xlsx, .ods or .pdf, by the ending of `out`."""
        self._with(path, lambda book: book.store(out))

    def pdf(
        self, paths: Sequence[Path], folder: Path | None = None, limit: float = TIME_LIMIT
    ) -> list[Path]:
        """Print each workbook to a .pdf beside it, or in `folder`; the files written.

        limit: seconds that a workbook may take, from opening it to the printed file.
        """
        printed = []
        for path in paths:
            out = (folder or path.parent) / f"{path.stem}.pdf"
            with self.helper.within(limit):
                self.store(path, out)
            printed.append(out)
        return printed

    def open(self, path: Path) -> Book:
        """A workbook to fill in and compute again and again; use it in a `with`."""
        if path.suffix.lower() not in _READS:
            raise CalcError(f"{path} is no workbook that can be read here ({', '.join(_READS)})")
        if not path.is_file():
            raise CalcError(f"{path} does not exist")
        if not path.stat().st_size:  # LibreOffice would take it for a new workbook
            raise CalcError(f"{path} was not opened: it is empty")
        number = next(_numbers)
        try:
            copy = self.helper.open(number, path)
        except CalcError as error:
            raise type(error)(f"{path} was not opened: {error}") from None
        except OSError as error:
            raise CalcError(f"{path} was not opened: {error}") from None
        return Book(self.helper, path, number, copy)

    def wizard(self) -> dict[str, Any]:
        """What the function wizard shows, by function name."""
        described: dict[str, Any] = self.helper.ask("wizard")
        return described

    def close(self) -> None:
        """End LibreOffice and remove its profile."""
        self.helper.close()

    def _with(self, path: Path, task: Callable[[Book], T]) -> T:
        try:
            with self.open(path) as book:
                return task(book)
        except Died:
            with self.open(path) as book:
                return task(book)


class Book:
    """A workbook open in LibreOffice; the file itself stays as it is."""

    def __init__(self, helper: HelperProcess, path: Path, number: int, copy: Path) -> None:
        self._helper = helper
        self._copy = copy
        self._path = path
        self._number = number

    def __enter__(self) -> Book:
        return self

    def __exit__(self, *_: object) -> None:
        if self._copy.exists():  # it is gone with the LibreOffice that had it open
            with suppress(CalcError):
                self._helper.ask("close", self._number)
        shutil.rmtree(self._copy.parent, ignore_errors=True)

    def set(self, cells: Mapping[str, Mapping[str, CellValue]]) -> None:
        """Enter values, by sheet and address; None empties a cell."""
        self._ask("set", {title: _encoded(values) for title, values in cells.items()})

    def calculate(self) -> None:
        """Compute every formula."""
        self._ask("calculate")

    def values(self, titles: Sequence[str] | None = None) -> Values:
        """Compute everything; the value of every formula cell, by sheet and address.

        titles: the sheets to read, all when left out.
        """
        self.calculate()
        return {
            title: {name: self._decoded(title, name, value) for name, value in cells.items()}
            for title, cells in self._ask("values", titles).items()
        }

    def store(self, out: Path) -> None:
        """Compute everything and store as .xlsx, .ods or .pdf, by the ending of `out`.

        A file of that name is replaced.
        """
        self.calculate()
        with tempfile.TemporaryDirectory(dir=out.parent) as folder:
            written = Path(folder, out.name).resolve()
            self._ask("store", str(written))
            os.replace(written, out)

    def _ask(self, do: str, *arguments: Any) -> Any:
        try:
            return self._helper.ask(do, self._number, *arguments)
        except CalcError as error:
            raise type(error)(f"{self._path}: {error}") from None

    def _decoded(self, title: str, address: str, value: Any) -> CellValue:
        if not isinstance(value, dict):
            return value  # type: ignore[no-any-return]
        number = ErrorKind.VALUE.value if value["error"] in _ALSO_VALUE else value["error"]
        try:
            return ErrorKind(number)
        except ValueError:
            raise CalcError(
                f"{self._path}: cell {title}!{address} has LibreOffice's error {number}, "
                "which no workbook can hold; mend the formula"
            ) from None


def _encoded(values: Mapping[str, CellValue]) -> dict[str, Any]:
    return {
        address: {"error": value.text} if isinstance(value, ErrorKind) else value
        for address, value in values.items()
    }
