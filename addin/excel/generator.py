"""xlwings' own generator of VBA, on any system.

Its module imports COM at the top although the generator uses none of it. Where COM is missing,
empty stand-ins take its place for the moment of that import.
"""

from __future__ import annotations

import importlib
import sys
import types
from typing import Any

from tausheet.functions.errors import TausheetError

_COM = ("pythoncom", "pywintypes", "win32com", "win32com.client")


def generator() -> Any:
    """The module xlwings.udfs."""
    try:
        importlib.import_module("xlwings")
    except ImportError:
        raise TausheetError(
            'the package xlwings is missing; install it with: pip install "tausheet[excel]"'
        ) from None
    try:
        return importlib.import_module("xlwings.udfs")
    except ImportError:
        return _without_com()


def _without_com() -> Any:
    stand_ins = {name: types.ModuleType(name) for name in _COM if name not in sys.modules}
    for module in stand_ins.values():
        module.__dict__.update(CoInitialize=None, Dispatch=None, __path__=[])
    sys.modules.update(stand_ins)
    try:
        return importlib.import_module("xlwings.udfs")
    finally:
        for name in stand_ins:
            del sys.modules[name]


def decorators(udfs: Any) -> Any:
    """The decorators that xlwings offers as xlwings.func, arg and ret on Windows."""
    return types.SimpleNamespace(func=udfs.xlfunc, arg=udfs.xlarg, ret=udfs.xlret)
