"""The circuit of `bleed`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A bank of two levels with tapped discharge resistors behind a supply that opens."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(4.8).label("supply"))
    d += (opens := elm.Switch(action="open").right().length(3.2).label("opens at t = 0", loc="top"))
    d += elm.Line().right().length(1.2)
    d += (top := elm.Dot())
    d += elm.Capacitor().down().length(2.4).label("C_unit\nn_p in parallel", loc="bottom")
    d += (middle := elm.Dot())
    d += elm.Capacitor().down().length(2.4).label("C_unit\nn_p in parallel", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(top.center).right().length(5.2)
    d += (first := elm.ResistorIEC().down().length(2.4))
    d += (tap := elm.Dot())
    d += elm.ResistorIEC().down().length(2.4)
    d += elm.Line().tox(bottom.center)
    d += elm.Line().at(middle.center).tox(tap.center).label("tapped", loc="top")
    d += (
        elm.Gap()
        .at((first.start[0] + 0.5, first.start[1]))
        .down()
        .length(4.8)
        .label("R_unit\nn_rp chains of\nn_rs in series", loc="bottom", halign="left")
    )
    d += (
        elm.Gap()
        .at((opens.end[0] - 0.4, top.center[1]))
        .down()
        .length(4.8)
        .label(("+", "V_start", "−"))
    )
    d += (
        elm.Gap()
        .at((bottom.center[0] - 0.2, bottom.center[1] - 0.6))
        .right()
        .length(4)
        .label("n_s levels in series")
    )
    return d
