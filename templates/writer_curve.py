"""Part 8, curve: the waveform from before switching until past the end, with its limits."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.chart.axis import ChartLines
from openpyxl.chart.layout import Layout, ManualLayout
from openpyxl.chart.legend import Legend
from openpyxl.chart.marker import Marker
from openpyxl.chart.series import XYSeries
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText, Text
from openpyxl.chart.title import Title
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.text import (
    CharacterProperties,
    Font,
    Paragraph,
    ParagraphProperties,
    RegularTextRun,
)
from openpyxl.utils import get_column_letter

from tausheet.functions.units import units_of
from tausheet.templates import style
from tausheet.templates.book import Book
from tausheet.templates.formulas import renamed
from tausheet.templates.model import Curve
from tausheet.templates.page import Page
from tausheet.templates.values import shown_unit
from tausheet.templates.writer_tables import ratio

PART = 8
TOP = 4
"""First row of points on the worksheet "Curve"."""
BEFORE = 0.06
PAST = 1.25
"""How far the chart begins before switching and ends past the end, in lengths of it."""

HEIGHT = 330
"""Points that the chart takes."""

# dash, width in EMU, ink: told apart without colour by dash and width
LINES: dict[str, tuple[tuple[Any, int, str], ...]] = {
    "trace": (
        ("solid", 28575, style.INK),
        ("dash", 19050, style.DEEP),
        ("lgDashDot", 15875, style.QUIET),
    ),
    "level": (("sysDot", 19050, style.BAD), ("sysDashDot", 19050, style.BAD)),
    "moment": (("lgDash", 12700, style.HEED), ("sysDash", 12700, style.HEED)),
}


@dataclass(frozen=True)
class _Line:
    """One series of the chart: where its points stand."""

    label: str
    kind: str
    times: str
    values: str
    last: int


def write(page: Page, book: Book) -> None:
    """Write the chart, and the points behind it."""
    page.part(PART, "Curve", HEIGHT)
    row = page.down(HEIGHT)
    chart = _chart(book, _Points(book).write())
    chart.width = page.width("A:H") * 2.54 / 96  # type: ignore[assignment]
    chart.height = HEIGHT * 2.54 / 72
    page.worksheet.add_chart(chart, f"A{row}")
    page.quiet(book.sheet.curve.caption)


class _Points:
    """The worksheet "Curve": a formula a point, all in the units of the axes."""

    def __init__(self, book: Book) -> None:
        self.book, self.curve, self.sheet = book, book.sheet.curve, book.curve
        self.last = TOP + self.curve.points
        self.place = 3
        self.time_scale = _scale("time", self.curve.time_unit)
        self.times = "B" if self.time_scale else "A"
        self.value_scale = _scale(self.curve.quantity, self.curve.unit)

    def write(self) -> list[_Line]:
        """Write every series."""
        curve = self.curve
        self.sheet["A1"] = (
            f"Points of the curve: time in {shown_unit(curve.time_unit)}, {_measured(curve)}"
        )
        self.sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
        self._times()
        lines = [self._trace(trace.label, trace.formula) for trace in curve.traces]
        drawn = f"{get_column_letter(self.place - len(curve.traces))}{TOP}:"
        drawn += f"{get_column_letter(self.place - 1)}{self.last}"
        lowest, highest = 0 if curve.from_zero else f"=MIN({drawn})", f"=MAX({drawn})"
        ends = (f"={self.times}{TOP}", f"={self.times}{self.last}")
        for level in curve.levels:
            height = f"=({level.value}){self.value_scale}"
            lines.append(self._few(level.label, "level", zip(ends, (height, height), strict=True)))
        for moment in curve.moments:
            at = f"=({moment.time}){self.time_scale}"
            lines.append(self._few(moment.label, "moment", ((at, lowest), (at, highest))))
        for mark in curve.marks:
            point = (f"=({mark.time}){self.time_scale}", f"=({mark.value}){self.value_scale}")
            lines.append(self._few(mark.label, "mark", (point,)))
        return lines

    def _head(self, letter: str, label: str) -> None:
        cell = self.sheet[f"{letter}{TOP - 1}"]
        cell.value = label
        cell.font = style.font(10, bold=True)
        cell.border = style.RULE
        self.sheet.column_dimensions[letter].width = max(12, len(label) + 2)

    def _times(self) -> None:
        points = self.curve.points
        self.sheet["D1"] = f"=IFERROR({self.curve.end},NA())"
        self.book.define("curve_span", self.sheet, "D1")
        self._head("A", "time in s")
        if self.time_scale:
            self._head("B", f"time in {shown_unit(self.curve.time_unit)}")
        at_zero = round(points * BEFORE / (PAST + BEFORE))
        for i in range(points + 1):
            before = i < at_zero
            share = (
                -BEFORE * (1 - i / at_zero) if before else PAST * (i - at_zero) / (points - at_zero)
            )
            self.sheet[f"A{TOP + i}"] = f"=curve_span*{share:.12g}"
            if self.time_scale:
                self.sheet[f"B{TOP + i}"] = f"=A{TOP + i}{self.time_scale}"

    def _trace(self, label: str, formula: str) -> _Line:
        letter = get_column_letter(self.place)
        self.place += 1
        self._head(letter, label)
        for row in range(TOP, self.last + 1):
            at = renamed(formula, {"t": f"$A{row}"})
            self.sheet[f"{letter}{row}"] = f"=({at}){self.value_scale}"
        return _Line(label, "trace", self.times, letter, self.last)

    def _few(self, label: str, kind: str, points: Iterable[tuple[str, str | int]]) -> _Line:
        times, values = get_column_letter(self.place), get_column_letter(self.place + 1)
        self.place += 2
        self._head(times, f"{label}: time")
        self._head(values, label)
        row = TOP - 1
        for row, (time, value) in enumerate(points, start=TOP):
            self.sheet[f"{times}{row}"], self.sheet[f"{values}{row}"] = time, value
        return _Line(label, kind, times, values, row)


def _measured(curve: Curve) -> str:
    """What the vertical axis shows, and in which unit."""
    return f"{curve.y_title} in {shown_unit(curve.unit)}" if curve.unit else curve.y_title


def _scale(quantity: str, unit: str) -> str:
    """The end of a formula that turns base SI into the unit of an axis."""
    if not unit:
        return ""
    over, under = ratio(units_of(quantity)[unit])
    return "" if over == under else f"*{under:.0f}/{over:.0f}"


def _chart(book: Book, lines: list[_Line]) -> ScatterChart:
    curve = book.sheet.curve
    chart = ScatterChart()
    chart.scatterStyle = "lineMarker"
    seen = dict.fromkeys((*LINES, "mark"), 0)
    for line in lines:
        chart.series.append(_series(book, line, seen[line.kind]))
        seen[line.kind] += 1
    _axis(chart.x_axis, f"time after switching in {shown_unit(curve.time_unit)}")
    _axis(chart.y_axis, _measured(curve))
    if curve.from_zero:
        chart.y_axis.scaling.min = 0
    chart.legend = Legend(legendPos="b", overlay=False, txPr=_letters(850))
    chart.graphical_properties = GraphicalProperties(ln=LineProperties(noFill=True))
    chart.layout = Layout(
        manualLayout=ManualLayout(
            layoutTarget="inner", xMode="edge", yMode="edge", x=0.09, y=0.03, w=0.88, h=0.75
        )
    )
    return chart


def _series(book: Book, line: _Line, number: int) -> XYSeries:
    title = book.curve.title
    area = f"'{title}'!${{0}}${TOP}:${{0}}${line.last}"
    series: XYSeries = Series(
        Reference(range_string=area.format(line.values)),
        Reference(range_string=area.format(line.times)),
        title=line.label,
    )
    series.smooth = False
    if line.kind == "mark":
        series.marker = Marker("diamond", 10, GraphicalProperties(solidFill=style.INK))
        series.graphicalProperties = GraphicalProperties(ln=LineProperties(noFill=True))
        return series
    dash, width, colour = LINES[line.kind][number % len(LINES[line.kind])]
    series.marker = Marker("none")
    series.graphicalProperties = GraphicalProperties(
        ln=LineProperties(solidFill=colour, w=width, prstDash=dash)
    )
    return series


def _axis(axis: object, title: str) -> None:
    """A drawn axis: title with its unit, light grid, labels at the low end."""
    letters = _properties(900, bold=True)
    run = RegularTextRun(rPr=letters, t=title)
    paragraph = Paragraph(pPr=ParagraphProperties(defRPr=letters), r=[run])
    for name, value in {
        "title": Title(tx=Text(rich=RichText(p=[paragraph])), overlay=False),
        "delete": False,
        "number_format": "General",
        "majorTickMark": "out",
        "tickLblPos": "low",
        "majorGridlines": ChartLines(
            spPr=GraphicalProperties(ln=LineProperties(solidFill="DDE3E6", w=6350))
        ),
        "txPr": _letters(850),
        "graphicalProperties": GraphicalProperties(
            ln=LineProperties(solidFill=style.QUIET, w=9525)
        ),
    }.items():
        setattr(axis, name, value)


def _letters(size: int) -> RichText:
    properties = _properties(size)
    return RichText(
        p=[Paragraph(pPr=ParagraphProperties(defRPr=properties), endParaRPr=properties)]
    )


def _properties(size: int, bold: bool = False) -> CharacterProperties:
    return CharacterProperties(
        sz=size, b=bold, latin=Font(typeface=style.FONT), solidFill=style.INK
    )
