"""Keeps the helper process, and with it LibreOffice, running, answering, and ending in time."""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import tempfile
import threading
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

from tausheet.addin.calc import extension, libreoffice
from tausheet.functions.errors import TausheetError

_START_LIMIT = 100.0
_END_LIMIT = 5.0
_HELPER = Path(__file__).with_name("helper.py")

# a stranger's workbook is computed: no macros, no content from elsewhere
_SETTINGS = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Common/Security/Scripting">
<prop oor:name="DisableMacrosExecution" oor:op="fuse"><value>true</value></prop></item>
<item oor:path="/org.openoffice.Office.Calc/Content/Update">
<prop oor:name="Link" oor:op="fuse"><value>1</value></prop></item>
<item oor:path="/org.openoffice.Office.Java/VirtualMachine">
<prop oor:name="Enable" oor:op="fuse"><value>false</value></prop></item>
</oor:items>
"""


class CalcError(TausheetError):
    """LibreOffice could not do what was asked; the text says what and why."""


class Died(CalcError):
    """LibreOffice ended in the middle; worth another try."""


class HelperProcess:
    """The helper, started when first asked, and again after it has ended."""

    def __init__(
        self, time_limit: float, more_extensions: Mapping[str, Mapping[str, bytes]]
    ) -> None:
        self._time_limit = time_limit
        self._left: float | None = None
        self._whole: float | None = None
        self._more_extensions = more_extensions
        self._process: subprocess.Popen[bytes] | None = None
        self._late = False
        self._lock = threading.RLock()
        self.folder = ""
        """Holds the profile and the copies of workbooks while LibreOffice runs."""

    def ask(self, do: str, *arguments: Any) -> Any:
        """One request of the helper; CalcError with its sentence when it is refused."""
        with self._lock:
            self._start()
            began = time.monotonic()
            try:
                limit = self._time_limit if self._left is None else max(self._left, 0.001)
                reply = self._exchange({"do": do, "with": arguments}, limit)
            finally:
                if self._left is not None:
                    self._left -= time.monotonic() - began
        if "refused" in reply:
            raise CalcError(reply["refused"])
        return reply["result"]

    @contextmanager
    def within(self, limit: float) -> Iterator[None]:
        """All that is asked in the block together takes no longer, starting LibreOffice aside."""
        with self._lock:
            self._left, self._whole = limit, limit
            try:
                yield
            finally:
                self._left = self._whole = None

    def open(self, number: int, path: Path) -> Path:
        """Open a copy of a workbook, which can be filled in and is open to nobody else."""
        with self._lock:
            self._start()
            copy = Path(tempfile.mkdtemp(dir=self.folder), path.name)
            shutil.copyfile(path, copy)
            self.ask("open", number, str(copy))
            return copy

    def close(self) -> None:
        """End LibreOffice and remove its profile."""
        with self._lock:
            if self._process is not None:
                with suppress(OSError, subprocess.TimeoutExpired):
                    self._process.communicate(timeout=_END_LIMIT)
            self._end()

    def _start(self) -> None:
        if self._process is not None:
            return
        office = libreoffice.find()
        files = extension.files()
        self.folder = tempfile.mkdtemp(prefix="tausheet-")
        user = Path(self.folder, "profile/user")
        user.mkdir(parents=True)
        user.joinpath("registrymodifications.xcu").write_text(_SETTINGS)
        bundled = Path(self.folder, "bundled")
        for name, contents in {"tausheet": files, **self._more_extensions}.items():
            extension.write(contents, bundled / name)
        extensions = f"-env:BUNDLED_EXTENSIONS={bundled.as_uri()}"
        self._process = subprocess.Popen(
            [office.python, _HELPER, office.soffice, self.folder, extensions],
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
                raise CalcError(
                    f"LibreOffice took longer than {self._whole or limit:g} s and was ended"
                )
            raise Died(f"LibreOffice ended in the middle: {reply['died']}")
        return reply

    def _end_late(self) -> None:
        self._late = True
        self._kill()

    def _end(self) -> None:
        process = self._process
        if process is not None:
            self._kill()
            process.wait()
            for pipe in (process.stdin, process.stdout):
                with suppress(OSError):
                    pipe.close()  # type: ignore[union-attr]
            self._process = None
        if self.folder:
            shutil.rmtree(self.folder, ignore_errors=True)
            self.folder = ""

    def _kill(self) -> None:
        process = self._process
        if process is None:
            return
        if os.name == "posix":
            with suppress(ProcessLookupError):
                os.killpg(process.pid, signal.SIGKILL)
        else:
            subprocess.run(["taskkill", "/F", "/T", "/PID", str(process.pid)], check=False)
