"""The VBA module of the add-in: xlwings' own generated wrappers, made to return real errors.

Python cannot send an error cell through COM; raising shows a text, which compares as greater
than every number. So a result carries an error as its number, and the wrapper turns it back.
"""

from __future__ import annotations

import io
import re
import types
from pathlib import PureWindowsPath
from typing import Any

from tausheet.addin.excel import bridge
from tausheet.addin.excel.generator import decorators
from tausheet.addin.excel.registration import register

PYTHON_MODULE = "tausheet.addin.excel.worksheet_functions"


def module_text(
    udfs: Any, book: str, interpreter: PureWindowsPath, xlwings_source: str
) -> tuple[str, list[str]]:
    """Source of the add-in's module, and the functions in it; `udfs` is xlwings.udfs."""
    module = types.ModuleType(PYTHON_MODULE)
    register(vars(module), decorators(udfs))
    buffer = io.StringIO()
    # the generator looks at nothing but the workbook's name
    udfs.generate_vba_wrapper(PYTHON_MODULE, module, buffer, types.SimpleNamespace(Name=book))
    text = buffer.getvalue()
    infos = [f.__xlfunc__ for f in vars(module).values() if hasattr(f, "__xlfunc__")]
    for info in infos:
        text = _with_real_errors(text, info["name"], info["ret"]["doc"])
    shown = [
        (info["name"], info["category"], info["ret"]["doc"], [a["doc"] for a in info["args"]])
        for info in infos
    ]
    parts = [
        bridge.head(xlwings_source),
        bridge.helpers(interpreter),
        f"\n{text}",
        bridge.help_texts(shown, book),
    ]
    return "".join(parts), [info["name"] for info in infos]


def _with_real_errors(text: str, name: str, description: str) -> str:
    # a workbook handed over could bring code of its own; without it, and with values for ranges,
    # Python has nothing to ask Excel for
    text, calls = re.subn(
        rf'(?m)^(\s*){name} = XLPy\.CallUDF\(("[\w.]+", "{name}"), (Array\(.*?\)|argsArray)'
        r"(?:, \w+, Application\.Caller)?\)$",
        rf"\1{name} = InCells(XLPy.CallUDF(\2, Given(\3)))",
        text,
    )
    text, failures = re.subn(
        rf"(?m)^(\s*){name} = Err\.Description$", rf"\1{name} = ErrorFrom(Err.Description)", text
    )
    # an error in the cell, wherever the call stands
    begin = text.index(f"Function {name}(")
    own, rest = text[begin:].split("End Function", 1)
    guard = "If TypeOf Application.Caller Is Range Then On Error GoTo failed"
    guards = own.count(guard)
    own = own.replace(guard, "On Error GoTo failed")
    # stands in the source too, so that the wizard shows it even where macros may not set it
    first, _, body = own.partition("\n")
    shown = description.encode("ascii", "replace").decode().replace('"', '""')
    attribute = f'Attribute {name}.VB_Description = "{shown}"'
    text = f"{text[:begin]}{first}\n{attribute}\n{body}End Function{rest}"
    if (calls, failures, guards) != (2, 1, 1):
        raise bridge.ChangedShape(
            f"xlwings generates {name} in a form that this version does not know "
            f"({calls} calls, {failures} failures, {guards} guards); install the version of "
            "xlwings that pyproject.toml names"
        )
    return text
