"""Stand-ins for pywin32 and Windows' own libraries, so that xlwings' real code runs on Linux.

`install()` imports xlwings with sys.platform set to "win32" for the duration of that import, so
that it takes its Windows branch: its decorators, its generator of VBA and its `CallUDF` are the
real ones. Only what lies below (COM, the DLLs) is replaced. Nothing here is Excel: what a real
one does is settled by tests/on_windows.
"""

from __future__ import annotations

import asyncio  # noqa: F401 - these look at sys.platform when first imported
import atexit
import concurrent.futures  # noqa: F401
import ctypes
import datetime
import importlib
import logging  # noqa: F401
import multiprocessing  # noqa: F401
import subprocess  # noqa: F401
import sys
import tempfile  # noqa: F401
import types
from decimal import Decimal
from typing import Any

import numpy as np  # noqa: F401

MISSING = -2147352572
"""DISP_E_PARAMNOTFOUND: an argument left out, as pywin32 hands it to Python."""

ERROR_BASE = -2146828288
"""0x800A0000: an error cell reaches Python as this plus its number."""


class ComError(Exception):
    def __init__(self, hresult: Any = None, strerror: Any = None, *_: Any) -> None:
        super().__init__(hresult, strerror)
        self.hresult, self.strerror = hresult, strerror


class ComException(ComError):
    def __init__(self, description: Any = None, scode: Any = None, *_: Any, **__: Any) -> None:
        super().__init__(scode, description)
        self.description = description


class IID(str):
    def __new__(cls, text: Any) -> IID:
        return super().__new__(cls, str(text).upper())


class PyTime(datetime.datetime):
    """pywintypes' time object, which a date cell becomes."""


class Dispatchable:
    """A COM object before xlwings has wrapped it."""

    def __init__(self, target: Any) -> None:
        self.target = target

    def GetTypeInfo(self) -> Any:
        name = type(self.target).__name__
        return types.SimpleNamespace(GetDocumentation=lambda _: (name,))


class _Wrapped:
    def __init__(self, obj: Any) -> None:
        self.obj = obj


class _Anything:
    """Takes any attribute and any call: the handles of the DLLs."""

    def __getattr__(self, name: str) -> _Anything:
        return _Anything()

    def __call__(self, *_: Any, **__: Any) -> int:
        return 0


def _module(name: str, **attributes: Any) -> types.ModuleType:
    module = types.ModuleType(name)
    module.__path__ = []
    module.__dict__.update(attributes)
    sys.modules[name] = module
    parent, _, child = name.rpartition(".")
    if parent:
        setattr(sys.modules[parent], child, module)
    return module


def _unwrap(value: Any) -> Any:
    if isinstance(value, _Wrapped):
        return value
    raise ComError(0, "not a Python object")


def _dispatch(obj: Any, *_: Any, **__: Any) -> Any:
    return obj.target if isinstance(obj, Dispatchable) else obj


def _anything_but_dunders(name: str) -> _Anything:
    if name.startswith("__"):  # what Python itself asks a module for
        raise AttributeError(name)
    return _Anything()


def _pywin32() -> None:
    def nothing(*_: Any, **__: Any) -> None:
        return None

    dispatch_iid = IID("{00020400-0000-0000-C000-000000000046}")
    enum_iid = IID("{00020404-0000-0000-C000-000000000046}")
    _module(
        "pywintypes",
        com_error=ComError,
        error=type("error", (Exception,), {}),
        TimeType=PyTime,
        IID=IID,
        IIDType=IID,
    )
    _module(
        "pythoncom",
        com_error=ComError,
        ole_error=ComError,
        CoInitialize=nothing,
        CoUninitialize=nothing,
        IID_IDispatch=dispatch_iid,
        IID_IEnumVARIANT=enum_iid,
        TypeIIDs={dispatch_iid: Dispatchable},
        CLSCTX_LOCAL_SERVER=4,
        REGCLS_MULTIPLEUSE=1,
        REGCLS_SUSPENDED=4,
        __file__="pythoncom.dll",
    )
    _module("win32com")
    _module(
        "win32com.client",
        Dispatch=_dispatch,
        DispatchEx=_dispatch,
        VARIANT=type("VARIANT", (), {}),
        CDispatch=type("CDispatch", (), {}),
        CoClassBaseClass=type("CoClassBaseClass", (), {}),
        DispatchBaseClass=type("DispatchBaseClass", (), {}),
    )
    _module("win32com.client.gencache", EnsureModule=nothing)
    _module("win32com.server")
    _module("win32com.server.util", wrap=lambda obj, iid=None: _Wrapped(obj), unwrap=_unwrap)
    _module("win32com.server.policy", DefaultPolicy=type("DefaultPolicy", (), {}))
    _module("win32com.server.dispatcher")
    _module("win32com.server.exception", COMException=ComException)
    utc = types.SimpleNamespace(utc=lambda: datetime.timezone.utc)
    _module("win32timezone", TimeZoneInfo=utc)
    for name in ("win32api", "win32con", "win32event", "win32gui", "win32process"):
        _module(name).__getattr__ = _anything_but_dunders  # type: ignore[method-assign]
    sys.modules["win32process"].GetWindowThreadProcessId = lambda _: (1, 4711)


_installed: types.SimpleNamespace | None = None


def install() -> types.SimpleNamespace:
    """xlwings as on Windows: xlwings, its udfs module, and the server object that Excel calls."""
    global _installed
    if _installed is not None:
        return _installed
    if "xlwings" in sys.modules:
        raise RuntimeError("install() must run before anything imports xlwings")
    _pywin32()
    saved = {name: getattr(ctypes, name, None) for name in ("oledll", "windll", "PyDLL")}
    ctypes.oledll, ctypes.windll = _Anything(), _Anything()  # type: ignore[attr-defined]
    ctypes.PyDLL = lambda *_, **__: _Anything()  # type: ignore[misc, assignment]
    platform, sys.platform = sys.platform, "win32"
    try:
        xlwings = importlib.import_module("xlwings")
    finally:
        sys.platform = platform
        for name, value in saved.items():
            if value is None:
                delattr(ctypes, name)
            else:
                setattr(ctypes, name, value)
    atexit.unregister(sys.modules["xlwings._xlwindows"].cleanup)  # would look for EXCEL.EXE
    server = sys.modules["xlwings.com_server"].XLPython()
    _installed = types.SimpleNamespace(
        xlwings=xlwings, udfs=sys.modules["xlwings.udfs"], server=server
    )
    return _installed


class Range:
    """Cells as an argument; `value` as Excel's Value hands it over: one, or a tuple of rows."""

    def __init__(self, value: Any = None, areas: int = 1) -> None:
        self.value, self.areas = value, areas

    def given(self) -> Any:
        """What the wrapper's VBA hands over: Value2, in which currencies and dates are numbers."""
        if self.areas > 1:
            return ERROR_BASE + 2015
        if isinstance(self.value, tuple):
            return tuple(tuple(map(_value2, row)) for row in self.value)
        return _value2(self.value)


def _value2(value: Any) -> Any:
    if isinstance(value, datetime.datetime):
        start = datetime.datetime(1899, 12, 30)
        return (value.replace(tzinfo=None) - start) / datetime.timedelta(days=1)
    return float(value) if isinstance(value, Decimal) else value


def call(module: str, function: str, *arguments: Any) -> Any:
    """=FUNCTION(arguments) in a cell, through xlwings' real CallUDF; what COM would carry back."""
    given = tuple(a.given() if isinstance(a, Range) else a for a in arguments)
    return install().server.CallUDF(module, function, given)
