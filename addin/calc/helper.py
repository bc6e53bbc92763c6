"""Owns one headless LibreOffice and does what it is told, a JSON line each way.

    python helper.py SOFFICE FOLDER [more options for soffice]

Run by the Python that has uno (3.8 or newer); standard library and uno only. FOLDER holds the
profile, and is removed at the end, which is when the standard input ends, whatever happens.
"""

from __future__ import annotations

import contextlib
import json
import os
import queue
import secrets
import shutil
import signal
import subprocess
import sys
import threading
import time
from typing import Any

import uno
from com.sun.star.beans import NamedValue, PropertyValue

START_LIMIT = 90.0
END_LIMIT = 10.0
_FILTERS = {
    ".xlsx": "Calc MS Excel 2007 XML",
    ".xlsm": "Calc MS Excel 2007 VBA XML",
    ".ods": "calc8",
    ".pdf": "calc_pdf_Export",
}
READER = "org.tausheet.Reader"


class Refused(Exception):
    """The file or the request is at fault, not LibreOffice."""


def properties(**values: Any) -> tuple[Any, ...]:
    """Arguments of a load or a store."""
    made = []
    for name, value in values.items():
        item = PropertyValue()
        item.Name, item.Value = name, value
        made.append(item)
    return tuple(made)


class Office:
    """The running LibreOffice and the workbooks open in it."""

    OPTIONS = ("--headless", "--norestore", "--nologo", "--nodefault", "--nofirststartwizard")

    def __init__(self, soffice: str, folder: str, options: list[str]) -> None:
        self.books: dict[int, Any] = {}
        pipe = "tausheet" + secrets.token_hex(8)
        profile = uno.systemPathToFileUrl(os.path.join(folder, "profile"))
        command = [soffice, f"-env:UserInstallation={profile}", *options, *self.OPTIONS]
        command.append(f"--accept=pipe,name={pipe};urp;")
        # importing uno put URE_BOOTSTRAP into the environment of C, which os.environ does not have
        self.process = subprocess.Popen(
            command, stdin=subprocess.DEVNULL, stdout=2, stderr=2, env=dict(os.environ)
        )
        context = uno.getComponentContext()
        resolver = context.ServiceManager.createInstanceWithContext(
            "com.sun.star.bridge.UnoUrlResolver", context
        )
        address = f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext"
        deadline = time.monotonic() + START_LIMIT
        while True:
            try:
                self.context = resolver.resolve(address)
                break
            except Exception:
                ended = self.process.poll() is not None
                if ended or time.monotonic() > deadline:
                    raise RuntimeError("LibreOffice does not start") from None
                time.sleep(0.05)
        self.desktop = self.context.ServiceManager.createInstanceWithContext(
            "com.sun.star.frame.Desktop", self.context
        )

    def open(self, number: int, path: str) -> None:
        """Load a workbook, without its macros and without its links to elsewhere."""
        url = uno.systemPathToFileUrl(path)
        how = properties(
            Hidden=True,
            FilterName=_FILTERS[os.path.splitext(path)[1].lower()],
            MacroExecutionMode=0,
            UpdateDocMode=0,
        )
        document = self.desktop.loadComponentFromURL(url, "_blank", 0, how)
        if document is None:
            raise Refused("it is damaged, or protected by a password")
        self.books[number] = document

    def book(self, number: int) -> Any:
        """An open workbook; it is gone when LibreOffice has been started again since."""
        if number not in self.books:
            raise Refused("it was open in a LibreOffice that has ended")
        return self.books[number]

    def set(self, number: int, cells: dict[str, dict[str, Any]]) -> None:
        """Enter values into cells."""
        sheets = self.book(number).Sheets
        for title, values in cells.items():
            if not sheets.hasByName(title):
                raise Refused(f"it has no sheet {title}")
            for address, value in values.items():
                enter(sheets.getByName(title).getCellRangeByName(address), value)

    def calculate(self, number: int) -> None:
        """Compute every formula."""
        self.book(number).calculateAll()

    def values(self, number: int, titles: list[str] | None) -> Any:
        """The value of each formula cell, of every sheet or of those named."""
        return self.read(self.book(number), titles)

    def read(self, document: Any, titles: list[str] | None = None) -> Any:
        """The value of each formula cell; our extension reads them inside LibreOffice."""
        request = NamedValue("Document", document), NamedValue("Titles", tuple(titles or ()))
        reader = self.context.ServiceManager.createInstanceWithContext(READER, self.context)
        return json.loads(reader.execute(request))

    def store(self, number: int, path: str) -> None:
        """Write a workbook, or its printed form, by the ending of the name."""
        how = properties(FilterName=_FILTERS[os.path.splitext(path)[1].lower()], Overwrite=True)
        self.book(number).storeToURL(uno.systemPathToFileUrl(path), how)

    def close(self, number: int) -> None:
        """Close a workbook without storing it."""
        self.books.pop(number).close(True)

    def lives(self) -> bool:
        """Whether LibreOffice still answers."""
        try:
            self.desktop.getCurrentComponent()
        except Exception:
            return False
        return True

    def end(self) -> None:
        """End LibreOffice."""
        with contextlib.suppress(Exception):  # it breaks the connection while it answers
            self.desktop.terminate()
        self.process.wait()

    def wizard(self) -> dict[str, Any]:
        """What the function wizard shows of each function."""
        described = self.context.ServiceManager.createInstanceWithContext(
            "com.sun.star.sheet.FunctionDescriptions", self.context
        )
        functions = {}
        for index in range(described.Count):
            shown = {item.Name: item.Value for item in described.getByIndex(index)}
            functions[shown["Name"]] = {
                "description": shown["Description"],
                "arguments": [[item.Name, item.Description] for item in shown["Arguments"] or ()],
            }
        return functions


