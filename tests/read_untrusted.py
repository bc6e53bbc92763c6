"""Gives each file of a folder to the commands, and says what each took: for the test beside this.

    python read_untrusted.py FOLDER

Prints a line of JSON for each file and command, then the largest memory use in MB.
"""

from __future__ import annotations

import json
import re
import sys
import time
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import Any

from tausheet.addin.printing import print_sheets
from tausheet.addin.recalc import recalc
from tausheet.addin.review.verify import verify
from tausheet.functions.errors import TausheetError


def printed(path: Path) -> None:
    (said,) = print_sheets([path])
    if said.error is not None:
        raise said.error


COMMANDS: dict[str, Callable[[Path], Any]] = {
    "recalc": recalc,
    "calc": lambda path: recalc(path, engine="calc"),
    "verify": verify,
    "pdf": printed,
}

if __name__ == "__main__":
    warnings.simplefilter("ignore")
    for path in sorted(Path(sys.argv[1]).glob("*.xlsx")):
        before = path.read_bytes()
        for name in path.stem.split(".")[1].split("-"):
            began = time.process_time()
            try:
                said = f"done: {COMMANDS[name](path)}"
            except TausheetError as refusal:
                said = f"refused: {refusal}"
            took = time.process_time() - began
            same = path.read_bytes() == before
            print(json.dumps([path.name, name, said[:500], took, same]), flush=True)
    # getrusage would tell the size of the process that started this one, where that is larger
    peak = re.search(r"VmHWM:\s+(\d+) kB", Path("/proc/self/status").read_text())
    print(int(peak[1]) / 1024 if peak else float("inf"))
