"""Answers from the Python that installed the extension, in a process of its own, over pipes.

The way when its packages cannot be used inside LibreOffice. A call that takes too long, or ends
the process twice, is an error in its cell.
"""

from __future__ import annotations

import contextlib
import os
import pickle
import struct
import subprocess
import threading
import time
from collections.abc import Callable
from typing import Any

TIME_LIMIT = 60.0
"""Seconds that a call may take; starting the process is part of the first."""

_LENGTH = struct.Struct("<Q")
_VALUE_ERROR = struct.unpack("<d", struct.pack("<Q", 0x7FF8000000000000 | 519))[0]
# LibreOffice sets some of these for its own Python
_NOT_INHERITED = ("PYTHONHOME", "PYTHONPATH", "LD_LIBRARY_PATH", "URE_BOOTSTRAP")
_PROGRAM = (
    "import sys; sys.path[:] = [path for path in sys.path if path]; "
    "from tausheet.addin.calc.worker import main; main()"
)


class SecondProcess:
    """The process, started at the first call and again after it has ended."""

    def __init__(self, executable: str, time_limit: float = TIME_LIMIT) -> None:
        self._executable = executable
        self._time_limit = time_limit
        self._process: Any = None
        self._deadline: float | None = None
        self._lock = threading.Lock()
        threading.Thread(target=self._watch, daemon=True).start()

    def answer_of(self, name: str) -> Callable[..., Any]:
        """The cell function `name`, answered there."""

        def answer(*arguments: Any) -> Any:
            with self._lock:
                return self._answer((name, arguments))

        return answer

    def close(self) -> None:
        """End the process."""
        if self._process is not None:
            self._process.kill()
            self._process.wait()
            for pipe in (self._process.stdin, self._process.stdout):
                with contextlib.suppress(OSError):  # what was to be sent goes to nobody
                    pipe.close()
            self._process = None

    def _answer(self, call: Any) -> Any:
        for _ in range(2):
            self._deadline = time.monotonic() + self._time_limit
            try:
                return self._ask(call)
            except (EOFError, OSError):
                too_late = time.monotonic() >= self._deadline
                self.close()
                if too_late:
                    break
            finally:
                self._deadline = None
        return ((_VALUE_ERROR,),)

    def _ask(self, call: Any) -> Any:
        if self._process is None:
            environment = {k: v for k, v in os.environ.items() if k not in _NOT_INHERITED}
            self._process = subprocess.Popen(
                [self._executable, "-c", _PROGRAM],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                env=environment,
            )
        message = pickle.dumps(call, 4)
        self._process.stdin.write(_LENGTH.pack(len(message)) + message)
        self._process.stdin.flush()
        (length,) = _LENGTH.unpack(self._read(_LENGTH.size))
        return pickle.loads(self._read(length))

    def _read(self, size: int) -> bytes:
        content: bytes = self._process.stdout.read(size)
        if len(content) < size:
            raise EOFError
        return content

    def _watch(self) -> None:
        """End the process when a call is past its time, so that the reader gets an end of file."""
        while True:
            time.sleep(0.2)
            deadline, process = self._deadline, self._process
            if deadline is not None and process is not None and time.monotonic() >= deadline:
                process.kill()
