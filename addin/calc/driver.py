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
import json
import os
import shutil
import signal
import subprocess
import tempfile
import threading
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any, TypeVar

from tausheet.addin.calc import extension, libreoffice
from tausheet.addin.cells import CellValue
from tausheet.functions.errors import ErrorKind, TausheetError

Values = dict[str, dict[str, CellValue]]
T = TypeVar("T")

TIME_LIMIT = 120.0
_START_LIMIT = 100.0
_END_LIMIT = 5.0
_READS = (".xlsx", ".xlsm", ".ods")
_HELPER = Path(__file__).with_name("helper.py")

# a range with an error in it, and a built-in function's argument outside its domain: these are
# LibreOffice's own, and in an .xlsx it writes them as #VALUE! itself
_ALSO_VALUE = (502, 504)
_numbers = itertools.count(1)

_SETTINGS = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Common/Security/Scripting"><prop oor:name="DisableMacrosExecution" oor:op="fuse"><value>true</value></prop></item>
<item oor:path="/org.openoffice.Office.Calc/Content/Update"><prop oor:name="Link" oor:op="fuse"><value>1</value></prop></item>
<item oor:path="/org.openoffice.Office.Java/VirtualMachine"><prop oor:name="Enable" oor:op="fuse"><value>false</value></prop></item>
</oor:items>
"""  # noqa: E501


class CalcError(TausheetError):
    """LibreOffice could not do what was asked; the text says what and why."""


class _Died(CalcError):
    """LibreOffice ended in the middle; worth another try."""


class Calc:
    """A headless LibreOffice, started when first needed."""

    def __init__(
        self,
        time_limit: float = TIME_LIMIT,
        more_extensions: Mapping[str, Mapping[str, bytes]] | None = None,
    ) -> None:
        self._time_limit = time_limit
        self._more_extensions = more_extensions or {}
        self._process: subprocess.Popen[bytes] | None = None
        self._folder = ""
        self._late = False
        self._lock = threading.RLock()

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

    def pdf(self, paths: Sequence[Path], folder: Path | None = None) -> list[Path]:
        """Print each workbook to a .pdf beside it, or in `folder`; the files written."""
        printed = []
        for path in paths:
            out = (folder or path.parent) / f"{path.stem}.pdf"
            self.store(path, out)
            printed.append(out)
        return printed

    def open(self, path: Path) -> Book:
        """A workbook to fill in and compute again and again; use it in a `with`."""
        if path.suffix.lower() not in _READS:
            raise CalcError(f"{path} is no workbook that can be read here ({', '.join(_READS)})")
        if not path.is_file():
            raise CalcError(f"{path} does not exist")
        with self._lock:
            self._start()
            # a copy can be filled in, and is open to nobody else
            copy = Path(tempfile.mkdtemp(dir=self._folder), path.name)
            try:
                shutil.copyfile(path, copy)
                number = next(_numbers)
                self.ask("open", number, str(copy))
                return Book(self, path, number)
            except (CalcError, OSError) as error:
                kind = type(error) if isinstance(error, CalcError) else CalcError
                raise kind(f"{path} was not opened: {error}") from None

    def wizard(self) -> dict[str, Any]:
        """What the function wizard shows, by function name."""
        described: dict[str, Any] = self.ask("wizard")
        return described

    def close(self) -> None:
        """End LibreOffice and remove its profile."""
        with self._lock:
            if self._process is not None:
                with suppress(OSError, subprocess.TimeoutExpired):
                    self._process.communicate(timeout=_END_LIMIT)
            self._end()

    def ask(self, do: str, *arguments: Any) -> Any:
        """One request of the helper; CalcError with its sentence when it is refused."""
        with self._lock:
            self._start()
            reply = self._exchange({"do": do, "with": arguments}, self._time_limit)
        if "refused" in reply:
            raise CalcError(reply["refused"])
        return reply["result"]

    def _with(self, path: Path, task: Callable[[Book], T]) -> T:
        for attempt in (1, 2):
            try:
                with self.open(path) as book:
                    return task(book)
            except _Died:
                if attempt == 2:
                    raise
        raise AssertionError("the second attempt returns or raises")

    def _start(self) -> None:
        if self._process is not None:
            return
        office = libreoffice.find()
        self._folder = tempfile.mkdtemp(prefix="tausheet-")
        user = Path(self._folder, "profile/user")
        user.mkdir(parents=True)
        user.joinpath("registrymodifications.xcu").write_text(_SETTINGS)
        bundled = Path(self._folder, "bundled")
        extension.write(extension.files(), bundled / "tausheet")
        for name, files in self._more_extensions.items():
            extension.write(files, bundled / name)
        self._process = subprocess.Popen(
            [
                office.python,
                _HELPER,
                office.soffice,
                self._folder,
                f"-env:BUNDLED_EXTENSIONS={bundled.as_uri()}",
            ],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            env={**libreoffice.clean_environment(), "LC_ALL": "C.UTF-8"},
            start_new_session=True,
        )
        self._exchange(None, _START_LIMIT)

    def _exchange(self, request: dict[str, Any] | None, limit: float) -> dict[str, Any]:
        process = self._process
        assert process is not None
        assert process.stdin is not None
        assert process.stdout is not None
        self._late = False
        timer = threading.Timer(limit, self._end_late)
        timer.start()
        try:
            if request is not None:
                process.stdin.write(json.dumps(request).encode() + b"\n")
                process.stdin.flush()
            line = process.stdout.readline()
            reply: dict[str, Any] = json.loads(line) if line else {"died": "it ended by itself"}
        except OSError:
            reply = {"died": "it ended by itself"}
        except BaseException:  # a Ctrl-C included: the answer that is under way belongs to nobody
            self._end()
            raise
        finally:
            timer.cancel()
        if "died" in reply:
            self._end()
            if self._late:
                raise CalcError(f"LibreOffice took longer than {limit:g} s and was ended")
            raise _Died(f"LibreOffice ended in the middle: {reply['died']}")
        return reply

    def _end(self) -> None:
        process = self._process
        if process is not None:
            self._kill()
            process.wait()
            for pipe in (process.stdin, process.stdout):
                with suppress(OSError):
                    pipe.close()  # type: ignore[union-attr]
            self._process = None
        if self._folder:
            shutil.rmtree(self._folder, ignore_errors=True)
            self._folder = ""

    def _end_late(self) -> None:
        self._late = True
        self._kill()

    def _kill(self) -> None:
        process = self._process
        if process is None:
            return
        if os.name == "posix":
            with suppress(ProcessLookupError):
                os.killpg(process.pid, signal.SIGKILL)
        else:
            subprocess.run(["taskkill", "/F", "/T", "/PID", str(process.pid)], check=False)


class Book:
    """A workbook open in LibreOffice; the file itself stays as it is."""

    def __init__(self, calc: Calc, path: Path, number: int) -> None:
        self._calc = calc
        self._path = path
        self._number = number

    def __enter__(self) -> Book:
        return self

    def __exit__(self, *_: object) -> None:
        with suppress(CalcError):
            self._calc.ask("close", self._number)

    def set(self, cells: Mapping[str, Mapping[str, CellValue]]) -> None:
        """Enter values, by sheet and address; None empties a cell."""
        self._ask("set", {title: _encoded(values) for title, values in cells.items()})

    def calculate(self) -> None:
        """Compute every formula."""
        self._ask("calculate")

    def values(self) -> Values:
        """Compute everything; the value of every formula cell, by sheet and address."""
        self.calculate()
        return {
            title: {
                address: self._decoded(title, address, value) for address, value in cells.items()
            }
            for title, cells in self._ask("values").items()
        }

    def store(self, out: Path) -> None:
        """Compute everything and store as .xlsx, .ods or .pdf, by the ending of `out`.

        A file of that name is replaced.
        """
        self.calculate()
        handle, temporary = tempfile.mkstemp(suffix=out.suffix, dir=out.parent or ".")
        os.close(handle)
        try:
            self._ask("store", str(Path(temporary).resolve()))
            os.replace(temporary, out)
        except BaseException:
            Path(temporary).unlink(missing_ok=True)
            raise

    def _ask(self, do: str, *arguments: Any) -> Any:
        try:
            return self._calc.ask(do, self._number, *arguments)
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
