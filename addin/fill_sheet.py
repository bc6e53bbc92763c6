"""One calc sheet filled in again and again: built and compiled once, then only computed.

What it gives is what `tausheet new` would write for the same values. Values that would change the
layout, a long source for instance, have a workbook of their own.
"""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from typing import Any
from xml.sax.saxutils import escape

from tausheet import templates
from tausheet.addin import package
from tausheet.addin.cells import CellValue
from tausheet.addin.embedded import Book
from tausheet.addin.make import Said, named, said
from tausheet.addin.review.fingerprint import Place, places_of
from tausheet.templates import entered
from tausheet.templates.entered import Cell, Content

Given = Mapping[str, str]

MOST_KEPT = 6
"""Workbooks kept ready; each takes about 20 MB."""
_PROPERTIES = "docProps/core.xml"
_kept: dict[Any, _Ready] = {}


@dataclass(frozen=True)
class Done:
    """A workbook, what it says, and the corners in which its worst cases are highest."""

    data: bytes
    said: Said
    corner: str


def fill(name: str, given: Given) -> Done:
    """The calc sheet with these values, computed and stored."""
    sheet = templates.find(name)
    content = entered.entered(sheet, given)
    key = (name, date.today(), entered.layout(sheet, content))
    ready = _kept.pop(key, None) or _Ready(name, given)
    _kept[key] = ready  # the last used is the last
    if len(_kept) > MOST_KEPT:
        del _kept[next(iter(_kept))]
    return ready.filled(content)


class _Ready:
    """A workbook built for one set of values, to be filled with all that are laid out alike."""

    def __init__(self, name: str, given: Given) -> None:
        self._sheet = templates.find(name)
        self._workbook = templates.build(name, given)
        packed = io.BytesIO()
        self._workbook.save(packed)
        self._stencil = package.Stencil(packed.getvalue())
        with zipfile.ZipFile(packed) as parts:
            self._properties = parts.read(_PROPERTIES)
        self._book = Book(self._workbook)
        self._places = {n: places_of(self._workbook, n) for n in self._workbook.defined_names}
        self._built = entered.entered(self._sheet, given)
        self._now = dict(self._built)

    def filled(self, content: Mapping[Cell, Content]) -> Done:
        """The sheet with these contents of the cells to type into."""
        changed = self._differing(self._now, content)
        self._now = {}  # should a cell be refused, nothing is taken for known
        for title, address, value in changed:
            self._book.set(title, address, value)
        self._now = dict(content)
        values = self._book.values()
        typed: dict[str, dict[str, CellValue]] = {}
        for title, address, value in self._differing(self._built, content):
            typed.setdefault(title, {})[address] = value
        title = str(content["doc_title", 0] or self._sheet.title)
        data = self._stencil.filled(values, typed, {_PROPERTIES: self._titled(title)})
        corners = [
            f"{worst.of}: {named(self._workbook, values, name)[0]}"
            for worst in self._sheet.worst_cases
            if (name := f"{worst.of}_highest_corner") in self._places
        ]
        return Done(data, said(self._workbook, values), "; ".join(corners))

    def _differing(
        self, known: Mapping[Cell, Content], content: Mapping[Cell, Content]
    ) -> list[tuple[str, str, CellValue]]:
        """Worksheet, address and content of the cells that hold something else now."""
        found: list[tuple[str, str, CellValue]] = []
        for cell in dict.fromkeys((*known, *content)):
            value = content.get(cell)
            if cell not in known or known[cell] != value:
                place: Place = self._places[cell[0]][cell[1]]
                found.append((*place, float(value) if isinstance(value, int) else value))
        return found

    def _titled(self, title: str) -> bytes:
        text = f"<dc:title>{escape(title)}</dc:title>".encode()
        return re.sub(rb"<dc:title>[^<]*</dc:title>", lambda _: text, self._properties)
