"""The add-in as LibreOffice sees it: one method a cell function, and the job at loading."""

from __future__ import annotations

import platform
import struct
import sysconfig
from collections.abc import Callable
from typing import Any

import unohelper
from com.sun.star.lang import XServiceInfo
from com.sun.star.task import XJob

from . import binary_form, load_job, mismatch, packages, reader, record
from .names import JOB, READER, SERVICE
from .second_process import SecondProcess

_VALUE_ERROR = struct.unpack("<d", struct.pack("<Q", 0x7FF8000000000000 | 519))[0]
_SPEAKING = ("FO_REASON", "FO_VERSION")


class _Named(unohelper.Base, XServiceInfo):  # type: ignore[misc]
    """A component whose implementation and service have one name."""

    name = ""

    def getImplementationName(self) -> str:
        return self.name

    def supportsService(self, name: str) -> bool:
        return name == self.name

    def getSupportedServiceNames(self) -> tuple[str, ...]:
        return (self.name,)


def _unable(sentence: str) -> Callable[[str], Callable[..., Any]]:
    """Answers of an add-in that cannot compute: errors, and the sentence where words are wanted."""

    def answer_of(name: str) -> Callable[..., Any]:
        value = sentence if name in _SPEAKING else _VALUE_ERROR
        return lambda *_: ((value,),)

    return answer_of


def _answers(recorded: dict[str, Any]) -> Callable[[str], Callable[..., Any]]:
    sentence = packages.missing(recorded)
    if sentence:
        return _unable(sentence)
    if mismatch(recorded, platform.python_version(), binary_form(sysconfig.get_config_var)):
        return SecondProcess(recorded["executable"]).answer_of
    packages.add(recorded["folders"])
    try:
        from tausheet.addin.calc.answer import answer_of
    except Exception as error:
        return _unable(
            f"tausheet cannot be loaded in LibreOffice ({type(error).__name__}: {error}); "
            "run tausheet install calc again"
        )
    return answer_of


def _alone(answer: Callable[..., Any]) -> Callable[..., Any]:
    """A text on its own, not in an array; an array of texts is an error (see interface.text)."""

    def answer_alone(*arguments: Any) -> Any:
        rows = answer(*arguments)
        return rows[0][0] if len(rows) == len(rows[0]) == 1 else _VALUE_ERROR

    return answer_alone


_functions: Any = None


def _create_functions(context: Any, *_: Any) -> Any:
    global _functions
    if _functions is None:
        # known only once LibreOffice has read the extension's type library
        from org.tausheet import XFunctions

        recorded = record()
        answer_of = _answers(recorded)
        methods = {name: staticmethod(answer_of(name)) for name in recorded["functions"]}
        for name in recorded["texts"]:
            methods[name] = staticmethod(_alone(answer_of(name)))
        _functions = type("Functions", (_Named, XFunctions), {"name": SERVICE, **methods})
    return _functions()


class _LoadJob(_Named, XJob):  # type: ignore[misc]
    name = JOB

    def __init__(self, context: Any, *_: Any) -> None:
        pass

    def execute(self, arguments: Any) -> tuple[()]:
        """Run after a spreadsheet has been loaded."""
        for argument in arguments:
            if argument.Name == "Environment":
                for value in argument.Value:
                    if value.Name == "Model" and value.Value is not None:
                        load_job.resolve(value.Value)
        return ()


class _Reader(_Named, XJob):  # type: ignore[misc]
    name = READER

    def __init__(self, context: Any, *_: Any) -> None:
        pass

    def execute(self, arguments: Any) -> str:
        """Answer the headless engine."""
        given = {argument.Name: argument.Value for argument in arguments}
        return reader.read(given["Document"], given["Titles"])


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(_create_functions, SERVICE, (SERVICE,))
g_ImplementationHelper.addImplementation(_LoadJob, JOB, (JOB,))
g_ImplementationHelper.addImplementation(_Reader, READER, (READER,))
