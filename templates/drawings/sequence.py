"""The circuit of `sequence`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A source E behind R, a constant current I, or nothing, switched to the store."""
    d = drawing()
    d += (source := elm.SourceV().up().length(3.4).label("E"))
    d += elm.ResistorIEC().right().length(3.0).label("R")
    d += (one := elm.Dot(open=True).label("through R", loc="top", ofst=(0.45, 0.1)))
    d += elm.SourceI().at((source.start[0] + 4.4, source.start[1])).up().length(2.2).label("I")
    d += elm.Dot(open=True).label("constant\ncurrent", loc="right")
    d += (none := elm.Dot(open=True).at((one.center[0] + 1.4, one.center[1] + 1.0)))
    d += elm.Label().at((none.center[0] + 0.7, none.center[1] + 0.1)).label("held")
    d += (pole := elm.Dot(open=True).at((one.center[0] + 2.2, one.center[1])))
    d += elm.Line().at(one.center).to((pole.center[0] - 0.15, pole.center[1] + 0.05))
    d += elm.Line().at(pole.center).right().length(2.2)
    d += (top := elm.Dot())
    d += elm.Capacitor().down().toy(source.start).label("C_store", loc="bottom")
    d += elm.Dot()
    d += (
        elm.Gap()
        .at((top.center[0] - 1.0, top.center[1] - 0.1))
        .down()
        .toy(source.start)
        .label(("+", "y_start", "−"))
    )
    d += elm.Line().at(top.center).right().length(2.2)
    d += elm.Inductor2(loops=3).down().toy(source.start).label("or L_store", loc="bottom")
    d += elm.Line().tox(source.start)
    return d
