"""The circuit of `filter`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A contact with a resistor to the idle voltage, an R-C filter and an input."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(3.4).label("V_on"))
    d += elm.ResistorIEC().right().length(2).label("R_on", loc="top")
    d += elm.Switch().right().length(1.8).label("contact", loc="bottom")
    d += (idle := elm.Dot())
    d += elm.ResistorIEC().down().length(2.2).label("R_off", loc="top")
    d += elm.Dot(open=True).label("V_idle", loc="right")
    d += elm.ResistorIEC().at(idle.center).right().length(2.8).label("R_flt", loc="top")
    d += (node := elm.Dot())
    d += elm.Capacitor().down().length(3.4).label("C_flt", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(node.center).right().length(2)
    d += (load := elm.Dot())
    d += elm.ResistorIEC().down().length(3.4).label("R_load", loc="bottom")
    d += elm.Dot()
    d += elm.Line().tox(bottom.center)
    d += elm.Line(arrow="->").at(load.center).right().length(2.2).label("I_in", loc="top")
    d += (box := elm.RBox().down().length(3.4))
    d += elm.Line().tox(bottom.center)
    d += (
        elm.Gap()
        .at((box.start[0] + 0.5, box.start[1]))
        .down()
        .length(3.4)
        .label("input:\nup at V_up,\nback at V_dn", loc="bottom", halign="left")
    )
    return d
