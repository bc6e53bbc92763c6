"""The files that register the add-in with LibreOffice, made from the catalogue.

Registration is passive: LibreOffice reads these files and starts Python at the first call only.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from xml.sax.saxutils import escape, quoteattr

from tausheet.addin.calc.inside import names
from tausheet.addin.calc.interface import argument_name
from tausheet.functions.arguments import Number, Parameter
from tausheet.functions.catalogue import CellFunction

_HEADER = '<?xml version="1.0" encoding="UTF-8"?>\n'
_REGISTRY = (
    'xmlns:oor="http://openoffice.org/2001/registry" '
    'xmlns:xs="http://www.w3.org/2001/XMLSchema" oor:package="org.openoffice.Office"'
)
COMPONENT = "tausheet_component.py"


def argument_help(parameter: Parameter, *, variadic: bool = False) -> str:
    """What the function wizard says of an argument.

    LibreOffice itself calls every argument of such a function optional, and hands a single empty
    cell over as 0: so the help says which arguments are required, and what an empty cell does.
    """
    if variadic:
        return f"{parameter.help}; as many as needed"
    if not parameter.required:
        return f"{parameter.help}; optional{_default(parameter.default)}"
    if isinstance(parameter.spec, Number):
        return f"{parameter.help}; required (an empty cell given by its address counts as 0)"
    return f"{parameter.help}; required"


def _default(default: object) -> str:
    if default is None or (isinstance(default, float) and math.isinf(default)):
        return ""
    if isinstance(default, bool):
        return f", default {str(default).upper()}"
    shown = f'"{default}"' if isinstance(default, str) else f"{default:g}"
    return f", default {shown}"


def functions_xcu(entries: Iterable[CellFunction], service: str = names.SERVICE) -> str:
    """Names, descriptions and argument help of the functions (CalcAddIns.xcu)."""
    nodes = "".join(map(_function, entries))
    return (
        f'{_HEADER}<oor:component-data {_REGISTRY} oor:name="CalcAddIns">\n'
        f'<node oor:name="AddInInfo"><node oor:name={quoteattr(service)} oor:op="replace">'
        f'<node oor:name="AddInFunctions">\n{nodes}</node></node></node>\n</oor:component-data>\n'
    )


def _function(entry: CellFunction) -> str:
    variadic = entry.parameters[-1] if entry.variadic else None
    arguments = ""
    for index, parameter in enumerate(entry.parameters, start=1):
        help_text = argument_help(parameter, variadic=parameter is variadic)
        arguments += (
            f'  <node oor:name="{argument_name(index)}" oor:op="replace">'
            f"{_text('DisplayName', parameter.name)}{_text('Description', help_text)}</node>\n"
        )
    return (
        f'<node oor:name="{entry.name}" oor:op="replace">\n'
        f"  {_text('DisplayName', entry.name)}{_text('CompatibilityName', entry.name)}\n"
        f"  {_text('Description', entry.summary)}\n"
        '  <prop oor:name="Category"><value>Add-In</value></prop>\n'
        f'  <node oor:name="Parameters">\n{arguments}  </node>\n</node>\n'
    )


def _text(name: str, value: str) -> str:
    return f'<prop oor:name="{name}"><value xml:lang="en">{escape(value)}</value></prop>'


def jobs_xcu() -> str:
    """The job that runs when a spreadsheet has been loaded (Jobs.xcu)."""
    return f"""{_HEADER}<oor:component-data {_REGISTRY} oor:name="Jobs">
<node oor:name="Jobs"><node oor:name="{names.JOB}" oor:op="replace">
  <prop oor:name="Service"><value>{names.JOB}</value></prop>
  <prop oor:name="Context"><value>com.sun.star.sheet.SpreadsheetDocument</value></prop>
</node></node>
<node oor:name="Events"><node oor:name="OnLoadFinished" oor:op="fuse"><node oor:name="JobList">
  <node oor:name="{names.JOB}" oor:op="replace"/>
</node></node></node>
</oor:component-data>
"""


def components(services: Iterable[str] = (names.SERVICE, names.JOB, names.READER)) -> str:
    """Which file implements which service."""
    implementations = "".join(
        f'    <implementation name="{service}"><service name="{service}"/></implementation>\n'
        for service in services
    )
    return (
        f'{_HEADER}<components xmlns="http://openoffice.org/2010/uno-components">\n'
        f'  <component loader="com.sun.star.loader.Python" uri="{COMPONENT}">\n'
        f"{implementations}  </component>\n</components>\n"
    )


def description(version: str) -> str:
    """Identifier, version and name of the extension (description.xml)."""
    return f"""{_HEADER}<description
    xmlns="http://openoffice.org/extensions/description/2006"
    xmlns:xlink="http://www.w3.org/1999/xlink">
  <identifier value="{names.IDENTIFIER}"/>
  <version value="{version}"/>
  <display-name><name lang="en">tausheet</name></display-name>
  <extension-description><src xlink:href="summary.txt" lang="en"/></extension-description>
</description>
"""


_MEDIA_TYPES = {
    ".rdb": "application/vnd.sun.star.uno-typelibrary;type=RDB",
    ".components": "application/vnd.sun.star.uno-components",
    ".xcu": "application/vnd.sun.star.configuration-data",
}


def manifest(files: Iterable[str]) -> str:
    """What each file of the extension is, where LibreOffice must know (manifest.xml)."""
    entries = "".join(
        f'  <manifest:file-entry manifest:full-path="{name}" manifest:media-type="{kind}"/>\n'
        for name in files
        for suffix, kind in _MEDIA_TYPES.items()
        if name.endswith(suffix)
    )
    return (
        f'{_HEADER}<manifest:manifest xmlns:manifest="http://openoffice.org/2001/manifest">\n'
        f"{entries}</manifest:manifest>\n"
    )
