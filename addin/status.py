"""What works on this machine and what is missing, in sentences."""

from __future__ import annotations

import platform
import sys

from tausheet.addin.calc import installation as calc
from tausheet.addin.excel import installation as excel
from tausheet.functions import version
from tausheet.functions.catalogue import CATALOGUE


def lines() -> list[str]:
    """One sentence a line."""
    return [
        f"tausheet {version()}: {len(CATALOGUE)} cell functions, "
        f"Python {platform.python_version()} at {sys.executable}.",
        "Without a spreadsheet program: works (--engine embedded, the default).",
        *calc.status(),
        *excel.status(),
    ]
