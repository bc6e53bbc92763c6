"""Loads the add-in file into a headless LibreOffice and runs procedures of its VBA module.

    python vba_in_libreoffice.py SOFFICE FOLDER ADDIN REQUEST

Run by the Python that has uno. REQUEST is a JSON object: "replace" holds pairs of texts for the
module's source, "append" more source, "classes" more modules, "run" the names of functions without
arguments. Printed is a JSON object of what each gives, or how it fails.
"""

from __future__ import annotations

import json
import shutil
import sys
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "addin" / "calc"))

import helper
import uno

MODULE = "xlwings_udfs"


def run(office: helper.Office, addin: str, request: dict[str, Any]) -> dict[str, str]:
    how = helper.properties(
        Hidden=True, FilterName="Calc MS Excel 2007 VBA XML", MacroExecutionMode=4
    )
    url = uno.systemPathToFileUrl(addin)
    document = office.desktop.loadComponentFromURL(url, "_blank", 0, how)
    library = document.BasicLibraries.getByName("tausheet")
    source = library.getByName(MODULE)
    for old, new in request.get("replace", []):
        if old not in source:
            raise ValueError(f"not in the module: {old}")
        source = source.replace(old, new)
    for name, text in request.get("classes", {}).items():
        library.insertByName(name, text)
    library.replaceByName(MODULE, source + request.get("append", ""))
    results = {}
    for name in request["run"]:
        address = f"vnd.sun.star.script:tausheet.{MODULE}.{name}?language=Basic&location=document"
        try:
            script = document.getScriptProvider().getScript(address)
            results[name] = script.invoke((), (), ())[0]
        except Exception as error:
            results[name] = f"failed: {type(error).__name__}: {error}"
    document.close(True)
    return results


if __name__ == "__main__":
    soffice, folder, addin, request = sys.argv[1:]
    office = helper.Office(soffice, folder, [])
    try:
        print(json.dumps(run(office, addin, json.loads(request))))
    finally:
        office.end()
        shutil.rmtree(folder, ignore_errors=True)