def enter(cell: Any, value: Any) -> None:
    """Put one value into a cell; {"error": text} is a cell error."""
    if value is None:
        cell.setFormula("")
        done = cell.getFormula() == ""
    elif isinstance(value, str):
        cell.setString(value)
        done = cell.getString() == value
    elif isinstance(value, bool):
        cell.setFormula("=TRUE()" if value else "=FALSE()")
        done = cell.getValue() == value
    elif isinstance(value, dict):
        cell.setFormula("=" + value["error"])
        done = cell.getError() != 0
    else:
        cell.setValue(value)
        done = cell.getValue() == value
    if not done:
        raise Refused(f"cell {cell.AbsoluteName} cannot hold {value}")


def _read_requests(requests: Any) -> None:
    for line in sys.stdin:
        requests.put(json.loads(line))
    requests.put(None)
    time.sleep(END_LIMIT)  # the main thread is done before that, unless LibreOffice hangs
    if os.name == "posix":
        os.killpg(0, signal.SIGKILL)
    subprocess.call(["taskkill", "/F", "/T", "/PID", str(os.getpid())])


def main() -> None:
    """Start LibreOffice, say so, then answer requests until they end."""
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    os.dup2(2, 1)
    requests: Any = queue.Queue()
    threading.Thread(target=_read_requests, args=(requests,), daemon=True).start()

    def answer(**content: Any) -> None:
        answers.write(json.dumps(content) + "\n")
        answers.flush()

    try:
        office = Office(sys.argv[1], sys.argv[2], sys.argv[3:])
    except Exception as error:
        answer(died=str(error))
        return
    answer(ready=office.process.pid)
    for request in iter(requests.get, None):
        try:
            answer(result=getattr(office, request["do"])(*request["with"]))
        except Refused as error:
            answer(refused=str(error))
        except Exception as error:
            said = f"{type(error).__name__}: {error}"[:300]
            answer(**{"refused" if office.lives() else "died": said})
    office.end()
    shutil.rmtree(sys.argv[2], ignore_errors=True)


if __name__ == "__main__":
    main()
