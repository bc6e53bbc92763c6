"""The circuit of `delay`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A resistor that charges a capacitor at an input, with a discharge path to the supply."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(3.4).label("V_sup\nrises in t_ramp"))
    d += elm.Line().right().length(1.6)
    d += (left := elm.Dot())
    d += elm.ResistorIEC().right().length(4.6).label("R_time", loc="bottom")
    d += (node := elm.Dot())
    d += elm.Line().at(node.center).up().length(1.4)
    d += elm.ResistorIEC().left().length(2.3).label("R_dis", loc="top")
    d += elm.Diode().left().length(2.3)
    d += elm.Line().down().toy(left.center)
    d += elm.Capacitor().at(node.center).down().length(3.4).label("C_time\nI_leak", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(node.center).right().length(1.8)
    d += elm.Line(arrow="->").right().length(1.2).label("I_in", loc="top")
    d += (box := elm.RBox().down().length(3.4))
    d += elm.Line().tox(bottom.center)
    d += (
        elm.Gap()
        .at((box.start[0] + 0.5, box.start[1]))
        .down()
        .length(3.4)
        .label("input:\nup at V_th,\nback at V_off", loc="bottom", halign="left")
    )
    return d
