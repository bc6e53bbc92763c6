"""Runs one of our commands again and again, each time in a process killed at a random moment.

    python run_and_be_killed.py COMMAND FOLDER TIMES SEED

FOLDER holds old.xlsx. After each kill the target is the old file, or a whole new one; printed is
how often it was which, as JSON. Everything is imported once; a fork is what is killed.
"""

from __future__ import annotations

import json
import os
import random
import shutil
import signal
import sys
import time
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from openpyxl import load_workbook

from tausheet.addin.make import make_index, make_sheet
from tausheet.addin.recalc import recalc

COMMANDS: dict[str, Callable[[Path], Any]] = {
    "recalc": recalc,
    "new": lambda path: make_sheet("bleed", path, {}, demo=True, force=True),
    "index": lambda path: make_index(path, force=True),
}


def started(command: str, target: Path) -> int:
    """The command in a process of its own; its number."""
    child = os.fork()
    if child:
        return child
    code = 1
    try:
        COMMANDS[command](target)
        code = 0
    finally:
        os._exit(code)


def main() -> None:
    """Let it run for the time it takes, then kill it TIMES times, about as often late as early."""
    command, folder, times, seed = sys.argv[1:]
    target, old = Path(folder) / "target.xlsx", (Path(folder) / "old.xlsx").read_bytes()
    reach = 0.0
    for _ in range(2):  # the first of them imports what is imported late
        target.write_bytes(old)
        began = time.monotonic()
        COMMANDS[command](target)
        reach = time.monotonic() - began
    assert target.read_bytes() != old, "the command changes nothing"
    moments, seen = random.Random(int(seed)), {"old": 0, "new": 0, "left behind": 0}
    for _ in range(int(times)):
        target.write_bytes(old)
        child = started(command, target)
        time.sleep(moments.uniform(0, reach))
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        data = target.read_bytes()
        if data == old:
            seen["old"] += 1
            reach *= 1.1
        else:
            with zipfile.ZipFile(target) as archive:
                assert archive.testzip() is None
            assert load_workbook(target, data_only=True).worksheets
            seen["new"] += 1
            reach /= 1.1
        for path in Path(folder).iterdir():
            if path.name not in ("old.xlsx", "target.xlsx"):
                assert path.name.startswith("."), path
                seen["left behind"] += 1
                path.unlink()
    shutil.rmtree(folder)
    print(json.dumps(seen))


if __name__ == "__main__":
    main()
