"""What runs inside LibreOffice, under its own Python: the standard library and uno only.

Written for Python 3.8 and newer, the oldest that LibreOffice 7.4 brings along. The extension
carries a copy of this package under the name tausheet_inside.
"""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from typing import Any

MINIMUM = (3, 8)
"""The oldest Python under which this package and the helper run."""


def binary_form(variable: Callable[[str], Any]) -> str:
    """What the compiled packages of a Python are made for; two that differ cannot share them."""
    return str(variable("SOABI") or variable("EXT_SUFFIX"))


def record() -> dict[str, Any]:
    """What the installation wrote down of the Python that installed the extension."""
    path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "environment.json")
    with open(path, encoding="utf-8") as file:
        recorded: dict[str, Any] = json.load(file)
    return recorded


def mismatch(recorded: dict[str, Any], version: str, binary: str) -> str:
    """A sentence that names both Pythons where they cannot share packages, else an empty text."""
    if recorded["binary"] == binary:
        return ""
    return (
        f"LibreOffice runs Python {version} ({binary}) and tausheet was installed with "
        f"Python {recorded['version']} ({recorded['binary']}), so the cell functions are computed "
        "in a second process, more slowly"
    )
