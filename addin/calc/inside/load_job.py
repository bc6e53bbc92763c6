"""Makes formulas with a plain FO_NAME( compute when a file has been loaded.

Release 7.4 reads such a call from an .xlsx as an unknown name, kept in small letters. Adding and
removing a defined name makes it compile every formula that holds an unknown name, and only those;
entering the formulas anew would be slow, and is refused for array formulas on protected sheets.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

UNKNOWN_CALL = r"(?<![a-z0-9_.])fo_[a-z0-9_]+\s*\("
_TEMPORARY_NAME = "tausheet_temporary_name"


def resolve(document: Any) -> None:
    """Resolve the calls of a loaded document, leaving no trace in it."""
    named = [name for name in _defined_names(document) if re.search(UNKNOWN_CALL, name.Content)]
    if not named and not any(map(_calls, document.Sheets)):
        return
    was_modified = document.isModified()
    undo = document.getUndoManager()
    undo.lock()
    try:
        for name in named:
            name.setContent(name.getContent())
        _compile_unknown_names(document.NamedRanges)
    finally:
        undo.unlock()
        if not was_modified:
            document.setModified(False)


def _calls(sheet: Any) -> bool:
    search = sheet.createSearchDescriptor()
    search.SearchRegularExpression = True
    search.SearchCaseSensitive = True
    search.SearchString = UNKNOWN_CALL
    return sheet.findFirst(search) is not None


def _defined_names(document: Any) -> Iterator[Any]:
    for names in [document.NamedRanges, *(sheet.NamedRanges for sheet in document.Sheets)]:
        for name in names.ElementNames:
            yield names.getByName(name)


def _compile_unknown_names(names: Any) -> None:
    from com.sun.star.table import CellAddress

    temporary = _TEMPORARY_NAME
    while names.hasByName(temporary):
        temporary += "_"
    names.addNewByName(temporary, "0", CellAddress(), 0)
    names.removeByName(temporary)
