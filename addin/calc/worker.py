"""The second process: answers calls that LibreOffice's Python sends over pipes."""

from __future__ import annotations

import os
import pickle
import struct
import sys

from tausheet.addin.calc.answer import answer_of

_LENGTH = struct.Struct("<Q")


def main() -> None:
    """Answer until the pipe ends."""
    calls = sys.stdin.buffer
    answers = os.fdopen(os.dup(1), "wb")
    os.dup2(2, 1)  # whatever a package prints must not get between the answers
    while len(header := calls.read(_LENGTH.size)) == _LENGTH.size:
        name, arguments = pickle.loads(calls.read(_LENGTH.unpack(header)[0]))
        content = pickle.dumps(answer_of(name)(*arguments), 4)
        answers.write(_LENGTH.pack(len(content)) + content)
        answers.flush()
